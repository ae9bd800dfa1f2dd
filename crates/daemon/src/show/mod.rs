//! What people and programs are shown: plain views with units in their names, made from the
//! engine's state, and their text.

mod views;
mod build;
mod text;

pub use build::{now_view, plan_view, why_view};
pub use text::{print_now, print_plan, print_why, table, when};
pub use views::{NowView, PlanView, WhyView};
