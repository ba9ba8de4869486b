//! Watched quantities over time: one plot below the other, so that what happens at one time stands in one line.

use ropewalk_api::ropewalk::v1;

use super::curve::{Plot, bounds, with_room};
use super::{CURVES, WIDTH};
use crate::draw::frame::{self, short};
use crate::draw::{ALARM, MUTED, Sketch};
use crate::escape::markup;
use crate::number::{for_eyes, three};
use crate::run::{MotionRun, Run};

/// Plots on a page.
const DOWN: usize = 5;
const LEFT: f64 = 92.0;
const TOP: f64 = 128.0;
const HEIGHT: f64 = 132.0;
const PITCH: f64 = 192.0;
/// Breaks that are marked.
const BREAKS: usize = 4;

/// Pages with the watched quantities of a motion; none where it has none, or no two frames.
pub(super) fn watched(run: &Run, motion: &MotionRun) -> Vec<String> {
    let times = motion.times();
    if times.len() < 2 {
        return Vec::new();
    }
    let numbers: Vec<usize> = (0..motion.shown.watched.len()).collect();
    let n_pages = numbers.len().div_ceil(DOWN);
    let pages = numbers.chunks(DOWN).enumerate();
    pages
        .map(|(page, on_page)| {
            let mut sketch = Sketch::new();
            let title = format!("Motion {} · over time · {}", motion.id, run.title());
            let of = if n_pages > 1 {
                format!("Page {} of {n_pages}. ", page + 1)
            } else {
                String::new()
            };
            let lines = [
                motion.begin.as_ref().map_or(String::new(), |begin| begin.in_words.clone()),
                format!("{of}Dots: least and largest value in a frame; between frames it may be larger, peaks over all steps are in the tables."),
            ];
            frame::head(&mut sketch, &title, &lines.map(|line| (line, MUTED)));
            let mut top = TOP;
            for &number in on_page {
                plot(&mut sketch, motion, number, &times, top);
                top += PITCH;
            }
            frame::foot(&mut sketch, run, top + 6.0);
            sketch.finish(WIDTH, top + 24.0, &title)
        })
        .collect()
}

fn plot(sketch: &mut Sketch, motion: &MotionRun, number: usize, times: &[f64], top: f64) {
    let quantity = &motion.shown.watched[number];
    let (unit, scale) = for_eyes(&quantity.unit);
    let values: Vec<f64> = motion.watched(number).into_iter().map(|value| value * scale).collect();
    let plot = Plot {
        corner: [LEFT, top],
        size: [WIDTH - LEFT - 56.0, HEIGHT],
        across: [times[0], times[times.len() - 1]],
        up: with_room(bounds(values.iter().copied()), 0.2),
    };
    sketch.put(format_args!(
        "<text x=\"36\" y=\"{:.1}\" font-weight=\"600\" data-watched=\"{}\">{} <tspan font-weight=\"400\" fill=\"{MUTED}\">({unit}) {}</tspan></text>",
        top - 10.0,
        markup(&quantity.id),
        markup(&short(&quantity.id, 40)),
        markup(&short(&quantity.in_words, 100))
    ));
    plot.levels(sketch, 4.0);
    plot.below(sketch, "s");
    for (place, event) in breaks(motion).enumerate() {
        let x = plot.x(event.time_s);
        sketch.put(format_args!(
            "<path d=\"M{x:.1} {top:.1}v{HEIGHT}\" stroke=\"{ALARM}\" stroke-dasharray=\"3 3\"/>"
        ));
        if number.is_multiple_of(DOWN) && place == 0 {
            let (anchor, by) = if event.time_s - times[0] > 0.7 * (plot.across[1] - times[0]) {
                ("end", -5.0)
            } else {
                ("start", 5.0)
            };
            sketch.put(format_args!(
                "<text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"{anchor}\" font-size=\"11\" fill=\"{ALARM}\" {}>{} breaks, {} s</text>",
                x + by,
                top + HEIGHT - 5.0,
                crate::draw::room::HALO,
                markup(&short(&event.member, 24)),
                three(event.time_s)
            ));
        }
    }
    plot.curve(sketch, times, &values, CURVES[0]);
    let points = || times.iter().zip(&values).map(|(time, value)| [*time, *value]);
    let least = points().min_by(|a, b| a[1].total_cmp(&b[1]));
    let largest = points().max_by(|a, b| a[1].total_cmp(&b[1]));
    if let (Some(least), Some(largest)) = (least, largest) {
        plot.mark(sketch, largest, unit, true);
        if least[1] < largest[1] {
            plot.mark(sketch, least, unit, false);
        }
    }
}

/// The first breaks, one for each member.
fn breaks(motion: &MotionRun) -> impl Iterator<Item = &v1::MotionEvent> {
    let mut members: Vec<&str> = Vec::new();
    let events = motion.events.iter().filter(move |event| {
        let new = event.kind() == v1::MotionEventKind::Break && !members.contains(&event.member.as_str());
        if new {
            members.push(&event.member);
        }
        new
    });
    events.take(BREAKS)
}
