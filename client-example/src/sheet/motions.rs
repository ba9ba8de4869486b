//! Motions: how each ended, what was largest, what happened, how fast waves run, and what frequencies are in it.

use ropewalk_api::ropewalk::v1;

use super::text::{terminal_up_to, wrap};
use super::{Cell, Mark, Row, Sheet, file_head, head, page_head, terminal};
use crate::number::{counted, for_eyes, order, percent, three};
use crate::run::{MotionRun, Run};

/// Events that a terminal shows.
const EVENTS: usize = 20;
/// How far from a peak a natural frequency may be to stand beside it, over that frequency.
const NEAR: f64 = 0.25;
/// Width of the names in a block of lines.
const NAMES: usize = 26;

/// How a motion ended, or why it did not.
pub(crate) fn motion_outcome(motion: &MotionRun) -> String {
    let Some(end) = &motion.end else {
        return "not ended".to_owned();
    };
    let why = end.failure.as_ref().map_or("", |failure| failure.message.as_str());
    match end.outcome() {
        v1::MotionOutcome::Finished => format!("followed to its end, {} s", three(end.time_s)),
        v1::MotionOutcome::Stopped => format!("stopped at {} s: {why}", three(end.time_s)),
        v1::MotionOutcome::NotBegun => format!("could not begin: {why}"),
        v1::MotionOutcome::EngineError | v1::MotionOutcome::Unspecified => format!("the engine failed: {why}"),
    }
}

/// The step of time as planned (s): as given, or as explicit stepping divides it.
pub(crate) fn planned_step(run: &Run, motion: &MotionRun) -> Option<f64> {
    let begin = motion.begin.as_ref()?;
    let given = run.brief.motions.iter().find(|given| given.id == motion.id)?;
    (begin.divided_steps > 0.0).then(|| given.duration_s / begin.divided_steps)
}

/// An energy with its unit.
pub(crate) fn energy_words(joule: f64) -> String {
    if joule.abs() >= 1e3 {
        format!("{} kJ", three(joule / 1e3))
    } else if joule.abs() >= 1e-3 || joule == 0.0 {
        format!("{} J", three(joule))
    } else {
        format!("{} J", order(joule))
    }
}

/// A time of a step with its unit.
fn step_words(seconds: f64) -> String {
    format!("{} ms", three(seconds * 1e3))
}

/// Name and words of everything that is told of a motion in a line each.
pub(crate) fn motion_lines(run: &Run, motion: &MotionRun) -> Vec<(&'static str, String)> {
    let mut lines = Vec::new();
    if let Some(begin) = &motion.begin {
        lines.push(("what happens", begin.in_words.clone()));
    }
    lines.push(("how it ended", motion_outcome(motion)));
    let Some(end) = &motion.end else {
        return lines;
    };
    if let Some(failure) = end.failure.as_ref().filter(|failure| !failure.cure.is_empty()) {
        lines.push(("try", failure.cure.clone()));
    }
    let Some(begin) = &motion.begin else {
        return lines;
    };
    let planned = planned_step(run, motion).map_or(String::new(), |step| format!("planned {}, ", step_words(step)));
    lines.push((
        "steps",
        format!(
            "{}; {planned}smallest {}; {}",
            counted(as_size(end.steps), "step"),
            step_words(end.smallest_step_s),
            counted(as_size(end.iterations), "iteration")
        ),
    ));
    let extremes = [
        ("largest tension", "kN", 1e-3, "in", &end.largest_tension_n),
        ("largest movement", "mm", 1e3, "at", &end.largest_movement_m),
        (
            "largest pull on a support",
            "kN",
            1e-3,
            "at",
            &end.largest_support_force_n,
        ),
    ];
    for (name, unit, scale, place, extreme) in extremes {
        let words = extreme.as_ref().map_or("none".to_owned(), |extreme| {
            format!(
                "{} {unit} {place} {}, {} s",
                three(extreme.value * scale),
                extreme.id,
                three(extreme.time_s)
            )
        });
        lines.push((name, words));
    }
    lines.push(("against the static answer", against_static(begin, end)));
    lines.push((
        "slack",
        if end.slackenings == 0 && end.snatches == 0 {
            "no segment went slack".to_owned()
        } else {
            format!(
                "segments went slack {} and snatched {}",
                times(end.slackenings),
                times(end.snatches)
            )
        },
    ));
    // Beside a net that hardly moves a share says nothing.
    let share = if end.largest_error_j < 10.0 * end.largest_kinetic_j {
        format!(
            ", {} % of the largest kinetic energy, {}",
            small_percent(end.largest_error_j / end.largest_kinetic_j),
            energy_words(end.largest_kinetic_j)
        )
    } else {
        String::new()
    };
    lines.push((
        "error of the energy ledger",
        format!("at most {}{share}", energy_words(end.largest_error_j)),
    ));
    lines.push(("mass and damping", mass_words(begin)));
    if begin.divided_segments > 0 {
        lines.push((
            "hanging ropes",
            format!(
                "{} divided; that moves nodes by up to {} mm and changes tensions by up to {} kN",
                counted(as_size(begin.divided_segments.into()), "segment"),
                three(begin.moved_by_division_m * 1e3),
                three(begin.tension_by_division_n / 1e3)
            ),
        ));
    }
    lines
}

fn as_size(count: u64) -> usize {
    usize::try_from(count).unwrap_or(usize::MAX)
}

fn times(count: u64) -> String {
    match count {
        0 => "never".to_owned(),
        1 => "once".to_owned(),
        2 => "twice".to_owned(),
        count => format!("{count} times"),
    }
}

/// A share as a percentage with three digits, however small.
fn small_percent(share: f64) -> String {
    let value = share * 100.0;
    if value == 0.0 || value.abs() >= 1e-3 {
        three(value)
    } else {
        order(value)
    }
}

fn against_static(begin: &v1::MotionBegin, end: &v1::MotionEnd) -> String {
    if begin.compared_with.is_empty() {
        let why = if begin.not_compared.is_empty() {
            "none was found"
        } else {
            &begin.not_compared
        };
        return format!("not compared: {why}");
    }
    let factor = |what: &str, extreme: &Option<v1::MotionExtreme>| {
        extreme.as_ref().map(|extreme| {
            format!(
                "{what} of {} {} times the static answer ({} s)",
                extreme.id,
                three(extreme.value),
                three(extreme.time_s)
            )
        })
    };
    let factors = [
        factor("tension", &end.largest_tension_factor),
        factor("movement", &end.largest_movement_factor),
    ];
    let told: Vec<String> = factors.into_iter().flatten().collect();
    let told = if told.is_empty() {
        "nothing large enough to compare".to_owned()
    } else {
        told.join("; ")
    };
    format!("{told}. Static answer: {}", begin.compared_with)
}

fn mass_words(begin: &v1::MotionBegin) -> String {
    let mut damping = Vec::new();
    if begin.damping_mass_per_s > 0.0 {
        damping.push(format!("{} 1/s times mass", three(begin.damping_mass_per_s)));
    }
    if begin.damping_stiffness_s > 0.0 {
        damping.push(format!("{} ms times stiffness", three(begin.damping_stiffness_s * 1e3)));
    }
    let damping = if damping.is_empty() {
        "no Rayleigh damping".to_owned()
    } else {
        format!("Rayleigh damping {}", damping.join(" and "))
    };
    format!("{} kg move; {damping}", three(begin.moving_mass_kg))
}

/// A motion for a terminal.
pub(crate) fn motion_text(run: &Run, motion: &MotionRun) -> String {
    let mut text = format!("Motion {}\n", motion.id);
    let indent = format!("\n{}", " ".repeat(NAMES + 4));
    for (name, words) in motion_lines(run, motion) {
        let words = wrap(&words, 114 - NAMES, "").replace('\n', &indent);
        text.push_str(&format!("  {name:NAMES$}  {words}\n"));
    }
    if let Some(events) = motion_events(motion) {
        text.push_str(&format!("\n{}", terminal_up_to(&events, EVENTS)));
    }
    for sheet in [motion_waves(run, motion, Told::Telling), motion_peaks(run, motion)]
        .into_iter()
        .flatten()
    {
        text.push_str(&format!("\n{}", terminal(&sheet)));
    }
    text
}

/// Sheets of a motion for its files and the page, in the order in which they are read.
pub(crate) fn motion_sheets(run: &Run, motion: &MotionRun, waves: Told) -> Vec<Sheet> {
    let sheets = [
        motion_events(motion),
        motion_waves(run, motion, waves),
        motion_peaks(run, motion),
    ];
    sheets.into_iter().flatten().collect()
}

/// All motions, a row each; none where the brief asks for none.
pub(crate) fn motions(run: &Run) -> Option<Sheet> {
    let rows: Vec<Row> = run.motions.iter().map(row).collect();
    (!rows.is_empty()).then(|| Sheet {
        file: "motions".into(),
        title: "Motions".into(),
        heads: vec![
            head("motion", ""),
            head("how it ended", ""),
            file_head("steps", ""),
            file_head("smallest step", "ms"),
            head("largest tension", "kN"),
            head("in", ""),
            file_head("at", "s"),
            head("largest movement", "mm"),
            head("of", ""),
            file_head("at", "s"),
            head("largest pull", "kN"),
            head("on", ""),
            file_head("at", "s"),
            head("tension over static", ""),
            file_head("in", ""),
            head("movement over static", ""),
            file_head("of", ""),
            head("slack", ""),
            head("snatches", ""),
            file_head("largest kinetic energy", "J"),
            file_head("error of the ledger over it", "%"),
        ],
        rows,
        note: "Motions in time from solved states. Not judged by checks: peaks are to be compared with resistances by an engineer. \
               Over static: largest ratio of a peak to the static answer.",
    })
}

fn row(motion: &MotionRun) -> Row {
    let end = motion.end.clone().unwrap_or_default();
    let begun = motion.begin.is_some();
    let number = |number: f64| Cell::maybe(begun.then(|| Cell::three(number)));
    let extreme = |extreme: &Option<v1::MotionExtreme>, scale: f64| -> [Cell; 3] {
        match extreme {
            Some(found) => [
                Cell::three(found.value * scale),
                Cell::text(&found.id),
                Cell::three(found.time_s),
            ],
            None => [Cell::Empty, Cell::Empty, Cell::Empty],
        }
    };
    let factor = |factor: &Option<v1::MotionExtreme>| {
        let [value, id, _] = extreme(factor, 1.0);
        [value, id]
    };
    let mut cells = vec![
        Cell::text(&motion.id),
        Cell::text(motion_outcome(motion)),
        Cell::Count(end.steps),
        number(end.smallest_step_s * 1e3),
    ];
    cells.extend(extreme(&end.largest_tension_n, 1e-3));
    cells.extend(extreme(&end.largest_movement_m, 1e3));
    cells.extend(extreme(&end.largest_support_force_n, 1e-3));
    cells.extend(factor(&end.largest_tension_factor));
    cells.extend(factor(&end.largest_movement_factor));
    let share = (end.largest_kinetic_j > 0.0).then(|| end.largest_error_j / end.largest_kinetic_j * 100.0);
    cells.extend([
        Cell::Count(end.slackenings),
        Cell::Count(end.snatches),
        number(end.largest_kinetic_j),
        Cell::maybe(share.map(Cell::three)),
    ]);
    Row {
        cells,
        mark: if motion.finished() { Mark::Plain } else { Mark::Gone },
        group: String::new(),
    }
}

/// What happened to segments; none where nothing did.
fn motion_events(motion: &MotionRun) -> Option<Sheet> {
    let rows = motion.events.iter().map(|event| {
        let (words, mark) = match event.kind() {
            v1::MotionEventKind::Slack => ("went slack", Mark::Plain),
            v1::MotionEventKind::Snatch => ("snatched", Mark::Plain),
            v1::MotionEventKind::Break => ("began to break", Mark::Bad),
            v1::MotionEventKind::Unspecified => ("", Mark::Plain),
        };
        Row {
            cells: vec![
                Cell::three(event.time_s),
                Cell::text(words),
                Cell::text(&event.member),
                Cell::text(&event.from),
                Cell::text(&event.to),
            ],
            mark,
            group: String::new(),
        }
    });
    let rows: Vec<Row> = rows.collect();
    (!rows.is_empty()).then(|| Sheet {
        file: format!("motion-{}-events", motion.name).into(),
        title: format!("Motion {}: what happened to segments", motion.id).into(),
        heads: vec![
            head("time", "s"),
            head("what", ""),
            head("member", ""),
            head("from", ""),
            head("to", ""),
        ],
        rows,
        note: match motion.end.as_ref().map_or(0, |end| end.events_left_out) {
            0 => "In order of time. Snatched: came taut again.",
            _ => "In order of time; later ones are counted but not listed. Snatched: came taut again.",
        },
    })
}

/// Which ropes a sheet of waves lists.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Told {
    All,
    /// Those that frames show, and those whose transverse waves the steps smear.
    Telling,
}

/// Speeds of waves beside the step that follows them; none where no rope has any.
fn motion_waves(run: &Run, motion: &MotionRun, told: Told) -> Option<Sheet> {
    let used = planned_step(run, motion);
    // What the engine rounds in its last digits is no difference.
    let follows = |step: Option<f64>| Some(used? <= step? * (1.0 + 1e-9));
    let rows = motion.waves.iter().filter_map(|waves| {
        let (transverse, axial) = (follows(waves.transverse_step_s), follows(Some(waves.axial_step_s)));
        let shown = motion.shown.ropes.iter().any(|rope| rope.cable == waves.cable);
        if told == Told::Telling && !shown && transverse != Some(false) {
            return None;
        }
        let followed = match (transverse, axial) {
            (_, Some(true)) => "transverse and axial",
            (Some(true), _) => "transverse",
            (Some(false), _) => "neither",
            (None, Some(false)) => "not the axial ones",
            (None, None) => "",
        };
        let cells = vec![
            Cell::text(&waves.cable),
            Cell::three(waves.transverse_least_m_per_s),
            Cell::three(waves.transverse_most_m_per_s),
            Cell::maybe(waves.transverse_step_s.map(|step| Cell::three(step * 1e3))),
            Cell::three(waves.axial_m_per_s),
            Cell::three(waves.axial_step_s * 1e3),
            Cell::maybe(used.map(|step| Cell::three(step * 1e3))),
            Cell::text(followed),
        ];
        Some(Row {
            cells,
            mark: if transverse == Some(false) {
                Mark::Open
            } else {
                Mark::Plain
            },
            group: String::new(),
        })
    });
    let rows: Vec<Row> = rows.collect();
    (!rows.is_empty()).then(|| Sheet {
        file: format!("motion-{}-waves", motion.name).into(),
        title: format!("Motion {}: waves on ropes", motion.id).into(),
        heads: vec![
            head("rope", ""),
            head("transverse slowest", "m/s"),
            head("transverse fastest", "m/s"),
            head("takes steps of", "ms"),
            head("axial waves", "m/s"),
            head("takes steps of", "ms"),
            head("steps planned", "ms"),
            head("followed are", ""),
        ],
        rows,
        note: "Speeds over the unstressed length in the state at the start. Takes steps of: the time in which the wave crosses one \
               segment; longer steps smear it. Listed are ropes that frames show and those whose transverse waves are smeared; \
               the CSV file has all.",
    })
}

/// Peaks of spectra beside natural frequencies of the state that the motion starts from; none where there are no spectra.
fn motion_peaks(run: &Run, motion: &MotionRun) -> Option<Sheet> {
    let from = motion.begin.as_ref().map_or("", |begin| begin.from.as_str());
    let natural = run.natural_frequencies(from);
    let mut rows = Vec::new();
    for spectrum in &motion.spectra {
        let (unit, scale) = for_eyes(&spectrum.unit);
        for peak in &spectrum.peaks {
            let off = |frequency: f64| (peak.frequency_hz - frequency).abs();
            // Beyond the modes that were asked for, the nearest one says nothing.
            let nearest = natural
                .iter()
                .min_by(|a, b| off(a.1).total_cmp(&off(b.1)))
                .filter(|(_, frequency)| off(*frequency) <= (NEAR * frequency).max(spectrum.resolution_hz));
            let mut cells = vec![
                Cell::text(&spectrum.watched),
                Cell::three(peak.frequency_hz),
                Cell::three(peak.amplitude * scale),
                Cell::text(unit),
            ];
            match nearest {
                Some((number, frequency)) => cells.extend([
                    Cell::Count((*number).into()),
                    Cell::three(*frequency),
                    Cell::text(difference(
                        peak.frequency_hz - frequency,
                        *frequency,
                        spectrum.resolution_hz,
                    )),
                ]),
                None => cells.extend([Cell::Empty, Cell::Empty, Cell::Empty]),
            }
            cells.push(Cell::three(spectrum.resolution_hz));
            rows.push(Row {
                cells,
                mark: Mark::Plain,
                group: spectrum.watched.clone(),
            });
        }
    }
    (!rows.is_empty()).then(|| Sheet {
        file: format!("motion-{}-spectrum-peaks", motion.name).into(),
        title: format!("Motion {}: peaks of spectra", motion.id).into(),
        heads: vec![
            head("watched", ""),
            head("frequency", "Hz"),
            head("amplitude", ""),
            head("unit", ""),
            head("nearest mode", ""),
            head("its frequency", "Hz"),
            head("off", ""),
            page_head("lines apart", "Hz"),
        ],
        rows,
        note: "Largest first for each watched quantity. Amplitude: of a sine that makes the peak. Nearest mode: natural mode of the \
               state that the motion starts from, where modes are asked for and one is within a quarter; a large movement has other \
               frequencies than a small one.",
    })
}

/// How far a peak is from a natural frequency.
fn difference(by: f64, of: f64, resolution: f64) -> String {
    if by.abs() <= resolution {
        "within a line".to_owned()
    } else {
        let sign = if by > 0.0 { "+" } else { "-" };
        format!("{sign}{} %", percent(by.abs() / of))
    }
}
