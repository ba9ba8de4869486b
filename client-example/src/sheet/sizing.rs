//! Sections that were chosen, and what was tried on the way.

use ropewalk_api::ropewalk::v1;

use super::{Cell, Mark, Row, Sheet, head, page_head};

/// What each choice came to, in the order of the brief.
pub(crate) fn sized(sizing: &v1::SizingResult) -> Sheet {
    let rows = sizing.choices.iter().map(|choice| {
        let judged = !choice.check.is_empty();
        Row {
            cells: vec![
                Cell::text(&choice.path),
                Cell::text(choice.members.join(", ")),
                Cell::text(&choice.section),
                Cell::three(choice.mass_kg),
                Cell::text(&choice.worst),
                if judged {
                    Cell::percent(choice.ratio)
                } else {
                    Cell::Empty
                },
                Cell::text(&choice.governing_case),
                Cell::text(&choice.check),
            ],
            mark: if judged && choice.ratio > 1.0 {
                Mark::Bad
            } else {
                Mark::Plain
            },
            group: String::new(),
        }
    });
    Sheet {
        file: "sizing".into(),
        title: "Chosen sections".into(),
        heads: vec![
            head("choice", ""),
            page_head("members", ""),
            head("section", ""),
            head("mass", "kg"),
            head("worst", ""),
            head("used", "%"),
            head("governing case", ""),
            head("check", ""),
        ],
        rows: rows.collect(),
        note: "The least mass with which every check holds, by runs of the whole brief. Used: of the strength and buckling \
               checks. All results are those of the chosen sections.",
    }
}

/// Every choice that was tried, in order.
pub(crate) fn sizing_rounds(sizing: &v1::SizingResult) -> Sheet {
    let rows = sizing.rounds.iter().map(|round| {
        let why = match round.step() {
            v1::SizingStep::First => "first of each list",
            v1::SizingStep::Up => "larger where exceeded",
            v1::SizingStep::Trial => "which helps most",
            v1::SizingStep::Down => "smaller",
            v1::SizingStep::Lighter => "lighter ones left",
            v1::SizingStep::Unspecified => "",
        };
        let sections: Vec<String> = round.sections.iter().map(u32::to_string).collect();
        Row {
            cells: vec![
                Cell::text(why),
                Cell::text(sections.join(" ")),
                Cell::three(round.mass_kg),
                Cell::maybe(round.worst_ratio.map(Cell::percent)),
                Cell::text(if round.passes { "yes" } else { "no" }),
            ],
            mark: Mark::Plain,
            group: String::new(),
        }
    });
    Sheet {
        file: "sizing-rounds".into(),
        title: "Sections that were tried".into(),
        heads: vec![
            head("why", ""),
            head("positions in the lists", ""),
            head("mass", "kg"),
            head("worst ratio", "%"),
            head("every check holds", ""),
        ],
        rows: rows.collect(),
        note: "Positions count from 0, in the order of the choices.",
    }
}

/// What came of sizing, in sentences.
pub(crate) fn sizing_words(sizing: &v1::SizingResult) -> String {
    let runs = match sizing.runs {
        1 => "1 run".to_owned(),
        runs => format!("{runs} runs"),
    };
    match (sizing.passes, sizing.proven) {
        (true, true) => {
            format!("Sizing: the lightest choice with which every check holds, after {runs}; no lighter one does.")
        }
        (true, false) => {
            format!(
                "Sizing: every check holds, after {runs}; not every lighter choice was tried, so it may not be the lightest."
            )
        }
        (false, proven) => {
            let needs: Vec<&str> = sizing.needs.iter().take(5).map(|need| need.message.as_str()).collect();
            let all = if proven {
                "no choice from the lists"
            } else {
                "no choice that was tried"
            };
            format!(
                "Sizing: {all} makes every check hold, after {runs}. {}.",
                needs.join("; ")
            )
        }
    }
}
