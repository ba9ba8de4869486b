//! The end of a run: what checks and envelopes came to, and what must be said with it.

use std::fmt;

use super::{FactorRules, Loss, ReferenceOutcome};
use crate::check::{AnchorExtremes, CheckResult, Envelope, Extreme, Facts, Verdict};
use crate::model::{Net, SegmentId};

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
    /// Skins have no stiffness here.
    SkinsPassLoad,
    /// Ropes slide against friction, which depends on the path of the loads.
    FrictionDependsOnPath {
        /// Ids of the ropes.
        cables: Vec<String>,
    },
    /// The shape was corrected as an elastic net, so that given force densities are met nearly only.
    ShapeCorrected,
    /// Motions were run: no check judges them, and some of what they say is assumed.
    MotionsNotJudged,
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
            Self::FrictionDependsOnPath { cables } => write!(
                f,
                "friction where ropes slide depends on the order in which loads come and go; each case is reached in one go \
                 from the reference state, which has none: {}",
                list(cables)
            ),
            Self::SkinsPassLoad => f.write_str(
                "skins only pass load to the ropes at the corners of their panels: they have no stiffness and no \
                 prestress here, and are not judged",
            ),
            Self::ShapeCorrected => f.write_str(
                "the shape found was corrected as an elastic net: given force densities are met nearly only",
            ),
            Self::MotionsNotJudged => f.write_str(
                "motions are not judged by checks: an engineer compares their peaks with resistances; damping and times of \
                 release are as given, mass is lumped at nodes, loads have none of their own, skins only pass load, and \
                 nothing slides",
            ),
        }
    }
}

/// The end of a run.
#[derive(Clone, Debug, PartialEq)]
pub struct Summary {
    /// The word on top.
    pub verdict: Verdict,
    /// The facts behind it.
    pub facts: Facts,
    /// The checks, in the order of the brief.
    pub checks: Vec<CheckResult>,
    /// Envelope of every segment over the reference state and the sound cases.
    pub envelopes: Vec<Envelope>,
    /// The same over the reference state and the sound cases of each of [`super::Brief::envelopes`].
    pub set_envelopes: Vec<Vec<Envelope>>,
    /// What the loss of each member that some case takes out came to, in the order in which cases name them.
    pub losses: Vec<Loss>,
    /// Which way to factor a predominant action governs, where design effects stand beside cases.
    pub factor_rules: Option<FactorRules>,
    /// Largest movement of every node from the reference state (m), over the sound cases.
    pub movements: Vec<Extreme>,
    /// Pulls on every anchor over the reference state and the sound cases, in the order of the support forces.
    pub anchors: Vec<AnchorExtremes>,
    /// What must be shown.
    pub cautions: Vec<Caution>,
}

pub(super) fn cautions(net: &Net, reference: &ReferenceOutcome) -> Vec<Caution> {
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
    if !net.panels().is_empty() {
        cautions.push(Caution::SkinsPassLoad);
    }
    if net.has_friction() {
        let reaches = net
            .reaches()
            .iter()
            .filter(|reach| reach.friction.iter().any(|mu| *mu > 0.0));
        let mut cables: Vec<String> = reaches
            .map(|reach| net.cables()[reach.cable.index()].name.clone())
            .collect();
        cables.dedup();
        cautions.push(Caution::FrictionDependsOnPath { cables });
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
