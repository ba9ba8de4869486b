//! A whole canopy: every kind of rule at once, and what a found shape is good for.

use super::*;
use crate::test_nets::{Sketch, courtyard, courtyard_prestress, node, section, segments};

/// Orientation numbers of an independent solve, which had the skin's 1.1 kg/m² besides: carrying 10.3 to 21.7 kN, bracing
/// 9.9 to 20.6, edges 54.6 to 63.5 with mean 60, guys 104.7, masts −181.3, middle at 3.62 m, storm rope slack. Here the
/// skin is left out, so the middle hangs 27 mm higher and the masts bear 0.3 kN less.
#[test]
fn courtyard_canopy_in_its_reference_state() {
    let net = Arc::new(courtyard().net());
    let found = shape(&net, &courtyard_prestress(&net), vec![own_weight()]).expect("a shape");
    let range = |names: &[&str]| {
        let forces = segments(&net, names)
            .into_iter()
            .map(|e| found.state.axial_forces[e] / 1e3);
        forces.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), n| {
            (low.min(n), high.max(n))
        })
    };
    for (names, low, high) in [
        (&["c1", "c2", "c3"][..], 10.3, 21.7),
        (&["b1", "b2", "b3"], 9.9, 20.6),
        (&["eSW", "eSE", "eNE", "eNW"], 54.6, 63.5),
        (&["gW1", "gW2", "gE1", "gE2"], 104.7, 104.7),
    ] {
        let found = range(names);
        close(found.0, low, 0.06);
        close(found.1, high, 0.06);
    }
    for edge in ["eSW", "eSE", "eNE", "eNW"] {
        let forces: Vec<f64> = segments(&net, &[edge])
            .iter()
            .map(|e| found.state.axial_forces[*e])
            .collect();
        close(forces.iter().sum::<f64>() / forces.len() as f64, 60e3, 60e3 * 1e-10);
    }
    close(range(&["mW", "mE"]).0, -181.3, 0.4);
    close(found.state.positions[node(&net, "n22").index()].z, 3.62, 0.03);
    assert_eq!(range(&["storm1"]), (0.0, 0.0));
    assert!(found.report.imbalance <= 1e-9 * found.report.largest_force && !found.report.polished);
    assert!(found.report.balance.expect("guys and masts balance").unique);
}

/// The same with the weight of the skin on its 109 m² put on the inner nodes by hand.
#[test]
fn courtyard_canopy_with_the_weight_of_its_skin() {
    let net = Arc::new(courtyard().net());
    let inner: Vec<NodeId> = net
        .nodes()
        .iter()
        .enumerate()
        .filter(|(_, n)| n.position.is_none())
        .map(|(index, _)| NodeId::new(index))
        .collect();
    let skin = Load::Nodes {
        force: Vector3::new(0.0, 0.0, -1.1 * 109.0 * 9.80665 / inner.len() as f64),
        nodes: inner,
    };
    let found = shape(&net, &courtyard_prestress(&net), vec![own_weight(), skin]).expect("a shape");
    close(found.state.positions[node(&net, "n22").index()].z, 3.62, 0.01);
    for mast in segments(&net, &["mW", "mE"]) {
        close(found.state.axial_forces[mast], -181.3e3, 0.1e3);
    }
}

/// A storm rope too short to be slack pulls the middle down to where its own law bears what it pulls with.
#[test]
fn a_shorter_storm_rope_pulls_the_middle_down() {
    let net = Arc::new(courtyard().net());
    let mut prestress = courtyard_prestress(&net);
    let storm = segments(&net, &["storm1"])[0];
    let found = |prestress: &Prestress| shape(&net, prestress, vec![own_weight()]).expect("a shape");
    let middle = |found: &Found| found.state.positions[node(&net, "n22").index()].z;
    let before = middle(&found(&prestress));
    prestress.rules[storm] = PrestressRule::UnstressedLength(3.60);
    let after = found(&prestress);
    let tension = after.state.axial_forces[storm];
    close(middle(&after), 3.60 * (1.0 + tension / 8.9e6), 1e-10);
    assert!(before - middle(&after) > 0.04 && tension > 500.0);
    assert_eq!(after.report.taut_given_lengths, [crate::model::SegmentId::new(storm)]);
}

/// Lengths found become lengths given: the net stands as before.
#[test]
fn a_frozen_shape_keeps_its_tensions() {
    let net = Arc::new(courtyard().net());
    let found = shape(&net, &courtyard_prestress(&net), vec![own_weight()]).expect("a shape");
    let mut frozen = courtyard();
    for (given, position) in frozen.given.nodes.iter_mut().zip(&found.state.positions) {
        given.position = Some(*position);
    }
    let frozen = Arc::new(frozen.net());
    let rules = |by: f64| Prestress {
        rules: (frozen.segments().iter())
            .map(|s| PrestressRule::UnstressedLength(found.state.unstressed_lengths[s.length] * by))
            .collect(),
        ..all(&frozen, PrestressRule::Balance)
    };
    let again = shape(&frozen, &rules(1.0), vec![own_weight()]).expect("a state");
    let largest = found.report.largest_force;
    for (before, after) in found.state.axial_forces.iter().zip(&again.state.axial_forces) {
        close(*after, *before, 1e-9 * largest);
    }
    // And lengths that are a little longer do not: the comparison can fail.
    let longer = shape(&frozen, &rules(1.0001), vec![own_weight()]).expect("a state");
    assert!((longer.state.axial_forces[0] - found.state.axial_forces[0]).abs() > 1e-4 * largest);
}

/// Ropes of given length alone: `2 EA (l/L0 − 1) z/l = P` on two ropes under a load in the middle.
#[test]
fn given_lengths_alone_are_solved_as_an_elastic_net() {
    let mut sketch = Sketch::default();
    sketch.held("a", [-3.0, 0.0, 0.0]);
    sketch.held("b", [3.0, 0.0, 0.0]);
    sketch.node("m", [0.0, 0.0, -0.5]);
    sketch.cable("rope", section(1e6, 0.0), "a m b");
    let net = Arc::new(sketch.net());
    let sag: f64 = 0.4;
    let length = 3.0_f64.hypot(sag);
    let tension = 2000.0 * length / (2.0 * sag);
    let l0 = length / (1.0 + tension / 1e6);
    let load = down(node(&net, "m"), 2000.0);
    let found = shape(&net, &all(&net, PrestressRule::UnstressedLength(l0)), vec![load]).expect("a state");
    close(found.state.positions[2].z, -sag, 1e-9);
    close(found.state.axial_forces[0], tension, 1e-9 * tension);
}

/// Loads per length on plan follow the shape of a net of given lengths: `T_x` is the same all along, and at each node the
/// slopes take up the load of half of both plan lengths.
#[test]
fn plan_loads_settle_on_a_net_of_given_lengths() {
    let mut sketch = Sketch::default();
    sketch.held("a", [0.0, 0.0, 0.0]);
    sketch.held("b", [10.0, 0.0, 2.0]);
    for (name, x) in [("1", 2.5), ("2", 5.0), ("3", 7.5)] {
        sketch.node(name, [x, 0.0, -1.0]);
    }
    sketch.cable("rope", section(1e5, 0.0), "a 1 2 3 b");
    let net = Arc::new(sketch.net());
    let plan = Load::PerPlanLength {
        scope: crate::load::Scope::All,
        force: Vector3::new(0.0, 0.0, -700.0),
    };
    let found = shape(&net, &all(&net, PrestressRule::UnstressedLength(2.7)), vec![plan]).expect("a state");
    let order = ["a", "1", "2", "3", "b"].map(|name| found.state.positions[node(&net, name).index()]);
    let mut level = Vec::new();
    for k in 0..4 {
        let d = order[k + 1] - order[k];
        level.push(found.state.axial_forces[k] * d.x / d.norm());
    }
    for k in 1..4 {
        let (before, after) = (order[k] - order[k - 1], order[k + 1] - order[k]);
        close(level[k], level[0], 1e-7 * level[0]);
        let bend = level[k] * after.z / after.x - level[k - 1] * before.z / before.x;
        close(bend, 350.0 * (before.x + after.x), 1e-6 * 350.0);
    }
    assert!(
        (order[1].x - 2.5).abs() > 0.05,
        "plan lengths differ from those given at the start"
    );
}

/// A node held for the search that stands on a spring: the spring at rest bears nothing.
#[test]
fn a_held_node_may_have_a_spring() {
    let mut sketch = Sketch::default();
    sketch.held("wall", [5.0, 0.0, 0.0]);
    sketch.held("anchor", [-4.0, 0.0, 0.0]);
    sketch.sprung("h", [0.0, 0.0, 0.0], [1e5, 1e5, 1e5]);
    sketch.cable("rope", section(1e6, 0.0), "h wall");
    sketch.cable("guy", section(1e6, 0.0), "h anchor");
    let net = Arc::new(sketch.net());
    let prestress = Prestress {
        rules: vec![PrestressRule::Tension(700.0), PrestressRule::Balance],
        hold: vec![node(&net, "h")],
        ..all(&net, PrestressRule::Balance)
    };
    let found = shape(&net, &prestress, vec![]).expect("a shape");
    close(found.state.axial_forces[1], 700.0, 1e-9);
    assert!(found.state.positions[node(&net, "h").index()].norm() < 1e-12);
}
