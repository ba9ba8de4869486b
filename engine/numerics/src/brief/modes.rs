//! Natural frequencies about the states of a brief.

use std::ops::ControlFlow;

use super::StateResult;
use crate::equilibrium::{Analysis, IterationReport, Way};
use crate::load::Case;
use crate::model::ReferenceState;
use crate::motion::{About, MassGiven, Modes, ModesError, natural_modes};

/// States whose natural frequencies are wanted.
#[derive(Clone, Debug, PartialEq)]
pub struct ModesGiven {
    /// Whether the reference state is one of them.
    pub reference: bool,
    /// Cases, by index in rising order.
    pub cases: Vec<usize>,
    /// How many frequencies, from the lowest.
    pub count: usize,
    /// Masses beside those of the net.
    pub masses: MassGiven,
    /// A lowest frequency below this (Hz) asks for a study of the wind.
    pub wind_study_below: f64,
    /// One below this (Hz) counts as flexible: resonance with gusts is likely.
    pub flexible_below: f64,
}

impl Default for ModesGiven {
    /// Limits: common practice, from memory: verify (5 Hz, the European wind standard for parts of roofs; 1 Hz, the American one).
    fn default() -> Self {
        Self {
            reference: true,
            cases: Vec::new(),
            count: 6,
            masses: MassGiven::default(),
            wind_study_below: 5.0,
            flexible_below: 1.0,
        }
    }
}

/// What the lowest frequency of a state says about gusts.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum GustNote {
    /// Below [`ModesGiven::wind_study_below`].
    StudyWind,
    /// Below [`ModesGiven::flexible_below`] too.
    Flexible,
}

impl ModesGiven {
    /// What a lowest frequency (Hz) says about gusts.
    #[must_use]
    pub fn gust_note(&self, lowest: f64) -> Option<GustNote> {
        if lowest < self.flexible_below {
            Some(GustNote::Flexible)
        } else if lowest < self.wind_study_below {
            Some(GustNote::StudyWind)
        } else {
            None
        }
    }
}

/// Modes about a state of `case`, found by iterations of which `last` was the last.
///
/// `observe` is asked with that report, again and again, whether to go on.
pub(super) fn modes_about(
    analysis: &Analysis,
    asked: &ModesGiven,
    case: &Case,
    state: &StateResult,
    reference: &ReferenceState,
    last: Option<&IterationReport>,
    observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
) -> Box<Result<Modes, ModesError>> {
    let about = About {
        case,
        positions: &state.positions,
        reference: &reference.positions,
        axial_forces: &state.axial_forces,
        lying: &state.lying,
    };
    let last = last.copied().unwrap_or(IterationReport {
        way: Way::Newton,
        load_step: 1,
        load_factor: 1.0,
        iteration: 0,
        residual: 0.0,
        worst_node: None,
        strain_energy: 0.0,
        slack: 0,
        step_length: 0.0,
    });
    Box::new(natural_modes(analysis, &about, &asked.masses, asked.count, &mut || {
        observe(&last)
    }))
}
