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
}
