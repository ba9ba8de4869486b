//! What acts on a net, and the cases that put actions together.

mod action;
mod case;
pub mod combination;

pub use action::{Action, Load, Scope};
pub use case::{Case, SegmentLoads};
