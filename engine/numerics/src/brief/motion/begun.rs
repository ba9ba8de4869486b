//! A motion under way, and what came of it, in the net as given.

use std::sync::Arc;

use super::MotionDoubt;
use super::doubts::doubts;
use crate::model::{AxialLaw, CableId, Net, NodeId, SegmentId};
use crate::motion::Division;
use crate::motion::transient::{
    DynamicFactors, Ending, Event, Motion, Observer, Outcome, Outlook, Peak, Peaks, Running, Went,
};

/// What peaks are compared with.
#[derive(Clone, Debug, PartialEq)]
pub enum Compared {
    /// A case of the brief.
    Case(usize),
    /// The static answer under what acts at the end.
    Settled,
    /// Nothing.
    Nothing {
        /// Why there is no static answer.
        why: String,
    },
}

/// What dividing hanging ropes did.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Divided {
    /// Segments that were divided.
    pub segments: usize,
    /// Largest movement by it of a node of the net (m).
    pub moved: f64,
    /// Largest difference by it of a tension at a node of the net (N).
    pub tension: f64,
}

/// A rope that frames show.
#[derive(Clone, Debug, PartialEq)]
pub struct ShownRope {
    /// The cable.
    pub cable: CableId,
    /// Unstressed length from its start to every point (m).
    pub material: Vec<f64>,
    /// Node at every point; `None` at points of division.
    pub nodes: Vec<Option<NodeId>>,
}

/// The net as given behind the net that moves.
#[derive(Clone, Debug)]
pub(super) struct Whole {
    pub(super) net: Arc<Net>,
    pub(super) division: Option<Arc<Division>>,
    pub(super) motion: Arc<Motion>,
}

/// A motion that is ready to be followed, or under way.
///
/// Frames of [`Self::running`] have the nodes and cables that were asked for; at the points of [`Self::shown_ropes`], those of
/// division among them, stand the fields of a rope. Slack segments are counted by pieces there.
#[derive(Debug)]
pub struct MotionBegun {
    /// The motion itself.
    pub running: Running,
    /// Its size, speeds of waves and what its steps can not resolve. Speeds and steps of hanging ropes are those of pieces.
    pub outlook: Outlook,
    /// Mass of nodes that can move (kg), air left out.
    pub moving_mass: f64,
    /// What peaks are compared with.
    pub compared: Compared,
    /// What dividing hanging ropes did; `None` where nothing hangs.
    pub divided: Option<Divided>,
    pub(super) whole: Whole,
}

/// A largest value: where, how much, when.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct MotionExtreme<Place> {
    /// Where.
    pub place: Place,
    /// The value, and when it was first reached (s).
    pub peak: Peak,
}

/// The largest values of a motion.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct MotionExtremes {
    /// Tension of a rope (N); `None` where none was taut.
    pub tension: Option<MotionExtreme<SegmentId>>,
    /// Movement of a node from its start (m).
    pub movement: Option<MotionExtreme<NodeId>>,
    /// Pull on a support (N).
    pub support_force: Option<MotionExtreme<NodeId>>,
    /// Peak over static tension (–), of segments of ropes with at least 5 % of the largest static one that reach their peak
    /// after the start: one that only lets go has it there.
    pub tension_factor: Option<MotionExtreme<SegmentId>>,
    /// Peak over static movement (–), of nodes with at least 5 % of the largest static one.
    pub movement_factor: Option<MotionExtreme<NodeId>>,
}

/// What came of a motion.
#[derive(Clone, Debug, PartialEq)]
pub struct MotionFound {
    /// By nodes and segments of the net as given. Of a divided segment: the largest and the least of its pieces; events of any of
    /// its pieces, those that happen together once; counts of slackening and snatching by pieces.
    pub outcome: Outcome,
    /// The largest values.
    pub extremes: MotionExtremes,
    /// What to doubt.
    pub doubts: Vec<MotionDoubt>,
}

impl MotionFound {
    /// Whether it was followed to its end.
    #[must_use]
    pub fn is_finished(&self) -> bool {
        self.outcome.ending == Ending::Done
    }
}

impl MotionBegun {
    /// Goes on to the next frame; see [`Running::next_frame`].
    pub fn next_frame(&mut self, observe: Observer<'_>) -> Option<crate::motion::transient::Frame> {
        self.running.next_frame(observe)
    }

    /// Goes on to the next frame or a pause; see [`Running::go_on`].
    pub fn go_on(&mut self, pauses: &mut dyn FnMut() -> bool, observe: Observer<'_>) -> Went {
        self.running.go_on(pauses, observe)
    }

    /// The ropes that frames show, in their order.
    #[must_use]
    pub fn shown_ropes(&self) -> Vec<ShownRope> {
        let Whole { motion, .. } = &self.whole;
        let net = self.whole.moving();
        let ropes = motion.frames.cables.iter().map(|id| {
            let cable = &net.cables()[id.index()];
            let mut material = vec![0.0];
            for segment in &net.segments()[cable.segments.clone()] {
                material.push(material[material.len() - 1] + motion.case.unstressed_lengths[segment.length]);
            }
            ShownRope {
                cable: *id,
                material,
                nodes: cable
                    .path
                    .iter()
                    .map(|node| self.whole.is_given(*node).then_some(*node))
                    .collect(),
            }
        });
        ropes.collect()
    }

    /// What came of it; cancelled where it has not ended yet.
    #[must_use]
    pub fn finish(self) -> MotionFound {
        let Self {
            running,
            outlook,
            whole,
            ..
        } = self;
        let outcome = whole.outcome(running.finish());
        MotionFound {
            extremes: whole.extremes(&outcome),
            doubts: doubts(&whole, &outlook, &outcome),
            outcome,
        }
    }
}

impl Whole {
    /// The net that moves.
    pub(super) fn moving(&self) -> &Net {
        self.division.as_ref().map_or(&self.net, |division| division.net())
    }

    fn is_given(&self, node: NodeId) -> bool {
        self.division.as_ref().is_none_or(|division| division.is_given(node))
    }

    /// The outcome by nodes and segments of the net as given.
    fn outcome(&self, outcome: Outcome) -> Outcome {
        let Some(division) = &self.division else {
            return outcome;
        };
        let n_nodes = self.net.nodes().len();
        let segments = || (0..self.net.segments().len()).map(SegmentId::new);
        let merge = |peaks: &[Peak], is_beyond: fn(f64, f64) -> bool| -> Vec<Peak> {
            let over_pieces = segments().map(|segment| {
                let pieces = peaks[division.pieces(segment)].iter().copied();
                pieces
                    .reduce(|known, next| {
                        let is_earlier = next.value == known.value && next.time < known.time;
                        if is_beyond(next.value, known.value) || is_earlier {
                            next
                        } else {
                            known
                        }
                    })
                    .expect("at least one piece")
            });
            over_pieces.collect()
        };
        let Outcome {
            ending,
            mut positions,
            mut velocities,
            peaks,
            mut factors,
            mut events,
            ..
        } = outcome;
        positions.truncate(n_nodes);
        velocities.truncate(n_nodes);
        let mut peaks = Peaks {
            largest_forces: merge(&peaks.largest_forces, |next, known| next > known),
            least_forces: merge(&peaks.least_forces, |next, known| next < known),
            ..peaks
        };
        peaks.movements.truncate(n_nodes);
        peaks.towards.truncate(n_nodes);
        factors.movements.truncate(n_nodes);
        if let Some(settled) = &self.motion.settled {
            let of_whole = segments().map(|segment| {
                let pieces = division.pieces(segment);
                let is_told = factors.forces[pieces.clone()].iter().any(Option::is_some);
                let fixed = settled.axial_forces[pieces]
                    .iter()
                    .copied()
                    .fold(f64::NEG_INFINITY, f64::max);
                (is_told && fixed > 0.0).then(|| peaks.largest_forces[segment.index()].value / fixed)
            });
            factors = DynamicFactors {
                forces: of_whole.collect(),
                movements: factors.movements,
            };
        }
        let mut listed: Vec<Event> = Vec::with_capacity(events.first.len());
        for event in events.first {
            let event = Event {
                segment: division.segment(event.segment),
                ..event
            };
            // Of pieces that do the same together, one tells it.
            let together = listed.iter().rev().take_while(|other| other.time == event.time);
            if !together.into_iter().any(|other| *other == event) {
                listed.push(event);
            }
        }
        events.first = listed;
        let ending = match ending {
            Ending::StepTooSmall(mut stuck) => {
                stuck.node = division.nearest(stuck.node);
                stuck.segment = stuck.segment.map(|segment| division.segment(segment));
                Ending::StepTooSmall(stuck)
            }
            other => other,
        };
        Outcome {
            ending,
            positions,
            velocities,
            peaks,
            factors,
            events,
            ..outcome
        }
    }

    fn extremes(&self, outcome: &Outcome) -> MotionExtremes {
        /// Share of the largest static value below which a ratio to it says little.
        const TOLD_FROM: f64 = 0.05;
        let Outcome { peaks, factors, .. } = outcome;
        let is_rope = |segment: &usize| self.net.segments()[*segment].law == AxialLaw::TensionOnly;
        let tensions = (0..peaks.largest_forces.len())
            .filter(is_rope)
            .map(|segment| (SegmentId::new(segment), peaks.largest_forces[segment]));
        let movements = peaks.movements.iter().enumerate();
        let movements = movements.map(|(node, peak)| (NodeId::new(node), *peak));
        // Static values by the ratios themselves: of what is too small for a ratio nothing is told.
        let ratios = |peaks: &[Peak], factors: &[Option<f64>]| -> Vec<(usize, Peak)> {
            let both = factors.iter().zip(peaks).enumerate();
            let told: Vec<(usize, f64, Peak)> = both
                .filter_map(|(index, (factor, peak))| {
                    let factor = (*factor)?;
                    let value = Peak { value: factor, ..*peak };
                    (factor != 0.0).then_some((index, peak.value / factor, value))
                })
                .collect();
            let largest = told.iter().map(|(_, fixed, _)| *fixed).fold(0.0, f64::max);
            let kept = told.into_iter().filter(|(_, fixed, _)| *fixed >= TOLD_FROM * largest);
            kept.map(|(index, _, peak)| (index, peak)).collect()
        };
        let forces = ratios(&peaks.largest_forces, &factors.forces);
        let forces = (forces.into_iter()).filter(|(segment, peak)| is_rope(segment) && peak.time > 0.0);
        let towards = ratios(&peaks.towards, &factors.movements);
        MotionExtremes {
            tension: largest(tensions).filter(|extreme| extreme.peak.value > 0.0),
            movement: largest(movements),
            support_force: largest(peaks.supports.iter().map(|support| (support.node, support.size))),
            tension_factor: largest(forces.map(|(segment, peak)| (SegmentId::new(segment), peak))),
            movement_factor: largest(towards.into_iter().map(|(node, peak)| (NodeId::new(node), peak))),
        }
    }
}

/// The first of the largest.
fn largest<Place>(peaks: impl Iterator<Item = (Place, Peak)>) -> Option<MotionExtreme<Place>> {
    let largest = peaks.reduce(|known, next| if next.1.value > known.1.value { next } else { known });
    largest.map(|(place, peak)| MotionExtreme { place, peak })
}
