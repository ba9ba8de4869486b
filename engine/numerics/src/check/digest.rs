//! What checks need of states.

use nalgebra::Vector3;

use crate::model::{Net, NodeId};

/// The little that checks need of a case, so that its full fields need not be kept.
///
/// A design effect, which is no state, leaves `positions` empty: checks that need places do not judge it.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct CaseDigest {
    /// Whether a state within tolerance was found.
    pub answered: bool,
    /// Whether the independent routine agrees.
    pub audited: bool,
    /// Axial force of every segment (N); empty if there is no answer.
    pub axial_forces: Vec<f64>,
    /// Movement of every node from its place in the reference state (m); empty if there is no answer.
    pub displacements: Vec<Vector3<f64>>,
    /// Position of every node (m); empty if there is no answer, or no state.
    pub positions: Vec<Vector3<f64>>,
    /// Support force on the net at every node, global axes (N), `None` where there is no support; empty if there is no
    /// answer.
    pub support_forces: Vec<Option<Vector3<f64>>>,
    /// Nodes whose place, and so whose movement, is not determined.
    pub loose_nodes: Vec<NodeId>,
}

impl CaseDigest {
    /// Whether the case may be judged: an answer that the audit confirms.
    #[must_use]
    pub fn is_sound(&self) -> bool {
        self.answered && self.audited
    }
}

/// A case from whose state movements are measured.
#[derive(Clone, Debug, PartialEq)]
pub struct Base {
    /// The case, by index.
    pub case: usize,
    /// Its state; without a sound answer nothing is measured from it.
    pub digest: CaseDigest,
}

/// What every case is judged against.
#[derive(Clone, Copy, Debug)]
pub struct Against<'a> {
    /// The net.
    pub net: &'a Net,
    /// Axial force of every segment in the reference state (N).
    pub axial_forces: &'a [f64],
    /// Position of every node in the reference state (m).
    pub positions: &'a [Vector3<f64>],
    /// States of the cases that movements are measured from.
    pub bases: &'a [Base],
}

impl Against<'_> {
    /// The reference state as a digest.
    #[must_use]
    pub fn reference(&self) -> CaseDigest {
        CaseDigest {
            answered: true,
            audited: true,
            axial_forces: self.axial_forces.to_vec(),
            displacements: vec![Vector3::zeros(); self.positions.len()],
            positions: self.positions.to_vec(),
            support_forces: vec![None; self.positions.len()],
            loose_nodes: Vec::new(),
        }
    }
}
