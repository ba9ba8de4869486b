//! Force densities for which families have their wanted mean tensions.
//!
//! ```text
//! unknown  y_f = ln |q_f|            so that no rope comes to push
//! wanted   c_f(y) = ln (mean T / wanted) = 0
//! step     (Jᵀ J + λ I) δ = −Jᵀ c,   λ = μ |c|²
//! ```
//!
//! `J` is exact, by one right-hand side a family with the matrix factorised at the balanced shape. With `λ` falling as `|c|²` the
//! end is quadratic, also where the tensions are not independent.
//!
//! # Reference
//! Force densities and their derivatives: Schek 1974. Damping with `|c|²`: Yamashita & Fukushima 2001.

use nalgebra::{DMatrix, DVector, Vector3};

use super::ShapeError;
use super::search::{Point, Search};

/// Deviation of a mean tension from the wanted one at which it is met.
pub(super) const MET: f64 = 1e-10;
/// Deviation below which the search for better force densities ends at once.
const MET_TO_ROUNDING: f64 = 1e-13;
const MAX_STEPS: usize = 200;
/// Longest step of a logarithm: no force density changes by more than a factor of about 7 at once.
const LONGEST_STEP: f64 = 2.0;
/// Singular values of `J` smaller than this share of the largest count as zero.
const RANK: f64 = 1e-8;

/// What the search for force densities came to.
pub(super) struct Densities {
    pub(super) point: Point,
    /// Force density of each family (N/m).
    pub(super) densities: Vec<f64>,
    /// Mean axial force of each family (N).
    pub(super) means: Vec<f64>,
    /// Whether every wanted tension is met.
    pub(super) met: bool,
    /// How many tensions can be chosen independently; worked out where some are not met.
    pub(super) rank: usize,
}

impl Search<'_, '_> {
    /// Finds force densities of all families from a start.
    ///
    /// `densities`: to start from (N/m). `start`: positions to start from (m).
    pub(super) fn with_wanted_tensions(
        &mut self,
        start: Vec<Vector3<f64>>,
        densities: Vec<f64>,
    ) -> Result<Densities, ShapeError> {
        let n = self.parts.families.len();
        let mut point = self.balanced(start, &densities)?;
        let mut densities = densities;
        if n > 0 {
            self.approach(&mut point, &mut densities)?;
        }
        let mut misses = self.misses(&point, &densities);
        let mut damping = 1e-3;
        let mut stale = 0;
        for _ in 0..MAX_STEPS {
            if misses.amax() <= MET_TO_ROUNDING || stale >= 8 {
                break;
            }
            let jacobian = self.jacobian(&point, &densities)?;
            let size = misses.norm();
            let mut improved = false;
            while !improved && damping < 1e12 {
                let step = damped_step(&jacobian, &misses, damping * size * size);
                let trial: Vec<f64> = densities.iter().zip(&step).map(|(q, d)| q * d.exp()).collect();
                match self.balanced(point.positions.clone(), &trial) {
                    Ok(next) => {
                        let next_misses = self.misses(&next, &trial);
                        if next_misses.norm() < size {
                            improved = true;
                            // Creeping is not progress: several steps of it end the search.
                            stale = if next_misses.norm() > 0.98 * size { stale + 1 } else { 0 };
                            damping = (damping * 0.2).max(1e-12);
                            (point, densities, misses) = (next, trial, next_misses);
                            continue;
                        }
                    }
                    Err(ShapeError::Cancelled) => return Err(ShapeError::Cancelled),
                    Err(_) => {}
                }
                if misses.amax() <= MET {
                    // Within rounding of the balance no step need improve.
                    break;
                }
                damping *= 5.0;
            }
            if !improved {
                break;
            }
        }
        let met = misses.iter().all(|c| c.abs() <= MET);
        let rank = if met {
            n
        } else {
            rank(&self.jacobian(&point, &densities)?)
        };
        let means = self.means(&point);
        Ok(Densities {
            point,
            densities,
            means,
            met,
            rank,
        })
    }

    /// A few rounds of `q ← q wanted / mean T`: crude, but it can not go astray.
    fn approach(&mut self, point: &mut Point, densities: &mut [f64]) -> Result<(), ShapeError> {
        for _ in 0..6 {
            let misses = self.misses(point, densities);
            if misses.amax() <= 0.1 {
                break;
            }
            for (q, miss) in densities.iter_mut().zip(&misses) {
                *q *= (-miss).clamp(-LONGEST_STEP, LONGEST_STEP).exp();
            }
            *point = self.balanced(std::mem::take(&mut point.positions), densities)?;
        }
        Ok(())
    }

    /// Mean axial force of each family (N).
    pub(super) fn means(&self, point: &Point) -> Vec<f64> {
        let mean =
            |segments: &[usize]| segments.iter().map(|e| point.axial_forces[*e]).sum::<f64>() / segments.len() as f64;
        self.parts.families.iter().map(|f| mean(&f.segments)).collect()
    }

    fn misses(&self, point: &Point, densities: &[f64]) -> DVector<f64> {
        let wanted = self.parts.families.iter().map(|f| f.wanted);
        let means = self.means(point);
        DVector::from_iterator(
            densities.len(),
            means.iter().zip(wanted).map(|(mean, wanted)| {
                // The logarithm keeps its sign and digits down to nothing, and stays finite there.
                (mean / wanted).max(1e-30).ln()
            }),
        )
    }
}

fn damped_step(jacobian: &DMatrix<f64>, misses: &DVector<f64>, damping: f64) -> DVector<f64> {
    let n = jacobian.ncols();
    // Stacked rows instead of Jᵀ J keep the digits of nearly dependent tensions.
    let mut stacked = DMatrix::zeros(2 * n, n);
    stacked.rows_mut(0, n).copy_from(jacobian);
    let mut right = DVector::zeros(2 * n);
    right.rows_mut(0, n).copy_from(&-misses);
    for k in 0..n {
        stacked[(n + k, k)] = damping.sqrt().max(1e-14);
    }
    let qr = stacked.qr();
    let reduced = qr.q().transpose() * right;
    let step = qr
        .r()
        .solve_upper_triangular(&reduced)
        .unwrap_or_else(|| DVector::zeros(n));
    let longest = step.amax();
    if longest > LONGEST_STEP {
        step * (LONGEST_STEP / longest)
    } else {
        step
    }
}

fn rank(jacobian: &DMatrix<f64>) -> usize {
    let values = jacobian.clone().singular_values();
    values.iter().filter(|v| **v > RANK * values.max()).count()
}
