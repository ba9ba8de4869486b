//! What a run answers.

use std::ops::ControlFlow;

use nalgebra::Vector3;

use super::Brief;
use crate::equilibrium::{IterationReport, Solution, SolveError};
use crate::load::Case;
use crate::model::{NodeId, ReferenceState, SegmentId};
use crate::shape::{ShapeError, ShapeReport};

/// A brief with what is worked out once for its net: numbering, pattern, symbolic factorisation.
#[derive(Debug)]
pub struct Plan {
    brief: Brief,
}

/// Forces of a support on the net.
#[derive(Clone, Debug, PartialEq)]
pub struct SupportForce {
    /// The supported node.
    pub node: NodeId,
    /// Force on the net, global axes (N).
    pub force: Vector3<f64>,
    /// Its components along the support's own held directions, then along its free ones (N).
    pub own_axes: [f64; 3],
}

/// Pull of one cable or strut end on a supported node.
#[derive(Clone, Debug, PartialEq)]
pub struct EndForce {
    /// The supported node.
    pub node: NodeId,
    /// The segment that ends there.
    pub segment: SegmentId,
    /// Force of the segment on the node (N).
    pub force: Vector3<f64>,
}

/// One state with everything that is told of it.
#[derive(Clone, Debug, PartialEq)]
pub struct StateResult {
    /// Position of every node (m).
    pub positions: Vec<Vector3<f64>>,
    /// Movement of every node from the reference state (m).
    pub displacements: Vec<Vector3<f64>>,
    /// Axial force of every segment (N).
    pub axial_forces: Vec<f64>,
    /// Stretch `l/a` of every segment.
    pub stretches: Vec<f64>,
    /// Whether a cable segment is slack.
    pub slack: Vec<bool>,
    /// Current length of every segment (m).
    pub lengths: Vec<f64>,
    /// Unstressed length at the reference temperature (m), by [`crate::model::Net::n_lengths`].
    pub unstressed_lengths: Vec<f64>,
    /// Support forces: rigid supports in node order, then elastic ones by their nodes; a node with both appears once.
    pub support_forces: Vec<SupportForce>,
    /// Member ends at supported nodes.
    pub end_forces: Vec<EndForce>,
    /// Sum of the loads (N).
    pub load_sum: Vector3<f64>,
    /// Sum of the support forces (N).
    pub support_sum: Vector3<f64>,
    /// Nodes whose place is not determined, because only slack ropes lead to them.
    pub loose_nodes: Vec<NodeId>,
    /// What the independent routine found.
    pub audit: crate::equilibrium::audit::Audit,
}

/// What came of the reference state.
#[derive(Clone, Debug)]
pub struct ReferenceOutcome {
    /// The state that everything is measured from.
    pub state: ReferenceState,
    /// The case it balances.
    pub case: Case,
    /// Everything told of it.
    pub result: StateResult,
    /// How it was found.
    pub report: ShapeReport,
}

/// What came of one case.
#[derive(Clone, Debug)]
pub enum CaseOutcome {
    /// A state, converged or the last good one; see [`Solution::termination`].
    State {
        /// The solution with its history.
        solution: Solution,
        /// Everything told of the state.
        result: Box<StateResult>,
    },
    /// No state can be given.
    None(SolveError),
}

/// Which part of the work reports.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Task {
    /// The reference state.
    Reference,
    /// A case, by index.
    Case(usize),
}

impl Plan {
    /// Prepares the work: numbering, pattern and symbolic factorisation, once for the net.
    #[must_use]
    pub fn new(brief: Brief) -> Self {
        Self { brief }
    }

    /// The work as given.
    #[must_use]
    pub fn brief(&self) -> &Brief {
        &self.brief
    }

    /// Finds the reference state.
    ///
    /// # Errors
    /// [`ShapeError`] if there is none.
    pub fn reference(
        &self,
        _observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
    ) -> Result<ReferenceOutcome, ShapeError> {
        unimplemented!()
    }

    /// Solves one case from the reference state.
    pub fn case(
        &self,
        _reference: &ReferenceOutcome,
        _case: usize,
        _observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
    ) -> CaseOutcome {
        unimplemented!()
    }
}
