//! Checks: what is covered, over which cases.

use nalgebra::Vector3;
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{Check, CheckKind};
use ropewalk_numerics::load::Surface;
use ropewalk_numerics::model::{Area, CableId, Net, NodeId, StrutId};
use v1::check::Kind;

use super::cases::Cases;
use super::check_kinds;
use super::findings::{Findings, Path};
use super::names::Thing;
use super::net::NetDraft;
use super::reasons;
use super::resolved::Resolved;
use super::scope::{ANYTHING, AREAS, MEMBERS, NODES, PIECES, Scope, Scopes};
use super::sections::Sections;
use super::supports::Supports;
use super::surface::SurfaceDraft;
use crate::words::{Quoted, quoted_list};

/// Checks of a brief: their results are told in one message.
const MOST: usize = 500;

/// Everything that checks are read against.
pub(crate) struct Context<'c, 'a> {
    pub(crate) net: &'c NetDraft<'a>,
    pub(crate) scopes: &'c Scopes,
    pub(crate) sections: &'c Sections<'a>,
    pub(crate) supports: &'c Supports,
    pub(crate) cases: &'c Cases<'a>,
}

pub(crate) fn read(
    messages: &[v1::Check],
    context: &Context<'_, '_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Vec<CheckDraft> {
    let list = Path::root("checks");
    if messages.len() > MOST {
        findings
            .error(
                reasons::TOO_MANY,
                &list,
                "",
                format!("the brief has {} checks: at most {MOST} can be told", messages.len()),
                "let checks cover more members and cases each",
            )
            .value(messages.len());
        return Vec::new();
    }
    if messages.is_empty() && !context.cases.messages.is_empty() {
        findings.note(
            reasons::NOTHING_CHECKED,
            &list,
            "",
            "the brief has cases and no check: its verdict will be not judged",
            "add checks",
        );
    }
    let checks = messages.iter().enumerate();
    checks
        .filter_map(|(number, check)| read_check(check, number, &list.number(number), context, findings, resolved))
        .collect()
}

/// A check as read. What it covers of panels is known only when panels are.
pub(crate) struct CheckDraft {
    pub(crate) check: Check,
    /// Skins and zones that it covers.
    areas: Vec<Area>,
    /// Whether it covers every panel.
    all_panels: bool,
}

impl CheckDraft {
    /// The check of a net without panels.
    pub(crate) fn without_panels(self) -> Check {
        self.check
    }

    /// The check with what it covers of the panels of a net, `positions` (m) being about where its nodes are.
    pub(crate) fn with_panels(self, surface: &SurfaceDraft, net: &Net, positions: &[Vector3<f64>]) -> Check {
        let mut check = self.check;
        match check.kind {
            CheckKind::Movement { .. } => {
                check.nodes.extend(surface.corners(net, positions, &self.areas));
                check.nodes.sort_unstable();
                check.nodes.dedup();
            }
            _ if self.all_panels => check.panels = (0..net.panels().len()).collect(),
            _ => check.panels = Surface::new(net, positions).panels_of(&self.areas).collect(),
        }
        check
    }
}

fn read_check(
    check: &v1::Check,
    number: usize,
    at: &Path<'_>,
    context: &Context<'_, '_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<CheckDraft> {
    let over = at.field("over");
    if context.cases.messages.is_empty() && check.over.is_empty() {
        findings.error(
            reasons::CHECK_WITHOUT_CASES,
            &over,
            "",
            format!("check {number} reads all cases, and the brief has none"),
            "add cases, or take the check out",
        );
    }
    let cases = context.cases.named(&check.over, &over, findings);
    let Some(given) = check.kind.as_ref() else {
        findings.error(
            reasons::MISSING,
            at,
            "",
            format!("check {number} says not what is checked"),
            "give one of safety, resistance, service_stress, construction_stress, slackness, buckling, movement, \
             clearance, anchor_pull, clamp, saddle, drainage",
        );
        return None;
    };
    let kind = check_kinds::read(given, at, context, findings, resolved);
    let mut read = Check {
        kind: kind.unwrap_or(CheckKind::Safety { factor: 1.0 }),
        cables: Vec::new(),
        struts: Vec::new(),
        nodes: Vec::new(),
        panels: Vec::new(),
        cases: cases.unwrap_or_default(),
    };
    let areas = cover(given, &check.on, &mut read, at, context, findings, resolved);
    tell_not_judgeable(given, &read, at, context, findings);
    kind.map(|_| CheckDraft {
        check: read,
        areas,
        all_panels: check.on.is_empty() && matches!(given, Kind::Drainage(_) | Kind::Clearance(_)),
    })
}

fn cover(
    given: &Kind,
    names: &[String],
    read: &mut Check,
    at: &Path<'_>,
    context: &Context<'_, '_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Vec<Area> {
    let (net, on) = (context.net, at.field("on"));
    let mut areas = Vec::new();
    let all = names.is_empty();
    let complete = if all {
        let told = cover_all(given, read, context);
        resolved.left_out(&on, told);
        true
    } else {
        let allowed = match given {
            Kind::Movement(_) => ANYTHING,
            Kind::Drainage(_) => AREAS,
            Kind::Clearance(_) => PIECES,
            Kind::AnchorPull(_) | Kind::Clamp(_) | Kind::Saddle(_) => NODES,
            _ => MEMBERS,
        };
        let scope = context.scopes.of(net, names, &on, allowed, findings);
        if let Kind::Movement(_) = given {
            read.nodes = nodes_of(&scope, context).into_iter().map(NodeId::new).collect();
        } else {
            read.cables = scope.cables().map(CableId::new).collect();
            read.struts = scope.struts().map(StrutId::new).collect();
            read.nodes = scope.nodes().map(NodeId::new).collect();
        }
        if let Kind::AnchorPull(_) = given {
            for node in scope.nodes().filter(|node| context.supports.of_node[*node].is_none()) {
                let id = net.nodes[node].id;
                findings.error(
                    reasons::WRONG_KIND,
                    &on,
                    id,
                    format!(
                        "node {} has no support: there is no pull on an anchor to check",
                        Quoted(id)
                    ),
                    "name supported nodes",
                );
            }
        }
        areas = scope.areas().collect();
        scope.complete
    };
    let no_part = read.cables.is_empty() && read.struts.is_empty() && read.nodes.is_empty() && read.panels.is_empty();
    let message = net.message;
    let has_panels = !(message.skins.is_empty() && message.panels.is_empty());
    let all_panels = all && has_panels && matches!(given, Kind::Drainage(_));
    if complete && no_part && areas.is_empty() && !all_panels {
        findings.error(
            reasons::COVERS_NOTHING,
            &on,
            "",
            "this check covers nothing",
            "name in on what it covers, or take it out",
        );
    }
    areas
}

/// Everything that a check is for; answers that in words.
fn cover_all(given: &Kind, read: &mut Check, context: &Context<'_, '_>) -> &'static str {
    let net = context.net;
    let nodes = |wanted: &dyn Fn(usize) -> bool| -> Vec<NodeId> {
        (0..net.nodes.len())
            .filter(|node| wanted(*node))
            .map(NodeId::new)
            .collect()
    };
    let supported = |node: usize| context.supports.of_node[node].is_some();
    let cables = || (0..net.cables.len()).map(CableId::new).collect();
    let struts = || (0..net.struts.len()).map(StrutId::new).collect();
    match given {
        Kind::Movement(_) => {
            read.nodes = nodes(&|node| !supported(node));
            "all free nodes"
        }
        Kind::AnchorPull(_) => {
            read.nodes = nodes(&supported);
            "all anchors"
        }
        Kind::Buckling(_) => {
            read.struts = struts();
            "all struts"
        }
        Kind::Clearance(_) => {
            read.cables = cables();
            read.struts = struts();
            "all members and panels"
        }
        Kind::Drainage(_) => "all panels",
        Kind::Clamp(_) => {
            let passages = passages(net);
            read.nodes = nodes(&|node| passages[node].is_clamp());
            "all nodes where ropes cross and one of them runs on, clamped"
        }
        Kind::Saddle(_) => {
            let passages = passages(net);
            read.nodes = nodes(&|node| passages[node].sliding);
            "all nodes through which a rope slides"
        }
        _ => {
            read.cables = cables();
            "all cables"
        }
    }
}

/// What ropes do at a node.
#[derive(Clone, Copy, Debug, Default)]
struct Passage {
    /// Ropes that come to it.
    ropes: usize,
    /// Whether one of them runs on through it, clamped.
    clamped: bool,
    /// Whether one of them slides through it.
    sliding: bool,
}

impl Passage {
    fn is_clamp(self) -> bool {
        self.clamped && self.ropes > 1
    }
}

/// What ropes do at each node.
fn passages(net: &NetDraft<'_>) -> Vec<Passage> {
    let mut passages = vec![Passage::default(); net.nodes.len()];
    for cable in &net.cables {
        let mut touched: Vec<usize> = cable.path.clone();
        touched.sort_unstable();
        touched.dedup();
        touched.iter().for_each(|node| passages[*node].ropes += 1);
        let inner = cable.path.len().saturating_sub(1);
        for node in cable.path.iter().take(inner).skip(1) {
            let slides = cable.message.slides.as_ref();
            let slides = slides
                .is_some_and(|slides| slides.at.is_empty() || slides.at.iter().any(|id| id == net.nodes[*node].id));
            if slides {
                passages[*node].sliding = true;
            } else {
                passages[*node].clamped = true;
            }
        }
    }
    passages
}

/// Nodes named themselves, and the free ones of named members, each once, in order.
fn nodes_of(scope: &Scope, context: &Context<'_, '_>) -> Vec<usize> {
    let net = context.net;
    let mut wanted = vec![false; net.nodes.len()];
    for covered in &scope.covered {
        let nodes: &[usize] = match covered.thing {
            Thing::Node(node) => {
                wanted[node] = true;
                &[]
            }
            Thing::Cable(cable) => &net.cables[cable].path,
            Thing::Strut(strut) => net.struts[strut].ends.as_ref().map_or(&[], |ends| &ends[..]),
            _ => &[],
        };
        for node in nodes {
            wanted[*node] |= context.supports.of_node[*node].is_none();
        }
    }
    (0..wanted.len()).filter(|node| wanted[*node]).collect()
}

/// Tells members that this check covers and cannot judge, each reason once.
fn tell_not_judgeable(given: &Kind, read: &Check, at: &Path<'_>, context: &Context<'_, '_>, findings: &mut Findings) {
    let net = context.net;
    let cable_id = |cable: &CableId| net.cables[cable.index()].message.id.as_str();
    let strut_id = |strut: &StrutId| net.struts[strut.index()].message.id.as_str();
    let lacks = |segment: usize, has: &dyn Fn(&v1::Section) -> bool| {
        context.sections.of_segment[segment].is_some_and(|(section, _)| !has(context.sections.list[section].message))
    };
    let of = read.cables.len() + read.struts.len();
    let mut tell = |field: &'static str, ids: Vec<&str>, why: &str, cure: &str| {
        if let Some(first) = ids.first() {
            findings
                .doubt(
                    reasons::NOT_JUDGEABLE,
                    &at.field(field),
                    first,
                    format!(
                        "{} of {of} members will not be judged: {} {why}",
                        ids.len(),
                        quoted_list(ids.iter().copied())
                    ),
                    cure,
                )
                .value(ids.len());
        }
    };
    match given {
        Kind::Safety(_)
        | Kind::Resistance(_)
        | Kind::ServiceStress(_)
        | Kind::ConstructionStress(_)
        | Kind::Slackness(_) => {
            if !matches!(given, Kind::Slackness(_)) {
                let unknown = |cable: &&CableId| {
                    let draft = &net.cables[cable.index()];
                    let mut segments = draft.first_segment..draft.first_segment + draft.n_segments();
                    segments.any(|segment| lacks(segment, &|section| section.breaking_force_n.is_some()))
                };
                tell(
                    check_kinds::field(given),
                    read.cables.iter().filter(unknown).map(cable_id).collect(),
                    "have no breaking force",
                    "give breaking_force_n of their sections, or cover fewer members",
                );
            }
            tell(
                "on",
                read.struts.iter().map(strut_id).collect(),
                "are struts, and this check is for ropes",
                "cover ropes only",
            );
        }
        Kind::Buckling(_) => {
            let unknown = |strut: &&StrutId| {
                let segment = net.struts[strut.index()].segment;
                lacks(segment, &|section| section.bending_stiffness_n_m2.is_some())
            };
            tell(
                check_kinds::field(given),
                read.struts.iter().filter(unknown).map(strut_id).collect(),
                "have no bending stiffness",
                "give bending_stiffness_n_m2 of their sections, or cover fewer members",
            );
            tell(
                "on",
                read.cables.iter().map(cable_id).collect(),
                "are cables, and this check is for struts",
                "cover struts only",
            );
        }
        Kind::Clamp(_) | Kind::Saddle(_) => {
            let passages = passages(net);
            let is_clamp = matches!(given, Kind::Clamp(_));
            let judged = |node: &NodeId| {
                let passage = passages[node.index()];
                passage.clamped || (passage.sliding && !is_clamp)
            };
            let others = read.nodes.iter().filter(|node| !judged(node));
            let ids: Vec<&str> = others.map(|node| net.nodes[node.index()].id).collect();
            if let Some(first) = ids.first() {
                findings
                    .doubt(
                        reasons::NOT_JUDGEABLE,
                        &at.field("on"),
                        first,
                        format!(
                            "{} of {} nodes will not be judged: no rope runs on through {}{}",
                            ids.len(),
                            read.nodes.len(),
                            quoted_list(ids.iter().copied()),
                            if is_clamp { ", clamped" } else { "" }
                        ),
                        "name nodes inside the path of a rope",
                    )
                    .value(ids.len());
            }
        }
        Kind::Movement(_) | Kind::AnchorPull(_) | Kind::Clearance(_) | Kind::Drainage(_) => {}
    }
}
