//! Saddle nets of some size.

use super::*;
use crate::test_nets::{Sketch, section};

/// A saddle of `n` free nodes a side over a square of 12 m, its rim held; cables along x, then along y.
fn saddle(n: u32, mass: f64) -> Sketch {
    let mut sketch = Sketch::default();
    let name = |i: u32, j: u32| format!("{i},{j}");
    let at = |k: u32| 12.0 * f64::from(k) / f64::from(n + 1);
    for i in 0..=n + 1 {
        for j in 0..=n + 1 {
            let rim = |k| k == 0 || k == n + 1;
            if rim(i) != rim(j) {
                let (u, w) = (at(i) / 6.0 - 1.0, at(j) / 6.0 - 1.0);
                sketch.held(&name(i, j), [at(i), at(j), 1.2 * (u * u - w * w)]);
            }
        }
    }
    for j in 1..=n {
        let path: Vec<String> = (0..=n + 1).map(|i| name(i, j)).collect();
        sketch.cable(&format!("x{j}"), section(4e6, mass), &path.join(" "));
    }
    for i in 1..=n {
        let path: Vec<String> = (0..=n + 1).map(|j| name(i, j)).collect();
        sketch.cable(&format!("y{i}"), section(4e6, mass), &path.join(" "));
    }
    sketch
}

/// Equal tension along each rope, another one across: nodes find the places where the directions cancel.
#[test]
fn a_net_of_constant_tensions() {
    constant_tensions(6);
}

/// More unknowns than their derivatives are formed for: least squares by products.
#[test]
fn a_net_of_many_constant_tensions() {
    constant_tensions(15);
}

fn constant_tensions(n: u32) {
    let net = Arc::new(saddle(n, 0.0).net());
    let half = net.segments().len() / 2;
    let wanted = |e: usize| if e < half { 10e3 } else { 12e3 };
    let prestress = Prestress {
        rules: (0..net.segments().len())
            .map(|e| PrestressRule::Tension(wanted(e)))
            .collect(),
        ..all(&net, PrestressRule::Balance)
    };
    let found = shape(&net, &prestress, vec![]).expect("a shape");
    let mut sums = vec![Vector3::zeros(); net.nodes().len()];
    for (e, segment) in net.segments().iter().enumerate() {
        close(found.state.axial_forces[e], wanted(e), 1e-10 * wanted(e));
        let [i, j] = segment.ends.map(NodeId::index);
        let n = (found.state.positions[j] - found.state.positions[i]).normalize();
        sums[i] += n * wanted(e);
        sums[j] -= n * wanted(e);
    }
    // Of all shapes this one has the least tension times length: its gradient vanishes.
    for (sum, node) in sums.iter().zip(net.nodes()) {
        assert!(node.position.is_some() || sum.norm() < 1e-5, "{sum} at {}", node.name);
    }
}

/// The force density of every segment free, and all free nodes wanted on a surface: met where it is in reach, by many
/// unknowns under few equations.
#[test]
fn a_net_fitted_to_a_surface() {
    let net = Arc::new(saddle(15, 2.0).net());
    let hypar = |x: f64, y: f64| 1.1 * ((x / 6.0 - 1.0).powi(2) - (y / 6.0 - 1.0).powi(2));
    let points = (0..81)
        .map(|k| {
            let (x, y) = (1.5 * f64::from(k % 9), 1.5 * f64::from(k / 9));
            Vector3::new(x, y, hypar(x, y))
        })
        .collect();
    let n = net.segments().len();
    let nodes: Vec<NodeId> = (0..net.nodes().len())
        .filter(|k| net.nodes()[*k].position.is_none())
        .map(NodeId::new)
        .step_by(7)
        .collect();
    let prestress = Prestress {
        rules: (0..n).map(PrestressRule::Adjustable).collect(),
        adjustables: vec![
            Adjustable {
                density: 8e3,
                least: 0.0,
                most: f64::INFINITY,
            };
            n
        ],
        targets: vec![ShapeTarget {
            name: "form".to_owned(),
            wish: Wish::Surface {
                nodes: nodes.clone(),
                points,
            },
            weight: 1.0,
        }],
        ..Prestress::default()
    };
    let found = shape(&net, &prestress, vec![own_weight()]).expect("a shape");
    assert_eq!(found.report.unmet_in_words(), None);
    for node in nodes {
        let x = found.state.positions[node.index()];
        close(x.z, hypar(x.x, x.y), 1e-8);
    }
    assert!(found.state.axial_forces.iter().all(|n| *n > 0.0));
}

/// Finds the shape of a saddle with a wanted mean tension in each rope.
fn with_mean_tensions(n: u32, mass: f64, weight: Vec<Load>) -> Found {
    let net = Arc::new(saddle(n, mass).net());
    let mut prestress = Prestress {
        mean_tensions: (0..net.cables().len()).map(|c| 8e3 + 500.0 * c as f64).collect(),
        ..all(&net, PrestressRule::Balance)
    };
    for (index, cable) in net.cables().iter().enumerate() {
        for segment in cable.segments.clone() {
            prestress.rules[segment] = PrestressRule::MeanTension(index);
        }
    }
    let found = shape(&net, &prestress, weight).expect("a shape");
    for (target, wanted) in found.report.targets.iter().zip(&prestress.mean_tensions) {
        close(target.found, *wanted, 1e-10 * wanted);
    }
    assert!(found.report.imbalance <= 1e-9 * found.report.largest_force);
    found
}

/// The end of the search is quadratic: few factorisations for a dozen wanted tensions under own weight.
#[test]
fn mean_tensions_of_many_ropes_take_few_iterations() {
    let found = with_mean_tensions(6, 2.0, vec![own_weight()]);
    assert!(found.report.iterations <= 10, "{}", found.report.iterations);
}

/// More ropes than are solved for at a time.
#[test]
fn mean_tensions_of_more_ropes_than_fit_one_block() {
    let found = with_mean_tensions(18, 0.0, vec![]);
    assert!(found.report.iterations <= 8, "{}", found.report.iterations);
}
