//! The recipe: which method when, and how the load is put on.

use nalgebra::Vector3;

use super::carried::Carried;
use super::friction::Friction;
use super::newton::Newton;
use super::run::{Observer, Run};
use super::solution::LoadStepState;
use super::{
    Analysis, IterationReport, LoadSteps, Settings, Solution, SolveError, Termination, Way, existence, friction,
    interior_point, members, relaxation, stability,
};
use crate::assembly::{Gripping, Loading, Response, Structure, check_vectors};
use crate::load::Case;

/// Share of slack segments at the start from which the interior point goes first.
const MUCH_SLACK: f64 = 0.2;
/// A segment counts as slack at the start below this share of its stress-free length.
const CLEARLY_SLACK: f64 = 0.999;
/// Forces below this share of the largest do not hold a node in place.
const HOLDS: f64 = 1e-9;
const ROUNDS_WITH_STRUTS: u32 = 3;
/// Substitutes tried where Newton does not get hold of a net that slides, hangs or is pressed.
const SUBSTITUTES: u32 = 12;
const FIRST_STEP: f64 = 0.25;
const SMALLEST_STEP: f64 = 1.0 / 256.0;

const QUICK: Carried = Carried {
    way: Way::Newton,
    limit: 12,
};
const POLISH: Carried = Carried {
    way: Way::Polish,
    limit: 12,
};
const TRY: Newton = Newton {
    floor_share: 1.0,
    limit: 15,
    patience: 15,
};
/// With struts a start that looks taut may be far off: then the interior point does better, and nothing should be lost on
/// the way to it.
const TRY_WITH_STRUTS: Newton = Newton { patience: 4, ..TRY };
const AFTER_INTERIOR_POINT: Newton = Newton {
    floor_share: 0.1,
    limit: 80,
    patience: 80,
};
const WITH_STRUTS: Newton = Newton {
    floor_share: 1.0,
    limit: 60,
    patience: 60,
};

/// A way to answer one load level.
type LevelWay = fn(&mut Run<'_>, u32, f64, &Loading, &mut Vec<Vector3<f64>>) -> Termination;
/// Answers a load level by a way, friction included.
type Answer<'a> =
    dyn Fn(&mut Run<'_>, u32, f64, &mut Vec<Vector3<f64>>, LevelWay) -> Result<(Termination, Loading), SolveError> + 'a;

/// The state in which a net balances a case.
///
/// `start`: position of every node to start from (m); held nodes go where the case puts their supports.
/// `reference_lengths`: unstressed lengths (m) from which those of the case are approached in load steps.
/// `observe`: called at every iteration; a break ends the solve before the next.
///
/// Equal input gives equal bits. Not converged is an answer, see [`Solution::termination`].
///
/// # Errors
/// [`SolveError`] if there can be no state, or none that stays: nothing holds a load, the numbers are beyond use, or the
/// balanced state can move freely.
pub fn solve(
    analysis: &Analysis,
    case: &Case,
    start: &[Vector3<f64>],
    reference_lengths: &[f64],
    settings: &Settings,
    observe: Observer<'_>,
) -> Result<Solution, SolveError> {
    let structure = analysis.structure();
    let level = |factor: f64, gripping: Option<&Gripping>| {
        Loading::gripping(structure, case, reference_lengths, factor, gripping)
    };
    let full = level(1.0, None)?;
    if start.len() != structure.net().nodes().len() {
        return Err(crate::assembly::LoadingError::WrongLength {
            what: "start positions",
            given: start.len(),
            needed: structure.net().nodes().len(),
        }
        .into());
    }
    check_vectors("start position", start)?;
    let anchors = existence::check_loads_are_held(structure, &bars_only(structure, &full, start))?;

    let before = match structure.net().has_friction() && !case.lying.is_empty() {
        true => Some(lying_at(structure, &level(0.0, None)?, start)),
        false => None,
    };
    // One load level, friction and all.
    let answer = |run: &mut Run<'_>, load_step: u32, factor: f64, positions: &mut Vec<Vector3<f64>>, way: LevelWay| {
        let Some(before) = &before else {
            let loading = level(factor, None)?;
            let outcome = way(run, load_step, factor, &loading, positions);
            return Ok((outcome, loading));
        };
        let friction = Friction::new(structure, case, before, reference_lengths, factor);
        friction::settle(
            run,
            friction,
            |gripping| Ok(level(factor, Some(gripping))?),
            |run, loading| way(run, load_step, factor, loading, positions),
        )
    };
    let gives_up_lightly = !structure.net().is_pure_tension() || !full.has_energy() || before.is_some();
    let mut run = Run::new(analysis, settings, start, &anchors, observe);
    let mut steps = Vec::new();
    let mut positions = start.to_vec();
    let mut at_end = None;
    let (termination, load_factor) = match settings.load_steps {
        LoadSteps::FullFirst => {
            let (outcome, loading) = answer(&mut run, 1, 1.0, &mut positions, state)?;
            at_end = Some(loading);
            let gave_up = !matches!(outcome, Termination::Converged | Termination::Cancelled);
            if gave_up && gives_up_lightly && !run.is_spent() {
                let (outcome, factor, loading) = in_smaller_steps(&mut run, &answer, start, &mut positions)?;
                at_end = loading;
                (outcome, factor)
            } else {
                (outcome, 1.0)
            }
        }
        LoadSteps::Equal(n) => {
            let n = n.max(1);
            let mut reached = (Termination::Converged, 0.0);
            for step in 1..=n {
                let factor = f64::from(step) / f64::from(n);
                let good = positions.clone();
                let (mut outcome, mut loading) = answer(&mut run, step, factor, &mut positions, state)?;
                let gave_up = !matches!(outcome, Termination::Converged | Termination::Cancelled);
                if gave_up && gives_up_lightly && !run.is_spent() {
                    positions.copy_from_slice(&good);
                    (outcome, loading) = answer(&mut run, step, factor, &mut positions, relaxed)?;
                }
                if outcome != Termination::Converged {
                    // The last good state, if there is one, is worth more than the wreck.
                    if step > 1 {
                        positions = good;
                    } else {
                        reached.1 = factor;
                        at_end = Some(loading);
                    }
                    reached.0 = outcome;
                    break;
                }
                at_end = Some(loading);
                reached = (outcome, factor);
                steps.push(LoadStepState {
                    load_factor: factor,
                    positions: positions.clone(),
                    axial_forces: run.response.axial_forces.clone(),
                });
            }
            reached
        }
    };

    let at_end = at_end.unwrap_or(full);
    run.respond(&at_end, &positions);
    let way = way(&run.history, load_factor);
    run.begin(run.load_step, load_factor, &at_end);
    let force = run.response.largest_axial_force();
    // What is left of forces that fade without load is rounding, and holds nothing.
    let has_faded = run.load == 0.0 && force <= run.largest_rounding();
    let holds = if has_faded { force } else { HOLDS * force.max(run.load) };
    let loose_nodes = existence::loose_nodes(structure, |s| run.response.axial_forces[s].abs() > holds);
    let mut free_movement = None;
    let may_tip = !structure.net().is_pure_tension() || !at_end.has_energy();
    if may_tip && run.is_balanced(&run.response) {
        free_movement = stability::free_movement(analysis, &at_end, &positions, &loose_nodes);
    }
    if termination == Termination::Converged
        && let Some(movement) = free_movement
    {
        return Err(movement.into());
    }
    Ok(Solution {
        members: members::of_response(&at_end, &run.response),
        axial_forces: std::mem::take(&mut run.response.axial_forces),
        positions,
        termination,
        way,
        load_factor,
        loose_nodes,
        free_movement,
        steps,
        history: run.history,
        factorisations: run.factorisations,
    })
}

/// The hardest method that the last level needed.
fn way(history: &[IterationReport], load_factor: f64) -> Way {
    let used = |way| {
        let mut last_level = history.iter().rev().skip_while(|r| r.load_factor != load_factor);
        let load_step = last_level.clone().next().map(|r| r.load_step);
        last_level.any(|r| Some(r.load_step) == load_step && r.way == way)
    };
    if used(Way::Relaxation) {
        Way::Relaxation
    } else if used(Way::InteriorPoint) {
        Way::InteriorPoint
    } else {
        Way::Newton
    }
}

/// One load level, by whatever the net asks for.
fn state(
    run: &mut Run<'_>,
    load_step: u32,
    load_factor: f64,
    loading: &Loading,
    positions: &mut Vec<Vector3<f64>>,
) -> Termination {
    loading.place_supports(run.structure, positions);
    run.begin(load_step, load_factor, loading);
    run.respond(loading, positions);
    let entry = positions.clone();
    let (mut slack, mut pulled, mut present) = (0.0, 0.0, 0.0);
    for ((bar, length), axial) in loading
        .bars
        .iter()
        .zip(&run.response.lengths)
        .zip(&run.response.axial_forces)
    {
        if bar.is_present() {
            present += 1.0;
            slack += f64::from(u8::from(*length < CLEARLY_SLACK * bar.stress_free_length));
            pulled += f64::from(u8::from(*axial != 0.0));
        }
    }
    let ends =
        |outcome, run: &Run<'_>| matches!(outcome, Termination::Converged | Termination::Cancelled) || run.is_spent();
    let is_taut = pulled >= (1.0 - MUCH_SLACK) * present;
    if is_taut {
        let carried = run.response.axial_forces.clone();
        let joining = if run.load > 0.0 {
            run.load
        } else {
            0.01 * run.response.largest_axial_force()
        };
        let outcome = QUICK.solve(run, loading, positions, carried, joining);
        if ends(outcome, run) {
            return outcome;
        }
        positions.copy_from_slice(&entry);
    }
    // A taut net of ropes that the carried forces do not solve is one for the interior point; one with struts need not be.
    let attempt = match (is_taut, run.structure.net().is_pure_tension()) {
        (false, _) => Some(TRY),
        (true, false) => Some(TRY_WITH_STRUTS),
        (true, true) => None,
    };
    if let Some(attempt) = attempt.filter(|_| slack < MUCH_SLACK * present) {
        let outcome = attempt.solve(run, loading, positions);
        if ends(outcome, run) {
            return outcome;
        }
        positions.copy_from_slice(&entry);
    }
    if loading.special.is_some() {
        return by_substitutes(run, load_step, load_factor, loading, positions);
    }
    // With struts the interior point is repeated from where it got to: it takes them along their direction at its start.
    let rounds = if run.structure.net().is_pure_tension() {
        1
    } else {
        ROUNDS_WITH_STRUTS
    };
    for _ in 0..rounds {
        match interior_point::solve(run, loading, positions) {
            Err(Termination::Cancelled) => return Termination::Cancelled,
            Err(_) => {
                positions.copy_from_slice(&entry);
                break;
            }
            Ok((forces, load)) => {
                let inside = positions.clone();
                let outcome = POLISH.solve(run, loading, positions, forces, load);
                if ends(outcome, run) {
                    return outcome;
                }
                positions.copy_from_slice(&inside);
            }
        }
    }
    AFTER_INTERIOR_POINT.solve(run, loading, positions)
}

/// Load steps as small as they have to be, then relaxation at full load: for nets with struts.
///
/// Returns how it ended and the share of the load that `positions` carry.
fn in_smaller_steps(
    run: &mut Run<'_>,
    answer: &Answer<'_>,
    start: &[Vector3<f64>],
    positions: &mut Vec<Vector3<f64>>,
) -> Result<(Termination, f64, Option<Loading>), SolveError> {
    let (mut reached, mut step, mut load_step) = (0.0, FIRST_STEP, 1);
    let mut good = start.to_vec();
    let mut at_good = None;
    // The rest of the allowance is for what comes after.
    let share = run.settings.max_iterations / 4 * 3;
    run.allowance = share;
    while step >= SMALLEST_STEP && !run.is_spent() {
        let factor = f64::min(reached + step, 1.0);
        load_step += 1;
        positions.copy_from_slice(&good);
        let (outcome, loading) = answer(run, load_step, factor, positions, state)?;
        match outcome {
            Termination::Converged if factor == 1.0 => return Ok((outcome, 1.0, Some(loading))),
            Termination::Cancelled => return Ok((outcome, factor, Some(loading))),
            Termination::Converged => {
                at_good = Some(loading);
                good.copy_from_slice(positions);
                reached = factor;
                step *= 2.0;
            }
            _ => step *= 0.5,
        }
    }
    run.allowance = run.settings.max_iterations;
    positions.copy_from_slice(&good);
    let (outcome, loading) = answer(run, load_step + 1, 1.0, positions, relaxed)?;
    if matches!(outcome, Termination::Converged | Termination::Cancelled) || reached == 0.0 {
        return Ok((outcome, 1.0, Some(loading)));
    }
    positions.copy_from_slice(&good);
    Ok((outcome, reached, at_good))
}

/// Dynamic relaxation, then Newton for the last digits.
fn relaxed(
    run: &mut Run<'_>,
    load_step: u32,
    load_factor: f64,
    loading: &Loading,
    positions: &mut Vec<Vector3<f64>>,
) -> Termination {
    loading.place_supports(run.structure, positions);
    run.begin(load_step, load_factor, loading);
    let outcome = if loading.special.is_some() {
        run.respond(loading, positions);
        let substitute = run.structure.substitute(loading, &run.response);
        relaxation::solve(run, &substitute, positions)
    } else {
        relaxation::solve(run, loading, positions)
    };
    match outcome {
        // Soft ropes on stiff struts creep towards the end; near it Newton does without more of that.
        Termination::Converged | Termination::StepTooSmall => WITH_STRUTS.solve(run, loading, positions),
        outcome => outcome,
    }
}

/// Answers of bars and dead forces in place of what slides, hangs and follows, taken anew at each, until Newton gets hold
/// of the true net from there.
fn by_substitutes(
    run: &mut Run<'_>,
    load_step: u32,
    load_factor: f64,
    loading: &Loading,
    positions: &mut Vec<Vector3<f64>>,
) -> Termination {
    let mut last = Termination::IterationLimit;
    for _ in 0..SUBSTITUTES {
        run.respond(loading, positions);
        let substitute = run.structure.substitute(loading, &run.response);
        match state(run, load_step, load_factor, &substitute, positions) {
            Termination::Converged => {}
            outcome => return outcome,
        }
        let near = positions.clone();
        for quick in [true, false] {
            run.begin(load_step, load_factor, loading);
            run.respond(loading, positions);
            last = if quick {
                let carried = run.response.axial_forces.clone();
                let joining = run.load.max(0.01 * run.response.largest_axial_force());
                QUICK.solve(run, loading, positions, carried, joining)
            } else {
                AFTER_INTERIOR_POINT.solve(run, loading, positions)
            };
            if matches!(last, Termination::Converged | Termination::Cancelled) || run.is_spent() {
                return last;
            }
            positions.copy_from_slice(&near);
        }
    }
    last
}

/// The case as bars and dead forces at given positions.
fn bars_only(structure: &Structure, loading: &Loading, positions: &[Vector3<f64>]) -> Loading {
    if loading.special.is_none() {
        return loading.clone();
    }
    let mut response = Response::new(structure);
    structure.response_into(loading, positions, &mut response);
    structure.substitute(loading, &response)
}

fn lying_at(structure: &Structure, loading: &Loading, positions: &[Vector3<f64>]) -> Vec<f64> {
    let mut response = Response::new(structure);
    structure.response_into(loading, positions, &mut response);
    members::lying(loading, &response)
}
