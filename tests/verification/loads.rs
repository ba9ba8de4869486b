//! Each kind of load once, against its closed form. Forces on nodes: see the straight ropes.

use nalgebra::Vector3;
use ropewalk_numerics::load::{Load, Scope};
use ropewalk_numerics::model::SegmentId;

use crate::problem::{Answer, Problem, stiff};
use crate::report::Tolerance::{Absolute, Relative};
use crate::report::{check, check_all};
use crate::scalar::root;

const SOURCE: &str = "statics by hand (our own)";

#[test]
fn own_weight_with_an_attached_mass() {
    // A lamp of 300 kg on 20 m of rope hung straight down, in two bars: each bar carries what hangs below its middle.
    let (axial_stiffness, mass_per_length, mass, gravity) = (5e6, 4.0, 300.0, 9.80665);
    let mut section = stiff(axial_stiffness);
    section.mass_per_length = mass_per_length;
    let mut problem = Problem::default();
    let top = problem.fixed(0.0, 0.0, 0.0);
    let middle = problem.free(0.0, 0.0, -12.0);
    let lamp = problem.free(0.0, 0.0, -20.0);
    problem.bar(top, middle, section, 12.0);
    problem.bar(middle, lamp, section, 8.0);
    problem.attach(lamp, mass);
    problem.always(Load::OwnWeight {
        gravity: Vector3::new(0.0, 0.0, -gravity),
    });
    let state = problem.solve().state;
    let tensions = [
        gravity * (mass + mass_per_length * (8.0 + 6.0)),
        gravity * (mass + mass_per_length * 4.0),
    ];
    check_all(
        "own weight: tensions (N)",
        SOURCE,
        &tensions,
        &state.axial_forces,
        Relative(1e-9),
    );
    let sinks = (12.0 * tensions[0] + 8.0 * tensions[1]) / axial_stiffness;
    check(
        "own weight: the lamp sinks (m)",
        SOURCE,
        sinks,
        -20.0 - state.positions[lamp.index()].z,
        Relative(1e-9),
    );
    check(
        "own weight: support force (N)",
        SOURCE,
        gravity * (mass + mass_per_length * 20.0),
        state.support_forces[0].force.z,
        Relative(1e-9),
    );
}

/// A straight inclined rope, half 4 m on plan and 3 m high, clamped at its middle and prestressed; a load acts across it.
fn inclined(load: impl FnOnce(&mut Problem)) -> Answer {
    let mut problem = Problem::default();
    let from = problem.fixed(0.0, 0.0, 0.0);
    let middle = problem.free(4.0, 0.0, 3.0);
    let to = problem.fixed(8.0, 0.0, 6.0);
    let section = stiff(AXIAL_STIFFNESS);
    problem.bar(from, middle, section, UNSTRESSED);
    problem.bar(middle, to, section, UNSTRESSED);
    load(&mut problem);
    problem.solve()
}

const AXIAL_STIFFNESS: f64 = 2e6;
/// Half of the inclined rope (m): 10 kN of tension while it is straight.
const UNSTRESSED: f64 = 5.0 / 1.005;

/// Deflection of the middle of the inclined rope under a force across it: `2 N d / l = P`, `l² = 25 + d²`.
fn deflection(force: f64) -> f64 {
    root(0.0, 5.0, |d| {
        let length = 5.0_f64.hypot(d);
        2.0 * AXIAL_STIFFNESS * (length / UNSTRESSED - 1.0) * d / length - force
    })
}

#[test]
fn per_unstressed_length_and_per_plan_length() {
    // Half of each segment's load sits at the middle, half at an anchor.
    let across = Vector3::new(0.0, 350.0, 0.0);
    let scope = || Scope::All;
    for (kind, load, force) in [
        (
            "load per unstressed length",
            Load::PerUnstressedLength {
                scope: scope(),
                force: across,
            },
            350.0 * UNSTRESSED,
        ),
        (
            "load per plan length",
            Load::PerPlanLength {
                scope: scope(),
                force: across,
            },
            350.0 * 4.0,
        ),
        (
            "load per plan length of one segment",
            Load::PerPlanLength {
                scope: Scope::Segments(vec![SegmentId::new(1)]),
                force: across,
            },
            350.0 * 2.0,
        ),
    ] {
        let answer = inclined(|problem| problem.load(load));
        check(
            &format!("{kind}: deflection (m)"),
            SOURCE,
            deflection(force),
            answer.state.displacements[1].y,
            Relative(1e-9),
        );
        check(
            &format!("{kind}: sum of loads, half of it at the anchors (N)"),
            SOURCE,
            2.0 * force,
            answer.state.load_sum.y,
            Relative(1e-12),
        );
    }
}

#[test]
fn temperature_of_one_of_two_ropes() {
    // Two ropes in line; one warms. With a = L0 (1 + α ΔT): N (a1 + a2) / EA = span − a1 − a2.
    let mut section = stiff(AXIAL_STIFFNESS);
    section.expansion = 12e-6;
    let change = 35.0;
    let mut problem = Problem::default();
    let from = problem.fixed(0.0, 0.0, 0.0);
    let middle = problem.free(3.0, 0.0, 0.0);
    let to = problem.fixed(10.0, 0.0, 0.0);
    problem.bar(from, middle, section, 2.98);
    problem.bar(middle, to, section, 6.97);
    problem.load(Load::Temperature {
        scope: Scope::Segments(vec![SegmentId::new(0)]),
        change,
    });
    let state = problem.solve().state;
    let warm = 2.98 * (1.0 + 12e-6 * change);
    let tension = AXIAL_STIFFNESS * (10.0 - warm - 6.97) / (warm + 6.97);
    check_all(
        "temperature: tensions (N)",
        SOURCE,
        &[tension; 2],
        &state.axial_forces,
        Relative(1e-9),
    );
    let joint = warm * (1.0 + tension / AXIAL_STIFFNESS);
    check(
        "temperature: joint (m)",
        SOURCE,
        joint,
        state.positions[middle.index()].x,
        Relative(1e-10),
    );
}

#[test]
fn prestress_share() {
    // A share of 0.3 on a straight rope between anchors: the geometry stays, the tension grows by the share, and the
    // unstressed length is the one that belongs to it.
    let answer = inclined(|problem| {
        problem.load(Load::PrestressShare {
            scope: Scope::All,
            share: 0.3,
        });
    });
    check_all(
        "prestress share: tensions (N)",
        SOURCE,
        &[13e3; 2],
        &answer.state.axial_forces,
        Relative(1e-9),
    );
    check_all(
        "prestress share: unstressed lengths (m)",
        SOURCE,
        &[5.0 / (1.0 + 13e3 / AXIAL_STIFFNESS); 2],
        &answer.state.unstressed_lengths,
        Relative(1e-12),
    );
    check(
        "prestress share: middle stays (m)",
        SOURCE,
        0.0,
        answer.state.displacements[1].norm(),
        Absolute(1e-9),
    );
}
