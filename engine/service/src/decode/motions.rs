//! Motions in time: each as a whole. Its loads are read in `driven` and `histories`, what breaks and damps in `breaks`, its
//! start in `motion_start`, what is told of it in `watched`, what needs panels and masses in `motion_net`.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::MotionGiven;
use ropewalk_numerics::motion::MassGiven;
use ropewalk_numerics::motion::transient::Scheme;
use v1::driven_load::What;
use v1::motion::Scheme as GivenScheme;

use super::actions::Actions;
use super::cases::{Cases, Known, REFERENCE, reserved};
use super::coefficients::Coefficients;
use super::covered::Covered;
use super::findings::{Findings, Path};
use super::modes::{read_added, read_air};
use super::names::Names;
use super::net::NetDraft;
use super::numbers::{DURATION, Of, PIECES, SPECTRAL_RADIUS, STEP_ERROR, TIME_STEP};
use super::resolved::Resolved;
use super::scope::Scopes;
use super::slides::Slides;
use super::supports::Supports;
use super::{breaks, driven, motion_start, reasons, watched};
use crate::words::{Quoted, number, quoted_list, rounded};

/// Steps of one motion.
const MOST_STEPS: f64 = 1e8;
/// Spectral radius where the brief gives none.
const RADIUS: f64 = 0.8;
/// Straight pieces of a hanging segment where the brief does not say,
pub(super) const PIECES_DEFAULT: u32 = 16;
/// and at most.
pub(super) const MOST_PIECES: u32 = 1000;

/// What motions are read against.
pub(crate) struct Context<'c, 'a> {
    pub(crate) net: &'c NetDraft<'a>,
    pub(crate) scopes: &'c Scopes,
    pub(crate) supports: &'c Supports,
    pub(crate) slides: &'c Slides,
    pub(crate) actions: &'c Actions<'a>,
    /// Actions under which the reference state is found.
    pub(crate) under: &'c [usize],
    pub(crate) cases: &'c Cases<'a>,
    /// What lists of motions cover.
    pub(crate) covered: Covered,
}

/// What the parts of a motion ask for; `None` where it could not be read.
pub(super) struct Basics<'m> {
    pub(super) of: Of<'m>,
    /// The state that it starts from: a case, or the reference state.
    pub(super) from: Option<Option<usize>>,
    /// How long it is followed (s).
    pub(super) duration: Option<f64>,
    /// Step (s).
    pub(super) step: Option<f64>,
}

impl Basics<'_> {
    /// Steps as given.
    pub(super) fn steps(&self) -> Option<f64> {
        let (duration, step) = (self.duration?, self.step?);
        Some((duration / step - 1e-9).ceil().max(1.0))
    }
}

/// A motion as read, before panels are known.
#[derive(Debug)]
pub(crate) struct MotionDraft {
    /// Its position in the brief.
    pub(super) position: usize,
    /// The motion; loads of wind without coefficients.
    pub(super) given: MotionGiven,
    /// Position in the message and coefficients of each wind, in order.
    pub(super) winds: Vec<(usize, Coefficients)>,
}

/// Actions that motions name.
pub(crate) fn driven_actions(motions: &[v1::Motion], actions: &Actions<'_>) -> Vec<usize> {
    let driven = motions.iter().flat_map(|motion| &motion.driven);
    let named = driven.filter_map(|driven| match &driven.what {
        Some(What::Action(id)) => actions.names.get(id),
        _ => None,
    });
    named.collect()
}

/// Reads all motions. Those that could not be read are left out.
pub(crate) fn read(
    motions: &[v1::Motion],
    context: &Context<'_, '_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Vec<MotionDraft> {
    let list = Path::root("motions");
    let mut names = Names::new("motions");
    let mut drafts = Vec::with_capacity(motions.len());
    for (position, motion) in motions.iter().enumerate() {
        names.declare(findings, &list, position, motion.id.as_str(), ());
        read_id(&motion.id, &list.number(position).field("id"), context.cases, findings);
        let at = list.element(&motion.id, position);
        drafts.extend(read_one(position, motion, &at, context, findings, resolved));
    }
    drafts
}

fn read_id(id: &str, at: &Path<'_>, cases: &Cases<'_>, findings: &mut Findings) {
    reserved(id, at, findings);
    let what = match cases.known(id) {
        Some(Known::Case(_)) => "case",
        Some(Known::Set) => "set",
        Some(Known::Effect) => "design effect",
        None => return,
    };
    findings
        .error(
            reasons::DUPLICATE_ID,
            at,
            id,
            format!(
                "{} is a motion and a {what}: a run could not tell which is meant",
                Quoted(id)
            ),
            "give the motion another name",
        )
        .value(id);
}

fn read_one(
    position: usize,
    motion: &v1::Motion,
    at: &Path<'_>,
    context: &Context<'_, '_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<MotionDraft> {
    let basics = basics(motion, at, context.cases, findings, resolved);
    let of = basics.of;
    tell_slides(of, at, context, findings);
    let scheme = read_scheme(motion.scheme.as_ref(), of, at, findings, resolved);
    let pieces = read_pieces(motion, of, at, context.net, findings, resolved);
    let loads = driven::read(motion, &basics, context, at, findings, resolved);
    let breaks = breaks::read(motion, &basics, context, at, findings);
    let damps = (!loads.winds.is_empty(), loads.moves_supports);
    let damping = breaks::read_damping(motion, damps, of, context, at, findings);
    let start = motion_start::read(motion, &basics, context, at, findings);
    let masses = read_masses(motion, of, at, context, findings);
    let shown = usize::try_from(pieces.unwrap_or(PIECES_DEFAULT)).ok()?;
    let frames = watched::read_frames(motion, shown, &basics, context, at, findings, resolved);
    let watched = watched::read_watched(motion, of, context, at, findings);
    let spectra = watched::read_spectra(motion, &basics, at, findings, resolved);
    let compare_with = read_compared(motion, at, context.cases, findings, resolved);
    if motion.driven.is_empty() && motion.breaks.is_empty() && !sets_going(motion.start.as_ref()) {
        findings.doubt(
            reasons::NOTHING_MOVES,
            at,
            of.id,
            format!("{of}: nothing varies, nothing breaks, and it starts at rest in balance: nothing will move"),
            "give driven, breaks or start",
        );
    }
    pieces?;
    Some(MotionDraft {
        position,
        given: MotionGiven {
            name: motion.id.clone(),
            from: basics.from?,
            duration: basics.duration?,
            step: basics.step?,
            scheme: scheme?,
            driven: loads.given,
            breaks,
            damping: damping?,
            start: start?,
            masses: masses?,
            frames: frames?,
            watched,
            spectra,
            compare_with: compare_with?,
            pieces_of_hanging: shown,
        },
        winds: loads.winds,
    })
}

fn sets_going(start: Option<&v1::MotionStart>) -> bool {
    start.is_some_and(|start| !start.shape_of.is_empty() || !start.moved.is_empty() || !start.velocities.is_empty())
}

fn basics<'m>(
    motion: &'m v1::Motion,
    at: &Path<'_>,
    cases: &Cases<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Basics<'m> {
    let of = Of::new("motion", &motion.id);
    let field = at.field("from");
    let from = match motion.from.as_str() {
        "" => {
            resolved.left_out(&field, REFERENCE);
            Some(None)
        }
        REFERENCE => Some(None),
        name => cases.one(name, &field, findings).map(Some),
    };
    let duration = findings.number(&at.field("duration_s"), of, &DURATION, motion.duration_s);
    let field = at.field("step_s");
    let step = findings.number(&field, of, &TIME_STEP, motion.step_s);
    let mut basics = Basics {
        of,
        from,
        duration,
        step,
    };
    let (Some(duration), Some(step)) = (duration, step) else {
        return basics;
    };
    let steps = duration / step;
    if step > duration {
        findings
            .error(
                reasons::OUT_OF_RANGE,
                &field,
                of.id,
                format!(
                    "{of}: a step of {} s is longer than the motion of {} s",
                    number(step),
                    number(duration)
                ),
                "give a step of a small part of the duration",
            )
            .value(number(step));
        basics.step = None;
    } else if steps > MOST_STEPS * (1.0 + 1e-9) {
        findings
            .error(
                reasons::TOO_MANY,
                &field,
                of.id,
                format!(
                    "{of}: {} steps, {} hours at a thousandth of a second each: at most {} are taken",
                    rounded(steps, 4),
                    rounded(steps / 3.6e6, 3),
                    number(MOST_STEPS)
                ),
                format!(
                    "give step_s at least {}, or duration_s at most {}",
                    rounded(duration / MOST_STEPS, 4),
                    rounded(step * MOST_STEPS, 4)
                ),
            )
            .value(rounded(steps, 4));
    }
    basics
}

fn tell_slides(of: Of<'_>, at: &Path<'_>, context: &Context<'_, '_>, findings: &mut Findings) {
    let cables = context.net.cables.iter().zip(&context.slides.of_cable);
    let sliding = cables.filter(|(_, slides)| !slides.is_empty());
    let ids: Vec<&str> = sliding.map(|(cable, _)| cable.message.id.as_str()).collect();
    if let Some(first) = ids.first() {
        findings
            .error(
                reasons::SLIDES_IN_MOTION,
                at,
                first,
                format!(
                    "{of}: ropes that slide are not followed in time: {}",
                    quoted_list(ids.iter().copied())
                ),
                "clamp these ropes: take slides out of them",
            )
            .value(ids.len());
    }
}

fn read_scheme(
    given: Option<&GivenScheme>,
    of: Of<'_>,
    at: &Path<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<Scheme> {
    match given {
        None => {
            resolved.left_out(&at.field("generalised_alpha"), "with its defaults");
            Some(Scheme::GeneralisedAlpha {
                spectral_radius: RADIUS,
                error: None,
            })
        }
        Some(GivenScheme::GeneralisedAlpha(given)) => {
            let at = at.field("generalised_alpha");
            let field = at.field("spectral_radius");
            if given.spectral_radius.is_none() {
                resolved.left_out(&field, RADIUS);
            }
            let radius = findings.number_or(&field, of, &SPECTRAL_RADIUS, given.spectral_radius, RADIUS);
            let error = read_error(given.error_m, of, &at, findings, resolved);
            Some(Scheme::GeneralisedAlpha {
                spectral_radius: radius?,
                error: error?,
            })
        }
        Some(GivenScheme::EnergyConserving(given)) => {
            let at = at.field("energy_conserving");
            let error = read_error(given.error_m, of, &at, findings, resolved)?;
            Some(Scheme::Conserving { error })
        }
        Some(GivenScheme::CentralDifferences(_)) => Some(Scheme::CentralDifferences),
    }
}

/// Error of a step that is to be kept, if any; `None` where it could not be read.
fn read_error(
    given: Option<f64>,
    of: Of<'_>,
    at: &Path<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<Option<f64>> {
    let field = at.field("error_m");
    match given {
        Some(error) => findings.number(&field, of, &STEP_ERROR, error).map(Some),
        None => {
            resolved.left_out(&field, "equal steps");
            Some(None)
        }
    }
}

fn read_pieces(
    motion: &v1::Motion,
    of: Of<'_>,
    at: &Path<'_>,
    net: &NetDraft<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<u32> {
    let field = at.field("pieces_of_hanging");
    let hangs = net.cables.iter().any(|cable| cable.message.hangs.is_some());
    let Some(pieces) = motion.pieces_of_hanging else {
        if hangs {
            resolved.left_out(&field, PIECES_DEFAULT);
        }
        return Some(PIECES_DEFAULT);
    };
    findings.number(&field, of, &PIECES, f64::from(pieces))?;
    if !hangs {
        findings
            .doubt(
                reasons::DATA_NOT_USED,
                &field,
                of.id,
                format!("{of}: hanging segments are to be divided, and no cable hangs"),
                "give hangs to the cables that are meant, or take this out",
            )
            .value(pieces);
    }
    Some(pieces)
}

fn read_masses(
    motion: &v1::Motion,
    of: Of<'_>,
    at: &Path<'_>,
    context: &Context<'_, '_>,
    findings: &mut Findings,
) -> Option<MassGiven> {
    let air = read_air(motion.air_mass_kg_per_m2, of, at, context.net, findings);
    let mut masses = MassGiven::default();
    let list = at.field("added");
    for (place, added) in motion.added.iter().enumerate() {
        let at = list.number(place);
        let before = covered_by(&masses);
        read_added(added, &at, context.net, context.scopes, &mut masses, findings);
        if !(context.covered).add(covered_by(&masses) - before, of, &at, findings) {
            return None;
        }
    }
    masses.air = air?;
    Some(masses)
}

/// Nodes, segments and areas with added mass.
fn covered_by(masses: &MassGiven) -> usize {
    let areas: usize = masses.areas.iter().map(|(areas, _)| areas.len()).sum();
    masses.nodes.len() + masses.segments.len() + areas
}

fn read_compared(
    motion: &v1::Motion,
    at: &Path<'_>,
    cases: &Cases<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<Option<usize>> {
    let field = at.field("compare_with");
    if motion.compare_with.is_empty() {
        resolved.left_out(&field, "at rest under what acts at the end");
        return Some(None);
    }
    cases.one(&motion.compare_with, &field, findings).map(Some)
}
