//! Arrows for the pull on anchors, outside the net, with their numbers.

use super::frame::short;
use super::plan::View;
use super::room::{HALO, Taken};
use super::{INK, MUTED, Sketch};
use crate::escape::markup;
use crate::number::{clean, three};
use crate::run::{Run, State};

/// Share of a pull that must lie in plan for an arrow to say anything.
const LEVEL: f64 = 0.15;
/// Half the height of two lines of text.
const HALF_HEIGHT: f64 = 16.0;
/// Farther off than this, a number is led to its anchor by a line.
const NEAR: f64 = 24.0;
/// More anchors than this stand in a crowd.
const CROWD: usize = 40;

/// Towards the members of a support in plan: on the other side nothing is in the way of an arrow.
fn towards(run: &Run, node: usize, view: &View, positions: &[[f64; 3]], forces: &[f64]) -> [f64; 2] {
    let mut sum = [0.0; 2];
    for end in run.ends.iter().filter(|end| end.node == node) {
        let nodes = run.segments[end.segment].nodes;
        let other = if nodes[0] == node { nodes[1] } else { nodes[0] };
        let (here, there) = (view.at(positions[node]), view.at(positions[other]));
        let along = [there[0] - here[0], there[1] - here[1]];
        let size = along[0].hypot(along[1]).max(f64::MIN_POSITIVE);
        for axis in 0..2 {
            sum[axis] += forces[end.segment].abs() * along[axis] / size;
        }
    }
    sum
}

/// A pull that waits for a place for its numbers.
struct Waiting {
    node: usize,
    pull: [f64; 3],
    place: [f64; 2],
    /// Away from the net along the arrow; nothing where there is none.
    out: [f64; 2],
}

/// The pull on each anchor: an arrow outside the net along its horizontal part, the size and the upright part as numbers.
/// Returns how many numbers found no room.
pub(super) fn arrows(
    sketch: &mut Sketch,
    run: &Run,
    state: &State,
    view: &View,
    positions: &[[f64; 3]],
    taken: &mut Taken,
) -> usize {
    let supports = state.vectors("support_force_n").unwrap_or_default();
    let forces = run.axial_forces(state).unwrap_or_default();
    let mut waiting = Vec::new();
    for (&node, force) in run.supports.iter().zip(&supports) {
        let pull = force.map(|part| 0.0 - part);
        let level = pull[0].hypot(pull[1]);
        let size = level.hypot(pull[2]);
        if size <= 0.0 {
            continue;
        }
        let [x, y] = view.at(positions[node]);
        let flat = level > LEVEL * size;
        let [dx, dy] = if flat {
            [pull[0] / level, -pull[1] / level]
        } else {
            [0.0, 0.0]
        };
        let net = towards(run, node, view, positions, &forces);
        // A rope pulls the anchor towards the net, a strut may press it away; the arrow stands outside either way.
        let pressed = dx * net[0] + dy * net[1] < 0.0;
        let side = if pressed { 1.0 } else { -1.0 };
        let at = |way: f64| [x + side * way * dx, y + side * way * dy];
        if flat {
            let (head, tail) = if pressed {
                (at(52.0), at(12.0))
            } else {
                (at(12.0), at(52.0))
            };
            sketch.put(format_args!(
                "<path d=\"M{:.1} {:.1}L{:.1} {:.1}\" stroke=\"{INK}\" stroke-width=\"2\"/>\
                 <path d=\"M{:.1} {:.1}L{:.1} {:.1}L{:.1} {:.1}z\"/>",
                tail[0],
                tail[1],
                head[0] - 6.0 * dx,
                head[1] - 6.0 * dy,
                head[0],
                head[1],
                head[0] - 11.0 * dx - 5.0 * dy,
                head[1] - 11.0 * dy + 5.0 * dx,
                head[0] - 11.0 * dx + 5.0 * dy,
                head[1] - 11.0 * dy - 5.0 * dx
            ));
            for way in [14.0, 24.0, 34.0, 44.0, 52.0] {
                // Along an arrow nothing else may stand.
                let [x, y] = at(way);
                taken.occupy([x - 6.0, y - 6.0, x + 6.0, y + 6.0]);
            }
        }
        waiting.push(Waiting {
            node,
            pull,
            place: [x, y],
            out: [side * dx, side * dy],
        });
    }
    // All arrows stand before the first number looks for a place; large pulls choose first.
    let size = |pull: [f64; 3]| pull[0].hypot(pull[1]).hypot(pull[2]);
    waiting.sort_by(|a, b| size(b.pull).total_cmp(&size(a.pull)).then(a.node.cmp(&b.node)));
    waiting
        .iter()
        .filter(|waits| !pull_label(sketch, run, waits, view, positions, taken))
        .count()
}

/// Writes the numbers of a pull where there is room; whether there was.
fn pull_label(
    sketch: &mut Sketch,
    run: &Run,
    waits: &Waiting,
    view: &View,
    positions: &[[f64; 3]],
    taken: &mut Taken,
) -> bool {
    let pull = waits.pull;
    let size = pull.iter().map(|part| part * part).sum::<f64>().sqrt();
    let (kn, id) = (size / 1e3, markup(&run.nodes[waits.node]));
    let upright = if pull[2].abs() < 0.02 * size {
        String::new()
    } else {
        format!(
            "{} {}",
            three(pull[2].abs() / 1e3),
            if pull[2] > 0.0 { "up" } else { "down" }
        )
    };
    let first = format!("{} kN", three(kn));
    let name = short(&run.nodes[waits.node], 14);
    let letters = (first.chars().count() + 1 + name.chars().count()).max(upright.chars().count());
    #[allow(clippy::cast_precision_loss, reason = "a label has few letters")]
    let half = 3.9 * letters as f64 + 3.0;
    let others: Vec<[f64; 2]> = (run.supports.iter().filter(|&&node| node != waits.node))
        .map(|&node| view.at(positions[node]))
        .collect();
    let Some([x, y]) = place_for(waits, half, view, taken, &others) else {
        return false;
    };
    let [ax, ay] = waits.place;
    // A number that stands apart from anchor and arrow is led to them.
    let place = [x - half, y - HALF_HEIGHT, x + half, y + HALF_HEIGHT];
    let end = [ax + 52.0 * waits.out[0], ay + 52.0 * waits.out[1]];
    if distance([ax, ay], place) > NEAR && distance(end, place) > NEAR {
        let nearest = nearest([ax, ay], place);
        sketch.put(format_args!(
            "<path d=\"M{ax:.1} {ay:.1}L{:.1} {:.1}\" stroke=\"{MUTED}\" stroke-width=\"0.8\" stroke-dasharray=\"2 2\"/>",
            nearest[0], nearest[1]
        ));
    }
    sketch.put(format_args!(
        "<text x=\"{x:.1}\" y=\"{:.1}\" text-anchor=\"middle\" {HALO}><tspan fill=\"{MUTED}\">{} </tspan><tspan class=\"pull\" font-weight=\"600\" data-anchor=\"{id}\" \
         data-pull-kn=\"{}\">{first}</tspan><tspan x=\"{x:.1}\" dy=\"15\" font-size=\"12\">{upright}</tspan></text>",
        y - 2.0,
        markup(&name),
        clean(kn)
    ));
    true
}

/// The point of a rectangle that is nearest to a point.
fn nearest([x, y]: [f64; 2], [left, top, right, bottom]: [f64; 4]) -> [f64; 2] {
    [x.clamp(left, right), y.clamp(top, bottom)]
}

fn distance(point: [f64; 2], place: [f64; 4]) -> f64 {
    let near = nearest(point, place);
    (near[0] - point[0]).hypot(near[1] - point[1])
}

/// A place for two lines, half as wide as told: beyond the arrow, else around the anchor, off the net if that can be. In a
/// crowd only what is near and clear will do: many leaders to many anchors could not be told apart.
fn place_for(waits: &Waiting, half: f64, view: &View, taken: &mut Taken, others: &[[f64; 2]]) -> Option<[f64; 2]> {
    let ([x, y], [dx, dy]) = (waits.place, waits.out);
    let crowded = others.len() >= CROWD;
    let mut places = Vec::new();
    if [dx, dy] != [0.0, 0.0] {
        places.extend([60.0, 68.0, 76.0, 84.0].map(|way| [x + dx * (way + half), y + dy * (way + HALF_HEIGHT)]));
    }
    for ring in 0..if crowded { 1 } else { 9 } {
        let way = 12.0 + 16.0 * f64::from(ring);
        for turn in 0..16 {
            // Below first, then alternately to both sides.
            let sign = if turn % 2 == 0 { 1.0 } else { -1.0 };
            let angle = std::f64::consts::FRAC_PI_2 + sign * f64::from((turn + 1) / 2) * std::f64::consts::FRAC_PI_8;
            let (sine, cosine) = angle.sin_cos();
            places.push([x + cosine * (way + half), y + sine * (way + HALF_HEIGHT)]);
        }
    }
    let room = view.room();
    let place = |[x, y]: [f64; 2]| [x - half, y - HALF_HEIGHT, x + half, y + HALF_HEIGHT];
    places.retain(|&at| {
        let [left, top, right, bottom] = place(at);
        left >= room[0] && top >= room[1] && right <= room[2] && bottom <= room[3] && taken.is_free(place(at))
    });
    if !crowded {
        // Closer to another anchor a number would be read as that one's.
        places.retain(|&at| {
            let own = distance([x, y], place(at));
            others.iter().all(|&other| distance(other, place(at)) > own)
        });
    }
    let clear = places.iter().find(|&&at| taken.is_clear(place(at)));
    let found = *clear.or(places.first().filter(|_| !crowded))?;
    taken.occupy(place(found));
    Some(found)
}
