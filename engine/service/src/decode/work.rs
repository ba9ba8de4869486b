//! The work of a brief without errors.

use std::collections::HashSet;

use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{Brief, EffectRule, SizingOutcome};
use ropewalk_numerics::model::Member;

use super::cases::{REFERENCE, in_words};
use super::findings::{Path, accepts};
use super::keep::Kept;
use super::limits::LARGEST_ELEMENT;
use super::motion_words;
use super::names::nearest;
use super::reasons;
use super::sections::Sections;
use super::sizing::SizingWork;
use super::supports::Supports;
use crate::words::{Quoted, number, shown};

/// The brief for the kernel, the message that it came from, and what results need of it.
#[derive(Clone, Debug)]
pub struct Work {
    /// The work.
    pub brief: Brief,
    /// The message as it was sent.
    pub message: v1::Brief,
    /// Digest of the message.
    pub digest: String,
    /// Whether lengths come from a frozen brief.
    pub frozen: bool,
    names: Names,
    /// Doubts and notes of the brief; a run repeats them.
    findings: Vec<v1::Finding>,
}

/// What results need of the message beside the domain.
#[derive(Clone, Debug)]
pub(crate) struct Names {
    /// Nodes in model order whose given position is where their springs are at rest.
    keeps_position: Vec<bool>,
    /// Where the breaking force of each segment comes from; empty: not told.
    breaking_force_origins: Vec<String>,
    /// Sections that are to be chosen, if any.
    sizing: Option<SizingWork>,
    /// Which states are told with their arrays; all, where the brief does not say.
    kept: Option<Kept>,
}

/// What of a brief is run, in brief order.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Selected {
    /// Cases.
    pub cases: Vec<usize>,
    /// Motions.
    pub motions: Vec<usize>,
}

impl Names {
    pub(crate) fn new(
        sections: &Sections<'_>,
        supports: &Supports,
        sizing: Option<SizingWork>,
        kept: Option<Kept>,
    ) -> Self {
        let origins = sections.of_segment.iter().map(|section| match section {
            Some((section, _)) => sections.list[*section].message.breaking_force_origin.clone(),
            None => String::new(),
        });
        Self {
            keeps_position: supports.is_elastic.clone(),
            breaking_force_origins: origins.collect(),
            sizing,
            kept,
        }
    }
}

impl Work {
    pub(crate) fn new(
        brief: Brief,
        message: v1::Brief,
        digest: String,
        names: Names,
        findings: &[v1::Finding],
    ) -> Self {
        Self {
            frozen: message.frozen_from.is_some(),
            brief,
            message,
            digest,
            names,
            findings: findings.to_vec(),
        }
    }

    /// Which states are told with their arrays; `None`: all.
    #[must_use]
    pub fn kept(&self) -> Option<&Kept> {
        self.names.kept.as_ref()
    }

    /// Sections that are to be chosen, if any.
    #[must_use]
    pub fn sizing(&self) -> Option<&SizingWork> {
        self.names.sizing.as_ref()
    }

    /// Why the brief cannot be frozen, if so: sections that are still to be chosen, or a motion that no message could repeat.
    pub(crate) fn refuse_to_freeze(&self) -> Option<v1::Finding> {
        let motions = self.message.motions.iter();
        let mut large = motions.filter(|motion| motion.encoded_len() > LARGEST_ELEMENT);
        if let Some(motion) = large.next() {
            let size = motion.encoded_len();
            return Some(v1::Finding {
                severity: v1::FindingSeverity::Error.into(),
                reason: reasons::TOO_LARGE.to_owned(),
                path: Path::root("motions").key(&motion.id).to_string(),
                id: shown(&motion.id),
                value: size.to_string(),
                message: format!(
                    "motion {} takes {size} bytes: at most {LARGEST_ELEMENT} can be sent back",
                    Quoted(&motion.id)
                ),
                cure: "freeze the brief without its motions, and put them in again".to_owned(),
                ..v1::Finding::default()
            });
        }
        self.names.sizing.as_ref().map(|_| v1::Finding {
            severity: v1::FindingSeverity::Error.into(),
            reason: reasons::NOT_SERVED.to_owned(),
            path: "sizing".to_owned(),
            message: "a brief whose sections are still to be chosen cannot be frozen".to_owned(),
            cure: "run it, write the chosen sections into the brief, and take sizing out".to_owned(),
            ..v1::Finding::default()
        })
    }

    /// The work with the sections that were chosen.
    #[must_use]
    pub fn sized(&self, outcome: &SizingOutcome) -> Self {
        let mut work = self.clone();
        work.brief = outcome.brief.clone();
        if let Some(sizing) = &self.names.sizing {
            let units = sizing.given.units.iter().zip(&sizing.choices).zip(&outcome.choice);
            for ((unit, names), position) in units {
                let (_, origin) = &names.sections[*position];
                for segment in &unit.segments {
                    work.names.breaking_force_origins[segment.index()].clone_from(origin);
                }
            }
        }
        work
    }

    /// Cases that sets, cases and design effects in `only` name, those that effects need included, and the motions that it
    /// names; all of both where it is empty. The word `reference` names none.
    ///
    /// # Errors
    /// A finding for the first name that is none of these.
    #[allow(
        clippy::result_large_err,
        reason = "the finding goes straight into the refusal, once a call"
    )]
    pub fn select(&self, only: &[String]) -> Result<Selected, v1::Finding> {
        let Brief {
            cases,
            effects,
            motions,
            ..
        } = &self.brief;
        if only.is_empty() {
            return Ok(Selected {
                cases: (0..cases.len()).collect(),
                motions: (0..motions.len()).collect(),
            });
        }
        let mut wanted = vec![false; cases.len()];
        let mut wanted_motions = vec![false; motions.len()];
        for (number, name) in only.iter().enumerate() {
            let mut found = name == REFERENCE;
            for (case, wanted) in cases.iter().zip(&mut wanted) {
                if case.name == *name || case.sets.contains(name) {
                    *wanted = true;
                    found = true;
                }
            }
            for effect in effects {
                if effect.name == *name || effect.sets.contains(name) {
                    effect.cases().for_each(|case| wanted[case] = true);
                    found = true;
                }
            }
            for (motion, wanted) in motions.iter().zip(&mut wanted_motions) {
                if motion.name == *name {
                    *wanted = true;
                    found = true;
                }
            }
            if !found {
                let known = cases.iter().map(|case| (&case.sets, &case.name));
                let known = known.chain(effects.iter().map(|effect| (&effect.sets, &effect.name)));
                let known = known.flat_map(|(sets, name)| sets.iter().chain([name]));
                let known = known.chain(motions.iter().map(|motion| &motion.name));
                let meant = nearest(name, known.map(String::as_str));
                let question = meant.map_or(String::new(), |meant| format!(" Did you mean {}?", Quoted(meant)));
                return Err(v1::Finding {
                    severity: v1::FindingSeverity::Error.into(),
                    reason: reasons::UNKNOWN_ID.to_owned(),
                    path: format!("only[{number}]"),
                    id: shown(name),
                    value: shown(name),
                    message: format!("there is no set, case or motion {}.{question}", Quoted(name)),
                    cure: "name sets, cases or motions of the brief, or none for all of them".to_owned(),
                    ..v1::Finding::default()
                });
            }
        }
        let named = |wanted: Vec<bool>| (0..wanted.len()).filter(|place| wanted[*place]).collect();
        Ok(Selected {
            cases: named(wanted),
            motions: named(wanted_motions),
        })
    }

    /// What acts in a case, in words.
    #[must_use]
    pub fn in_words(&self, case: usize) -> String {
        in_words(&self.brief.cases[case], &self.message.actions, &|member| {
            self.member_name(member)
        })
    }

    /// Name of a state: a case, or the reference state.
    pub(crate) fn state_name(&self, state: Option<usize>) -> &str {
        state.map_or(REFERENCE, |case| &self.brief.cases[case].name)
    }

    /// What acts and happens in a motion, in words.
    #[must_use]
    pub fn motion_in_words(&self, motion: usize) -> String {
        motion_words::in_words(&self.brief, motion)
    }

    /// Ids of what a case takes out.
    pub(crate) fn removed(&self, case: usize) -> Vec<&str> {
        let removed = self.brief.cases[case].removed.iter();
        removed.map(|member| self.member_name(*member)).collect()
    }

    pub(crate) fn member_name(&self, member: Member) -> &str {
        let net = &self.brief.net;
        match member {
            Member::Cable(cable) => &net.cables()[cable.index()].name,
            Member::Strut(strut) => &net.struts()[strut.index()].name,
        }
    }

    /// What a design effect is, in words.
    #[must_use]
    pub fn effect_in_words(&self, effect: usize) -> String {
        let effect = &self.brief.effects[effect];
        let of = |position: usize| self.in_words(effect.terms[position].0);
        match effect.rule {
            EffectRule::Loss { factor } => {
                format!("({}) and {} times what changes to ({})", of(0), number(factor), of(1))
            }
            EffectRule::OnEffect { factor } => format!("{} of ({})", number(factor), of(0)),
            EffectRule::OnParts { permanent, variable } => format!(
                "{} of ({}) and {} of what changes to ({})",
                number(permanent),
                of(0),
                number(variable),
                of(1)
            ),
        }
    }

    /// What acts in the reference state, in words.
    #[must_use]
    pub fn reference_in_words(&self) -> String {
        let under = &self.brief.prestress.under;
        let actions = under
            .iter()
            .map(|action| format!("1 {}", self.brief.actions[*action].name));
        let words: Vec<String> = actions.collect();
        if words.is_empty() {
            "prestress alone".to_owned()
        } else {
            format!("prestress under {}", words.join(" + "))
        }
    }

    /// Marks a doubt of a result as accepted where the brief says so.
    pub(crate) fn accept(&self, finding: &mut v1::Finding) {
        if let Some(accepted) = self.message.accepted.iter().find(|accepted| accepts(accepted, finding)) {
            finding.accepted_note.clone_from(&accepted.note);
        }
    }

    /// Findings of the brief itself.
    pub(crate) fn findings(&self) -> &[v1::Finding] {
        &self.findings
    }

    /// Whether the given place of a node is where its springs are at rest, so that it must not be written over.
    pub(crate) fn keeps_position(&self, node: usize) -> bool {
        self.names.keeps_position[node]
    }

    /// Ids of the panels that the brief gives one by one; all others are meshes of ropes.
    pub(crate) fn given_panels(&self) -> HashSet<&str> {
        match &self.message.net_source {
            Some(v1::brief::NetSource::Net(net)) => net.panels.iter().map(|panel| panel.id.as_str()).collect(),
            _ => HashSet::new(),
        }
    }

    /// Where the breaking force of a segment comes from, if the brief tells.
    pub(crate) fn breaking_force_origin(&self, segment: usize) -> Option<&str> {
        Some(self.names.breaking_force_origins[segment].as_str()).filter(|origin| !origin.is_empty())
    }
}
