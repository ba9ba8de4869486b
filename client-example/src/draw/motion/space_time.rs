//! A rope over time: its unstressed length across, time downwards, tension and movement as colour, so that a wave is a slanting
//! band, and how steep it is tells its speed.

use super::WIDTH;
use super::curve::bounds;
use super::field::{self, Grid};
use crate::colour::{self, Scale};
use crate::draw::frame::{self, short, ticks};
use crate::draw::room::HALO;
use crate::draw::{ALARM, INK, MUTED, Sketch};
use crate::escape::markup;
use crate::number::three;
use crate::run::{MotionRun, Run};

const LEFT: f64 = 92.0;
const TOP: f64 = 180.0;
const FIELD: [f64; 2] = [470.0, 520.0];
const PITCH: f64 = 574.0;
/// Classes of colour: an odd number, so that nothing has one of its own.
const CLASSES: usize = 41;
/// Share of the time that a wave takes at least to pass the rope where it is drawn.
const SEEN: f64 = 0.06;
/// How often the drawn way of a wave is turned back.
const TURNS: usize = 4;

/// One picture of a shown rope: its tension at the left, its movement at the right. None where the rope cannot be drawn.
pub(super) fn space_time(run: &Run, motion: &MotionRun, rope: usize) -> Option<String> {
    let tension = field::tension(motion, rope)?;
    let sideways = field::sideways(motion, rope)?;
    let shown = &motion.shown.ropes[rope];
    let mut sketch = Sketch::new();
    let title = format!(
        "Motion {} · rope {} over time · {}",
        motion.id,
        shown.cable,
        run.title()
    );
    frame::head(
        &mut sketch,
        &title,
        &[
            (
                motion.begin.as_ref().map_or(String::new(), |begin| begin.in_words.clone()),
                MUTED,
            ),
            (
                "Across: unstressed length; downwards: time. A wave is a slanting band: the flatter, the faster. Dashed: at the speed of the start."
                    .to_owned(),
                MUTED,
            ),
        ],
    );
    let forces = || tension.rows.iter().flatten().copied();
    let [low, high] = bounds(forces());
    let taut = bounds(forces().filter(|force| *force > 0.0));
    let has_slack = low <= 0.0;
    // From the least tension on, so that a small wave in a tight rope is seen; by logarithm where tensions span much.
    let scale = Scale::over(forces());
    let low = if has_slack { 0.0 } else { taut[0] };
    let high = if high > low { high } else { low + 1.0 };
    let share = |force: f64| {
        if scale.logarithmic {
            scale.share(force)
        } else {
            (force - low) / (high - low)
        }
    };
    panel(
        &mut sketch,
        motion,
        rope,
        0,
        &tension,
        ["tension", "kN", "slack"],
        &|force| {
            let class = (force > 0.0).then(|| class(share(force)))?;
            Some((class, colour::at(share_of(class))))
        },
    );
    let words = format!(
        "kN{}{}",
        if scale.logarithmic { ", log scale" } else { "" },
        if has_slack { "; white: slack" } else { "" }
    );
    let marks = if scale.logarithmic {
        let ticks = scale.ticks().into_iter();
        ticks.map(|(tick, text)| (share(tick * 1e3), text)).collect()
    } else {
        even([low / 1e3, high / 1e3])
    };
    legend(&mut sketch, 0, &marks, &words, &colour::at);
    let [least, most] = bounds(sideways.grid.rows.iter().flatten().copied());
    let size = least.abs().max(most.abs()).max(1e-12);
    panel(
        &mut sketch,
        motion,
        rope,
        1,
        &sideways.grid,
        ["movement across the rope", "mm", ""],
        &|number| {
            let class = class(f64::midpoint(number / size, 1.0));
            Some((class, colour::two_ways(2.0 * share_of(class) - 1.0)))
        },
    );
    let along = sideways.along.map(|part| crate::number::fixed(part, 2));
    let rest = if sideways.share < 0.95 {
        format!(" ({} % of it, by squares)", crate::number::percent(sideways.share))
    } else {
        String::new()
    };
    legend(
        &mut sketch,
        1,
        &even([-size * 1e3, size * 1e3]),
        &format!("mm from the start, positive along ({}){rest}", along.join(", ")),
        &|share| colour::two_ways(2.0 * share - 1.0),
    );
    let note = guides(&mut sketch, motion, rope, [&tension, &sideways.grid]);
    sketch.put(format_args!(
        "<text x=\"36\" y=\"{:.1}\" font-size=\"12\">{}</text>",
        TOP + FIELD[1] + 90.0,
        markup(&note)
    ));
    let bottom = TOP + FIELD[1] + 114.0;
    frame::foot(&mut sketch, run, bottom);
    Some(sketch.finish(WIDTH, bottom + 18.0, &title))
}

#[allow(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    clippy::cast_precision_loss,
    reason = "a share of a small count"
)]
fn class(share: f64) -> usize {
    ((share.clamp(0.0, 1.0) * CLASSES as f64) as usize).min(CLASSES - 1)
}

/// Share in the middle of a class.
#[allow(clippy::cast_precision_loss, reason = "a small count")]
fn share_of(class: usize) -> f64 {
    (class as f64 + 0.5) / CLASSES as f64
}

fn corner(panel: usize) -> [f64; 2] {
    [if panel == 0 { LEFT } else { LEFT + PITCH }, TOP]
}

/// Class and colour of a number; none: nothing is there.
type Paint<'a> = dyn Fn(f64) -> Option<(usize, String)> + 'a;

/// A field with its axes. Cells are joined to runs of a class, and the most frequent class lies below all.
fn panel(
    sketch: &mut Sketch,
    motion: &MotionRun,
    rope: usize,
    number: usize,
    grid: &Grid,
    [name, unit, nothing]: [&str; 3],
    paint: &Paint,
) {
    let [left, top] = corner(number);
    let shown = &motion.shown.ropes[rope];
    sketch.put(format_args!(
        "<text x=\"{left:.1}\" y=\"{:.1}\" font-weight=\"600\" font-size=\"15\">{name} <tspan font-weight=\"400\" fill=\"{MUTED}\">({unit})</tspan></text>",
        top - 46.0
    ));
    cells(sketch, grid, [left, top], nothing, paint);
    sketch.put(format_args!(
        "<rect x=\"{left:.1}\" y=\"{top:.1}\" width=\"{}\" height=\"{}\" fill=\"none\" stroke=\"{MUTED}\"/>",
        FIELD[0], FIELD[1]
    ));
    let x = |material: f64| left + (material - grid.material[0]) / (grid.material[1] - grid.material[0]) * FIELD[0];
    let y = |time: f64| top + (time - grid.time[0]) / (grid.time[1] - grid.time[0]) * FIELD[1];
    let numbers = ticks(grid.material[0], grid.material[1], 6.0);
    for (place, tick) in numbers.iter().enumerate() {
        let unit = if place + 1 == numbers.len() { " m" } else { "" };
        sketch.put(format_args!(
            "<path d=\"M{:.1} {top:.1}v-5\" stroke=\"{MUTED}\"/><text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"middle\" font-size=\"11\">{tick}{unit}</text>",
            x(*tick),
            x(*tick),
            top - 9.0
        ));
    }
    let numbers = ticks(grid.time[0], grid.time[1], 8.0);
    for (place, tick) in numbers.iter().enumerate() {
        let unit = if place + 1 == numbers.len() { " s" } else { "" };
        sketch.put(format_args!(
            "<path d=\"M{left:.1} {:.1}h-5\" stroke=\"{MUTED}\"/><text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"end\" font-size=\"11\">{tick}{unit}</text>",
            y(*tick),
            left - 8.0,
            y(*tick) + 4.0
        ));
    }
    sketch.put(format_args!(
        "<text x=\"{:.1}\" y=\"{:.1}\" font-size=\"11\" fill=\"{MUTED}\" text-anchor=\"middle\" transform=\"rotate(-90 {:.1} {:.1})\">time, downwards</text>",
        left - 56.0,
        top + FIELD[1] / 2.0,
        left - 56.0,
        top + FIELD[1] / 2.0
    ));
    for (node, at, anchor) in [
        (shown.nodes.first(), left, "start"),
        (shown.nodes.last(), left + FIELD[0], "end"),
    ] {
        let node = node.map_or("", String::as_str);
        sketch.put(format_args!(
            "<text x=\"{at:.1}\" y=\"{:.1}\" font-size=\"12\" text-anchor=\"{anchor}\">{}</text>",
            top - 25.0,
            markup(&short(node, 24))
        ));
    }
}

fn cells(sketch: &mut Sketch, grid: &Grid, [left, top]: [f64; 2], nothing: &str, paint: &Paint) {
    let classes: Vec<Vec<Option<(usize, String)>>> = (grid.rows.iter())
        .map(|row| row.iter().map(|number| paint(*number)).collect())
        .collect();
    let mut counts = vec![(0_usize, ""); CLASSES];
    for (class, colour) in classes.iter().flatten().flatten() {
        counts[*class] = (counts[*class].0 + 1, colour);
    }
    let n_columns = classes.first().map_or(0, Vec::len);
    #[allow(clippy::cast_precision_loss, reason = "a grid is small")]
    let scale = [FIELD[0] / n_columns as f64, FIELD[1] / classes.len() as f64];
    let ground = (0..CLASSES).max_by_key(|&class| counts[class].0).unwrap_or(0);
    sketch.put(format_args!(
        "<g transform=\"translate({left:.1} {top:.1}) scale({:.4} {:.4})\" shape-rendering=\"crispEdges\">\
         <path d=\"M0 0h{n_columns}v{}h-{n_columns}z\" fill=\"{}\"/>",
        scale[0],
        scale[1],
        classes.len(),
        counts[ground].1
    ));
    let mut paths = vec![String::new(); CLASSES + 1];
    for (row, line) in classes.iter().enumerate() {
        let mut column = 0;
        while column < n_columns {
            let of = |at: usize| line[at].as_ref().map_or(CLASSES, |(class, _)| *class);
            let class = of(column);
            let long = (column..n_columns).take_while(|&at| of(at) == class).count();
            if class != ground {
                paths[class].push_str(&format!("M{column} {row}h{long}v1h-{long}z"));
            }
            column += long;
        }
    }
    for (class, path) in paths.iter().enumerate().filter(|(_, path)| !path.is_empty()) {
        let colour = counts.get(class).map_or("#fff", |(_, colour)| colour);
        let what = if class == CLASSES { nothing } else { "" };
        let what = if what.is_empty() {
            String::new()
        } else {
            format!(" data-what=\"{what}\"")
        };
        sketch.put(format_args!("<path d=\"{path}\" fill=\"{colour}\"{what}/>"));
    }
    sketch.put(format_args!("</g>"));
}

/// Round numbers of an even scale, each with its share of it.
fn even([low, high]: [f64; 2]) -> Vec<(f64, String)> {
    let numbers = ticks(low, high, 6.0).into_iter();
    numbers
        .map(|tick| ((tick - low) / (high - low), tick.to_string()))
        .collect()
}

/// The scale of colours below a field, with numbers at shares of it.
fn legend(sketch: &mut Sketch, panel: usize, marks: &[(f64, String)], words: &str, paint: &dyn Fn(f64) -> String) {
    let [left, top] = [corner(panel)[0], TOP + FIELD[1] + 18.0];
    let step = FIELD[0] / 48.0;
    for number in 0..48 {
        sketch.put(format_args!(
            "<rect x=\"{:.2}\" y=\"{top:.1}\" width=\"{:.2}\" height=\"12\" fill=\"{}\"/>",
            left + step * f64::from(number),
            step + 0.3,
            paint((f64::from(number) + 0.5) / 48.0)
        ));
    }
    for (share, tick) in marks {
        let x = left + share * FIELD[0];
        sketch.put(format_args!(
            "<path d=\"M{x:.1} {:.1}v4\" stroke=\"{INK}\"/><text x=\"{x:.1}\" y=\"{:.1}\" text-anchor=\"middle\" font-size=\"11\">{tick}</text>",
            top + 12.0,
            top + 28.0
        ));
    }
    sketch.put(format_args!(
        "<text x=\"{left:.1}\" y=\"{:.1}\" font-size=\"11\" fill=\"{MUTED}\">{}</text>",
        top + 46.0,
        markup(words)
    ));
}

/// How waves would run from where something first happened: on the movement transverse ones, on the tension axial ones, or
/// transverse ones there too where axial ones are too fast for the picture. Returns what must be known of it, in words.
fn guides(sketch: &mut Sketch, motion: &MotionRun, rope: usize, grids: [&Grid; 2]) -> String {
    let grid = grids[0];
    let shown = &motion.shown.ropes[rope];
    let Some(waves) = motion.waves_of(&shown.cable) else {
        return "No wave is drawn: the rope has no mass per length throughout.".to_owned();
    };
    let (least, most) = (waves.transverse_least_m_per_s, waves.transverse_most_m_per_s);
    let (length, span) = (grid.material[1] - grid.material[0], grid.time[1] - grid.time[0]);
    if most <= 0.0 {
        return "No wave is drawn: the rope is slack at the start.".to_owned();
    }
    if length / most < SEEN * span {
        return format!(
            "A transverse wave ({} m/s) passes the rope in {} s, too fast to be seen here: a shorter motion with more frames shows it.",
            three(most),
            three(length / most)
        );
    }
    let Some(start) = field::start(motion, rope, grids[1]) else {
        return "No wave is drawn: no event tells where one begins, and the rope moves in many places at once."
            .to_owned();
    };
    let place = |panel: usize, [material, time]: [f64; 2]| {
        let [left, top] = corner(panel);
        [
            left + (material - grid.material[0]) / (grid.material[1] - grid.material[0]) * FIELD[0],
            top + (time - grid.time[0]) / (grid.time[1] - grid.time[0]) * FIELD[1],
        ]
    };
    let which = if least < 0.98 * most { " at most" } else { "" };
    let transverse = (most, format!("transverse wave,{which} {} m/s", three(most)), TURNS);
    let axial = waves.axial_m_per_s;
    let on_tension = if length / axial > SEEN * span {
        (axial, format!("axial wave, {} m/s", three(axial)), 1)
    } else {
        transverse.clone()
    };
    for (panel, (speed, words, turns)) in [on_tension, transverse].into_iter().enumerate() {
        let ways = field::way(start.at, speed, grid.material, grid.time[1], turns);
        let long = |way: &[[f64; 2]]| way.get(1).map_or(0.0, |next| (next[0] - way[0][0]).abs());
        let longer = usize::from(long(&ways[1]) > long(&ways[0]));
        for (side, way) in ways.iter().enumerate().filter(|(_, way)| way.len() > 1) {
            let points: Vec<[f64; 2]> = way.iter().map(|point| place(panel, *point)).collect();
            guide(
                sketch,
                &points,
                speed,
                (side == longer).then_some(words.as_str()),
                panel,
            );
        }
    }
    for panel in 0..2 {
        let [x, y] = place(panel, start.at);
        sketch.put(format_args!(
            "<circle cx=\"{x:.1}\" cy=\"{y:.1}\" r=\"4\" fill=\"none\" stroke=\"{ALARM}\" stroke-width=\"1.6\"><title>{}</title></circle>",
            markup(&start.words)
        ));
    }
    format!("Circle, from where the dashed waves run: {}.", start.words)
}

/// One way of a wave, its words beside the middle of its first part.
fn guide(sketch: &mut Sketch, points: &[[f64; 2]], speed: f64, words: Option<&str>, panel: usize) {
    let line: Vec<String> = points.iter().map(|[x, y]| format!("{x:.1},{y:.1}")).collect();
    let line = line.join(" ");
    sketch.put(format_args!(
        "<polyline points=\"{line}\" fill=\"none\" stroke=\"#fff\" stroke-width=\"2.2\" stroke-opacity=\".4\"/>\
         <polyline points=\"{line}\" fill=\"none\" stroke=\"{INK}\" stroke-width=\"1\" stroke-dasharray=\"6 5\" stroke-opacity=\".75\" data-speed-m-per-s=\"{speed}\"/>"
    ));
    let (Some(words), [a, b, ..]) = (words, points) else {
        return;
    };
    let [left, top] = corner(panel);
    let (x, y) = (f64::midpoint(a[0], b[0]), f64::midpoint(a[1], b[1]));
    // Beside the line where it is steep enough for that, below it where it lies flat at the top.
    let (x, y) = if y - top > 22.0 { (x, y - 14.0) } else { (x, y + 26.0) };
    #[allow(clippy::cast_precision_loss, reason = "a few letters")]
    let half = 3.6 * words.chars().count() as f64;
    let shift = if b[0] > a[0] { half + 12.0 } else { -half - 12.0 };
    let x = (x + shift).clamp(left + half + 4.0, left + FIELD[0] - half - 4.0);
    sketch.put(format_args!(
        "<text x=\"{x:.1}\" y=\"{y:.1}\" text-anchor=\"middle\" font-size=\"12\" {HALO}>{words}</text>"
    ));
}
