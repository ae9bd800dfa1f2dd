//! **Did the run keep to every rule, by the plant's own record?**
//!
//! An independent judge, written from the list of constraints: it takes samples and events of the
//! plant, the lawful windows and caps as plain data, and says what was broken, when and by how much.
//! It shares no code with planner, licence or interlock, so that one fault cannot blind both; it
//! depends on `units` alone, and only tests reach it.
//!
//! It does not work out windows or tides, drives nothing, and believes nothing that the program
//! under test wrote, but for [`lost`], which compares what was printed with what was kept.
//!
//! How fine it sees: the plant samples once a minute and keeps its totals exactly, so volumes at
//! samples are exact and are taken as straight between them; flow at the ports begins and ends at
//! the exact instant of its events. A record that is empty, out of order or not a number breaks no
//! rule by comparison, so it is refused as such and never passes.
//!
//! ```
//! use oracle::{Line, lost};
//! let printed = [Line { seq: 7, text: "penstock: rest" }, Line { seq: 8, text: "tripped" }];
//! let kept = [Line { seq: 7, text: "penstock: rest" }];
//! assert_eq!(lost(&printed, &kept), [8]);
//! ```

mod finding;
mod run;

mod caps;
mod drives;
mod flow;
mod foresight;
mod judge;
mod lost;
mod rests;
mod sound;
mod spill;

pub use finding::{Finding, Report, Totals};
pub use foresight::{Foresight, foresight};
pub use judge::judge;
pub use lost::{Line, lost};
pub use run::{
    Asset, Barred, Event, EventKind, FixedCap, GateHead, LawfulWindow, Rules, Run, Sample, TideCap,
};

#[cfg(test)]
mod fixture;
