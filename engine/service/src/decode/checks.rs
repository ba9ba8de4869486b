//! Checks: what is covered, over which cases.

use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::check::Kind;
use ropewalk_numerics::brief::{Check, CheckKind};
use ropewalk_numerics::model::{Area, CableId, NodeId, StrutId};

use super::cases::Cases;
use super::findings::{Findings, Path};
use super::names::Thing;
use super::net::NetDraft;
use super::numbers::{MOVEMENT_LIMIT, Of, PULL_LIMIT, Quantity, SAFETY_FACTOR, SHARE_OF_REFERENCE};
use super::reasons;
use super::resolved::Resolved;
use super::scope::{ANYTHING, MEMBERS, NODES, Scope, Scopes};
use super::sections::Sections;
use super::supports::Supports;
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

/// A check as read. Which nodes are at the corners of panels is known only when panels are.
pub(crate) struct CheckDraft {
    pub(crate) check: Check,
    /// Skins and zones that it covers.
    pub(crate) areas: Vec<Area>,
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
    let of = Of::new("check", "");
    let mut limit = |kind: &'static str, field: &'static str, quantity: &Quantity, value: f64| {
        findings.number(&at.field(kind).field(field), of, quantity, value)
    };
    let kind = match check.kind.as_ref() {
        Some(Kind::Safety(safety)) => {
            limit("safety", "factor", &SAFETY_FACTOR, safety.factor).map(|factor| CheckKind::Safety { factor })
        }
        Some(Kind::Slackness(slackness)) => {
            let share = slackness.min_share_of_reference;
            limit("slackness", "min_share_of_reference", &SHARE_OF_REFERENCE, share).map(|share| CheckKind::Slackness {
                min_share_of_reference: share,
            })
        }
        Some(Kind::Movement(movement)) => {
            limit("movement", "limit_m", &MOVEMENT_LIMIT, movement.limit_m).map(|limit| CheckKind::Movement { limit })
        }
        Some(Kind::AnchorPull(pull)) => {
            limit("anchor_pull", "limit_n", &PULL_LIMIT, pull.limit_n).map(|limit| CheckKind::AnchorPull { limit })
        }
        // Refused by name elsewhere.
        Some(Kind::Resistance(_) | Kind::ServiceStress(_) | Kind::Buckling(_) | Kind::Clearance(_)) => return None,
        None => {
            findings.error(
                reasons::MISSING,
                at,
                "",
                format!("check {number} says not what is checked"),
                "give one of safety, slackness, movement, anchor_pull",
            );
            return None;
        }
    };
    let mut read = Check {
        kind: kind.unwrap_or(CheckKind::Safety { factor: 1.0 }),
        cables: Vec::new(),
        struts: Vec::new(),
        nodes: Vec::new(),
        cases: cases.unwrap_or_default(),
    };
    let areas = cover(check, &mut read, at, context, findings, resolved);
    tell_not_judgeable(check, &read, at, context, findings);
    kind.map(|_| CheckDraft { check: read, areas })
}

fn cover(
    check: &v1::Check,
    read: &mut Check,
    at: &Path<'_>,
    context: &Context<'_, '_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Vec<Area> {
    let (net, on) = (context.net, at.field("on"));
    let mut areas = Vec::new();
    let supported = |node: &usize| context.supports.of_node[*node].is_some();
    let all = check.on.is_empty();
    let mut scope_of = |allowed| context.scopes.of(net, &check.on, &on, allowed, findings);
    let mut complete = true;
    match check.kind {
        Some(Kind::Movement(_)) if all => {
            let free = (0..net.nodes.len()).filter(|node| !supported(node));
            read.nodes = free.map(NodeId::new).collect();
            resolved.left_out(&on, "all free nodes");
        }
        Some(Kind::AnchorPull(_)) if all => {
            read.nodes = (0..net.nodes.len()).filter(supported).map(NodeId::new).collect();
            resolved.left_out(&on, "all anchors");
        }
        _ if all => {
            read.cables = (0..net.cables.len()).map(CableId::new).collect();
            resolved.left_out(&on, "all cables");
        }
        Some(Kind::Movement(_)) => {
            let scope = scope_of(ANYTHING);
            complete = scope.complete;
            read.nodes = nodes_of(&scope, context).into_iter().map(NodeId::new).collect();
            areas = scope.areas().collect();
        }
        Some(Kind::AnchorPull(_)) => {
            let scope = scope_of(NODES);
            complete = scope.complete;
            for node in scope.nodes() {
                if !supported(&node) {
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
            read.nodes = scope.nodes().map(NodeId::new).collect();
        }
        _ => {
            let scope = scope_of(MEMBERS);
            complete = scope.complete;
            read.cables = scope.cables().map(CableId::new).collect();
            read.struts = scope.struts().map(StrutId::new).collect();
        }
    }
    let nothing = read.cables.is_empty() && read.struts.is_empty() && read.nodes.is_empty() && areas.is_empty();
    if complete && nothing {
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

fn tell_not_judgeable(
    check: &v1::Check,
    read: &Check,
    at: &Path<'_>,
    context: &Context<'_, '_>,
    findings: &mut Findings,
) {
    let net = context.net;
    let Some(Kind::Safety(_) | Kind::Slackness(_)) = check.kind else {
        return;
    };
    let strength = matches!(check.kind, Some(Kind::Safety(_)));
    let unknown = |cable: &CableId| {
        let draft = &net.cables[cable.index()];
        let mut segments = draft.first_segment..draft.first_segment + draft.n_segments();
        segments.any(|segment| {
            context.sections.of_segment[segment]
                .is_some_and(|(section, _)| context.sections.list[section].message.breaking_force_n.is_none())
        })
    };
    let cables = read.cables.iter().filter(|cable| strength && unknown(cable));
    let cables: Vec<&str> = cables
        .map(|cable| net.cables[cable.index()].message.id.as_str())
        .collect();
    let of = read.cables.len() + read.struts.len();
    if let Some(first) = cables.first() {
        findings
            .doubt(
                reasons::NOT_JUDGEABLE,
                &at.field("safety"),
                first,
                format!(
                    "{} of {of} members will not be judged: {} have no breaking force",
                    cables.len(),
                    quoted_list(cables.iter().copied())
                ),
                "give breaking_force_n of their sections, or cover fewer members",
            )
            .value(cables.len());
    }
    let struts: Vec<&str> = read
        .struts
        .iter()
        .map(|s| net.struts[s.index()].message.id.as_str())
        .collect();
    if let Some(first) = struts.first() {
        findings
            .doubt(
                reasons::NOT_JUDGEABLE,
                &at.field("on"),
                first,
                format!(
                    "{} of {of} members will not be judged: {} are struts, and this check is for ropes",
                    struts.len(),
                    quoted_list(struts.iter().copied())
                ),
                "cover ropes only",
            )
            .value(struts.len());
    }
}
