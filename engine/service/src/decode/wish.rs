//! One prestress rule by itself: its parts, its number, its words.

use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::prestress_rule::Rule;

use super::findings::{Findings, Path};
use super::names::Thing;
use super::net::{MemberDraft, NetDraft};
use super::numbers::{
    FORCE_DENSITY, FORCE_DENSITY_BOUND, MEAN_TENSION, Of, Quantity, SHARE_OF_BREAKING, TENSION, UNSTRESSED_LENGTH,
};
use super::reasons;
use super::scope::Narrowness;
use super::stretch::{Stretch, stretch};
use crate::words::{Quoted, number};

/// Segments of a part of a cable.
pub(super) fn read_part(
    part: &v1::PartOfCable,
    net: &NetDraft<'_>,
    at: &Path<'_>,
    findings: &mut Findings,
) -> Option<Vec<usize>> {
    let field = at.field("cable");
    let cable = match net.names.find(findings, &field, "cable", &part.cable)? {
        Thing::Cable(cable) => cable,
        other => {
            findings.error(
                reasons::WRONG_KIND,
                &field,
                &part.cable,
                format!(
                    "{} is a {}, and only cables have parts",
                    Quoted(&part.cable),
                    other.kind()
                ),
                "name a cable",
            );
            return None;
        }
    };
    let wanted = Stretch {
        from: &part.from,
        to: &part.to,
        from_visit: part.from_visit,
        to_visit: part.to_visit,
    };
    let positions = stretch(net, cable, &wanted, at, findings)?;
    let first = net.cables[cable].first_segment;
    Some(positions.into_iter().map(|position| first + position).collect())
}

/// Checks the number of a wish, and that it is one that its members can meet.
pub(super) fn check_wish(
    rule: &v1::PrestressRule,
    covered: &[(Vec<usize>, Narrowness)],
    at: &Path<'_>,
    net: &NetDraft<'_>,
    findings: &mut Findings,
) {
    let of = Of::new("prestress rule", "");
    let covered = || {
        covered
            .iter()
            .flat_map(|(segments, _)| segments)
            .map(|segment| net.segments[*segment].1)
    };
    let (field, quantity, value): (&'static str, &Quantity, f64) = match rule.rule {
        Some(Rule::ForceDensityNPerM(value)) => ("force_density_n_per_m", &FORCE_DENSITY, value),
        Some(Rule::TensionN(value)) => ("tension_n", &TENSION, value),
        Some(Rule::MeanTensionN(value)) => ("mean_tension_n", &MEAN_TENSION, value),
        Some(Rule::UnstressedLengthM(value)) => ("unstressed_length_m", &UNSTRESSED_LENGTH, value),
        Some(Rule::ShareOfBreaking(value)) => ("share_of_breaking", &SHARE_OF_BREAKING, value),
        Some(Rule::Balance(_)) => return,
        None => {
            findings.error(
                reasons::MISSING,
                at,
                "",
                "this prestress rule says nothing about its members",
                "give one of force_density_n_per_m, tension_n, mean_tension_n, unstressed_length_m, share_of_breaking, \
                 balance {}",
            );
            return;
        }
    };
    let field_at = at.field(field);
    if findings.number(&field_at, of, quantity, value).is_none() {
        return;
    }
    let signed = matches!(rule.rule, Some(Rule::ForceDensityNPerM(_) | Rule::TensionN(_)));
    if signed && value == 0.0 {
        findings
            .error(
                reasons::NOT_POSITIVE,
                &field_at,
                "",
                "this prestress rule asks for no force at all: such a member holds nothing",
                "give a tension, or the unstressed length of a rope that hangs slack",
            )
            .value(number(value));
    }
    if signed
        && value < 0.0
        && let Some(MemberDraft::Cable(cable)) = covered().find(|member| matches!(member, MemberDraft::Cable(_)))
    {
        let id = &net.cables[cable].message.id;
        findings
            .error(
                reasons::CABLE_PUSHES,
                &field_at,
                id,
                format!(
                    "cable {} is asked to push with {}: a rope only pulls",
                    Quoted(id),
                    number(value)
                ),
                "give a positive value; only struts may have a negative one",
            )
            .value(number(value));
    }
    if let Some(Rule::MeanTensionN(_)) = rule.rule
        && let Some(MemberDraft::Strut(strut)) = covered().find(|member| matches!(member, MemberDraft::Strut(_)))
    {
        let id = &net.struts[strut].message.id;
        findings.error(
            reasons::WRONG_KIND,
            &field_at,
            id,
            format!("strut {} has one segment, and no mean over several", Quoted(id)),
            "give tension_n for struts",
        );
    }
}

/// Checks that a rule may be adjusted, and that its bounds leave its own force density in.
pub(super) fn check_adjust(rule: &v1::PrestressRule, at: &Path<'_>, findings: &mut Findings) {
    let Some(adjust) = &rule.adjust else {
        return;
    };
    let at = at.field("adjust");
    let Some(Rule::ForceDensityNPerM(density)) = rule.rule else {
        findings.error(
            reasons::NOT_ADJUSTABLE,
            &at,
            "",
            "only a rule with a force density can be adjusted: the others say what is to be met",
            "give force_density_n_per_m to start from, and the tension as a target",
        );
        return;
    };
    let of = Of::new("prestress rule", "");
    for (field, bound, wrong, side) in [
        (
            "least_n_per_m",
            adjust.least_n_per_m,
            density.abs() < adjust.least_n_per_m.unwrap_or(0.0),
            "below",
        ),
        (
            "most_n_per_m",
            adjust.most_n_per_m,
            density.abs() > adjust.most_n_per_m.unwrap_or(f64::INFINITY),
            "above",
        ),
    ] {
        let field = at.field(field);
        let Some(bound) = bound.and_then(|bound| findings.number(&field, of, &FORCE_DENSITY_BOUND, bound)) else {
            continue;
        };
        if wrong {
            findings
                .error(
                    reasons::NOT_ADJUSTABLE,
                    &field,
                    "",
                    format!(
                        "the force density {} N/m, where the search starts, is {side} its bound {} N/m",
                        number(density.abs()),
                        number(bound)
                    ),
                    "start within the bounds",
                )
                .value(number(bound));
        }
    }
}

/// A wish in words.
pub(super) fn in_words(rule: &v1::PrestressRule) -> String {
    match rule.rule {
        Some(Rule::ForceDensityNPerM(value)) if rule.adjust.is_some() => {
            format!("force density {} N/m, adjusted to targets", number(value))
        }
        Some(Rule::ForceDensityNPerM(value)) => format!("force density {} N/m", number(value)),
        Some(Rule::TensionN(value)) => format!("tension {} N in every segment", number(value)),
        Some(Rule::MeanTensionN(value)) => format!("mean tension {} N", number(value)),
        Some(Rule::UnstressedLengthM(value)) => format!("unstressed length {} m of each reach", number(value)),
        Some(Rule::ShareOfBreaking(value)) => format!("tension of {} of the breaking force", number(value)),
        Some(Rule::Balance(_)) => "balance".to_owned(),
        None => "nothing".to_owned(),
    }
}
