//! What can not be shaped says so, in the client's ids.

use super::*;
use crate::test_nets::{Sketch, node, section};

fn message(outcome: Result<Found, ShapeError>) -> String {
    outcome.expect_err("there is no such state").to_string()
}

fn rope() -> Sketch {
    let mut sketch = Sketch::default();
    sketch.held("a", [0.0, 0.0, 0.0]);
    sketch.held("b", [6.0, 0.0, 0.0]);
    sketch.cable("rope", section(1e6, 0.0), "a m b");
    sketch
}

#[test]
fn a_cable_can_not_be_given_compression() {
    let net = Arc::new(rope().net());
    for rule in [
        PrestressRule::ForceDensity(-3.0),
        PrestressRule::Tension(-3.0),
        PrestressRule::Tension(f64::NAN),
        PrestressRule::UnstressedLength(0.0),
        PrestressRule::ForceDensity(f64::INFINITY),
    ] {
        let text = message(shape(&net, &all(&net, rule), vec![]));
        assert!(text.contains("member \"rope\" is given"), "{text}");
    }
}

#[test]
fn nodes_without_tension_are_not_held() {
    let mut sketch = rope();
    sketch.cable("tail", section(1e6, 0.0), "m t1 t2");
    let net = Arc::new(sketch.net());
    let mut prestress = all(&net, PrestressRule::ForceDensity(100.0));
    prestress.rules[2] = PrestressRule::ForceDensity(0.0);
    let text = message(shape(&net, &prestress, vec![]));
    assert!(text.contains("nothing holds \"t1\", \"t2\""), "{text}");
}

#[test]
fn a_net_on_level_slides_only_is_not_held_along_them() {
    let mut sketch = Sketch::default();
    for (name, x) in [("a", 0.0), ("b", 4.0)] {
        sketch.held(name, [x, 0.0, 0.0]);
        let index = sketch.id(name).index();
        sketch.given.nodes[index].support = Some(crate::model::SupportGiven {
            released: vec![Vector3::new(0.0, 2.0, 0.0)],
        });
    }
    sketch.cable("rope", section(1e6, 0.0), "a b");
    let net = Arc::new(sketch.net());
    let outcome = shape(&net, &all(&net, PrestressRule::ForceDensity(100.0)), vec![]);
    let text = message(outcome);
    assert!(text.contains("nothing holds \"a\", \"b\" in place"), "{text}");
}

#[test]
fn a_net_of_given_lengths_needs_a_place_to_start() {
    let net = Arc::new(rope().net());
    let text = message(shape(&net, &all(&net, PrestressRule::UnstressedLength(3.0)), vec![]));
    assert!(text.contains("coordinates to start from: \"m\" have none"), "{text}");
}

#[test]
fn slack_ropes_leave_a_node_loose() {
    let mut sketch = rope();
    sketch.held("c", [3.0, 2.0, 0.0]);
    sketch.cable("long", section(1e6, 0.0), "m t c");
    let net = Arc::new(sketch.net());
    let mut prestress = all(&net, PrestressRule::ForceDensity(100.0));
    prestress.rules[2] = PrestressRule::UnstressedLength(9.0);
    prestress.rules[3] = PrestressRule::UnstressedLength(9.0);
    let text = message(shape(&net, &prestress, vec![]));
    assert!(text.contains("only slack ropes lead to \"t\""), "{text}");
}

/// A free end pulls nothing to it: it is loose, not a rope without length.
#[test]
fn a_slack_rope_with_a_free_end_is_loose() {
    let mut sketch = rope();
    sketch.cable("tail", section(1e6, 0.0), "m t");
    let net = Arc::new(sketch.net());
    let mut prestress = all(&net, PrestressRule::ForceDensity(100.0));
    prestress.rules[2] = PrestressRule::UnstressedLength(2.0);
    let text = message(shape(&net, &prestress, vec![]));
    assert!(text.contains("only slack ropes lead to \"t\""), "{text}");
}

/// A strut that pushes as much as its ropes pull leaves the node between them without stiffness.
#[test]
fn compression_that_cancels_tension_is_told() {
    let mut sketch = rope();
    sketch.held("post", [3.0, 0.0, -2.0]);
    sketch.strut("strut", section(1e7, 0.0), "post", "m");
    let net = Arc::new(sketch.net());
    let mut prestress = all(&net, PrestressRule::ForceDensity(100.0));
    for push in [-200.0, -200.0 * (1.0 + 1e-15)] {
        prestress.rules[2] = PrestressRule::ForceDensity(push);
        let text = message(shape(&net, &prestress, vec![down(node(&net, "m"), 10.0)]));
        assert!(text.contains("compression and tension cancel there"), "{text}");
    }
}

#[test]
fn loads_of_the_reference_state_are_dead() {
    let net = Arc::new(rope().net());
    let hot = Load::Temperature {
        scope: crate::load::Scope::All,
        change: 20.0,
    };
    let text = message(shape(&net, &all(&net, PrestressRule::ForceDensity(100.0)), vec![hot]));
    assert!(text.contains("action \"self\" has a change of temperature"), "{text}");
}

fn mast_head(wall: [f64; 3]) -> (Arc<Net>, Prestress) {
    let mut sketch = Sketch::default();
    sketch.held("anchor", [-4.0, 0.0, 0.0]);
    sketch.held("wall", wall);
    sketch.node("head", [0.0, 0.0, 3.0]);
    sketch.cable("rope", section(1e6, 0.0), "head wall");
    sketch.cable("guy", section(2e6, 0.0), "head anchor");
    let net = Arc::new(sketch.net());
    let prestress = Prestress {
        rules: vec![PrestressRule::Tension(8000.0), PrestressRule::Balance],
        hold: vec![node(&net, "head")],
        ..all(&net, PrestressRule::Balance)
    };
    (net, prestress)
}

#[test]
fn a_head_that_its_members_can_not_hold() {
    let (net, prestress) = mast_head([6.0, 0.0, 3.0]);
    let text = message(shape(&net, &prestress, vec![]));
    // A guy along (4, 3)/5 against 8 kN level: at best 8 · 3/5 is left across it.
    assert!(text.contains("at best they leave 4.80 kN at \"head\""), "{text}");
}

#[test]
fn a_guy_that_would_have_to_push() {
    let (net, prestress) = mast_head([-8.0, 0.0, -3.0]);
    let text = message(shape(&net, &prestress, vec![]));
    assert!(text.contains("cable \"guy\" (-8.00 kN)"), "{text}");
}

#[test]
fn a_member_left_to_balance_needs_held_ends() {
    let (net, mut prestress) = mast_head([6.0, 0.0, 3.0]);
    prestress.hold.clear();
    let text = message(shape(&net, &prestress, vec![]));
    assert!(
        text.contains("\"guy\" is left to balance, but ends at \"head\""),
        "{text}"
    );
}

#[test]
fn a_held_node_where_nothing_is_left_to_balance() {
    let (net, mut prestress) = mast_head([6.0, 0.0, 3.0]);
    prestress.rules = vec![PrestressRule::ForceDensity(1000.0); 2];
    // 6 kN towards the wall, 4 kN back and 3 kN down towards the anchor: that is what is left.
    let text = message(shape(&net, &prestress, vec![]));
    assert!(text.contains("3.61 kN at \"head\""), "{text}");
    // Half way between its ends the head is in balance as it is.
    let (net, _) = mast_head([4.0, 0.0, 6.0]);
    let found = shape(&net, &prestress, vec![]).expect("in balance");
    assert_eq!(found.report.balance, None);
}

#[test]
fn a_member_left_to_balance_where_no_node_is_held_bears_nothing() {
    let mut sketch = rope();
    sketch.cable("tie", section(1e6, 0.0), "a b");
    let net = Arc::new(sketch.net());
    let mut prestress = all(&net, PrestressRule::ForceDensity(10.0));
    *prestress.rules.last_mut().expect("a segment") = PrestressRule::Balance;
    let found = shape(&net, &prestress, vec![]).expect("a shape");
    assert_eq!(found.state.axial_forces.last(), Some(&0.0));
    let balance = found.report.balance.expect("a report");
    assert_eq!((balance.rank, balance.unique), (0, false));
}

#[test]
fn a_held_node_needs_a_place() {
    let net = Arc::new(rope().net());
    let prestress = Prestress {
        hold: vec![node(&net, "m")],
        ..all(&net, PrestressRule::ForceDensity(10.0))
    };
    let text = message(shape(&net, &prestress, vec![]));
    assert!(
        text.contains("\"m\" are to be held while the shape is found, but have no coordinates"),
        "{text}"
    );
}

/// Three ropes that meet: a tension larger than the other two together balances nowhere.
#[test]
fn tensions_that_do_not_balance() {
    let mut sketch = Sketch::default();
    sketch.held("a", [0.0, 0.0, 0.0]);
    sketch.held("b", [4.0, 0.0, 0.0]);
    sketch.held("c", [1.0, 3.0, 0.0]);
    for anchor in ["a", "b", "c"] {
        sketch.cable(anchor, section(1e6, 0.0), &format!("{anchor} m"));
    }
    let net = Arc::new(sketch.net());
    let prestress = Prestress {
        rules: [500.0, 600.0, 2000.0].map(PrestressRule::Tension).to_vec(),
        ..all(&net, PrestressRule::Balance)
    };
    let found = shape(&net, &prestress, vec![]).expect("the nearest balanced set");
    let text = found.report.unmet_in_words().expect("something is not met");
    assert!(text.contains("the given tensions leave"), "{text}");
    assert!(text.contains("instead of"), "{text}");
}

/// Both chords of a level rope without load: only the ratio of their densities is free, so the tensions must agree.
#[test]
fn dependent_tensions_that_disagree() {
    let net = Arc::new(rope().net());
    let prestress = Prestress {
        rules: [500.0, 700.0].map(PrestressRule::Tension).to_vec(),
        ..all(&net, PrestressRule::Balance)
    };
    let report = shape(&net, &prestress, vec![])
        .expect("the nearest balanced set")
        .report;
    let unmet = report.unmet.as_ref().expect("they disagree");
    let left = &unmet.left;
    assert_eq!(unmet.rank, Some(1));
    // Least squares of logarithms: both get the geometric mean.
    for target in &report.targets {
        close(target.found, (500.0_f64 * 700.0).sqrt(), 1e-3);
    }
    // Each alone sets the other as well: there is one tension in a straight rope.
    assert_eq!(unmet.fights.len(), 1);
    let fight = unmet.fights[0];
    for side in 0..2 {
        let wanted = report.targets[fight.targets[side]].wanted;
        close(fight.alone[side], wanted, 1e-6);
        close(fight.left_out[1 - side], wanted, 1e-6);
    }
    assert_eq!(left[0].node, "m");
    close(left[0].force.norm(), 200.0, 1e-3);
    assert_eq!(left[0].towards.as_deref(), Some("b"));
}

#[test]
fn a_mast_with_guys_in_its_own_plane_is_not_held() {
    let mut sketch = Sketch::default();
    sketch.held("foot", [0.0, 0.0, 0.0]);
    sketch.held("w", [-4.0, 0.0, 0.0]);
    sketch.held("e", [4.0, 0.0, 0.0]);
    sketch.node("head", [0.0, 0.0, 5.0]);
    sketch.cable("gw", section(1e6, 0.0), "head w");
    sketch.cable("ge", section(1e6, 0.0), "head e");
    sketch.strut("mast", section(50e6, 0.0), "foot", "head");
    let net = Arc::new(sketch.net());
    let prestress = Prestress {
        rules: vec![
            PrestressRule::Tension(9000.0),
            PrestressRule::Balance,
            PrestressRule::Balance,
        ],
        hold: vec![node(&net, "head")],
        ..all(&net, PrestressRule::Balance)
    };
    let text = message(shape(&net, &prestress, vec![]));
    assert!(text.starts_with("nothing holds \"head\" along (0.00, "), "{text}");
    assert!(text.contains("\"gw\", \"ge\", \"mast\""), "{text}");
}

/// Equal tension in every segment of a clamped edge: its nodes creep along it until two of them meet.
#[test]
fn nodes_that_creep_together_are_told() {
    let net = Arc::new(crate::test_nets::courtyard().net());
    let mut prestress = crate::test_nets::courtyard_prestress(&net);
    for segment in crate::test_nets::segments(&net, &["eSW", "eSE", "eNE", "eNW"]) {
        prestress.rules[segment] = PrestressRule::Tension(35e3);
    }
    let text = message(shape(&net, &prestress, vec![own_weight()]));
    assert!(text.contains("give it one mean tension"), "{text}");
}

#[test]
fn an_observer_may_stop_the_search() {
    let net = Arc::new(rope().net());
    let analysis = Analysis::new(Arc::clone(&net));
    let prestress = all(&net, PrestressRule::ForceDensity(10.0));
    let outcome = find(&analysis, &prestress, &[], &Settings::default(), &mut |_| {
        ControlFlow::Break(())
    });
    assert_eq!(outcome.expect_err("stopped"), ShapeError::Cancelled);
}

/// Lengths of very stiff ropes hold few digits of their force: the shape is corrected, or the stiffness refused.
#[test]
fn stiffness_beyond_reckoning() {
    let shaped = |stiffness| {
        let mut sketch = rope();
        sketch.given.cables[0].sections = vec![section(stiffness, 0.0); 2];
        let net = Arc::new(sketch.net());
        let load = down(node(&net, "m"), 500.0);
        shape(&net, &all(&net, PrestressRule::ForceDensity(1000.0)), vec![load])
    };
    let stiff = shaped(1e13).expect("a shape").report;
    assert!(
        stiff.polished && stiff.imbalance <= 1e-8 * stiff.largest_force,
        "{stiff:?}"
    );
    for stiffness in [1e18, 1e300] {
        let text = message(shaped(stiffness));
        assert!(text.contains("axial stiffness of \"rope\""), "{text}");
    }
}

#[test]
fn numbers_beyond_all_bounds_are_told() {
    let net = Arc::new(rope().net());
    let prestress = all(&net, PrestressRule::ForceDensity(1e-300));
    let outcome = shape(&net, &prestress, vec![down(node(&net, "m"), 1e300)]);
    assert!(outcome.is_err(), "{outcome:?}");
}
