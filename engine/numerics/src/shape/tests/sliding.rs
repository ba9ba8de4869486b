//! Ropes that slide: one tension in all segments of a reach, and one unstressed length.

use super::*;
use crate::model::Slide;
use crate::test_nets::{Sketch, node, section};

const LOAD: f64 = 1000.0;

/// A rope from `a` to a higher `b` that slides through the free node `m`.
fn rope() -> Sketch {
    let mut sketch = Sketch::default();
    sketch.held("a", [0.0, 0.0, 0.0]);
    sketch.held("b", [6.0, 0.0, 2.0]);
    sketch.cable("rope", section(1e6, 0.0), "a m b");
    sketch.given.cables[0].slides = vec![Slide {
        place: 1,
        friction: 0.0,
    }];
    sketch
}

/// Both sides make one angle with the horizontal, `T = q L / 2` with `L` the length of both, so that `L sin = P / q` and
/// `L cos = 6` (closed form).
#[test]
fn a_ring_on_a_rope() {
    let net = Arc::new(rope().net());
    let q = 200.0;
    let load = vec![down(node(&net, "m"), LOAD)];
    let found = shape(&net, &all(&net, PrestressRule::ForceDensity(q)), load).expect("a shape");
    let drop = LOAD / q;
    let length = drop.hypot(6.0);
    let below = 0.5 * (drop - 2.0);
    let m = found.state.positions[node(&net, "m").index()];
    close(m.z, -below, 1e-9);
    close(m.x, below / drop * 6.0, 1e-9);
    let tension = 0.5 * q * length;
    for force in &found.state.axial_forces {
        close(*force, tension, 1e-8 * tension);
    }
    assert_eq!(found.state.unstressed_lengths.len(), 1);
    close(found.state.unstressed_lengths[0], length / (1.0 + tension / 1e6), 1e-9);
    assert!(found.report.imbalance <= 1e-9 * tension);
}

/// Tensions wanted of it, in both wordings: `sin = P / (2 T)`.
#[test]
fn a_tension_in_a_rope_that_slides() {
    let net = Arc::new(rope().net());
    for rule in [PrestressRule::Tension(800.0), PrestressRule::MeanTension(0)] {
        let prestress = Prestress {
            mean_tensions: vec![800.0],
            ..all(&net, rule)
        };
        let found = shape(&net, &prestress, vec![down(node(&net, "m"), LOAD)]).expect("a shape");
        assert!(found.report.unmet.is_none() && found.report.targets.len() == 1);
        let sine = LOAD / 1600.0;
        let drop = 6.0 * sine / (1.0_f64 - sine * sine).sqrt();
        let m = found.state.positions[node(&net, "m").index()];
        close(m.z, -0.5 * (drop - 2.0), 1e-8);
    }
}

/// Given the length that the first shape has, a rope that slides comes to the same place, beside a rope by its density.
#[test]
fn a_given_length_in_a_rope_that_slides() {
    let mut sketch = rope();
    sketch.held("c", [3.0, 4.0, 0.0]);
    sketch.cable("stay", section(1e6, 0.0), "m c");
    let net = Arc::new(sketch.net());
    let load = || vec![down(node(&net, "m"), LOAD)];
    let densities = Prestress {
        rules: [200.0, 200.0, 50.0].map(PrestressRule::ForceDensity).to_vec(),
        ..Prestress::default()
    };
    let first = shape(&net, &densities, load()).expect("a shape");
    let mut lengths = densities.clone();
    let given = PrestressRule::UnstressedLength(first.state.unstressed_lengths[0]);
    (lengths.rules[0], lengths.rules[1]) = (given, given);
    let again = shape(&net, &lengths, load()).expect("a shape");
    for (a, b) in first.state.positions.iter().zip(&again.state.positions) {
        assert!((a - b).norm() < 1e-8, "{a} {b}");
    }
    assert_eq!(again.report.taut_given_lengths.len(), 2);
}

/// A mast head over which a rope runs to its anchor, held by what the head needs: one force for both sides.
#[test]
fn a_rope_left_to_balance_slides() {
    let mut sketch = Sketch::default();
    sketch.node("head", [0.0, 0.0, 4.0]);
    sketch.held("foot", [0.0, 0.0, 0.0]);
    sketch.held("east", [3.0, 0.0, 0.0]);
    sketch.held("west", [-3.0, 0.0, 0.0]);
    sketch.cable("over", section(1e6, 0.0), "east head west");
    sketch.given.cables[0].slides = vec![Slide {
        place: 1,
        friction: 0.0,
    }];
    for (name, place) in [
        ("g1", [2.0, 4.0, 0.0]),
        ("g2", [-2.0, 4.0, 0.0]),
        ("g3", [2.0, -4.0, 0.0]),
        ("g4", [-2.0, -4.0, 0.0]),
    ] {
        sketch.held(name, place);
        sketch.cable(name, section(1e6, 0.0), &format!("head {name}"));
    }
    sketch.strut("mast", section(5e7, 0.0), "foot", "head");
    let net = Arc::new(sketch.net());
    let mut prestress = all(&net, PrestressRule::Tension(5000.0));
    (prestress.rules[0], prestress.rules[1]) = (PrestressRule::Balance, PrestressRule::Balance);
    prestress.rules[6] = PrestressRule::Tension(-20_000.0);
    prestress.hold = vec![node(&net, "head")];
    let found = shape(&net, &prestress, vec![]).expect("a shape");
    let balance = found.report.balance.expect("a report");
    assert_eq!((balance.segments.len(), balance.rank, balance.unique), (2, 1, true));
    // Down: four guys with 5 kN · 4/6 and twice the rope's 4/5 make the 20 kN of the mast.
    let expected = (20_000.0 - 4.0 * 5000.0 * 4.0 / 6.0) / 1.6;
    close(found.state.axial_forces[0], expected, 1e-6 * expected);
    close(found.state.axial_forces[1], expected, 1e-6 * expected);
}

#[test]
fn a_rule_must_not_change_where_a_rope_slides() {
    let net = Arc::new(rope().net());
    for pair in [
        [PrestressRule::ForceDensity(100.0), PrestressRule::ForceDensity(200.0)],
        [PrestressRule::Tension(100.0), PrestressRule::Tension(200.0)],
        [PrestressRule::ForceDensity(100.0), PrestressRule::UnstressedLength(3.0)],
    ] {
        let prestress = Prestress {
            rules: pair.to_vec(),
            ..Prestress::default()
        };
        let text = shape(&net, &prestress, vec![]).expect_err("two rules").to_string();
        assert!(text.contains("\"rope\" slides through \"m\""), "{text}");
    }
}
