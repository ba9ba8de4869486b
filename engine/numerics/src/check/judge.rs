//! One check judged: member by member, over its cases.

use nalgebra::Vector3;

use super::{Check, CheckKind, Share, Verdict};
use crate::model::{AxialLaw, CableId, Member, Net, NodeId, SegmentId, StrutId};

/// The little that checks need of a case, so that its full fields need not be kept.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct CaseDigest {
    /// Whether a state within tolerance was found.
    pub answered: bool,
    /// Whether the independent routine agrees.
    pub audited: bool,
    /// Axial force of every segment (N); empty if there is no answer.
    pub axial_forces: Vec<f64>,
    /// Movement of every node from its place in the reference state (m); empty if there is no answer.
    pub displacements: Vec<Vector3<f64>>,
    /// Support force on the net at every node (N), `None` where there is no support; empty if there is no answer.
    pub support_forces: Vec<Option<Vector3<f64>>>,
    /// Nodes whose place, and so whose movement, is not determined.
    pub loose_nodes: Vec<NodeId>,
    /// Segments that are taken out in this case: their members are not judged in it, and have no part in envelopes.
    pub removed: Vec<SegmentId>,
}

impl CaseDigest {
    /// Whether the case may be judged: an answer that the audit confirms.
    #[must_use]
    pub fn is_sound(&self) -> bool {
        self.answered && self.audited
    }

    /// A design effect: `Σ w E` over sound cases, quantity by quantity, for the rules that a standard states on effects.
    /// It is no state: nothing is in balance in it.
    ///
    /// A rope can not push, so that its sum counts from zero. What is taken out in one of the cases is taken out of the
    /// effect; a place that one of them leaves open stays open. `None` unless every case is sound.
    ///
    /// `terms`: weight (–) and case, at least one.
    #[must_use]
    pub fn design_effect(net: &Net, terms: &[(f64, &Self)]) -> Option<Self> {
        let (_, first) = terms.first()?;
        if !terms.iter().all(|(_, digest)| digest.is_sound()) {
            return None;
        }
        let sum =
            |value: &dyn Fn(&Self) -> f64| terms.iter().map(|(weight, digest)| weight * value(digest)).sum::<f64>();
        let vector = |value: &dyn Fn(&Self) -> Vector3<f64>| {
            (terms.iter()).fold(Vector3::zeros(), |sum, (weight, digest)| sum + *weight * value(digest))
        };
        let mut effect = Self {
            answered: true,
            audited: true,
            axial_forces: (0..first.axial_forces.len())
                .map(|e| sum(&|digest| digest.axial_forces[e]))
                .collect(),
            displacements: (0..first.displacements.len())
                .map(|node| vector(&|digest| digest.displacements[node]))
                .collect(),
            support_forces: (0..first.support_forces.len())
                .map(|node| {
                    first.support_forces[node]?;
                    Some(vector(&|digest| {
                        digest.support_forces[node].unwrap_or_else(Vector3::zeros)
                    }))
                })
                .collect(),
            loose_nodes: terms
                .iter()
                .flat_map(|(_, digest)| digest.loose_nodes.iter().copied())
                .collect(),
            removed: terms
                .iter()
                .flat_map(|(_, digest)| digest.removed.iter().copied())
                .collect(),
        };
        effect.removed.sort_unstable();
        effect.removed.dedup();
        effect.loose_nodes.sort_unstable();
        effect.loose_nodes.dedup();
        for (force, segment) in effect.axial_forces.iter_mut().zip(net.segments()) {
            if segment.law == AxialLaw::TensionOnly {
                *force = force.max(0.0);
            }
        }
        for segment in &effect.removed {
            effect.axial_forces[segment.index()] = 0.0;
        }
        Some(effect)
    }

    /// Whether a member is taken out in this case.
    fn lacks(&self, net: &Net, part: Covered) -> bool {
        let is_of = |segment: &SegmentId| match (net.segments()[segment.index()].member, part) {
            (Member::Cable(of), Covered::Cable(cable)) => of == cable,
            (Member::Strut(of), Covered::Strut(strut)) => of == strut,
            _ => false,
        };
        self.removed.iter().any(is_of)
    }
}

/// A part that a check covers.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Covered {
    /// A cable.
    Cable(CableId),
    /// A strut.
    Strut(StrutId),
    /// A node.
    Node(NodeId),
}

/// One part, judged.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Judgement {
    /// The part.
    pub of: Covered,
    /// Its segment that governs, for a cable.
    pub segment: Option<SegmentId>,
    /// The case that governs, by index; from the number of cases on, a design effect.
    pub case: usize,
    /// What is demanded: tension times factor (N), tension over reference tension (–), movement (m) or force (N).
    pub demand: f64,
    /// What is allowed, in the unit of `demand`.
    pub limit: f64,
    /// Use of the limit (–): above 1 fails. For slackness the share of tension lost over the share that may be lost; a
    /// slack rope of which only that it is not slack is asked stands at 1, and fails.
    pub ratio: f64,
    /// Whether the demand keeps within the limit.
    pub passes: bool,
}

/// What came of one check.
#[derive(Clone, Debug, PartialEq)]
pub struct CheckResult {
    /// What was checked.
    pub kind: CheckKind,
    /// One entry a judged part, each with its governing case, in the order of the check.
    pub judgements: Vec<Judgement>,
    /// Covered parts that could not be judged, for want of data or of an answer.
    pub not_judged: Vec<Covered>,
    /// Covered cases without a sound answer.
    pub unanswered: Vec<usize>,
}

impl CheckResult {
    /// The judged part with the largest ratio.
    #[must_use]
    pub fn worst(&self) -> Option<&Judgement> {
        self.judgements.iter().max_by(|a, b| a.ratio.total_cmp(&b.ratio))
    }

    /// Judged parts of those covered.
    #[must_use]
    pub fn judged(&self) -> Share {
        Share {
            count: self.judgements.len(),
            of: self.judgements.len() + self.not_judged.len(),
        }
    }

    /// The word for this check alone. A check over nothing judges nothing.
    #[must_use]
    pub fn verdict(&self) -> Verdict {
        if !self.unanswered.is_empty() {
            Verdict::NoAnswer
        } else if self.judgements.iter().any(|j| !j.passes) {
            Verdict::Exceeds
        } else if self.judgements.is_empty() || !self.not_judged.is_empty() {
            Verdict::NotJudged
        } else {
            Verdict::Passes
        }
    }
}

/// What is known of a part before all cases are in.
#[derive(Clone, Copy, Debug)]
enum Standing {
    /// No case yet.
    Open,
    /// The worst so far.
    Worst(Judgement),
    /// A case could not be judged, and so neither can the part.
    NotJudged,
}

/// A check on its way through the cases: the worst of each part so far, whatever the order and number of cases.
///
/// A cable is judged only if each of its segments can be: with a breaking force for strength, with a tension in the
/// reference state for slackness.
#[derive(Clone, Debug)]
pub struct CheckTally {
    kind: CheckKind,
    parts: Vec<(Covered, Standing)>,
}

impl CheckTally {
    /// A check before its first case.
    #[must_use]
    pub fn new(check: &Check) -> Self {
        Self {
            kind: check.kind,
            parts: check.covered().map(|part| (part, Standing::Open)).collect(),
        }
    }

    /// Takes in a case that the check covers; one without a sound answer is not looked at.
    ///
    /// `reference_forces`: axial force of every segment in the reference state (N).
    pub fn add(&mut self, net: &Net, reference_forces: &[f64], case: usize, digest: &CaseDigest) {
        if !digest.is_sound() {
            return;
        }
        for (part, standing) in &mut self.parts {
            let worst = match standing {
                _ if digest.lacks(net, *part) => continue,
                Standing::NotJudged => continue,
                Standing::Open => None,
                Standing::Worst(worst) => Some(*worst),
            };
            *standing = match judge_part(net, reference_forces, self.kind, *part, case, digest) {
                None => Standing::NotJudged,
                Some(next) => Standing::Worst(worst.map_or(next, |worst| worse_case(worst, next))),
            };
        }
    }

    /// What came of the check. `unanswered`: its cases without a sound answer.
    #[must_use]
    pub fn finish(self, unanswered: Vec<usize>) -> CheckResult {
        let mut result = CheckResult {
            kind: self.kind,
            judgements: Vec::new(),
            not_judged: Vec::new(),
            unanswered,
        };
        for (part, standing) in self.parts {
            match standing {
                Standing::Worst(judgement) => result.judgements.push(judgement),
                Standing::Open | Standing::NotJudged => result.not_judged.push(part),
            }
        }
        result
    }
}

/// Of two cases the worse one, of equals the one that comes first in the brief: the order of adding leaves no trace.
fn worse_case(a: Judgement, b: Judgement) -> Judgement {
    if b.ratio > a.ratio || (b.ratio == a.ratio && b.case < a.case) {
        b
    } else {
        a
    }
}

/// Worst ratio that a check finds in one case (–); `None` where it judges nothing in it.
#[must_use]
pub fn worst_ratio(
    net: &Net,
    reference_forces: &[f64],
    check: &Check,
    case: usize,
    digest: &CaseDigest,
) -> Option<f64> {
    if !digest.is_sound() {
        return None;
    }
    check
        .covered()
        .filter(|part| !digest.lacks(net, *part))
        .filter_map(|part| judge_part(net, reference_forces, check.kind, part, case, digest))
        .map(|judgement| judgement.ratio)
        .reduce(f64::max)
}

fn judge_part(
    net: &Net,
    reference_forces: &[f64],
    kind: CheckKind,
    part: Covered,
    case: usize,
    digest: &CaseDigest,
) -> Option<Judgement> {
    let judgement = |segment, demand, limit, ratio: f64, passes| {
        ratio.is_finite().then_some(Judgement {
            of: part,
            segment,
            case,
            demand,
            limit,
            ratio,
            passes,
        })
    };
    let below = |demand: f64, limit: f64| judgement(None, demand, limit, demand / limit, demand <= limit);
    match (kind, part) {
        (CheckKind::Safety { factor }, Covered::Cable(cable)) => over_segments(net, cable, |segment| {
            let limit = net.segments()[segment.index()].section.breaking_force?;
            let demand = factor * digest.axial_forces[segment.index()];
            judgement(Some(segment), demand, limit, demand / limit, demand <= limit)
        }),
        (CheckKind::Slackness { min_share_of_reference }, Covered::Cable(cable)) => {
            over_segments(net, cable, |segment| {
                let whole = reference_forces[segment.index()];
                if whole <= 0.0 || min_share_of_reference >= 1.0 {
                    return None;
                }
                let share = digest.axial_forces[segment.index()] / whole;
                let ratio = (1.0 - share) / (1.0 - min_share_of_reference);
                // A slack rope fails a wanted share of zero too: it asks for "not slack".
                let passes = share >= min_share_of_reference && share > 0.0;
                judgement(Some(segment), share, min_share_of_reference, ratio, passes)
            })
        }
        (CheckKind::Movement { limit }, Covered::Node(node)) => {
            if digest.loose_nodes.contains(&node) {
                return None;
            }
            below(digest.displacements[node.index()].norm(), limit)
        }
        (CheckKind::AnchorPull { limit }, Covered::Node(node)) => {
            below(digest.support_forces[node.index()]?.norm(), limit)
        }
        _ => None,
    }
}

/// The worst of the segments of a cable, of equals the first, if each could be judged.
fn over_segments(net: &Net, cable: CableId, judge: impl Fn(SegmentId) -> Option<Judgement>) -> Option<Judgement> {
    let mut worst: Option<Judgement> = None;
    for index in net.cables()[cable.index()].segments.clone() {
        let next = judge(SegmentId::new(index))?;
        worst = Some(worst.map_or(next, |worst| if next.ratio > worst.ratio { next } else { worst }));
    }
    worst
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::check::tests_support::{digest, net, reference_forces};

    fn judge_in_order(check: &Check, digests: &[CaseDigest], order: &[usize]) -> CheckResult {
        let mut tally = CheckTally::new(check);
        for case in order {
            tally.add(&net(), &reference_forces(), *case, &digests[*case]);
        }
        let unanswered = check.cases.iter().copied().filter(|case| !digests[*case].is_sound());
        tally.finish(unanswered.collect())
    }

    /// The check over all of its cases; whether they come forward or backward must not matter.
    fn judge(check: &Check, digests: &[CaseDigest]) -> CheckResult {
        let forward: Vec<usize> = (0..digests.len()).collect();
        let backward: Vec<usize> = forward.iter().rev().copied().collect();
        let result = judge_in_order(check, digests, &forward);
        assert_eq!(result, judge_in_order(check, digests, &backward));
        result
    }

    fn check(kind: CheckKind) -> Check {
        Check {
            kind,
            cables: vec![CableId::new(0), CableId::new(1)],
            struts: Vec::new(),
            nodes: Vec::new(),
            cases: vec![0, 1],
        }
    }

    #[test]
    fn strength_takes_the_worst_segment_and_case() {
        // Breaking force 10 kN in cable 0, unknown in cable 1.
        let digests = [digest(&[1000.0, 2000.0, 3000.0]), digest(&[4000.0, 2500.0, 3000.0])];
        let result = judge(&check(CheckKind::Safety { factor: 3.0 }), &digests);
        assert_eq!(result.not_judged, [Covered::Cable(CableId::new(1))]);
        let [only] = result.judgements[..] else {
            panic!("one judgement");
        };
        assert_eq!((only.segment, only.case), (Some(SegmentId::new(0)), 1));
        assert_eq!((only.demand, only.limit, only.passes), (12_000.0, 10_000.0, false));
        assert!((only.ratio - 1.2).abs() < 1e-15);
        assert_eq!(result.verdict(), Verdict::Exceeds);
    }

    #[test]
    fn slackness_is_a_share_of_the_reference_tension() {
        // Reference tensions 2 kN and 1 kN in cable 0, slack in cable 1.
        let digests = [digest(&[500.0, 600.0, 0.0]), digest(&[2000.0, 0.0, 0.0])];
        let kind = CheckKind::Slackness {
            min_share_of_reference: 0.2,
        };
        let result = judge(&check(kind), &digests);
        assert_eq!(result.not_judged, [Covered::Cable(CableId::new(1))]);
        let worst = result.worst().expect("one judgement");
        assert_eq!((worst.segment, worst.case), (Some(SegmentId::new(1)), 1));
        assert_eq!((worst.demand, worst.passes), (0.0, false));
        assert!((worst.ratio - 1.25).abs() < 1e-15);
    }

    #[test]
    fn a_wanted_share_of_zero_asks_for_a_taut_rope() {
        let kind = CheckKind::Slackness {
            min_share_of_reference: 0.0,
        };
        let verdict_with = |tension: f64| {
            let digests = [digest(&[500.0, tension, 0.0]), digest(&[2000.0, 1000.0, 0.0])];
            let result = judge(&check(kind), &digests);
            let worst = result.worst().expect("one judgement");
            (worst.segment, worst.ratio <= 1.0, worst.passes)
        };
        // Reference tension 1 kN in segment 1.
        assert_eq!(verdict_with(0.0), (Some(SegmentId::new(1)), true, false));
        assert_eq!(verdict_with(1.0), (Some(SegmentId::new(1)), true, true));
    }

    #[test]
    fn movement_of_a_loose_node_is_not_judged() {
        let mut digests = [digest(&[1.0; 3]), digest(&[1.0; 3])];
        digests[1].loose_nodes = vec![NodeId::new(1)];
        digests[1].displacements[0] = Vector3::z() * -0.03;
        let check = Check {
            cables: Vec::new(),
            nodes: vec![NodeId::new(0), NodeId::new(1)],
            ..check(CheckKind::Movement { limit: 0.02 })
        };
        let result = judge(&check, &digests);
        assert_eq!(result.not_judged, [Covered::Node(NodeId::new(1))]);
        assert_eq!(result.judgements[0].case, 1);
        assert!(!result.judgements[0].passes);
    }

    #[test]
    fn anchor_pull_needs_a_support() {
        let mut digests = [digest(&[1.0; 3]), digest(&[1.0; 3])];
        digests[0].support_forces[0] = Some(Vector3::x() * 900.0);
        digests[1].support_forces[0] = Some(Vector3::x() * 800.0);
        let check = Check {
            cables: Vec::new(),
            nodes: vec![NodeId::new(0), NodeId::new(1)],
            struts: vec![StrutId::new(0)],
            ..check(CheckKind::AnchorPull { limit: 1000.0 })
        };
        let result = judge(&check, &digests);
        let unjudged = [Covered::Strut(StrutId::new(0)), Covered::Node(NodeId::new(1))];
        assert_eq!(result.not_judged, unjudged);
        assert_eq!((result.judgements[0].demand, result.judgements[0].case), (900.0, 0));
        assert_eq!(result.verdict(), Verdict::NotJudged);
    }

    #[test]
    fn a_case_without_a_sound_answer_outranks_everything() {
        let mut digests = [digest(&[1.0; 3]), CaseDigest::default()];
        let check = check(CheckKind::Safety { factor: 1.0 });
        let verdict = |digests: &[CaseDigest]| judge(&check, digests).verdict();
        assert_eq!(verdict(&digests), Verdict::NoAnswer);
        digests[1] = digest(&[1.0; 3]);
        digests[1].audited = false;
        assert_eq!(verdict(&digests), Verdict::NoAnswer);
    }

    #[test]
    fn of_equal_cases_the_first_of_the_brief_governs() {
        let digests = [digest(&[1000.0, 4000.0, 0.0]), digest(&[4000.0, 1000.0, 0.0])];
        let result = judge(&check(CheckKind::Safety { factor: 3.0 }), &digests);
        let worst = result.worst().expect("one judgement");
        assert_eq!((worst.case, worst.segment), (0, Some(SegmentId::new(1))));
    }

    #[test]
    fn the_worst_ratio_of_one_case() {
        let check = check(CheckKind::Safety { factor: 3.0 });
        let mut digest = digest(&[1000.0, 2000.0, 3000.0]);
        let ratio = |digest: &CaseDigest| worst_ratio(&net(), &reference_forces(), &check, 1, digest);
        // 3 · 2 kN against 10 kN; the cable of unknown strength does not count.
        assert!((ratio(&digest).expect("a judged cable") - 0.6).abs() < 1e-15);
        digest.audited = false;
        assert_eq!(ratio(&digest), None);
    }

    #[test]
    fn a_check_over_nothing_does_not_pass() {
        let empty = Check {
            cables: Vec::new(),
            ..check(CheckKind::Safety { factor: 1.0 })
        };
        let digests = [digest(&[1.0; 3]), digest(&[1.0; 3])];
        assert_eq!(judge(&empty, &digests).verdict(), Verdict::NotJudged);
    }
}
