//! Design effects, the paths of cases, and what the loss of members came to.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{Effect, EffectRule, FactorRules, Loss, PathResult, Plan, ReferenceOutcome};
use ropewalk_numerics::check::CaseDigest;
use ropewalk_numerics::model::{Member, Net};
use v1::Range;
use v1::run_response::Event;

use super::parts::{count, event, first_ids, split};
use super::state::{Array, flat, unit};
use crate::decode::{ENVELOPE, REFERENCE, Work};

/// Members of a design effect that are listed.
const MEMBERS: usize = 20;
/// Ids that are listed.
const LISTED: usize = 100;
/// Index where there is nothing to divide by.
const NO_INDEX: f64 = -1.0;

/// What is told of a design effect: itself, then its arrays.
#[must_use]
pub fn design_effect(work: &Work, plan: &Plan, reference: &ReferenceOutcome, effect: &Effect) -> Vec<v1::RunResponse> {
    let brief = plan.brief();
    let given = &brief.effects[effect.effect];
    let (rule, factor) = match given.rule {
        EffectRule::Loss { factor } => (v1::EffectRule::Loss, factor),
        EffectRule::OnEffect { factor } => (v1::EffectRule::OnEffect, factor),
        EffectRule::OnParts { variable, .. } => (v1::EffectRule::OnParts, variable),
    };
    let mut message = v1::DesignEffect {
        id: given.name.clone(),
        rule: rule.into(),
        in_words: work.effect_in_words(effect.effect),
        sets: given.sets.clone(),
        terms: (given.terms.iter())
            .map(|(case, weight)| v1::EffectTerm {
                case: brief.cases[*case].name.clone(),
                weight: *weight,
            })
            .collect(),
        answered: effect.digest.is_some(),
        factor,
        beside: given
            .beside
            .map_or_else(String::new, |case| brief.cases[case].name.clone()),
        ..v1::DesignEffect::default()
    };
    let mut arrays = Vec::new();
    if let Some(digest) = &effect.digest {
        let index = brief.cases.len() + effect.effect;
        message.worst_ratio = plan.worst_ratio(reference, index, digest);
        let moved = digest.displacements.iter().enumerate();
        let moved = moved.filter(|(node, _)| digest.loose_nodes.iter().all(|loose| loose.index() != *node));
        let largest = moved.map(|(node, moved)| (node, moved.norm()));
        if let Some((node, moved)) = largest.reduce(|a, b| if b.1 > a.1 { b } else { a }) {
            message.largest_movement_m = moved;
            message.largest_movement_node.clone_from(&brief.net.nodes()[node].name);
        }
        if let Some(beside) = &effect.beside {
            message.members = over_linearity(&brief.net, digest, beside);
        }
        arrays = arrays_of(&brief.net, &given.name, digest, effect.beside.as_deref());
    }
    let mut messages = vec![event(Event::DesignEffect(message))];
    messages.extend(arrays);
    messages
}

fn ropes(net: &Net) -> usize {
    let segments = net.segments().iter();
    segments.filter(|s| matches!(s.member, Member::Cable(_))).count()
}

fn arrays_of(net: &Net, name: &str, digest: &CaseDigest, beside: Option<&CaseDigest>) -> Vec<v1::RunResponse> {
    let ropes = ropes(net);
    let mut messages = Vec::new();
    let mut send = |array: &'static str, over: Range, components: u32, baseline: &'static str, values: Vec<f64>| {
        let array = Array {
            case: name,
            name: array,
            unit: unit(array),
            over,
            components,
            baseline,
            values,
        };
        messages.extend(array.parts());
    };
    let forces = &digest.axial_forces;
    send("tension_n", Range::RopeSegment, 1, "", forces[..ropes].to_vec());
    send("axial_force_n", Range::Strut, 1, "", forces[ropes..].to_vec());
    send("displacement_m", Range::Node, 3, REFERENCE, flat(&digest.displacements));
    let supports = net
        .supports()
        .iter()
        .map(|support| digest.support_forces[support.node().index()]);
    let supports: Vec<_> = supports.map(Option::unwrap_or_default).collect();
    send("support_force_n", Range::Support, 3, "", flat(&supports));
    if let Some(beside) = beside {
        let index = beside.axial_forces[..ropes].iter().zip(forces);
        let index = index.map(|(action, effect)| index_of(*action, *effect));
        send("over_linearity", Range::RopeSegment, 1, "", index.collect());
    }
    messages
}

/// `E(γF) / (γ E(F))`.
fn index_of(on_action: f64, on_effect: f64) -> f64 {
    if on_effect > 0.0 {
        on_action / on_effect
    } else {
        NO_INDEX
    }
}

/// Ropes that depart most from growing in proportion, most first.
fn over_linearity(net: &Net, effect: &CaseDigest, beside: &CaseDigest) -> Vec<v1::OverLinearity> {
    let largest = |digest: &CaseDigest, segments: &std::ops::Range<usize>| {
        digest.axial_forces[segments.clone()]
            .iter()
            .copied()
            .fold(0.0, f64::max)
    };
    let of_cable = net.cables().iter().enumerate().map(|(cable, given)| {
        let [on_action, on_effect] = [beside, effect].map(|digest| largest(digest, &given.segments));
        (cable, on_action, on_effect, index_of(on_action, on_effect))
    });
    let departure =
        |(_, on_action, on_effect, index): &(usize, f64, f64, f64)| match (*on_effect > 0.0, *on_action > 0.0) {
            (true, true) => index.ln().abs(),
            (false, false) => f64::NEG_INFINITY,
            _ => f64::INFINITY,
        };
    let mut members: Vec<_> = of_cable.collect();
    members.sort_by(|a, b| departure(b).total_cmp(&departure(a)).then(a.0.cmp(&b.0)));
    members.truncate(MEMBERS);
    let member = |(cable, on_action_n, on_effect_n, index): (usize, f64, f64, f64)| v1::OverLinearity {
        member: net.cables()[cable].name.clone(),
        on_action_n,
        on_effect_n,
        index,
    };
    members.into_iter().map(member).collect()
}

/// Columns of a path; nothing where not even its beginning has an answer.
#[must_use]
pub fn path(case: &str, path: &PathResult) -> Vec<v1::RunResponse> {
    let steps = path.load_factors.len();
    let cables = path.tensions.first().map_or(0, Vec::len);
    let tensions = (0..cables).flat_map(|cable| path.tensions.iter().map(move |at_step| at_step[cable]));
    [
        ("path_load_factor", Range::LoadStep, 1, path.load_factors.clone(), ""),
        ("path_movement_m", Range::LoadStep, 1, path.movements.clone(), REFERENCE),
        ("path_tension_n", Range::Cable, steps, tensions.collect(), ""),
    ]
    .into_iter()
    .flat_map(|(name, over, components, values, baseline)| {
        let array = Array {
            case,
            name,
            unit: unit(name),
            over,
            components: count(components),
            baseline,
            values,
        };
        array.parts().collect::<Vec<_>>()
    })
    .collect()
}

/// Which way to factor a predominant action governs: largest tensions over rope segments.
pub(super) fn factor_rules(net: &Net, rules: &FactorRules) -> Vec<v1::RunResponse> {
    let ropes = ropes(net);
    [
        ("tension_max_on_action_n", &rules.on_action),
        ("tension_max_on_effect_n", &rules.on_effect),
        ("tension_max_on_parts_n", &rules.on_parts),
    ]
    .into_iter()
    .flat_map(|(name, values)| {
        let array = Array {
            case: ENVELOPE,
            name,
            unit: "N",
            over: Range::RopeSegment,
            components: 1,
            baseline: "",
            values: values[..ropes].to_vec(),
        };
        array.parts().collect::<Vec<_>>()
    })
    .collect()
}

/// The table of losses, in parts.
pub(super) fn losses(work: &Work, plan: &Plan, losses: &[Loss]) -> Vec<v1::RunResponse> {
    let rows: Vec<v1::LossRow> = losses.iter().map(|loss| row(work, plan, loss)).collect();
    let total = count(rows.len());
    let mut offset = 0;
    let mut messages = Vec::new();
    for rows in split(rows) {
        let next = offset + count(rows.len());
        messages.push(event(Event::LossTable(v1::LossTable { offset, total, rows })));
        offset = next;
    }
    messages
}

fn row(work: &Work, plan: &Plan, loss: &Loss) -> v1::LossRow {
    let brief = plan.brief();
    let removed = loss.removed.iter().map(|member| work.member_name(*member));
    let unanswered = loss.unanswered.iter().map(|case| brief.case_name(*case));
    let most = |extreme: Option<ropewalk_numerics::brief::LossExtreme>| {
        // Counts come as numbers: at most as many as the net has parts.
        #[allow(
            clippy::cast_possible_truncation,
            clippy::cast_sign_loss,
            reason = "a count of parts of a net"
        )]
        extreme.map_or(0, |extreme| extreme.value as u32)
    };
    let mut row = v1::LossRow {
        removed: first_ids(removed, LISTED),
        factor: loss.factor,
        cases: count(loss.cases.len()),
        unanswered: first_ids(unanswered, LISTED),
        unanswered_total: count(loss.unanswered.len()),
        worst: (loss.worst.iter())
            .map(|worst| v1::LossCell {
                member: work.member_name(worst.member).to_owned(),
                force_n: worst.force,
                share_of_breaking: worst.share,
                case: brief.case_name(worst.case).to_owned(),
            })
            .collect(),
        slack_segments: most(loss.slack),
        loose_nodes: most(loss.loose),
        ..v1::LossRow::default()
    };
    if let Some((node, moved)) = loss.largest_movement {
        row.largest_movement_m = moved.value;
        brief.net.node_name(node).clone_into(&mut row.largest_movement_node);
        brief.case_name(moved.case).clone_into(&mut row.largest_movement_case);
    }
    row
}
