//! A plot of numbers over time or frequency: its axes, its curves, and curves thinned to what a screen can show.

use crate::draw::frame::{rule, ticks};
use crate::draw::{INK, MUTED, Sketch};
use crate::number::three;

/// Numbers thinned to at most four a column: the first, the least, the largest and the last of each, in order. So a peak stays,
/// however short it is. `at` ascends.
pub(super) fn thinned(at: &[f64], values: &[f64], columns: usize) -> Vec<[f64; 2]> {
    let all = || at.iter().zip(values).map(|(at, value)| [*at, *value]);
    let (Some(first), Some(last)) = (at.first(), at.last()) else {
        return Vec::new();
    };
    if at.len() <= 2 * columns || last <= first {
        return all().collect();
    }
    #[allow(clippy::cast_precision_loss, reason = "columns of a screen")]
    let a_column = (last - first) / columns as f64;
    let column = |at: f64| ((at - first) / a_column).floor();
    let mut thin: Vec<[f64; 2]> = Vec::new();
    let mut open: Vec<[f64; 2]> = Vec::new();
    let mut close = |open: &mut Vec<[f64; 2]>| {
        let by = |a: &&[f64; 2], b: &&[f64; 2]| a[1].total_cmp(&b[1]);
        let (low, high) = (open.iter().min_by(by).copied(), open.iter().max_by(by).copied());
        let mut kept: Vec<[f64; 2]> = [open.first().copied(), low, high, open.last().copied()]
            .into_iter()
            .flatten()
            .collect();
        kept.sort_by(|a, b| a[0].total_cmp(&b[0]));
        kept.dedup();
        thin.extend(kept);
        open.clear();
    };
    for point in all() {
        if open.last().is_some_and(|last| column(last[0]) < column(point[0])) {
            close(&mut open);
        }
        open.push(point);
    }
    close(&mut open);
    thin
}

/// Least and largest of finite numbers; 0 and 1 of none.
pub(super) fn bounds(values: impl IntoIterator<Item = f64>) -> [f64; 2] {
    let finite = values.into_iter().filter(|value| value.is_finite());
    let [low, high] = finite.fold([f64::INFINITY, f64::NEG_INFINITY], |[low, high], value| {
        [low.min(value), high.max(value)]
    });
    if low > high { [0.0, 1.0] } else { [low, high] }
}

/// An interval with room at both ends; around a single number there is room too.
pub(super) fn with_room([low, high]: [f64; 2], share: f64) -> [f64; 2] {
    let span = high - low;
    let size = low.abs().max(high.abs());
    let room = if span > 1e-9 * size {
        share * span
    } else {
        (0.1 * size).max(1e-9)
    };
    [low - room, high + room]
}

/// The field of a plot and what it spans.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Plot {
    pub(super) corner: [f64; 2],
    pub(super) size: [f64; 2],
    pub(super) across: [f64; 2],
    pub(super) up: [f64; 2],
}

impl Plot {
    pub(super) fn x(&self, value: f64) -> f64 {
        let [low, high] = self.across;
        let span = (high - low).max(f64::MIN_POSITIVE);
        self.corner[0] + ((value - low) / span).clamp(0.0, 1.0) * self.size[0]
    }

    pub(super) fn y(&self, value: f64) -> f64 {
        let [low, high] = self.up;
        let span = (high - low).max(f64::MIN_POSITIVE);
        self.corner[1] + (1.0 - ((value - low) / span).clamp(0.0, 1.0)) * self.size[1]
    }

    fn bottom(&self) -> f64 {
        self.corner[1] + self.size[1]
    }

    /// Rules across with their numbers.
    pub(super) fn levels(&self, sketch: &mut Sketch, parts: f64) {
        let right = self.corner[0] + self.size[0];
        for tick in ticks(self.up[0], self.up[1], parts) {
            let y = self.y(tick);
            rule(sketch, [self.corner[0], y], [right, y]);
            sketch.put(format_args!(
                "<text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"end\" font-size=\"11\">{tick}</text>",
                self.corner[0] - 6.0,
                y + 4.0
            ));
        }
    }

    /// Numbers below, with the unit behind the last one.
    pub(super) fn below(&self, sketch: &mut Sketch, unit: &str) {
        sketch.put(format_args!(
            "<path d=\"M{:.1} {:.1}h{:.1}\" stroke=\"{MUTED}\"/>",
            self.corner[0],
            self.bottom(),
            self.size[0]
        ));
        let numbers = ticks(self.across[0], self.across[1], 8.0);
        for (place, tick) in numbers.iter().enumerate() {
            let unit = if place + 1 == numbers.len() {
                format!(" {unit}")
            } else {
                String::new()
            };
            sketch.put(format_args!(
                "<path d=\"M{:.1} {:.1}v4\" stroke=\"{MUTED}\"/><text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"middle\" font-size=\"11\">{tick}{unit}</text>",
                self.x(*tick),
                self.bottom(),
                self.x(*tick),
                self.bottom() + 17.0
            ));
        }
    }

    /// A curve, thinned to the width of the plot.
    pub(super) fn curve(&self, sketch: &mut Sketch, at: &[f64], values: &[f64], colour: &str) {
        #[allow(
            clippy::cast_possible_truncation,
            clippy::cast_sign_loss,
            reason = "a plot is some hundred units wide"
        )]
        let columns = self.size[0] as usize;
        let points: Vec<String> = thinned(at, values, columns)
            .into_iter()
            .map(|[at, value]| format!("{:.1},{:.1}", self.x(at), self.y(value)))
            .collect();
        sketch.put(format_args!(
            "<polyline points=\"{}\" fill=\"none\" stroke=\"{colour}\" stroke-width=\"1.4\" stroke-linejoin=\"round\"/>",
            points.join(" ")
        ));
    }

    /// A dot at the least or largest number with its number and place.
    pub(super) fn mark(&self, sketch: &mut Sketch, [at, value]: [f64; 2], unit: &str, above: bool) {
        let (x, y) = (self.x(at), self.y(value));
        let share = (x - self.corner[0]) / self.size[0];
        let (anchor, by) = match share {
            share if share < 0.08 => ("start", 5.0),
            share if share > 0.92 => ("end", -5.0),
            _ => ("middle", 0.0),
        };
        sketch.put(format_args!(
            "<circle cx=\"{x:.1}\" cy=\"{y:.1}\" r=\"3\" fill=\"{INK}\"/><text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"{anchor}\" \
             font-size=\"12\" {}>{} {unit} at {} s</text>",
            x + by,
            if above { y - 7.0 } else { y + 16.0 },
            crate::draw::room::HALO,
            three(value),
            three(at)
        ));
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn thinning_keeps_the_shortest_peak_and_few_points() {
        let at: Vec<f64> = (0..100_000).map(f64::from).collect();
        let mut values: Vec<f64> = at.iter().map(|at| (at / 9000.0).sin()).collect();
        values[54_321] = 7.5;
        values[77_777] = -6.5;
        let thin = thinned(&at, &values, 500);
        assert!(thin.len() <= 2000, "{}", thin.len());
        assert!(thin.contains(&[54_321.0, 7.5]) && thin.contains(&[77_777.0, -6.5]));
        assert!(thin.windows(2).all(|pair| pair[0][0] <= pair[1][0]));
        assert_eq!(
            (thin[0], thin[thin.len() - 1]),
            ([0.0, values[0]], [99_999.0, values[99_999]])
        );
        // Few points are all kept.
        assert_eq!(thinned(&at[..900], &values[..900], 500).len(), 900);
    }

    #[test]
    fn a_constant_has_room_around_it() {
        let [low, high] = with_room([20.0, 20.0], 0.2);
        assert!(low < 20.0 && high > 20.0);
        let [low, high] = with_room([0.0, 0.0], 0.2);
        assert!(low < 0.0 && high > 0.0);
    }
}
