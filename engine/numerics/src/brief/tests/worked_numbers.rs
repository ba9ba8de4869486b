//! Numbers worked out before, by other means.

use super::*;
use crate::test_nets::{courtyard, courtyard_prestress, segments};

fn crossing_brief() -> Brief {
    let net = crossing().net();
    let m = node(&net, "m");
    let prestress = densities(&net, 3000.0);
    let snow = action("snow", vec![force(&[m], [0.0, 0.0, -5000.0])]);
    brief(net, prestress, vec![snow], vec![case("full-snow", &[(0, 1.0)])])
}

/// Worked numbers of the minimal brief (an independent Newton solve, four digits).
#[test]
fn crossing_ropes_under_snow() {
    let plan = Plan::new(crossing_brief());
    let net = &plan.brief().net;
    let m = node(net, "m");
    let reference = plan.reference(&mut run_on).expect("a reference state");
    assert!((reference.state.positions[m.index()] - Vector3::new(4.5, 4.5, 1.5)).norm() < 1e-12);
    for force in &reference.state.axial_forces {
        close(*force, 19.615e3, 0.5);
    }
    for length in &reference.state.unstressed_lengths {
        close(*length, 6.518677, 5e-7);
    }
    let snow = state(plan.case(&reference, 0, &mut run_on));
    close(snow.displacements[m.index()].z, -22.59e-3, 5e-6);
    close(snow.axial_forces[0], 24.820e3, 0.5);
    close(snow.axial_forces[2], 14.484e3, 0.5);
    assert!(snow.audit.passed && snow.loose_nodes.is_empty());
    // Supports bear what is put on, and each end pulls its anchor as its rope says.
    assert!((snow.load_sum + snow.support_sum).norm() < 1e-6);
    for end in &snow.end_forces {
        let support = snow
            .support_forces
            .iter()
            .find(|s| s.node == end.node)
            .expect("a support");
        assert!((support.force + end.force).norm() < 1e-9);
    }
}

/// Heating by 35 K. Orientation numbers of an independent solve with the skin's weight: carrying 8.6 to 18.6 kN, edges 45.4
/// to 53.2, guys 87.6 to 88.0, masts −152.6, largest movement 6 mm. The skin is left out here.
#[test]
fn courtyard_canopy_when_hot() {
    let net = courtyard().net();
    let prestress = courtyard_prestress(&net);
    let hot = Load::Temperature {
        scope: crate::load::Scope::All,
        change: 35.0,
    };
    let weak = Load::PrestressShare {
        scope: crate::load::Scope::All,
        share: -0.10,
    };
    let actions = vec![
        action("self", vec![own_weight()]),
        action("hot", vec![hot]),
        action("weak", vec![weak]),
    ];
    let cases = vec![
        case("still", &[(0, 1.0)]),
        case("hot", &[(0, 1.0), (1, 1.0)]),
        case("weak", &[(0, 1.0), (2, 1.0)]),
    ];
    let plan = Plan::new(brief(net, prestress, actions, cases));
    let net = &plan.brief().net;
    let reference = plan.reference(&mut run_on).expect("a reference state");
    // The case that repeats the reference loads is the reference state.
    let still = state(plan.case(&reference, 0, &mut run_on));
    for (a, b) in still.axial_forces.iter().zip(&reference.state.axial_forces) {
        close(*a, *b, 1e-9 * reference.report.largest_force);
    }
    let hot = state(plan.case(&reference, 1, &mut run_on));
    let range = |state: &StateResult, names: &[&str]| {
        let forces = segments(net, names).into_iter().map(|e| state.axial_forces[e] / 1e3);
        forces.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), n| {
            (low.min(n), high.max(n))
        })
    };
    for (names, low, high, tolerance) in [
        (&["c1", "c2", "c3"][..], 8.6, 18.6, 0.15),
        (&["eSW", "eSE", "eNE", "eNW"], 45.4, 53.2, 0.15),
        (&["gW1", "gE1"], 87.6, 88.0, 0.4),
        (&["mW", "mE"], -152.6, -152.6, 0.8),
    ] {
        let found = range(&hot, names);
        close(found.0, low, tolerance);
        close(found.1, high, tolerance);
    }
    let largest = hot.displacements.iter().map(|d| d.norm()).fold(0.0, f64::max);
    close(largest, 6e-3, 1e-3);
    // Between the bracket and the winch both ends are held: the rope there loses EA α ΔT and no more.
    let fixed = segments(net, &["b2"])[4];
    let stress_free = reference.state.unstressed_lengths[fixed] * (1.0 + 12e-6 * 35.0);
    close(hot.axial_forces[fixed], 8.9e6 * (2.0 / stress_free - 1.0), 1e-6);
    let weak = state(plan.case(&reference, 2, &mut run_on));
    assert!(range(&weak, &["eSW"]).1 < range(&reference.result, &["eSW"]).1);
}
