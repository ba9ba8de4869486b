//! Whole nets under load, against independent solutions.

use nalgebra::Vector3;
use ropewalk_numerics::brief::StateResult;
use ropewalk_numerics::equilibrium::certificate::Kind;
use ropewalk_numerics::load::{Load, Scope};
use ropewalk_numerics::model::{CableId, SegmentId};
use serde_json::Value;

use crate::data::{Data, coordinates, file, index, number, numbers, vector};
use crate::problem::{Problem, modes, stiff, support_force};
use crate::report::Tolerance::{Absolute, Either, Relative};
use crate::report::{check, check_all};

fn list(value: &Value) -> &[Value] {
    value.as_array().expect("a list stands there")
}

/// Quantity whose values are natural frequencies about the final state.
const FREQUENCIES: &str = "lowest 12 natural frequencies";
/// Of the files: masses are weights over it (m/s²).
const GRAVITY: f64 = 9.80665;

/// Frequencies, and the mass that moves.
fn compare_frequencies(data: &Data, state: &StateResult) {
    let found = modes(state);
    let expected = data.expected(FREQUENCIES);
    let frequencies: Vec<f64> = found.modes.iter().map(|mode| mode.frequency).collect();
    check_all(
        &format!("{} natural frequencies (Hz)", data.id()),
        &data.source(),
        &numbers(&expected["value"]),
        &frequencies,
        Relative(number(&expected["tol_rel"])),
    );
    let masses = data.expected("lumped node masses");
    // Held nodes have those of their ropes alone.
    let sum: f64 = numbers(&masses["value"]).iter().filter(|mass| **mass > 60.0).sum();
    for moving in found.moving_mass {
        check(
            &format!("{} moving mass (kg)", data.id()),
            &data.source(),
            sum,
            moving,
            Relative(1e-9),
        );
    }
}

/// Solves the net of a file and compares everything that the file gives of its static state.
fn compare_net(data: &Data) {
    compare_net_of(data, data);
}

/// The same for the net of `whole`, of which is taken out what the file has not.
fn compare_net_of(data: &Data, whole: &Data) {
    let model = whole.model();
    let left = list(&data.model()["elements"]);
    let is_left = |element: &Value| {
        left.iter()
            .any(|other| ["i", "j"].iter().all(|end| other[*end] == element[*end]))
    };
    let given: Vec<Vector3<f64>> = list(&model["nodes"]).iter().map(vector).collect();
    let mut problem = Problem::default();
    let supported: Vec<usize> = list(&model["supports"])
        .iter()
        .map(|support| {
            assert_eq!(support["dof"], "xyz", "the files hold their nodes in all directions");
            index(&support["node"])
        })
        .collect();
    let nodes: Vec<_> = given
        .iter()
        .enumerate()
        .map(|(i, at)| {
            if supported.contains(&i) {
                problem.fixed(at.x, at.y, at.z)
            } else {
                problem.free(at.x, at.y, at.z)
            }
        })
        .collect();
    // Energy of the file's law: N² L0 / (2 EA).
    let mut flexibility = Vec::new();
    for (position, element) in list(&model["elements"]).iter().enumerate() {
        let [axial_stiffness, unstressed] = ["EA", "L0"].map(|key| number(&element[key]));
        let heat = element
            .get("dT")
            .map(|change| (number(&element["alpha"]), number(change)));
        // The file's law is N = EA (l/L0 − 1 − α ΔT), ours N = EA (l/(L0 (1 + α ΔT)) − 1): with EA (1 + α ΔT) given to the
        // engine the two are one.
        let mut section = stiff(axial_stiffness * heat.map_or(1.0, |(expansion, change)| 1.0 + expansion * change));
        if is_left(element) {
            flexibility.push(unstressed / axial_stiffness);
        } else {
            problem.take_out(CableId::new(position));
        }
        section.mass_per_length = number(&element["w"]) / GRAVITY;
        section.expansion = heat.map_or(0.0, |(expansion, _)| expansion);
        problem.bar(
            nodes[index(&element["i"])],
            nodes[index(&element["j"])],
            section,
            unstressed,
        );
        let scope = || Scope::Segments(vec![SegmentId::new(position)]);
        problem.load(Load::PerUnstressedLength {
            scope: scope(),
            force: Vector3::new(0.0, 0.0, -number(&element["w"])),
        });
        if let Some((_, change)) = heat {
            problem.load(Load::Temperature { scope: scope(), change });
        }
    }
    for load in list(&model["point_loads"]) {
        let force = vector(&load["F"]);
        problem.push_node(nodes[index(&load["node"])], force.x, force.y, force.z);
    }
    let expects = |quantity: &str| {
        let names = data
            .all_expected()
            .iter()
            .filter_map(|expected| expected["quantity"].as_str());
        names.filter(|name| name.starts_with(quantity)).count() > 0
    };
    if expects(FREQUENCIES) {
        // 60 kg on each free node: the file's masses say so.
        for (i, node) in nodes.iter().enumerate().filter(|(i, _)| !supported.contains(i)) {
            assert_eq!(*node, nodes[i]);
            problem.attach(*node, 60.0);
        }
        problem.modes(numbers(&data.expected(FREQUENCIES)["value"]).len());
    }
    let mut state = problem.solve().state;
    if expects(FREQUENCIES) {
        compare_frequencies(data, &state);
    }
    // What is left, in the order of the file.
    let gone = |segment: usize| state.removed.contains(&SegmentId::new(segment));
    let kept: Vec<usize> = (0..state.slack.len()).filter(|segment| !gone(*segment)).collect();
    state.axial_forces = kept.iter().map(|segment| state.axial_forces[*segment]).collect();
    state.slack = kept.iter().map(|segment| state.slack[*segment]).collect();

    let of = if std::ptr::eq(data, whole) {
        ""
    } else {
        "taken out of the whole: "
    };
    let name = |quantity: &str| format!("{} {of}{quantity}", data.id());
    let source = data.source();
    let expected = data.expected("final positions");
    let positions: Vec<f64> = state.positions.iter().flatten_coordinates();
    check_all(
        &name("positions (m)"),
        &source,
        &coordinates(&expected["value"]),
        &positions,
        Absolute(number(&expected["tol_abs"])),
    );
    let expected = data.expected("displacements");
    let moved: Vec<Vector3<f64>> = state
        .positions
        .iter()
        .zip(&given)
        .map(|(now, then)| now - then)
        .collect();
    check_all(
        &name("displacements from the given positions (m)"),
        &source,
        &coordinates(&expected["value"]),
        &moved.iter().flatten_coordinates(),
        Absolute(number(&expected["tol_abs"])),
    );
    let tolerance = |expected: &Value| Either {
        relative: number(&expected["tol_rel"]),
        absolute: number(&expected["tol_abs"]),
    };
    let expected = data.expected("member forces");
    check_all(
        &name("tensions (N)"),
        &source,
        &numbers(&expected["value"]),
        &state.axial_forces,
        tolerance(expected),
    );
    assert_eq!(
        slack_segments(&state),
        list(&data.expected("slack members")["value"])
            .iter()
            .map(index)
            .collect::<Vec<_>>()
    );
    let expected = data.expected("support reactions");
    let mut wanted = Vec::new();
    let mut found = Vec::new();
    for entry in list(&expected["value"]) {
        wanted.push(vector(&entry["R"]));
        found.push(support_force(&state, nodes[index(&entry["node"])]).force);
    }
    assert_eq!(wanted.len(), supported.len());
    check_all(
        &name("support forces (N)"),
        &source,
        &wanted.iter().flatten_coordinates(),
        &found.iter().flatten_coordinates(),
        tolerance(expected),
    );
    let expected = data.expected("strain energy");
    let energy: f64 = state
        .axial_forces
        .iter()
        .zip(&flexibility)
        .map(|(n, f)| 0.5 * n * n * f)
        .sum();
    check(
        &name("strain energy (J)"),
        &source,
        number(&expected["value"]),
        energy,
        Relative(number(&expected["tol_rel"])),
    );
    let expected = data.expected("sum of reactions");
    check(
        &name("sum of support forces and loads (N)"),
        &source,
        0.0,
        (state.support_sum + state.load_sum).norm(),
        Absolute(number(&expected["tol_abs"])),
    );
}

trait FlattenCoordinates {
    fn flatten_coordinates(self) -> Vec<f64>;
}

impl<'a, I: Iterator<Item = &'a Vector3<f64>>> FlattenCoordinates for I {
    fn flatten_coordinates(self) -> Vec<f64> {
        self.flat_map(|p| [p.x, p.y, p.z]).collect()
    }
}

fn slack_segments(state: &StateResult) -> Vec<usize> {
    (0..state.slack.len()).filter(|i| state.slack[*i]).collect()
}

#[test]
fn saddle_under_own_weight_and_snow() {
    compare_net(&file!("inv-01-saddle-snow"));
}

#[test]
fn saddle_with_warm_and_cold_ropes() {
    compare_net(&file!("inv-03-saddle-thermal"));
}

#[test]
fn saddle_without_one_rope() {
    compare_net(&file!("inv-05-saddle-cable-removed"));
}

#[test]
fn saddle_of_which_one_rope_is_taken_out() {
    compare_net_of(&file!("inv-05-saddle-cable-removed"), &file!("inv-01-saddle-snow"));
}

#[test]
fn saddle_with_six_slack_segments() {
    // Node (i, j) at (12 i/7, 12 j/7, 1.2 (u² − w²)), u = 2 i/7 − 1, w = 2 j/7 − 1, without corners; the rim is held.
    let source = "6 x 6 saddle, energy also by a second-order cone program within 1e-9 J (our own)";
    let at = |i: u32, j: u32| {
        let [u, w] = [i, j].map(|k| 2.0 * f64::from(k) / 7.0 - 1.0);
        Vector3::new(
            12.0 * f64::from(i) / 7.0,
            12.0 * f64::from(j) / 7.0,
            1.2 * (u * u - w * w),
        )
    };
    let mut problem = Problem::default();
    let mut number_of = [[None; 8]; 8];
    let mut given = Vec::new();
    let mut loads = Vec::new();
    for i in 0..8_u32 {
        for j in 0..8_u32 {
            let rim = |k: u32| k == 0 || k == 7;
            if rim(i) && rim(j) {
                continue;
            }
            let p = at(i, j);
            given.push(p);
            let node = if rim(i) || rim(j) {
                problem.fixed(p.x, p.y, p.z)
            } else {
                let node = problem.free(p.x, p.y, p.z);
                let load = if p.x < 6.0 { -9000.0 } else { -600.0 };
                problem.push_node(node, 0.0, 0.0, load);
                loads.push((node.index(), load));
                node
            };
            number_of[i as usize][j as usize] = Some(node);
        }
    }
    let axial_stiffness = 4e6;
    let mut stiffnesses = Vec::new();
    for line in 1..7 {
        for step in 0..7 {
            for ends in [[(step, line), (step + 1, line)], [(line, step), (line, step + 1)]] {
                let nodes = ends.map(|(i, j)| number_of[i][j].expect("no rope ends at a corner"));
                let unstressed = (given[nodes[1].index()] - given[nodes[0].index()]).norm() / 1.003;
                stiffnesses.push(axial_stiffness / unstressed);
                problem.bar(nodes[0], nodes[1], stiff(axial_stiffness), unstressed);
            }
        }
    }
    assert_eq!(stiffnesses.len(), 84);
    let state = problem.solve().state;
    let taut: Vec<f64> = state.axial_forces.iter().copied().filter(|n| *n > 0.0).collect();
    let energy: f64 = state
        .axial_forces
        .iter()
        .zip(&stiffnesses)
        .map(|(n, k)| n * n / (2.0 * k))
        .sum();
    let work: f64 = loads.iter().map(|(node, load)| load * state.positions[*node].z).sum();
    let lowest = loads
        .iter()
        .map(|(node, _)| state.positions[*node].z)
        .fold(f64::INFINITY, f64::min);
    check(
        "6 x 6 saddle: slack segments",
        source,
        6.0,
        slack_segments(&state).len() as f64,
        Absolute(0.0),
    );
    check(
        "6 x 6 saddle: largest tension (N)",
        source,
        49765.512595,
        taut.iter().copied().fold(0.0, f64::max),
        Absolute(1e-5),
    );
    check(
        "6 x 6 saddle: least taut tension (N)",
        source,
        3.637634,
        taut.iter().copied().fold(f64::INFINITY, f64::min),
        Absolute(1e-5),
    );
    check(
        "6 x 6 saddle: strain energy (J)",
        source,
        21326.537356,
        energy,
        Absolute(1e-5),
    );
    check(
        "6 x 6 saddle: potential energy (J)",
        source,
        -17986.756634,
        energy - work,
        Absolute(1e-5),
    );
    check(
        "6 x 6 saddle: lowest free node (m)",
        source,
        -0.819426025,
        lowest,
        Absolute(1e-8),
    );
    let certificate = state.certificate.expect("forces in balance were found");
    assert_eq!(certificate.kind, Kind::Full);
    assert!(certificate.certified);
    assert_eq!(certificate.n_without_bound(), 0);
    check(
        "6 x 6 saddle: strain energy of the certificate (J)",
        source,
        21326.537356,
        certificate.strain_energy,
        Absolute(1e-5),
    );
    check(
        "6 x 6 saddle: gap of the certificate over strain energy",
        "strong duality: the gap of the answer is zero",
        0.0,
        certificate.gap / certificate.strain_energy,
        Absolute(1e-20),
    );
    check(
        "6 x 6 saddle: bound on tensions (N)",
        "strong duality: the bound closes on the answer",
        0.0,
        certificate.largest_force_bound(),
        Absolute(1e-4),
    );
}

#[test]
fn first_net() {
    // Two ropes crossing between two high and two low points; the numbers are an own Newton solve, digits as given.
    let source = "the minimal brief, own Newton solve in another language (our own)";
    let mut problem = Problem::default();
    let corners = [[0.0, 0.0, 3.0], [9.0, 0.0, 0.0], [9.0, 9.0, 3.0], [0.0, 9.0, 0.0]];
    let [a, b, c, d] = corners.map(|[x, y, z]| problem.fixed(x, y, z));
    let m = problem.free(1.0, 2.0, 3.0);
    for path in [[a, m, c], [b, m, d]] {
        let rule = ropewalk_numerics::brief::PrestressRule::ForceDensity(3000.0);
        problem.cable(&path, stiff(6.5e6), [rule; 2]);
    }
    problem.push_node(m, 0.0, 0.0, -5000.0);
    let answer = problem.solve();
    let at = answer.reference.positions[m.index()];
    check_all(
        "first net: crossing (m)",
        source,
        &[4.5, 4.5, 1.5],
        at.as_slice(),
        Absolute(1e-10),
    );
    check_all(
        "first net: tensions (N)",
        source,
        &[19615.0; 4],
        &answer.reference.axial_forces,
        Absolute(0.5),
    );
    check_all(
        "first net: unstressed lengths (m)",
        source,
        &[6.518677; 4],
        &answer.reference.unstressed_lengths,
        Absolute(5e-7),
    );
    let sinks = -answer.state.displacements[m.index()].z;
    check(
        "first net under snow: crossing sinks (m)",
        source,
        0.02259,
        sinks,
        Absolute(5e-6),
    );
    check_all(
        "first net under snow: tensions (N)",
        source,
        &[24820.0, 24820.0, 14484.0, 14484.0],
        &answer.state.axial_forces,
        Absolute(0.5),
    );
}
