//! Shapes by force densities.

use nalgebra::Vector3;
use ropewalk_numerics::brief::PrestressRule;
use ropewalk_numerics::load::Load;

use crate::data::{coordinates, file, index, number, numbers, vector};
use crate::problem::{Problem, stiff};
use crate::report::Tolerance::{Absolute, Relative};
use crate::report::{check, check_all, check_print};
use crate::scalar::halving_limit;

/// Stiffness of ropes whose stiffness does not enter the shape (N).
const ANY_STIFFNESS: f64 = 1e7;

fn flat(points: &[Vector3<f64>]) -> Vec<f64> {
    points.iter().flat_map(|p| [p.x, p.y, p.z]).collect()
}

#[test]
fn funicular_of_three_loads() {
    let data = file!("pub-08-funicular-concentrated-loads");
    let loads = numbers(&data.inputs()["loads_N"]);
    let density = number(&data.inputs()["force_density_all"]);
    let mut problem = Problem::default();
    let start = problem.fixed(0.0, 0.0, -2.0);
    let mut path = vec![start];
    for (i, load) in [1.0, 2.0, 3.0].into_iter().zip(loads) {
        // Away from the answer: the shape must be found.
        let node = problem.free(2.3 * i, 0.4, 1.0);
        problem.always(Load::Nodes {
            nodes: vec![node],
            force: Vector3::new(0.0, 0.0, -load),
        });
        path.push(node);
    }
    let end = problem.fixed(8.0, 0.0, 0.0);
    path.push(end);
    problem.cable(
        &path,
        stiff(ANY_STIFFNESS),
        vec![PrestressRule::ForceDensity(density); 4],
    );
    let state = problem.solve().state;

    let depths: Vec<f64> = path[1..4].iter().map(|n| -state.positions[n.index()].z).collect();
    let expected = data.expected("depths below B");
    check_all(
        "pub-08 depths of C, D, E (m)",
        &data.source(),
        &numbers(&expected["value"]),
        &depths,
        Relative(number(&expected["tol_rel"])),
    );
    let expected = data.expected("tensions");
    check_all(
        "pub-08 tensions (N)",
        &data.source(),
        &numbers(&expected["value"]),
        &state.axial_forces,
        Relative(number(&expected["tol_rel"])),
    );
    let at_end = state.support_forces[1].force;
    check_print(&data, "horizontal reaction", at_end.x);
    check_print(&data, "vertical reaction at B", at_end.z);
    check_print(&data, "depth of E", depths[2]);
    check_print(&data, "T_CA", state.axial_forces[0]);
    check_print(&data, "T_max", state.axial_forces[3]);
    check_print(&data, "slope of EB", (at_end.z / at_end.x).atan().to_degrees());
}

/// A level cable with equal loads at equal horizontal spacing, shaped by one force density: length and end tension.
fn parabola(segments: u32, span: f64, sag: f64, load_per_length: f64) -> (f64, f64, f64) {
    let spacing = span / f64::from(segments);
    let density = load_per_length * span * span / (8.0 * sag) / spacing;
    let mut problem = Problem::default();
    let mut path = vec![problem.fixed(0.0, 0.0, 0.0)];
    path.extend((1..segments).map(|i| problem.free(spacing * f64::from(i), 0.0, 0.0)));
    path.push(problem.fixed(span, 0.0, 0.0));
    // Half a spacing's load at each anchor goes straight into it, and into its support force.
    for node in &path {
        let share = if *node == path[0] || Some(node) == path.last() {
            0.5
        } else {
            1.0
        };
        problem.always(Load::Nodes {
            nodes: vec![*node],
            force: Vector3::new(0.0, 0.0, -share * load_per_length * spacing),
        });
    }
    let rules = vec![PrestressRule::ForceDensity(density); path.len() - 1];
    problem.cable(&path, stiff(ANY_STIFFNESS), rules);
    let state = problem.solve().state;
    let middle = state.positions[path[path.len() / 2].index()];
    (
        state.lengths.iter().sum(),
        state.support_forces[0].force.norm(),
        -middle.z,
    )
}

#[test]
fn parabolic_cable() {
    let data = file!("pub-09-parabolic-cable");
    let (span, load) = (40.0, 500.0);
    for entry in data.all_expected() {
        let value = &entry["value"];
        let sag_ratio = number(&value["sag_ratio"]);
        let name = format!("pub-09 {}", entry["quantity"].as_str().expect("a name"));
        let tolerance = Relative(number(&entry["tol_rel"]));
        let chains: Vec<_> = [16, 32, 64, 128]
            .iter()
            .map(|segments| parabola(*segments, span, sag_ratio * span, load))
            .collect();
        let length = halving_limit(&chains.iter().map(|c| c.0).collect::<Vec<_>>());
        let finest = chains[3];
        check(
            &format!("{name}: sag over span"),
            &data.source(),
            sag_ratio,
            finest.2 / span,
            tolerance,
        );
        check(
            &format!("{name}: length over span, limit of chains"),
            &data.source(),
            number(&value["exact"]),
            length / span,
            tolerance,
        );
        check(
            &format!("{name}: end tension over w L"),
            &data.source(),
            number(&value["Tmax_over_wL"]),
            finest.1 / (load * span),
            tolerance,
        );
        let horizontal = (finest.1.powi(2) - (0.5 * load * span).powi(2)).sqrt();
        check(
            &format!("{name}: horizontal force over w L"),
            &data.source(),
            number(&value["H_over_wL"]),
            horizontal / (load * span),
            tolerance,
        );
    }
}

/// A name in the data and the height over plan (m).
type Surface = (&'static str, fn(f64, f64) -> f64);

#[test]
fn grid_takes_discrete_harmonic_shapes() {
    let data = file!("pub-16-fdm-discrete-harmonic");
    let surfaces: [Surface; 3] = [
        ("max node error: bilinear", |i, j| 0.3 * i * j),
        ("max node error: saddle", |i, j| 0.2 * (i * i - j * j)),
        ("max node error: cubic", |i, j| 0.05 * (i * i * i - 3.0 * i * j * j)),
    ];
    let (rows, columns) = (7_u32, 6_u32);
    for (quantity, surface) in surfaces {
        let mut problem = Problem::default();
        let mut wanted = Vec::new();
        let mut nodes = Vec::new();
        for i in 0..rows {
            for j in 0..columns {
                let (x, y) = (f64::from(i), f64::from(j));
                let at = Vector3::new(x, y, surface(x, y));
                wanted.push(at);
                let rim = i == 0 || j == 0 || i == rows - 1 || j == columns - 1;
                nodes.push(if rim {
                    problem.fixed(at.x, at.y, at.z)
                } else {
                    problem.free(at.x + 0.2, at.y - 0.1, at.z + 1.0)
                });
            }
        }
        let at = |i: u32, j: u32| nodes[(i * columns + j) as usize];
        let mut run = |path: Vec<_>| {
            let rules = vec![PrestressRule::ForceDensity(2.5); path.len() - 1];
            problem.cable(&path, stiff(ANY_STIFFNESS), rules);
        };
        for i in 1..rows - 1 {
            run((0..columns).map(|j| at(i, j)).collect());
        }
        for j in 1..columns - 1 {
            run((0..rows).map(|i| at(i, j)).collect());
        }
        let state = problem.solve().state;
        let error = state
            .positions
            .iter()
            .zip(&wanted)
            .fold(0.0, |worst: f64, (p, w)| worst.max((p - w).amax()));
        let expected = data.expected(quantity);
        check(
            &format!("pub-16 {quantity} (m)"),
            &data.source(),
            number(&expected["value"]),
            error,
            Absolute(number(&expected["tol_abs"])),
        );
    }
}

#[test]
fn chain_with_equal_loads_is_a_parabola() {
    let data = file!("pub-17-fdm-parabola");
    let [density, load, spacing, rise] =
        ["q", "nodal_load_down", "spacing", "end_height"].map(|key| number(&data.inputs()[key]));
    let segments = u32::try_from(index(&data.inputs()["segments"])).expect("a few segments");
    let mut problem = Problem::default();
    let mut path = vec![problem.fixed(0.0, 0.0, 0.0)];
    path.extend((1..segments).map(|i| problem.free(spacing * f64::from(i), 0.0, 0.0)));
    path.push(problem.fixed(spacing * f64::from(segments), 0.0, rise));
    problem.always(Load::Nodes {
        nodes: path[1..path.len() - 1].to_vec(),
        force: Vector3::new(0.0, 0.0, -load),
    });
    let rules = vec![PrestressRule::ForceDensity(density); path.len() - 1];
    problem.cable(&path, stiff(ANY_STIFFNESS), rules);
    let state = problem.solve().state;
    let expected = data.expected("z of nodes");
    let heights: Vec<f64> = state.positions.iter().map(|p| p.z).collect();
    check_all(
        "pub-17 heights (m)",
        &data.source(),
        &numbers(&expected["value"]),
        &heights,
        Absolute(number(&expected["tol_abs"])),
    );
    let expected = data.expected("horizontal force");
    check(
        "pub-17 horizontal force (N)",
        &data.source(),
        number(&expected["value"]),
        -state.support_forces[0].force.x,
        Relative(number(&expected["tol_rel"])),
    );
}

#[test]
fn ring_on_four_corner_ropes() {
    let source = "force densities by hand: linear equations of one inner node (our own)";
    let corners = [[0.0, 0.0, 3.0], [9.0, 0.0, 0.0], [9.0, 9.0, 3.0], [0.0, 9.0, 0.0]];
    let inner = [
        [2.25, 2.25, 2.0],
        [6.75, 2.25, 1.0],
        [6.75, 6.75, 2.0],
        [2.25, 6.75, 1.0],
    ];
    let mut problem = Problem::default();
    let anchors = corners.map(|[x, y, z]| problem.fixed(x, y, z));
    let ring = inner.map(|_| problem.free(4.0, 5.0, 1.0));
    for (anchor, node) in anchors.iter().zip(ring) {
        problem.cable(
            &[*anchor, node],
            stiff(ANY_STIFFNESS),
            [PrestressRule::ForceDensity(6000.0)],
        );
    }
    let closed = [ring[0], ring[1], ring[2], ring[3], ring[0]];
    problem.cable(&closed, stiff(ANY_STIFFNESS), [PrestressRule::ForceDensity(3000.0); 4]);
    let state = problem.solve().state;
    let found: Vec<f64> = ring
        .iter()
        .flat_map(|n| state.positions[n.index()].iter().copied().collect::<Vec<_>>())
        .collect();
    check_all(
        "ring on four corners: inner nodes (m)",
        source,
        inner.as_flattened(),
        &found,
        Absolute(1e-10),
    );
    check(
        "ring on four corners: corner tension (N)",
        source,
        20012.496,
        state.axial_forces[0],
        Absolute(5e-4),
    );
    check(
        "ring on four corners: ring tension (N)",
        source,
        13829.317,
        state.axial_forces[4],
        Absolute(5e-4),
    );
}

#[test]
fn tent_of_seven_anchors() {
    let data = file!("inv-07-tent-force-density");
    let expected = data.expected("node positions");
    let positions = expected["value"].as_array().expect("a list of points");
    let fixed = data.inputs()["fixed"].as_array().expect("a list of anchors");
    let mut problem = Problem::default();
    let nodes: Vec<_> = (0..positions.len())
        .map(|node| match fixed.iter().find(|f| index(&f["node"]) == node) {
            Some(anchor) => {
                let at = vector(&anchor["x"]);
                problem.fixed(at.x, at.y, at.z)
            }
            None => problem.free(0.0, 0.0, 1.0),
        })
        .collect();
    for edge in data.inputs()["edges"].as_array().expect("a list of edges") {
        problem.cable(
            &[nodes[index(&edge["i"])], nodes[index(&edge["j"])]],
            stiff(ANY_STIFFNESS),
            [PrestressRule::ForceDensity(number(&edge["q"]))],
        );
    }
    let state = problem.solve().state;
    check_all(
        "inv-07 node positions (m)",
        &data.source(),
        &coordinates(&expected["value"]),
        &flat(&state.positions),
        Absolute(number(&expected["tol_abs"])),
    );
    let expected = data.expected("forces");
    check_all(
        "inv-07 tensions (N)",
        &data.source(),
        &numbers(&expected["value"]),
        &state.axial_forces,
        Relative(number(&expected["tol_rel"])),
    );
}
