//! One check judged: part by part, over its cases.

use super::{Against, CaseDigest, Check, CheckKind, CheckResult, Covered, Judgement, Lack};
use super::{anchor, grip, member, place};

/// What is known of a part before all cases are in.
#[derive(Clone, Copy, Debug)]
enum Standing {
    /// No case yet.
    Open,
    /// The worst so far.
    Worst(Judgement),
    /// A case could not be judged, and so neither can the part.
    NotJudged(Lack),
}

impl Standing {
    /// Takes in what a case says; the order of cases leaves no trace.
    fn with(self, next: Result<Judgement, Lack>) -> Self {
        match (self, next) {
            (Self::Open, Ok(next)) => Self::Worst(next),
            (Self::Worst(worst), Ok(next)) => Self::Worst(worse_case(worst, next)),
            (Self::NotJudged(lack), Err(other)) => Self::NotJudged(lack.min(other)),
            (Self::NotJudged(lack), Ok(_)) | (_, Err(lack)) => Self::NotJudged(lack),
        }
    }
}

/// A check on its way through the cases: the worst of each part so far, whatever the order and number of cases.
///
/// A part is judged only if each covered case can be; a cable only if each of its segments can be: with a breaking force
/// for strength, with a tension in the reference state for slackness.
#[derive(Clone, Debug)]
pub struct CheckTally {
    parts: Vec<(Covered, Standing)>,
}

impl CheckTally {
    /// A check before its first case.
    #[must_use]
    pub fn new(check: &Check, against: &Against<'_>) -> Self {
        let reference = check.judges_reference().then(|| against.reference());
        let standing = |part| match &reference {
            Some(reference) => Standing::Open.with(judge_part(against, check, part, None, reference)),
            None => Standing::Open,
        };
        Self {
            parts: check.covered().into_iter().map(|part| (part, standing(part))).collect(),
        }
    }

    /// Takes in a case that the check covers; one without a sound answer is not looked at.
    ///
    /// `check`: the one that the tally was made for.
    pub fn add(&mut self, check: &Check, against: &Against<'_>, case: usize, digest: &CaseDigest) {
        if !digest.is_sound() {
            return;
        }
        for (part, standing) in &mut self.parts {
            if !digest.lacks(against.net, *part) {
                *standing = standing.with(judge_part(against, check, *part, Some(case), digest));
            }
        }
    }

    /// The case in which the worst part so far is worst; `None` while there is none, or where it is the reference state.
    #[must_use]
    pub fn governing_case(&self) -> Option<usize> {
        let worst = self.parts.iter().filter_map(|(_, standing)| match standing {
            Standing::Worst(judgement) => Some(judgement),
            _ => None,
        });
        worst.max_by(|a, b| a.ratio.total_cmp(&b.ratio))?.case
    }

    /// What came of the check. `unanswered`: its cases without a sound answer.
    #[must_use]
    pub fn finish(self, check: &Check, unanswered: Vec<usize>) -> CheckResult {
        let mut result = CheckResult {
            kind: check.kind,
            judgements: Vec::new(),
            not_judged: Vec::new(),
            unanswered,
        };
        for (part, standing) in self.parts {
            match standing {
                Standing::Worst(judgement) => result.judgements.push(judgement),
                Standing::Open => result.not_judged.push((part, Lack::Answer)),
                Standing::NotJudged(lack) => result.not_judged.push((part, lack)),
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
pub fn worst_ratio(against: &Against<'_>, check: &Check, case: usize, digest: &CaseDigest) -> Option<f64> {
    if !digest.is_sound() {
        return None;
    }
    let parts = check.covered().into_iter();
    parts
        .filter(|part| !digest.lacks(against.net, *part))
        .filter_map(|part| judge_part(against, check, part, Some(case), digest).ok())
        .map(|judgement| judgement.ratio)
        .reduce(f64::max)
}

fn judge_part(
    against: &Against<'_>,
    check: &Check,
    part: Covered,
    case: Option<usize>,
    digest: &CaseDigest,
) -> Result<Judgement, Lack> {
    let judged = match check.kind {
        CheckKind::Safety { .. }
        | CheckKind::Resistance { .. }
        | CheckKind::ShareOfStrength { .. }
        | CheckKind::Slackness { .. } => member::rope(against, check.kind, part, digest),
        CheckKind::Buckling {
            length_factor,
            safety,
            eccentricity,
        } => {
            let buckling = member::Buckling {
                length_factor,
                safety,
                eccentricity,
            };
            member::strut(against, &buckling, part, digest)
        }
        CheckKind::Movement { limit, from } => place::movement(against, limit, from, part, digest),
        CheckKind::Clearance(clearance) => place::clearance(against, check, &clearance, digest),
        CheckKind::Drainage { least_fall } => place::fall(against, least_fall, part, digest),
        CheckKind::AnchorPull(limits) => anchor::pull(&limits, part, digest),
        CheckKind::Clamp(clamp) => grip::clamp(against.net, &clamp, part, digest),
        CheckKind::Saddle(saddle) => grip::saddle(against.net, &saddle, part, digest),
    };
    judged.map(|judgement| Judgement { case, ..judgement })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::check::tests_support::{digest, net, positions, reference_forces};
    use crate::check::{Base, MovementLimit, PullLimits, Verdict};
    use crate::model::{CableId, NodeId, SegmentId, StrutId};
    use nalgebra::Vector3;

    /// What the small net is judged against.
    fn with_against<T>(ask: impl FnOnce(&Against<'_>) -> T) -> T {
        ask(&Against {
            net: &net(),
            axial_forces: &reference_forces(),
            positions: &positions(),
            bases: &[],
        })
    }

    fn judge_in_order(check: &Check, digests: &[CaseDigest], order: &[usize]) -> CheckResult {
        with_against(|against| {
            let mut tally = CheckTally::new(check, against);
            for case in order {
                tally.add(check, against, *case, &digests[*case]);
            }
            let unanswered = check.cases.iter().copied().filter(|case| !digests[*case].is_sound());
            tally.finish(check, unanswered.collect())
        })
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
            panels: Vec::new(),
            cases: vec![0, 1],
        }
    }

    #[test]
    fn strength_takes_the_worst_segment_and_case() {
        // Breaking force 10 kN in cable 0, unknown in cable 1.
        let digests = [digest(&[1000.0, 2000.0, 3000.0]), digest(&[4000.0, 2500.0, 3000.0])];
        let result = judge(&check(CheckKind::Safety { factor: 3.0 }), &digests);
        assert_eq!(
            result.not_judged,
            [(Covered::Cable(CableId::new(1)), Lack::BreakingForce)]
        );
        let [only] = result.judgements[..] else {
            panic!("one judgement");
        };
        assert_eq!((only.segment, only.case), (Some(SegmentId::new(0)), Some(1)));
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
        assert_eq!(
            result.not_judged,
            [(Covered::Cable(CableId::new(1)), Lack::TautReference)]
        );
        let worst = result.worst().expect("one judgement");
        assert_eq!((worst.segment, worst.case), (Some(SegmentId::new(1)), Some(1)));
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
            ..check(CheckKind::Movement {
                limit: MovementLimit::Length(0.02),
                from: None,
            })
        };
        let result = judge(&check, &digests);
        assert_eq!(result.not_judged, [(Covered::Node(NodeId::new(1)), Lack::Place)]);
        assert_eq!(result.judgements[0].case, Some(1));
        assert!(!result.judgements[0].passes);
    }

    #[test]
    fn movement_from_a_case_needs_its_state() {
        let from_zero = Check {
            cables: Vec::new(),
            nodes: vec![NodeId::new(1)],
            ..check(CheckKind::Movement {
                limit: MovementLimit::Length(0.02),
                from: Some(0),
            })
        };
        let found = |base: CaseDigest, digest: &CaseDigest| {
            let bases = [Base { case: 0, digest: base }];
            with_against(|against| {
                let against = Against {
                    bases: &bases,
                    ..*against
                };
                let mut tally = CheckTally::new(&from_zero, &against);
                tally.add(&from_zero, &against, 1, digest);
                tally.finish(&from_zero, Vec::new())
            })
        };
        let mut moved = digest(&[1.0; 3]);
        moved.positions[1] += Vector3::new(0.0, 0.03, 0.04);
        let result = found(digest(&[1.0; 3]), &moved);
        assert!((result.judgements[0].demand - 0.05).abs() < 1e-15 && !result.judgements[0].passes);
        let lack = |result: CheckResult| result.not_judged[0].1;
        assert_eq!(lack(found(CaseDigest::default(), &moved)), Lack::Base);
        // A design effect has no places.
        moved.positions.clear();
        assert_eq!(lack(found(digest(&[1.0; 3]), &moved)), Lack::State);
        let mut loose = digest(&[1.0; 3]);
        loose.loose_nodes = vec![NodeId::new(1)];
        assert_eq!(lack(found(loose, &digest(&[1.0; 3]))), Lack::Place);
    }

    #[test]
    fn anchor_pull_needs_a_support() {
        let mut digests = [digest(&[1.0; 3]), digest(&[1.0; 3])];
        digests[0].support_forces[0] = Some(Vector3::new(0.0, 0.0, -900.0));
        digests[1].support_forces[0] = Some(Vector3::new(480.0, 640.0, 0.0));
        let check = Check {
            cables: Vec::new(),
            nodes: vec![NodeId::new(0), NodeId::new(1)],
            struts: vec![StrutId::new(0)],
            ..check(CheckKind::AnchorPull(PullLimits {
                resultant: Some(1000.0),
                ..PullLimits::default()
            }))
        };
        let result = judge(&check, &digests);
        let unjudged = [
            (Covered::Strut(StrutId::new(0)), Lack::Support),
            (Covered::Node(NodeId::new(1)), Lack::Support),
        ];
        assert_eq!(result.not_judged, unjudged);
        assert_eq!(
            (result.judgements[0].demand, result.judgements[0].case),
            (900.0, Some(0))
        );
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
        assert_eq!((worst.case, worst.segment), (Some(0), Some(SegmentId::new(1))));
    }

    #[test]
    fn the_worst_ratio_of_one_case() {
        let check = check(CheckKind::Safety { factor: 3.0 });
        let mut digest = digest(&[1000.0, 2000.0, 3000.0]);
        let ratio = |digest: &CaseDigest| with_against(|against| worst_ratio(against, &check, 1, digest));
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
