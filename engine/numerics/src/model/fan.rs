//! A panel as triangles around the mean of its corners, and how what lies on it goes to the corners.
//!
//! ```text
//! m   = mean of the corners                a_k = ½ (x_k − m) × (x_k+1 − m)      area vector of triangle k
//! s_k = (a_k−1 + a_k) / 3 + Σ a / (3 n)    share of corner k: a third of each triangle for each of its vertices, the
//!                                          part of the mean to all corners alike
//! ```
//!
//! Corners run counter-clockwise seen from the outer side, so that area vectors point outwards. For a triangle all of
//! this gives a third of the area to each corner.

use std::ops::{Add, AddAssign, Div};

use nalgebra::Vector3;

/// Area vectors of the triangles (m²): of the corners `k`, `k + 1` and the mean.
#[must_use]
pub fn triangles(corners: &[Vector3<f64>]) -> Vec<Vector3<f64>> {
    let mean = corners.iter().sum::<Vector3<f64>>() / corners.len() as f64;
    (0..corners.len())
        .map(|k| {
            let (a, b) = (corners[k] - mean, corners[(k + 1) % corners.len()] - mean);
            0.5 * a.cross(&b)
        })
        .collect()
}

/// Derivative of [`triangles`] as the corners move by `moved` (m²).
#[must_use]
pub(crate) fn triangle_changes(corners: &[Vector3<f64>], moved: &[Vector3<f64>]) -> Vec<Vector3<f64>> {
    let n = corners.len() as f64;
    let mean = corners.iter().sum::<Vector3<f64>>() / n;
    let mean_moved = moved.iter().sum::<Vector3<f64>>() / n;
    (0..corners.len())
        .map(|k| {
            let next = (k + 1) % corners.len();
            let (a, b) = (corners[k] - mean, corners[next] - mean);
            let (da, db) = (moved[k] - mean_moved, moved[next] - mean_moved);
            0.5 * (da.cross(&b) + a.cross(&db))
        })
        .collect()
}

/// The transpose of [`triangle_changes`]: what gives with any movement of the corners the same product as `weights` with the
/// changes of the triangles.
#[must_use]
pub(crate) fn triangle_changes_transposed(corners: &[Vector3<f64>], weights: &[Vector3<f64>]) -> Vec<Vector3<f64>> {
    let n = corners.len();
    let mean = corners.iter().sum::<Vector3<f64>>() / n as f64;
    let mut result = vec![Vector3::zeros(); n];
    for k in 0..n {
        let next = (k + 1) % n;
        let (a, b) = (corners[k] - mean, corners[next] - mean);
        result[k] += 0.5 * b.cross(&weights[k]);
        result[next] += 0.5 * weights[k].cross(&a);
    }
    let of_mean = result.iter().sum::<Vector3<f64>>() / n as f64;
    result.iter_mut().for_each(|r| *r -= of_mean);
    result
}

/// The transpose of [`to_corners`]: what of the corners comes from each triangle.
#[must_use]
pub(crate) fn from_corners(corners: &[Vector3<f64>]) -> Vec<Vector3<f64>> {
    let n = corners.len();
    let of_mean = corners.iter().sum::<Vector3<f64>>() / (3.0 * n as f64);
    (0..n)
        .map(|k| (corners[k] + corners[(k + 1) % n]) / 3.0 + of_mean)
        .collect()
}

/// What of the triangles goes to each corner.
#[must_use]
pub fn to_corners<T>(triangles: &[T]) -> Vec<T>
where
    T: Copy + Add<Output = T> + AddAssign + Div<f64, Output = T>,
{
    let n = triangles.len();
    let mut sum = triangles[0];
    triangles[1..].iter().for_each(|t| sum += *t);
    let of_mean = sum / (3.0 * n as f64);
    (0..n)
        .map(|k| (triangles[(k + n - 1) % n] + triangles[k]) / 3.0 + of_mean)
        .collect()
}

/// Area of a panel (m²): the sum of its triangles.
#[must_use]
pub fn area(corners: &[Vector3<f64>]) -> f64 {
    triangles(corners).iter().map(|a| a.norm()).sum()
}

/// Area of a panel on plan (m²): positive where its outer side faces up.
#[must_use]
pub fn signed_area_on_plan(corners: &[Vector3<f64>]) -> f64 {
    triangles(corners).iter().map(|a| a.z).sum()
}

/// Centre of the area of a panel on plan (m); the mean of the corners where it has none.
#[must_use]
pub fn centre(corners: &[Vector3<f64>]) -> Vector3<f64> {
    let n = corners.len();
    let mean = corners.iter().sum::<Vector3<f64>>() / n as f64;
    let areas = triangles(corners);
    let total: f64 = areas.iter().map(|a| a.z).sum();
    let size: f64 = areas.iter().map(|a| a.norm()).sum();
    if total.abs() <= 1e-6 * size {
        return mean;
    }
    let moment: Vector3<f64> = (0..n)
        .map(|k| (mean + corners[k] + corners[(k + 1) % n]) * (areas[k].z / 3.0))
        .sum();
    moment / total
}

#[cfg(test)]
mod tests {
    use super::*;

    fn corners() -> Vec<Vector3<f64>> {
        [
            [0.0, 0.0, 1.0],
            [4.0, -0.5, 0.2],
            [5.0, 3.0, 0.9],
            [2.0, 4.5, 0.0],
            [-0.5, 2.0, 0.4],
        ]
        .map(Vector3::from)
        .to_vec()
    }

    /// The area vector of an outline is `½ Σ x_k × x_k+1` whatever spans it (Stokes).
    #[test]
    fn shares_add_up_to_the_area_vector_of_the_outline() {
        let corners = corners();
        let n = corners.len();
        let outline: Vector3<f64> = (0..n).map(|k| 0.5 * corners[k].cross(&corners[(k + 1) % n])).sum();
        let shares = to_corners(&triangles(&corners));
        assert!((shares.iter().sum::<Vector3<f64>>() - outline).norm() < 1e-14 * outline.norm() * 10.0);
        assert!((signed_area_on_plan(&corners) - outline.z).abs() < 1e-13);
    }

    #[test]
    fn a_triangle_gives_a_third_to_each_corner() {
        let corners = &corners()[..3];
        let whole = 0.5 * (corners[1] - corners[0]).cross(&(corners[2] - corners[0]));
        for share in to_corners(&triangles(corners)) {
            assert!((share - whole / 3.0).norm() < 1e-14);
        }
        assert!((area(corners) - whole.norm()).abs() < 1e-14);
        let mean = corners.iter().sum::<Vector3<f64>>() / 3.0;
        assert!((centre(corners) - mean).norm() < 1e-14);
    }

    #[test]
    fn changes_are_the_slope_of_the_triangles() {
        let corners = corners();
        let moved: Vec<_> = (0..5)
            .map(|k| Vector3::new(0.3 - 0.1 * f64::from(k), 0.2 * f64::from(k), 0.5))
            .collect();
        let at = |t: f64| -> Vec<_> { corners.iter().zip(&moved).map(|(x, m)| x + t * m).collect() };
        let step = 1e-5;
        let (after, before) = (triangles(&at(step)), triangles(&at(-step)));
        let changes = triangle_changes(&corners, &moved);
        for k in 0..5 {
            assert!(((after[k] - before[k]) / (2.0 * step) - changes[k]).norm() < 1e-9);
        }
    }

    #[test]
    fn transposes_give_the_same_products() {
        let corners = corners();
        let vectors = |a: f64| -> Vec<Vector3<f64>> {
            let one = |k: i32| Vector3::new((a * f64::from(k)).cos(), a - f64::from(k), (a + f64::from(k)).sin());
            (0..5).map(one).collect()
        };
        let dot = |a: &[Vector3<f64>], b: &[Vector3<f64>]| -> f64 { a.iter().zip(b).map(|(a, b)| a.dot(b)).sum() };
        let (moved, weights) = (vectors(0.7), vectors(1.9));
        let forward = dot(&weights, &triangle_changes(&corners, &moved));
        let backward = dot(&triangle_changes_transposed(&corners, &weights), &moved);
        assert!((forward - backward).abs() < 1e-12 * forward.abs());
        let forward = dot(&weights, &to_corners(&moved));
        assert!((forward - dot(&from_corners(&weights), &moved)).abs() < 1e-12 * forward.abs());
    }

    #[test]
    fn the_centre_of_a_rectangle_with_a_node_in_a_side_is_its_middle() {
        let corners = [
            [0.0, 0.0, 0.0],
            [1.0, 0.0, 0.0],
            [4.0, 0.0, 0.0],
            [4.0, 2.0, 0.0],
            [0.0, 2.0, 0.0],
        ];
        let centre = centre(&corners.map(Vector3::from));
        assert!((centre - Vector3::new(2.0, 1.0, 0.0)).norm() < 1e-14);
    }
}
