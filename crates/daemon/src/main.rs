//! The binary `tidereeve`.
fn main() {}
