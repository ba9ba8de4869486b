//! Ids, numbers and forces as people read them, in messages and cautions.

use std::fmt;

/// Characters of a client's text that a message repeats.
const SHOWN: usize = 128;

/// A client's text in quotation marks, cut where it is long, without control characters.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Quoted<'a>(pub(crate) &'a str);

impl fmt::Display for Quoted<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("\"")?;
        for (count, character) in self.0.chars().enumerate() {
            if count == SHOWN {
                f.write_str("...")?;
                break;
            }
            if character.is_control() {
                write!(f, "{}", character.escape_unicode())?;
            } else {
                write!(f, "{character}")?;
            }
        }
        f.write_str("\"")
    }
}

/// Several ids in quotation marks, the first few of many.
pub(crate) fn quoted_list<'a>(ids: impl IntoIterator<Item = &'a str>) -> String {
    const FIRST: usize = 12;
    let mut text = String::new();
    let mut more = 0_usize;
    for (count, id) in ids.into_iter().enumerate() {
        if count >= FIRST {
            more += 1;
            continue;
        }
        if count > 0 {
            text.push_str(", ");
        }
        text.push_str(&Quoted(id).to_string());
    }
    if more > 0 {
        text.push_str(&format!(" and {more} more"));
    }
    text
}

/// A client's text as a value in a finding: cut where it is long.
pub(crate) fn shown(text: &str) -> String {
    let quoted = Quoted(text).to_string();
    quoted[1..quoted.len() - 1].to_owned()
}

/// A number written for people: digits in groups of three from 10 000 on, powers of ten where it is very large or small.
pub(crate) fn number(value: f64) -> String {
    let size = value.abs();
    if !value.is_finite() {
        return value.to_string();
    }
    if size != 0.0 && !(1e-4..1e6).contains(&size) {
        return format!("{value:e}");
    }
    let plain = value.to_string();
    let (sign, digits) = match plain.strip_prefix('-') {
        Some(rest) => ("-", rest),
        None => ("", plain.as_str()),
    };
    let (whole, fraction) = match digits.split_once('.') {
        Some((whole, fraction)) => (whole, Some(fraction)),
        None => (digits, None),
    };
    let mut text = String::from(sign);
    if whole.len() < 5 {
        text.push_str(whole);
    } else {
        for (position, digit) in whole.chars().enumerate() {
            if position > 0 && (whole.len() - position) % 3 == 0 {
                text.push(' ');
            }
            text.push(digit);
        }
    }
    if let Some(fraction) = fraction {
        text.push('.');
        text.push_str(fraction);
    }
    text
}

/// A number rounded to `digits` significant digits, then written for people.
pub(crate) fn rounded(value: f64, digits: usize) -> String {
    if value == 0.0 || !value.is_finite() {
        return number(value);
    }
    let text = format!("{value:.*e}", digits.saturating_sub(1));
    number(text.parse().unwrap_or(value))
}

/// A force (N) in N, kN or MN, with three digits.
pub(crate) fn force(value: f64) -> String {
    let size = value.abs();
    if size >= 1e6 {
        format!("{} MN", rounded(value / 1e6, 3))
    } else if size >= 1e3 {
        format!("{} kN", rounded(value / 1e3, 3))
    } else {
        format!("{} N", rounded(value, 3))
    }
}

/// A length (m) in mm below one metre, else in m.
pub(crate) fn length(value: f64) -> String {
    if value.abs() < 1.0 {
        format!("{} mm", rounded(value * 1e3, 3))
    } else {
        format!("{} m", rounded(value, 3))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_read_well() {
        for (value, text) in [
            (8900.0, "8900"),
            (13_500.0, "13 500"),
            (-123_456.5, "-123 456.5"),
            (9e6, "9e6"),
            (1e300, "1e300"),
            (0.0, "0"),
            (1.35, "1.35"),
            (f64::NAN, "NaN"),
        ] {
            assert_eq!(number(value), text);
        }
        assert_eq!(force(13_512.0), "13.5 kN");
        assert_eq!(force(-8.9e6), "-8.9 MN");
        assert_eq!(length(0.0841), "84.1 mm");
    }

    #[test]
    fn texts_are_cut_and_have_no_control_characters() {
        assert_eq!(Quoted("a\nb").to_string(), "\"a\\u{a}b\"");
        assert_eq!(shown(&"é".repeat(500)).chars().count(), SHOWN + 3);
        let many: Vec<String> = (0..20).map(|i| i.to_string()).collect();
        assert!(quoted_list(many.iter().map(String::as_str)).ends_with("\"11\" and 8 more"));
    }
}
