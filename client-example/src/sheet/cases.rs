//! The case ledger: what acted, what came of it, and why where nothing came of it.

use ropewalk_api::ropewalk::v1;

use super::{Cell, Mark, Row, Sheet, Show, file_head, head, largest_difference, page_head};
use crate::run::{Run, State};

/// A way of solving, in words.
pub(crate) fn way_words(way: v1::SolutionWay) -> &'static str {
    match way {
        v1::SolutionWay::Unspecified => "",
        v1::SolutionWay::ForceDensities => "force densities",
        v1::SolutionWay::Newton => "Newton",
        v1::SolutionWay::InteriorPoint => "interior point",
        v1::SolutionWay::Polish => "interior point and polish",
        v1::SolutionWay::Relaxation => "relaxation",
    }
}

/// An outcome, in words.
pub(crate) fn outcome_words(state: &State) -> &'static str {
    match state.summary.outcome() {
        v1::CaseOutcome::Answered if state.summary.audited => "converged",
        v1::CaseOutcome::Answered => "converged, audit failed",
        v1::CaseOutcome::NotConverged => "not converged",
        v1::CaseOutcome::NoEquilibrium => "no equilibrium",
        v1::CaseOutcome::EngineError => "engine error",
        v1::CaseOutcome::Unspecified => "none",
    }
}

/// States in the order of the ledger: those without answer first, then by the worst ratio.
pub(crate) fn by_need(run: &Run) -> Vec<&State> {
    let mut states: Vec<&State> = run.states.iter().collect();
    let ratio = |state: &State| state.summary.worst_ratio.unwrap_or(-1.0);
    states.sort_by(|a, b| a.answered().cmp(&b.answered()).then(ratio(b).total_cmp(&ratio(a))));
    states
}

fn culprit(failure: &v1::Failure) -> String {
    failure
        .members
        .first()
        .or(failure.nodes.first())
        .cloned()
        .unwrap_or_default()
}

/// All states.
pub(crate) fn cases(run: &Run) -> Sheet {
    let loose = run.states.iter().any(|state| state.summary.loose_nodes_total > 0);
    Sheet {
        file: "cases".into(),
        title: "Case ledger".into(),
        heads: vec![
            head("case", ""),
            page_head("what acts", ""),
            head("sets", ""),
            head("answer", ""),
            head("way", ""),
            head("iterations", ""),
            head("load reached", "%"),
            head("slack", ""),
            head("worst ratio", "%"),
            head("lowest tension", "% of ref."),
            head("at rope", ""),
            head("largest movement", "mm"),
            head("at node", ""),
            head("imbalance", "N"),
            file_head("allowed", "N"),
            head("proven within", "N"),
            file_head("places within", "mm"),
            file_head("proven if", ""),
            // A column of zeros would push others off the page.
            if loose {
                page_head("loose nodes", "")
            } else {
                file_head("loose nodes", "")
            },
            file_head("reason", ""),
            file_head("cause", ""),
            file_head("cure", ""),
            file_head("look at", ""),
        ],
        rows: by_need(run).into_iter().map(row).collect(),
        note: "Every case starts from the same unstressed lengths; nothing is added or scaled. Slack counts segments. \
               A state without an answer has no numbers here: load reached tells how far it came, and its last good \
               places, a hint and no result, stand in nodes.csv with answered 0.",
    }
}

fn row(state: &State) -> Row {
    let summary = &state.summary;
    let answered = state.answered();
    let when_answered = |cell: Cell| if answered { cell } else { Cell::Empty };
    let failure = summary.failure.as_ref();
    let proven = summary.certificate.as_ref().filter(|_| answered);
    let told = |pick: fn(&v1::Failure) -> String| Cell::maybe(failure.map(|failure| Cell::text(pick(failure))));
    let mark = if !answered || !summary.audited {
        Mark::Gone
    } else if summary.worst_ratio.is_some_and(|ratio| ratio > 1.0) {
        Mark::Bad
    } else {
        Mark::Plain
    };
    Row {
        cells: vec![
            Cell::text(&state.id),
            Cell::text(&state.in_words),
            Cell::text(state.sets.join(", ")),
            Cell::text(outcome_words(state)),
            Cell::text(way_words(summary.way())),
            Cell::Count(summary.iterations.into()),
            Cell::percent(summary.load_factor),
            when_answered(Cell::Count(summary.slack_segments.into())),
            Cell::maybe(summary.worst_ratio.map(Cell::percent)),
            when_answered(Cell::maybe(summary.lowest_tension_share.map(Cell::percent))),
            when_answered(Cell::text(&summary.lowest_tension_cable)),
            when_answered(Cell::three(summary.largest_movement_m * 1e3)),
            when_answered(Cell::text(&summary.largest_movement_node)),
            when_answered(Cell::Number(summary.imbalance_n, Show::Order)),
            when_answered(Cell::Number(summary.imbalance_allowed_n, Show::Order)),
            Cell::maybe(proven.map(|found| Cell::Number(found.tension_within_n, Show::Order))),
            Cell::maybe(proven.map(|found| Cell::Number(found.position_within_m * 1e3, Show::Order))),
            Cell::maybe(proven.map(|found| Cell::text(&found.condition))),
            when_answered(Cell::Count(summary.loose_nodes_total.into())),
            told(|failure| failure.reason.clone()),
            told(|failure| failure.message.clone()),
            told(|failure| failure.cure.clone()),
            told(|failure| {
                let ids: Vec<&str> = failure
                    .members
                    .iter()
                    .chain(&failure.nodes)
                    .map(String::as_str)
                    .collect();
                ids.join(", ")
            }),
        ],
        mark,
        group: String::new(),
    }
}

/// States without an answer, gathered by their cause; the culprit comes first.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Cause {
    /// Member or node to look at first.
    pub(crate) culprit: String,
    /// Stable reason.
    pub(crate) reason: String,
    /// What happened in the first of the cases.
    pub(crate) message: String,
    /// What to try.
    pub(crate) cure: String,
    /// The cases.
    pub(crate) cases: Vec<String>,
}

/// Causes, the one with most cases first.
pub(crate) fn causes(run: &Run) -> Vec<Cause> {
    let mut causes: Vec<Cause> = Vec::new();
    for state in run.states.iter().filter(|state| !state.answered()) {
        let failure = state.summary.failure.clone().unwrap_or_else(|| v1::Failure {
            reason: "UNKNOWN".to_owned(),
            message: "the engine gave no cause".to_owned(),
            ..Default::default()
        });
        let culprit = culprit(&failure);
        match causes
            .iter_mut()
            .find(|cause| cause.reason == failure.reason && cause.culprit == culprit)
        {
            Some(cause) => cause.cases.push(state.id.clone()),
            None => causes.push(Cause {
                culprit,
                reason: failure.reason,
                message: failure.message,
                cure: failure.cure,
                cases: vec![state.id.clone()],
            }),
        }
    }
    causes.sort_by_key(|cause| std::cmp::Reverse(cause.cases.len()));
    causes
}

/// Sums of loads and of support forces for each answered state.
pub(crate) fn sums(run: &Run) -> Sheet {
    let rows = run.states.iter().filter(|state| state.answered()).map(|state| {
        let summary = &state.summary;
        let part = |sum: &[f64], axis: usize| Cell::maybe(sum.get(axis).map(|force| Cell::three(force / 1e3)));
        let mut cells = vec![Cell::text(&state.id)];
        cells.extend((0..3).map(|axis| part(&summary.load_sum_n, axis)));
        cells.extend((0..3).map(|axis| part(&summary.support_force_sum_n, axis)));
        cells.push(Cell::Number(largest_difference(summary), Show::Order));
        Row {
            cells,
            mark: Mark::Plain,
            group: String::new(),
        }
    });
    Sheet {
        file: "sums".into(),
        title: "Loads against supports".into(),
        heads: vec![
            head("case", ""),
            head("loads Fx", "kN"),
            head("loads Fy", "kN"),
            head("loads Fz", "kN"),
            head("supports Fx", "kN"),
            head("supports Fy", "kN"),
            head("supports Fz", "kN"),
            head("difference", "N"),
        ],
        rows: rows.collect(),
        note: "Forces on the net. The two sums must cancel.",
    }
}
