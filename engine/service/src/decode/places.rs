//! Nodes that something is odd about: used once, used by nothing, far away, in the same place as another.

use std::collections::HashMap;

use nalgebra::Vector3;

use super::findings::{Findings, Path};
use super::names::{Thing, look_alike};
use super::net::{MemberDraft, NetDraft, NodeDraft};
use super::reasons;
use crate::words::{Quoted, length, quoted_list, rounded};

/// Coordinates farther from the origin lose digits to it (m).
const FARTHEST: f64 = 10_000.0;
/// Nodes closer than this are in the same place (m).
const SAME_PLACE: f64 = 1e-6;

/// Listed and named nodes that something is odd about.
pub(crate) fn check_uses(net: &NetDraft<'_>, findings: &mut Findings) {
    let list = Path::root("net.nodes");
    let mut forms = HashMap::new();
    for node in &net.nodes {
        *forms.entry(look_alike(node.id)).or_insert(0_usize) += 1;
    }
    for (index, node) in net.nodes.iter().enumerate() {
        let at = list.element(node.id, index);
        let supported = node.listed.is_some_and(|n| n.support.is_some());
        let name = Quoted(node.id);
        match node.uses {
            0 if supported => {
                findings.doubt(
                    reasons::NODE_UNUSED,
                    &at,
                    node.id,
                    format!("node {name} is supported, and no member leads to it"),
                    "name it in the path of a member, or take it out",
                );
            }
            0 => {
                findings.error(
                    reasons::NODE_NOT_CONNECTED,
                    &at,
                    node.id,
                    format!("node {name} is free, and no member leads to it: nothing holds it"),
                    "name it in the path of a member, or take it out",
                );
            }
            1 if node.at_end && !node.is_placed() && !supported => used_once(net, node, &at, findings),
            1 if node.listed.is_none() && forms[&look_alike(node.id)] > 1 => {
                let others = net.nodes.iter().map(|n| n.id);
                if let Some(other) = findings.nearest(node.id, others) {
                    findings.doubt(
                        reasons::NODE_LOOKS_LIKE,
                        &net.place_in_path(node, &mut String::new()),
                        node.id,
                        format!(
                            "node {name} is used once, by {}, and looks like node {}",
                            Quoted(node.user),
                            Quoted(other)
                        ),
                        "write one of the names everywhere, or accept this doubt",
                    );
                }
            }
            _ => {}
        }
    }
}

fn used_once(net: &NetDraft<'_>, node: &NodeDraft<'_>, listed_at: &Path<'_>, findings: &mut Findings) {
    let cable = matches!(net.names.get(node.user), Some(Thing::Cable(_)));
    let (kind, rope) = if cable { ("cable", "rope") } else { ("strut", "bar") };
    let meant = findings.nearest(node.id, net.nodes.iter().map(|n| n.id));
    let question = meant.map_or(String::new(), |meant| format!(" Did you mean {}?", Quoted(meant)));
    let message = format!(
        "node {} is used once, by {kind} {}, and has no coordinates: it would hang on one {rope}.{question}",
        Quoted(node.id),
        Quoted(node.user),
    );
    let cure = meant.map_or_else(
        || "lead another member to it, or list it in net.nodes with xyz_m".to_owned(),
        |meant| {
            format!(
                "write {} in the path, or list the node in net.nodes with xyz_m",
                Quoted(meant)
            )
        },
    );
    let mut text = String::new();
    let at = if node.listed.is_some() {
        *listed_at
    } else {
        net.place_in_path(node, &mut text)
    };
    findings
        .error(reasons::NODE_USED_ONCE, &at, node.id, message, cure)
        .value(node.id);
}

pub(crate) fn check_places(net: &NetDraft<'_>, findings: &mut Findings) {
    let far: Vec<usize> = (0..net.nodes.len())
        .filter(|i| net.nodes[*i].position.is_some_and(|p| p.amax() > FARTHEST))
        .collect();
    let placed = net.nodes.iter().filter(|n| n.position.is_some()).count();
    if far.len() > 1 && far.len() == placed {
        let positions = || far.iter().filter_map(|i| net.nodes[*i].position);
        let mean: Vector3<f64> = positions().sum::<Vector3<f64>>() / placed as f64;
        let shift = mean.map(|c| {
            if c.abs() > FARTHEST {
                (c / 100.0).round() * 100.0
            } else {
                0.0
            }
        });
        findings
            .error(
                reasons::FAR_FROM_ORIGIN,
                &Path::root("net.nodes"),
                "",
                format!(
                    "all nodes lie about {} km from the origin: that many digits are lost to their movements",
                    rounded(mean.norm() / 1e3, 4)
                ),
                format!(
                    "subtract ({}, {}, {}) from all coordinates and give it as net.origin_m; coordinates may reach 10 km",
                    shift.x, shift.y, shift.z
                ),
            )
            .value(rounded(mean.norm(), 6));
    } else {
        let list = Path::root("net.nodes");
        for index in far {
            let node = &net.nodes[index];
            let away = node.position.map_or(0.0, |p| p.amax());
            findings
                .error(
                    reasons::FAR_FROM_ORIGIN,
                    &list.element(node.id, index).field("xyz_m"),
                    node.id,
                    format!("node {} lies {} from the origin", Quoted(node.id), length(away)),
                    "mend the coordinate, or count all coordinates from a point nearby and give it as net.origin_m; \
                     they may reach 10 km",
                )
                .value(away);
        }
    }
    let cables = Path::root("net.cables");
    let struts = Path::root("net.struts");
    for ([a, b], member) in &net.segments {
        let (Some(first), Some(second)) = (net.nodes[*a].position, net.nodes[*b].position) else {
            continue;
        };
        if a == b || (second - first).norm() >= SAME_PLACE {
            continue;
        }
        let (list, id, index) = match member {
            MemberDraft::Cable(index) => (&cables, &net.cables[*index].message.id, *index),
            MemberDraft::Strut(index) => (&struts, &net.struts[*index].message.id, *index),
        };
        findings.error(
            reasons::NO_LENGTH,
            &list.element(id, index).field("nodes"),
            id,
            format!(
                "{} has no length between {}: they lie in the same place",
                Quoted(id),
                quoted_list([net.nodes[*a].id, net.nodes[*b].id])
            ),
            "mend the coordinates of one of the two nodes, or name only one of them",
        );
    }
}
