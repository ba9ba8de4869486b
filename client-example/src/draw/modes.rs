//! Natural modes of a state seen from the side and above, several on a page.

use ropewalk_api::ropewalk::v1;

use super::frame::{self, short};
use super::{HAIR, INK, MUTED, Sketch};
use crate::escape::markup;
use crate::number::{percent, three};
use crate::run::{Run, State};

const WIDTH: f64 = 1200.0;
const LEFT: f64 = 36.0;
const TOP: f64 = 112.0;
/// Modes on a page: so many beside each other, and so many below.
const ACROSS: usize = 2;
const DOWN: usize = 3;
const CELL: [f64; 2] = [564.0, 330.0];
/// Room in a cell for its words, and around its picture.
const WORDS: f64 = 44.0;
const MARGIN: f64 = 26.0;
/// The largest movement over the largest extent of the net.
const AMPLITUDE: f64 = 0.05;
const MOVED: &str = "#31688e";
/// Seen from there: turned in plan, then tilted (rad).
const TURN: f64 = 0.45;
const TILT: f64 = 0.55;

/// Pages with the modes of a state; none where it has none.
pub(crate) fn modes(run: &Run, state: &State) -> Vec<String> {
    let modes = run.modes_of(&state.id);
    let (Some(positions), Some(shapes)) = (state.vectors("position_m"), state.columns.get("mode_shape")) else {
        return Vec::new();
    };
    if modes.is_empty()
        || shapes.components != 3 * modes.len()
        || shapes.values.len() != shapes.components * positions.len()
    {
        return Vec::new();
    }
    let shape = |mode: usize| -> Vec<[f64; 3]> {
        (shapes.values.chunks_exact(shapes.components))
            .map(|of_node| [of_node[3 * mode], of_node[3 * mode + 1], of_node[3 * mode + 2]])
            .collect()
    };
    let moving = run
        .modes_found(&state.id)
        .map_or(&[][..], |found| &found.moving_mass_kg);
    let view = View::of(&positions);
    let n_pages = modes.len().div_ceil(ACROSS * DOWN);
    let pages = modes.chunks(ACROSS * DOWN).enumerate();
    pages
        .map(|(page, on_page)| {
            let mut sketch = Sketch::new();
            let title = format!("{} · natural modes, {}", run.title(), state.id);
            let lines = [
                format!(
                    "Page {} of {n_pages}. Grey: the state itself; blue: the mode, to no scale of its own.",
                    page + 1
                ),
                "Small undamped movements: frequency and shape, not how large they become.".to_owned(),
            ];
            frame::head(&mut sketch, &title, &lines.map(|line| (line, MUTED)));
            let mut bottom = TOP;
            for (place, mode) in on_page.iter().enumerate() {
                let (column, row) = (place % ACROSS, place / ACROSS);
                let corner = [LEFT + CELL[0] * to_f64(column), TOP + CELL[1] * to_f64(row)];
                bottom = corner[1] + CELL[1];
                let moved = shape(page * ACROSS * DOWN + place);
                draw(&mut sketch, run, &view, corner, (mode, moving), [&positions, &moved]);
            }
            frame::foot(&mut sketch, run, bottom + 22.0);
            sketch.finish(WIDTH, bottom + 42.0, &title)
        })
        .collect()
}

/// A small count as a number.
fn to_f64(count: usize) -> f64 {
    u32::try_from(count).map_or(f64::MAX, f64::from)
}

/// From space to a cell, the same for all modes of a state.
struct View {
    scale: f64,
    middle: [f64; 2],
    /// Largest extent of the net (m).
    extent: f64,
}

impl View {
    fn of(positions: &[[f64; 3]]) -> Self {
        let bound = |values: &mut dyn Iterator<Item = f64>| {
            values.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), value| {
                (low.min(value), high.max(value))
            })
        };
        let extent = (0..3)
            .map(|axis| {
                let (low, high) = bound(&mut positions.iter().map(|at| at[axis]));
                high - low
            })
            .fold(1e-6, f64::max);
        let (u0, u1) = bound(&mut positions.iter().map(|at| flat(*at)[0]));
        let (v0, v1) = bound(&mut positions.iter().map(|at| flat(*at)[1]));
        let amplitude = 2.0 * AMPLITUDE * extent;
        let across = (CELL[0] - 2.0 * MARGIN) / (u1 - u0 + amplitude);
        let up = (CELL[1] - WORDS - 2.0 * MARGIN) / (v1 - v0 + amplitude);
        Self {
            scale: across.min(up),
            middle: [f64::midpoint(u0, u1), f64::midpoint(v0, v1)],
            extent,
        }
    }

    fn at(&self, corner: [f64; 2], position: [f64; 3]) -> [f64; 2] {
        let [u, v] = flat(position);
        [
            corner[0] + CELL[0] / 2.0 + (u - self.middle[0]) * self.scale,
            corner[1] + WORDS + (CELL[1] - WORDS) / 2.0 - (v - self.middle[1]) * self.scale,
        ]
    }
}

/// A parallel view of a place (m).
fn flat([x, y, z]: [f64; 3]) -> [f64; 2] {
    let depth = y * TURN.cos() - x * TURN.sin();
    [x * TURN.cos() + y * TURN.sin(), z * TILT.cos() + depth * TILT.sin()]
}

fn draw(
    sketch: &mut Sketch,
    run: &Run,
    view: &View,
    corner: [f64; 2],
    (mode, moving): (&v1::Mode, &[f64]),
    [positions, shape]: [&[[f64; 3]]; 2],
) {
    let what = if mode.frequency_hz > 0.0 {
        format!(
            "{} Hz · period {} s",
            three(mode.frequency_hz),
            three(mode.frequency_hz.recip())
        )
    } else {
        "does not vibrate: without stiffness, or not stable".to_owned()
    };
    let shares: Vec<String> = (["x", "y", "z"].iter().zip(&mode.effective_mass_kg).zip(moving))
        .filter(|(_, moving)| **moving > 0.0)
        .map(|((axis, mass), moving)| format!("{axis} {} %", percent(mass / moving)))
        .collect();
    sketch.put(format_args!(
        "<text x=\"{:.1}\" y=\"{:.1}\" font-size=\"15\" font-weight=\"600\">mode {} · {what}</text>\
         <text x=\"{:.1}\" y=\"{:.1}\" font-size=\"12\" fill=\"{MUTED}\">takes part: {} · most moves {}</text>",
        corner[0],
        corner[1] + 16.0,
        mode.number + 1,
        corner[0],
        corner[1] + 34.0,
        markup(&shares.join(", ")),
        markup(&short(mode.nodes.first().map_or("nothing", String::as_str), 40))
    ));
    let size = AMPLITUDE * view.extent;
    let moved: Vec<[f64; 3]> = (positions.iter().zip(shape))
        .map(|(at, by)| [at[0] + size * by[0], at[1] + size * by[1], at[2] + size * by[2]])
        .collect();
    for (places, colour, width) in [(positions, HAIR, 1.4), (&moved[..], MOVED, 1.6)] {
        let lines: Vec<String> = (run.segments.iter())
            .map(|segment| {
                let [a, b] = segment.nodes.map(|node| view.at(corner, places[node]));
                format!("M{:.1} {:.1}L{:.1} {:.1}", a[0], a[1], b[0], b[1])
            })
            .collect();
        sketch.put(format_args!(
            "<path d=\"{}\" fill=\"none\" stroke=\"{colour}\" stroke-width=\"{width}\" data-mode=\"{}\" data-frequency-hz=\"{}\"/>",
            lines.concat(),
            mode.number,
            mode.frequency_hz
        ));
    }
    for &node in &run.supports {
        let [x, y] = view.at(corner, positions[node]);
        sketch.put(format_args!(
            "<circle cx=\"{x:.1}\" cy=\"{y:.1}\" r=\"2.4\" fill=\"{INK}\"/>"
        ));
    }
}
