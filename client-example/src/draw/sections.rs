//! Sections along picked ropes: height over the way in plan, and below it how far the rope has moved.

use super::frame::{self, rule, ticks};
use super::{HAIR, INK, MUTED, Sketch, pick};
use crate::escape::markup;
use crate::number::{clean, three};
use crate::run::{Run, State};

const WIDTH: f64 = 1200.0;
const LEFT: f64 = 92.0;
const RIGHT: f64 = 930.0;
/// Height of a shape: enough for the key beside it, and no more than a sheet bears.
const SHAPE: [f64; 2] = [170.0, 460.0];
const USUAL: f64 = 230.0;
const MOVE: f64 = 90.0;
const GAP: f64 = 62.0;
/// Colours and dashes of the cases: told apart without colour too.
const CASES: [(&str, &str); 3] = [("#31688e", ""), ("#c2571a", "7 3"), ("#7a3e9d", "2 3")];

/// A rope as seen from the side.
struct Profile<'a> {
    name: &'a str,
    nodes: Vec<usize>,
    /// Way in plan along the reference shape (m).
    way: Vec<f64>,
    reference: Vec<[f64; 3]>,
    cases: Vec<(&'a State, Vec<[f64; 3]>)>,
}

/// Sections through the shape; none without a reference state or ropes of several segments.
pub(crate) fn sections(run: &Run) -> Option<String> {
    let profiles: Vec<Profile> = pick::ropes(run)
        .into_iter()
        .filter_map(|cable| profile(run, cable))
        .collect();
    if profiles.is_empty() {
        return None;
    }
    let mut sketch = Sketch::new();
    let lines = [
        "Reference state and the cases that move each rope most.",
        "Movements are drawn to the scale of the heights, at the places in plan of the reference state.",
    ];
    frame::head(
        &mut sketch,
        &format!("{} · sections along ropes", run.title()),
        &lines.map(|line| (line.to_owned(), MUTED)),
    );
    first_frequencies(&mut sketch, run, &profiles);
    let mut top = 128.0;
    for profile in &profiles {
        let shape = draw(&mut sketch, run, profile, top);
        top += shape + MOVE + GAP + 56.0;
    }
    frame::foot(&mut sketch, run, top);
    Some(sketch.finish(WIDTH, top + 20.0, &format!("{}, sections", run.title())))
}

/// The lowest natural frequency of each state drawn, in the corner, where it was asked for.
fn first_frequencies(sketch: &mut Sketch, run: &Run, profiles: &[Profile]) {
    let mut states = vec!["reference"];
    for (state, _) in profiles.iter().flat_map(|profile| &profile.cases) {
        if !states.contains(&state.id.as_str()) {
            states.push(&state.id);
        }
    }
    let frequencies = states.into_iter().filter_map(|state| {
        let lowest = run.modes_found(state)?.lowest_frequency_hz?;
        Some((state, lowest))
    });
    for (line, (state, lowest)) in (0_u8..4).zip(frequencies) {
        sketch.put(format_args!(
            "<text x=\"{:.0}\" y=\"{:.0}\" text-anchor=\"end\" data-f1-hz=\"{lowest}\">f1 {} Hz <tspan fill=\"{MUTED}\">{}</tspan></text>",
            WIDTH - 36.0,
            44.0 + 18.0 * f64::from(line),
            three(lowest),
            markup(&frame::short(state, 26))
        ));
    }
}

fn profile(run: &Run, cable: usize) -> Option<Profile<'_>> {
    let reference = run
        .reference()
        .filter(|state| state.answered())?
        .vectors("position_m")?;
    let segments = run.cable_segments().swap_remove(cable);
    let mut nodes = vec![run.segments[*segments.first()?].nodes[0]];
    nodes.extend(segments.iter().map(|&segment| run.segments[segment].nodes[1]));
    let mut way = vec![0.0];
    for pair in nodes.windows(2) {
        let (a, b) = (reference[pair[0]], reference[pair[1]]);
        way.push(way.last()? + (b[0] - a[0]).hypot(b[1] - a[1]));
    }
    // A rope that stands upright has no section of this kind.
    if *way.last()? <= 0.0 {
        return None;
    }
    let cases = pick::cases(run, &nodes);
    let cases = cases
        .into_iter()
        .filter_map(|state| Some((state, state.vectors("position_m")?)))
        .collect();
    Some(Profile {
        name: &run.cables[cable],
        nodes,
        way,
        reference,
        cases,
    })
}

fn scale_words(exaggeration: f64) -> String {
    if exaggeration == 1.0 {
        "true to scale".to_owned()
    } else {
        format!("heights drawn {exaggeration} times")
    }
}

fn bounds(values: impl Iterator<Item = f64>) -> (f64, f64) {
    values.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), value| {
        (low.min(value), high.max(value))
    })
}

/// Draws a section; returns the height of its shape.
fn draw(sketch: &mut Sketch, run: &Run, profile: &Profile, top: f64) -> f64 {
    let end = *profile.way.last().expect("a rope has nodes");
    let across = (RIGHT - LEFT) / end;
    let all = profile
        .cases
        .iter()
        .map(|(_, positions)| positions)
        .chain([&profile.reference]);
    let heights = all.flat_map(|positions| profile.nodes.iter().map(|&node| positions[node][2]));
    let (low, high) = bounds(heights);
    // True to scale if that is high enough, else the largest round exaggeration that keeps to the usual height. Flattened
    // only where a sheet could not bear the rope.
    let true_height = (high - low).max(1e-3) * across;
    let exaggeration = if true_height > SHAPE[1] {
        frame::round_below(SHAPE[1] / true_height)
    } else {
        frame::round_below((USUAL / true_height).max(1.0)).min(20.0)
    };
    let shape = (true_height * exaggeration + 24.0).max(SHAPE[0]);
    let up = across * exaggeration;
    let middle = f64::midpoint(low, high);
    let x = |way: f64| LEFT + way * across;
    let y = |height: f64| top + shape / 2.0 - (height - middle) * up;

    sketch.put(format_args!(
        "<text x=\"{LEFT}\" y=\"{:.1}\" font-size=\"16\" font-weight=\"600\">{}</text>\
         <text x=\"{RIGHT}\" y=\"{:.1}\" text-anchor=\"end\" fill=\"{MUTED}\">{}</text>",
        top - 16.0,
        markup(&frame::short(&format!("along {}", profile.name), 60)),
        top - 16.0,
        scale_words(exaggeration)
    ));
    for tick in ticks(middle - shape / 2.0 / up, middle + shape / 2.0 / up, 4.0) {
        rule(sketch, [LEFT, y(tick)], [RIGHT, y(tick)]);
        sketch.put(format_args!(
            "<text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"end\" font-size=\"12\">{}</text>",
            LEFT - 8.0,
            y(tick) + 4.0,
            tick
        ));
    }
    axis_title(sketch, top + shape / 2.0, "height (m)");

    let line = |positions: &[[f64; 3]]| -> String {
        let points = profile
            .nodes
            .iter()
            .zip(&profile.way)
            .map(|(&node, &way)| format!("{:.1},{:.1}", x(way), y(positions[node][2])));
        points.collect::<Vec<_>>().join(" ")
    };
    sketch.put(format_args!(
        "<polyline points=\"{}\" fill=\"none\" stroke=\"{INK}\" stroke-width=\"2.2\"/>",
        line(&profile.reference)
    ));
    for (&node, &way) in profile.nodes.iter().zip(&profile.way) {
        sketch.put(format_args!(
            "<circle cx=\"{:.1}\" cy=\"{:.1}\" r=\"2.4\" data-case=\"reference\" data-node=\"{}\" data-z-m=\"{}\"><title>{}: {} m</title></circle>",
            x(way),
            y(profile.reference[node][2]),
            markup(&run.nodes[node]),
            profile.reference[node][2],
            markup(&run.nodes[node]),
            three(profile.reference[node][2])
        ));
    }
    for ((state, positions), (colour, dash)) in profile.cases.iter().zip(CASES) {
        let dash = if dash.is_empty() {
            String::new()
        } else {
            format!(" stroke-dasharray=\"{dash}\"")
        };
        sketch.put(format_args!("<polyline points=\"{}\" fill=\"none\" stroke=\"{colour}\" stroke-width=\"1.8\"{dash}><title>{}</title></polyline>", line(positions), markup(&state.id)));
    }
    moves(sketch, run, profile, top + shape + 34.0, across);
    key(sketch, profile, top, shape);
    shape
}

/// The movement along the rope (mm), with the largest of each case written at its place.
fn moves(sketch: &mut Sketch, run: &Run, profile: &Profile, top: f64, across: f64) {
    let mm = |positions: &[[f64; 3]], node: usize| {
        let (now, was) = (positions[node], profile.reference[node]);
        pick::size([now[0] - was[0], now[1] - was[1], now[2] - was[2]]) * 1e3
    };
    let all = profile
        .cases
        .iter()
        .flat_map(|(_, positions)| profile.nodes.iter().map(|&node| mm(positions, node)));
    let most = all.fold(0.0, f64::max).max(1e-3);
    let x = |way: f64| LEFT + way * across;
    let y = |value: f64| top + MOVE - value / most * MOVE;
    for tick in ticks(0.0, most, 3.0) {
        rule(sketch, [LEFT, y(tick)], [RIGHT, y(tick)]);
        sketch.put(format_args!(
            "<text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"end\" font-size=\"12\">{}</text>",
            LEFT - 8.0,
            y(tick) + 4.0,
            tick
        ));
    }
    axis_title(sketch, top + MOVE / 2.0, "moved (mm)");
    let end = *profile.way.last().expect("a rope has nodes");
    for tick in ticks(0.0, end, 8.0) {
        sketch.put(format_args!(
            "<path d=\"M{:.1} {:.1}v5\" stroke=\"{MUTED}\"/><text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"middle\" font-size=\"12\">{}</text>",
            x(tick),
            top + MOVE,
            x(tick),
            top + MOVE + 19.0,
            tick
        ));
    }
    sketch.put(format_args!(
        "<text x=\"{RIGHT}\" y=\"{:.1}\" text-anchor=\"end\" font-size=\"12\" fill=\"{MUTED}\">way in plan from {} (m)</text>",
        top + MOVE + 36.0,
        markup(&frame::short(&run.nodes[profile.nodes[0]], 40))
    ));
    for ((state, positions), (colour, dash)) in profile.cases.iter().zip(CASES) {
        let points = profile
            .nodes
            .iter()
            .zip(&profile.way)
            .map(|(&node, &way)| format!("{:.1},{:.1}", x(way), y(mm(positions, node))));
        let dash = if dash.is_empty() {
            String::new()
        } else {
            format!(" stroke-dasharray=\"{dash}\"")
        };
        sketch.put(format_args!(
            "<polyline points=\"{}\" fill=\"none\" stroke=\"{colour}\" stroke-width=\"1.8\"{dash}/>",
            points.collect::<Vec<_>>().join(" ")
        ));
        let moves = state.vectors("displacement_m").unwrap_or_default();
        for &node in &profile.nodes {
            let told = moves.get(node).map_or(0.0, |part| pick::size(*part)) * 1e3;
            let place = profile
                .nodes
                .iter()
                .position(|other| *other == node)
                .expect("the node is on the rope");
            sketch.put(format_args!(
                "<circle cx=\"{:.1}\" cy=\"{:.1}\" r=\"2\" fill=\"{colour}\" data-case=\"{}\" data-node=\"{}\" data-moved-mm=\"{}\"/>",
                x(profile.way[place]),
                y(mm(positions, node)),
                markup(&state.id),
                markup(&run.nodes[node]),
                clean(told)
            ));
        }
    }
}

fn axis_title(sketch: &mut Sketch, y: f64, words: &str) {
    sketch.put(format_args!("<text transform=\"translate(30 {y:.1}) rotate(-90)\" text-anchor=\"middle\" font-size=\"12\" fill=\"{MUTED}\">{words}</text>"));
}

/// Which line is which, with the largest movement of each.
fn key(sketch: &mut Sketch, profile: &Profile, top: f64, shape: f64) {
    let x = RIGHT + 24.0;
    sketch.put(format_args!("<path d=\"M{x} {top:.1}h26\" stroke=\"{INK}\" stroke-width=\"2.2\"/><text x=\"{:.1}\" y=\"{:.1}\">reference</text>", x + 34.0, top + 4.5));
    for (number, ((state, _), (colour, dash))) in (1_u8..).zip(profile.cases.iter().zip(CASES)) {
        let y = top + 44.0 * f64::from(number);
        let moves = state.vectors("displacement_m").unwrap_or_default();
        let largest = profile
            .nodes
            .iter()
            .map(|&node| moves.get(node).map_or(0.0, |part| pick::size(*part)))
            .fold(0.0, f64::max);
        let dash = if dash.is_empty() {
            String::new()
        } else {
            format!(" stroke-dasharray=\"{dash}\"")
        };
        sketch.put(format_args!(
            "<path d=\"M{x} {y:.1}h26\" stroke=\"{colour}\" stroke-width=\"2\"{dash}/><text x=\"{:.1}\" y=\"{:.1}\">{}</text>\
             <text x=\"{:.1}\" y=\"{:.1}\" font-size=\"12\" fill=\"{MUTED}\">moves up to {} mm</text>",
            x + 34.0,
            y + 4.5,
            markup(&frame::short(&state.id, 26)),
            x + 34.0,
            y + 21.0,
            three(largest * 1e3)
        ));
    }
    sketch.put(format_args!(
        "<path d=\"M{:.1} {:.1}V{:.1}\" stroke=\"{HAIR}\"/>",
        RIGHT + 10.0,
        top,
        top + shape
    ));
}
