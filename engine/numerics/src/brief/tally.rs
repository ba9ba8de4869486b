//! A run summed up while it goes on: what a case leaves is folded in, and the case forgotten.

use std::sync::Arc;

use nalgebra::Vector3;

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

/// The summary of a run in the making.
///
/// It grows with members times checks and with segments; of a case it keeps one byte. In which order cases are added
/// does not change a bit of the summary.
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
    answered: usize,
    checks: Vec<CheckTally>,
    envelopes: EnvelopeTally,
    movements: MovementTally,
    anchors: AnchorTally,
}

impl Tally {
    /// A run before its first case.
    ///
    /// `cases`: those to be run, by index; each that is never added counts as not answered.
    #[must_use]
    pub fn new(plan: &Plan, reference: &ReferenceOutcome, cases: &[usize]) -> Self {
        let brief = plan.shared_brief();
        let mut standings = vec![Standing::NotOfTheRun; brief.cases.len()];
        cases.iter().for_each(|case| standings[*case] = Standing::Awaited);
        let against = reference.against(&brief.net);
        let supports = reference.result.support_forces.iter();
        Self {
            reference_forces: reference.state.axial_forces.clone(),
            reference_positions: reference.state.positions.clone(),
            bases: reference.bases.clone(),
            reference_audited: reference.result.audit.passed,
            cautions: cautions(&brief.net, reference),
            cases: standings,
            answered: 0,
            checks: brief
                .checks
                .iter()
                .map(|check| CheckTally::new(check, &against))
                .collect(),
            envelopes: EnvelopeTally::new(&reference.state.axial_forces),
            movements: MovementTally::new(brief.net.nodes().len()),
            anchors: AnchorTally::new(supports.map(|support| (support.node, support.force))),
            brief,
        }
    }

    /// Takes in a case of the run. Cases of no run and cases that are in already are not looked at.
    pub fn add(&mut self, case: usize, digest: &CaseDigest) {
        if self.cases[case] != Standing::Awaited {
            return;
        }
        self.answered += usize::from(digest.answered);
        if !digest.is_sound() {
            self.cases[case] = Standing::Unsound;
            return;
        }
        self.cases[case] = Standing::Sound;
        let against = Against {
            net: &self.brief.net,
            axial_forces: &self.reference_forces,
            positions: &self.reference_positions,
            bases: &self.bases,
        };
        for (check, tally) in self.brief.checks.iter().zip(&mut self.checks) {
            if check.cases.contains(&case) {
                tally.add(check, &against, case, digest);
            }
        }
        self.envelopes.add(case, digest);
        self.movements.add(case, digest);
        self.anchors.add(case, digest);
    }

    /// The end of the run.
    #[must_use]
    pub fn finish(self) -> Summary {
        let Self { brief, cases, .. } = self;
        let is_open = |case: &usize| matches!(cases[*case], Standing::Awaited | Standing::Unsound);
        let checks = brief.checks.iter().zip(self.checks);
        let checks: Vec<_> = checks
            .map(|(check, tally)| tally.finish(check, check.cases.iter().copied().filter(is_open).collect()))
            .collect();
        let answered = Share {
            count: self.answered,
            of: cases.iter().filter(|case| **case != Standing::NotOfTheRun).count(),
        };
        let audited = cases.iter().filter(|case| **case == Standing::Sound).count();
        let facts = Facts::new(answered, audited, &checks);
        Summary {
            verdict: if self.reference_audited {
                facts.verdict()
            } else {
                Verdict::NoAnswer
            },
            facts,
            checks,
            envelopes: self.envelopes.finish(),
            movements: self.movements.finish(),
            anchors: self.anchors.finish(),
            cautions: self.cautions,
        }
    }
}
