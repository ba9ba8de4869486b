//! Everything that keeps the given parts from being a net.

use super::{CableGiven, ElasticSupportGiven, NetError, NetGiven, NodeId, PanelGiven, Section, Skin, Zone};

/// All of it, not just the first.
pub(super) fn violations(given: &NetGiven) -> Vec<NetError> {
    let mut errors = Vec::new();
    if given.cables.is_empty() && given.struts.is_empty() {
        errors.push(NetError::Empty);
    }
    for node in &given.nodes {
        if let Some(value) = node.position.iter().flatten().find(|c| !c.is_finite()) {
            errors.push(NetError::NotFinite {
                what: "position",
                of: node.name.clone(),
                value: *value,
            });
        }
        if !(node.attached_mass.is_finite() && node.attached_mass >= 0.0) {
            errors.push(NetError::NotPositive {
                what: "attached mass",
                of: node.name.clone(),
                value: node.attached_mass,
            });
        }
        if let Some(support) = &node.support {
            if node.position.is_none() {
                errors.push(NetError::SupportWithoutPosition { of: node.name.clone() });
            }
            for direction in &support.released {
                if !(direction.norm().is_finite() && direction.norm() > 0.0) {
                    errors.push(NetError::NotPositive {
                        what: "released direction",
                        of: node.name.clone(),
                        value: direction.norm(),
                    });
                }
            }
        }
    }
    for cable in &given.cables {
        check_path(&cable.name, &cable.path, given.nodes.len(), &mut errors);
        if cable.sections.len() + 1 != cable.path.len() {
            errors.push(NetError::DegeneratePath {
                of: cable.name.clone(),
                position: cable.sections.len(),
            });
        }
        for section in &cable.sections {
            check_section(&cable.name, section, &mut errors);
        }
        check_slides(cable, &mut errors);
    }
    for strut in &given.struts {
        check_path(&strut.name, &strut.ends, given.nodes.len(), &mut errors);
        check_section(&strut.name, &strut.section, &mut errors);
    }
    check_surface(
        &given.panels,
        &given.skins,
        &given.zones,
        given.nodes.len(),
        &mut errors,
    );
    for elastic in &given.elastic_supports {
        check_elastic_support(elastic, given, &mut errors);
    }
    errors
}

fn check_path(name: &str, path: &[NodeId], n_nodes: usize, errors: &mut Vec<NetError>) {
    if path.len() < 2 {
        errors.push(NetError::DegeneratePath {
            of: name.to_owned(),
            position: 0,
        });
    }
    for (position, pair) in path.windows(2).enumerate() {
        if pair[0] == pair[1] {
            errors.push(NetError::DegeneratePath {
                of: name.to_owned(),
                position,
            });
        }
    }
    for node in path {
        if node.index() >= n_nodes {
            errors.push(NetError::UnknownNode {
                of: name.to_owned(),
                node: *node,
            });
        }
    }
}

fn check_slides(cable: &CableGiven, errors: &mut Vec<NetError>) {
    for (index, slide) in cable.slides.iter().enumerate() {
        let is_inner = slide.place > 0 && slide.place + 1 < cable.path.len();
        let is_new = cable.slides[..index].iter().all(|other| other.place != slide.place);
        if !is_inner || !is_new || cable.hangs {
            errors.push(NetError::CanNotSlide {
                of: cable.name.clone(),
                position: slide.place,
            });
        }
        if !(slide.friction.is_finite() && slide.friction >= 0.0) {
            errors.push(NetError::NotPositive {
                what: "friction coefficient",
                of: cable.name.clone(),
                value: slide.friction,
            });
        }
    }
}

pub(super) fn check_surface(
    panels: &[PanelGiven],
    skins: &[Skin],
    zones: &[Zone],
    n_nodes: usize,
    errors: &mut Vec<NetError>,
) {
    for panel in panels {
        check_panel(panel, n_nodes, errors);
    }
    let mut skins_of = vec![0; panels.len()];
    for skin in skins {
        if !(skin.mass_per_area.is_finite() && skin.mass_per_area >= 0.0) {
            errors.push(NetError::NotPositive {
                what: "mass per area",
                of: skin.name.clone(),
                value: skin.mass_per_area,
            });
        }
        for panel in &skin.panels {
            match skins_of.get_mut(*panel) {
                Some(skins) => *skins += 1,
                None => errors.push(NetError::UnknownPart {
                    of: skin.name.clone(),
                    what: "panel",
                }),
            }
        }
    }
    for (panel, skins) in panels.iter().zip(skins_of) {
        if skins > 1 {
            errors.push(NetError::SeveralSkins { of: panel.name.clone() });
        }
    }
    for zone in zones {
        if zone.skin >= skins.len() {
            errors.push(NetError::UnknownPart {
                of: zone.name.clone(),
                what: "skin",
            });
        }
        if zone.outline.len() < 3 || zone.outline.iter().any(|p| !(p.x.is_finite() && p.y.is_finite())) {
            errors.push(NetError::DegeneratePanel { of: zone.name.clone() });
        }
    }
}

fn check_panel(panel: &PanelGiven, n_nodes: usize, errors: &mut Vec<NetError>) {
    if let Some(node) = panel.corners.iter().find(|n| n.index() >= n_nodes) {
        errors.push(NetError::UnknownNode {
            of: panel.name.clone(),
            node: *node,
        });
    }
    let is_double = |i: usize| panel.corners[..i].contains(&panel.corners[i]);
    if panel.corners.len() < 3 || (0..panel.corners.len()).any(is_double) {
        errors.push(NetError::DegeneratePanel { of: panel.name.clone() });
    }
}

pub(super) fn check_section(name: &str, section: &Section, errors: &mut Vec<NetError>) {
    let mut positive = |what, value: f64, allowed: bool| {
        if !(value.is_finite() && allowed) {
            errors.push(NetError::NotPositive {
                what,
                of: name.to_owned(),
                value,
            });
        }
    };
    positive(
        "axial stiffness",
        section.axial_stiffness,
        section.axial_stiffness > 0.0,
    );
    positive(
        "mass per length",
        section.mass_per_length,
        section.mass_per_length >= 0.0,
    );
    positive("expansion", section.expansion, true);
    for (what, value) in [
        ("breaking force", section.breaking_force),
        ("proof force", section.proof_force),
        ("bending stiffness", section.bending_stiffness),
        ("diameter", section.diameter),
    ] {
        if let Some(value) = value {
            positive(what, value, value > 0.0);
        }
    }
}

/// Relative asymmetry and negative eigenvalue of a support stiffness that still count as rounding.
const STIFFNESS_ROUNDING: f64 = 1e-9;

fn check_elastic_support(elastic: &ElasticSupportGiven, given: &NetGiven, errors: &mut Vec<NetError>) {
    let names: Vec<&str> = elastic
        .nodes
        .iter()
        .filter_map(|n| given.nodes.get(n.index()))
        .map(|n| n.name.as_str())
        .collect();
    let mut lacks = |property| {
        errors.push(NetError::SupportStiffness {
            of: names.join(", "),
            property,
        })
    };
    let size = 3 * elastic.nodes.len();
    let s = &elastic.stiffness;
    if names.len() != elastic.nodes.len() || s.nrows() != size || s.ncols() != size || size == 0 {
        lacks("of three rows and columns for each of its nodes");
        return;
    }
    if !s.iter().all(|v| v.is_finite()) {
        lacks("finite");
        return;
    }
    if elastic.nodes.iter().any(|n| given.nodes[n.index()].position.is_none()) {
        lacks("at a node with a position");
    }
    let largest = s.amax();
    if (s - s.transpose()).amax() > STIFFNESS_ROUNDING * largest {
        lacks("symmetric");
    } else if s.clone().symmetric_eigenvalues().min() < -STIFFNESS_ROUNDING * largest {
        lacks("positive semi-definite");
    }
}
