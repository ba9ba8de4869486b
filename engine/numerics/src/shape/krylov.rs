//! Generalised minimal residuals, for matrices that are nearly the one that was factorised.

/// Relative residual at which a system counts as solved: the steps that use it are repeated or only nearly right anyway.
const SOLVED: f64 = 1e-10;
const MAX_VECTORS: usize = 40;

/// Solves `A x = b` with `M⁻¹` from the left: `A` and `M` differ little, so a few vectors do.
///
/// `size`: rows of `A`. `product`: `v → A v`. `precondition`: `v → M⁻¹ v` in place, for several vectors one after the
/// other: the systems go on side by side, each until it is solved, so that `M⁻¹` is read once for all of them.
/// `right_hand_sides`: one after the other, as the solutions are.
///
/// # Reference
/// Saad & Schultz 1986.
pub(super) fn gmres(
    size: usize,
    mut product: impl FnMut(&[f64]) -> Vec<f64>,
    mut precondition: impl FnMut(&mut [f64]),
    right_hand_sides: Vec<f64>,
) -> Vec<f64> {
    if size == 0 {
        return right_hand_sides;
    }
    let mut first = right_hand_sides;
    precondition(&mut first);
    let mut systems: Vec<System> = first.chunks_exact(size).map(System::new).collect();
    drop(first);
    loop {
        let mut next: Vec<f64> = Vec::new();
        for system in systems.iter().filter(|system| system.goes_on) {
            next.extend(product(system.basis.last().expect("never empty")));
        }
        if next.is_empty() {
            break;
        }
        precondition(&mut next);
        let open = systems.iter_mut().filter(|system| system.goes_on);
        for (system, next) in open.zip(next.chunks_exact(size)) {
            system.take(next.to_vec());
        }
    }
    systems.iter().flat_map(System::solution).collect()
}

/// One system on its way: an orthonormal basis, and the least squares problem in it.
struct System {
    basis: Vec<Vec<f64>>,
    /// Hessenberg matrix by columns, made triangular by rotations as it grows.
    columns: Vec<Vec<f64>>,
    rotations: Vec<(f64, f64)>,
    rest: Vec<f64>,
    /// Size of the right-hand side.
    size: f64,
    goes_on: bool,
}

impl System {
    fn new(right_hand_side: &[f64]) -> Self {
        let size = norm(right_hand_side);
        let mut first = right_hand_side.to_vec();
        let goes_on = size != 0.0 && size.is_finite();
        if goes_on {
            first.iter_mut().for_each(|v| *v /= size);
        }
        Self {
            basis: vec![first],
            columns: Vec::new(),
            rotations: Vec::new(),
            rest: vec![size],
            size,
            goes_on,
        }
    }

    /// Takes in `M⁻¹ A` times the last vector of the basis.
    fn take(&mut self, mut next: Vec<f64>) {
        let before = norm(&next);
        let mut column = vec![0.0; self.basis.len() + 1];
        // Twice keeps the basis orthogonal to rounding.
        for _ in 0..2 {
            for (entry, vector) in column.iter_mut().zip(&self.basis) {
                let along: f64 = next.iter().zip(vector).map(|(a, b)| a * b).sum();
                next.iter_mut().zip(vector).for_each(|(a, b)| *a -= along * b);
                *entry += along;
            }
        }
        let beside = norm(&next);
        *column.last_mut().expect("never empty") = beside;
        for (k, (c, s)) in self.rotations.iter().enumerate() {
            (column[k], column[k + 1]) = (c * column[k] + s * column[k + 1], c * column[k + 1] - s * column[k]);
        }
        let k = self.columns.len();
        let radius = column[k].hypot(column[k + 1]);
        let (c, s) = if radius > 0.0 {
            (column[k] / radius, column[k + 1] / radius)
        } else {
            (1.0, 0.0)
        };
        column[k] = radius;
        column.truncate(k + 1);
        self.rotations.push((c, s));
        self.columns.push(column);
        let carried = self.rest[k];
        self.rest[k] = c * carried;
        self.rest.push(-s * carried);
        let solved = self.rest[k + 1].abs() <= SOLVED * self.size || beside <= 1e-15 * before;
        self.goes_on = !solved && self.columns.len() < MAX_VECTORS.min(next.len());
        if self.goes_on {
            next.iter_mut().for_each(|v| *v /= beside);
            self.basis.push(next);
        }
    }

    fn solution(&self) -> Vec<f64> {
        let m = self.columns.len();
        if m == 0 {
            // Nothing was to be solved, or what came in is beyond use: it goes out as it is.
            return self.basis[0].clone();
        }
        let mut weights = vec![0.0; m];
        for k in (0..m).rev() {
            let known: f64 = (k + 1..m).map(|j| self.columns[j][k] * weights[j]).sum();
            weights[k] = (self.rest[k] - known) / self.columns[k][k];
        }
        let mut solution = vec![0.0; self.basis[0].len()];
        for (weight, vector) in weights.iter().zip(&self.basis) {
            solution.iter_mut().zip(vector).for_each(|(x, v)| *x += weight * v);
        }
        solution
    }
}

fn norm(v: &[f64]) -> f64 {
    v.iter().map(|x| x * x).sum::<f64>().sqrt()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn solves_systems_near_their_preconditioner() {
        let n = 12;
        let entry = |i: usize, j: usize| match (i, j) {
            _ if i == j => 3.0 + i as f64,
            _ => 0.3 * ((7 * i + 3 * j) % 5) as f64 - 0.5,
        };
        let product = |v: &[f64]| -> Vec<f64> { (0..n).map(|i| (0..n).map(|j| entry(i, j) * v[j]).sum()).collect() };
        let precondition = |v: &mut [f64]| {
            for one in v.chunks_exact_mut(n) {
                one.iter_mut().enumerate().for_each(|(i, x)| *x /= entry(i, i));
            }
        };
        let wanted = [
            (0..n).map(|i| (i as f64).cos()).collect(),
            vec![0.0; n],
            (0..n).map(|i| 1.0 / (1.0 + i as f64)).collect::<Vec<f64>>(),
        ];
        let right: Vec<f64> = wanted.iter().flat_map(|x| product(x)).collect();
        let together = gmres(n, product, precondition, right.clone());
        for (k, (found, wanted)) in together.chunks_exact(n).zip(&wanted).enumerate() {
            assert!(found.iter().zip(wanted).all(|(a, b)| (a - b).abs() < 1e-8));
            let alone = gmres(n, product, precondition, right[k * n..(k + 1) * n].to_vec());
            assert_eq!(found, alone, "the company does not matter");
        }
    }
}
