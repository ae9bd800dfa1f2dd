//! **What do the parts of the program say to each other?**
//!
//! Data only: the checked site, readings, the forecast, lawful and usable windows, the plan and its
//! reasons. It has no behaviour beyond looking things up, is never serialised (see `record`,
//! `protocol` and `site` for the forms that leave the program) and knows no formula.
//!
//! Everything that has a name in the site file has a small index here; the names live in [`Site`].

mod clause;
mod forecast;
mod ids;
mod keeping;
mod outlet;
mod plan;
mod reading;
mod reason;
mod site;
mod windows;

pub use clause::*;
pub use forecast::*;
pub use ids::*;
pub use keeping::*;
pub use outlet::*;
pub use plan::*;
pub use reading::*;
pub use reason::*;
pub use site::*;
pub use windows::*;
