//! The word on top, why it is that word, and the line that lets the work be trusted.

use ropewalk_api::ropewalk::v1;

use crate::number::{counted, order, percent, three};
use crate::run::Run;
use crate::sheet::motion_outcome;

/// A verdict as a word.
pub(crate) fn verdict_word(verdict: v1::Verdict) -> &'static str {
    match verdict {
        v1::Verdict::Passes => "passes",
        v1::Verdict::NotJudged => "not judged",
        v1::Verdict::Exceeds => "exceeds",
        v1::Verdict::NoAnswer | v1::Verdict::Unspecified => "no answer",
    }
}

/// Why the verdict is what it is, in one sentence.
pub(crate) fn why(run: &Run) -> String {
    let summary = &run.summary;
    if let Some(why) = &run.broken_off {
        let missing = run.cases_missing();
        let named: Vec<String> = missing.iter().take(5).map(|id| format!("\"{id}\"")).collect();
        let more = match missing.len().saturating_sub(named.len()) {
            0 => String::new(),
            count => format!(" and {count} more"),
        };
        let lacks = if missing.is_empty() {
            "no check was judged".to_owned()
        } else {
            format!("no answer for {}{more}, and no check was judged", named.join(", "))
        };
        return format!(
            "the run broke off after {}: {lacks}. {why}",
            counted(run.states.len(), "state")
        );
    }
    match summary.verdict() {
        v1::Verdict::Passes => {
            let n_cases = run.states.len().saturating_sub(1);
            format!("every check holds for every member in {}", counted(n_cases, "case"))
        }
        v1::Verdict::Exceeds => {
            let over = summary
                .checks
                .iter()
                .filter(|check| check.verdict() == v1::Verdict::Exceeds);
            let over: Vec<&v1::CheckResult> = over.collect();
            match over.iter().max_by(|a, b| a.ratio.total_cmp(&b.ratio)) {
                None => "a check is exceeded".to_owned(),
                Some(worst) => format!(
                    "{} of {} exceeded, worst: {} of \"{}\" uses {} % of its limit in case \"{}\"",
                    over.len(),
                    counted(summary.checks.len(), "check"),
                    worst.kind.replace('_', " "),
                    worst.worst,
                    percent(worst.ratio),
                    worst.governing_case
                ),
            }
        }
        v1::Verdict::NotJudged => {
            let open: u32 = summary.checks.iter().map(|check| check.not_judged).sum();
            match summary.checks.iter().find(|check| check.not_judged > 0) {
                None => "nothing failed, but no check was asked for".to_owned(),
                Some(check) => format!(
                    "nothing failed, but {open} could not be judged, \"{}\" among them: {}",
                    check.not_judged_ids.first().map_or("", String::as_str),
                    check.not_judged_why
                ),
            }
        }
        v1::Verdict::NoAnswer | v1::Verdict::Unspecified => {
            let none: Vec<&str> = run
                .states
                .iter()
                .filter(|state| !state.answered())
                .map(|state| state.id.as_str())
                .collect();
            if let Some(first) = none.first() {
                let others = if none.len() > 1 {
                    format!(" and {} more", none.len() - 1)
                } else {
                    String::new()
                };
                let states = counted(run.states.len(), "state");
                format!("{} of {states} without an answer: \"{first}\"{others}", none.len())
            } else if let Some(motion) = run.motions.iter().find(|motion| !motion.finished()) {
                format!("motion \"{}\": {}", motion.id, motion_outcome(motion))
            } else {
                "an answer did not pass the audit, or a case was not run".to_owned()
            }
        }
    }
}

/// The largest imbalance against what is allowed, and the loads against the supports.
pub(crate) fn audit_line(run: &Run) -> String {
    let answered: Vec<&v1::CaseSummary> = run
        .states
        .iter()
        .filter(|state| state.answered())
        .map(|state| &state.summary)
        .collect();
    // An imbalance counts by how much of what is allowed it uses: what is allowed differs from case to case.
    let used = |summary: &v1::CaseSummary| summary.imbalance_n / summary.imbalance_allowed_n.max(f64::MIN_POSITIVE);
    let Some(worst) = answered.iter().max_by(|a, b| used(a).total_cmp(&used(b))) else {
        return "Audit: no state has an answer, nothing to audit.".to_owned();
    };
    let audited = answered.iter().filter(|summary| summary.audited).count();
    let place = if worst.imbalance_node.is_empty() {
        String::new()
    } else {
        format!(" at \"{}\"", worst.imbalance_node)
    };
    let mut line = format!(
        "Audit: {audited} of {} answered states pass; largest imbalance {} N of {} N allowed{place} in \"{}\"",
        answered.len(),
        order(worst.imbalance_n),
        order(worst.imbalance_allowed_n),
        worst.case
    );
    let differences = answered.iter().map(|summary| (largest_difference(summary), *summary));
    if let Some((difference, summary)) = differences.max_by(|a, b| a.0.total_cmp(&b.0)) {
        let load = summary.load_sum_n.iter().map(|part| part * part).sum::<f64>().sqrt() / 1e3;
        line.push_str(&format!(
            "; loads and support forces differ by at most {} N (\"{}\", loads {} kN).",
            order(difference),
            summary.case,
            three(load)
        ));
    }
    line
}

/// Within what the axial forces are proven, and under which condition.
pub(crate) fn proof_line(run: &Run) -> String {
    let answered: Vec<&v1::CaseSummary> = (run.states.iter().filter(|state| state.answered()))
        .map(|state| &state.summary)
        .collect();
    let proofs: Vec<(&v1::CaseSummary, &v1::Certificate)> = answered
        .iter()
        .filter_map(|summary| summary.certificate.as_ref().map(|found| (*summary, found)))
        .filter(|(_, found)| found.certified)
        .collect();
    let widest = proofs
        .iter()
        .max_by(|a, b| a.1.tension_within_n.total_cmp(&b.1.tension_within_n));
    let Some((summary, found)) = widest else {
        return "Proof: of no state are the forces proven.".to_owned();
    };
    let mut line = format!(
        "Proof: in {} of {} answered states no axial force is wrong by more than {} kN (\"{}\")",
        proofs.len(),
        answered.len(),
        order(found.tension_within_n / 1e3),
        summary.case
    );
    if let Some((_, found)) = proofs.iter().find(|(_, found)| !found.condition.is_empty()) {
        line.push_str(&format!("; in some {}", found.condition));
    }
    line.push('.');
    line
}

/// Largest component of the sum of loads and support forces (N); they must cancel.
pub(crate) fn largest_difference(summary: &v1::CaseSummary) -> f64 {
    let pairs = summary.load_sum_n.iter().zip(&summary.support_force_sum_n);
    pairs.map(|(load, support)| (load + support).abs()).fold(0.0, f64::max)
}
