//! How loads of a motion vary in time.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::motion::transient::History;
use v1::driven_load::History as Given;

use super::findings::{Findings, Path};
use super::numbers::{DRIVEN_FREQUENCY, MOMENT, Of, PHASE, Quantity, SPACING};
use super::reasons;
use super::resolved::Resolved;
use crate::words::number;

/// Values of one table.
const MOST_VALUES: usize = 1_000_000;

/// Reads a history of values of a `quantity`. `at`: the load that it belongs to.
pub(super) fn read(
    given: &Given,
    of: Of<'_>,
    quantity: &Quantity,
    at: &Path<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<History> {
    let at = at.field(field(given));
    let mut value = |name: &'static str, value: f64| findings.number(&at.field(name), of, quantity, value);
    match given {
        Given::Constant(constant) => Some(History::Constant(findings.number(&at, of, quantity, *constant)?)),
        Given::Table(table) => read_table(table, of, quantity, &at, findings, resolved).map(History::Table),
        Given::Step(step) => {
            let (before, after) = (value("before", step.before), value("after", step.after));
            let field = at.field("at_s");
            if step.at_s.is_none() {
                resolved.left_out(&field, 0);
            }
            let when = findings.number_or(&field, of, &MOMENT, step.at_s, 0.0);
            Some(History::Step {
                at: when?,
                before: before?,
                after: after?,
            })
        }
        Given::Ramp(ramp) => {
            let (before, after) = (value("before", ramp.before), value("after", ramp.after));
            let span = read_span(ramp.start_s, ramp.end_s, of, &at, findings);
            let (start, end) = span?;
            Some(History::Ramp {
                start,
                end,
                before: before?,
                after: after?,
            })
        }
        Given::Harmonic(sine) => {
            let (mean, amplitude) = (value("mean", sine.mean), value("amplitude", sine.amplitude));
            let field = at.field("frequency_hz");
            let frequency = findings.number(&field, of, &DRIVEN_FREQUENCY, sine.frequency_hz);
            let phase = findings.number(&at.field("phase_deg"), of, &PHASE, sine.phase_deg);
            let span = match sine.end_s {
                Some(end) => read_span(sine.start_s, end, of, &at, findings),
                None => {
                    resolved.left_out(&at.field("end_s"), "with the motion");
                    let start = findings.number(&at.field("start_s"), of, &MOMENT, sine.start_s);
                    start.map(|start| (start, f64::MAX))
                }
            };
            let (start, end) = span?;
            Some(History::Harmonic {
                mean: mean?,
                amplitude: amplitude?,
                frequency: frequency?,
                phase: phase?.to_radians(),
                start,
                end,
            })
        }
    }
}

/// Name of the field that a history stands in.
pub(super) fn field(given: &Given) -> &'static str {
    match given {
        Given::Constant(_) => "constant",
        Given::Table(_) => "table",
        Given::Step(_) => "step",
        Given::Ramp(_) => "ramp",
        Given::Harmonic(_) => "harmonic",
    }
}

fn read_span(start: f64, end: f64, of: Of<'_>, at: &Path<'_>, findings: &mut Findings) -> Option<(f64, f64)> {
    let field = at.field("end_s");
    let start = findings.number(&at.field("start_s"), of, &MOMENT, start);
    let end = findings.number(&field, of, &MOMENT, end);
    let (start, end) = (start?, end?);
    if end > start {
        return Some((start, end));
    }
    findings
        .error(
            reasons::TIMES_OUT_OF_ORDER,
            &field,
            of.id,
            format!(
                "{of}: a history ends at {} s and begins at {} s: it must end after it begins",
                number(end),
                number(start)
            ),
            "give end_s after start_s; a change in no time is a step",
        )
        .value(number(end));
    None
}

fn read_table(
    table: &v1::HistoryTable,
    of: Of<'_>,
    quantity: &Quantity,
    at: &Path<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<Vec<(f64, f64)>> {
    let count = table.values.len();
    let field = at.field("values");
    if count == 0 {
        findings.error(
            reasons::MISSING,
            &field,
            of.id,
            format!("{of}: a table has no values"),
            "give at least one value",
        );
        return None;
    }
    if count > MOST_VALUES {
        findings
            .error(
                reasons::TOO_MANY,
                &field,
                of.id,
                format!("{of}: {count} values in one table: at most {MOST_VALUES} are taken"),
                "thin the record out, or follow it in several motions",
            )
            .value(count);
        return None;
    }
    let mut all_valid = true;
    for (place, value) in table.values.iter().enumerate() {
        all_valid &= findings.number(&field.number(place), of, quantity, *value).is_some();
    }
    let times = if table.times_s.is_empty() {
        spaced(table, of, at, findings, resolved)
    } else {
        listed(table, of, at, findings)
    };
    let times = times.filter(|_| all_valid)?;
    Some(times.into_iter().zip(table.values.iter().copied()).collect())
}

/// Times at equal spacing.
fn spaced(
    table: &v1::HistoryTable,
    of: Of<'_>,
    at: &Path<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<Vec<f64>> {
    let from_at = at.field("from_s");
    if table.from_s.is_none() {
        resolved.left_out(&from_at, 0);
    }
    let from = findings.number_or(&from_at, of, &MOMENT, table.from_s, 0.0);
    let field = at.field("every_s");
    let Some(every) = table.every_s else {
        findings.error(
            reasons::MISSING,
            &field,
            of.id,
            format!("{of}: a table has values and no times"),
            "give times_s, or the spacing in every_s",
        );
        return None;
    };
    let every = findings.number(&field, of, &SPACING, every)?;
    let from = from?;
    Some(
        (0..table.values.len())
            .map(|place| from + place as f64 * every)
            .collect(),
    )
}

/// Times as given, one by one.
fn listed(table: &v1::HistoryTable, of: Of<'_>, at: &Path<'_>, findings: &mut Findings) -> Option<Vec<f64>> {
    let mut is_right = true;
    for (name, given) in [("every_s", table.every_s), ("from_s", table.from_s)] {
        if let Some(given) = given {
            is_right = false;
            findings
                .error(
                    reasons::TIMES_TWICE,
                    &at.field(name),
                    of.id,
                    format!("{of}: a table gives its times one by one, and {name} besides"),
                    "give times_s, or every_s with from_s",
                )
                .value(number(given));
        }
    }
    let (field, times) = (at.field("times_s"), &table.times_s);
    if times.len() != table.values.len() {
        is_right = false;
        findings
            .error(
                reasons::WRONG_COUNT,
                &field,
                of.id,
                format!(
                    "{of}: a table has {} times for {} values",
                    times.len(),
                    table.values.len()
                ),
                "give one time for each value",
            )
            .value(times.len());
    }
    for (place, time) in times.iter().enumerate() {
        is_right &= findings.number(&field.number(place), of, &MOMENT, *time).is_some();
    }
    let back = times
        .windows(2)
        .position(|pair| pair[1] < pair[0])
        .map(|place| place + 1);
    if let Some(place) = back {
        is_right = false;
        let (time, before) = (number(times[place]), number(times[place - 1]));
        findings
            .error(
                reasons::TIMES_OUT_OF_ORDER,
                &field.number(place),
                of.id,
                format!("{of}: a table goes back in time: {time} s at place {place} comes after {before} s"),
                "sort the points by time",
            )
            .value(time);
    }
    let crowded = times
        .windows(3)
        .position(|three| three[0] == three[1] && three[1] == three[2]);
    if let Some(place) = crowded.map(|place| place + 2) {
        is_right = false;
        let time = number(times[place]);
        findings
            .error(
                reasons::TIMES_OUT_OF_ORDER,
                &field.number(place),
                of.id,
                format!("{of}: a table has more than two points at {time} s, up to place {place}"),
                "keep the first and the last of them: two points at one time are a jump",
            )
            .value(time);
    }
    is_right.then(|| times.clone())
}
