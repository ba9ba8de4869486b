//! The facts of a run, and the word on top.

use super::CheckResult;

/// The word on top: the worst of what is true.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Verdict {
    /// Everything covered was judged and keeps within its limits.
    Passes,
    /// Nothing exceeds, but something covered could not be judged, or nothing was covered.
    NotJudged,
    /// A limit is exceeded.
    Exceeds,
    /// A state that was asked for was not found, or the audit does not confirm it; or a motion was not followed to its end.
    NoAnswer,
}

/// So many of so many.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Share {
    /// So many,
    pub count: usize,
    /// of so many.
    pub of: usize,
}

/// The facts of a run.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Facts {
    /// Cases with a state within tolerance.
    pub answered: Share,
    /// Answered cases that the independent routine confirms, of those answered.
    pub audited: Share,
    /// Covered parts that were judged, summed over the checks.
    pub judged: Share,
    /// Judged parts that keep within their limit, of those judged.
    pub passing: Share,
    /// Motions that were followed to their end, of those asked for.
    pub motions: Share,
}

impl Facts {
    /// Counts what checks say, beside what is known of the cases.
    ///
    /// `answered`: cases with a state, of those run. `audited`: how many of these states are confirmed.
    #[must_use]
    pub fn new(answered: Share, audited: usize, checks: &[CheckResult]) -> Self {
        let judged: usize = checks.iter().map(|c| c.judged().count).sum();
        Self {
            answered,
            audited: Share {
                count: audited,
                of: answered.count,
            },
            judged: Share {
                count: judged,
                of: checks.iter().map(|c| c.judged().of).sum(),
            },
            passing: Share {
                count: checks.iter().flat_map(|c| &c.judgements).filter(|j| j.passes).count(),
                of: judged,
            },
            motions: Share::default(),
        }
    }

    /// The worst of no answer, exceeds, not judged, passes. Where nothing was judged, nothing passes.
    #[must_use]
    pub fn verdict(&self) -> Verdict {
        let falls_short = |share: Share| share.count < share.of;
        if falls_short(self.answered) || falls_short(self.audited) || falls_short(self.motions) {
            Verdict::NoAnswer
        } else if falls_short(self.passing) {
            Verdict::Exceeds
        } else if falls_short(self.judged) || self.judged.of == 0 {
            Verdict::NotJudged
        } else {
            Verdict::Passes
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_word_on_top_is_the_worst() {
        let share = |count, of| Share { count, of };
        let mut facts = Facts {
            answered: share(2, 2),
            audited: share(2, 2),
            judged: share(5, 5),
            passing: share(5, 5),
            motions: share(1, 1),
        };
        assert_eq!(facts.verdict(), Verdict::Passes);
        facts.judged = share(4, 5);
        facts.passing = share(4, 4);
        assert_eq!(facts.verdict(), Verdict::NotJudged);
        facts.passing = share(3, 4);
        assert_eq!(facts.verdict(), Verdict::Exceeds);
        facts.audited = share(1, 2);
        assert_eq!(facts.verdict(), Verdict::NoAnswer);
        facts.audited = share(2, 2);
        facts.motions = share(0, 1);
        assert_eq!(facts.verdict(), Verdict::NoAnswer);
        assert!(Verdict::NoAnswer > Verdict::Exceeds && Verdict::NotJudged > Verdict::Passes);
    }

    #[test]
    fn without_checks_nothing_passes() {
        let all = Share { count: 1, of: 1 };
        assert_eq!(Facts::new(all, 1, &[]).verdict(), Verdict::NotJudged);
    }
}
