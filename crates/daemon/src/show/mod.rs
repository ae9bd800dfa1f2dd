//! What people and programs are shown: plain views with units in their names, made from the
//! engine's state, and their text.

mod build;
mod text;
mod views;

pub use build::{now_view, plan_view, row_json, why_planned, why_view};
pub use text::{print_now, print_plan, print_why, table, when};
pub use views::{NowView, PlanView, WhyView};
