//! **May this asset move, now, on what the instruments say?**
//!
//! A total function of raw readings with their ages, the wish, the clock's trust and the asset's
//! state. It answers with a [`Permit`], which nothing else can make, or with every finding that
//! stands against the movement. It can only stop, deny or send to rest; it never starts anything
//! for profit. It knows nothing of plans, licences or forecasts, and depends on the standard
//! library and `units` alone, so that one fault cannot blind both it and the planner.
//!
//! It is a control layer, not a safety system: the plant's own hard-wired protection stays in
//! charge.
//!
//! ```
//! use interlock::{Bounds, Raw, RawFault};
//! use units::Span;
//! let bounds = Bounds { min: 0.0, max: 100.0, age_max: Span::seconds(30), frozen_after: None };
//! let old = Raw { value: 12.0, age: Span::seconds(31), unchanged_for: Span::ZERO, bounds };
//! assert_eq!(old.checked(), Err(RawFault::Stale));
//! ```

mod finding;
mod judge;
mod permit;
mod raw;
mod rules;
mod self_test;
mod travel;

pub use finding::{Finding, Findings, Id, Subject};
pub use judge::{Renewed, Verdict, Wish, judge, renew};
pub use permit::{Action, Permit, Renewal};
pub use raw::{Bounds, Raw, RawFault};
pub use rules::{ClockTrust, GateRules, Kind, PermitLife, PumpRules, Rules, Scene, State};
pub use self_test::self_test;
pub use travel::{Travel, travel};
