//! The end of a run: envelopes, then the summary.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{Plan, ReferenceOutcome};
use ropewalk_numerics::check::CaseDigest;
use ropewalk_numerics::model::Member;
use ropewalk_numerics::shape::ShapeError;
use v1::run_response::Event;

use super::parts::{count, event};
use super::state::Array;
use super::{cautions, outcome, verdicts};
use crate::decode::{ENVELOPE, Work};

/// What the end of a run needs of a case.
#[derive(Debug)]
pub struct Noted {
    digest: CaseDigest,
    counts: Counts,
}

impl Noted {
    pub(super) fn new(digest: CaseDigest, findings: &[v1::Finding]) -> Self {
        let mut counts = Counts::default();
        findings.iter().for_each(|finding| counts.add(finding));
        Self { digest, counts }
    }
}

/// Findings by severity; accepted doubts are left out.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Counts {
    errors: u32,
    doubts: u32,
    notes: u32,
}

impl Counts {
    pub(super) fn add(&mut self, finding: &v1::Finding) {
        match finding.severity() {
            v1::FindingSeverity::Error => self.errors += 1,
            v1::FindingSeverity::Doubt if finding.accepted_note.is_empty() => self.doubts += 1,
            v1::FindingSeverity::Note => self.notes += 1,
            v1::FindingSeverity::Doubt | v1::FindingSeverity::Unspecified => {}
        }
    }

    fn join(&mut self, other: Self) {
        self.errors += other.errors;
        self.doubts += other.doubts;
        self.notes += other.notes;
    }

    pub(super) fn messages(self) -> Vec<v1::FindingCount> {
        let count = |severity: v1::FindingSeverity, count| v1::FindingCount {
            severity: severity.into(),
            count,
        };
        vec![
            count(v1::FindingSeverity::Error, self.errors),
            count(v1::FindingSeverity::Doubt, self.doubts),
            count(v1::FindingSeverity::Note, self.notes),
        ]
    }
}

/// What is gathered on the way through a run.
#[derive(Debug)]
pub struct Tally {
    cases: Vec<usize>,
    /// The reference state, if there is one.
    reference: Option<ReferenceOutcome>,
    failed: Option<ShapeError>,
    /// One entry a case of the brief; those that were not run stay empty.
    digests: Vec<CaseDigest>,
    counts: Counts,
}

impl Tally {
    /// A tally of a run of `cases`, none of them solved yet.
    #[must_use]
    pub fn new(plan: &Plan, cases: &[usize], found: &Result<ReferenceOutcome, ShapeError>) -> Self {
        Self {
            cases: cases.to_vec(),
            reference: found.as_ref().ok().cloned(),
            failed: found.as_ref().err().cloned(),
            digests: vec![CaseDigest::default(); plan.brief().cases.len()],
            counts: Counts::default(),
        }
    }

    /// Takes in a case.
    pub fn add(&mut self, case: usize, noted: Noted) {
        self.digests[case] = noted.digest;
        self.counts.join(noted.counts);
    }
}

/// The envelopes, then the summary.
#[must_use]
pub fn closing(work: &Work, plan: &Plan, tally: Tally) -> Vec<v1::RunResponse> {
    let mut messages = Vec::new();
    let mut counts = tally.counts;
    work.findings().iter().for_each(|finding| counts.add(finding));
    let summary = match &tally.reference {
        Some(reference) => {
            let found = Ok(reference.clone());
            for finding in outcome::reference_findings(work, plan, &found) {
                counts.add(&finding);
            }
            messages.extend(envelope(plan, reference, &tally));
            let summary = plan.summary(reference, &tally.cases, &tally.digests);
            let answered = summary.facts.answered;
            let reference_audited = usize::from(reference.result.audit.passed);
            v1::Summary {
                verdict: verdicts::verdict(summary.verdict).into(),
                // The reference state counts among the states.
                answered: Some(share(answered.count + 1, answered.of + 1)),
                audited: Some(share(
                    summary.facts.audited.count + reference_audited,
                    answered.count + 1,
                )),
                judged: Some(share(summary.facts.judged.count, summary.facts.judged.of)),
                passes: Some(share(summary.facts.passing.count, summary.facts.passing.of)),
                checks: verdicts::checks(work, plan, &summary.checks),
                cautions: cautions::of_run(&summary.cautions),
                findings: counts.messages(),
                digest: work.digest.clone(),
            }
        }
        None => {
            if let Some(error) = tally.failed {
                for finding in outcome::reference_findings(work, plan, &Err(error)) {
                    counts.add(&finding);
                }
            }
            let checks = verdicts::not_judged(work, plan);
            let covered: u32 = checks.iter().map(|check| check.not_judged).sum();
            v1::Summary {
                verdict: v1::Verdict::NoAnswer.into(),
                answered: Some(share(0, tally.cases.len() + 1)),
                audited: Some(share(0, 0)),
                judged: Some(v1::Share { count: 0, of: covered }),
                passes: Some(share(0, 0)),
                checks,
                cautions: cautions::cautions(),
                findings: counts.messages(),
                digest: work.digest.clone(),
            }
        }
    };
    messages.push(event(Event::Summary(summary)));
    messages
}

fn share(of_them: usize, of: usize) -> v1::Share {
    v1::Share {
        count: count(of_them),
        of: count(of),
    }
}

/// Least and largest tension of every rope segment over the sound cases and the reference state, and where they occur.
fn envelope(plan: &Plan, reference: &ReferenceOutcome, tally: &Tally) -> Vec<v1::RunResponse> {
    let net = &plan.brief().net;
    let ropes = net
        .segments()
        .iter()
        .filter(|s| matches!(s.member, Member::Cable(_)))
        .count();
    let mut least: Vec<f64> = reference.state.axial_forces[..ropes].to_vec();
    let mut largest = least.clone();
    // Position in the table of cases; −1 stands for the reference state.
    let mut least_case = vec![-1.0; ropes];
    let mut largest_case = vec![-1.0; ropes];
    for (position, case) in tally.cases.iter().enumerate() {
        let digest = &tally.digests[*case];
        if !digest.is_sound() {
            continue;
        }
        for (segment, tension) in digest.axial_forces[..ropes].iter().enumerate() {
            if *tension < least[segment] {
                least[segment] = *tension;
                least_case[segment] = f64::from(count(position));
            }
            if *tension > largest[segment] {
                largest[segment] = *tension;
                largest_case[segment] = f64::from(count(position));
            }
        }
    }
    [
        ("tension_min_n", "N", least),
        ("tension_max_n", "N", largest),
        ("tension_min_case", "", least_case),
        ("tension_max_case", "", largest_case),
    ]
    .into_iter()
    .flat_map(|(name, unit, values)| {
        let array = Array {
            case: ENVELOPE,
            name,
            unit,
            over: v1::Range::RopeSegment,
            components: 1,
            baseline: "",
            values,
        };
        array.parts().collect::<Vec<_>>()
    })
    .collect()
}
