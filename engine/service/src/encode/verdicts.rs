//! What came of the checks.

use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{CheckKind, CheckResult, Plan, Verdict};
use ropewalk_numerics::check::Covered;

use super::parts::{BYTES, count, first_ids};
use crate::decode::Work;
use crate::words::shown;

/// Parts that could not be judged and are listed.
const NOT_JUDGED: usize = 100;
/// Names that a check read and that are repeated.
const OVER: usize = 100;

pub(super) fn verdict(verdict: Verdict) -> v1::Verdict {
    match verdict {
        Verdict::Passes => v1::Verdict::Passes,
        Verdict::NotJudged => v1::Verdict::NotJudged,
        Verdict::Exceeds => v1::Verdict::Exceeds,
        Verdict::NoAnswer => v1::Verdict::NoAnswer,
    }
}

/// Results of the checks, in brief order.
pub(super) fn checks(work: &Work, plan: &Plan, results: &[CheckResult]) -> Vec<v1::CheckResult> {
    let results = results.iter().enumerate();
    fit(results
        .map(|(number, result)| check(work, plan, number, result))
        .collect())
}

/// Results of checks in a run without a reference state.
pub(super) fn not_judged(work: &Work, plan: &Plan) -> Vec<v1::CheckResult> {
    let checks = plan.brief().checks.iter().enumerate();
    let results = checks.map(|(number, check)| {
        let covered: Vec<Covered> = check.covered().collect();
        v1::CheckResult {
            not_judged: count(covered.len()),
            not_judged_ids: ids(plan, &covered),
            not_judged_why: "there is no reference state".to_owned(),
            verdict: v1::Verdict::NoAnswer.into(),
            ..head(work, number, check.kind)
        }
    });
    fit(results.collect())
}

/// Takes out lists of ids, from the last check on, until all checks fit one message.
fn fit(mut results: Vec<v1::CheckResult>) -> Vec<v1::CheckResult> {
    let mut size: usize = results.iter().map(|result| result.encoded_len() + 8).sum();
    for result in results.iter_mut().rev() {
        if size <= BYTES {
            break;
        }
        let before = result.encoded_len();
        result.not_judged_ids.truncate(3);
        result.over.truncate(3);
        size -= before - result.encoded_len();
    }
    results
}

fn name(plan: &Plan, covered: Covered) -> &str {
    let net = &plan.brief().net;
    match covered {
        Covered::Cable(cable) => &net.cables()[cable.index()].name,
        Covered::Strut(strut) => &net.struts()[strut.index()].name,
        Covered::Node(node) => net.node_name(node),
    }
}

fn ids(plan: &Plan, covered: &[Covered]) -> Vec<String> {
    first_ids(covered.iter().map(|covered| name(plan, *covered)), NOT_JUDGED)
}

fn head(work: &Work, number: usize, kind: CheckKind) -> v1::CheckResult {
    let (kind, unit, source) = match kind {
        CheckKind::Safety { .. } => (
            "safety",
            "N",
            "factor of the brief times largest tension, against the breaking force with end fittings",
        ),
        CheckKind::Slackness { .. } => (
            "slackness",
            "",
            "least tension over the tension in the reference state, against the share of the brief",
        ),
        CheckKind::Movement { .. } => (
            "movement",
            "m",
            "distance from the place in the reference state, against the limit of the brief",
        ),
        CheckKind::AnchorPull { .. } => (
            "anchor_pull",
            "N",
            "resultant support force, against the limit of the brief",
        ),
    };
    let over = work.message.checks[number].over.iter().map(String::as_str);
    v1::CheckResult {
        path: format!("checks[{number}]"),
        kind: kind.to_owned(),
        over: first_ids(over, OVER),
        unit: unit.to_owned(),
        source: source.to_owned(),
        ..v1::CheckResult::default()
    }
}

fn check(work: &Work, plan: &Plan, number: usize, result: &CheckResult) -> v1::CheckResult {
    let mut message = v1::CheckResult {
        judged: count(result.judgements.len()),
        not_judged: count(result.not_judged.len()),
        not_judged_ids: ids(plan, &result.not_judged),
        not_judged_why: why_not_judged(result),
        verdict: verdict(result.verdict()).into(),
        ..head(work, number, result.kind)
    };
    if let Some(worst) = result.worst() {
        message.worst = name(plan, worst.of).to_owned();
        message.demand = worst.demand;
        message.limit = worst.limit;
        message.ratio = worst.ratio;
        message.governing_case.push_str(plan.brief().case_name(worst.case));
        let origin = worst
            .segment
            .and_then(|segment| work.breaking_force_origin(segment.index()));
        if let (CheckKind::Safety { .. }, Some(origin)) = (result.kind, origin) {
            message
                .source
                .push_str(&format!(" (breaking force: {})", shown(origin)));
        }
    }
    message
}

fn why_not_judged(result: &CheckResult) -> String {
    let struts = result
        .not_judged
        .iter()
        .filter(|part| matches!(part, Covered::Strut(_)))
        .count();
    let mut reasons = Vec::new();
    if struts < result.not_judged.len() {
        reasons.push(match result.kind {
            _ if !result.unanswered.is_empty() && result.judgements.is_empty() => "no case with a sound answer",
            CheckKind::Safety { .. } => "no breaking force is given",
            CheckKind::Slackness { .. } => "slack in the reference state",
            CheckKind::Movement { .. } => "only slack ropes lead there: the place is not determined",
            CheckKind::AnchorPull { .. } => "not supported",
        });
    }
    if struts > 0 {
        reasons.push("struts are not judged by this check");
    }
    reasons.join("; ")
}
