//! Motions: quantities over time, where the energy is, waves along ropes, spectra.

mod curve;
mod energy;
mod field;
mod space_time;
mod spectra;
mod watched;

use std::collections::BTreeSet;

use crate::escape::free_file_name;
use crate::run::{MotionRun, Run};

/// Width of the drawings.
const WIDTH: f64 = 1200.0;

/// Colours of curves that are told apart by their labels too: dark, and apart from each other for colour-blind eyes.
const CURVES: [&str; 6] = ["#31688e", "#c2571a", "#7a3e9d", "#1f6f4a", "#1d2733", "#9a6a00"];

/// Ropes that are drawn over time.
const ROPES: usize = 12;

/// Every drawing of a motion with the end of its name, in the order in which they are read.
pub(crate) fn motion(run: &Run, motion: &MotionRun) -> Vec<(String, String)> {
    let mut drawings = Vec::new();
    let numbered = |name: &str, pages: Vec<String>| -> Vec<(String, String)> {
        let pages = (1..).zip(pages);
        pages.map(|(number, page)| (format!("{name}-{number}"), page)).collect()
    };
    drawings.extend(numbered("watched", watched::watched(run, motion)));
    drawings.extend(energy::energy(run, motion).map(|drawing| ("energy".to_owned(), drawing)));
    let mut taken = BTreeSet::new();
    for (number, rope) in motion.shown.ropes.iter().enumerate().take(ROPES) {
        let name = free_file_name(&rope.cable, &mut taken);
        if let Some(drawing) = space_time::space_time(run, motion, number) {
            drawings.push((format!("rope-{name}"), drawing));
        }
    }
    drawings.extend(numbered("spectra", spectra::spectra(run, motion)));
    drawings
}
