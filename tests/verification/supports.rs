//! Each kind of support once, against its closed form.

use nalgebra::{DMatrix, Matrix2, Matrix3, Vector2, Vector3};
use ropewalk_numerics::load::Load;
use ropewalk_numerics::model::NodeId;

use crate::problem::{Answer, Problem, stiff, support_force};
use crate::report::Tolerance::{Absolute, Relative};
use crate::report::{check, check_all};

const SOURCE: &str = "statics by hand (our own)";
const CLOSE: crate::report::Tolerance = Relative(1e-9);

fn diagonal(stiffness: f64, direction: Vector3<f64>) -> DMatrix<f64> {
    let block = stiffness * direction * direction.transpose();
    DMatrix::from_iterator(3, 3, block.iter().copied())
}

#[test]
fn rigid() {
    // A load P on the lowest point of a V of 3-4-5 triangles, with the length for which it hangs at the origin:
    // T = 5 P / 8, and each support holds its rope's tension along the rope.
    let (load, axial_stiffness) = (16e3, 5e6);
    let tension = 5.0 * load / 8.0;
    let unstressed = 5.0 / (1.0 + tension / axial_stiffness);
    let mut problem = Problem::default();
    let left = problem.fixed(-3.0, 0.0, 4.0);
    let right = problem.fixed(3.0, 0.0, 4.0);
    let middle = problem.free(0.4, 0.1, -0.2);
    problem.bar(left, middle, stiff(axial_stiffness), unstressed);
    problem.bar(middle, right, stiff(axial_stiffness), unstressed);
    problem.always(Load::Nodes {
        nodes: vec![middle],
        force: Vector3::new(0.0, 0.0, -load),
    });
    let state = problem.solve().state;
    let force = support_force(&state, left).force;
    check_all(
        "rigid support: force on the net (N)",
        SOURCE,
        &[-0.6 * tension, 0.0, 0.8 * tension],
        force.as_slice(),
        Absolute(1e-6),
    );
    check_all(
        "rigid support: where the load hangs (m)",
        SOURCE,
        &[0.0; 3],
        state.positions[middle.index()].as_slice(),
        Absolute(1e-9),
    );
}

/// A node on a rail along `u`, between two ropes along the same line, with `tension` in both until a load pulls.
fn on_a_rail(u: Vector3<f64>, tension: f64, axial_stiffness: f64, spring: f64, load: Vector3<f64>) -> (Answer, NodeId) {
    let mut problem = Problem::default();
    let at = Vector3::new(2.0, -1.0, 4.0);
    let [back, ahead] = [at - 3.0 * u, at + 3.0 * u];
    let from = problem.fixed(back.x, back.y, back.z);
    let to = problem.fixed(ahead.x, ahead.y, ahead.z);
    let node = if spring > 0.0 {
        // The spring takes its own direction out of the rigid support.
        let node = problem.released(at, Vec::new());
        problem.elastic(vec![node], diagonal(spring, u));
        node
    } else {
        problem.released(at, vec![2.5 * u])
    };
    let unstressed = 3.0 / (1.0 + tension / axial_stiffness);
    problem.bar(from, node, stiff(axial_stiffness), unstressed);
    problem.bar(node, to, stiff(axial_stiffness), unstressed);
    problem.push_node(node, load.x, load.y, load.z);
    (problem.solve(), node)
}

#[test]
fn skew_release_and_skew_spring() {
    // Along the rail the two ropes, and the spring, act in parallel; across it the support takes the whole load.
    let u = Vector3::new(2.0, 1.0, -2.0) / 3.0;
    let load = Vector3::new(900.0, -300.0, 600.0);
    let (tension, axial_stiffness) = (4000.0, 2e6);
    let rope = axial_stiffness / (3.0 / (1.0 + tension / axial_stiffness));
    for (kind, spring) in [("skew release", 0.0), ("skew spring", 1.5e6)] {
        let along = load.dot(&u);
        let moved = along / (2.0 * rope + spring);
        let (answer, node) = on_a_rail(u, tension, axial_stiffness, spring, load);
        let state = &answer.state;
        check_all(
            &format!("{kind}: movement (m)"),
            SOURCE,
            (moved * u).as_slice(),
            state.displacements[node.index()].as_slice(),
            Absolute(1e-12),
        );
        check_all(
            &format!("{kind}: tensions (N)"),
            SOURCE,
            &[tension + rope * moved, tension - rope * moved],
            &state.axial_forces,
            CLOSE,
        );
        let expected = -(load - along * u) - spring * moved * u;
        let force = support_force(state, node);
        check_all(
            &format!("{kind}: support force (N)"),
            SOURCE,
            expected.as_slice(),
            force.force.as_slice(),
            Absolute(1e-6),
        );
        // Two held directions first, then the free one, whose sense is not fixed.
        let own = force.own_axes;
        check(
            &format!("{kind}: support force along the rail (N)"),
            SOURCE,
            spring * moved.abs(),
            own[2].abs(),
            Absolute(1e-6),
        );
        check(
            &format!("{kind}: support force across the rail (N)"),
            SOURCE,
            (load - along * u).norm(),
            own[0].hypot(own[1]),
            Absolute(1e-6),
        );
    }
}

/// A straight rope to an anchor that gives along the rope.
struct Sprung {
    span: f64,
    unstressed: f64,
    axial_stiffness: f64,
    spring: f64,
}

impl Sprung {
    fn solve(&self, anchor_moves: f64) -> (Answer, NodeId) {
        let mut problem = Problem::default();
        let from = problem.fixed(0.0, 0.0, 0.0);
        let to = problem.released(Vector3::new(self.span, 0.0, 0.0), Vec::new());
        problem.elastic(vec![to], diagonal(self.spring, Vector3::x()));
        problem.bar(from, to, stiff(self.axial_stiffness), self.unstressed);
        if anchor_moves != 0.0 {
            problem.load(Load::SupportMovement {
                node: to,
                by: Vector3::new(anchor_moves, 0.0, 0.0),
            });
        }
        (problem.solve(), to)
    }

    /// Rope and spring in series: `T (1/k + L0/EA) = span + movement − L0`.
    fn tension(&self, anchor_moves: f64) -> f64 {
        (self.span + anchor_moves - self.unstressed) / (1.0 / self.spring + self.unstressed / self.axial_stiffness)
    }
}

#[test]
fn spring() {
    let sprung = Sprung {
        span: 10.0,
        unstressed: 9.97,
        axial_stiffness: 4e6,
        spring: 3e5,
    };
    let tension = sprung.tension(0.0);
    let (answer, node) = sprung.solve(0.0);
    check(
        "spring: tension (N)",
        SOURCE,
        tension,
        answer.state.axial_forces[0],
        CLOSE,
    );
    check(
        "spring: position (m)",
        SOURCE,
        10.0 - tension / sprung.spring,
        answer.state.positions[node.index()].x,
        CLOSE,
    );
    let force = support_force(&answer.state, node).force;
    check_all(
        "spring: support force (N)",
        SOURCE,
        &[tension, 0.0, 0.0],
        force.as_slice(),
        Absolute(1e-6),
    );

    let (answer, _) = sprung.solve(0.02);
    check(
        "spring on an anchor that moves 20 mm: tension (N)",
        SOURCE,
        sprung.tension(0.02),
        answer.state.axial_forces[0],
        CLOSE,
    );
}

#[test]
fn springs_skew_to_each_other() {
    // Three springs that are not at right angles hold a node on which a slack rope ends: x = (Σ k b bᵀ)⁻¹ p.
    let directions = [
        Vector3::new(1.0, 0.2, 0.1).normalize(),
        Vector3::new(0.3, 1.0, -0.4).normalize(),
        Vector3::new(-0.5, 0.6, 1.0).normalize(),
    ];
    let stiffness: Matrix3<f64> = directions
        .iter()
        .zip([2e5, 5e4, 9e4])
        .map(|(b, k)| k * b * b.transpose())
        .sum();
    let load = Vector3::new(1200.0, -700.0, 400.0);
    let mut problem = Problem::default();
    let node = problem.released(Vector3::zeros(), Vec::new());
    problem.elastic(vec![node], DMatrix::from_iterator(3, 3, stiffness.iter().copied()));
    let far = problem.fixed(5.0, 0.0, 0.0);
    problem.bar(node, far, stiff(1e6), 6.0);
    problem.push_node(node, load.x, load.y, load.z);
    let state = problem.solve().state;
    let moved = stiffness.try_inverse().expect("the springs span space") * load;
    check_all(
        "skew springs: movement (m)",
        SOURCE,
        moved.as_slice(),
        state.displacements[node.index()].as_slice(),
        Absolute(1e-11),
    );
    check_all(
        "skew springs: support force (N)",
        SOURCE,
        (-load).as_slice(),
        support_force(&state, node).force.as_slice(),
        Absolute(1e-6),
    );
}

#[test]
fn prescribed_movement() {
    // A straight rope, clamped at its middle, between anchors of which one moves along it and across:
    // N = EA (l / L0 − 1) with l the new distance.
    let (axial_stiffness, unstressed) = (3e6, 9.98);
    let by = Vector3::new(0.03, -0.4, 0.25);
    let mut problem = Problem::default();
    let from = problem.fixed(0.0, 0.0, 0.0);
    let middle = problem.free(5.0, 0.0, 0.0);
    let to = problem.fixed(10.0, 0.0, 0.0);
    problem.bar(from, middle, stiff(axial_stiffness), 0.5 * unstressed);
    problem.bar(middle, to, stiff(axial_stiffness), 0.5 * unstressed);
    problem.load(Load::SupportMovement { node: to, by });
    let state = problem.solve().state;
    let ends = Vector3::new(10.0, 0.0, 0.0) + by;
    let tension = axial_stiffness * (ends.norm() / unstressed - 1.0);
    check_all(
        "moved support: tensions (N)",
        SOURCE,
        &[tension; 2],
        &state.axial_forces,
        CLOSE,
    );
    check_all(
        "moved support: middle (m)",
        SOURCE,
        (0.5 * ends).as_slice(),
        state.positions[middle.index()].as_slice(),
        Absolute(1e-9),
    );
    check_all(
        "moved support: support force (N)",
        SOURCE,
        (tension * ends.normalize()).as_slice(),
        support_force(&state, to).force.as_slice(),
        Absolute(1e-5),
    );
}

#[test]
fn coupled_stiffness_matrix() {
    // Two parallel ropes pull on two nodes of one wall, whose stiffness couples them. Along the ropes
    // (S + diag k) u = −k (span − L0); across them nothing moves.
    let wall = Matrix2::new(8e5, -3e5, -3e5, 5e5);
    let across = 4e6;
    let mut stiffness = DMatrix::zeros(6, 6);
    for row in 0..2 {
        for column in 0..2 {
            stiffness[(3 * row, 3 * column)] = wall[(row, column)];
        }
        for axis in 1..3 {
            stiffness[(3 * row + axis, 3 * row + axis)] = across;
        }
    }
    let (span, axial_stiffness) = (8.0, 6e6);
    let unstressed = [7.97, 7.99];
    let mut problem = Problem::default();
    let mut wall_nodes = Vec::new();
    for (y, l0) in [(0.0, unstressed[0]), (2.0, unstressed[1])] {
        let from = problem.fixed(0.0, y, 1.0);
        let to = problem.released(Vector3::new(span, y, 1.0), Vec::new());
        problem.bar(from, to, stiff(axial_stiffness), l0);
        wall_nodes.push(to);
    }
    problem.elastic(wall_nodes.clone(), stiffness);
    let state = problem.solve().state;

    let ropes = Vector2::new(axial_stiffness / unstressed[0], axial_stiffness / unstressed[1]);
    let tight = ropes.component_mul(&Vector2::new(span - unstressed[0], span - unstressed[1]));
    let moved = (wall + Matrix2::from_diagonal(&ropes))
        .try_inverse()
        .expect("wall and ropes are stiff")
        * -tight;
    let tensions = tight + ropes.component_mul(&moved);
    check_all(
        "stiffness matrix: tensions (N)",
        SOURCE,
        tensions.as_slice(),
        &state.axial_forces,
        CLOSE,
    );
    let found: Vec<f64> = wall_nodes.iter().map(|n| state.positions[n.index()].x - span).collect();
    check_all(
        "stiffness matrix: movement of the wall (m)",
        SOURCE,
        moved.as_slice(),
        &found,
        Absolute(1e-12),
    );
    for (node, tension) in wall_nodes.iter().zip(&tensions) {
        check_all(
            "stiffness matrix: support force (N)",
            SOURCE,
            &[*tension, 0.0, 0.0],
            support_force(&state, *node).force.as_slice(),
            Absolute(1e-5),
        );
    }
}
