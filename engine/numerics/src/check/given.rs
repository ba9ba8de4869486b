//! Checks as they are given.

use super::Covered;
use crate::model::{CableId, NodeId, StrutId};

/// What is checked.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum CheckKind {
    /// Largest tension times `factor` against the breaking force.
    Safety {
        /// Wanted factor, at least 1.
        factor: f64,
    },
    /// Least tension against a share of the tension in the reference state.
    Slackness {
        /// Wanted share, from 0 to less than 1.
        min_share_of_reference: f64,
    },
    /// Distance of a node from its place in the reference state (m).
    Movement {
        /// Limit (m).
        limit: f64,
    },
    /// Size of the force on a support (N).
    AnchorPull {
        /// Limit (N).
        limit: f64,
    },
}

/// A check over members and cases.
#[derive(Clone, Debug, PartialEq)]
pub struct Check {
    /// What is checked.
    pub kind: CheckKind,
    /// Cables it covers (strength, slackness).
    pub cables: Vec<CableId>,
    /// Struts it covers (none of the present kinds can judge one; they count as not judged).
    pub struts: Vec<StrutId>,
    /// Nodes it covers (movement, anchor pull).
    pub nodes: Vec<NodeId>,
    /// Cases it covers, by index; design effects are counted on from the last case, see `brief::Brief`.
    pub cases: Vec<usize>,
}

impl Check {
    /// The parts it covers: cables, then struts, then nodes.
    pub fn covered(&self) -> impl Iterator<Item = Covered> + '_ {
        (self.cables.iter().map(|cable| Covered::Cable(*cable)))
            .chain(self.struts.iter().map(|strut| Covered::Strut(*strut)))
            .chain(self.nodes.iter().map(|node| Covered::Node(*node)))
    }
}
