//! What the loss of each member comes to.

use std::collections::BTreeMap;

use ropewalk_api::ropewalk::v1;

use super::{Cell, Mark, Row, Sheet, head, page_head};
use crate::run::Run;

/// Surviving members that a matrix has columns for.
const COLUMNS: usize = 14;

/// What is lost, in words.
pub(crate) fn lost_words(row: &v1::LossRow) -> String {
    row.removed.join(" + ")
}

fn largest_share(row: &v1::LossRow) -> Option<f64> {
    row.worst
        .iter()
        .filter_map(|cell| cell.share_of_breaking)
        .max_by(f64::total_cmp)
}

/// Losses in the order of need: without an answer first, then the largest share of what is left.
pub(crate) fn losses_by_need(run: &Run) -> Vec<&v1::LossRow> {
    let mut rows: Vec<&v1::LossRow> = run.losses.iter().collect();
    let share = |row: &v1::LossRow| largest_share(row).unwrap_or(-1.0);
    rows.sort_by(|a, b| {
        let fails = |row: &v1::LossRow| row.unanswered_total > 0;
        fails(b).cmp(&fails(a)).then(share(b).total_cmp(&share(a)))
    });
    rows
}

/// Surviving members by their largest share over all losses: the columns of the matrix.
pub(crate) fn survivors(run: &Run) -> Vec<&str> {
    let mut most: BTreeMap<&str, f64> = BTreeMap::new();
    for cell in run.losses.iter().flat_map(|row| &row.worst) {
        let Some(share) = cell.share_of_breaking else { continue };
        let known = most.entry(cell.member.as_str()).or_insert(share);
        *known = known.max(share);
    }
    let mut members: Vec<(&str, f64)> = most.into_iter().collect();
    members.sort_by(|a, b| b.1.total_cmp(&a.1));
    members.into_iter().take(COLUMNS).map(|(member, _)| member).collect()
}

/// One row for each loss; none where nothing is taken out.
pub(crate) fn losses(run: &Run) -> Option<Sheet> {
    (!run.losses.is_empty()).then(|| Sheet {
        file: "losses".into(),
        title: "Loss of members".into(),
        heads: vec![
            head("lost", ""),
            head("cases", ""),
            head("no answer", ""),
            head("k", ""),
            head("worst left", ""),
            head("of breaking", "%"),
            head("force", "kN"),
            head("in", ""),
            head("largest movement", "mm"),
            head("at node", ""),
            head("slack", ""),
            head("mechanism", ""),
            page_head("cases without answer", ""),
        ],
        rows: losses_by_need(run).into_iter().map(row).collect(),
        note: "k: the largest factor on the effect of the loss, 1 where only states without the member were solved. Mechanism: nodes whose \
               place nothing determines any more. Slack: the most segments in one state.",
    })
}

fn row(row: &v1::LossRow) -> Row {
    let worst = row.worst.first();
    let fails = row.unanswered_total > 0;
    let mechanism = match row.loose_nodes {
        0 => "no".to_owned(),
        nodes => format!("yes, {nodes} nodes"),
    };
    let moved = row.cases > row.unanswered_total;
    Row {
        cells: vec![
            Cell::text(lost_words(row)),
            Cell::Count(row.cases.into()),
            Cell::Count(row.unanswered_total.into()),
            Cell::three(row.factor),
            Cell::maybe(worst.map(|cell| Cell::text(&cell.member))),
            Cell::maybe(worst.and_then(|cell| cell.share_of_breaking).map(Cell::percent)),
            Cell::maybe(worst.map(|cell| Cell::three(cell.force_n / 1e3))),
            Cell::maybe(worst.map(|cell| Cell::text(&cell.case))),
            if moved {
                Cell::three(row.largest_movement_m * 1e3)
            } else {
                Cell::Empty
            },
            Cell::text(&row.largest_movement_node),
            Cell::Count(row.slack_segments.into()),
            Cell::text(mechanism),
            Cell::text(row.unanswered.join(", ")),
        ],
        mark: if fails {
            Mark::Gone
        } else if largest_share(row).is_some_and(|share| share > 1.0) {
            Mark::Bad
        } else {
            Mark::Plain
        },
        group: String::new(),
    }
}

/// Each loss against each of the members that it works hardest.
pub(crate) fn loss_cells(run: &Run) -> Option<Sheet> {
    let mut rows = Vec::new();
    for loss in losses_by_need(run) {
        for cell in &loss.worst {
            rows.push(Row {
                cells: vec![
                    Cell::text(lost_words(loss)),
                    Cell::text(&cell.member),
                    Cell::maybe(cell.share_of_breaking.map(Cell::percent)),
                    Cell::three(cell.force_n / 1e3),
                    Cell::text(&cell.case),
                ],
                mark: Mark::Plain,
                group: String::new(),
            });
        }
    }
    (!rows.is_empty()).then(|| Sheet {
        file: "loss-cells".into(),
        title: "Loss matrix, cell by cell".into(),
        heads: vec![
            head("lost", ""),
            head("member", ""),
            head("of breaking", "%"),
            head("force", "kN"),
            head("case", ""),
        ],
        rows,
        note: "",
    })
}
