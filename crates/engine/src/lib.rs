//! **Given all that has happened, what does the site do now?**
//!
//! One pure function, [`step`]: it takes the state, one event with its stamp, and a buffer of
//! effects that the caller owns. It reads no clock, touches no file and starts no thread; the
//! daemon is a thin shell that feeds events in and carries effects out. The same events give the
//! same effects, bit for bit. It does not plan and does not know hydraulics: a plan comes to it as
//! data, and every opening passes the licence's guard and the interlock on its way out.

mod act;
mod acts;
mod arming;
mod decide;
mod drive;
mod effect;
mod entry;
mod event;
mod meter;
mod ramp;
mod schedule;
mod start;
mod state;
mod step;
mod words;

pub use act::{Act, ActKind, Mode};
pub use decide::{Decision, Goal, decide, next_active, slot_words};
pub use effect::{Effects, ForecastRequest, Job, JobKind, Notice, Order, RestOrder, Severity};
pub use entry::{Carried, Entry, OpenIntent, StandingAuthorisation};
pub use event::{Event, Outcome, Product, Stamp};
pub use interlock::{ClockTrust, PermitLife};
pub use state::{Config, State};
pub use step::step;

/// Plain words for causes.
pub mod say {
    pub use crate::words::{about, by, cause, is, must_be};
}
