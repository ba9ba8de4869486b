//! A run summed up while it goes on: what a case leaves is folded in, and the case forgotten.

use std::collections::BTreeMap;
use std::sync::Arc;

use nalgebra::Vector3;

use super::effect::FactorRules;
use super::loss::LossTally;
use super::summary::cautions;
use super::{Brief, Caution, Plan, ReferenceOutcome, Summary};
use crate::check::{
    Against, AnchorTally, Base, CaseDigest, CheckTally, EnvelopeTally, Facts, MovementTally, Share, Verdict,
};

/// What is known of a case of the brief.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Standing {
    NotOfTheRun,
    Awaited,
    Unsound,
    Sound,
}

/// A design effect on its way: what is known of the cases that it needs.
#[derive(Clone, Debug)]
struct Pending {
    standing: Standing,
    /// Cases of it that are not in yet.
    missing: usize,
}

/// A digest that design effects still wait for.
#[derive(Clone, Debug)]
struct Held {
    digest: Arc<CaseDigest>,
    /// Effects that will read it.
    readers: usize,
}

/// A design effect for which every case is in.
#[derive(Clone, Debug)]
pub struct Effect {
    /// Which one, by its index in the brief.
    pub effect: usize,
    /// Its numbers, in the form of a case's; `None` where one of its cases has no sound answer.
    pub digest: Option<CaseDigest>,
    /// The case that it stands beside, if there is one with a sound answer.
    pub beside: Option<Arc<CaseDigest>>,
}

/// The summary of a run in the making.
///
/// It grows with members times checks and with segments; of a case it keeps one byte, and its digest as long as design
/// effects wait for it. In which order cases are added does not change a bit of the summary.
#[derive(Clone, Debug)]
pub struct Tally {
    brief: Arc<Brief>,
    reference_forces: Vec<f64>,
    reference_positions: Vec<Vector3<f64>>,
    bases: Vec<Base>,
    reference_audited: bool,
    cautions: Vec<Caution>,
    /// One entry a case of the brief.
    cases: Vec<Standing>,
    /// One entry a design effect of the brief.
    effects: Vec<Pending>,
    /// Effects that read each case.
    readers: Vec<Vec<usize>>,
    held: BTreeMap<usize, Held>,
    answered: usize,
    checks: Vec<CheckTally>,
    envelopes: EnvelopeTally,
    set_envelopes: Vec<EnvelopeTally>,
    losses: LossTally,
    factor_rules: Option<FactorRules>,
    movements: MovementTally,
    anchors: AnchorTally,
    /// One entry a motion of the brief.
    motions: Vec<Motion>,
}

/// What is known of a motion of the brief.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Motion {
    NotOfTheRun,
    Awaited,
    Finished,
}

impl Tally {
    /// A run before its first case.
    ///
    /// `cases`: those to be run, by index; each that is never added counts as not answered. Design effects are of the run
    /// where all of their cases are.
    #[must_use]
    pub fn new(plan: &Plan, reference: &ReferenceOutcome, cases: &[usize]) -> Self {
        let brief = plan.shared_brief();
        let mut standings = vec![Standing::NotOfTheRun; brief.cases.len()];
        cases.iter().for_each(|case| standings[*case] = Standing::Awaited);
        let mut readers = vec![Vec::new(); brief.cases.len()];
        let mut effects = Vec::with_capacity(brief.effects.len());
        for (index, effect) in brief.effects.iter().enumerate() {
            let runs = effect.cases().all(|case| standings[case] == Standing::Awaited);
            if runs {
                effect.cases().for_each(|case| readers[case].push(index));
            }
            effects.push(Pending {
                standing: if runs { Standing::Awaited } else { Standing::NotOfTheRun },
                missing: effect.cases().count(),
            });
        }
        let against = reference.against(&brief.net);
        let supports = reference.result.support_forces.iter();
        Self {
            reference_forces: reference.state.axial_forces.clone(),
            reference_positions: reference.state.positions.clone(),
            bases: reference.bases.clone(),
            reference_audited: reference.result.audit.passed,
            cautions: cautions(&brief.net, reference),
            cases: standings,
            effects,
            readers,
            held: BTreeMap::new(),
            answered: 0,
            checks: brief
                .checks
                .iter()
                .map(|check| CheckTally::new(check, &against))
                .collect(),
            envelopes: EnvelopeTally::new(&reference.state.axial_forces),
            set_envelopes: vec![EnvelopeTally::new(&reference.state.axial_forces); brief.envelopes.len()],
            losses: LossTally::new(&brief),
            factor_rules: None,
            movements: MovementTally::new(brief.net.nodes().len()),
            anchors: AnchorTally::new(supports.map(|support| (support.node, support.force))),
            motions: vec![Motion::NotOfTheRun; brief.motions.len()],
            brief,
        }
    }

    /// The same with motions to be run, by index; each that is never added counts as not finished.
    #[must_use]
    pub fn with_motions(mut self, motions: &[usize]) -> Self {
        for motion in motions {
            self.motions[*motion] = Motion::Awaited;
        }
        if !motions.is_empty() && !self.cautions.contains(&Caution::MotionsNotJudged) {
            self.cautions.push(Caution::MotionsNotJudged);
        }
        self
    }

    /// Takes in a motion of the run. Motions of no run are not looked at.
    ///
    /// `finished`: whether it was followed to its end.
    pub fn add_motion(&mut self, motion: usize, finished: bool) {
        if finished && self.motions[motion] == Motion::Awaited {
            self.motions[motion] = Motion::Finished;
        }
    }

    /// Takes in a case of the run, and answers the design effects that are complete with it. Cases of no run and cases
    /// that are in already are not looked at.
    pub fn add(&mut self, case: usize, digest: &CaseDigest) -> Vec<Effect> {
        if self.cases[case] != Standing::Awaited {
            return Vec::new();
        }
        self.answered += usize::from(digest.answered);
        self.losses.add_case(&self.brief, case, digest);
        if digest.is_sound() {
            self.cases[case] = Standing::Sound;
            self.judge(case, digest);
            self.envelopes.add(case, digest);
            for (given, tally) in self.brief.envelopes.iter().zip(&mut self.set_envelopes) {
                if given.cases.contains(&case) {
                    tally.add(case, digest);
                }
            }
            self.movements.add(case, digest);
            self.anchors.add(case, digest);
        } else {
            self.cases[case] = Standing::Unsound;
        }
        self.effects_of(case, digest)
    }

    /// Lets the checks that cover a case, or a design effect, read it.
    fn judge(&mut self, index: usize, digest: &CaseDigest) {
        let against = Against {
            net: &self.brief.net,
            axial_forces: &self.reference_forces,
            positions: &self.reference_positions,
            bases: &self.bases,
        };
        for (check, tally) in self.brief.checks.iter().zip(&mut self.checks) {
            if check.cases.contains(&index) {
                tally.add(check, &against, index, digest);
            }
        }
    }

    fn effects_of(&mut self, case: usize, digest: &CaseDigest) -> Vec<Effect> {
        let readers = std::mem::take(&mut self.readers[case]);
        if readers.is_empty() {
            return Vec::new();
        }
        let digest = Arc::new(digest.clone());
        self.held.insert(
            case,
            Held {
                digest,
                readers: readers.len(),
            },
        );
        let mut complete = Vec::new();
        for effect in readers {
            self.effects[effect].missing -= 1;
            if self.effects[effect].missing == 0 {
                complete.push(self.complete(effect));
            }
        }
        complete
    }

    fn complete(&mut self, effect: usize) -> Effect {
        let brief = Arc::clone(&self.brief);
        let given = &brief.effects[effect];
        let terms: Vec<(f64, Arc<CaseDigest>)> = (given.terms.iter())
            .map(|(case, weight)| (*weight, Arc::clone(&self.held[case].digest)))
            .collect();
        let terms: Vec<(f64, &CaseDigest)> = terms.iter().map(|(weight, digest)| (*weight, &**digest)).collect();
        let digest = CaseDigest::design_effect(&brief.net, &terms);
        let beside = given.beside.map(|case| Arc::clone(&self.held[&case].digest));
        let beside = beside.filter(|digest| digest.is_sound());
        for case in given.cases() {
            let held = self.held.get_mut(&case).expect("held until its last reader");
            held.readers -= 1;
            if held.readers == 0 {
                self.held.remove(&case);
            }
        }
        self.effects[effect].standing = if digest.is_some() {
            Standing::Sound
        } else {
            Standing::Unsound
        };
        if let Some(digest) = &digest {
            self.judge(brief.cases.len() + effect, digest);
            self.losses.add_effect(&brief, effect, digest);
            if let Some(beside) = &beside {
                let n_segments = brief.net.segments().len();
                let rules = self.factor_rules.get_or_insert_with(|| FactorRules::new(n_segments));
                rules.add(given.rule, digest, beside);
            }
        }
        Effect { effect, digest, beside }
    }

    /// Cases that govern a check as far as it has come, each once, in brief order.
    #[must_use]
    pub fn governing(&self) -> Vec<usize> {
        let n_cases = self.brief.cases.len();
        let worst = self.checks.iter().filter_map(CheckTally::governing_case);
        let mut cases: Vec<usize> = worst.filter(|case| *case < n_cases).collect();
        cases.sort_unstable();
        cases.dedup();
        cases
    }

    /// The end of the run.
    #[must_use]
    pub fn finish(self) -> Summary {
        let Self {
            brief, cases, effects, ..
        } = self;
        let n_cases = cases.len();
        let standing = |index: usize| match cases.get(index) {
            Some(standing) => *standing,
            None => effects[index - n_cases].standing,
        };
        let is_open = |index: &usize| matches!(standing(*index), Standing::Awaited | Standing::Unsound);
        let checks = brief.checks.iter().zip(self.checks);
        let checks: Vec<_> = checks
            .map(|(check, tally)| tally.finish(check, check.cases.iter().copied().filter(is_open).collect()))
            .collect();
        let answered = Share {
            count: self.answered,
            of: cases.iter().filter(|case| **case != Standing::NotOfTheRun).count(),
        };
        let audited = cases.iter().filter(|case| **case == Standing::Sound).count();
        let are = |wanted: fn(&Motion) -> bool| self.motions.iter().filter(|motion| wanted(motion)).count();
        let facts = Facts {
            motions: Share {
                count: are(|motion| *motion == Motion::Finished),
                of: are(|motion| *motion != Motion::NotOfTheRun),
            },
            ..Facts::new(answered, audited, &checks)
        };
        Summary {
            verdict: if self.reference_audited {
                facts.verdict()
            } else {
                Verdict::NoAnswer
            },
            facts,
            checks,
            envelopes: self.envelopes.finish(),
            set_envelopes: self.set_envelopes.into_iter().map(EnvelopeTally::finish).collect(),
            losses: self.losses.finish(),
            factor_rules: self.factor_rules,
            movements: self.movements.finish(),
            anchors: self.anchors.finish(),
            cautions: self.cautions,
        }
    }
}
