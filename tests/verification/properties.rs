//! What must hold for any net: rigid motion, renumbering, mirror images and scaling change nothing that they should not,
//! and support forces balance loads.

use nalgebra::{Rotation3, Vector3};
use proptest::prelude::*;
use ropewalk_numerics::brief::StateResult;
use ropewalk_numerics::load::Load;
use ropewalk_numerics::model::NodeId;

use crate::problem::{Problem, stiff};

/// A rope of one segment.
#[derive(Clone, Copy, Debug)]
struct Rope {
    ends: [usize; 2],
    axial_stiffness: f64,
    unstressed: f64,
}

/// A net under loads as plain numbers, easy to transform.
#[derive(Clone, Debug)]
struct Given {
    positions: Vec<Vector3<f64>>,
    held: Vec<bool>,
    ropes: Vec<Rope>,
    loads: Vec<Vector3<f64>>,
}

/// Tensions are compared within this share of the largest, positions within this share of the net's size.
const SAME: f64 = 1e-7;

impl Given {
    fn solve(&self) -> StateResult {
        let mut problem = Problem::default();
        for (at, held) in self.positions.iter().zip(&self.held) {
            if *held {
                problem.fixed(at.x, at.y, at.z);
            } else {
                problem.free(at.x, at.y, at.z);
            }
        }
        for rope in &self.ropes {
            let [from, to] = rope.ends.map(NodeId::new);
            problem.bar(from, to, stiff(rope.axial_stiffness), rope.unstressed);
        }
        for (node, force) in self.loads.iter().enumerate() {
            problem.always(Load::Nodes {
                nodes: vec![NodeId::new(node)],
                force: *force,
            });
        }
        problem.solve().state
    }

    /// The same net with every position and load mapped.
    fn mapped(
        &self,
        place: impl Fn(&Vector3<f64>) -> Vector3<f64>,
        push: impl Fn(&Vector3<f64>) -> Vector3<f64>,
    ) -> Self {
        Self {
            positions: self.positions.iter().map(place).collect(),
            loads: self.loads.iter().map(push).collect(),
            ..self.clone()
        }
    }

    fn size(&self) -> f64 {
        self.positions.iter().map(|p| p.amax()).fold(1.0, f64::max)
    }
}

prop_compose! {
    /// A grid of ropes on a held rim, out of plane and irregular, some ropes tight and some too long, each free node loaded.
    fn nets()(
        rows in 3_usize..6,
        columns in 3_usize..6,
        rise in -0.3_f64..0.3,
        strain in 1e-3_f64..8e-3,
        stiffness in 5.5_f64..7.5,
        irregular in prop::collection::vec(-1.0_f64..1.0, 300),
    ) -> Given {
        let mut numbers = irregular.iter().copied().cycle();
        let mut any = move || numbers.next().expect("a cycle has no end");
        let mut positions = Vec::new();
        let mut held = Vec::new();
        for i in 0..rows {
            for j in 0..columns {
                let rim = i == 0 || j == 0 || i == rows - 1 || j == columns - 1;
                let [x, y] = [i, j].map(|k| 2.0 * k as f64);
                let jitter = if rim { 0.0 } else { 0.2 };
                positions.push(Vector3::new(x + jitter * any(), y + jitter * any(), rise * (x - y) + 0.2 * any()));
                held.push(rim);
            }
        }
        let mut ropes = Vec::new();
        for i in 0..rows {
            for j in 0..columns {
                let here = i * columns + j;
                for there in [(i + 1 < rows).then_some(here + columns), (j + 1 < columns).then_some(here + 1)] {
                    let Some(there) = there.filter(|there| !(held[here] && held[*there])) else {
                        continue;
                    };
                    let length = (positions[there] - positions[here]).norm();
                    ropes.push(Rope {
                        ends: [here, there],
                        axial_stiffness: 10.0_f64.powf(stiffness + 0.3 * any()),
                        unstressed: length * (1.0 - strain * (1.0 + 1.5 * any())),
                    });
                }
            }
        }
        let largest = 0.3 * strain * 10.0_f64.powf(stiffness);
        let loads = held
            .iter()
            .map(|held| if *held { Vector3::zeros() } else { largest * Vector3::new(0.3 * any(), 0.3 * any(), 1.1 + any()) })
            .collect();
        Given { positions, held, ropes, loads }
    }
}

/// Solves both nets, and compares the second's answer with what the first's becomes: tensions times a factor in the given
/// order of ropes, positions mapped and in the given order of nodes.
#[track_caller]
fn check(
    first: &Given,
    second: &Given,
    force: f64,
    place: impl Fn(&Vector3<f64>) -> Vector3<f64>,
    node: impl Fn(usize) -> usize,
    rope: impl Fn(usize) -> usize,
) {
    let [before, after] = [first.solve(), second.solve()];
    let largest = force * before.axial_forces.iter().copied().fold(0.0, f64::max);
    for (i, tension) in before.axial_forces.iter().enumerate() {
        let off = after.axial_forces[rope(i)] - force * tension;
        assert!(
            off.abs() <= SAME * largest,
            "rope {i}: tension off by {off} N of {largest} N"
        );
    }
    for (i, at) in before.positions.iter().enumerate() {
        let loose = before.loose_nodes.contains(&NodeId::new(i));
        let off = (after.positions[node(i)] - place(at)).norm();
        assert!(
            loose || off <= 10.0 * SAME * second.size(),
            "node {i}: position off by {off} m"
        );
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(128))]

    #[test]
    fn rigid_motion_moves_the_answer_along(
        net in nets(),
        axis in prop::array::uniform3(-3.0_f64..3.0),
        by in prop::array::uniform3(-50.0_f64..50.0),
    ) {
        let turn = Rotation3::new(Vector3::from(axis));
        let place = |p: &Vector3<f64>| turn * p + Vector3::from(by);
        check(&net, &net.mapped(place, |f| turn * f), 1.0, place, |i| i, |i| i);
    }

    #[test]
    fn mirror_image_has_the_mirrored_answer(net in nets(), normal in prop::array::uniform3(0.1_f64..1.0)) {
        let n = Vector3::from(normal).normalize();
        let mirror = |v: &Vector3<f64>| v - 2.0 * n * n.dot(v);
        check(&net, &net.mapped(mirror, mirror), 1.0, mirror, |i| i, |i| i);
    }

    #[test]
    fn lengths_and_forces_scale(net in nets(), lengths in 0.01_f64..100.0, forces in 0.001_f64..1000.0) {
        // Lengths times a and forces (EA among them) times b: positions times a, tensions times b.
        let place = |p: &Vector3<f64>| lengths * p;
        let mut scaled = net.mapped(place, |f| forces * f);
        for rope in &mut scaled.ropes {
            rope.axial_stiffness *= forces;
            rope.unstressed *= lengths;
        }
        check(&net, &scaled, forces, place, |i| i, |i| i);
    }

    #[test]
    fn numbering_does_not_matter(net in nets(), swap in any::<u64>()) {
        // Nodes and ropes in another order, every second rope the other way round.
        let shuffled = |n: usize, odd: u64| {
            let mut order: Vec<usize> = (0..n).collect();
            order.sort_by_key(|i| (*i as u64 + 1).wrapping_mul(swap | odd).rotate_left(29));
            order
        };
        let position_in = |order: &[usize]| {
            let mut position = vec![0; order.len()];
            order.iter().enumerate().for_each(|(new, old)| position[*old] = new);
            position
        };
        let nodes = shuffled(net.positions.len(), 1);
        let ropes = shuffled(net.ropes.len(), 3);
        let [new_node, new_rope] = [&nodes, &ropes].map(|order| position_in(order));
        let renumbered = Given {
            positions: nodes.iter().map(|old| net.positions[*old]).collect(),
            held: nodes.iter().map(|old| net.held[*old]).collect(),
            loads: nodes.iter().map(|old| net.loads[*old]).collect(),
            ropes: ropes
                .iter()
                .enumerate()
                .map(|(new, old)| {
                    let mut rope = net.ropes[*old];
                    rope.ends = rope.ends.map(|node| new_node[node]);
                    if new % 2 == 1 {
                        rope.ends.reverse();
                    }
                    rope
                })
                .collect(),
        };
        check(&net, &renumbered, 1.0, |p| *p, |i| new_node[i], |i| new_rope[i]);
    }

    #[test]
    fn support_forces_balance_loads_and_their_moments(net in nets()) {
        let state = net.solve();
        let mut force = Vector3::zeros();
        let mut moment = Vector3::zeros();
        let mut scale: f64 = 0.0;
        for (at, load) in state.positions.iter().zip(&net.loads) {
            force += load;
            moment += at.cross(load);
            scale += load.norm();
        }
        for support in &state.support_forces {
            force += support.force;
            moment += state.positions[support.node.index()].cross(&support.force);
            scale += support.force.norm();
        }
        prop_assert!(force.norm() <= 1e-9 * scale, "forces leave {} N of {scale} N", force.norm());
        prop_assert!(moment.norm() <= 1e-9 * scale * net.size(), "moments leave {} N m", moment.norm());
        for end in &state.end_forces {
            let tension = state.axial_forces[end.segment.index()];
            prop_assert!((end.force.norm() - tension).abs() <= 1e-9 * scale, "an end of {tension} N shows {}", end.force);
        }
    }
}
