//! The brief with found coordinates and unstressed lengths written in, in parts that merge.

use std::collections::HashMap;

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{Plan, ReferenceOutcome};
use ropewalk_numerics::model::{Net, NodeId};
use ropewalk_numerics::shape::ShapeError;
use v1::brief::NetSource;
use v1::freeze_response::Part;
use v1::prestress_rule::Rule;

use super::parts::split;
use super::{cautions, outcome};
use crate::build_info::engine_build;
use crate::decode::{Work, digest};

/// The frozen brief in parts, then the summary.
///
/// # Errors
/// Why there is no reference state, for people.
pub fn freeze(
    work: &Work,
    plan: &Plan,
    found: &Result<ReferenceOutcome, ShapeError>,
) -> Result<Vec<v1::FreezeResponse>, String> {
    let history = found.as_ref().map_or(&[][..], |reference| &reference.history);
    let summary = outcome::reference_summary(work, plan, found, history);
    let reference = match found {
        Ok(reference) if reference.result.audit.passed => reference,
        Ok(_) => {
            return Err("the independent routine does not confirm the reference state: it is not frozen".to_owned());
        }
        Err(_) => {
            let failure = summary.failure.unwrap_or_default();
            return Err(format!("{}. To mend it: {}", failure.message, failure.cure));
        }
    };
    let frozen = frozen_brief(work, &plan.brief().net, reference);
    let closing = v1::FreezeSummary {
        from_digest: work.digest.clone(),
        digest: digest(&frozen),
        reference: Some(summary),
        cautions: cautions::of_net(work, &plan.brief().net),
        findings: outcome::reference_findings(work, plan, found),
    };
    let parts = merging_parts(frozen).into_iter().map(Part::Brief);
    let parts = parts.chain([Part::Summary(closing)]);
    Ok(parts.map(|part| v1::FreezeResponse { part: Some(part) }).collect())
}

fn frozen_brief(work: &Work, net: &Net, reference: &ReferenceOutcome) -> v1::Brief {
    let mut brief = work.message.clone();
    let mut sections = Vec::new();
    if let Some(NetSource::Net(message)) = &mut brief.net_source {
        sections.clone_from(&message.sections);
        message.nodes = nodes(work, std::mem::take(&mut message.nodes), net, reference);
    }
    let prestress = brief.prestress.get_or_insert_with(v1::Prestress::default);
    prestress.hold.clear();
    // They are met as closely as they can be; from here on lengths are kept.
    prestress.targets.clear();
    prestress.rules = rules(net, &reference.state.unstressed_lengths);
    brief.frozen_from = Some(v1::FrozenFrom {
        digest: work.digest.clone(),
        engine_version: engine_build().version,
        sections,
        note: String::new(),
    });
    brief
}

/// Every node, in result order, where it was found. A node on springs keeps its given place: there they are at rest.
fn nodes(work: &Work, listed: Vec<v1::Node>, net: &Net, reference: &ReferenceOutcome) -> Vec<v1::Node> {
    let mut listed = listed.into_iter();
    let places = net.nodes().iter().zip(&reference.state.positions).enumerate();
    places
        .map(|(index, (node, position))| {
            let mut message = listed.next().unwrap_or_else(|| v1::Node {
                id: node.name.clone(),
                ..v1::Node::default()
            });
            if !work.keeps_position(index) {
                message.xyz_m = position.iter().copied().collect();
            }
            message
        })
        .collect()
}

/// One rule for each reach and strut: its unstressed length.
fn rules(net: &Net, lengths: &[f64]) -> Vec<v1::PrestressRule> {
    let rule = |length: f64| v1::PrestressRule {
        rule: Some(Rule::UnstressedLengthM(length)),
        ..v1::PrestressRule::default()
    };
    let mut rules = Vec::new();
    for cable in net.cables() {
        let of_cable = &lengths[cable.reaches.clone()];
        if of_cable.iter().all(|length| *length == of_cable[0]) {
            rules.push(v1::PrestressRule {
                on: vec![cable.name.clone()],
                ..rule(of_cable[0])
            });
            continue;
        }
        let visits = visits(&cable.path);
        for (reach, length) in net.reaches()[cable.reaches.clone()].iter().zip(of_cable) {
            let (position, end) = (
                reach.segments.start - cable.segments.start,
                reach.segments.end - cable.segments.start,
            );
            let [from, to] = [cable.path[position], cable.path[end]];
            let part = v1::PartOfCable {
                cable: cable.name.clone(),
                from: net.node_name(from).to_owned(),
                to: net.node_name(to).to_owned(),
                from_visit: visits[position],
                // The default, the first visit after `from`, is the right one unless the rope slides through `to` before.
                to_visit: (cable.path[position + 1..end].contains(&to)).then(|| visits[end].unwrap_or(1)),
                note: String::new(),
            };
            rules.push(v1::PrestressRule {
                parts: vec![part],
                ..rule(*length)
            });
        }
    }
    for (strut, length) in net.struts().iter().zip(&lengths[net.reaches().len()..]) {
        rules.push(v1::PrestressRule {
            on: vec![strut.name.clone()],
            ..rule(*length)
        });
    }
    rules
}

/// Which visit of its node each position of a path is; `None` for the first, the default.
fn visits(path: &[NodeId]) -> Vec<Option<u32>> {
    let mut so_far: HashMap<NodeId, u32> = HashMap::new();
    path.iter()
        .map(|node| {
            let visit = so_far.entry(*node).or_default();
            *visit += 1;
            (*visit > 1).then_some(*visit)
        })
        .collect()
}

/// Cuts a brief into parts that give it back when they are merged, in order, as protobuf merges messages: single values
/// stand in the first part, lists are appended.
fn merging_parts(mut brief: v1::Brief) -> Vec<v1::Brief> {
    let mut parts = vec![v1::Brief::default()];
    let in_net = |net: v1::Net| v1::Brief {
        net_source: Some(NetSource::Net(net)),
        ..v1::Brief::default()
    };
    if let Some(NetSource::Net(net)) = &mut brief.net_source {
        let mut lists = Vec::new();
        macro_rules! take {
            ($($list:ident),+) => {
                $(for $list in split(std::mem::take(&mut net.$list)) {
                    lists.push(v1::Net { $list, ..v1::Net::default() });
                })+
            };
        }
        take!(
            nodes,
            sections,
            roles,
            cables,
            struts,
            groups,
            support_groups,
            skins,
            zones,
            panels
        );
        parts.extend(lists.into_iter().map(in_net));
    }
    if let Some(prestress) = &mut brief.prestress {
        for rules in split(std::mem::take(&mut prestress.rules)) {
            parts.push(v1::Brief {
                prestress: Some(v1::Prestress {
                    rules,
                    ..v1::Prestress::default()
                }),
                ..v1::Brief::default()
            });
        }
    }
    if let Some(frozen) = &mut brief.frozen_from {
        for sections in split(std::mem::take(&mut frozen.sections)) {
            parts.push(v1::Brief {
                frozen_from: Some(v1::FrozenFrom {
                    sections,
                    ..v1::FrozenFrom::default()
                }),
                ..v1::Brief::default()
            });
        }
    }
    macro_rules! take {
        ($($list:ident),+) => {
            $(for $list in split(std::mem::take(&mut brief.$list)) {
                parts.push(v1::Brief { $list, ..v1::Brief::default() });
            })+
        };
    }
    take!(actions, combinations, cases, checks, motions, accepted);
    parts[0] = brief;
    parts
}
