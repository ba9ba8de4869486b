//! Hanging ropes as chains of straight bars: values of given chains, and the way chains approach the catenary.
//!
//! Half of each bar's weight sits at each of its ends. The error of such a chain against the smooth curve is a series in
//! even powers of the bar length, so that a few chains, each with bars half as long, tell the smooth curve's values by
//! extrapolation (Romberg 1955). Ropes that hang as catenaries by themselves are in `hanging`.

use nalgebra::Vector3;
use ropewalk_numerics::brief::{PrestressRule, StateResult};
use ropewalk_numerics::load::{Load, Scope};
use ropewalk_numerics::model::NodeId;
use serde_json::Value;

use crate::data::{file, number, numbers};
use crate::problem::{Problem, stiff, support_force};
use crate::report::Tolerance::{Absolute, Relative};
use crate::report::{check, check_all, check_print, check_second_order};
use crate::scalar::halving_limit;

/// A rope hung from the origin to another anchor.
#[derive(Clone, Copy, Debug)]
struct Rope {
    /// The other anchor, from the first (m).
    dx: f64,
    dz: f64,
    /// Whole unstressed length (m).
    unstressed: f64,
    axial_stiffness: f64,
    /// Per unstressed length (N/m).
    weight: f64,
}

/// What a chain answers.
#[derive(Clone, Debug)]
struct Hung {
    middle: Vector3<f64>,
    lowest: f64,
    /// Force of each support on the net (N).
    first: Vector3<f64>,
    second: Vector3<f64>,
}

impl Rope {
    /// Hangs the rope as a chain of equal straight bars, which start on the chord: slack wherever the rope is longer.
    fn hang(self, bars: u32) -> Hung {
        let mut problem = Problem::default();
        let first = problem.fixed(0.0, 0.0, 0.0);
        let mut path = vec![first];
        for i in 1..bars {
            let share = f64::from(i) / f64::from(bars);
            path.push(problem.free(share * self.dx, 0.0, share * self.dz));
        }
        let second = problem.fixed(self.dx, 0.0, self.dz);
        path.push(second);
        chain(&mut problem, &path, self.axial_stiffness, self.unstressed);
        weigh(&mut problem, self.weight);
        let state = problem.solve().state;
        Hung {
            middle: state.positions[path[path.len() / 2].index()],
            lowest: state.positions.iter().fold(0.0, |a: f64, p| a.min(p.z)),
            first: support_force(&state, first).force,
            second: support_force(&state, second).force,
        }
    }

    /// The limit of `value` for bars of no length.
    fn limit(self, chains: &[u32], value: impl Fn(&Hung) -> f64) -> f64 {
        let values: Vec<f64> = chains.iter().map(|bars| value(&self.hang(*bars))).collect();
        halving_limit(&values)
    }

    /// The limit of `value` for bars of no length and a rope that does not stretch: the stretch enters in proportion
    /// to 1/EA, and two stiff ropes tell the rest.
    fn inextensible_limit(self, value: impl Fn(&Hung) -> f64) -> f64 {
        let [soft, hard] = [1e9, 2e9].map(|axial_stiffness| {
            Self {
                axial_stiffness,
                ..self
            }
            .limit(&[16, 32, 64, 128], &value)
        });
        2.0 * hard - soft
    }
}

fn chain(problem: &mut Problem, path: &[NodeId], axial_stiffness: f64, unstressed: f64) {
    let bars = path.len() - 1;
    let each = unstressed / f64::from(u32::try_from(bars).expect("a chain is short"));
    let rules = vec![PrestressRule::UnstressedLength(each); bars];
    problem.cable(path, stiff(axial_stiffness), rules);
}

fn weigh(problem: &mut Problem, weight: f64) {
    problem.always(Load::PerUnstressedLength {
        scope: Scope::All,
        force: Vector3::new(0.0, 0.0, -weight),
    });
}

fn rope(case: &Value) -> Rope {
    Rope {
        dx: number(&case["dx"]),
        dz: number(&case["dz"]),
        unstressed: number(&case["L0"]),
        axial_stiffness: number(&case["EA"]),
        weight: number(&case["w"]),
    }
}

#[test]
fn chains_of_32_bars() {
    let data = file!("pub-03-elastic-catenary");
    for entry in data.all_expected() {
        let case = &entry["value"];
        let name = format!("pub-03 {}", entry["quantity"].as_str().expect("a name"));
        let hung = rope(case).hang(32);
        // The file gives this tolerance for its chains.
        check_all(
            &format!("{name}: middle of 32 bars (m)"),
            &data.source(),
            &numbers(&case["chain32_mid"]),
            &[hung.middle.x, hung.middle.z],
            Relative(1e-7),
        );
        check(
            &format!("{name}: horizontal force of 32 bars (N)"),
            &data.source(),
            number(&case["chain32_H"]),
            -hung.first.x,
            Relative(1e-7),
        );
    }
}

/// A name in the data and how a chain tells it.
type Quantity = (&'static str, fn(&Hung) -> f64);

#[test]
fn chains_approach_the_elastic_catenary() {
    let data = file!("pub-03-elastic-catenary");
    for entry in data.all_expected() {
        let case = &entry["value"];
        let name = format!("pub-03 {}", entry["quantity"].as_str().expect("a name"));
        let hung: Vec<Hung> = [32, 64, 128, 256].iter().map(|bars| rope(case).hang(*bars)).collect();
        let quantities: [Quantity; 6] = [
            ("H", |h| -h.first.x),
            ("V_A", |h| h.first.z),
            ("T_A", |h| h.first.norm()),
            ("T_B", |h| h.second.norm()),
            ("mid_x", |h| h.middle.x),
            ("mid_z", |h| h.middle.z),
        ];
        for (key, value) in quantities {
            let closed_form = number(&case[key]);
            let values: Vec<f64> = hung.iter().map(value).collect();
            check(
                &format!("{name}: {key}, limit of chains of 32 to 256 bars"),
                &data.source(),
                closed_form,
                halving_limit(&values),
                Relative(number(&entry["tol_rel"])),
            );
            // On level supports the chain meets the vertical force and the middle exactly: no error, no order.
            let exact = ["V_A", "mid_x"].contains(&key) && number(&case["dz"]) == 0.0;
            if !exact {
                let errors: Vec<f64> = values.iter().map(|v| v - closed_form).collect();
                check_second_order(&format!("{name}: {key}"), &data.source(), &errors);
            }
        }
    }
}

#[test]
fn chain_hangs_between_the_ends_of_a_known_catenary() {
    // Ends, and forces at them, of one elastic catenary; checked against quadrature. Digits as given.
    let source = "elastic catenary, closed form (Irvine 1981, from memory)";
    let rope = Rope {
        dx: 69.492353,
        dz: -3.919748,
        unstressed: 70.0,
        axial_stiffness: 42e6,
        weight: 200.0,
    };
    let chains = [8, 16, 32, 64];
    // The span is given to 5e-7 m and the rope's stiffness along it is 37 kN/m: 0.02 N.
    check(
        "catenary of 70 m: H (N)",
        source,
        35000.0,
        rope.limit(&chains, |h| -h.first.x),
        Absolute(0.02),
    );
    check(
        "catenary of 70 m: V (N)",
        source,
        9000.0,
        rope.limit(&chains, |h| h.first.z),
        Absolute(0.02),
    );
    check(
        "catenary of 70 m: Ta (N)",
        source,
        36138.622,
        rope.limit(&chains, |h| h.first.norm()),
        Absolute(0.02),
    );
    check(
        "catenary of 70 m: Tb (N)",
        source,
        35355.339,
        rope.limit(&chains, |h| h.second.norm()),
        Absolute(0.02),
    );
}

#[test]
fn steep_inextensible_catenary() {
    // The chain has the file's length; its forces are compared. The lowest point and the parts of the length follow from
    // the forces at the ends by the catenary's own relations.
    let data = file!("pub-04-inextensible-inclined-catenary");
    let weight = number(&data.inputs()["q0"]);
    let rope = Rope {
        dx: number(&data.inputs()["span"]),
        dz: -number(&data.inputs()["height_difference"]),
        unstressed: number(&data.expected("total unstressed length")["value"]),
        axial_stiffness: f64::NAN,
        weight,
    };
    let horizontal = rope.inextensible_limit(|h| -h.first.x);
    let [high, low] = [
        rope.inextensible_limit(|h| h.first.norm()),
        rope.inextensible_limit(|h| h.second.norm()),
    ];
    let up = |tension: f64| (tension * tension - horizontal * horizontal).sqrt();
    let distance = |tension: f64| horizontal / weight * (up(tension) / horizontal).asinh();
    let angle = (up(high) / horizontal).atan().to_degrees();

    check(
        "pub-04 horizontal force (N)",
        &data.source(),
        number(&data.inputs()["H"]),
        horizontal,
        Relative(1e-6),
    );
    for (quantity, computed) in [
        ("tension at high support", high),
        ("tension at low support", low),
        ("distance of lowest point from high support", distance(high)),
        ("slope angle at high support", angle),
    ] {
        let expected = data.expected(quantity);
        check(
            &format!("pub-04 {quantity}"),
            &data.source(),
            number(&expected["value"]),
            computed,
            Relative(number(&expected["tol_rel"])),
        );
    }
    for (quantity, computed) in [
        ("x_A", distance(high)),
        ("x_B", distance(low)),
        ("y_A", high / weight),
        ("y_B", low / weight),
        ("N_A", high / 1e3),
        ("N_B", low / 1e3),
        ("L_A", up(high) / weight),
        ("L_B", up(low) / weight),
        ("angle at A", angle),
    ] {
        check_print(&data, quantity, computed);
    }
}

#[test]
fn textbook_uniform_cable() {
    // The chain has the file's length; minimum and maximum tension and the sag are compared.
    let data = file!("pub-07-textbook-uniform-cable");
    let length = data.expected("length");
    let rope = Rope {
        dx: number(&data.inputs()["span"]),
        dz: 0.0,
        unstressed: number(&length["value"]),
        axial_stiffness: f64::NAN,
        weight: number(&data.inputs()["w"]),
    };
    let least = rope.inextensible_limit(|h| -h.first.x);
    let largest = rope.inextensible_limit(|h| h.first.norm());
    for (quantity, computed) in [("minimum tension", least), ("maximum tension", largest)] {
        let expected = data.expected(quantity);
        check(
            &format!("pub-07 {quantity} (N)"),
            &data.source(),
            number(&expected["value"]),
            computed,
            Relative(number(&expected["tol_rel"])),
        );
    }
    check(
        "pub-07 sag (m)",
        &data.source(),
        number(&data.inputs()["sag"]),
        -rope.inextensible_limit(|h| h.lowest),
        Relative(1e-6),
    );
    let pound = 4.4482216152605;
    check_print(&data, "T_min", least / pound);
    check_print(&data, "T_max", largest / pound);
}

/// The 1000 ft cable as a chain: own weight, then the load, at node 2.
fn isolated_cable(bars_a_side: u32) -> (StateResult, StateResult, NodeId) {
    let data = file!("pub-01-isolated-cable-point-load");
    let input = |key: &str| number(&data.inputs()[key]);
    let [span, at] = [input("span"), input("load_x")];
    let low = -input("sag_at_load_point");
    let mut problem = Problem::default();
    let left = problem.fixed(0.0, 0.0, 0.0);
    let loaded = problem.free(at, 0.0, low);
    let right = problem.fixed(span, 0.0, 0.0);
    for (from, to, ends, unstressed) in [
        (left, loaded, [[0.0, 0.0], [at, low]], input("unstressed_left")),
        (loaded, right, [[at, low], [span, 0.0]], input("unstressed_right")),
    ] {
        let mut path = vec![from];
        for i in 1..bars_a_side {
            let share = f64::from(i) / f64::from(bars_a_side);
            let along = |axis: usize| ends[0][axis] + share * (ends[1][axis] - ends[0][axis]);
            path.push(problem.free(along(0), 0.0, along(1)));
        }
        path.push(to);
        chain(&mut problem, &path, input("EA"), unstressed);
    }
    weigh(&mut problem, input("w"));
    problem.push_node(loaded, 0.0, 0.0, -input("P"));
    let answer = problem.solve();
    (answer.reference, answer.state, loaded)
}

#[test]
fn thousand_foot_cable_under_a_point_load() {
    let data = file!("pub-01-isolated-cable-point-load");
    let mut movements = Vec::new();
    let mut sags = Vec::new();
    let mut horizontals = Vec::new();
    for bars in [5, 10, 20, 40] {
        let (reference, state, node) = isolated_cable(bars);
        let movement = state.positions[node.index()] - reference.positions[node.index()];
        if bars <= 20 {
            let expected = data.expected(&format!("chain of {bars}+{bars}"));
            check_all(
                &format!("pub-01 chain of {bars}+{bars} bars: movement (m)"),
                &data.source(),
                &numbers(&expected["value"]),
                &[movement.x, movement.z],
                Relative(number(&expected["tol_rel"])),
            );
        }
        movements.push(movement);
        sags.push(-reference.positions[node.index()].z);
        horizontals.push(-state.support_forces[0].force.x);
    }
    let foot = 0.3048;
    check_print(&data, "vertical, Michalos & Birnstiel", movements[0].z);
    check_print(&data, "horizontal, Michalos & Birnstiel", movements[0].x);

    // Towards the catenary: the limit of the chains, and the rate at which they approach it.
    for (axis, quantity, jayaraman, obrien) in [
        (
            0,
            "node 2 horizontal displacement",
            "horizontal, same",
            "horizontal, O'Brien & Francis",
        ),
        (
            2,
            "node 2 vertical displacement",
            "vertical, Jayaraman & Knudson",
            "vertical, O'Brien & Francis",
        ),
    ] {
        let expected = data.expected(quantity);
        let values: Vec<f64> = movements.iter().map(|m| m[axis]).collect();
        let limit = halving_limit(&values);
        check(
            &format!("pub-01 {quantity}, limit of chains (m)"),
            &data.source(),
            number(&expected["value"]),
            limit,
            Relative(number(&expected["tol_rel"])),
        );
        let errors: Vec<f64> = values.iter().map(|v| v - number(&expected["value"])).collect();
        check_second_order(&format!("pub-01 {quantity}"), &data.source(), &errors);
        check_print(&data, jayaraman, limit / foot);
        check_print(&data, obrien, limit);
    }
    let expected = data.expected("H after load");
    check(
        "pub-01 horizontal force after loading, limit of chains (N)",
        &data.source(),
        number(&expected["value"]),
        halving_limit(&horizontals),
        Relative(number(&expected["tol_rel"])),
    );
    check_print(&data, "sag at load point", halving_limit(&sags));
}
