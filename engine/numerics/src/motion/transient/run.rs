//! From the start of a motion to its end, frame by frame.

use std::sync::Arc;

use nalgebra::Vector3;

use super::check::{cautions, check_extent, check_given, check_masses, extent};
use super::explicit::explicit_divisions;
use super::history::Side;
use super::record::{Recorder, Series, frame};
use super::step::{Done, Failure, From, Stepper, Tried, turned};
use super::system::{Forces, Moment, State, System};
use super::watch::check_watched;
use super::waves::wave_speeds;
use super::{
    Break, BreakWhen, Caution, Driven, DynamicFactors, Event, EventKind, Events, Extent, Frame, Ledger, Motion,
    MotionError, Observer, Peaks, Progress, Scheme, Spectrum, WaveSpeeds,
};
use crate::equilibrium::Analysis;
use crate::model::{NodeId, SegmentId};

/// Steps are divided down to this share of the given one before a motion is given up.
const SMALLEST_SHARE: f64 = 1.0 / (1 << 20) as f64;

/// How a motion ended.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Ending {
    /// The duration is over.
    Done,
    /// Steps became too small.
    StepTooSmall(Stuck),
    /// The observer stopped it.
    Cancelled,
}

/// Where and why steps became too small: a step was divided down to 2⁻²⁰ of the given one, and still could not be done.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Stuck {
    /// Why the smallest one could not be done.
    pub why: StuckBy,
    /// Time reached, at which it began (s).
    pub time: f64,
    /// Smallest step tried (s).
    pub step: f64,
    /// Node where the residual, or the error, of the last trial is largest.
    pub node: NodeId,
    /// Segment that came taut or went slack within the last trial; of several the one whose force changed most.
    pub segment: Option<SegmentId>,
}

/// Why a step could not be done.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum StuckBy {
    /// Newton did not converge.
    NotConverged {
        /// Largest out-of-balance force of its last iteration (N).
        residual: f64,
        /// The largest that is allowed (N).
        allowed: f64,
    },
    /// The error that is to be kept was not.
    ErrorNotKept {
        /// Estimated error of the step in a position (m).
        error: f64,
        /// The largest that is allowed (m).
        allowed: f64,
    },
    /// Numbers are beyond use.
    BeyondUse,
}

/// What came of a motion.
#[derive(Clone, Debug, PartialEq)]
pub struct Outcome {
    /// How it ended.
    pub ending: Ending,
    /// Time reached (s).
    pub time: f64,
    /// Steps done, divided ones counted each.
    pub steps: u64,
    /// Smallest step that was done (s).
    pub smallest_step: f64,
    /// Newton iterations.
    pub iterations: u64,
    /// Factorisations; one serves as many iterations and steps as it can.
    pub factorisations: u64,
    /// Position of every node at the end (m).
    pub positions: Vec<Vector3<f64>>,
    /// Velocity of every node at the end (m/s).
    pub velocities: Vec<Vector3<f64>>,
    /// Extremes.
    pub peaks: Peaks,
    /// Dynamic over static values; empty where there is nothing to compare with.
    pub factors: DynamicFactors,
    /// Slack, snatch and break.
    pub events: Events,
    /// Spectra of all that is watched, in that order, of the samples up to where the motion ended; empty where none are
    /// wanted, or where it ended before there were 16 samples.
    pub spectra: Vec<Spectrum>,
    /// Where the energy is at the end.
    pub ledger: Ledger,
    /// Largest error of the ledger by size (J).
    pub largest_error: f64,
    /// Largest kinetic energy at the end of any step (J), to compare it with.
    pub largest_kinetic: f64,
}

/// What can be told of a motion before it runs.
#[derive(Clone, Debug, PartialEq)]
pub struct Outlook {
    /// Its size.
    pub extent: Extent,
    /// Speeds of waves at the start.
    pub waves: Vec<WaveSpeeds>,
    /// What its steps can not resolve.
    pub cautions: Vec<Caution>,
}

/// Checks a motion and tells its size, the speeds of waves and what its steps can not resolve.
///
/// # Errors
/// What stands against it; see [`MotionError`].
pub fn outlook(analysis: &Analysis, motion: &Arc<Motion>) -> Result<Outlook, MotionError> {
    let system = checked(analysis, motion)?;
    let net = analysis.structure().net();
    Ok(Outlook {
        extent: extent(&system),
        waves: wave_speeds(net, motion),
        cautions: cautions(net, motion),
    })
}

fn checked(analysis: &Analysis, motion: &Arc<Motion>) -> Result<System, MotionError> {
    check_given(analysis.structure(), motion)?;
    let system = System::new(analysis.shared_structure(), Arc::clone(motion))?;
    check_masses(&system)?;
    check_watched(&system)?;
    check_extent(&extent(&system))?;
    Ok(system)
}

/// Follows a motion to its end at one go.
///
/// `observe` is told before every iteration, and every frame; when it breaks, the motion ends within one iteration.
///
/// # Errors
/// What stands against it; see [`MotionError`]. A step that does not converge is an [`Ending`], not an error.
pub fn run(analysis: &Arc<Analysis>, motion: &Arc<Motion>, observe: Observer<'_>) -> Result<Outcome, MotionError> {
    let mut running = Running::begin(Arc::clone(analysis), Arc::clone(motion))?;
    while let Some(frame) = running.next_frame(observe) {
        if observe(Progress::Frame(&frame)).is_break() {
            running.ending = Some(Ending::Cancelled);
        }
    }
    Ok(running.finish())
}

/// How far a motion went at one go.
#[derive(Clone, Debug, PartialEq)]
pub enum Went {
    /// To a frame.
    Frame(Frame),
    /// To a whole step without a frame.
    Paused,
    /// To its end.
    Ended,
}

/// A break on its way.
#[derive(Clone, Debug)]
struct Breaking {
    given: Break,
    /// When it begins, once that is known (s).
    began: Option<f64>,
    is_told: bool,
}

impl Breaking {
    /// Share of the force left over a step around `middle` (s).
    fn share(&self, middle: f64) -> f64 {
        match self.began {
            Some(began) if middle > began && self.given.release > 0.0 => {
                (1.0 - (middle - began) / self.given.release).clamp(0.0, 1.0)
            }
            Some(began) if middle > began => 0.0,
            _ => 1.0,
        }
    }
}

/// A motion under way. It owns all that it needs: between two frames it may wait as long as it likes, or go on in another
/// thread, and comes to the same bits.
#[derive(Debug)]
pub struct Running {
    system: System,
    stepper: Stepper,
    recorder: Recorder,
    series: Option<Series>,
    state: State,
    forces: Forces,
    /// What the forces make of the masses (m/s²); those of the state may belong to other moments.
    accelerations: Vec<f64>,
    taut: Vec<bool>,
    movements: Vec<Vector3<f64>>,
    /// Moments at which loads jump (s), in order.
    jumps: Vec<f64>,
    breaks: Vec<Breaking>,
    time: f64,
    /// Whole steps done; none before the frame of the start.
    whole: Option<u64>,
    /// Whole steps to do.
    wanted: u64,
    ending: Option<Ending>,
    steps: u64,
    smallest_step: f64,
    /// Longest step for now (s).
    limit: f64,
    /// Whether forces at the start of the next step must be worked out anew.
    is_stale: bool,
    /// Whether accelerations jump there. Where they do not they are left alone: those of the generalised-α method belong
    /// to its own moments within the steps, and are not those of the forces.
    has_jumped: bool,
    at_start: f64,
    ledger: Ledger,
    largest_error: f64,
    largest_kinetic: f64,
}

impl Running {
    /// Checks a motion and makes it ready; nothing moves yet.
    ///
    /// # Errors
    /// What stands against it; see [`MotionError`].
    pub fn begin(analysis: Arc<Analysis>, motion: Arc<Motion>) -> Result<Self, MotionError> {
        let mut system = checked(&analysis, &motion)?;
        let loads = system.loads_at(0.0, Side::After);
        let mut positions = motion.positions.clone();
        system.place_supports(&loads, &mut positions);
        let dofs = system.structure.dofs();
        let mut velocities = vec![0.0; dofs.len()];
        if !motion.velocities.is_empty() {
            dofs.components_into(&motion.velocities, &mut velocities);
        }
        let state = State {
            accelerations: vec![0.0; velocities.len()],
            held_velocities: system.support_velocities(0.0, Side::After),
            positions,
            velocities,
        };
        let mut jumps: Vec<f64> = (motion.driven.iter())
            .flat_map(|driven| match driven {
                Driven::Case { history, .. } | Driven::Wind { speed: history, .. } => history.jumps(),
            })
            .collect();
        jumps.sort_by(f64::total_cmp);
        let breaks = (motion.breaks.iter())
            .map(|given| Breaking {
                given: given.clone(),
                began: match given.when {
                    BreakWhen::Time(t) => Some(t),
                    BreakWhen::Tension(_) => None,
                },
                is_told: false,
            })
            .collect();
        let limit = match motion.scheme {
            Scheme::CentralDifferences => motion.step / explicit_divisions(&system),
            _ => motion.step,
        };
        let energies = system.energies(&state, &loads.movements);
        let taut = system.taut(&state.positions);
        let mut forces = system.new_forces();
        system.forces_at(&loads, &state, &taut, &mut forces, None);
        let mut accelerations = vec![0.0; state.velocities.len()];
        system.inertia.divide_into(&forces.residual, &mut accelerations);
        let mut recorder = Recorder::new(&system);
        let start = Moment {
            time: 0.0,
            state: &state,
            forces: &forces,
            accelerations: &accelerations,
        };
        recorder.add(&system, &start);
        Ok(Self {
            series: Series::new(&system.motion),
            accelerations,
            stepper: Stepper::new(&analysis),
            recorder,
            forces,
            taut,
            movements: loads.movements,
            jumps,
            breaks,
            time: 0.0,
            whole: None,
            wanted: extent(&system).steps,
            ending: None,
            steps: 0,
            smallest_step: limit,
            limit,
            is_stale: true,
            has_jumped: true,
            at_start: energies.kinetic + energies.elastic + energies.potential,
            ledger: Ledger {
                kinetic: energies.kinetic,
                elastic: energies.elastic,
                potential: energies.potential,
                ..Ledger::default()
            },
            largest_error: 0.0,
            largest_kinetic: energies.kinetic,
            state,
            system,
        })
    }

    /// Goes on to the next frame: the first is that of the start, the last that of the last step. `None` when the motion has
    /// ended.
    ///
    /// `observe` is told of every iteration before it; when it breaks, the motion ends as cancelled within one iteration.
    pub fn next_frame(&mut self, observe: Observer<'_>) -> Option<Frame> {
        match self.go_on(&mut || false, observe) {
            Went::Frame(frame) => Some(frame),
            Went::Paused | Went::Ended => None,
        }
    }

    /// Goes on to the next frame as [`Self::next_frame`] does, or up to a whole step after which `pauses` says so: frames may
    /// lie far apart. Where it pauses makes no difference to the bits.
    pub fn go_on(&mut self, pauses: &mut dyn FnMut() -> bool, observe: Observer<'_>) -> Went {
        let stride = self.system.motion.frames.stride;
        while self.ending.is_none() {
            let done = self.whole.map_or(0, |whole| whole + 1);
            if done > 0 {
                let motion = &self.system.motion;
                let target = self.snapped((done as f64 * motion.step).min(motion.duration));
                self.ending = self.advance(target, observe);
                if self.ending.is_some() {
                    break;
                }
            }
            self.whole = Some(done);
            if let Some(series) = &mut self.series {
                let moment = Moment {
                    time: self.time,
                    state: &self.state,
                    forces: &self.forces,
                    accelerations: &self.accelerations,
                };
                series.add(&self.system, &moment, done);
            }
            let is_last = done == self.wanted;
            if is_last {
                self.ending = Some(Ending::Done);
            }
            // With a stride of zero the start alone.
            if is_last || done.is_multiple_of(stride) {
                return Went::Frame(frame(&self.system, &self.moment(), done, self.ledger));
            }
            if pauses() {
                return Went::Paused;
            }
        }
        Went::Ended
    }

    fn moment(&self) -> Moment<'_> {
        Moment {
            time: self.time,
            state: &self.state,
            forces: &self.forces,
            accelerations: &self.accelerations,
        }
    }

    /// Time reached (s).
    #[must_use]
    pub fn time(&self) -> f64 {
        self.time
    }

    /// How it ended; `None` while it goes on.
    #[must_use]
    pub fn ending(&self) -> Option<Ending> {
        self.ending
    }

    /// What came of it; cancelled where it has not ended yet.
    #[must_use]
    pub fn finish(self) -> Outcome {
        let motion = &self.system.motion;
        let velocities = self
            .system
            .nodal_velocities(&self.state.velocities, &self.state.held_velocities);
        let settled = motion.settled.as_ref();
        let spectra = self.series.as_ref().zip(motion.spectra.as_ref());
        Outcome {
            spectra: spectra.map_or(Vec::new(), |(series, given)| series.spectra(motion.step, given)),
            ending: self.ending.unwrap_or(Ending::Cancelled),
            time: self.time,
            steps: self.steps,
            smallest_step: self.smallest_step,
            iterations: self.stepper.iterations,
            factorisations: self.stepper.factorisations,
            positions: self.state.positions,
            velocities,
            factors: settled.map_or(DynamicFactors::default(), |settled| {
                self.recorder.peaks.against(settled, &motion.positions)
            }),
            peaks: self.recorder.peaks,
            events: self.recorder.events,
            ledger: self.ledger,
            largest_error: self.largest_error,
            largest_kinetic: self.largest_kinetic,
        }
    }

    /// The first moment after `time` (s) at which loads or shares jump or kink (s).
    fn moment_after(&self, time: f64) -> Option<f64> {
        let jump = self
            .jumps
            .get(self.jumps.partition_point(|jump| *jump <= time))
            .copied();
        let breaks = self
            .breaks
            .iter()
            .filter_map(|b| b.began.map(|began| [began, began + b.given.release]));
        let later = breaks.flatten().filter(|moment| *moment > time);
        later.chain(jump).reduce(f64::min)
    }

    /// The end of a whole step (s): the moment beside it where only rounding is between them, which is no step of its own.
    fn snapped(&self, target: f64) -> f64 {
        let rounding = 1e-9 * self.system.motion.step;
        let beside = self.moment_after(target - rounding);
        beside.filter(|moment| *moment <= target + rounding).unwrap_or(target)
    }

    /// The next moment after now, up to `target` (s).
    fn next_moment(&self, target: f64) -> f64 {
        self.moment_after(self.time).map_or(target, |moment| moment.min(target))
    }

    /// Goes on to `target` (s); how it ended where it did not get there.
    fn advance(&mut self, target: f64, observe: Observer<'_>) -> Option<Ending> {
        let step = self.system.motion.step;
        while self.time < target {
            let next = self.next_moment(target);
            let left = next - self.time;
            // A step that would leave next to nothing takes it along.
            let (h, end) = if self.limit >= left * (1.0 - 1e-9) {
                (left, next)
            } else {
                (self.limit, self.time + self.limit)
            };
            if !self.set_shares(end) && self.is_stale {
                self.refresh();
            }
            let loads = [
                self.system.loads_at(self.time, Side::After),
                self.system.loads_at(end, Side::Before),
            ];
            let from = From {
                time: self.time,
                state: &self.state,
                forces: &self.forces,
                taut: &self.taut,
                loads: [&loads[0], &loads[1]],
                movements: &self.movements,
            };
            let failure = match self.stepper.step(&mut self.system, from, h, observe) {
                Tried::Cancelled => return Some(Ending::Cancelled),
                Tried::Failed(failure) => {
                    self.limit = 0.5 * h;
                    failure
                }
                Tried::Done(done) => {
                    let (error, node) = done.error;
                    let allowed = self.system.motion.scheme.allowed_error();
                    let allowed = allowed.filter(|_| error > 0.0);
                    // The error grows with the third power of the step.
                    let growth = allowed.map_or(2.0, |allowed| 0.9 * (allowed / error).cbrt());
                    if growth >= 0.9 {
                        self.accept(*done, end, h, loads[1].movements.clone());
                        if self.system.motion.scheme != Scheme::CentralDifferences {
                            let grown = self.limit.max(h) * growth.clamp(1.0, 2.0);
                            self.limit = if growth < 1.0 { h * growth } else { grown }.min(step);
                        }
                        continue;
                    }
                    self.limit = h * growth.max(0.2);
                    Failure {
                        why: StuckBy::ErrorNotKept {
                            error,
                            allowed: allowed.unwrap_or_default(),
                        },
                        node,
                        segment: turned(&self.system, &from, &done.state.positions),
                    }
                }
            };
            if self.limit < SMALLEST_SHARE * step {
                return Some(Ending::StepTooSmall(Stuck {
                    why: failure.why,
                    time: self.time,
                    step: h,
                    node: failure.node,
                    segment: failure.segment,
                }));
            }
        }
        None
    }

    /// Sets the shares of what breaks over a step to `end`; true where that made the forces anew.
    fn set_shares(&mut self, end: f64) -> bool {
        let middle = self.time + 0.5 * (end - self.time);
        let mut has_changed = false;
        for breaking in &mut self.breaks {
            let share = breaking.share(middle);
            for segment in &breaking.given.segments {
                let e = segment.index();
                let before = self.system.shares[e];
                if share == before {
                    continue;
                }
                has_changed = true;
                let stored = self.system.bars()[e].energy(self.system.length(&self.state.positions, e));
                self.ledger.released += (before - share) * stored;
                self.system.shares[e] = share;
                if !breaking.is_told {
                    self.recorder.events.add(Event {
                        time: breaking.began.unwrap_or(self.time),
                        segment: *segment,
                        kind: EventKind::Break,
                    });
                }
            }
            breaking.is_told |= share < 1.0;
        }
        if has_changed {
            self.refresh();
        }
        has_changed
    }

    /// Forces from now on, with supports at the velocity that they go on with, and accelerations where they jump.
    fn refresh(&mut self) {
        let loads = self.system.loads_at(self.time, Side::After);
        if self.system.supports_move {
            self.state.held_velocities = self.system.support_velocities(self.time, Side::After);
        }
        self.taut = self.system.taut(&self.state.positions);
        self.system
            .forces_at(&loads, &self.state, &self.taut, &mut self.forces, None);
        if self.has_jumped || self.system.motion.scheme == Scheme::CentralDifferences {
            self.system
                .inertia
                .divide_into(&self.forces.residual, &mut self.state.accelerations);
        }
        self.is_stale = false;
        self.has_jumped = false;
    }

    fn accept(&mut self, done: Done, end: f64, h: f64, movements: Vec<Vector3<f64>>) {
        let taut = self.system.taut(&done.state.positions);
        let states = [&self.state, &done.state];
        self.recorder
            .events
            .compare(&self.system, [&self.taut, &taut], states, self.time, h);
        self.state = done.state;
        self.taut = taut;
        self.time = end;
        self.steps += 1;
        self.smallest_step = self.smallest_step.min(h);
        self.ledger.work += done.work;
        self.ledger.dissipated += done.dissipated;
        let energies = self.system.energies(&self.state, &movements);
        self.movements = movements;
        self.ledger.kinetic = energies.kinetic;
        self.ledger.elastic = energies.elastic;
        self.ledger.potential = energies.potential;
        let spent = self.ledger.dissipated + self.ledger.released;
        self.ledger.error = (self.ledger.total() - self.at_start) - self.ledger.work + spent;
        self.largest_error = self.largest_error.max(self.ledger.error.abs());
        self.largest_kinetic = self.largest_kinetic.max(energies.kinetic);
        let mut is_moment = self.jumps.binary_search_by(|jump| jump.total_cmp(&end)).is_ok();
        for breaking in &mut self.breaks {
            if let (None, BreakWhen::Tension(tension)) = (breaking.began, breaking.given.when) {
                let axial = |segment: &SegmentId| self.system.axial_force(&self.state.positions, segment.index());
                if breaking.given.segments.iter().any(|segment| axial(segment) >= tension) {
                    breaking.began = Some(end);
                }
            }
            let ends = breaking.began.map(|began| [began, began + breaking.given.release]);
            is_moment |= ends.is_some_and(|ends| ends.contains(&end));
        }
        self.forces = done.forces;
        self.system
            .inertia
            .divide_into(&self.forces.residual, &mut self.accelerations);
        let moment = Moment {
            time: end,
            state: &self.state,
            forces: &self.forces,
            accelerations: &self.accelerations,
        };
        self.recorder.add(&self.system, &moment);
        self.has_jumped = is_moment;
        self.is_stale = is_moment || !self.system.motion.damping.segments.is_empty();
    }
}
