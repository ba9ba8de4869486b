//! A state from its beginning to its closing words.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{CaseOutcome, LikelyCause, Plan, ReferenceOutcome, StateResult};
use ropewalk_numerics::check::CaseDigest;
use ropewalk_numerics::equilibrium::IterationReport;
use ropewalk_numerics::model::{AxialLaw, Net, SegmentId};
use ropewalk_numerics::shape::ShapeError;
use v1::run_response::Event;

use super::closing::Noted;
use super::parts::{count, event, first_ids};
use super::progress::way;
use super::{certificate, diagnosis, doubts, failure, modes, shape, state, surface};
use crate::decode::{REFERENCE, Work, reasons};
use crate::words::quoted_list;

/// Loose nodes that are listed.
const LOOSE_NODES: usize = 1000;

/// The reference state: beginning, arrays, findings, summary; then panels and what each action does.
///
/// `history`: every iteration, also where there is no state.
#[must_use]
pub fn reference(
    work: &Work,
    plan: &Plan,
    found: &Result<ReferenceOutcome, ShapeError>,
    history: &[IterationReport],
) -> Vec<v1::RunResponse> {
    let begin = v1::CaseBegin {
        case: REFERENCE.to_owned(),
        in_words: work.reference_in_words(),
        sets: Vec::new(),
        again: false,
    };
    let mut messages = vec![event(Event::CaseBegin(begin))];
    if let Ok(reference) = found {
        messages.extend(state::arrays(
            &plan.brief().net,
            REFERENCE,
            &reference.result,
            &reference.result,
        ));
    }
    messages.extend(state::history(REFERENCE, history));
    if let Ok(reference) = found {
        messages.extend(shape::report(&reference.report));
        messages.extend(diagnosed(&plan.brief().net, REFERENCE, &reference.result));
        messages.extend(moving(&plan.brief().net, REFERENCE, &reference.result, reference));
    }
    let findings = reference_findings(work, plan, found);
    messages.extend(findings.into_iter().map(|finding| event(Event::Finding(finding))));
    messages.push(event(Event::CaseSummary(reference_summary(work, plan, found, history))));
    if let Ok(reference) = found {
        messages.extend(surface::tables(plan, reference));
    }
    messages
}

pub(super) fn reference_findings(
    work: &Work,
    plan: &Plan,
    found: &Result<ReferenceOutcome, ShapeError>,
) -> Vec<v1::Finding> {
    match found {
        Ok(reference) => {
            let mut findings = doubts::of_state(work, &plan.brief().net, REFERENCE, &reference.result);
            findings.extend(surface::doubts(work, plan, reference));
            findings.extend(doubts::targets_unmet(work, &reference.report));
            findings
        }
        Err(error) => vec![no_answer(REFERENCE, &failure::of_shape(&plan.brief().net, error).1)],
    }
}

/// The closing words of the reference state.
pub(super) fn reference_summary(
    work: &Work,
    plan: &Plan,
    found: &Result<ReferenceOutcome, ShapeError>,
    history: &[IterationReport],
) -> v1::CaseSummary {
    match found {
        Ok(reference) => {
            let mut summary = summary(work, &plan.brief().net, REFERENCE, &reference.result, reference);
            summary.set_outcome(v1::CaseOutcome::Answered);
            summary.set_way(way(reference.report.way));
            summary.load_factor = 1.0;
            summary.iterations = iterations(history);
            summary.factorisations = reference.report.iterations;
            summary
        }
        Err(error) => {
            let (outcome, failure) = failure::of_shape(&plan.brief().net, error);
            v1::CaseSummary {
                case: REFERENCE.to_owned(),
                outcome: outcome.into(),
                failure: Some(failure),
                iterations: iterations(history),
                ..v1::CaseSummary::default()
            }
        }
    }
}

/// A case: beginning, arrays, findings, summary; and what the end of the run needs of it.
#[must_use]
pub fn case(
    work: &Work,
    plan: &Plan,
    reference: &ReferenceOutcome,
    case: usize,
    outcome: &CaseOutcome,
) -> (Vec<v1::RunResponse>, Noted) {
    let net = &plan.brief().net;
    let name = &plan.brief().cases[case].name;
    let mut messages = vec![begin(work, plan, case)];
    let mut findings = Vec::new();
    let digest = outcome.digest();
    let mut closing = match outcome {
        CaseOutcome::State {
            solution,
            result,
            cause,
        } => {
            messages.extend(state::arrays(net, name, result, &reference.result));
            messages.extend(state::history(name, &solution.history));
            messages.extend(diagnosed(net, name, result));
            messages.extend(moving(net, name, result, reference));
            let mut closing = summary(work, net, name, result, reference);
            closing.set_way(way(solution.way));
            closing.load_factor = solution.load_factor;
            closing.iterations = iterations(&solution.history);
            closing.factorisations = solution.factorisations;
            closing.ponding = result.ponding.as_ref().map(|ponding| surface::ponding(net, ponding));
            if outcome.is_answered() {
                closing.set_outcome(v1::CaseOutcome::Answered);
                closing.worst_ratio = plan.worst_ratio(reference, case, &digest);
                findings.extend(doubts::of_state(work, net, name, result));
            } else {
                closing.set_outcome(v1::CaseOutcome::NotConverged);
                closing.failure = Some(match cause.as_ref() {
                    Some(cause) if matches!(cause.likely, LikelyCause::Pond { .. }) => failure::of_pond(name, cause),
                    cause => failure::of_stop(name, solution.termination, solution.load_factor, cause),
                });
            }
            closing
        }
        CaseOutcome::None { error, cause } => v1::CaseSummary {
            outcome: v1::CaseOutcome::NoEquilibrium.into(),
            failure: Some(failure::of_error(name, error, cause)),
            ..v1::CaseSummary::default()
        },
    };
    closing.case.clone_from(name);
    let removed = work.removed(case);
    if let (Some(failure), false) = (closing.failure.as_mut(), removed.is_empty()) {
        failure
            .message
            .push_str(&format!(" Taken out: {}.", quoted_list(removed)));
    }
    findings.extend(closing.failure.as_ref().map(|failure| no_answer(name, failure)));
    let noted = Noted::new(digest, &findings);
    messages.extend(findings.into_iter().map(|finding| event(Event::Finding(finding))));
    messages.push(event(Event::CaseSummary(closing)));
    (messages, noted)
}

/// A case in which our own code failed.
#[must_use]
pub fn engine_error(work: &Work, plan: &Plan, case: usize) -> (Vec<v1::RunResponse>, Noted) {
    let name = &plan.brief().cases[case].name;
    let failure = failure::of_engine(name);
    let finding = no_answer(name, &failure);
    let noted = Noted::new(CaseDigest::default(), std::slice::from_ref(&finding));
    let closing = v1::CaseSummary {
        case: name.clone(),
        outcome: v1::CaseOutcome::EngineError.into(),
        failure: Some(failure),
        ..v1::CaseSummary::default()
    };
    let messages = vec![
        begin(work, plan, case),
        event(Event::Finding(finding)),
        event(Event::CaseSummary(closing)),
    ];
    (messages, noted)
}

fn begin(work: &Work, plan: &Plan, case: usize) -> v1::RunResponse {
    let given = &plan.brief().cases[case];
    event(Event::CaseBegin(v1::CaseBegin {
        case: given.name.clone(),
        in_words: work.in_words(case),
        sets: given.sets.clone(),
        again: false,
    }))
}

fn no_answer(case: &str, failure: &v1::Failure) -> v1::Finding {
    let first = failure.nodes.first().or(failure.members.first());
    v1::Finding {
        severity: v1::FindingSeverity::Error.into(),
        reason: reasons::NO_ANSWER.to_owned(),
        id: first.cloned().unwrap_or_default(),
        value: failure.reason.clone(),
        message: failure.message.clone(),
        cure: failure.cure.clone(),
        case: case.to_owned(),
        ..v1::Finding::default()
    }
}

fn diagnosed(net: &Net, case: &str, state: &StateResult) -> Vec<v1::RunResponse> {
    let found = state.diagnosis.as_deref();
    found.map_or_else(Vec::new, |found| diagnosis::parts(net, case, found))
}

fn moving(net: &Net, case: &str, state: &StateResult, reference: &ReferenceOutcome) -> Vec<v1::RunResponse> {
    let lowest = lowest_tension_share(net, state, reference);
    modes::parts(net, case, state, lowest.map(|(_, share)| share))
}

/// What a state says of itself.
fn summary(work: &Work, net: &Net, case: &str, state: &StateResult, reference: &ReferenceOutcome) -> v1::CaseSummary {
    let name = |node: usize| net.nodes()[node].name.clone();
    let movement = doubts::largest_movement(state);
    let lowest = lowest_tension_share(net, state, reference);
    let audit = &state.audit;
    v1::CaseSummary {
        case: case.to_owned(),
        slack_segments: count(state.slack.iter().filter(|slack| **slack).count()),
        audited: audit.passed,
        imbalance_n: audit.largest_imbalance,
        imbalance_node: audit.node.map_or_else(String::new, |node| name(node.index())),
        imbalance_allowed_n: audit.allowed,
        load_sum_n: state.load_sum.iter().copied().collect(),
        support_force_sum_n: state.support_sum.iter().copied().collect(),
        load_moment_nm: state.load_moment.iter().copied().collect(),
        support_moment_nm: state.support_moment.iter().copied().collect(),
        largest_movement_m: movement.map_or(0.0, |(_, moved)| moved),
        largest_movement_node: movement.map_or_else(String::new, |(node, _)| name(node)),
        lowest_tension_share: lowest.map(|(_, share)| share),
        lowest_tension_cable: lowest.map_or_else(String::new, |(segment, _)| {
            net.member_name(SegmentId::new(segment)).to_owned()
        }),
        loose_nodes: first_ids(state.loose_nodes.iter().map(|node| net.node_name(*node)), LOOSE_NODES),
        loose_nodes_total: count(state.loose_nodes.len()),
        certificate: state
            .certificate
            .as_ref()
            .map(|found| certificate::of(work, net, found)),
        smallest_stiffness_n_per_m: (state.diagnosis.as_ref())
            .and_then(|found| found.stiffnesses.first())
            .map(|least| least.stiffness),
        ..v1::CaseSummary::default()
    }
}

/// Lowest tension over reference tension, of rope segments that are taut in the reference state, and its segment.
fn lowest_tension_share(net: &Net, state: &StateResult, reference: &ReferenceOutcome) -> Option<(usize, f64)> {
    let before = &reference.state.axial_forces;
    let taut = |segment: &usize| net.segments()[*segment].law == AxialLaw::TensionOnly && before[*segment] > 0.0;
    let left = |segment: &usize| !state.removed.contains(&SegmentId::new(*segment));
    (0..before.len())
        .filter(taut)
        .filter(left)
        .map(|segment| (segment, state.axial_forces[segment] / before[segment]))
        .reduce(|lowest, next| if next.1 < lowest.1 { next } else { lowest })
}

/// Corrections in a history: the reports before the first one do not count.
fn iterations(history: &[IterationReport]) -> u32 {
    count(history.iter().filter(|report| report.iteration > 0).count())
}
