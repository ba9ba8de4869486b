//! Pressure on a panel, normal to it as it moves.
//!
//! ```text
//! c = mean of the corners;   triangle (c, x_i, x_i+1):   f = −p/6 (x_i − c) × (x_i+1 − c) on each of its vertices
//! ```
//! The share of `c` goes to all corners alike. Because `c` is linear in them, the forces are the derivative of `−p V`,
//! `V` the volume under the triangles: the sum over a closed surface vanishes, and a fixed rim sees the projected area.
//!
//! The derivative of the forces is not symmetric on the rim and where neighbours bear different pressures. The
//! symmetric part is what a symmetric matrix can take; with exact forces Newton still converges, linearly at the end.

use nalgebra::{Matrix3, Vector3};

/// Force on every corner (N) of a panel under `pressure` (Pa) on its outer side.
///
/// `corners`: counter-clockwise seen from the outer side (m). `forces`: one place a corner; overwritten.
pub fn pressure_forces(corners: &[Vector3<f64>], pressure: f64, forces: &mut [Vector3<f64>]) {
    let n = corners.len();
    let centre = mean(corners);
    forces.fill(Vector3::zeros());
    let mut whole = Vector3::zeros();
    for i in 0..n {
        let j = (i + 1) % n;
        let third = (corners[i] - centre).cross(&(corners[j] - centre)) * (-pressure / 6.0);
        forces[i] += third;
        forces[j] += third;
        whole += third;
    }
    for force in forces.iter_mut() {
        *force += whole / n as f64;
    }
}

/// Vector area (m²): the sum over its triangles, outward normal times area.
#[must_use]
pub fn vector_area(corners: &[Vector3<f64>]) -> Vector3<f64> {
    let centre = mean(corners);
    (0..corners.len())
        .map(|i| 0.5 * (corners[i] - centre).cross(&(corners[(i + 1) % corners.len()] - centre)))
        .sum()
}

/// Adds the symmetric part of the load stiffness, `−½ (∂f/∂x + (∂f/∂x)ᵀ)`, block by block (N/m).
///
/// `add`: called with two corners, the first not before the second, and their block; the block of a pair stands for both
/// triangles of the matrix.
pub(crate) fn symmetric_stiffness(
    corners: &[Vector3<f64>],
    pressure: f64,
    mut add: impl FnMut(usize, usize, &Matrix3<f64>),
) {
    let n = corners.len();
    for row in 0..n {
        for column in 0..=row {
            let block = slope(corners, pressure, row, column);
            let across = slope(corners, pressure, column, row).transpose();
            add(row, column, &(-0.5 * (block + across)));
        }
    }
}

/// `∂f_row / ∂x_column` (N/m).
///
/// With `S = Σ (x_i − c) × (x_i+1 − c) = Σ x_i × x_i+1` the force is
/// `f_r = −p/6 [(x_r−1 − c) × (x_r − c) + (x_r − c) × (x_r+1 − c) + S/n]`.
#[must_use]
pub fn slope(corners: &[Vector3<f64>], pressure: f64, row: usize, column: usize) -> Matrix3<f64> {
    let n = corners.len();
    let at = |i: usize| corners[i % n];
    let (before, after) = (at(row + n - 1), at(row + 1));
    let centre = mean(corners);
    // d(a × b) = [a]ₓ db − [b]ₓ da; every corner moves the mean by 1/n of its own movement.
    let share = 1.0 / n as f64;
    let own = |i: usize| f64::from(u8::from(i % n == column));
    let mut block = Matrix3::zeros();
    let mut product = |a: Vector3<f64>, da: f64, b: Vector3<f64>, db: f64| {
        block += a.cross_matrix() * db - b.cross_matrix() * da;
    };
    product(
        before - centre,
        own(row + n - 1) - share,
        at(row) - centre,
        own(row) - share,
    );
    product(at(row) - centre, own(row) - share, after - centre, own(row + 1) - share);
    // dS/dx_c = [x_c−1]ₓ − [x_c+1]ₓ, independent of the mean.
    let whole = (at(column + n - 1) - at(column + 1)).cross_matrix() * share;
    (block + whole) * (-pressure / 6.0)
}

fn mean(corners: &[Vector3<f64>]) -> Vector3<f64> {
    corners.iter().sum::<Vector3<f64>>() / corners.len() as f64
}

#[cfg(test)]
mod tests {
    use super::*;

    fn pentagon() -> Vec<Vector3<f64>> {
        [
            [0.0, 0.0, 0.1],
            [2.0, -0.3, 0.4],
            [3.1, 1.2, -0.2],
            [1.4, 2.6, 0.6],
            [-0.5, 1.7, 0.0],
        ]
        .map(Vector3::from)
        .to_vec()
    }

    #[test]
    fn slope_against_differences() {
        for corners in [pentagon(), pentagon()[..4].to_vec(), pentagon()[..3].to_vec()] {
            let n = corners.len();
            let forces = |moved: &[Vector3<f64>]| {
                let mut forces = vec![Vector3::zeros(); n];
                pressure_forces(moved, 450.0, &mut forces);
                forces
            };
            for column in 0..n {
                for axis in 0..3 {
                    let shifted = |h: f64| {
                        let mut moved = corners.clone();
                        moved[column][axis] += h;
                        forces(&moved)
                    };
                    let (up, down) = (shifted(1e-3), shifted(-1e-3));
                    for row in 0..n {
                        // Forces are quadratic in the positions, so that the central difference is exact but for rounding.
                        let difference = (up[row] - down[row]) / 2e-3;
                        let exact = slope(&corners, 450.0, row, column).column(axis).into_owned();
                        assert!((difference - exact).norm() < 1e-9 * 450.0, "{row} {column} {axis}");
                    }
                }
            }
        }
    }

    #[test]
    fn forces_sum_to_pressure_times_area_and_have_no_moment_of_their_own_when_flat() {
        let corners = pentagon();
        let mut forces = vec![Vector3::zeros(); 5];
        pressure_forces(&corners, 300.0, &mut forces);
        let sum: Vector3<f64> = forces.iter().sum();
        assert!((sum + 300.0 * vector_area(&corners)).norm() < 1e-10);
        // Pressure on the upper side presses down.
        assert!(sum.z < 0.0);
        let square = [[0.0, 0.0], [2.0, 0.0], [2.0, 2.0], [0.0, 2.0]].map(|[x, y]| Vector3::new(x, y, 1.0));
        let mut forces = vec![Vector3::zeros(); 4];
        pressure_forces(&square, 100.0, &mut forces);
        for force in forces {
            assert!((force - Vector3::new(0.0, 0.0, -100.0)).norm() < 1e-12);
        }
    }
}
