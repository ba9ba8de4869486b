//! How far to go along a Newton step, found without differences of energies.
//!
//! ```text
//! Π(x + t dx) − Π(x) = −t s + F(t),   s = r·dx,   F = Σ FY ≥ 0 for ropes,   slope f'(t) = −r(x + t dx)·dx
//! accept when F ≤ (1 − 1e−4) t s and |f'| ≤ 0.3 s
//! ```
//! `FY` is the Fenchel–Young term of a segment: what its energy grows beyond the first order. Formed without
//! cancellation, it keeps its sign down to the last bit, where the difference of two energies is noise.

use nalgebra::Vector3;

use super::run::Run;
use crate::assembly::Loading;
use crate::element::Bar;
use crate::model::AxialLaw;

const SUFFICIENT_DECREASE: f64 = 1e-4;
const FLAT_ENOUGH: f64 = 0.3;
const MOST_EVALUATIONS: u32 = 25;

/// Energy of a segment beyond its first order, when its chord goes from `d0` to `d0 + change` (J).
///
/// ```text
/// FY = (T1−T0)²/2k + T0 max(0, a−l1) + T0 tr         tr = l1 − d1·n0
/// ```
/// A strut never lacks length, so its middle term is absent.
pub(super) fn fenchel_young(bar: &Bar, d0: &Vector3<f64>, l0: f64, t0: f64, change: &Vector3<f64>) -> f64 {
    if !bar.is_present() {
        return 0.0;
    }
    let d1 = d0 + change;
    let l1 = d1.norm();
    let (k, a) = (bar.stiffness, bar.stress_free_length);
    let t1 = bar.axial_force(l1);
    let both_taut = bar.is_taut(l0) && bar.is_taut(l1);
    let dt = if both_taut && l0 + l1 > 0.0 {
        k * change.dot(&(d0 + d1)) / (l0 + l1)
    } else {
        t1 - t0
    };
    let mut term = dt * dt / (2.0 * k);
    if t0 != 0.0 && l0 > 0.0 {
        let n0 = d0 / l0;
        let along = d1.dot(&n0);
        let turn = if along > 0.0 {
            let across = change - n0 * change.dot(&n0);
            across.norm_squared() / (l1 + along)
        } else {
            l1 - along
        };
        let lack = match bar.law {
            AxialLaw::TensionOnly => (a - l1).max(0.0),
            AxialLaw::TwoWay => 0.0,
        };
        term += t0 * lack + t0 * turn;
    }
    term
}

/// Searches along the step of `run` from `positions` with slope `s`; leaves the state it accepts in
/// `run.trial_positions` and `run.trial`.
///
/// Returns the share of the step, or `None` if no share lowers the energy.
pub(super) fn search(run: &mut Run<'_>, loading: &Loading, positions: &[Vector3<f64>], s: f64) -> Option<f64> {
    let elastic = elastic_growth(run);
    let (mut low, mut slope_low) = (0.0, -s);
    let mut high: Option<(f64, f64)> = None;
    let mut fallback = None;
    let mut t = 1.0;
    for _ in 0..MOST_EVALUATIONS {
        let slope = evaluate(run, loading, positions, t);
        if run.is_balanced(&run.trial) && !run.runs_away(&run.trial_positions) {
            return Some(t);
        }
        let lowers = if loading.special.is_some() {
            // Where the energy is convex a slope that still falls, or hardly rises, says as much.
            slope <= FLAT_ENOUGH * s
        } else {
            growth(run, loading, t) + elastic * t * t <= (1.0 - SUFFICIENT_DECREASE) * t * s
        };
        if lowers && slope.abs() <= FLAT_ENOUGH * s {
            return Some(t);
        }
        if lowers {
            fallback = Some(t);
        }
        if lowers && slope < 0.0 {
            (low, slope_low) = (t, slope);
        } else {
            high = Some((t, slope));
        }
        t = match high {
            None => {
                let secant = t * s / (s + slope).max(0.25 * s);
                secant.clamp(2.0 * t, 4.0 * t)
            }
            Some((end, slope_end)) => {
                let width = end - low;
                let secant = low - slope_low * width / (slope_end - slope_low);
                let inside = if secant.is_finite() { secant } else { low + 0.5 * width };
                inside.clamp(low + 0.1 * width, end - 0.1 * width)
            }
        };
    }
    let t = fallback?;
    evaluate(run, loading, positions, t);
    Some(t)
}

/// Response at `t` along the step; returns the slope of the energy there (J).
fn evaluate(run: &mut Run<'_>, loading: &Loading, positions: &[Vector3<f64>], t: f64) -> f64 {
    for ((trial, x), u) in run.trial_positions.iter_mut().zip(positions).zip(&run.nodal_step) {
        *trial = x + u * t;
    }
    run.structure
        .response_into(loading, &run.trial_positions, &mut run.trial);
    -run.trial
        .residual
        .iter()
        .zip(&run.step)
        .map(|(r, u)| r * u)
        .sum::<f64>()
}

fn growth(run: &Run<'_>, loading: &Loading, t: f64) -> f64 {
    let response = &run.response;
    let mut sum = 0.0;
    for (index, (bar, segment)) in loading.bars.iter().zip(run.structure.net().segments()).enumerate() {
        let [i, j] = segment.ends;
        let change = (run.nodal_step[j.index()] - run.nodal_step[i.index()]) * t;
        sum += fenchel_young(
            bar,
            &response.chords[index],
            response.lengths[index],
            response.axial_forces[index],
            &change,
        );
    }
    sum
}

/// `½ dx·S dx` of all elastic supports (J).
fn elastic_growth(run: &Run<'_>) -> f64 {
    let mut sum = 0.0;
    for elastic in run.structure.net().elastic_supports() {
        for (row, a) in elastic.nodes().iter().enumerate() {
            for (column, b) in elastic.nodes().iter().enumerate() {
                let pull = elastic.block(row, column) * run.nodal_step[b.index()];
                sum += 0.5 * run.nodal_step[a.index()].dot(&pull);
            }
        }
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::*;

    fn remainder(bar: &Bar, d0: &Vector3<f64>, change: &Vector3<f64>) -> f64 {
        let (l0, l1) = (d0.norm(), (d0 + change).norm());
        bar.energy(l1) - bar.energy(l0) - bar.axial_force(l0) / l0 * d0.dot(change)
    }

    #[test]
    fn the_term_is_the_energy_beyond_the_first_order() {
        let d0 = Vector3::new(1.0, 0.5, -0.3);
        for law in [AxialLaw::TensionOnly, AxialLaw::TwoWay] {
            for length in [0.9, 1.0, 1.2, 1.4] {
                let bar = Bar::new(law, 1000.0, length, 0.0);
                for change in [
                    Vector3::new(0.1, 0.2, 0.3),
                    Vector3::new(-0.4, 0.0, 0.1),
                    Vector3::new(-2.0, -1.0, 0.5),
                ] {
                    let term = fenchel_young(&bar, &d0, d0.norm(), bar.axial_force(d0.norm()), &change);
                    assert!((term - remainder(&bar, &d0, &change)).abs() < 1e-10);
                    if law == AxialLaw::TensionOnly {
                        assert!(term >= 0.0);
                    }
                }
            }
        }
    }
}
