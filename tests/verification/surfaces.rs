//! What lies on skins and blows against ropes, against statics by hand.
//!
//! The net is a square of side `a` between four fixed corners, with one free node in its middle and four ropes to it; four
//! triangular panels span between. The middle moves up and down only, so that the area on plan of a panel stays a quarter
//! of the square, and a third of what lies on each comes to the middle:
//!
//! ```text
//! 4 N h / l = P      l² = a²/2 + h²      N = EA (l/L0 − 1)
//! ```

use nalgebra::Vector3;
use ropewalk_numerics::brief::{CaseOutcome, LikelyCause, PondingEnd};
use ropewalk_numerics::load::{Load, Scope};
use ropewalk_numerics::model::{Area, NodeId, Section, SegmentId};

use crate::problem::{Answer, Problem, stiff};
use crate::report::Tolerance::{Absolute, Relative};
use crate::report::check;
use crate::scalar::root;

const SOURCE: &str = "statics by hand (our own)";
const SIDE: f64 = 10.0;

/// The square, its middle `below` the corners, and the middle.
fn square(axial_stiffness: f64, unstressed: f64, below: f64) -> (Problem, NodeId) {
    let mut problem = Problem::default();
    let half = SIDE / 2.0;
    let corners = [[-half, -half], [half, -half], [half, half], [-half, half]].map(|[x, y]| problem.fixed(x, y, 0.0));
    let middle = problem.free(0.0, 0.0, -below);
    for corner in corners {
        problem.bar(corner, middle, stiff(axial_stiffness), unstressed);
    }
    let panels: Vec<[NodeId; 3]> = (0..4).map(|k| [corners[k], corners[(k + 1) % 4], middle]).collect();
    let panels: Vec<&[NodeId]> = panels.iter().map(|panel| &panel[..]).collect();
    problem.skin(0.0, &panels);
    (problem, middle)
}

/// Vertical force of the four ropes on the middle at the depth `h` (N).
fn resists(axial_stiffness: f64, unstressed: f64, h: f64) -> f64 {
    let length = (0.5 * SIDE * SIDE + h * h).sqrt();
    4.0 * axial_stiffness * (length / unstressed - 1.0).max(0.0) * h / length
}

const AXIAL_STIFFNESS: f64 = 2e6;
const UNSTRESSED: f64 = 7.0;

fn height(answer: &Answer, node: NodeId) -> f64 {
    answer.state.positions[node.index()].z
}

#[test]
fn snow_on_plan() {
    let (mut problem, middle) = square(AXIAL_STIFFNESS, UNSTRESSED, 0.0);
    problem.load(Load::OnPlan {
        on: vec![Area::Skin(0)],
        pressure: 750.0,
    });
    let answer = problem.solve();
    let load = 750.0 * SIDE * SIDE;
    let sinks = root(0.01, 5.0, |h| resists(AXIAL_STIFFNESS, UNSTRESSED, h) - load / 3.0);
    check(
        "snow on plan: the middle sinks (m)",
        SOURCE,
        sinks,
        -height(&answer, middle),
        Relative(1e-9),
    );
    check(
        "snow on plan: its sum is on the plan area (N)",
        SOURCE,
        load,
        -answer.state.load_sum.z,
        Relative(1e-12),
    );
    let moment = answer.state.load_moment.norm();
    check(
        "snow on plan: no moment about the middle (N m)",
        SOURCE,
        0.0,
        moment,
        Absolute(1e-8),
    );
}

/// The vertical part of a pressure that stays normal to the panels acts on their plan area, which does not change; the rest
/// cancels by symmetry. Over a fixed rim the sum is the pressure times the area vector of the rim, whatever the shape.
#[test]
fn pressure_that_follows_the_panels() {
    let (mut problem, middle) = square(AXIAL_STIFFNESS, UNSTRESSED, 0.0);
    problem.load(Load::OnSurface {
        pressure: 750.0,
        coefficients: vec![(Area::Skin(0), -0.8)],
        elsewhere: None,
    });
    let answer = problem.solve();
    let load = 0.8 * 750.0 * SIDE * SIDE;
    let rises = root(0.01, 5.0, |h| resists(AXIAL_STIFFNESS, UNSTRESSED, h) - load / 3.0);
    check(
        "suction: the middle rises (m)",
        SOURCE,
        rises,
        height(&answer, middle),
        Relative(1e-7),
    );
    let supports = answer.state.support_sum;
    let stokes = "Stokes: the area vector of the rim";
    check(
        "suction: supports hold it down (N)",
        stokes,
        -load,
        supports.z,
        Relative(1e-7),
    );
    check(
        "suction: no force in plan (N)",
        stokes,
        0.0,
        supports.xy().norm(),
        Absolute(1e-6 * load),
    );
}

/// Pressure on one panel only: the sum acts at the third point between its rim and the middle, and follows its slope.
#[test]
fn snow_on_one_panel_acts_at_its_centroid() {
    let mut problem = Problem::default();
    let corners = [[0.0, 0.0], [6.0, 0.0], [6.0, 3.0], [0.0, 3.0]].map(|[x, y]| problem.fixed(x, y, 1.0 + 0.1 * x));
    problem.bar(corners[0], corners[2], stiff(1e6), 7.0);
    problem.skin(0.0, &[&corners]);
    problem.load(Load::OnPlan {
        on: vec![Area::Skin(0)],
        pressure: 400.0,
    });
    let state = problem.solve().state;
    // Force down at the centre (3, 1.5): the moment is x × F.
    let load = 400.0 * 18.0;
    check(
        "snow on a slope: its sum (N)",
        SOURCE,
        load,
        -state.load_sum.z,
        Relative(1e-12),
    );
    check(
        "snow on a slope: moment about x (N m)",
        SOURCE,
        -1.5 * load,
        state.load_moment.x,
        Relative(1e-12),
    );
    check(
        "snow on a slope: moment about y (N m)",
        SOURCE,
        3.0 * load,
        state.load_moment.y,
        Relative(1e-12),
    );
    let rest = (state.load_moment + state.support_moment).norm();
    check(
        "snow on a slope: moments balance (N m)",
        SOURCE,
        0.0,
        rest,
        Absolute(1e-8 * load),
    );
}

/// A level rope of two segments of 5 m, taut with about 10 kN: wind across it, and ice on it.
fn rope(load: impl FnOnce(Scope) -> Load) -> Answer {
    let section = Section {
        diameter: Some(0.024),
        ..stiff(AXIAL_STIFFNESS)
    };
    let mut problem = Problem::default();
    let from = problem.fixed(-5.0, 0.0, 0.0);
    let middle = problem.free(0.0, 0.0, 0.0);
    let to = problem.fixed(5.0, 0.0, 0.0);
    problem.bar(from, middle, section, LEVEL);
    problem.bar(middle, to, section, LEVEL);
    problem.load(load(Scope::Segments(vec![SegmentId::new(0), SegmentId::new(1)])));
    problem.solve()
}

const LEVEL: f64 = 5.0 / 1.005;

fn moves(force: f64) -> f64 {
    root(1e-9, 3.0, |d| {
        let length = 5.0_f64.hypot(d);
        2.0 * AXIAL_STIFFNESS * (length / LEVEL - 1.0) * d / length - force
    })
}

#[test]
fn wind_on_a_rope() {
    let wind = |along: Vector3<f64>| {
        move |scope| Load::WindOnRopes {
            scope,
            pressure: 900.0,
            along,
            drag_coefficient: 1.2,
        }
    };
    let across = rope(wind(Vector3::y()));
    // Half of each segment's force comes to the middle: that of one of them.
    let force = 900.0 * 1.2 * 0.024 * 5.0;
    check(
        "wind across a rope: its middle moves (m)",
        SOURCE,
        moves(force),
        across.state.positions[1].y,
        Relative(1e-9),
    );
    // At 30 degrees to the rope: a quarter of it, and across only.
    let angle = 30.0_f64.to_radians();
    let aslant = rope(wind(Vector3::new(angle.cos(), angle.sin(), 0.0)));
    let source = "cross-flow principle (Hoerner 1965, from memory)";
    check(
        "wind aslant on a rope: its sum (N)",
        source,
        0.25 * 2.0 * force,
        aslant.state.load_sum.y,
        Relative(1e-12),
    );
    check(
        "wind aslant on a rope: none along it (N)",
        source,
        0.0,
        aslant.state.load_sum.x,
        Absolute(1e-12 * force),
    );
}

#[test]
fn ice_on_a_rope() {
    let answer = rope(|scope| Load::Ice {
        scope,
        thickness: 0.03,
        density: 900.0,
        gravity: Vector3::new(0.0, 0.0, -9.81),
    });
    let ring = std::f64::consts::PI * (0.042_f64.powi(2) - 0.012_f64.powi(2));
    let force = 9.81 * 900.0 * ring * LEVEL;
    check(
        "ice on a rope: its middle sinks (m)",
        SOURCE,
        moves(force),
        -answer.state.positions[1].z,
        Relative(1e-9),
    );
}

const WATER: f64 = 1000.0;
const GRAVITY: f64 = 9.80665;

/// Force of water at the middle for each metre of depth (N/m): a sixth of base times height bears on the tip of a pyramid.
fn water() -> f64 {
    WATER * GRAVITY * SIDE * SIDE / 6.0
}

fn pressed_down(axial_stiffness: f64, unstressed: f64, force: f64) -> (Problem, NodeId) {
    let (mut problem, middle) = square(axial_stiffness, unstressed, 0.1);
    problem.always(Load::Nodes {
        nodes: vec![middle],
        force: Vector3::new(0.0, 0.0, -force),
    });
    problem.gather_water(WATER, GRAVITY);
    (problem, middle)
}

/// Ropes that hardly give: the basin is a pyramid upside down, a third of base times height, and stays as deep as it was dry
/// within half a per cent.
#[test]
fn a_stiff_basin_holds_a_pyramid_of_water() {
    let (dry, stiffness, force) = (0.6_f64, 1e10, 1000.0);
    let unstressed = (0.5 * SIDE * SIDE + dry * dry).sqrt();
    let (problem, middle) = pressed_down(stiffness, unstressed, force);
    let answer = problem.solve();
    let ponding = answer.state.ponding.as_ref().expect("it was asked for");
    assert_eq!(ponding.end, PondingEnd::Settled);
    let depth = root(dry, 1.01 * dry, |h| {
        resists(stiffness, unstressed, h) - force - water() * h
    });
    check(
        "stiff basin: depth, as dry (m)",
        SOURCE,
        dry,
        -height(&answer, middle),
        Relative(5e-3),
    );
    check(
        "stiff basin: depth (m)",
        SOURCE,
        depth,
        -height(&answer, middle),
        Relative(1e-8),
    );
    let volume = SIDE * SIDE * depth / 3.0;
    check(
        "stiff basin: volume (m3)",
        SOURCE,
        volume,
        ponding.volume(),
        Relative(1e-8),
    );
    let length = (0.5 * SIDE * SIDE + depth * depth).sqrt();
    let tension = (force + water() * depth) * length / (4.0 * depth);
    check(
        "stiff basin: tension of a rope (N)",
        SOURCE,
        tension,
        answer.state.axial_forces[0],
        Relative(1e-6),
    );
    let weight = WATER * GRAVITY * ponding.volume() + force;
    check(
        "stiff basin: supports bear water and load (N)",
        SOURCE,
        weight,
        answer.state.support_sum.z,
        Relative(1e-6),
    );
}

/// Ropes that give: the water settles where `4 N h / l = P + ρ g a² h / 6`.
#[test]
fn water_on_a_soft_net_settles_at_the_fixed_point() {
    let force = 2000.0;
    let (problem, middle) = pressed_down(5e6, UNSTRESSED, force);
    let answer = problem.solve();
    let ponding = answer.state.ponding.as_ref().expect("it was asked for");
    assert_eq!(ponding.end, PondingEnd::Settled);
    let dry = root(1e-3, 1.0, |h| resists(5e6, UNSTRESSED, h) - force);
    let wet = root(1.0, 4.0, |h| resists(5e6, UNSTRESSED, h) - force - water() * h);
    check(
        "pond: volume that the dry net would hold (m3)",
        SOURCE,
        SIDE * SIDE * dry / 3.0,
        ponding.volumes[0],
        Relative(1e-8),
    );
    check(
        "pond: depth where it settles (m)",
        SOURCE,
        wet,
        -height(&answer, middle),
        Relative(1e-5),
    );
    check(
        "pond: volume where it settles (m3)",
        SOURCE,
        SIDE * SIDE * wet / 3.0,
        ponding.volume(),
        Relative(1e-5),
    );
    check(
        "pond: depth told (m)",
        SOURCE,
        wet,
        ponding.ponds[0].depth,
        Relative(1e-5),
    );
}

/// However deep, water adds `ρ g a² / 6` = 163 kN for each metre, and ropes of 4 EA / L0 = 114 kN/m never catch up: no state of
/// balance is there to be found.
#[test]
fn water_on_a_net_that_never_catches_up_grows() {
    let stiffness = 2e5;
    assert!(4.0 * stiffness / UNSTRESSED < water());
    let (problem, _) = pressed_down(stiffness, UNSTRESSED, 500.0);
    let outcome = problem.outcome();
    let CaseOutcome::State { result, cause, .. } = &outcome else {
        panic!("{outcome:?}");
    };
    let ponding = result.ponding.as_ref().expect("it was asked for");
    assert!(!outcome.is_answered(), "{:?}", ponding.volumes);
    assert_eq!(ponding.end, PondingEnd::Growing, "{:?}", ponding.volumes);
    let cause = cause.as_ref().expect("it explains itself");
    assert!(matches!(cause.likely, LikelyCause::Pond { grows: true, .. }), "{cause}");
    // Far out every round adds more than the one before by the ratio of the two.
    let (last, before) = ponding.last_growth().expect("several rounds");
    check(
        "growing pond: ratio of rounds (-)",
        SOURCE,
        water() / (4.0 * stiffness / UNSTRESSED),
        last / before,
        Relative(0.05),
    );
}
