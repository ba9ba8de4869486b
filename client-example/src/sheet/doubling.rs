//! Does doubling double? How tensions and movements of a case grow with its load.

use super::{Cell, Mark, Row, Sheet, head, page_head};
use crate::run::{Growth, Run};

/// For each case with a path: its ropes, those with the largest departure from the straight line first, and its movement.
/// None where no case asks for a path.
pub(crate) fn doubling(run: &Run) -> Option<Sheet> {
    let gamma = run.looked_at_factor();
    let mut rows = Vec::new();
    for (state, path) in run.load_paths() {
        if let Some(growth) = path.movement(gamma) {
            rows.push(row(&state.id, "largest movement", "mm", 1e3, growth));
        }
        for (cable, growth) in path.by_departure(gamma) {
            rows.push(row(&state.id, &run.cables[cable], "kN", 1e-3, growth));
        }
    }
    (!rows.is_empty()).then(|| Sheet {
        file: "doubling".into(),
        title: "Does doubling double?".into(),
        heads: vec![
            head("case", ""),
            head("of", ""),
            head("unit", ""),
            head("no load", ""),
            head("E(F)", ""),
            head("factor γ", ""),
            head("E(γF)", ""),
            head("γE(F)", ""),
            page_head("γ on what F adds", ""),
            head("index", ""),
            head("off the line", "%"),
            head("slack from", "× F"),
            page_head("factor belongs", ""),
        ],
        rows,
        note: "F: the actions of the case beside those of the reference state. Index: E(γF) over γE(F); above 1 the factor governs on \
               the action, below 1 on the effect. Off the line: largest distance from the straight line through no load and F, \
               of the largest number on the path. Tension: the largest of the rope's segments.",
    })
}

fn row(case: &str, of: &str, unit: &str, scale: f64, growth: Growth) -> Row {
    let value = |number: f64| Cell::three(number * scale);
    let belongs = match growth.index() {
        None => "",
        Some(index) if index > 1.0 + 1e-6 => "on the action",
        Some(index) if index < 1.0 - 1e-6 => "on the effect",
        Some(_) => "on either",
    };
    Row {
        cells: vec![
            Cell::text(case),
            Cell::text(of),
            Cell::text(unit),
            value(growth.none),
            value(growth.full),
            Cell::three(growth.gamma),
            value(growth.on_action),
            value(growth.on_effect()),
            value(growth.on_parts()),
            Cell::maybe(growth.index().map(Cell::three)),
            Cell::percent(growth.departure),
            Cell::maybe(growth.slack_from.map(Cell::three)),
            Cell::text(belongs),
        ],
        mark: Mark::Plain,
        group: case.to_owned(),
    }
}
