//! The plan of a state: each rope with its tension as width and colour, the pull on each anchor as an arrow.

use super::frame::{self, short};
use super::pulls::arrows;
use super::room::{HALO, Taken};
use super::{ALARM, INK, MUTED, Sketch};
use crate::colour::{self, Scale};
use crate::escape::markup;
use crate::number::{percent, three};
use crate::run::{Member, Run, State};

const WIDTH: f64 = 1200.0;
const LEFT: f64 = 36.0;
const RIGHT: f64 = 1036.0;
const TOP: f64 = 120.0;
/// Room for arrows and their numbers around the net.
const ROOM: f64 = 136.0;
/// The same above and below, where numbers take less room.
const HEADROOM: f64 = 100.0;
/// Up to so many rope segments each gets its number; beyond, each rope gets that of its largest tension.
const NUMBERS_EACH: usize = 40;

/// From plan coordinates to the sheet.
#[derive(Debug)]
pub(super) struct View {
    scale: f64,
    origin: [f64; 2],
    bottom: f64,
}

impl View {
    fn of(positions: &[[f64; 3]]) -> Self {
        let bound = |axis: usize| {
            let values = positions.iter().map(|position| position[axis]);
            values.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), value| {
                (low.min(value), high.max(value))
            })
        };
        let ((x0, x1), (y0, y1)) = (bound(0), bound(1));
        let (wide, high) = ((x1 - x0).max(1e-6), (y1 - y0).max(1e-6));
        let scale = ((RIGHT - LEFT - 2.0 * ROOM) / wide).min(800.0 / high);
        let bottom = TOP + 2.0 * HEADROOM + high * scale;
        let left = f64::midpoint(LEFT, RIGHT) - wide * scale / 2.0;
        Self {
            scale,
            origin: [left - x0 * scale, bottom - HEADROOM + y0 * scale],
            bottom: bottom.max(560.0),
        }
    }

    /// Where text may stand: left, top, right, bottom.
    pub(super) fn room(&self) -> [f64; 4] {
        [8.0, TOP - 8.0, RIGHT + 14.0, self.bottom - 6.0]
    }

    pub(super) fn at(&self, position: [f64; 3]) -> [f64; 2] {
        [
            self.origin[0] + position[0] * self.scale,
            self.origin[1] - position[1] * self.scale,
        ]
    }
}

/// The plan of a state; of one without answer, the reference state with what to look at. None without any positions.
pub(crate) fn plan(run: &Run, state: &State, scale: &Scale) -> Option<String> {
    let answered = state.answered();
    let drawn = if answered {
        state
    } else {
        run.reference().filter(|reference| reference.answered())?
    };
    let positions = drawn.vectors("position_m")?;
    let forces = run.axial_forces(drawn)?;
    let slack = run.slack(drawn);
    let view = View::of(&positions);
    let mut sketch = Sketch::new();
    let mut taken = Taken::default();
    head(&mut sketch, run, state, &forces);

    let widest = forces
        .iter()
        .map(|force| force.abs())
        .fold(0.0, f64::max)
        .max(f64::MIN_POSITIVE);
    // Large forces last, so that they lie on top.
    let mut order: Vec<usize> = (0..run.segments.len()).collect();
    order.sort_by(|&a, &b| forces[a].abs().total_cmp(&forces[b].abs()).then(a.cmp(&b)));
    for &segment in &order {
        draw_segment(
            &mut sketch,
            run,
            segment,
            &view,
            &positions,
            Look {
                force: forces[segment],
                slack: slack[segment],
                widest,
                scale,
                answered,
            },
        );
    }
    for &node in &run.supports {
        let [x, y] = view.at(positions[node]);
        taken.occupy([x - 7.0, y - 7.0, x + 7.0, y + 7.0]);
    }
    for segment in &run.segments {
        let [from, to] = segment.nodes.map(|node| view.at(positions[node]));
        taken.cross(from, to);
    }
    let pulls_left_out = if answered {
        arrows(&mut sketch, run, state, &view, &positions, &mut taken)
    } else {
        0
    };
    supports(&mut sketch, run, &view, &positions, (!answered).then_some(&mut taken));
    let left_out = if answered {
        numbers(&mut sketch, run, &view, &positions, &forces, &mut taken)
    } else {
        0
    };
    if let Some(failure) = &state.summary.failure {
        culprits(&mut sketch, run, &view, &positions, failure);
    }

    if answered {
        frame::legend(&mut sketch, scale, RIGHT + 30.0, TOP + 40.0, 260.0);
    }
    key(&mut sketch, RIGHT + 30.0, TOP + 340.0, answered);
    let bottom = view.bottom;
    frame::scale_bar(&mut sketch, LEFT, bottom + 12.0, view.scale);
    let mut remark = String::from("x to the right, y up the sheet");
    if answered && run.n_rope_segments() <= NUMBERS_EACH {
        remark.push_str("; numbers: kN in each segment");
    } else if answered {
        remark.push_str("; numbers: largest kN of each rope, at its place");
    }
    let room = match (left_out, pulls_left_out) {
        (0, 0) => String::new(),
        (ropes, 0) => format!("; for room {ropes} left out, see segments.csv"),
        (0, pulls) => format!("; for room {pulls} pulls left out, see anchors.csv"),
        (ropes, pulls) => format!("; for room {ropes} left out, and {pulls} pulls: see the tables"),
    };
    remark.push_str(&room);
    sketch.put(format_args!(
        "<text x=\"300\" y=\"{:.0}\" font-size=\"12\" fill=\"{MUTED}\">{remark}</text>",
        bottom + 14.0
    ));
    frame::foot(&mut sketch, run, bottom + 40.0);
    Some(sketch.finish(WIDTH, bottom + 60.0, &format!("{}, plan, {}", run.title(), state.id)))
}

fn head(sketch: &mut Sketch, run: &Run, state: &State, forces: &[f64]) {
    let words = if state.in_words.is_empty() {
        String::new()
    } else {
        format!("acting: {}", state.in_words)
    };
    let told = match &state.summary.failure {
        Some(failure) if !state.answered() => (
            format!(
                "No answer ({} % of the load): {}. Drawn: the reference state.",
                percent(state.summary.load_factor),
                failure.message
            ),
            ALARM,
        ),
        _ if !state.answered() => ("No answer. Drawn: the reference state.".to_owned(), ALARM),
        _ => {
            let most = (0..run.n_rope_segments()).max_by(|&a, &b| forces[a].total_cmp(&forces[b]));
            let most = most.map(|segment| {
                format!(
                    "largest {} kN in {}",
                    three(forces[segment] / 1e3),
                    run.member_id(segment)
                )
            });
            (
                format!(
                    "in balance; {}; {} segments slack",
                    most.unwrap_or_default(),
                    state.summary.slack_segments
                ),
                INK,
            )
        }
    };
    frame::head(
        sketch,
        &format!("{} · {}", run.title(), state.id),
        &[(words, MUTED), told],
    );
}

#[derive(Clone, Copy)]
struct Look<'a> {
    force: f64,
    slack: bool,
    widest: f64,
    scale: &'a Scale,
    answered: bool,
}

fn draw_segment(sketch: &mut Sketch, run: &Run, segment: usize, view: &View, positions: &[[f64; 3]], look: Look) {
    let [from, to] = run.segments[segment].nodes;
    let ([x0, y0], [x1, y1]) = (view.at(positions[from]), view.at(positions[to]));
    let (id, from, to) = (
        markup(run.member_id(segment)),
        markup(&run.nodes[from]),
        markup(&run.nodes[to]),
    );
    let strut = matches!(run.segments[segment].member, Member::Strut(_));
    let kn = three(look.force / 1e3);
    let width = match (look.answered, look.slack) {
        (false, _) => 1.4,
        (true, true) => 1.3,
        (true, false) => 1.2 + 6.0 * (look.force.abs() / look.widest).sqrt(),
    };
    let (stroke, dash) = if !look.answered {
        ("#aab3bc".to_owned(), "")
    } else if look.slack {
        (MUTED.to_owned(), " stroke-dasharray=\"4 4\"")
    } else {
        (colour::at(look.scale.share(look.force)), "")
    };
    let kind = if strut { "strut" } else { "rope" };
    let line = format!("x1=\"{x0:.1}\" y1=\"{y0:.1}\" x2=\"{x1:.1}\" y2=\"{y1:.1}\"");
    if strut {
        sketch.put(format_args!(
            "<line {line} stroke=\"{INK}\" stroke-width=\"{:.1}\"/>",
            width + 4.0
        ));
    }
    let told = if look.answered {
        let state = if look.slack {
            "slack".to_owned()
        } else {
            format!("{kn} kN")
        };
        format!(
            " data-{kind}=\"{id}\" data-from=\"{from}\" data-to=\"{to}\" data-axial-force-n=\"{}\" data-slack=\"{}\"><title>{id}, {from} to {to}: {state}</title></line>",
            look.force,
            u8::from(look.slack)
        )
    } else {
        format!("><title>{id}, {from} to {to}</title></line>")
    };
    let stroke = if strut && look.answered {
        "#fff".to_owned()
    } else {
        stroke
    };
    sketch.put(format_args!(
        "<line {line} stroke=\"{stroke}\" stroke-width=\"{width:.1}\" stroke-linecap=\"round\"{dash}{told}"
    ));
}

/// Supports as squares, with their names where there is room to be taken for them: beside a pull the name stands already.
fn supports(sketch: &mut Sketch, run: &Run, view: &View, positions: &[[f64; 3]], mut room: Option<&mut Taken>) {
    for &node in &run.supports {
        let [x, y] = view.at(positions[node]);
        let id = &run.nodes[node];
        sketch.put(format_args!(
            "<rect x=\"{:.1}\" y=\"{:.1}\" width=\"11\" height=\"11\" fill=\"#fff\" stroke=\"{INK}\" stroke-width=\"2\"><title>support {}</title></rect>",
            x - 5.5,
            y - 5.5,
            markup(id)
        ));
        let Some(taken) = room.as_deref_mut() else { continue };
        let shown = short(id, 16);
        for (dx, dy) in [(0.0, -13.0), (0.0, 22.0), (24.0, 5.0), (-24.0, 5.0), (20.0, -12.0)] {
            if taken.take(x + dx, y + dy - 4.0, shown.chars().count()) {
                sketch.put(format_args!(
                    "<text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"middle\" font-size=\"12\" fill=\"{MUTED}\" {HALO}>{}</text>",
                    x + dx,
                    y + dy,
                    markup(&shown)
                ));
                break;
            }
        }
    }
}

/// Writes tensions at segments; returns how many found no room.
fn numbers(
    sketch: &mut Sketch,
    run: &Run,
    view: &View,
    positions: &[[f64; 3]],
    forces: &[f64],
    taken: &mut Taken,
) -> usize {
    let mut places: Vec<usize> = if run.n_rope_segments() <= NUMBERS_EACH {
        (0..run.segments.len()).collect()
    } else {
        let struts = (run.n_rope_segments()..run.segments.len()).map(|segment| vec![segment]);
        let of_members = run.cable_segments().into_iter().chain(struts);
        let largest = |list: Vec<usize>| {
            list.into_iter()
                .rev()
                .max_by(|&a, &b| forces[a].abs().total_cmp(&forces[b].abs()))
        };
        of_members.filter_map(largest).collect()
    };
    places.sort_by(|&a, &b| forces[b].abs().total_cmp(&forces[a].abs()).then(a.cmp(&b)));
    let mut left_out = 0;
    for segment in places {
        let [from, to] = run.segments[segment].nodes;
        let ([x0, y0], [x1, y1]) = (view.at(positions[from]), view.at(positions[to]));
        let label = three(forces[segment] / 1e3);
        if let Some([x, y]) = number_place([x0, y0], [x1, y1], label.chars().count(), taken) {
            sketch.put(format_args!(
                "<text class=\"tension\" x=\"{x:.1}\" y=\"{:.1}\" text-anchor=\"middle\" font-size=\"12\" {HALO} data-of=\"{}\" \
                 data-axial-force-n=\"{}\">{label}</text>",
                y + 4.3,
                markup(run.member_id(segment)),
                forces[segment]
            ));
        } else {
            left_out += 1;
        }
    }
    left_out
}

/// A place for a number on its segment, or close beside it where nothing else is.
fn number_place(from: [f64; 2], to: [f64; 2], letters: usize, taken: &mut Taken) -> Option<[f64; 2]> {
    let [x, y] = [f64::midpoint(from[0], to[0]), f64::midpoint(from[1], to[1])];
    if taken.take(x, y, letters) {
        return Some([x, y]);
    }
    let along = [to[0] - from[0], to[1] - from[1]];
    let size = along[0].hypot(along[1]);
    if size <= 0.0 {
        return None;
    }
    let beside = [16.0, -16.0, 24.0, -24.0].map(|way| [x - along[1] / size * way, y + along[0] / size * way]);
    beside.into_iter().find(|&[x, y]| {
        let place = Taken::place(x, y, letters, 9.0);
        taken.is_clear(place) && taken.take(x, y, letters)
    })
}

/// Marks what a failure names.
fn culprits(
    sketch: &mut Sketch,
    run: &Run,
    view: &View,
    positions: &[[f64; 3]],
    failure: &ropewalk_api::ropewalk::v1::Failure,
) {
    for (number, segment) in run.segments.iter().enumerate() {
        if failure.members.iter().any(|member| member == run.member_id(number)) {
            let ([x0, y0], [x1, y1]) = (
                view.at(positions[segment.nodes[0]]),
                view.at(positions[segment.nodes[1]]),
            );
            sketch.put(format_args!(
                "<path d=\"M{x0:.1} {y0:.1}L{x1:.1} {y1:.1}\" stroke=\"{ALARM}\" stroke-width=\"2.5\"/>"
            ));
        }
    }
    for id in &failure.nodes {
        let Some(node) = run.nodes.iter().position(|node| node == id) else {
            continue;
        };
        let [x, y] = view.at(positions[node]);
        sketch.put(format_args!(
            "<circle cx=\"{x:.1}\" cy=\"{y:.1}\" r=\"11\" fill=\"none\" stroke=\"{ALARM}\" stroke-width=\"2.5\"/>"
        ));
        sketch.put(format_args!(
            "<text x=\"{:.1}\" y=\"{:.1}\" fill=\"{ALARM}\" font-weight=\"600\" {HALO}>{}</text>",
            x + 14.0,
            y - 9.0,
            markup(&short(id, 24))
        ));
    }
}

fn key(sketch: &mut Sketch, x: f64, y: f64, answered: bool) {
    let mut row = 0.0;
    let mut entry = |sign: String, words: &str| {
        let at = y + 24.0 * row;
        sketch.put(format_args!("<g transform=\"translate({x:.1} {at:.1})\">{sign}<text x=\"38\" y=\"4.5\" font-size=\"12\">{words}</text></g>"));
        row += 1.0;
    };
    if answered {
        entry(
            format!("<path d=\"M0 0h28\" stroke=\"{MUTED}\" stroke-width=\"1.3\" stroke-dasharray=\"4 4\"/>"),
            "slack",
        );
    }
    entry(
        format!(
            "<path d=\"M0 0h28\" stroke=\"{INK}\" stroke-width=\"7\"/><path d=\"M0 0h28\" stroke=\"#fff\" stroke-width=\"3\"/>"
        ),
        "strut",
    );
    entry(
        format!(
            "<rect x=\"8.5\" y=\"-5.5\" width=\"11\" height=\"11\" fill=\"#fff\" stroke=\"{INK}\" stroke-width=\"2\"/>"
        ),
        "support",
    );
    if answered {
        entry(
            format!("<path d=\"M0 0h20\" stroke=\"{INK}\" stroke-width=\"2\"/><path d=\"M28 0l-11 5v-10z\"/>"),
            "pull on anchor",
        );
    } else {
        entry(
            format!("<circle cx=\"14\" cy=\"0\" r=\"8\" fill=\"none\" stroke=\"{ALARM}\" stroke-width=\"2.5\"/>"),
            "look here",
        );
    }
}
