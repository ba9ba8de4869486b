//! What a solve returns.

use nalgebra::Vector3;
use thiserror::Error;

use super::stability::FreeMovement;
use crate::assembly::LoadingError;
use crate::model::{NodeId, SegmentId};

/// The method that is at work.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Way {
    /// Linear or Gauss–Newton search on force densities.
    ForceDensities,
    /// Newton–Raphson with line search.
    Newton,
    /// Interior point, for starts with much slack.
    InteriorPoint,
    /// Newton with carried tensions after the interior point.
    Polish,
    /// Dynamic relaxation.
    Relaxation,
}

/// One iteration, as reported while solving.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct IterationReport {
    /// The method.
    pub way: Way,
    /// Load step, from 1.
    pub load_step: u32,
    /// Share of the load in this step.
    pub load_factor: f64,
    /// Iteration within the step, from 0 (before the first correction).
    pub iteration: u32,
    /// Largest out-of-balance force on a free direction (N).
    pub residual: f64,
    /// Where it is.
    pub worst_node: Option<NodeId>,
    /// Strain energy (J).
    pub strain_energy: f64,
    /// Slack cable segments.
    pub slack: usize,
    /// Length of the step taken along the Newton direction (0 before the first).
    pub step_length: f64,
}

/// How a solve ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Termination {
    /// Within tolerance.
    Converged,
    /// The allowance of factorisations is used up.
    IterationLimit,
    /// No more headway: steps became too small to matter, or a method took as many as it ever needs.
    StepTooSmall,
    /// The iterate left the neighbourhood of the net.
    RunsAway,
    /// The observer asked to stop.
    Cancelled,
}

/// The state after one load step.
#[derive(Clone, Debug, PartialEq)]
pub struct LoadStepState {
    /// Share of the load.
    pub load_factor: f64,
    /// Position of every node (m).
    pub positions: Vec<Vector3<f64>>,
    /// Axial force of every segment (N).
    pub axial_forces: Vec<f64>,
}

/// How the segments are in a state, beyond their axial forces.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct MemberStates {
    /// Force of every segment on its first and its second node (N).
    pub pulls: Vec<[Vector3<f64>; 2]>,
    /// Length of every segment (m); along the curve where it hangs.
    pub lengths: Vec<f64>,
    /// Unstressed length, at the reference temperature, that lies in every segment (m): that of its reach, or its share of
    /// it where the rope slides.
    pub lying: Vec<f64>,
}

/// The last state and how it came about.
#[derive(Clone, Debug, PartialEq)]
pub struct Solution {
    /// Position of every node (m).
    pub positions: Vec<Vector3<f64>>,
    /// Axial force of every segment (N); the larger end where it hangs.
    pub axial_forces: Vec<f64>,
    /// Ends and lengths of every segment.
    pub members: MemberStates,
    /// How it ended.
    pub termination: Termination,
    /// The method that brought the last state near: relaxation or the interior point where one of them was needed, which
    /// Newton then finished; Newton itself otherwise.
    pub way: Way,
    /// Share of the load that the state carries; where not even a part of it was reached, the share that was tried.
    pub load_factor: f64,
    /// Nodes whose place is not determined.
    pub loose_nodes: Vec<NodeId>,
    /// A movement that nothing resists, where the solve ended early at a balanced state: what to blame.
    pub free_movement: Option<FreeMovement>,
    /// The state after every load step, where equal steps were asked for.
    pub steps: Vec<LoadStepState>,
    /// Every iteration; of a relaxation, every peak of the kinetic energy.
    pub history: Vec<IterationReport>,
    /// Factorisations.
    pub factorisations: u32,
}

/// Why no state can be given.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum SolveError {
    /// The case does not fit the net, or its numbers are beyond use.
    #[error(transparent)]
    Loading(#[from] LoadingError),
    /// A part that nothing holds carries a load along a direction in which it is free.
    #[error("nothing holds {n} nodes along the load on them", n = nodes.len())]
    NotHeld {
        /// The part.
        nodes: Vec<NodeId>,
        /// Free direction (unit).
        direction: Vector3<f64>,
        /// Net load along it (N).
        force: f64,
    },
    /// The tangent is singular or indefinite at a state that balances.
    #[error("a free movement of {n} nodes", n = nodes.len())]
    FreeMovement {
        /// Nodes that move, most first.
        nodes: Vec<NodeId>,
        /// How the first moves (unit).
        direction: Vector3<f64>,
        /// Stiffness against the movement (N/m).
        stiffness: f64,
        /// Segments at the first node.
        segments: Vec<SegmentId>,
    },
}

impl From<FreeMovement> for SolveError {
    fn from(movement: FreeMovement) -> Self {
        Self::FreeMovement {
            nodes: movement.nodes,
            direction: movement.direction,
            stiffness: movement.stiffness,
            segments: movement.segments,
        }
    }
}
