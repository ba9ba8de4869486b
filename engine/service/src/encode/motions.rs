//! Motions: their beginning, frames, events, spectra, peaks, end.

use std::time::Duration;

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{
    BreakGiven, Compared, MotionBegun, MotionExtreme, MotionFound, MotionNotBegun, Plan, Watched,
};
use ropewalk_numerics::model::{Member, Net, NodeId, SegmentId};
use ropewalk_numerics::motion::transient::{
    BreakWhen, Event as Happening, EventKind, Events, Frame, Ledger, Outcome, Peak, Progress, RopeField, Spectrum,
    WaveSpeeds,
};
use v1::Range;
use v1::motion_part::Part;
use v1::run_response::Event;

use super::closing::Counts;
use super::doubts::finding;
use super::parts::{BYTES, NUMBERS, count, event, split};
use super::state::{Array, flat};
use super::{failure, motion_doubts};
use crate::decode::{Work, reasons};
use crate::words::{Quoted, quoted_list, rounded, shown};

/// What the end of a run needs of a motion.
#[derive(Debug, Default)]
pub struct NotedMotion {
    pub(super) finished: bool,
    pub(super) counts: Counts,
}

/// Numbers of one frame in one message: 192 KiB of them.
const NUMBERS_OF_FRAME: usize = 3 * NUMBERS;
/// Numbers that a shown node has: position and velocity.
const PER_NODE: usize = 6;
/// Numbers that a point of a shown rope has: position, velocity, and stretch and tension of the segment that begins there.
const PER_POINT: usize = 8;
/// Names of shown nodes in one message; each has at most 512 bytes.
const NODES_SHOWN: usize = 384;
/// Bytes that a point of a shown rope takes besides the id of its node.
const BYTES_OF_POINT: usize = 12;

/// A part of a motion.
fn part(motion: &str, part: Part) -> v1::RunResponse {
    event(Event::Motion(v1::MotionPart {
        motion: motion.to_owned(),
        part: Some(part),
    }))
}

/// Where a motion is, on its way to the client. `spent`: what it has taken to get there. `slack`: segments that were slack in its
/// last frame.
#[must_use]
pub fn motion_progress(
    plan: &Plan,
    motion: usize,
    report: &Progress<'_>,
    spent: Duration,
    slack: usize,
) -> v1::Progress {
    let given = &plan.brief().motions[motion];
    let (time, iteration, residual, slack) = match report {
        Progress::Iteration {
            time,
            iteration,
            residual,
        } => (*time, *iteration, *residual, slack),
        Progress::Frame(frame) => (frame.time, 0, 0.0, frame.slack),
    };
    v1::Progress {
        motion: given.name.clone(),
        iteration,
        residual_n: residual,
        slack_segments: count(slack),
        simulated_s: time,
        duration_s: given.duration,
        left_s: (time > 0.0).then(|| spent.as_secs_f64() * (given.duration - time).max(0.0) / time),
        ..v1::Progress::default()
    }
}

/// The beginning of a motion, what its frames show, speeds of waves.
#[must_use]
pub fn motion_head(work: &Work, plan: &Plan, motion: usize, begun: &MotionBegun) -> Vec<v1::RunResponse> {
    let brief = plan.brief();
    let (net, given) = (&*brief.net, &brief.motions[motion]);
    let name = &given.name;
    let extent = &begun.outlook.extent;
    let (compared_with, not_compared) = match &begun.compared {
        Compared::Case(case) => (brief.cases[*case].name.clone(), String::new()),
        Compared::Settled => {
            let is_open = |given: &&BreakGiven| matches!(given.when, BreakWhen::Tension(_));
            let kept = given
                .breaks
                .iter()
                .filter(is_open)
                .filter_map(|given| given.segments.first());
            let kept: Vec<&str> = kept.map(|segment| net.member_name(*segment)).collect();
            let kept = match kept.is_empty() {
                true => String::new(),
                false => format!(", with {} whole", quoted_list(kept)),
            };
            (format!("{AT_REST}{kept}"), String::new())
        }
        Compared::Nothing { why } => (String::new(), why.clone()),
    };
    let begin = v1::MotionBegin {
        from: work.state_name(given.from).to_owned(),
        in_words: work.motion_in_words(motion),
        steps: extent.steps,
        divided_steps: extent.divided_steps,
        frames: extent.frames,
        frame_bytes: extent.bytes,
        stable_step_s: extent.stable_step,
        moving_mass_kg: begun.moving_mass,
        damping_mass_per_s: given.damping.mass,
        damping_stiffness_s: given.damping.stiffness,
        compared_with,
        not_compared,
        divided_segments: begun.divided.map_or(0, |divided| count(divided.segments)),
        moved_by_division_m: begun.divided.map_or(0.0, |divided| divided.moved),
        tension_by_division_n: begun.divided.map_or(0.0, |divided| divided.tension),
    };
    let mut messages = vec![part(name, Part::Begin(begin))];
    messages.extend(shown_things(work, net, motion, begun));
    let waves = begun.outlook.waves.iter().map(|waves| rope_waves(net, waves));
    let waves = split(waves.collect()).into_iter();
    messages.extend(waves.map(|ropes| part(name, Part::Waves(v1::MotionWaves { ropes }))));
    messages
}

/// What peaks are compared with where the brief names no case.
pub(super) const AT_REST: &str = "at rest under what acts at the end";

/// What frames show, in parts.
fn shown_things(work: &Work, net: &Net, motion: usize, begun: &MotionBegun) -> Vec<v1::RunResponse> {
    let given = &work.brief.motions[motion];
    let nodes = given.frames.nodes.chunks(NODES_SHOWN).map(|nodes| v1::MotionShown {
        nodes: nodes.iter().map(|node| net.node_name(*node).to_owned()).collect(),
        ..v1::MotionShown::default()
    });
    let ropes = begun.shown_ropes().into_iter().flat_map(|rope| {
        let nodes = rope.nodes.iter();
        let nodes = nodes.map(|node| node.map_or_else(String::new, |node| net.node_name(node).to_owned()));
        shown_rope(&net.cables()[rope.cable.index()].name, &rope.material, nodes.collect())
    });
    let ropes = split(ropes.collect()).into_iter().map(|ropes| v1::MotionShown {
        ropes,
        ..v1::MotionShown::default()
    });
    let ids = work.message.motions[motion].watched.iter().map(|watched| &watched.id);
    let watched = given.watched.iter().zip(ids).map(|(watched, id)| {
        let (unit, in_words) = watched_in_words(net, watched);
        v1::ShownQuantity {
            id: id.clone(),
            unit: unit.to_owned(),
            in_words,
        }
    });
    let watched = split(watched.collect()).into_iter().map(|watched| v1::MotionShown {
        watched,
        ..v1::MotionShown::default()
    });
    let parts = nodes.chain(ropes).chain(watched);
    parts.map(|shown| part(&given.name, Part::Shown(shown))).collect()
}

/// A shown rope, in parts that each fit a message.
fn shown_rope(cable: &str, material: &[f64], nodes: Vec<String>) -> Vec<v1::ShownRope> {
    let mut parts: Vec<v1::ShownRope> = Vec::new();
    let mut size = BYTES;
    for (place, (material, node)) in material.iter().zip(nodes).enumerate() {
        let own = BYTES_OF_POINT + node.len();
        if size + own > BYTES {
            parts.push(v1::ShownRope {
                cable: cable.to_owned(),
                from: count(place),
                ..v1::ShownRope::default()
            });
            size = cable.len();
        }
        size += own;
        let part = parts.last_mut().expect("there is one");
        part.material_m.push(*material);
        part.nodes.push(node);
    }
    parts
}

/// Unit of a watched quantity, and what it is.
fn watched_in_words(net: &Net, watched: &Watched) -> (&'static str, String) {
    let along = |what: &str, node: NodeId, along: &nalgebra::Vector3<f64>| {
        let [x, y, z] = [along.x, along.y, along.z].map(|part| rounded(part, 4));
        format!("{what} {} along ({x}, {y}, {z})", shown(net.node_name(node)))
    };
    match watched {
        Watched::Movement { node, along: by } => ("m", along("movement of", *node, by)),
        Watched::Velocity { node, along: by } => ("m/s", along("velocity of", *node, by)),
        Watched::Acceleration { node, along: by } => ("m/s2", along("acceleration of", *node, by)),
        Watched::SupportForce { node, along: by } => ("N", along("force of the support at", *node, by)),
        Watched::AxialForce { segment } => {
            let [from, to] = net.segments()[segment.index()]
                .ends
                .map(|end| shown(net.node_name(end)));
            let member = shown(net.member_name(*segment));
            ("N", format!("axial force of {member} from {from} to {to}"))
        }
        Watched::LargestForce { segments } => {
            let member = segments.first().map_or("", |segment| net.member_name(*segment));
            ("N", format!("largest axial force of {}", shown(member)))
        }
    }
}

fn rope_waves(net: &Net, waves: &WaveSpeeds) -> v1::RopeWaves {
    let [least, most] = waves.transverse;
    v1::RopeWaves {
        cable: net.cables()[waves.cable.index()].name.clone(),
        transverse_least_m_per_s: least,
        transverse_most_m_per_s: most,
        axial_m_per_s: waves.axial,
        transverse_step_s: waves.transverse_step.is_finite().then_some(waves.transverse_step),
        axial_step_s: waves.axial_step,
    }
}

/// A moment, in as many messages as it needs.
#[must_use]
pub fn motion_frame(plan: &Plan, motion: usize, frame: &Frame) -> Vec<v1::RunResponse> {
    moment(&plan.brief().motions[motion].name, frame)
}

fn moment(motion: &str, frame: &Frame) -> Vec<v1::RunResponse> {
    let mut parts = Parts::new(v1::MotionFrame {
        step: frame.step,
        time_s: frame.time,
        energy: Some(ledger(&frame.ledger)),
        slack_segments: count(frame.slack),
        watched: frame.watched.clone(),
        ..v1::MotionFrame::default()
    });
    for (position, velocity) in frame.positions.iter().zip(&frame.velocities) {
        let message = parts.with_room_for(PER_NODE);
        message.positions_m.extend(position.iter());
        message.velocities_m_per_s.extend(velocity.iter());
    }
    for (rope, field) in frame.cables.iter().enumerate() {
        add_rope(&mut parts, count(rope), field);
    }
    let messages = parts.done.into_iter().chain([parts.open]);
    messages
        .map(|message| self::part(motion, Part::Frame(message)))
        .collect()
}

fn add_rope(parts: &mut Parts, rope: u32, field: &RopeField) {
    let mut from = 0;
    while from < field.positions.len() {
        let fits = parts.room().max(PER_POINT) / PER_POINT;
        let to = field.positions.len().min(from + fits);
        let segments = from..to.min(field.stretches.len());
        let message = parts.with_room_for(PER_POINT * (to - from));
        message.ropes.push(v1::RopeFrame {
            rope,
            from: count(from),
            positions_m: flat(&field.positions[from..to]),
            velocities_m_per_s: flat(&field.velocities[from..to]),
            stretch: field.stretches[segments.clone()].to_vec(),
            tension_n: field.tensions[segments].to_vec(),
        });
        from = to;
    }
}

/// A frame as it is cut into messages.
struct Parts {
    done: Vec<v1::MotionFrame>,
    open: v1::MotionFrame,
    numbers: usize,
}

impl Parts {
    fn new(first: v1::MotionFrame) -> Self {
        Self {
            numbers: first.watched.len(),
            done: Vec::new(),
            open: first,
        }
    }

    /// Numbers that still fit the open message; all of a fresh one where nothing fits.
    fn room(&self) -> usize {
        match NUMBERS_OF_FRAME.saturating_sub(self.numbers) {
            room if room >= PER_POINT => room,
            _ => NUMBERS_OF_FRAME,
        }
    }

    /// The open message, or a fresh one that goes on with it.
    fn with_room_for(&mut self, numbers: usize) -> &mut v1::MotionFrame {
        if self.numbers + numbers > NUMBERS_OF_FRAME {
            let next = v1::MotionFrame {
                step: self.open.step,
                time_s: self.open.time_s,
                continues: true,
                ..v1::MotionFrame::default()
            };
            self.done.push(std::mem::replace(&mut self.open, next));
            self.numbers = 0;
        }
        self.numbers += numbers;
        &mut self.open
    }
}

fn ledger(ledger: &Ledger) -> v1::EnergyLedger {
    v1::EnergyLedger {
        kinetic_j: ledger.kinetic,
        elastic_j: ledger.elastic,
        potential_j: ledger.potential,
        work_j: ledger.work,
        dissipated_j: ledger.dissipated,
        released_j: ledger.released,
        error_j: ledger.error,
    }
}

/// What happened to segments.
fn events(net: &Net, motion: &str, events: &Events) -> Vec<v1::RunResponse> {
    let list = events.first.iter().map(|happening| happened(net, happening)).collect();
    let parts = split(list).into_iter();
    parts
        .map(|events| part(motion, Part::Events(v1::MotionEvents { events })))
        .collect()
}

fn happened(net: &Net, happening: &Happening) -> v1::MotionEvent {
    let kind = match happening.kind {
        EventKind::Slack => v1::MotionEventKind::Slack,
        EventKind::Snatch => v1::MotionEventKind::Snatch,
        EventKind::Break => v1::MotionEventKind::Break,
    };
    let [from, to] = net.segments()[happening.segment.index()].ends;
    v1::MotionEvent {
        time_s: happening.time,
        kind: kind.into(),
        segment: count(happening.segment.index()),
        member: net.member_name(happening.segment).to_owned(),
        from: net.node_name(from).to_owned(),
        to: net.node_name(to).to_owned(),
    }
}

/// The end of a motion: events, spectra, arrays of extremes, findings, closing words.
#[must_use]
pub fn motion_end(work: &Work, plan: &Plan, motion: usize, begun: MotionBegun) -> (Vec<v1::RunResponse>, NotedMotion) {
    let net = &*plan.brief().net;
    let name = &plan.brief().motions[motion].name;
    let found = begun.finish();
    let outcome = &found.outcome;
    let mut messages = events(net, name, &outcome.events);
    let ids = work.message.motions[motion].watched.iter().map(|watched| &watched.id);
    let watched = ids.zip(&plan.brief().motions[motion].watched).zip(&outcome.spectra);
    for ((id, watched), spectrum) in watched {
        let told = spectrum_of(id, watched_in_words(net, watched).0, spectrum);
        messages.push(part(name, Part::Spectrum(told)));
    }
    messages.extend(arrays(net, name, outcome));
    let mut findings = motion_doubts::findings(work, plan, motion, &found.doubts);
    let failure = (!found.is_finished()).then(|| motion_doubts::failure(net, name, outcome));
    findings.extend(failure.as_ref().map(not_finished));
    let mut end = closing_words(net, &found);
    end.failure = failure;
    finish(work, name, messages, findings, end)
}

/// A motion that could not begin.
#[must_use]
pub fn motion_not_begun(
    work: &Work,
    plan: &Plan,
    motion: usize,
    why: &MotionNotBegun,
) -> (Vec<v1::RunResponse>, NotedMotion) {
    let name = &plan.brief().motions[motion].name;
    let message = format!("motion {} could not begin: {why}", Quoted(name));
    let failure = failure::failure("NOT_BEGUN", message, why.cure(), &why.nodes(), &why.members());
    stopped(work, name, v1::MotionOutcome::NotBegun, failure)
}

/// A motion in which the engine failed.
#[must_use]
pub fn motion_broke(work: &Work, plan: &Plan, motion: usize) -> (Vec<v1::RunResponse>, NotedMotion) {
    let name = &plan.brief().motions[motion].name;
    let message = format!(
        "the engine failed in motion {}; other motions are not touched by it",
        Quoted(name)
    );
    let cure = "report this brief; change the motion, or leave it out";
    let failure = failure::failure("ENGINE_ERROR", message, cure, &[""; 0], &[""; 0]);
    stopped(work, name, v1::MotionOutcome::EngineError, failure)
}

fn stopped(
    work: &Work,
    name: &str,
    outcome: v1::MotionOutcome,
    failure: v1::Failure,
) -> (Vec<v1::RunResponse>, NotedMotion) {
    let findings = vec![not_finished(&failure)];
    let end = v1::MotionEnd {
        outcome: outcome.into(),
        failure: Some(failure),
        ..v1::MotionEnd::default()
    };
    finish(work, name, Vec::new(), findings, end)
}

/// Adds findings and closing words.
fn finish(
    work: &Work,
    name: &str,
    mut messages: Vec<v1::RunResponse>,
    findings: Vec<v1::Finding>,
    end: v1::MotionEnd,
) -> (Vec<v1::RunResponse>, NotedMotion) {
    let mut counts = Counts::default();
    for mut finding in findings {
        finding.case = name.to_owned();
        work.accept(&mut finding);
        counts.add(&finding);
        messages.push(event(Event::Finding(finding)));
    }
    let finished = end.outcome() == v1::MotionOutcome::Finished;
    messages.push(part(name, Part::End(end)));
    (messages, NotedMotion { finished, counts })
}

fn not_finished(failure: &v1::Failure) -> v1::Finding {
    let first = failure.nodes.first().or(failure.members.first());
    finding(
        v1::FindingSeverity::Error,
        reasons::MOTION_NOT_FINISHED,
        first.map_or("", String::as_str),
        failure.reason.clone(),
        failure.message.clone(),
        &failure.cure,
    )
}

fn closing_words(net: &Net, found: &MotionFound) -> v1::MotionEnd {
    let MotionFound { outcome, extremes, .. } = found;
    let outcome_word = if found.is_finished() {
        v1::MotionOutcome::Finished
    } else {
        v1::MotionOutcome::Stopped
    };
    let of_segment = |extreme: &Option<MotionExtreme<SegmentId>>| {
        extreme.map(|extreme| told(extreme.peak, net.member_name(extreme.place)))
    };
    let of_node = |extreme: &Option<MotionExtreme<NodeId>>| {
        extreme.map(|extreme| told(extreme.peak, net.node_name(extreme.place)))
    };
    v1::MotionEnd {
        outcome: outcome_word.into(),
        failure: None,
        time_s: outcome.time,
        steps: outcome.steps,
        smallest_step_s: outcome.smallest_step,
        iterations: outcome.iterations,
        factorisations: outcome.factorisations,
        energy: Some(ledger(&outcome.ledger)),
        largest_error_j: outcome.largest_error,
        largest_kinetic_j: outcome.largest_kinetic,
        slackenings: outcome.events.slackenings,
        snatches: outcome.events.snatches,
        events_left_out: left_out(&outcome.events),
        largest_tension_n: of_segment(&extremes.tension),
        largest_movement_m: of_node(&extremes.movement),
        largest_support_force_n: of_node(&extremes.support_force),
        largest_tension_factor: of_segment(&extremes.tension_factor),
        largest_movement_factor: of_node(&extremes.movement_factor),
    }
}

/// Slackening and snatching that is counted but not listed.
fn left_out(events: &Events) -> u64 {
    let is_counted = |event: &&Happening| event.kind != EventKind::Break;
    let listed = events.first.iter().filter(is_counted).count() as u64;
    (events.slackenings + events.snatches).saturating_sub(listed)
}

fn told(peak: Peak, id: &str) -> v1::MotionExtreme {
    v1::MotionExtreme {
        value: peak.value,
        time_s: peak.time,
        id: id.to_owned(),
    }
}

fn spectrum_of(id: &str, unit: &str, spectrum: &Spectrum) -> v1::MotionSpectrum {
    let peaks = spectrum.peaks.iter().map(|peak| v1::SpectrumPeak {
        frequency_hz: peak.frequency,
        amplitude: peak.amplitude,
    });
    v1::MotionSpectrum {
        watched: id.to_owned(),
        unit: unit.to_owned(),
        samples: spectrum.samples as u64,
        resolution_hz: spectrum.resolution,
        mean: spectrum.mean,
        rms: spectrum.rms,
        peaks: peaks.collect(),
    }
}

/// The arrays of a motion, as the contract lists them at `RunResponse`.
fn arrays(net: &Net, motion: &str, outcome: &Outcome) -> Vec<v1::RunResponse> {
    let case = format!("motion/{motion}");
    let ropes = (net.segments().iter())
        .filter(|segment| matches!(segment.member, Member::Cable(_)))
        .count();
    let mut messages = Vec::new();
    let mut send = |name: &str, unit: &str, over: Range, components: u32, values: Vec<f64>| {
        let array = Array {
            case: &case,
            name,
            unit,
            over,
            components,
            baseline: "",
            values,
        };
        messages.extend(array.parts());
    };
    let values = |peaks: &[Peak]| -> Vec<f64> { peaks.iter().map(|peak| peak.value).collect() };
    let times = |peaks: &[Peak]| -> Vec<f64> { peaks.iter().map(|peak| peak.time).collect() };
    let factors =
        |factors: &[Option<f64>]| -> Vec<f64> { factors.iter().map(|factor| factor.unwrap_or(0.0)).collect() };
    let peaks = &outcome.peaks;
    send("movement_max_m", "m", Range::Node, 1, values(&peaks.movements));
    send("movement_max_time_s", "s", Range::Node, 1, times(&peaks.movements));
    send(
        "movement_factor",
        "",
        Range::Node,
        1,
        factors(&outcome.factors.movements),
    );
    let largest = peaks.largest_forces.split_at(ropes);
    let least = peaks.least_forces.split_at(ropes);
    for (range, member, largest, least) in [
        (Range::RopeSegment, "tension", largest.0, least.0),
        (Range::Strut, "axial_force", largest.1, least.1),
    ] {
        send(&format!("{member}_max_n"), "N", range, 1, values(largest));
        send(&format!("{member}_max_time_s"), "s", range, 1, times(largest));
        send(&format!("{member}_min_n"), "N", range, 1, values(least));
        send(&format!("{member}_min_time_s"), "s", range, 1, times(least));
    }
    let of_ropes = outcome.factors.forces.get(..ropes).unwrap_or_default();
    send("tension_factor", "", Range::RopeSegment, 1, factors(of_ropes));
    let supports: Vec<Peak> = peaks.supports.iter().map(|support| support.size).collect();
    let forces = flat(peaks.supports.iter().map(|support| &support.force));
    send("support_force_max_n", "N", Range::Support, 3, forces);
    send("support_force_max_time_s", "s", Range::Support, 1, times(&supports));
    let lines = outcome.spectra.first().map_or(0, |spectrum| spectrum.amplitudes.len());
    let amplitudes = (0..lines).flat_map(|line| outcome.spectra.iter().map(move |spectrum| spectrum.amplitudes[line]));
    let watched = count(outcome.spectra.len());
    send(
        "spectrum_amplitude",
        "",
        Range::Frequency,
        watched,
        amplitudes.collect(),
    );
    messages
}

#[cfg(test)]
mod tests;
