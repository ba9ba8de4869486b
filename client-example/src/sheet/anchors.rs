//! The anchor sheet: what the foundations and walls must take.

use ropewalk_api::ropewalk::v1;

use super::{Cell, Mark, Row, Sheet, Show, head};
use crate::run::{Run, State};

/// The pull on an anchor: the opposite of the support's force on the net.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Pull {
    /// Components along x, y and z, up (N).
    pub(super) parts: [f64; 3],
}

impl Pull {
    pub(super) fn size(self) -> f64 {
        self.parts.iter().map(|part| part * part).sum::<f64>().sqrt()
    }

    /// Horizontal part (N).
    pub(super) fn level(self) -> f64 {
        self.parts[0].hypot(self.parts[1])
    }

    /// Angle in plan, from x towards y (deg).
    pub(super) fn plan_deg(self) -> f64 {
        self.parts[1].atan2(self.parts[0]).to_degrees()
    }

    /// Angle above the horizontal (deg).
    pub(super) fn up_deg(self) -> f64 {
        self.parts[2].atan2(self.level()).to_degrees()
    }
}

pub(super) fn pulls(state: &State) -> Vec<Pull> {
    let forces = state.vectors("support_force_n").unwrap_or_default();
    // Zero stays zero: a force of -0 would read oddly.
    forces
        .iter()
        .map(|force| Pull {
            parts: force.map(|part| 0.0 - part),
        })
        .collect()
}

/// Limit of the pull on a node in a state (N), if a check gives one.
fn limit(run: &Run, node: usize, state: &State) -> Option<f64> {
    let mut least: Option<f64> = None;
    for check in &run.brief.checks {
        let Some(v1::check::Kind::AnchorPull(pull)) = &check.kind else {
            continue;
        };
        let reads = check.over.is_empty()
            || check
                .over
                .iter()
                .any(|name| *name == state.id || state.sets.contains(name));
        let covers = check.on.is_empty() || run.nodes_named(&check.on).contains(&node);
        if reads && covers && state.id != "reference" {
            least = match (least, pull.limit_n) {
                (Some(least), Some(limit)) => Some(least.min(limit)),
                (known, given) => known.or(given),
            };
        }
    }
    least
}

const NOTE: &str = "Pull on the anchor, the opposite of the support's force on the net. Plan angle from x towards y; \
                    upward angle from the horizontal. Pulls of different cases do not act together.";

/// All anchors in all answered states: by anchor, largest pull first. Forces of one case act together.
pub(crate) fn anchors(run: &Run) -> Sheet {
    let mut rows = Vec::new();
    let answered: Vec<(&State, Vec<Pull>)> = run
        .states
        .iter()
        .filter(|state| state.answered())
        .map(|state| (state, pulls(state)))
        .collect();
    for (position, &node) in run.supports.iter().enumerate() {
        let mut of_node: Vec<(&State, Pull)> = answered
            .iter()
            .filter_map(|(state, pulls)| Some((*state, *pulls.get(position)?)))
            .collect();
        of_node.sort_by(|a, b| b.1.size().total_cmp(&a.1.size()));
        for (state, pull) in of_node {
            let limit = limit(run, node, state);
            let used = limit.map(|limit| pull.size() / limit);
            let [hx, hy, v] = Cell::components(pull.parts.map(|part| part / 1e3), pull.size() / 1e3);
            rows.push(Row {
                cells: vec![
                    Cell::text(&run.nodes[node]),
                    Cell::text(&state.id),
                    Cell::text(state.sets.join(", ")),
                    Cell::text(run.factoring(state).word()),
                    hx,
                    hy,
                    v,
                    Cell::three(pull.size() / 1e3),
                    Cell::Number(pull.plan_deg(), Show::Whole),
                    Cell::Number(pull.up_deg(), Show::Whole),
                    Cell::maybe(limit.map(|limit| Cell::three(limit / 1e3))),
                    Cell::maybe(used.map(Cell::percent)),
                ],
                mark: if used.is_some_and(|used| used > 1.0) {
                    Mark::Bad
                } else {
                    Mark::Plain
                },
                group: run.nodes[node].clone(),
            });
        }
    }
    Sheet {
        file: "anchors".into(),
        title: "Anchors in every case".into(),
        heads: vec![
            head("anchor", ""),
            head("case", ""),
            head("sets", ""),
            head("factors", ""),
            head("Hx", "kN"),
            head("Hy", "kN"),
            head("V up", "kN"),
            head("pull", "kN"),
            head("plan angle", "deg"),
            head("upward angle", "deg"),
            head("limit", "kN"),
            head("used", "%"),
        ],
        rows,
        note: NOTE,
    }
}

/// One row an anchor: its largest pull, its largest uplift, and which of its components turn round.
pub(crate) fn anchor_peaks(run: &Run) -> Sheet {
    let answered: Vec<(&State, Vec<Pull>)> = run
        .states
        .iter()
        .filter(|state| state.answered())
        .map(|state| (state, pulls(state)))
        .collect();
    let mut keyed: Vec<(f64, Row)> = Vec::new();
    for (position, &node) in run.supports.iter().enumerate() {
        let of_node: Vec<(&State, Pull)> = answered
            .iter()
            .filter_map(|(state, pulls)| Some((*state, *pulls.get(position)?)))
            .collect();
        // Of equal ones the first counts, in the order of the cases.
        let Some(&(state, pull)) = of_node.iter().rev().max_by(|a, b| a.1.size().total_cmp(&b.1.size())) else {
            continue;
        };
        let Some(&(up_state, up)) = of_node
            .iter()
            .rev()
            .max_by(|a, b| a.1.parts[2].total_cmp(&b.1.parts[2]))
        else {
            continue;
        };
        let judged = of_node
            .iter()
            .filter_map(|(state, pull)| Some((limit(run, node, state)?, pull.size())));
        let used = judged
            .map(|(limit, size)| (size / limit, limit))
            .max_by(|a, b| a.0.total_cmp(&b.0));
        let lifts = up.parts[2] > 0.0;
        let turns = reversals(&of_node, pull.size());
        let [hx, hy, v] = Cell::components(pull.parts.map(|part| part / 1e3), pull.size() / 1e3);
        let row = Row {
            cells: vec![
                Cell::text(&run.nodes[node]),
                Cell::three(pull.size() / 1e3),
                Cell::text(words(pull)),
                hx,
                hy,
                v,
                Cell::Number(pull.plan_deg(), Show::Whole),
                Cell::Number(pull.up_deg(), Show::Whole),
                Cell::text(&state.id),
                if lifts {
                    Cell::three(up.parts[2] / 1e3)
                } else {
                    Cell::text("none")
                },
                if lifts { Cell::text(&up_state.id) } else { Cell::Empty },
                Cell::text(turns),
                Cell::maybe(used.map(|(_, limit)| Cell::three(limit / 1e3))),
                Cell::maybe(used.map(|(used, _)| Cell::percent(used))),
            ],
            mark: if used.is_some_and(|(used, _)| used > 1.0) {
                Mark::Bad
            } else {
                Mark::Plain
            },
            group: String::new(),
        };
        keyed.push((pull.size(), row));
    }
    keyed.sort_by(|a, b| b.0.total_cmp(&a.0));
    Sheet {
        file: "anchor-peaks".into(),
        title: "Anchor sheet: largest pull of each anchor".into(),
        heads: vec![
            head("anchor", ""),
            head("pull", "kN"),
            head("towards", ""),
            head("Hx", "kN"),
            head("Hy", "kN"),
            head("V up", "kN"),
            head("plan angle", "deg"),
            head("upward angle", "deg"),
            head("case", ""),
            head("largest uplift", "kN"),
            head("case of uplift", ""),
            head("reverses", ""),
            head("limit", "kN"),
            head("used", "%"),
        ],
        rows: keyed.into_iter().map(|(_, row)| row).collect(),
        note: NOTE,
    }
}

/// Components that point one way in one state and the other way in another: "Hx, V". Rounding noise is no reversal: of the
/// upright part a thousandth of the largest pull counts, of level ones a hundredth.
fn reversals(of_node: &[(&State, Pull)], largest: f64) -> String {
    let turns = ["Hx", "Hy", "V"].into_iter().enumerate().filter(|(axis, _)| {
        let parts = of_node.iter().map(|(_, pull)| pull.parts[*axis]);
        let (low, high) = parts.fold((0.0_f64, 0.0_f64), |(low, high), part| (low.min(part), high.max(part)));
        high.min(-low) > if *axis == 2 { 1e-3 } else { 1e-2 } * largest
    });
    let turns: Vec<&str> = turns.map(|(_, name)| name).collect();
    if turns.is_empty() {
        "no".to_owned()
    } else {
        turns.join(", ")
    }
}

/// Where a pull goes, in words: "up, +x -y".
fn words(pull: Pull) -> String {
    let level = pull.size() * 0.02;
    let mut words = Vec::new();
    let mut plan = Vec::new();
    for (part, axis) in pull.parts.iter().zip(["x", "y"]) {
        if part.abs() > level {
            plan.push(format!("{}{axis}", if *part > 0.0 { '+' } else { '-' }));
        }
    }
    if pull.parts[2].abs() > level {
        words.push(if pull.parts[2] > 0.0 {
            "up".to_owned()
        } else {
            "down".to_owned()
        });
    }
    if !plan.is_empty() {
        words.push(plan.join(" "));
    }
    words.join(", ")
}
