//! Natural frequencies of states, from the lowest.

use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::state_modes::Part;

use super::{Cell, Mark, Row, Sheet, file_head, head, page_head};
use crate::number::percent;
use crate::run::Run;

/// Nodes that a line names.
const NAMED: usize = 3;

/// The modes of each state that was asked about; first a line that tells whether any was missed.
pub(crate) fn modes(run: &Run) -> Option<Sheet> {
    if run.modes.is_empty() {
        return None;
    }
    let mut moving = [0.0; 3];
    let mut rows = Vec::new();
    for part in &run.modes {
        let group = part.case.clone();
        match part.part.as_ref() {
            Some(Part::Found(found)) => {
                moving
                    .iter_mut()
                    .zip(&found.moving_mass_kg)
                    .for_each(|(to, mass)| *to = *mass);
                rows.push(Row {
                    cells: of_state(&part.case, found),
                    mark: if found.complete { Mark::Plain } else { Mark::Open },
                    group,
                });
            }
            Some(Part::Mode(mode)) => rows.push(Row {
                cells: of_mode(&part.case, mode, &moving),
                mark: if mode.kind() == v1::ModeKind::Vibrates {
                    Mark::Plain
                } else {
                    Mark::Bad
                },
                group,
            }),
            None => {}
        }
    }
    Some(Sheet {
        file: "frequencies".into(),
        title: "Natural frequencies".into(),
        heads: vec![
            head("state", ""),
            head("mode", ""),
            head("frequency", "Hz"),
            head("period", "s"),
            head("takes part x", "%"),
            head("takes part y", "%"),
            head("takes part z", "%"),
            head("where", ""),
            page_head("modal mass", "kg"),
            file_head("residual", ""),
        ],
        rows,
        note: "Small undamped movements about each state, lumped masses. Takes part: share of the mass that can move along \
               the axis. Most moves first. Low frequencies ask for a study of the wind.",
    })
}

fn of_state(case: &str, found: &v1::ModesFound) -> Vec<Cell> {
    let sure = match (found.complete, found.counted) {
        (true, _) => "a count misses none".to_owned(),
        (false, Some(counted)) => format!("a count says {counted}"),
        (false, None) => "whether one is missed is open".to_owned(),
    };
    let mut notes = Vec::new();
    if let Some(share) = found.lowest_tension_share {
        notes.push(format!("lowest tension {} % of reference", percent(share)));
    }
    for (count, what) in [
        (
            found.floating_nodes_total,
            "nodes float on slack ropes and are left out",
        ),
        (found.massless_nodes_total, "nodes without mass"),
        (found.nearly_slack_segments, "segments nearly slack"),
    ] {
        if count > 0 {
            notes.push(format!("{count} {what}"));
        }
    }
    if !found.islands.is_empty() {
        notes.push(format!("{} parts joined by slack ropes only", found.islands.len()));
    }
    if let Some(share) = found.unsymmetric_share {
        notes.push(format!("pressure leaves out {} %", percent(share)));
    }
    let mut cells = vec![
        Cell::text(case),
        Cell::text(format!("{} modes, {sure}", found.modes)),
        Cell::Empty,
        Cell::Empty,
    ];
    cells.extend([Cell::Empty, Cell::Empty, Cell::Empty]);
    cells.extend([Cell::text(notes.join("; ")), Cell::Empty, Cell::Empty]);
    cells
}

fn of_mode(case: &str, mode: &v1::Mode, moving: &[f64; 3]) -> Vec<Cell> {
    let what = match mode.kind() {
        v1::ModeKind::Rigid => " without stiffness",
        v1::ModeKind::Unstable => " not stable",
        _ => "",
    };
    let vibrates = mode.frequency_hz > 0.0;
    let mut cells = vec![
        Cell::text(case),
        Cell::text(format!("{}{what}", mode.number + 1)),
        Cell::maybe(vibrates.then(|| Cell::three(mode.frequency_hz))),
        Cell::maybe(vibrates.then(|| Cell::three(mode.frequency_hz.recip()))),
    ];
    cells.extend((0..3).map(|axis| {
        let mass = mode.effective_mass_kg.get(axis).copied().unwrap_or(0.0);
        Cell::maybe((moving[axis] > 0.0).then(|| Cell::percent(mass / moving[axis])))
    }));
    let nodes: Vec<&str> = mode.nodes.iter().take(NAMED).map(String::as_str).collect();
    cells.extend([
        Cell::text(nodes.join(", ")),
        Cell::three(mode.modal_mass_kg),
        Cell::three(mode.residual),
    ]);
    cells
}
