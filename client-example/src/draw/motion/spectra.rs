//! Spectra of watched quantities: amplitude over frequency, peaks with their numbers, natural frequencies as thin marks.

use ropewalk_api::ropewalk::v1;

use super::curve::Plot;
use super::{CURVES, WIDTH};
use crate::draw::frame::{self, rule, short};
use crate::draw::room::{HALO, Taken};
use crate::draw::{INK, MUTED, Sketch};
use crate::escape::markup;
use crate::number::{for_eyes, three};
use crate::run::{MotionRun, Run};

/// Plots on a page.
const DOWN: usize = 4;
const LEFT: f64 = 92.0;
const TOP: f64 = 150.0;
const HEIGHT: f64 = 170.0;
const PITCH: f64 = 252.0;
/// Powers of ten below the largest amplitude.
const DECADES: f64 = 3.0;
/// Peaks that are labelled.
const PEAKS: usize = 8;
/// Natural frequencies with a number; all have a mark.
const NUMBERED: usize = 12;

/// Pages with the spectra of a motion; none where there are none.
pub(super) fn spectra(run: &Run, motion: &MotionRun) -> Vec<String> {
    let drawn: Vec<(usize, &v1::MotionSpectrum, Vec<f64>)> = (0..motion.shown.watched.len())
        .filter_map(|number| Some((number, motion.spectrum(number)?, motion.amplitudes(number)?)))
        .filter(|(_, spectrum, amplitudes)| {
            spectrum.resolution_hz > 0.0 && amplitudes.len() > 1 && amplitudes.iter().any(|size| *size > 0.0)
        })
        .collect();
    let from = motion.begin.as_ref().map_or("", |begin| begin.from.as_str());
    let natural = run.natural_frequencies(from);
    let n_pages = drawn.len().div_ceil(DOWN);
    let pages = drawn.chunks(DOWN).enumerate();
    pages
        .map(|(page, on_page)| {
            let mut sketch = Sketch::new();
            let title = format!("Motion {} · spectra · {}", motion.id, run.title());
            let of = if n_pages > 1 {
                format!("Page {} of {n_pages}. ", page + 1)
            } else {
                String::new()
            };
            let marks = if natural.is_empty() {
                "No modes of the state at the start were asked for.".to_owned()
            } else {
                format!("Marks above: natural frequencies of {from}, by number of the mode.")
            };
            let lines = [
                format!("{of}Amplitude of a sine that makes a line, log scale, down to a thousandth of the largest. The window widens a peak to four lines."),
                marks,
            ];
            frame::head(&mut sketch, &title, &lines.map(|line| (line, MUTED)));
            let mut top = TOP;
            for (number, spectrum, amplitudes) in on_page {
                plot(&mut sketch, motion, *number, spectrum, amplitudes, &natural, top);
                top += PITCH;
            }
            frame::foot(&mut sketch, run, top - 8.0);
            sketch.finish(WIDTH, top + 10.0, &title)
        })
        .collect()
}

fn plot(
    sketch: &mut Sketch,
    motion: &MotionRun,
    number: usize,
    spectrum: &v1::MotionSpectrum,
    amplitudes: &[f64],
    natural: &[(u32, f64)],
    top: f64,
) {
    let quantity = &motion.shown.watched[number];
    let (unit, scale) = for_eyes(&quantity.unit);
    #[allow(clippy::cast_precision_loss, reason = "lines of a spectrum")]
    let frequencies: Vec<f64> = (0..amplitudes.len())
        .map(|line| line as f64 * spectrum.resolution_hz)
        .collect();
    // What lies below a thousandth of the largest is not drawn, and nothing beyond the last line above that.
    let top_line = amplitudes.iter().copied().fold(0.0, f64::max);
    let last = amplitudes
        .iter()
        .rposition(|size| *size >= 1e-3 * top_line)
        .unwrap_or(0);
    let drawn = (last + last / 20 + 2).min(amplitudes.len());
    let (frequencies, amplitudes) = (&frequencies[..drawn], &amplitudes[..drawn]);
    let largest = amplitudes
        .iter()
        .chain(spectrum.peaks.iter().map(|peak| &peak.amplitude))
        .copied()
        .fold(0.0, f64::max)
        * scale;
    let high = largest.log10() + 0.35;
    let low = high - DECADES - 0.35;
    let order = |amplitude: f64| (amplitude * scale).max(10.0_f64.powf(low)).log10();
    let plot = Plot {
        corner: [LEFT, top],
        size: [WIDTH - LEFT - 56.0, HEIGHT],
        across: [0.0, frequencies[frequencies.len() - 1]],
        up: [low, high],
    };
    sketch.put(format_args!(
        "<text x=\"36\" y=\"{:.1}\" font-weight=\"600\">{} <tspan font-weight=\"400\" fill=\"{MUTED}\">({unit}) {}; mean {}, rms about it {}; lines {} Hz apart</tspan></text>",
        top - 28.0,
        markup(&short(&quantity.id, 40)),
        markup(&short(&quantity.in_words, 70)),
        three(spectrum.mean * scale),
        three(spectrum.rms * scale),
        three(spectrum.resolution_hz)
    ));
    let right = plot.corner[0] + plot.size[0];
    let mut decade = low.ceil();
    while decade <= high {
        let y = plot.y(decade);
        rule(sketch, [LEFT, y], [right, y]);
        sketch.put(format_args!(
            "<text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"end\" font-size=\"11\">{}</text>",
            LEFT - 6.0,
            y + 4.0,
            crate::number::clean(10.0_f64.powf(decade))
        ));
        decade += 1.0;
    }
    plot.below(sketch, "Hz");
    marks(sketch, &plot, natural);
    let orders: Vec<f64> = amplitudes.iter().map(|amplitude| order(*amplitude)).collect();
    plot.curve(sketch, frequencies, &orders, CURVES[0]);
    let mut taken = Taken::default();
    for peak in spectrum
        .peaks
        .iter()
        .filter(|peak| peak.frequency_hz <= plot.across[1])
        .take(PEAKS)
    {
        let (x, y) = (plot.x(peak.frequency_hz), plot.y(order(peak.amplitude)));
        let words = format!(
            "{} Hz: {} {unit}",
            three(peak.frequency_hz),
            three(peak.amplitude * scale)
        );
        let letters = words.chars().count();
        sketch.put(format_args!(
            "<circle cx=\"{x:.1}\" cy=\"{y:.1}\" r=\"2.6\" fill=\"{INK}\" data-peak-hz=\"{}\"/>",
            peak.frequency_hz
        ));
        #[allow(clippy::cast_precision_loss, reason = "a few letters")]
        let half = 3.6 * letters as f64;
        let middle = x.clamp(LEFT + half + 4.0, right - half);
        if taken.take(middle, y - 11.0, letters) {
            sketch.put(format_args!(
                "<text x=\"{middle:.1}\" y=\"{:.1}\" text-anchor=\"middle\" font-size=\"12\" {HALO}>{words}</text>",
                y - 7.0
            ));
        }
    }
}

/// Natural frequencies that the plot spans.
fn marks(sketch: &mut Sketch, plot: &Plot, natural: &[(u32, f64)]) {
    let mut last = f64::NEG_INFINITY;
    let inside = natural.iter().filter(|(_, frequency)| *frequency <= plot.across[1]);
    for (place, (number, frequency)) in inside.enumerate() {
        let x = plot.x(*frequency);
        sketch.put(format_args!(
            "<path d=\"M{x:.1} {:.1}v{:.1}\" stroke=\"{}\" stroke-opacity=\".55\" stroke-dasharray=\"2 3\" data-natural-hz=\"{frequency}\"/>",
            plot.corner[1],
            plot.size[1],
            CURVES[1]
        ));
        if place < NUMBERED && x - last > 22.0 {
            last = x;
            sketch.put(format_args!(
                "<text x=\"{x:.1}\" y=\"{:.1}\" text-anchor=\"middle\" font-size=\"11\" fill=\"{}\">f{number}</text>",
                plot.corner[1] - 4.0,
                CURVES[1]
            ));
        }
    }
}
