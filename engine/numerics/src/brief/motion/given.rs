//! What is asked of a motion.

use std::f64::consts::PI;

use nalgebra::Vector3;

use crate::model::{NodeId, SegmentId};
use crate::motion::MassGiven;
use crate::motion::transient::{BreakWhen, Frames, History, Scheme, SpectraGiven, Watched};

/// A motion as given.
#[derive(Clone, Debug, PartialEq)]
pub struct MotionGiven {
    /// The client's id.
    pub name: String,
    /// The case that it starts from; `None`: the reference state.
    pub from: Option<usize>,
    /// How long it is followed (s).
    pub duration: f64,
    /// Step (s).
    pub step: f64,
    /// How time is stepped.
    pub scheme: Scheme,
    /// Loads that vary in time.
    pub driven: Vec<DrivenGiven>,
    /// What breaks.
    pub breaks: Vec<BreakGiven>,
    /// Damping.
    pub damping: DampingGiven,
    /// A start other than at rest.
    pub start: StartGiven,
    /// Masses beside those of the net.
    pub masses: MassGiven,
    /// What frames show.
    pub frames: Frames,
    /// Quantities that every frame tells.
    pub watched: Vec<Watched>,
    /// Spectra of them, where they are wanted.
    pub spectra: Option<SpectraGiven>,
    /// The case that peaks are compared with; `None`: what acts at the end, at rest.
    pub compare_with: Option<usize>,
    /// Straight pieces into which a hanging segment is divided.
    pub pieces_of_hanging: usize,
}

/// A load that varies in time.
#[derive(Clone, Debug, PartialEq)]
pub struct DrivenGiven {
    /// What acts.
    pub what: DrivenWhat,
    /// How it varies: a factor (–), or the speed of wind (m/s).
    pub history: History,
}

/// What acts.
#[derive(Clone, Debug, PartialEq)]
pub enum DrivenWhat {
    /// An action of the brief, by index.
    Action(usize),
    /// Wind on panels that move along with it or against it.
    Wind {
        /// Coefficient on the outer side of every panel (–).
        coefficients: Vec<f64>,
        /// Density of the air (kg/m³).
        density: f64,
        /// Direction in which it blows, a unit vector.
        along: Vector3<f64>,
    },
}

/// Segments that break together.
#[derive(Clone, Debug, PartialEq)]
pub struct BreakGiven {
    /// The segments: one, or all of a rope.
    pub segments: Vec<SegmentId>,
    /// When: at a tension, as soon as one of them reaches it.
    pub when: BreakWhen,
    /// How long it takes to let go (s).
    pub release: f64,
}

/// Damping as given. All zero or more.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct DampingGiven {
    /// Factor of mass (1/s).
    pub mass: f64,
    /// Factor of stiffness (s).
    pub stiffness: f64,
    /// Force per rate of strain (N s) of segments; a segment named twice has the sum.
    pub segments: Vec<(SegmentId, f64)>,
}

impl DampingGiven {
    /// The two factors of Rayleigh damping, of mass (1/s) and of stiffness (s), that give a damping ratio at two frequencies (Hz):
    ///
    /// ```text
    /// ξ(ω) = a / 2ω + b ω / 2,    a = 2 ξ ω1 ω2 / (ω1 + ω2),    b = 2 ξ / (ω1 + ω2)
    /// ```
    #[must_use]
    pub fn rayleigh(ratio: f64, [low, high]: [f64; 2]) -> (f64, f64) {
        let sum = low + high;
        (4.0 * PI * ratio * low * high / sum, ratio / (PI * sum))
    }
}

/// How a motion starts, if not at rest in the state that it starts from.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct StartGiven {
    /// Case whose state gives the shape.
    pub shape_of: Option<usize>,
    /// Nodes moved from there (m).
    pub moved: Vec<(NodeId, Vector3<f64>)>,
    /// Velocities (m/s); a node named twice has the sum.
    pub velocities: Vec<(NodeId, Vector3<f64>)>,
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rayleigh_damping_has_its_ratio_at_both_frequencies() {
        let (a, b) = DampingGiven::rayleigh(0.015, [1.2, 7.5]);
        for frequency in [1.2, 7.5] {
            let omega = 2.0 * PI * frequency;
            assert!((a / (2.0 * omega) + b * omega / 2.0 - 0.015).abs() < 1e-15);
        }
    }
}
