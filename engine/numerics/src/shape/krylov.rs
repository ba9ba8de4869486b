//! Generalised minimal residuals, for matrices that are nearly the one that was factorised.

/// Relative residual at which a system counts as solved: the steps that use it are repeated or only nearly right anyway.
const SOLVED: f64 = 1e-10;
const MAX_VECTORS: usize = 40;

/// Solves `A x = b` with `M⁻¹` from the left: `A` and `M` differ little, so a few vectors do.
///
/// `product`: `v → A v`. `precondition`: `v → M⁻¹ v` in place.
///
/// # Reference
/// Saad & Schultz 1986.
pub(super) fn gmres(
    mut product: impl FnMut(&[f64]) -> Vec<f64>,
    mut precondition: impl FnMut(&mut [f64]),
    right_hand_side: Vec<f64>,
) -> Vec<f64> {
    let n = right_hand_side.len();
    let mut first = right_hand_side;
    precondition(&mut first);
    let size = norm(&first);
    if size == 0.0 || !size.is_finite() {
        return first;
    }
    first.iter_mut().for_each(|v| *v /= size);
    let mut basis = vec![first];
    // Hessenberg matrix by columns, made triangular by rotations as it grows.
    let mut columns: Vec<Vec<f64>> = Vec::new();
    let mut rotations: Vec<(f64, f64)> = Vec::new();
    let mut rest = vec![size];
    while columns.len() < MAX_VECTORS.min(n) {
        let mut next = product(basis.last().expect("never empty"));
        precondition(&mut next);
        let before = norm(&next);
        let mut column = vec![0.0; basis.len() + 1];
        // Twice keeps the basis orthogonal to rounding.
        for _ in 0..2 {
            for (entry, vector) in column.iter_mut().zip(&basis) {
                let along: f64 = next.iter().zip(vector).map(|(a, b)| a * b).sum();
                next.iter_mut().zip(vector).for_each(|(a, b)| *a -= along * b);
                *entry += along;
            }
        }
        let beside = norm(&next);
        *column.last_mut().expect("never empty") = beside;
        for (k, (c, s)) in rotations.iter().enumerate() {
            (column[k], column[k + 1]) = (c * column[k] + s * column[k + 1], c * column[k + 1] - s * column[k]);
        }
        let k = columns.len();
        let radius = column[k].hypot(column[k + 1]);
        let (c, s) = if radius > 0.0 {
            (column[k] / radius, column[k + 1] / radius)
        } else {
            (1.0, 0.0)
        };
        column[k] = radius;
        column.truncate(k + 1);
        rotations.push((c, s));
        columns.push(column);
        let carried = rest[k];
        rest[k] = c * carried;
        rest.push(-s * carried);
        if rest[k + 1].abs() <= SOLVED * size || beside <= 1e-15 * before {
            break;
        }
        next.iter_mut().for_each(|v| *v /= beside);
        basis.push(next);
    }
    let m = columns.len();
    let mut weights = vec![0.0; m];
    for k in (0..m).rev() {
        let known: f64 = (k + 1..m).map(|j| columns[j][k] * weights[j]).sum();
        weights[k] = (rest[k] - known) / columns[k][k];
    }
    let mut solution = vec![0.0; n];
    for (weight, vector) in weights.iter().zip(&basis) {
        solution.iter_mut().zip(vector).for_each(|(x, v)| *x += weight * v);
    }
    solution
}

fn norm(v: &[f64]) -> f64 {
    v.iter().map(|x| x * x).sum::<f64>().sqrt()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn solves_a_system_near_its_preconditioner() {
        let n = 12;
        let entry = |i: usize, j: usize| match (i, j) {
            _ if i == j => 3.0 + i as f64,
            _ => 0.3 * ((7 * i + 3 * j) % 5) as f64 - 0.5,
        };
        let product = |v: &[f64]| -> Vec<f64> { (0..n).map(|i| (0..n).map(|j| entry(i, j) * v[j]).sum()).collect() };
        let wanted: Vec<f64> = (0..n).map(|i| (i as f64).cos()).collect();
        let found = gmres(
            product,
            |v| v.iter_mut().enumerate().for_each(|(i, x)| *x /= entry(i, i)),
            product(&wanted),
        );
        for (a, b) in found.iter().zip(&wanted) {
            assert!((a - b).abs() < 1e-8);
        }
    }
}
