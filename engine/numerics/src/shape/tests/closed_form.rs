//! One closed form for each rule.

use super::*;
use crate::test_nets::{Sketch, node, section, segments};

/// Two ropes that cross at `m`, between two high and two low points 9 m apart.
fn crossing() -> Sketch {
    let mut sketch = Sketch::default();
    for (name, position) in [
        ("A", [0.0, 0.0, 3.0]),
        ("B", [9.0, 0.0, 0.0]),
        ("C", [9.0, 9.0, 3.0]),
        ("D", [0.0, 9.0, 0.0]),
    ] {
        sketch.held(name, position);
    }
    sketch.cable("carrying", section(6.5e6, 0.0), "A m C");
    sketch.cable("bracing", section(6.5e6, 0.0), "B m D");
    sketch
}

#[test]
fn force_densities_put_the_crossing_in_the_middle() {
    let net = Arc::new(crossing().net());
    let found = shape(&net, &all(&net, PrestressRule::ForceDensity(3000.0)), vec![]).expect("a shape");
    let m = found.state.positions[node(&net, "m").index()];
    assert!((m - Vector3::new(4.5, 4.5, 1.5)).norm() < 1e-13);
    // N = q l and L0 = l / (1 + N/EA), l the distance from the middle to a corner.
    let length = (2.0 * 4.5_f64.powi(2) + 1.5_f64.powi(2)).sqrt();
    let tension = 3000.0 * length;
    for (force, unstressed) in found.state.axial_forces.iter().zip(&found.state.unstressed_lengths) {
        close(*force, tension, 1e-10 * tension);
        close(*unstressed, length / (1.0 + tension / 6.5e6), 1e-13);
    }
    assert!(found.report.imbalance <= 1e-12 * tension && !found.report.polished);
}

#[test]
fn a_tension_in_every_segment() {
    let net = Arc::new(crossing().net());
    let found = shape(&net, &all(&net, PrestressRule::Tension(12_345.0)), vec![]).expect("a shape");
    let m = found.state.positions[node(&net, "m").index()];
    assert!((m - Vector3::new(4.5, 4.5, 1.5)).norm() < 1e-10);
    for force in &found.state.axial_forces {
        close(*force, 12_345.0, 1e-10 * 12_345.0);
    }
    assert!(
        found
            .report
            .targets
            .iter()
            .all(|t| t.met && t.quantity == Quantity::Tension)
    );
}

/// The length of minimal weight: equal tensions meet at the point where unit vectors cancel (Fermat's point).
#[test]
fn equal_tensions_meet_at_equal_angles() {
    let mut sketch = Sketch::default();
    sketch.held("a", [0.0, 0.0, 0.0]);
    sketch.held("b", [4.0, 0.0, 0.0]);
    sketch.held("c", [1.0, 3.0, 0.0]);
    for anchor in ["a", "b", "c"] {
        sketch.cable(anchor, section(1e6, 0.0), &format!("{anchor} m"));
    }
    let net = Arc::new(sketch.net());
    let found = shape(&net, &all(&net, PrestressRule::Tension(500.0)), vec![]).expect("a shape");
    let m = found.state.positions[node(&net, "m").index()];
    let unit = |name: &str| (found.state.positions[node(&net, name).index()] - m).normalize();
    for pair in [("a", "b"), ("b", "c"), ("c", "a")] {
        close(unit(pair.0).dot(&unit(pair.1)), -0.5, 1e-10);
    }
}

#[test]
fn a_mean_tension_with_one_force_density() {
    // A rope A m n B on a line with a pull q beside: m and n are placed by loads along the rope.
    let mut sketch = Sketch::default();
    sketch.held("A", [0.0, 0.0, 0.0]);
    sketch.held("B", [9.0, 0.0, 0.0]);
    sketch.cable("rope", section(1e6, 0.0), "A m n B");
    let net = Arc::new(sketch.net());
    let prestress = Prestress {
        mean_tensions: vec![600.0],
        ..all(&net, PrestressRule::MeanTension(0))
    };
    // One density along the rope: lengths l1, l2, l3 with q (l2 − l1) = −P at m, so the mean of q l is q 9/3.
    let load = Load::Nodes {
        nodes: vec![node(&net, "m")],
        force: Vector3::new(100.0, 0.0, 0.0),
    };
    let found = shape(&net, &prestress, vec![load]).expect("a shape");
    let q = 600.0 / 3.0;
    // q (l2 − l1) = −100, q (l3 − l2) = 0, l1 + l2 + l3 = 9.
    let l2 = (9.0 - 100.0 / q) / 3.0;
    for (force, length) in found.state.axial_forces.iter().zip([l2 + 100.0 / q, l2, l2]) {
        close(*force, q * length, 1e-9);
    }
    assert!(found.report.targets[0].met && found.report.targets[0].quantity == Quantity::MeanTension);
}

/// On a vertical line: `q (10 − z) = EA (z/L0 − 1)` between a force density above and a rope of given length below.
#[test]
fn a_rope_of_given_length_takes_part_in_the_search() {
    let mut sketch = Sketch::default();
    sketch.held("top", [0.0, 0.0, 10.0]);
    sketch.held("bottom", [0.0, 0.0, 0.0]);
    sketch.cable("upper", section(1e6, 0.0), "top m");
    sketch.cable("lower", section(5000.0, 0.0), "m bottom");
    let net = Arc::new(sketch.net());
    let rules = |l0| Prestress {
        rules: vec![PrestressRule::ForceDensity(1000.0), PrestressRule::UnstressedLength(l0)],
        ..all(&net, PrestressRule::Balance)
    };
    let m = node(&net, "m");
    let taut = shape(&net, &rules(4.0), vec![]).expect("a shape");
    close(taut.state.positions[m.index()].z, 15_000.0 / 2250.0, 1e-12);
    close(taut.state.unstressed_lengths[1], 4.0, 0.0);
    assert_eq!(taut.report.taut_given_lengths.len(), 1);
    let slack = shape(&net, &rules(12.0), vec![down(m, 2000.0)]).expect("a shape");
    close(slack.state.positions[m.index()].z, 8.0, 1e-12);
    assert_eq!(slack.state.axial_forces[1], 0.0);
    assert!(slack.report.taut_given_lengths.is_empty());
}

/// A mast head held at rest by a guy and a mast against a level pull: forces from two equations.
#[test]
fn guy_and_mast_hold_their_head() {
    let mut sketch = Sketch::default();
    sketch.held("anchor", [-4.0, 0.0, 0.0]);
    sketch.held("foot", [0.0, 0.0, 0.0]);
    sketch.node("head", [0.0, 0.0, 3.0]);
    sketch.held("wall", [6.0, 0.0, 3.0]);
    sketch.cable("rope", section(1e6, 0.0), "head wall");
    sketch.cable("guy", section(2e6, 0.0), "head anchor");
    sketch.strut("mast", section(50e6, 0.0), "foot", "head");
    let net = Arc::new(sketch.net());
    let prestress = Prestress {
        rules: vec![
            PrestressRule::Tension(8000.0),
            PrestressRule::Balance,
            PrestressRule::Balance,
        ],
        hold: vec![node(&net, "head")],
        ..all(&net, PrestressRule::Balance)
    };
    let found = shape(&net, &prestress, vec![down(node(&net, "head"), 500.0)]).expect("a shape");
    // Level: guy 4/5 = 8000; down: mast = guy 3/5 + 500.
    close(found.state.axial_forces[1], 10_000.0, 1e-8);
    close(found.state.axial_forces[2], -6500.0, 1e-8);
    let balance = found.report.balance.expect("two members were left to balance");
    assert!(balance.unique && balance.rank == 2);
    close(found.state.unstressed_lengths[1], 5.0 / (1.0 + 10_000.0 / 2e6), 1e-13);
    close(found.state.unstressed_lengths[2], 3.0 / (1.0 - 6500.0 / 50e6), 1e-13);
}

#[test]
fn of_many_balancing_forces_the_least_are_taken() {
    let mut sketch = Sketch::default();
    for (name, x) in [("a", -3.0), ("b", -6.0), ("wall", 5.0)] {
        sketch.held(name, [x, 0.0, 0.0]);
    }
    sketch.node("h", [0.0, 0.0, 0.0]);
    sketch.cable("rope", section(1e6, 0.0), "h wall");
    sketch.cable("one", section(1e6, 0.0), "h a");
    sketch.cable("two", section(1e6, 0.0), "h b");
    // Nothing acts across the line: the rest of the balance at h is met by itself.
    let net = Arc::new(sketch.net());
    let prestress = Prestress {
        rules: vec![
            PrestressRule::ForceDensity(100.0),
            PrestressRule::Balance,
            PrestressRule::Balance,
        ],
        hold: vec![node(&net, "h")],
        ..all(&net, PrestressRule::Balance)
    };
    let found = shape(&net, &prestress, vec![]).expect("a shape");
    close(found.state.axial_forces[1], 250.0, 1e-10);
    close(found.state.axial_forces[2], 250.0, 1e-10);
    let balance = found.report.balance.expect("two members were left to balance");
    assert!(!balance.unique && balance.rank == 1);
}

/// Four level guys at a head, 60 degrees apart, of which the forces of least square sum have one push: others balance as
/// well, in which none does.
#[test]
fn of_many_balancing_forces_some_in_which_no_rope_pushes_are_taken() {
    let mut sketch = Sketch::default();
    sketch.node("h", [0.0, 0.0, 0.0]);
    let at = |degrees: f64| [4.0 * degrees.to_radians().cos(), 4.0 * degrees.to_radians().sin(), 0.0];
    sketch.held("wall", at(180.0));
    sketch.cable("rope", section(1e6, 0.0), "h wall");
    for (name, degrees) in [("g1", 10.0), ("g2", -20.0), ("g3", 160.0), ("up", 90.0)] {
        sketch.held(name, at(degrees));
        sketch.cable(name, section(1e6, 0.0), &format!("h {name}"));
    }
    let net = Arc::new(sketch.net());
    let mut prestress = all(&net, PrestressRule::Balance);
    prestress.rules[0] = PrestressRule::Tension(1000.0);
    prestress.hold = vec![node(&net, "h")];
    let found = shape(&net, &prestress, vec![]).expect("a shape");
    let forces = &found.state.axial_forces;
    assert!(forces.iter().all(|n| *n >= 0.0), "{forces:?}");
    let sum: Vector3<f64> = (0..5)
        .map(|e| {
            let [_, j] = net.segments()[e].ends;
            found.state.positions[j.index()].normalize() * forces[e]
        })
        .sum();
    assert!(sum.norm() < 1e-7, "{sum}");
    let balance = found.report.balance.expect("a report");
    assert!(!balance.unique && balance.residual < 1e-7);
}

/// An elastic support at rest where it was given gives way: on a line `q (x_m) …` is two springs in a row.
#[test]
fn an_elastic_support_gives_way() {
    let mut sketch = Sketch::default();
    sketch.held("wall", [10.0, 0.0, 0.0]);
    sketch.sprung("s", [0.0, 0.0, 0.0], [4000.0, 0.0, 0.0]);
    sketch.cable("rope", section(1e6, 0.0), "s wall");
    let net = Arc::new(sketch.net());
    let found = shape(&net, &all(&net, PrestressRule::ForceDensity(1000.0)), vec![]).expect("a shape");
    // 1000 (10 − x) = 4000 x
    close(found.state.positions[1].x, 2.0, 1e-13);
    assert_eq!(found.state.positions[1].yz().norm(), 0.0);
    close(found.state.axial_forces[0], 8000.0, 1e-9);
}

/// A mast on a sprung foot: the force left to balance moves the foot, which moves what balances.
#[test]
fn a_member_left_to_balance_may_stand_on_a_spring() {
    let mut sketch = Sketch::default();
    sketch.sprung("foot", [0.0, 0.0, 0.0], [0.0, 0.0, 2e5]);
    sketch.node("head", [0.0, 0.0, 3.0]);
    sketch.held("wall", [4.0, 0.0, 0.0]);
    sketch.held("other", [-4.0, 0.0, 0.0]);
    sketch.cable("stay", section(1e7, 0.0), "wall head other");
    sketch.strut("mast", section(50e6, 0.0), "foot", "head");
    let net = Arc::new(sketch.net());
    let prestress = Prestress {
        rules: vec![
            PrestressRule::Tension(5000.0),
            PrestressRule::Tension(5000.0),
            PrestressRule::Balance,
        ],
        hold: vec![node(&net, "head")],
        ..all(&net, PrestressRule::Balance)
    };
    let found = shape(&net, &prestress, vec![]).expect("a shape");
    let foot = found.state.positions[node(&net, "foot").index()];
    close(found.state.axial_forces[2], -6000.0, 1e-8);
    close(foot.z, -6000.0 / 2e5, 1e-12);
    close(found.state.unstressed_lengths[2], 3.03 / (1.0 - 6000.0 / 50e6), 1e-12);
}

/// A node on an inclined slide takes the place at which the rope has no part along the slide.
#[test]
fn a_skew_slide_takes_part_in_the_search() {
    let mut sketch = Sketch::default();
    sketch.held("wall", [10.0, 0.0, 0.0]);
    sketch.held("s", [0.0, 0.0, 0.0]);
    let slide = sketch.id("s").index();
    sketch.given.nodes[slide].support = Some(crate::model::SupportGiven {
        released: vec![Vector3::new(1.0, 1.0, 0.0)],
    });
    sketch.cable("rope", section(1e6, 0.0), "s wall");
    let net = Arc::new(sketch.net());
    let found = shape(&net, &all(&net, PrestressRule::ForceDensity(700.0)), vec![]).expect("a shape");
    assert!((found.state.positions[1] - Vector3::new(5.0, 5.0, 0.0)).norm() < 1e-13);
}

/// A strut with a given compression in a self-stressed kite: the ropes at its ends give the force density.
#[test]
fn a_strut_may_be_given_its_compression() {
    let mut sketch = Sketch::default();
    sketch.held("left", [-3.0, 0.0, 0.0]);
    sketch.held("right", [3.0, 0.0, 0.0]);
    sketch.cable("upper", section(1e6, 0.0), "left top right");
    sketch.cable("lower", section(1e6, 0.0), "left bottom right");
    sketch.strut("post", section(1e7, 0.0), "bottom", "top");
    sketch.node("top", [0.0, 0.0, 0.9]);
    sketch.node("bottom", [0.0, 0.0, -0.9]);
    let net = Arc::new(sketch.net());
    // Out of the plane and across nothing but the ropes holds: any height balances q = −q_rope, so the strut is
    // given its compression, and a load opens the lens: 2 q z = −Q 2 z + P at the top.
    let (q, post) = (1000.0, -800.0);
    let mut rules = vec![PrestressRule::ForceDensity(q); 4];
    rules.push(PrestressRule::Tension(post));
    let prestress = Prestress {
        rules,
        ..all(&net, PrestressRule::Balance)
    };
    let apart = |node, force| Load::Nodes {
        nodes: vec![node],
        force: Vector3::new(0.0, 0.0, force),
    };
    let loads = vec![apart(node(&net, "top"), 600.0), apart(node(&net, "bottom"), -600.0)];
    let found = shape(&net, &prestress, loads).expect("a shape");
    let top = found.state.positions[node(&net, "top").index()];
    // 2 q z = P + 800
    close(top.z, (600.0 + 800.0) / (2.0 * q), 1e-10);
    close(found.state.axial_forces[4], post, 1e-7);
}

/// Weight follows the length found: `H z'' = w √(1 + z'²)` in the limit; here the nodal balance is looked at itself.
#[test]
fn own_weight_and_plan_loads_follow_the_shape() {
    let mut sketch = Sketch::default();
    sketch.held("a", [0.0, 0.0, 0.0]);
    sketch.held("b", [20.0, 0.0, 4.0]);
    sketch.cable("rope", section(3e5, 40.0), "a 1 2 3 4 5 b");
    let net = Arc::new(sketch.net());
    let plan = Load::PerPlanLength {
        scope: crate::load::Scope::All,
        force: Vector3::new(0.0, 30.0, -250.0),
    };
    let prestress = all(&net, PrestressRule::ForceDensity(900.0));
    let found = shape(&net, &prestress, vec![own_weight(), plan]).expect("a shape");
    let x = |n: usize| found.state.positions[node(&net, ["a", "1", "2", "3", "4", "5", "b"][n]).index()];
    let mut heavy: f64 = 0.0;
    for n in 1..6 {
        let mut sum = Vector3::zeros();
        for (from, to) in [(n, n - 1), (n, n + 1)] {
            let d = x(to) - x(from);
            let unstressed = d.norm() / (1.0 + 900.0 * d.norm() / 3e5);
            sum += 900.0 * d;
            sum += 0.5 * Vector3::new(0.0, 0.0, -40.0 * 9.80665 * unstressed);
            sum += 0.5 * Vector3::new(0.0, 30.0, -250.0) * d.xy().norm();
            heavy = heavy.max(d.norm() / d.xy().norm());
        }
        assert!(sum.norm() < 1e-9, "{sum}");
    }
    // The weight is not small beside the tension: the test is one of the coupling.
    assert!(heavy > 1.5 && segments(&net, &["rope"]).len() == 6);
}

/// Four bars to the corners and a ring: the inner nodes by symmetry (closed form: 6 (c − x) + 3 (neighbours) = 0).
#[test]
fn ring_of_force_densities() {
    let mut sketch = Sketch::default();
    let corners = [[0.0, 0.0, 3.0], [9.0, 0.0, 0.0], [9.0, 9.0, 3.0], [0.0, 9.0, 0.0]];
    for (k, corner) in corners.into_iter().enumerate() {
        sketch.held(&format!("c{k}"), corner);
        sketch.cable(&format!("arm{k}"), section(1e7, 0.0), &format!("c{k} i{k}"));
    }
    sketch.cable("ring", section(1e7, 0.0), "i0 i1 i2 i3 i0");
    let net = Arc::new(sketch.net());
    let mut rules = vec![PrestressRule::ForceDensity(6000.0); 4];
    rules.extend([PrestressRule::ForceDensity(3000.0); 4]);
    let prestress = Prestress {
        rules,
        ..all(&net, PrestressRule::Balance)
    };
    let found = shape(&net, &prestress, vec![]).expect("a shape");
    let wanted = [
        [2.25, 2.25, 2.0],
        [6.75, 2.25, 1.0],
        [6.75, 6.75, 2.0],
        [2.25, 6.75, 1.0],
    ];
    for (k, wanted) in wanted.into_iter().enumerate() {
        let found = found.state.positions[node(&net, &format!("i{k}")).index()];
        assert!((found - Vector3::from(wanted)).norm() < 1e-12);
    }
    close(found.state.axial_forces[0], 20_012.496, 5e-4);
    close(found.state.axial_forces[4], 13_829.317, 5e-4);
}
