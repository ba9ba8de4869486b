//! Newton's method on the potential energy, with a line search.
//!
//! ```text
//! K_e = k n nᵀ [taut] + g / max(l, a) (I − [taut] n nᵀ) + 1e−12 k I,     g = max(T, N_floor),   N_floor = c max|r|
//! ```
//! The floor on the force in the geometric part stiffens what nothing stiffens yet (flat, slack) and fades with the
//! residual, so that the quadratic end is kept.

use std::ops::ControlFlow;

use nalgebra::{Matrix3, Vector3};

use super::run::Run;
use super::{Termination, Way, line_search};
use crate::assembly::Loading;
use crate::element::axial_block;
use crate::model::AxialLaw;

/// Smallest isotropic stiffness of a segment over its axial stiffness; raised where rounding still breaks a pivot.
const SMALLEST_STIFFNESS: [f64; 3] = [1e-12, 1e-9, 1e-6];

/// Share of the largest axial force that stands for the load where there is little of it.
const LITTLE_LOAD: f64 = 1e-3;

/// How Newton is used in one place of the recipe.
#[derive(Clone, Copy, Debug)]
pub(super) struct Newton {
    /// `c`: share of the largest residual below which no force falls in the geometric part.
    pub(super) floor_share: f64,
    /// Factorisations allowed.
    pub(super) limit: u32,
    /// Factorisations after which the residual must be down to the load to go on: from a good start it soon is.
    pub(super) patience: u32,
}

/// What compressed struts bring to the tangent.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Compression {
    /// Their true, negative geometric stiffness.
    Kept,
    /// Nothing: the tangent is positive definite and the step leads downhill.
    Dropped,
}

impl Newton {
    /// Improves `positions` until they balance, or says why not. The last good iterate stays in `positions`, its
    /// response in `run.response`.
    pub(super) fn solve(self, run: &mut Run<'_>, loading: &Loading, positions: &mut Vec<Vector3<f64>>) -> Termination {
        let first = run.factorisations;
        let mut step_length = 0.0;
        run.respond(loading, positions);
        loop {
            if let ControlFlow::Break(end) = run.report(Way::Newton, loading, step_length) {
                return end;
            }
            let (residual, _) = run.response.largest_residual(run.structure);
            if !residual.is_finite() {
                return Termination::StepTooSmall;
            }
            if run.is_balanced(&run.response) {
                return Termination::Converged;
            }
            if run.is_spent() {
                return Termination::IterationLimit;
            }
            let used = run.factorisations - first;
            let load = run.load.max(LITTLE_LOAD * run.response.largest_axial_force());
            let is_hopeless = used == self.patience && residual > load;
            if used >= self.limit || is_hopeless {
                return Termination::StepTooSmall;
            }
            if !factorise(run, loading, self.floor_share * residual) {
                return Termination::StepTooSmall;
            }
            let slope = run.newton_step();
            if !(slope > 0.0 && slope.is_finite()) {
                return Termination::StepTooSmall;
            }
            match line_search::search(run, loading, positions, slope) {
                None => return Termination::StepTooSmall,
                Some(_) if run.runs_away(&run.trial_positions) => return Termination::RunsAway,
                Some(t) => {
                    step_length = t;
                    std::mem::swap(positions, &mut run.trial_positions);
                    run.respond(loading, positions);
                }
            }
        }
    }
}

fn factorise(run: &mut Run<'_>, loading: &Loading, force_floor: f64) -> bool {
    let struts = loading.bars.iter().any(|b| b.law == AxialLaw::TwoWay);
    let kept = struts.then_some(Compression::Kept);
    for compression in kept.into_iter().chain([Compression::Dropped]) {
        for smallest in SMALLEST_STIFFNESS {
            fill_blocks(run, loading, force_floor, smallest, compression);
            let taut: Vec<bool> = run.response.special.tensions.iter().map(|n| *n > 0.0).collect();
            if run.factorise_blocks(loading, |piece| taut[piece]) {
                return true;
            }
            if compression == Compression::Kept {
                break;
            }
        }
    }
    false
}

fn fill_blocks(run: &mut Run<'_>, loading: &Loading, force_floor: f64, smallest: f64, compression: Compression) {
    let response = &run.response;
    for (index, (block, bar)) in run.blocks.iter_mut().zip(&loading.bars).enumerate() {
        if !bar.is_present() {
            *block = Matrix3::zeros();
            continue;
        }
        let (length, axial) = (response.lengths[index], response.axial_forces[index]);
        let across = if axial < 0.0 && compression == Compression::Kept && length > 0.0 {
            axial / length
        } else {
            axial.max(force_floor) / length.max(bar.stress_free_length)
        };
        let least = smallest * bar.stiffness;
        *block = if bar.is_taut(length) && length > 0.0 {
            let n = response.chords[index] / length;
            axial_block(bar.stiffness + least, across + least, &n)
        } else {
            Matrix3::from_diagonal_element(across + least)
        };
    }
    if let Some(special) = &loading.special {
        let tensions = response.special.tensions.iter().map(|n| n.max(force_floor));
        let tensions: Vec<f64> = tensions.collect();
        run.structure
            .special_blocks(special, response, &tensions, smallest, &mut run.blocks);
    }
}
