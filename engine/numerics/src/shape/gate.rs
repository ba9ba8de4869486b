//! The last gate of a shape: it has to stand as an elastic net.

use std::ops::ControlFlow;

use nalgebra::Vector3;

use super::find::{RawShape, names};
use super::{Prestress, ShapeError, ShapeReport};
use crate::assembly::{Loading, LoadingError};
use crate::equilibrium::{
    self, Analysis, IterationReport, LoadSteps, Settings, Solution, SolveError, Termination, Way, audit, member_states,
    stability,
};
use crate::load::{Action, Case};
use crate::model::{Net, NodeId, ReferenceState, SegmentId};

/// Imbalance over the largest axial force at which a shape stands as it is.
const STANDS: f64 = 1e-9;

/// A reference state, the case it balances, and how it was found.
#[derive(Clone, Debug, PartialEq)]
pub struct Found {
    /// The state.
    pub state: ReferenceState,
    /// Its loads.
    pub case: Case,
    /// How it was found.
    pub report: ShapeReport,
}

/// The case under which a state is to be in balance.
pub(super) fn case_under(net: &Net, state: &ReferenceState, actions: &[Action], prestress: &Prestress) -> Case {
    let factors: Vec<(usize, f64)> = prestress.under.iter().map(|action| (*action, 1.0)).collect();
    let mut case = Case::new(net, state, actions, &factors);
    // Ropes come to rest in the reference state without friction.
    case.lying.clear();
    case
}

/// Gives the shape its unstressed lengths and looks whether it stands; corrects it if rounding or a member near slack
/// keeps it from standing.
pub(super) fn finish(
    analysis: &Analysis,
    prestress: &Prestress,
    actions: &[Action],
    settings: &Settings,
    raw: RawShape,
    observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
) -> Result<Found, ShapeError> {
    let net = analysis.structure().net();
    let mut unstressed_lengths = vec![0.0; net.n_lengths()];
    for (segment, length) in net.segments().iter().zip(&raw.unstressed) {
        unstressed_lengths[segment.length] += length;
    }
    let state = ReferenceState {
        positions: raw.positions,
        unstressed_lengths,
        axial_forces: raw.axial_forces,
    };
    let report = ShapeReport {
        way: Way::ForceDensities,
        iterations: raw.iterations,
        targets: raw.targets,
        unmet: raw.unmet,
        balance: raw.balance,
        taut_given_lengths: raw.taut_given_lengths,
        imbalance: 0.0,
        largest_force: 0.0,
        polished: false,
        largest_strain: None,
    };
    let found = Found {
        case: case_under(net, &state, actions, prestress),
        state,
        report,
    };
    let audit = audited(analysis, &found);
    let stands = audit.largest_imbalance <= STANDS * largest(&found.state.axial_forces);
    if stands && audit.passed {
        return checked(analysis, found);
    }
    polished(analysis, prestress, actions, settings, found, observe)
}

/// What the independent routine says of a state.
fn audited(analysis: &Analysis, found: &Found) -> audit::Audit {
    let state = &found.state;
    let members = member_states(analysis.structure(), &found.case, state);
    audit::audit_members(
        analysis.structure().net(),
        &found.case,
        &state.positions,
        &state.axial_forces,
        &members,
    )
}

/// Corrects the state as an elastic net.
fn polished(
    analysis: &Analysis,
    prestress: &Prestress,
    actions: &[Action],
    settings: &Settings,
    mut found: Found,
    observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
) -> Result<Found, ShapeError> {
    let solution = elastic(analysis, &found.case, &found.state, settings, observe)?;
    found.state.positions = solution.positions;
    found.state.axial_forces = solution.axial_forces;
    found.case = case_under(analysis.structure().net(), &found.state, actions, prestress);
    found.report.iterations += solution.factorisations;
    found.report.polished = true;
    checked(analysis, found)
}

/// The elastic net of given lengths in balance.
pub(super) fn elastic(
    analysis: &Analysis,
    case: &Case,
    state: &ReferenceState,
    settings: &Settings,
    observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
) -> Result<Solution, ShapeError> {
    let net = analysis.structure().net();
    let lengths = &state.unstressed_lengths;
    let settings = Settings {
        load_steps: LoadSteps::FullFirst,
        tolerance: settings.tolerance.min(STANDS),
        ..*settings
    };
    let solved = equilibrium::solve(analysis, case, &state.positions, lengths, &settings, observe);
    let solution = solved.map_err(|error| in_ids(net, error))?;
    match solution.termination {
        Termination::Converged if solution.loose_nodes.is_empty() => Ok(solution),
        Termination::Converged => Err(ShapeError::Loose {
            nodes: names(net, &solution.loose_nodes),
        }),
        Termination::Cancelled => Err(ShapeError::Cancelled),
        termination => {
            let last = solution.history.last();
            let node = last.and_then(|report| report.worst_node).unwrap_or(NodeId::new(0));
            Err(ShapeError::NotConverged {
                iterations: solution.factorisations,
                residual: last.map_or(0.0, |report| report.residual),
                node: net.node_name(node).to_owned(),
                termination,
            })
        }
    }
}

/// Fills in what the audit says, and refuses a state that does not stand or can move freely.
pub(super) fn checked(analysis: &Analysis, mut found: Found) -> Result<Found, ShapeError> {
    let net = analysis.structure().net();
    let state = &found.state;
    let audit = audited(analysis, &found);
    if !audit.passed {
        return Err(ShapeError::GateFailed {
            imbalance: audit.largest_imbalance.max(audit.largest_force_error),
            allowed: audit.allowed,
            node: net.node_name(audit.node.unwrap_or(NodeId::new(0))).to_owned(),
        });
    }
    if !net.is_pure_tension() {
        let loading = Loading::new(analysis.structure(), &found.case, &state.unstressed_lengths, 1.0);
        let loading = loading.map_err(|error| in_ids(net, error.into()))?;
        if let Some(m) = stability::free_movement(analysis, &loading, &state.positions, &[]) {
            return Err(free_movement(net, &m.nodes, m.direction, m.stiffness, &m.segments));
        }
    }
    found.report.imbalance = audit.largest_imbalance;
    found.report.largest_force = largest(&state.axial_forces);
    found.report.largest_strain = largest_strain(net, state);
    Ok(found)
}

/// What the solver says, with the client's ids.
fn in_ids(net: &Net, error: SolveError) -> ShapeError {
    match error {
        SolveError::FreeMovement {
            nodes,
            direction,
            stiffness,
            segments,
        } => free_movement(net, &nodes, direction, stiffness, &segments),
        SolveError::Loading(LoadingError::Segment { segment, what, value }) => ShapeError::BeyondReckoning {
            part: net.member_name(segment).to_owned(),
            what,
            value,
        },
        SolveError::Loading(LoadingError::Node { node, what, value }) => ShapeError::BeyondReckoning {
            part: net.node_name(node).to_owned(),
            what,
            value,
        },
        source => {
            let nodes = match &source {
                SolveError::NotHeld { nodes, .. } => names(net, nodes),
                _ => Vec::new(),
            };
            ShapeError::Elastic { source, nodes }
        }
    }
}

fn free_movement(
    net: &Net,
    nodes: &[NodeId],
    along: Vector3<f64>,
    stiffness: f64,
    segments: &[SegmentId],
) -> ShapeError {
    ShapeError::FreeMovement {
        node: names(net, nodes).swap_remove(0),
        along,
        stiffness,
        members: segments.iter().map(|s| net.member_name(*s).to_owned()).collect(),
    }
}

fn largest(forces: &[f64]) -> f64 {
    forces.iter().fold(0.0, |m: f64, n| m.max(n.abs()))
}

fn largest_strain(net: &Net, state: &ReferenceState) -> Option<(SegmentId, f64)> {
    let strains = net.segments().iter().zip(&state.axial_forces).enumerate();
    strains
        .map(|(index, (segment, force))| (SegmentId::new(index), force / segment.section.axial_stiffness))
        .max_by(|a, b| a.1.abs().total_cmp(&b.1.abs()))
}
