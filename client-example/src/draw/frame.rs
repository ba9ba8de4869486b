//! What stands around every drawing: its head, the legend of tensions, the foot with where it comes from.

use super::{HAIR, INK, MUTED, Sketch};
use crate::colour::{self, Scale};
use crate::escape::markup;
use crate::number::three;
use crate::run::Run;
use crate::sheet::wrap;

/// Letters in a line of a head.
const LINE: usize = 145;
/// Lines of a head.
const LINES: usize = 3;

/// A title and up to three lines below it; a longer line runs on, and is cut where there is no room left.
pub(crate) fn head(sketch: &mut Sketch, title: &str, lines: &[(String, &str)]) {
    sketch.put(format_args!(
        "<text x=\"36\" y=\"44\" font-size=\"22\" font-weight=\"600\">{}</text>",
        markup(&short(title, 90))
    ));
    let wrapped = lines.iter().flat_map(|(line, colour)| {
        let lines: Vec<String> = wrap(line, LINE, "").lines().map(str::to_owned).collect();
        lines.into_iter().map(move |line| (line, colour))
    });
    let wrapped: Vec<(String, &&str)> = wrapped.collect();
    for (number, (line, colour)) in wrapped.iter().take(LINES).enumerate() {
        let y = 68 + 18 * number;
        let more = if number + 1 == LINES && wrapped.len() > LINES {
            " …"
        } else {
            ""
        };
        sketch.put(format_args!(
            "<text x=\"36\" y=\"{y}\" fill=\"{colour}\">{}{more}</text>",
            markup(&short(line, LINE))
        ));
    }
}

/// Where the drawing comes from.
pub(crate) fn foot(sketch: &mut Sketch, run: &Run, y: f64) {
    let engine = run.started.engine.clone().unwrap_or_default();
    let digest: String = run.started.digest.chars().take(12).collect();
    let line = format!(
        "{} · brief {digest} · engine {} · an aid: local codes and a licensed engineer decide",
        run.brief.id, engine.version
    );
    sketch.put(format_args!(
        "<text x=\"36\" y=\"{y:.0}\" font-size=\"11\" fill=\"{MUTED}\">{}</text>",
        markup(&line)
    ));
}

/// The legend of tensions, upright, with numbers in kN.
pub(crate) fn legend(sketch: &mut Sketch, scale: &Scale, x: f64, y: f64, height: f64) {
    let steps = 48;
    let step = height / f64::from(steps);
    for number in 0..steps {
        let share = (f64::from(number) + 0.5) / f64::from(steps);
        let top = y + height - step * f64::from(number + 1);
        sketch.put(format_args!(
            "<rect x=\"{x:.1}\" y=\"{top:.2}\" width=\"16\" height=\"{:.2}\" fill=\"{}\"/>",
            step + 0.3,
            colour::at(share)
        ));
    }
    let kind = if scale.logarithmic { "kN, log scale" } else { "kN" };
    sketch.put(format_args!(
        "<text x=\"{x:.1}\" y=\"{:.1}\" font-weight=\"600\">tension</text>",
        y - 28.0
    ));
    sketch.put(format_args!(
        "<text x=\"{x:.1}\" y=\"{:.1}\" fill=\"{MUTED}\">{kind}</text>",
        y - 11.0
    ));
    for (tick, text) in scale.ticks() {
        let at = y + height * (1.0 - scale.share(tick * 1e3));
        sketch.put(format_args!(
            "<path d=\"M{:.1} {at:.1}h6\" stroke=\"{INK}\"/>",
            x + 14.0
        ));
        sketch.put(format_args!(
            "<text x=\"{:.1}\" y=\"{:.1}\">{}</text>",
            x + 25.0,
            at + 4.5,
            text
        ));
    }
}

/// A bar that shows how long some metres are.
pub(crate) fn scale_bar(sketch: &mut Sketch, x: f64, y: f64, pixels_a_metre: f64) {
    let metres = round_below(130.0 / pixels_a_metre);
    let width = metres * pixels_a_metre;
    sketch.put(format_args!(
        "<path d=\"M{x:.1} {:.1}v6h{width:.1}v-6\" fill=\"none\" stroke=\"{INK}\"/><text x=\"{:.1}\" y=\"{:.1}\" \
         font-size=\"12\">{} m</text>",
        y - 6.0,
        x + width + 8.0,
        y + 2.0,
        three(metres)
    ));
}

/// The largest of 1, 2 and 5 times a power of ten that is not above a number.
pub(crate) fn round_below(number: f64) -> f64 {
    let decade = 10.0_f64.powf(number.log10().floor());
    let digit = [5.0, 2.0, 1.0]
        .into_iter()
        .find(|digit| digit * decade <= number * (1.0 + 1e-9))
        .unwrap_or(1.0);
    crate::number::clean(digit * decade)
}

/// Round numbers that divide an interval into about so many parts.
pub(crate) fn ticks(low: f64, high: f64, parts: f64) -> Vec<f64> {
    let rough = ((high - low) / parts).max(f64::MIN_POSITIVE);
    let step = round_below(rough * 1.5);
    let first = (low / step).ceil();
    let mut ticks = Vec::new();
    let mut count = 0.0;
    while (first + count) * step <= high * (1.0 + 1e-12) + step * 1e-9 && count < 60.0 {
        ticks.push(crate::number::clean((first + count) * step));
        count += 1.0;
    }
    ticks
}

/// A grid line with its number.
pub(crate) fn rule(sketch: &mut Sketch, from: [f64; 2], to: [f64; 2]) {
    let ([x0, y0], [x1, y1]) = (from, to);
    sketch.put(format_args!(
        "<path d=\"M{x0:.1} {y0:.1}L{x1:.1} {y1:.1}\" stroke=\"{HAIR}\"/>"
    ));
}

/// A text cut to a number of letters.
pub(crate) fn short(text: &str, letters: usize) -> String {
    if text.chars().count() <= letters {
        return text.to_owned();
    }
    let mut cut: String = text.chars().take(letters - 1).collect();
    cut.push('…');
    cut
}
