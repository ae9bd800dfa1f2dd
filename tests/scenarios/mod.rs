//! Stories: a named site and tide through the engine.

pub mod tarrow;
mod why;
