//! Sections, roles and fittings, and what each segment is made of.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::model::Section;

use super::findings::{Findings, Path};
use super::names::Names;
use super::net::{MemberDraft, NetDraft};
use super::numbers::{
    AREA, AXIAL_STIFFNESS, BENDING_STIFFNESS, BREAKING_FORCE, DIAMETER, EXPANSION, MASS_PER_LENGTH, MODULUS, Of,
    PROOF_FORCE, STRENGTH_FACTOR, TAKE_UP,
};
use super::reasons;
use super::resolved::Resolved;
use super::stretch::{Stretch, stretch};
use crate::words::{Quoted, number, rounded};

/// Thermal expansion where the brief gives none (1/K): steel wire, common practice.
const STEEL_EXPANSION: f64 = 12e-6;
/// Axial stiffness, and modulus times area, agree within this share.
const AGREEMENT: f64 = 1e-3;

/// Sections as read, and the one of every segment.
#[derive(Debug)]
pub(crate) struct Sections<'a> {
    /// Position in the list, by id.
    pub(crate) names: Names<'a, usize>,
    pub(crate) list: Vec<SectionDraft<'a>>,
    /// Index of the section and strength factor of the fittings, by segment.
    pub(crate) of_segment: Vec<Option<(usize, f64)>>,
}

/// A section with every number in force.
#[derive(Debug)]
pub(crate) struct SectionDraft<'a> {
    pub(crate) message: &'a v1::Section,
    /// `None` where it could not be read.
    pub(crate) axial_stiffness: Option<f64>,
    pub(crate) mass_per_length: f64,
    pub(crate) expansion: f64,
    /// Of the bare rope (N).
    pub(crate) breaking_force: Option<f64>,
    /// Force at the proof strength (N).
    pub(crate) proof_force: Option<f64>,
    pub(crate) diameter: Option<f64>,
    pub(crate) bending_stiffness: Option<f64>,
}

impl<'a> Sections<'a> {
    /// Reads sections and roles, and finds what each segment is made of.
    pub(crate) fn read(net: &NetDraft<'a>, findings: &mut Findings, resolved: &mut Resolved) -> Self {
        let at = Path::root("net.sections");
        let mut names = Names::new("sections");
        let mut list = Vec::with_capacity(net.message.sections.len());
        for (index, section) in net.message.sections.iter().enumerate() {
            names.declare(findings, &at, index, section.id.as_str(), index);
            list.push(read_section(
                section,
                &at.element(&section.id, index),
                findings,
                resolved,
            ));
        }
        let roles = read_roles(net, &names, findings);
        let mut sections = Self {
            names: Names::new("sections"),
            list,
            of_segment: vec![None; net.segments.len()],
        };
        sections.of_cables(net, &names, &roles, findings, resolved);
        sections.of_struts(net, &names, &roles, findings, resolved);
        sections.names = names;
        sections
    }

    fn of_cables(
        &mut self,
        net: &NetDraft<'a>,
        names: &Names<'a, usize>,
        roles: &[RoleDraft],
        findings: &mut Findings,
        resolved: &mut Resolved,
    ) {
        let list = Path::root("net.cables");
        for (index, cable) in net.cables.iter().enumerate() {
            let (message, at) = (cable.message, list.element(&cable.message.id, index));
            let role = cable.role.map(|role| (role, &roles[role]));
            let own = own_section(&message.section, names, &at, findings);
            let section = inherit(net, own, role, &message.section, &at, resolved);
            let fitting_at = at.field("end_fitting");
            let factor = match (&message.end_fitting, role) {
                (Some(fitting), _) => read_fitting(fitting, Of::new("cable", &message.id), &fitting_at, findings),
                (None, Some((role, draft))) if net.message.roles[role].end_fitting.is_some() => {
                    let roles = Path::root("net.roles");
                    let origin = roles.element(&net.message.roles[role].id, role);
                    let words = format!("strength factor {}", number(draft.strength_factor));
                    resolved.inherited(&fitting_at, words, &origin.field("end_fitting"));
                    draft.strength_factor
                }
                (None, _) => 1.0,
            };
            let mut parts: Vec<Option<(usize, usize)>> = vec![None; cable.n_segments()];
            for (number, part) in message.parts.iter().enumerate() {
                let list = at.field("parts");
                let at = list.number(number);
                self.read_part(net, index, (part, number), names, &at, &mut parts, findings);
            }
            let mut bare = false;
            for (position, part) in parts.iter().enumerate() {
                let of_segment = part.map(|(_, section)| section).or(section);
                bare |= of_segment.is_none();
                self.of_segment[cable.first_segment + position] = of_segment.map(|section| (section, factor));
            }
            if bare && message.section.is_empty() && !role.is_some_and(|(_, draft)| draft.names_one) {
                no_section(MemberDraft::Cable(index), net, &at, findings);
            }
        }
    }

    #[allow(
        clippy::too_many_arguments,
        reason = "the place, the part, and what it is read against"
    )]
    fn read_part(
        &self,
        net: &NetDraft<'a>,
        cable: usize,
        (part, number): (&'a v1::CablePart, usize),
        names: &Names<'a, usize>,
        at: &Path<'_>,
        parts: &mut [Option<(usize, usize)>],
        findings: &mut Findings,
    ) {
        let id = &net.cables[cable].message.id;
        let section = if part.section.is_empty() {
            findings.error(
                reasons::MISSING,
                &at.field("section"),
                id,
                format!("this part of cable {} names no section", Quoted(id)),
                "give its section: nothing else differs in a part",
            );
            None
        } else {
            names.find(findings, &at.field("section"), "section", &part.section)
        };
        let wanted = Stretch {
            from: &part.from,
            to: &part.to,
            from_visit: part.from_visit,
            to_visit: part.to_visit,
        };
        let (Some(positions), Some(section)) = (stretch(net, cable, &wanted, at, findings), section) else {
            return;
        };
        for position in positions {
            match parts[position] {
                Some((other, _)) if other != number => {
                    findings.error(
                        reasons::PARTS_OVERLAP,
                        at,
                        id,
                        format!("parts {other} and {number} of cable {} overlap", Quoted(id)),
                        "let each part end where the next begins",
                    );
                    return;
                }
                _ => parts[position] = Some((number, section)),
            }
        }
    }

    fn of_struts(
        &mut self,
        net: &NetDraft<'a>,
        names: &Names<'a, usize>,
        roles: &[RoleDraft],
        findings: &mut Findings,
        resolved: &mut Resolved,
    ) {
        let list = Path::root("net.struts");
        for (index, strut) in net.struts.iter().enumerate() {
            let (message, at) = (strut.message, list.element(&strut.message.id, index));
            let role = strut.role.map(|role| (role, &roles[role]));
            let own = own_section(&message.section, names, &at, findings);
            let section = inherit(net, own, role, &message.section, &at, resolved);
            if section.is_none() && message.section.is_empty() && !role.is_some_and(|(_, draft)| draft.names_one) {
                no_section(MemberDraft::Strut(index), net, &at, findings);
            }
            if strut.ends.is_some() {
                let factor = role.map_or(1.0, |(_, draft)| draft.strength_factor);
                self.of_segment[strut.segment] = section.map(|section| (section, factor));
            }
        }
    }

    /// The section of a segment as the kernel wants it, where it could be read.
    pub(crate) fn section(&self, segment: usize) -> Option<Section> {
        let (index, factor) = self.of_segment[segment]?;
        self.with_fittings(index, factor)
    }

    /// A section of the list as the kernel wants it, with the strength factor of end fittings, where it could be read.
    pub(crate) fn with_fittings(&self, index: usize, factor: f64) -> Option<Section> {
        let draft = &self.list[index];
        Some(Section {
            axial_stiffness: draft.axial_stiffness?,
            mass_per_length: draft.mass_per_length,
            expansion: draft.expansion,
            breaking_force: draft.breaking_force.map(|force| factor * force),
            proof_force: draft.proof_force,
            bending_stiffness: draft.bending_stiffness,
            diameter: draft.diameter,
        })
    }
}

fn own_section(id: &str, names: &Names<'_, usize>, at: &Path<'_>, findings: &mut Findings) -> Option<usize> {
    if id.is_empty() {
        None
    } else {
        names.find(findings, &at.field("section"), "section", id)
    }
}

fn inherit(
    net: &NetDraft<'_>,
    own: Option<usize>,
    role: Option<(usize, &RoleDraft)>,
    own_id: &str,
    at: &Path<'_>,
    resolved: &mut Resolved,
) -> Option<usize> {
    if own.is_some() || !own_id.is_empty() {
        return own;
    }
    let (role, draft) = role?;
    let section = draft.section?;
    let roles = Path::root("net.roles");
    let origin = roles.element(&net.message.roles[role].id, role);
    let id = &net.message.sections[section].id;
    resolved.inherited(&at.field("section"), id, &origin.field("section"));
    Some(section)
}

fn no_section(member: MemberDraft, net: &NetDraft<'_>, at: &Path<'_>, findings: &mut Findings) {
    let kind = match member {
        MemberDraft::Cable(_) => "cable",
        MemberDraft::Strut(_) => "strut",
    };
    let id = net.member_id(member);
    findings.error(
        reasons::NO_SECTION,
        &at.field("section"),
        id,
        format!("{kind} {} has no section, and no role that gives it one", Quoted(id)),
        "give its section, or a role with a section",
    );
}

fn read_section<'a>(
    section: &'a v1::Section,
    at: &Path<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> SectionDraft<'a> {
    let of = Of::new("section", &section.id);
    let mut positive = |field: &'static str, quantity, value: Option<f64>| {
        value.map(|value| findings.number(&at.field(field), of, quantity, value))
    };
    let stiffness = positive("axial_stiffness_n", &AXIAL_STIFFNESS, section.axial_stiffness_n);
    let modulus = positive("modulus_pa", &MODULUS, section.modulus_pa);
    let (field, area) = match section.area {
        Some(v1::section::Area::MetallicAreaM2(area)) => ("metallic_area_m2", Some(area)),
        Some(v1::section::Area::NominalAreaM2(area)) => ("nominal_area_m2", Some(area)),
        None => ("metallic_area_m2", None),
    };
    let area = positive(field, &AREA, area);
    let breaking_force = positive("breaking_force_n", &BREAKING_FORCE, section.breaking_force_n).flatten();
    let proof_force = positive("proof_force_n", &PROOF_FORCE, section.proof_force_n).flatten();
    let diameter = positive("diameter_m", &DIAMETER, section.diameter_m).flatten();
    let bending_stiffness = positive(
        "bending_stiffness_n_m2",
        &BENDING_STIFFNESS,
        section.bending_stiffness_n_m2,
    )
    .flatten();

    let product = match (modulus, area) {
        (Some(Some(modulus)), Some(Some(area))) => Some(modulus * area),
        _ => None,
    };
    let axial_stiffness = match (stiffness, product) {
        (Some(Some(stiffness)), Some(product)) => {
            if (stiffness - product).abs() > AGREEMENT * stiffness.max(product) {
                findings
                    .error(
                        reasons::STIFFNESS_DISAGREES,
                        &at.field("axial_stiffness_n"),
                        &section.id,
                        format!(
                            "{of}: axial stiffness {} N, but modulus times area is {} N",
                            number(stiffness),
                            rounded(product, 4)
                        ),
                        "give only one of the two, or make them agree within 0.1 %; mind which area the modulus belongs to",
                    )
                    .value(number(stiffness));
            }
            Some(stiffness)
        }
        (Some(stiffness), _) => stiffness,
        (None, Some(product)) => {
            let field = at.field("axial_stiffness_n");
            let product = findings.number(&field, of, &AXIAL_STIFFNESS, product);
            if let Some(product) = product {
                resolved.inherited(&field, number(product), &at.field("modulus_pa"));
            }
            product
        }
        (None, None) => {
            if modulus != Some(None) && area != Some(None) {
                let (field, lacks) = match (modulus, area) {
                    (Some(_), None) => ("metallic_area_m2", "a modulus without an area"),
                    (None, Some(_)) => ("modulus_pa", "an area without a modulus"),
                    _ => ("axial_stiffness_n", "no axial stiffness"),
                };
                findings.error(
                    reasons::MISSING,
                    &at.field(field),
                    &section.id,
                    format!("{of} has {lacks}"),
                    "give axial_stiffness_n, or modulus_pa with metallic_area_m2 or nominal_area_m2",
                );
            }
            None
        }
    };
    let mut with_default = |field: &'static str, quantity, value: Option<f64>, default: f64| {
        let at = at.field(field);
        if value.is_none() {
            resolved.left_out(&at, number(default));
        }
        findings.number_or(&at, of, quantity, value, default).unwrap_or(default)
    };
    let mass = with_default("mass_kg_per_m", &MASS_PER_LENGTH, section.mass_kg_per_m, 0.0);
    let expansion = with_default("expansion_per_k", &EXPANSION, section.expansion_per_k, STEEL_EXPANSION);
    SectionDraft {
        message: section,
        axial_stiffness,
        mass_per_length: mass,
        expansion,
        breaking_force,
        proof_force,
        diameter,
        bending_stiffness,
    }
}

/// What a role supplies.
struct RoleDraft {
    section: Option<usize>,
    /// Whether it names a section, known or not.
    names_one: bool,
    strength_factor: f64,
}

fn read_roles(net: &NetDraft<'_>, names: &Names<'_, usize>, findings: &mut Findings) -> Vec<RoleDraft> {
    let list = Path::root("net.roles");
    let roles = net.message.roles.iter().enumerate();
    roles
        .map(|(index, role)| {
            let at = list.element(&role.id, index);
            let fitting = role.end_fitting.as_ref();
            RoleDraft {
                section: own_section(&role.section, names, &at, findings),
                names_one: !role.section.is_empty(),
                strength_factor: fitting.map_or(1.0, |fitting| {
                    read_fitting(fitting, Of::new("role", &role.id), &at.field("end_fitting"), findings)
                }),
            }
        })
        .collect()
}

fn read_fitting(fitting: &v1::EndFitting, of: Of<'_>, at: &Path<'_>, findings: &mut Findings) -> f64 {
    if let Some(take_up) = fitting.take_up_m {
        findings.number(&at.field("take_up_m"), of, &TAKE_UP, take_up);
    }
    let factor = at.field("strength_factor");
    findings
        .number_or(&factor, of, &STRENGTH_FACTOR, fitting.strength_factor, 1.0)
        .unwrap_or(1.0)
}
