//! Ropes that hang as elastic catenaries, in nets of one and two pieces, against closed forms and printed values.

use nalgebra::Vector3;
use ropewalk_numerics::brief::StateResult;
use ropewalk_numerics::load::{Load, Scope};
use ropewalk_numerics::model::NodeId;

use crate::data::{file, number};
use crate::problem::{Answer, Problem, stiff, support_force};
use crate::report::Tolerance::{Absolute, Relative};
use crate::report::{check, check_all, check_print};

/// The weight of every rope, which acts in the reference state too.
fn weigh(problem: &mut Problem, weight: f64) {
    problem.always(Load::PerUnstressedLength {
        scope: Scope::All,
        force: Vector3::new(0.0, 0.0, -weight),
    });
}

/// A rope from the origin to `to` in equal pieces, which hangs under its weight; its nodes with it.
fn hang(to: [f64; 2], pieces: u32, axial_stiffness: f64, unstressed: f64, weight: f64) -> (StateResult, Vec<NodeId>) {
    let mut problem = Problem::default();
    let mut path = vec![problem.fixed(0.0, 0.0, 0.0)];
    for i in 1..pieces {
        let share = f64::from(i) / f64::from(pieces);
        path.push(problem.free(share * to[0], 0.0, share * to[1]));
    }
    path.push(problem.fixed(to[0], 0.0, to[1]));
    let each = unstressed / f64::from(pieces);
    problem.hanging(&path, stiff(axial_stiffness), &vec![each; path.len() - 1]);
    weigh(&mut problem, weight);
    (problem.solve().state, path)
}

#[test]
fn elastic_catenaries_in_one_and_in_two_pieces() {
    let data = file!("pub-03-elastic-catenary");
    for entry in data.all_expected() {
        let case = &entry["value"];
        let [dx, dz, axial_stiffness, unstressed, weight] = ["dx", "dz", "EA", "L0", "w"].map(|key| number(&case[key]));
        for pieces in [1, 2] {
            let (state, path) = hang([dx, dz], pieces, axial_stiffness, unstressed, weight);
            let name = format!(
                "pub-03 {}, in pieces: {pieces}",
                entry["quantity"].as_str().expect("a name")
            );
            let [first, second] = [path[0], path[path.len() - 1]].map(|end| support_force(&state, end).force);
            let mut quantities = vec![
                ("H", -first.x),
                ("V_A", first.z),
                ("T_A", first.norm()),
                ("T_B", second.norm()),
            ];
            if pieces == 2 {
                let middle = state.positions[path[1].index()];
                quantities.extend([("mid_x", middle.x), ("mid_z", middle.z)]);
            }
            for (key, computed) in quantities {
                check(
                    &format!("{name}: {key}"),
                    &data.source(),
                    number(&case[key]),
                    computed,
                    Relative(number(&entry["tol_rel"])),
                );
            }
        }
    }
}

/// Stiffness of ropes that are thought not to stretch (N): strains of a few parts in 1e8.
const HARDLY_STRETCHES: f64 = 1e12;

#[test]
fn steep_rope_that_does_not_stretch() {
    let data = file!("pub-04-inextensible-inclined-catenary");
    let weight = number(&data.inputs()["q0"]);
    let to = [
        number(&data.inputs()["span"]),
        -number(&data.inputs()["height_difference"]),
    ];
    let length = number(&data.expected("total unstressed length")["value"]);
    let (state, path) = hang(to, 1, HARDLY_STRETCHES, length, weight);
    let [high, low] = [path[0], path[1]].map(|end| support_force(&state, end).force);
    check(
        "pub-04 as a hanging rope: horizontal force (N)",
        &data.source(),
        number(&data.inputs()["H"]),
        -high.x,
        Relative(1e-6),
    );
    for (quantity, computed) in [
        ("tension at high support", high.norm()),
        ("tension at low support", low.norm()),
        (
            "distance of lowest point from high support",
            -high.x / weight * (high.z / -high.x).asinh(),
        ),
        ("slope angle at high support", (high.z / -high.x).atan().to_degrees()),
    ] {
        let expected = data.expected(quantity);
        check(
            &format!("pub-04 as a hanging rope: {quantity}"),
            &data.source(),
            number(&expected["value"]),
            computed,
            Relative(number(&expected["tol_rel"])),
        );
    }
    check_print(&data, "N_A", high.norm() / 1e3);
    check_print(&data, "N_B", low.norm() / 1e3);
}

#[test]
fn textbook_rope_of_500_feet() {
    let data = file!("pub-07-textbook-uniform-cable");
    let [span, sag, weight] = ["span", "sag", "w"].map(|key| number(&data.inputs()[key]));
    let length = number(&data.expected("length")["value"]);
    let (state, path) = hang([span, 0.0], 2, HARDLY_STRETCHES, length, weight);
    let end = support_force(&state, path[0]).force;
    for (quantity, computed) in [("minimum tension", -end.x), ("maximum tension", end.norm())] {
        let expected = data.expected(quantity);
        check(
            &format!("pub-07 as a hanging rope: {quantity} (N)"),
            &data.source(),
            number(&expected["value"]),
            computed,
            Relative(number(&expected["tol_rel"])),
        );
    }
    check(
        "pub-07 as a hanging rope: sag (m)",
        &data.source(),
        sag,
        -state.positions[path[1].index()].z,
        Relative(1e-6),
    );
    let pound = 4.4482216152605;
    check_print(&data, "T_min", -end.x / pound);
    check_print(&data, "T_max", end.norm() / pound);
}

#[test]
fn thousand_foot_cable_of_two_pieces() {
    let data = file!("pub-01-isolated-cable-point-load");
    let input = |key: &str| number(&data.inputs()[key]);
    let mut problem = Problem::default();
    let left = problem.fixed(0.0, 0.0, 0.0);
    let loaded = problem.free(input("load_x"), 0.0, -input("sag_at_load_point"));
    let right = problem.fixed(input("span"), 0.0, 0.0);
    problem.hanging(
        &[left, loaded, right],
        stiff(input("EA")),
        &[input("unstressed_left"), input("unstressed_right")],
    );
    weigh(&mut problem, input("w"));
    problem.push_node(loaded, 0.0, 0.0, -input("P"));
    let Answer { reference, state } = problem.solve();
    let movement = state.positions[loaded.index()] - reference.positions[loaded.index()];
    let foot = 0.3048;
    for (quantity, computed, jayaraman, obrien) in [
        (
            "node 2 horizontal displacement",
            movement.x,
            "horizontal, same",
            "horizontal, O'Brien & Francis",
        ),
        (
            "node 2 vertical displacement",
            movement.z,
            "vertical, Jayaraman & Knudson",
            "vertical, O'Brien & Francis",
        ),
    ] {
        // The file's own value was worked out in 30 digits, but it allows for the digits of its prints: here a millionth.
        check(
            &format!("pub-01 as a hanging rope: {quantity} (m)"),
            &data.source(),
            number(&data.expected(quantity)["value"]),
            computed,
            Relative(1e-6),
        );
        check_print(&data, jayaraman, computed / foot);
        check_print(&data, obrien, computed);
    }
    check(
        "pub-01 as a hanging rope: horizontal force after loading (N)",
        &data.source(),
        number(&data.expected("H after load")["value"]),
        -support_force(&state, left).force.x,
        Relative(1e-6),
    );
    check_print(&data, "sag at load point", -reference.positions[loaded.index()].z);
}

#[test]
fn rope_pulled_at_its_free_end() {
    // H 35 kN and V 9 kN at the anchor, 70 m of 0.2 kN/m: V 5 kN is left at the free end. Digits as given.
    let source = "elastic catenary, closed form against quadrature (Irvine 1981, from memory)";
    let mut problem = Problem::default();
    let anchor = problem.fixed(0.0, 0.0, 0.0);
    let end = problem.free(60.0, 5.0, 0.0);
    problem.hanging(&[anchor, end], stiff(42e6), &[70.0]);
    weigh(&mut problem, 200.0);
    problem.always(Load::Nodes {
        nodes: vec![end],
        force: Vector3::new(35e3, 0.0, 5e3),
    });
    let state = problem.solve().state;
    check_all(
        "catenary of 70 m: free end (m)",
        source,
        &[69.492353, 0.0, -3.919748],
        state.positions[end.index()].as_slice(),
        Absolute(5e-7),
    );
    let pull = support_force(&state, anchor).force;
    check_all(
        "catenary of 70 m: force at the anchor (N)",
        source,
        &[-35e3, 0.0, 9e3],
        pull.as_slice(),
        Absolute(1e-6),
    );
    check(
        "catenary of 70 m: tension at the anchor (N)",
        source,
        36138.622,
        pull.norm(),
        Absolute(5e-4),
    );
    check(
        "catenary of 70 m: tension at the free end (N)",
        source,
        35355.339,
        state.pulls[0][1].norm(),
        Absolute(5e-4),
    );
}
