//! Why a state has no answer, by the client's ids.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{Cause, LikelyCause};
use ropewalk_numerics::equilibrium::{SolveError, Termination};
use ropewalk_numerics::model::Net;
use ropewalk_numerics::shape::ShapeError;

use super::parts::first_ids;
use crate::words::{Quoted, rounded};

/// Nodes or members to look at.
const LOOKED_AT: usize = 20;

pub(super) fn failure(
    reason: &str,
    message: String,
    cure: &str,
    nodes: &[impl AsRef<str>],
    members: &[impl AsRef<str>],
) -> v1::Failure {
    v1::Failure {
        reason: reason.to_owned(),
        message,
        cure: cure.to_owned(),
        nodes: first_ids(nodes.iter().map(AsRef::as_ref), LOOKED_AT),
        members: first_ids(members.iter().map(AsRef::as_ref), LOOKED_AT),
        group: group(reason, nodes, members),
    }
}

/// What failures of one cause have in common: the reason and the first id to look at.
fn group(reason: &str, nodes: &[impl AsRef<str>], members: &[impl AsRef<str>]) -> String {
    let mut ids = nodes.iter().map(AsRef::as_ref).chain(members.iter().map(AsRef::as_ref));
    match ids.find(|id: &&str| !id.is_empty()) {
        Some(culprit) => format!("{reason}/{culprit}"),
        None => reason.to_owned(),
    }
}

/// Why a case that stopped has no answer.
pub(super) fn of_stop(case: &str, termination: Termination, load_factor: f64, cause: Option<&Cause>) -> v1::Failure {
    let (reason, why) = match termination {
        Termination::Converged => ("NONE", "is in balance"),
        Termination::IterationLimit => ("ITERATION_LIMIT", "used up the allowed iterations"),
        Termination::StepTooSmall => ("STEP_TOO_SMALL", "made no more headway"),
        Termination::RunsAway => ("RUNS_AWAY", "ran away from its place"),
        Termination::Cancelled => ("CANCELLED", "was stopped on request"),
    };
    let mut message = format!(
        "case {} {why} at {} % of its load",
        Quoted(case),
        rounded(100.0 * load_factor, 3)
    );
    let Some(cause) = cause else {
        return failure(reason, message, "run it again", &[""; 0], &[""; 0]);
    };
    message.push_str(&format!(". {cause}"));
    let nodes: Vec<&str> = cause.worst.iter().map(|culprit| culprit.node.as_str()).collect();
    failure(reason, message, &cure_of(&cause.likely), &nodes, &cause.members)
}

/// Why the state of a case is no answer although it is in balance: its water has not settled.
pub(super) fn of_pond(case: &str, cause: &Cause) -> v1::Failure {
    let grows = matches!(cause.likely, LikelyCause::Pond { grows: true, .. });
    let (reason, what) = if grows {
        ("POND_GROWS", "is not stable under water")
    } else {
        ("POND_NOT_SETTLED", "has no answer with water")
    };
    let place = match &cause.likely {
        LikelyCause::Pond { place, .. } => vec![place.as_str()],
        _ => Vec::new(),
    };
    let message = format!("case {} {what}: {cause}", Quoted(case));
    failure(reason, message, &cure_of(&cause.likely), &place, &cause.members)
}

/// Why no state of a case can be given.
pub(super) fn of_error(case: &str, error: &SolveError, cause: &Cause) -> v1::Failure {
    let reason = match error {
        SolveError::Loading(_) => "NUMBERS_BEYOND_USE",
        SolveError::NotHeld { .. } => "NOT_HELD",
        SolveError::FreeMovement { .. } => "FREE_MOVEMENT",
    };
    let mut nodes: Vec<&str> = match &cause.likely {
        LikelyCause::NotHeld { nodes, .. } => nodes.iter().map(String::as_str).collect(),
        LikelyCause::Mechanism { node, .. } => vec![node],
        _ => Vec::new(),
    };
    nodes.extend(cause.worst.iter().map(|culprit| culprit.node.as_str()));
    let message = format!("case {} has no equilibrium: {cause}", Quoted(case));
    failure(reason, message, &cure_of(&cause.likely), &nodes, &cause.members)
}

/// What to try; the message tells only what happened, so that nothing is said twice.
fn cure_of(likely: &LikelyCause) -> String {
    let cure = match likely {
        LikelyCause::Numbers { .. } => "check units and factors of the actions in this case",
        LikelyCause::NotHeld { .. } => "hold one of the nodes, join them to a support, or take the load off",
        LikelyCause::Mechanism { node, .. } => {
            return format!(
                "spread the members at {}, or hold it along that direction",
                Quoted(node)
            );
        }
        LikelyCause::UnitSlip { .. } => "check the axial stiffness: was it given in kN?",
        LikelyCause::MuchSlack { .. } => "give more prestress there, or less load",
        LikelyCause::RanAway => "check size and sign of the loads, and what holds these nodes",
        LikelyCause::Tips { .. } => "give more prestress, or check the sign of the loads",
        LikelyCause::RanToTheEnd { .. } => {
            "clamp the rope at that node, give the slide friction, or hold the node back with another rope"
        }
        LikelyCause::Pond { grows: true, .. } => {
            "give the skin more fall or the ropes more prestress, so that water runs off"
        }
        LikelyCause::Pond { grows: false, .. } => {
            "the pond is near to growing without end: give the skin more fall or the ropes more prestress"
        }
        LikelyCause::OutOfIterations => "allow more iterations in solving.max_iterations",
        LikelyCause::GaveUp => "put the load on in steps with solving.load_steps, or give more prestress",
    };
    cure.to_owned()
}

/// The failure of our own code in a case.
pub(super) fn of_engine(case: &str) -> v1::Failure {
    let message = format!(
        "the engine failed in case {}; other cases are not touched by it",
        Quoted(case)
    );
    failure(
        "ENGINE_ERROR",
        message,
        "report this brief; change the case, or leave it out",
        &[""; 0],
        &[""; 0],
    )
}

/// Why there is no reference state.
pub(super) fn of_shape(net: &Net, error: &ShapeError) -> (v1::CaseOutcome, v1::Failure) {
    let none: Vec<String> = Vec::new();
    let one = |id: &String| vec![id.clone()];
    let (reason, cure, nodes, members) = match error {
        ShapeError::BadRule { member, .. } => ("BAD_RULE", "mend the prestress rule of the member", none, one(member)),
        ShapeError::MixedReach { member, node } => (
            "MIXED_REACH",
            "give the whole reach one prestress rule",
            one(node),
            one(member),
        ),
        ShapeError::MissingCoordinates { nodes } => {
            ("NO_COORDINATES", "list these nodes with xyz_m", nodes.clone(), none)
        }
        ShapeError::HeldWithoutPosition { nodes } => {
            ("HOLD_NOT_FREE", "list these nodes with xyz_m", nodes.clone(), none)
        }
        ShapeError::NotDead { .. } => (
            "UNDER_NOT_DEAD",
            "name dead loads only in prestress.under",
            none.clone(),
            none,
        ),
        ShapeError::NotHeld { nodes } => (
            "NOT_HELD",
            "lead a member with prestress from there to a support",
            nodes.clone(),
            none,
        ),
        ShapeError::Loose { nodes } => (
            "LOOSE",
            "shorten a rope there, or give it prestress",
            nodes.clone(),
            none,
        ),
        ShapeError::Singular { nodes } => (
            "PRESTRESS_CANCELS",
            "change the prestress so that tension outweighs compression at these nodes",
            nodes.clone(),
            none,
        ),
        ShapeError::BalanceNotHeld { member, node } => (
            "BALANCE_NOT_HELD",
            "name the node in prestress.hold, or give the member a tension",
            one(node),
            one(member),
        ),
        ShapeError::BalanceUnsolvable { left, .. } => (
            "BALANCE_UNSOLVABLE",
            "add a member on balance at the node, or move the node",
            left.iter().map(|left| left.node.clone()).collect(),
            none,
        ),
        ShapeError::BalancePushes { members, .. } => (
            "BALANCE_PUSHES",
            "make the member a strut, move its anchor, or give one of the members at the node a tension",
            none,
            members.iter().map(|(member, _)| member.clone()).collect(),
        ),
        ShapeError::BadTarget { .. } => ("BAD_TARGET", "mend the target, or take it out", none.clone(), none),
        ShapeError::NothingAdjustable => (
            "NOTHING_ADJUSTABLE",
            "give some prestress rules adjust {}",
            none.clone(),
            none,
        ),
        ShapeError::NotMeasurable { .. } => (
            "TARGET_NOT_MEASURABLE",
            "start from other force densities, or take the target out",
            none.clone(),
            none,
        ),
        ShapeError::NoLength { member, from, to } => (
            "NO_LENGTH",
            "give the member one mean tension, or force densities",
            vec![from.clone(), to.clone()],
            one(member),
        ),
        ShapeError::BeyondStiffness { member, .. } => (
            "BEYOND_STIFFNESS",
            "check the axial stiffness and the wanted force: was one of them in kN?",
            none,
            one(member),
        ),
        ShapeError::NotConverged { node, .. } => (
            "NOT_CONVERGED",
            "allow more iterations in solving.max_iterations, or ask for force densities",
            one(node),
            none,
        ),
        ShapeError::GateFailed { node, .. } => (
            "OUT_OF_BALANCE",
            "check stiffness and prestress of the members at the node",
            one(node),
            none,
        ),
        ShapeError::BeyondReckoning { part, .. } => {
            let is_node = net.nodes().iter().any(|node| node.name == *part);
            let (nodes, members) = if is_node { (one(part), none) } else { (none, one(part)) };
            ("BEYOND_RECKONING", "check the units of the part", nodes, members)
        }
        ShapeError::Elastic { nodes, .. } => (
            "NO_EQUILIBRIUM",
            "check the unstressed lengths and what holds these nodes",
            nodes.clone(),
            none,
        ),
        ShapeError::FreeMovement { node, members, .. } => (
            "FREE_MOVEMENT",
            "spread the members at the node, or hold it along the direction",
            one(node),
            members.clone(),
        ),
        ShapeError::Unbounded { node } => (
            "UNBOUNDED",
            "check the units of force densities and loads",
            one(node),
            none,
        ),
        ShapeError::Cancelled => ("CANCELLED", "run it again", none.clone(), none),
    };
    let outcome = match error {
        ShapeError::NotConverged { .. }
        | ShapeError::GateFailed { .. }
        | ShapeError::Unbounded { .. }
        | ShapeError::Cancelled => v1::CaseOutcome::NotConverged,
        _ => v1::CaseOutcome::NoEquilibrium,
    };
    let message = format!("there is no reference state: {error}");
    (outcome, failure(reason, message, cure, &nodes, &members))
}
