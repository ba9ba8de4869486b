//! Skins, and air that moves with them across them only.

use super::*;
use crate::equilibrium::{Settings, Termination, solve};
use crate::model::Skin;
use crate::motion::{About, Modes, natural_modes};

/// A curved skin of 1 kg/m² on the inner nodes of a saddle at rest, with its modes.
fn skin(air: f64) -> (Start, MassGiven, Modes) {
    let mut sketch = saddle_sketch();
    for i in 1..3 {
        for j in 1..3 {
            let corners = [(i, j), (i + 1, j), (i + 1, j + 1), (i, j + 1)];
            let corners = corners.map(|(i, j)| sketch.id(&format!("n{i}{j}"))).to_vec();
            let name = format!("{i}{j}");
            sketch.given.panels.push(PanelGiven { name, corners });
        }
    }
    sketch.given.skins.push(Skin {
        name: "skin".to_owned(),
        mass_per_area: 1.0,
        panels: vec![0, 1, 2, 3],
    });
    let mut start = stretched(sketch, 1.01);
    let case = start.case();
    let found = solve(
        &start.analysis,
        &case,
        &start.reference.positions,
        &case.unstressed_lengths,
        &Settings::default(),
        &mut |_| ControlFlow::Continue(()),
    )
    .expect("it fits");
    assert_eq!(found.termination, Termination::Converged);
    let reference = Arc::make_mut(&mut start.reference);
    reference.positions = found.positions;
    reference.axial_forces = found.axial_forces;
    let masses = MassGiven {
        nodes: vec![(NodeId::new(6), 5.0)],
        air,
        ..MassGiven::default()
    };
    let about = About {
        case: &case,
        positions: &start.reference.positions,
        reference: &start.reference.positions,
        axial_forces: &start.reference.axial_forces,
        lying: &case.unstressed_lengths,
    };
    let modes = natural_modes(&start.analysis, &about, &masses, 2, &mut || ControlFlow::Continue(())).expect("modes");
    (start, masses, modes)
}

/// Follows a swing in the lowest mode: the node that moves most, along that movement over its start (–), at `steps` a period.
fn swing(scheme: Scheme, air: f64, damping: f64, steps: f64) -> (Vec<f64>, f64) {
    let (start, masses, modes) = skin(air);
    let mode = &modes.modes[0];
    let step = 1.0 / (mode.frequency * steps);
    let mut motion = start.motion(scheme, 10.25 / mode.frequency, step);
    motion.masses = masses;
    motion.damping.mass = damping;
    for (position, shape) in motion.positions.iter_mut().zip(&mode.shape) {
        *position += shape * 1e-6;
    }
    let norms = mode.shape.iter().map(Vector3::norm);
    let (most, _) = norms.enumerate().max_by(|a, b| a.1.total_cmp(&b.1)).expect("nodes");
    motion.frames = Frames {
        stride: 1,
        nodes: vec![NodeId::new(most)],
        cables: Vec::new(),
    };
    let mut told = Vec::new();
    let outcome = run(&start.analysis, &Arc::new(motion), &mut |progress| {
        if let Progress::Frame(frame) = progress {
            told.push((frame.positions[0] - start.reference.positions[most]).dot(&mode.shape[most]) / 1e-6);
        }
        ControlFlow::Continue(())
    });
    assert_eq!(outcome.expect("a motion").ending, Ending::Done);
    (told, mode.frequency)
}

/// Frequency by the passages through zero, over that of the mode.
fn ratio(told: &[f64], steps: f64) -> f64 {
    let passages: Vec<f64> = (told.windows(2).enumerate())
        .filter(|(_, pair)| pair[0] * pair[1] < 0.0)
        .map(|(n, pair)| n as f64 + pair[0] / (pair[0] - pair[1]))
        .collect();
    let last = passages.len() - 1;
    assert!(last >= 19);
    steps * 0.5 * last as f64 / (passages[last] - passages[0])
}

#[test]
fn a_skin_swings_at_the_frequency_of_its_mode() {
    let (_, alone) = swing(CONSERVING, 0.0, 0.0, 400.0);
    for (scheme, steps) in [
        (AVERAGE, 400.0),
        (CONSERVING, 400.0),
        (Scheme::CentralDifferences, 400.0),
    ] {
        let (told, frequency) = swing(scheme, 12.0, 0.0, steps);
        assert!(frequency < 0.95 * alone, "{frequency} {alone}");
        // Periods are off by (ω h)²/12 = 2e-5 or, where steps are divided, less.
        let ratio = ratio(&told, steps);
        assert!((ratio - 1.0).abs() < 3e-5, "{scheme:?} {ratio}");
    }
}

#[test]
fn damping_by_mass_takes_all_modes_alike() {
    // x = exp(−a t / 2) cos(√(ω² − a²/4) t) for a start at rest, but for the phase.
    let (told, frequency) = swing(AVERAGE, 12.0, 2.0, 400.0);
    let last = told.iter().rev().take(400).fold(0.0_f64, |most, u| most.max(u.abs()));
    let peak = told.iter().rposition(|u| u.abs() == last).expect("it is one of them");
    let expected = (-(peak as f64) / (400.0 * frequency)).exp();
    assert!((last - expected).abs() < 2e-3 * expected, "{last} {expected}");
}

#[test]
fn the_ledger_closes_with_air() {
    let (start, masses, _) = skin(12.0);
    let mut motion = start.motion(CONSERVING, 1.0, 2e-3);
    motion.masses = masses;
    thrown(&start, &mut motion);
    motion.damping.mass = 0.5;
    let outcome = start.run(&motion);
    assert_eq!(outcome.ending, Ending::Done);
    assert!(
        outcome.ledger.dissipated > 1.0 && outcome.events.snatches > 10,
        "{outcome:?}"
    );
    let first = outcome.ledger.total() + outcome.ledger.dissipated;
    assert!(outcome.largest_error <= 1e-10 * first, "{:?}", outcome.ledger);
}

#[test]
fn masses_without_a_place_and_air_at_moving_rollers_are_named() {
    let (start, _, _) = skin(0.0);
    let refusal = |masses: MassGiven| {
        let mut motion = start.motion(AVERAGE, 1.0, 1e-3);
        motion.masses = masses;
        start.refusal(&motion)
    };
    let place = |masses: MassGiven| match refusal(masses) {
        MotionError::NoPlaceForMass { what, .. } => what,
        other => panic!("{other}"),
    };
    let nodes = vec![(NodeId::new(99), 1.0)];
    assert_eq!(
        place(MassGiven {
            nodes,
            ..MassGiven::default()
        }),
        "node"
    );
    let segments = vec![(SegmentId::new(99), 1.0)];
    assert_eq!(
        place(MassGiven {
            segments,
            ..MassGiven::default()
        }),
        "segment"
    );
    let areas = vec![(vec![crate::model::Area::Zone(0)], 1.0)];
    assert_eq!(
        place(MassGiven {
            areas,
            ..MassGiven::default()
        }),
        "zone"
    );
    let bad = refusal(MassGiven {
        air: f64::NAN,
        ..MassGiven::default()
    });
    assert!(matches!(bad, MotionError::Number { what: "added mass", .. }), "{bad}");

    let (start, _) = mast();
    let rail = NodeId::new(2);
    let mut shaken = start.case();
    shaken.support_movements[rail.index()] = Vector3::new(0.0, 0.1, 0.0);
    let mut motion = start.motion(AVERAGE, 1.0, 1e-3);
    motion.driven.push(Driven::Case {
        case: Box::new(shaken),
        history: History::Table(vec![(0.0, 0.0), (1.0, 1.0)]),
    });
    assert_eq!(start.run(&motion).ending, Ending::Done);
    motion.masses.air = 1.0;
    assert_eq!(start.refusal(&motion), MotionError::AirAtMovingSupport { node: rail });
}
