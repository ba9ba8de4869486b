//! Derivatives by force densities against central differences.

use super::*;
use crate::shape::loads::ShapeLoads;
use crate::shape::parts::Parts;
use crate::shape::search::Search;
use crate::test_nets::{Sketch, node, section};

/// A skew net with weight, plan loads, a rope of given length, a spring, a strut and three families.
fn net() -> Sketch {
    let mut sketch = Sketch::default();
    sketch.held("A", [0.0, 0.0, 3.0]);
    sketch.held("B", [9.0, 1.0, 0.0]);
    sketch.sprung("C", [8.0, 9.0, 3.5], [4e4, 2e4, 3e4]);
    sketch.held("D", [0.0, 9.0, 0.5]);
    sketch.held("Z", [4.0, 4.0, -2.0]);
    sketch.cable("one", section(2e5, 9.0), "A p q C");
    sketch.cable("two", section(3e5, 7.0), "B q r D");
    sketch.cable("three", section(3e5, 7.0), "p r");
    sketch.cable("tie", section(3e4, 1.0), "q Z");
    sketch.strut("post", section(1e6, 3.0), "p", "r");
    sketch
}

#[test]
fn mean_tensions_by_force_densities() {
    let net = Arc::new(net().net());
    let mut rules = vec![PrestressRule::MeanTension(0); 3];
    rules.extend([PrestressRule::MeanTension(1); 3]);
    rules.push(PrestressRule::Tension(1.0));
    rules.push(PrestressRule::UnstressedLength(3.0));
    rules.push(PrestressRule::ForceDensity(-60.0));
    let prestress = Prestress {
        rules,
        mean_tensions: vec![3000.0, 4000.0],
        ..all(&net, PrestressRule::Balance)
    };
    let plan = Load::PerPlanLength {
        scope: crate::load::Scope::All,
        force: Vector3::new(5.0, 0.0, -40.0),
    };
    let action = Action {
        name: "self".to_owned(),
        loads: vec![own_weight(), plan, down(node(&net, "p"), 700.0)],
    };
    let parts = Parts::new(&net, &prestress).expect("good rules");
    let loads = ShapeLoads::new(&net, &[action], &[0]).expect("dead loads");
    let analysis = Analysis::new(Arc::clone(&net));
    let mut observe = |_: &crate::equilibrium::IterationReport| ControlFlow::Continue(());
    let mut search = Search::new(&analysis, &parts, &loads, &mut observe);
    let densities = [900.0, 1100.0, 250.0];
    let start = vec![Vector3::new(4.0, 4.0, 1.0); net.nodes().len()];
    let start = net
        .nodes()
        .iter()
        .zip(start)
        .map(|(n, s)| n.position.unwrap_or(s))
        .collect();
    let point = search.balanced(start, &densities).expect("a balanced shape");
    assert!(point.axial_forces[7] > 0.0, "the tie is taut");
    let jacobian = search.jacobian(&point, &densities).expect("not singular");
    let h = 1e-4;
    for column in 0..3 {
        let means = |search: &mut Search<'_, '_>, t: f64| {
            let mut moved = densities;
            moved[column] *= (t * h).exp();
            let point = search
                .balanced(point.positions.clone(), &moved)
                .expect("a balanced shape");
            search.means(&point).iter().map(|m| m.ln()).collect::<Vec<f64>>()
        };
        let [far, near, back, rear] = [2.0, 1.0, -1.0, -2.0].map(|t| means(&mut search, t));
        for row in 0..3 {
            let slope = (8.0 * (near[row] - back[row]) - (far[row] - rear[row])) / (12.0 * h);
            close(jacobian[(row, column)], slope, 1e-8);
        }
    }
}
