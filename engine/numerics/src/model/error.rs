//! What makes a given net invalid.

use thiserror::Error;

use super::NodeId;

/// One thing that keeps the given parts from being a net.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum NetError {
    /// A number that must be finite is not.
    #[error("{what} of {of} is {value}: give a finite number")]
    NotFinite {
        /// The quantity.
        what: &'static str,
        /// Name of the part.
        of: String,
        /// What was given.
        value: f64,
    },
    /// A number that must be positive (or not negative) is not.
    #[error("{what} of {of} is {value}: give a larger number")]
    NotPositive {
        /// The quantity.
        what: &'static str,
        /// Name of the part.
        of: String,
        /// What was given.
        value: f64,
    },
    /// A path names a node that does not exist.
    #[error("{of} runs through {node}, which the net does not have")]
    UnknownNode {
        /// Name of the member.
        of: String,
        /// The index that dangles.
        node: NodeId,
    },
    /// A path has fewer than two nodes, or the same node twice in a row.
    #[error("{of} has no length between its nodes {position} and the next")]
    DegeneratePath {
        /// Name of the member.
        of: String,
        /// Position in the path.
        position: usize,
    },
    /// A rope can slide at an inner node only, once, and not where it hangs as a catenary.
    #[error("{of} can not slide at place {position} of its path: name an inner node of a straight rope, once")]
    CanNotSlide {
        /// Name of the cable.
        of: String,
        /// Position in the path.
        position: usize,
    },
    /// A panel has fewer than three corners, or one of them twice; or a zone has no outline.
    #[error("{of} has fewer than three different corners")]
    DegeneratePanel {
        /// Name of the panel or zone.
        of: String,
    },
    /// A skin or zone names a part that does not exist.
    #[error("{of} names a {what} that the net does not have")]
    UnknownPart {
        /// Name of the skin or zone.
        of: String,
        /// Kind of the part.
        what: &'static str,
    },
    /// A panel belongs to several skins.
    #[error("the panel {of} belongs to several skins")]
    SeveralSkins {
        /// Name of the panel.
        of: String,
    },
    /// A held node has no position.
    #[error("the held node {of} has no position")]
    SupportWithoutPosition {
        /// Name of the node.
        of: String,
    },
    /// The stiffness of a support is not usable.
    #[error("the stiffness of the support of {of} is not {property}")]
    SupportStiffness {
        /// Names of the nodes.
        of: String,
        /// The property it lacks.
        property: &'static str,
    },
    /// The net has no member.
    #[error("the net has no cable and no strut")]
    Empty,
}
