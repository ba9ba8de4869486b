//! Engine.
fn main() {}
