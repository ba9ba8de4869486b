//! A surface over plan, given by scattered points.
//!
//! ```text
//! height(x, y) = a0,   a = argmin Σ_k w_k (b(x_k − x, y_k − y)·a − z_k)²,   w_k = (1 + d_k²/h²)⁻⁴
//! ```
//!
//! Moving least squares: `b` are the monomials up to the second degree, or up to the first where the points do not decide
//! a second, `d` the distance in plan and `h` the mean spacing of the points. Surfaces of that degree are met exactly,
//! noise is smoothed over about the spacing, and the slope is exact and continuous.
//!
//! # Reference
//! Lancaster & Salkauskas 1981.

use nalgebra::{DMatrix, DVector, Vector2, Vector3};

/// Singular values of the monomials at the points below this share of the largest count as zero.
const RANK: f64 = 1e-6;

/// Whether scattered points give a surface over plan: three or more, not on one line.
#[must_use]
pub fn gives_surface(points: &[Vector3<f64>]) -> bool {
    Surface::new(points).is_some()
}

/// The surface.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Surface {
    points: Vec<Vector3<f64>>,
    spacing: f64,
    terms: usize,
}

impl Surface {
    /// `None` if the points lie on a line in plan, or are fewer than three.
    pub(super) fn new(points: &[Vector3<f64>]) -> Option<Self> {
        let first = points.first()?.xy();
        let (least, most) = points.iter().fold((first, first), |(least, most), p| {
            (least.inf(&p.xy()), most.sup(&p.xy()))
        });
        let extent = (most - least).norm();
        let spacing = extent / (points.len() as f64).sqrt();
        let middle = 0.5 * (least + most);
        let decide = |terms: usize| {
            let rows = DMatrix::from_fn(points.len(), terms, |row, term| {
                monomials((points[row].xy() - middle) / extent)[term]
            });
            let values = rows.singular_values();
            points.len() >= terms && values.min() > RANK * values.max()
        };
        let usable = spacing > 0.0 && points.iter().all(|p| p.iter().all(|x| x.is_finite()));
        let terms = [6, 3].into_iter().find(|terms| usable && decide(*terms))?;
        Some(Self {
            points: points.to_vec(),
            spacing,
            terms,
        })
    }

    /// Height at a place in plan (m) and its slope (–).
    pub(super) fn height(&self, at: Vector2<f64>) -> (f64, Vector2<f64>) {
        let n = self.terms;
        let (mut normal, mut right) = (DMatrix::<f64>::zeros(n, n), DVector::<f64>::zeros(n));
        let mut normal_slope = [normal.clone(), normal.clone()];
        let mut right_slope = [right.clone(), right.clone()];
        for point in &self.points {
            // In spacings, so that the monomials are of like size.
            let apart = (point.xy() - at) / self.spacing;
            let base = monomials(apart);
            let base_slope = monomial_slopes(apart);
            let near = 1.0 + apart.norm_squared();
            let weight = near.powi(-4);
            // Moving the place moves `apart` the other way.
            let weight_slope = apart * (8.0 * near.powi(-5));
            for i in 0..n {
                right[i] += weight * base[i] * point.z;
                for j in 0..n {
                    normal[(i, j)] += weight * base[i] * base[j];
                }
                for axis in 0..2 {
                    right_slope[axis][i] += (weight_slope[axis] * base[i] - weight * base_slope[axis][i]) * point.z;
                    for j in 0..n {
                        normal_slope[axis][(i, j)] += weight_slope[axis] * base[i] * base[j]
                            - weight * (base_slope[axis][i] * base[j] + base[i] * base_slope[axis][j]);
                    }
                }
            }
        }
        let Some(cholesky) = normal.cholesky() else {
            return (f64::NAN, Vector2::zeros());
        };
        let fit = cholesky.solve(&right);
        let slope = |axis: usize| cholesky.solve(&(&right_slope[axis] - &normal_slope[axis] * &fit))[0] / self.spacing;
        (fit[0], Vector2::new(slope(0), slope(1)))
    }
}

fn monomials(at: Vector2<f64>) -> [f64; 6] {
    [1.0, at.x, at.y, at.x * at.x, at.x * at.y, at.y * at.y]
}

fn monomial_slopes(at: Vector2<f64>) -> [[f64; 6]; 2] {
    [
        [0.0, 1.0, 0.0, 2.0 * at.x, at.y, 0.0],
        [0.0, 0.0, 1.0, 0.0, at.x, 2.0 * at.y],
    ]
}

#[cfg(test)]
mod tests {
    use super::*;

    fn scattered(height: impl Fn(f64, f64) -> f64) -> Vec<Vector3<f64>> {
        (0..60)
            .map(|k| {
                let (x, y) = (f64::from(k * 37 % 61) / 4.0, f64::from(k * 23 % 59) / 5.0);
                Vector3::new(x, y, height(x, y))
            })
            .collect()
    }

    /// Second degree is reproduced, by the construction of the method (closed form).
    #[test]
    fn a_hyperbolic_paraboloid_is_met() {
        let hypar = |x: f64, y: f64| 2.0 + 0.1 * x - 0.3 * y + 0.05 * x * y - 0.01 * x * x;
        let surface = Surface::new(&scattered(hypar)).expect("a surface");
        for (x, y) in [(3.0, 4.0), (11.5, 0.3), (7.77, 9.1)] {
            let (height, slope) = surface.height(Vector2::new(x, y));
            assert!((height - hypar(x, y)).abs() < 1e-10);
            assert!((slope.x - (0.1 + 0.05 * y - 0.02 * x)).abs() < 1e-9);
            assert!((slope.y - (-0.3 + 0.05 * x)).abs() < 1e-9);
        }
    }

    #[test]
    fn the_slope_is_that_of_the_height() {
        let surface = Surface::new(&scattered(|x, y| (0.4 * x).sin() * (0.3 * y).cos())).expect("a surface");
        let at = Vector2::new(6.2, 5.1);
        let (_, slope) = surface.height(at);
        let h = 1e-3;
        for axis in 0..2 {
            let height = |t: f64| {
                let mut moved = at;
                moved[axis] += t * h;
                surface.height(moved).0
            };
            let difference = (8.0 * (height(1.0) - height(-1.0)) - (height(2.0) - height(-2.0))) / (12.0 * h);
            assert!((slope[axis] - difference).abs() < 1e-9, "{slope} {difference}");
        }
    }

    #[test]
    fn three_points_give_a_plane_and_a_line_gives_nothing() {
        let points = [[0.0, 0.0, 1.0], [4.0, 0.0, 2.0], [0.0, 2.0, 4.0]].map(Vector3::from);
        let (height, slope) = Surface::new(&points).expect("a plane").height(Vector2::new(2.0, 1.0));
        assert!((height - 3.0).abs() < 1e-12 && (slope.x - 0.25).abs() < 1e-12 && (slope.y - 1.5).abs() < 1e-12);
        let line: Vec<Vector3<f64>> = (0..9)
            .map(|k| Vector3::new(f64::from(k), 2.0 * f64::from(k), 1.0))
            .collect();
        assert_eq!(Surface::new(&line), None);
        assert_eq!(Surface::new(&points[..2]), None);
        assert_eq!(Surface::new(&[points[0]; 5]), None);
    }
}
