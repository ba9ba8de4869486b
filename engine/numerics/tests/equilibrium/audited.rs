//! The audit passes what the solver finds and catches what is corrupted.

use nalgebra::{DMatrix, Vector3};
use ropewalk_numerics::equilibrium::Termination;
use ropewalk_numerics::equilibrium::audit::audit;
use ropewalk_numerics::model::{ElasticSupportGiven, NodeId, SegmentId};

use crate::nets::Example;
use crate::saddle::saddle_net;

#[test]
fn a_solved_state_passes_and_its_supports_bear_its_loads() {
    let net = saddle_net();
    let solution = net.solve().unwrap();
    let audit = audit(&net.net(), &net.case(), &solution.positions, &solution.axial_forces);
    assert!(audit.passed, "{audit:?}");
    assert!((audit.load_sum + audit.support_sum).norm() < 24.0 * audit.allowed);
    assert!((audit.load_sum.z + 18.0 * 9600.0).abs() < 1e-9);
}

#[test]
fn one_corrupted_tension_is_found() {
    let net = saddle_net();
    let mut solution = net.solve().unwrap();
    solution.axial_forces[17] *= 1.0 + 1e-6;
    let audit = audit(&net.net(), &net.case(), &solution.positions, &solution.axial_forces);
    assert!(!audit.passed);
    assert_eq!(audit.segment, Some(SegmentId::new(17)));
    assert!(
        audit.largest_imbalance <= audit.allowed,
        "the positions are still right"
    );
}

#[test]
fn one_moved_node_is_found() {
    let net = saddle_net();
    let mut solution = net.solve().unwrap();
    let node = (0..60).find(|n| !net.held.contains(n)).unwrap();
    solution.positions[node].z += 1e-6;
    let audit = audit(&net.net(), &net.case(), &solution.positions, &solution.axial_forces);
    assert!(!audit.passed);
    solution.positions[node].z = f64::NAN;
    let net_audit = ropewalk_numerics::equilibrium::audit::audit(
        &net.net(),
        &net.case(),
        &solution.positions,
        &solution.axial_forces,
    );
    assert!(!net_audit.passed);
}

#[test]
fn a_support_that_is_not_where_the_case_puts_it_is_found() {
    // Everything moved alike is in balance, but not on its supports.
    let net = saddle_net();
    let mut solution = net.solve().unwrap();
    solution.positions.iter_mut().for_each(|x| x.y += 1e-6);
    let state = audit(&net.net(), &net.case(), &solution.positions, &solution.axial_forces);
    assert!(!state.passed && state.largest_imbalance <= state.allowed, "{state:?}");
    assert!((state.largest_misplacement - 1e-6).abs() < 1e-12);
}

#[test]
fn skew_sliders_movements_and_coupled_springs_are_balanced_too() {
    let mut net = saddle_net();
    let slider = net.held.remove(3);
    net.sliders.push((slider, vec![Vector3::new(0.3, 0.2, 1.0)]));
    net.movements.push((net.held[9], Vector3::new(0.02, -0.01, 0.03)));
    let (a, b) = (net.held.remove(1), net.held.remove(2));
    let mut stiffness = DMatrix::identity(6, 6) * 4e6;
    for axis in 0..3 {
        stiffness[(axis, 3 + axis)] = -1e6;
        stiffness[(3 + axis, axis)] = -1e6;
    }
    net.elastic.push(ElasticSupportGiven {
        nodes: vec![NodeId::new(a), NodeId::new(b)],
        stiffness,
    });
    net.movements.push((a, Vector3::new(-0.01, 0.0, -0.002)));
    let solution = net.solve().unwrap();
    let audit = audit(&net.net(), &net.case(), &solution.positions, &solution.axial_forces);
    assert!(audit.passed, "{audit:?}");
    assert!(audit.support_forces[a].norm() > 1e3);
    let slid = solution.positions[slider] - net.positions[slider];
    assert!(slid.norm() > 1e-4 && slid.cross(&Vector3::new(0.3, 0.2, 1.0)).norm() < 1e-12);
    let moved = net.movements[0].0;
    assert_eq!(solution.positions[moved], net.positions[moved] + net.movements[0].1);
}

/// A hanging chain from which the load is taken: its forces fade to what the last bits of the positions make of `EA`.
#[test]
fn forces_that_fade_without_load_pass_and_hold_nothing() {
    for (n, sag) in [(3, 4.0), (3, 4.8), (6, 4.0), (6, 12.0), (11, 4.04)] {
        let mut net = Example {
            held: vec![0, n],
            ..Example::default()
        };
        for i in 0..=n {
            let u = i as f64 / n as f64;
            let z = -sag * u * (1.0 - u);
            net.positions.push(Vector3::new(10.0 * u, 0.3 * u * u, z));
        }
        for i in 0..n {
            let length = (net.positions[i + 1] - net.positions[i]).norm();
            net.segments
                .push((i, i + 1, 1e7, length * (1.0 - 1e-4 * (1.0 + i as f64))));
        }
        let solution = net.solve().unwrap();
        assert_eq!(solution.termination, Termination::Converged);
        assert_eq!(solution.loose_nodes.len(), n - 1, "all slack: no place is determined");
        let mut forces = solution.axial_forces.clone();
        let state = audit(&net.net(), &net.case(), &solution.positions, &forces);
        assert!(state.passed && state.allowed < 1e-6, "{state:?}");
        // What the last bits can not make is still found.
        forces[1] += 1e-3;
        assert!(!audit(&net.net(), &net.case(), &solution.positions, &forces).passed);
    }
}
