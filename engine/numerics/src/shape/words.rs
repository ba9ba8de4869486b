//! Numbers and names as messages spell them.

use nalgebra::Vector3;

/// A force (N) in kilonewtons with three digits that count.
pub(crate) fn kilonewtons(force: f64) -> String {
    format!("{} kN", three_digits(force / 1e3))
}

/// A number with three digits that count.
pub(crate) fn three_digits(value: f64) -> String {
    let size = value.abs();
    if size == 0.0 || !size.is_finite() {
        return format!("{value}");
    }
    if !(1e-4..1e6).contains(&size) {
        return format!("{value:.2e}");
    }
    let mut decimals: usize = 2;
    let mut scale = size;
    while scale < 1.0 {
        scale *= 10.0;
        decimals += 1;
    }
    while scale >= 10.0 && decimals > 0 {
        scale /= 10.0;
        decimals -= 1;
    }
    format!("{value:.decimals$}")
}

/// Names in quotes, at most `most` of them, then how many more there are.
pub(crate) fn list(names: &[String], most: usize) -> String {
    let quoted: Vec<String> = names.iter().take(most).map(|n| format!("\"{n}\"")).collect();
    match names.len().saturating_sub(most) {
        0 => quoted.join(", "),
        more => format!("{} and {more} more", quoted.join(", ")),
    }
}

/// A direction in two decimals.
pub(crate) fn direction(d: &Vector3<f64>) -> String {
    // Adding zero takes the sign from a zero.
    let d = d.map(|c| (c * 100.0).round() / 100.0 + 0.0);
    format!("({:.2}, {:.2}, {:.2})", d.x, d.y, d.z)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn three_digits_count() {
        for (value, text) in [
            (35_000.0, "35.0 kN"),
            (104_690.0, "105 kN"),
            (4_123.0, "4.12 kN"),
            (12.3456, "0.0123 kN"),
            (-181_300.0, "-181 kN"),
            (0.0, "0 kN"),
        ] {
            assert_eq!(kilonewtons(value), text);
        }
    }

    #[test]
    fn long_lists_are_counted() {
        let names = ["a", "b", "c"].map(str::to_owned);
        assert_eq!(list(&names, 2), "\"a\", \"b\" and 1 more");
        assert_eq!(list(&names, 3), "\"a\", \"b\", \"c\"");
    }
}
