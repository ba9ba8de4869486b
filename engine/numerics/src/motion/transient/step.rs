//! One step of time.
//!
//! Newton keeps a factor over iterations and over steps of the same length, as long as it serves (modified Newton): while
//! the residual falls so fast that going on costs less than factorising anew. A step begins with the factor of the one
//! before where the first correction there did; else, and where the residual falls too slowly (a rope came taut, a segment
//! broke), the matrix of the present iterate is factorised. That touches the way, not the end: every iterate is judged by
//! the residual of the exact forces against the same tolerance, whatever matrix the correction came from. A step that
//! fails with a kept factor is tried again with one for every iterate, before it is halved. The factor belongs to the
//! motion and waits with it between frames: whoever pauses comes to the same bits.

use nalgebra::{Matrix3, Vector3};

use super::history::Side;
use super::system::{Forces, Loads, State, System};
use super::{Observer, Progress, Scheme, StuckBy};
use crate::equilibrium::Analysis;
use crate::equilibrium::linear::Factor;
use crate::model::{NodeId, SegmentId};

/// Largest residual over the largest of inertia, load and tension.
const TOLERANCE: f64 = 1e-12;

/// Newton iterations of one step with a factor of their own; where they do not suffice, the step is halved.
const MOST_ITERATIONS: u32 = 15;

/// A factor is kept while no more iterations with it are to be expected than this: about as many as a factorisation costs.
const MOST_TO_GO: f64 = 5.0;

/// Share of the residual that an iteration with a kept factor may leave.
const SLOWEST: f64 = 0.5;

/// What came of a step that was tried.
#[derive(Debug)]
pub(super) enum Tried {
    /// It is done.
    Done(Box<Done>),
    /// It could not be done.
    Failed(Failure),
    /// The observer stopped it.
    Cancelled,
}

/// A step that could not be done.
#[derive(Clone, Copy, Debug)]
pub(super) struct Failure {
    pub(super) why: StuckBy,
    pub(super) node: NodeId,
    pub(super) segment: Option<SegmentId>,
}

/// A step that is done.
#[derive(Debug)]
pub(super) struct Done {
    pub(super) state: State,
    /// Forces at its end.
    pub(super) forces: Forces,
    /// Work of driven loads, pressure and supports (J).
    pub(super) work: f64,
    /// Energy that damping took (J).
    pub(super) dissipated: f64,
    /// Largest estimated error of the step in any position (m), zero where there is no estimate; and where.
    pub(super) error: (f64, NodeId),
}

/// Where a step begins.
#[derive(Clone, Copy, Debug)]
pub(super) struct From<'a> {
    pub(super) time: f64,
    pub(super) state: &'a State,
    /// Forces at the start.
    pub(super) forces: &'a Forces,
    /// Which segments are taut there.
    pub(super) taut: &'a [bool],
    /// Loads from the start on, and just before the end.
    pub(super) loads: [&'a Loads; 2],
    /// Movements of the supports at the start (m).
    pub(super) movements: &'a [Vector3<f64>],
}

/// Room for the numbers of a step.
#[derive(Debug)]
pub(super) struct Stepper {
    factor: Factor,
    /// Weights of the matrix that the factor is of; `None` where there is none to keep.
    kept: Option<Weights>,
    /// Whether the first correction of the step before took so much of the residual that its factor was kept.
    is_calm: bool,
    values: Vec<f64>,
    blocks: Vec<Matrix3<f64>>,
    /// What is out of balance along the free directions (N), then the correction that follows from it (m).
    residual: Vec<f64>,
    /// Room for the residual while the kept factor is tried.
    tried: Vec<f64>,
    /// Change of velocity over time that the scheme sets against the forces (m/s²).
    change: Vec<f64>,
    /// Room for products with the mass.
    product: Vec<f64>,
    /// Newton iterations so far.
    pub(super) iterations: u64,
    /// Factorisations so far.
    pub(super) factorisations: u64,
}

/// Weights of the generalised-α method.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Alpha {
    inertia: f64,
    force: f64,
    gamma: f64,
    beta: f64,
}

impl Alpha {
    /// Those of least damping at low frequency for a spectral radius at high frequency (Chung & Hulbert 1993).
    pub(super) fn new(spectral_radius: f64) -> Self {
        let inertia = (2.0 * spectral_radius - 1.0) / (spectral_radius + 1.0);
        let force = spectral_radius / (spectral_radius + 1.0);
        let sum = 1.0 - inertia + force;
        Self {
            inertia,
            force,
            gamma: 0.5 - inertia + force,
            beta: 0.25 * sum * sum,
        }
    }
}

/// Weights of mass, damping and elastic supports in the matrix of a step beside the blocks of segments.
#[derive(Clone, Copy, Debug)]
struct Weights {
    mass: f64,
    damping: f64,
    elastic: f64,
}

impl Weights {
    /// Whether they are alike but for the rounding of the length of a step.
    fn are_like(&self, other: &Self) -> bool {
        let pairs = [
            (self.mass, other.mass),
            (self.damping, other.damping),
            (self.elastic, other.elastic),
        ];
        pairs.iter().all(|(a, b)| (a - b).abs() <= 1e-6 * a)
    }
}

/// How the iterations of one step go.
#[derive(Clone, Copy, Debug)]
struct Pace {
    /// Whether a factor may serve more than one iterate.
    keeps: bool,
    /// Residual of the iterate before (N); infinite at the first.
    before: f64,
    /// Corrections so far.
    corrections: u32,
    /// Factorisations among them.
    factorisations: u32,
    /// Whether the present factor has brought an iterate of this step nearer.
    has_served: bool,
}

impl Pace {
    fn new(keeps: bool) -> Self {
        Self {
            keeps,
            before: f64::INFINITY,
            corrections: 0,
            factorisations: 0,
            has_served: false,
        }
    }

    /// Whether the residual falls so fast that going on with the same factor is worth it.
    fn is_fast(&self, distance: Distance) -> bool {
        let rate = distance.residual / self.before;
        rate <= SLOWEST && (distance.residual / distance.allowed).ln() <= -MOST_TO_GO * rate.ln()
    }

    /// Whether a factor of another iterate was used.
    fn has_kept(&self) -> bool {
        self.corrections > self.factorisations
    }
}

/// How far an iterate is from balance.
#[derive(Clone, Copy, Debug)]
struct Distance {
    residual: f64,
    allowed: f64,
    /// Where the residual is largest.
    node: NodeId,
}

impl Stepper {
    pub(super) fn new(analysis: &Analysis) -> Self {
        let structure = analysis.structure();
        Self {
            factor: analysis.new_factor(),
            values: vec![0.0; structure.pattern().n_entries()],
            blocks: vec![Matrix3::zeros(); structure.net().segments().len()],
            kept: None,
            is_calm: false,
            residual: vec![0.0; structure.n_dofs()],
            tried: vec![0.0; structure.n_dofs()],
            change: vec![0.0; structure.n_dofs()],
            product: vec![0.0; structure.n_dofs()],
            iterations: 0,
            factorisations: 0,
        }
    }

    /// Tries a step of length `h` (s).
    pub(super) fn step(&mut self, system: &mut System, from: From<'_>, h: f64, observe: Observer<'_>) -> Tried {
        let mut pace = Pace::new(true);
        loop {
            let tried = match system.motion.scheme {
                Scheme::GeneralisedAlpha { spectral_radius, .. } => {
                    self.averaged(system, from, h, Alpha::new(spectral_radius), &mut pace, observe)
                }
                Scheme::Conserving { .. } => self.conserving(system, from, h, &mut pace, observe),
                Scheme::CentralDifferences => explicit(system, from, h, observe),
            };
            match tried {
                // Full Newton may come further.
                Tried::Failed(_) if pace.has_kept() => pace = Pace::new(false),
                _ => return tried,
            }
        }
    }

    /// ```text
    /// (1 − α_m) M a1 + α_m M a0 = (1 − α_f) r1 + α_f r0
    /// x1 = x0 + h v0 + h² [(½ − β) a0 + β a1],   v1 = v0 + h [(1 − γ) a0 + γ a1]
    /// ```
    fn averaged(
        &mut self,
        system: &mut System,
        from: From<'_>,
        h: f64,
        alpha: Alpha,
        pace: &mut Pace,
        observe: Observer<'_>,
    ) -> Tried {
        let Alpha {
            inertia,
            force,
            gamma,
            beta,
        } = alpha;
        let start = from.state;
        let mut state = start.clone();
        let mut forces = from.forces.clone();
        let n = start.velocities.len();
        let mut movement: Vec<f64> = (0..n)
            .map(|dof| h * (start.velocities[dof] + 0.5 * h * start.accelerations[dof]))
            .collect();
        place(system, &from, h, &movement, &mut state);
        let mut last = Distance::unknown();
        for iteration in 0.. {
            for (dof, u) in movement.iter().enumerate() {
                let (v0, a0) = (start.velocities[dof], start.accelerations[dof]);
                let a1 = (u - h * v0) / (beta * h * h) - (0.5 / beta - 1.0) * a0;
                state.accelerations[dof] = a1;
                state.velocities[dof] = v0 + h * ((1.0 - gamma) * a0 + gamma * a1);
            }
            let rate = gamma / (beta * h);
            let blocks = Some((self.blocks.as_mut_slice(), rate));
            system.forces_at(from.loads[1], &state, from.taut, &mut forces, blocks);
            for (dof, residual) in self.residual.iter_mut().enumerate() {
                *residual = (1.0 - force) * forces.residual[dof] + force * from.forces.residual[dof];
                self.change[dof] = (1.0 - inertia) * state.accelerations[dof] + inertia * start.accelerations[dof];
            }
            let distance = self.less_inertia(system, &state.accelerations, 1.0, &forces);
            if self.is_stopped(&from, iteration, distance, observe) {
                return Tried::Cancelled;
            }
            last = distance;
            if !distance.residual.is_finite() {
                break;
            }
            let mut is_done = distance.residual <= distance.allowed;
            if !is_done {
                let weight = 1.0 - force;
                self.blocks.iter_mut().for_each(|block| *block *= weight);
                let weights = Weights {
                    mass: (1.0 - inertia) / (beta * h * h),
                    damping: weight * rate,
                    elastic: weight,
                };
                let Some(is_lost) = self.correct(system, weights, distance, pace, &state.positions) else {
                    break;
                };
                self.apply(system, &mut movement, &mut state.positions);
                is_done = is_lost;
            }
            if is_done {
                let error = error_of(system, [start, &state], (beta - 1.0 / 6.0) * h * h);
                let dissipated = 0.5 * h * (from.forces.damping_power + forces.damping_power);
                let movements = [from.movements, &from.loads[1].movements];
                let work = system.work([from.forces, &forces], [start, &state], movements);
                return Tried::Done(Box::new(Done {
                    state,
                    forces,
                    work,
                    dissipated,
                    error,
                }));
            }
        }
        Tried::Failed(failure(system, &from, last, &state.positions))
    }

    /// ```text
    /// M (v1 − v0) / h = p − Cᵀ (q d_m),   (x1 − x0) / h = (v0 + v1) / 2
    /// ```
    fn conserving(
        &mut self,
        system: &mut System,
        from: From<'_>,
        h: f64,
        pace: &mut Pace,
        observe: Observer<'_>,
    ) -> Tried {
        let start = from.state;
        let loads = from.loads[0].mean(from.loads[1]);
        let mut state = start.clone();
        let mut forces = from.forces.clone();
        let mut movement: Vec<f64> = start.velocities.iter().map(|v| h * v).collect();
        place(system, &from, h, &movement, &mut state);
        let mut last = Distance::unknown();
        for iteration in 0.. {
            let ends = [start.positions.as_slice(), state.positions.as_slice()];
            let blocks = Some(self.blocks.as_mut_slice());
            system.forces_between(&loads, ends, h, from.taut, &mut forces, blocks);
            self.residual.copy_from_slice(&forces.residual);
            for (dof, change) in self.change.iter_mut().enumerate() {
                *change = 2.0 * (movement[dof] / h - start.velocities[dof]) / h;
            }
            let distance = self.less_inertia(system, &start.velocities, 2.0 / h, &forces);
            if self.is_stopped(&from, iteration, distance, observe) {
                return Tried::Cancelled;
            }
            last = distance;
            if !distance.residual.is_finite() {
                break;
            }
            let mut is_done = distance.residual <= distance.allowed;
            if !is_done {
                let weights = Weights {
                    mass: 2.0 / (h * h),
                    damping: 1.0 / h,
                    elastic: 0.5,
                };
                let Some(is_lost) = self.correct(system, weights, distance, pace, &state.positions) else {
                    break;
                };
                self.apply(system, &mut movement, &mut state.positions);
                is_done = is_lost;
            }
            if is_done {
                for (dof, u) in movement.iter().enumerate() {
                    state.velocities[dof] = 2.0 * u / h - start.velocities[dof];
                }
                let dissipated = h * forces.damping_power;
                let movements = [from.movements, &from.loads[1].movements];
                let work = system.work([&forces, &forces], [start, &state], movements);
                // So far those in the middle of the step.
                system.forces_at(from.loads[1], &state, from.taut, &mut forces, None);
                system.inertia.divide_into(&forces.residual, &mut state.accelerations);
                let error = error_of(system, [start, &state], h * h / 12.0);
                return Tried::Done(Box::new(Done {
                    state,
                    forces,
                    work,
                    dissipated,
                    error,
                }));
            }
        }
        Tried::Failed(failure(system, &from, last, &state.positions))
    }

    /// Tells the observer of an iteration; whether it stops there.
    fn is_stopped(&mut self, from: &From<'_>, iteration: u32, distance: Distance, observe: Observer<'_>) -> bool {
        self.iterations += 1;
        let progress = Progress::Iteration {
            time: from.time,
            iteration,
            residual: distance.residual,
        };
        observe(progress).is_break()
    }

    /// Takes the inertia of the change of velocity out of the residual; `rates` times `weight`: accelerations to measure it
    /// by (m/s²).
    fn less_inertia(&mut self, system: &System, rates: &[f64], weight: f64, forces: &Forces) -> Distance {
        system.inertia.add_product(-1.0, &self.change, &mut self.residual);
        self.product.fill(0.0);
        system.inertia.add_product(weight, rates, &mut self.product);
        distance(system, &self.residual, &self.product, forces)
    }

    /// Turns the residual into the correction, with the kept factor where that serves, else with one of the matrix at this
    /// iterate; whether the correction is lost in rounding. `None` where that matrix is singular or it is one too many.
    fn correct(
        &mut self,
        system: &System,
        weights: Weights,
        distance: Distance,
        pace: &mut Pace,
        positions: &[Vector3<f64>],
    ) -> Option<bool> {
        let is_first = pace.corrections == 0;
        let is_fast = if is_first { self.is_calm } else { pace.is_fast(distance) };
        // Where there is no second correction, the first one did.
        self.is_calm = if pace.corrections < 2 {
            is_first || is_fast
        } else {
            self.is_calm
        };
        pace.has_served |= is_fast && !is_first;
        pace.before = distance.residual;
        let has_kept = self.kept.is_some_and(|kept| kept.are_like(&weights));
        if pace.keeps && has_kept && (is_fast || pace.has_served) {
            self.tried.copy_from_slice(&self.residual);
            self.factor.solve_in_place(&mut self.tried);
            let is_lost = is_lost_in_rounding(&self.tried, positions);
            // What rounding leaves does not fall any more, with no factor. But that next to nothing is left to correct is
            // taken only from one that has served in this step.
            let serves = if is_lost { pace.has_served } else { is_fast };
            if serves && self.tried.iter().all(|dx| dx.is_finite()) {
                std::mem::swap(&mut self.residual, &mut self.tried);
                pace.corrections += 1;
                return Some(is_lost);
            }
        }
        if pace.factorisations > MOST_ITERATIONS {
            return None;
        }
        pace.corrections += 1;
        pace.factorisations += 1;
        pace.has_served = false;
        self.kept = None;
        let Weights { mass, damping, elastic } = weights;
        system.matrix_into(&self.blocks, mass, damping, elastic, &mut self.values);
        if !self.solve() {
            return None;
        }
        self.kept = Some(weights);
        Some(is_lost_in_rounding(&self.residual, positions))
    }

    /// Adds the correction to the movement over the step (m) and to the positions.
    fn apply(&self, system: &System, movement: &mut [f64], positions: &mut [Vector3<f64>]) {
        let steps = &self.residual;
        system.structure.dofs().move_nodes(steps, 1.0, positions);
        movement.iter_mut().zip(steps).for_each(|(u, dx)| *u += dx);
    }

    /// Factorises the matrix and turns the residual into the correction; false where it is singular.
    fn solve(&mut self) -> bool {
        self.factorisations += 1;
        // Compressed struts and pressure may make it indefinite at long steps.
        if self.factor.cholesky(&self.values).is_err() && self.factor.ldlt(&self.values).is_err() {
            return false;
        }
        self.factor.solve_in_place(&mut self.residual);
        self.residual.iter().all(|dx| dx.is_finite())
    }
}

/// Central differences, with the velocity at full steps:
///
/// ```text
/// v½ = v0 + h/2 a0,   x1 = x0 + h v½,   M a1 = r(x1, v0 + h a0),   v1 = v½ + h/2 a1
/// ```
fn explicit(system: &mut System, from: From<'_>, h: f64, observe: Observer<'_>) -> Tried {
    let progress = Progress::Iteration {
        time: from.time,
        iteration: 0,
        residual: 0.0,
    };
    if observe(progress).is_break() {
        return Tried::Cancelled;
    }
    let start = from.state;
    let mut state = start.clone();
    let mut forces = from.forces.clone();
    let n = start.velocities.len();
    let half: Vec<f64> = (0..n)
        .map(|dof| start.velocities[dof] + 0.5 * h * start.accelerations[dof])
        .collect();
    let movement: Vec<f64> = half.iter().map(|v| h * v).collect();
    place(system, &from, h, &movement, &mut state);
    for dof in 0..n {
        state.velocities[dof] = start.velocities[dof] + h * start.accelerations[dof];
    }
    system.forces_at(from.loads[1], &state, from.taut, &mut forces, None);
    system.inertia.divide_into(&forces.residual, &mut state.accelerations);
    for (dof, v) in half.iter().enumerate() {
        state.velocities[dof] = v + 0.5 * h * state.accelerations[dof];
        if !state.velocities[dof].is_finite() {
            let beyond = Distance {
                node: system.structure.dofs().node(dof),
                ..Distance::unknown()
            };
            return Tried::Failed(failure(system, &from, beyond, &state.positions));
        }
    }
    let dissipated = 0.5 * h * (from.forces.damping_power + forces.damping_power);
    let movements = [from.movements, &from.loads[1].movements];
    let work = system.work([from.forces, &forces], [start, &state], movements);
    Tried::Done(Box::new(Done {
        state,
        forces,
        work,
        dissipated,
        error: (0.0, NodeId::new(0)),
    }))
}

/// Moves free directions by `movement` (m) and held nodes with their supports.
fn place(system: &mut System, from: &From<'_>, h: f64, movement: &[f64], state: &mut State) {
    if system.supports_move {
        system.place_supports(from.loads[1], &mut state.positions);
        // The way over a step would be the velocity in its middle, and dashpots there would lag by half a step.
        state.held_velocities = system.support_velocities(from.time + h, Side::Before);
    }
    system.structure.dofs().move_nodes(movement, 1.0, &mut state.positions);
}

fn distance(system: &System, residual: &[f64], inertia: &[f64], forces: &Forces) -> Distance {
    let (mut largest, mut at) = (0.0, 0);
    for (dof, r) in residual.iter().enumerate() {
        if !r.is_finite() {
            return Distance {
                node: system.structure.dofs().node(dof),
                ..Distance::unknown()
            };
        }
        if r.abs() > largest {
            (largest, at) = (r.abs(), dof);
        }
    }
    // What acts on held nodes is not to be balanced.
    let dofs = system.structure.dofs();
    let load = (0..dofs.len())
        .map(|dof| dofs.direction(dof).dot(&forces.applied[dofs.node(dof).index()]).abs())
        .fold(system.largest_force(), f64::max);
    let yardstick = (inertia.iter()).fold(load.max(forces.largest_axial), |most, f| most.max(f.abs()));
    Distance {
        residual: largest,
        allowed: TOLERANCE * yardstick,
        node: system.node_of(at),
    }
}

impl Distance {
    /// That of numbers beyond use.
    fn unknown() -> Self {
        Self {
            residual: f64::INFINITY,
            allowed: 0.0,
            node: NodeId::new(0),
        }
    }
}

fn failure(system: &System, from: &From<'_>, last: Distance, reached: &[Vector3<f64>]) -> Failure {
    Failure {
        why: if last.residual.is_finite() {
            StuckBy::NotConverged {
                residual: last.residual,
                allowed: last.allowed,
            }
        } else {
            StuckBy::BeyondUse
        },
        node: last.node,
        segment: turned(system, from, reached),
    }
}

/// The segment that went slack or came taut from the start to the positions `reached`; of several the one whose force
/// changed most.
pub(super) fn turned(system: &System, from: &From<'_>, reached: &[Vector3<f64>]) -> Option<SegmentId> {
    let change = |e: usize| {
        let forces = [from.state.positions.as_slice(), reached].map(|positions| system.axial_force(positions, e));
        (forces[1] - forces[0]).abs()
    };
    let taut = system.taut(reached);
    let turned = (0..taut.len()).filter(|e| taut[*e] != from.taut[*e]);
    let most = turned.map(|e| (change(e), e)).max_by(|a, b| a.0.total_cmp(&b.0));
    most.map(|(_, e)| SegmentId::new(e))
}

/// Largest error of a step in a position by the change of the accelerations (m), and where.
fn error_of(system: &System, [from, to]: [&State; 2], weight: f64) -> (f64, NodeId) {
    let (mut largest, mut at) = (0.0, 0);
    for (dof, (a0, a1)) in from.accelerations.iter().zip(&to.accelerations).enumerate() {
        let error = weight * (a1 - a0).abs();
        if error > largest {
            (largest, at) = (error, dof);
        }
    }
    (largest, system.node_of(at))
}

/// Whether a correction is below what positions can tell apart.
fn is_lost_in_rounding(correction: &[f64], positions: &[Vector3<f64>]) -> bool {
    let largest = positions.iter().map(Vector3::amax).fold(0.0, f64::max);
    correction.iter().all(|dx| dx.abs() <= 2.0 * f64::EPSILON * largest)
}
