//! All members together: numbering, pattern, out-of-balance forces, tangent.

mod dofs;
mod loading;
mod pattern;
mod residual;
mod special;
mod structure;
mod tangent;

pub use dofs::Dofs;
pub(crate) use loading::check_vectors;
pub use loading::{Grip, Gripping, Loading, LoadingError};
pub use pattern::Pattern;
pub use residual::Response;
pub use special::{HangingSegment, Special, SpecialResponse};
pub use structure::Structure;
