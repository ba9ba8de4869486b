//! What is watched, its spectra, forces of supports, and the case at rest.

use super::*;

fn frames(start: &Start, motion: &Motion) -> (Vec<Frame>, Outcome) {
    let mut frames = Vec::new();
    let outcome = run(&start.analysis, &Arc::new(motion.clone()), &mut |progress| {
        if let Progress::Frame(frame) = progress {
            frames.push(frame.clone());
        }
        ControlFlow::Continue(())
    });
    (frames, outcome.expect("a motion"))
}

/// A mass of 5 kg on a rope of 1e4 N/m, pulled to 1 kN and let swing about that by a sudden force: the rope bears
/// `T = T0 + P (1 − cos ωt)`, `ω = √2000`, and so does the wall.
#[test]
fn a_sudden_load_shows_in_all_that_is_watched() {
    let start = single();
    let (pull, more, omega) = (1000.0, 400.0, 2000.0_f64.sqrt());
    for scheme in [AVERAGE, CONSERVING, Scheme::CentralDifferences] {
        let mut motion = start.motion(scheme, 4.0, 1e-4);
        motion.positions[1].x = 2.1;
        motion.case.nodal_forces[1].x = pull + more;
        let (node, along) = (NodeId::new(1), Vector3::x());
        let segment = SegmentId::new(0);
        motion.watched = vec![
            Watched::Movement { node, along },
            Watched::Velocity { node, along: -along },
            Watched::Acceleration { node, along },
            Watched::AxialForce { segment },
            Watched::LargestForce {
                segments: vec![segment],
            },
            Watched::SupportForce {
                node: NodeId::new(0),
                along: -along,
            },
        ];
        motion.spectra = Some(SpectraGiven {
            from: 0.5,
            up_to: Some(50.0),
        });
        motion.frames.stride = 100;
        let (frames, outcome) = frames(&start, &motion);
        for frame in &frames {
            let (sine, cosine) = (omega * frame.time).sin_cos();
            let swing = more * (1.0 - cosine);
            let expected = [
                swing / 1e4,
                -more / 1e4 * omega * sine,
                more / 5.0 * cosine,
                pull + swing,
                pull + swing,
                pull + swing,
            ];
            let scales = [more / 1e4, more / 1e4 * omega, more / 5.0, more, more, more];
            for ((value, expected), scale) in frame.watched.iter().zip(expected).zip(scales) {
                // The phase is off by ω t (ω h)²/12 or half of it after t.
                assert!((value - expected).abs() < 5e-4 * scale, "{scheme:?} {value} {expected}");
            }
        }
        // Twice the static change.
        let peak = outcome.peaks.supports[0];
        assert_eq!(outcome.peaks.supports.len(), 2);
        assert_eq!(peak.node, NodeId::new(0));
        assert!(
            (peak.size.value - pull - 2.0 * more).abs() < 1e-3,
            "{scheme:?} {peak:?}"
        );
        assert!((peak.force + along * (pull + 2.0 * more)).norm() < 1e-3);
        let frequency = omega / (2.0 * std::f64::consts::PI);
        let tension = &outcome.spectra[3];
        assert_eq!(outcome.spectra.len(), 6);
        assert_eq!((tension.samples, tension.amplitudes.len()), (35_001, 176));
        // Not a whole number of periods: the mean is off by the part that is left over.
        assert!((tension.mean - pull - more).abs() < 0.01 * more);
        assert!((tension.rms - more / 2.0_f64.sqrt()).abs() < 0.01 * more);
        assert_eq!(tension.peaks.len(), 1, "{:?}", tension.peaks);
        assert!(
            (tension.peaks[0].frequency / frequency - 1.0).abs() < 1e-5,
            "{:?}",
            tension.peaks
        );
        assert!(
            (tension.peaks[0].amplitude / more - 1.0).abs() < 1e-4,
            "{:?}",
            tension.peaks
        );
        let acceleration = &outcome.spectra[2].peaks[0];
        assert!(
            (acceleration.amplitude * 5.0 / more - 1.0).abs() < 1e-4,
            "{acceleration:?}"
        );
    }
}

/// Forces of supports and what accelerates the masses add up to all loads (momentum), whatever supports there are, and however
/// they are damped.
#[test]
fn forces_of_supports_balance_the_momentum() {
    for scheme in [AVERAGE, CONSERVING, Scheme::CentralDifferences] {
        for by_stiffness in [true, false] {
            let (start, foot) = mast();
            let mut motion = start.motion(scheme, 0.1, 1e-3);
            motion.masses.air = 4.0;
            for (force, mass) in motion.case.nodal_forces.iter_mut().zip([30.0, 60.0, 15.0]) {
                force.z = -9.81 * mass;
            }
            // Explicit differences damp by the velocity foreseen at the start of a step, not by that at its end.
            let explicit = scheme == Scheme::CentralDifferences;
            motion.damping.mass = if explicit { 0.0 } else { 0.8 };
            if by_stiffness && !explicit {
                motion.damping.stiffness = 1e-4;
            } else {
                motion.damping.segments = vec![50.0; start.net().segments().len()];
                let mut shaken = start.case();
                shaken.support_movements[foot.index()] = Vector3::new(0.02, -0.03, 0.04);
                shaken.support_movements[3] = Vector3::new(0.01, 0.03, 0.0);
                motion.driven.push(Driven::Case {
                    case: Box::new(shaken),
                    history: History::Harmonic {
                        mean: 0.0,
                        amplitude: 1.0,
                        frequency: 3.0,
                        phase: 0.0,
                        start: 0.0,
                        end: 9.0,
                    },
                });
            }
            let axes = [Vector3::x(), Vector3::y(), Vector3::z()];
            for along in axes {
                for node in (0..start.net().nodes().len()).map(NodeId::new) {
                    motion.watched.push(Watched::Acceleration { node, along });
                    motion.watched.push(Watched::Velocity { node, along });
                }
                for support in [0, 2, 3, 4, 5, 6] {
                    let node = NodeId::new(support);
                    motion.watched.push(Watched::SupportForce { node, along });
                }
            }
            motion.frames.stride = 5;
            let (frames, outcome) = frames(&start, &motion);
            assert_eq!(outcome.ending, Ending::Done);
            let masses = crate::motion::mass::Masses::new(
                start.analysis.structure(),
                &motion.masses,
                &crate::motion::About {
                    case: &motion.case,
                    positions: &motion.positions,
                    reference: &start.reference.positions,
                    axial_forces: &[],
                    lying: &start.reference.unstressed_lengths,
                },
            );
            assert!(masses.air[1] != nalgebra::Matrix3::zeros());
            let n = start.net().nodes().len();
            for frame in &frames[1..] {
                let mut rest = motion.case.nodal_forces.iter().sum::<Vector3<f64>>();
                let mut scale = 0.0_f64;
                let value = |axis: usize, place: usize| frame.watched[axis * (2 * n + 6) + place];
                for node in 0..n {
                    let rate = Vector3::from_fn(|axis, _| {
                        value(axis, 2 * node) + motion.damping.mass * value(axis, 2 * node + 1)
                    });
                    let mass = nalgebra::Matrix3::from_diagonal_element(masses.alike[node]) + masses.air[node];
                    rest -= mass * rate;
                }
                for support in 0..6 {
                    let force = Vector3::from_fn(|axis, _| value(axis, 2 * n + support));
                    rest += force;
                    scale = scale.max(force.norm());
                }
                // Explicit differences damp by the velocity foreseen at the start of a step, not by that at its end.
                let share = if scheme == Scheme::CentralDifferences {
                    2e-4
                } else {
                    1e-9
                };
                assert!(
                    rest.norm() < share * scale,
                    "{scheme:?} {by_stiffness} {rest:?} {scale}"
                );
            }
        }
    }
}

#[test]
fn senseless_watches_are_named() {
    let start = single();
    let refusal = |watched: Watched| {
        let mut motion = start.motion(AVERAGE, 1.0, 1e-2);
        motion.watched = vec![watched];
        match start.refusal(&motion) {
            MotionError::Watched { place: 0, what } => what,
            other => panic!("{other}"),
        }
    };
    let along = Vector3::x();
    let gone = NodeId::new(9);
    assert!(refusal(Watched::Movement { node: gone, along }).contains("not in the net"));
    let skew = Watched::Velocity {
        node: NodeId::new(1),
        along: Vector3::new(1.0, 1.0, 0.0),
    };
    assert!(refusal(skew).contains("unit"));
    let segment = SegmentId::new(1);
    assert!(refusal(Watched::AxialForce { segment }).contains("segment"));
    assert!(refusal(Watched::LargestForce { segments: Vec::new() }).contains("no segments"));
    let free = saddle(1.0);
    let mut motion = free.motion(AVERAGE, 1.0, 1e-2);
    motion.watched = vec![Watched::SupportForce {
        node: NodeId::new(6),
        along,
    }];
    let refused = free.refusal(&motion);
    assert!(refused.to_string().contains("support"), "{refused}");

    let spectra = |from: f64, up_to: Option<f64>, watched: Vec<Watched>, step: f64| {
        let mut motion = start.motion(AVERAGE, 1.0, step);
        motion.watched = watched;
        motion.spectra = Some(SpectraGiven { from, up_to });
        start.refusal(&motion)
    };
    let watched = vec![Watched::AxialForce {
        segment: SegmentId::new(0),
    }];
    assert_eq!(spectra(0.0, None, Vec::new(), 1e-2), MotionError::NothingWatched);
    let late = spectra(0.86, None, watched.clone(), 1e-2);
    assert!(matches!(late, MotionError::TooFewSamples { samples: 15, .. }), "{late}");
    let beyond = spectra(1.0, None, watched.clone(), 1e-2);
    assert!(beyond.to_string().contains("before the end"), "{beyond}");
    let high = spectra(0.0, Some(51.0), watched.clone(), 1e-2);
    assert!(high.to_string().contains("Nyquist"), "{high}");
    let long = spectra(0.0, None, watched, 1e-7);
    assert!(matches!(long, MotionError::TooManySamples { .. }), "{long}");
}

#[test]
fn what_ends_early_has_spectra_of_what_it_did() {
    let start = single();
    let mut motion = start.motion(AVERAGE, 1.0, 1e-2);
    motion.watched = vec![Watched::AxialForce {
        segment: SegmentId::new(0),
    }];
    motion.spectra = Some(SpectraGiven { from: 0.1, up_to: None });
    motion.frames.stride = 1;
    for (frames, samples) in [(31, Some(21)), (20, None)] {
        let mut running = Running::begin(Arc::clone(&start.analysis), Arc::new(motion.clone())).expect("a motion");
        for _ in 0..frames {
            running.next_frame(&mut |_| ControlFlow::Continue(())).expect("a frame");
        }
        let outcome = running.finish();
        assert_eq!(outcome.ending, Ending::Cancelled);
        assert_eq!(outcome.spectra.first().map(|spectrum| spectrum.samples), samples);
    }
}

#[test]
fn the_case_at_rest() {
    let (start, foot) = mast();
    let net = start.net();
    let mut motion = start.motion(AVERAGE, 2.0, 1e-2);
    motion.case.nodal_forces[1].z = -100.0;
    motion.case.pressures = vec![7.0];
    let driven = |history| Driven::Case {
        case: start.force(1, Vector3::x()),
        history,
    };
    let harmonic = |end| History::Harmonic {
        mean: 5.0,
        amplitude: 3.0,
        frequency: 1.3,
        phase: 0.2,
        start: 0.5,
        end,
    };
    let force = |history: History| {
        let mut motion = motion.clone();
        motion.driven.push(driven(history));
        let settled = settled_case(net, &motion);
        assert_eq!(settled.nodal_forces[1].z, -100.0);
        assert_eq!(settled.pressures, [7.0]);
        settled.nodal_forces[1].x
    };
    assert_eq!(force(History::Constant(4.0)), 4.0);
    assert_eq!(force(History::Table(vec![(0.0, 1.0), (4.0, 9.0)])), 5.0);
    assert_eq!(force(harmonic(2.0)), 5.0);
    assert_eq!(force(harmonic(1.9)), 0.0);
    let step = |at| History::Step {
        at,
        before: 1.0,
        after: 2.0,
    };
    assert_eq!(force(step(1.9)), 2.0);
    // The motion never sees what comes at its very end.
    assert_eq!(force(step(2.0)), 1.0);

    let mut shaken = start.case();
    shaken.support_movements[foot.index()] = Vector3::z();
    shaken.pressures = vec![10.0];
    motion.driven = vec![
        Driven::Case {
            case: Box::new(shaken),
            history: History::Ramp {
                start: 0.0,
                end: 1.0,
                before: 0.0,
                after: 0.3,
            },
        },
        Driven::Wind {
            coefficients: vec![-0.8],
            density: 1.25,
            along: Vector3::x(),
            speed: harmonic(9.0),
        },
    ];
    let when = [BreakWhen::Time(1.999), BreakWhen::Tension(1.0)];
    motion.breaks = (when.into_iter().enumerate())
        .map(|(place, when)| Break {
            segments: vec![SegmentId::new(place)],
            when,
            release: 0.5,
        })
        .collect();
    let settled = settled_case(net, &motion);
    assert_eq!(settled.support_movements[foot.index()], Vector3::z() * 0.3);
    let pressure = 7.0 + 3.0 - 0.5 * 1.25 * 0.8 * 25.0;
    assert!((settled.pressures[0] - pressure).abs() < 1e-12);
    assert_eq!(settled.removed[..3], [true, false, false]);
}
