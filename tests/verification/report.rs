//! One line a comparison, and the verdict on it.

use crate::data::{Data, number};

/// How far a computed value may lie from the published one.
#[derive(Clone, Copy, Debug)]
pub(crate) enum Tolerance {
    /// Share of the published value.
    Relative(f64),
    /// In the unit of the value.
    Absolute(f64),
    /// The larger of a share of the published value and an amount.
    Either {
        /// Share of the published value.
        relative: f64,
        /// In the unit of the value.
        absolute: f64,
    },
}

impl Tolerance {
    fn allowed(self, published: f64) -> f64 {
        match self {
            Self::Relative(share) => share * published.abs(),
            Self::Absolute(amount) => amount,
            Self::Either { relative, absolute } => absolute.max(relative * published.abs()),
        }
    }
}

/// Compares one computed value with its published one, prints the line, and fails the test where they disagree.
#[track_caller]
pub(crate) fn check(name: &str, source: &str, published: f64, computed: f64, tolerance: Tolerance) {
    let deviation = computed - published;
    let allowed = tolerance.allowed(published);
    // Not the other way round: a NaN must fail.
    let pass = deviation.abs() <= allowed;
    println!(
        "case: {name} | {source} | {published} | {computed} | {deviation:.1e} | {allowed:.1e} | {}",
        if pass { "pass" } else { "FAIL" }
    );
    assert!(
        pass,
        "{name}: {computed} instead of {published}, off by {deviation:.3e} where {allowed:.3e} is allowed"
    );
}

/// Compares two lists entry by entry and reports the entry that uses most of its tolerance.
#[track_caller]
pub(crate) fn check_all(name: &str, source: &str, published: &[f64], computed: &[f64], tolerance: Tolerance) {
    assert_eq!(published.len(), computed.len(), "{name}: lists of different length");
    assert!(!published.is_empty(), "{name}: nothing to compare");
    let used = |i: usize| {
        let share = (computed[i] - published[i]).abs() / tolerance.allowed(published[i]).max(f64::MIN_POSITIVE);
        if share.is_nan() { f64::INFINITY } else { share }
    };
    let worst = (0..published.len())
        .max_by(|a, b| used(*a).total_cmp(&used(*b)))
        .expect("checked: not empty");
    check(
        &format!("{name}, worst of {}: [{worst}]", published.len()),
        source,
        published[worst],
        computed[worst],
        tolerance,
    );
}

/// Checks that errors fall with the square of the segment length: each entry of `errors` belongs to half the length of
/// the one before.
///
/// The observed order of the last halving is compared with 2, within 0.1: the next term of the series still shows.
#[track_caller]
pub(crate) fn check_second_order(name: &str, source: &str, errors: &[f64]) {
    let [.., coarse, fine] = errors else {
        panic!("{name}: two errors at least");
    };
    let order = (coarse / fine).abs().log2();
    check(
        &format!("{name}, observed order of convergence"),
        source,
        2.0,
        order,
        Tolerance::Absolute(0.1),
    );
}

/// Compares a computed value with a printed one of a file, whose name begins with `quantity`, in the unit of the print.
///
/// Allowed is how far the file's independent solution stands from the print, and half a unit of the last printed digit.
#[track_caller]
pub(crate) fn check_print(data: &Data, quantity: &str, computed: f64) {
    let entry = data
        .published()
        .iter()
        .find(|entry| {
            entry["quantity"]
                .as_str()
                .is_some_and(|name| name.starts_with(quantity))
        })
        .unwrap_or_else(|| panic!("{} has no printed {quantity}", data.id()));
    let printed = number(&entry["published"]);
    let decimals = printed
        .to_string()
        .split_once('.')
        .map_or(0, |(_, digits)| digits.len());
    let half_a_digit = 0.5 * 0.1_f64.powi(i32::try_from(decimals).expect("a printed number is short"));
    let spread = (number(&entry["reproduced"]) - printed).abs();
    check(
        &format!(
            "{} as printed: {quantity} ({})",
            data.id(),
            entry["unit"].as_str().expect("a unit")
        ),
        &data.source(),
        printed,
        computed,
        Tolerance::Absolute(spread + half_a_digit),
    );
}
