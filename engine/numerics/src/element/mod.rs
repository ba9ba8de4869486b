//! One member between two nodes.

mod segment;

pub use segment::Bar;
