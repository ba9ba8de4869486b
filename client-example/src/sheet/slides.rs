//! How far ropes slide through their nodes.

use super::{Cell, Mark, Row, Sheet, head};
use crate::run::Run;

/// Each slide in each answered state, those that slide farthest first; none where no rope slides.
pub(crate) fn slides(run: &Run) -> Option<Sheet> {
    let mut slid: Vec<(&str, usize, f64)> = Vec::new();
    for state in run
        .states
        .iter()
        .filter(|state| state.answered() && state.id != "reference")
    {
        let numbers = state.numbers("slid_m").unwrap_or_default();
        slid.extend(
            numbers
                .iter()
                .enumerate()
                .map(|(at, way)| (state.id.as_str(), at, *way)),
        );
    }
    slid.retain(|(_, at, _)| *at < run.slides.len());
    slid.sort_by(|a, b| b.2.abs().total_cmp(&a.2.abs()));
    let rows = slid.into_iter().map(|(case, at, way)| {
        let (rope, node) = &run.slides[at];
        Row {
            cells: vec![
                Cell::text(rope),
                Cell::text(&run.nodes[*node]),
                Cell::text(case),
                Cell::three(way * 1e3),
            ],
            mark: Mark::Plain,
            group: format!("{rope} at {}", run.nodes[*node]),
        }
    });
    let rows: Vec<Row> = rows.collect();
    (!rows.is_empty()).then(|| Sheet {
        file: "slides".into(),
        title: "Ropes that slide".into(),
        heads: vec![head("rope", ""), head("at node", ""), head("case", ""), head("passed", "mm")],
        rows,
        note: "Unstressed rope that has passed the node since the reference state, positive towards the end of the rope.",
    })
}
