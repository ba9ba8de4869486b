//! What is kept of a motion: frames, peaks, events, the ledger of energy.

use nalgebra::Vector3;

use super::spectrum::{LEAST_SAMPLES, spectrum};
use super::system::{Moment, State, System};
use super::{Motion, RopeField, Settled, SpectraGiven, Spectrum};
use crate::model::{NodeId, SegmentId};

/// Where the energy is and where it went (J). What is not told apart is zero at the start.
///
/// ```text
/// error = kinetic + elastic + potential − (the same at the start) − work + dissipated + released
/// ```
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Ledger {
    /// Of motion, along free directions.
    pub kinetic: f64,
    /// Of strain, in members and springs.
    pub elastic: f64,
    /// Of dead loads that act throughout, measured from the start.
    pub potential: f64,
    /// Done so far by driven loads, pressure, wind and moving supports.
    pub work: f64,
    /// Taken so far by damping.
    pub dissipated: f64,
    /// Strain energy so far of members that broke.
    pub released: f64,
    /// Made by the steps of time: negative where the scheme damps of itself.
    pub error: f64,
}

impl Ledger {
    /// Kinetic, elastic and potential energy (J).
    #[must_use]
    pub fn total(&self) -> f64 {
        self.kinetic + self.elastic + self.potential
    }
}

/// A moment of a motion.
#[derive(Clone, Debug, PartialEq)]
pub struct Frame {
    /// Steps from the start.
    pub step: u64,
    /// Time (s).
    pub time: f64,
    /// Position of every chosen node (m).
    pub positions: Vec<Vector3<f64>>,
    /// Velocity of every chosen node (m/s).
    pub velocities: Vec<Vector3<f64>>,
    /// Every chosen cable.
    pub cables: Vec<RopeField>,
    /// Segments that are slack.
    pub slack: usize,
    /// Where the energy is.
    pub ledger: Ledger,
    /// Value of everything watched.
    pub watched: Vec<f64>,
}

/// A value and when it was first reached.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Peak {
    /// The value.
    pub value: f64,
    /// When (s).
    pub time: f64,
}

impl Peak {
    fn raise(&mut self, value: f64, time: f64) {
        if value > self.value {
            *self = Self { value, time };
        }
    }

    fn lower(&mut self, value: f64, time: f64) {
        if value < self.value {
            *self = Self { value, time };
        }
    }
}

/// Extremes over the steps, not only over the frames.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Peaks {
    /// Largest axial force of every segment (N).
    pub largest_forces: Vec<Peak>,
    /// Least axial force of every segment (N), as long as it is whole.
    pub least_forces: Vec<Peak>,
    /// Largest movement of every node from its start (m).
    pub movements: Vec<Peak>,
    /// Largest movement of every node along that to the static answer (m); empty without one.
    pub towards: Vec<Peak>,
    /// Largest force of the support of every node that has one, rigid or elastic, in the order of the nodes.
    pub supports: Vec<SupportPeak>,
}

/// Largest force of a support on the net.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SupportPeak {
    /// The supported node.
    pub node: NodeId,
    /// Its size (N), and when it was first reached (s).
    pub size: Peak,
    /// The force on the net then (N).
    pub force: Vector3<f64>,
}

/// Dynamic over static values; none where the static one is too small to compare with.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct DynamicFactors {
    /// Largest over static axial force of every segment.
    pub forces: Vec<Option<f64>>,
    /// Largest movement along that to the static answer, over it, of every node.
    pub movements: Vec<Option<f64>>,
}

/// Static values below this share of the largest are not compared with.
const LEAST_SHARE: f64 = 1e-6;

impl Peaks {
    /// Compares with a static answer.
    #[must_use]
    pub(super) fn against(&self, settled: &Settled, start: &[Vector3<f64>]) -> DynamicFactors {
        let ratios = |peaks: &[Peak], values: &[f64]| {
            let largest = values.iter().fold(0.0_f64, |most, value| most.max(value.abs()));
            let ratio = |(peak, value): (&Peak, &f64)| (*value > LEAST_SHARE * largest).then(|| peak.value / value);
            peaks.iter().zip(values).map(ratio).collect()
        };
        let movements: Vec<f64> = (settled.positions.iter().zip(start))
            .map(|(to, from)| (to - from).norm())
            .collect();
        DynamicFactors {
            forces: ratios(&self.largest_forces, &settled.axial_forces),
            movements: ratios(&self.towards, &movements),
        }
    }
}

/// What happened to a segment.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum EventKind {
    /// It lost its tension.
    Slack,
    /// It came taut again.
    Snatch,
    /// It began to break.
    Break,
}

/// Something that happened.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Event {
    /// When (s), between the ends of a step by proportion of lengths.
    pub time: f64,
    /// Where.
    pub segment: SegmentId,
    /// What.
    pub kind: EventKind,
}

/// Events beyond this many are counted only.
const MOST_EVENTS: usize = 10_000;

/// Events in order, the first of them kept.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Events {
    /// The first ones.
    pub first: Vec<Event>,
    /// How many times segments went slack in all.
    pub slackenings: u64,
    /// How many times segments came taut in all.
    pub snatches: u64,
}

impl Events {
    pub(super) fn add(&mut self, event: Event) {
        match event.kind {
            EventKind::Slack => self.slackenings += 1,
            EventKind::Snatch => self.snatches += 1,
            EventKind::Break => {}
        }
        if self.first.len() < MOST_EVENTS {
            self.first.push(event);
        }
    }

    /// Adds what happened between two states from `start` to `start + h` (s).
    pub(super) fn compare(
        &mut self,
        system: &System,
        [before, after]: [&[bool]; 2],
        [from, to]: [&State; 2],
        start: f64,
        h: f64,
    ) {
        let mut new = Vec::new();
        for (e, (was, is)) in before.iter().zip(after).enumerate() {
            if was == is || system.shares[e] == 0.0 {
                continue;
            }
            let [l0, l1] = [from, to].map(|state| system.length(&state.positions, e));
            let share = (system.bars()[e].stress_free_length - l0) / (l1 - l0);
            new.push(Event {
                time: start + h * share.clamp(0.0, 1.0),
                segment: SegmentId::new(e),
                kind: if *is { EventKind::Snatch } else { EventKind::Slack },
            });
        }
        new.sort_by(|a, b| a.time.total_cmp(&b.time));
        new.into_iter().for_each(|event| self.add(event));
    }
}

/// Keeps peaks.
#[derive(Debug)]
pub(super) struct Recorder {
    pub(super) peaks: Peaks,
    pub(super) events: Events,
    start: Vec<Vector3<f64>>,
    /// Unit vector of every node to the static answer.
    towards: Vec<Vector3<f64>>,
}

impl Recorder {
    pub(super) fn new(system: &System) -> Self {
        let start = system.motion.positions.clone();
        let towards: Vec<Vector3<f64>> = system.motion.settled.as_ref().map_or(Vec::new(), |settled| {
            let moved = settled.positions.iter().zip(&start);
            moved
                .map(|(to, from)| (to - from).try_normalize(0.0).unwrap_or_default())
                .collect()
        });
        let at = |value, n: usize| vec![Peak { value, time: 0.0 }; n];
        Self {
            peaks: Peaks {
                largest_forces: at(f64::NEG_INFINITY, system.shares.len()),
                least_forces: at(f64::INFINITY, system.shares.len()),
                movements: at(0.0, start.len()),
                towards: at(0.0, towards.len()),
                supports: (system.supported().iter())
                    .map(|node| SupportPeak {
                        node: *node,
                        size: Peak { value: 0.0, time: 0.0 },
                        force: Vector3::zeros(),
                    })
                    .collect(),
            },
            events: Events::default(),
            start,
            towards,
        }
    }

    pub(super) fn add(&mut self, system: &System, moment: &Moment<'_>) {
        let (time, state) = (moment.time, moment.state);
        for peak in &mut self.peaks.supports {
            let force = system.support_force(peak.node, moment);
            let size = force.norm();
            if size > peak.size.value {
                peak.size.raise(size, time);
                peak.force = force;
            }
        }
        for (e, share) in system.shares.iter().enumerate() {
            let axial = system.axial_force(&state.positions, e);
            self.peaks.largest_forces[e].raise(axial, time);
            if *share == 1.0 {
                self.peaks.least_forces[e].lower(axial, time);
            }
        }
        for (node, (position, start)) in state.positions.iter().zip(&self.start).enumerate() {
            let movement = position - start;
            self.peaks.movements[node].raise(movement.norm(), time);
            if let Some(direction) = self.towards.get(node) {
                self.peaks.towards[node].raise(movement.dot(direction), time);
            }
        }
    }
}

/// A frame of a state.
pub(super) fn frame(system: &System, moment: &Moment<'_>, step: u64, ledger: Ledger) -> Frame {
    let (time, state) = (moment.time, moment.state);
    let chosen = &system.motion.frames;
    let net = system.structure.net();
    let velocities = system.nodal_velocities(&state.velocities, &state.held_velocities);
    let pick = |nodes: &[NodeId], of: &[Vector3<f64>]| nodes.iter().map(|node| of[node.index()]).collect();
    let cables = chosen.cables.iter().map(|id| {
        let cable = &net.cables()[id.index()];
        let mut material = vec![0.0];
        for e in cable.segments.clone() {
            let before = material[material.len() - 1];
            material.push(before + system.motion.case.unstressed_lengths[net.segments()[e].length]);
        }
        let stretch = |e: usize| system.length(&state.positions, e) / system.bars()[e].stress_free_length;
        RopeField {
            cable: *id,
            material,
            positions: pick(&cable.path, &state.positions),
            velocities: pick(&cable.path, &velocities),
            stretches: cable.segments.clone().map(stretch).collect(),
            tensions: cable
                .segments
                .clone()
                .map(|e| system.axial_force(&state.positions, e))
                .collect(),
        }
    });
    let taut = system.taut(&state.positions);
    Frame {
        step,
        time,
        positions: pick(&chosen.nodes, &state.positions),
        velocities: pick(&chosen.nodes, &velocities),
        cables: cables.collect(),
        slack: (0..taut.len())
            .filter(|e| !taut[*e] && system.shares[*e] > 0.0 && system.bars()[*e].is_present())
            .count(),
        ledger,
        watched: watched(system, moment),
    }
}

/// Value of everything watched.
pub(super) fn watched(system: &System, moment: &Moment<'_>) -> Vec<f64> {
    let all = system.motion.watched.iter();
    all.map(|watched| watched.value(system, moment)).collect()
}

/// Samples of everything watched, for spectra.
#[derive(Debug)]
pub(super) struct Series {
    /// First and last whole step that is sampled.
    first: u64,
    last: u64,
    samples: Vec<Vec<f64>>,
}

impl Series {
    /// None where no spectra are wanted.
    pub(super) fn new(motion: &Motion) -> Option<Self> {
        let [first, last] = sampled_steps(motion)?;
        Some(Self {
            first,
            last,
            samples: vec![Vec::new(); motion.watched.len()],
        })
    }

    /// Takes the sample of a whole step.
    pub(super) fn add(&mut self, system: &System, moment: &Moment<'_>, step: u64) {
        if (self.first..=self.last).contains(&step) {
            for (samples, value) in self.samples.iter_mut().zip(watched(system, moment)) {
                samples.push(value);
            }
        }
    }

    /// The spectra of what was sampled; none where that is too little.
    pub(super) fn spectra(&self, step: f64, given: &SpectraGiven) -> Vec<Spectrum> {
        let enough = |samples: &&Vec<f64>| samples.len() as u64 >= LEAST_SAMPLES;
        let told = self.samples.iter().filter(enough);
        told.map(|samples| spectrum(samples, step, given.up_to)).collect()
    }
}

/// First and last whole step that is sampled for spectra, where they are wanted.
#[allow(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "beyond u64 it saturates, and is refused"
)]
pub(super) fn sampled_steps(motion: &Motion) -> Option<[u64; 2]> {
    let given = motion.spectra.as_ref()?;
    let first = (given.from / motion.step - 1e-9).ceil().max(0.0);
    let last = (motion.duration / motion.step + 1e-9).floor();
    Some([first as u64, last as u64])
}
