//! What is odd about a solved state.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{LITTLE_LEFT, Standing, StateResult};
use ropewalk_numerics::model::{Net, SegmentId};
use ropewalk_numerics::shape::ShapeReport;

use super::modes;
use crate::decode::{Work, reasons};
use crate::words::{Quoted, force, length, number, quoted_list, rounded};

/// Movement over the extent of the net from which units or loads are to be doubted.
const LARGE_MOVEMENT: f64 = 0.25;
/// Strain from which units are to be doubted: steel breaks at about 0.02.
const LARGEST_STRAIN: f64 = 0.05;

/// Findings about a state, with the doubts marked that the brief accepts.
pub(super) fn of_state(work: &Work, net: &Net, case: &str, state: &StateResult) -> Vec<v1::Finding> {
    let found = [
        loose_nodes(net, state),
        slack_in_reference(net, case, state),
        over_breaking(net, state),
        strained(net, state),
        large_movement(net, state),
        audit_failed(net, state),
    ];
    let mut findings: Vec<v1::Finding> = found.into_iter().flatten().collect();
    findings.extend(little_stiffness(net, state));
    findings.extend(modes::findings(net, work.brief.modes.as_ref(), state));
    for finding in &mut findings {
        finding.case = case.to_owned();
        work.accept(finding);
    }
    findings
}

pub(super) fn finding(
    severity: v1::FindingSeverity,
    reason: &str,
    id: &str,
    value: String,
    message: String,
    cure: &str,
) -> v1::Finding {
    v1::Finding {
        severity: severity.into(),
        reason: reason.to_owned(),
        id: id.to_owned(),
        value,
        message,
        cure: cure.to_owned(),
        ..v1::Finding::default()
    }
}

/// The doubt that not everything wanted of the reference state is met.
pub(super) fn targets_unmet(work: &Work, report: &ShapeReport) -> Option<v1::Finding> {
    let message = report.unmet_in_words()?;
    let worst = &report.targets[*report.ranked().first()?];
    let mut finding = finding(
        v1::FindingSeverity::Doubt,
        reasons::TARGETS_UNMET,
        &worst.on,
        rounded(worst.found, 4),
        message,
        "take the nearest balanced set as it is, drop one of the wishes or give it less weight, let more be adjusted, or \
         leave some members to balance {}",
    );
    finding.path = worst.name.as_ref().map_or_else(String::new, |name| target_path(name));
    finding.case = crate::decode::REFERENCE.to_owned();
    work.accept(&mut finding);
    Some(finding)
}

/// Place of a target in the brief.
pub(super) fn target_path(name: &str) -> String {
    format!("prestress.targets[{name}]")
}

fn loose_nodes(net: &Net, state: &StateResult) -> Option<v1::Finding> {
    let ids: Vec<&str> = state.loose_nodes.iter().map(|node| net.node_name(*node)).collect();
    let first = *ids.first()?;
    let message = format!(
        "only slack ropes lead to {}: their place is not determined",
        quoted_list(ids.iter().copied())
    );
    Some(finding(
        v1::FindingSeverity::Doubt,
        reasons::LOOSE_NODES,
        first,
        ids.len().to_string(),
        message,
        "read no positions there; give more prestress if they matter",
    ))
}

fn slack_in_reference(net: &Net, case: &str, state: &StateResult) -> Option<v1::Finding> {
    if case != crate::decode::REFERENCE {
        return None;
    }
    let slack = (0..state.slack.len()).filter(|segment| state.slack[*segment]);
    let mut ids: Vec<&str> = slack.map(|segment| net.member_name(SegmentId::new(segment))).collect();
    ids.dedup();
    let first = *ids.first()?;
    let message = format!("slack in the reference state: {}", quoted_list(ids.iter().copied()));
    Some(finding(
        v1::FindingSeverity::Note,
        reasons::SLACK_IN_REFERENCE,
        first,
        ids.len().to_string(),
        message,
        "shorten them if they are meant to pull",
    ))
}

fn over_breaking(net: &Net, state: &StateResult) -> Option<v1::Finding> {
    let mut worst: Option<(f64, usize)> = None;
    for (index, (segment, tension)) in net.segments().iter().zip(&state.axial_forces).enumerate() {
        let Some(breaking) = segment.section.breaking_force else {
            continue;
        };
        if tension / breaking > worst.map_or(1.0, |(ratio, _)| ratio) {
            worst = Some((tension / breaking, index));
        }
    }
    let (ratio, index) = worst?;
    let id = net.member_name(SegmentId::new(index));
    let message = format!(
        "{} would break: {} is {} % of its breaking force",
        Quoted(id),
        force(state.axial_forces[index]),
        rounded(100.0 * ratio, 3)
    );
    Some(finding(
        v1::FindingSeverity::Doubt,
        reasons::OVER_BREAKING,
        id,
        rounded(state.axial_forces[index], 4),
        message,
        "check the units of loads and breaking force; else take a stronger rope, or less load",
    ))
}

/// The member that is strained most, where no rope or strut bears that.
fn strained(net: &Net, state: &StateResult) -> Option<v1::Finding> {
    let bears = |segment: &usize| !state.slack[*segment] && state.stretches[*segment] > 0.0;
    let strains = (0..state.stretches.len())
        .filter(bears)
        .map(|segment| (segment, state.stretches[segment] - 1.0));
    let (segment, strain) = strains.reduce(|worst, next| if next.1.abs() > worst.1.abs() { next } else { worst })?;
    if strain.abs() <= LARGEST_STRAIN {
        return None;
    }
    let id = net.member_name(SegmentId::new(segment));
    let stiffness = net.segments()[segment].section.axial_stiffness;
    let how = if strain > 0.0 { "stretched" } else { "squeezed" };
    let message = format!(
        "{} is {how} by {} % with {}: was its axial stiffness of {} N given in kN?",
        Quoted(id),
        rounded(100.0 * strain.abs(), 3),
        force(state.axial_forces[segment]),
        number(stiffness)
    );
    Some(finding(
        v1::FindingSeverity::Doubt,
        reasons::UNIT_SLIP,
        id,
        number(stiffness),
        message,
        "check the units of stiffness, prestress and loads, or accept this doubt",
    ))
}

fn large_movement(net: &Net, state: &StateResult) -> Option<v1::Finding> {
    let first = *state.positions.first()?;
    let fold = state.positions.iter().zip(&state.displacements);
    let (least, largest) = fold.fold((first, first), |(least, largest), (position, moved)| {
        let before = position - moved;
        (least.inf(&before), largest.sup(&before))
    });
    let extent = (largest - least).norm();
    let (node, moved) = largest_movement(state)?;
    if moved <= LARGE_MOVEMENT * extent {
        return None;
    }
    let id = &net.nodes()[node].name;
    let message = format!(
        "node {} moves by {}, {} % of the extent of the net",
        Quoted(id),
        length(moved),
        rounded(100.0 * moved / extent, 3)
    );
    Some(finding(
        v1::FindingSeverity::Doubt,
        reasons::LARGE_MOVEMENT,
        id,
        rounded(moved, 4),
        message,
        "check units and signs of the loads",
    ))
}

fn little_stiffness(net: &Net, state: &StateResult) -> Option<v1::Finding> {
    let diagnosis = state.diagnosis.as_ref()?;
    let least = diagnosis.stiffnesses.first()?;
    let (node, by) = least.movements.first()?;
    let how = match diagnosis.standing {
        Standing::Firm => return None,
        Standing::Weak => format!(
            "less than {} % of that of the reference state",
            rounded(100.0 * LITTLE_LEFT, 2)
        ),
        Standing::Unstable => "none: the state is not stable".to_owned(),
    };
    let id = net.node_name(*node);
    // Adding zero takes the sign from a zero.
    let shown = |component: f64| (component * 100.0).round() / 100.0 + 0.0;
    let message = format!(
        "the least stiffness is {} N/m, {how}; most moves {}, along ({:.2}, {:.2}, {:.2})",
        rounded(least.stiffness, 3),
        Quoted(id),
        shown(by.x),
        shown(by.y),
        shown(by.z)
    );
    Some(finding(
        v1::FindingSeverity::Doubt,
        reasons::LITTLE_STIFFNESS,
        id,
        rounded(least.stiffness, 3),
        message,
        "give more prestress there, or hold the node along that direction",
    ))
}

/// The node that moves farthest from the reference state, of those whose place is determined, and how far (m).
pub(super) fn largest_movement(state: &StateResult) -> Option<(usize, f64)> {
    let mut loose = vec![false; state.displacements.len()];
    for node in &state.loose_nodes {
        loose[node.index()] = true;
    }
    let moves = state.displacements.iter().enumerate().filter(|(node, _)| !loose[*node]);
    moves
        .map(|(node, moved)| (node, moved.norm()))
        .reduce(|worst, next| if next.1 > worst.1 { next } else { worst })
}

fn audit_failed(net: &Net, state: &StateResult) -> Option<v1::Finding> {
    let audit = &state.audit;
    if audit.passed {
        return None;
    }
    let id = audit.node.map_or("", |node| net.node_name(node));
    let message = format!(
        "an independent routine does not confirm this state: {} out of balance at {}, {} in doubt in a member, and {} allowed",
        force(audit.largest_imbalance),
        Quoted(id),
        force(audit.largest_force_error),
        force(audit.allowed)
    );
    Some(finding(
        v1::FindingSeverity::Error,
        reasons::AUDIT_FAILED,
        id,
        rounded(audit.largest_imbalance, 4),
        message,
        "do not use this state; check units, or report the brief",
    ))
}
