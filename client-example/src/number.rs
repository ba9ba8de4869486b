//! Numbers for eyes: three digits, enough decimals to tell a limit that is just exceeded.

/// A number with three significant digits and no exponent; whole above 999.
pub(crate) fn three(number: f64) -> String {
    digits(number, 3)
}

/// A number with so many significant digits, no exponent; never fewer than its whole part.
pub(crate) fn digits(number: f64, wanted: i32) -> String {
    if number == 0.0 || !number.is_finite() {
        return if number == 0.0 {
            "0".to_owned()
        } else {
            format!("{number}")
        };
    }
    // Rounding may carry into one more digit (99.96 becomes 100), so the order is read after it.
    let decimals = decimals(number, wanted);
    let rounded = format!("{number:.decimals$}");
    let value: f64 = rounded.parse().expect("a formatted number is a number");
    let decimals = self::decimals(if value == 0.0 { number } else { value }, wanted);
    let text = format!("{number:.decimals$}");
    if text.parse::<f64>().is_ok_and(|value| value == 0.0) {
        "0".to_owned()
    } else {
        text
    }
}

fn decimals(number: f64, wanted: i32) -> usize {
    #[allow(
        clippy::cast_possible_truncation,
        reason = "an order of magnitude is between -324 and 308"
    )]
    let order = number.abs().log10().floor() as i32;
    // Below a millionth nothing is shown: no quantity here has a meaning there.
    usize::try_from((wanted - 1 - order).clamp(0, 6)).expect("clamped to what fits")
}

/// A share as a percentage: whole, but with the decimals that it takes to stand off 100 %.
pub(crate) fn percent(share: f64) -> String {
    let value = share * 100.0;
    let mut text = format!("{value:.0}");
    for decimals in 1..=6 {
        if text != "100" || value == 100.0 {
            break;
        }
        text = format!("{value:.decimals$}");
        if text.trim_start_matches("100").trim_matches(['.', '0']).is_empty() {
            "100".clone_into(&mut text);
        }
    }
    if text == "-0" { "0".to_owned() } else { text }
}

/// A number with so many decimals; no negative zero, and zero without decimals.
pub(crate) fn fixed(number: f64, decimals: usize) -> String {
    let text = format!("{number:.decimals$}");
    if text.parse::<f64>().is_ok_and(|value| value == 0.0) {
        "0".to_owned()
    } else {
        text
    }
}

/// A number without the noise that a change of unit leaves in its last digits: nine digits.
pub(crate) fn clean(number: f64) -> f64 {
    format!("{number:.8e}").parse().expect("a formatted number is a number")
}

/// A small number that spans many orders, such as a residual: `3.2e-7`.
pub(crate) fn order(number: f64) -> String {
    if number == 0.0 {
        "0".to_owned()
    } else {
        format!("{number:.1e}")
    }
}

/// Unit for eyes, and how many of it make one of the contract's.
pub(crate) fn for_eyes(unit: &str) -> (&str, f64) {
    match unit {
        "N" => ("kN", 1e-3),
        "m" => ("mm", 1e3),
        "m/s2" => ("m/s²", 1.0),
        other => (other, 1.0),
    }
}

/// So many of something: "1 case", "3 cases".
pub(crate) fn counted(count: usize, noun: &str) -> String {
    if count == 1 {
        format!("1 {noun}")
    } else {
        format!("{count} {noun}s")
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn three_digits_without_exponent() {
        for (number, text) in [
            (0.0, "0"),
            (-0.0, "0"),
            (12.345, "12.3"),
            (99.96, "100"),
            (608.4, "608"),
            (12_345.6, "12346"),
            (0.012_34, "0.0123"),
            (-4.5, "-4.50"),
            (1e-9, "0"),
        ] {
            assert_eq!(three(number), text, "{number}");
        }
    }

    #[test]
    fn a_limit_just_exceeded_never_reads_100() {
        for (share, text) in [
            (0.956, "96"),
            (1.0, "100"),
            (1.003, "100.3"),
            (1.000_4, "100.04"),
            (0.999, "99.9"),
            (-0.001, "0"),
        ] {
            assert_eq!(percent(share), text, "{share}");
        }
    }
}
