//! Sizes that the server takes.

use prost::Message;
use ropewalk_api::ropewalk::v1;

use super::findings::{Findings, Path};
use super::motions::{MOST_PIECES, PIECES_DEFAULT};
use super::net::NetDraft;
use super::reasons;
use crate::config::Limits;

/// Skins and zones: each zone is compared with each panel.
const MOST_AREAS: u32 = 1000;
/// Classes of actions: each is compared with each where they make too many cases.
const MOST_CLASSES: u32 = 1000;
/// Motions of a brief.
const MOST_MOTIONS: u32 = 100;
/// Loads of all motions that vary in time, times nodes and segments of the net: each is written out for all of them.
const MOST_DRIVEN: usize = 20_000_000;
/// Bytes of one element of a list: it must fit a message from the server, which stays below 1 MiB.
pub(super) const LARGEST_ELEMENT: usize = 900 * 1024;
/// Bytes of what a frozen brief says in one message: title, remarks, labels, the actions of the reference state, factors.
const LARGEST_HEAD: usize = 128 * 1024;

/// Refuses lists that are too long, before anything is made of them. Answers whether to go on.
pub(crate) fn counts(brief: &v1::Brief, limits: &Limits, findings: &mut Findings) -> bool {
    let mut fits = most(findings, "cases", "cases", brief.cases.len(), limits.cases);
    fits &= most(findings, "motions", "motions", brief.motions.len(), MOST_MOTIONS);
    let rules = brief.combinations.len();
    fits &= most(findings, "combinations", "rules", rules, limits.cases);
    let classes = brief.factors.as_ref().map_or(0, |factors| factors.classes.len());
    fits &= most(findings, "factors.classes", "classes of actions", classes, MOST_CLASSES);
    if let Some(v1::brief::NetSource::Net(net)) = &brief.net_source {
        fits &= most(findings, "net.nodes", "nodes", net.nodes.len(), limits.nodes);
        let paths: usize = net.cables.iter().map(|cable| cable.nodes.len().saturating_sub(1)).sum();
        let segments = paths + net.struts.len();
        fits &= most(findings, "net", "segments", segments, limits.segments);
        fits &= motions(brief, net, segments, limits, findings);
        // What describes members need not be more than they can be.
        fits &= most(
            findings,
            "net.sections",
            "sections",
            net.sections.len(),
            limits.segments,
        );
        fits &= most(findings, "net.roles", "roles", net.roles.len(), limits.segments);
        fits &= most(findings, "net.cables", "cables", net.cables.len(), limits.segments);
        fits &= most(findings, "net.groups", "groups", net.groups.len(), limits.segments);
        fits &= most(findings, "net.panels", "panels", net.panels.len(), limits.segments);
        fits &= most(findings, "net.skins", "skins", net.skins.len(), MOST_AREAS);
        fits &= most(findings, "net.zones", "zones", net.zones.len(), MOST_AREAS);
    }
    fits
}

/// Refuses motions whose hanging ropes would be divided into too many pieces, or on which too many loads act.
fn motions(brief: &v1::Brief, net: &v1::Net, segments: usize, limits: &Limits, findings: &mut Findings) -> bool {
    let hanging: usize = (net.cables.iter().filter(|cable| cable.hangs.is_some()))
        .map(|cable| cable.nodes.len().saturating_sub(1))
        .sum();
    let list = Path::root("motions");
    let (mut fits, mut loaded) = (true, 0_usize);
    for (place, motion) in brief.motions.iter().enumerate() {
        let pieces = motion.pieces_of_hanging.unwrap_or(PIECES_DEFAULT);
        // Numbers out of their range have an error of their own.
        let more = hanging.saturating_mul(pieces.clamp(1, MOST_PIECES) as usize - 1);
        let count = segments.saturating_add(more);
        let size = count.saturating_add(net.nodes.len()).saturating_add(more);
        let before = loaded;
        loaded = loaded.saturating_add(motion.driven.len().saturating_mul(size));
        fits &= driven(motion, (before, loaded), &list.element(&motion.id, place), findings);
        if count <= limits.segments as usize || segments > limits.segments as usize {
            continue;
        }
        fits = false;
        findings
            .error(
                reasons::TOO_MANY,
                &list.element(&motion.id, place).field("pieces_of_hanging"),
                &motion.id,
                format!(
                    "with {hanging} hanging segments in {pieces} pieces each the net that moves has {count} segments: \
                     this server takes {}",
                    limits.segments
                ),
                "give a smaller number of pieces, or take hangs out of ropes that are nearly straight",
            )
            .value(count);
    }
    fits
}

/// Refuses too many loads that vary in time; `before`, `after`: what they come to without those of this motion, and with them.
fn driven(motion: &v1::Motion, (before, after): (usize, usize), at: &Path<'_>, findings: &mut Findings) -> bool {
    if before <= MOST_DRIVEN && after > MOST_DRIVEN {
        findings
            .error(
                reasons::TOO_MANY,
                &at.field("driven"),
                &motion.id,
                format!(
                    "up to here loads that vary in time, each times the nodes and segments of the net that moves, come to \
                     {after}: at most {MOST_DRIVEN} are taken"
                ),
                "gather what varies alike in one action, or leave out motions",
            )
            .value(motion.driven.len());
    }
    after <= MOST_DRIVEN
}

/// Refuses nets with too many nodes, those that only paths name counted.
pub(crate) fn nodes(net: &NetDraft<'_>, limits: &Limits, findings: &mut Findings) {
    if net.message.nodes.len() <= limits.nodes as usize {
        most(findings, "net", "nodes", net.nodes.len(), limits.nodes);
    }
}

fn most(findings: &mut Findings, path: &str, what: &str, count: usize, limit: u32) -> bool {
    let fits = count <= limit as usize;
    if !fits {
        findings
            .error(
                reasons::TOO_MANY,
                &Path::root(path),
                "",
                format!("{count} {what}: this server takes {limit}"),
                "send a smaller brief, or ask for a server with higher limits; GetInfo tells them",
            )
            .value(count);
    }
    fits
}

/// Refuses elements that no message from the server could repeat.
pub(crate) fn elements(brief: &v1::Brief, findings: &mut Findings) {
    fn each<M: Message>(list: &str, elements: &[M], id: impl Fn(&M) -> &str, findings: &mut Findings) {
        let list = Path::root(list);
        for (number, element) in elements.iter().enumerate() {
            let size = element.encoded_len();
            if size > LARGEST_ELEMENT {
                let id = id(element);
                findings
                    .error(
                        reasons::TOO_LARGE,
                        &list.element(id, number),
                        id,
                        format!("this element takes {size} bytes: at most {LARGEST_ELEMENT} can be sent back"),
                        "split it, or use shorter ids",
                    )
                    .value(size);
            }
        }
    }
    if let Some(v1::brief::NetSource::Net(net)) = &brief.net_source {
        each("net.nodes", &net.nodes, |e| &e.id, findings);
        each("net.sections", &net.sections, |e| &e.id, findings);
        each("net.roles", &net.roles, |e| &e.id, findings);
        each("net.cables", &net.cables, |e| &e.id, findings);
        each("net.struts", &net.struts, |e| &e.id, findings);
        each("net.groups", &net.groups, |e| &e.id, findings);
        each("net.support_groups", &net.support_groups, |e| &e.id, findings);
        each("net.skins", &net.skins, |e| &e.id, findings);
        each("net.zones", &net.zones, |e| &e.id, findings);
        each("net.panels", &net.panels, |e| &e.id, findings);
    }
    each("actions", &brief.actions, |e| &e.id, findings);
    each("combinations", &brief.combinations, |_| "", findings);
    each("checks", &brief.checks, |_| "", findings);
    each("accepted", &brief.accepted, |e| &e.on, findings);
    let labels: usize = brief
        .labels
        .iter()
        .map(|(key, value)| key.len() + value.len() + 8)
        .sum();
    let notes = brief.solving.as_ref().map_or(0, |s| s.note.len())
        + brief.prestress.as_ref().map_or(0, |p| p.note.len())
        + (brief.diagnosis.iter())
            .map(|d| d.note.len() + d.about.iter().map(|id| id.len() + 4).sum::<usize>())
            .sum::<usize>()
        + brief.modes.as_ref().map_or(0, Message::encoded_len)
        + brief.frozen_from.as_ref().map_or(0, |f| f.note.len());
    let net = match &brief.net_source {
        Some(v1::brief::NetSource::Net(net)) => net.note.len(),
        _ => 0,
    };
    let under: usize = (brief.prestress.iter())
        .flat_map(|prestress| &prestress.under)
        .map(|id| id.len() + 4)
        .sum();
    let factors = brief.factors.as_ref().map_or(0, Message::encoded_len);
    let head = brief.title.len() + brief.note.len() + labels + notes + net + under + factors;
    if head > LARGEST_HEAD {
        findings
            .error(
                reasons::TOO_LARGE,
                &Path::root("note"),
                "",
                format!("title, remarks, labels, prestress.under and factors take {head} bytes: at most {LARGEST_HEAD} can be sent back"),
                "keep long texts elsewhere, and gather loads in fewer actions",
            )
            .value(head);
    }
}
