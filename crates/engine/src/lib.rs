//! **Given all that has happened, what does the site do now?**
//!
//! One pure function, [`step`]: it takes the state, one event with its stamp, and a buffer of
//! effects that the caller owns. It reads no clock, touches no file and starts no thread; the
//! daemon is a thin shell that feeds events in and carries effects out. The same events give the
//! same effects, bit for bit.

mod act;
mod effect;
mod entry;
mod event;

pub use act::{Act, ActKind, Mode};
pub use effect::{Effects, ForecastRequest, Job, JobKind, Notice, Order, RestOrder, Severity};
pub use entry::{Carried, Entry, OpenIntent, StandingAuthorisation};
pub use event::{Event, Outcome, Product, Stamp};
pub use interlock::ClockTrust;
