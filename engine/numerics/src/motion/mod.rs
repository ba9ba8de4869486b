//! Natural frequencies about a balanced state; motion in time in [`transient`].
//!
//! ```text
//! K x = ω² M x      K tangent at the state (symmetric part), M lumped masses, f = ω / 2π
//! ```
//!
//! | file | subject |
//! |---|---|
//! | `mass` | `M`: half of each segment at each of its ends, what is attached, skins, air that moves along |
//! | `pencil` | `K` and `M` without what has no stiffness; shifts; counts of roots by signs of pivots |
//! | `krylov` | the lowest roots by shift and invert |
//! | `modes` | all of it about one state, and what is told of it |
//! | `division` | hanging ropes as straight pieces, for motion in time |

mod division;
mod krylov;
mod mass;
mod modes;
mod pencil;
pub mod transient;

#[cfg(test)]
mod tests;

pub use division::Division;
pub use mass::{MassGiven, nodal_masses};
pub use modes::{About, Mode, ModeKind, Modes, ModesError, Observer, RootCount, natural_modes};
