//! Ropes that slide against friction: where they stick and where they slip.
//!
//! ```text
//! sticks   exp(−μ θ) ≤ T_after / T_before ≤ exp(μ θ),  and no rope has passed
//! slips    T_after = exp(±μ θ) T_before,               and rope has passed towards the larger tension
//! ```
//! `θ` is the angle by which the rope turns at the node (Euler–Eytelwein). Each load level is reached in one go from where
//! the rope lay in the reference state, which has no friction: friction remembers no path but this one.
//!
//! With the places of sticking and the ratios frozen the level is solved as any other; then both are looked at again.

use nalgebra::Vector3;

use super::run::Run;
use super::{SolveError, Termination, members};
use crate::assembly::{Grip, Gripping, Loading, Response, Structure};
use crate::load::Case;
use crate::model::Reach;

/// Rounds of looking again; four are usual.
const MOST_ROUNDS: usize = 60;
/// From this round on one node at a time changes its mind.
const ONE_AT_A_TIME: usize = 8;
/// Change of a ratio that no longer matters (–).
const SETTLED: f64 = 1e-13;
/// Excess of a ratio at which a rope that sticks begins to slip (–).
const BEGINS: f64 = 1e-9;
/// Rope that has passed the wrong way, over the length of its piece, at which a slipping rope sticks again (–).
const PASSED: f64 = 1e-12;

/// Ropes that stick and slip in one load level.
pub(super) struct Friction {
    gripping: Gripping,
    rounds: usize,
}

impl Friction {
    /// All stick where they lay.
    ///
    /// `before`: unstressed length in every segment in the reference state (m).
    pub(super) fn new(
        structure: &Structure,
        case: &Case,
        before: &[f64],
        reference_lengths: &[f64],
        factor: f64,
    ) -> Self {
        let net = structure.net();
        let mut lying = before.to_vec();
        for (index, reach) in net.reaches().iter().enumerate() {
            for e in reach.segments.clone() {
                let full = match case.lying.get(e) {
                    Some(full) => *full,
                    None => before[e] * case.unstressed_lengths[index] / reference_lengths[index],
                };
                lying[e] = factor * full + (1.0 - factor) * before[e];
            }
        }
        let start = |reach: &Reach| {
            let grip = |mu: &f64| if *mu > 0.0 { Grip::Sticks } else { Grip::Slips(1.0) };
            reach.friction.iter().map(grip).collect()
        };
        Self {
            gripping: Gripping {
                grips: net.reaches().iter().map(start).collect(),
                lying,
            },
            rounds: 0,
        }
    }

    pub(super) fn gripping(&self) -> &Gripping {
        &self.gripping
    }

    /// Looks again at a balanced state; whether it stands as it is. `None` if no end is in sight.
    pub(super) fn settles(&mut self, structure: &Structure, loading: &Loading, response: &Response) -> Option<bool> {
        self.rounds += 1;
        let now = members::lying(loading, response);
        let mut changes: Vec<(f64, usize, usize, Grip)> = Vec::new();
        for (index, reach) in structure.net().reaches().iter().enumerate() {
            for (place, mu) in reach.friction.iter().enumerate().filter(|(_, mu)| **mu > 0.0) {
                let node = Node::new(reach, place, response, *mu);
                let first = reach.segments.start;
                let beyond = |lying: &[f64]| lying[first + place + 1..reach.segments.end].iter().sum::<f64>();
                let passed = beyond(&now) - beyond(&self.gripping.lying);
                let whole: f64 = now[reach.segments.clone()].iter().sum();
                if let Some((weight, grip)) = node.change(self.gripping.grips[index][place], passed / whole) {
                    changes.push((weight, index, place, grip));
                }
            }
        }
        if changes.is_empty() {
            return Some(true);
        }
        if self.rounds >= MOST_ROUNDS {
            return None;
        }
        if self.rounds >= ONE_AT_A_TIME {
            let worst = (changes.iter().copied())
                .reduce(|a, b| if b.0 > a.0 { b } else { a })
                .expect("not empty");
            changes = vec![worst];
        }
        for (_, reach, place, grip) in changes {
            self.gripping.grips[reach][place] = grip;
        }
        Some(false)
    }
}

/// A node through which a rope slides.
struct Node {
    before: f64,
    after: f64,
    limit: f64,
}

impl Node {
    fn new(reach: &Reach, place: usize, response: &Response, mu: f64) -> Self {
        let e = reach.segments.start + place;
        Self {
            before: response.axial_forces[e],
            after: response.axial_forces[e + 1],
            limit: (mu * turn(&response.chords[e], &response.chords[e + 1])).exp(),
        }
    }

    /// Another grip, if this one does not stand, and how badly it is wanted. `passed`: share of the rope that has gone on.
    fn change(&self, grip: Grip, passed: f64) -> Option<(f64, Grip)> {
        let (on, back) = (Grip::Slips(self.limit), Grip::Slips(1.0 / self.limit));
        match grip {
            Grip::Sticks if self.after > self.limit * self.before * (1.0 + BEGINS) => {
                Some((self.after / (self.limit * self.before) - 1.0, on))
            }
            Grip::Sticks if self.before > self.limit * self.after * (1.0 + BEGINS) => {
                Some((self.before / (self.limit * self.after) - 1.0, back))
            }
            Grip::Sticks => None,
            Grip::Slips(ratio) => {
                let goes_on = ratio >= 1.0;
                if (goes_on && passed < -PASSED) || (!goes_on && passed > PASSED) {
                    return Some((passed.abs(), Grip::Sticks));
                }
                let now = if goes_on { self.limit } else { 1.0 / self.limit };
                let change = (now / ratio - 1.0).abs();
                (change > SETTLED).then_some((change, Grip::Slips(now)))
            }
        }
    }
}

/// Angle between two directions (rad).
fn turn(a: &Vector3<f64>, b: &Vector3<f64>) -> f64 {
    a.cross(b).norm().atan2(a.dot(b))
}

/// Solves a level by `solve`, with friction looked at again until it stands.
pub(super) fn settle(
    run: &mut Run<'_>,
    mut friction: Friction,
    loading: impl Fn(&Gripping) -> Result<Loading, SolveError>,
    mut solve: impl FnMut(&mut Run<'_>, &Loading) -> Termination,
) -> Result<(Termination, Loading), SolveError> {
    loop {
        let at = loading(friction.gripping())?;
        let outcome = solve(run, &at);
        if outcome != Termination::Converged {
            return Ok((outcome, at));
        }
        match friction.settles(run.structure, &at, &run.response) {
            Some(true) => return Ok((outcome, at)),
            Some(false) => {}
            None => return Ok((Termination::StepTooSmall, at)),
        }
    }
}
