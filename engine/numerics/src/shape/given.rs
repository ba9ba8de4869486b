//! How the reference state is wanted.

use crate::model::NodeId;

/// How the prestress of one segment arises.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum PrestressRule {
    /// Force over length (N/m); negative in a strut only.
    ForceDensity(f64),
    /// Axial force in this segment (N); negative in a strut only.
    Tension(f64),
    /// One force density along a family of segments, such that the mean of their tensions is as wanted; index into
    /// [`Prestress::mean_tensions`].
    MeanTension(usize),
    /// Unstressed length (m): takes part in the search as an elastic member.
    UnstressedLength(f64),
    /// Whatever force keeps the nodes of [`Prestress::hold`] in place.
    Balance,
}

/// How the reference state arises.
#[derive(Clone, Debug, PartialEq)]
pub struct Prestress {
    /// One rule a segment.
    pub rules: Vec<PrestressRule>,
    /// Wanted mean tension of each family (N).
    pub mean_tensions: Vec<f64>,
    /// Free nodes that stay where they were given while the shape is found.
    pub hold: Vec<NodeId>,
    /// Actions under which the reference state is in balance, by index; dead loads only.
    pub under: Vec<usize>,
}
