//! **May this asset move, now, on what the instruments say?**

mod permit;

pub use permit::{Action, Permit, Renewal};

/// Whether the clock may be believed.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum ClockTrust {
    Trusted,
    Distrusted,
}
