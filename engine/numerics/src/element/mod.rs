//! One member between two nodes.

mod catenary;
mod segment;

pub use catenary::{Catenary, Hanging};
pub use segment::Bar;
pub(crate) use segment::axial_block;
