//! Ropes that break in a motion, and damping.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{BreakGiven, DampingGiven};
use ropewalk_numerics::model::{CableId, Member, SegmentId, StrutId};
use ropewalk_numerics::motion::transient::BreakWhen;
use v1::motion_damping::Rayleigh;
use v1::rope_break::{What, When};

use super::findings::{Findings, Path};
use super::motions::{Basics, Context};
use super::names::Thing;
use super::net::{MemberDraft, NetDraft};
use super::numbers::{
    BREAK_TENSION, BREAK_TIME, DAMPING_RATIO, DRIVEN_FREQUENCY, MASS_DAMPING, Of, RELEASE, ROPE_DAMPING,
    STIFFNESS_DAMPING,
};
use super::reasons;
use super::scope::MEMBERS;
use super::wish::read_part;
use crate::words::{Quoted, number, quoted_list};

pub(super) fn read(
    motion: &v1::Motion,
    basics: &Basics<'_>,
    context: &Context<'_, '_>,
    at: &Path<'_>,
    findings: &mut Findings,
) -> Vec<BreakGiven> {
    let (of, net) = (basics.of, context.net);
    let list = at.field("breaks");
    let mut breaks: Vec<BreakGiven> = Vec::new();
    // Which break each segment belongs to.
    let mut broken: Vec<Option<usize>> = vec![None; net.segments.len()];
    for (place, given) in motion.breaks.iter().enumerate() {
        let at = list.number(place);
        let segments = match &given.what {
            Some(What::Member(id)) => member_segments(id, of, &at.field("member"), net, findings),
            Some(What::Segment(part)) => one_segment(part, of, &at.field("segment"), net, findings).map(|s| vec![s]),
            None => {
                findings.error(
                    reasons::MISSING,
                    &at,
                    of.id,
                    format!("{of}: it is not said what breaks"),
                    "give member or segment",
                );
                None
            }
        };
        let when = match given.when {
            Some(When::AtS(time)) => read_time(time, basics, &at.field("at_s"), findings).map(BreakWhen::Time),
            Some(When::AtTensionN(tension)) => findings
                .number(&at.field("at_tension_n"), of, &BREAK_TENSION, tension)
                .map(BreakWhen::Tension),
            None => {
                findings.error(
                    reasons::MISSING,
                    &at,
                    of.id,
                    format!("{of}: it is not said when a rope breaks"),
                    "give at_s or at_tension_n",
                );
                None
            }
        };
        let release = findings.number_or(&at.field("release_s"), of, &RELEASE, given.release_s, 0.0);
        let Some(segments) = segments else { continue };
        let id = segments
            .first()
            .map_or("", |segment| net.member_id(net.segments[*segment].1));
        if let Some(other) = segments.iter().find_map(|segment| broken[*segment]) {
            findings
                .error(
                    reasons::BREAKS_TWICE,
                    &at,
                    id,
                    format!("{of}: {} breaks here and already in {}", Quoted(id), list.number(other)),
                    "let each segment break once: name the whole member, or other segments of it",
                )
                .value(id);
        }
        segments.iter().for_each(|segment| broken[*segment] = Some(place));
        tell_removed(&segments, id, basics, context, &at, findings);
        if let (Some(BreakWhen::Time(time)), Some(release), Some(duration)) = (when, release, basics.duration)
            && time + release > duration
        {
            findings
                .doubt(
                    reasons::RELEASE_TOO_LONG,
                    &at.field("release_s"),
                    of.id,
                    format!(
                        "{of}: {} lets go over {} s from {} s on, and the motion ends at {} s; the static answer has it gone",
                        Quoted(id),
                        number(release),
                        number(time),
                        number(duration)
                    ),
                    "lengthen the motion, or let the break come sooner or quicker",
                )
                .value(number(release));
        }
        if let (Some(when), Some(release)) = (when, release) {
            breaks.push(BreakGiven {
                segments: segments.into_iter().map(SegmentId::new).collect(),
                when,
                release,
            });
        }
    }
    breaks
}

/// Segments of a cable or strut.
pub(super) fn member_segments(
    id: &str,
    of: Of<'_>,
    at: &Path<'_>,
    net: &NetDraft<'_>,
    findings: &mut Findings,
) -> Option<Vec<usize>> {
    match net.names.find(findings, at, "cable or strut", id)? {
        Thing::Cable(cable) => {
            let cable = &net.cables[cable];
            Some((cable.first_segment..cable.first_segment + cable.n_segments()).collect())
        }
        Thing::Strut(strut) => {
            let strut = &net.struts[strut];
            strut.ends.map(|_| vec![strut.segment])
        }
        other => {
            findings
                .error(
                    reasons::WRONG_KIND,
                    at,
                    id,
                    format!(
                        "{of}: {} is a {}, and one cable or strut is wanted",
                        Quoted(id),
                        other.kind()
                    ),
                    "name a cable or a strut",
                )
                .value(id);
            None
        }
    }
}

/// A part of a cable that is one segment.
pub(super) fn one_segment(
    part: &v1::PartOfCable,
    of: Of<'_>,
    at: &Path<'_>,
    net: &NetDraft<'_>,
    findings: &mut Findings,
) -> Option<usize> {
    let segments = read_part(part, net, at, findings)?;
    if let [segment] = segments[..] {
        return Some(segment);
    }
    findings
        .error(
            reasons::NOT_ONE_SEGMENT,
            at,
            &part.cable,
            format!(
                "{of}: from {} to {} cable {} has {} segments, and one is wanted",
                Quoted(&part.from),
                Quoted(&part.to),
                Quoted(&part.cable),
                segments.len()
            ),
            "name two nodes that follow each other on its path",
        )
        .value(segments.len());
    None
}

/// A time at which something happens, before the motion ends.
fn read_time(time: f64, basics: &Basics<'_>, at: &Path<'_>, findings: &mut Findings) -> Option<f64> {
    let of = basics.of;
    let time = findings.number(at, of, &BREAK_TIME, time)?;
    if let Some(duration) = basics.duration.filter(|duration| time >= *duration) {
        findings
            .error(
                reasons::OUT_OF_RANGE,
                at,
                of.id,
                format!(
                    "{of}: a rope is to break at {} s, and the motion ends at {} s",
                    number(time),
                    number(duration)
                ),
                "let it break before the end, or follow the motion for longer",
            )
            .value(number(time));
        return None;
    }
    Some(time)
}

fn tell_removed(
    segments: &[usize],
    id: &str,
    basics: &Basics<'_>,
    context: &Context<'_, '_>,
    at: &Path<'_>,
    findings: &mut Findings,
) {
    let Some(Some(case)) = basics.from else { return };
    let case = &context.cases.list[case];
    let member = segments.first().map(|segment| match context.net.segments[*segment].1 {
        MemberDraft::Cable(cable) => Member::Cable(CableId::new(cable)),
        MemberDraft::Strut(strut) => Member::Strut(StrutId::new(strut)),
    });
    if member.is_some_and(|member| case.removed.contains(&member)) {
        findings
            .error(
                reasons::BREAK_NOT_THERE,
                at,
                id,
                format!(
                    "{}: {} is to break, and case {}, where the motion starts, takes it out",
                    basics.of,
                    Quoted(id),
                    Quoted(&case.name)
                ),
                "start from a case in which it is there",
            )
            .value(id);
    }
}

/// Reads damping; notes where there is none at all. `damps`: whether wind damps; `moves_supports`: whether loads do.
pub(super) fn read_damping(
    motion: &v1::Motion,
    (damps, moves_supports): (bool, bool),
    of: Of<'_>,
    context: &Context<'_, '_>,
    at: &Path<'_>,
    findings: &mut Findings,
) -> Option<DampingGiven> {
    let at = at.field("damping");
    let mut damping = DampingGiven::default();
    let mut is_right = true;
    if let Some(given) = &motion.damping {
        let rayleigh = read_rayleigh(given, of, &at, findings);
        is_right &= rayleigh.is_some();
        (damping.mass, damping.stiffness) = rayleigh.unwrap_or_default();
        if moves_supports && damping.stiffness > 0.0 {
            let (name, field) = match given.rayleigh {
                Some(Rayleigh::Factors(_)) => ("factors", "stiffness_s"),
                _ => ("ratio", "ratio"),
            };
            findings
                .error(
                    reasons::DAMPED_GROUND,
                    &at.field(name).field(field),
                    of.id,
                    format!("{of} moves supports, and damping by stiffness acts on velocities over fixed ground"),
                    "give damping by mass alone in factors, and damping along ropes in damping.ropes",
                )
                .value(number(damping.stiffness));
        }
        let list = at.field("ropes");
        for (place, ropes) in given.ropes.iter().enumerate() {
            let at = list.number(place);
            let segments = read_ropes(ropes, of, context, &at, findings);
            is_right &= segments.is_some();
            let segments = segments.unwrap_or_default();
            if !context.covered.add(segments.len(), of, &at, findings) {
                return None;
            }
            damping.segments.extend(segments);
        }
    }
    let none = damping.mass == 0.0 && damping.stiffness == 0.0 && damping.segments.iter().all(|(_, c)| *c == 0.0);
    if is_right && none && !damps {
        findings.note(
            reasons::NO_DAMPING,
            &at,
            of.id,
            format!("{of} has no damping: it will not die out by itself"),
            "give a damping ratio at two frequencies, or force_per_strain_rate_n_s of ropes",
        );
    }
    is_right.then_some(damping)
}

/// Factors of mass and of stiffness.
fn read_rayleigh(given: &v1::MotionDamping, of: Of<'_>, at: &Path<'_>, findings: &mut Findings) -> Option<(f64, f64)> {
    match &given.rayleigh {
        None => Some((0.0, 0.0)),
        Some(Rayleigh::Factors(factors)) => {
            let at = at.field("factors");
            let mass = findings.number(&at.field("mass_per_s"), of, &MASS_DAMPING, factors.mass_per_s);
            let stiffness = findings.number(&at.field("stiffness_s"), of, &STIFFNESS_DAMPING, factors.stiffness_s);
            mass.zip(stiffness)
        }
        Some(Rayleigh::Ratio(given)) => {
            let at = at.field("ratio");
            let high_at = at.field("high_hz");
            let ratio = findings.number(&at.field("ratio"), of, &DAMPING_RATIO, given.ratio);
            let low = findings.number(&at.field("low_hz"), of, &DRIVEN_FREQUENCY, given.low_hz);
            let high = findings.number(&high_at, of, &DRIVEN_FREQUENCY, given.high_hz);
            let (low, high) = (low?, high?);
            if high < low {
                findings
                    .error(
                        reasons::OUT_OF_RANGE,
                        &high_at,
                        of.id,
                        format!(
                            "{of}: damping is given at {} Hz and at {} Hz, which is lower",
                            number(low),
                            number(high)
                        ),
                        "give the lower frequency in low_hz and the higher one in high_hz",
                    )
                    .value(number(high));
                return None;
            }
            Some(DampingGiven::rayleigh(ratio?, [low, high]))
        }
    }
}

fn read_ropes(
    ropes: &v1::RopeDamping,
    of: Of<'_>,
    context: &Context<'_, '_>,
    at: &Path<'_>,
    findings: &mut Findings,
) -> Option<Vec<(SegmentId, f64)>> {
    let (field, on) = (at.field("force_per_strain_rate_n_s"), at.field("on"));
    let force = findings.number(&field, of, &ROPE_DAMPING, ropes.force_per_strain_rate_n_s);
    let scope = context.scopes.of(context.net, &ropes.on, &on, MEMBERS, findings);
    let segments = scope.segments(context.net);
    if segments.is_empty() && scope.complete {
        let named = if ropes.on.is_empty() {
            "names no rope and no strut".to_owned()
        } else {
            format!("covers nothing in {}", quoted_list(ropes.on.iter().map(String::as_str)))
        };
        findings.error(
            reasons::COVERS_NOTHING,
            &on,
            of.id,
            format!("{of}: damping along ropes {named}"),
            "name cables, struts, roles or groups in on",
        );
        return None;
    }
    let force = force?;
    Some(
        segments
            .into_iter()
            .map(|segment| (SegmentId::new(segment), force))
            .collect(),
    )
}
