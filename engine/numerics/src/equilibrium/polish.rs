//! Newton with carried forces: from the neighbourhood of the answer to its last digits.
//!
//! ```text
//! taut set A from the interior point;  residual with T = k (l − a) on A
//! tangent k n nᵀ + (N / l)(I − n nᵀ) on A with the carried N, 1e−11 k I everywhere;  full step
//! N ← k (l − a) + k n·C dx;  dropped where N ≤ 0, added where the new length is beyond a
//! ```
//! `T(l)` instead of the carried `N` in the geometric part fails often: it is noise of the size `k dx`
//! (carried stress in Newton: Magisano, Leonetti & Garcea 2017, from memory).

use std::ops::ControlFlow;

use nalgebra::{Matrix3, Vector3};

use super::run::Run;
use super::{Termination, Way};
use crate::assembly::Loading;
use crate::element::axial_block;

const LIMIT: u32 = 12;
const SMALLEST_STIFFNESS: f64 = 1e-11;
/// Share of the largest force at which a segment joins the taut set.
const JOINS: f64 = 1e-9;

/// Improves `positions` with the forces `carried` (N, one a segment) of an interior point; `load` is its force scale (N).
pub(super) fn solve(
    run: &mut Run<'_>,
    loading: &Loading,
    positions: &mut [Vector3<f64>],
    carried: &[f64],
    load: f64,
) -> Termination {
    let mut carried = carried.to_vec();
    run.respond(loading, positions);
    let largest = carried.iter().fold(0.0, |m: f64, n| m.max(*n));
    let mut taut: Vec<bool> = (loading.bars.iter().zip(&carried))
        .zip(&run.response.lengths)
        .map(|((bar, n), l)| {
            let a = bar.stress_free_length;
            bar.is_present() && n / largest > (a + n / bar.stiffness - l) / a
        })
        .collect();
    for _ in 0..=LIMIT {
        if let ControlFlow::Break(end) = run.report(Way::Polish, loading, 1.0) {
            return end;
        }
        if run.is_balanced(&run.response) {
            return Termination::Converged;
        }
        if run.is_spent() || run.runs_away(positions) {
            break;
        }
        // The right-hand side takes the taut set as two-way, so that a segment on the verge does not flicker.
        let mut balance = loading.nodal_forces.clone();
        run.structure.add_elastic_forces(loading, positions, &mut balance);
        for (index, segment) in run.structure.net().segments().iter().enumerate() {
            let bar = &loading.bars[index];
            let (length, chord) = (run.response.lengths[index], run.response.chords[index]);
            run.blocks[index] = if !bar.is_present() {
                Matrix3::zeros()
            } else if taut[index] && length > 0.0 {
                let force = chord * (bar.stiffness * (length - bar.stress_free_length) / length);
                balance[segment.ends[0].index()] += force;
                balance[segment.ends[1].index()] -= force;
                let least = SMALLEST_STIFFNESS * bar.stiffness;
                axial_block(
                    bar.stiffness + least,
                    carried[index] / length + least,
                    &(chord / length),
                )
            } else {
                Matrix3::from_diagonal_element(SMALLEST_STIFFNESS * bar.stiffness)
            };
        }
        if !run.factorise_blocks() {
            break;
        }
        let mut step = std::mem::take(&mut run.step);
        run.structure.dofs().components_into(&balance, &mut step);
        run.solve_in_place(&mut step);
        run.structure.dofs().nodal_into(&step, &mut run.nodal_step);
        run.step = step;
        for (index, segment) in run.structure.net().segments().iter().enumerate() {
            let bar = &loading.bars[index];
            let length = run.response.lengths[index];
            if taut[index] && length > 0.0 {
                let change = run.nodal_step[segment.ends[1].index()] - run.nodal_step[segment.ends[0].index()];
                let along = change.dot(&run.response.chords[index]) / length;
                carried[index] = bar.stiffness * (length - bar.stress_free_length + along);
                if carried[index] <= 0.0 {
                    taut[index] = false;
                }
            }
        }
        for (x, u) in positions.iter_mut().zip(&run.nodal_step) {
            *x += u;
        }
        run.respond(loading, positions);
        let reference = load.max(run.response.largest_axial_force());
        for (index, bar) in loading.bars.iter().enumerate() {
            let force = bar.stiffness * (run.response.lengths[index] - bar.stress_free_length);
            if bar.is_present() && !taut[index] && force > JOINS * reference {
                taut[index] = true;
                carried[index] = force.min(load);
            }
        }
    }
    Termination::StepTooSmall
}
