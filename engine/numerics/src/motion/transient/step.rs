//! One step of time.

use std::ops::ControlFlow;

use nalgebra::{Matrix3, Vector3};

use super::system::{Forces, Loads, State, System};
use super::{Observer, Progress, Scheme};
use crate::equilibrium::Analysis;
use crate::equilibrium::linear::Factor;

/// Largest residual over the largest of inertia, load and tension.
const TOLERANCE: f64 = 1e-12;

/// Newton iterations of one step; where they do not suffice, the step is halved.
const MOST_ITERATIONS: u32 = 15;

/// What came of a step that was tried.
#[derive(Debug)]
pub(super) enum Tried {
    /// It is done.
    Done(Box<Done>),
    /// Newton did not converge.
    NotConverged,
    /// The observer stopped it.
    Cancelled,
}

/// A step that is done.
#[derive(Debug)]
pub(super) struct Done {
    pub(super) state: State,
    /// Forces at its end; those in its middle where the scheme knows only these.
    pub(super) forces: Forces,
    /// Whether the forces are those at the end.
    pub(super) forces_at_end: bool,
    /// Work of driven loads, pressure and supports (J).
    pub(super) work: f64,
    /// Energy that damping took (J).
    pub(super) dissipated: f64,
    /// Estimated error of the step in any position (m); zero where there is no estimate.
    pub(super) error: f64,
}

/// Where a step begins.
#[derive(Clone, Copy, Debug)]
pub(super) struct From<'a> {
    pub(super) time: f64,
    pub(super) state: &'a State,
    /// Forces at the start; not used by the conserving scheme.
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
    values: Vec<f64>,
    blocks: Vec<Matrix3<f64>>,
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

/// How far an iterate is from balance.
#[derive(Clone, Copy, Debug)]
struct Distance {
    residual: f64,
    allowed: f64,
}

impl Stepper {
    pub(super) fn new(analysis: &Analysis) -> Self {
        let structure = analysis.structure();
        Self {
            factor: analysis.new_factor(),
            values: vec![0.0; structure.pattern().n_entries()],
            blocks: vec![Matrix3::zeros(); structure.net().segments().len()],
            iterations: 0,
            factorisations: 0,
        }
    }

    /// Tries a step of length `h` (s).
    pub(super) fn step(&mut self, system: &mut System, from: From<'_>, h: f64, observe: Observer<'_>) -> Tried {
        match system.motion.scheme {
            Scheme::GeneralisedAlpha { spectral_radius, .. } => {
                self.averaged(system, from, h, Alpha::new(spectral_radius), observe)
            }
            Scheme::Conserving => self.conserving(system, from, h, observe),
            Scheme::CentralDifferences => explicit(system, from, h, observe),
        }
    }

    /// ```text
    /// (1 − α_m) M a1 + α_m M a0 = (1 − α_f) r1 + α_f r0
    /// x1 = x0 + h v0 + h² [(½ − β) a0 + β a1],   v1 = v0 + h [(1 − γ) a0 + γ a1]
    /// ```
    fn averaged(&mut self, system: &mut System, from: From<'_>, h: f64, alpha: Alpha, observe: Observer<'_>) -> Tried {
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
        for iteration in 0..=MOST_ITERATIONS {
            for (dof, u) in movement.iter().enumerate() {
                let (v0, a0) = (start.velocities[dof], start.accelerations[dof]);
                let a1 = (u - h * v0) / (beta * h * h) - (0.5 / beta - 1.0) * a0;
                state.accelerations[dof] = a1;
                state.velocities[dof] = v0 + h * ((1.0 - gamma) * a0 + gamma * a1);
            }
            let rate = gamma / (beta * h);
            let blocks = Some((self.blocks.as_mut_slice(), rate));
            system.forces_at(from.loads[1], &state, from.taut, &mut forces, blocks);
            let mut residual: Vec<f64> = (0..n)
                .map(|dof| {
                    (1.0 - force) * forces.residual[dof] + force * from.forces.residual[dof]
                        - system.mass_of(dof)
                            * ((1.0 - inertia) * state.accelerations[dof] + inertia * start.accelerations[dof])
                })
                .collect();
            let distance = distance(system, &residual, &state.accelerations, 1.0, &forces);
            if let ControlFlow::Break(tried) = self.watch(&from, iteration, distance, observe) {
                return tried;
            }
            let mut is_done = distance.residual <= distance.allowed;
            if !is_done {
                let weight = 1.0 - force;
                self.blocks.iter_mut().for_each(|block| *block *= weight);
                let mass_weight = (1.0 - inertia) / (beta * h * h);
                system.matrix_into(&self.blocks, mass_weight, weight * rate, weight, &mut self.values);
                if !self.solve(&mut residual) {
                    return Tried::NotConverged;
                }
                system.structure.dofs().move_nodes(&residual, 1.0, &mut state.positions);
                movement.iter_mut().zip(&residual).for_each(|(u, dx)| *u += dx);
                is_done = is_lost_in_rounding(&residual, &state.positions);
            }
            if is_done {
                let error = (state.accelerations.iter().zip(&start.accelerations))
                    .map(|(a1, a0)| (beta - 1.0 / 6.0) * h * h * (a1 - a0).abs())
                    .fold(0.0, f64::max);
                let dissipated = 0.5 * h * (from.forces.damping_power + forces.damping_power);
                let movements = [from.movements, &from.loads[1].movements];
                let work = system.work([from.forces, &forces], [start, &state], movements);
                return Tried::Done(Box::new(Done {
                    state,
                    forces,
                    forces_at_end: true,
                    work,
                    dissipated,
                    error,
                }));
            }
        }
        Tried::NotConverged
    }

    /// ```text
    /// M (v1 − v0) / h = p − Cᵀ (q d_m),   (x1 − x0) / h = (v0 + v1) / 2
    /// ```
    fn conserving(&mut self, system: &mut System, from: From<'_>, h: f64, observe: Observer<'_>) -> Tried {
        let start = from.state;
        let loads = from.loads[0].mean(from.loads[1]);
        let mut state = start.clone();
        let mut forces = from.forces.clone();
        let n = start.velocities.len();
        let mut movement: Vec<f64> = start.velocities.iter().map(|v| h * v).collect();
        place(system, &from, h, &movement, &mut state);
        for iteration in 0..=MOST_ITERATIONS {
            let ends = [start.positions.as_slice(), state.positions.as_slice()];
            let blocks = Some(self.blocks.as_mut_slice());
            system.forces_between(&loads, ends, h, from.taut, &mut forces, blocks);
            let mut residual: Vec<f64> = (0..n)
                .map(|dof| {
                    let change = 2.0 * (movement[dof] / h - start.velocities[dof]) / h;
                    forces.residual[dof] - system.mass_of(dof) * change
                })
                .collect();
            let distance = distance(system, &residual, &start.velocities, 2.0 / h, &forces);
            if let ControlFlow::Break(tried) = self.watch(&from, iteration, distance, observe) {
                return tried;
            }
            let mut is_done = distance.residual <= distance.allowed;
            if !is_done {
                system.matrix_into(&self.blocks, 2.0 / (h * h), 1.0 / h, 0.5, &mut self.values);
                if !self.solve(&mut residual) {
                    return Tried::NotConverged;
                }
                system.structure.dofs().move_nodes(&residual, 1.0, &mut state.positions);
                movement.iter_mut().zip(&residual).for_each(|(u, dx)| *u += dx);
                is_done = is_lost_in_rounding(&residual, &state.positions);
            }
            if is_done {
                for (dof, u) in movement.iter().enumerate() {
                    state.velocities[dof] = 2.0 * u / h - start.velocities[dof];
                    state.accelerations[dof] = (state.velocities[dof] - start.velocities[dof]) / h;
                }
                let dissipated = h * forces.damping_power;
                let movements = [from.movements, &from.loads[1].movements];
                let work = system.work([&forces, &forces], [start, &state], movements);
                return Tried::Done(Box::new(Done {
                    state,
                    forces,
                    forces_at_end: false,
                    work,
                    dissipated,
                    error: 0.0,
                }));
            }
        }
        Tried::NotConverged
    }

    fn watch(
        &mut self,
        from: &From<'_>,
        iteration: u32,
        distance: Distance,
        observe: Observer<'_>,
    ) -> ControlFlow<Tried> {
        self.iterations += 1;
        let progress = Progress::Iteration {
            time: from.time,
            iteration,
            residual: distance.residual,
        };
        if observe(progress).is_break() {
            return ControlFlow::Break(Tried::Cancelled);
        }
        if distance.residual.is_finite() {
            ControlFlow::Continue(())
        } else {
            ControlFlow::Break(Tried::NotConverged)
        }
    }

    /// Factorises the matrix and solves in place; false where it is singular.
    fn solve(&mut self, right_hand_side: &mut [f64]) -> bool {
        self.factorisations += 1;
        // Compressed struts and pressure may make it indefinite at long steps.
        if self.factor.cholesky(&self.values).is_err() && self.factor.ldlt(&self.values).is_err() {
            return false;
        }
        self.factor.solve_in_place(right_hand_side);
        right_hand_side.iter().all(|dx| dx.is_finite())
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
    for (dof, v) in half.iter().enumerate() {
        state.accelerations[dof] = forces.residual[dof] / system.mass_of(dof);
        state.velocities[dof] = v + 0.5 * h * state.accelerations[dof];
        if !state.velocities[dof].is_finite() {
            return Tried::NotConverged;
        }
    }
    let dissipated = 0.5 * h * (from.forces.damping_power + forces.damping_power);
    let movements = [from.movements, &from.loads[1].movements];
    let work = system.work([from.forces, &forces], [start, &state], movements);
    Tried::Done(Box::new(Done {
        state,
        forces,
        forces_at_end: true,
        work,
        dissipated,
        error: 0.0,
    }))
}

/// Moves free directions by `movement` (m) and held nodes with their supports.
fn place(system: &mut System, from: &From<'_>, h: f64, movement: &[f64], state: &mut State) {
    if system.supports_move {
        system.place_supports(from.loads[1], &mut state.positions);
        let steps: Vec<_> = (state.positions.iter().zip(&from.state.positions))
            .map(|(to, from)| (to - from) / h)
            .collect();
        state.held_velocities = system.held_parts(&steps);
    }
    system.structure.dofs().move_nodes(movement, 1.0, &mut state.positions);
}

fn distance(system: &System, residual: &[f64], rates: &[f64], weight: f64, forces: &Forces) -> Distance {
    let mut largest: f64 = 0.0;
    for r in residual {
        if !r.is_finite() {
            return Distance {
                residual: f64::INFINITY,
                allowed: 0.0,
            };
        }
        largest = largest.max(r.abs());
    }
    let inertia = rates.iter().enumerate();
    let inertia = inertia.map(|(dof, v)| weight * (system.mass_of(dof) * v).abs());
    let load = forces
        .applied
        .iter()
        .map(Vector3::amax)
        .fold(system.largest_force(), f64::max);
    let yardstick = inertia.fold(load.max(forces.largest_axial), f64::max);
    Distance {
        residual: largest,
        allowed: TOLERANCE * yardstick,
    }
}

/// Whether a correction is below what positions can tell apart.
fn is_lost_in_rounding(correction: &[f64], positions: &[Vector3<f64>]) -> bool {
    let largest = positions.iter().map(Vector3::amax).fold(0.0, f64::max);
    correction.iter().all(|dx| dx.abs() <= 2.0 * f64::EPSILON * largest)
}
