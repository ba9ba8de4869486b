//! What checks need of states.

use nalgebra::Vector3;

use super::Covered;
use crate::model::{AxialLaw, Member, Net, NodeId, SegmentId};

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
    /// Segments that are taken out in this case: their members are not judged in it, and have no part in envelopes.
    pub removed: Vec<SegmentId>,
}

impl CaseDigest {
    /// Whether the case may be judged: an answer that the audit confirms.
    #[must_use]
    pub fn is_sound(&self) -> bool {
        self.answered && self.audited
    }

    /// A design effect: `Σ w E` over sound cases, quantity by quantity, for the rules that a standard states on effects.
    /// It is no state: nothing is in balance in it.
    ///
    /// A rope can not push, so that its sum counts from zero. What is taken out in one of the cases is taken out of the
    /// effect; a place that one of them leaves open stays open. `None` unless every case is sound.
    ///
    /// `terms`: weight (–) and case, at least one.
    #[must_use]
    pub fn design_effect(net: &Net, terms: &[(f64, &Self)]) -> Option<Self> {
        let (_, first) = terms.first()?;
        if !terms.iter().all(|(_, digest)| digest.is_sound()) {
            return None;
        }
        let sum =
            |value: &dyn Fn(&Self) -> f64| terms.iter().map(|(weight, digest)| weight * value(digest)).sum::<f64>();
        let vector = |value: &dyn Fn(&Self) -> Vector3<f64>| {
            (terms.iter()).fold(Vector3::zeros(), |sum, (weight, digest)| sum + *weight * value(digest))
        };
        let mut effect = Self {
            answered: true,
            audited: true,
            axial_forces: (0..first.axial_forces.len())
                .map(|e| sum(&|digest| digest.axial_forces[e]))
                .collect(),
            positions: Vec::new(),
            displacements: (0..first.displacements.len())
                .map(|node| vector(&|digest| digest.displacements[node]))
                .collect(),
            support_forces: (0..first.support_forces.len())
                .map(|node| {
                    first.support_forces[node]?;
                    Some(vector(&|digest| {
                        digest.support_forces[node].unwrap_or_else(Vector3::zeros)
                    }))
                })
                .collect(),
            loose_nodes: terms
                .iter()
                .flat_map(|(_, digest)| digest.loose_nodes.iter().copied())
                .collect(),
            removed: terms
                .iter()
                .flat_map(|(_, digest)| digest.removed.iter().copied())
                .collect(),
        };
        effect.removed.sort_unstable();
        effect.removed.dedup();
        effect.loose_nodes.sort_unstable();
        effect.loose_nodes.dedup();
        for (force, segment) in effect.axial_forces.iter_mut().zip(net.segments()) {
            if segment.law == AxialLaw::TensionOnly {
                *force = force.max(0.0);
            }
        }
        for segment in &effect.removed {
            effect.axial_forces[segment.index()] = 0.0;
        }
        Some(effect)
    }

    /// Whether a member is taken out in this case.
    pub(super) fn lacks(&self, net: &Net, part: Covered) -> bool {
        let is_of = |segment: &SegmentId| match (net.segments()[segment.index()].member, part) {
            (Member::Cable(of), Covered::Cable(cable)) => of == cable,
            (Member::Strut(of), Covered::Strut(strut)) => of == strut,
            _ => false,
        };
        self.removed.iter().any(is_of)
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
            removed: Vec::new(),
        }
    }
}
