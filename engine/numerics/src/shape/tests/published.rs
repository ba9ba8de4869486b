//! Shapes of the verification cases `pub-08`, `pub-16`, `pub-17` and `inv-07`.

use super::tent;
use super::*;
use crate::test_nets::{Sketch, node, section, segments};

/// Weightless cable with three loads. Depths and tensions: textbook companion notebook, chapter "Uniform flexible
/// suspension cables", example 10.1 (found by search); digits beyond the printed ones by the linear equations.
#[test]
fn funicular_of_three_loads() {
    let mut sketch = Sketch::default();
    sketch.held("A", [0.0, 0.0, -2.0]);
    sketch.held("B", [8.0, 0.0, 0.0]);
    sketch.cable("rope", section(1e9, 0.0), "A C D E B");
    let net = Arc::new(sketch.net());
    let loads = [("C", 400.0), ("D", 600.0), ("E", 400.0)].map(|(name, force)| down(node(&net, name), force));
    let found = shape(&net, &all(&net, PrestressRule::ForceDensity(800.0)), loads.to_vec()).expect("a shape");
    for (name, depth) in [("C", 2.375), ("D", 2.25), ("E", 1.375)] {
        close(found.state.positions[node(&net, name).index()].z, -depth, 1e-10 * depth);
    }
    let tensions = [
        1627.882059609971,
        1603.1219541881403,
        1746.4249196572978,
        1941.6487838947596,
    ];
    for (found, wanted) in found.state.axial_forces.iter().zip(tensions) {
        close(*found, wanted, 1e-10 * wanted);
    }
}

/// Equal force densities on a square grid reproduce every discrete harmonic (Schek 1974, from memory; the shapes follow
/// from the five-point Laplace equation).
#[test]
fn discrete_harmonic_shapes() {
    let surfaces: [fn(f64, f64) -> f64; 3] = [
        |x, y| 0.3 * x * y,
        |x, y| 0.2 * (x * x - y * y),
        |x, y| 0.05 * (x.powi(3) - 3.0 * x * y * y),
    ];
    for surface in surfaces {
        let mut sketch = Sketch::default();
        let (nx, ny) = (7_u32, 6_u32);
        let name = |i: u32, j: u32| format!("n{i}_{j}");
        for i in 0..nx {
            for j in 0..ny {
                if i == 0 || j == 0 || i == nx - 1 || j == ny - 1 {
                    let (x, y) = (f64::from(i), f64::from(j));
                    sketch.held(&name(i, j), [x, y, surface(x, y)]);
                }
            }
        }
        for i in 1..nx - 1 {
            let path: Vec<String> = (0..ny).map(|j| name(i, j)).collect();
            sketch.cable(&format!("y{i}"), section(1e6, 0.0), &path.join(" "));
        }
        for j in 1..ny - 1 {
            let path: Vec<String> = (0..nx).map(|i| name(i, j)).collect();
            sketch.cable(&format!("x{j}"), section(1e6, 0.0), &path.join(" "));
        }
        let net = Arc::new(sketch.net());
        let found = shape(&net, &all(&net, PrestressRule::ForceDensity(2.5)), vec![]).expect("a shape");
        for i in 1..nx - 1 {
            for j in 1..ny - 1 {
                let (x, y) = (f64::from(i), f64::from(j));
                let place = found.state.positions[node(&net, &name(i, j)).index()];
                assert!((place - Vector3::new(x, y, surface(x, y))).norm() < 1e-10);
            }
        }
    }
}

/// `z_k = z_chord − p k (n − k) / (2 q)` (Schek 1974, from memory; elementary difference equation).
#[test]
fn equal_loads_make_a_parabola() {
    let mut sketch = Sketch::default();
    sketch.held("0", [0.0, 0.0, 0.0]);
    sketch.held("10", [15.0, 0.0, 4.0]);
    sketch.cable("rope", section(1e6, 0.0), "0 1 2 3 4 5 6 7 8 9 10");
    let net = Arc::new(sketch.net());
    let loads = (1..10).map(|k| down(node(&net, &k.to_string()), 3.0)).collect();
    let found = shape(&net, &all(&net, PrestressRule::ForceDensity(4.0)), loads).expect("a shape");
    for k in 0..=10_u32 {
        let along = f64::from(k);
        let wanted = 4.0 * along / 10.0 - 3.0 * along * (10.0 - along) / 8.0;
        close(
            found.state.positions[node(&net, &k.to_string()).index()].z,
            wanted,
            1e-11,
        );
    }
    for segment in segments(&net, &["rope"]) {
        let [from, to] = net.segments()[segment]
            .ends
            .map(|end| found.state.positions[end.index()]);
        let level = found.state.axial_forces[segment] * (to - from).x / (to - from).norm();
        close(level, 6.0, 6e-12);
    }
}

/// The tent of `inv-07` (invented, our own numbers by an independent solve).
#[test]
fn tent_by_force_densities() {
    let mut sketch = Sketch::default();
    for (index, position) in tent::HELD.into_iter().enumerate() {
        sketch.held(&index.to_string(), position);
    }
    for index in tent::HELD.len()..tent::POSITIONS.len() {
        sketch.id(&index.to_string());
    }
    let mut rules = Vec::new();
    for (index, (from, to, density)) in tent::SEGMENTS.into_iter().enumerate() {
        sketch.cable(&format!("s{index}"), section(1e7, 0.0), &format!("{from} {to}"));
        rules.push(PrestressRule::ForceDensity(density));
    }
    let net = Arc::new(sketch.net());
    let prestress = Prestress {
        rules,
        ..all(&net, PrestressRule::Balance)
    };
    let found = shape(&net, &prestress, vec![]).expect("a shape");
    for (found, wanted) in found.state.positions.iter().zip(tent::POSITIONS) {
        assert!((found - Vector3::from(wanted)).norm() < 1e-9);
    }
    for (found, wanted) in found.state.axial_forces.iter().zip(tent::TENSIONS) {
        close(*found, wanted, 1e-9 * wanted);
    }
}
