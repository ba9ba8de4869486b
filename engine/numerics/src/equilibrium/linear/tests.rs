//! The sparse solver against dense algebra.

use nalgebra::{DMatrix, DVector};
use nalgebra_sparse::{CooMatrix, CsrMatrix};

use super::*;

/// A ring with chords of blocks of mixed sizes, some of them empty.
fn pattern() -> Pattern {
    let sizes = [3, 0, 2, 3, 1, 3, 3, 2, 3, 3];
    let mut graph = CooMatrix::new(sizes.len(), sizes.len());
    for i in 0..sizes.len() {
        for j in [(i + 1) % sizes.len(), (i + 4) % sizes.len()] {
            graph.push(i, j, 1.0);
            graph.push(j, i, 1.0);
        }
    }
    Pattern::new(&sizes, &CsrMatrix::from(&graph))
}

fn values(pattern: &Pattern, diagonal: impl Fn(usize) -> f64) -> Vec<f64> {
    let mut values: Vec<f64> = (0..pattern.n_entries())
        .map(|i| ((i * 7919 % 101) as f64) / 101.0 - 0.5)
        .collect();
    for dof in 0..pattern.size() {
        values[pattern.column_starts()[dof]] = diagonal(dof);
    }
    values
}

fn dense(pattern: &Pattern, values: &[f64]) -> DMatrix<f64> {
    DMatrix::from(&pattern.full_matrix(values))
}

#[test]
fn cholesky_solves_several_right_hand_sides() {
    let pattern = pattern();
    let values = values(&pattern, |dof| 12.0 + dof as f64);
    let mut factor = Factor::new(Arc::new(Symbolic::new(&pattern)));
    factor.cholesky(&values).expect("diagonally dominant");
    let matrix = dense(&pattern, &values);
    let wanted = DMatrix::from_fn(pattern.size(), 3, |i, j| (i as f64 + 1.0).sin() + j as f64);
    let mut x = (&matrix * &wanted).as_slice().to_vec();
    factor.solve_in_place(&mut x);
    let error = DVector::from_vec(x) - DVector::from_column_slice(wanted.as_slice());
    assert!(error.amax() < 1e-13);
}

#[test]
fn pivots_have_the_signs_of_the_eigenvalues() {
    let pattern = pattern();
    let values = values(&pattern, |dof| if dof % 3 == 0 { -9.0 } else { 11.0 });
    let mut factor = Factor::new(Arc::new(Symbolic::new(&pattern)));
    assert!(matches!(factor.cholesky(&values), Err(FactorError::Pivot { .. })));
    let inertia = factor.ldlt(&values).expect("no pivot vanishes");
    let eigenvalues = dense(&pattern, &values).symmetric_eigenvalues();
    assert_eq!(inertia.negative, eigenvalues.iter().filter(|v| **v < 0.0).count());
    let wanted = DVector::from_fn(pattern.size(), |i, _| (i as f64).cos());
    let mut x = (dense(&pattern, &values) * &wanted).as_slice().to_vec();
    factor.solve_in_place(&mut x);
    assert!((DVector::from_vec(x) - wanted).amax() < 1e-11);
}

#[test]
fn the_pivot_that_fails_is_told_in_the_numbering_of_the_caller() {
    let pattern = pattern();
    let mut values = vec![0.0; pattern.n_entries()];
    for dof in 0..pattern.size() {
        values[pattern.column_starts()[dof]] = if dof == 7 { -1.0 } else { 1.0 };
    }
    let mut factor = Factor::new(Arc::new(Symbolic::new(&pattern)));
    assert_eq!(factor.cholesky(&values), Err(FactorError::Pivot { dof: 7 }));
    values[0] = f64::NAN;
    assert_eq!(factor.cholesky(&values), Err(FactorError::NotFinite));
}

/// Elimination by the book on a dense pattern gives the tree; in a postorder the descendants of a row come right
/// before it.
#[test]
fn the_order_is_a_postorder_of_its_elimination_tree() {
    let pattern = pattern();
    let order = elimination_order(&pattern);
    let n = order.len();
    let full = dense(&pattern, &vec![1.0; pattern.n_entries()]);
    let mut fill = DMatrix::from_fn(n, n, |i, j| full[(order[i], order[j])] != 0.0);
    let mut descendants = vec![1; n];
    for k in 0..n {
        let below: Vec<usize> = (k + 1..n).filter(|&i| fill[(i, k)]).collect();
        for &i in &below {
            for &j in &below {
                fill[(i, j)] = true;
            }
        }
        if let Some(&parent) = below.first() {
            descendants[parent] += descendants[k];
        }
    }
    for (k, n_below) in descendants.iter().enumerate() {
        for i in k + 1 - n_below..k {
            let parent = (i + 1..n).find(|&j| fill[(j, i)]).expect("a descendant has a parent");
            assert!(parent <= k, "row {i} is not below {k}");
        }
    }
}
