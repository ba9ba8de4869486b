//! Interior point for nets with much slack, on the same pattern as the tangent.
//!
//! ```text
//! min Σ ½ k ε² − p·x   with   |d_e| ≤ a_e + ε_e
//! s = (a + ε, d), z = (N, −v) in the second-order cone;   at the end k ε = N, Cᵀ v = p, s ∘ z = 0
//! ```
//! Unlike Newton on the energy it does not creep along curved valleys where much is slack and little stretches. It ends
//! near seven digits, which is the nature of its equations; [`super::carried`] takes it from there.
//!
//! A strut takes part as a two-way spring along its direction at the start, which is convex: force `k (n0·d − a) n0`.
//! What it lacks, the turning of the strut, is left to whoever goes on from here.
//!
//! Scaling: Nesterov & Todd 1997; predictor and corrector: Mehrotra 1992 (both from memory).

use std::ops::ControlFlow;

use nalgebra::{Matrix3, Vector3};

use super::run::Run;
use super::{Termination, Way};
use crate::assembly::Loading;
use crate::element::axial_block;
use crate::model::AxialLaw;

const LIMIT: u32 = 40;
const SMALLEST_STIFFNESS: f64 = 1e-13;
/// Share of its stiffness that a strut has across, in the steps only, so that none is without.
const SMALLEST_OF_A_STRUT: f64 = 1e-9;
const TO_THE_BOUNDARY: f64 = 0.99;
const ENOUGH_BALANCE: f64 = 1e-4;
const ENOUGH_GAP: f64 = 1e-6;
/// Once both are below this share, an iteration pair that halves neither ends the search.
const STALLED: f64 = 1e-2;

/// A point of the second-order cone, `(u0, u1)` with `u0 ≥ |u1|`.
#[derive(Clone, Copy, Debug)]
struct Cone {
    head: f64,
    tail: Vector3<f64>,
}

impl Cone {
    fn new(head: f64, tail: Vector3<f64>) -> Self {
        Self { head, tail }
    }

    fn dot(&self, other: &Self) -> f64 {
        self.head * other.head + self.tail.dot(&other.tail)
    }

    fn determinant(&self) -> f64 {
        let norm = self.tail.norm();
        (self.head - norm) * (self.head + norm)
    }

    fn plus(&self, other: &Self, factor: f64) -> Self {
        Self::new(self.head + factor * other.head, self.tail + other.tail * factor)
    }

    fn scaled(&self, factor: f64) -> Self {
        Self::new(self.head * factor, self.tail * factor)
    }

    /// `u ∘ v = (u·v, u0 v1 + v0 u1)`.
    fn product(&self, other: &Self) -> Self {
        Self::new(self.dot(other), other.tail * self.head + self.tail * other.head)
    }

    /// Solution `x` of `self ∘ x = b`.
    fn divide(&self, b: &Self) -> Self {
        let head = (self.head * b.head - self.tail.dot(&b.tail)) / self.determinant();
        Self::new(head, (b.tail - self.tail * head) / self.head)
    }

    /// Largest step along `direction` that stays in the cone.
    fn longest_step(&self, direction: &Self) -> f64 {
        let root = self.determinant().sqrt();
        let unit = self.scaled(1.0 / root);
        // The direction as seen from the point, turned hyperbolically to the axis of the cone.
        let head = unit.head * direction.head - unit.tail.dot(&direction.tail);
        let tail = direction.tail - unit.tail * ((head + direction.head) / (1.0 + unit.head));
        let closing = tail.norm() - head;
        if closing > 0.0 { root / closing } else { f64::INFINITY }
    }
}

/// Nesterov–Todd scaling of one pair `(s, z)`: `W z = W⁻¹ s`.
#[derive(Clone, Copy, Debug)]
struct Scaling {
    eta: f64,
    w: Cone,
}

impl Scaling {
    fn new(s: &Cone, z: &Cone) -> Self {
        let (det_s, det_z) = (s.determinant(), z.determinant());
        let (s_unit, z_unit) = (s.scaled(1.0 / det_s.sqrt()), z.scaled(1.0 / det_z.sqrt()));
        let gamma = ((1.0 + s_unit.dot(&z_unit)) / 2.0).sqrt();
        Self {
            eta: (det_s / det_z).sqrt().sqrt(),
            w: Cone::new(s_unit.head + z_unit.head, s_unit.tail - z_unit.tail).scaled(0.5 / gamma),
        }
    }

    fn turn(w0: f64, w1: &Vector3<f64>, y: &Cone) -> Cone {
        let along = w1.dot(&y.tail);
        Cone::new(w0 * y.head + along, w1 * y.head + y.tail + w1 * (along / (1.0 + w0)))
    }

    fn apply(&self, y: &Cone) -> Cone {
        Self::turn(self.w.head, &self.w.tail, y).scaled(self.eta)
    }

    fn apply_inverse(&self, y: &Cone) -> Cone {
        Self::turn(self.w.head, &-self.w.tail, y).scaled(1.0 / self.eta)
    }

    /// `H = W⁻² = (2 (Jw)(Jw)ᵀ − J) / η²` as head, column and block.
    fn inverse_square(&self) -> (f64, Vector3<f64>, Matrix3<f64>) {
        let (w0, w1) = (self.w.head, self.w.tail);
        let scale = 1.0 / (self.eta * self.eta);
        (
            (2.0 * w0 * w0 - 1.0) * scale,
            w1 * (-2.0 * w0 * scale),
            (w1 * w1.transpose() * 2.0 + Matrix3::identity()) * scale,
        )
    }
}

/// One segment between its cone pair and the linear system.
#[derive(Clone, Copy, Debug)]
struct Member {
    index: usize,
    ends: [usize; 2],
    stiffness: f64,
    elongation: f64,
    s: Cone,
    z: Cone,
    scaling: Scaling,
    lambda: Cone,
    head: f64,
    column: Vector3<f64>,
    block: Matrix3<f64>,
    /// `t` of the present direction.
    t: Cone,
    ds: Cone,
    dz: Cone,
}

impl Member {
    fn scale(&mut self) {
        self.scaling = Scaling::new(&self.s, &self.z);
        self.lambda = self.scaling.apply(&self.z);
        (self.head, self.column, self.block) = self.scaling.inverse_square();
    }

    /// `Ht` and the eliminated elongation's constant part `c`.
    fn constant(&self, share: f64) -> (Vector3<f64>, f64) {
        let lack = self.stiffness * self.elongation - self.z.head;
        let head = self.head * self.t.head + self.column.dot(&self.t.tail);
        let tail = self.column * self.t.head + self.block * self.t.tail;
        (tail, (head - share * lack) / (self.stiffness + self.head))
    }

    fn finish(&mut self, share: f64, chord_change: Vector3<f64>) {
        let (_, c) = self.constant(share);
        let elongation = c - self.column.dot(&chord_change) / (self.stiffness + self.head);
        self.ds = Cone::new(elongation, chord_change);
        let rest = self.t.plus(&self.ds, -1.0);
        self.dz = Cone::new(
            self.head * rest.head + self.column.dot(&rest.tail),
            self.column * rest.head + self.block * rest.tail,
        );
    }

    fn longest_step(&self) -> f64 {
        self.s.longest_step(&self.ds).min(self.z.longest_step(&self.dz))
    }
}

/// Searches from `positions`; leaves its last point there.
///
/// Returns the axial force of every segment (N) and the force scale `P` (N) for a polish, or why it had to stop.
pub(super) fn solve(
    run: &mut Run<'_>,
    loading: &Loading,
    positions: &mut [Vector3<f64>],
) -> Result<(Vec<f64>, f64), Termination> {
    run.respond(loading, positions);
    let imbalance = run.response.largest_residual(run.structure).0;
    // Without loads the out-of-balance forces of the start give the scale.
    let force = if run.load > 0.0 { run.load } else { 0.01 * imbalance };
    let length = median_length(loading);
    let mut members = start(run, loading, force, length);
    let struts = struts(run, loading);
    if members.is_empty() || force <= 0.0 || !force.is_finite() {
        return Ok((vec![0.0; loading.bars.len()], force));
    }
    let mut before: Vec<(f64, f64)> = Vec::new();
    let mut step_length = 0.0;
    for iteration in 0..=LIMIT {
        run.respond(loading, positions);
        for member in &mut members {
            member.s.tail = run.response.chords[member.index];
            member.scale();
        }
        let residual = residual(run, loading, positions, &members, &struts);
        let imbalance = residual.iter().fold(0.0, |m: f64, r| m.max(r.abs()));
        let gap = members.iter().map(|m| m.lambda.dot(&m.lambda)).sum::<f64>() / members.len() as f64;
        if !(imbalance.is_finite() && gap.is_finite()) || run.runs_away(positions) {
            return Err(Termination::StepTooSmall);
        }
        let mut report = run.report_of(Way::InteriorPoint, loading, step_length);
        report.residual = imbalance;
        run.history.push(report);
        if let ControlFlow::Break(end) = run.tell(&report) {
            return Err(end);
        }
        let (balance_share, gap_share) = (imbalance / force, gap / (force * length));
        let is_there = balance_share <= ENOUGH_BALANCE && gap_share <= ENOUGH_GAP;
        let stalls = before.len() >= 2 && balance_share <= STALLED && gap_share <= STALLED && {
            let (balance, gap) = before[before.len() - 2];
            balance_share > 0.5 * balance && gap_share > 0.5 * gap
        };
        before.push((balance_share, gap_share));
        if is_there || stalls || iteration == LIMIT || run.is_spent() {
            break;
        }
        for strut in &struts {
            run.blocks[strut.index] = axial_block(strut.stiffness, SMALLEST_OF_A_STRUT * strut.stiffness, &strut.along);
        }
        for member in &members {
            let fill = member.column * member.column.transpose() / (member.stiffness + member.head);
            run.blocks[member.index] =
                member.block - fill + Matrix3::from_diagonal_element(SMALLEST_STIFFNESS * member.stiffness);
        }
        if !run.factorise_blocks(loading, |_| false) {
            break;
        }
        for member in &mut members {
            member.t = member.s.scaled(-1.0);
        }
        direction(run, &residual, &mut members, 1.0);
        let predicted = longest(&members).min(1.0);
        let centring = (1.0 - predicted).powi(3);
        for member in &mut members {
            let scaled_ds = member.scaling.apply_inverse(&member.ds);
            let scaled_dz = member.scaling.apply(&member.dz);
            let mut b = member
                .lambda
                .product(&member.lambda)
                .scaled(-1.0)
                .plus(&scaled_ds.product(&scaled_dz), -1.0);
            b.head += centring * gap;
            member.t = member.scaling.apply(&member.lambda.divide(&b));
        }
        direction(run, &residual, &mut members, 1.0 - centring);
        step_length = (TO_THE_BOUNDARY * longest(&members)).min(1.0);
        if step_length <= 0.0 || step_length.is_nan() {
            break;
        }
        for member in &mut members {
            member.s = member.s.plus(&member.ds, step_length);
            member.z = member.z.plus(&member.dz, step_length);
            member.elongation += step_length * member.ds.head;
        }
        for (x, u) in positions.iter_mut().zip(&run.nodal_step) {
            *x += u * step_length;
        }
    }
    let mut forces = vec![0.0; loading.bars.len()];
    for member in &members {
        forces[member.index] = member.z.head;
    }
    for strut in &struts {
        forces[strut.index] = strut.force(positions);
    }
    Ok((forces, force))
}

fn median_length(loading: &Loading) -> f64 {
    let mut lengths: Vec<f64> = loading
        .bars
        .iter()
        .filter(|b| b.is_present())
        .map(|b| b.stress_free_length)
        .collect();
    lengths.sort_by(f64::total_cmp);
    lengths.get(lengths.len() / 2).copied().unwrap_or(1.0)
}

fn start(run: &mut Run<'_>, loading: &Loading, force: f64, length: f64) -> Vec<Member> {
    let zero = Cone::new(0.0, Vector3::zeros());
    let mut members = Vec::new();
    for (index, (bar, segment)) in loading.bars.iter().zip(run.structure.net().segments()).enumerate() {
        if !bar.is_present() || bar.law == AxialLaw::TwoWay {
            run.blocks[index] = Matrix3::zeros();
            continue;
        }
        let chord = run.response.chords[index];
        let head = run.response.lengths[index].max(bar.stress_free_length) + 0.1 * length;
        let s = Cone::new(head, chord);
        let z = Cone::new(force, chord * (-0.9 * force / head));
        members.push(Member {
            index,
            ends: segment.ends.map(|n| n.index()),
            stiffness: bar.stiffness,
            elongation: head - bar.stress_free_length,
            s,
            z,
            scaling: Scaling { eta: 1.0, w: zero },
            lambda: zero,
            head: 0.0,
            column: Vector3::zeros(),
            block: Matrix3::zeros(),
            t: zero,
            ds: zero,
            dz: zero,
        });
    }
    members
}

/// A strut as a spring along its direction at the start.
#[derive(Clone, Copy, Debug)]
struct Rail {
    index: usize,
    ends: [usize; 2],
    stiffness: f64,
    length: f64,
    along: Vector3<f64>,
}

impl Rail {
    fn force(&self, positions: &[Vector3<f64>]) -> f64 {
        let chord = positions[self.ends[1]] - positions[self.ends[0]];
        self.stiffness * (self.along.dot(&chord) - self.length)
    }
}

fn struts(run: &Run<'_>, loading: &Loading) -> Vec<Rail> {
    let segments = loading.bars.iter().zip(run.structure.net().segments()).enumerate();
    segments
        .filter(|(index, (bar, _))| {
            bar.is_present() && bar.law == AxialLaw::TwoWay && run.response.lengths[*index] > 0.0
        })
        .map(|(index, (bar, segment))| Rail {
            index,
            ends: segment.ends.map(|n| n.index()),
            stiffness: bar.stiffness,
            length: bar.stress_free_length,
            along: run.response.chords[index] / run.response.lengths[index],
        })
        .collect()
}

/// `p − Cᵀ v`, struts and elastic supports, along the free directions (N).
fn residual(
    run: &Run<'_>,
    loading: &Loading,
    positions: &[Vector3<f64>],
    members: &[Member],
    struts: &[Rail],
) -> Vec<f64> {
    let mut balance = loading.nodal_forces.clone();
    run.structure.add_elastic_forces(loading, positions, &mut balance);
    for member in members {
        // z carries −v.
        balance[member.ends[0]] -= member.z.tail;
        balance[member.ends[1]] += member.z.tail;
    }
    for strut in struts {
        let pull = strut.along * strut.force(positions);
        balance[strut.ends[0]] += pull;
        balance[strut.ends[1]] -= pull;
    }
    let mut residual = vec![0.0; run.structure.n_dofs()];
    run.structure.dofs().components_into(&balance, &mut residual);
    residual
}

/// Solves for the direction that belongs to `t`, taking away `share` of what is out of balance.
fn direction(run: &mut Run<'_>, residual: &[f64], members: &mut [Member], share: f64) {
    run.nodal_step.fill(Vector3::zeros());
    for member in members.iter() {
        let (tail, c) = member.constant(share);
        let force = tail - member.column * c;
        run.nodal_step[member.ends[1]] += force;
        run.nodal_step[member.ends[0]] -= force;
    }
    let mut step = std::mem::take(&mut run.step);
    run.structure.dofs().components_into(&run.nodal_step, &mut step);
    for (u, r) in step.iter_mut().zip(residual) {
        *u += share * r;
    }
    run.solve_in_place(&mut step);
    run.structure.dofs().nodal_into(&step, &mut run.nodal_step);
    run.step = step;
    for member in members {
        let change = run.nodal_step[member.ends[1]] - run.nodal_step[member.ends[0]];
        member.finish(share, change);
    }
}

fn longest(members: &[Member]) -> f64 {
    members.iter().map(Member::longest_step).fold(f64::INFINITY, f64::min)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn pair() -> (Cone, Cone) {
        (
            Cone::new(2.0, Vector3::new(0.5, -1.2, 0.9)),
            Cone::new(30.0, Vector3::new(-9.0, 20.0, 4.0)),
        )
    }

    #[test]
    fn scaling_maps_both_to_the_same_point() {
        let (s, z) = pair();
        let scaling = Scaling::new(&s, &z);
        let difference = scaling.apply(&z).plus(&scaling.apply_inverse(&s), -1.0);
        assert!(difference.dot(&difference).sqrt() < 1e-13);
        let (head, column, block) = scaling.inverse_square();
        let twice = scaling.apply_inverse(&scaling.apply_inverse(&s));
        assert!((head * s.head + column.dot(&s.tail) - twice.head).abs() < 1e-12);
        assert!((column * s.head + block * s.tail - twice.tail).norm() < 1e-12);
    }

    #[test]
    fn division_undoes_the_product_and_the_longest_step_ends_on_the_boundary() {
        let (s, z) = pair();
        let back = s.divide(&s.product(&z));
        assert!((back.head - z.head).abs() + (back.tail - z.tail).norm() < 1e-12);
        let direction = Cone::new(-0.4, Vector3::new(1.0, 0.3, -0.2));
        let end = s.plus(&direction, s.longest_step(&direction));
        assert!(end.determinant().abs() < 1e-12 && end.head > 0.0);
    }
}
