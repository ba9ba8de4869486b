//! Values that can be computed with and are hardly meant: slips of unit above all.

use std::f64::consts::PI;

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::diagnose::plausible::odd_stiffnesses;
use ropewalk_numerics::model::{Member, Net};
use ropewalk_numerics::shape::{Prestress, PrestressRule};

use super::findings::{Findings, Path};
use super::net::NetDraft;
use super::reasons;
use super::sections::Sections;
use crate::words::{Quoted, force, length, number, rounded};

/// Axial stiffness over the area of the circle around a rope or tube (Pa): from soft fibre ropes to solid steel.
const STIFFNESS_OF_CIRCLE: (f64, f64) = (3e8, 2.4e11);
/// Axial stiffness of a wire rope over the area of its circle (Pa): about 0.7 metal at 160 GPa (EN 1993-1-11:2006, 3.2,
/// from memory).
const ROPE_STIFFNESS_OF_CIRCLE: f64 = 1.12e11;
/// Breaking force over the area of the circle (Pa): from fibre cord to the strongest wire.
const STRENGTH_OF_CIRCLE: (f64, f64) = (3e7, 2.5e9);
/// Mass over the volume of the circle (kg/m3): from light fibre to a solid bar with zinc.
const DENSITY_OF_CIRCLE: (f64, f64) = (100.0, 1.2e4);
/// Modulus of ropes and bars (Pa).
const MODULI: (f64, f64) = (1e8, 3e11);
/// Strain from prestress that no wire rope has.
const LARGEST_STRAIN: f64 = 0.05;
/// Extent beyond which a net is hardly meant (m): coordinates in mm reach it with a few metres.
const LARGEST_EXTENT: f64 = 2500.0;

/// Doubts about sections, by themselves.
pub(crate) fn sections(net: &NetDraft<'_>, findings: &mut Findings) {
    let list = Path::root("net.sections");
    for (index, section) in net.message.sections.iter().enumerate() {
        let at = list.element(&section.id, index);
        let name = Quoted(&section.id);
        let mut slip =
            |field: &'static str, value: Option<f64>, scale: f64, usual: (f64, f64), unit: &str, hint: String| {
                let Some(value) = value.filter(|value| value.is_finite() && *value > 0.0) else {
                    return;
                };
                if (usual.0..=usual.1).contains(&(value / scale)) {
                    return;
                }
                // The unit is the last word of the field's name.
                let words = field
                    .rsplit_once('_')
                    .map_or(field, |(quantity, _)| quantity)
                    .replace('_', " ");
                findings
                    .doubt(
                        reasons::UNIT_SLIP,
                        &at.field(field),
                        &section.id,
                        format!("section {name}: {words} is {} {unit}. {hint}", number(value)),
                        "check the unit, or accept this doubt",
                    )
                    .value(number(value));
            };
        let hint = "A rope has 1e8 to 3e11 Pa: was the value in MPa or GPa?".to_owned();
        slip("modulus_pa", section.modulus_pa, 1.0, MODULI, "Pa", hint);
        let Some(diameter) = section
            .diameter_m
            .filter(|diameter| diameter.is_finite() && *diameter > 0.0)
        else {
            continue;
        };
        let circle = PI / 4.0 * diameter * diameter;
        let about = rounded(ROPE_STIFFNESS_OF_CIRCLE * circle, 1);
        let rope = format!("A {} rope", length(diameter));
        let stiffness = section.axial_stiffness_n;
        let hint = format!("{rope} has about {about} N: was the value in kN, or the diameter in mm?");
        slip("axial_stiffness_n", stiffness, circle, STIFFNESS_OF_CIRCLE, "N", hint);
        let least = force(STRENGTH_OF_CIRCLE.0 * circle);
        let hint = format!(
            "{rope} breaks at {least} to {}: was it in kN?",
            force(STRENGTH_OF_CIRCLE.1 * circle)
        );
        slip(
            "breaking_force_n",
            section.breaking_force_n,
            circle,
            STRENGTH_OF_CIRCLE,
            "N",
            hint,
        );
        let (least, most) = (
            rounded(DENSITY_OF_CIRCLE.0 * circle, 2),
            rounded(DENSITY_OF_CIRCLE.1 * circle, 2),
        );
        let hint = format!("{rope} has {least} to {most} kg/m: was it in kg per 100 m?");
        slip(
            "mass_kg_per_m",
            section.mass_kg_per_m,
            circle,
            DENSITY_OF_CIRCLE,
            "kg/m",
            hint,
        );
    }
}

/// Doubts about stiffnesses beside those of the other ropes or struts: the first member of each section.
pub(crate) fn ratios(net: &Net, findings: &mut Findings) {
    let mut told: Vec<f64> = Vec::new();
    for odd in odd_stiffnesses(net) {
        // Members of one section share its slip.
        if told.contains(&odd.axial_stiffness) {
            continue;
        }
        told.push(odd.axial_stiffness);
        let (list, kind, index) = match net.segments()[odd.segment.index()].member {
            Member::Cable(cable) => ("net.cables", "ropes", cable.index()),
            Member::Strut(strut) => ("net.struts", "struts", strut.index()),
        };
        let id = net.member_name(odd.segment);
        let share = odd.axial_stiffness / odd.median;
        let times = if share < 1.0 {
            format!("1/{}", rounded(1.0 / share, 2))
        } else {
            format!("{} times", rounded(share, 2))
        };
        findings
            .doubt(
                reasons::UNIT_SLIP,
                &Path::root(list).element(id, index),
                id,
                format!(
                    "{} has an axial stiffness of {} N, {times} that of the median of the {kind}: was it in another unit?",
                    Quoted(id),
                    number(odd.axial_stiffness)
                ),
                "check the unit of the stiffness of its section, or accept this doubt",
            )
            .value(number(odd.axial_stiffness));
    }
}

/// Doubts about the size of the net.
pub(crate) fn extent(net: &NetDraft<'_>, findings: &mut Findings) {
    let mut positions = net.nodes.iter().filter_map(|node| node.position);
    let Some(first) = positions.next() else {
        return;
    };
    let (least, largest) = positions.fold((first, first), |(least, largest), p| (least.inf(&p), largest.sup(&p)));
    let extent = (largest - least).amax();
    if extent > LARGEST_EXTENT {
        findings
            .doubt(
                reasons::UNIT_SLIP,
                &Path::root("net.nodes"),
                "",
                format!("the net is {} wide: were its coordinates in mm?", length(extent)),
                "give coordinates in m, or accept this doubt",
            )
            .value(rounded(extent, 6));
    }
}

/// Doubts about prestress against stiffness and breaking force: the worst segment of each section.
pub(crate) fn prestress(net: &NetDraft<'_>, sections: &Sections<'_>, prestress: &Prestress, findings: &mut Findings) {
    let lengths = mean_lengths(net);
    let n_sections = sections.list.len();
    let mut strained: Vec<Option<(f64, f64, usize)>> = vec![None; n_sections];
    let mut broken: Vec<Option<(f64, f64, usize)>> = vec![None; n_sections];
    for (segment, rule) in prestress.rules.iter().enumerate() {
        let (Some((index, _)), Some(section)) = (sections.of_segment[segment], sections.section(segment)) else {
            continue;
        };
        let Some(tension) = wanted_tension(prestress, lengths[segment], rule, section.axial_stiffness) else {
            continue;
        };
        let strain = tension.abs() / section.axial_stiffness;
        if strain > strained[index].map_or(LARGEST_STRAIN, |worst| worst.0) {
            strained[index] = Some((strain, tension, segment));
        }
        if let Some(breaking) = section.breaking_force.filter(|breaking| tension > *breaking)
            && tension / breaking > broken[index].map_or(1.0, |worst| worst.0)
        {
            broken[index] = Some((tension / breaking, tension, segment));
        }
    }
    let list = Path::root("net.sections");
    for (index, draft) in sections.list.iter().enumerate() {
        let id = &draft.message.id;
        let at = list.element(id, index);
        if let (Some((strain, tension, segment)), Some(stiffness)) = (strained[index], draft.axial_stiffness) {
            let hint = draft.message.diameter_m.map_or_else(String::new, |diameter| {
                let about = rounded(ROPE_STIFFNESS_OF_CIRCLE * PI / 4.0 * diameter * diameter, 1);
                format!(" A {} rope has about {about} N: was the value in kN?", length(diameter))
            });
            findings
                .doubt(
                    reasons::UNIT_SLIP,
                    &at.field("axial_stiffness_n"),
                    id,
                    format!(
                        "section {}: axial stiffness {} N; with {} N in {} the rope would stretch by {} %.{hint}",
                        Quoted(id),
                        number(stiffness),
                        rounded(tension, 3),
                        Quoted(net.member_id(net.segments[segment].1)),
                        rounded(100.0 * strain, 3)
                    ),
                    "check the units of stiffness and prestress, or accept this doubt",
                )
                .value(number(stiffness));
        }
        if let Some((ratio, tension, segment)) = broken[index] {
            findings
                .doubt(
                    reasons::PRESTRESS_OVER_BREAKING,
                    &at.field("breaking_force_n"),
                    id,
                    format!(
                        "section {}: with a prestress of {} in {} the rope would be at {} % of its breaking force",
                        Quoted(id),
                        force(tension),
                        Quoted(net.member_id(net.segments[segment].1)),
                        rounded(100.0 * ratio, 3)
                    ),
                    "check the units of breaking force and prestress, or accept this doubt",
                )
                .value(rounded(tension, 4));
        }
    }
}

/// The tension that a rule asks for (N), as far as it is known before the shape is: for a force density at least that of
/// the mean segment of the straight line between known nodes.
fn wanted_tension(
    prestress: &Prestress,
    length: Option<f64>,
    rule: &PrestressRule,
    axial_stiffness: f64,
) -> Option<f64> {
    match rule {
        PrestressRule::Tension(tension) => Some(*tension),
        PrestressRule::MeanTension(family) => prestress.mean_tensions.get(*family).copied(),
        PrestressRule::ForceDensity(density) => Some(density * length?),
        PrestressRule::Adjustable(family) => Some(prestress.adjustables.get(*family)?.density * length?),
        PrestressRule::UnstressedLength(unstressed) => {
            let strain = length? / unstressed - 1.0;
            Some(axial_stiffness * strain.max(0.0))
        }
        PrestressRule::Balance => None,
    }
}

/// Length of every segment: as given, or else the mean between the known nodes on both sides of it (m).
fn mean_lengths(net: &NetDraft<'_>) -> Vec<Option<f64>> {
    let mut lengths: Vec<Option<f64>> = (0..net.segments.len())
        .map(|segment| net.given_length(segment))
        .collect();
    for cable in &net.cables {
        let known = (0..cable.path.len()).filter_map(|place| Some((place, net.nodes[cable.path[place]].position?)));
        let known: Vec<_> = known.collect();
        for pair in known.windows(2) {
            let [(before, from), (after, to)] = [pair[0], pair[1]];
            let mean = (to - from).norm() / (after - before) as f64;
            lengths[cable.first_segment + before..cable.first_segment + after].fill(Some(mean));
        }
    }
    lengths
}

/// Notes about data that no served part uses; classes of actions are for combinations alone.
pub(crate) fn unused_data(brief: &v1::Brief, net: &NetDraft<'_>, findings: &mut Findings) {
    let mut told = |path: &str, field: &str, ids: Vec<&str>| {
        if let Some(first) = ids.first() {
            findings
                .note(
                    reasons::DATA_NOT_USED,
                    &Path::root(path),
                    first,
                    format!(
                        "{field} is kept, and nothing in this brief uses it ({} given)",
                        ids.len()
                    ),
                    "nothing to mend",
                )
                .value(ids.len());
        }
    };
    let message = net.message;
    let taking_up = |fitting: &Option<v1::EndFitting>| fitting.as_ref().is_some_and(|f| f.take_up_m.is_some());
    let roles = message.roles.iter().filter(|role| taking_up(&role.end_fitting));
    told(
        "net.roles",
        "end_fitting.take_up_m",
        roles.map(|role| role.id.as_str()).collect(),
    );
    let cables = message.cables.iter().filter(|cable| taking_up(&cable.end_fitting));
    told(
        "net.cables",
        "end_fitting.take_up_m",
        cables.map(|cable| cable.id.as_str()).collect(),
    );
    if brief.combinations.is_empty() {
        let classed = brief.actions.iter().filter(|action| !action.class.is_empty());
        told("actions", "class", classed.map(|action| action.id.as_str()).collect());
    }
}
