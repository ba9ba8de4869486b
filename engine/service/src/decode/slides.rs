//! Ropes that slide through nodes, and the reaches that this leaves.

use ropewalk_numerics::model::Slide;

use super::findings::{Findings, Path};
use super::names::Thing;
use super::net::{CableDraft, NetDraft};
use super::numbers::{Of, ROPE_FRICTION};
use super::reasons;
use crate::words::Quoted;

/// Where ropes slide, by cable.
#[derive(Debug)]
pub(crate) struct Slides {
    pub(crate) of_cable: Vec<Vec<Slide>>,
    /// Number of the first reach of every cable.
    first_reach: Vec<usize>,
}

impl Slides {
    pub(crate) fn read(net: &NetDraft<'_>, findings: &mut Findings) -> Self {
        let list = Path::root("net.cables");
        let mut slides = Self {
            of_cable: Vec::with_capacity(net.cables.len()),
            first_reach: Vec::with_capacity(net.cables.len()),
        };
        let mut reaches = 0;
        for (index, cable) in net.cables.iter().enumerate() {
            let at = list.element(&cable.message.id, index);
            let of_cable = read_cable(net, cable, &at, findings);
            slides.first_reach.push(reaches);
            reaches += cable.n_segments().saturating_sub(of_cable.len());
            slides.of_cable.push(of_cable);
        }
        slides
    }

    /// Numbers of the first and the last reach of a cable.
    pub(crate) fn outer_reaches(&self, net: &NetDraft<'_>, cable: usize) -> [usize; 2] {
        let first = self.first_reach[cable];
        let count = net.cables[cable]
            .n_segments()
            .saturating_sub(self.of_cable[cable].len());
        [first, first + count.saturating_sub(1)]
    }
}

fn read_cable(net: &NetDraft<'_>, cable: &CableDraft<'_>, at: &Path<'_>, findings: &mut Findings) -> Vec<Slide> {
    let Some(given) = &cable.message.slides else {
        return Vec::new();
    };
    let id = &cable.message.id;
    let at = at.field("slides");
    if cable.message.hangs.is_some() {
        findings.error(
            reasons::SLIDES_AND_HANGS,
            &at,
            id,
            format!("cable {} slides and hangs: only a straight rope can slide", Quoted(id)),
            "take slides or hangs out of it",
        );
    }
    let of = Of::new("cable", id);
    let friction = given.friction_coefficient.unwrap_or(0.0);
    let friction = findings.number(&at.field("friction_coefficient"), of, &ROPE_FRICTION, friction);
    let last = cable.path.len().saturating_sub(1);
    let mut places: Vec<usize> = Vec::new();
    if given.at.is_empty() {
        places.extend(1..last);
    }
    let list = at.field("at");
    for (number, name) in given.at.iter().enumerate() {
        let visits = match net.names.get(name) {
            Some(Thing::Node(node)) => cable.visits(node),
            _ => &[],
        };
        let inner = visits.iter().copied().filter(|place| *place > 0 && *place < last);
        let before = places.len();
        places.extend(inner);
        if places.len() == before {
            findings
                .error(
                    reasons::CAN_NOT_SLIDE,
                    &list.number(number),
                    id,
                    format!(
                        "cable {} can not slide at {}: that is no inner node of its path",
                        Quoted(id),
                        Quoted(name)
                    ),
                    "name nodes between its two ends",
                )
                .value(name);
        }
    }
    if last < 2 {
        findings.error(
            reasons::CAN_NOT_SLIDE,
            &at,
            id,
            format!("cable {} slides, and has no node between its ends", Quoted(id)),
            "take slides out of it, or lead it through a node",
        );
    }
    places.sort_unstable();
    places.dedup();
    let friction = friction.unwrap_or(0.0);
    places.into_iter().map(|place| Slide { place, friction }).collect()
}
