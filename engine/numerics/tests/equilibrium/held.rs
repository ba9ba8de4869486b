//! The graph test for loads that nothing holds, and nodes without a place.

use nalgebra::{DMatrix, Vector3};
use ropewalk_numerics::equilibrium::{SolveError, Termination};
use ropewalk_numerics::model::{ElasticSupportGiven, NodeId};

use crate::nets::Example;
use crate::saddle::saddle_net;

/// One rope between two nodes, loaded at its second.
fn rope() -> Example {
    Example {
        positions: vec![Vector3::zeros(), Vector3::new(1.0, 0.0, 0.0)],
        segments: vec![(0, 1, 1e6, 1.0)],
        loads: vec![Vector3::zeros(), Vector3::new(300.0, 0.0, -400.0)],
        ..Example::default()
    }
}

#[test]
fn a_part_that_nothing_holds_is_named() {
    let mut net = saddle_net();
    let first = net.positions.len();
    net.positions
        .extend([Vector3::new(20.0, 0.0, 0.0), Vector3::new(21.0, 0.0, 0.0)]);
    net.segments.push((first, first + 1, 1e6, 1.0));
    net.loads.resize(first + 2, Vector3::zeros());
    let solution = net.solve().unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    assert_eq!(
        solution.loose_nodes,
        [first, first + 1].map(NodeId::new),
        "not held, not loaded: loose"
    );

    net.loads[first] = Vector3::new(0.0, 3.0, -4.0);
    let Err(SolveError::NotHeld {
        nodes,
        direction,
        force,
    }) = net.solve()
    else {
        panic!("nothing holds the second part")
    };
    assert_eq!(nodes, [first, first + 1].map(NodeId::new));
    assert!((direction - Vector3::new(0.0, 0.6, -0.8)).norm() < 1e-12);
    assert!((force - 5.0).abs() < 1e-12);

    // Opposite loads pull the part straight and leave it in balance.
    net.loads[first + 1] = -net.loads[first];
    let solution = net.solve().unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    assert!((solution.axial_forces[net.segments.len() - 1] - 5.0).abs() < 1e-6);
    assert_eq!(solution.loose_nodes.len(), 2);
}

#[test]
fn a_slider_holds_across_its_direction_only() {
    let mut net = rope();
    net.sliders = vec![(0, vec![Vector3::new(0.0, 1.0, 1.0)])];
    let Err(SolveError::NotHeld { direction, force, .. }) = net.solve() else {
        panic!("the load has a part along the slide")
    };
    assert!((direction.dot(&Vector3::new(0.0, 1.0, 1.0).normalize()).abs() - 1.0).abs() < 1e-12);
    assert!((force - 400.0 / 2.0_f64.sqrt()).abs() < 1e-9);
    net.loads[1] = Vector3::new(300.0, 400.0, -400.0);
    let solution = net.solve().unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    assert_eq!(
        solution.loose_nodes,
        [0, 1].map(NodeId::new),
        "it may stand anywhere along the slide"
    );
}

#[test]
fn springs_hold_along_themselves() {
    let mut net = rope();
    let along = Vector3::new(0.6, 0.0, -0.8);
    let spring = along * along.transpose() * 2e4;
    net.elastic = vec![ElasticSupportGiven {
        nodes: vec![NodeId::new(0)],
        stiffness: DMatrix::from_iterator(3, 3, spring.iter().copied()),
    }];
    let solution = net.solve().unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    // 500 N along the spring: 25 mm; the rope hangs on along it.
    assert!((solution.positions[0].dot(&along) - 0.025).abs() < 1e-9);
    assert!((solution.axial_forces[0] - 500.0).abs() < 1e-6);
    net.loads[1].y = 1.0;
    assert!(matches!(net.solve(), Err(SolveError::NotHeld { .. })));
}

/// A matrix that resists only the difference of two nodes holds neither of them.
#[test]
fn coupled_supports_are_judged_together() {
    let mut net = rope();
    net.positions
        .extend([Vector3::new(0.0, 5.0, 0.0), Vector3::new(1.0, 5.0, 0.0)]);
    net.segments.push((2, 3, 1e6, 1.0));
    net.loads = vec![Vector3::zeros(); 4];
    net.loads[1] = Vector3::new(100.0, 0.0, 0.0);
    let mut stiffness = DMatrix::identity(6, 6) * 1e4;
    for axis in 0..3 {
        stiffness[(axis, 3 + axis)] = -1e4;
        stiffness[(3 + axis, axis)] = -1e4;
    }
    net.elastic = vec![ElasticSupportGiven {
        nodes: vec![NodeId::new(0), NodeId::new(2)],
        stiffness,
    }];
    assert!(matches!(net.solve(), Err(SolveError::NotHeld { .. })));
    net.loads[3] = Vector3::new(-100.0, 0.0, 0.0);
    let solution = net.solve().unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    assert!((solution.positions[0].x - solution.positions[2].x - 0.01).abs() < 1e-8);
    assert!((solution.axial_forces[0] - 100.0).abs() < 1e-6);
    assert_eq!(solution.loose_nodes.len(), 4, "both together may stand anywhere");
}

#[test]
fn slack_is_exact_and_its_nodes_are_loose() {
    let net = Example {
        positions: [0.0, 1.0, 2.0].map(|x| Vector3::new(x, 0.0, 0.0)).to_vec(),
        held: vec![0, 2],
        segments: vec![(0, 1, 1e6, 1.0), (1, 2, 1e6, 1.0)],
        ..Example::default()
    };
    let solution = net.solve().unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    assert_eq!(solution.axial_forces, [0.0, 0.0]);
    assert_eq!(solution.loose_nodes, [NodeId::new(1)]);
}

#[test]
fn a_spring_as_good_as_rigid_does_not_hide_a_soft_one() {
    for soft in [1e3, 1.0, 1e-1] {
        let mut net = rope();
        // Skew, so that the soft one shows in no single entry of the matrix.
        let (stiff, gives) = (Vector3::new(0.8, 0.0, 0.6), Vector3::new(-0.6, 0.0, 0.8));
        let stiffness = stiff * stiff.transpose() * 1e10
            + Vector3::y() * Vector3::y().transpose() * 1e10
            + gives * gives.transpose() * soft;
        net.elastic = vec![ElasticSupportGiven {
            nodes: vec![NodeId::new(0)],
            stiffness: DMatrix::from_column_slice(3, 3, stiffness.as_slice()),
        }];
        net.loads[1] = Vector3::new(0.0, 0.0, -0.05 * soft.min(1.0));
        let solution = net.solve().unwrap();
        assert_eq!(solution.termination, Termination::Converged, "{soft}");
        let sunk = solution.positions[0].dot(&gives);
        let expected = net.loads[1].dot(&gives) / soft;
        assert!((sunk - expected).abs() < 1e-4 * expected.abs(), "{sunk} {expected}");
    }
}
