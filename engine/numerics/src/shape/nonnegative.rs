//! Least squares in which some unknowns must not be negative, of least norm where many do as well.
//!
//! # Reference
//! Lawson & Hanson 1974.

use nalgebra::{DMatrix, DVector};

/// Weight of the norm of the solution beside the equations, over the largest entry: small enough to leave them alone, large
/// enough to choose among many solutions.
const NORM: f64 = 1e-6;
/// Share of the largest gradient from which on an unknown is worth freeing.
const WORTH: f64 = 1e-12;

/// Minimises `|A x − b|²`, then `|x|²`, with `x_k ≥ 0` except where `any_sign`.
///
/// Gives the minimiser also where the residual does not vanish; `None` if the iteration does not end.
pub(super) fn non_negative(a: &DMatrix<f64>, b: &DVector<f64>, any_sign: &[bool]) -> Option<DVector<f64>> {
    let (m, n) = a.shape();
    let mut stacked = DMatrix::zeros(m + n, n);
    stacked.rows_mut(0, m).copy_from(a);
    stacked.rows_mut(m, n).fill_diagonal(NORM * a.amax());
    let mut right = DVector::zeros(m + n);
    right.rows_mut(0, m).copy_from(b);
    let mut passive = any_sign.to_vec();
    let mut x = fitted(&stacked, &right, &passive);
    let worth = WORTH * (stacked.transpose() * &right).amax();
    for _ in 0..=4 * n {
        let gradient = stacked.transpose() * (&right - &stacked * &x);
        let next = (0..n)
            .filter(|k| !passive[*k] && gradient[*k] > worth)
            .max_by(|i, j| gradient[*i].total_cmp(&gradient[*j]));
        let Some(next) = next else {
            return Some(sharpened(a, b, &passive, any_sign, x));
        };
        passive[next] = true;
        for _ in 0..=n {
            let trial = fitted(&stacked, &right, &passive);
            let bounded = |k: &usize| passive[*k] && !any_sign[*k] && trial[*k] <= 0.0;
            let share = (0..n)
                .filter(bounded)
                .map(|k| x[k] / (x[k] - trial[k]))
                .fold(1.0, f64::min);
            if (0..n).all(|k| !bounded(&k)) {
                x = trial;
                break;
            }
            x += (&trial - &x) * share;
            for k in 0..n {
                if passive[k] && !any_sign[k] && x[k] <= 1e-14 * x.amax() {
                    (passive[k], x[k]) = (false, 0.0);
                }
            }
        }
    }
    None
}

/// Least squares over the passive unknowns; the others are zero.
fn fitted(a: &DMatrix<f64>, b: &DVector<f64>, passive: &[bool]) -> DVector<f64> {
    let mut masked = a.clone();
    for (mut column, _) in masked.column_iter_mut().zip(passive).filter(|(_, passive)| !**passive) {
        column.fill(0.0);
    }
    if masked.amax() == 0.0 {
        return DVector::zeros(a.ncols());
    }
    let svd = masked.svd(true, true);
    let least = 1e-12 * svd.singular_values.max();
    let mut x = svd.solve(b, least).expect("both sides were asked for");
    // Rounding must not bring the others in.
    for (x, _) in x.iter_mut().zip(passive).filter(|(_, passive)| !**passive) {
        *x = 0.0;
    }
    x
}

/// The same unknowns fitted to the equations alone, unless that takes one of them below zero.
fn sharpened(a: &DMatrix<f64>, b: &DVector<f64>, passive: &[bool], any_sign: &[bool], x: DVector<f64>) -> DVector<f64> {
    let exact = fitted(a, b, passive);
    if exact.iter().zip(any_sign).all(|(x, any)| *any || *x >= 0.0) {
        exact
    } else {
        x
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Against all choices of unknowns that are zero (brute force).
    #[test]
    fn agrees_with_trying_all_choices() {
        for seed in 0..40 {
            let entry =
                |k: usize| f64::from(u8::try_from((seed * 31 + k * k * 17 + k * 5) % 23).expect("small")) - 11.0;
            let a = DMatrix::from_fn(3, 5, |i, j| entry(5 * i + j));
            let b = DVector::from_fn(3, |i, _| entry(40 + i));
            let any_sign = [false, false, true, false, false];
            let found = non_negative(&a, &b, &any_sign).expect("it ends");
            assert!(found.iter().zip(any_sign).all(|(x, any)| any || *x >= 0.0), "{found}");
            let mut least = f64::INFINITY;
            for choice in 0..32_u32 {
                let passive: Vec<bool> = (0..5).map(|k| choice >> k & 1 == 1).collect();
                let x = fitted(&a, &b, &passive);
                if x.iter().zip(any_sign).all(|(x, any)| any || *x >= -1e-12) {
                    least = least.min((&a * x - &b).norm());
                }
            }
            assert!(((&a * &found - &b).norm() - least).abs() < 1e-8, "seed {seed}: {least}");
        }
    }
}
