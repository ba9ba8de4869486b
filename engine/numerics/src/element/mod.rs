//! One member between two nodes, one piece of a sliding rope, one panel.

mod catenary;
pub mod panel;
mod segment;
mod sliding;

pub use catenary::{Catenary, Hanging};
pub use segment::Bar;
pub(crate) use segment::axial_block;
pub use sliding::Sliding;
