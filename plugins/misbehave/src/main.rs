//! An adapter built to do everything wrong.
fn main() {}
