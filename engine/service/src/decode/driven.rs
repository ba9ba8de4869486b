//! Loads of a motion that vary in time.

use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::load::Kind;
use ropewalk_numerics::brief::{DrivenGiven, DrivenWhat};
use ropewalk_numerics::load::Load;
use ropewalk_numerics::motion::transient::History;
use v1::driven_load::{History as GivenHistory, What};

use super::coefficients::{self, Coefficients};
use super::findings::{Findings, Path};
use super::histories::{self, field};
use super::motions::{Basics, Context};
use super::numbers::{AIR_DENSITY, FACTOR, Of, WIND_SPEED};
use super::reasons;
use super::resolved::Resolved;
use crate::words::{Quoted, number, rounded};

/// Density of air (kg/m³), recommended in EN 1991-1-4, from memory: verify.
const AIR: f64 = 1.25;
/// Speeds of wind above this are doubted (m/s): no gust on record over land, tornadoes apart, is much faster (common practice).
const FAST: f64 = 110.0;

/// Loads as read.
#[derive(Debug, Default)]
pub(super) struct Driven {
    /// The loads; those of wind without coefficients, since panels are not known yet.
    pub(super) given: Vec<DrivenGiven>,
    /// Position in the message and coefficients of each wind, in order.
    pub(super) winds: Vec<(usize, Coefficients)>,
    /// Whether any of them moves supports.
    pub(super) moves_supports: bool,
}

pub(super) fn read(
    motion: &v1::Motion,
    basics: &Basics<'_>,
    context: &Context<'_, '_>,
    at: &Path<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Driven {
    let list = at.field("driven");
    let mut driven = Driven::default();
    for (place, load) in motion.driven.iter().enumerate() {
        let at = list.number(place);
        let quantity = match load.what {
            Some(What::Wind(_)) => &WIND_SPEED,
            _ => &FACTOR,
        };
        let history = match &load.history {
            Some(history) => histories::read(history, basics.of, quantity, &at, findings, resolved),
            None => {
                findings.error(
                    reasons::MISSING,
                    &at,
                    basics.of.id,
                    format!("{}: it is not said how a load varies", basics.of),
                    "give one of constant, table, step, ramp, harmonic",
                );
                None
            }
        };
        let wind = matches!(load.what, Some(What::Wind(_)));
        if let (Some(history), Some(given)) = (&history, &load.history) {
            doubts(history, given, wind, basics, &at, findings);
        }
        let what = match &load.what {
            Some(What::Action(id)) => {
                let moves = &mut driven.moves_supports;
                read_action(id, history.as_ref(), basics, context, &at, moves, findings)
            }
            Some(What::Wind(given)) => {
                let wind = read_wind(given, basics.of, context, &at.field("wind"), findings, resolved);
                wind.map(|(wind, coefficients)| {
                    driven.winds.push((place, coefficients));
                    wind
                })
            }
            None => {
                findings.error(
                    reasons::MISSING,
                    &at,
                    basics.of.id,
                    format!("{}: it is not said what varies", basics.of),
                    "give action or wind",
                );
                None
            }
        };
        driven
            .given
            .extend(what.zip(history).map(|(what, history)| DrivenGiven { what, history }));
    }
    driven
}

fn read_action(
    id: &str,
    history: Option<&History>,
    basics: &Basics<'_>,
    context: &Context<'_, '_>,
    at: &Path<'_>,
    moves_supports: &mut bool,
    findings: &mut Findings,
) -> Option<DrivenWhat> {
    let of = basics.of;
    let field = at.field("action");
    let action = context.actions.names.find(findings, &field, "action", id)?;
    let actions = Path::root("actions");
    let element = actions.element(id, action);
    let loads = element.field("loads");
    let mut is_drivable = true;
    for (place, load) in context.actions.messages[action].loads.iter().enumerate() {
        let (name, what) = match load.kind {
            Some(Kind::Temperature(_)) => ("temperature", "temperatures"),
            Some(Kind::Prestress(_)) => ("prestress", "prestress"),
            Some(Kind::Adjust(_)) => ("adjust", "an adjuster"),
            _ => continue,
        };
        is_drivable = false;
        findings
            .error(
                reasons::NOT_DRIVABLE,
                &field,
                id,
                format!(
                    "{of}: action {} changes {what} in {}: only forces, pressures and movements of supports can vary \
                     in time",
                    Quoted(id),
                    loads.number(place).field(name)
                ),
                "put that load into an action of its own, which acts in the case that the motion starts from",
            )
            .value(id);
    }
    let acts = match basics.from {
        Some(Some(case)) => {
            let factors = context.cases.list[case].factors.iter();
            factors
                .into_iter()
                .any(|(other, factor)| *other == action && *factor != 0.0)
        }
        Some(None) => context.under.contains(&action),
        None => false,
    };
    if acts {
        findings
            .doubt(
                reasons::ACTS_TWICE,
                &field,
                id,
                format!(
                    "{of}: action {} acts in the state at the start and goes on acting; its history comes on top",
                    Quoted(id)
                ),
                "start from a state without it, let the history be what is added, or accept this doubt",
            )
            .value(id);
    }
    // An action that could not be read has fewer loads here, and its own findings.
    let loads = context.actions.list.get(action).map_or(&[][..], |action| &action.loads);
    let moves = |load: &Load| matches!(load, Load::SupportMovement { by, .. } if by.amax() > 0.0);
    if loads.iter().any(moves) {
        *moves_supports = true;
        if let (Some(history), Some(duration)) = (history, basics.duration) {
            is_drivable &= moves_smoothly(history, duration, id, of, at, findings);
        }
    }
    is_drivable.then_some(DrivenWhat::Action(action))
}

/// Whether supports start where they are and do not jump.
fn moves_smoothly(
    history: &History,
    duration: f64,
    id: &str,
    of: Of<'_>,
    at: &Path<'_>,
    findings: &mut Findings,
) -> bool {
    let (start, jump) = (history.at_start(), history.first_jump(duration));
    let why = match jump {
        Some((when, by)) => format!("jumps by {} at {} s", rounded(by, 4), rounded(when, 6)),
        None if start != 0.0 => format!("begins with {} and not with 0", rounded(start, 4)),
        None => return true,
    };
    findings
        .error(
            reasons::SUPPORT_JUMPS,
            at,
            id,
            format!("{of}: action {} moves supports, and its history {why}", Quoted(id)),
            "begin with 0 and use a ramp, a table or a harmonic without jumps; put what has moved before into the case \
             that the motion starts from",
        )
        .value(rounded(jump.map_or(start, |(_, by)| by), 6));
    false
}

fn read_wind(
    wind: &v1::MovingWind,
    of: Of<'_>,
    context: &Context<'_, '_>,
    at: &Path<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<(DrivenWhat, Coefficients)> {
    let along = findings.direction(&at.field("along"), of, &wind.along);
    let field = at.field("air_density_kg_per_m3");
    if wind.air_density_kg_per_m3.is_none() {
        resolved.left_out(&field, number(AIR));
    }
    let density = findings.number_or(&field, of, &AIR_DENSITY, wind.air_density_kg_per_m3, AIR);
    let given = (&wind.coefficients, wind.elsewhere);
    let what = format!("a wind of {of}");
    let coefficients = coefficients::read(given, &what, of, at, context.net, findings)?;
    let wind = DrivenWhat::Wind {
        coefficients: Vec::new(),
        density: density?,
        along: along?,
    };
    Some((wind, coefficients))
}

/// What is odd about a history in this motion.
fn doubts(
    history: &History,
    given: &GivenHistory,
    wind: bool,
    basics: &Basics<'_>,
    at: &Path<'_>,
    findings: &mut Findings,
) {
    let at = at.field(field(given));
    let (of, id) = (basics.of, basics.of.id);
    let Some(duration) = basics.duration else { return };
    if history.is_zero(duration) {
        let (severity, message, cure) = if wind {
            (
                v1::FindingSeverity::Note,
                format!("{of}: the wind has no speed: still air, which only damps"),
                "give it a speed, if more is meant",
            )
        } else {
            (
                v1::FindingSeverity::Doubt,
                format!("{of}: a load is zero from the start to {} s", number(duration)),
                "give its history values, or take the load out",
            )
        };
        findings.add(severity, reasons::HISTORY_ZERO, &at, id, message, cure.to_owned());
    }
    if let History::Table(points) = history {
        table_doubts(points, duration, of, &at, findings);
    }
    let fastest = fastest(history);
    if wind && fastest > FAST {
        findings
            .doubt(
                reasons::UNIT_SLIP,
                &at,
                id,
                format!(
                    "{of}: the wind blows with up to {} m/s: was it in km/h?",
                    rounded(fastest, 4)
                ),
                "check the unit, or accept this doubt",
            )
            .value(rounded(fastest, 4));
    }
    let Some(step) = basics.step else { return };
    // Times of a table are rounded.
    let Some(needed) = history.finest().filter(|needed| *needed * (1.0 + 1e-9) < step) else {
        return;
    };
    let what = match history {
        History::Harmonic { frequency, .. } => format!("a sine of {} Hz, with 20 steps a period", number(*frequency)),
        History::Ramp { .. } => "a ramp, with one step".to_owned(),
        _ => "the closest points of a table, with one step from one to the next".to_owned(),
    };
    findings
        .doubt(
            reasons::STEPS_TOO_LONG,
            &at,
            id,
            format!(
                "{of}: steps of {} s are too long to follow {what}: that needs {} s",
                number(step),
                rounded(needed, 4)
            ),
            format!("give step_s at most {}", rounded(needed, 4)),
        )
        .value(number(step));
}

fn table_doubts(points: &[(f64, f64)], duration: f64, of: Of<'_>, at: &Path<'_>, findings: &mut Findings) {
    let (Some((first, begins)), Some((last, ends))) = (points.first(), points.last()) else {
        return;
    };
    if *first >= duration {
        findings
            .doubt(
                reasons::HISTORY_SHORT,
                at,
                of.id,
                format!(
                    "{of}: a table begins at {} s, and the motion ends at {} s: its first value, {}, holds throughout",
                    rounded(*first, 6),
                    number(duration),
                    number(*begins)
                ),
                "let it begin earlier, or follow the motion for longer",
            )
            .value(rounded(*first, 6));
    } else if *last < duration * (1.0 - 1e-9) {
        // What ends with nothing has passed by, and leaves nothing open.
        let severity = if *ends == 0.0 {
            v1::FindingSeverity::Note
        } else {
            v1::FindingSeverity::Doubt
        };
        findings
            .add(
                severity,
                reasons::HISTORY_SHORT,
                at,
                of.id,
                format!(
                    "{of}: a table ends at {} s, and the motion goes on to {} s: its last value, {}, holds from there on",
                    rounded(*last, 6),
                    number(duration),
                    number(*ends)
                ),
                "lengthen the table, shorten the motion, or accept this doubt if the value is meant to stay".to_owned(),
            )
            .value(rounded(*last, 6));
    }
}

/// Largest size that a history takes, or could.
fn fastest(history: &History) -> f64 {
    match history {
        History::Constant(value) => value.abs(),
        History::Table(points) => points.iter().map(|(_, value)| value.abs()).fold(0.0, f64::max),
        History::Step { before, after, .. } | History::Ramp { before, after, .. } => before.abs().max(after.abs()),
        History::Harmonic { mean, amplitude, .. } => mean.abs() + amplitude.abs(),
    }
}
