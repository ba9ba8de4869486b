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
