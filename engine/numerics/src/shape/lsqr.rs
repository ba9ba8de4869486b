//! Damped least squares for matrices that are only known by their products.

/// Minimises `|A x − b|² + d² |x|²` from zero: of many solutions the one of least norm.
///
/// `forward`: `x → A x`. `backward`: `y → Aᵀ y`, of as many entries as `x`. `damping`: `d`. `tolerance`: size of
/// `Aᵀ r` over those of `A` and `r`, or of `r` over that of `b`, at which it ends.
///
/// # Reference
/// Paige & Saunders 1982.
pub(super) fn lsqr(
    mut forward: impl FnMut(&[f64]) -> Vec<f64>,
    mut backward: impl FnMut(&[f64]) -> Vec<f64>,
    right_hand_side: &[f64],
    damping: f64,
    tolerance: f64,
    most: usize,
) -> Vec<f64> {
    let mut u = right_hand_side.to_vec();
    let mut beta = normalise(&mut u);
    let mut v = backward(&u);
    let mut alpha = normalise(&mut v);
    let mut x = vec![0.0; v.len()];
    if beta == 0.0 || alpha == 0.0 {
        return x;
    }
    let size = beta;
    let mut w = v.clone();
    let (mut phi_bar, mut rho_bar) = (beta, alpha);
    let (mut square_of_matrix, mut square_of_damped) = (alpha * alpha, 0.0);
    for _ in 0..most {
        u = combined(&forward(&v), -alpha, &u);
        beta = normalise(&mut u);
        v = combined(&backward(&u), -beta, &v);
        alpha = normalise(&mut v);
        square_of_matrix += alpha * alpha + beta * beta + damping * damping;

        let rho_damped = rho_bar.hypot(damping);
        square_of_damped += (damping / rho_damped * phi_bar).powi(2);
        phi_bar *= rho_bar / rho_damped;
        let rho = rho_damped.hypot(beta);
        let (c, s) = (rho_damped / rho, beta / rho);
        let (theta, phi) = (s * alpha, c * phi_bar);
        rho_bar = -c * alpha;
        phi_bar *= s;
        for ((x, w), v) in x.iter_mut().zip(&mut w).zip(&v) {
            *x += phi / rho * *w;
            *w = v - theta / rho * *w;
        }
        let residual = (phi_bar * phi_bar + square_of_damped).sqrt();
        let gradient = (phi_bar * alpha * c).abs();
        let small = gradient <= tolerance * square_of_matrix.sqrt() * residual;
        if small || residual <= tolerance * size || alpha == 0.0 || beta == 0.0 {
            break;
        }
    }
    x
}

fn normalise(v: &mut [f64]) -> f64 {
    let size = v.iter().map(|x| x * x).sum::<f64>().sqrt();
    if size > 0.0 {
        v.iter_mut().for_each(|x| *x /= size);
    }
    size
}

fn combined(a: &[f64], by: f64, b: &[f64]) -> Vec<f64> {
    a.iter().zip(b).map(|(a, b)| a + by * b).collect()
}

#[cfg(test)]
mod tests {
    use nalgebra::{DMatrix, DVector};

    use super::*;

    fn solve(a: &DMatrix<f64>, b: &[f64], damping: f64) -> Vec<f64> {
        let forward = |x: &[f64]| (a * DVector::from_column_slice(x)).as_slice().to_vec();
        let backward = |y: &[f64]| (a.transpose() * DVector::from_column_slice(y)).as_slice().to_vec();
        lsqr(forward, backward, b, damping, 1e-12, 200)
    }

    /// Against singular values: too many equations, too few, and dependent ones; with and without damping.
    #[test]
    fn agrees_with_singular_values() {
        for (rows, columns) in [(9, 5), (5, 9), (7, 7)] {
            for damping in [0.0, 0.3] {
                let mut a = DMatrix::from_fn(rows, columns, |i, j| ((3 * i + 5 * j * j) % 7) as f64 - 2.5);
                let copy = a.row(0) * 2.0;
                a.set_row(1, &copy);
                let b: Vec<f64> = (0..rows).map(|i| (i as f64 + 0.4).cos()).collect();
                let x = solve(&a, &b, damping);
                let svd = a.clone().svd(true, true);
                let (u, vt) = (svd.u.expect("asked for"), svd.v_t.expect("asked for"));
                let mut expected = DVector::zeros(columns);
                for (k, s) in svd.singular_values.iter().enumerate().filter(|(_, s)| **s > 1e-10) {
                    let along = u.column(k).dot(&DVector::from_column_slice(&b));
                    expected += vt.row(k).transpose() * (along * s / (s * s + damping * damping));
                }
                for (found, wanted) in x.iter().zip(expected.iter()) {
                    assert!(
                        (found - wanted).abs() < 1e-9,
                        "{rows} x {columns}, {damping}: {found} {wanted}"
                    );
                }
            }
        }
    }
}
