//! Drawings as SVG: the numbers in them are those of the CSV files, kept in `data-` attributes beside what is shown.

mod convergence;
mod doubling;
mod frame;
mod modes;
mod motion;
mod pick;
mod plan;
mod pulls;
mod room;
mod sections;

use std::fmt::Write as _;

pub(crate) use convergence::convergence;
pub(crate) use doubling::doubling;
pub(crate) use modes::modes;
pub(crate) use motion::motion;
pub(crate) use pick::{moved_cases, ropes as picked_ropes};
pub(crate) use plan::plan;
pub(crate) use sections::sections;

/// Ink, muted ink, hairlines, alarm.
pub(crate) const INK: &str = "#1d2733";
pub(crate) const MUTED: &str = "#5d6a78";
pub(crate) const HAIR: &str = "#d4dae0";
pub(crate) const ALARM: &str = "#b3261e";

/// A drawing that grows line by line.
#[derive(Debug)]
pub(crate) struct Sketch {
    body: String,
}

impl Sketch {
    pub(crate) fn new() -> Self {
        Self { body: String::new() }
    }

    /// Adds a line of markup.
    pub(crate) fn put(&mut self, markup: std::fmt::Arguments) {
        self.body.write_fmt(markup).expect("memory takes any text");
        self.body.push('\n');
    }

    /// The drawing of that size, on white.
    pub(crate) fn finish(self, width: f64, height: f64, label: &str) -> String {
        let label = crate::escape::markup(label);
        format!(
            "<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 {width:.0} {height:.0}\" width=\"{width:.0}\" \
             height=\"{height:.0}\" role=\"img\" aria-label=\"{label}\" \
             font-family=\"system-ui, 'DejaVu Sans', sans-serif\" font-size=\"13\" fill=\"{INK}\">\n\
             <title>{label}</title>\n<rect width=\"100%\" height=\"100%\" fill=\"#fff\"/>\n{}</svg>\n",
            self.body
        )
    }
}

#[cfg(test)]
mod tests;
