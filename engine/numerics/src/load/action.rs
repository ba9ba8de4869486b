//! Actions: named groups of loads that are factored as one.

use nalgebra::Vector3;

use crate::model::{NodeId, SegmentId};

/// Which segments a load acts on.
#[derive(Clone, Debug, PartialEq)]
pub enum Scope {
    /// Every cable and strut.
    All,
    /// These segments.
    Segments(Vec<SegmentId>),
}

/// One load. All of them are dead: fixed in size and direction once the reference state is known.
#[derive(Clone, Debug, PartialEq)]
pub enum Load {
    /// The same force (N) on each of these nodes.
    Nodes {
        /// The nodes.
        nodes: Vec<NodeId>,
        /// Force on each (N).
        force: Vector3<f64>,
    },
    /// Weight of every mass: members by their unstressed length, attached masses. Half of a segment's to each end.
    OwnWeight {
        /// Acceleration (m/s²), pointing down for the usual case.
        gravity: Vector3<f64>,
    },
    /// Force per unstressed length (N/m), half of a segment's share to each end.
    PerUnstressedLength {
        /// Where.
        scope: Scope,
        /// Force per length (N/m).
        force: Vector3<f64>,
    },
    /// Force per length on plan in the reference state (N/m), half of a segment's share to each end.
    PerPlanLength {
        /// Where.
        scope: Scope,
        /// Force per length on plan (N/m).
        force: Vector3<f64>,
    },
    /// Change of temperature from the reference temperature (K).
    Temperature {
        /// Where.
        scope: Scope,
        /// Change (K).
        change: f64,
    },
    /// Movement of a support (m), along its held or sprung directions.
    SupportMovement {
        /// The supported node.
        node: NodeId,
        /// By how much (m).
        by: Vector3<f64>,
    },
    /// Change of prestress through lengths: each reach gets the unstressed length for which its reference tension at
    /// the reference geometry is `(1 + share) T`. Reaches slack in the reference state and struts keep their length.
    PrestressShare {
        /// Where.
        scope: Scope,
        /// Share of the reference tension, greater than −1.
        share: f64,
    },
}

/// A named group of loads, factored as one.
#[derive(Clone, Debug, PartialEq)]
pub struct Action {
    /// The client's id.
    pub name: String,
    /// What it is made of.
    pub loads: Vec<Load>,
}
