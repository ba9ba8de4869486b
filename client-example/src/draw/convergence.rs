//! How the out-of-balance force fell: one small plot a state, all to the same scale.

use super::{ALARM, HAIR, MUTED, Sketch, frame};
use crate::escape::markup;
use crate::number::order;
use crate::run::{Run, State};

const WIDTH: f64 = 1120.0;
const COLUMNS: usize = 4;
const CELL: [f64; 2] = [270.0, 178.0];
const PLOT: [f64; 2] = [196.0, 110.0];
/// States that are drawn.
const STATES: usize = 40;

/// Residuals of the states over their iterations; none where the engine told of none.
pub(crate) fn convergence(run: &Run) -> Option<String> {
    let mut states: Vec<(&State, Vec<f64>)> = run
        .states
        .iter()
        .filter_map(|state| Some((state, state.numbers("iteration_residual_n")?.to_vec())))
        .filter(|(_, residuals)| !residuals.is_empty())
        .collect();
    if states.is_empty() {
        return None;
    }
    if states.len() > STATES {
        // What had no answer and what took longest is what one looks for.
        states.sort_by_key(|(state, residuals)| (state.answered(), std::cmp::Reverse(residuals.len())));
        states.truncate(STATES);
    }
    let positive = states
        .iter()
        .flat_map(|(_, residuals)| residuals)
        .copied()
        .filter(|residual| *residual > 0.0);
    let (low, high) = positive.fold((f64::INFINITY, 0.0_f64), |(low, high), residual| {
        (low.min(residual), high.max(residual))
    });
    if high == 0.0 {
        return None;
    }
    let (low, high) = (
        low.log10().floor(),
        (high.log10().ceil()).max(low.log10().floor() + 1.0),
    );

    let mut sketch = Sketch::new();
    for (number, (state, residuals)) in states.iter().enumerate() {
        #[allow(clippy::cast_precision_loss, reason = "at most 40 states")]
        let (column, row) = ((number % COLUMNS) as f64, (number / COLUMNS) as f64);
        plot(
            &mut sketch,
            state,
            residuals,
            [16.0 + column * CELL[0], 20.0 + row * CELL[1]],
            [low, high],
        );
    }
    #[allow(clippy::cast_precision_loss, reason = "at most 40 states")]
    let height = 10.0 + CELL[1] * states.len().div_ceil(COLUMNS) as f64;
    Some(sketch.finish(WIDTH, height, "Largest out-of-balance force over iterations"))
}

fn plot(sketch: &mut Sketch, state: &State, residuals: &[f64], corner: [f64; 2], orders: [f64; 2]) {
    let [left, top] = [corner[0] + 44.0, corner[1] + 22.0];
    let [low, high] = orders;
    #[allow(clippy::cast_precision_loss, reason = "iterations are counted in 32 bits")]
    let steps = (residuals.len().saturating_sub(1)).max(1) as f64;
    let y = |residual: f64| {
        let order = if residual > 0.0 { residual.log10().max(low) } else { low };
        top + PLOT[1] * (high - order) / (high - low)
    };
    let colour = if state.answered() { "#31688e" } else { ALARM };
    sketch.put(format_args!(
        "<text x=\"{left:.1}\" y=\"{:.1}\" font-weight=\"600\">{}</text>",
        corner[1] + 12.0,
        markup(&frame::short(&state.id, 26))
    ));
    let every = ((high - low) / 4.0).ceil().max(1.0);
    let mut order_shown = low;
    while order_shown <= high {
        let at = top + PLOT[1] * (high - order_shown) / (high - low);
        sketch.put(format_args!(
            "<path d=\"M{left:.1} {at:.1}h{}\" stroke=\"{HAIR}\"/><text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"end\" font-size=\"10\" fill=\"{MUTED}\">1e{order_shown:.0}</text>",
            PLOT[0],
            left - 5.0,
            at + 3.5
        ));
        order_shown += every;
    }
    let mut points = String::new();
    let mut dots = String::new();
    for (number, residual) in residuals.iter().enumerate() {
        #[allow(clippy::cast_precision_loss, reason = "iterations are counted in 32 bits")]
        let at = left + PLOT[0] * number as f64 / steps;
        points.push_str(&format!("{at:.1},{:.1} ", y(*residual)));
        if residuals.len() <= 60 {
            dots.push_str(&format!(
                "<circle cx=\"{at:.1}\" cy=\"{:.1}\" r=\"2.2\"/>",
                y(*residual)
            ));
        }
    }
    sketch.put(format_args!(
        "<polyline points=\"{}\" fill=\"none\" stroke=\"{colour}\" stroke-width=\"1.6\"/><g fill=\"{colour}\">{dots}</g>",
        points.trim_end()
    ));
    let last = residuals.last().copied().unwrap_or(0.0);
    sketch.put(format_args!(
        "<text x=\"{left:.1}\" y=\"{:.1}\" font-size=\"11\" fill=\"{MUTED}\">{} points, last {} N</text>",
        top + PLOT[1] + 17.0,
        residuals.len(),
        order(last)
    ));
}
