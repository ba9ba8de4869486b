//! A brief made ready to be run, and its two kinds of run.

use std::collections::BTreeSet;
use std::ops::ControlFlow;
use std::sync::Arc;

use super::cause::{Stop, cause_of_error, cause_of_pond, cause_of_stop};
use super::diagnosis::diagnose;
use super::modes::modes_about;
use super::state::{Bare, state_result};
use super::{Brief, CaseOutcome, Estimate, LoadPicture, PondingEnd, ReferenceOutcome, Task, ponding};
use crate::check::{Base, CaseDigest, CheckKind, worst_ratio};
use crate::equilibrium::certificate::{self, Certificate, certificate};
use crate::equilibrium::{self, Analysis, IterationReport, Settings, Termination, Way};
use crate::load::{Case, Surface};
use crate::shape::{self, Found, ShapeError};

/// A brief with what is worked out once for its net: numbering, pattern, symbolic factorisation.
///
/// It does not change while it is run: cases may be solved side by side, in any order, with the same results.
#[derive(Debug)]
pub struct Plan {
    brief: Arc<Brief>,
    analysis: Analysis,
}

impl Plan {
    /// Prepares the work: numbering, pattern and symbolic factorisation, once for the net.
    #[must_use]
    pub fn new(brief: Brief) -> Self {
        Self {
            analysis: Analysis::new(Arc::clone(&brief.net)),
            brief: Arc::new(brief),
        }
    }

    pub(super) fn shared_brief(&self) -> Arc<Brief> {
        Arc::clone(&self.brief)
    }

    pub(super) fn analysis(&self) -> &Analysis {
        &self.analysis
    }

    /// The work as given.
    #[must_use]
    pub fn brief(&self) -> &Brief {
        &self.brief
    }

    /// The parts of the work: the reference state first, since every case starts from it, then the cases in order, then the
    /// motions.
    pub fn tasks(&self) -> impl Iterator<Item = Task> + use<> {
        let cases = (0..self.brief.cases.len()).map(Task::Case);
        let motions = (0..self.brief.motions.len()).map(Task::Motion);
        std::iter::once(Task::Reference).chain(cases).chain(motions)
    }

    /// What the work will cost, roughly.
    #[must_use]
    pub fn estimate(&self) -> Estimate {
        Estimate::new(&self.brief, &self.analysis)
    }

    /// Finds the reference state.
    ///
    /// # Errors
    /// [`ShapeError`] if there is none.
    pub fn reference(
        &self,
        observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
    ) -> Result<ReferenceOutcome, ShapeError> {
        self.reference_with_history(&mut Vec::new(), observe)
    }

    /// Finds the reference state and notes every iteration in `history`, also where there is none.
    ///
    /// # Errors
    /// [`ShapeError`] if there is none.
    pub fn reference_with_history(
        &self,
        history: &mut Vec<IterationReport>,
        observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
    ) -> Result<ReferenceOutcome, ShapeError> {
        let brief = &self.brief;
        let Found { state, case, report } = shape::find(
            &self.analysis,
            &brief.prestress,
            &brief.actions,
            &brief.settings,
            &mut |report| {
                note(history, report);
                observe(report)
            },
        )?;
        let bare = Bare {
            positions: &state.positions,
            axial_forces: &state.axial_forces,
            members: &equilibrium::member_states(self.analysis.structure(), &case, &state),
            loose_nodes: &[],
        };
        let mut result = state_result(&brief.net, &case, &state.positions, &bare);
        result.certificate = self.certificate(&case, &bare);
        if let Some(asked) = brief.diagnosis.as_ref().filter(|asked| asked.reference) {
            result.diagnosis = diagnose(&self.analysis, asked, &case, &result, None).map(Box::new);
        }
        if let Some(asked) = brief.modes.as_ref().filter(|asked| asked.reference) {
            let last = history.last();
            result.modes = Some(modes_about(
                &self.analysis,
                asked,
                &case,
                &result,
                &state,
                last,
                observe,
            ));
        }
        let mut outcome = ReferenceOutcome {
            state,
            case,
            result,
            report,
            history: history.clone(),
            bases: Vec::new(),
        };
        outcome.bases = self.bases(&outcome, observe);
        Ok(outcome)
    }

    /// States of the cases that checks measure movements from, each once, in the order of the cases: wanted before the
    /// first case is judged, whichever cases are run.
    fn bases(
        &self,
        reference: &ReferenceOutcome,
        observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
    ) -> Vec<Base> {
        let named = self.brief.checks.iter().filter_map(|check| match check.kind {
            CheckKind::Movement { from, .. } => from,
            _ => None,
        });
        let cases: BTreeSet<usize> = named.collect();
        let solve = |case| Base {
            case,
            digest: self.case(reference, case, observe).digest(),
        };
        cases.into_iter().map(solve).collect()
    }

    /// Solves one case from the reference state.
    pub fn case(
        &self,
        reference: &ReferenceOutcome,
        case: usize,
        observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
    ) -> CaseOutcome {
        self.answer(reference, case, true, observe).0
    }

    /// The same, and what the state carries, water on skins included.
    ///
    /// `look_into`: whether everything is worked out that the brief wants to know of the state; where not, it only has its
    /// answer, with the same bits.
    pub(super) fn answer(
        &self,
        reference: &ReferenceOutcome,
        case: usize,
        look_into: bool,
        observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
    ) -> (CaseOutcome, Case) {
        let Brief {
            net,
            actions,
            cases,
            settings,
            diagnosis,
            modes,
            ..
        } = &*self.brief;
        let given = &cases[case];
        let index = case;
        let diagnosis = diagnosis.as_ref().filter(|_| look_into);
        let asked = diagnosis.filter(|asked| asked.cases.contains(&case));
        let settings = &Settings {
            load_steps: given.load_steps.unwrap_or(settings.load_steps),
            ..*settings
        };
        let case = given.case(net, &reference.state, actions);
        let solved = match given.ponding {
            Some(ponding) => ponding::solve(&self.analysis, &case, ponding, &reference.state, settings, observe)
                .map(|ponded| (ponded.solution, Some(ponded.case), Some(ponded.ponding))),
            None => equilibrium::solve(
                &self.analysis,
                &case,
                &reference.state.positions,
                &reference.state.unstressed_lengths,
                settings,
                observe,
            )
            .map(|solution| (solution, None, None)),
        };
        match solved {
            Ok((solution, ponded, ponding)) => {
                let case = ponded.unwrap_or(case);
                let bare = Bare {
                    positions: &solution.positions,
                    axial_forces: &solution.axial_forces,
                    members: &solution.members,
                    loose_nodes: &solution.loose_nodes,
                };
                // The last good state carries a share of the load; it is told under the loads that it carries.
                let carried = case.scaled(&reference.state.unstressed_lengths, solution.load_factor);
                let mut result = state_result(net, &carried, &reference.state.positions, &bare);
                result.ponding = ponding;
                let of_pond = result.ponding.as_ref().and_then(|ponding| cause_of_pond(net, ponding));
                let grows = result.ponding.as_ref().is_some_and(|p| p.end == PondingEnd::Growing);
                if look_into && solution.termination == Termination::Converged && !grows {
                    result.certificate = self.certificate(&carried, &bare);
                }
                let cause = match solution.termination {
                    Termination::Cancelled => None,
                    Termination::Converged => of_pond,
                    // A pond that grew until nothing converged any more is the cause, not the last of its rounds.
                    _ if grows => of_pond,
                    _ => Some(cause_of_stop(
                        net,
                        &Stop {
                            reference: &reference.state,
                            case: &case,
                            solution: &solution,
                            result: &result,
                            limit: settings.max_iterations,
                        },
                    )),
                };
                if let Some(asked) = asked.filter(|_| solution.termination == Termination::Converged) {
                    let before = reference.result.diagnosis.as_ref();
                    let before = before
                        .and_then(|of| of.stiffnesses.first())
                        .map(|least| least.stiffness);
                    result.diagnosis = diagnose(&self.analysis, asked, &case, &result, before).map(Box::new);
                }
                let modes = modes.as_ref().filter(|_| look_into);
                let asked = modes.filter(|asked| asked.cases.binary_search(&index).is_ok());
                if let Some(asked) = asked.filter(|_| solution.termination == Termination::Converged && !grows) {
                    let last = solution.history.last();
                    let modes = modes_about(&self.analysis, asked, &case, &result, &reference.state, last, observe);
                    result.modes = Some(modes);
                }
                let outcome = CaseOutcome::State {
                    solution,
                    result: Box::new(result),
                    cause,
                };
                (outcome, carried)
            }
            Err(error) => {
                let cause = cause_of_error(net, &case, &reference.state.positions, &error);
                (CaseOutcome::None { error, cause }, case)
            }
        }
    }

    /// How far a state of `case` can be from the true one.
    fn certificate(&self, case: &Case, state: &Bare<'_>) -> Option<Certificate> {
        let found = certificate::State {
            positions: state.positions,
            axial_forces: state.axial_forces,
            members: state.members,
        };
        certificate(&self.analysis, case, &found).expect("a case that was solved fits the net")
    }

    /// The panels in the reference state.
    #[must_use]
    pub fn surface(&self, reference: &ReferenceOutcome) -> Surface {
        Surface::new(&self.brief.net, &reference.state.positions)
    }

    /// What each action does in the reference state, with the factor 1, in order.
    #[must_use]
    pub fn load_pictures(&self, reference: &ReferenceOutcome) -> Vec<LoadPicture> {
        let surface = self.surface(reference);
        let actions = 0..self.brief.actions.len();
        actions
            .map(|action| LoadPicture::new(&self.brief, reference, &surface, action))
            .collect()
    }

    /// Worst ratio, in one case or (counted on from the last case) design effect, of the checks that cover it (–); `None`
    /// where none of them judges anything.
    #[must_use]
    pub fn worst_ratio(&self, reference: &ReferenceOutcome, case: usize, digest: &CaseDigest) -> Option<f64> {
        let against = reference.against(&self.brief.net);
        let checks = self.brief.checks.iter().filter(|check| check.cases.contains(&case));
        checks
            .filter_map(|check| worst_ratio(&against, check, case, digest))
            .reduce(f64::max)
    }
}

/// Adds a report to a history, which keeps of a relaxation its beginning and its end only.
fn note(history: &mut Vec<IterationReport>, report: &IterationReport) {
    let relaxes = |report: &&IterationReport| report.way == Way::Relaxation;
    if relaxes(&report) && history.len() > 1 && history.iter().rev().take(2).all(|r| relaxes(&r)) {
        history.pop();
    }
    history.push(*report);
}
