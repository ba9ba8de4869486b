//! The verdict sheet: what was checked, what is worst, how much of the limit it uses.

use ropewalk_api::ropewalk::v1;

use super::{Cell, Mark, Row, Sheet, head, page_head, verdict_word};
use crate::run::Run;

/// Checks, failures first, then by how much of the limit is used.
pub(crate) fn checks(run: &Run) -> Sheet {
    let mut results: Vec<&v1::CheckResult> = run.summary.checks.iter().collect();
    // The words are numbered from good to bad.
    results.sort_by(|a, b| b.verdict.cmp(&a.verdict).then(b.ratio.total_cmp(&a.ratio)));
    let rows = results.iter().map(|result| row(result)).collect();
    Sheet {
        file: "checks".into(),
        title: "Verdict sheet".into(),
        heads: vec![
            head("check", ""),
            head("over", ""),
            head("verdict", ""),
            head("worst", ""),
            head("demand", ""),
            head("limit", ""),
            head("unit", ""),
            head("used", "%"),
            head("governing case", ""),
            head("judged", ""),
            head("not judged", ""),
            page_head("why not judged", ""),
            page_head("rule", ""),
            page_head("beside it", ""),
            page_head("place in the brief", ""),
        ],
        rows,
        note: "Demand and limit of the worst member. Members without the data for a check are not judged, never passed.",
    }
}

/// Unit of demands and limits for eyes, and how many of it make one of the contract's.
pub(super) fn shown_unit(unit: &str) -> (&str, f64) {
    match unit {
        "N" => ("kN", 1e-3),
        "m" => ("mm", 1e3),
        "" => ("%", 1e2),
        unit => (unit, 1.0),
    }
}

/// How much of the limit is used; a rope whose tension grew everywhere uses nothing of what may be lost.
fn used(result: &v1::CheckResult) -> Cell {
    if result.kind == "slackness" && result.ratio < 0.0 {
        Cell::text("none: grew")
    } else {
        Cell::percent(result.ratio)
    }
}

fn row(result: &v1::CheckResult) -> Row {
    let (unit, scale) = shown_unit(&result.unit);
    let judged = result.judged > 0;
    let when_judged = |cell: Cell| if judged { cell } else { Cell::Empty };
    let mark = match result.verdict() {
        v1::Verdict::Passes => Mark::Good,
        v1::Verdict::Exceeds => Mark::Bad,
        v1::Verdict::NotJudged => Mark::Open,
        v1::Verdict::NoAnswer | v1::Verdict::Unspecified => Mark::Gone,
    };
    let mut why = result.not_judged_why.clone();
    if !result.not_judged_ids.is_empty() {
        why = format!("{why}: {}", result.not_judged_ids.join(", "));
    }
    let over = if result.over.is_empty() {
        "all cases".to_owned()
    } else {
        result.over.join(", ")
    };
    Row {
        cells: vec![
            Cell::text(result.kind.replace('_', " ")),
            Cell::text(over),
            Cell::text(verdict_word(result.verdict())),
            Cell::text(&result.worst),
            when_judged(Cell::three(result.demand * scale)),
            when_judged(Cell::three(result.limit * scale)),
            Cell::text(unit),
            when_judged(used(result)),
            Cell::text(&result.governing_case),
            Cell::Count(result.judged.into()),
            Cell::Count(result.not_judged.into()),
            Cell::text(why),
            Cell::text(&result.source),
            Cell::text(result.notes.join("; ")),
            Cell::text(&result.path),
        ],
        mark,
        group: String::new(),
    }
}
