//! A brief, read as a whole.

use std::sync::Arc;

use nalgebra::Vector3;
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{Brief, Check, Prestress};
use ropewalk_numerics::model::{CableGiven, Member, Net, NetGiven, NodeGiven, NodeId, StrutGiven, SupportGiven};
use ropewalk_numerics::shape::first_shape;

use super::actions::Actions;
use super::adjusters::Adjusters;
use super::cases::{Cases, LARGEST, in_words};
use super::checks::CheckDraft;
use super::covered::Covered;
use super::digest::digest;
use super::factors::Factors;
use super::findings::{Findings, Path, is_id};
use super::motions::MotionDraft;
use super::names::bad_id;
use super::net::NetDraft;
use super::resolved::Resolved;
use super::scope::Scopes;
use super::sections::Sections;
use super::slides::Slides;
use super::supports::Supports;
use super::surface::SurfaceDraft;
use super::work::{Names, Work};
use super::{
    accepted, checks, combinations, diagnosis, frozen, keep, limits, modes, motion_net, motions, not_served, plausible,
    prestress, reasons, sizing, solving,
};
use crate::config::Limits;
use crate::words::shown;

/// What came of reading a brief.
#[derive(Debug)]
pub struct Reading {
    /// Digest of the brief.
    pub digest: String,
    /// Everything that is wrong, odd or worth knowing: errors first.
    pub findings: Vec<v1::Finding>,
    /// Values that the brief left to defaults, roles and rules.
    pub resolved: Vec<v1::ResolvedValue>,
    /// The cases in words, in brief order.
    pub cases: Vec<v1::CaseInWords>,
    /// The work, where there are no errors.
    pub work: Option<Work>,
}

/// Reads a brief.
#[must_use]
pub fn read(brief: v1::Brief, limits: &Limits) -> Reading {
    let mut findings = Findings::default();
    let mut resolved = Resolved::default();
    let digest = digest(&brief);
    let parts = read_parts(&brief, limits, &mut findings, &mut resolved);
    let (cases, built) = match parts {
        Some(parts) => {
            let built = parts.work.and_then(|(unbuilt, names)| {
                let built = unbuilt.build(&mut findings, &mut resolved);
                built.map(|domain| {
                    plausible::ratios(&domain.net, &mut findings);
                    (domain, names)
                })
            });
            (parts.words, built)
        }
        None => (Vec::new(), None),
    };
    accepted::read(&brief.accepted, &mut findings);
    let work = built.filter(|_| !findings.has_errors());
    let findings = findings.into_list();
    let work = work.map(|(domain, names)| Work::new(domain, brief, digest.clone(), names, &findings));
    Reading {
        digest,
        findings,
        resolved: resolved.into_list(),
        cases,
        work,
    }
}

/// A brief of the kernel whose net is not built yet.
struct Unbuilt {
    net: NetGiven,
    surface: SurfaceDraft,
    checks: Vec<CheckDraft>,
    motions: Vec<MotionDraft>,
    /// Nodes that can move.
    movable: Vec<bool>,
    rest: Box<dyn FnOnce(Arc<Net>, Vec<Check>) -> Brief>,
    prestress: Prestress,
}

impl Unbuilt {
    fn build(self, findings: &mut Findings, resolved: &mut Resolved) -> Option<Brief> {
        let net = Net::new(self.net).map_err(|errors| {
            // The border checks everything that the model does; should it ever not, the model has the last word.
            for error in errors {
                findings.error(
                    reasons::OUT_OF_RANGE,
                    &Path::root("net"),
                    "",
                    error.to_string(),
                    "mend this part of the net",
                );
            }
        });
        let net = Arc::new(net.ok()?);
        // Without a first shape there is no reference state either, and the run tells why.
        let first = (!self.surface.is_empty())
            .then(|| first_shape(&net, &self.prestress).ok())
            .flatten();
        let Some(first) = first else {
            let checks = self.checks.into_iter().map(CheckDraft::without_panels).collect();
            let mut brief = (self.rest)(net, checks);
            // Of a net without panels all is known that motions ask for.
            let anywhere = vec![Vector3::zeros(); brief.net.nodes().len()];
            let positions = self.surface.is_empty().then_some(&anywhere[..]);
            complete_motions(&mut brief, self.motions, positions, &self.movable, findings);
            return Some(brief);
        };
        let net = self.surface.complete((*net).clone(), &first, findings, resolved)?;
        let surface = &self.surface;
        let checks = self.checks.into_iter();
        let checks = checks.map(|draft| draft.with_panels(surface, &net, &first)).collect();
        let mut brief = (self.rest)(Arc::new(net), checks);
        self.surface.tell_actions(&brief.net, &first, &brief.actions, findings);
        complete_motions(&mut brief, self.motions, Some(&first), &self.movable, findings);
        Some(brief)
    }
}

fn complete_motions(
    brief: &mut Brief,
    drafts: Vec<MotionDraft>,
    positions: Option<&[Vector3<f64>]>,
    movable: &[bool],
    findings: &mut Findings,
) {
    brief.motions = motion_net::complete(drafts, &brief.net, positions, &brief.cases, movable, findings);
}

struct Parts {
    words: Vec<v1::CaseInWords>,
    work: Option<(Unbuilt, Names)>,
}

/// The sets of a case; the first of them where they are so many that the case is refused: the report shall fit its
/// messages all the same.
fn first_sets(sets: &[String]) -> Vec<String> {
    let mut room = LARGEST;
    let fits = sets.iter().take_while(|set| match room.checked_sub(set.len() + 2) {
        Some(left) => {
            room = left;
            true
        }
        None => false,
    });
    fits.cloned().collect()
}

fn read_parts(brief: &v1::Brief, limits: &Limits, findings: &mut Findings, resolved: &mut Resolved) -> Option<Parts> {
    if !is_id(&brief.id) {
        bad_id(findings, &Path::root("id"), &brief.id);
    }
    not_served::refuse(brief, findings);
    if !limits::counts(brief, limits, findings) {
        return None;
    }
    limits::elements(brief, findings);
    let settings = solving::read(brief.solving.as_ref(), findings, resolved);
    let message = match &brief.net_source {
        Some(v1::brief::NetSource::Net(net)) => net,
        Some(v1::brief::NetSource::StoredNet(_)) => return None,
        None => {
            findings.error(
                reasons::MISSING,
                &Path::root("net"),
                "",
                "the brief has no net",
                "give the net in the field net",
            );
            return None;
        }
    };
    let net = NetDraft::read(message, findings, resolved);
    limits::nodes(&net, limits, findings);
    let sections = Sections::read(&net, findings, resolved);
    let supports = Supports::read(&net, findings);
    let scopes = Scopes::read(&net, findings);
    let surface = SurfaceDraft::read(&net, &scopes, &supports, findings);
    let slides = Slides::read(&net, findings);
    let adjusters = Adjusters::read(&net, &slides, findings, resolved);
    let actions = Actions::read(
        &brief.actions,
        &net,
        &sections,
        &scopes,
        &supports,
        &adjusters,
        findings,
        resolved,
    );
    let prestress = prestress::read(
        brief.prestress.as_ref(),
        &prestress::Context {
            net: &net,
            scopes: &scopes,
            sections: &sections,
            supports: &supports,
            actions: &actions,
        },
        findings,
        resolved,
    );
    let context = combinations::Context {
        net: &net,
        scopes: &scopes,
        actions: &actions,
        under: &prestress.under,
        limits,
    };
    let factors = brief.factors.as_ref();
    let factors = factors.map(|factors| Factors::read(factors, &actions, findings, resolved));
    let mut cases = Cases::read(brief, &context, findings, resolved);
    combinations::read(brief, factors.as_ref(), &context, &mut cases, findings, resolved);
    let driven = motions::driven_actions(&brief.motions, &actions);
    cases.doubts(&context, factors.as_ref(), &driven, findings);
    adjusters.check_travel(&cases.list, &actions.adjustments, findings);
    let checks = checks::read(
        &brief.checks,
        &checks::Context {
            net: &net,
            scopes: &scopes,
            sections: &sections,
            supports: &supports,
            cases: &cases,
        },
        findings,
        resolved,
    );
    let diagnosis = diagnosis::read(brief.diagnosis.as_ref(), &cases, findings, resolved);
    let modes = modes::read(
        brief.modes.as_ref(),
        &modes::Context {
            net: &net,
            scopes: &scopes,
            cases: &cases,
        },
        findings,
        resolved,
    );
    let motions = motions::read(
        &brief.motions,
        &motions::Context {
            net: &net,
            scopes: &scopes,
            supports: &supports,
            slides: &slides,
            actions: &actions,
            under: &prestress.under,
            cases: &cases,
            covered: Covered::default(),
        },
        findings,
        resolved,
    );
    plausible::sections(&net, findings);
    plausible::extent(&net, findings);
    plausible::prestress(&net, &sections, &prestress, findings);
    plausible::unused_data(brief, &net, findings);
    frozen::read(brief.frozen_from.as_ref(), &net, &sections, &prestress, findings);

    let member_name = |member| match member {
        Member::Cable(cable) => net.cables[cable.index()].message.id.as_str(),
        Member::Strut(strut) => net.struts[strut.index()].message.id.as_str(),
    };
    let words = (cases.list.iter())
        .map(|case| v1::CaseInWords {
            case: shown(&case.name),
            in_words: in_words(case, &brief.actions, &member_name),
            sets: first_sets(&case.sets),
        })
        .collect();
    let sizing = sizing::read(
        brief.sizing.as_ref(),
        &sizing::Context {
            net: &net,
            scopes: &scopes,
            sections: &sections,
            has_checks: !brief.checks.is_empty(),
        },
        findings,
        resolved,
    );
    let (kept, envelopes) = keep::read(brief.keep.as_ref(), &cases, findings);
    let names = Names::new(&sections, &supports, sizing, kept);
    let movable = (0..net.nodes.len()).map(|node| !supports.holds(node)).collect();
    let given = (!findings.has_errors())
        .then(|| net_given(&net, &sections, &slides, supports))
        .flatten();
    let (actions, cases, effects) = (actions.list, cases.list, cases.effects);
    let work = given.map(|net| {
        let kept = prestress.clone();
        let rest = move |net, checks| Brief {
            net,
            prestress,
            actions,
            cases,
            effects,
            checks,
            diagnosis,
            modes,
            motions: Vec::new(),
            envelopes,
            settings,
        };
        let unbuilt = Unbuilt {
            net,
            surface,
            checks,
            motions,
            movable,
            rest: Box::new(rest),
            prestress: kept,
        };
        (unbuilt, names)
    });
    Some(Parts { words, work })
}

fn net_given(net: &NetDraft<'_>, sections: &Sections<'_>, slides: &Slides, supports: Supports) -> Option<NetGiven> {
    let nodes = net.nodes.iter().zip(supports.of_node);
    let nodes = nodes.map(|(node, support)| NodeGiven {
        name: node.id.to_owned(),
        position: node.position,
        support: support.map(|support| SupportGiven {
            released: support.released,
        }),
        attached_mass: node.attached_mass,
    });
    let cables = net.cables.iter().zip(&slides.of_cable).map(|(cable, slides)| {
        let segments = cable.first_segment..cable.first_segment + cable.n_segments();
        Some(CableGiven {
            name: cable.message.id.clone(),
            path: cable.path.iter().copied().map(NodeId::new).collect(),
            sections: segments
                .map(|segment| sections.section(segment))
                .collect::<Option<_>>()?,
            slides: slides.clone(),
            hangs: cable.message.hangs.is_some(),
        })
    });
    let struts = net.struts.iter().map(|strut| {
        Some(StrutGiven {
            name: strut.message.id.clone(),
            ends: strut.ends?.map(NodeId::new),
            section: sections.section(strut.segment)?,
        })
    });
    Some(NetGiven {
        nodes: nodes.collect(),
        cables: cables.collect::<Option<_>>()?,
        struts: struts.collect::<Option<_>>()?,
        elastic_supports: supports.elastic,
        ..NetGiven::default()
    })
}
