//! What acts on a net, and the cases that put actions together.

mod action;
mod case;
pub mod combination;
mod pond;
mod surface;

pub use action::{Action, Load, Scope};
pub use case::{Case, SegmentLoads, ice_per_length};
pub use pond::{Place, Pond, Ponds};
pub use surface::Surface;
