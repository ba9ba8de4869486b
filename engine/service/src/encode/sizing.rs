//! Sections chosen from lists.

use std::ops::ControlFlow;

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{Brief, SizingNeed, SizingOutcome, SizingRound, SizingStep, Task, size};
use ropewalk_numerics::equilibrium::IterationReport;
use v1::run_response::Event;

use super::parts::{count, event, first_ids, fitting};
use super::rules;
use super::verdicts::{case_name, judged_name, name};
use crate::decode::{SizingWork, Work};
use crate::words::{Quoted, force, length, rounded};

/// Members of a choice that are listed.
const MEMBERS: usize = 100;

/// Chooses the sections that a brief asks for: the work with them, and how they were found. `None` where the brief asks
/// for none, or `observe` breaks off.
///
/// # Panics
/// If a candidate is no section: the border has checked each.
#[must_use]
pub fn sizing(
    work: &Work,
    observe: &mut dyn FnMut(Task, &IterationReport) -> ControlFlow<()>,
) -> Option<(Work, v1::RunResponse)> {
    let sizing = work.sizing()?;
    let outcome = size(&work.brief, &sizing.given, observe).expect("checked candidates")?;
    let choices = (0..sizing.choices.len()).map(|unit| choice(sizing, &outcome, unit));
    let told = event(Event::Sizing(v1::SizingResult {
        passes: outcome.passes,
        proven: outcome.proven,
        mass_kg: outcome.masses.iter().sum(),
        runs: count(outcome.rounds.len()),
        choices: fitting(choices),
        choices_total: count(sizing.choices.len()),
        rounds: fitting(outcome.rounds.iter().map(round)),
        needs: fitting(outcome.needs.iter().map(|found| need(&outcome.brief, found))),
    }));
    Some((work.sized(&outcome), told))
}

fn choice(sizing: &SizingWork, outcome: &SizingOutcome, unit: usize) -> v1::SizedChoice {
    let (names, brief) = (&sizing.choices[unit], &outcome.brief);
    let (section, _) = &names.sections[outcome.choice[unit]];
    let mut message = v1::SizedChoice {
        path: names.path.clone(),
        members: first_ids(names.members.iter().map(String::as_str), MEMBERS),
        section: section.clone(),
        mass_kg: outcome.masses[unit],
        ..v1::SizedChoice::default()
    };
    if let Some((check, judgement)) = &outcome.governing[unit] {
        message.check = format!("checks[{check}]");
        message.worst = judged_name(brief, judgement).to_owned();
        message.ratio = judgement.ratio;
        message.governing_case = case_name(brief, judgement.case).to_owned();
    }
    message
}

fn round(round: &SizingRound) -> v1::SizingRound {
    let step = match round.step {
        SizingStep::First => v1::SizingStep::First,
        SizingStep::Up => v1::SizingStep::Up,
        SizingStep::Trial => v1::SizingStep::Trial,
        SizingStep::Down => v1::SizingStep::Down,
        SizingStep::Lighter => v1::SizingStep::Lighter,
    };
    v1::SizingRound {
        step: step.into(),
        sections: round.choice.iter().map(|position| count(*position)).collect(),
        mass_kg: round.mass,
        worst_ratio: round.worst_ratio,
        passes: round.passes,
    }
}

fn need(brief: &Brief, need: &SizingNeed) -> v1::SizingNeed {
    let check = format!("checks[{}]", need.check);
    match &need.found {
        Ok(judgement) => {
            let (words, unit, scale) = rules::measure(judgement.measure);
            let written = |value: f64| match unit {
                "N" => force(value),
                "m" => length(value),
                _ => format!("{} {unit}", rounded(value * scale, 3)).trim_end().to_owned(),
            };
            let id = judged_name(brief, judgement);
            v1::SizingNeed {
                check,
                id: id.to_owned(),
                message: format!(
                    "{}: {words} {} where {} is the limit",
                    Quoted(id),
                    written(judgement.demand),
                    written(judgement.limit)
                ),
                ratio: judgement.ratio,
                governing_case: case_name(brief, judgement.case).to_owned(),
            }
        }
        Err((part, lack)) => {
            let id = name(brief, *part);
            v1::SizingNeed {
                check,
                id: id.to_owned(),
                message: format!("{} could not be judged: {}", Quoted(id), rules::lack(*lack)),
                ..v1::SizingNeed::default()
            }
        }
    }
}
