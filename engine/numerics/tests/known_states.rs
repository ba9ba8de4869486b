//! Cases with known answers; each file names its source and how its numbers were found.
//!
//! The files take `N = EA (l/L0 − 1 − α ΔT)`; with `EA (1 + α ΔT)` here, where `N = EA (l/a − 1)`, `a = L0 (1 + α ΔT)`,
//! forces and positions coincide exactly.
#![allow(clippy::unwrap_used, reason = "tests")]

use std::ops::ControlFlow;
use std::path::Path;
use std::sync::Arc;

use nalgebra::Vector3;
use ropewalk_numerics::equilibrium::{Analysis, Settings, Solution, Termination, solve};
use ropewalk_numerics::load::{Case, SegmentLoads};
use ropewalk_numerics::model::{CableGiven, Net, NetGiven, NodeGiven, NodeId, Section, SupportGiven};
use serde_json::Value;

fn file(name: &str) -> Value {
    let path = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("../../tests/verification/data")
        .join(name);
    serde_json::from_str(&std::fs::read_to_string(&path).unwrap()).unwrap()
}

fn expected<'a>(case: &'a Value, quantity: &str) -> &'a Value {
    let all = case["expected"].as_array().unwrap();
    all.iter()
        .find(|e| e["quantity"] == quantity)
        .unwrap_or_else(|| panic!("no {quantity}"))
}

fn number(value: &Value) -> f64 {
    value.as_f64().unwrap()
}

fn vector(value: &Value) -> Vector3<f64> {
    Vector3::new(number(&value[0]), number(&value[1]), number(&value[2]))
}

/// A bar from node to node: `EA` (N), `L0` (m), thermal strain (–).
type Bar = (usize, usize, f64, f64, f64);

/// Solves a net of bars; the tolerance is that of the answers looked for, not the usual one.
#[track_caller]
fn check(nodes: &[Vector3<f64>], held: &[usize], bars: &[Bar], loads: Vec<Vector3<f64>>) -> Solution {
    let given = NetGiven {
        nodes: (nodes.iter().enumerate())
            .map(|(i, x)| NodeGiven {
                name: format!("n{i}"),
                position: Some(*x),
                support: held.contains(&i).then(SupportGiven::default),
                attached_mass: 0.0,
            })
            .collect(),
        cables: (bars.iter().enumerate())
            .map(|(i, (a, b, ea, ..))| CableGiven {
                name: format!("c{i}"),
                path: vec![NodeId::new(*a), NodeId::new(*b)],
                sections: vec![Section {
                    axial_stiffness: *ea,
                    mass_per_length: 0.0,
                    expansion: 1.0,
                    breaking_force: None,
                    ..Section::default()
                }],
                ..CableGiven::default()
            })
            .collect(),
        ..NetGiven::default()
    };
    let analysis = Analysis::new(Arc::new(Net::new(given).unwrap()));
    let case = Case {
        nodal_forces: loads,
        unstressed_lengths: bars.iter().map(|b| b.3).collect(),
        segments: (bars.iter())
            .map(|b| SegmentLoads {
                temperature_change: b.4,
                ..SegmentLoads::default()
            })
            .collect(),
        support_movements: vec![Vector3::zeros(); nodes.len()],
        removed: vec![false; bars.len()],
        ..Case::default()
    };
    let settings = Settings {
        tolerance: 1e-13,
        ..Settings::default()
    };
    let mut watch = |_: &_| ControlFlow::Continue(());
    let solution = solve(&analysis, &case, nodes, &case.unstressed_lengths, &settings, &mut watch).unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    solution
}

#[track_caller]
fn near(found: f64, wanted: f64, relative: f64) {
    assert!(
        (found - wanted).abs() <= relative * wanted.abs(),
        "{found} is not {wanted}"
    );
}

/// Invented nets, own reckoning in 40 digits; see the files.
#[track_caller]
fn saddle(name: &str) {
    let case = file(name);
    let model = &case["model"];
    let list = |key: &str| model[key].as_array().unwrap().clone();
    let index = |v: &Value| usize::try_from(v.as_u64().unwrap()).unwrap();
    let nodes: Vec<_> = list("nodes").iter().map(vector).collect();
    let held: Vec<_> = list("supports").iter().map(|s| index(&s["node"])).collect();
    let mut loads = vec![Vector3::zeros(); nodes.len()];
    for load in list("point_loads") {
        loads[index(&load["node"])] += vector(&load["F"]);
    }
    let mut bars = Vec::new();
    for element in list("elements") {
        let [i, j] = ["i", "j"].map(|end| index(&element[end]));
        let l0 = number(&element["L0"]);
        let strain = element["alpha"].as_f64().unwrap_or(0.0) * element["dT"].as_f64().unwrap_or(0.0);
        let half = Vector3::new(0.0, 0.0, -0.5 * number(&element["w"]) * l0);
        loads[i] += half;
        loads[j] += half;
        bars.push((i, j, number(&element["EA"]) * (1.0 + strain), l0, strain));
    }
    let solution = check(&nodes, &held, &bars, loads);
    let positions = expected(&case, "final positions of all nodes");
    let tolerance = number(&positions["tol_abs"]);
    for (found, wanted) in solution.positions.iter().zip(positions["value"].as_array().unwrap()) {
        assert!((found - vector(wanted)).amax() <= tolerance, "{found} {wanted}");
    }
    let forces = expected(&case, "member forces");
    let (relative, absolute) = (number(&forces["tol_rel"]), number(&forces["tol_abs"]));
    for (found, wanted) in solution.axial_forces.iter().zip(forces["value"].as_array().unwrap()) {
        let wanted = number(wanted);
        assert!(
            (found - wanted).abs() <= absolute.max(relative * wanted),
            "{found} {wanted}"
        );
    }
}

#[test]
fn inv_01_saddle_under_snow() {
    saddle("inv-01-saddle-snow.json");
}

#[test]
fn inv_03_saddle_with_temperatures() {
    saddle("inv-03-saddle-thermal.json");
}

#[test]
fn inv_05_saddle_without_one_cable() {
    saddle("inv-05-saddle-cable-removed.json");
}

/// Closed form of the flat two-link cable (standard theory).
#[test]
fn pub_10_two_links() {
    let file = file("pub-10-two-link.json");
    for case in file["expected"].as_array().unwrap() {
        let value = |key: &str| number(&case["value"][key]);
        let half = value("half_span");
        let nodes = [0.0, half, 2.0 * half].map(|x| Vector3::new(x, 0.0, 0.0));
        let bars = [
            (0, 1, value("EA"), value("L0"), 0.0),
            (1, 2, value("EA"), value("L0"), 0.0),
        ];
        let loads = vec![Vector3::zeros(), Vector3::new(0.0, 0.0, -value("P")), Vector3::zeros()];
        let solution = check(&nodes, &[0, 2], &bars, loads);
        near(-solution.positions[1].z, value("deflection"), number(&case["tol_rel"]));
        near(solution.axial_forces[0], value("force"), number(&case["tol_rel"]));
    }
}

/// `N = N0 − EA α ΔT` and the engine's own law beside it (elementary).
#[test]
fn pub_26_temperature_of_a_straight_cable() {
    let file = file("pub-26-thermal-straight.json");
    let input = |key: &str| number(&file["inputs"][key]);
    let (length, ea) = (input("length"), input("EA"));
    let l0 = length / (1.0 + input("N0") / ea);
    let nodes = [0.0, 0.5 * length, length].map(|x| Vector3::new(x, 0.0, 0.0));
    let force = |change: f64, own_law: bool| {
        let strain = input("alpha") * change;
        let ea = if own_law { ea } else { ea * (1.0 + strain) };
        let bars = [(0, 1, ea, 0.5 * l0, strain), (1, 2, ea, 0.5 * l0, strain)];
        check(&nodes, &[0, 2], &bars, vec![Vector3::zeros(); 3]).axial_forces[1]
    };
    let wanted = |quantity: &str| number(&expected(&file, quantity)["value"]);
    near(force(100.0, false), wanted("N at dT = +100 K"), 1e-9);
    near(force(-50.0, false), wanted("N at dT = -50 K"), 1e-9);
    assert_eq!(force(300.0, false), wanted("N at dT = +300 K"));
    let slack = wanted("slack temperature change");
    assert!(force(slack - 0.001, false) > 0.0 && force(slack + 0.001, false) == 0.0);
    let own = "alternative law N = EA*(l/(L0(1+alpha dT)) - 1) at +100 K";
    near(force(100.0, true), wanted(own), 1e-9);
}

/// Two cables in line, the lower one slackening (elementary).
#[test]
fn pub_27_slack_pair() {
    let file = file("pub-27-slack-pair.json");
    let input = |key: &str| number(&file["inputs"][key]);
    let (upper, lower, ea) = (input("upper"), input("lower"), input("EA"));
    let stretch = 1.0 + input("N0") / ea;
    let nodes = [0.0, -upper, -upper - lower].map(|z| Vector3::new(0.0, 0.0, z));
    let bars = [(0, 1, ea, upper / stretch, 0.0), (1, 2, ea, lower / stretch, 0.0)];
    let down = |p: f64| {
        let loads = vec![Vector3::zeros(), Vector3::new(0.0, 0.0, -p), Vector3::zeros()];
        check(&nodes, &[0, 2], &bars, loads)
    };
    for load in ["P = 1000", "P = 4000", "P = 8000"] {
        let wanted = &expected(&file, load)["value"];
        let solution = down(number(&wanted["P_down"]));
        near(
            -upper - solution.positions[1].z,
            number(&wanted["displacement_down"]),
            1e-9,
        );
        near(solution.axial_forces[0], number(&wanted["N_upper"]), 1e-9);
        near(solution.axial_forces[1], number(&wanted["N_lower"]), 1e-9);
    }
    let limit = number(&expected(&file, "slack load")["value"]);
    assert!(down(limit - 1e-3).axial_forces[1] > 0.0 && down(limit + 1e-3).axial_forces[1] == 0.0);
}

/// Elongation of a hanging cable under its own weight (elementary).
#[test]
fn pub_28_vertical_cable_under_own_weight() {
    let file = file("pub-28-vertical-own-weight.json");
    let input = |key: &str| number(&file["inputs"][key]);
    let n = 10;
    let part = input("L0") / f64::from(n);
    let nodes: Vec<_> = (0..=n).map(|i| Vector3::new(0.0, 0.0, -part * f64::from(i))).collect();
    let count = nodes.len();
    let bars: Vec<Bar> = (1..count).map(|i| (i - 1, i, input("EA"), part, 0.0)).collect();
    let weight = input("w") * part;
    let mut loads = vec![Vector3::new(0.0, 0.0, -weight); count];
    loads[0] *= 0.5;
    loads[count - 1].z = -0.5 * weight - input("P");
    let solution = check(&nodes, &[0], &bars, loads);
    let wanted = |quantity: &str| number(&expected(&file, quantity)["value"]);
    near(
        nodes[count - 1].z - solution.positions[count - 1].z,
        wanted("end displacement"),
        1e-9,
    );
    near(
        solution.axial_forces[0],
        wanted("top bar force, 10 equal bars (half-weight lumping)"),
        1e-9,
    );
    near(solution.axial_forces[0] + 0.5 * weight, wanted("top tension"), 1e-9);
}
