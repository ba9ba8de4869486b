//! A basis that can be read: the same space by vectors of few entries.

/// Entries below this share of the largest of their vector are rounding.
const ROUNDING: f64 = 1e-9;

/// Reduces vectors to row echelon form with complete pivoting: each has an entry of 1 where all others have none, so
/// that what moves apart is told apart. Vectors that depend on the others are left out.
#[must_use]
pub(super) fn localise(mut vectors: Vec<Vec<f64>>) -> Vec<Vec<f64>> {
    let largest = |vector: &[f64]| vector.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
    let scale = vectors.iter().map(|v| largest(v)).fold(0.0, f64::max);
    for done in 0..vectors.len() {
        // The largest entry; of those that differ by rounding only, the first one.
        let most = vectors[done..].iter().map(|v| largest(v)).fold(0.0, f64::max);
        if most <= ROUNDING * scale {
            vectors.truncate(done);
            break;
        }
        let size = vectors[done].len();
        let is_most =
            |row: usize, column: usize, vectors: &[Vec<f64>]| vectors[row][column].abs() > (1.0 - ROUNDING) * most;
        let mut found = (0..size).flat_map(|column| (done..vectors.len()).map(move |row| (row, column)));
        let Some((row, column)) = found.find(|(row, column)| is_most(*row, *column, &vectors)) else {
            break;
        };
        vectors.swap(done, row);
        let pivot = vectors[done][column];
        vectors[done].iter_mut().for_each(|v| *v /= pivot);
        let reduced = vectors[done].clone();
        for (other, vector) in vectors.iter_mut().enumerate() {
            let share = vector[column];
            if other != done && share != 0.0 {
                vector.iter_mut().zip(&reduced).for_each(|(v, r)| *v -= share * r);
                vector[column] = 0.0;
            }
        }
    }
    for vector in &mut vectors {
        let small = ROUNDING * largest(vector);
        vector.iter_mut().filter(|v| v.abs() < small).for_each(|v| *v = 0.0);
    }
    vectors
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn mixed_vectors_are_told_apart() {
        let (a, b, c) = (
            [0.0, 2.0, 1.0, 0.0, 0.0],
            [1.0, 0.0, 0.0, -1.0, 0.0],
            [0.0, 0.0, 0.0, 0.0, 3.0],
        );
        let mix = |p: f64, q: f64, r: f64| (0..5).map(|i| p * a[i] + q * b[i] + r * c[i]).collect::<Vec<f64>>();
        let mut told = localise(vec![
            mix(1.0, 2.0, 0.5),
            mix(-1.0, 0.3, 0.2),
            mix(0.1, 0.4, -2.0),
            mix(1.0, 1.0, 1.0),
        ]);
        assert_eq!(told.len(), 3);
        told.sort_by_key(|v| v.iter().position(|x| *x != 0.0));
        for (vector, wanted) in told.iter().zip([b, a, c]) {
            let scale =
                vector.iter().zip(&wanted).map(|(v, w)| v * w).sum::<f64>() / wanted.iter().map(|w| w * w).sum::<f64>();
            assert!(
                vector.iter().zip(&wanted).all(|(v, w)| (v - scale * w).abs() < 1e-12),
                "{vector:?}"
            );
        }
    }
}
