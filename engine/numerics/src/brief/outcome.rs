//! What a run answers.

use nalgebra::Vector3;

use super::{Cause, Ponding, PondingEnd, StateDiagnosis};
use crate::check::{Against, Base, CaseDigest};
use crate::equilibrium::audit::Audit;
use crate::equilibrium::certificate::Certificate;
use crate::equilibrium::{IterationReport, Solution, SolveError, Termination};
use crate::load::Case;
use crate::model::{Net, NodeId, ReferenceState, SegmentId};
use crate::motion::{Modes, ModesError};
use crate::shape::ShapeReport;

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
    /// Force of every segment on its first and its second node (N).
    pub pulls: Vec<[Vector3<f64>; 2]>,
    /// Stretch `l/a` of every segment; zero where it is taken out.
    pub stretches: Vec<f64>,
    /// Whether a cable segment is slack: `l ≤ a`; one that is taken out is not.
    pub slack: Vec<bool>,
    /// Current length of every segment (m), along the curve where it hangs.
    pub lengths: Vec<f64>,
    /// Unstressed length that lies in every segment (m): its share where the rope slides.
    pub lying: Vec<f64>,
    /// Load on every node (N), pressure where the panels are now; without what acts along hanging ropes.
    pub loads: Vec<Vector3<f64>>,
    /// Unstressed length at the reference temperature (m), by [`crate::model::Net::n_lengths`].
    pub unstressed_lengths: Vec<f64>,
    /// Support forces: rigid supports in node order, then elastic ones by their nodes; a node with both appears once.
    pub support_forces: Vec<SupportForce>,
    /// Member ends at supported nodes.
    pub end_forces: Vec<EndForce>,
    /// Sum of the loads (N).
    pub load_sum: Vector3<f64>,
    /// Moment of the loads about the origin (N m), at these positions.
    pub load_moment: Vector3<f64>,
    /// Sum of the support forces (N).
    pub support_sum: Vector3<f64>,
    /// Moment of the support forces about the origin (N m), at these positions.
    pub support_moment: Vector3<f64>,
    /// Area of every panel (m²).
    pub panel_areas: Vec<f64>,
    /// Pressure on the outer side of every panel (Pa).
    pub panel_pressures: Vec<f64>,
    /// Nodes whose place is not determined, because only slack ropes lead to them.
    pub loose_nodes: Vec<NodeId>,
    /// Segments that are taken out.
    pub removed: Vec<SegmentId>,
    /// Water on skins, where the case asks for it; its weight is among the loads.
    pub ponding: Option<Ponding>,
    /// What the independent routine found.
    pub audit: Audit,
    /// How far the state can be from the true one; `None` where it is no answer, or nothing can be said.
    pub certificate: Option<Certificate>,
    /// What it allows beside bearing its load, where that was asked for.
    pub diagnosis: Option<Box<StateDiagnosis>>,
    /// Natural modes about it, where they were asked for, or why there are none.
    pub modes: Option<Box<Result<Modes, ModesError>>>,
}

impl StateResult {
    /// The little that checks and envelopes need.
    #[must_use]
    pub fn digest(&self, answered: bool) -> CaseDigest {
        let mut support_forces = vec![None; self.positions.len()];
        for support in &self.support_forces {
            support_forces[support.node.index()] = Some(support.force);
        }
        CaseDigest {
            answered,
            audited: answered && self.audit.passed,
            axial_forces: self.axial_forces.clone(),
            displacements: self.displacements.clone(),
            positions: self.positions.clone(),
            support_forces,
            loose_nodes: self.loose_nodes.clone(),
            removed: self.removed.clone(),
        }
    }
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
    /// Every iteration; of a relaxation its beginning and its end.
    pub history: Vec<IterationReport>,
    /// States of the cases that checks measure movements from.
    pub bases: Vec<Base>,
}

impl ReferenceOutcome {
    /// What every case is judged against.
    #[must_use]
    pub fn against<'a>(&'a self, net: &'a Net) -> Against<'a> {
        Against {
            net,
            axial_forces: &self.state.axial_forces,
            positions: &self.state.positions,
            bases: &self.bases,
        }
    }
}

/// What came of one case.
#[derive(Clone, Debug)]
#[allow(
    clippy::large_enum_variant,
    reason = "there is one a case, and nearly all are states"
)]
pub enum CaseOutcome {
    /// A state, converged or the last good one; see [`Solution::termination`].
    State {
        /// The solution with its history.
        solution: Solution,
        /// Everything told of the state.
        result: Box<StateResult>,
        /// Why it did not converge; `None` if it did, or was cancelled.
        cause: Option<Cause>,
    },
    /// No state can be given.
    None {
        /// What the solver says.
        error: SolveError,
        /// The same in the client's ids.
        cause: Cause,
    },
}

impl CaseOutcome {
    /// Whether there is a state within tolerance, with water that has settled.
    #[must_use]
    pub fn is_answered(&self) -> bool {
        match self {
            Self::State { solution, result, .. } => {
                let settled = |ponding: &Ponding| ponding.end == PondingEnd::Settled;
                solution.termination == Termination::Converged && result.ponding.as_ref().is_none_or(settled)
            }
            Self::None { .. } => false,
        }
    }

    /// The little that checks and envelopes need.
    #[must_use]
    pub fn digest(&self) -> CaseDigest {
        match self {
            Self::State { result, .. } if self.is_answered() => result.digest(true),
            _ => CaseDigest::default(),
        }
    }
}

/// Which part of the work is meant.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Task {
    /// The reference state.
    Reference,
    /// A case, by index.
    Case(usize),
    /// A motion, by index.
    Motion(usize),
}
