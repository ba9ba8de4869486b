//! Every member, node and panel that a check judged, with what it used of its limit.

use ropewalk_api::ropewalk::v1;

use super::checks::shown_unit;
use super::{Cell, Mark, Row, Sheet, head, page_head};
use crate::run::Run;

/// All judgements, the largest ratio first; none where the engine told of none.
pub(crate) fn judgements(run: &Run) -> Option<Sheet> {
    let mut judged: Vec<(&v1::CheckResult, &v1::Judgement)> = Vec::new();
    for check in &run.summary.checks {
        judged.extend(check.judgements.iter().map(|judgement| (check, judgement)));
    }
    judged.sort_by(|a, b| b.1.ratio.total_cmp(&a.1.ratio));
    (!judged.is_empty()).then(|| Sheet {
        file: "judgements".into(),
        title: "Judged one by one".into(),
        heads: vec![
            head("check", ""),
            head("over", ""),
            head("id", ""),
            head("demand", ""),
            head("limit", ""),
            head("unit", ""),
            head("used", "%"),
            head("verdict", ""),
            head("governing case", ""),
            page_head("measured", ""),
            page_head("place in the brief", ""),
        ],
        rows: judged
            .into_iter()
            .map(|(check, judgement)| row(check, judgement))
            .collect(),
        note: "The largest ratios first. Of each check the engine tells the first 200 members, nodes or panels.",
    })
}

fn row(check: &v1::CheckResult, judgement: &v1::Judgement) -> Row {
    let (unit, scale) = shown_unit(&judgement.unit);
    let over = if check.over.is_empty() {
        "all cases".to_owned()
    } else {
        check.over.join(", ")
    };
    Row {
        cells: vec![
            Cell::text(check.kind.replace('_', " ")),
            Cell::text(over),
            Cell::text(&judgement.id),
            Cell::three(judgement.demand * scale),
            Cell::three(judgement.limit * scale),
            Cell::text(unit),
            Cell::percent(judgement.ratio),
            Cell::text(if judgement.passes { "passes" } else { "exceeds" }),
            Cell::text(&judgement.governing_case),
            Cell::text(&judgement.measure),
            Cell::text(&check.path),
        ],
        mark: if judgement.passes { Mark::Plain } else { Mark::Bad },
        group: check.path.clone(),
    }
}
