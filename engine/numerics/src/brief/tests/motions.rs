//! Motions of a brief, beside motions put together by hand.

use super::*;
use crate::check::Share;
use crate::equilibrium::Analysis;
use crate::load::Case;
use crate::model::{Member, SegmentId, Slide};
use crate::motion::MassGiven;
use crate::motion::transient::{
    self, Break, BreakWhen, Damping, Ending, EventKind, Frames, History, Motion, Progress, Scheme, Settled, Went,
};

const AVERAGE: Scheme = Scheme::GeneralisedAlpha {
    spectral_radius: 1.0,
    error: None,
};

fn motion(duration: f64, step: f64) -> MotionGiven {
    MotionGiven {
        name: "motion".to_owned(),
        from: None,
        duration,
        step,
        scheme: AVERAGE,
        driven: Vec::new(),
        breaks: Vec::new(),
        damping: DampingGiven::default(),
        start: StartGiven::default(),
        masses: MassGiven::default(),
        frames: Frames::default(),
        watched: Vec::new(),
        spectra: None,
        compare_with: None,
        pieces_of_hanging: 16,
    }
}

/// A saddle of three ropes each way with 20 kg at each crossing, between 12 anchors.
fn saddle() -> Sketch {
    let mut sketch = Sketch::default();
    for i in 1..4 {
        let at = f64::from(i) - 2.0;
        let rise = |along: f64, across: f64| 0.25 * (along * along - across * across);
        sketch.held(&format!("w{i}"), [-2.0, at, rise(-2.0, at)]);
        sketch.held(&format!("e{i}"), [2.0, at, rise(2.0, at)]);
        sketch.held(&format!("s{i}"), [at, -2.0, rise(at, -2.0)]);
        sketch.held(&format!("n{i}"), [at, 2.0, rise(at, 2.0)]);
    }
    let rope = crate::model::Section {
        breaking_force: Some(30e3),
        ..section(4e5, 0.5)
    };
    for i in 1..4 {
        sketch.cable(&format!("x{i}"), rope, &format!("w{i} m1{i} m2{i} m3{i} e{i}"));
        sketch.cable(&format!("y{i}"), rope, &format!("s{i} m{i}1 m{i}2 m{i}3 n{i}"));
    }
    for node in &mut sketch.given.nodes {
        if node.name.starts_with('m') {
            node.attached_mass = 20.0;
        }
    }
    sketch
}

/// The saddle with 2 kN/m in every segment, under `lift` and `snow`; case 0 has snow, case 1 snow without the rope x2.
fn saddle_plan(motions: Vec<MotionGiven>) -> Plan {
    let net = saddle().net();
    let crossings: Vec<NodeId> = (0..net.nodes().len())
        .map(NodeId::new)
        .filter(|n| net.node_name(*n).starts_with('m'))
        .collect();
    let m22 = node(&net, "m22");
    let prestress = densities(&net, 2000.0);
    let actions = vec![
        action("snow", vec![force(&crossings, [0.0, 0.0, -300.0])]),
        action("gust", vec![force(&[m22], [0.0, 0.0, 900.0])]),
        action(
            "heat",
            vec![Load::Temperature {
                scope: crate::load::Scope::All,
                change: 10.0,
            }],
        ),
    ];
    let mut without = case("without x2", &[(0, 1.0)]);
    without.removed = vec![net.segments()[segments_of(&net, "x2")[0].index()].member];
    let cases = vec![
        case("snowed", &[(0, 1.0)]),
        without,
        case("beyond use", &[(0, f64::INFINITY)]),
    ];
    let mut brief = brief(net, prestress, actions, cases);
    brief.motions = motions;
    Plan::new(brief)
}

fn segments_of(net: &Net, member: &str) -> Vec<SegmentId> {
    crate::test_nets::segments(net, &[member])
        .into_iter()
        .map(SegmentId::new)
        .collect()
}

fn breaks(net: &Net, member: &str, when: BreakWhen) -> BreakGiven {
    BreakGiven {
        segments: segments_of(net, member),
        when,
        release: 0.0,
    }
}

fn begun(plan: &Plan, reference: &ReferenceOutcome, index: usize) -> MotionBegun {
    plan.motion(reference, index, &mut |_, _| ControlFlow::Continue(()))
        .expect("it can begin")
}

fn followed(plan: &Plan, reference: &ReferenceOutcome, index: usize) -> MotionFound {
    let mut begun = begun(plan, reference, index);
    while begun.next_frame(&mut |_| ControlFlow::Continue(())).is_some() {}
    begun.finish()
}

fn refused(plan: &Plan, index: usize) -> MotionNotBegun {
    let reference = plan.reference(&mut run_on).expect("a reference state");
    plan.motion(&reference, index, &mut |_, _| ControlFlow::Continue(()))
        .expect_err("it can not begin")
}

#[test]
fn a_break_of_a_whole_rope_is_that_of_a_motion_by_hand() {
    let mut given = motion(0.6, 0.002);
    given.from = Some(0);
    given.breaks = vec![breaks(&saddle().net(), "x2", BreakWhen::Time(0.05))];
    given.damping.segments = segments_of(&saddle().net(), "y2")
        .into_iter()
        .map(|s| (s, 40.0))
        .collect();
    given.masses.nodes = vec![(node(&saddle().net(), "m22"), 5.0)];
    let plan = saddle_plan(vec![given.clone()]);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let net = Arc::clone(&plan.brief().net);
    let begun = begun(&plan, &reference, 0);
    // The crossings, 60 m of ropes less what lies at the anchors, and what is added.
    let lengths: f64 = (net.segments().iter())
        .map(|s| {
            let free = s.ends.iter().filter(|end| net.support_of(**end).is_none()).count();
            0.25 * free as f64 * reference.state.unstressed_lengths[s.length]
        })
        .sum();
    close(begun.moving_mass, 9.0 * 20.0 + 5.0 + lengths, 1e-9);
    assert_eq!((&begun.compared, begun.divided), (&Compared::Settled, None));
    let found = followed(&plan, &reference, 0);
    assert!(found.is_finished());

    // By hand, without a brief.
    let snowed = state(plan.case(&reference, 0, &mut run_on));
    let without = state(plan.case(&reference, 1, &mut run_on));
    let mut dashpots = vec![0.0; net.segments().len()];
    for segment in segments_of(&net, "y2") {
        dashpots[segment.index()] = 40.0 / reference.state.unstressed_lengths[net.segments()[segment.index()].length];
    }
    let by_hand = Motion {
        reference: Arc::new(reference.state.clone()),
        positions: snowed.positions.clone(),
        velocities: Vec::new(),
        masses: given.masses.clone(),
        case: Case::new(&net, &reference.state, &plan.brief().actions, &[(0, 1.0)]),
        driven: Vec::new(),
        breaks: vec![Break {
            segments: segments_of(&net, "x2"),
            when: BreakWhen::Time(0.05),
            release: 0.0,
        }],
        damping: Damping {
            segments: dashpots,
            ..Damping::default()
        },
        scheme: AVERAGE,
        duration: 0.6,
        step: 0.002,
        frames: Frames::default(),
        watched: Vec::new(),
        spectra: None,
        settled: Some(Settled {
            positions: without.positions.clone(),
            axial_forces: without.axial_forces.clone(),
        }),
    };
    let analysis = Arc::new(Analysis::new(Arc::clone(&net)));
    let outcome = transient::run(&analysis, &Arc::new(by_hand), &mut |_| ControlFlow::Continue(()));
    let outcome = outcome.expect("a motion");
    assert_eq!(found.outcome.positions, outcome.positions);
    assert_eq!(found.outcome.peaks.largest_forces, outcome.peaks.largest_forces);
    assert_eq!(found.outcome.peaks.movements, outcome.peaks.movements);
    assert_eq!(found.outcome.events, outcome.events);
    // The static answer after the break is the case without the rope, found from another start.
    for (one, other) in found.outcome.factors.forces.iter().zip(&outcome.factors.forces) {
        match (one, other) {
            (Some(one), Some(other)) => close(*one, *other, 1e-7 * other.abs()),
            other => assert_eq!(other, (&None, &None)),
        }
    }
    let factor = found.extremes.movement_factor.expect("nodes move").peak.value;
    assert!((1.0..2.5).contains(&factor), "{factor}");
    let told = (found.outcome.events.first.iter()).filter(|event| event.kind == EventKind::Break);
    assert_eq!(told.count(), 4);
    let largest = found.extremes.movement.expect("nodes move");
    let peaks = &found.outcome.peaks.movements;
    assert!(peaks.iter().all(|peak| peak.value <= largest.peak.value));
}

#[test]
fn peaks_are_compared_with_the_case_that_is_named_or_with_nothing() {
    let net = saddle().net();
    let mut with_case = motion(0.2, 0.002);
    with_case.from = Some(0);
    with_case.breaks = vec![breaks(&net, "x2", BreakWhen::Time(0.05))];
    with_case.compare_with = Some(1);
    let mut unanswered = with_case.clone();
    unanswered.compare_with = Some(2);
    // Every rope of one direction and one of the other gone: what is left moves freely.
    let mut falling = with_case.clone();
    falling.compare_with = None;
    falling.breaks = ["x1", "x2", "x3", "y1", "y2", "y3"]
        .map(|rope| breaks(&net, rope, BreakWhen::Time(0.05)))
        .to_vec();
    let plan = saddle_plan(vec![with_case, unanswered, falling]);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    assert_eq!(begun(&plan, &reference, 0).compared, Compared::Case(1));
    for (motion, word) in [(1, "\"beyond use\""), (2, "at rest")] {
        let begun = begun(&plan, &reference, motion);
        let Compared::Nothing { why } = &begun.compared else {
            panic!("{:?}", begun.compared);
        };
        assert!(why.contains(word), "{why}");
        let found = begun.finish();
        assert_eq!(found.outcome.ending, Ending::Cancelled);
        assert!(found.outcome.factors.forces.is_empty() && found.extremes.tension_factor.is_none());
    }
}

#[test]
fn what_can_not_begin_is_told_in_the_ids_of_the_client() {
    let net = saddle().net();
    let from_nothing = MotionGiven {
        from: Some(2),
        ..motion(0.1, 0.01)
    };
    let gone = MotionGiven {
        from: Some(1),
        breaks: vec![breaks(&net, "x2", BreakWhen::Time(0.05))],
        ..motion(0.1, 0.01)
    };
    let twice = MotionGiven {
        breaks: ["x2", "x2"]
            .map(|rope| breaks(&net, rope, BreakWhen::Time(0.05)))
            .to_vec(),
        ..motion(0.1, 0.01)
    };
    let warmed = MotionGiven {
        driven: vec![DrivenGiven {
            what: DrivenWhat::Action(2),
            history: History::Constant(1.0),
        }],
        ..motion(0.1, 0.01)
    };
    let endless = motion(1e6, 1e-3);
    let held = MotionGiven {
        start: StartGiven {
            velocities: vec![(node(&net, "w1"), Vector3::x())],
            ..StartGiven::default()
        },
        ..motion(0.1, 0.01)
    };
    let plan = saddle_plan(vec![from_nothing, gone, twice, warmed, endless, held]);
    for (index, words) in [
        (0, ["\"beyond use\"", "no answer"]),
        (1, ["\"x2\"", "taken out"]),
        (2, ["\"x2\"", "twice"]),
        (3, ["\"heat\"", "temperatures"]),
        (4, ["steps", "too much"]),
        (5, ["\"w1\"", "held"]),
    ] {
        let refused = refused(&plan, index);
        for word in words {
            assert!(refused.to_string().contains(word), "{refused}");
        }
        assert!(!refused.cure().is_empty());
    }
    assert!(matches!(
        refused(&plan, 0),
        MotionNotBegun::NoState {
            state: Some(2),
            cause: Some(_),
            ..
        }
    ));
    assert_eq!(refused(&plan, 1).members(), ["x2"]);
    assert_eq!(refused(&plan, 5).nodes(), ["w1"]);

    // A state that is not found with so few iterations.
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let mut hasty = plan.brief().clone();
    hasty.settings.max_iterations = 1;
    hasty.motions[0].from = Some(0);
    let refused = Plan::new(hasty).motion(&reference, 0, &mut |_, _| ControlFlow::Continue(()));
    let refused = refused.expect_err("not converged");
    assert!(
        matches!(
            refused,
            MotionNotBegun::NoState {
                state: Some(0),
                cause: Some(_),
                ..
            }
        ),
        "{refused:?}"
    );
    assert!(
        refused.to_string().contains("\"snowed\"") && refused.to_string().contains("iterations"),
        "{refused}"
    );

    let stopped = plan.motion(&reference, 1, &mut |_, _| ControlFlow::Break(()));
    assert_eq!(stopped.expect_err("stopped"), MotionNotBegun::Cancelled);
}

/// The states that are solved before time runs, in that order.
fn states_solved(plan: &Plan, index: usize) -> Vec<AtRest> {
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let mut states = Vec::new();
    let begun = plan.motion(&reference, index, &mut |state, _| {
        states.push(state);
        ControlFlow::Continue(())
    });
    begun.expect("it can begin");
    states.dedup();
    states
}

#[test]
fn which_state_is_solved_is_told() {
    let from_snow = MotionGiven {
        from: Some(0),
        ..motion(0.1, 0.01)
    };
    let let_go = MotionGiven {
        start: StartGiven {
            shape_of: Some(0),
            ..StartGiven::default()
        },
        compare_with: Some(1),
        ..motion(0.1, 0.01)
    };
    let plan = saddle_plan(vec![motion(0.1, 0.01), from_snow, let_go]);
    assert_eq!(states_solved(&plan, 0), [AtRest::Settled]);
    assert_eq!(states_solved(&plan, 1), [AtRest::State(Some(0)), AtRest::Settled]);
    assert_eq!(
        states_solved(&plan, 2),
        [AtRest::State(Some(0)), AtRest::State(Some(1))]
    );
}

#[test]
fn pauses_leave_the_bits_alone() {
    let mut given = motion(0.3, 0.002);
    given.frames.stride = 40;
    given.breaks = vec![breaks(&saddle().net(), "x2", BreakWhen::Time(0.1))];
    let plan = saddle_plan(vec![given]);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let mut at_one_go = begun(&plan, &reference, 0);
    let mut paused = begun(&plan, &reference, 0);
    let (mut pauses, mut asked) = (0, 0);
    let mut observe = |_: Progress<'_>| ControlFlow::Continue(());
    loop {
        let every_third = &mut || {
            asked += 1;
            asked % 3 == 0
        };
        match paused.go_on(every_third, &mut observe) {
            Went::Frame(frame) => assert_eq!(Some(frame), at_one_go.next_frame(&mut observe)),
            Went::Paused => pauses += 1,
            Went::Ended => break,
        }
    }
    assert!(pauses > 40, "{pauses}");
    assert_eq!(at_one_go.next_frame(&mut observe), None);
    assert_eq!(paused.finish(), at_one_go.finish());
}

#[test]
fn massless_nodes_and_sliding_ropes_are_named() {
    let mut sketch = saddle();
    for node in &mut sketch.given.nodes {
        node.attached_mass = if node.name == "m22" { 1.0 } else { 0.0 };
    }
    for cable in &mut sketch.given.cables {
        cable
            .sections
            .iter_mut()
            .for_each(|section| section.mass_per_length = 0.0);
    }
    let plan_of = |sketch: Sketch| {
        let net = sketch.net();
        let prestress = densities(&net, 2000.0);
        let mut brief = brief(net, prestress, Vec::new(), Vec::new());
        brief.motions = vec![motion(0.1, 0.01)];
        Plan::new(brief)
    };
    let refusal = refused(&plan_of(sketch), 0);
    assert_eq!(
        refusal.nodes(),
        ["m11", "m21", "m31", "m12", "m13", "m32", "m23", "m33"]
    );

    let mut sketch = saddle();
    sketch.given.cables[0].slides = vec![Slide {
        place: 2,
        friction: 0.0,
    }];
    let refusal = refused(&plan_of(sketch), 0);
    assert_eq!(refusal.members(), ["x1"]);
    assert!(refusal.to_string().contains("slide"), "{refusal}");
}

/// What breaks at a tension lets go of the whole rope once one of its segments reaches it.
#[test]
fn a_tension_breaks_a_whole_rope() {
    let net = saddle().net();
    let mut given = motion(1.0, 0.002);
    given.driven = vec![DrivenGiven {
        what: DrivenWhat::Action(1),
        history: History::Ramp {
            start: 0.0,
            end: 1.0,
            before: 0.0,
            after: 12.0,
        },
    }];
    let reference_tension = |plan: &Plan| {
        let reference = plan.reference(&mut run_on).expect("a reference state");
        let of_rope = segments_of(&net, "y2")
            .into_iter()
            .map(|s| reference.state.axial_forces[s.index()]);
        of_rope.fold(0.0, f64::max)
    };
    let at = 1.3 * reference_tension(&saddle_plan(Vec::new()));
    given.breaks = vec![breaks(&net, "y2", BreakWhen::Tension(at))];
    let plan = saddle_plan(vec![given]);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let found = followed(&plan, &reference, 0);
    assert!(found.is_finished());
    let broken: Vec<_> = (found.outcome.events.first.iter())
        .filter(|event| event.kind == EventKind::Break)
        .collect();
    assert_eq!(
        broken.iter().map(|event| event.segment).collect::<Vec<_>>(),
        segments_of(&net, "y2")
    );
    assert!(
        broken
            .iter()
            .all(|event| event.time == broken[0].time && event.time > 0.0)
    );
    let peaks = segments_of(&net, "y2")
        .into_iter()
        .map(|s| found.outcome.peaks.largest_forces[s.index()].value);
    let peaks: Vec<f64> = peaks.collect();
    // One of them reached it, others had not when they were let go.
    assert!(
        peaks.iter().any(|peak| *peak >= at) && peaks.iter().any(|peak| *peak < at),
        "{peaks:?} {at}"
    );
    // What breaks at a tension counts as whole in the static answer.
    assert!(found.outcome.factors.forces[segments_of(&net, "y2")[0].index()].is_some());
}

/// Damping by the stiffness of the start is doubted once something breaks; a tension that is never reached is told.
#[test]
fn what_the_start_says_of_later_is_doubted() {
    let net = saddle().net();
    let mut lasting = motion(0.2, 0.002);
    lasting.start.velocities = vec![(node(&net, "m22"), Vector3::new(0.0, 0.0, 0.01))];
    lasting.damping.stiffness = 1e-4;
    lasting.breaks = vec![breaks(&net, "y2", BreakWhen::Tension(1e7))];
    let mut lost = lasting.clone();
    lost.damping = DampingGiven {
        mass: 0.1,
        ..DampingGiven::default()
    };
    lost.breaks = vec![breaks(&net, "y2", BreakWhen::Time(0.1))];
    let plan = saddle_plan(vec![lasting, lost]);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let [lasting, lost] = [0, 1].map(|index| followed(&plan, &reference, index));
    let largest = lasting.doubts.iter().find_map(|doubt| match doubt {
        MotionDoubt::NotBroken { largest, count: 1, .. } => Some(*largest),
        _ => None,
    });
    let peaks = segments_of(&net, "y2").into_iter();
    let peaks = peaks.map(|segment| lasting.outcome.peaks.largest_forces[segment.index()].value);
    assert_eq!(largest, peaks.reduce(f64::max));
    let of_start = |found: &MotionFound| {
        let is = |doubt: &&MotionDoubt| matches!(doubt, MotionDoubt::DampingOfStart { .. });
        found.doubts.iter().filter(is).count()
    };
    assert_eq!([of_start(&lasting), of_start(&lost)], [1, 0]);
    assert!(!lost.doubts.iter().any(|d| matches!(d, MotionDoubt::NotBroken { .. })));
    // The moment of the break is that of a whole step, and no sliver of a step comes before it.
    assert_eq!((lost.outcome.steps, lost.outcome.ending), (100, Ending::Done));
    assert!(lost.outcome.smallest_step > 0.0019, "{}", lost.outcome.smallest_step);
}

/// Pieces of a hanging rope that a quick load would need shorter.
#[test]
fn long_pieces_are_doubted() {
    let within = |times: [f64; 3], pieces: usize| {
        let mut given = motion(0.2, 1e-3);
        given.pieces_of_hanging = pieces;
        given.driven = vec![DrivenGiven {
            what: DrivenWhat::Action(1),
            history: History::Table(times.into_iter().zip([0.0, 1.0, 0.0]).collect()),
        }];
        let plan = line(vec![given]);
        let reference = plan.reference(&mut run_on).expect("a reference state");
        let doubts = followed(&plan, &reference, 0).doubts.into_iter();
        let mut needed = doubts.filter_map(|doubt| match doubt {
            MotionDoubt::LongPieces {
                crossing,
                finest,
                needed,
                ..
            } => Some((crossing, finest, needed)),
            _ => None,
        });
        needed.next()
    };
    let (crossing, finest, needed) = within([0.0, 4e-3, 8e-3], 16).expect("a doubt");
    assert!((finest - 4e-3).abs() < 1e-12 && crossing > finest);
    assert!((needed - (16.0 * crossing / finest).ceil()).abs() < 0.5);
    assert_eq!(within([0.0, 0.1, 0.2], 16), None);
}

/// A rope of two hanging segments, a lamp of 30 kg between them, which carries its weight in the reference state.
fn line(motions: Vec<MotionGiven>) -> Plan {
    let mut sketch = Sketch::default();
    sketch.held("A", [0.0, 0.0, 4.0]);
    sketch.held("B", [24.0, 0.0, 6.0]);
    sketch.node("lamp", [11.0, 0.0, 3.6]).attached_mass = 30.0;
    sketch.cable("line", section(2.4e6, 1.3), "A lamp B");
    sketch.given.cables[0].hangs = true;
    let net = sketch.net();
    let prestress = Prestress {
        rules: vec![
            PrestressRule::UnstressedLength(11.2),
            PrestressRule::UnstressedLength(13.4),
        ],
        under: vec![0],
        ..Prestress::default()
    };
    let lamp = node(&net, "lamp");
    let actions = vec![
        action("self", vec![own_weight()]),
        action("wind", vec![force(&[lamp], [0.0, 150.0, 0.0])]),
    ];
    let mut without = case("blown", &[(0, 1.0), (1, 1.0)]);
    without.removed = Vec::<Member>::new();
    let mut brief = brief(net, prestress, actions, vec![without]);
    brief.motions = motions;
    Plan::new(brief)
}

/// Let go from where the wind holds it: nothing damps it, and energy stays what it is.
#[test]
fn a_plucked_hanging_rope_keeps_its_energy() {
    let plucked = MotionGiven {
        scheme: Scheme::Conserving { error: None },
        start: StartGiven {
            shape_of: Some(0),
            ..StartGiven::default()
        },
        frames: Frames {
            stride: 50,
            nodes: vec![NodeId::new(2)],
            cables: vec![crate::model::CableId::new(0)],
        },
        watched: vec![
            Watched::Movement {
                node: NodeId::new(2),
                along: Vector3::y(),
            },
            Watched::AxialForce {
                segment: SegmentId::new(1),
            },
        ],
        ..motion(2.0, 0.005)
    };
    let plan = line(vec![plucked]);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let mut begun = begun(&plan, &reference, 0);
    let divided = begun.divided.expect("it hangs");
    assert_eq!(divided.segments, 2);
    assert!(divided.moved > 0.0 && divided.moved < 0.01, "{divided:?}");
    assert!(
        divided.tension > 0.0 && divided.tension < 0.01 * reference.state.axial_forces[0],
        "{divided:?}"
    );
    close(begun.moving_mass, 30.0 + 1.3 * 24.6 - 1.3 * 24.6 / 32.0, 0.02);
    let ropes = begun.shown_ropes();
    assert_eq!((ropes[0].nodes.len(), ropes[0].material.len()), (33, 33));
    let named: Vec<_> = (ropes[0].nodes.iter().enumerate())
        .filter_map(|(place, node)| node.map(|node| (place, node.index())))
        .collect();
    assert_eq!(named, [(0, 0), (16, 2), (32, 1)]);
    close(ropes[0].material[32], 24.6, 1e-12);
    let mut frames = Vec::new();
    while let Some(frame) = begun.next_frame(&mut |_| ControlFlow::Continue(())) {
        frames.push(frame);
    }
    assert_eq!(frames.len(), 9);
    assert!(
        frames
            .iter()
            .all(|frame| frame.cables[0].positions.len() == 33 && frame.watched.len() == 2)
    );
    let found = begun.finish();
    assert!(found.is_finished());
    let Outcomes { nodes, segments } = Outcomes::of(&found);
    assert_eq!((nodes, segments), (3, 2));
    let outcome = &found.outcome;
    assert!(outcome.largest_kinetic > 10.0);
    assert!(
        outcome.largest_error < 1e-8 * outcome.largest_kinetic,
        "{}",
        outcome.largest_error
    );
    // It swings across: as far to the other side as it was let go from.
    let movement = outcome.peaks.movements[2];
    let from = frames[0].positions[0].y;
    assert!(
        from > 0.05 && movement.value > 1.8 * from && movement.value < 2.2 * from,
        "{from} {movement:?}"
    );
    // The static answer is the reference state: divided, it is where the swing has its middle.
    let factor = found.extremes.movement_factor.expect("it moves").peak.value;
    assert!((1.8..2.3).contains(&factor), "{factor}");
}

/// What dividing does falls with the square of the number of pieces; where it fails, that is told.
#[test]
fn more_pieces_change_the_state_at_the_start_less() {
    let in_pieces = |pieces_of_hanging| MotionGiven {
        pieces_of_hanging,
        ..motion(0.1, 0.01)
    };
    let plan = line([8, 16, 32].map(in_pieces).to_vec());
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let divided: Vec<Divided> = (0..3)
        .map(|n| begun(&plan, &reference, n).divided.expect("it hangs"))
        .collect();
    for (coarse, fine) in divided.iter().zip(&divided[1..]) {
        for (coarse, fine) in [(coarse.moved, fine.moved), (coarse.tension, fine.tension)] {
            close((coarse / fine).log2(), 2.0, 0.1);
        }
    }
    let mut hasty = plan.brief().clone();
    hasty.settings.max_iterations = 0;
    let refused = Plan::new(hasty)
        .motion(&reference, 0, &mut |_, _| ControlFlow::Continue(()))
        .expect_err("not converged");
    assert!(
        matches!(refused, MotionNotBegun::NotDivided { pieces: 8, .. }),
        "{refused:?}"
    );
    assert_eq!(refused.members(), ["line"]);
}

/// How many nodes and segments an outcome tells of.
struct Outcomes {
    nodes: usize,
    segments: usize,
}

impl Outcomes {
    fn of(found: &MotionFound) -> Self {
        let outcome = &found.outcome;
        assert_eq!(outcome.positions.len(), outcome.peaks.movements.len());
        assert_eq!(outcome.peaks.least_forces.len(), outcome.peaks.largest_forces.len());
        Self {
            nodes: outcome.positions.len(),
            segments: outcome.peaks.largest_forces.len(),
        }
    }
}

/// A hanging segment that lets go: its points fall, and nothing of that is told of nodes and segments of the net.
#[test]
fn a_hanging_segment_that_breaks_is_one_break() {
    let mut given = motion(0.3, 0.002);
    given.breaks = vec![BreakGiven {
        segments: vec![SegmentId::new(1)],
        when: BreakWhen::Time(0.1),
        release: 0.0,
    }];
    let plan = line(vec![given]);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let begun = begun(&plan, &reference, 0);
    // The lamp hangs from A alone then: there is a state at rest, straight below.
    assert_eq!(begun.compared, Compared::Settled);
    let found = followed(&plan, &reference, 0);
    assert!(found.is_finished());
    let broken: Vec<_> = (found.outcome.events.first.iter())
        .filter(|event| event.kind == EventKind::Break)
        .map(|event| event.segment.index())
        .collect();
    assert_eq!(broken, [1]);
}

#[test]
fn the_same_motion_has_the_same_bits() {
    let mut given = motion(0.3, 0.004);
    given.breaks = vec![breaks(&saddle().net(), "x2", BreakWhen::Time(0.05))];
    given.from = Some(0);
    let hanging = motion(0.3, 0.004);
    for (plan, again) in [
        (saddle_plan(vec![given.clone()]), saddle_plan(vec![given])),
        (line(vec![hanging.clone()]), line(vec![hanging])),
    ] {
        let reference = plan.reference(&mut run_on).expect("a reference state");
        let first = followed(&plan, &reference, 0);
        // Other work in between leaves no trace.
        let _ = plan.case(&reference, 0, &mut run_on);
        assert_eq!(followed(&plan, &reference, 0), first);
        let reference = again.reference(&mut run_on).expect("a reference state");
        assert_eq!(followed(&again, &reference, 0), first);
    }
}

#[test]
fn doubts_tell_the_worst_of_each_kind_once() {
    let mut coarse = motion(0.6, 0.1);
    coarse.driven = vec![DrivenGiven {
        what: DrivenWhat::Action(1),
        history: History::Harmonic {
            mean: 0.0,
            amplitude: 300.0,
            frequency: 9.0,
            phase: 0.0,
            start: 0.0,
            end: 9.0,
        },
    }];
    let plan = saddle_plan(vec![coarse]);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let found = followed(&plan, &reference, 0);
    let told = |is: fn(&MotionDoubt) -> bool| found.doubts.iter().filter(|doubt| is(doubt)).count();
    assert_eq!(
        told(|doubt| matches!(doubt, MotionDoubt::Waves { count: 6, .. })),
        1,
        "{:?}",
        found.doubts
    );
    assert_eq!(
        told(|doubt| matches!(doubt, MotionDoubt::Histories { driven: 0, .. })),
        1
    );
    assert_eq!(
        told(|doubt| matches!(doubt, MotionDoubt::OverBreaking { .. })),
        1,
        "{:?}",
        found.doubts
    );

    // Steps that long make energy: average acceleration conserves that of linear nets only.
    assert_eq!(told(|doubt| matches!(doubt, MotionDoubt::Energy { .. })), 1);
    let net = saddle().net();
    let m22 = node(&net, "m22");
    let struck = MotionGiven {
        start: StartGiven {
            velocities: vec![(m22, Vector3::z())],
            ..StartGiven::default()
        },
        watched: vec![Watched::Movement {
            node: m22,
            along: Vector3::z(),
        }],
        spectra: Some(SpectraGiven { from: 0.0, up_to: None }),
        ..motion(0.4, 0.002)
    };
    let all = ["x1", "x2", "x3", "y1", "y2", "y3"];
    let falling = MotionGiven {
        from: Some(0),
        breaks: all.map(|rope| breaks(&net, rope, BreakWhen::Time(0.0))).to_vec(),
        ..motion(0.9, 0.01)
    };
    let plan = saddle_plan(vec![struck, falling]);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let short = followed(&plan, &reference, 0).doubts;
    assert!(
        matches!(short[..], [MotionDoubt::ShortSpectrum { watched: 0, count: 1, periods, .. }] if periods < 20.0),
        "{short:?}"
    );
    let far = followed(&plan, &reference, 1).doubts;
    let fell = |doubt: &MotionDoubt| matches!(doubt, MotionDoubt::LargeMovement { movement, extent, .. } if *movement > extent / 2.0);
    assert!(far.iter().any(fell), "{far:?}");

    let calm = saddle_plan(vec![motion(0.05, 0.001)]);
    let reference = calm.reference(&mut run_on).expect("a reference state");
    let found = followed(&calm, &reference, 0);
    assert!(found.doubts.is_empty(), "{:?}", found.doubts);
}

#[test]
fn a_motion_that_is_not_finished_is_no_answer() {
    let plan = saddle_plan(vec![motion(0.1, 0.01); 2]);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let summed_up = |asked: &[usize], added: &[(usize, bool)]| {
        let mut tally = Tally::new(&plan, &reference, &[]).with_motions(asked);
        for (motion, finished) in added {
            tally.add_motion(*motion, *finished);
        }
        tally.finish()
    };
    let all = summed_up(&[0, 1], &[(0, true), (1, true)]);
    assert_eq!(
        (all.facts.motions, all.verdict),
        (Share { count: 2, of: 2 }, Verdict::NotJudged)
    );
    assert!(all.cautions.contains(&Caution::MotionsNotJudged));
    for part in [
        summed_up(&[0, 1], &[(1, true)]),
        summed_up(&[0, 1], &[(1, true), (0, false)]),
    ] {
        assert_eq!(
            (part.facts.motions, part.verdict),
            (Share { count: 1, of: 2 }, Verdict::NoAnswer)
        );
    }
    let none = summed_up(&[], &[(0, true)]);
    assert_eq!(
        (none.facts.motions, none.verdict),
        (Share { count: 0, of: 0 }, Verdict::NotJudged)
    );
    assert!(!none.cautions.contains(&Caution::MotionsNotJudged));
}

#[test]
fn the_estimate_counts_steps_and_frames() {
    let of = |motions: Vec<MotionGiven>| saddle_plan(motions).estimate();
    let (none, implicit) = (of(Vec::new()), of(vec![motion(1.0, 0.001)]));
    assert_eq!((none.motions, none.motion_steps), (0, 0.0));
    assert_eq!((implicit.motions, implicit.motion_steps), (1, 1000.0));
    assert!(implicit.seconds > none.seconds);
    // Explicit: substeps by EA 4e5 N over pieces of about 1 m, and 20.5 kg a node; nodes of the saddle have no place as given.
    let explicit = MotionGiven {
        scheme: Scheme::CentralDifferences,
        ..motion(10.0, 0.5)
    };
    assert_eq!(of(vec![explicit.clone()]).motion_steps, 20.0);
    let hanging = line(vec![explicit]).estimate().motion_steps;
    // The shorter pieces are 11.0 m / 16 long: h = L √(m/EA) = 0.506 ms.
    assert!((hanging / (10.0 / 0.506e-3) - 1.0).abs() < 0.01, "{hanging}");
    let shown = MotionGiven {
        frames: Frames {
            stride: 10,
            nodes: vec![NodeId::new(0); 5],
            cables: Vec::new(),
        },
        ..motion(1.0, 0.001)
    };
    let bytes = of(vec![shown]).result_bytes - implicit.result_bytes;
    assert_eq!(bytes, 101 * (80 + 8 * 6 * 5) - 2 * 80);
}
