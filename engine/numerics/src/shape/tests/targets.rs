//! Targets: met where they can be, with the least change; derivatives; wishes that fight.

use super::*;
use crate::model::SegmentId;
use crate::shape::loads::ShapeLoads;
use crate::shape::parts::Parts;
use crate::shape::rows::Rows;
use crate::shape::search::Search;
use crate::test_nets::{Sketch, node, section, segments};

fn target(name: &str, wish: Wish) -> ShapeTarget {
    ShapeTarget {
        name: name.to_owned(),
        wish,
        weight: 1.0,
    }
}

fn height(net: &Net, name: &str, value: f64) -> Wish {
    Wish::Coordinate {
        node: node(net, name),
        axis: 2,
        value,
    }
}

fn adjustable(density: f64) -> Adjustable {
    Adjustable {
        density,
        least: 0.0,
        most: f64::INFINITY,
    }
}

fn ids(segments: &[usize]) -> Vec<SegmentId> {
    segments.iter().map(|s| SegmentId::new(*s)).collect()
}

/// A saddle of three ropes each way between held points; inner nodes `n11` to `n33`.
fn saddle(mass: f64) -> Arc<Net> {
    let mut sketch = Sketch::default();
    let at = |u: f64, w: f64| [4.0 * u, 4.0 * w, 1.5 * (u * u - w * w)];
    let place = |k: i32| f64::from(k - 2) / 2.0;
    for k in 1..=3 {
        sketch.held(&format!("w{k}"), at(-1.0, place(k)));
        sketch.held(&format!("e{k}"), at(1.0, place(k)));
        sketch.held(&format!("s{k}"), at(place(k), -1.0));
        sketch.held(&format!("n{k}"), at(place(k), 1.0));
    }
    for k in 1..=3 {
        let inner: Vec<String> = (1..=3).map(|i| format!("n{i}{k}")).collect();
        sketch.cable(
            &format!("c{k}"),
            section(8e6, mass),
            &format!("w{k} {} e{k}", inner.join(" ")),
        );
    }
    for i in 1..=3 {
        let inner: Vec<String> = (1..=3).map(|k| format!("n{i}{k}")).collect();
        sketch.cable(
            &format!("b{i}"),
            section(8e6, mass),
            &format!("s{i} {} n{i}", inner.join(" ")),
        );
    }
    Arc::new(sketch.net())
}

/// One adjustable density a segment, all the same at the start.
fn by_segments(net: &Net, density: f64) -> Prestress {
    let n = net.segments().len();
    Prestress {
        rules: (0..n).map(PrestressRule::Adjustable).collect(),
        adjustables: vec![adjustable(density); n],
        ..Prestress::default()
    }
}

/// One adjustable density a cable.
fn by_cables(net: &Net, density: f64) -> Prestress {
    let rules = net.cables().iter().enumerate();
    Prestress {
        rules: rules
            .flat_map(|(index, cable)| cable.segments.clone().map(move |_| PrestressRule::Adjustable(index)))
            .collect(),
        adjustables: vec![adjustable(density); net.cables().len()],
        ..Prestress::default()
    }
}

#[test]
fn every_kind_of_target_is_met_under_own_weight() {
    let net = saddle(20.0);
    let point = |name: &str| node(&net, name);
    let mut prestress = by_segments(&net, 2500.0);
    let c2 = segments(&net, &["c2"]);
    let b1 = segments(&net, &["b1"]);
    let hypar = |x: f64, y: f64| Vector3::new(x, y, 0.05 + 0.08 * x * x - 0.085 * y * y);
    let points = (0..49)
        .map(|k| hypar(f64::from(k % 7) - 3.0, f64::from(k / 7) - 3.0))
        .collect();
    prestress.targets = vec![
        target("high", height(&net, "n22", -0.12)),
        target(
            "sag",
            Wish::Sag {
                node: point("n21"),
                chord: [point("w1"), point("e1")],
                sag: 1.3,
                measure: SagMeasure::Vertical,
            },
        ),
        target(
            "across",
            Wish::Sag {
                node: point("n23"),
                chord: [point("w3"), point("e3")],
                sag: 1.4,
                measure: SagMeasure::Normal,
            },
        ),
        target("mesh", Wish::EqualLengths { segments: ids(&c2) }),
        target(
            "pull",
            Wish::Tension {
                segments: ids(&b1),
                tension: 6000.0,
            },
        ),
        target(
            "cut",
            Wish::UnstressedLength {
                segments: ids(&b1[..1]),
                length: 2.3,
            },
        ),
        target(
            "long",
            Wish::Length {
                segments: ids(&segments(&net, &["b3"])),
                length: 8.8,
            },
        ),
        target(
            "round",
            Wish::Radius {
                nodes: [point("n22"), point("n32"), point("e2")],
                radius: 5.8,
            },
        ),
        target(
            "form",
            Wish::Surface {
                nodes: vec![point("n13"), point("n31")],
                points,
            },
        ),
    ];
    let found = shape(&net, &prestress, vec![own_weight()]).expect("a shape");
    assert_eq!(found.report.unmet_in_words(), None);
    let x = |name: &str| found.state.positions[point(name).index()];
    let length = |e: usize| {
        let [i, j] = net.segments()[e].ends;
        (found.state.positions[j.index()] - found.state.positions[i.index()]).norm()
    };
    // Measured anew from the state, not from what the search says of itself.
    close(x("n22").z, -0.12, 1e-9);
    let share = (x("n21").x - x("w1").x) / (x("e1").x - x("w1").x);
    close(x("w1").z + share * (x("e1").z - x("w1").z) - x("n21").z, 1.3, 1e-9);
    let chord = (x("e3") - x("w3")).normalize();
    close((x("n23") - x("w3")).cross(&chord).norm(), 1.4, 1e-9);
    for pair in c2.windows(2) {
        close(length(pair[1]), length(pair[0]), 1e-8);
    }
    let mean = b1.iter().map(|e| found.state.axial_forces[*e]).sum::<f64>() / b1.len() as f64;
    close(mean, 6000.0, 1e-4);
    close(found.state.unstressed_lengths[net.segments()[b1[0]].length], 2.3, 1e-8);
    close(segments(&net, &["b3"]).iter().map(|e| length(*e)).sum(), 8.8, 1e-8);
    let [a, b, c] = ["n22", "n32", "e2"].map(x);
    let radius = (b - a).norm() * (c - b).norm() * (a - c).norm() / (2.0 * (b - a).cross(&(c - a)).norm());
    close(radius, 5.8, 1e-7);
    for name in ["n13", "n31"] {
        close(x(name).z, hypar(x(name).x, x(name).y).z, 1e-9);
    }
    assert!(found.report.imbalance <= 1e-9 * found.report.largest_force);
}

/// Two densities under a point load, of which only the sum decides the height: the nearest pair, in logarithms, obeys
/// `ln(q1/p1)/q1 = ln(q2/p2)/q2` (Lagrange, closed form).
#[test]
fn freedom_left_over_changes_least() {
    let mut sketch = Sketch::default();
    sketch.held("a", [0.0, 0.0, 0.0]);
    sketch.held("b", [6.0, 0.0, 0.0]);
    sketch.cable("rope", section(1e8, 0.0), "a m b");
    let net = Arc::new(sketch.net());
    let mut prestress = by_segments(&net, 400.0);
    prestress.adjustables[1].density = 900.0;
    prestress.targets = vec![target("low", height(&net, "m", -2.0))];
    let found = shape(&net, &prestress, vec![down(node(&net, "m"), 1000.0)]).expect("a shape");
    let q: Vec<f64> = (0..2)
        .map(|e| {
            let [i, j] = net.segments()[e].ends;
            let length = (found.state.positions[j.index()] - found.state.positions[i.index()]).norm();
            found.state.axial_forces[e] / length
        })
        .collect();
    close(q[0] + q[1], 500.0, 1e-6);
    let by = |k: usize, p: f64| (q[k] / p).ln() / q[k];
    close(by(0, 400.0) / by(1, 900.0), 1.0, 1e-6);
}

#[test]
fn densities_keep_within_bounds() {
    let net = saddle(20.0);
    let mut prestress = by_cables(&net, 2500.0);
    for given in &mut prestress.adjustables {
        (given.least, given.most) = (2000.0, 3000.0);
    }
    prestress.targets = vec![target("low", height(&net, "n22", -5.0))];
    let found = shape(&net, &prestress, vec![own_weight()]).expect("a shape");
    for (e, segment) in net.segments().iter().enumerate() {
        let [i, j] = segment.ends;
        let length = (found.state.positions[j.index()] - found.state.positions[i.index()]).norm();
        let q = found.state.axial_forces[e] / length;
        assert!((2000.0 - 1e-6..=3000.0 + 1e-6).contains(&q), "{q}");
    }
    // Lowest with the hanging ropes as soft, the others as hard as they may be, by symmetry.
    let unmet = found.report.unmet.as_ref().expect("out of reach");
    assert!(unmet.at_bounds.contains(&"c2".to_owned()) && unmet.at_bounds.contains(&"b2".to_owned()));
    let text = found.report.unmet_in_words().expect("out of reach");
    assert!(text.contains("force densities at a bound"), "{text}");
}

/// Tension and sag of a rope under one point load fix each other: `T = P l / (2 f)` with `l` half the rope's length.
#[test]
fn wishes_that_fight_are_named_with_what_each_gives_alone() {
    let mut sketch = Sketch::default();
    sketch.held("a", [-4.0, 0.0, 0.0]);
    sketch.held("b", [4.0, 0.0, 0.0]);
    sketch.cable("rope", section(1e8, 0.0), "a m b");
    sketch.held("c", [0.0, 5.0, -1.0]);
    sketch.held("d", [8.0, 5.0, -1.0]);
    sketch.cable("other", section(1e8, 0.0), "c k d");
    let net = Arc::new(sketch.net());
    let mut prestress = by_cables(&net, 500.0);
    let rope = segments(&net, &["rope"]);
    prestress.targets = vec![
        target("other", height(&net, "k", -2.0)),
        target(
            "tight",
            Wish::Tension {
                segments: ids(&rope),
                tension: 5000.0,
            },
        ),
        target(
            "deep",
            Wish::Sag {
                node: node(&net, "m"),
                chord: [node(&net, "a"), node(&net, "b")],
                sag: 0.9,
                measure: SagMeasure::Vertical,
            },
        ),
    ];
    let loads = vec![down(node(&net, "m"), 1000.0), down(node(&net, "k"), 1000.0)];
    let report = shape(&net, &prestress, loads).expect("the nearest").report;
    let unmet = report.unmet.as_ref().expect("they fight");
    assert_eq!(unmet.fights.len(), 1);
    let fight = unmet.fights[0];
    let (tight, deep) = (1, 2);
    let mut pair = fight.targets;
    pair.sort_unstable();
    assert_eq!(pair, [tight, deep]);
    assert!(report.targets[0].met && unmet.rank == Some(2));
    let side = |target: usize| usize::from(fight.targets[1] == target);
    // Each alone is met; what it leaves of the other follows from the triangle of forces.
    close(fight.alone[side(tight)], 5000.0, 1e-3);
    close(fight.alone[side(deep)], 0.9, 1e-7);
    let half = |sag: f64| (16.0 + sag * sag).sqrt();
    close(fight.left_out[side(tight)], 1000.0 * half(0.9) / (2.0 * 0.9), 1e-3);
    // T = 5 kN: sin = 0.1, so that f = 4 tan.
    close(fight.left_out[side(deep)], 4.0 * 0.1 / (1.0 - 0.01_f64).sqrt(), 1e-7);
    let text = report.unmet_in_words().expect("they fight");
    assert!(text.contains("can not both be met"), "{text}");
    assert!(text.contains("Met within 0.2 %: 1 of 3, independent: 2"), "{text}");
}

#[test]
fn a_heavier_wish_is_met_more_closely() {
    let net = saddle(0.0);
    let found = |weight: f64| {
        let mut prestress = by_cables(&net, 2500.0);
        prestress.targets = vec![
            target("low", height(&net, "n22", -0.2)),
            target("high", height(&net, "n22", 0.2)),
        ];
        prestress.targets[1].weight = weight;
        let found = shape(&net, &prestress, vec![]).expect("the nearest");
        found.state.positions[node(&net, "n22").index()].z
    };
    close(found(1.0), 0.0, 1e-6);
    // Weighted least squares: 1·(z + 0.2) + 9·(z − 0.2) = 0.
    close(found(3.0), 0.16, 1e-6);
}

#[test]
fn what_can_not_be_a_target_is_told() {
    let net = saddle(0.0);
    let refused = |wish: Wish, change: &dyn Fn(&mut Prestress)| {
        let mut prestress = by_cables(&net, 2500.0);
        prestress.targets = vec![target("it", wish)];
        change(&mut prestress);
        shape(&net, &prestress, vec![]).expect_err("refused").to_string()
    };
    let c1 = ids(&segments(&net, &["c1"]));
    let pull = |tension| Wish::Tension {
        segments: c1.clone(),
        tension,
    };
    let nothing = |_: &mut Prestress| {};
    assert!(refused(pull(-4.0), &nothing).contains("a force that pushes is wanted of \"c1\""));
    assert!(refused(pull(f64::NAN), &nothing).contains("has to be positive"));
    let length = Wish::Length {
        segments: c1.clone(),
        length: 0.0,
    };
    assert!(refused(length, &nothing).contains("the wanted length (m) is 0"));
    let line = Wish::Surface {
        nodes: vec![node(&net, "n11")],
        points: vec![Vector3::zeros(), Vector3::x(), Vector3::x() * 2.0],
    };
    assert!(refused(line, &nothing).contains("no surface over plan"));
    let weightless = refused(height(&net, "n11", 0.0), &|p| p.targets[0].weight = 0.0);
    assert!(weightless.contains("its weight is 0"), "{weightless}");
    let upright = Wish::Sag {
        node: node(&net, "n22"),
        chord: [node(&net, "n11"), node(&net, "n11")],
        sag: 0.1,
        measure: SagMeasure::Vertical,
    };
    assert!(refused(upright, &nothing).contains("has no value at the shape"));
    let outside = refused(height(&net, "n11", 0.0), &|p| p.adjustables[2].most = 2000.0);
    assert!(outside.contains("adjustable force density (N/m) 2500"), "{outside}");
}

/// Every kind of target against central differences, with weight, loads on plan, an elastic rope, a spring and a strut;
/// formed by columns, by rows, and applied both ways.
#[test]
fn derivatives_of_targets() {
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
    let corners = ["A", "p", "q", "r"].map(|name| sketch.id(name)).to_vec();
    sketch.given.panels.push(crate::model::PanelGiven {
        name: "panel".to_owned(),
        corners,
    });
    let net = Arc::new(sketch.net());
    let n = |name: &str| node(&net, name);
    let mut rules = vec![PrestressRule::Adjustable(0); 3];
    rules.extend([PrestressRule::MeanTension(0); 3]);
    rules.extend([
        PrestressRule::Adjustable(1),
        PrestressRule::UnstressedLength(3.0),
        PrestressRule::Adjustable(2),
    ]);
    let sag = |measure| Wish::Sag {
        node: n("q"),
        chord: [n("p"), n("C")],
        sag: 0.4,
        measure,
    };
    let wishes = vec![
        height(&net, "r", 1.0),
        sag(SagMeasure::Vertical),
        sag(SagMeasure::Normal),
        Wish::EqualLengths {
            segments: ids(&[0, 3, 7]),
        },
        Wish::Tension {
            segments: ids(&[0, 4, 7]),
            tension: 2000.0,
        },
        Wish::Tension {
            segments: ids(&[8]),
            tension: -200.0,
        },
        Wish::UnstressedLength {
            segments: ids(&[1, 2, 6]),
            length: 9.0,
        },
        Wish::Length {
            segments: ids(&[1, 5]),
            length: 9.0,
        },
        Wish::Radius {
            nodes: [n("A"), n("p"), n("q")],
            radius: 9.0,
        },
        Wish::Surface {
            nodes: vec![n("p"), n("r")],
            points: (0..20)
                .map(|k| {
                    Vector3::new(
                        f64::from(k % 5) * 2.0,
                        f64::from(k / 5) * 3.0,
                        f64::from(k * k % 7) * 0.2,
                    )
                })
                .collect(),
        },
    ];
    let mut prestress = Prestress {
        rules,
        mean_tensions: vec![4000.0],
        adjustables: [900.0, 250.0, -60.0].map(adjustable).to_vec(),
        targets: wishes.into_iter().map(|wish| target("it", wish)).collect(),
        ..Prestress::default()
    };
    prestress.targets[2].weight = 3.0;
    let plan = Load::PerPlanLength {
        scope: crate::load::Scope::All,
        force: Vector3::new(5.0, 0.0, -40.0),
    };
    let action = Action {
        name: "self".to_owned(),
        loads: vec![own_weight(), plan, down(n("p"), 700.0)],
    };
    let parts = Parts::new(&net, &prestress).expect("good rules");
    let mut loads = ShapeLoads::new(&net, &[action], &[0]).expect("dead loads");
    loads.per_area = vec![Vector3::new(0.0, 3.0, -60.0)];
    loads.per_plan_area = vec![Vector3::new(2.0, 0.0, -90.0)];
    let rows = Rows::new(&net, &parts, &prestress).expect("good targets");
    let analysis = Analysis::new(Arc::clone(&net));
    let mut observe = |_: &crate::equilibrium::IterationReport| ControlFlow::Continue(());
    let mut search = Search::new(&analysis, &parts, &loads, &mut observe);
    search.rows = rows;
    let densities = [1100.0, 900.0, 250.0, -60.0];
    let start: Vec<Vector3<f64>> = (net.nodes().iter())
        .map(|n| n.position.unwrap_or(Vector3::new(4.0, 4.0, 1.0)))
        .collect();
    let point = search.balanced(start, &densities).expect("a balanced shape");
    assert!(point.axial_forces[7] > 0.0, "the tie is taut");
    let jacobian = search.jacobian(&point, &densities).expect("not singular");
    assert_eq!(jacobian.shape(), (13, 4));
    let h = 2e-4;
    for column in 0..4 {
        let misses = |search: &mut Search<'_, '_>, t: f64| {
            let mut moved = densities;
            moved[column] *= (t * h).exp();
            let point = search
                .balanced(point.positions.clone(), &moved)
                .expect("a balanced shape");
            search.misses(&point)
        };
        let [far, near, back, rear] = [2.0, 1.0, -1.0, -2.0].map(|t| misses(&mut search, t));
        for row in 0..13 {
            let slope = (8.0 * (near[row] - back[row]) - (far[row] - rear[row])) / (12.0 * h);
            let size = jacobian.row(row).amax().max(1.0);
            close(jacobian[(row, column)] / size, slope / size, 1e-8);
        }
    }
    search.factorise(&point, &densities, 0.0).expect("not singular");
    let slopes = search.slopes(&point);
    let v: Vec<f64> = (0..4).map(|k| 0.3 - f64::from(k)).collect();
    let u: Vec<f64> = (0..13).map(|k| f64::from(k).cos()).collect();
    let forward = search.forward(&point, &densities, &slopes, &v);
    for (row, found) in forward.iter().enumerate() {
        let expected: f64 = (0..4).map(|k| jacobian[(row, k)] * v[k]).sum();
        close(*found, expected, 1e-8 * jacobian.amax());
    }
    let backward = search.backward(&point, &densities, &slopes, &u);
    for (column, found) in backward.iter().enumerate() {
        let expected: f64 = (0..13).map(|k| jacobian[(k, column)] * u[k]).sum();
        close(*found, expected, 1e-8 * jacobian.amax());
    }
    // With fewer equations than unknowns it is formed by rows.
    let mut prestress = prestress.clone();
    prestress.targets = vec![prestress.targets[1].clone(), prestress.targets[4].clone()];
    search.rows = Rows::new(&net, &parts, &prestress).expect("good targets");
    let by_rows = search.jacobian(&point, &densities).expect("not singular");
    assert_eq!(by_rows.shape(), (3, 4));
    for (row, of_all) in [(0, 0), (1, 2), (2, 6)] {
        for column in 0..4 {
            close(
                by_rows[(row, column)],
                jacobian[(of_all, column)],
                1e-8 * jacobian.amax(),
            );
        }
    }
}
