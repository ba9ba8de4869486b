//! Briefs whose lengths were found earlier: are they still lengths of these ropes?

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::shape::{Prestress, PrestressRule};

use super::findings::{Findings, Path};
use super::names::Names;
use super::net::NetDraft;
use super::reasons;
use super::sections::Sections;
use crate::words::{Quoted, force, number, shown};

/// Axial stiffness alike within this share is the same.
const SAME: f64 = 1e-9;

/// Compares the sections of a frozen brief with those that its lengths were found for.
pub(crate) fn read(
    frozen: Option<&v1::FrozenFrom>,
    net: &NetDraft<'_>,
    sections: &Sections<'_>,
    prestress: &Prestress,
    findings: &mut Findings,
) {
    let Some(frozen) = frozen else {
        return;
    };
    let at = Path::root("frozen_from");
    let is_digest = frozen.digest.len() == 64 && frozen.digest.chars().all(|c| matches!(c, '0'..='9' | 'a'..='f'));
    if !is_digest {
        findings
            .error(
                reasons::BAD_ID,
                &at.field("digest"),
                "",
                format!("{} is no digest", Quoted(&frozen.digest)),
                "leave frozen_from as Freeze wrote it: 64 digits in lower-case hexadecimal",
            )
            .value(&frozen.digest);
    }
    let list = at.field("sections");
    let mut names = Names::new("sections of a frozen brief");
    for (index, before) in frozen.sections.iter().enumerate() {
        names.declare(findings, &list, index, before.id.as_str(), index);
        let now = sections.list.iter().position(|draft| draft.message.id == before.id);
        let now = now.and_then(|index| Some((index, sections.list[index].axial_stiffness?)));
        let (Some(was), Some((section, now))) = (axial_stiffness(before), now) else {
            continue;
        };
        if (was - now).abs() > SAME * was.abs() {
            let effect = effect(net, sections, prestress, section, was, now);
            let id = &before.id;
            let sections_at = Path::root("net.sections");
            findings
                .doubt(
                    reasons::FROZEN_SECTION_CHANGED,
                    &sections_at.element(id, section).field("axial_stiffness_n"),
                    id,
                    format!(
                        "this brief was frozen from digest {}... with section {} (EA {}); it now says {}.{effect}",
                        shown(&frozen.digest).chars().take(8).collect::<String>(),
                        Quoted(id),
                        force(was),
                        force(now)
                    ),
                    "freeze again if the ropes are not cut; keep and accept this doubt if they are",
                )
                .value(number(now));
        }
    }
}

fn axial_stiffness(section: &v1::Section) -> Option<f64> {
    let area = match section.area {
        Some(v1::section::Area::MetallicAreaM2(area) | v1::section::Area::NominalAreaM2(area)) => Some(area),
        None => None,
    };
    let stiffness = section
        .axial_stiffness_n
        .or_else(|| Some(section.modulus_pa? * area?))?;
    (stiffness.is_finite() && stiffness > 0.0).then_some(stiffness)
}

/// What the change does to the tension that is largest in the frozen geometry, before the net gives way.
fn effect(
    net: &NetDraft<'_>,
    sections: &Sections<'_>,
    prestress: &Prestress,
    section: usize,
    was: f64,
    now: f64,
) -> String {
    let mut worst: Option<(f64, usize)> = None;
    for (segment, rule) in prestress.rules.iter().enumerate() {
        let PrestressRule::UnstressedLength(unstressed) = rule else {
            continue;
        };
        if sections.of_segment[segment].is_none_or(|(of, _)| of != section) {
            continue;
        }
        let Some(length) = net.given_length(segment) else {
            continue;
        };
        let strain = length / unstressed - 1.0;
        if strain > worst.map_or(0.0, |(largest, _)| largest) {
            worst = Some((strain, segment));
        }
    }
    worst.map_or_else(String::new, |(strain, segment)| {
        let verb = if now < was { "falls" } else { "rises" };
        format!(
            " With the cut lengths the reference tension of {} {verb} from {} to about {}.",
            Quoted(net.member_id(net.segments[segment].1)),
            force(was * strain),
            force(now * strain)
        )
    })
}
