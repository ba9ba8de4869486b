//! How a motion starts, if not at rest in the state that it starts from.

use nalgebra::Vector3;
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::StartGiven;
use ropewalk_numerics::model::NodeId;

use super::findings::{Findings, Path};
use super::motions::{Basics, Context};
use super::numbers::{MOVEMENT, Quantity, VELOCITY};
use super::reasons;
use super::scope::NODES;
use crate::words::{Quoted, number, quoted_list};

/// Part of a vector along held directions, over the whole of it, that still counts as rounding.
const ROUNDING: f64 = 1e-9;

pub(super) fn read(
    motion: &v1::Motion,
    basics: &Basics<'_>,
    context: &Context<'_, '_>,
    at: &Path<'_>,
    findings: &mut Findings,
) -> Option<StartGiven> {
    let Some(given) = &motion.start else {
        return Some(StartGiven::default());
    };
    let of = basics.of;
    let at = at.field("start");
    let shape_at = at.field("shape_of");
    let mut is_right = true;
    let shape_of = if given.shape_of.is_empty() {
        None
    } else {
        let case = context.cases.one(&given.shape_of, &shape_at, findings);
        is_right &= case.is_some();
        case
    };
    if shape_of.is_some() && basics.from == Some(shape_of) {
        findings
            .doubt(
                reasons::DATA_NOT_USED,
                &shape_at,
                &given.shape_of,
                format!(
                    "{of} starts in the state of {} and in its shape: that is the same",
                    Quoted(&given.shape_of)
                ),
                "name the case whose shape it is let go from, and in from the state that it returns to",
            )
            .value(&given.shape_of);
    }
    let mut start = StartGiven {
        shape_of,
        ..StartGiven::default()
    };
    let list = at.field("moved");
    let mut moved = vec![false; context.net.nodes.len()];
    for (place, given) in given.moved.iter().enumerate() {
        let at = list.number(place);
        let vector = (&given.by_m[..], "by_m", &MOVEMENT, "is moved");
        let nodes = read_vector(&given.on, vector, basics, context, &at, findings);
        is_right &= nodes.is_some();
        let nodes = nodes.unwrap_or_default();
        if !context.covered.add(nodes.len(), of, &at, findings) {
            return None;
        }
        for (node, by) in nodes {
            if std::mem::replace(&mut moved[node.index()], true) {
                is_right = false;
                let id = context.net.nodes[node.index()].id;
                findings
                    .error(
                        reasons::REPEATED_IN_LIST,
                        &at.field("on"),
                        id,
                        format!("{of}: node {} is moved twice at the start", Quoted(id)),
                        "name each node once in start.moved",
                    )
                    .value(id);
            }
            start.moved.push((node, by));
        }
    }
    let list = at.field("velocities");
    for (place, given) in given.velocities.iter().enumerate() {
        let at = list.number(place);
        let vector = (
            &given.velocity_m_per_s[..],
            "velocity_m_per_s",
            &VELOCITY,
            "has a velocity",
        );
        let nodes = read_vector(&given.on, vector, basics, context, &at, findings);
        is_right &= nodes.is_some();
        let nodes = nodes.unwrap_or_default();
        if !context.covered.add(nodes.len(), of, &at, findings) {
            return None;
        }
        start.velocities.extend(nodes);
    }
    is_right.then_some(start)
}

/// Nodes with a vector along which they can move. `verb`: what they do with it.
fn read_vector(
    on: &[String],
    (given, name, quantity, verb): (&[f64], &'static str, &Quantity, &'static str),
    basics: &Basics<'_>,
    context: &Context<'_, '_>,
    at: &Path<'_>,
    findings: &mut Findings,
) -> Option<Vec<(NodeId, Vector3<f64>)>> {
    let of = basics.of;
    let (on_at, field) = (at.field("on"), at.field(name));
    let vector = findings.vector(&field, of, quantity, given);
    if on.is_empty() {
        findings.error(
            reasons::COVERS_NOTHING,
            &on_at,
            of.id,
            format!("{of}: it is not said which node {verb} at the start"),
            "name nodes or groups of nodes in on",
        );
        return None;
    }
    let scope = context.scopes.of(context.net, on, &on_at, NODES, findings);
    let vector = vector?;
    if vector == Vector3::zeros() {
        findings.doubt(
            reasons::COVERS_NOTHING,
            &field,
            of.id,
            format!("{of}: a node {verb} at the start by (0, 0, 0), which is nothing"),
            "give the three numbers, or take it out",
        );
    }
    let nodes: Vec<(usize, Vector3<f64>)> = scope
        .nodes()
        .map(|node| (node, context.supports.movable_part(node, vector)))
        .collect();
    let held = nodes
        .iter()
        .filter(|(_, part)| (vector - part).norm() > ROUNDING * vector.norm());
    let held: Vec<&str> = held.map(|(node, _)| context.net.nodes[*node].id).collect();
    if let Some(first) = held.first() {
        findings
            .error(
                reasons::START_ALONG_HELD,
                &on_at,
                first,
                format!(
                    "{of}: a node {verb} along ({}, {}, {}) at the start where its support holds it: {}",
                    number(vector.x),
                    number(vector.y),
                    number(vector.z),
                    quoted_list(held.iter().copied())
                ),
                "name free nodes, or a vector along directions in which they are free; supports are moved by a driven \
                 action",
            )
            .value(held.len());
        return None;
    }
    let nodes = nodes.into_iter().map(|(node, part)| (NodeId::new(node), part));
    scope.complete.then(|| nodes.collect())
}
