//! A net of given lengths alone: solved as an elastic one.

use std::ops::ControlFlow;

use super::gate::{Found, case_under, checked, elastic};
use super::{Prestress, PrestressRule, ShapeError, ShapeReport};
use crate::equilibrium::{Analysis, IterationReport, Settings};
use crate::load::Action;
use crate::model::ReferenceState;

/// Rounds for loads per length on plan, which depend on the shape that is sought.
const MAX_ROUNDS: usize = 50;
/// Change of a load, over the largest, at which these rounds end.
const SETTLED: f64 = 1e-12;

/// Solves from the given coordinates; every node has some.
pub(super) fn find(
    analysis: &Analysis,
    prestress: &Prestress,
    actions: &[Action],
    settings: &Settings,
    observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
) -> Result<Found, ShapeError> {
    let net = analysis.structure().net();
    let mut unstressed_lengths = vec![0.0; net.n_lengths()];
    for (segment, rule) in net.segments().iter().zip(&prestress.rules) {
        if let PrestressRule::UnstressedLength(length) = rule {
            unstressed_lengths[segment.length] = *length;
        }
    }
    let mut state = ReferenceState {
        positions: net
            .nodes()
            .iter()
            .map(|n| n.position.expect("looked at before"))
            .collect(),
        axial_forces: vec![0.0; net.segments().len()],
        unstressed_lengths,
    };
    let mut case = case_under(net, &state, actions, prestress);
    let mut iterations = 0;
    for round in 1.. {
        let solution = elastic(analysis, &case, &state, settings, observe)?;
        iterations += solution.factorisations;
        state.positions = solution.positions;
        state.axial_forces = solution.axial_forces;
        let next = case_under(net, &state, actions, prestress);
        let largest = next.nodal_forces.iter().fold(0.0, |m: f64, p| m.max(p.amax()));
        let forces = next.nodal_forces.iter().zip(&case.nodal_forces);
        let change = forces.fold(0.0, |m: f64, (now, before)| m.max((now - before).amax()));
        case = next;
        if change <= SETTLED * largest || round == MAX_ROUNDS {
            let report = ShapeReport {
                way: solution.way,
                iterations,
                targets: Vec::new(),
                unmet: None,
                balance: None,
                taut_given_lengths: Vec::new(),
                imbalance: 0.0,
                largest_force: 0.0,
                polished: false,
                largest_strain: None,
            };
            return checked(analysis, Found { state, case, report });
        }
    }
    unreachable!("the last round returns")
}
