//! Small tools for closed forms: one root, and extrapolation of a sequence.

/// The root of `f` between `low` and `high`, where it changes sign, to the last digit.
pub(crate) fn root(mut low: f64, mut high: f64, f: impl Fn(f64) -> f64) -> f64 {
    let sign = f(low).signum();
    assert!(sign != f(high).signum(), "no change of sign between {low} and {high}");
    loop {
        let middle = 0.5 * (low + high);
        if middle <= low || middle >= high {
            return middle;
        }
        if f(middle).signum() == sign {
            low = middle;
        } else {
            high = middle;
        }
    }
}

/// Limit of a sequence whose error is a series in even powers of a step that halves from entry to entry (Romberg 1955).
pub(crate) fn halving_limit(values: &[f64]) -> f64 {
    let mut row = values.to_vec();
    let mut power = 4.0;
    while row.len() > 1 {
        row = row
            .windows(2)
            .map(|pair| pair[1] + (pair[1] - pair[0]) / (power - 1.0))
            .collect();
        power *= 4.0;
    }
    row[0]
}
