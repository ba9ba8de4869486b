//! What acts on a net, and the cases that put actions together.

mod action;
mod case;
pub mod combination;
mod surface;

pub use action::{Action, Load, Scope};
pub use case::{Case, SegmentLoads, ice_per_length};
pub use surface::Surface;
