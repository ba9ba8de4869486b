//! Each rule of prestress once, against its closed form. A share of the breaking force is a tension by the time it reaches
//! the kernel; it is checked over the wire.

use nalgebra::Vector3;
use ropewalk_numerics::brief::PrestressRule;
use ropewalk_numerics::load::Load;

use crate::problem::{Problem, stiff};
use crate::report::Tolerance::{Absolute, Relative};
use crate::report::{check, check_all};
use crate::scalar::root;

const SOURCE: &str = "statics by hand (our own)";
const AXIAL_STIFFNESS: f64 = 4e6;

#[test]
fn force_density() {
    // One node between three anchors: it lies at the mean of the anchors, weighted by the force densities.
    let anchors = [
        Vector3::new(0.0, 0.0, 3.0),
        Vector3::new(8.0, 1.0, 0.0),
        Vector3::new(2.0, 7.0, 1.0),
    ];
    let densities = [2000.0, 3000.0, 5000.0];
    let mut problem = Problem::default();
    let node = problem.free(20.0, 20.0, 20.0);
    for (at, density) in anchors.iter().zip(densities) {
        let anchor = problem.fixed(at.x, at.y, at.z);
        problem.cable(
            &[anchor, node],
            stiff(AXIAL_STIFFNESS),
            [PrestressRule::ForceDensity(density)],
        );
    }
    let state = problem.solve().state;
    let mean: Vector3<f64> = anchors.iter().zip(densities).map(|(a, q)| a * (q / 10_000.0)).sum();
    check_all(
        "rule force density: node (m)",
        SOURCE,
        mean.as_slice(),
        state.positions[node.index()].as_slice(),
        Absolute(1e-11),
    );
    let tensions: Vec<f64> = anchors
        .iter()
        .zip(densities)
        .map(|(a, q)| q * (a - mean).norm())
        .collect();
    check_all(
        "rule force density: tensions (N)",
        SOURCE,
        &tensions,
        &state.axial_forces,
        Relative(1e-11),
    );
    let lengths: Vec<f64> = tensions
        .iter()
        .zip(densities)
        .map(|(t, q)| t / q / (1.0 + t / AXIAL_STIFFNESS))
        .collect();
    check_all(
        "rule force density: unstressed lengths (m)",
        SOURCE,
        &lengths,
        &state.unstressed_lengths,
        Relative(1e-11),
    );
}

#[test]
fn tension() {
    // Three ropes with one tension meet at angles of 120°: over a base of half-width a, at a / √3 (Torricelli's point).
    let half = 3.0;
    let mut problem = Problem::default();
    let anchors = [
        problem.fixed(-half, 0.0, 2.0),
        problem.fixed(half, 0.0, 2.0),
        problem.fixed(0.0, 7.0, 2.0),
    ];
    let node = problem.free(0.5, 3.0, 2.5);
    for anchor in anchors {
        problem.cable(&[anchor, node], stiff(AXIAL_STIFFNESS), [PrestressRule::Tension(12e3)]);
    }
    let state = problem.solve().state;
    check_all(
        "rule tension: tensions (N)",
        SOURCE,
        &[12e3; 3],
        &state.axial_forces,
        Relative(1e-9),
    );
    check_all(
        "rule tension: node (m)",
        "Torricelli's point (from memory)",
        &[0.0, half / 3.0_f64.sqrt(), 2.0],
        state.positions[node.index()].as_slice(),
        Absolute(1e-8),
    );
}

#[test]
fn mean_tension() {
    // A level rope with two equal loads P at thirds of the span: with one force density q it hangs P / q deep, so that
    // the mean of its tensions is q (2 √(s² + (P/q)²) + s) / 3, s a third of the span.
    let (third, load, wanted) = (4.0, 3000.0, 20e3);
    let mut problem = Problem::default();
    let from = problem.fixed(0.0, 0.0, 0.0);
    let inner = [problem.free(4.5, 0.0, -1.0), problem.free(7.0, 0.2, -1.0)];
    let to = problem.fixed(3.0 * third, 0.0, 0.0);
    let rule = problem.mean_tension(wanted);
    problem.cable(&[from, inner[0], inner[1], to], stiff(AXIAL_STIFFNESS), [rule; 3]);
    problem.always(Load::Nodes {
        nodes: inner.to_vec(),
        force: Vector3::new(0.0, 0.0, -load),
    });
    let state = problem.solve().state;
    let density = root(1.0, 1e6, |q| q * (2.0 * third.hypot(load / q) + third) / 3.0 - wanted);
    let mean = state.axial_forces.iter().sum::<f64>() / 3.0;
    check("rule mean tension: mean (N)", SOURCE, wanted, mean, Relative(1e-9));
    check(
        "rule mean tension: depth (m)",
        SOURCE,
        load / density,
        -state.positions[inner[0].index()].z,
        Relative(1e-8),
    );
    let steep = density * third.hypot(load / density);
    check_all(
        "rule mean tension: tensions (N)",
        SOURCE,
        &[steep, density * third, steep],
        &state.axial_forces,
        Relative(1e-8),
    );
}

#[test]
fn unstressed_length() {
    // Two ropes of given length in line: N (L1 + L2) / EA = span − L1 − L2.
    let lengths = [2.99, 4.98];
    let mut problem = Problem::default();
    let from = problem.fixed(0.0, 0.0, 0.0);
    let joint = problem.free(1.0, 1.0, 1.0);
    let to = problem.fixed(8.0, 0.0, 0.0);
    problem.cable(
        &[from, joint, to],
        stiff(AXIAL_STIFFNESS),
        lengths.map(PrestressRule::UnstressedLength),
    );
    let state = problem.solve().state;
    let total = lengths[0] + lengths[1];
    let tension = AXIAL_STIFFNESS * (8.0 - total) / total;
    check_all(
        "rule unstressed length: tensions (N)",
        SOURCE,
        &[tension; 2],
        &state.axial_forces,
        Relative(1e-9),
    );
    check_all(
        "rule unstressed length: joint (m)",
        SOURCE,
        &[lengths[0] * 8.0 / total, 0.0, 0.0],
        state.positions[joint.index()].as_slice(),
        Absolute(1e-9),
    );
}

#[test]
fn balance() {
    // A mast 5 m high, a rope that pulls its head level with H, two guys at (−4, ±3, −5) from it:
    // each guy √50 H / 8, the mast −5 H / 4.
    let pull = 16e3;
    let mut problem = Problem::default();
    let foot = problem.fixed(0.0, 0.0, 0.0);
    let head = problem.free(0.0, 0.0, 5.0);
    let wall = problem.fixed(10.0, 0.0, 5.0);
    problem.cable(&[head, wall], stiff(AXIAL_STIFFNESS), [PrestressRule::Tension(pull)]);
    for side in [-3.0, 3.0] {
        let anchor = problem.fixed(-4.0, side, 0.0);
        problem.cable(&[head, anchor], stiff(2e7), [PrestressRule::Balance]);
    }
    problem.strut(foot, head, stiff(5e8), PrestressRule::Balance);
    problem.hold(head);
    let state = problem.solve().state;
    let guy = 50.0_f64.sqrt() * pull / 8.0;
    check_all(
        "rule balance: rope, guys and mast (N)",
        SOURCE,
        &[pull, guy, guy, -1.25 * pull],
        &state.axial_forces,
        Relative(1e-9),
    );
    check_all(
        "rule balance: the head stays (m)",
        SOURCE,
        &[0.0, 0.0, 5.0],
        state.positions[head.index()].as_slice(),
        Absolute(1e-9),
    );
    check(
        "rule balance: unstressed length of the mast (m)",
        SOURCE,
        5.0 / (1.0 - 1.25 * pull / 5e8),
        *state.unstressed_lengths.last().expect("the mast comes last"),
        Relative(1e-12),
    );
}
