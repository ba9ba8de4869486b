//! Motions of small nets: closed forms, balance of energy, order, and what is refused.

mod air;
mod stuck;
mod watched;

use std::ops::ControlFlow;
use std::sync::Arc;

use nalgebra::Vector3;

use super::*;
use crate::equilibrium::Analysis;
use crate::load::{Case, SegmentLoads};
use crate::model::{CableGiven, Net, NodeId, PanelGiven, ReferenceState, SegmentId, Slide};
use crate::motion::MassGiven;
use crate::test_nets::{Sketch, section};

/// A net with a state to start from, whether that balances or not.
struct Start {
    analysis: Arc<Analysis>,
    reference: Arc<ReferenceState>,
}

impl Start {
    fn new(net: Net, unstressed_lengths: Vec<f64>) -> Self {
        let positions: Vec<_> = net.nodes().iter().map(|n| n.position.expect("given")).collect();
        Self {
            reference: Arc::new(ReferenceState {
                positions,
                unstressed_lengths,
                axial_forces: vec![0.0; net.segments().len()],
            }),
            analysis: Arc::new(Analysis::new(Arc::new(net))),
        }
    }

    fn net(&self) -> &Net {
        self.analysis.structure().net()
    }

    fn case(&self) -> Case {
        let (nodes, segments) = (self.net().nodes().len(), self.net().segments().len());
        Case {
            nodal_forces: vec![Vector3::zeros(); nodes],
            unstressed_lengths: self.reference.unstressed_lengths.clone(),
            segments: vec![SegmentLoads::default(); segments],
            support_movements: vec![Vector3::zeros(); nodes],
            removed: vec![false; segments],
            ..Case::default()
        }
    }

    fn force(&self, node: usize, force: Vector3<f64>) -> Box<Case> {
        let mut case = self.case();
        case.nodal_forces[node] = force;
        Box::new(case)
    }

    fn motion(&self, scheme: Scheme, duration: f64, step: f64) -> Motion {
        Motion {
            reference: Arc::clone(&self.reference),
            positions: self.reference.positions.clone(),
            velocities: Vec::new(),
            masses: MassGiven::default(),
            case: self.case(),
            driven: Vec::new(),
            breaks: Vec::new(),
            damping: Damping::default(),
            scheme,
            duration,
            step,
            frames: Frames::default(),
            watched: Vec::new(),
            spectra: None,
            settled: None,
        }
    }

    fn run(&self, motion: &Motion) -> Outcome {
        let motion = Arc::new(motion.clone());
        run(&self.analysis, &motion, &mut |_| ControlFlow::Continue(())).expect("a motion")
    }

    fn refusal(&self, motion: &Motion) -> MotionError {
        let refused = Running::begin(Arc::clone(&self.analysis), Arc::new(motion.clone()));
        refused.expect_err("refused")
    }
}

/// A saddle of 3 × 3 free nodes of 20 kg, 1 m apart, on ropes of which each is as long as its chord times `stretch`.
fn saddle(stretch: f64) -> Start {
    stretched(saddle_sketch(), stretch)
}

fn saddle_sketch() -> Sketch {
    let mut sketch = Sketch::default();
    let name = |i: usize, j: usize| format!("n{i}{j}");
    for i in 0..5 {
        for j in 0..5 {
            let (x, y) = (i as f64 - 2.0, j as f64 - 2.0);
            let position = [x, y, 0.15 * (x * x - y * y)];
            let (inner_i, inner_j) = ((1..4).contains(&i), (1..4).contains(&j));
            match (inner_i, inner_j) {
                (true, true) => sketch.node(&name(i, j), position).attached_mass = 20.0,
                (true, false) | (false, true) => sketch.held(&name(i, j), position),
                (false, false) => {}
            }
        }
    }
    for line in 1..4 {
        for along in [true, false] {
            let path: Vec<_> = (0..5)
                .map(|k| if along { name(k, line) } else { name(line, k) })
                .collect();
            sketch.cable(&format!("{along}{line}"), section(4e5, 0.5), &path.join(" "));
        }
    }
    sketch
}

/// Every segment of a sketch as long as its chord over `stretch`.
fn stretched(sketch: Sketch, stretch: f64) -> Start {
    let net = sketch.net();
    let lengths = net.segments().iter().map(|segment| {
        let [a, b] = segment.ends.map(|n| net.nodes()[n.index()].position.expect("given"));
        (b - a).norm() / stretch
    });
    let lengths = lengths.collect();
    Start::new(net, lengths)
}

/// One rope of 2 m, EA 2e4 N, from a held node to one of 5 kg that moves along x.
fn single() -> Start {
    single_of(5.0)
}

/// The same with a mass (kg).
fn single_of(mass: f64) -> Start {
    let mut sketch = Sketch::default();
    sketch.held("wall", [0.0, 0.0, 0.0]);
    let node = sketch.node("mass", [2.0, 0.0, 0.0]);
    node.attached_mass = mass;
    node.support = Some(crate::model::SupportGiven {
        released: vec![Vector3::x()],
    });
    sketch.cable("rope", section(2e4, 0.0), "wall mass");
    Start::new(sketch.net(), vec![2.0])
}

const CONSERVING: Scheme = Scheme::Conserving { error: None };

const AVERAGE: Scheme = Scheme::GeneralisedAlpha {
    spectral_radius: 1.0,
    error: None,
};

/// Thrown about so that ropes go slack and snatch all the time.
fn thrown(start: &Start, motion: &mut Motion) {
    let dofs = start.analysis.structure().dofs();
    motion.velocities = (0..start.net().nodes().len())
        .map(|n| match dofs.directions(NodeId::new(n)).len() {
            3 => {
                Vector3::new(
                    (n * 7 % 5) as f64 - 2.0,
                    (n * 3 % 7) as f64 - 3.0,
                    (n * 5 % 11) as f64 - 5.0,
                ) * 0.6
            }
            _ => Vector3::zeros(),
        })
        .collect();
}

#[test]
fn energy_stays_over_ten_thousand_steps_with_thousands_of_snatches() {
    for step in [1e-3, 5e-3] {
        let start = saddle(1.0);
        let mut motion = start.motion(CONSERVING, 1e4 * step, step);
        thrown(&start, &mut motion);
        let outcome = start.run(&motion);
        assert_eq!(outcome.ending, Ending::Done);
        assert!(outcome.steps >= 10_000);
        let first = 0.5 * 20.0 * motion.velocities.iter().map(Vector3::norm_squared).sum::<f64>();
        let drift = outcome.largest_error / first;
        assert!(outcome.events.snatches >= 3_000, "{}", outcome.events.snatches);
        assert!(drift <= 1e-9, "{drift:e}");
    }
}

#[test]
fn a_factor_serves_as_long_as_the_residual_falls() {
    for scheme in [AVERAGE, CONSERVING] {
        let start = saddle(1.01);
        let mut motion = start.motion(scheme, 1.0, 1e-3);
        motion.driven.push(Driven::Case {
            case: start.force(6, Vector3::new(30.0, 0.0, -300.0)),
            history: History::Step {
                at: 0.1,
                before: 0.0,
                after: 1.0,
            },
        });
        motion.breaks = vec![Break {
            segments: vec![SegmentId::new(3)],
            when: BreakWhen::Time(0.5),
            release: 0.0,
        }];
        let calm = start.run(&motion);
        assert_eq!((calm.ending, calm.steps), (Ending::Done, 1000));
        assert!(calm.factorisations <= 10, "{scheme:?}: {}", calm.factorisations);
        assert!(calm.iterations >= 2000, "{scheme:?}: {}", calm.iterations);
        if scheme == CONSERVING {
            assert!(calm.largest_error <= 1e-10 * calm.ledger.total(), "{:?}", calm.ledger);
        }
        // Where ropes snatch all the time, it often does not.
        let start = saddle(1.0);
        let mut motion = start.motion(scheme, 5.0, 5e-3);
        thrown(&start, &mut motion);
        let wild = start.run(&motion);
        assert_eq!((wild.ending, wild.steps), (Ending::Done, 1000));
        assert!(wild.factorisations >= 500, "{scheme:?}: {}", wild.factorisations);
    }
}

#[test]
fn every_scheme_is_of_second_order() {
    let others = [0.5, 0.0].map(|spectral_radius| Scheme::GeneralisedAlpha {
        spectral_radius,
        error: None,
    });
    for scheme in [AVERAGE, others[0], others[1], CONSERVING, Scheme::CentralDifferences] {
        let start = saddle(1.01);
        let end = |step: f64| {
            let mut motion = start.motion(scheme, 0.08, step);
            motion.damping = Damping {
                mass: 1.0,
                stiffness: 1e-4,
                segments: vec![20.0; 24],
            };
            motion.driven.push(Driven::Case {
                case: start.force(6, Vector3::new(100.0, 50.0, -900.0)),
                history: History::Harmonic {
                    mean: 0.0,
                    amplitude: 1.0,
                    frequency: 12.0,
                    phase: 0.3,
                    start: 0.0,
                    end: 1.0,
                },
            });
            let outcome = start.run(&motion);
            assert_eq!(outcome.events.slackenings, 0);
            outcome.positions
        };
        let all = [1.0, 0.5, 0.25].map(|share| end(4e-4 * share));
        let change = |a: usize| -> f64 {
            let pairs = all[a].iter().zip(&all[a + 1]);
            pairs.map(|(x, y)| (x - y).norm_squared()).sum::<f64>().sqrt()
        };
        let order = (change(0) / change(1)).log2();
        assert!((order - 2.0).abs() < 0.1, "{scheme:?}: {order}");
    }
}

#[test]
fn the_ledger_closes_with_all_that_acts() {
    let start = saddle(1.002);
    let mut motion = start.motion(CONSERVING, 1.0, 2e-3);
    thrown(&start, &mut motion);
    motion.damping = Damping {
        mass: 0.4,
        stiffness: 0.0,
        segments: vec![60.0; 24],
    };
    motion.driven.push(Driven::Case {
        case: start.force(6, Vector3::new(0.0, 30.0, -500.0)),
        history: History::Step {
            at: 0.1,
            before: 0.0,
            after: 1.0,
        },
    });
    let mut shaken = start.case();
    for support in start.net().supports() {
        shaken.support_movements[support.node().index()] = Vector3::new(0.05, 0.0, 0.02);
    }
    motion.driven.push(Driven::Case {
        case: Box::new(shaken),
        history: History::Harmonic {
            mean: 0.0,
            amplitude: 1.0,
            frequency: 2.0,
            phase: 0.0,
            start: 0.0,
            end: 10.0,
        },
    });
    motion.breaks = vec![
        Break {
            segments: vec![SegmentId::new(3)],
            when: BreakWhen::Time(0.3111),
            release: 0.05,
        },
        Break {
            segments: vec![SegmentId::new(17)],
            when: BreakWhen::Time(0.6),
            release: 0.0,
        },
    ];
    let outcome = start.run(&motion);
    assert_eq!(outcome.ending, Ending::Done);
    let ledger = outcome.ledger;
    assert!(ledger.work.abs() > 1.0 && ledger.dissipated > 1.0, "{ledger:?}");
    assert!(outcome.largest_error <= 1e-10 * ledger.total(), "{ledger:?}");
    let breaks = outcome.events.first.iter().filter(|e| e.kind == EventKind::Break);
    assert_eq!(breaks.map(|e| e.time).collect::<Vec<_>>(), [0.3111, 0.6]);
    // The other schemes leave an error; where ropes snatch on dashpots it falls with the step.
    let error = |step| {
        let motion = Motion {
            scheme: AVERAGE,
            step,
            ..motion.clone()
        };
        start.run(&motion).ledger.error.abs()
    };
    let errors = [1e-4, 5e-5].map(error);
    assert!(errors[0] < 5e-3 * ledger.total() && errors[1] < 0.6 * errors[0]);
}

/// A mast on springs with guys, one of them over a node on a skew roller; a panel between. Its foot.
fn mast() -> (Start, NodeId) {
    let mut sketch = Sketch::default();
    sketch.sprung("foot", [0.0, 0.0, 0.0], [3e4, 2e4, 5e5]);
    sketch.node("foot", [0.0, 0.0, 0.0]).attached_mass = 30.0;
    sketch.node("head", [0.5, 0.0, 4.0]).attached_mass = 60.0;
    sketch.node("rail", [4.0, 1.0, 1.0]).attached_mass = 15.0;
    sketch.node("rail", [4.0, 1.0, 1.0]).support = Some(crate::model::SupportGiven {
        released: vec![Vector3::new(1.0, 0.5, 0.2), Vector3::new(0.0, 0.3, 1.0)],
    });
    for (name, place) in [
        ("a", [-3.0, 2.0, 0.0]),
        ("b", [-3.0, -2.0, 0.0]),
        ("c", [5.0, 3.0, 2.0]),
        ("d", [6.0, -2.0, 0.0]),
    ] {
        sketch.held(name, place);
    }
    sketch.strut("mast", section(2e7, 3.0), "foot", "head");
    for path in ["head a", "head b", "head rail", "rail c", "rail d"] {
        sketch.cable(path, section(8e5, 0.5), path);
    }
    sketch.given.panels.push(PanelGiven {
        name: "panel".to_owned(),
        corners: [1, 4, 2].map(NodeId::new).to_vec(),
    });
    let net = sketch.net();
    let ends = net.segments().iter().map(|segment| {
        let [a, b] = segment.ends.map(|n| net.nodes()[n.index()].position.expect("given"));
        (segment.length, (b - a).norm() / 1.002)
    });
    let mut lengths = vec![0.0; net.n_lengths()];
    ends.for_each(|(place, length)| lengths[place] = length);
    (Start::new(net, lengths), NodeId::new(0))
}

#[test]
fn springs_struts_and_skew_supports_keep_the_energy() {
    let (start, _) = mast();
    let mut motion = start.motion(CONSERVING, 2.0, 2e-3);
    for (force, mass) in motion.case.nodal_forces.iter_mut().zip([30.0, 60.0, 15.0]) {
        force.z = -9.81 * mass;
    }
    let quiet = start.run(&motion);
    assert_eq!(quiet.ending, Ending::Done);
    assert!(quiet.events.snatches > 0);
    let scale = quiet.ledger.elastic + quiet.ledger.kinetic;
    assert!(quiet.largest_error <= 1e-10 * scale, "{:?}", quiet.ledger);
    // The ground under the springs moves: its work is in the ledger too.
    let mut shaken = start.case();
    shaken.support_movements[0] = Vector3::new(0.02, -0.03, 0.04);
    motion.driven.push(Driven::Case {
        case: Box::new(shaken),
        history: History::Ramp {
            start: 0.2,
            end: 0.6,
            before: 0.0,
            after: 1.0,
        },
    });
    let moved = start.run(&motion);
    assert!(moved.ledger.work.abs() > 1.0);
    assert!(moved.largest_error <= 1e-10 * scale, "{:?}", moved.ledger);
}

#[test]
fn a_thrown_mass_goes_slack_after_half_a_period_and_flies_on() {
    let start = single();
    // Stiffness 1e4 N/m, 5 kg: ω = √2000; taut from the start, slack after π/ω, back through its start and off.
    let omega = 2000.0_f64.sqrt();
    for scheme in [AVERAGE, CONSERVING, Scheme::CentralDifferences] {
        let mut motion = start.motion(scheme, 0.15, 1e-4);
        motion.velocities = vec![Vector3::zeros(), Vector3::x()];
        motion.case.unstressed_lengths[0] = 2.0;
        let outcome = start.run(&motion);
        assert_eq!((outcome.events.slackenings, outcome.events.snatches), (1, 1));
        let slack = outcome.events.first[1];
        assert!(
            (slack.time - std::f64::consts::PI / omega).abs() < 1e-6,
            "{scheme:?} {slack:?}"
        );
        let peak = outcome.peaks.largest_forces[0].value;
        // Inertia against stiffness: T = v √(k m).
        assert!((peak - (1e4_f64 * 5.0).sqrt()).abs() < 1e-3 * peak, "{scheme:?} {peak}");
        assert!((outcome.velocities[1].x + 1.0).abs() < 1e-3);
        let flown = 2.0 - (0.15 - std::f64::consts::PI / omega);
        assert!((outcome.positions[1].x - flown).abs() < 1e-4, "{scheme:?}");
    }
}

#[test]
fn a_rope_breaks_at_its_tension() {
    let start = single();
    let mut motion = start.motion(AVERAGE, 0.05, 1e-4);
    motion.velocities = vec![Vector3::zeros(), Vector3::x()];
    motion.breaks.push(Break {
        segments: vec![SegmentId::new(0)],
        when: BreakWhen::Tension(100.0),
        release: 0.0,
    });
    let outcome = start.run(&motion);
    let event = outcome
        .events
        .first
        .iter()
        .find(|e| e.kind == EventKind::Break)
        .expect("it breaks");
    let omega = 2000.0_f64.sqrt();
    let expected = (100.0 / (1e4_f64 * 5.0).sqrt()).asin() / omega;
    assert!(
        event.time >= expected && event.time <= expected + 1e-4 + 1e-12,
        "{event:?}"
    );
    // What is left is the kinetic energy of that moment; the rest went with the rope.
    let released = 100.0_f64.powi(2) / 2e4;
    assert!((outcome.ledger.released - released).abs() < 0.05 * released);
    assert!((outcome.ledger.kinetic + outcome.ledger.released - 2.5).abs() < 1e-5);
    assert_eq!(outcome.ledger.elastic, 0.0);
}

#[test]
fn moving_ground_shakes_a_mass() {
    // The wall follows a ramp s = c t: a taut mass answers with x − x0 = c t − (c/ω) sin ωt as long as it stays taut.
    let start = single();
    let mut motion = start.motion(CONSERVING, 0.1, 5e-5);
    motion.case.unstressed_lengths[0] = 1.9;
    let pull = 2e4 * (2.0 / 1.9 - 1.0);
    motion.case.nodal_forces[1] = Vector3::new(pull, 0.0, 0.0);
    let mut shaken = start.case();
    shaken.support_movements[0] = -Vector3::x();
    motion.driven.push(Driven::Case {
        case: Box::new(shaken),
        history: History::Table(vec![(0.0, 0.0), (1.0, 0.5)]),
    });
    let outcome = start.run(&motion);
    let omega = (2e4_f64 / 1.9 / 5.0).sqrt();
    let expected = 2.0 - 0.5 * (0.1 - (omega * 0.1).sin() / omega);
    assert!(
        (outcome.positions[1].x - expected).abs() < 1e-6,
        "{}",
        outcome.positions[1].x
    );
    assert!((outcome.positions[0].x + 0.05).abs() < 1e-12);
    assert!(outcome.largest_error < 1e-10);
}

#[test]
fn moving_ground_pulls_at_dashpots_without_lag() {
    // Dashpots feel the velocity of the ground at the end of a step, not in its middle: else they are of first order.
    let start = single();
    for scheme in [AVERAGE, CONSERVING, Scheme::CentralDifferences] {
        let end = |step: f64| {
            let mut motion = start.motion(scheme, 0.1, step);
            motion.case.unstressed_lengths[0] = 1.9;
            let pull = 2e4 * (2.0 / 1.9 - 1.0);
            motion.case.nodal_forces[1] = Vector3::new(pull, 0.0, 0.0);
            motion.damping.segments = vec![200.0];
            let mut shaken = start.case();
            shaken.support_movements[0] = Vector3::x() * 1e-3;
            motion.driven.push(Driven::Case {
                case: Box::new(shaken),
                history: History::Harmonic {
                    mean: 0.0,
                    amplitude: 1.0,
                    frequency: 12.0,
                    phase: 0.0,
                    start: 0.0,
                    end: 1.0,
                },
            });
            start.run(&motion).positions[1].x
        };
        let all = [4e-4, 2e-4, 1e-4].map(end);
        let order = ((all[0] - all[1]) / (all[1] - all[2])).abs().log2();
        assert!((order - 2.0).abs() < 0.1, "{scheme:?}: {order}");
    }
}

#[test]
fn wind_damps_what_moves_with_it() {
    // A plate of 4 m² that moves along x: m ẍ = ½ ρ c A |U − ẋ| (U − ẋ) without ropes. From rest, U − ẋ = U / (1 + U t/b),
    // b = 2 m / (ρ c A).
    let mut sketch = Sketch::default();
    for (name, y, z) in [("a", 0.0, 0.0), ("b", 2.0, 0.0), ("c", 2.0, 2.0), ("d", 0.0, 2.0)] {
        sketch.node(name, [0.0, y, z]).attached_mass = 5.0;
    }
    sketch.held("far", [9.0, 0.0, 0.0]);
    sketch.cable("slack", section(1e3, 0.0), "a far");
    sketch.given.panels.push(PanelGiven {
        name: "plate".to_owned(),
        corners: (0..4).map(NodeId::new).collect(),
    });
    let start = Start::new(sketch.net(), vec![50.0]);
    let mut motion = start.motion(AVERAGE, 1.0, 1e-3);
    motion.driven.push(Driven::Wind {
        coefficients: vec![-1.2],
        density: 1.25,
        along: Vector3::x(),
        speed: History::Constant(15.0),
    });
    let outcome = start.run(&motion);
    let b = 2.0 * 20.0 / (1.25 * 1.2 * 4.0);
    let expected = 15.0 - 15.0 / (1.0 + 15.0 / b);
    for node in 0..4 {
        let v = outcome.velocities[node].x;
        assert!((v - expected).abs() < 1e-4 * expected, "{v} {expected}");
    }
}

#[test]
fn divided_steps_keep_the_error() {
    let start = saddle(1.01);
    let run = |error, step| {
        let scheme = Scheme::GeneralisedAlpha {
            spectral_radius: 0.9,
            error,
        };
        let mut motion = start.motion(scheme, 0.2, step);
        thrown(&start, &mut motion);
        start.run(&motion)
    };
    let (fine, divided) = (run(None, 2e-5), run(Some(1e-6), 2e-2));
    assert_eq!(divided.ending, Ending::Done);
    assert!(divided.smallest_step < 5e-3);
    let apart = fine
        .positions
        .iter()
        .zip(&divided.positions)
        .map(|(a, b)| (a - b).norm());
    let apart = apart.fold(0.0, f64::max);
    assert!(apart < 1e-6 * divided.steps as f64, "{apart:e}");
}

#[test]
fn explicit_steps_are_as_many_as_foreseen() {
    let start = single();
    // The bound is ω² = 2 k/m = 4000, so that the stable step is 2/ω = 0.0316 s; nine tenths are used: 0.03 s does not do.
    for (step, parts) in [(0.028, 1.0), (0.03, 2.0), (0.1, 4.0)] {
        let motion = start.motion(Scheme::CentralDifferences, 10.0 * step, step);
        let foreseen = outlook(&start.analysis, &Arc::new(motion.clone()))
            .expect("a motion")
            .extent;
        assert_eq!(foreseen.divided_steps, 10.0 * parts);
        assert_eq!(start.run(&motion).steps as f64, foreseen.divided_steps);
    }
}

#[test]
fn it_stops_within_one_iteration() {
    let start = saddle(1.01);
    let motion = Arc::new(start.motion(AVERAGE, 1.0, 1e-3));
    let mut told = 0;
    let outcome = run(&start.analysis, &motion, &mut |progress| {
        told += 1;
        match progress {
            Progress::Iteration { .. } if told > 20 => ControlFlow::Break(()),
            _ => ControlFlow::Continue(()),
        }
    });
    let outcome = outcome.expect("a motion");
    assert_eq!(outcome.ending, Ending::Cancelled);
    assert_eq!(told, 21);
}

#[test]
#[allow(clippy::disallowed_methods, reason = "that is what is tried here")]
fn a_motion_that_waits_and_changes_threads_comes_to_the_same_bits() {
    let averaged = Scheme::GeneralisedAlpha {
        spectral_radius: 0.8,
        error: Some(1e-5),
    };
    for scheme in [averaged, CONSERVING, Scheme::CentralDifferences] {
        let start = saddle(1.002);
        let mut motion = start.motion(scheme, 0.1003, 1e-3);
        thrown(&start, &mut motion);
        motion.damping.segments = vec![30.0; 24];
        motion.breaks = vec![Break {
            segments: vec![SegmentId::new(3)],
            when: BreakWhen::Time(0.0311),
            release: 0.02,
        }];
        motion.frames = Frames {
            stride: 10,
            nodes: (0..9).map(NodeId::new).collect(),
            cables: vec![crate::model::CableId::new(2)],
        };
        let motion = Arc::new(motion);
        let mut at_once = Vec::new();
        let outcome = run(&start.analysis, &motion, &mut |progress| {
            if let Progress::Frame(frame) = progress {
                at_once.push(frame.clone());
            }
            ControlFlow::Continue(())
        });
        let mut running = Running::begin(Arc::clone(&start.analysis), motion).expect("a motion");
        let mut in_parts = Vec::new();
        loop {
            let (moved, frame) = std::thread::spawn(move || {
                let frame = running.next_frame(&mut |_| ControlFlow::Continue(()));
                (running, frame)
            })
            .join()
            .expect("it goes on");
            running = moved;
            match frame {
                Some(frame) => {
                    assert_eq!(frame.time, running.time());
                    in_parts.push(frame);
                }
                None => break,
            }
        }
        assert_eq!(running.ending(), Some(Ending::Done));
        let steps: Vec<u64> = in_parts.iter().map(|frame| frame.step).collect();
        assert_eq!(steps, [0, 10, 20, 30, 40, 50, 60, 70, 80, 90, 100, 101]);
        assert_eq!(in_parts[11].time, 0.1003);
        assert_eq!(in_parts, at_once, "{scheme:?}");
        assert_eq!(running.finish(), outcome.expect("a motion"), "{scheme:?}");
    }
}

#[test]
fn a_motion_under_way_stops_within_one_iteration() {
    for scheme in [AVERAGE, CONSERVING, Scheme::CentralDifferences] {
        let start = saddle(1.01);
        let motion = Arc::new(start.motion(scheme, 1.0, 1e-3));
        let mut running = Running::begin(Arc::clone(&start.analysis), motion).expect("a motion");
        let mut told = 0;
        let mut observe = |_: Progress<'_>| {
            told += 1;
            if told == 8 {
                ControlFlow::Break(())
            } else {
                ControlFlow::Continue(())
            }
        };
        assert_eq!(running.next_frame(&mut observe).expect("the start").step, 0);
        assert_eq!(running.ending(), None);
        assert_eq!(running.next_frame(&mut observe), None);
        assert_eq!(running.next_frame(&mut observe), None);
        assert_eq!(told, 8, "{scheme:?}");
        assert_eq!(running.ending(), Some(Ending::Cancelled));
        assert!(running.time() < 8e-3);
    }
}

#[test]
fn frames_show_a_wave_along_a_rope() {
    // A taut rope of 80 segments struck at one end: the front is where √(T/m) t says, less by the stretch of 1.005.
    let mut sketch = Sketch::default();
    let names: Vec<_> = (0..81).map(|k| format!("k{k}")).collect();
    for (k, name) in names.iter().enumerate() {
        let position = [0.25 * k as f64, 0.0, 0.0];
        match k {
            0 | 80 => sketch.held(name, position),
            _ => sketch.node(name, position).attached_mass = 0.0,
        }
    }
    sketch.cable("rope", section(1e6, 2.0), &names.join(" "));
    let start = Start::new(sketch.net(), vec![0.25 / 1.005; 80]);
    let mut motion = start.motion(AVERAGE, 0.2, 5e-4);
    motion.velocities = vec![Vector3::zeros(); 81];
    for node in 1..=4 {
        motion.velocities[node] = Vector3::z() * 0.1;
    }
    motion.frames = Frames {
        stride: 400,
        nodes: vec![NodeId::new(3)],
        cables: vec![crate::model::CableId::new(0)],
    };
    let motion = Arc::new(motion);
    let told = outlook(&start.analysis, &motion).expect("a motion");
    let speed = (5000.0_f64 / 2.0 / 1.005).sqrt();
    assert!((told.waves[0].transverse[1] - speed).abs() < 1e-9 * speed);
    assert!((told.waves[0].axial - (1e6_f64 / 2.0).sqrt()).abs() < 1e-9);
    assert!(told.cautions.is_empty());
    assert_eq!((told.extent.steps, told.extent.frames), (400, 2));
    let mut frames = Vec::new();
    let outcome = run(&start.analysis, &motion, &mut |progress| {
        if let Progress::Frame(frame) = progress {
            frames.push(frame.clone());
        }
        ControlFlow::Continue(())
    });
    assert_eq!(outcome.expect("a motion").ending, Ending::Done);
    assert_eq!(frames.len(), 2);
    let field = &frames[1].cables[0];
    assert_eq!(field.positions[3], frames[1].positions[0]);
    // The displaced part reaches as far as the front, and no further.
    let front = (0..81).rev().find(|k| field.positions[*k].z > 2e-4).expect("moved");
    let reached = field.material[front];
    let expected = 1.0 + speed * 0.2;
    assert!((reached - expected).abs() < 0.75, "{reached} {expected}");
    let coarse = Motion {
        step: 0.02,
        ..(*motion).clone()
    };
    let told = outlook(&start.analysis, &Arc::new(coarse)).expect("a motion");
    assert!(matches!(told.cautions[0], Caution::Wave { needed, .. } if (needed - 0.25 / 1.005 / speed).abs() < 1e-9));
}

#[test]
fn what_can_not_move_is_refused() {
    let start = saddle(1.01);
    let good = start.motion(AVERAGE, 1.0, 1e-3);
    let refusal = |change: &dyn Fn(&mut Motion)| {
        let mut motion = good.clone();
        change(&mut motion);
        start.refusal(&motion)
    };
    let number = |error: MotionError| match error {
        MotionError::Number { what, .. } => what,
        other => panic!("{other}"),
    };
    assert_eq!(number(refusal(&|m| m.step = 0.0)), "step");
    assert_eq!(number(refusal(&|m| m.step = 2.0)), "step");
    assert_eq!(number(refusal(&|m| m.duration = f64::NAN)), "duration");
    assert_eq!(number(refusal(&|m| m.damping.mass = -1.0)), "damping by mass");
    assert_eq!(
        number(refusal(&|m| m.damping.segments = vec![-1.0; 24])),
        "dashpot of a segment"
    );
    let radius = Scheme::GeneralisedAlpha {
        spectral_radius: 1.5,
        error: None,
    };
    assert_eq!(number(refusal(&|m| m.scheme = radius)), "spectral radius");
    let huge = refusal(&|m| m.step = 1e-9);
    assert!(
        matches!(huge, MotionError::TooLarge { steps, .. } if (steps - 1e9).abs() < 1.0),
        "{huge}"
    );
    let stiff = refusal(&|m| {
        m.scheme = Scheme::CentralDifferences;
        m.duration = 1e6;
        m.step = 1.0;
    });
    assert!(
        matches!(stiff, MotionError::TooLarge { steps, .. } if steps > 1e8),
        "{stiff}"
    );
    let late = Break {
        segments: vec![SegmentId::new(0)],
        when: BreakWhen::Time(1.0),
        release: 0.0,
    };
    assert_eq!(number(refusal(&|m| m.breaks = vec![late.clone()])), "time of a break");
    let shown = refusal(&|m| m.frames.nodes.push(NodeId::new(99)));
    assert!(
        matches!(
            shown,
            MotionError::NotShown {
                what: "node",
                index: 99,
                ..
            }
        ),
        "{shown}"
    );
    let shown = refusal(&|m| m.frames.cables.push(crate::model::CableId::new(6)));
    assert!(
        matches!(
            shown,
            MotionError::NotShown {
                what: "cable",
                present: 6,
                ..
            }
        ),
        "{shown}"
    );
    let given = |segment, when| Break {
        segments: vec![SegmentId::new(segment)],
        when,
        release: 0.0,
    };
    let none = refusal(&|m| {
        m.breaks = vec![Break {
            segments: Vec::new(),
            ..given(0, BreakWhen::Time(0.0))
        }];
    });
    assert!(matches!(none, MotionError::NothingBreaks { place: 0 }), "{none}");
    let gone = refusal(&|m| m.breaks = vec![given(24, BreakWhen::Time(0.0))]);
    assert!(matches!(gone, MotionError::NotThere { place: 0, .. }), "{gone}");
    let twice = refusal(&|m| m.breaks = vec![given(3, BreakWhen::Time(0.0)), given(3, BreakWhen::Tension(1.0))]);
    assert!(matches!(twice, MotionError::BrokenTwice { place: 1, .. }), "{twice}");
    let taken = refusal(&|m| {
        m.case.removed[3] = true;
        m.breaks = vec![given(3, BreakWhen::Time(0.0))];
    });
    assert!(matches!(taken, MotionError::NotThere { .. }), "{taken}");
    let held = refusal(&|m| m.velocities = vec![Vector3::x(); m.positions.len()]);
    assert!(matches!(held, MotionError::HeldVelocity { .. }), "{held}");
    let driven = |history, case: Case| Driven::Case {
        case: Box::new(case),
        history,
    };
    let table = History::Table(vec![(1.0, 0.0), (0.5, 0.0)]);
    let order = refusal(&|m| m.driven = vec![driven(table.clone(), start.case())]);
    assert!(matches!(order, MotionError::History { driven: 0, .. }), "{order}");
    let mut warm = start.case();
    warm.segments[0].temperature_change = 5.0;
    let warm = refusal(&|m| m.driven = vec![driven(History::Constant(1.0), warm.clone())]);
    assert!(
        matches!(
            warm,
            MotionError::Driven {
                what: "temperatures",
                ..
            }
        ),
        "{warm}"
    );
    let mut shaken = start.case();
    shaken.support_movements[0] = Vector3::x();
    let jump = refusal(&|m| m.driven = vec![driven(History::Constant(1.0), shaken.clone())]);
    assert!(matches!(jump, MotionError::Driven { .. }), "{jump}");
    let rise = History::Table(vec![(0.0, 0.0), (1.0, 1.0)]);
    let ground = refusal(&|m| {
        m.damping.stiffness = 1e-3;
        m.driven = vec![driven(rise.clone(), shaken.clone())];
    });
    assert_eq!(ground, MotionError::DampedGround);
    let short = refusal(&|m| m.positions.truncate(3));
    assert!(matches!(short, MotionError::WrongLength { .. }), "{short}");
}

#[test]
fn ropes_that_slide_or_hang_and_nodes_without_mass_are_named() {
    let three = |hangs: bool, slides: Vec<Slide>, mass: f64| {
        let mut sketch = Sketch::default();
        sketch.held("a", [0.0, 0.0, 0.0]);
        sketch.node("b", [1.0, 0.0, -0.2]).attached_mass = mass;
        sketch.held("c", [2.0, 0.0, 0.0]);
        let path = ["a", "b", "c"].map(|n| sketch.id(n)).to_vec();
        sketch.given.cables.push(CableGiven {
            name: "rope".to_owned(),
            path,
            sections: vec![section(1e5, 0.0); 2],
            slides,
            hangs,
        });
        let net = sketch.net();
        let n = net.n_lengths();
        Start::new(net, vec![1.0; n])
    };
    let slide = Slide {
        place: 1,
        friction: 0.0,
    };
    let refusal = |start: Start| {
        let motion = start.motion(AVERAGE, 1.0, 1e-2);
        start.refusal(&motion)
    };
    assert!(matches!(
        refusal(three(false, vec![slide], 1.0)),
        MotionError::Slides { .. }
    ));
    assert!(matches!(
        refusal(three(true, Vec::new(), 1.0)),
        MotionError::Hangs { .. }
    ));
    let massless = refusal(three(false, Vec::new(), 0.0));
    assert_eq!(massless, MotionError::NoMass { node: NodeId::new(1) });
}
