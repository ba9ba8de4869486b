//! Least eigenvalues of a sparse symmetric matrix.
//!
//! ```text
//! X ← orth((K − σ I)⁻¹ X),   H = Xᵀ K X = Q Λ Qᵀ,   X ← X Q       σ below the least eigenvalue
//! ```
//! Subspace iteration with a Rayleigh–Ritz step (Parlett 1980). The shift is sought so that Cholesky accepts the shifted
//! matrix, which proves that it lies below every eigenvalue: none is passed over on its lower side.

use nalgebra::DMatrix;

use super::linear::Factor;
use crate::assembly::Pattern;

/// First shift, over the largest entry of the diagonal: rounding reaches there.
const FIRST_SHIFT: f64 = 1e-11;
/// Residual over the eigenvalue at which a pair is good enough; the value then is as good as the square of that.
const RESIDUAL: f64 = 1e-6;
/// The same over the largest entry, which rounding of the product makes.
const ROUNDING: f64 = 1e-13;
const ROUNDS: u32 = 150;
/// Rounds after which a shift nearer to the least eigenvalue is tried: the nearer, the faster.
const CLOSER_EVERY: u32 = 6;

/// An eigenvalue with its vector.
#[derive(Clone, Debug, PartialEq)]
pub struct EigenPair {
    /// The eigenvalue: the Rayleigh quotient of the vector.
    pub value: f64,
    /// Unit vector along the rows of the matrix.
    pub vector: Vec<f64>,
    /// `|K x − λ x|`: some eigenvalue lies within this of `value`.
    pub residual: f64,
}

/// The least `count` eigenvalues in rising order, or all where there are fewer.
///
/// `values`: lower triangle by the entries of `pattern`, whose factor `factor` makes. Empty where the matrix has no row,
/// or numbers beyond use.
#[must_use]
pub fn least(pattern: &Pattern, factor: &mut Factor, values: &[f64], count: usize) -> Vec<EigenPair> {
    let size = pattern.size();
    if size == 0 || count == 0 {
        return Vec::new();
    }
    let Some(mut shift) = shift_below(pattern, factor, values) else {
        return Vec::new();
    };
    let largest = largest_on_diagonal(pattern, values);
    let count = count.min(size);
    let width = (2 * count + 6).min(size);
    // Vectors without symmetry, so that each has a part along every eigenvector.
    let mut block = DMatrix::from_fn(size, width, |i, j| {
        let spread = (i * (2 * j + 37) + 13 * j) % 101;
        1.0 + spread as f64 / 101.0 - if j > 0 { 1.5 } else { 0.0 }
    });
    let mut product = DMatrix::zeros(size, width);
    let (mut quotients, mut residuals) = (vec![f64::NAN; width], vec![f64::INFINITY; width]);
    for round in 1..=ROUNDS {
        factor.solve_in_place(block.as_mut_slice());
        orthonormalise(&mut block);
        for (x, kx) in block.column_iter().zip(product.column_iter_mut()) {
            let mut kx = kx;
            pattern.product_into(values, x.as_slice(), kx.as_mut_slice());
        }
        let mut small = block.transpose() * &product;
        small = 0.5 * (&small + small.transpose());
        if small.iter().any(|entry| !entry.is_finite()) {
            return Vec::new();
        }
        let eigen = small.symmetric_eigen();
        let mut order: Vec<usize> = (0..width).collect();
        order.sort_by(|a, b| eigen.eigenvalues[*a].total_cmp(&eigen.eigenvalues[*b]));
        let turn = DMatrix::from_fn(width, width, |i, j| eigen.eigenvectors[(i, order[j])]);
        block = &block * &turn;
        product = &product * turn;
        for j in 0..width {
            let value = eigen.eigenvalues[order[j]];
            quotients[j] = value;
            residuals[j] = (product.column(j) - block.column(j) * value).norm();
        }
        let is_good = |j: usize| residuals[j] <= RESIDUAL * quotients[j].abs() + ROUNDING * largest;
        if (0..count).all(is_good) {
            break;
        }
        if round % CLOSER_EVERY == 0 {
            let room = (2.0 * residuals[0]).max(0.1 * (quotients[width - 1] - quotients[0]));
            let closer = quotients[0] - room.max(FIRST_SHIFT * largest);
            if closer > shift {
                // Where it is not below all of them after all, the old one still is.
                if factor.cholesky(&shifted(pattern, values, closer)).is_ok() {
                    shift = closer;
                } else if factor.cholesky(&shifted(pattern, values, shift)).is_err() {
                    return Vec::new();
                }
            }
        }
    }
    (0..count)
        .map(|j| EigenPair {
            value: quotients[j],
            vector: block.column(j).iter().copied().collect(),
            residual: residuals[j],
        })
        .collect()
}

/// How many eigenvalues lie below `limit`; `None` where no pivot near it is fit to be trusted.
///
/// Signs of the pivots of `K − limit I` (Sylvester's law of inertia).
#[must_use]
pub fn count_below(pattern: &Pattern, factor: &mut Factor, values: &[f64], limit: f64) -> Option<usize> {
    let largest = largest_on_diagonal(pattern, values);
    // A pivot that nearly vanishes spoils the signs of the others: a limit beside it does as well.
    [1.0, 1.13, 0.87, 1.31, 0.69].into_iter().find_map(|share| {
        let inertia = factor.ldlt(&shifted(pattern, values, limit * share)).ok()?;
        (inertia.smallest.abs() > 1e-14 * largest.max(limit.abs())).then_some(inertia.negative)
    })
}

/// The largest entry of the diagonal by size; 1 where all of them vanish, for any measure serves there.
#[must_use]
pub fn largest_on_diagonal(pattern: &Pattern, values: &[f64]) -> f64 {
    let starts = pattern.column_starts();
    let largest = (0..pattern.size())
        .map(|row| values[starts[row]].abs())
        .fold(0.0, f64::max);
    if largest > 0.0 { largest } else { 1.0 }
}

fn shifted(pattern: &Pattern, values: &[f64], shift: f64) -> Vec<f64> {
    let mut shifted = values.to_vec();
    for row in 0..pattern.size() {
        shifted[pattern.column_starts()[row]] -= shift;
    }
    shifted
}

/// A shift below every eigenvalue, with the shifted matrix factorised.
fn shift_below(pattern: &Pattern, factor: &mut Factor, values: &[f64]) -> Option<f64> {
    let mut shift = -FIRST_SHIFT * largest_on_diagonal(pattern, values);
    while factor.cholesky(&shifted(pattern, values, shift)).is_err() {
        shift *= 4.0;
        if !shift.is_finite() {
            return None;
        }
    }
    Some(shift)
}

/// Makes the columns orthonormal; twice is enough (Parlett 1980, Kahan's remark).
fn orthonormalise(block: &mut DMatrix<f64>) {
    for j in 0..block.ncols() {
        let scale = block.column(j).amax();
        if scale > 0.0 {
            block.column_mut(j).unscale_mut(scale);
        }
        for _ in 0..2 {
            for i in 0..j {
                let other = block.column(i).into_owned();
                let along = other.dot(&block.column(j));
                block.column_mut(j).axpy(-along, &other, 1.0);
            }
            let norm = block.column(j).norm();
            if norm > 0.0 {
                block.column_mut(j).unscale_mut(norm);
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use nalgebra_sparse::{CooMatrix, CsrMatrix};

    use super::*;
    use crate::equilibrium::linear::Symbolic;

    /// Second differences on a line of `n` points: `4 sin²(j π / (2 (n + 1)))` (standard), each twice where `twice`.
    fn line(n: usize, twice: bool) -> (Pattern, Vec<f64>) {
        let size = if twice { 2 } else { 1 };
        let mut graph = CooMatrix::new(n, n);
        for i in 1..n {
            graph.push(i, i - 1, 1.0);
            graph.push(i - 1, i, 1.0);
        }
        let pattern = Pattern::new(&vec![size; n], &CsrMatrix::from(&graph));
        let mut values = vec![0.0; pattern.n_entries()];
        for row in 0..pattern.size() {
            values[pattern.position(row, row).unwrap()] = 2.0;
            if row + size < pattern.size() {
                values[pattern.position(row + size, row).unwrap()] = -1.0;
            }
        }
        (pattern, values)
    }

    fn exact(n: usize, j: usize) -> f64 {
        let half = std::f64::consts::PI * j as f64 / (2 * (n + 1)) as f64;
        4.0 * half.sin().powi(2)
    }

    #[test]
    fn a_chain_of_springs() {
        for twice in [false, true] {
            let (pattern, values) = line(80, twice);
            let mut factor = Factor::new(Arc::new(Symbolic::new(&pattern)));
            let pairs = least(&pattern, &mut factor, &values, 4);
            for (j, pair) in pairs.iter().enumerate() {
                let wanted = exact(80, if twice { j / 2 + 1 } else { j + 1 });
                assert!((pair.value - wanted).abs() <= 1e-10 * wanted, "{} {wanted}", pair.value);
                assert!(pair.residual <= 1e-5 * wanted);
            }
            let between = 0.5 * (exact(80, 5) + exact(80, 6));
            let below = count_below(&pattern, &mut factor, &values, between);
            assert_eq!(below, Some(if twice { 10 } else { 5 }));
        }
    }

    #[test]
    fn eigenvalues_below_zero_and_at_zero() {
        let (pattern, mut values) = line(30, false);
        for shift in [0.0, exact(30, 1), exact(30, 3) + 0.01, 50.0] {
            values.copy_from_slice(&line(30, false).1);
            for row in 0..30 {
                values[pattern.column_starts()[row]] -= shift;
            }
            let mut factor = Factor::new(Arc::new(Symbolic::new(&pattern)));
            for (j, pair) in least(&pattern, &mut factor, &values, 3).iter().enumerate() {
                let wanted = exact(30, j + 1) - shift;
                assert!((pair.value - wanted).abs() <= 1e-9, "{shift}: {} {wanted}", pair.value);
            }
        }
    }

    #[test]
    fn fewer_rows_than_wanted() {
        let (pattern, values) = line(2, false);
        let mut factor = Factor::new(Arc::new(Symbolic::new(&pattern)));
        let pairs = least(&pattern, &mut factor, &values, 9);
        let found: Vec<f64> = pairs.iter().map(|p| (p.value * 1e12).round() / 1e12).collect();
        assert_eq!(found, [1.0, 3.0]);
    }
}
