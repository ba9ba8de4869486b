//! Dynamic relaxation with kinetic damping: slow, and hard to lead astray.
//!
//! ```text
//! v ← v + r / m,   x ← x + v        fictitious masses m from the stiffness at the node, time step 1
//! at each peak of the kinetic energy: back to the peak, v = 0
//! ```
//! Day 1965; kinetic damping as in Barnes 1999 (both from memory).

use std::ops::ControlFlow;

use nalgebra::Vector3;

use super::run::Run;
use super::{Termination, Way};
use crate::assembly::Loading;

const LIMIT: u32 = 20_000;
/// Masses above the least stable ones, `½ Σ k`, by this factor.
const MASS_RESERVE: f64 = 2.0;
/// Share of the largest force at which Newton takes over.
const NEAR: f64 = 1e-5;

/// Moves `positions` towards balance; converged means near enough for Newton.
pub(super) fn solve(run: &mut Run<'_>, loading: &Loading, positions: &mut [Vector3<f64>]) -> Termination {
    let structure = run.structure;
    let mut velocity = vec![0.0; structure.n_dofs()];
    let mut energy_before = 0.0;
    run.respond(loading, positions);
    let mut masses = masses(run, loading);
    for step in 0..LIMIT {
        let report = run.report_of(Way::Relaxation, loading, 1.0);
        if step == 0 {
            run.history.push(report);
        }
        if let ControlFlow::Break(end) = run.tell(&report) {
            return end;
        }
        if !report.residual.is_finite() {
            return Termination::StepTooSmall;
        }
        if run.runs_away(positions) {
            return Termination::RunsAway;
        }
        if report.residual <= NEAR * run.load.max(run.response.largest_axial_force()) {
            run.history.push(report);
            return Termination::Converged;
        }
        let mut energy = 0.0;
        for ((v, r), m) in velocity.iter_mut().zip(&run.response.residual).zip(&masses) {
            *v += r / m;
            energy += m * *v * *v;
        }
        if energy >= energy_before {
            structure.dofs().move_nodes(&velocity, 1.0, positions);
            energy_before = energy;
        } else {
            // The energy peaked in the step before; its middle lies half a step back along the velocity of then.
            for ((v, r), m) in velocity.iter_mut().zip(&run.response.residual).zip(&masses) {
                *v -= r / m;
            }
            structure.dofs().move_nodes(&velocity, -0.5, positions);
            velocity.fill(0.0);
            energy_before = 0.0;
            run.history.push(report);
            run.respond(loading, positions);
            masses = self::masses(run, loading);
            continue;
        }
        run.respond(loading, positions);
    }
    Termination::IterationLimit
}

/// Fictitious mass of each free direction: `½ Σ (k + |T| / l)` of all that meets there, with a reserve (N/m, step 1).
fn masses(run: &Run<'_>, loading: &Loading) -> Vec<f64> {
    let structure = run.structure;
    let mut nodal = vec![0.0; structure.net().nodes().len()];
    for (index, (bar, segment)) in loading.bars.iter().zip(structure.net().segments()).enumerate() {
        let length = run.response.lengths[index].max(bar.stress_free_length);
        for end in segment.ends {
            nodal[end.index()] += bar.stiffness + run.response.axial_forces[index].abs() / length;
        }
    }
    for elastic in structure.net().elastic_supports() {
        for (position, end) in elastic.nodes().iter().enumerate() {
            nodal[end.index()] += elastic.stiffness().rows(3 * position, 3).abs().row_sum().amax();
        }
    }
    (0..structure.n_dofs())
        .map(|dof| (MASS_RESERVE * 0.5 * nodal[structure.dofs().node(dof).index()]).max(f64::MIN_POSITIVE))
        .collect()
}
