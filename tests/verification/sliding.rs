//! Ropes that slide through nodes, with friction and without.

use std::f64::consts::PI;

use nalgebra::Vector3;
use ropewalk_numerics::load::Load;
use ropewalk_numerics::model::NodeId;

use crate::data::{file, number};
use crate::problem::{Problem, stiff};
use crate::report::Tolerance::{Absolute, Relative};
use crate::report::{check, check_all};

/// A rope from an anchor around `edges` fixed edges, by the angle `turn` (rad) in all, to a weight that hangs from it: the
/// weight is `first` (N) in the reference state and `then` (N) in the case. Tensions at the anchor and at the weight.
///
/// The rope turns by the same angle at each edge, in one vertical plane; it may cross itself.
fn around(friction: f64, turn: f64, edges: u32, first: f64, then: f64) -> [f64; 2] {
    let each = turn / f64::from(edges);
    let direction = |passed: u32| {
        let angle = -0.5 * PI - turn + each * f64::from(passed);
        Vector3::new(angle.cos(), 0.0, angle.sin())
    };
    let mut problem = Problem::default();
    let mut place = Vector3::zeros();
    let mut path: Vec<NodeId> = Vec::new();
    for passed in 0..=edges {
        path.push(problem.fixed(place.x, place.y, place.z));
        place += direction(passed);
    }
    let end = problem.free(place.x, place.y, place.z);
    path.push(end);
    problem.sliding(&path, stiff(1e8), friction, f64::from(edges + 1));
    problem.always(Load::Nodes {
        nodes: vec![end],
        force: Vector3::new(0.0, 0.0, -first),
    });
    problem.push_node(end, 0.0, 0.0, first - then);
    let state = problem.solve().state;
    let forces = state.axial_forces;
    [forces[0], forces[forces.len() - 1]]
}

#[test]
fn capstan() {
    let data = file!("pub-23-capstan");
    for (quantity, friction, turn) in [("mu=0.3, one turn", 0.3, 2.0 * PI), ("mu=0.2, half turn", 0.2, PI)] {
        let expected = data.expected(quantity);
        for edges in [3, 8] {
            // Let down by far: the rope runs over every edge towards the weight.
            let [anchor, weight] = around(friction, turn, edges, 1e3, 12e3);
            check(
                &format!("pub-23 {quantity}, {edges} edges: weight over pull at the anchor"),
                &data.source(),
                number(&expected["value"]),
                weight / anchor,
                Relative(number(&expected["tol_rel"])),
            );
            // Taken off by far: it runs back towards the anchor.
            let [anchor, weight] = around(friction, turn, edges, 12e3, 1e3);
            check(
                &format!("pub-23 {quantity}, {edges} edges: pull at the anchor over weight"),
                &data.source(),
                number(&expected["value"]),
                anchor / weight,
                Relative(number(&expected["tol_rel"])),
            );
        }
    }
}

#[test]
fn capstan_of_five_turns() {
    let data = file!("pub-23-capstan");
    let expected = data.expected("mu=0.6, five turns");
    // From a tenth of a newton to 40 MN, so that the rope runs over all of them.
    let [anchor, weight] = around(0.6, 10.0 * PI, 20, 0.1, 4e7);
    check(
        "pub-23 mu=0.6, five turns, 20 edges: weight over pull at the anchor",
        &data.source(),
        number(&expected["value"]),
        weight / anchor,
        Relative(number(&expected["tol_rel"])),
    );
}

#[test]
fn rope_that_slides_over_two_edges() {
    // Length in all over the unstressed length; the number stands in the kernel's theory notes, to four decimals.
    let mut problem = Problem::default();
    let path =
        [[0.0, 0.0, 0.0], [3.0, 0.5, -1.0], [6.0, -0.2, -1.4], [9.0, 0.0, 0.5]].map(|[x, y, z]| problem.fixed(x, y, z));
    problem.sliding(&path, stiff(1e6), 0.0, 9.6);
    check_all(
        "rope over two edges: tension of its pieces (N)",
        "N = EA (l / L0 - 1), by hand (our own)",
        &[27571.9668; 3],
        &problem.solve().state.axial_forces,
        Absolute(5e-5),
    );
}
