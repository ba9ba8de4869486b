//! What a brief will cost, before it is run.

use super::{Brief, MotionGiven};
use crate::equilibrium::Analysis;
use crate::model::{Net, NodeId, Segment};
use crate::motion::transient::Scheme;

/// Factorisations that a case takes, as a rule: 5 to 20.
const FACTORISATIONS_PER_CASE: f64 = 12.0;
/// Floating-point operations a second in a factorisation on one thread, from measurements on a common server.
const FACTOR_RATE: f64 = 12e9;
/// Seconds a stored entry of the factor takes in two substitutions, bound by memory.
const SOLVE_SECONDS_PER_ENTRY: f64 = 3e-9;
/// Factorisations that natural modes of a state take: shifts, counts.
const FACTORISATIONS_OF_MODES: f64 = 6.0;
/// Iterations of a step in time, as a rule: 2 to 3.
const ITERATIONS_PER_STEP: f64 = 2.5;
/// States at rest that a motion takes: that at its start, with hanging ropes divided too, and the one that it is compared with.
const STATES_PER_MOTION: f64 = 2.0;
/// Bytes of the ledger and other numbers of a frame.
const FRAME_BYTES: f64 = 80.0;
/// Entries of the factor that a point of division adds: those of itself, and of itself with its neighbour.
const ENTRIES_PER_POINT: f64 = 15.0;
/// Seconds a segment takes to assemble.
const ASSEMBLY_SECONDS_PER_SEGMENT: f64 = 1e-7;

/// Size of the work, roughly.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Estimate {
    /// Free directions.
    pub unknowns: usize,
    /// Cases, and the reference state.
    pub states: usize,
    /// Motions.
    pub motions: usize,
    /// Steps of all motions, as many as stability needs where they are explicit.
    pub motion_steps: f64,
    /// Stored entries of the factor.
    pub factor_entries: usize,
    /// Floating-point operations of one factorisation.
    pub factor_operations: f64,
    /// Seconds on one thread; right within a factor of three or so.
    pub seconds: f64,
    /// Bytes of full results of all states, and of frames and extremes of motions.
    pub result_bytes: u64,
}

impl Estimate {
    pub(super) fn new(brief: &Brief, analysis: &Analysis) -> Self {
        let net = &brief.net;
        let unknowns = analysis.structure().n_dofs();
        let factor_entries = analysis.symbolic().n_factor_entries();
        let (n, entries) = (unknowns.max(1) as f64, factor_entries as f64);
        // Columns of equal length would need entries² / n; those of nets are longest at the end, hence the larger factor.
        let factor_operations = 4.0 * entries * entries / n;
        let iteration = factor_operations / FACTOR_RATE
            + entries * SOLVE_SECONDS_PER_ENTRY
            + net.segments().len() as f64 * ASSEMBLY_SECONDS_PER_SEGMENT;
        let states = brief.cases.len() + 1;
        let supported = net.supports().len() + net.elastic_supports().iter().map(|e| e.nodes().len()).sum::<usize>();
        let on_paths: u32 = brief
            .cases
            .iter()
            .filter_map(|case| case.path)
            .map(|path| path.steps + 1)
            .sum();
        // Positions and displacements; four numbers and a flag a segment; unstressed lengths; support forces; two a panel.
        let numbers =
            6 * net.nodes().len() + 4 * net.segments().len() + net.n_lengths() + 9 * supported + 2 * net.panels().len();
        let (mut of_modes, mut shapes) = (0.0, 0);
        if let Some(modes) = &brief.modes {
            let states = modes.cases.len() + usize::from(modes.reference);
            let vectors = 3.0 * modes.count as f64 + 40.0;
            let steps = vectors * (entries * SOLVE_SECONDS_PER_ENTRY + vectors * n * 4e-9);
            of_modes = states as f64 * (FACTORISATIONS_OF_MODES * factor_operations / FACTOR_RATE + steps);
            shapes = states * modes.count * 24 * net.nodes().len();
        }
        let (mut motion_steps, mut of_motions, mut told) = (0.0, 0.0, 0.0);
        for motion in &brief.motions {
            let divided = n_points(net, motion);
            let segments = (net.segments().len() + divided) as f64;
            let assembly = segments * ASSEMBLY_SECONDS_PER_SEGMENT;
            let entries = entries + ENTRIES_PER_POINT * divided as f64;
            let iteration = factor_operations / FACTOR_RATE + entries * SOLVE_SECONDS_PER_ENTRY + assembly;
            let steps = (motion.duration / motion.step).ceil();
            of_motions += STATES_PER_MOTION * FACTORISATIONS_PER_CASE * iteration;
            if motion.scheme == Scheme::CentralDifferences {
                let substeps = (motion.step / stable_step(net, motion)).ceil().max(1.0);
                motion_steps += steps * substeps;
                of_motions += steps * substeps * assembly;
            } else {
                motion_steps += steps;
                of_motions += steps * ITERATIONS_PER_STEP * iteration;
            }
            told += frame_bytes(net, motion, steps) + 32.0 * segments + 24.0 * net.nodes().len() as f64;
        }
        Self {
            unknowns,
            states,
            motions: brief.motions.len(),
            motion_steps,
            factor_entries,
            factor_operations,
            seconds: of_motions
                + of_modes
                + iteration * FACTORISATIONS_PER_CASE * (states as f64 + f64::from(on_paths)),
            result_bytes: (states * (8 * numbers + net.segments().len()) + shapes) as u64 + whole(told),
        }
    }
}

#[allow(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "positive; beyond u64 it saturates"
)]
fn whole(value: f64) -> u64 {
    value.round() as u64
}

/// Points into which hanging ropes are divided.
fn n_points(net: &Net, motion: &MotionGiven) -> usize {
    let hanging = net.segments().iter().filter(|segment| segment.hangs).count();
    hanging * motion.pieces_of_hanging.saturating_sub(1)
}

/// Bytes of all frames.
fn frame_bytes(net: &Net, motion: &MotionGiven, steps: f64) -> f64 {
    let frames = match motion.frames.stride {
        0 => 2.0,
        stride => (steps / stride as f64).ceil() + 1.0,
    };
    let along = motion.frames.cables.iter().map(|cable| {
        let segments = &net.segments()[net.cables()[cable.index()].segments.clone()];
        let pieces = |segment: &Segment| if segment.hangs { motion.pieces_of_hanging } else { 1 };
        let n: usize = segments.iter().map(pieces).sum();
        7 * (n + 1) + 2 * n
    });
    let values = 6 * motion.frames.nodes.len() + motion.watched.len() + along.sum::<usize>();
    frames * (FRAME_BYTES + 8.0 * values as f64)
}

/// Largest stable explicit step (s), roughly: lengths are those between nodes as given, and nodes at members without are left
/// out. Infinite where nothing is known.
///
/// ```text
/// h = 2/ω,   ω² ≤ max over nodes of  2 Σ k / M,   k = EA / L0
/// ```
fn stable_step(net: &Net, motion: &MotionGiven) -> f64 {
    let n_nodes = net.nodes().len();
    let mut stiffness = vec![0.0; n_nodes];
    let mut mass: Vec<f64> = net.nodes().iter().map(|node| node.attached_mass).collect();
    for (node, more) in &motion.masses.nodes {
        mass[node.index()] += more;
    }
    let mut largest: f64 = 0.0;
    for segment in net.segments() {
        let [from, to] = segment.ends.map(NodeId::index);
        let pieces = if segment.hangs {
            motion.pieces_of_hanging as f64
        } else {
            1.0
        };
        let span = match (net.nodes()[from].position, net.nodes()[to].position) {
            (Some(from), Some(to)) => (to - from).norm() / pieces,
            // No number: the nodes of this member are left out.
            _ => f64::NAN,
        };
        let (k, m) = (
            segment.section.axial_stiffness / span,
            segment.section.mass_per_length * span,
        );
        for end in [from, to] {
            stiffness[end] += 2.0 * k;
            mass[end] += 0.5 * m;
        }
        if segment.hangs {
            // A point between two pieces.
            largest = largest.max(4.0 * k / m);
        }
    }
    let is_free = |node: &usize| net.support_of(NodeId::new(*node)).is_none() && mass[*node] > 0.0;
    for node in (0..n_nodes).filter(is_free) {
        // The larger of a number and of none is the number.
        largest = largest.max(stiffness[node] / mass[node]);
    }
    2.0 / largest.sqrt()
}
