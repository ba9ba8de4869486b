//! The static case that a motion would come to rest in.

use super::history::Side;
use super::{BreakWhen, Driven, History, Motion};
use crate::load::Case;
use crate::model::Net;

/// What acts at the end of a motion, as a case to be solved: where damping takes all movement, its answer is where the motion
/// comes to rest, and it is what a quasi-static analysis would say of the same loads.
///
/// | given | at rest |
/// |---|---|
/// | case | all of it |
/// | driven case | times its last value; a harmonic that still runs: times its mean; one that is over, or not begun: nothing |
/// | wind | `½ ρ c \|U\| U` at its last speed on panels that do not move, a harmonic speed by its mean |
/// | break at a time | taken out, also where it is still letting go |
/// | break at a tension | not foreseen: left whole |
///
/// A value that jumps at the very end counts as before the jump, as the motion sees it.
#[must_use]
pub fn settled_case(net: &Net, motion: &Motion) -> Case {
    let mut settled = motion.case.clone();
    for driven in &motion.driven {
        match driven {
            Driven::Case { case, history } => {
                let factor = last(history, motion.duration);
                if factor == 0.0 {
                    continue;
                }
                for (sum, force) in settled.nodal_forces.iter_mut().zip(&case.nodal_forces) {
                    *sum += factor * force;
                }
                for (sum, movement) in settled.support_movements.iter_mut().zip(&case.support_movements) {
                    *sum += factor * movement;
                }
                add_pressures(net, &mut settled, factor, &case.pressures);
            }
            Driven::Wind {
                coefficients,
                density,
                speed,
                ..
            } => {
                let speed = last(speed, motion.duration);
                add_pressures(net, &mut settled, 0.5 * density * speed.abs() * speed, coefficients);
            }
        }
    }
    for given in &motion.breaks {
        if matches!(given.when, BreakWhen::Time(at) if at <= motion.duration) {
            for segment in &given.segments {
                settled.removed[segment.index()] = true;
            }
        }
    }
    settled
}

fn last(history: &History, duration: f64) -> f64 {
    match history {
        History::Harmonic { mean, start, end, .. } if *start < duration && duration <= *end => *mean,
        History::Harmonic { .. } => 0.0,
        _ => history.value(duration, Side::Before),
    }
}

fn add_pressures(net: &Net, settled: &mut Case, factor: f64, pressures: &[f64]) {
    if pressures.is_empty() || factor == 0.0 {
        return;
    }
    settled.pressures.resize(net.panels().len(), 0.0);
    for (sum, pressure) in settled.pressures.iter_mut().zip(pressures) {
        *sum += factor * pressure;
    }
}
