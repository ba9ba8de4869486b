//! Nets with struts: closed forms, unstable balances, hard starts.

use nalgebra::Vector3;
use ropewalk_numerics::equilibrium::audit::{Audit, audit};
use ropewalk_numerics::equilibrium::{IterationReport, LoadSteps, Settings, Solution, SolveError, Termination, Way};
use ropewalk_numerics::model::NodeId;

use crate::nets::Example;

/// A mast of 5 m with guys to anchors around its foot at the given angles, each guy shortened by `strain`.
fn mast(angles: &[f64], strain: f64) -> Example {
    let mut net = Example {
        positions: vec![Vector3::zeros(), Vector3::new(0.0, 0.0, 5.0)],
        held: vec![0],
        struts: vec![(0, 1, 2e7, 5.0)],
        ..Example::default()
    };
    for angle in angles {
        let anchor = net.positions.len();
        net.positions
            .push(Vector3::new(4.0 * angle.cos(), 4.0 * angle.sin(), 0.0));
        net.held.push(anchor);
        net.segments.push((1, anchor, 5e6, 41_f64.sqrt() / (1.0 + strain)));
    }
    net.loads = vec![Vector3::zeros(); net.positions.len()];
    net
}

fn around(n: u32) -> Vec<f64> {
    (0..n)
        .map(|i| 0.3 + std::f64::consts::TAU * f64::from(i) / f64::from(n))
        .collect()
}

#[test]
fn a_guyed_mast_stands() {
    let mut net = mast(&around(3), 0.003);
    net.loads[1] = Vector3::new(2000.0, -500.0, -10_000.0);
    let solution = net.solve().unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    assert!(solution.axial_forces[3] < -30_000.0, "{:?}", solution.axial_forces);
    let imbalance = net.imbalance(&solution)[1];
    assert!(imbalance.norm() < 1e-5, "{imbalance}");
}

#[test]
fn a_mast_with_guys_in_one_plane_is_not_called_balanced() {
    let net = mast(&[0.0, std::f64::consts::PI], 0.003);
    let Err(SolveError::FreeMovement {
        nodes,
        direction,
        stiffness,
        segments,
    }) = net.solve()
    else {
        panic!("nothing holds the head across the plane")
    };
    assert_eq!(nodes, [NodeId::new(1)]);
    assert!((direction - Vector3::y()).norm() < 1e-9, "{direction}");
    // By hand: 2 T/l of the guys less N/h of the mast; N = 2 T · 5/l: equal in size, so that prestress brings nothing.
    assert!(stiffness.abs() < 1.0, "{stiffness}");
    assert_eq!(segments.len(), 3);
}

/// The head carries a load, so that the mast is squeezed more than the guys pull.
#[test]
fn compression_drives_the_free_movement() {
    let mut net = mast(&[0.0, std::f64::consts::PI], 0.003);
    net.loads[1].z = -20_000.0;
    let Err(SolveError::FreeMovement { stiffness, .. }) = net.solve() else {
        panic!("nothing holds the head across the plane")
    };
    // −P/h, P the load, h the height at balance (by hand from lateral balance of head and guys).
    assert!((stiffness + 20_000.0 / 5.0).abs() < 0.01 * 4000.0, "{stiffness}");
}

#[test]
fn a_strut_alone_in_space_moves_freely() {
    let mut net = mast(&around(3), 0.003);
    let (a, b) = (net.positions.len(), net.positions.len() + 1);
    net.positions
        .extend([Vector3::new(9.0, 0.0, 0.0), Vector3::new(9.0, 0.0, 1.0)]);
    net.held.push(a);
    net.struts.push((a, b, 1e6, 1.0));
    let outcome = net.solve();
    let solution = outcome.unwrap();
    assert_eq!(
        solution.loose_nodes,
        [NodeId::new(b)],
        "a strut without force holds nothing in place"
    );
    net.loads.resize(b + 1, Vector3::zeros());
    net.loads[b].z = -50.0;
    assert!(
        matches!(net.solve(), Err(SolveError::FreeMovement { .. })),
        "a pencil on its tip"
    );
}

/// Two struts in a flat arch snap through at a load known in closed form (standard theory: two-bar truss, engineering
/// strain on the initial length).
#[test]
fn a_flat_arch_snaps_through_beyond_its_limit() {
    let (half, rise, ea) = (10.0_f64, 0.5_f64, 1e7);
    let l0 = half.hypot(rise);
    let push = |w: f64| {
        let l = half.hypot(rise - w);
        2.0 * ea * (l0 - l) / l0 * (rise - w) / l
    };
    let limit = (0..10_000)
        .map(|i| push(rise * f64::from(i) / 10_000.0))
        .fold(0.0, f64::max);
    let arch = |load: f64| Example {
        positions: vec![
            Vector3::zeros(),
            Vector3::new(half, 0.0, rise),
            Vector3::new(2.0 * half, 0.0, 0.0),
            Vector3::new(half, 8.0, rise),
            Vector3::new(half, -8.0, rise),
        ],
        held: vec![0, 2, 3, 4],
        struts: vec![(0, 1, ea, l0), (1, 2, ea, l0)],
        // Side ropes keep the crown in its plane; too weak to matter along it.
        segments: vec![(1, 3, 1.2e4, 7.99), (1, 4, 1.2e4, 7.99)],
        loads: vec![Vector3::zeros(), Vector3::new(0.0, 0.0, -load)],
        ..Example::default()
    };
    for share in [0.5, 0.9] {
        let net = arch(share * limit);
        let solution = net.solve().unwrap();
        assert_eq!(solution.termination, Termination::Converged);
        assert!(
            solution.positions[1].z > 0.2,
            "before the limit: {}",
            solution.positions[1].z
        );
        assert!(net.imbalance(&solution)[1].norm() < 1e-4);
    }
    for steps in [LoadSteps::FullFirst, LoadSteps::Equal(8)] {
        let net = arch(1.2 * limit);
        let settings = Settings {
            load_steps: steps,
            ..Settings::default()
        };
        let solution = net.solve_with(&settings).unwrap();
        assert_eq!(solution.termination, Termination::Converged);
        assert!(solution.positions[1].z < -0.3, "beyond it: {}", solution.positions[1].z);
        assert!(net.imbalance(&solution)[1].norm() < 1e-4);
    }
}

/// A mast of three lengths of 3 m with three guys at each joint, all of them slack by 3 %, its joints given on a heap
/// around its foot.
fn heaped_mast() -> Example {
    let joints = [
        Vector3::new(-1.5, 2.5, 0.0),
        Vector3::new(-1.0, 1.0, 1.0),
        Vector3::new(1.0, -2.0, -1.0),
    ];
    let load = Vector3::new(-7000.0, -3000.0, -5000.0);
    let mut net = Example {
        positions: [Vector3::zeros()].into_iter().chain(joints).collect(),
        held: vec![0],
        struts: (0..3).map(|i| (i, i + 1, 2e7, 3.0)).collect(),
        loads: vec![Vector3::zeros(), load, load, load],
        ..Example::default()
    };
    for joint in 1..=3 {
        for angle in around(3) {
            let anchor = net.positions.len();
            net.positions
                .push(Vector3::new(6.0 * angle.cos(), 6.0 * angle.sin(), 0.0));
            net.held.push(anchor);
            let length = 1.03 * 6.0_f64.hypot(3.0 * joint as f64);
            net.segments.push((joint, anchor, 5e6, length));
        }
    }
    net
}

fn audited(net: &Example, solution: &Solution) -> Audit {
    audit(&net.net(), &net.case(), &solution.positions, &solution.axial_forces)
}

/// Full load fails, and so does every smaller step; relaxation gets near, and Newton ends it.
#[test]
fn a_heaped_mast_needs_relaxation() {
    let net = heaped_mast();
    let solution = net.solve().unwrap();
    assert_eq!(
        (solution.termination, solution.way),
        (Termination::Converged, Way::Relaxation)
    );
    assert_eq!(solution.load_factor, 1.0);
    let last = solution.history.last().unwrap();
    assert_eq!(
        (last.way, last.load_factor),
        (Way::Newton, 1.0),
        "Newton has the last word"
    );
    let earlier = |r: &&IterationReport| r.load_step < last.load_step;
    let tried = solution.history.iter().filter(earlier);
    assert!(tried.clone().any(|r| r.load_factor == 1.0) && tried.clone().any(|r| r.load_factor < 1.0));
    assert!(tried.clone().all(|r| r.way != Way::Relaxation));
    let audit = audited(&net, &solution);
    assert!(audit.passed, "{audit:?}");
    let imbalance = net.imbalance(&solution);
    assert!(imbalance[1..=3].iter().all(|left| left.norm() < 1e-4), "{imbalance:?}");
}

/// A prism of three struts between ropes on a held triangle, its top triangle turned by `twist`, the ropes shortened by
/// `tight`; the start of each top node lies off by a row of `offsets` (m).
fn prism(twist: f64, tight: f64, stiffness: [f64; 2], offsets: [[f64; 3]; 3], loads: [[f64; 3]; 3]) -> Example {
    let [rope, strut] = stiffness;
    let at = |i: usize, turn: f64, z: f64| {
        let angle = std::f64::consts::TAU * i as f64 / 3.0 + turn;
        Vector3::new(2.0 * angle.cos(), 2.0 * angle.sin(), z)
    };
    let mut net = Example {
        positions: (0..3)
            .map(|i| at(i, 0.0, 0.0))
            .chain((0..3).map(|i| at(i, twist, 3.0)))
            .collect(),
        held: vec![0, 1, 2],
        loads: vec![Vector3::zeros(); 6],
        ..Example::default()
    };
    for i in 0..3 {
        let apart = |a: usize, b: usize| (net.positions[a] - net.positions[b]).norm();
        let (top, next, foot) = (3 + i, 3 + (i + 1) % 3, (i + 1) % 3);
        net.segments.push((top, next, rope, tight * apart(top, next)));
        net.segments.push((i, top, rope, tight * apart(i, top)));
        net.struts.push((foot, top, strut, apart(foot, top)));
    }
    for i in 0..3 {
        net.positions[3 + i] += Vector3::from(offsets[i]);
        net.loads[3 + i] = Vector3::from(loads[i]);
    }
    net
}

/// Full load fails from these starts; a quarter of it, then three quarters, then all of it do not.
#[test]
fn prisms_that_need_smaller_load_steps() {
    let soft = prism(
        0.6,
        0.99,
        [1e4, 1e7],
        [[0.5, -1.0, -1.0], [-1.5, 0.0, -0.5], [1.0, -2.0, -2.0]],
        [[25.0, 100.0, -125.0], [-50.0, 50.0, -150.0], [50.0, -25.0, -175.0]],
    );
    let stiff = prism(
        1.0,
        1.0,
        [1e6, 1e7],
        [[-1.5, 2.0, 1.0], [-1.0, 1.0, 2.0], [0.5, -1.5, 2.0]],
        [[-25.0, 25.0, -175.0], [-25.0, 100.0, -75.0], [-50.0, 25.0, -75.0]],
    );
    for (net, way) in [(soft, Way::Newton), (stiff, Way::InteriorPoint)] {
        let solution = net.solve().unwrap();
        assert_eq!((solution.termination, solution.way), (Termination::Converged, way));
        assert_eq!(solution.load_factor, 1.0);
        let mut levels: Vec<(u32, f64)> = solution.history.iter().map(|r| (r.load_step, r.load_factor)).collect();
        levels.dedup();
        assert_eq!(levels, [(1, 1.0), (2, 0.25), (3, 0.75), (4, 1.0)]);
        assert!(solution.history.iter().all(|r| r.way != Way::Relaxation));
        let audit = audited(&net, &solution);
        assert!(audit.passed, "{audit:?}");
        let largest = solution.axial_forces.iter().fold(0.0, |m: f64, n| m.max(n.abs()));
        for left in &net.imbalance(&solution)[3..] {
            assert!(left.norm() < 1e-8 * largest, "{left}");
        }
    }
}

#[test]
fn a_slack_rope_beside_a_strut_between_supports_is_loose() {
    // Nothing that can move has any stiffness: the question for a free movement has no measure to go by.
    let net = Example {
        positions: vec![
            Vector3::zeros(),
            Vector3::new(4.0, 0.0, 0.0),
            Vector3::new(2.0, 0.0, 0.0),
        ],
        held: vec![0, 1],
        segments: vec![(0, 2, 1e6, 2.5), (2, 1, 1e6, 2.5)],
        struts: vec![(0, 1, 1e7, 4.0)],
        ..Example::default()
    };
    let solution = net.solve().unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    assert_eq!(solution.loose_nodes, [NodeId::new(2)]);
}
