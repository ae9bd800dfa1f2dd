//! Tests over the whole of a plan.

mod figures;
mod fixture;
mod greedy;
mod laws;
mod reader;
