//! Where the energy of a motion is and where it went, with the error of the ledger on a scale of its own.

use ropewalk_api::ropewalk::v1;

use super::curve::{Plot, bounds, with_room};
use super::{CURVES, WIDTH};
use crate::draw::frame;
use crate::draw::{MUTED, Sketch};
use crate::number::three;
use crate::run::{MotionRun, Run};
use crate::sheet::energy_words;

const LEFT: f64 = 92.0;
/// Room for the labels at the right.
const RIGHT: f64 = 190.0;
const TOP: f64 = 124.0;
const HEIGHT: f64 = 380.0;
const ERROR_HEIGHT: f64 = 96.0;
/// Distance of labels.
const PITCH: f64 = 17.0;

/// Entries of the ledger that are drawn together.
type Entry = (&'static str, fn(&v1::EnergyLedger) -> f64);

const ENTRIES: [Entry; 6] = [
    ("kinetic", |energy| energy.kinetic_j),
    ("elastic change", |energy| energy.elastic_j),
    ("potential", |energy| energy.potential_j),
    ("work done", |energy| energy.work_j),
    ("dissipated", |energy| energy.dissipated_j),
    ("released", |energy| energy.released_j),
];

/// The energies of a motion over time; none where it has no two frames.
pub(super) fn energy(run: &Run, motion: &MotionRun) -> Option<String> {
    let times = motion.times();
    let ledgers: Vec<v1::EnergyLedger> = motion.frames.iter().filter_map(|frame| frame.energy).collect();
    if times.len() < 2 || ledgers.len() != times.len() {
        return None;
    }
    let first_elastic = ledgers[0].elastic_j;
    let mut curves: Vec<(&str, &str, Vec<f64>)> = Vec::new();
    let mut nothing = Vec::new();
    for ((name, of), colour) in ENTRIES.into_iter().zip(CURVES) {
        let from = if name.starts_with("elastic") {
            first_elastic
        } else {
            0.0
        };
        let values: Vec<f64> = ledgers.iter().map(|ledger| of(ledger) - from).collect();
        if values.iter().all(|value| *value == 0.0) {
            nothing.push(name);
        } else {
            curves.push((name, colour, values));
        }
    }
    let errors: Vec<f64> = ledgers.iter().map(|ledger| ledger.error_j).collect();
    let [low, high] = bounds(curves.iter().flat_map(|(_, _, values)| values.iter().copied()));
    let (unit, scale) = fit([low, high]);
    let across = [times[0], times[times.len() - 1]];

    let mut sketch = Sketch::new();
    let title = format!("Motion {} · energy · {}", motion.id, run.title());
    let zero = if nothing.is_empty() {
        String::new()
    } else {
        format!(" Zero throughout: {}.", nothing.join(", "))
    };
    let lines = [
        motion
            .begin
            .as_ref()
            .map_or(String::new(), |begin| begin.in_words.clone()),
        format!("What is there and what has been done, taken and released since the start.{zero}"),
    ];
    frame::head(&mut sketch, &title, &lines.map(|line| (line, MUTED)));

    let plot = Plot {
        corner: [LEFT, TOP],
        size: [WIDTH - LEFT - RIGHT, HEIGHT],
        across,
        up: with_room([low.min(0.0) * scale, high.max(0.0) * scale], 0.04),
    };
    sketch.put(format_args!("<text x=\"36\" y=\"{:.1}\" font-weight=\"600\">energy <tspan font-weight=\"400\" fill=\"{MUTED}\">({unit})</tspan></text>", TOP - 10.0));
    plot.levels(&mut sketch, 6.0);
    plot.below(&mut sketch, "s");
    let mut labels = Vec::new();
    for (name, colour, values) in &curves {
        let values: Vec<f64> = values.iter().map(|value| value * scale).collect();
        plot.curve(&mut sketch, &times, &values, colour);
        let last = values.last().copied().unwrap_or(0.0);
        labels.push((plot.y(last), format!("{name} {}", three(last)), *colour));
    }
    label(&mut sketch, &plot, labels);

    let top = TOP + HEIGHT + 68.0;
    let [low, high] = bounds(errors.iter().copied());
    let (unit, scale) = fit([low, high]);
    let plot = Plot {
        corner: [LEFT, top],
        size: [WIDTH - LEFT - RIGHT, ERROR_HEIGHT],
        across,
        up: with_room([low.min(0.0) * scale, high.max(0.0) * scale], 0.1),
    };
    let end = motion.end.clone().unwrap_or_default();
    sketch.put(format_args!(
        "<text x=\"36\" y=\"{:.1}\" font-weight=\"600\">error of the ledger <tspan font-weight=\"400\" fill=\"{MUTED}\">({unit}) at most {} beside a \
         largest kinetic energy of {}; negative where the steps damp of themselves</tspan></text>",
        top - 10.0,
        energy_words(end.largest_error_j),
        energy_words(end.largest_kinetic_j)
    ));
    plot.levels(&mut sketch, 3.0);
    plot.below(&mut sketch, "s");
    let errors: Vec<f64> = errors.iter().map(|error| error * scale).collect();
    plot.curve(&mut sketch, &times, &errors, CURVES[4]);
    let bottom = top + ERROR_HEIGHT + 46.0;
    frame::foot(&mut sketch, run, bottom);
    Some(sketch.finish(WIDTH, bottom + 18.0, &title))
}

/// A unit for energies between two bounds (J), and how many of it make a joule.
fn fit([low, high]: [f64; 2]) -> (&'static str, f64) {
    match low.abs().max(high.abs()) {
        most if most >= 1e3 => ("kJ", 1e-3),
        most if most >= 0.1 || most == 0.0 => ("J", 1.0),
        most if most >= 1e-4 => ("mJ", 1e3),
        most if most >= 1e-7 => ("µJ", 1e6),
        _ => ("nJ", 1e9),
    }
}

/// Labels at the right ends of curves, moved apart where they would stand on each other.
fn label(sketch: &mut Sketch, plot: &Plot, mut labels: Vec<(f64, String, &str)>) {
    labels.sort_by(|a, b| a.0.total_cmp(&b.0));
    let wanted: Vec<f64> = labels.iter().map(|(y, _, _)| *y).collect();
    let bottom = plot.corner[1] + plot.size[1];
    let right = plot.corner[0] + plot.size[0];
    for ((y, words, colour), from) in labels.iter().zip(apart(&wanted, PITCH, bottom)) {
        sketch.put(format_args!(
            "<path d=\"M{right:.1} {y:.1}L{:.1} {from:.1}\" stroke=\"{colour}\" stroke-width=\".8\" fill=\"none\"/>\
             <text x=\"{:.1}\" y=\"{:.1}\" fill=\"{colour}\" font-weight=\"600\" font-size=\"12\">{words}</text>",
            right + 14.0,
            right + 18.0,
            from + 4.0
        ));
    }
}

/// Places in ascending order, moved to be a distance apart and none below the bottom.
fn apart(places: &[f64], distance: f64, bottom: f64) -> Vec<f64> {
    let mut moved = places.to_vec();
    for at in 1..moved.len() {
        moved[at] = moved[at].max(moved[at - 1] + distance);
    }
    let mut limit = bottom;
    for place in moved.iter_mut().rev() {
        *place = place.min(limit);
        limit = *place - distance;
    }
    moved
}

#[cfg(test)]
mod tests {
    use super::apart;

    #[test]
    fn labels_stand_apart_and_on_the_paper() {
        assert_eq!(apart(&[10.0, 12.0, 100.0], 17.0, 200.0), [10.0, 27.0, 100.0]);
        assert_eq!(apart(&[190.0, 195.0, 200.0], 17.0, 200.0), [166.0, 183.0, 200.0]);
    }
}
