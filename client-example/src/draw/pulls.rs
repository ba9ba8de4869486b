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

/// The pull on each anchor: an arrow outside the net along its horizontal part, the size and the upright part as numbers.
pub(super) fn arrows(
    sketch: &mut Sketch,
    run: &Run,
    state: &State,
    view: &View,
    positions: &[[f64; 3]],
    taken: &mut Taken,
) {
    let supports = state.vectors("support_force_n").unwrap_or_default();
    let forces = run.axial_forces(state).unwrap_or_default();
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
        if flat {
            let at = |way: f64| [x + side * way * dx, y + side * way * dy];
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
        }
        for way in [20.0, 32.0, 44.0] {
            // Along its own arrow nothing else may stand.
            taken.take_box(x + side * way * dx, y + side * way * dy, 1, 5.0);
        }
        pull_label(sketch, run, node, pull, [x, y], [side * dx, side * dy], taken);
    }
}

fn pull_label(
    sketch: &mut Sketch,
    run: &Run,
    node: usize,
    pull: [f64; 3],
    place: [f64; 2],
    out: [f64; 2],
    taken: &mut Taken,
) {
    let size = pull.iter().map(|part| part * part).sum::<f64>().sqrt();
    let (kn, id) = (size / 1e3, markup(&run.nodes[node]));
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
    let name = markup(&short(&run.nodes[node], 14));
    let letters = (first.chars().count() + 1 + run.nodes[node].chars().count().min(14)).max(upright.chars().count());
    #[allow(clippy::cast_precision_loss, reason = "a label has few letters")]
    let half = 3.9 * letters as f64;
    // Without an arrow the numbers stand below the anchor. Farther out where the place is taken.
    let mut chosen = place;
    for step in 0..8 {
        let way = 58.0 + 14.0 * f64::from(step);
        chosen = if out == [0.0, 0.0] {
            [place[0], place[1] + way - 32.0]
        } else {
            [place[0] + out[0] * (way + half), place[1] + out[1] * (way + 12.0)]
        };
        if taken.take_lines(chosen[0], chosen[1], letters) {
            break;
        }
    }
    let [x, y] = chosen;
    sketch.put(format_args!(
        "<text x=\"{x:.1}\" y=\"{:.1}\" text-anchor=\"middle\" {HALO}><tspan fill=\"{MUTED}\">{name} </tspan><tspan class=\"pull\" font-weight=\"600\" data-anchor=\"{id}\" \
         data-pull-kn=\"{}\">{first}</tspan><tspan x=\"{x:.1}\" dy=\"15\" font-size=\"12\">{upright}</tspan></text>",
        y - 2.0,
        clean(kn)
    ));
}
