//! What is odd about a motion, and why one did not come to its end.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{MotionDoubt, Plan};
use ropewalk_numerics::model::Net;
use ropewalk_numerics::motion::transient::{Ending, Outcome, StuckBy};

use super::doubts::finding;
use super::failure;
use crate::decode::{Work, reasons};
use crate::words::{Quoted, force, length, number, rounded, shown};

/// Doubts about a motion.
pub(super) fn findings(work: &Work, plan: &Plan, motion: usize, doubts: &[MotionDoubt]) -> Vec<v1::Finding> {
    let net = &*plan.brief().net;
    let doubts = doubts.iter().filter_map(|doubt| match doubt {
        // Told of the brief already: it takes no state to see it.
        MotionDoubt::Histories { .. } => None,
        MotionDoubt::Waves {
            cable,
            step,
            needed,
            count,
        } => {
            let id = net.cables()[cable.index()].name.as_str();
            let others = match count {
                1 => String::new(),
                more => format!(" (and in {} other ropes)", more - 1),
            };
            Some(doubt_of(
                reasons::STEPS_TOO_LONG,
                id,
                rounded(*step, 3),
                format!(
                    "a transverse wave on {} crosses a segment in {} s{others}: steps of {} s smear what is that quick; \
                     slower movement of the whole net is not touched by it",
                    Quoted(id),
                    rounded(*needed, 3),
                    rounded(*step, 3)
                ),
                &format!("give step_s at most {} to follow waves, or accept this doubt", rounded(*needed, 2)),
            ))
        }
        MotionDoubt::Energy { error, kinetic } => Some(doubt_of(
            reasons::ENERGY_NOT_KEPT,
            "",
            format!("{} J", rounded(*error, 3)),
            format!(
                "the steps of time made or lost {} J, where the net moved with {} J at most",
                rounded(*error, 3),
                rounded(*kinetic, 3)
            ),
            "halve step_s and compare, or take energy_conserving",
        )),
        MotionDoubt::ShortSpectrum {
            watched,
            frequency,
            periods,
            count,
        } => {
            let id = &work.message.motions[motion].watched[*watched].id;
            let others = match count {
                1 => String::new(),
                more => format!("; {} other quantities have too few as well", more - 1),
            };
            Some(doubt_of(
                reasons::SHORT_SPECTRUM,
                id,
                rounded(*periods, 3),
                format!(
                    "the samples of {} hold {} periods of its largest peak at {} Hz: its frequency and amplitude are rough{others}",
                    Quoted(id),
                    rounded(*periods, 3),
                    rounded(*frequency, 3)
                ),
                "follow the motion over at least 20 periods",
            ))
        }
        MotionDoubt::DampingOfStart { slackenings, breaks } => Some(doubt_of(
            reasons::DAMPING_OF_START,
            "",
            slackenings.to_string(),
            format!(
                "damping by stiffness is that of the state at the start and resists on, where segments went slack {slackenings} \
                 times and {breaks} were to break: it holds back what hangs loose, and can make peaks too small"
            ),
            "damp by mass and along ropes instead (`ropes` in damping), or compare with a motion without it",
        )),
        MotionDoubt::LongPieces {
            cable,
            crossing,
            finest,
            needed,
        } => {
            let id = net.cables()[cable.index()].name.as_str();
            Some(doubt_of(
                reasons::PIECES_TOO_LONG,
                id,
                format!("{} s", rounded(*crossing, 3)),
                format!(
                    "a transverse wave takes {} s to cross a straight piece of {}, and a load changes within {} s: waves that it \
                     makes are smeared, forces at the ends come out too small",
                    rounded(*crossing, 3),
                    Quoted(id),
                    rounded(*finest, 3)
                ),
                &format!(
                    "give pieces_of_hanging at least {} and compare with twice as many",
                    number(*needed)
                ),
            ))
        }
        MotionDoubt::NotBroken {
            segment,
            tension,
            largest,
            count,
        } => {
            let id = net.member_name(*segment);
            let others = match count {
                1 => String::new(),
                more => format!("; {} other breaks did not come either", more - 1),
            };
            Some(finding(
                v1::FindingSeverity::Note,
                reasons::NOT_BROKEN,
                id,
                force(*largest),
                format!(
                    "{} did not break: it had {} at most, and was to break at {}{others}",
                    Quoted(id),
                    force(*largest),
                    force(*tension)
                ),
                "nothing to mend, unless it was meant to break",
            ))
        }
        MotionDoubt::LargeMovement { node, movement, extent } => {
            let id = net.node_name(*node);
            Some(doubt_of(
                reasons::LARGE_MOVEMENT,
                id,
                length(*movement),
                format!(
                    "node {} moves by {}, where the whole net measures {}",
                    Quoted(id),
                    length(*movement),
                    length(*extent)
                ),
                "check units of loads and masses; a part that breaks off falls without end",
            ))
        }
        MotionDoubt::OverBreaking {
            segment,
            tension,
            breaking,
        } => {
            let id = net.member_name(*segment);
            Some(doubt_of(
                reasons::OVER_BREAKING,
                id,
                force(*tension),
                format!(
                    "{} is pulled with {}, above its breaking force of {}; the motion goes on as if it held",
                    Quoted(id),
                    force(*tension),
                    force(*breaking)
                ),
                "let it break at that tension, take a stronger rope, or lessen the load",
            ))
        }
    });
    doubts.collect()
}

fn doubt_of(reason: &str, id: &str, value: String, message: String, cure: &str) -> v1::Finding {
    finding(v1::FindingSeverity::Doubt, reason, id, value, message, cure)
}

/// Why a motion did not come to its end.
pub(super) fn failure(net: &Net, name: &str, outcome: &Outcome) -> v1::Failure {
    let time = rounded(outcome.time, 4);
    let Ending::StepTooSmall(stuck) = outcome.ending else {
        let message = format!("motion {} was stopped on request at {time} s", Quoted(name));
        return failure::failure("CANCELLED", message, "run it again", &[""; 0], &[""; 0]);
    };
    let node = net.node_name(stuck.node);
    let (what, cure) = match stuck.why {
        StuckBy::NotConverged { residual, allowed } => (
            format!(
                "Newton's method did not converge: {} out of balance at node {}, where {} is allowed",
                force(residual),
                Quoted(node),
                force(allowed)
            ),
            "give a smaller step_s, or central_differences, or damp the rope that snatches",
        ),
        StuckBy::ErrorNotKept { error, allowed } => (
            format!(
                "the error of a step could not be kept: {} at node {}, where {} is allowed",
                length(error),
                Quoted(node),
                length(allowed)
            ),
            "allow a larger error_m, or take equal steps",
        ),
        StuckBy::BeyondUse => (
            format!("numbers ran beyond use at node {}", Quoted(node)),
            "check units of loads and masses, and give a smaller step_s",
        ),
    };
    let snatches = stuck.segment.map(|segment| net.member_name(segment));
    let snatch = snatches.map_or_else(String::new, |member| {
        format!("; {} went slack or came taut just then", shown(member))
    });
    let message = format!(
        "motion {} stopped at {time} s: steps down to {} s were too long. {what}{snatch}",
        Quoted(name),
        number(stuck.step)
    );
    failure::failure("STEP_TOO_SMALL", message, cure, &[node], snatches.as_slice())
}
