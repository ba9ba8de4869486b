//! Anchors by set: what a foundation is designed for, each row a set of forces that act at the same time.

use std::collections::BTreeMap;

use super::anchors::{Pull, pulls};
use super::{Cell, Mark, Row, Sheet, Show, head};
use crate::run::{Run, State};

/// Extremes that a foundation may be governed by, each with its name.
type Extreme = (&'static str, fn(Pull) -> f64);

const EXTREMES: [Extreme; 4] = [
    ("largest pull", Pull::size),
    ("uplift", |pull| pull.parts[2]),
    ("level", Pull::level),
    ("pressed down", |pull| -pull.parts[2]),
];

/// States of a set with the pulls in each.
type Set<'a> = (String, Vec<(&'a State, Vec<Pull>)>);

/// For each anchor and set the governing pulls; Hx, Hy and V of a row act together, in the case that it names.
pub(crate) fn anchor_sets(run: &Run) -> Sheet {
    let sets = sets(run);
    let mut rows = Vec::new();
    for (position, &node) in run.supports.iter().enumerate() {
        for (set, states) in &sets {
            let of_set: Vec<(&State, Pull)> = states
                .iter()
                .filter_map(|(state, pulls)| Some((*state, *pulls.get(position)?)))
                .collect();
            rows.extend(governing(run, &run.nodes[node], set, &of_set));
        }
    }
    Sheet {
        file: "anchor-sets".into(),
        title: "Anchors by set".into(),
        heads: vec![
            head("anchor", ""),
            head("set", ""),
            head("factors", ""),
            head("governs for", ""),
            head("case", ""),
            head("Hx", "kN"),
            head("Hy", "kN"),
            head("V up", "kN"),
            head("pull", "kN"),
            head("plan angle", "deg"),
            head("upward angle", "deg"),
        ],
        rows,
        note: "Pull on the anchor. Hx, Hy and V of a row act together. Factored: an action of the case has a factor above 1. \
               Forces of other anchors in the same case: anchors.csv, or below.",
    }
}

/// Answered states by set: the reference state, sets in the order in which cases name them, then what belongs to none.
fn sets(run: &Run) -> Vec<Set<'_>> {
    let mut sets: Vec<Set> = Vec::new();
    let mut at: BTreeMap<String, usize> = BTreeMap::new();
    let mut enter = |name: &str, state, pulls: &Vec<Pull>| {
        let place = *at.entry(name.to_owned()).or_insert(sets.len());
        if place == sets.len() {
            sets.push((name.to_owned(), Vec::new()));
        }
        sets[place].1.push((state, pulls.clone()));
    };
    for state in run.states.iter().filter(|state| state.answered()) {
        let pulls = pulls(state);
        if state.id == "reference" {
            enter("reference", state, &pulls);
        } else if state.sets.is_empty() {
            enter("in no set", state, &pulls);
        }
        for set in &state.sets {
            enter(set, state, &pulls);
        }
    }
    sets
}

/// The governing pulls of an anchor in a set; what one case governs twice stands in one row.
fn governing(run: &Run, anchor: &str, set: &str, states: &[(&State, Pull)]) -> Vec<Row> {
    let mut found: Vec<(usize, Vec<&str>)> = Vec::new();
    for (name, measure) in EXTREMES {
        // Of equal ones the first counts.
        let most = (0..states.len())
            .rev()
            .max_by(|&a, &b| measure(states[a].1).total_cmp(&measure(states[b].1)));
        let Some(most) = most.filter(|&at| measure(states[at].1) > 1e-3 * states[at].1.size()) else {
            continue;
        };
        match found.iter_mut().find(|(at, _)| *at == most) {
            Some((_, names)) => names.push(name),
            None => found.push((most, vec![name])),
        }
    }
    let rows = found.into_iter().map(|(at, names)| {
        let (state, pull) = states[at];
        let [hx, hy, v] = Cell::components(pull.parts.map(|part| part / 1e3), pull.size() / 1e3);
        Row {
            cells: vec![
                Cell::text(anchor),
                Cell::text(set),
                Cell::text(run.factoring(state).word()),
                Cell::text(names.join(", ")),
                Cell::text(&state.id),
                hx,
                hy,
                v,
                Cell::three(pull.size() / 1e3),
                Cell::Number(pull.plan_deg(), Show::Whole),
                Cell::Number(pull.up_deg(), Show::Whole),
            ],
            mark: Mark::Plain,
            group: anchor.to_owned(),
        }
    });
    rows.collect()
}
