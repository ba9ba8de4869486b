//! How a solve ends when it does not converge, and numbers at the edge.

use std::ops::ControlFlow;

use nalgebra::Vector3;
use ropewalk_numerics::assembly::LoadingError;
use ropewalk_numerics::equilibrium::{Analysis, IterationReport, Settings, SolveError, Termination, Way, solve};

use crate::nets::{Example, grid};
use crate::saddle::saddle_net;

/// Solves and stops at the first report that `stop` accepts; returns how it ended and the reports after that one.
fn stopped(net: &Example, stop: impl Fn(&IterationReport) -> bool) -> (Termination, usize) {
    let analysis = Analysis::new(net.net());
    let (mut has_stopped, mut after) = (false, 0);
    let mut watch = |report: &IterationReport| {
        after += usize::from(has_stopped);
        if has_stopped || stop(report) {
            has_stopped = true;
            return ControlFlow::Break(());
        }
        ControlFlow::Continue(())
    };
    let settings = Settings::default();
    let solution = solve(
        &analysis,
        &net.case(),
        &net.positions,
        &net.lengths(),
        &settings,
        &mut watch,
    )
    .unwrap();
    assert!(has_stopped);
    (solution.termination, after)
}

#[test]
fn the_observer_stops_every_method_at_once() {
    assert_eq!(
        stopped(&saddle_net(), |r| r.iteration == 2),
        (Termination::Cancelled, 0)
    );
    let mut slack = grid(6, 12.0, 1e6, |u, w| u * u - w * w);
    slack.segments.iter_mut().for_each(|s| s.3 *= 1.02);
    slack.loads = vec![Vector3::new(0.0, 0.0, -500.0); slack.positions.len()];
    for way in [Way::InteriorPoint, Way::Polish] {
        assert_eq!(stopped(&slack, |r| r.way == way), (Termination::Cancelled, 0));
    }
}

#[test]
fn the_limit_of_iterations_is_kept() {
    let settings = Settings {
        max_iterations: 3,
        ..Settings::default()
    };
    let solution = saddle_net().solve_with(&settings).unwrap();
    assert!(solution.factorisations <= 3);
    assert_eq!(solution.termination, Termination::IterationLimit);
    assert!(solution.positions.iter().all(|x| x.norm().is_finite()));
}

#[test]
fn absurd_numbers_are_named() {
    let mut net = saddle_net();
    net.segments[7].2 = 1e300;
    assert!(matches!(
        net.solve(),
        Err(SolveError::Loading(LoadingError::Segment { what: "stiffness", .. }))
    ));
    let mut net = saddle_net();
    net.loads[20].z = -1e300;
    assert!(matches!(
        net.solve(),
        Err(SolveError::Loading(LoadingError::Node { what: "force", .. }))
    ));
    net.loads[20].z = f64::NAN;
    assert!(matches!(
        net.solve(),
        Err(SolveError::Loading(LoadingError::Node { .. }))
    ));
    let mut net = saddle_net();
    net.strains = vec![-1.5];
    assert!(matches!(
        net.solve(),
        Err(SolveError::Loading(LoadingError::Segment { .. }))
    ));
}

/// Numbers that overflow nothing but mean nothing: any ending but a wrong answer will do.
#[test]
fn numbers_at_the_edge_end_cleanly() {
    for (stiffness, load) in [
        (1e95, 1.0),
        (4e6, 1e95),
        (1e90, 1e90),
        (1e-90, 1.0),
        (1e-90, 1e90),
        (1e40, 1e-40),
    ] {
        let mut net = saddle_net();
        net.segments.iter_mut().step_by(3).for_each(|s| s.2 = stiffness);
        net.loads.iter_mut().for_each(|p| *p *= load);
        let Ok(solution) = net.solve() else { continue };
        assert!(solution.positions.iter().all(|x| x.iter().all(|c| c.is_finite())));
        if solution.termination == Termination::Converged {
            let audit = ropewalk_numerics::equilibrium::audit::audit(
                &net.net(),
                &net.case(),
                &solution.positions,
                &solution.axial_forces,
            );
            assert!(audit.passed, "{stiffness:e} {load:e}: {audit:?}");
        }
    }
}

/// Nothing but one rope to hang from, far away: the load is held, and the net gets there.
#[test]
fn a_node_far_below_its_place_is_found() {
    let net = Example {
        positions: vec![Vector3::zeros(), Vector3::new(0.0, 0.0, 1e-3)],
        held: vec![0],
        segments: vec![(0, 1, 1e5, 50.0)],
        loads: vec![Vector3::zeros(), Vector3::new(0.0, 0.0, -1000.0)],
        ..Example::default()
    };
    let solution = net.solve().unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    assert!(
        (solution.positions[1].z + 50.5).abs() < 1e-6,
        "{}",
        solution.positions[1]
    );
}

/// World coordinates cost digits: the answer says so by what it leaves out of balance, and is still an answer.
#[test]
fn a_net_far_from_the_origin_is_solved_to_its_rounding() {
    let near = saddle_net();
    let wanted = near.solve().unwrap();
    for shift in [1e4, 3e6] {
        let mut far = near.clone();
        far.positions
            .iter_mut()
            .for_each(|x| *x += Vector3::new(shift, -shift, 0.0));
        let solution = far.solve().unwrap();
        assert_eq!(solution.termination, Termination::Converged, "{shift:e}");
        let audit = ropewalk_numerics::equilibrium::audit::audit(
            &far.net(),
            &far.case(),
            &solution.positions,
            &solution.axial_forces,
        );
        assert!(
            audit.passed,
            "{shift:e}: {} N of {} N",
            audit.largest_imbalance, audit.allowed
        );
        for (a, b) in solution.axial_forces.iter().zip(&wanted.axial_forces) {
            // k ε x of the rounded chords, where x is the size of the coordinates.
            assert!(
                (a - b).abs() < 1e-5 + 20.0 * 4e6 / 1.7 * f64::EPSILON * shift,
                "{shift:e}: {a} {b}"
            );
        }
    }
}

/// Slack nets of some size, whose start is nearly inextensible: the interior point's home ground.
#[test]
fn larger_slack_nets_are_solved() {
    for n in [16, 32, 48] {
        let mut net = grid(n, 24.0, 1e7, |u, w| 1.5 * (u * u - w * w));
        net.segments.iter_mut().for_each(|s| s.3 *= 1.02);
        net.loads = vec![Vector3::new(0.0, 0.0, -800.0); net.positions.len()];
        let solution = net.solve().unwrap();
        assert_eq!(solution.termination, Termination::Converged);
        assert!(solution.factorisations <= 30, "{n}: {}", solution.factorisations);
        println!(
            "slack {n} x {n}: {} factorisations, {:?}",
            solution.factorisations, solution.way
        );
    }
}

#[test]
fn a_net_that_can_not_move_has_its_forces() {
    let net = Example {
        positions: vec![Vector3::zeros(), Vector3::new(2.0, 0.0, 0.0)],
        held: vec![0, 1],
        segments: vec![(0, 1, 1e6, 1.9)],
        ..Example::default()
    };
    let solution = net.solve().unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    assert!((solution.axial_forces[0] - 1e6 * 0.1 / 1.9).abs() < 1e-6);
}

#[test]
fn a_node_without_members_is_loose_and_harms_nothing() {
    let mut net = saddle_net();
    let lonely = net.positions.len();
    net.positions.push(Vector3::new(1.0, 1.0, 9.0));
    let removed = net.segments.len();
    net.positions.push(Vector3::new(2.0, 1.0, 9.0));
    net.segments.push((0, lonely + 1, 1e6, 1.0));
    net.removed = vec![removed];
    let solution = net.solve().unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    let loose: Vec<usize> = solution.loose_nodes.iter().map(|n| n.index()).collect();
    assert_eq!(loose, [lonely, lonely + 1]);
    assert_eq!(solution.axial_forces[removed], 0.0);
    let whole = saddle_net().solve().unwrap();
    for (a, b) in solution.axial_forces.iter().zip(&whole.axial_forces) {
        assert!((a - b).abs() < 1e-4);
    }
}

#[test]
fn coincident_nodes_are_pulled_apart() {
    let net = Example {
        positions: vec![
            Vector3::zeros(),
            Vector3::zeros(),
            Vector3::zeros(),
            Vector3::new(1.0, 0.0, 0.0),
        ],
        held: vec![0, 3],
        segments: vec![(0, 1, 1e5, 1.0), (1, 2, 1e5, 1.0), (2, 3, 1e5, 1.0)],
        loads: vec![
            Vector3::zeros(),
            Vector3::new(0.0, 0.0, -50.0),
            Vector3::new(0.0, 0.0, -50.0),
            Vector3::zeros(),
        ],
        ..Example::default()
    };
    let solution = net.solve().unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    // Three equal bars over one bar's width hang as a symmetric trapezium with a level middle.
    assert!((solution.positions[1].z - solution.positions[2].z).abs() < 1e-9);
    assert!((solution.axial_forces[0] - solution.axial_forces[2]).abs() < 1e-6);
}

#[test]
fn supports_move_and_temperatures_come_with_the_load_factor() {
    let mut net = saddle_net();
    net.movements = vec![(net.held[2], Vector3::new(0.0, 0.0, 0.04))];
    net.strains = vec![2e-4; net.segments.len()];
    let settings = Settings {
        load_steps: ropewalk_numerics::equilibrium::LoadSteps::Equal(4),
        ..Settings::default()
    };
    let solution = net.solve_with(&settings).unwrap();
    let place = net.held[2];
    for (index, step) in solution.steps.iter().enumerate() {
        let share = (index + 1) as f64 / 4.0;
        let moved = step.positions[place] - net.positions[place];
        assert!((moved - Vector3::new(0.0, 0.0, 0.04 * share)).norm() < 1e-14);
        let mut part = net.clone();
        part.movements[0].1 *= share;
        part.loads.iter_mut().for_each(|p| *p *= share);
        part.strains.iter_mut().for_each(|s| *s *= share);
        let alone = part.solve().unwrap();
        for (a, b) in step.axial_forces.iter().zip(&alone.axial_forces) {
            assert!((a - b).abs() < 1e-3, "{a} {b}");
        }
    }
}
