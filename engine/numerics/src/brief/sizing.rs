//! Sections chosen from lists: the least mass with which every check passes in every case.

use std::collections::BTreeMap;
use std::ops::ControlFlow;
use std::sync::Arc;

use super::{Brief, Plan, Summary, Tally, Task};
use crate::check::{CheckKind, Covered, Judgement, Lack};
use crate::equilibrium::IterationReport;
use crate::model::{NetError, Section, SegmentId};

/// Lists of lighter choices that are gone through for the proof are not longer than this before they are sorted.
const MOST_LIGHTER: usize = 200_000;

/// Checks that do not hold and are kept of each choice.
const MOST_NEEDS: usize = 100;

/// Members that get one section together, and the sections to choose from.
#[derive(Clone, Debug, PartialEq)]
pub struct SizingUnit {
    /// Their segments.
    pub segments: Vec<SegmentId>,
    /// The sections to choose from, in the client's order, smallest first; each as one entry a segment, since end
    /// fittings differ.
    pub candidates: Vec<Vec<Section>>,
}

/// A choice of sections as it is given.
#[derive(Clone, Debug, PartialEq)]
pub struct Sizing {
    /// What gets one section each; no segment belongs to two of them.
    pub units: Vec<SizingUnit>,
    /// Runs of the whole brief that are allowed.
    pub max_evaluations: usize,
}

/// Why a choice was tried.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum SizingStep {
    /// The first of each list.
    First,
    /// A larger section where a check is exceeded.
    Up,
    /// A larger section for a trial: which one helps most?
    Trial,
    /// A smaller section.
    Down,
    /// One of the lighter choices that are left, lightest first.
    Lighter,
}

/// A choice that was tried: the whole brief was run with it.
#[derive(Clone, Debug, PartialEq)]
pub struct SizingRound {
    /// Why.
    pub step: SizingStep,
    /// Position in its list, by unit.
    pub choice: Vec<usize>,
    /// Mass of the sized members (kg).
    pub mass: f64,
    /// Worst ratio of all checks (–); `None` where nothing could be judged.
    pub worst_ratio: Option<f64>,
    /// Whether every check holds.
    pub passes: bool,
}

/// A check that does not hold.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SizingNeed {
    /// The check, by index.
    pub check: usize,
    /// What was found.
    pub found: Result<Judgement, (Covered, Lack)>,
}

/// What came of it.
#[derive(Clone, Debug)]
pub struct SizingOutcome {
    /// Position in its list, by unit: the lightest choice that passes, or else the last one of the way up.
    pub choice: Vec<usize>,
    /// Whether every check holds with it.
    pub passes: bool,
    /// Whether every lighter choice was tried, or, where none passes, every choice.
    pub proven: bool,
    /// Mass of the sized members (kg), by unit.
    pub masses: Vec<f64>,
    /// The judgement that governs each unit, with its check; `None` where no check of members judges it.
    pub governing: Vec<Option<(usize, Judgement)>>,
    /// Every choice that was tried, in order.
    pub rounds: Vec<SizingRound>,
    /// Checks that do not hold with the choice, the largest ratio first.
    pub needs: Vec<SizingNeed>,
    /// The brief with the chosen sections.
    pub brief: Brief,
}

/// What is kept of a choice that was run.
#[derive(Clone, Debug)]
struct Trial {
    passes: bool,
    /// Sum of ratios above 1 (–).
    excess: f64,
    /// Units with a check of their members that does not hold.
    failing: Vec<usize>,
    governing: Vec<Option<(usize, Judgement)>>,
    needs: Vec<SizingNeed>,
}

/// Chooses sections.
///
/// The shape is searched again for each choice, with the same prestress: shape and wanted tensions stay, lengths and
/// stiffness change. From the first section of each list on, every unit with an exceeded check of its members gets its
/// next section, until all hold; where only checks of the net as a whole do not hold, the unit whose next section helps
/// most for its mass gets it. Then each unit is tried with smaller sections. At last all choices lighter than the best
/// are tried, lightest first, as far as the allowed runs reach: then the answer is proven to be the lightest.
///
/// `observe`: sees each iteration of each run, with the task of the brief at hand. `None` where it breaks off.
///
/// # Errors
/// Every [`NetError`] of a section that no net can have.
pub fn size(
    brief: &Brief,
    sizing: &Sizing,
    observe: &mut dyn FnMut(Task, &IterationReport) -> ControlFlow<()>,
) -> Result<Option<SizingOutcome>, Vec<NetError>> {
    let mut unit_of_segment = vec![None; brief.net.segments().len()];
    for (number, unit) in sizing.units.iter().enumerate() {
        unit.segments
            .iter()
            .for_each(|segment| unit_of_segment[segment.index()] = Some(number));
    }
    let mut search = Search {
        brief,
        sizing,
        unit_of_segment,
        masses: masses(brief, sizing, observe),
        tried: BTreeMap::new(),
        rounds: Vec::new(),
        observe,
    };
    match search.run() {
        Ok((choice, proven)) => search.outcome(choice, proven).map(Some),
        Err(Ended::BrokenOff) => Ok(None),
        Err(Ended::Net(errors)) => Err(errors),
    }
}

/// Why a search has no answer.
enum Ended {
    BrokenOff,
    Net(Vec<NetError>),
}

struct Search<'a, 'o> {
    brief: &'a Brief,
    sizing: &'a Sizing,
    unit_of_segment: Vec<Option<usize>>,
    /// Mass of each candidate of each unit (kg).
    masses: Vec<Vec<f64>>,
    tried: BTreeMap<Vec<usize>, Trial>,
    rounds: Vec<SizingRound>,
    observe: &'o mut dyn FnMut(Task, &IterationReport) -> ControlFlow<()>,
}

/// Mass of each candidate of each unit (kg): mass per length times the length in the reference state of the brief as it
/// is given, or, where it has none, of the shortest that the net can have, its chords.
fn masses(
    brief: &Brief,
    sizing: &Sizing,
    observe: &mut dyn FnMut(Task, &IterationReport) -> ControlFlow<()>,
) -> Vec<Vec<f64>> {
    let plan = Plan::new(brief.clone());
    let reference = plan.reference(&mut |report| observe(Task::Reference, report)).ok();
    let length = |segment: &SegmentId| match &reference {
        Some(reference) => reference.result.lengths[segment.index()],
        None => {
            let [from, to] = brief.net.segments()[segment.index()]
                .ends
                .map(|end| brief.net.nodes()[end.index()].position);
            from.zip(to).map_or(1.0, |(from, to)| (to - from).norm())
        }
    };
    let of_unit = |unit: &SizingUnit| {
        let lengths: Vec<f64> = unit.segments.iter().map(length).collect();
        let mass = |sections: &Vec<Section>| sections.iter().zip(&lengths).map(|(s, l)| s.mass_per_length * l).sum();
        unit.candidates.iter().map(mass).collect()
    };
    sizing.units.iter().map(of_unit).collect()
}

impl Search<'_, '_> {
    /// The choice, and whether it is proven.
    fn run(&mut self) -> Result<(Vec<usize>, bool), Ended> {
        let first = vec![0; self.sizing.units.len()];
        let (last, found) = self.go_up(first)?;
        let best = if found { Some(self.go_down(last.clone())?) } else { None };
        self.go_through_lighter(best, last)
    }

    /// Whether another run is allowed.
    fn has_runs(&self) -> bool {
        self.rounds.len() < self.sizing.max_evaluations
    }

    fn largest(&self, unit: usize) -> usize {
        self.sizing.units[unit].candidates.len() - 1
    }

    fn mass(&self, choice: &[usize]) -> f64 {
        choice
            .iter()
            .zip(&self.masses)
            .map(|(position, masses)| masses[*position])
            .sum()
    }

    /// From a choice on to larger sections: the last choice, and whether it passes.
    fn go_up(&mut self, mut choice: Vec<usize>) -> Result<(Vec<usize>, bool), Ended> {
        let mut step = SizingStep::First;
        loop {
            let Some(trial) = self.trial(&choice, step)? else {
                return Ok((choice, false));
            };
            if trial.passes {
                return Ok((choice, true));
            }
            let room = |unit: &usize| choice[*unit] < self.largest(*unit);
            let next: Vec<usize> = trial.failing.iter().copied().filter(room).collect();
            if !next.is_empty() {
                next.iter().for_each(|unit| choice[*unit] += 1);
            } else if let Some(unit) = self.most_helpful(&choice, trial.excess)? {
                choice[unit] += 1;
            } else {
                return Ok((choice, false));
            }
            step = SizingStep::Up;
        }
    }

    /// The unit whose next section lowers the excess most for its mass; of equals the first.
    fn most_helpful(&mut self, choice: &[usize], excess: f64) -> Result<Option<usize>, Ended> {
        let mut best: Option<(f64, usize)> = None;
        for unit in 0..choice.len() {
            if choice[unit] == self.largest(unit) {
                continue;
            }
            let mut larger = choice.to_vec();
            larger[unit] += 1;
            let Some(trial) = self.trial(&larger, SizingStep::Trial)? else {
                break;
            };
            let gained = excess - trial.excess;
            let added = (self.mass(&larger) - self.mass(choice)).max(f64::MIN_POSITIVE);
            let worth = gained / added;
            if gained > 0.0 && best.is_none_or(|(most, _)| worth > most) {
                best = Some((worth, unit));
            }
        }
        Ok(best.map(|(_, unit)| unit))
    }

    /// From a choice that passes on to smaller sections, those that save most first.
    fn go_down(&mut self, mut choice: Vec<usize>) -> Result<Vec<usize>, Ended> {
        loop {
            let mut savings: Vec<(f64, usize)> = (0..choice.len())
                .filter(|unit| choice[*unit] > 0)
                .map(|unit| {
                    (
                        self.masses[unit][choice[unit]] - self.masses[unit][choice[unit] - 1],
                        unit,
                    )
                })
                .filter(|(saved, _)| *saved > 0.0)
                .collect();
            savings.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
            let before = choice.clone();
            for (_, unit) in savings {
                let mut smaller = choice.clone();
                smaller[unit] -= 1;
                if self
                    .trial(&smaller, SizingStep::Down)?
                    .is_some_and(|trial| trial.passes)
                {
                    choice = smaller;
                }
            }
            if choice == before {
                return Ok(choice);
            }
        }
    }

    /// Tries every choice lighter than the best, lightest first: the first that passes is the lightest of all.
    fn go_through_lighter(&mut self, best: Option<Vec<usize>>, last: Vec<usize>) -> Result<(Vec<usize>, bool), Ended> {
        let limit = best.as_ref().map_or(f64::INFINITY, |best| self.mass(best));
        let found = best.unwrap_or(last);
        let Some(lighter) = self.lighter(limit) else {
            return Ok((found, false));
        };
        let left = self.sizing.max_evaluations - self.rounds.len();
        if lighter
            .iter()
            .filter(|choice| !self.tried.contains_key(*choice))
            .count()
            > left
        {
            return Ok((found, false));
        }
        for choice in lighter {
            if self
                .trial(&choice, SizingStep::Lighter)?
                .is_some_and(|trial| trial.passes)
            {
                return Ok((choice, true));
            }
        }
        Ok((found, true))
    }

    /// Every choice lighter than `limit` (kg), lightest first; `None` where they are very many.
    fn lighter(&self, limit: f64) -> Option<Vec<Vec<usize>>> {
        let all = self.sizing.units.iter().try_fold(1_usize, |count, unit| {
            let count = count.checked_mul(unit.candidates.len())?;
            (count <= MOST_LIGHTER).then_some(count)
        })?;
        let mut lighter: Vec<(f64, Vec<usize>)> = Vec::new();
        for number in 0..all {
            let mut rest = number;
            let mut choice: Vec<usize> = Vec::with_capacity(self.sizing.units.len());
            for unit in &self.sizing.units {
                choice.push(rest % unit.candidates.len());
                rest /= unit.candidates.len();
            }
            let mass = self.mass(&choice);
            if mass < limit {
                lighter.push((mass, choice));
            }
        }
        lighter.sort_by(|a, b| a.0.total_cmp(&b.0).then_with(|| a.1.cmp(&b.1)));
        Some(lighter.into_iter().map(|(_, choice)| choice).collect())
    }

    /// Runs the brief with a choice, or recalls it; `None` where no run is left.
    fn trial(&mut self, choice: &[usize], step: SizingStep) -> Result<Option<Trial>, Ended> {
        if let Some(known) = self.tried.get(choice) {
            return Ok(Some(known.clone()));
        }
        if !self.has_runs() {
            return Ok(None);
        }
        let brief = self.with(choice).map_err(Ended::Net)?;
        let (trial, worst_ratio) = match run(brief, self.observe)? {
            Some(summary) => {
                let ratios = summary
                    .checks
                    .iter()
                    .flat_map(|check| &check.judgements)
                    .map(|j| j.ratio);
                (self.judge(&summary), ratios.reduce(f64::max))
            }
            // Without a reference state nothing is judged; a larger section of any member may mend that, or none.
            None => (
                Trial {
                    passes: false,
                    excess: f64::INFINITY,
                    failing: Vec::new(),
                    governing: vec![None; choice.len()],
                    needs: Vec::new(),
                },
                None,
            ),
        };
        self.rounds.push(SizingRound {
            step,
            choice: choice.to_vec(),
            mass: self.mass(choice),
            worst_ratio,
            passes: trial.passes,
        });
        self.tried.insert(choice.to_vec(), trial.clone());
        Ok(Some(trial))
    }

    /// The brief with a choice of sections.
    fn with(&self, choice: &[usize]) -> Result<Brief, Vec<NetError>> {
        let mut sections: Vec<Section> = self.brief.net.segments().iter().map(|s| s.section).collect();
        for (unit, position) in self.sizing.units.iter().zip(choice) {
            for (segment, section) in unit.segments.iter().zip(&unit.candidates[*position]) {
                sections[segment.index()] = *section;
            }
        }
        Ok(Brief {
            net: Arc::new(self.brief.net.with_sections(&sections)?),
            ..self.brief.clone()
        })
    }

    /// What a summary says of the units.
    fn judge(&self, summary: &Summary) -> Trial {
        let mut trial = Trial {
            passes: true,
            excess: 0.0,
            failing: Vec::new(),
            governing: vec![None; self.sizing.units.len()],
            needs: Vec::new(),
        };
        for (number, check) in summary.checks.iter().enumerate() {
            let of_members = is_of_members(&check.kind);
            for judgement in &check.judgements {
                let unit = self.unit_of(judgement.of).filter(|_| of_members);
                if let Some(unit) = unit {
                    let governing = &mut trial.governing[unit];
                    if governing.is_none_or(|(_, known)| judgement.ratio > known.ratio) {
                        *governing = Some((number, *judgement));
                    }
                }
                if !judgement.passes {
                    trial.passes = false;
                    trial.excess += (judgement.ratio - 1.0).max(f64::EPSILON);
                    trial.failing.extend(unit);
                    trial.needs.push(SizingNeed {
                        check: number,
                        found: Ok(*judgement),
                    });
                }
            }
            for (part, lack) in &check.not_judged {
                if let (Some(unit), true) = (self.unit_of(*part), lack.is_of_section()) {
                    trial.passes = false;
                    trial.excess += 1.0;
                    trial.failing.push(unit);
                    trial.needs.push(SizingNeed {
                        check: number,
                        found: Err((*part, *lack)),
                    });
                }
            }
        }
        trial.failing.sort_unstable();
        trial.failing.dedup();
        let ratio = |need: &SizingNeed| need.found.map_or(f64::INFINITY, |judgement| judgement.ratio);
        trial.needs.sort_by(|a, b| ratio(b).total_cmp(&ratio(a)));
        trial.needs.truncate(MOST_NEEDS);
        if summary.verdict == crate::check::Verdict::NoAnswer {
            trial.passes = false;
            let facts = &summary.facts;
            let open = facts.answered.of - facts.audited.count.min(facts.answered.of);
            trial.excess += 1e3 * (1 + open) as f64;
        }
        trial
    }

    /// The unit of a member; of a cable that of its first segment, since a member is sized as a whole.
    fn unit_of(&self, part: Covered) -> Option<usize> {
        let net = &self.brief.net;
        let segment = match part {
            Covered::Cable(cable) => net.cables()[cable.index()].segments.start,
            Covered::Strut(strut) => net.struts()[strut.index()].segment.index(),
            Covered::Node(_) | Covered::Panel(_) | Covered::Point => return None,
        };
        self.unit_of_segment[segment]
    }

    fn outcome(self, choice: Vec<usize>, proven: bool) -> Result<SizingOutcome, Vec<NetError>> {
        let brief = self.with(&choice)?;
        let masses = choice
            .iter()
            .zip(&self.masses)
            .map(|(position, masses)| masses[*position])
            .collect();
        let trial = self.tried.get(&choice).cloned();
        let (passes, governing, needs) = match trial {
            Some(trial) => (trial.passes, trial.governing, trial.needs),
            None => (false, vec![None; choice.len()], Vec::new()),
        };
        Ok(SizingOutcome {
            choice,
            passes,
            proven,
            masses,
            governing,
            rounds: self.rounds,
            needs,
            brief,
        })
    }
}

/// Whether a larger section of the member itself is what makes a check hold.
fn is_of_members(kind: &CheckKind) -> bool {
    matches!(
        kind,
        CheckKind::Safety { .. }
            | CheckKind::Resistance { .. }
            | CheckKind::ShareOfStrength { .. }
            | CheckKind::Buckling { .. }
    )
}

/// The summary of a run of every case; `None` where there is no reference state.
fn run(
    brief: Brief,
    observe: &mut dyn FnMut(Task, &IterationReport) -> ControlFlow<()>,
) -> Result<Option<Summary>, Ended> {
    // Only verdicts are wanted of a round.
    let plan = Plan::new(Brief {
        diagnosis: None,
        modes: None,
        motions: Vec::new(),
        ..brief
    });
    let mut goes_on = true;
    let mut see = |task: Task, report: &IterationReport| {
        let flow = observe(task, report);
        goes_on &= flow.is_continue();
        flow
    };
    let cases: Vec<usize> = (0..plan.brief().cases.len()).collect();
    let summary = match plan.reference(&mut |report| see(Task::Reference, report)) {
        Err(_) => None,
        Ok(reference) => {
            let mut tally = Tally::new(&plan, &reference, &cases);
            for case in cases {
                tally.add(
                    case,
                    &plan
                        .case(&reference, case, &mut |report| see(Task::Case(case), report))
                        .digest(),
                );
            }
            Some(tally.finish())
        }
    };
    if goes_on { Ok(summary) } else { Err(Ended::BrokenOff) }
}
