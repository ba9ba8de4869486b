//! A case with the water that gathers on its skins: filled, solved, filled again, until it settles or is shown to grow.

use std::ops::ControlFlow;

use nalgebra::Vector3;

use crate::equilibrium::{self, Analysis, IterationReport, Settings, Solution, SolveError, Termination};
use crate::load::{Case, Pond, Ponds};
use crate::model::ReferenceState;

/// Rounds of filling and solving.
const MAX_ROUNDS: usize = 200;
/// Change of the water on the nodes, over all of it, at which it has settled.
const SETTLED: f64 = 1e-6;
/// Movement over the extent of the net at which no further round is worth it.
const OUT_OF_PLACE: f64 = 100.0;
/// A round that adds at least this share of what the round before added does not lead to an end.
const GROWING: f64 = 0.999;

/// The water that a case is asked to gather.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PondingGiven {
    /// Density of the water (kg/m³).
    pub density: f64,
    /// Acceleration of gravity (m/s²).
    pub gravity: f64,
}

/// How the filling ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum PondingEnd {
    /// The water on the net is what its shape holds.
    Settled,
    /// Each round took at least as much as the one before: more water makes more room than it fills.
    Growing,
    /// It was still changing when the rounds ran out, or the solve stopped.
    NotSettled,
}

/// Water on the skins of a case.
#[derive(Clone, Debug, PartialEq)]
pub struct Ponding {
    /// How it ended.
    pub end: PondingEnd,
    /// Ponds in the last state, largest first.
    pub ponds: Vec<Pond>,
    /// Density of the water (kg/m³).
    pub density: f64,
    /// Volume that the shape held after each round (m³): first that of the case without water.
    pub volumes: Vec<f64>,
}

impl Ponding {
    /// Volume in the last state (m³).
    #[must_use]
    pub fn volume(&self) -> f64 {
        self.volumes.last().copied().unwrap_or(0.0)
    }

    /// What the last round added, and the one before (m³).
    #[must_use]
    pub fn last_growth(&self) -> Option<(f64, f64)> {
        match self.volumes[..] {
            [.., a, b, c] => Some((c - b, b - a)),
            _ => None,
        }
    }
}

/// A case with its water, and what came of it.
pub(super) struct Ponded {
    pub(super) solution: Solution,
    /// The case with the weight of the water on its nodes.
    pub(super) case: Case,
    pub(super) ponding: Ponding,
}

/// Solves the case, fills the depressions of its shape, puts the water's weight on the nodes, and solves again.
///
/// The water starts from none and only the shape decides how much there is, so that it is the least that can stand. A
/// round that does not converge ends the rounds; its state is handed on.
pub(super) fn solve(
    analysis: &Analysis,
    dry: &Case,
    given: PondingGiven,
    reference: &ReferenceState,
    settings: &Settings,
    observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
) -> Result<Ponded, SolveError> {
    let net = analysis.structure().net();
    let lengths = &reference.unstressed_lengths;
    let mut case = dry.clone();
    let mut water = vec![0.0; net.nodes().len()];
    let mut start = reference.positions.clone();
    let mut ponding = Ponding {
        end: PondingEnd::NotSettled,
        ponds: Vec::new(),
        density: given.density,
        volumes: Vec::new(),
    };
    let mut factorisations = 0;
    let first = reference.positions.first().copied().unwrap_or_else(Vector3::zeros);
    let extent = reference
        .positions
        .iter()
        .fold(0.0, |m: f64, x| m.max((x - first).amax()));
    loop {
        let mut solution = equilibrium::solve(analysis, &case, &start, lengths, settings, observe)?;
        factorisations += solution.factorisations;
        solution.factorisations = factorisations;
        if solution.termination != Termination::Converged {
            ponding.end = end_of(&ponding, PondingEnd::NotSettled);
            return Ok(Ponded {
                solution,
                case,
                ponding,
            });
        }
        let found = Ponds::fill(net, &solution.positions);
        let volume = found.volume();
        let changes = found.nodal_volumes.iter().zip(&water);
        let change: f64 = changes.map(|(now, before)| (now - before).abs()).sum();
        ponding.volumes.push(volume);
        ponding.ponds = found.ponds;
        let moves = solution.positions.iter().zip(&reference.positions);
        let moved = moves.map(|(now, before)| (now - before).amax()).fold(0.0, f64::max);
        if change <= SETTLED * volume {
            ponding.end = PondingEnd::Settled;
        } else if ponding.volumes.len() == MAX_ROUNDS || moved > OUT_OF_PLACE * extent {
            ponding.end = end_of(&ponding, PondingEnd::NotSettled);
        } else {
            start.clone_from(&solution.positions);
            water = found.nodal_volumes;
            let weight = given.density * given.gravity;
            for ((force, dry), volume) in case.nodal_forces.iter_mut().zip(&dry.nodal_forces).zip(&water) {
                *force = dry - Vector3::z() * (weight * volume);
            }
            continue;
        }
        return Ok(Ponded {
            solution,
            case,
            ponding,
        });
    }
}

/// Whether the last rounds grew.
fn end_of(ponding: &Ponding, otherwise: PondingEnd) -> PondingEnd {
    match ponding.last_growth() {
        Some((last, before)) if last > 0.0 && last >= GROWING * before => PondingEnd::Growing,
        _ => otherwise,
    }
}
