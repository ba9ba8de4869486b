//! What holds for any net of force densities.

use proptest::prelude::*;

use super::*;
use crate::equilibrium::audit::audit;
use crate::test_nets::{Sketch, section};

/// Free nodes hung to earlier ones at random, and some more ropes: always held, seldom pretty.
#[derive(Clone, Debug)]
struct Tangle {
    anchors: Vec<[f64; 3]>,
    /// For each free node: what it hangs on, and the load on it (N).
    nodes: Vec<(usize, [f64; 3])>,
    ropes: Vec<(usize, usize)>,
    /// Tenth powers of force density (N/m), of stiffness (N) and of weight per length over force density, by rope in turn.
    /// A rope that weighs more than twice its force density sags without end, so the last are small.
    sections: Vec<(f64, f64, f64)>,
}

fn tangle() -> impl Strategy<Value = Tangle> {
    let place = || prop::array::uniform3(-10.0..10.0);
    let anchors = prop::collection::vec(place(), 2..6);
    let nodes = prop::collection::vec((any::<usize>(), prop::array::uniform3(-500.0..500.0)), 1..25);
    let ropes = prop::collection::vec((any::<usize>(), any::<usize>()), 0..20);
    let sections = prop::collection::vec((1.0..4.0, 5.0..8.0, -4.0..-0.5), 1..9);
    (anchors, nodes, ropes, sections).prop_map(|(anchors, nodes, ropes, sections)| Tangle {
        anchors,
        nodes,
        ropes,
        sections,
    })
}

/// The net with lengths times `a` and forces times `b`, its rules, and its loads.
fn scaled(tangle: &Tangle, a: f64, b: f64) -> (Arc<Net>, Prestress, Vec<Load>) {
    let mut sketch = Sketch::default();
    let name = |n: usize| format!("n{n}");
    for (index, anchor) in tangle.anchors.iter().enumerate() {
        sketch.held(&name(index), anchor.map(|c| a * c));
    }
    let first = tangle.anchors.len();
    let all_nodes = first + tangle.nodes.len();
    let hung = tangle
        .nodes
        .iter()
        .enumerate()
        .map(|(k, (on, _))| (first + k, on % (first + k)));
    let more = tangle.ropes.iter().map(|(i, j)| (i % all_nodes, j % all_nodes));
    let mut rules = Vec::new();
    for (rope, (i, j)) in hung.chain(more.filter(|(i, j)| i != j)).enumerate() {
        let (q, ea, m) = tangle.sections[rope % tangle.sections.len()];
        let rope_section = section(b * 10_f64.powf(ea), b / a * 10_f64.powf(q + m) / 9.80665);
        sketch.cable(&format!("r{rope}"), rope_section, &format!("{} {}", name(i), name(j)));
        rules.push(PrestressRule::ForceDensity(b / a * 10_f64.powf(q)));
    }
    let net = Arc::new(sketch.net());
    let mut loads = vec![own_weight()];
    loads.extend(tangle.nodes.iter().enumerate().map(|(k, (_, force))| Load::Nodes {
        nodes: vec![NodeId::new(first + k)],
        force: b * Vector3::from(*force),
    }));
    let prestress = Prestress {
        rules,
        ..all(&net, PrestressRule::Balance)
    };
    (net, prestress, loads)
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 200, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn every_tangle_balances(tangle in tangle()) {
        let (net, prestress, loads) = scaled(&tangle, 1.0, 1.0);
        let found = shape(&net, &prestress, loads).expect("a held net has a shape");
        let audit = audit(&net, &found.case, &found.state.positions, &found.state.axial_forces);
        prop_assert!(audit.passed, "{audit:?}");
        prop_assert!((audit.load_sum + audit.support_sum).norm() <= 100.0 * audit.allowed);
        let largest = found.report.largest_force;
        for ((force, rule), segment) in found.state.axial_forces.iter().zip(&prestress.rules).zip(net.segments()) {
            let PrestressRule::ForceDensity(q) = rule else { unreachable!("all rules are densities") };
            let [i, j] = segment.ends.map(NodeId::index);
            let length = (found.state.positions[j] - found.state.positions[i]).norm();
            prop_assert!((force - q * length).abs() <= 1e-8 * largest);
        }
    }

    /// A slip of units inside would show here: lengths times a, forces times b.
    #[test]
    fn a_larger_or_stronger_net_has_the_same_shape(tangle in tangle(), a in 0.01..100.0, b in 1e-3..1e3) {
        let (net, prestress, loads) = scaled(&tangle, 1.0, 1.0);
        let (big_net, big_prestress, big_loads) = scaled(&tangle, a, b);
        let found = shape(&net, &prestress, loads).expect("a held net has a shape");
        let big = shape(&big_net, &big_prestress, big_loads).expect("a held net has a shape");
        let size = found.state.positions.iter().fold(1.0, |m: f64, x| m.max(x.norm()));
        for (x, y) in found.state.positions.iter().zip(&big.state.positions) {
            prop_assert!((y / a - x).norm() <= 1e-8 * size);
        }
        for (x, y) in found.state.axial_forces.iter().zip(&big.state.axial_forces) {
            prop_assert!((y / b - x).abs() <= 1e-8 * found.report.largest_force);
        }
    }

    /// With elastic members the search is one of a convex energy: it must end, in balance.
    #[test]
    fn ropes_of_given_length_take_part(tangle in tangle(), lengths in prop::collection::vec(0.2..12.0_f64, 1..6)) {
        let (net, mut prestress, mut loads) = scaled(&tangle, 1.0, 1.0);
        // Weight that grows with the shape has no energy; it is tried above.
        loads.remove(0);
        let first_more = tangle.nodes.len();
        for (k, rule) in prestress.rules.iter_mut().enumerate() {
            if k % 3 == 1 || k >= first_more {
                *rule = PrestressRule::UnstressedLength(lengths[k % lengths.len()]);
            }
        }
        match shape(&net, &prestress, loads) {
            Ok(found) => {
                let audit = audit(&net, &found.case, &found.state.positions, &found.state.axial_forces);
                prop_assert!(audit.passed, "{audit:?}");
            }
            Err(ShapeError::Loose { .. }) => {}
            Err(error) => prop_assert!(false, "{error}"),
        }
    }
}
