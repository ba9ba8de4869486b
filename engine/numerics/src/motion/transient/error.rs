//! Why a motion is not begun.

use thiserror::Error;

use super::HistoryError;
use crate::assembly::LoadingError;
use crate::model::{NodeId, SegmentId};

/// What stands against a motion.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum MotionError {
    /// The case does not fit the net, or its numbers are beyond use.
    #[error(transparent)]
    Loading(#[from] LoadingError),
    /// A rope slides.
    #[error("{segment} slides through a node: motion knows clamped ropes only; clamp it there")]
    Slides {
        /// Its first segment.
        segment: SegmentId,
    },
    /// A segment hangs as a catenary.
    #[error("{segment} hangs as a catenary: motion knows straight segments only; divide it into straight ones")]
    Hangs {
        /// The segment.
        segment: SegmentId,
    },
    /// A node that can move has no mass.
    #[error("{node} can move but has no mass: give a rope at it a mass per length, or attach a mass")]
    NoMass {
        /// The node.
        node: NodeId,
    },
    /// A mass is added where nothing is.
    #[error("a mass is added to {what} {index}, the net has {present}")]
    NoPlaceForMass {
        /// Node, segment, skin or zone.
        what: &'static str,
        /// Its index.
        index: usize,
        /// How many the net has.
        present: usize,
    },
    /// A list has the wrong length.
    #[error("{given} {what} are given, the net needs {needed}")]
    WrongLength {
        /// Which list.
        what: &'static str,
        /// Its length.
        given: usize,
        /// The length that fits the net.
        needed: usize,
    },
    /// A number is out of its range.
    #[error("the {what} is {value}: it must be {needed}")]
    Number {
        /// Which.
        what: &'static str,
        /// Its value.
        value: f64,
        /// Its range.
        needed: &'static str,
    },
    /// A node is given a velocity against its support.
    #[error("{node} is held but given a velocity along a held direction")]
    HeldVelocity {
        /// The node.
        node: NodeId,
    },
    /// A history is senseless.
    #[error("history {driven}: {error}")]
    History {
        /// Which driven load, from 0.
        driven: usize,
        /// Why.
        error: HistoryError,
    },
    /// A driven load changes what must not change.
    #[error("driven load {driven} changes {what}: only forces, pressures and support movements may vary in time")]
    Driven {
        /// Which, from 0.
        driven: usize,
        /// What it changes.
        what: &'static str,
    },
    /// Supports move while damping is measured against fixed ground.
    #[error(
        "damping by stiffness acts on velocities over fixed ground: with moving supports use damping along segments"
    )]
    DampedGround,
    /// A support moves while its node is free in other directions and air across skins couples the two.
    #[error(
        "{node} moves with its support and slides on it, while air across a skin couples the two directions: \
         hold it fully, or leave out the air"
    )]
    AirAtMovingSupport {
        /// The node.
        node: NodeId,
    },
    /// A break names a segment that is not there.
    #[error("break {place} names {segment}, which is not in the net or taken out already")]
    NotThere {
        /// Which break, from 0.
        place: usize,
        /// The segment.
        segment: SegmentId,
    },
    /// A break names no segment.
    #[error("break {place} names no segment")]
    NothingBreaks {
        /// Which break, from 0.
        place: usize,
    },
    /// A frame is to show a node or a cable that is not there.
    #[error("frames show {what} {index}, the net has {present}")]
    NotShown {
        /// Node or cable.
        what: &'static str,
        /// Its index.
        index: usize,
        /// How many the net has.
        present: usize,
    },
    /// Something can not be watched.
    #[error("watched quantity {place} {what}")]
    Watched {
        /// Which, from 0.
        place: usize,
        /// What is wrong with it.
        what: &'static str,
    },
    /// Spectra are wanted of nothing.
    #[error("spectra are wanted, but nothing is watched")]
    NothingWatched,
    /// Too little is left for spectra.
    #[error(
        "from {from} s on {samples} whole steps are left for spectra: at least {least}; begin earlier, or follow longer"
    )]
    TooFewSamples {
        /// Where they begin (s).
        from: f64,
        /// Whole steps from there to the end.
        samples: u64,
        /// How many it takes.
        least: u64,
    },
    /// What is watched is too much to keep for spectra.
    #[error("{bytes:e} bytes of samples for spectra: at most {most:e}; watch less, begin later or lengthen the step")]
    TooManySamples {
        /// Bytes needed.
        bytes: f64,
        /// Bytes allowed.
        most: f64,
    },
    /// A segment would break twice.
    #[error("break {place} names {segment}, which an earlier one breaks already")]
    BrokenTwice {
        /// Which break, from 0.
        place: usize,
        /// The segment.
        segment: SegmentId,
    },
    /// It is too much.
    #[error(
        "{steps:e} steps with {bytes:e} bytes of frames: at most {most_steps:e} and {most_bytes:e}; \
         shorten the time, lengthen the step or the stride"
    )]
    TooLarge {
        /// Steps, as many as stability needs where they are explicit.
        steps: f64,
        /// Size of all frames.
        bytes: f64,
        /// Steps allowed.
        most_steps: f64,
        /// Size of frames allowed.
        most_bytes: f64,
    },
}
