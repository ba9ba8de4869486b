//! Motion in time: periods, waves, sudden loads, loss of a rope.

use std::f64::consts::PI;
use std::ops::ControlFlow;
use std::sync::Arc;

use nalgebra::Vector3;
use ropewalk_numerics::equilibrium::Analysis;
use ropewalk_numerics::load::{Case, SegmentLoads};
use ropewalk_numerics::model::{CableGiven, Net, NetGiven, NodeGiven, NodeId, ReferenceState, SegmentId, SupportGiven};
use ropewalk_numerics::motion::MassGiven;
use ropewalk_numerics::motion::transient::{
    self, Break, BreakWhen, Damping, Ending, Frame, Frames, Motion, Outcome, Outlook, Progress, Scheme, Settled,
};
use serde_json::Value;

use crate::data::{Data, coordinates, file, index, number, numbers, vector};
use crate::problem::stiff;
use crate::report::{Tolerance, check, check_all, check_second_order};
use crate::scalar::halving_limit;

const CONSERVING: Scheme = Scheme::Conserving { error: None };

const AVERAGE: Scheme = Scheme::GeneralisedAlpha {
    spectral_radius: 1.0,
    error: None,
};

/// A net of single ropes to be put in motion.
#[derive(Default)]
struct Moving {
    given: NetGiven,
    unstressed_lengths: Vec<f64>,
}

/// The same, ready.
struct Ready {
    analysis: Arc<Analysis>,
    reference: Arc<ReferenceState>,
}

impl Moving {
    fn node(&mut self, position: Vector3<f64>, mass: f64, support: Option<SupportGiven>) -> NodeId {
        let id = NodeId::new(self.given.nodes.len());
        self.given.nodes.push(NodeGiven {
            name: format!("n{}", id.index()),
            position: Some(position),
            support,
            attached_mass: mass,
        });
        id
    }

    fn rope(&mut self, path: &[NodeId], axial_stiffness: f64, mass_per_length: f64, unstressed_length: f64) {
        let section = ropewalk_numerics::model::Section {
            mass_per_length,
            ..stiff(axial_stiffness)
        };
        self.given.cables.push(CableGiven {
            name: format!("c{}", self.given.cables.len()),
            path: path.to_vec(),
            sections: vec![section; path.len() - 1],
            ..CableGiven::default()
        });
        self.unstressed_lengths.extend(vec![unstressed_length; path.len() - 1]);
    }

    fn ready(self) -> Ready {
        let net = Net::new(self.given).expect("a valid net");
        Ready {
            reference: Arc::new(ReferenceState {
                positions: net.nodes().iter().map(|n| n.position.expect("given")).collect(),
                unstressed_lengths: self.unstressed_lengths,
                axial_forces: vec![0.0; net.segments().len()],
            }),
            analysis: Arc::new(Analysis::new(Arc::new(net))),
        }
    }
}

impl Ready {
    /// A motion from the given positions at rest, each node told at every step.
    fn motion(&self, scheme: Scheme, duration: f64, step: f64) -> Motion {
        let net = self.analysis.structure().net();
        let (nodes, segments) = (net.nodes().len(), net.segments().len());
        Motion {
            reference: Arc::clone(&self.reference),
            positions: self.reference.positions.clone(),
            velocities: Vec::new(),
            masses: MassGiven::default(),
            case: Case {
                nodal_forces: vec![Vector3::zeros(); nodes],
                unstressed_lengths: self.reference.unstressed_lengths.clone(),
                segments: vec![SegmentLoads::default(); segments],
                support_movements: vec![Vector3::zeros(); nodes],
                removed: vec![false; segments],
                ..Case::default()
            },
            driven: Vec::new(),
            breaks: Vec::new(),
            damping: Damping::default(),
            scheme,
            duration,
            step,
            frames: Frames {
                stride: 1,
                nodes: (0..nodes).map(NodeId::new).collect(),
                cables: Vec::new(),
            },
            watched: Vec::new(),
            spectra: None,
            settled: None,
        }
    }

    fn run(&self, motion: &Motion) -> (Vec<Frame>, Outcome) {
        let mut frames = Vec::new();
        let outcome = transient::run(&self.analysis, &Arc::new(motion.clone()), &mut |progress| {
            if let Progress::Frame(frame) = progress {
                frames.push(frame.clone());
            }
            ControlFlow::Continue(())
        })
        .expect("a motion");
        assert_eq!(outcome.ending, Ending::Done);
        (frames, outcome)
    }
}

/// A mass of `mass` (kg) between two strings of half span `half` (m).
fn two_strings(half: f64, axial_stiffness: f64, unstressed_length: f64, mass: f64) -> Ready {
    let mut moving = Moving::default();
    let left = moving.node(Vector3::new(-half, 0.0, 0.0), 0.0, Some(SupportGiven::default()));
    let middle = moving.node(Vector3::zeros(), mass, None);
    let right = moving.node(Vector3::new(half, 0.0, 0.0), 0.0, Some(SupportGiven::default()));
    moving.rope(&[left, middle], axial_stiffness, 0.0, unstressed_length);
    moving.rope(&[middle, right], axial_stiffness, 0.0, unstressed_length);
    moving.ready()
}

/// Period (s) of an undamped swing of amplitude `amplitude` told at equal steps of `h` (s), by its passages through zero;
/// between two steps as a sine would pass.
fn period(swing: &[f64], amplitude: f64, h: f64) -> f64 {
    let passages: Vec<f64> = (swing.windows(2).enumerate())
        .filter(|(_, pair)| pair[0] * pair[1] < 0.0)
        .map(|(n, pair)| {
            let phase = |u: f64| (u / amplitude).clamp(-1.0, 1.0).asin();
            h * (n as f64 + phase(pair[0]) / (phase(pair[0]) - phase(pair[1])))
        })
        .collect();
    2.0 * (passages[passages.len() - 1] - passages[0]) / (passages.len() - 1) as f64
}

/// How node 1 of a frame moves along y (m).
fn lateral(frames: &[Frame]) -> Vec<f64> {
    frames.iter().map(|frame| frame.positions[1].y).collect()
}

#[test]
fn mass_on_two_strings() {
    let data = file!("pub-20-mass-on-two-strings");
    for (name, scheme) in [("averaged", AVERAGE), ("conserving", CONSERVING)] {
        for set in ["set 1", "set 2", "set 3"] {
            let given = &data.expected(set)["value"];
            let value = |key: &str| number(&given[key]);
            let amplitude = value("amplitude");
            let exact = value("period_exact");
            let ready = two_strings(value("half_span"), value("EA"), value("L0"), value("mass"));
            let computed = |steps: f64| {
                let h = exact / steps;
                let mut motion = ready.motion(scheme, 6.0 * exact, h);
                motion.positions[1].y = amplitude;
                period(&lateral(&ready.run(&motion).0), amplitude, h)
            };
            let source = data.source();
            let title = format!("{set}, {name}: period at 200 steps");
            check(&title, &source, exact, computed(200.0), Tolerance::Relative(1e-3));
            let title = format!("{set}, {name}: period at 20000 steps");
            check(&title, &source, exact, computed(2e4), Tolerance::Relative(1e-6));
            let errors = [200.0, 400.0, 800.0].map(|steps| computed(steps) - exact);
            check_second_order(&format!("{set}, {name}: period"), &source, &errors);
        }
    }
}

/// The string of a file in `n` segments, plucked, told over half a period at 2000 steps; and what is told of it before.
fn pluck(data: &Data, n: usize) -> (Vec<Frame>, Outlook) {
    let value = |key: &str| number(&data.inputs()[key]);
    let (length, tension, mass, stiffness) = (value("length"), value("T"), value("mass_per_m"), value("EA"));
    let piece = length / n as f64;
    let unstressed = piece / (1.0 + tension / stiffness);
    let mut moving = Moving::default();
    let nodes: Vec<_> = (0..=n)
        .map(|k| {
            let held = (k == 0 || k == n).then(SupportGiven::default);
            // The beads weigh what a metre of stretched string does; the rope alone weighs that of an unstressed one.
            let rest = mass * (piece - unstressed);
            moving.node(Vector3::new(k as f64 * piece, 0.0, 0.0), rest, held)
        })
        .collect();
    moving.rope(&nodes, stiffness, mass, unstressed);
    let ready = moving.ready();
    let period = number(&data.expected("continuous period 2L/c")["value"]);
    let mut motion = ready.motion(AVERAGE, 0.5 * period, period / 4000.0);
    let outlook = transient::outlook(&ready.analysis, &Arc::new(motion.clone())).expect("a motion");
    for (k, position) in motion.positions.iter_mut().enumerate() {
        let x = k as f64 / n as f64;
        position.y = if x <= 0.25 { 4.0 * x } else { (1.0 - x) / 0.75 } * 1e-4;
    }
    (ready.run(&motion).0, outlook)
}

#[test]
fn plucked_string() {
    let data = file!("pub-21-plucked-string");
    let source = data.source();
    let expected = |quantity: &str| &data.expected(quantity)["value"];
    let n = index(&data.inputs()["segments"]);
    let (frames, outlook) = pluck(&data, n);
    // Speeds are over the unstressed length, and the rope alone weighs what an unstressed metre does: on the stretched rope
    // waves are faster by the stretch, and slower by the root of what else the beads weigh.
    let value = |key: &str| number(&data.inputs()[key]);
    let stretch = 1.0 + value("T") / value("EA");
    let computed = outlook.waves[0].transverse[1] * stretch / stretch.sqrt();
    // The tension follows from a strain of 8e−5, which rounding leaves 12 digits.
    let tolerance = Tolerance::Relative(1e-12);
    check(
        "wave speed",
        &source,
        number(expected("wave speed")),
        computed,
        tolerance,
    );
    let quarters = |frame: &Frame, n: usize| [1, 2, 3].map(|k| frame.positions[k * n / 4].y);
    for (quantity, frame) in [
        ("discrete displacement at x=L/4, L/2, 3L/4 at t = T1/2", 2000),
        ("same at t = T1/4", 1000),
    ] {
        let computed = quarters(&frames[frame], n);
        let tolerance = Tolerance::Absolute(2e-7);
        check_all(quantity, &source, &numbers(expected(quantity)), &computed, tolerance);
    }
    // Beads blunt the kink of the continuous string: 40 of them by 5.7e-6 m, as the exact modal sum says too. More come
    // nearer.
    let fine = 10 * n;
    let mirrored = quarters(&pluck(&data, fine).0[2000], fine).map(|u| -u);
    let quantity = "continuous at T1/2: mirror image, values at L/4, L/2, 3L/4";
    let title = format!("{quantity}, {fine} segments");
    check_all(
        &title,
        &source,
        &numbers(expected(quantity)),
        &mirrored,
        Tolerance::Absolute(3e-6),
    );
}

#[test]
fn sudden_load_and_elongation_of_the_period() {
    let data = file!("pub-22-sudden-load-newmark");
    let source = data.source();
    let (half, stiffness, tension, mass) = (5.0, 2e6, 5e4, 100.0);
    let ready = two_strings(half, stiffness, half / (1.0 + tension / stiffness), mass);
    let is_period = |entry: &&Value| entry["quantity"] == "period";
    let exact = number(&data.all_expected().iter().find(is_period).expect("a period")["value"]);
    for steps in [10_u32, 20, 50, 100] {
        let h = 2.0 * PI / (number(&data.inputs()["linear_stiffness"]) / mass).sqrt() / f64::from(steps);
        let amplitude = 2e-4;
        let mut motion = ready.motion(AVERAGE, 400.0 * exact, h);
        motion.positions[1].y = amplitude;
        let computed = period(&lateral(&ready.run(&motion).0), amplitude, h) / (h * f64::from(steps));
        let quantity = format!("period ratio T_num/T at {steps} steps per period");
        let published = number(&data.expected(&quantity)["value"]);
        check(&quantity, &source, published, computed, Tolerance::Relative(1e-6));
    }
    let load = Vector3::new(0.0, 20.0, 0.0);
    let mut motion = ready.motion(AVERAGE, 4.0 * exact, exact / 2000.0);
    motion.case.nodal_forces[1] = load;
    let deflection = number(&data.expected("static deflection")["value"]);
    let mut settled = ready.reference.positions.clone();
    settled[1].y = deflection;
    motion.settled = Some(Settled {
        positions: settled,
        axial_forces: vec![tension; 2],
    });
    let (_, undamped) = ready.run(&motion);
    let peak = number(&data.expected("peak of the undamped step response")["value"]);
    let computed = undamped.peaks.movements[1].value;
    check(
        "peak of the undamped step response",
        &source,
        peak,
        computed,
        Tolerance::Relative(1e-3),
    );
    motion.damping.mass = 10.0;
    motion.duration = 6.0;
    let (frames, _) = ready.run(&motion);
    let at_rest = frames[frames.len() - 1].positions[1].y;
    check(
        "static deflection",
        &source,
        deflection,
        at_rest,
        Tolerance::Relative(1e-5),
    );
    let factor = number(&data.published()[0]["published"]);
    let computed = undamped.factors.movements[1].expect("the static movement is not nothing");
    let tolerance = Tolerance::Relative(1e-3);
    check("dynamic load factor", &source, factor, computed, tolerance);
}

#[test]
fn sudden_loss_of_a_rope() {
    let data = file!("pub-30-sudden-cable-removal");
    let source = data.source();
    let value = |key: &str| number(&data.inputs()[key]);
    let (mass, length, stiffness, gravity) = (value("mass"), value("L0"), value("EA"), value("g"));
    let before = numbers(&data.expected("static extension before, after")["value"])[0];
    let exact = number(&data.expected("period after removal")["value"]);
    for scheme in [AVERAGE, CONSERVING, Scheme::CentralDifferences] {
        let mut moving = Moving::default();
        let top = moving.node(Vector3::zeros(), 0.0, Some(SupportGiven::default()));
        let hung = moving.node(Vector3::new(0.0, 0.0, -length - before), mass, None);
        moving.rope(&[top, hung], stiffness, 0.0, length);
        moving.rope(&[top, hung], stiffness, 0.0, length);
        let ready = moving.ready();
        let mut motion = ready.motion(scheme, 3.0 * exact, exact / 1000.0);
        motion.case.nodal_forces[1].z = -mass * gravity;
        motion.breaks.push(Break {
            segments: vec![SegmentId::new(1)],
            when: BreakWhen::Time(0.0),
            release: 0.0,
        });
        let (frames, outcome) = ready.run(&motion);
        let extension: Vec<f64> = frames.iter().map(|f| -f.positions[1].z - length).collect();
        let named = |quantity: &str| format!("{quantity}, {scheme:?}");
        let single = |quantity: &str, computed: f64, tolerance: f64| {
            let expected = number(&data.expected(quantity)["value"]);
            check(
                &named(quantity),
                &source,
                expected,
                computed,
                Tolerance::Relative(tolerance),
            );
        };
        single("force in each cable before", stiffness / length * extension[0], 1e-9);
        single("peak force after removal", outcome.peaks.largest_forces[0].value, 1e-3);
        single("minimum force after removal", outcome.peaks.least_forces[0].value, 1e-3);
        let after = mass * gravity * length / stiffness;
        let swing: Vec<f64> = extension.iter().map(|e| e - after).collect();
        single(
            "period after removal",
            period(&swing, after - before, exact / 1000.0),
            1e-4,
        );
        let quantity = "extension at t = T/4, T/2";
        let computed = [extension[250], extension[500]];
        let tolerance = Tolerance::Absolute(1e-6);
        check_all(
            &named(quantity),
            &source,
            &numbers(&data.expected(quantity)["value"]),
            &computed,
            tolerance,
        );
        let factor = number(&data.published()[0]["published"]);
        let computed = outcome.peaks.largest_forces[0].value / (mass * gravity);
        check(
            &named("peak over weight"),
            &source,
            factor,
            computed,
            Tolerance::Relative(1e-3),
        );
    }
}

/// The saddle of four nodes of a file.
fn saddle(data: &Data) -> (Ready, Vec<Vector3<f64>>) {
    let list = |key: &str| data.model()[key].as_array().expect("a list");
    let held: Vec<_> = list("supports").iter().map(|support| index(&support["node"])).collect();
    let mass = number(&data.inputs()["node_mass"]);
    let mut moving = Moving::default();
    let nodes: Vec<_> = (list("nodes").iter().enumerate())
        .map(|(n, position)| {
            let support = held.contains(&n).then(SupportGiven::default);
            moving.node(vector(position), mass, support)
        })
        .collect();
    for element in list("elements") {
        let ends = ["i", "j"].map(|end| nodes[index(&element[end])]);
        moving.rope(&ends, number(&element["EA"]), 0.0, number(&element["L0"]));
    }
    let mut loads = vec![Vector3::zeros(); nodes.len()];
    for load in list("point_loads") {
        loads[index(&load["node"])] += vector(&load["F"]);
    }
    (moving.ready(), loads)
}

/// Moves the saddle of a file and compares movements, forces and energy. `damping`: force per mass and velocity (1/s).
fn move_saddle(data: &Data, damping: f64) {
    let source = data.source();
    let (ready, loads) = saddle(data);
    let times = numbers(&data.expected("times")["value"]);
    let duration = times[times.len() - 1];
    let run = |scheme: Scheme, step: f64| {
        let mut motion = ready.motion(scheme, duration, step);
        motion.case.nodal_forces.clone_from(&loads);
        motion.damping.mass = damping;
        // One frame at each of the times.
        #[allow(
            clippy::cast_possible_truncation,
            clippy::cast_sign_loss,
            reason = "a small whole number"
        )]
        {
            motion.frames.stride = (times[1] / step).round() as u64;
        }
        ready.run(&motion)
    };
    let moved = |frames: &[Frame], node: usize| -> Vec<f64> {
        let from = ready.reference.positions[node];
        frames
            .iter()
            .flat_map(|f| (f.positions[node] - from).data.0[0])
            .collect()
    };
    let schemes = [("averaged", AVERAGE), ("conserving", CONSERVING)];
    let energy_at_rest: f64 = loads
        .iter()
        .zip(&ready.reference.positions)
        .map(|(p, x)| p.dot(x))
        .sum();
    let energies = numbers(&data.expected("total energy (strain + kinetic - P.x) at these times")["value"]);
    for (name, scheme) in schemes {
        for (step, share) in [(1e-3, 2e-3), (1e-4, 5e-5)] {
            let (frames, outcome) = run(scheme, step);
            for (node, quantity) in [
                (0, "displacement of node 0 (x, y, z) at these times"),
                (3, "displacement of node 3"),
            ] {
                let expected = coordinates(&data.expected(quantity)["value"]);
                let peak = expected.iter().fold(0.0_f64, |most, u| most.max(u.abs()));
                let title = format!("{quantity}, {name}, step {step}");
                let tolerance = Tolerance::Absolute(share * peak);
                check_all(&title, &source, &expected, &moved(&frames, node), tolerance);
            }
            // Peaks of force ride on the stiffest modes: the fine step is what resolves them.
            if step == 1e-4 {
                let [largest, least] = ["largest member force in 0..tend", "smallest member force"];
                let forces = |peaks: &[transient::Peak]| peaks.iter().map(|p| p.value).collect::<Vec<_>>();
                let most = forces(&outcome.peaks.largest_forces).into_iter().fold(0.0, f64::max);
                let fewest = forces(&outcome.peaks.least_forces)
                    .into_iter()
                    .fold(f64::INFINITY, f64::min);
                let expected = number(&data.expected(largest)["value"]);
                check(
                    &format!("{largest}, {name}, step {step}"),
                    &source,
                    expected,
                    most,
                    Tolerance::Relative(1e-3),
                );
                let expected = number(&data.expected(least)["value"]);
                check(
                    &format!("{least}, {name}, step {step}"),
                    &source,
                    expected,
                    fewest,
                    Tolerance::Absolute(2.0),
                );
            }
            let title = format!("energy, {name}, step {step}");
            let total: Vec<f64> = frames.iter().map(|f| f.ledger.total() - energy_at_rest).collect();
            if damping == 0.0 && scheme == CONSERVING {
                check_all(&title, &source, &energies, &total, Tolerance::Relative(1e-9));
            }
        }
        if damping > 0.0 {
            // What damping takes is a series in even powers of the step; its limit is that of fine steps.
            let runs = [4e-4, 2e-4, 1e-4, 5e-5].map(|step| run(scheme, step).0);
            let limits: Vec<f64> = (0..times.len())
                .map(|k| halving_limit(&runs.each_ref().map(|frames| frames[k].ledger.total() - energy_at_rest)))
                .collect();
            let title = format!("energy, {name}, limit of halved steps");
            check_all(&title, &source, &energies, &limits, Tolerance::Relative(1e-9));
        }
        // The error falls with the square of the step.
        let exact: &Value = &data.expected("displacement of node 3")["value"];
        let exact = coordinates(exact);
        let errors = [1e-3, 5e-4, 2.5e-4].map(|step| {
            let computed = moved(&run(scheme, step).0, 3);
            let apart = computed.iter().zip(&exact).map(|(a, b)| (a - b) * (a - b));
            apart.sum::<f64>().sqrt()
        });
        check_second_order(&format!("displacement of node 3, {name}"), &source, &errors);
    }
}

#[test]
fn saddle_under_a_sudden_load() {
    move_saddle(&file!("inv-08-transient-saddle"), 0.0);
}

#[test]
fn saddle_that_comes_to_rest() {
    move_saddle(&file!("inv-10-transient-damped"), 3.0);
}

/// Two nodes on seven ropes, thrown so that these go slack and snatch, beside an independent solver.
///
/// The numbers are of SciPy 1.17.1, `solve_ivp`, DOP853 with rtol 1e-12, atol 1e-13 and steps of at most 2.5e-5 s; RK45
/// agrees to 6e-11 m.
#[test]
fn thrown_net_beside_an_independent_solver() {
    let source = "SciPy 1.17.1 solve_ivp, DOP853, rtol 1e-12 (invented net)";
    let expected = [
        [
            -0.005_369_803_079_890_554,
            -0.017_181_844_687_138_823,
            -0.108_882_377_032_588_42,
            2.001_790_451_488_983_7,
            0.003_033_222_593_234_144,
            -0.094_365_805_275_393_91,
        ],
        [
            0.003_867_874_707_914_38,
            0.003_937_987_237_139_72,
            0.014_859_732_033_647_884,
            2.001_278_215_561_361_3,
            -0.002_572_263_549_806_336_3,
            -0.011_510_829_067_454_577,
        ],
        [
            -0.015_115_713_150_986_103,
            -0.013_143_691_328_447_96,
            -0.131_437_053_084_793_42,
            1.998_208_961_530_823_8,
            -0.008_237_220_144_627_612,
            -0.044_035_535_333_766_24,
        ],
    ]
    .concat();
    let mut moving = Moving::default();
    let positions = [
        [0.0, 0.0, 0.0],
        [2.0, 0.0, 0.0],
        [-2.0, 0.0, 0.3],
        [4.0, 0.0, 0.3],
        [0.0, 2.0, -0.4],
        [0.0, -2.0, -0.4],
        [2.0, 2.0, -0.4],
        [2.0, -2.0, -0.4],
    ]
    .map(Vector3::from);
    let nodes: Vec<_> = (positions.iter().enumerate())
        .map(|(n, position)| moving.node(*position, 6.0, (n > 1).then(SupportGiven::default)))
        .collect();
    for [i, j] in [[2, 0], [0, 1], [1, 3], [0, 4], [0, 5], [1, 6], [1, 7]] {
        let length = (positions[j] - positions[i]).norm() / 1.001;
        moving.rope(&[nodes[i], nodes[j]], 3e5, 0.0, length);
    }
    let ready = moving.ready();
    for scheme in [AVERAGE, CONSERVING, Scheme::CentralDifferences] {
        let mut motion = ready.motion(scheme, 0.3, 1e-5);
        motion.case.nodal_forces[0].z = -60.0;
        motion.case.nodal_forces[1].z = -60.0;
        motion.velocities = vec![Vector3::zeros(); positions.len()];
        motion.velocities[0] = Vector3::new(0.5, 1.0, -2.0);
        motion.velocities[1] = Vector3::new(-0.8, 0.4, 3.0);
        motion.frames.stride = 10_000;
        let (frames, outcome) = ready.run(&motion);
        let computed: Vec<f64> = (frames[1..].iter())
            .flat_map(|frame| frame.positions[..2].iter().flat_map(|x| [x.x, x.y, x.z]))
            .collect();
        let title = format!("thrown net, positions at 0.1, 0.2, 0.3 s, {scheme:?}");
        check_all(&title, source, &expected, &computed, Tolerance::Absolute(2e-6));
        let counts = [outcome.events.slackenings as f64, outcome.events.snatches as f64];
        let title = format!("thrown net, times that ropes go slack and snatch, {scheme:?}");
        check_all(&title, source, &[18.0, 15.0], &counts, Tolerance::Absolute(0.0));
    }
}
