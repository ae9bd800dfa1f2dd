//! Stories: a named site and tide through the engine.

mod delaware;
pub mod tarrow;
pub mod thirty_days;
mod view;
mod why;
