//! How the reference state was found.

use super::Target;
use crate::equilibrium::Way;
use crate::model::SegmentId;

/// What came of the members left to balance.
#[derive(Clone, Debug, PartialEq)]
pub struct BalanceReport {
    /// Their segments.
    pub segments: Vec<SegmentId>,
    /// How many of their forces the held nodes determine.
    pub rank: usize,
    /// Whether they determine all; otherwise the forces of least square sum were taken.
    pub unique: bool,
    /// Largest force left at a held node (N).
    pub residual: f64,
}

/// How the reference state was found.
#[derive(Clone, Debug, PartialEq)]
pub struct ShapeReport {
    /// The method that gave the state.
    pub way: Way,
    /// Factorisations.
    pub iterations: u32,
    /// Wanted tensions, each with what was found.
    pub targets: Vec<Target>,
    /// Members left to balance, if any.
    pub balance: Option<BalanceReport>,
    /// Ropes of given length that are taut in the state.
    pub taut_given_lengths: Vec<SegmentId>,
    /// Largest out-of-balance force of the elastic net at the state, as the independent routine finds it (N).
    pub imbalance: f64,
    /// Largest axial force (N), the measure for `imbalance`.
    pub largest_force: f64,
    /// Whether the state had to be corrected as an elastic net to balance.
    pub polished: bool,
    /// Largest strain and its segment: a unit slip in `EA` shows here.
    pub largest_strain: Option<(SegmentId, f64)>,
}
