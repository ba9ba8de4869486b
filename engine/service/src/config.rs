//! What the server takes.

/// Largest sizes of briefs and their nets.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Limits {
    /// Largest request (bytes).
    pub request_bytes: usize,
    /// Nodes of a net.
    pub nodes: u32,
    /// Segments of a net.
    pub segments: u32,
    /// Cases of a run.
    pub cases: u32,
}
