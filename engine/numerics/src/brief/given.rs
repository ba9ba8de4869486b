//! The work as it is given: everything resolved, nothing inherited any more.

use crate::equilibrium::Settings;
use crate::load::Action;
use crate::model::{CableId, Net, NodeId, StrutId};

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

/// A case as given: factors on actions.
#[derive(Clone, Debug, PartialEq)]
pub struct CaseGiven {
    /// The client's id.
    pub name: String,
    /// Sets it belongs to.
    pub sets: Vec<String>,
    /// Action and its factor.
    pub factors: Vec<(usize, f64)>,
}

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
        /// Wanted share.
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
    /// Cases it covers, by index.
    pub cases: Vec<usize>,
}

/// The whole work.
#[derive(Clone, Debug)]
pub struct Brief {
    /// The net.
    pub net: Net,
    /// How its reference state arises.
    pub prestress: Prestress,
    /// Actions.
    pub actions: Vec<Action>,
    /// Cases, in result order.
    pub cases: Vec<CaseGiven>,
    /// Checks, in result order.
    pub checks: Vec<Check>,
    /// How states are solved for.
    pub settings: Settings,
}
