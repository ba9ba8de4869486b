//! The end of a run: checks judged, envelopes taken, cautions listed.

use std::fmt;

use super::{Brief, ReferenceOutcome};
use crate::check::{CableEnvelope, CaseDigest, Check, CheckResult, Facts, Verdict, envelope, judge};
use crate::model::{Net, SegmentId};

/// Least and largest forces over the cases of one set.
#[derive(Clone, Debug, PartialEq)]
pub struct SetEnvelope {
    /// The set; `None` stands for all cases.
    pub set: Option<String>,
    /// Its cases, by index.
    pub cases: Vec<usize>,
    /// Its envelopes.
    pub envelope: CableEnvelope,
}

/// Something that must be shown with the results.
#[derive(Clone, Debug, PartialEq)]
pub enum Caution {
    /// With struts an equilibrium need not be the only one.
    StrutsNotUnique,
    /// Forces left to balance were not unique.
    BalanceNotUnique {
        /// Ids of the members.
        members: Vec<String>,
    },
    /// Ropes of given length are taut in the reference state and shape it.
    TautGivenLength {
        /// Ids of the cables.
        cables: Vec<String>,
    },
    /// Strains beyond what ropes bear: was `EA` given in another unit?
    LargeStrain {
        /// Id of the member.
        member: String,
        /// Its strain (–) in the reference state.
        strain: f64,
    },
    /// The shape was corrected as an elastic net, so that given force densities are met nearly only.
    ShapeCorrected,
}

/// Strain beyond which a unit slip is likelier than a rope: steel breaks at about 0.02.
const LARGE_STRAIN: f64 = 0.05;

impl fmt::Display for Caution {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let list = |names: &[String]| names.iter().map(|n| format!("\"{n}\"")).collect::<Vec<_>>().join(", ");
        match self {
            Self::StrutsNotUnique => {
                f.write_str("the net has struts: each state found is stable where it is, but need not be the only one")
            }
            Self::BalanceNotUnique { members } => write!(
                f,
                "the forces that hold the held nodes are not unique; the smallest were taken in {}",
                list(members)
            ),
            Self::TautGivenLength { cables } => {
                write!(
                    f,
                    "ropes of given length are taut in the reference state: {}",
                    list(cables)
                )
            }
            Self::LargeStrain { member, strain } => write!(
                f,
                "\"{member}\" is strained by {:.1} % in the reference state: was its EA given in another unit?",
                strain * 100.0
            ),
            Self::ShapeCorrected => f.write_str(
                "the shape found was corrected as an elastic net: given force densities are met nearly only",
            ),
        }
    }
}

/// The end of a run.
#[derive(Clone, Debug, PartialEq)]
pub struct Summary {
    /// The word on top.
    pub verdict: Verdict,
    /// The four facts behind it.
    pub facts: Facts,
    /// The checks, in the order of the brief.
    pub checks: Vec<CheckResult>,
    /// Envelopes over all cases, then over each set in order of first mention.
    pub envelopes: Vec<SetEnvelope>,
    /// What must be shown.
    pub cautions: Vec<Caution>,
}

impl Summary {
    pub(super) fn new(brief: &Brief, reference: &ReferenceOutcome, cases: &[usize], digests: &[CaseDigest]) -> Self {
        let net = &brief.net;
        let mut ran = vec![false; brief.cases.len()];
        cases.iter().for_each(|case| ran[*case] = true);
        let checks: Vec<CheckResult> = brief
            .checks
            .iter()
            .map(|check| judge(net, &reference.state, &over(check, |case| ran[case]), digests))
            .collect();
        let of_run: Vec<CaseDigest> = cases.iter().map(|case| digests[*case].clone()).collect();
        let facts = Facts::new(&of_run, &checks);
        Self {
            verdict: if reference.result.audit.passed {
                facts.verdict()
            } else {
                Verdict::NoAnswer
            },
            facts,
            checks,
            envelopes: envelopes(brief, &ran, digests),
            cautions: cautions(net, reference),
        }
    }
}

/// The check, over those of its cases that the test picks.
fn over(check: &Check, picks: impl Fn(usize) -> bool) -> Check {
    let mut over = check.clone();
    over.cases.retain(|case| picks(*case));
    over
}

/// Worst ratio, in one case, of the checks that cover it (–).
pub(super) fn worst_ratio(
    brief: &Brief,
    reference: &ReferenceOutcome,
    case: usize,
    digest: &CaseDigest,
) -> Option<f64> {
    let mut digests = vec![CaseDigest::default(); brief.cases.len()];
    digests[case] = digest.clone();
    let checks = brief.checks.iter().filter(|check| check.cases.contains(&case));
    checks
        .filter_map(|check| {
            let result = judge(
                &brief.net,
                &reference.state,
                &over(check, |other| other == case),
                &digests,
            );
            result.worst().map(|worst| worst.ratio)
        })
        .reduce(f64::max)
}

fn envelopes(brief: &Brief, ran: &[bool], digests: &[CaseDigest]) -> Vec<SetEnvelope> {
    let all = (0..brief.cases.len()).filter(|case| ran[*case]);
    let mut sets: Vec<(Option<String>, Vec<usize>)> = vec![(None, all.collect())];
    for (index, case) in brief.cases.iter().enumerate().filter(|(index, _)| ran[*index]) {
        for set in &case.sets {
            match sets.iter_mut().find(|(name, _)| name.as_ref() == Some(set)) {
                Some((_, cases)) => cases.push(index),
                None => sets.push((Some(set.clone()), vec![index])),
            }
        }
    }
    sets.into_iter()
        .map(|(set, cases)| SetEnvelope {
            set,
            envelope: envelope(&brief.net, digests, &cases),
            cases,
        })
        .collect()
}

fn cautions(net: &Net, reference: &ReferenceOutcome) -> Vec<Caution> {
    let report = &reference.report;
    let names = |segments: &[SegmentId]| {
        let mut names: Vec<String> = segments.iter().map(|s| net.member_name(*s).to_owned()).collect();
        names.dedup();
        names
    };
    let mut cautions = Vec::new();
    if !net.is_pure_tension() {
        cautions.push(Caution::StrutsNotUnique);
    }
    if let Some(balance) = report.balance.as_ref().filter(|b| !b.unique) {
        cautions.push(Caution::BalanceNotUnique {
            members: names(&balance.segments),
        });
    }
    if !report.taut_given_lengths.is_empty() {
        cautions.push(Caution::TautGivenLength {
            cables: names(&report.taut_given_lengths),
        });
    }
    if let Some((segment, strain)) = report.largest_strain.filter(|(_, strain)| strain.abs() > LARGE_STRAIN) {
        cautions.push(Caution::LargeStrain {
            member: net.member_name(segment).to_owned(),
            strain,
        });
    }
    if report.polished {
        cautions.push(Caution::ShapeCorrected);
    }
    cautions
}
