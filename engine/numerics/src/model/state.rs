//! States of a net.

use nalgebra::Vector3;

/// The state from which everything is measured: found once, before any case.
#[derive(Clone, Debug, PartialEq)]
pub struct ReferenceState {
    /// Position of every node (m).
    pub positions: Vec<Vector3<f64>>,
    /// Unstressed length of every reach at the reference temperature, then of every strut (m); see [`super::Net::n_lengths`].
    pub unstressed_lengths: Vec<f64>,
    /// Axial force of every segment (N), tension positive.
    pub axial_forces: Vec<f64>,
}
