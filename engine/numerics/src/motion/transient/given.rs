//! What is asked of a motion.

use std::ops::ControlFlow;
use std::sync::Arc;

use nalgebra::Vector3;

use super::{Frame, History, SpectraGiven, Watched};
use crate::load::Case;
use crate::model::{CableId, NodeId, ReferenceState, SegmentId};
use crate::motion::MassGiven;

/// A motion from a state of the net.
#[derive(Clone, Debug, PartialEq)]
pub struct Motion {
    /// The reference state: skins have their mass per area in it.
    pub reference: Arc<ReferenceState>,
    /// Position of every node at the start (m): a solved state, or a shape plucked from it.
    pub positions: Vec<Vector3<f64>>,
    /// Velocity of every node at the start (m/s); along held directions it must be zero. Empty: at rest.
    pub velocities: Vec<Vector3<f64>>,
    /// Masses beside those of the net: persons, equipment, water on areas, air that moves with panels across them. Air keeps the
    /// directions that panels have at the start.
    pub masses: MassGiven,
    /// What acts throughout, and the unstressed lengths and temperatures.
    pub case: Case,
    /// What acts besides, each with its history.
    pub driven: Vec<Driven>,
    /// Segments that break.
    pub breaks: Vec<Break>,
    /// Damping.
    pub damping: Damping,
    /// How time is stepped.
    pub scheme: Scheme,
    /// How long it is followed (s).
    pub duration: f64,
    /// Step (s); where it has to be smaller, a whole step is divided.
    pub step: f64,
    /// What is told on the way.
    pub frames: Frames,
    /// Quantities that every frame tells, and of which there may be spectra.
    pub watched: Vec<Watched>,
    /// Spectra of all that is watched; none: not wanted.
    pub spectra: Option<SpectraGiven>,
    /// The answer to compare with, to which the motion would settle, if there is one: see [`super::settled_case`].
    pub settled: Option<Settled>,
}

/// Loads that vary in time, on top of the case.
#[derive(Clone, Debug, PartialEq)]
pub enum Driven {
    /// Forces on nodes, movements of supports and pressures of a case at unit factor, times a factor in time. It must
    /// change neither lengths nor temperatures, and take nothing out.
    Case {
        /// The loads at factor 1.
        case: Box<Case>,
        /// The factor (–).
        history: History,
    },
    /// Wind that blows at panels which move along with it or against it:
    ///
    /// ```text
    /// p = ½ ρ c |U − v·w| (U − v·w),     v: mean velocity of the corners,   w: direction of the wind
    /// ```
    Wind {
        /// Coefficient `c` on the outer side of every panel (–).
        coefficients: Vec<f64>,
        /// Density `ρ` of the air (kg/m³).
        density: f64,
        /// Direction in which it blows, a unit vector.
        along: Vector3<f64>,
        /// Its speed `U` (m/s).
        speed: History,
    },
}

/// Segments that break together: each lets go of both ends. Their mass and their weight stay at these; what is clamped stays so.
#[derive(Clone, Debug, PartialEq)]
pub struct Break {
    /// The segments: one, or all of a rope.
    pub segments: Vec<SegmentId>,
    /// When.
    pub when: BreakWhen,
    /// How long it takes to let go (s), its force fading evenly; zero: at once.
    pub release: f64,
}

/// When segments break.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum BreakWhen {
    /// At this time (s).
    Time(f64),
    /// At the end of the step in which the tension of one of them reaches this (N).
    Tension(f64),
}

/// Damping. All coefficients are zero or more.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Damping {
    /// Force per mass and velocity (1/s): `−a M v`.
    pub mass: f64,
    /// Force per stiffness and velocity (s): `−b K v`, with the tangent `K` of the state at the start.
    pub stiffness: f64,
    /// Dashpot along every segment that was taut at the start of a step, force per rate of length (N s/m); with it the
    /// segment still can not push. Empty: none.
    pub segments: Vec<f64>,
}

/// How time is stepped.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Scheme {
    /// The generalised-α method (Chung & Hulbert 1993), forces averaged between the ends of a step.
    GeneralisedAlpha {
        /// Spectral radius at high frequency (–), 0 to 1; 1 is the average acceleration.
        spectral_radius: f64,
        /// Largest estimated error of a step in any position (m); the step is divided to keep it. None: equal steps.
        error: Option<f64>,
    },
    /// Bars whose force makes energy balance to the last digit (Simo & Tarnow 1992; Gonzalez 1996).
    Conserving {
        /// Largest estimated error of a step in any position (m), as above.
        error: Option<f64>,
    },
    /// Explicit central differences; each step divided into as many as stability needs.
    CentralDifferences,
}

impl Scheme {
    /// Largest error of a step that is allowed (m), where it is to be kept.
    pub(super) fn allowed_error(self) -> Option<f64> {
        match self {
            Self::GeneralisedAlpha { error, .. } | Self::Conserving { error } => error,
            Self::CentralDifferences => None,
        }
    }
}

/// What is told on the way.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Frames {
    /// Steps from one frame to the next; zero: only the first and the last.
    pub stride: u64,
    /// Nodes whose movement is told.
    pub nodes: Vec<NodeId>,
    /// Cables whose field along the rope is told.
    pub cables: Vec<CableId>,
}

/// A static answer to compare with.
#[derive(Clone, Debug, PartialEq)]
pub struct Settled {
    /// Position of every node (m).
    pub positions: Vec<Vector3<f64>>,
    /// Axial force of every segment (N).
    pub axial_forces: Vec<f64>,
}

/// What an observer is told.
#[derive(Clone, Copy, Debug)]
pub enum Progress<'a> {
    /// Before each Newton iteration, or each explicit step.
    Iteration {
        /// Time reached (s).
        time: f64,
        /// Iteration of this step, from 0.
        iteration: u32,
        /// Largest out-of-balance force (N); zero in an explicit step.
        residual: f64,
    },
    /// A frame; told by [`super::run`] only, since [`super::Running::next_frame`] hands it over.
    Frame(&'a Frame),
}

/// Watches a motion and may stop it.
pub type Observer<'a> = &'a mut dyn FnMut(Progress<'_>) -> ControlFlow<()>;
