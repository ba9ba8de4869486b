//! One case: everything that acts at once, as plain numbers over the net.

use nalgebra::Vector3;

/// What a case changes about the segments.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct SegmentLoads {
    /// Change of temperature (K).
    pub temperature_change: f64,
}

/// A case ready to be solved. Neither the net nor its analysis is rebuilt for it.
#[derive(Clone, Debug, PartialEq)]
pub struct Case {
    /// Dead force on every node (N), held ones too.
    pub nodal_forces: Vec<Vector3<f64>>,
    /// Unstressed lengths (m) in the order of [`crate::model::Net::n_lengths`].
    pub unstressed_lengths: Vec<f64>,
    /// One entry a segment.
    pub segments: Vec<SegmentLoads>,
    /// Movement of every supported node (m); zero elsewhere.
    pub support_movements: Vec<Vector3<f64>>,
    /// Segments taken out, by index.
    pub removed: Vec<bool>,
}
