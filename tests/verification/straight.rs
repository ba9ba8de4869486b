//! Ropes in a line: what can be written down on one sheet of paper.

use nalgebra::Vector3;
use ropewalk_numerics::load::{Load, Scope};

use crate::data::{Data, file, number};
use crate::problem::{Answer, Problem, stiff};
use crate::report::Tolerance::{Absolute, Relative};
use crate::report::check;

/// A rope between anchors `span` apart, clamped at its middle, where a transverse load pulls.
fn two_link(half_span: f64, axial_stiffness: f64, unstressed_half: f64, load: f64) -> Answer {
    let mut problem = Problem::default();
    let left = problem.fixed(-half_span, 0.0, 0.0);
    let middle = problem.free(0.0, 0.0, 0.0);
    let right = problem.fixed(half_span, 0.0, 0.0);
    problem.bar(left, middle, stiff(axial_stiffness), unstressed_half);
    problem.bar(middle, right, stiff(axial_stiffness), unstressed_half);
    let load = Load::Nodes {
        nodes: vec![middle],
        force: Vector3::new(0.0, 0.0, -load),
    };
    if unstressed_half < half_span {
        problem.load(load);
    } else {
        // Without tension the middle has no place of its own until it is loaded: the load belongs to the reference state.
        problem.always(load);
    }
    problem.solve()
}

#[test]
fn flat_two_link_cable() {
    let data = file!("pub-10-two-link");
    for entry in data.all_expected() {
        let case = &entry["value"];
        let name = format!("{} {}", data.id(), entry["quantity"].as_str().expect("a name"));
        let answer = two_link(
            number(&case["half_span"]),
            number(&case["EA"]),
            number(&case["L0"]),
            number(&case["P"]),
        );
        let tolerance = Relative(number(&entry["tol_rel"]));
        check(
            &format!("{name}: deflection (m)"),
            &data.source(),
            number(&case["deflection"]),
            -answer.state.positions[1].z,
            tolerance,
        );
        check(
            &format!("{name}: tension (N)"),
            &data.source(),
            number(&case["force"]),
            answer.state.axial_forces[0],
            tolerance,
        );
    }
}

#[test]
fn two_collinear_bars_answer_less_than_in_proportion() {
    let source = "two collinear bars, closed form by bisection, seven digits given (our own)";
    let unstressed = 6.0 / (1.0 + 18e3 / 2.4e6);
    let [service, factored] = [1.5e3, 2.25e3].map(|load| two_link(6.0, 2.4e6, unstressed, load).state);
    check(
        "collinear bars: unstressed length (m)",
        source,
        5.955335,
        unstressed,
        Absolute(5e-7),
    );
    check(
        "collinear bars: deflection (m)",
        source,
        0.228058,
        -service.displacements[1].z,
        Absolute(5e-7),
    );
    check(
        "collinear bars: tension (N)",
        source,
        19746.06,
        service.axial_forces[0],
        Absolute(5e-3),
    );
    check(
        "collinear bars: tension at 1.5 loads (N)",
        source,
        21360.55,
        factored.axial_forces[0],
        Absolute(5e-3),
    );
    check(
        "collinear bars: tension at 1.5 loads over 1.5 tensions",
        source,
        0.721,
        factored.axial_forces[0] / (1.5 * service.axial_forces[0]),
        Absolute(5e-4),
    );
}

/// A straight rope between rigid anchors, clamped at its middle, under a change of temperature.
fn heated(data: &Data, axial_stiffness: f64, change: f64) -> f64 {
    let inputs = data.inputs();
    let length = number(&inputs["length"]);
    let unstressed = length / (1.0 + number(&inputs["N0"]) / number(&inputs["EA"]));
    let mut section = stiff(axial_stiffness);
    section.expansion = number(&inputs["alpha"]);
    let mut problem = Problem::default();
    let from = problem.fixed(0.0, 0.0, 0.0);
    let middle = problem.free(0.5 * length, 0.0, 0.0);
    let to = problem.fixed(length, 0.0, 0.0);
    problem.bar(from, middle, section, 0.5 * unstressed);
    problem.bar(middle, to, section, 0.5 * unstressed);
    problem.load(Load::Temperature {
        scope: Scope::All,
        change,
    });
    problem.solve().state.axial_forces[0]
}

#[test]
fn straight_rope_warms_until_slack() {
    let data = file!("pub-26-thermal-straight");
    let axial_stiffness = number(&data.inputs()["EA"]);
    let expansion = number(&data.inputs()["alpha"]);
    // The file's law is N = EA (l/L0 − 1 − α ΔT), ours N = EA (l/(L0 (1 + α ΔT)) − 1): with EA (1 + α ΔT) given to the
    // engine the two are one.
    let by_the_files_law = |change: f64| heated(&data, axial_stiffness * (1.0 + expansion * change), change);
    for (quantity, change) in [("N at dT = +100", 100.0), ("N at dT = -50", -50.0)] {
        let expected = data.expected(quantity);
        check(
            &format!("{} {quantity} K (N)", data.id()),
            &data.source(),
            number(&expected["value"]),
            by_the_files_law(change),
            Relative(number(&expected["tol_rel"])),
        );
    }
    let expected = data.expected("N at dT = +300");
    check(
        "pub-26 tension at +300 K, slack (N)",
        &data.source(),
        number(&expected["value"]),
        by_the_files_law(300.0),
        Absolute(number(&expected["tol_abs"])),
    );
    // Under the file's law tension falls in proportion to the change, so that one warm state tells where it ends.
    let expected = data.expected("slack temperature change");
    let cold = number(&data.inputs()["N0"]);
    check(
        "pub-26 change at which it goes slack (K)",
        &data.source(),
        number(&expected["value"]),
        100.0 * cold / (cold - by_the_files_law(100.0)),
        Relative(number(&expected["tol_rel"])),
    );
    let expected = data.expected("alternative law");
    check(
        "pub-26 tension at +100 K by our own law, EA as given (N)",
        &data.source(),
        number(&expected["value"]),
        heated(&data, axial_stiffness, 100.0),
        Relative(number(&expected["tol_rel"])),
    );
}

#[test]
fn single_heated_segment_with_nothing_free() {
    // N = EA (l/(L0 (1 + α ΔT)) − 1); the number stands in the kernel's theory notes, to six decimals.
    let mut section = stiff(2.4e6);
    section.expansion = 12e-6;
    let mut problem = Problem::default();
    let from = problem.fixed(0.0, 0.0, 0.0);
    let to = problem.fixed(3.0, 4.0, 3.4);
    problem.bar(from, to, section, 5.955335);
    problem.load(Load::Temperature {
        scope: Scope::All,
        change: 25.0,
    });
    check(
        "one heated segment between anchors: tension (N)",
        "segment law by hand (our own)",
        36003.286940,
        problem.solve().state.axial_forces[0],
        Absolute(1e-6),
    );
}

#[test]
fn lower_of_two_vertical_ropes_goes_slack() {
    let data = file!("pub-27-slack-pair");
    let [upper, lower, axial_stiffness, tension] =
        ["upper", "lower", "EA", "N0"].map(|key| number(&data.inputs()[key]));
    let under = |load: f64| {
        let mut problem = Problem::default();
        let top = problem.fixed(0.0, 0.0, upper + lower);
        let joint = problem.free(0.0, 0.0, lower);
        let ground = problem.fixed(0.0, 0.0, 0.0);
        let stretch = 1.0 + tension / axial_stiffness;
        problem.bar(top, joint, stiff(axial_stiffness), upper / stretch);
        problem.bar(joint, ground, stiff(axial_stiffness), lower / stretch);
        problem.push_node(joint, 0.0, 0.0, -load);
        problem.solve().state
    };
    for load in ["P = 1000", "P = 4000", "P = 8000"] {
        let expected = data.expected(load);
        let value = &expected["value"];
        let tolerance = Relative(number(&expected["tol_rel"]));
        let state = under(number(&value["P_down"]));
        let compare = |key: &str, computed: f64| {
            check(
                &format!("pub-27 {load} N: {key}"),
                &data.source(),
                number(&value[key]),
                computed,
                tolerance,
            );
        };
        compare("displacement_down", -state.displacements[1].z);
        compare("N_upper", state.axial_forces[0]);
        compare("N_lower", state.axial_forces[1]);
        assert_eq!(state.slack, [false, load == "P = 8000"]);
    }
    let expected = data.expected("slack load");
    let [first, second] = [1000.0, 4000.0].map(|load| under(load).axial_forces[1]);
    check(
        "pub-27 load at which the lower rope goes slack, from two taut states (N)",
        &data.source(),
        number(&expected["value"]),
        1000.0 + 3000.0 * first / (first - second),
        Relative(number(&expected["tol_rel"])),
    );
}

#[test]
fn vertical_rope_stretches_under_its_own_weight() {
    let data = file!("pub-28-vertical-own-weight");
    let [length, axial_stiffness, weight, load] = ["L0", "EA", "w", "P"].map(|key| number(&data.inputs()[key]));
    let bars = 10;
    let bar = length / 10.0;
    let mut problem = Problem::default();
    let mut nodes = vec![problem.fixed(0.0, 0.0, 0.0)];
    for i in 1..=bars {
        nodes.push(problem.free(0.0, 0.0, -bar * f64::from(i)));
    }
    for pair in nodes.windows(2) {
        problem.bar(pair[0], pair[1], stiff(axial_stiffness), bar);
    }
    problem.always(Load::PerUnstressedLength {
        scope: Scope::All,
        force: Vector3::new(0.0, 0.0, -weight),
    });
    let end = *nodes.last().expect("there are nodes");
    problem.push_node(end, 0.0, 0.0, -load);
    let state = problem.solve().state;
    let compare = |quantity: &str, computed: f64| {
        let expected = data.expected(quantity);
        check(
            &format!("pub-28 {quantity}"),
            &data.source(),
            number(&expected["value"]),
            computed,
            Relative(number(&expected["tol_rel"])),
        );
    };
    compare("end displacement", -length - state.positions[end.index()].z);
    compare("top tension", state.support_forces[0].force.z);
    compare("top bar force", state.axial_forces[0]);
}

#[test]
fn length_and_mark_of_a_rope() {
    // 10 m between pins at 40 kN and 25 degC; where a mark at its end lies at 60 kN and 18 degC. Digits as given.
    let source = "l = L0 (1 + alpha dT) (1 + T / EA), by hand (our own)";
    let unstressed = 9.981564;
    for (name, tension, change, length) in [
        ("length between pins", 40e3, 15.0, 10.0),
        ("length to the mark", 60e3, 8.0, 10.007479),
    ] {
        let mut problem = Problem::default();
        let top = problem.fixed(0.0, 0.0, 0.0);
        let end = problem.free(0.0, 0.0, -unstressed);
        let mut section = stiff(24e6);
        section.expansion = 12e-6;
        problem.bar(top, end, section, unstressed);
        // Without tension its end has no place: it hangs from the first.
        problem.always(Load::Nodes {
            nodes: vec![end],
            force: Vector3::new(0.0, 0.0, -tension),
        });
        problem.load(Load::Temperature {
            scope: Scope::All,
            change,
        });
        check(
            &format!("rope of 10 m: {name} (m)"),
            source,
            length,
            -problem.solve().state.positions[end.index()].z,
            Absolute(1e-6),
        );
    }
}
