//! Shapes that meet targets, against closed forms.

use nalgebra::Vector3;
use ropewalk_numerics::load::Load;
use ropewalk_numerics::model::{NodeId, SegmentId};
use ropewalk_numerics::shape::{PrestressRule, SagMeasure, Wish};

use crate::problem::{Problem, stiff};
use crate::report::Tolerance::{Absolute, Relative};
use crate::report::{check, check_all};

const SOURCE: &str = "closed form";
const AXIAL_STIFFNESS: f64 = 2e7;

fn down(node: NodeId, force: f64) -> Load {
    Load::Nodes {
        nodes: vec![node],
        force: Vector3::new(0.0, 0.0, -force),
    }
}

/// A rope of 8 m span with `P` in its middle: `T = P l / (2 f)`, `l` half its length, `f` its sag.
#[test]
fn sag_of_a_loaded_rope() {
    let (load, sag) = (3000.0, 0.9);
    let mut problem = Problem::default();
    let ends = [problem.fixed(-4.0, 0.0, 1.0), problem.fixed(4.0, 0.0, 1.0)];
    let middle = problem.free(0.3, 0.2, 0.0);
    let rule = problem.adjustable(500.0);
    problem.cable(&[ends[0], middle, ends[1]], stiff(AXIAL_STIFFNESS), [rule; 2]);
    problem.always(down(middle, load));
    problem.target(Wish::Sag {
        node: middle,
        chord: ends,
        sag,
        measure: SagMeasure::Vertical,
    });
    let state = problem.solve().state;
    let half = sag.hypot(4.0);
    check(
        "target sag: tension (N)",
        SOURCE,
        load * half / (2.0 * sag),
        state.axial_forces[0],
        Relative(1e-9),
    );
    check(
        "target sag: height (m)",
        SOURCE,
        1.0 - sag,
        state.positions[middle.index()].z,
        Absolute(1e-9),
    );
}

/// The ring of force densities, its tensions wanted instead of its densities: corner bars q 6, ring bars q 3 kN/m.
#[test]
fn the_ring_by_its_tensions() {
    let mut problem = Problem::default();
    let corners = [[0.0, 0.0, 3.0], [9.0, 0.0, 0.0], [9.0, 9.0, 3.0], [0.0, 9.0, 0.0]];
    let ring = [
        [2.25, 2.25, 2.0],
        [6.75, 2.25, 1.0],
        [6.75, 6.75, 2.0],
        [2.25, 6.75, 1.0],
    ];
    let nodes: Vec<NodeId> = ring.iter().map(|p| problem.free(p[0] + 0.5, p[1] - 0.4, 0.0)).collect();
    for (node, corner) in nodes.iter().zip(corners) {
        let corner = problem.fixed(corner[0], corner[1], corner[2]);
        let rule = problem.adjustable(4000.0);
        problem.cable(&[corner, *node], stiff(AXIAL_STIFFNESS), [rule]);
    }
    let closed: Vec<NodeId> = nodes.iter().chain(&nodes[..1]).copied().collect();
    let rule = problem.adjustable(4000.0);
    problem.cable(&closed, stiff(AXIAL_STIFFNESS), [rule; 4]);
    // T = q l: 20012.496 and 13829.317 N.
    let corner = 6000.0 * (2.0 * 2.25_f64.powi(2) + 1.0).sqrt();
    let along = 3000.0 * 4.5_f64.hypot(1.0);
    for (segment, tension) in (0..5).zip([corner; 4].into_iter().chain([along])) {
        let segments = if segment == 4 { 4..8 } else { segment..segment + 1 };
        problem.target(Wish::Tension {
            segments: segments.map(SegmentId::new).collect(),
            tension,
        });
    }
    let state = problem.solve().state;
    let flat = |list: &[[f64; 3]]| -> Vec<f64> { list.iter().flatten().copied().collect() };
    let found: Vec<[f64; 3]> = nodes.iter().map(|n| state.positions[n.index()].into()).collect();
    check_all(
        "target tension: ring of force densities (m)",
        "common practice: force densities; closed form against bisection",
        &flat(&ring),
        &flat(&found),
        Absolute(1e-6),
    );
}

/// Equal tensions at a hub: the point of least length of rope (Fermat), from which the anchors are seen under 120 degrees.
/// The tensions are a wish for each rope, met by targets instead of rules.
#[test]
fn equal_tensions_at_a_hub() {
    let mut problem = Problem::default();
    let hub = problem.free(1.0, 1.0, 0.5);
    let mut anchors = Vec::new();
    for [x, y] in [[0.0, 0.0], [4.0, 0.0], [1.0, 3.0]] {
        let anchor = problem.fixed(x, y, 0.0);
        let rule = problem.adjustable(700.0);
        problem.cable(&[anchor, hub], stiff(AXIAL_STIFFNESS), [rule]);
        anchors.push(anchor);
    }
    for segment in 0..3 {
        problem.target(Wish::Tension {
            segments: vec![SegmentId::new(segment)],
            tension: 500.0,
        });
    }
    let state = problem.solve().state;
    let unit = |k: usize| (state.positions[anchors[k].index()] - state.positions[hub.index()]).normalize();
    let cosines = [unit(0).dot(&unit(1)), unit(1).dot(&unit(2)), unit(2).dot(&unit(0))];
    check_all(
        "target tension: angles at a hub (cos)",
        SOURCE,
        &[-0.5; 3],
        &cosines,
        Absolute(1e-8),
    );
}

/// A rope on a parabola by one force density, its last height wanted: with equal loads `q` at equal spacing `s` the sag of
/// `n` segments is `q n² s / (8 D s)`, so that the density that gives a sag is known (Schek's linear net).
#[test]
fn a_height_decides_the_force_density() {
    let (spacing, load, sag) = (2.0, 1200.0, 1.5);
    let mut problem = Problem::default();
    let mut path = vec![problem.fixed(0.0, 0.0, 0.0)];
    for k in 1..8_u32 {
        let node = problem.free(spacing * f64::from(k), 0.1, -0.5);
        problem.always(down(node, load));
        path.push(node);
    }
    path.push(problem.fixed(8.0 * spacing, 0.0, 0.0));
    let rule: PrestressRule = problem.adjustable(900.0);
    problem.cable(&path, stiff(AXIAL_STIFFNESS), [rule; 8]);
    problem.target(Wish::Coordinate {
        node: path[4],
        axis: 2,
        value: -sag,
    });
    let state = problem.solve().state;
    // z_k = −(P/D) k (n − k)/2, in the middle (P/D) n²/8.
    let density = load * 64.0 / (8.0 * sag);
    let heights: Vec<f64> = (0..9_u32)
        .map(|k| -(load / density) * f64::from(k * (8 - k)) / 2.0)
        .collect();
    let found: Vec<f64> = path.iter().map(|n| state.positions[n.index()].z).collect();
    check_all("target height: parabola (m)", SOURCE, &heights, &found, Absolute(1e-9));
}

/// Radius of a polygon inscribed in a circle: nodes of an edge rope pulled away from the centre lie on the circle
/// `R = c²/(8 s) + s/2` of its chord and rise.
#[test]
fn radius_of_an_edge_rope() {
    // c 8, s 0.8: R 10.4 (common practice).
    let (chord, rise) = (8.0_f64, 0.8);
    let radius = chord * chord / (8.0 * rise) + rise / 2.0;
    check(
        "radius by chord and rise (m)",
        "common practice",
        10.4,
        radius,
        Relative(1e-12),
    );
    let mut problem = Problem::default();
    let half = (chord / 2.0 / radius).asin();
    let on_circle = |k: u32, out: f64| {
        let angle = half * (f64::from(k) / 3.0 - 1.0);
        let r = radius + out;
        Vector3::new(r * angle.sin(), radius - rise - r * angle.cos(), 0.0)
    };
    let mut path = Vec::new();
    let mut ties = Vec::new();
    for k in 0..=6 {
        let at = on_circle(k, 0.0);
        if k == 0 || k == 6 {
            path.push(problem.fixed(at.x, at.y, at.z));
        } else {
            let node = problem.free(at.x + 0.02, at.y * 0.5, 0.1);
            let far = on_circle(k, 4.0);
            ties.push((node, problem.fixed(far.x, far.y, far.z)));
            path.push(node);
        }
    }
    let edge = problem.adjustable(30_000.0);
    problem.cable(&path, stiff(AXIAL_STIFFNESS), [edge; 6]);
    for (node, far) in &ties {
        let rule = problem.adjustable(1000.0);
        problem.cable(&[*node, *far], stiff(AXIAL_STIFFNESS), [rule]);
    }
    for nodes in path.windows(3) {
        problem.target(Wish::Radius {
            nodes: [nodes[0], nodes[1], nodes[2]],
            radius,
        });
    }
    let state = problem.solve().state;
    // Five circles of one radius, each through two nodes of the next, are one circle through both ends.
    let distance = |n: &NodeId| {
        let x = state.positions[n.index()];
        (x - Vector3::new(0.0, radius - rise, 0.0)).norm()
    };
    let found: Vec<f64> = path.iter().map(distance).collect();
    check_all(
        "target radius: distance from the centre (m)",
        SOURCE,
        &[radius; 7],
        &found,
        Absolute(1e-7),
    );
}
