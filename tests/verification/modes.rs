//! Natural frequencies of strings, chains and suspended cables.

use std::f64::consts::{PI, TAU};

use nalgebra::Vector3;
use ropewalk_numerics::load::Load;
use ropewalk_numerics::motion::Modes;

use crate::data::{file, index, number, numbers};
use crate::problem::{Answer, Problem, modes, stiff};
use crate::report::Tolerance::{Absolute, Relative};
use crate::report::{check, check_all, check_print};

const GRAVITY: f64 = 9.80665;

fn angular(found: &Modes) -> Vec<f64> {
    found.modes.iter().map(|mode| TAU * mode.frequency).collect()
}

/// Beads of equal mass on a taut string: all modes, each across twice.
#[test]
fn beaded_strings() {
    let data = file!("pub-13-beaded-string");
    for set in ["set 1", "set 2"] {
        let expected = data.expected(set);
        let value = &expected["value"];
        let [tension, mass, spacing, axial_stiffness] = ["T", "m", "spacing", "EA"].map(|key| number(&value[key]));
        let beads = index(&value["beads"]);
        let mut problem = Problem::default();
        let place = |bead: usize| bead as f64 * spacing;
        let mut nodes = vec![problem.fixed(0.0, 0.0, 0.0)];
        for bead in 1..=beads {
            let node = problem.free(place(bead), 0.0, 0.0);
            problem.attach(node, mass);
            nodes.push(node);
        }
        nodes.push(problem.fixed(place(beads + 1), 0.0, 0.0));
        for ends in nodes.windows(2) {
            problem.bar(
                ends[0],
                ends[1],
                stiff(axial_stiffness),
                spacing / (1.0 + tension / axial_stiffness),
            );
        }
        problem.modes(3 * beads);
        let state = problem.solve().reference;
        let found = modes(&state);
        let mut wanted: Vec<f64> = numbers(&value["omega_transverse_each_twice"]).repeat(2);
        wanted.extend(numbers(&value["omega_longitudinal"]));
        wanted.sort_by(f64::total_cmp);
        let computed = angular(found);
        check_all(
            &format!("{} {set}, all modes (rad/s)", data.id()),
            &data.source(),
            &wanted,
            &computed,
            Relative(number(&expected["tol_rel"])),
        );
        if beads == 3 {
            // The same mass spread along the string: ω₁ = π √(T / (M L)).
            let whole = PI * (tension / (3.0 * mass * 4.0 * spacing)).sqrt();
            for (number, mode) in [(1, 0), (2, 2), (3, 4)] {
                check_print(&data, &format!("ratio {number}"), computed[mode] / whole);
            }
        }
    }
}

/// Masses on links that hang from one end, taut by their weight alone: roots of the Laguerre polynomial.
#[test]
fn hanging_chains() {
    let data = file!("pub-15-hanging-chain");
    let (link, mass, axial_stiffness) = (0.8, 2.0, 1e9);
    for n in [4_u32, 10] {
        let expected = data.expected(&format!("n={n}:"));
        let mut problem = Problem::default();
        problem.always(Load::OwnWeight {
            gravity: Vector3::new(0.0, 0.0, -GRAVITY),
        });
        let mut above = problem.fixed(0.0, 0.0, 0.0);
        for k in 0..n {
            let node = problem.free(0.0, 0.0, -link * f64::from(k + 1));
            problem.attach(node, mass);
            // Links have their length under the weight below them, so that only the chain's own swing is left.
            let tension = f64::from(n - k) * mass * GRAVITY;
            problem.bar(
                above,
                node,
                stiff(axial_stiffness),
                link / (1.0 + tension / axial_stiffness),
            );
            above = node;
        }
        problem.modes(2 * n as usize);
        let state = problem.solve().reference;
        let computed: Vec<f64> = modes(&state)
            .modes
            .iter()
            .map(|mode| mode.root * link / GRAVITY)
            .collect();
        let wanted: Vec<f64> = numbers(&expected["value"]).iter().flat_map(|root| [*root; 2]).collect();
        check_all(
            &format!("{} with {n} masses, ω² h/g (–)", data.id()),
            &data.source(),
            &wanted,
            &computed,
            Relative(number(&expected["tol_rel"])),
        );
    }
}

const BARS: u32 = 160;

/// A cable in a parabola of that sag (m) over 160 equal steps in plan, with the horizontal pull (N) that this needs, and its
/// lowest modes.
fn suspended(span: f64, mass: f64, pull: f64, sag: f64, axial_stiffness: f64, count: usize) -> Answer {
    let step = span / f64::from(BARS);
    let place = |k: u32| {
        let share = f64::from(k) / f64::from(BARS);
        Vector3::new(span * share, 0.0, -4.0 * sag * share * (1.0 - share))
    };
    let mut problem = Problem::default();
    let nodes: Vec<_> = (0..=BARS)
        .map(|k| {
            let p = place(k);
            if k == 0 || k == BARS {
                return problem.fixed(p.x, p.y, p.z);
            }
            let node = problem.free(p.x, p.y, p.z);
            problem.attach(node, mass * step);
            node
        })
        .collect();
    problem.always(Load::OwnWeight {
        gravity: Vector3::new(0.0, 0.0, -GRAVITY),
    });
    for k in 0..BARS {
        let length = (place(k + 1) - place(k)).norm();
        let tension = pull * length / step;
        let unstressed = length / (1.0 + tension / axial_stiffness);
        problem.bar(
            nodes[k as usize],
            nodes[k as usize + 1],
            stiff(axial_stiffness),
            unstressed,
        );
    }
    problem.modes(count);
    problem.solve()
}

/// Frequencies in the plane of the cable that move it up and down as a whole: those whose mass takes part.
fn symmetric(found: &Modes) -> Vec<f64> {
    let takes_part = |axis: usize| {
        move |mode: &&ropewalk_numerics::motion::Mode| mode.effective_mass[axis] > 1e-6 * found.moving_mass[axis]
    };
    let modes = found.modes.iter().filter(takes_part(2));
    modes.map(|mode| TAU * mode.frequency).collect()
}

/// Through the crossover, where the first symmetric mode overtakes the antisymmetric one.
#[test]
fn suspended_cables_through_the_crossover() {
    let data = file!("pub-12-irvine-caughey");
    for given in data.inputs()["discrete_check"].as_array().expect("a list of cables") {
        let [lambda2, span, sag, mass, pull, axial_stiffness] =
            ["lambda2", "l", "d", "m", "H", "EA"].map(|key| number(&given[key]));
        let state = suspended(span, mass, pull, sag, axial_stiffness, 8).reference;
        let found = modes(&state);
        let scale = span * (mass / pull).sqrt() / PI;
        let over_pi: Vec<f64> = angular(found).iter().map(|omega| omega * scale).collect();
        check_all(
            &format!("{} at lambda2 {lambda2:.4}, 160 bars, ω l √(m/H) / π (–)", data.id()),
            "eigenvalues of the same 160 bars in the file (our own)",
            &numbers(&given["lowest8_omega_over_pi"]),
            &over_pi,
            Relative(1e-8),
        );
        // The continuous cable, within the shallow theory and 160 bars: 0.1 %, as the file says.
        let quantity = match lambda2 {
            value if value < 11.0 => "symmetric o/pi, lambda2 = 10",
            value if value < 99.0 => "symmetric o/pi, lambda2 = 4pi^2",
            _ => "symmetric o/pi, lambda2 = 100",
        };
        let expected = &data
            .all_expected()
            .iter()
            .find(|e| e["quantity"] == quantity)
            .expect("roots")["value"];
        let computed: Vec<f64> = symmetric(found).iter().map(|omega| omega * scale).collect();
        check_all(
            &format!("{} at lambda2 {lambda2:.4}, symmetric ω l √(m/H) / π (–)", data.id()),
            &data.source(),
            &numbers(expected)[..2],
            &computed[..2],
            Relative(1e-3),
        );
    }
}

/// A cable of 40 m and 8 kg/m under three tensions: the first symmetric frequency, from far above that of a string to it.
#[test]
fn a_cable_from_slack_to_taut() {
    let source = "Irvine & Caughey 1974, roots by bisection (our own): tan(z/2) = z/2 - (4/lambda2) (z/2)^3";
    let (span, mass, axial_stiffness) = (40.0, 8.0, 80e6);
    for (pull, first) in [(30e3, 1.385), (100e3, 1.442), (400e3, 2.797)] {
        let sag = mass * GRAVITY * span * span / (8.0 * pull);
        let state = suspended(span, mass, pull, sag, axial_stiffness, 6).reference;
        let computed = symmetric(modes(&state))[0] / TAU;
        // Half of the last digit, and 0.1 % for shallow theory and bars.
        check(
            &format!("cable under {pull} N, first symmetric frequency (Hz)"),
            source,
            first,
            computed,
            Absolute(5e-4 + 1e-3 * first),
        );
    }
}
