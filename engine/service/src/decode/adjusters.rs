//! Turnbuckles and winches: at which end of which rope, and how far they travel.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::CaseGiven;
use ropewalk_numerics::load::Load;
use ropewalk_numerics::model::SegmentId;
use v1::adjuster_load::Amount;

use super::findings::{Findings, Path};
use super::names::{Names, Thing};
use super::net::NetDraft;
use super::numbers::{OPENING, Of, TRAVEL, TRAVEL_PER_TURN, TURNS};
use super::reasons;
use super::resolved::Resolved;
use super::slides::Slides;
use crate::words::{Quoted, length, number};

/// Opening beyond the travel that still counts as rounding (m).
const ROUNDING: f64 = 1e-9;

/// Adjusters as read.
#[derive(Debug)]
pub(crate) struct Adjusters<'a> {
    messages: &'a [v1::Adjuster],
    names: Names<'a, usize>,
    /// `None` where it could not be read.
    list: Vec<Option<Adjuster>>,
}

#[derive(Clone, Copy, Debug)]
struct Adjuster {
    /// Number of the reach that ends there, which is that of its unstressed length.
    reach: usize,
    /// The segment that ends there.
    segment: usize,
    inwards: f64,
    outwards: f64,
    per_turn: Option<f64>,
}

impl<'a> Adjusters<'a> {
    pub(crate) fn read(net: &NetDraft<'a>, slides: &Slides, findings: &mut Findings, resolved: &mut Resolved) -> Self {
        let list = Path::root("net.adjusters");
        let roles = Path::root("net.roles");
        for (index, role) in net.message.roles.iter().enumerate() {
            if let Some(travel) = &role.adjuster {
                let at = roles.element(&role.id, index);
                travel_of(Of::new("role", &role.id), travel, &at.field("adjuster"), findings);
            }
        }
        let messages: &'a [v1::Adjuster] = &net.message.adjusters;
        let mut adjusters = Self {
            messages,
            names: Names::new("adjusters"),
            list: Vec::with_capacity(messages.len()),
        };
        for (index, message) in messages.iter().enumerate() {
            adjusters
                .names
                .declare(findings, &list, index, message.id.as_str(), index);
            let at = list.element(&message.id, index);
            adjusters.list.push(read(net, slides, message, &at, findings, resolved));
        }
        adjusters
    }

    /// One use of an adjuster by an action.
    pub(crate) fn load(
        &self,
        action: &str,
        load: &v1::AdjusterLoad,
        at: &Path<'_>,
        findings: &mut Findings,
    ) -> Option<(usize, f64, Load)> {
        let field = at.field("adjuster");
        let index = self.names.find(findings, &field, "adjuster", &load.adjuster)?;
        let adjuster = self.list[index].as_ref()?;
        let of = Of::new("action", action);
        let by = match load.amount {
            Some(Amount::OpenM(open)) => findings.number(&at.field("open_m"), of, &OPENING, open)?,
            Some(Amount::Turns(turns)) => {
                let turns = findings.number(&at.field("turns"), of, &TURNS, turns)?;
                let Some(per_turn) = adjuster.per_turn else {
                    findings.error(
                        reasons::NO_TRAVEL_PER_TURN,
                        &at.field("turns"),
                        &load.adjuster,
                        format!(
                            "action {} turns {}, of which the travel a turn is not known",
                            Quoted(action),
                            Quoted(&load.adjuster)
                        ),
                        "give per_turn_m of the adjuster, or open_m here",
                    );
                    return None;
                };
                turns * per_turn
            }
            None => {
                findings.error(
                    reasons::MISSING,
                    at,
                    action,
                    format!(
                        "action {} says not how far {} goes",
                        Quoted(action),
                        Quoted(&load.adjuster)
                    ),
                    "give open_m or turns",
                );
                return None;
            }
        };
        let load = Load::Adjustment {
            length: adjuster.reach,
            segment: SegmentId::new(adjuster.segment),
            by,
        };
        Some((index, by, load))
    }

    /// Doubts cases that ask more of an adjuster than its travel; the farthest case for each.
    ///
    /// `uses`: adjuster and opening (m) of each use, by action.
    pub(crate) fn check_travel(&self, cases: &[CaseGiven], uses: &[Vec<(usize, f64)>], findings: &mut Findings) {
        let mut farthest: Vec<Option<(f64, usize, f64)>> = vec![None; self.list.len()];
        for (case, given) in cases.iter().enumerate() {
            let mut open = vec![0.0; self.list.len()];
            for (action, factor) in &given.factors {
                for (adjuster, by) in &uses[*action] {
                    open[*adjuster] += factor * by;
                }
            }
            for (adjuster, open) in open.into_iter().enumerate() {
                let Some(travel) = &self.list[adjuster] else { continue };
                let beyond = (open - travel.outwards).max(-open - travel.inwards);
                if beyond > ROUNDING && farthest[adjuster].is_none_or(|(most, ..)| beyond > most) {
                    farthest[adjuster] = Some((beyond, case, open));
                }
            }
        }
        let list = Path::root("net.adjusters");
        for (index, found) in farthest.into_iter().enumerate() {
            let (Some((beyond, case, open)), Some(travel)) = (found, &self.list[index]) else {
                continue;
            };
            let id = &self.messages[index].id;
            let (way, limit) = if open > 0.0 {
                ("let out", travel.outwards)
            } else {
                ("drawn in", travel.inwards)
            };
            findings
                .doubt(
                    reasons::ADJUSTER_TOO_SHORT,
                    &list.element(id, index),
                    id,
                    format!(
                        "case {} has adjuster {} {way} by {}: it goes {}, {} short",
                        Quoted(&cases[case].name),
                        Quoted(id),
                        length(open.abs()),
                        length(limit),
                        length(beyond)
                    ),
                    "give it more travel, or turn less; the case runs all the same",
                )
                .value(number(open));
        }
    }
}

fn read(
    net: &NetDraft<'_>,
    slides: &Slides,
    message: &v1::Adjuster,
    at: &Path<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<Adjuster> {
    let id = &message.id;
    let cable_at = at.field("cable");
    let cable = match net.names.find(findings, &cable_at, "cable", &message.cable)? {
        Thing::Cable(cable) => cable,
        other => {
            findings
                .error(
                    reasons::WRONG_KIND,
                    &cable_at,
                    id,
                    format!(
                        "{} is a {}, and adjusters are on cables",
                        Quoted(&message.cable),
                        other.kind()
                    ),
                    "name a cable",
                )
                .value(&message.cable);
            return None;
        }
    };
    let draft = &net.cables[cable];
    let [first, last] = slides.outer_reaches(net, cable);
    let node = match net.names.get(&message.at) {
        Some(Thing::Node(node)) => Some(node),
        _ => None,
    };
    let end = |place: Option<&usize>| node.is_some() && place.copied() == node;
    let (is_first, is_last) = (end(draft.path.first()), end(draft.path.last()));
    let (reach, segment) = match (is_first, is_last) {
        (true, false) => (first, draft.first_segment),
        (false, true) => (last, draft.first_segment + draft.n_segments().saturating_sub(1)),
        _ => {
            let why = if is_first {
                "where a closed rope has no end"
            } else {
                "which is none of its ends"
            };
            findings
                .error(
                    reasons::NOT_AN_END,
                    &at.field("at"),
                    id,
                    format!(
                        "adjuster {} of cable {} is at {}, {why}",
                        Quoted(id),
                        Quoted(&message.cable),
                        Quoted(&message.at)
                    ),
                    "name the first or the last node of the cable",
                )
                .value(&message.at);
            return None;
        }
    };
    let from_role = draft
        .role
        .and_then(|role| Some((role, net.message.roles[role].adjuster.as_ref()?)));
    let roles = Path::root("net.roles");
    let mut or_role = |field: &'static str, own: Option<f64>, default: Option<f64>| -> Option<f64> {
        if let (None, Some(value), Some((role, _))) = (own, default, from_role) {
            let origin = roles.element(&net.message.roles[role].id, role);
            resolved.inherited(&at.field(field), number(value), &origin.field("adjuster").field(field));
        }
        own.or(default)
    };
    let inwards = or_role("in_m", message.in_m, from_role.map(|(_, travel)| travel.in_m));
    let outwards = or_role("out_m", message.out_m, from_role.map(|(_, travel)| travel.out_m));
    let per_turn = or_role(
        "per_turn_m",
        message.per_turn_m,
        from_role.and_then(|(_, travel)| travel.per_turn_m),
    );
    let (Some(inwards), Some(outwards)) = (inwards, outwards) else {
        findings.error(
            reasons::MISSING,
            at,
            id,
            format!(
                "adjuster {} has no travel, and neither has the role of its cable",
                Quoted(id)
            ),
            "give in_m and out_m, here or in the role",
        );
        return None;
    };
    let travel = v1::AdjusterTravel {
        in_m: inwards,
        out_m: outwards,
        per_turn_m: per_turn,
        note: String::new(),
    };
    travel_of(Of::new("adjuster", id), &travel, at, findings)?;
    Some(Adjuster {
        reach,
        segment,
        inwards,
        outwards,
        per_turn,
    })
}

fn travel_of(of: Of<'_>, travel: &v1::AdjusterTravel, at: &Path<'_>, findings: &mut Findings) -> Option<()> {
    let inwards = findings.number(&at.field("in_m"), of, &TRAVEL, travel.in_m);
    let outwards = findings.number(&at.field("out_m"), of, &TRAVEL, travel.out_m);
    let per_turn = match travel.per_turn_m {
        Some(per_turn) => findings
            .number(&at.field("per_turn_m"), of, &TRAVEL_PER_TURN, per_turn)
            .map(|_| ()),
        None => Some(()),
    };
    inwards.and(outwards).and(per_turn)
}
