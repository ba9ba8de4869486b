//! What motions need of the net as built: coefficients of wind on its panels, and whether what moves has a mass.

use nalgebra::Vector3;
use ropewalk_numerics::brief::{CaseGiven, DrivenWhat, MotionGiven};
use ropewalk_numerics::load::Surface;
use ropewalk_numerics::model::{Area, Member, Net};

use super::findings::{Findings, Path};
use super::motions::MotionDraft;
use super::numbers::Of;
use super::reasons;
use super::surface::{WithoutValue, about, tell_contradiction};
use crate::words::quoted_list;

/// The motions of a net whose nodes are or about are at `positions` (m); where they are not known there are no panels, and no
/// reference state either. `movable`: nodes that can move.
pub(super) fn complete(
    drafts: Vec<MotionDraft>,
    net: &Net,
    positions: Option<&[Vector3<f64>]>,
    cases: &[CaseGiven],
    movable: &[bool],
    findings: &mut Findings,
) -> Vec<MotionGiven> {
    let surface = positions.map(|positions| Surface::new(net, positions));
    let list = Path::root("motions");
    let complete = |draft: MotionDraft| {
        let mut given = draft.given;
        let name = given.name.clone();
        let (of, at) = (Of::new("motion", &name), list.element(&name, draft.position));
        if let Some(surface) = &surface {
            let loads = at.field("driven");
            let winds = given.driven.iter_mut().filter_map(|driven| match &mut driven.what {
                DrivenWhat::Wind { coefficients, .. } => Some(coefficients),
                DrivenWhat::Action(_) => None,
            });
            for (wind, (place, (coefficients, elsewhere))) in winds.zip(&draft.winds) {
                let at = loads.number(*place);
                let at = at.field("wind");
                tell_contradiction(net, surface, coefficients, of, &at, findings);
                if let Some(found) = WithoutValue::of(net, surface, coefficients, *elsewhere) {
                    findings
                        .doubt(
                            reasons::PANELS_WITHOUT_VALUE,
                            &at.field("coefficients"),
                            of.id,
                            found.message(net, of, about(net)),
                            WithoutValue::CURE,
                        )
                        .value(found.panels.len());
                }
                let of_panel = |panel| surface.coefficient(panel, coefficients, *elsewhere).unwrap_or(0.0);
                *wind = (0..net.panels().len()).map(of_panel).collect();
            }
            let removed = given.from.map_or(&[][..], |case| &cases[case].removed);
            tell_massless(net, surface, &given, removed, movable, of, &at, findings);
        }
        given
    };
    drafts.into_iter().map(complete).collect()
}

/// Tells nodes that can move, and points of division of hanging ropes, that have no mass.
#[allow(clippy::too_many_arguments, reason = "what masses come from, and where findings go")]
fn tell_massless(
    net: &Net,
    surface: &Surface,
    given: &MotionGiven,
    removed: &[Member],
    movable: &[bool],
    of: Of<'_>,
    at: &Path<'_>,
    findings: &mut Findings,
) {
    let has_mass = with_mass(net, surface, given, removed);
    let without = (0..net.nodes().len()).filter(|node| movable[*node] && !has_mass.nodes[*node]);
    let ids: Vec<&str> = without.map(|node| net.nodes()[node].name.as_str()).collect();
    if let Some(first) = ids.first() {
        findings
            .error(
                reasons::NO_MASS,
                at,
                first,
                format!(
                    "{of} cannot begin: {} nodes that can move have no mass: {}",
                    ids.len(),
                    quoted_list(ids.iter().copied())
                ),
                "give mass_kg_per_m of the sections there, attached_mass_kg of the nodes, or added",
            )
            .value(ids.len());
    }
    let hanging = net.cables().iter().filter(|cable| {
        let mut segments = cable.segments.clone();
        segments.any(|segment| net.segments()[segment].hangs && !has_mass.segments[segment])
    });
    let ids: Vec<&str> = hanging.map(|cable| cable.name.as_str()).collect();
    if let Some(first) = ids.first() {
        findings
            .error(
                reasons::NO_MASS,
                at,
                first,
                format!(
                    "{of} cannot begin: hanging ropes are divided, and the points of division of some have no mass: {}",
                    quoted_list(ids.iter().copied())
                ),
                "give mass_kg_per_m of their sections, or take hangs out of them",
            )
            .value(ids.len());
    }
}

/// What has a mass: nodes from anything, segments by their length.
struct WithMass {
    nodes: Vec<bool>,
    segments: Vec<bool>,
}

fn with_mass(net: &Net, surface: &Surface, given: &MotionGiven, removed: &[Member]) -> WithMass {
    let mut nodes: Vec<bool> = net.nodes().iter().map(|node| node.attached_mass > 0.0).collect();
    let heavy = net
        .segments()
        .iter()
        .map(|segment| segment.section.mass_per_length > 0.0);
    let mut segments: Vec<bool> = heavy.collect();
    for (segment, _) in given.masses.segments.iter().filter(|(_, mass)| *mass > 0.0) {
        segments[segment.index()] = true;
    }
    let mut present = vec![true; segments.len()];
    for member in removed {
        match member {
            Member::Cable(cable) => present[net.cables()[cable.index()].segments.clone()].fill(false),
            Member::Strut(strut) => present[net.struts()[strut.index()].segment.index()] = false,
        }
    }
    for (index, segment) in net.segments().iter().enumerate() {
        if present[index] && segments[index] {
            segment.ends.iter().for_each(|end| nodes[end.index()] = true);
        }
    }
    let skins = (net.skins().iter().enumerate()).filter(|(_, skin)| skin.mass_per_area > 0.0);
    let mut areas: Vec<Area> = skins.map(|(skin, _)| Area::Skin(skin)).collect();
    let added = given.masses.areas.iter().filter(|(_, mass)| *mass > 0.0);
    areas.extend(added.flat_map(|(areas, _)| areas));
    for panel in surface.panels_of(&areas) {
        let corners = &net.panels()[panel].corners;
        corners.iter().for_each(|corner| nodes[corner.index()] = true);
    }
    for (node, _) in given.masses.nodes.iter().filter(|(_, mass)| *mass > 0.0) {
        nodes[node.index()] = true;
    }
    // What is taken out is not divided.
    for (segment, present) in segments.iter_mut().zip(present) {
        *segment |= !present;
    }
    WithMass { nodes, segments }
}
