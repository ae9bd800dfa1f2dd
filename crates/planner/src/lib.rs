//! **What is the best lawful movement of water over the next days?**
//!
//! Dynamic programming over one storage, its gate and its pumps, with the true head-flow relation:
//! [`plan`] takes one self-contained request and gives one immutable plan with a reason for every
//! slot. It never breaks a clause; if a spill cannot be avoided it says when and how much. It moves
//! nothing, reads no clock, and has no path to anything that could.
//!
//! The order of what it minds: water spilled, then level above the high alarm, then energy and
//! strokes, with a small price on stored water so that it leaves early and by gravity.
//!
//! Not here yet: minimum run times longer than a slot of 5 minutes (such a pump is refused by name),
//! tariffs by the hour, duty rotation, and storages that share a resource.

mod assemble;
mod audit;
mod dp;
mod forward;
mod problem;
mod repair;
mod usable;
mod windows;

pub use assemble::plan;
pub use audit::{Finding, audit};
pub use problem::PlanError;
pub use usable::usable;

#[cfg(test)]
mod tests;
