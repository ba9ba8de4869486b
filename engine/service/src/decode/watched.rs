//! What is shown and told of a motion: frames, watched quantities, spectra.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{SpectraGiven, Watched};
use ropewalk_numerics::model::{CableId, NodeId, SegmentId};
use ropewalk_numerics::motion::transient::Frames;
use v1::watched_quantity::Of as Quantity;

use super::breaks::{member_segments, one_segment};
use super::findings::{Findings, Path};
use super::motions::{Basics, Context};
use super::names::{Names, Thing};
use super::numbers::{DRIVEN_FREQUENCY, FRAME_STEPS, Of, SAMPLES_FROM};
use super::reasons;
use super::resolved::Resolved;
use super::scope::{CABLES, NODES};
use crate::words::{Quoted, number, rounded};

/// Frames where the brief does not say how many.
const FRAMES: f64 = 200.0;
/// Bytes of the frames of one motion.
const MOST_BYTES: f64 = 4e9;
/// Bytes of the ledger and other numbers of a frame.
const FRAME_BYTES: f64 = 80.0;
/// Samples of one spectrum.
const LEAST_SAMPLES: f64 = 16.0;
/// Watched quantities of a motion: each frame tells all of them in one message.
const MOST_WATCHED: usize = 1000;
/// Bytes of the samples of a motion, which are held until it ends.
const MOST_SAMPLE_BYTES: f64 = 2.56e8;
/// Bytes that a sample takes for each watched quantity, with the lines of its spectrum,
const BYTES_OF_SAMPLE: f64 = 12.0;
/// and for the working out of one spectrum.
const BYTES_OF_TRANSFORM: f64 = 64.0;

/// Reads what frames show, `pieces` to a hanging segment, and tells where they come to too much.
pub(super) fn read_frames(
    motion: &v1::Motion,
    pieces: usize,
    basics: &Basics<'_>,
    context: &Context<'_, '_>,
    at: &Path<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<Frames> {
    let empty = v1::MotionFrames::default();
    let given = motion.frames.as_ref().unwrap_or(&empty);
    let (of, net) = (basics.of, context.net);
    let at = at.field("frames");
    let field = at.field("every_steps");
    let stride = match (given.every_steps, basics.steps()) {
        (Some(every), _) => findings
            .number(&field, of, &FRAME_STEPS, f64::from(every))
            .map(|_| u64::from(every)),
        (None, Some(steps)) => {
            let stride = whole((steps / FRAMES).round().max(1.0));
            resolved.left_out(&field, stride);
            Some(stride)
        }
        (None, None) => None,
    };
    let nodes = context
        .scopes
        .of(net, &given.nodes, &at.field("nodes"), NODES, findings);
    let ropes = context
        .scopes
        .of(net, &given.ropes, &at.field("ropes"), CABLES, findings);
    let points: usize = (ropes.cables())
        .map(|cable| {
            let cable = &net.cables[cable];
            let pieces = if cable.message.hangs.is_some() { pieces } else { 1 };
            let segments = cable.n_segments() * pieces;
            7 * (segments + 1) + 2 * segments
        })
        .sum();
    let values = 6 * nodes.nodes().count() + points + motion.watched.len();
    let bytes = FRAME_BYTES + 8.0 * values as f64;
    if let (Some(stride), Some(steps)) = (stride, basics.steps()) {
        tell_too_large((steps, stride, bytes), basics, &at, findings);
    }
    Some(Frames {
        stride: stride?,
        nodes: nodes.nodes().map(NodeId::new).collect(),
        cables: ropes.cables().map(CableId::new).collect(),
    })
}

/// Tells frames that come to too much: steps, steps to a frame, and bytes of a frame.
fn tell_too_large(
    (steps, stride, bytes): (f64, u64, f64),
    basics: &Basics<'_>,
    at: &Path<'_>,
    findings: &mut Findings,
) {
    let frames = (steps / stride as f64).ceil() + 1.0;
    if frames * bytes <= MOST_BYTES {
        return;
    }
    let fitting = (MOST_BYTES / bytes).floor() - 1.0;
    let cure = if fitting >= 1.0 {
        format!(
            "give every_steps at least {}, show fewer nodes and ropes, or shorten the motion",
            number((steps / fitting).ceil())
        )
    } else {
        "show fewer nodes and ropes".to_owned()
    };
    findings
        .error(
            reasons::TOO_LARGE,
            at,
            basics.of.id,
            format!(
                "{}: {} frames of {} bytes each come to {} bytes: at most {} are taken",
                basics.of,
                number(frames),
                number(bytes),
                rounded(frames * bytes, 3),
                number(MOST_BYTES)
            ),
            cure,
        )
        .value(rounded(frames * bytes, 3));
}

/// A whole number that is not negative; beyond the range its end.
#[allow(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "a count; what saturates is refused elsewhere"
)]
pub(super) fn whole(value: f64) -> u64 {
    value as u64
}

pub(super) fn read_watched(
    motion: &v1::Motion,
    of: Of<'_>,
    context: &Context<'_, '_>,
    at: &Path<'_>,
    findings: &mut Findings,
) -> Vec<Watched> {
    let list = at.field("watched");
    let count = motion.watched.len();
    if count > MOST_WATCHED {
        findings
            .error(
                reasons::TOO_MANY,
                &list,
                of.id,
                format!("{of}: {count} quantities are watched: at most {MOST_WATCHED} are taken"),
                "watch fewer, or follow the motion twice with some of them each; frames can show nodes and ropes too",
            )
            .value(count);
        return Vec::new();
    }
    let mut names = Names::new("watched quantities");
    let mut watched = Vec::with_capacity(motion.watched.len());
    for (place, given) in motion.watched.iter().enumerate() {
        names.declare(findings, &list, place, given.id.as_str(), ());
        let at = list.element(&given.id, place);
        let read = read_one(given, of, context, &at, findings);
        let covers = match &read {
            Some(Watched::LargestForce { segments }) => segments.len(),
            _ => 1,
        };
        if !context.covered.add(covers, of, &at, findings) {
            return watched;
        }
        watched.extend(read);
    }
    watched
}

fn read_one(
    given: &v1::WatchedQuantity,
    of: Of<'_>,
    context: &Context<'_, '_>,
    at: &Path<'_>,
    findings: &mut Findings,
) -> Option<Watched> {
    let net = context.net;
    let mut node = |name: &'static str, given: &v1::NodeAlong| {
        let at = at.field(name);
        let along = findings.direction(&at.field("along"), of, &given.along);
        let field = at.field("node");
        let node = match net.names.find(findings, &field, "node", &given.node)? {
            Thing::Node(node) => node,
            other => {
                let id = &given.node;
                let message = format!("{of}: {} is a {}, and one node is watched", Quoted(id), other.kind());
                findings
                    .error(reasons::WRONG_KIND, &field, id, message, "name a node")
                    .value(id);
                return None;
            }
        };
        if name == "support_force" && context.supports.of_node[node].is_none() {
            let id = net.nodes[node].id;
            findings
                .error(
                    reasons::NO_SUPPORT_FORCE,
                    &field,
                    id,
                    format!(
                        "{of}: the force of a support is watched at node {}, which has none",
                        Quoted(id)
                    ),
                    "name a supported node",
                )
                .value(id);
            return None;
        }
        along.map(|along| (NodeId::new(node), along))
    };
    match &given.of {
        Some(Quantity::Movement(given)) => {
            node("movement", given).map(|(node, along)| Watched::Movement { node, along })
        }
        Some(Quantity::Velocity(given)) => {
            node("velocity", given).map(|(node, along)| Watched::Velocity { node, along })
        }
        Some(Quantity::Acceleration(given)) => {
            node("acceleration", given).map(|(node, along)| Watched::Acceleration { node, along })
        }
        Some(Quantity::SupportForce(given)) => {
            node("support_force", given).map(|(node, along)| Watched::SupportForce { node, along })
        }
        Some(Quantity::Tension(part)) => one_segment(part, of, &at.field("tension"), net, findings)
            .map(SegmentId::new)
            .map(|segment| Watched::AxialForce { segment }),
        Some(Quantity::LargestTension(id)) => {
            member_segments(id, of, &at.field("largest_tension"), net, findings).map(|segments| Watched::LargestForce {
                segments: segments.into_iter().map(SegmentId::new).collect(),
            })
        }
        None => {
            findings.error(
                reasons::MISSING,
                at,
                &given.id,
                format!("{of}: it is not said what {} watches", Quoted(&given.id)),
                "give one of movement, velocity, acceleration, tension, largest_tension, support_force",
            );
            None
        }
    }
}

/// Reads what spectra are wanted; `None`: none, or none that could be.
pub(super) fn read_spectra(
    motion: &v1::Motion,
    basics: &Basics<'_>,
    at: &Path<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<SpectraGiven> {
    let given = motion.spectra.as_ref()?;
    let (of, id) = (basics.of, basics.of.id);
    let at = at.field("spectra");
    if motion.watched.is_empty() {
        findings.error(
            reasons::COVERS_NOTHING,
            &at,
            id,
            format!("{of}: spectra are wanted, and nothing is watched"),
            "name in watched what spectra are made of, or take spectra out",
        );
    }
    let (from_at, up_to_at) = (at.field("from_s"), at.field("up_to_hz"));
    if given.from_s.is_none() {
        resolved.left_out(&from_at, 0);
    }
    let from = findings.number_or(&from_at, of, &SAMPLES_FROM, given.from_s, 0.0);
    let up_to = match given.up_to_hz {
        Some(up_to) => Some(findings.number(&up_to_at, of, &DRIVEN_FREQUENCY, up_to)?),
        None => {
            resolved.left_out(&up_to_at, "half of one over the step");
            None
        }
    };
    let from = from?;
    if let (Some(duration), Some(step)) = (basics.duration, basics.step) {
        let highest = 0.5 / step;
        if let Some(up_to) = up_to.filter(|up_to| *up_to > highest * (1.0 + 1e-9)) {
            findings
                .error(
                    reasons::OUT_OF_RANGE,
                    &up_to_at,
                    id,
                    format!(
                        "{of}: a spectrum up to {} Hz is wanted, and steps of {} s show nothing above {} Hz",
                        number(up_to),
                        number(step),
                        rounded(highest, 4)
                    ),
                    format!(
                        "give at most {}, or step_s at most {}",
                        rounded(highest, 4),
                        rounded(0.5 / up_to, 4)
                    ),
                )
                .value(number(up_to));
        }
        // Whole steps only, the moment of the start among them.
        let last = (duration / step + 1e-9).floor();
        let samples = (last - (from / step - 1e-9).ceil() + 1.0).max(0.0);
        if samples < LEAST_SAMPLES {
            findings
                .error(
                    reasons::TOO_FEW_SAMPLES,
                    &from_at,
                    id,
                    format!(
                        "{of}: from {} s to {} s there are {} samples, one every {} s: a spectrum needs {}",
                        number(from),
                        number(duration),
                        number(samples),
                        number(step),
                        number(LEAST_SAMPLES)
                    ),
                    "let samples begin earlier, follow the motion for longer, or shorten the step",
                )
                .value(number(from));
        }
        let each = BYTES_OF_SAMPLE * motion.watched.len() as f64 + BYTES_OF_TRANSFORM;
        let all = samples * each;
        if all > MOST_SAMPLE_BYTES {
            findings
                .error(
                    reasons::TOO_LARGE,
                    &at,
                    id,
                    format!(
                        "{of}: spectra of {} samples take {} bytes where so many quantities are watched as here ({}): at most {} are taken",
                        number(samples),
                        rounded(all, 3),
                        motion.watched.len(),
                        number(MOST_SAMPLE_BYTES)
                    ),
                    format!(
                        "take at most {} samples: let them begin later, or lengthen the step; or watch fewer quantities",
                        number((MOST_SAMPLE_BYTES / each).floor())
                    ),
                )
                .value(rounded(all, 3));
        }
    }
    Some(SpectraGiven { from, up_to })
}
