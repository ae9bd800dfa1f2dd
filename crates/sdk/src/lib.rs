//! **How does an adapter author keep the protocol's rules without writing them again?**
//!
//! The author's loop: implement [`Adapter`] and call [`run`]. The loop refuses what must be refused,
//! answers the same command twice the same way, keeps leases that the adapter holds, and brings
//! everything to rest when its input ends. It knows nothing of any equipment.

mod clock;
mod loop_;
mod rules;

pub use clock::BootClock;
pub use loop_::{Adapter, Outbox, SdkError, run, run_on};
pub use protocol;
