//! What the shape is to meet beside the tensions that rules want.

use nalgebra::Vector3;
use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::sag_target::Sag;
use ropewalk_api::ropewalk::v1::shape_target::Wish as Given;
use ropewalk_api::ropewalk::v1::tension_target::Tension;
use ropewalk_numerics::model::{NodeId, SegmentId};
use ropewalk_numerics::shape::{SagMeasure, ShapeTarget, Wish, gives_surface};

use super::findings::{Findings, Path};
use super::names::{Names, Thing};
use super::net::MemberDraft;
use super::numbers::{
    COORDINATE, CURVATURE_RADIUS, LENGTH_TARGET, MEAN_TENSION, Of, Quantity, SAG, SAG_NORMAL, TENSION,
    UNSTRESSED_LENGTH, WEIGHT,
};
use super::prestress::Context;
use super::reasons;
use super::resolved::Resolved;
use super::scope::{Allowed, CABLES, MEMBERS, NODES};
use super::stretch::{Stretch, stretch};
use super::wish::read_part;
use crate::words::{Quoted, number};

/// Targets of one brief.
const MOST_TARGETS: usize = 10_000;
/// Wishes that targets come to, each for one member or node.
const MOST_WISHES: usize = 20_000;
/// Points of one surface.
const MOST_POINTS: usize = 10_000;
/// Nodes times points of one surface.
const MOST_PAIRS: usize = 1_000_000;

/// What targets are read against.
pub(super) struct Readers<'t, 'c, 'a> {
    pub(super) context: &'t Context<'c, 'a>,
    /// Nodes that stay in place.
    pub(super) hold: &'t [usize],
    /// Whether the rule in force for a segment is balance.
    pub(super) on_balance: &'t dyn Fn(usize) -> bool,
}

impl Readers<'_, '_, '_> {
    /// Reads all targets; each becomes one or several of the kernel's.
    pub(super) fn read(
        &self,
        targets: &[v1::ShapeTarget],
        findings: &mut Findings,
        resolved: &mut Resolved,
    ) -> Vec<ShapeTarget> {
        let list = Path::root("prestress.targets");
        let mut read = Vec::new();
        let mut names = Names::new("targets");
        if too_many(findings, &list, "targets", targets.len(), MOST_TARGETS) {
            return read;
        }
        let mut wishes_in_all = 0;
        for (index, target) in targets.iter().enumerate() {
            let mut name = index.to_string();
            if !target.id.is_empty() {
                names.declare(findings, &list, index, target.id.as_str(), ());
                name.clone_from(&target.id);
            }
            let at = list.element(&target.id, index);
            let of = Of::new("target", &name);
            let weight = findings.number_or(&at.field("weight"), of, &WEIGHT, target.weight, 1.0);
            if target.weight.is_none() {
                resolved.left_out(&at.field("weight"), "1");
            }
            let wishes = self.wishes(target, of, &at, findings, resolved);
            wishes_in_all += wishes.iter().map(n_wishes).sum::<usize>();
            if too_many(findings, &list, "wishes", wishes_in_all, MOST_WISHES) {
                return read;
            }
            read.extend(wishes.into_iter().map(|wish| ShapeTarget {
                name: name.clone(),
                wish,
                weight: weight.unwrap_or(1.0),
            }));
        }
        read
    }

    fn wishes(
        &self,
        target: &v1::ShapeTarget,
        of: Of<'_>,
        at: &Path<'_>,
        findings: &mut Findings,
        resolved: &mut Resolved,
    ) -> Vec<Wish> {
        match &target.wish {
            Some(Given::Length(wish)) => {
                let at = at.field("length");
                let length = findings.number(&at.field("length_m"), of, &LENGTH_TARGET, wish.length_m);
                let stretches = self.stretches(&wish.on, &wish.parts, MEMBERS, of, &at, findings);
                length.map_or_else(Vec::new, |length| {
                    let wish = |segments| Wish::Length { segments, length };
                    stretches.into_iter().map(wish).collect()
                })
            }
            Some(Given::UnstressedLength(wish)) => {
                let at = at.field("unstressed_length");
                let field = at.field("unstressed_length_m");
                let length = findings.number(&field, of, &UNSTRESSED_LENGTH, wish.unstressed_length_m);
                let stretches = self.stretches(&wish.on, &wish.parts, MEMBERS, of, &at, findings);
                self.tell_balance(&stretches, of, &at, findings);
                length.map_or_else(Vec::new, |length| {
                    let wish = |segments| Wish::UnstressedLength { segments, length };
                    stretches.into_iter().map(wish).collect()
                })
            }
            Some(Given::Tension(wish)) => self.tensions(wish, of, &at.field("tension"), findings),
            Some(Given::Place(wish)) => self.places(wish, of, &at.field("place"), findings),
            Some(Given::Sag(wish)) => self
                .sag(wish, of, &at.field("sag"), findings, resolved)
                .into_iter()
                .collect(),
            Some(Given::EqualLengths(wish)) => {
                let at = at.field("equal_lengths");
                let mut stretches = self.stretches(&wish.on, &wish.parts, CABLES, of, &at, findings);
                if !wish.within_each {
                    stretches = vec![stretches.concat()];
                }
                if stretches.iter().any(|segments| segments.len() < 2) && !findings.has_errors() {
                    let message = format!("{of}: one segment by itself is as long as it is");
                    findings.error(
                        reasons::TARGET_WITHOUT_WISH,
                        &at,
                        of.id,
                        message,
                        "name stretches of two segments or more",
                    );
                }
                stretches
                    .into_iter()
                    .map(|segments| Wish::EqualLengths { segments })
                    .collect()
            }
            Some(Given::Radius(wish)) => self.radii(wish, of, &at.field("radius"), findings),
            Some(Given::Surface(wish)) => self.surface(wish, of, &at.field("surface"), findings),
            None => {
                findings.error(
                    reasons::TARGET_WITHOUT_WISH,
                    at,
                    of.id,
                    format!("{of} wants nothing"),
                    "give one of length, unstressed_length, tension, place, sag, equal_lengths, radius, surface",
                );
                Vec::new()
            }
        }
    }

    /// Segments of each member and part that a target names.
    fn stretches(
        &self,
        on: &[String],
        parts: &[v1::PartOfCable],
        allowed: Allowed,
        of: Of<'_>,
        at: &Path<'_>,
        findings: &mut Findings,
    ) -> Vec<Vec<SegmentId>> {
        let net = self.context.net;
        if on.is_empty() && parts.is_empty() {
            findings.error(
                reasons::COVERS_NOTHING,
                &at.field("on"),
                of.id,
                format!("{of} names no member"),
                format!("name {} in on, or stretches in parts", allowed.words),
            );
        }
        let scope = self.context.scopes.of(net, on, &at.field("on"), allowed, findings);
        let mut stretches: Vec<Vec<usize>> = Vec::new();
        for cable in scope.cables() {
            let draft = &net.cables[cable];
            stretches.push((draft.first_segment..draft.first_segment + draft.n_segments()).collect());
        }
        for strut in scope.struts() {
            stretches.push(
                net.struts[strut]
                    .ends
                    .map(|_| net.struts[strut].segment)
                    .into_iter()
                    .collect(),
            );
        }
        let list = at.field("parts");
        for (number, part) in parts.iter().enumerate() {
            stretches.extend(read_part(part, net, &list.number(number), findings));
        }
        stretches.retain(|segments| !segments.is_empty());
        let ids = |segments: Vec<usize>| segments.into_iter().map(SegmentId::new).collect();
        stretches.into_iter().map(ids).collect()
    }

    fn tell_balance(&self, stretches: &[Vec<SegmentId>], of: Of<'_>, at: &Path<'_>, findings: &mut Findings) {
        let balanced = stretches.iter().flatten().find(|s| (self.on_balance)(s.index()));
        if let Some(segment) = balanced {
            let net = self.context.net;
            let id = net.member_id(net.segments[segment.index()].1);
            findings.error(
                reasons::TARGET_ON_BALANCE,
                at,
                id,
                format!(
                    "{of}: {} is on balance, so that its force follows from the others",
                    Quoted(id)
                ),
                "leave it out, or take it off balance",
            );
        }
    }

    fn tensions(&self, wish: &v1::TensionTarget, of: Of<'_>, at: &Path<'_>, findings: &mut Findings) -> Vec<Wish> {
        let stretches = self.stretches(&wish.on, &wish.parts, MEMBERS, of, at, findings);
        self.tell_balance(&stretches, of, at, findings);
        let (field, quantity, value): (_, &Quantity, f64) = match wish.tension {
            Some(Tension::TensionN(value)) => ("tension_n", &TENSION, value),
            Some(Tension::MeanTensionN(value)) => ("mean_tension_n", &MEAN_TENSION, value),
            None => {
                findings.error(
                    reasons::TARGET_WITHOUT_WISH,
                    at,
                    of.id,
                    format!("{of} wants no tension"),
                    "give tension_n or mean_tension_n",
                );
                return Vec::new();
            }
        };
        let field = at.field(field);
        let Some(tension) = findings.number(&field, of, quantity, value) else {
            return Vec::new();
        };
        let net = self.context.net;
        let is_cable = |s: &&SegmentId| matches!(net.segments[s.index()].1, MemberDraft::Cable(_));
        let pushed = stretches.iter().flatten().find(is_cable).filter(|_| tension < 0.0);
        if let Some(segment) = pushed {
            let id = net.member_id(net.segments[segment.index()].1);
            findings
                .error(
                    reasons::CABLE_PUSHES,
                    &field,
                    id,
                    format!(
                        "{of}: cable {} is to push with {}: a rope only pulls",
                        Quoted(id),
                        number(tension)
                    ),
                    "give a positive value; only struts may have a negative one",
                )
                .value(number(tension));
        } else if tension == 0.0 {
            findings
                .error(
                    reasons::NOT_POSITIVE,
                    &field,
                    of.id,
                    format!("{of} wants no force at all: such a member holds nothing"),
                    "give a tension",
                )
                .value(number(tension));
        }
        let each = matches!(wish.tension, Some(Tension::TensionN(_)));
        stretches
            .into_iter()
            .flat_map(|segments| {
                if each {
                    segments.into_iter().map(|segment| vec![segment]).collect()
                } else {
                    vec![segments]
                }
            })
            .map(|segments| Wish::Tension { segments, tension })
            .collect()
    }

    /// A node that the search places.
    fn placed(&self, id: &str, of: Of<'_>, at: &Path<'_>, findings: &mut Findings) -> Option<usize> {
        let net = self.context.net;
        match net.names.find(findings, at, "node", id)? {
            Thing::Node(node) => {
                self.tell_not_free(node, of, at, findings);
                Some(node)
            }
            other => {
                let message = format!("{of}: {} is a {}, and only nodes have places", Quoted(id), other.kind());
                findings.error(reasons::WRONG_KIND, at, id, message, "name a node");
                None
            }
        }
    }

    fn tell_not_free(&self, node: usize, of: Of<'_>, at: &Path<'_>, findings: &mut Findings) {
        let supports = self.context.supports;
        let why = if self.hold.contains(&node) {
            "it is in prestress.hold"
        } else if supports.holds(node) {
            "its support holds it"
        } else {
            return;
        };
        let id = self.context.net.nodes[node].id;
        findings.error(
            reasons::TARGET_NOT_FREE,
            at,
            id,
            format!("{of}: the shape search does not place node {}: {why}", Quoted(id)),
            "name free nodes here, or move this one in net.nodes",
        );
    }

    fn places(&self, wish: &v1::PlaceTarget, of: Of<'_>, at: &Path<'_>, findings: &mut Findings) -> Vec<Wish> {
        let node = self.placed(&wish.node, of, &at.field("node"), findings);
        let given = [("x_m", wish.x_m), ("y_m", wish.y_m), ("z_m", wish.z_m)];
        if given.iter().all(|(_, value)| value.is_none()) {
            findings.error(
                reasons::TARGET_WITHOUT_WISH,
                at,
                of.id,
                format!("{of} wants no coordinate"),
                "give x_m, y_m or z_m",
            );
        }
        let mut wishes = Vec::new();
        for (axis, (field, value)) in given.into_iter().enumerate() {
            let value = value.and_then(|value| findings.number(&at.field(field), of, &COORDINATE, value));
            wishes.extend(value.zip(node).map(|(value, node)| Wish::Coordinate {
                node: NodeId::new(node),
                axis,
                value,
            }));
        }
        wishes
    }

    fn sag(
        &self,
        wish: &v1::SagTarget,
        of: Of<'_>,
        at: &Path<'_>,
        findings: &mut Findings,
        resolved: &mut Resolved,
    ) -> Option<Wish> {
        let net = self.context.net;
        let (field, measure, quantity, value) = match wish.sag {
            Some(Sag::SagM(value)) => ("sag_m", SagMeasure::Vertical, &SAG, value),
            Some(Sag::SagNormalM(value)) => ("sag_normal_m", SagMeasure::Normal, &SAG_NORMAL, value),
            None => {
                findings.error(
                    reasons::TARGET_WITHOUT_WISH,
                    at,
                    of.id,
                    format!("{of} wants no sag"),
                    "give sag_m or sag_normal_m",
                );
                return None;
            }
        };
        let sag = findings.number(&at.field(field), of, quantity, value);
        let field = at.field("cable");
        let cable = match net.names.find(findings, &field, "cable", &wish.cable)? {
            Thing::Cable(cable) => cable,
            other => {
                let id = &wish.cable;
                let message = format!("{of}: {} is a {}, and only cables sag", Quoted(id), other.kind());
                findings.error(reasons::WRONG_KIND, &field, id, message, "name a cable");
                return None;
            }
        };
        let node = self.placed(&wish.node, of, &at.field("node"), findings)?;
        let path = &net.cables[cable].path;
        let (first, last) = (net.nodes[*path.first()?].id, net.nodes[*path.last()?].id);
        let ends = |given: &str, end: &str| {
            if given.is_empty() {
                end.to_owned()
            } else {
                given.to_owned()
            }
        };
        let (from, to) = (ends(&wish.from, first), ends(&wish.to, last));
        for (given, field, end) in [(&wish.from, "from", &from), (&wish.to, "to", &to)] {
            if given.is_empty() {
                resolved.left_out(&at.field(field), end);
            }
        }
        let asked = Stretch {
            from: &from,
            to: &to,
            from_visit: None,
            to_visit: None,
        };
        let segments = stretch(net, cable, &asked, at, findings)?;
        let base = net.cables[cable].first_segment;
        let inner = segments
            .iter()
            .skip(1)
            .any(|place| net.segments[base + place].0[0] == node);
        if !inner {
            let id = &wish.node;
            findings.error(
                reasons::NOT_BETWEEN,
                &at.field("node"),
                id,
                format!(
                    "{of}: node {} is not between {} and {} on cable {}",
                    Quoted(id),
                    Quoted(&from),
                    Quoted(&to),
                    Quoted(&wish.cable)
                ),
                "name a node of the cable between the ends of its chord",
            );
            return None;
        }
        let ends = [segments[0], segments[segments.len() - 1]];
        let chord = [net.segments[base + ends[0]].0[0], net.segments[base + ends[1]].0[1]];
        Some(Wish::Sag {
            node: NodeId::new(node),
            chord: chord.map(NodeId::new),
            sag: sag?,
            measure,
        })
    }

    fn radii(&self, wish: &v1::RadiusTarget, of: Of<'_>, at: &Path<'_>, findings: &mut Findings) -> Vec<Wish> {
        let radius = findings.number(&at.field("radius_m"), of, &CURVATURE_RADIUS, wish.radius_m);
        let stretches = self.stretches(&wish.on, &wish.parts, CABLES, of, at, findings);
        let net = self.context.net;
        if let Some(short) = stretches.iter().find(|segments| segments.len() < 2) {
            let id = net.member_id(net.segments[short[0].index()].1);
            findings.error(
                reasons::TARGET_WITHOUT_WISH,
                at,
                id,
                format!("{of}: a single segment of {} is straight", Quoted(id)),
                "name stretches of two segments or more",
            );
        }
        let Some(radius) = radius else {
            return Vec::new();
        };
        let ends = |segment: SegmentId| net.segments[segment.index()].0;
        let pairs = stretches.iter().flat_map(|segments| segments.windows(2));
        pairs
            .map(|pair| {
                let ([before, node], [_, behind]) = (ends(pair[0]), ends(pair[1]));
                Wish::Radius {
                    nodes: [before, node, behind].map(NodeId::new),
                    radius,
                }
            })
            .collect()
    }

    fn surface(&self, wish: &v1::SurfaceTarget, of: Of<'_>, at: &Path<'_>, findings: &mut Findings) -> Vec<Wish> {
        let net = self.context.net;
        let field = at.field("nodes");
        if wish.nodes.is_empty() {
            findings.error(
                reasons::COVERS_NOTHING,
                &field,
                of.id,
                format!("{of} names no node"),
                "name nodes or groups of nodes",
            );
        }
        let scope = self.context.scopes.of(net, &wish.nodes, &field, NODES, findings);
        let nodes: Vec<usize> = scope.nodes().collect();
        for node in &nodes {
            self.tell_not_free(*node, of, &field, findings);
        }
        let field = at.field("points_xyz_m");
        let numbers = &wish.points_xyz_m;
        if !numbers.len().is_multiple_of(3) {
            findings
                .error(
                    reasons::WRONG_COUNT,
                    &field,
                    of.id,
                    format!(
                        "{of} has {} numbers for its points: three for each are wanted",
                        numbers.len()
                    ),
                    "give x, y, z of each point",
                )
                .value(numbers.len());
            return Vec::new();
        }
        if too_many(findings, &field, "points", numbers.len() / 3, MOST_POINTS) {
            return Vec::new();
        }
        for (position, value) in numbers.iter().enumerate() {
            if findings
                .number(&field.number(position), of, &COORDINATE, *value)
                .is_none()
            {
                return Vec::new();
            }
        }
        let points: Vec<Vector3<f64>> = numbers.chunks_exact(3).map(Vector3::from_column_slice).collect();
        // Each node is compared with every point, in each iteration.
        if too_many(
            findings,
            at,
            "pairs of a node and a point",
            nodes.len() * points.len(),
            MOST_PAIRS,
        ) {
            return Vec::new();
        }
        if !gives_surface(&points) {
            findings
                .error(
                    reasons::NO_SURFACE,
                    &field,
                    of.id,
                    format!("{of}: {} points that give no surface over plan", points.len()),
                    "give three points or more that are not on one line in plan",
                )
                .value(points.len());
            return Vec::new();
        }
        vec![Wish::Surface {
            nodes: nodes.into_iter().map(NodeId::new).collect(),
            points,
        }]
    }
}

fn n_wishes(wish: &Wish) -> usize {
    match wish {
        Wish::EqualLengths { segments } => segments.len(),
        Wish::Surface { nodes, .. } => nodes.len(),
        _ => 1,
    }
}

fn too_many(findings: &mut Findings, at: &Path<'_>, what: &str, count: usize, most: usize) -> bool {
    if count > most {
        findings
            .error(
                reasons::TOO_MANY,
                at,
                "",
                format!("{count} {what}: at most {most} are taken"),
                "ask for less at once",
            )
            .value(count);
    }
    count > most
}
