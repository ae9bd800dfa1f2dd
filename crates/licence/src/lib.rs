//! **When does the licence let water move, how much, and may it move now?**
//!
//! Reads clauses as data ([`model::Clause`]) four ways: [`lawful`] turns them into windows over a
//! forecast; [`guard`] reads them against live conditions and sums at the moment of action;
//! [`Tallies`] keeps the sums; [`audit`] looks back over what was done. A window is necessary,
//! never sufficient: only the guard lets a release begin or go on. It plans nothing, knows no
//! hydraulics and commands nothing.
//!
//! An unmet, unreadable or stale clause is a hold, unless the clause itself says otherwise for the
//! asset (`on_stale`). Windows are half-open: at the end exactly, it is shut.
//!
//! Not read yet, and so to be kept by people: hysteresis and hold times of signal gates, seasons,
//! dilution, exclusion, notice, and declared emergencies.
//!
//! ```
//! use licence::rounded;
//! use units::Metres;
//! // Half up, to 0.1 m: the figure that clause 2.5 of a permit may turn on.
//! assert_eq!(rounded(Metres::of(2.128), Metres::of(0.1)), 21);
//! assert_eq!(rounded(Metres::of(2.15), Metres::of(0.1)), 22);
//! ```

mod audit;
mod caps;
mod clause_windows;
mod guard;
mod lawful;
mod tallies;

pub use audit::{Breach, Over, audit};
pub use caps::{flow_cap, long_caps, ramp_cap, rounded};
pub use guard::{Conditions, Guarded, Phase, guard};
pub use lawful::lawful;
pub use tallies::Tallies;

#[cfg(test)]
mod fixture;
#[cfg(test)]
mod tests;
