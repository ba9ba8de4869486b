//! What came of the checks.

use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{Brief, CheckKind, CheckResult, Plan, Verdict};
use ropewalk_numerics::check::{Covered, Judgement, Lack};

use super::parts::{BYTES, count, first_ids};
use super::rules;
use crate::decode::{REFERENCE, Work, check_field};
use crate::words::shown;

/// Parts that could not be judged and are listed.
const NOT_JUDGED: usize = 100;
/// Judged parts that are listed.
const JUDGED: usize = 200;
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
        let covered = check.covered();
        v1::CheckResult {
            not_judged: count(covered.len()),
            not_judged_ids: ids(plan, covered.iter()),
            not_judged_why: "there is no reference state".to_owned(),
            verdict: v1::Verdict::NoAnswer.into(),
            ..head(work, number, &check.kind)
        }
    });
    fit(results.collect())
}

/// Takes out lists, from the last check on, until all checks fit one message: first the judged parts, then ids.
fn fit(mut results: Vec<v1::CheckResult>) -> Vec<v1::CheckResult> {
    let mut size: usize = results.iter().map(|result| result.encoded_len() + 8).sum();
    for (judgements, names) in [(20, usize::MAX), (0, usize::MAX), (0, 3)] {
        for result in results.iter_mut().rev() {
            if size <= BYTES {
                return results;
            }
            let before = result.encoded_len();
            result.judgements.truncate(judgements);
            result.not_judged_ids.truncate(names);
            result.over.truncate(names);
            size -= before - result.encoded_len();
        }
    }
    results
}

pub(super) fn name(brief: &Brief, covered: Covered) -> &str {
    let net = &brief.net;
    match covered {
        Covered::Cable(cable) => &net.cables()[cable.index()].name,
        Covered::Strut(strut) => &net.struts()[strut.index()].name,
        Covered::Node(node) => net.node_name(node),
        Covered::Panel(panel) => &net.panels()[panel].name,
        Covered::Point => "",
    }
}

/// The part that was judged; of a clearance the member or panel that comes nearest.
pub(super) fn judged_name<'b>(brief: &'b Brief, judgement: &Judgement) -> &'b str {
    match (judgement.of, judgement.segment, judgement.panel) {
        (Covered::Point, Some(segment), _) => brief.net.member_name(segment),
        (Covered::Point, None, Some(panel)) => name(brief, Covered::Panel(panel)),
        (of, ..) => name(brief, of),
    }
}

/// Name of a case in results.
pub(super) fn case_name(brief: &Brief, case: Option<usize>) -> &str {
    case.map_or(REFERENCE, |case| brief.case_name(case))
}

fn ids<'a>(plan: &Plan, covered: impl Iterator<Item = &'a Covered>) -> Vec<String> {
    first_ids(covered.map(|covered| name(plan.brief(), *covered)), NOT_JUDGED)
}

fn head(work: &Work, number: usize, kind: &CheckKind) -> v1::CheckResult {
    let message = &work.message.checks[number];
    let (_, unit, _) = rules::measure(rules::usual_measure(kind));
    v1::CheckResult {
        path: format!("checks[{number}]"),
        kind: message.kind.as_ref().map_or("", check_field).to_owned(),
        over: first_ids(message.over.iter().map(String::as_str), OVER),
        unit: unit.to_owned(),
        source: rules::source(work, number, kind),
        ..v1::CheckResult::default()
    }
}

fn check(work: &Work, plan: &Plan, number: usize, result: &CheckResult) -> v1::CheckResult {
    let kind = &result.kind;
    let worst = result.worst();
    let mut message = v1::CheckResult {
        judged: count(result.judgements.len()),
        not_judged: count(result.not_judged.len()),
        not_judged_ids: ids(plan, result.not_judged.iter().map(|(part, _)| part)),
        not_judged_why: why_not_judged(result),
        verdict: verdict(result.verdict()).into(),
        judgements: judgements(plan, &result.judgements),
        notes: rules::notes(work, kind, worst),
        ..head(work, number, kind)
    };
    if let Some(worst) = worst {
        let (_, unit, scale) = rules::measure(worst.measure);
        message.worst = judged_name(plan.brief(), worst).to_owned();
        message.demand = worst.demand * scale;
        message.limit = worst.limit * scale;
        message.unit = unit.to_owned();
        message.ratio = worst.ratio;
        message.governing_case = case_name(plan.brief(), worst.case).to_owned();
        let origin = worst
            .segment
            .and_then(|segment| work.breaking_force_origin(segment.index()));
        let of_strength = matches!(
            kind,
            CheckKind::Safety { .. } | CheckKind::Resistance { .. } | CheckKind::ShareOfStrength { .. }
        );
        if let Some(origin) = origin.filter(|_| of_strength) {
            message
                .source
                .push_str(&format!(" (breaking force: {})", shown(origin)));
        }
    }
    message
}

/// Judged parts, the largest ratio first.
fn judgements(plan: &Plan, all: &[Judgement]) -> Vec<v1::Judgement> {
    let mut sorted: Vec<&Judgement> = all.iter().collect();
    // Stable: of equals the first of the check.
    sorted.sort_by(|a, b| b.ratio.total_cmp(&a.ratio));
    let listed = sorted.into_iter().take(JUDGED).map(|judgement| {
        let (words, unit, scale) = rules::measure(judgement.measure);
        v1::Judgement {
            id: judged_name(plan.brief(), judgement).to_owned(),
            demand: judgement.demand * scale,
            limit: judgement.limit * scale,
            unit: unit.to_owned(),
            ratio: judgement.ratio,
            passes: judgement.passes,
            governing_case: case_name(plan.brief(), judgement.case).to_owned(),
            measure: words.to_owned(),
        }
    });
    listed.collect()
}

/// Each reason once, in a fixed order.
fn why_not_judged(result: &CheckResult) -> String {
    let mut lacks: Vec<Lack> = result.not_judged.iter().map(|(_, lack)| *lack).collect();
    lacks.sort_unstable();
    lacks.dedup();
    lacks.into_iter().map(rules::lack).collect::<Vec<_>>().join("; ")
}
