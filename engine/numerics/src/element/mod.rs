//! One member between two nodes.

mod segment;

pub use segment::Bar;
pub(crate) use segment::axial_block;
