//! The gap of one member: energy of its chord plus conjugate energy of its force, less their product.
//!
//! Zero when the force is that of the chord, else positive (Fenchel's inequality), in floating point too.

use nalgebra::Vector3;

use crate::element::Bar;
use crate::model::Net;

/// Length of a force that is `along` in the unit direction `n`, but for `beyond`; `grown`: length less `along`;
/// `lift`: length less what lies in the direction `n`.
#[derive(Clone, Copy, Debug)]
struct Turned {
    size: f64,
    grown: f64,
    lift: f64,
}

fn turned(along: f64, n: &Vector3<f64>, beyond: &Vector3<f64>) -> Turned {
    let more = beyond.dot(n);
    let across = (beyond - n * more).norm();
    let in_line = along + more;
    let size = in_line.hypot(across);
    let lift = if in_line > 0.0 {
        across * (across / (size + in_line))
    } else {
        size - in_line
    };
    Turned {
        size,
        grown: more + lift,
        lift,
    }
}

/// Gap of a straight rope (J).
///
/// ```text
/// ψ(d) + ψ*(T n + δ) − (T n + δ)·d = (N − T)²/(2k) + N max(0, a − l) + l (N − v·n),    N = |v|
/// ```
///
/// `length`: `l` (m). `force`: `T` (N) by the law at that length. `n`: direction, zero without length.
/// `beyond`: `δ` (N).
pub(super) fn of_bar(bar: &Bar, length: f64, force: f64, n: &Vector3<f64>, beyond: &Vector3<f64>) -> f64 {
    let Turned { size, grown, lift } = turned(force, n, beyond);
    grown * (grown / (2.0 * bar.stiffness)) + size * (bar.stress_free_length - length).max(0.0) + length * lift
}

/// Gap of a rope that slides without friction: one spring, bent around nodes (J).
///
/// ```text
/// U(d) + U*(v) − Σ v_e·d_e = (V − T)²/(2k) + V max(0, a − Σ l) + Σ (V − |v_e|) l_e + Σ l_e (|v_e| − v_e·n_e)
/// U*(v) = a V + V²/(2k),    V = max |v_e|
/// ```
///
/// `spring`: of the whole piece. `force`: `T` (N). `segments`: length (m), direction, and force beyond `T n` (N) of each.
pub(super) fn of_sliding(
    spring: &Bar,
    force: f64,
    segments: impl Iterator<Item = (f64, Vector3<f64>, Vector3<f64>)>,
) -> f64 {
    let turned: Vec<(f64, Turned)> = segments
        .map(|(length, n, beyond)| (length, turned(force, &n, &beyond)))
        .collect();
    let grown = turned.iter().map(|(_, t)| t.grown).fold(f64::NEG_INFINITY, f64::max);
    let largest = turned.iter().map(|(_, t)| t.size).fold(0.0, f64::max);
    let total: f64 = turned.iter().map(|(length, _)| length).sum();
    let each: f64 = turned
        .iter()
        .map(|(length, t)| length * (grown - t.grown + t.lift))
        .sum();
    grown * (grown / (2.0 * spring.stiffness)) + largest * (spring.stress_free_length - total).max(0.0) + each
}

/// Gap of all elastic supports, `½ y·S y` (J): their forces are those of the state moved by `y`.
pub(super) fn of_elastic_supports(net: &Net, movement: &[Vector3<f64>]) -> f64 {
    let mut gap = 0.0;
    for elastic in net.elastic_supports() {
        let mut energy = 0.0;
        for (row, a) in elastic.nodes().iter().enumerate() {
            for (column, b) in elastic.nodes().iter().enumerate() {
                energy += movement[a.index()].dot(&(elastic.block(row, column) * movement[b.index()]));
            }
        }
        // Rounding alone can make it negative: the matrix is positive semi-definite.
        gap += 0.5 * energy.max(0.0);
    }
    gap
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::AxialLaw;

    /// The gap as its definition has it, digits lost and all.
    #[test]
    fn gap_of_a_bar_is_that_of_its_definition() {
        let bar = Bar::new(AxialLaw::TensionOnly, 5e4, 2.0, 0.0);
        let n = Vector3::new(2.0, -1.0, 2.0) / 3.0;
        for length in [1.7, 2.0, 2.1] {
            for beyond in [
                Vector3::new(300.0, 40.0, -2.0),
                Vector3::new(-9000.0, 10.0, 5000.0),
                Vector3::new(-1.0, 2.0, 0.5),
                -n * 50.0,
                Vector3::zeros(),
            ] {
                let force = bar.axial_force(length);
                let v = n * force + beyond;
                let conjugate = bar.stress_free_length * v.norm() + v.norm_squared() / (2.0 * bar.stiffness);
                let expected = bar.energy(length) + conjugate - v.dot(&(n * length));
                let gap = of_bar(&bar, length, force, &n, &beyond);
                let size = bar.energy(length) + conjugate;
                assert!(gap >= 0.0);
                assert!(
                    (gap - expected).abs() <= 1e-14 * size,
                    "{length} {beyond}: {gap} {expected}"
                );
            }
        }
    }

    #[test]
    fn gap_of_a_sliding_rope_is_that_of_its_definition() {
        let spring = Bar::new(AxialLaw::TensionOnly, 5e4, 6.0, 0.0);
        let n = [Vector3::x(), Vector3::new(0.6, 0.8, 0.0), Vector3::new(0.0, 0.6, -0.8)];
        for lengths in [[2.0, 1.9, 1.8], [2.0, 2.1, 2.05]] {
            let total: f64 = lengths.iter().sum();
            let force = spring.axial_force(total);
            for beyond in [
                [
                    Vector3::new(30.0, 40.0, -2.0),
                    Vector3::zeros(),
                    Vector3::new(-9.0, 0.0, 1.0),
                ],
                [Vector3::new(-9000.0, 10.0, 5000.0), Vector3::y(), Vector3::z() * 70.0],
            ] {
                let v: Vec<_> = (0..3).map(|e| n[e] * force + beyond[e]).collect();
                let largest = v.iter().map(|v| v.norm()).fold(0.0, f64::max);
                let conjugate = spring.stress_free_length * largest + largest * largest / (2.0 * spring.stiffness);
                let work: f64 = (0..3).map(|e| v[e].dot(&(n[e] * lengths[e]))).sum();
                let expected = spring.energy(total) + conjugate - work;
                let gap = of_sliding(&spring, force, (0..3).map(|e| (lengths[e], n[e], beyond[e])));
                assert!(gap >= 0.0);
                assert!((gap - expected).abs() <= 1e-14 * (spring.energy(total) + conjugate));
            }
        }
    }
}
