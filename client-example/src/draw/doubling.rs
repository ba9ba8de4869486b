//! Does doubling double? Small plots of tension and movement over the load factor, beside the straight line.

use super::frame::{self, rule, ticks};
use super::{ALARM, INK, MUTED, Sketch};
use crate::escape::markup;
use crate::number::{clean, three};
use crate::run::{Growth, LoadPath, Run, State};

const WIDTH: f64 = 1200.0;
const COLUMNS: usize = 3;
const CELL: [f64; 2] = [378.0, 258.0];
const PLOT: [f64; 2] = [270.0, 160.0];
/// Ropes that are drawn beside the movement.
const ROPES: usize = 8;
const CURVE: &str = "#31688e";
const OTHER: &str = "#c2571a";

/// The plots of a case with a path.
pub(crate) fn doubling(run: &Run, state: &State, path: &LoadPath) -> String {
    let gamma = run.looked_at_factor();
    let mut sketch = Sketch::new();
    frame::head(
        &mut sketch,
        &format!("{} · {} · does doubling double?", run.title(), state.id),
        &[
            (format!("F: {}", state.in_words), MUTED),
            (
                "Load factor 0 and up against the largest movement and the largest tension of a rope; ropes with the largest \
                 departure from the straight line first. Dashed: straight line through no load and F."
                    .to_owned(),
                MUTED,
            ),
        ],
    );
    let mut plots: Vec<(String, &str, f64, &[f64], Growth)> = Vec::new();
    if let Some(growth) = path.movement(gamma) {
        plots.push(("largest movement".to_owned(), "mm", 1e3, &path.movements, growth));
    }
    for (cable, growth) in path.by_departure(gamma).into_iter().take(ROPES) {
        plots.push((run.cables[cable].clone(), "kN", 1e-3, &path.tensions[cable], growth));
    }
    for (number, (name, unit, scale, numbers, growth)) in plots.iter().enumerate() {
        #[allow(clippy::cast_precision_loss, reason = "a handful of plots")]
        let (column, row) = ((number % COLUMNS) as f64, (number / COLUMNS) as f64);
        let corner = [36.0 + column * CELL[0], 124.0 + row * CELL[1]];
        let values: Vec<f64> = numbers.iter().map(|value| value * scale).collect();
        plot(
            &mut sketch,
            corner,
            [name, unit],
            *scale,
            &path.factors,
            &values,
            *growth,
        );
    }
    #[allow(clippy::cast_precision_loss, reason = "a handful of plots")]
    let bottom = 124.0 + plots.len().div_ceil(COLUMNS).max(1) as f64 * CELL[1];
    frame::foot(&mut sketch, run, bottom + 8.0);
    sketch.finish(
        WIDTH,
        bottom + 26.0,
        &format!("{}, load path, {}", run.title(), state.id),
    )
}

fn plot(
    sketch: &mut Sketch,
    corner: [f64; 2],
    [name, unit]: [&str; 2],
    scale: f64,
    factors: &[f64],
    values: &[f64],
    growth: Growth,
) {
    let [left, top] = [corner[0] + 46.0, corner[1] + 24.0];
    let last = factors.last().copied().unwrap_or(1.0);
    let line_end = (growth.none + last * (growth.full - growth.none)) * scale;
    let on_effect = growth.on_effect() * scale;
    let high = values.iter().copied().fold(line_end.max(on_effect), f64::max).max(1e-9) * 1.06;
    let x = |factor: f64| left + factor / last * PLOT[0];
    let y = |value: f64| top + PLOT[1] * (1.0 - value.clamp(0.0, high) / high);

    sketch.put(format_args!(
        "<text x=\"{:.1}\" y=\"{:.1}\" font-weight=\"600\">{} <tspan font-weight=\"400\" fill=\"{MUTED}\">({unit})</tspan></text>",
        corner[0],
        corner[1] + 8.0,
        markup(&frame::short(name, 34))
    ));
    for tick in ticks(0.0, high, 4.0) {
        rule(sketch, [left, y(tick)], [left + PLOT[0], y(tick)]);
        sketch.put(format_args!(
            "<text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"end\" font-size=\"11\">{tick}</text>",
            left - 6.0,
            y(tick) + 4.0
        ));
    }
    for tick in ticks(0.0, last, 4.0) {
        sketch.put(format_args!(
            "<path d=\"M{:.1} {:.1}v4\" stroke=\"{MUTED}\"/><text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"middle\" font-size=\"11\">{tick}</text>",
            x(tick),
            top + PLOT[1],
            x(tick),
            top + PLOT[1] + 17.0
        ));
    }
    sketch.put(format_args!(
        "<path d=\"M{:.1} {:.1}L{:.1} {:.1}\" stroke=\"{MUTED}\" stroke-dasharray=\"5 4\"/>",
        x(0.0),
        y(growth.none * scale),
        x(last),
        y(line_end)
    ));
    let points = factors
        .iter()
        .zip(values)
        .map(|(factor, value)| format!("{:.1},{:.1}", x(*factor), y(*value)));
    sketch.put(format_args!(
        "<polyline points=\"{}\" fill=\"none\" stroke=\"{CURVE}\" stroke-width=\"2.2\"/>",
        points.collect::<Vec<_>>().join(" ")
    ));
    mark(sketch, growth, scale, [&x, &y]);
    let index = growth
        .index()
        .map_or(String::new(), |index| format!(", index {}", three(index)));
    let slack = growth
        .slack_from
        .map_or(String::new(), |factor| format!("; slack from {} F", three(factor)));
    sketch.put(format_args!(
        "<text x=\"{:.1}\" y=\"{:.1}\" font-size=\"12\"><tspan fill=\"{CURVE}\">● E(γF) {}</tspan> <tspan fill=\"{OTHER}\">◆ γE(F) {}</tspan>\
         <tspan fill=\"{}\">{index}{slack}</tspan></text>",
        corner[0],
        top + PLOT[1] + 38.0,
        three(growth.on_action * scale),
        three(on_effect),
        if growth.slack_from.is_some() { ALARM } else { INK }
    ));
}

/// The points that the two rules look at, with their numbers beside them for other programs.
fn mark(sketch: &mut Sketch, growth: Growth, scale: f64, [x, y]: [&dyn Fn(f64) -> f64; 2]) {
    let (on_action, on_effect) = (growth.on_action * scale, growth.on_effect() * scale);
    sketch.put(format_args!(
        "<circle cx=\"{:.1}\" cy=\"{:.1}\" r=\"3\" fill=\"{INK}\"><title>F: {}</title></circle>",
        x(1.0),
        y(growth.full * scale),
        three(growth.full * scale)
    ));
    sketch.put(format_args!(
        "<circle cx=\"{:.1}\" cy=\"{:.1}\" r=\"5\" fill=\"{CURVE}\" data-on-action=\"{}\"><title>factor {} on the action</title></circle>",
        x(growth.gamma),
        y(on_action),
        clean(on_action),
        three(growth.gamma)
    ));
    let (at, up) = (x(growth.gamma), y(on_effect));
    sketch.put(format_args!(
        "<path d=\"M{:.1} {up:.1}L{at:.1} {:.1}L{:.1} {up:.1}L{at:.1} {:.1}Z\" fill=\"{OTHER}\" data-on-effect=\"{}\"><title>factor {} on the effect</title></path>",
        at - 5.5,
        up - 5.5,
        at + 5.5,
        up + 5.5,
        clean(on_effect),
        three(growth.gamma)
    ));
}
