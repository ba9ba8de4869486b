//! The end of a run: envelopes, then the summary.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{self, Effect, Plan, ReferenceOutcome};
use ropewalk_numerics::check::{CaseDigest, Envelope, Extreme};
use ropewalk_numerics::model::Member;
use ropewalk_numerics::shape::ShapeError;
use v1::run_response::Event;

use super::motions::NotedMotion;
use super::parts::{count, event};
use super::state::Array;
use super::{anchors, cautions, effects, outcome, verdicts};
use crate::decode::{ENVELOPE, REFERENCE, Work};

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
    /// Motions of the run.
    motions: usize,
    found: Result<ReferenceOutcome, ShapeError>,
    /// The summary in the making, if there is a reference state.
    summed_up: Option<brief::Tally>,
    counts: Counts,
}

impl Tally {
    /// A tally of a run of `cases` and `motions`, none of them worked off yet.
    #[must_use]
    pub fn new(plan: &Plan, cases: &[usize], motions: &[usize], found: &Result<ReferenceOutcome, ShapeError>) -> Self {
        let summed_up = found.as_ref().ok();
        Self {
            cases: cases.to_vec(),
            motions: motions.len(),
            summed_up: summed_up.map(|reference| brief::Tally::new(plan, reference, cases).with_motions(motions)),
            found: found.clone(),
            counts: Counts::default(),
        }
    }

    /// Takes in a case. Answers the design effects that are complete with it.
    pub fn add(&mut self, case: usize, noted: &Noted) -> Vec<Effect> {
        self.counts.join(noted.counts);
        match &mut self.summed_up {
            Some(summed_up) => summed_up.add(case, &noted.digest),
            None => Vec::new(),
        }
    }

    /// Takes in a motion.
    pub fn add_motion(&mut self, motion: usize, noted: &NotedMotion) {
        self.counts.join(noted.counts);
        if let Some(summed_up) = &mut self.summed_up {
            summed_up.add_motion(motion, noted.finished);
        }
    }
}

impl Tally {
    /// Cases that govern a check.
    #[must_use]
    pub fn governing(&self) -> Vec<usize> {
        self.summed_up.as_ref().map_or_else(Vec::new, brief::Tally::governing)
    }
}

/// The envelopes, then the summary.
#[must_use]
pub fn closing(work: &Work, plan: &Plan, tally: Tally) -> Vec<v1::RunResponse> {
    let Tally {
        cases,
        motions,
        found,
        summed_up,
        mut counts,
    } = tally;
    let mut messages = Vec::new();
    work.findings().iter().for_each(|finding| counts.add(finding));
    for finding in outcome::reference_findings(work, plan, &found) {
        counts.add(&finding);
    }
    let summary = match (&found, summed_up.map(brief::Tally::finish)) {
        (Ok(reference), Some(summary)) => {
            messages.extend(envelope(plan, &cases, &summary));
            messages.extend(set_envelopes(plan, &cases, &summary));
            if let Some(rules) = &summary.factor_rules {
                messages.extend(effects::factor_rules(&plan.brief().net, rules));
            }
            messages.extend(effects::losses(work, plan, &summary.losses));
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
                cautions: cautions::of_run(work, &summary.cautions),
                findings: counts.messages(),
                digest: work.digest.clone(),
                anchors: Some(anchors::sheet(plan, &summary.anchors)),
                motions: (motions > 0).then(|| share(summary.facts.motions.count, summary.facts.motions.of)),
            }
        }
        _ => {
            let checks = verdicts::not_judged(work, plan);
            let covered: u32 = checks.iter().map(|check| check.not_judged).sum();
            v1::Summary {
                verdict: v1::Verdict::NoAnswer.into(),
                answered: Some(share(0, cases.len() + 1)),
                audited: Some(share(0, 0)),
                judged: Some(v1::Share { count: 0, of: covered }),
                passes: Some(share(0, 0)),
                checks,
                cautions: cautions::of_net(work, &plan.brief().net),
                findings: counts.messages(),
                digest: work.digest.clone(),
                anchors: None,
                motions: (motions > 0).then(|| share(0, motions)),
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

/// Least and largest forces of every segment and largest movements of every node, over the sound cases and the reference
/// state, and where they occur.
/// Tensions over the cases of sets.
fn set_envelopes(plan: &Plan, cases: &[usize], summary: &brief::Summary) -> Vec<v1::RunResponse> {
    let brief = plan.brief();
    let mut messages = Vec::new();
    for (given, segments) in brief.envelopes.iter().zip(&summary.set_envelopes) {
        let name = format!("{ENVELOPE}/{}", given.name);
        messages.extend(forces(plan, cases, &name, segments));
    }
    messages
}

fn envelope(plan: &Plan, cases: &[usize], summary: &brief::Summary) -> Vec<v1::RunResponse> {
    let place = |extreme: &Extreme| place(plan, cases, *extreme);
    let moved = &summary.movements;
    let largest = Array {
        case: ENVELOPE,
        name: "movement_max_m",
        unit: "m",
        over: v1::Range::Node,
        components: 1,
        baseline: REFERENCE,
        values: moved.iter().map(|m| m.value).collect(),
    };
    let governing = Array {
        name: "movement_max_case",
        unit: "",
        baseline: "",
        values: moved.iter().map(place).collect(),
        ..largest
    };
    let mut messages = forces(plan, cases, ENVELOPE, &summary.envelopes);
    messages.extend(largest.parts());
    messages.extend(governing.parts());
    messages
}

/// Position in the table of cases; −1 stands for the reference state.
fn place(plan: &Plan, cases: &[usize], extreme: Extreme) -> f64 {
    debug_assert!(extreme.case.is_none_or(|case| case < plan.brief().cases.len()));
    // Cases run in brief order, so that their table is sorted.
    let position = extreme.case.and_then(|case| cases.binary_search(&case).ok());
    position.map_or(-1.0, |position| f64::from(count(position)))
}

/// Least and largest axial forces with their cases.
fn forces(plan: &Plan, cases: &[usize], name: &str, segments: &[Envelope]) -> Vec<v1::RunResponse> {
    let is_rope = |s: &&ropewalk_numerics::model::Segment| matches!(s.member, Member::Cable(_));
    let ropes = plan.brief().net.segments().iter().filter(is_rope).count();
    let (ropes, struts) = segments.split_at(ropes);
    let of_all = |list: &[Envelope], take: &dyn Fn(&Envelope) -> f64| list.iter().map(take).collect::<Vec<f64>>();
    let place = |extreme| place(plan, cases, extreme);
    let array = |what, unit, over, values| Array {
        case: name,
        name: what,
        unit,
        over,
        components: 1,
        baseline: "",
        values,
    };
    let (rope, strut) = (v1::Range::RopeSegment, v1::Range::Strut);
    [
        array("tension_min_n", "N", rope, of_all(ropes, &|e| e.least.value)),
        array("tension_max_n", "N", rope, of_all(ropes, &|e| e.largest.value)),
        array("tension_min_case", "", rope, of_all(ropes, &|e| place(e.least))),
        array("tension_max_case", "", rope, of_all(ropes, &|e| place(e.largest))),
        array("axial_force_min_n", "N", strut, of_all(struts, &|e| e.least.value)),
        array("axial_force_max_n", "N", strut, of_all(struts, &|e| e.largest.value)),
        array("axial_force_min_case", "", strut, of_all(struts, &|e| place(e.least))),
        array("axial_force_max_case", "", strut, of_all(struts, &|e| place(e.largest))),
    ]
    .into_iter()
    .flat_map(|array| array.parts().collect::<Vec<_>>())
    .collect()
}
