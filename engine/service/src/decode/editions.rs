//! Factors that a standard brings along, by its edition.
//!
//! Values recalled from memory: verify. They are inputs; what stands here is only what is taken where the brief leaves
//! one out, and what the edition recommends.

use ropewalk_api::ropewalk::v1;
use v1::check::Kind;

use super::findings::{Findings, Path};
use super::numbers::{Of, Quantity};
use super::reasons;
use super::resolved::Resolved;
use crate::words::{Quoted, number};

/// The edition whose factors are known here: design of structures with tension components.
pub(crate) const KNOWN: &str = "EN 1993-1-11:2006";

/// Divisor of the characteristic breaking force (6.2).
pub(crate) const STRENGTH_DIVISOR: f64 = 1.5;
/// Partial factors of the resistance (6.2): where bending at the anchorage is kept small, and otherwise.
pub(crate) const GAMMA_R: &[f64] = &[0.90, 1.00];
/// Shares of the strength in service (7.2): with and without bending in the fatigue design.
pub(crate) const SERVICE_SHARES: &[f64] = &[0.50, 0.45];
/// Shares of the strength during construction (7.2): first tendons for a few hours, and after the others.
pub(crate) const CONSTRUCTION_SHARES: &[f64] = &[0.60, 0.55];
/// Partial factor of friction (6.3, 6.4).
pub(crate) const GAMMA_FRICTION: f64 = 1.65;
/// Least radius of a saddle over the diameter of its rope (6.3).
pub(crate) const SADDLE_DIAMETERS: f64 = 30.0;
/// The same with a soft bed.
pub(crate) const SOFT_SADDLE_DIAMETERS: f64 = 20.0;
/// Least radius of a saddle over the diameter of the wires (6.3).
pub(crate) const SADDLE_WIRE_DIAMETERS: f64 = 400.0;

/// The standard and edition of a check by a standard.
pub(crate) fn of(check: &v1::Check) -> Option<&str> {
    let given = match check.kind.as_ref()? {
        Kind::Resistance(check) => &check.edition,
        Kind::ServiceStress(check) => &check.edition,
        Kind::ConstructionStress(check) => &check.edition,
        Kind::Clamp(check) if check.edition.is_empty() => KNOWN,
        Kind::Saddle(check) if check.edition.is_empty() => KNOWN,
        Kind::Clamp(check) => &check.edition,
        Kind::Saddle(check) => &check.edition,
        _ => return None,
    };
    Some(given.trim())
}

/// The edition that a check by a standard must name.
pub(crate) fn required(edition: &str, at: &Path<'_>, findings: &mut Findings) {
    if edition.trim().is_empty() {
        findings.error(
            reasons::MISSING,
            &at.field("edition"),
            "",
            "this check is by a standard and names none",
            format!("name the standard with its edition, such as {}", Quoted(KNOWN)),
        );
    }
}

/// A factor, from the brief or else from the edition.
pub(crate) fn factor(
    edition: &str,
    at: &Path<'_>,
    quantity: &Quantity,
    value: Option<f64>,
    known: f64,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<f64> {
    match value {
        Some(value) => findings.number(at, Of::new("check", ""), quantity, value),
        None if edition.trim() == KNOWN => {
            resolved.left_out(at, format!("{} ({KNOWN}; from memory: verify)", number(known)));
            Some(known)
        }
        None if edition.trim().is_empty() => None,
        None => {
            findings
                .error(
                    reasons::EDITION_UNKNOWN,
                    at,
                    "",
                    format!("the factors of {} are not known here", Quoted(edition)),
                    format!("give this factor, or name {}, whose factors are", Quoted(KNOWN)),
                )
                .value(edition);
            None
        }
    }
}

/// Tells a given factor that the edition does not recommend.
pub(crate) fn recommended(edition: &str, at: &Path<'_>, value: f64, recommended: &[f64], findings: &mut Findings) {
    if edition.trim() == KNOWN && !recommended.contains(&value) {
        let list: Vec<String> = recommended.iter().map(|value| number(*value)).collect();
        findings
            .note(
                reasons::FACTOR_NOT_OF_EDITION,
                at,
                "",
                format!("{} recommends {}", KNOWN, list.join(" or ")),
                "nothing, if the national annex says so",
            )
            .value(number(value));
    }
}
