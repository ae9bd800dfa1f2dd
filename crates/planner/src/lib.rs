//! **What is the best lawful movement of water over the next days, and why each part of it?**
//!
//! Dynamic programming over one storage, its gate and its pumps, with the true head-flow relation:
//! [`plan`] takes one self-contained request and gives one immutable plan with a reason for every
//! slot. It never breaks a clause; if a spill cannot be avoided it says when, how much, and which
//! clauses bound the releases before it. [`audit`] reads a plan as a stranger would; [`usable`] says
//! when the water lets an outlet work at all. The crate moves nothing, reads no clock, and has no
//! path to anything that could.
//!
//! What it minds, in this order: water spilled, then water above the high alarm, then energy,
//! strokes and starts, with a small price on stored water so that it leaves early and by gravity.
//!
//! How it goes: backwards over the slots for the least cost to go from every state (`dp`), then
//! forwards from now, minute by minute, with ramps and caps exact (`forward`); longer caps are
//! repaired to feasible (`repair`).
//!
//! Not here: tariffs by the hour, planning against several inflows at once, storages that share a
//! resource, levels that must be held, and how long a pump has run or rested before the plan begins
//! (the interlock keeps that). A pump's flow is taken as fixed whatever its lift. Two windows of
//! different tides that touch are two releases. Which tide gives way to a rolling cap is decided tide
//! by tide, earliest first, and is not proved best; a gate opens on the 5-minute grid or with its
//! window, not at the minute in which a head comes about.
//!
//! ```
//! use planner::{PlanError, usable};
//! // What cannot be planned is refused by name.
//! let refused = PlanError::NoSuchOutlet { outlet: 3, outlets: 1 };
//! assert_eq!(refused.to_string(), "outlet no. 3 was asked for, but the site has 1");
//! # let _ = usable;
//! ```

mod actions;
mod assemble;
mod audit;
mod digest;
mod dp;
mod error;
mod forward;
mod ledger;
mod prices;
mod problem;
mod reasons;
mod repair;
mod throttle;
mod usable;
mod windows;

pub use assemble::plan;
pub use audit::{Finding, audit};
pub use error::PlanError;
pub use usable::usable;

#[cfg(test)]
mod tests;
