//! Nodal balance, found again by a routine that shares no code with assembly.

/// What it found.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct Audit {
    /// Largest out-of-balance force at a node in its free directions (N).
    pub largest_imbalance: f64,
    /// Where.
    pub node: Option<crate::model::NodeId>,
    /// What is allowed (N).
    pub allowed: f64,
    /// Whether the state passes.
    pub passed: bool,
}
