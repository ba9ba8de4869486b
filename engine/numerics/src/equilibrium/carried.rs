//! Newton with carried forces: the quickest way from a taut net to its answer, and the last digits after an interior
//! point.
//!
//! ```text
//! taut set A;  residual with T = k (l − a) on A
//! tangent k n nᵀ + (N / l)(I − n nᵀ) on A with the carried N, 1e−11 k I everywhere;  full step
//! N ← k (l − a) + k n·C dx;  a rope is dropped where N ≤ 0, and joins where its new length is beyond a
//! ```
//! With `T(l)` instead of the carried `N` in the geometric part the method is plain Newton, and slow: a rope that turns
//! by a step grows by its square, and `k` makes a large force of that. The carried force does not see it. For the same
//! reason a rope just dropped may not join again at once: its second-order growth would undo what the first order
//! decided (carried stress in Newton: Magisano, Leonetti & Garcea 2017, from memory; the rest found by trial, 100 × 100
//! nodes with 20 % of the ropes going slack on the way take 7 factorisations, plain Newton 16).
//!
//! There is no line search and no proof: where it fails, the others take over.

use std::ops::ControlFlow;

use nalgebra::{Matrix3, Vector3};

use super::run::Run;
use super::{Termination, Way};
use crate::assembly::Loading;
use crate::element::axial_block;
use crate::model::AxialLaw;

const SMALLEST_STIFFNESS: f64 = 1e-11;
/// Share of the largest force at which a segment joins the taut set.
const JOINS: f64 = 1e-9;

/// How it is used in one place of the recipe.
#[derive(Clone, Copy, Debug)]
pub(super) struct Carried {
    /// As what it is reported.
    pub(super) way: Way,
    /// Factorisations allowed.
    pub(super) limit: u32,
}

impl Carried {
    /// Improves `positions` with the forces `carried` (N, one a segment); `joining`: largest force of a rope that joins (N).
    pub(super) fn solve(
        self,
        run: &mut Run<'_>,
        loading: &Loading,
        positions: &mut [Vector3<f64>],
        mut carried: Vec<f64>,
        joining: f64,
    ) -> Termination {
        run.respond(loading, positions);
        let mut taut = taut_set(run, loading, &carried);
        let mut sliding = run.response.special.tensions.clone();
        let mut step_length = 0.0;
        for _ in 0..=self.limit {
            if let ControlFlow::Break(end) = run.report(self.way, loading, step_length) {
                return end;
            }
            if run.is_balanced(&run.response) {
                return Termination::Converged;
            }
            if run.is_spent() || run.runs_away(positions) || !step(run, loading, positions, &carried, &taut, &sliding) {
                break;
            }
            step_length = 1.0;
            let dropped = carry(run, loading, &mut carried, &mut taut);
            carry_sliding(run, loading, &mut sliding);
            for (x, u) in positions.iter_mut().zip(&run.nodal_step) {
                *x += u;
            }
            run.respond(loading, positions);
            let reference = run.load.max(run.response.largest_axial_force());
            for (index, bar) in loading.bars.iter().enumerate() {
                let force = bar.stiffness * (run.response.lengths[index] - bar.stress_free_length);
                if bar.is_present() && !taut[index] && !dropped[index] && force > JOINS * reference {
                    taut[index] = true;
                    carried[index] = force.min(joining);
                }
            }
        }
        if run.is_spent() {
            Termination::IterationLimit
        } else {
            Termination::StepTooSmall
        }
    }
}

/// Struts, and ropes whose force is larger, over the largest, than their lack of length, over their length.
fn taut_set(run: &Run<'_>, loading: &Loading, carried: &[f64]) -> Vec<bool> {
    let largest = carried.iter().fold(0.0, |m: f64, n| m.max(*n));
    (loading.bars.iter().zip(carried))
        .zip(&run.response.lengths)
        .map(|((bar, n), l)| {
            let a = bar.stress_free_length;
            let is_pulled = *n > 0.0 && n / largest > (a + n / bar.stiffness - l) / a;
            bar.is_present() && (is_pulled || bar.law == AxialLaw::TwoWay)
        })
        .collect()
}

/// The full step for the present set, into the step of `run`; false if its tangent is not positive definite.
///
/// `sliding`: carried tensions of the sliding pieces (N).
fn step(
    run: &mut Run<'_>,
    loading: &Loading,
    positions: &[Vector3<f64>],
    carried: &[f64],
    taut: &[bool],
    sliding: &[f64],
) -> bool {
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
    if let Some(special) = &loading.special {
        run.structure.add_special_forces(special, &run.response, &mut balance);
        run.structure
            .special_blocks(special, &run.response, sliding, SMALLEST_STIFFNESS, &mut run.blocks);
    }
    if !run.factorise_blocks(loading, |piece| sliding[piece] > 0.0) {
        return false;
    }
    let mut step = std::mem::take(&mut run.step);
    run.structure.dofs().components_into(&balance, &mut step);
    run.solve_in_place(&mut step);
    run.add_slips(&mut step);
    run.structure.dofs().nodal_into(&step, &mut run.nodal_step);
    run.step = step;
    true
}

/// Predicts the tensions of sliding pieces after the step to first order.
fn carry_sliding(run: &Run<'_>, loading: &Loading, sliding: &mut [f64]) {
    let Some(special) = &loading.special else { return };
    for (piece, (carried, n)) in special
        .sliding
        .iter()
        .zip(sliding.iter_mut().zip(&run.response.special.tensions))
    {
        let lengths = &run.response.lengths[piece.segments()];
        let mut slopes = vec![0.0; lengths.len()];
        piece.slopes_into(lengths, *n, &mut slopes);
        // Below its stress-free length the same spring, drawn on to the other side.
        let lack = if *n > 0.0 { 0.0 } else { piece.lack(lengths) * slopes[0] };
        let growth: f64 = (piece.segments().zip(&slopes))
            .filter(|(e, _)| run.response.lengths[*e] > 0.0)
            .map(|(e, slope)| {
                let [i, j] = run.structure.net().segments()[e].ends;
                let change = run.nodal_step[j.index()] - run.nodal_step[i.index()];
                slope * change.dot(&run.response.chords[e]) / run.response.lengths[e]
            })
            .sum();
        *carried = (*n - lack + growth).max(0.0);
    }
}

/// Predicts the forces after the step to first order and drops ropes that would push; returns which.
fn carry(run: &Run<'_>, loading: &Loading, carried: &mut [f64], taut: &mut [bool]) -> Vec<bool> {
    let mut dropped = vec![false; taut.len()];
    for (index, segment) in run.structure.net().segments().iter().enumerate() {
        let bar = &loading.bars[index];
        let length = run.response.lengths[index];
        if taut[index] && length > 0.0 {
            let change = run.nodal_step[segment.ends[1].index()] - run.nodal_step[segment.ends[0].index()];
            let along = change.dot(&run.response.chords[index]) / length;
            carried[index] = bar.stiffness * (length - bar.stress_free_length + along);
            if carried[index] <= 0.0 && bar.law == AxialLaw::TensionOnly {
                taut[index] = false;
                dropped[index] = true;
            }
        }
    }
    dropped
}
