//! Against closed forms, and against all roots of the dense pencil.

use std::f64::consts::PI;
use std::ops::ControlFlow;
use std::sync::Arc;

use nalgebra::{DMatrix, Vector3};

use super::*;
use crate::equilibrium::{Analysis, Settings, solve};
use crate::load::{Case, SegmentLoads};
use crate::model::{Area, Net, NodeGiven, NodeId, PanelGiven, SegmentId, Skin};
use crate::test_nets::{Sketch, section};

struct Solved {
    analysis: Analysis,
    case: Case,
    positions: Vec<Vector3<f64>>,
    start: Vec<Vector3<f64>>,
    axial_forces: Vec<f64>,
    lying: Vec<f64>,
}

impl Solved {
    /// `ratio`: start length over unstressed length of every segment. `force`: on every node that can move.
    fn new(net: Net, ratio: impl Fn(usize) -> f64, force: Vector3<f64>) -> Self {
        let net = Arc::new(net);
        let start: Vec<_> = net.nodes().iter().map(|n| n.position.unwrap()).collect();
        let span = |e: &crate::model::Segment| (start[e.ends[1].index()] - start[e.ends[0].index()]).norm();
        let case = Case {
            nodal_forces: vec![force; start.len()],
            unstressed_lengths: net
                .segments()
                .iter()
                .enumerate()
                .map(|(e, s)| span(s) / ratio(e))
                .collect(),
            segments: vec![SegmentLoads::default(); net.segments().len()],
            support_movements: vec![Vector3::zeros(); start.len()],
            removed: vec![false; net.segments().len()],
            ..Case::default()
        };
        let analysis = Analysis::new(net);
        let go_on = &mut |_: &_| ControlFlow::Continue(());
        let found = solve(
            &analysis,
            &case,
            &start,
            &case.unstressed_lengths,
            &Settings::default(),
            go_on,
        )
        .unwrap();
        assert_eq!(found.termination, crate::equilibrium::Termination::Converged);
        Self {
            analysis,
            positions: found.positions,
            axial_forces: found.axial_forces,
            lying: case.unstressed_lengths.clone(),
            case,
            start,
        }
    }

    fn modes(&self, given: &MassGiven, count: usize) -> Result<Modes, ModesError> {
        let about = About {
            case: &self.case,
            positions: &self.positions,
            reference: &self.start,
            axial_forces: &self.axial_forces,
            lying: &self.lying,
        };
        natural_modes(&self.analysis, &about, given, count, &mut || ControlFlow::Continue(()))
    }
}

/// A string of `n` beads of mass 1 kg, spacing 2 m, under 3 kN.
fn beads(n: usize, attached_mass: f64) -> Solved {
    let mut sketch = Sketch::default();
    sketch.held("0", [0.0; 3]);
    for i in 1..=n {
        sketch.node(&i.to_string(), [2.0 * i as f64, 0.0, 0.0]).attached_mass = attached_mass;
    }
    sketch.held("end", [2.0 * (n + 1) as f64, 0.0, 0.0]);
    let inner: Vec<String> = (0..=n).map(|i| i.to_string()).collect();
    sketch.cable("c", section(1e6, 0.0), &(inner.join(" ") + " end"));
    Solved::new(sketch.net(), |_| 1.003, Vector3::zeros())
}

/// `ω = 2 √(k/m) sin(j π / (2 (n + 1)))` (Rayleigh), across twice each with `k = T/l`, along with `k = EA/a`.
fn roots_of_beads(n: usize) -> Vec<f64> {
    let root = |k: f64, j: usize| 4.0 * k * (PI * j as f64 / (2 * (n + 1)) as f64).sin().powi(2);
    let across = (1..=n).flat_map(|j| [root(3000.0 / 2.0, j); 2]);
    let mut roots: Vec<f64> = across.chain((1..=n).map(|j| root(1e6 * 1.003 / 2.0, j))).collect();
    roots.sort_by(f64::total_cmp);
    roots
}

#[test]
fn beads_on_a_string_with_each_root_twice() {
    for (n, count) in [(3, 9), (3, 50), (9, 4), (30, 11), (30, 12), (80, 20)] {
        let found = beads(n, 1.0).modes(&MassGiven::default(), count).unwrap();
        let wanted = roots_of_beads(n);
        assert!(
            found.modes.len() >= count.min(3 * n),
            "{n} {count}: {}",
            found.modes.len()
        );
        assert!(found.modes.len() <= count + 1);
        assert!(found.is_complete(), "{n} {count}: {:?}", found.counted);
        for (mode, wanted) in found.modes.iter().zip(&wanted) {
            assert!(
                (mode.root - wanted).abs() <= 1e-9 * wanted,
                "{n}: {} {wanted}",
                mode.root
            );
            assert!(mode.residual <= 1e-8, "{}", mode.residual);
            assert_eq!(mode.kind, ModeKind::Vibrates);
        }
        assert!(found.orthogonality <= 1e-12, "{}", found.orthogonality);
        assert!((found.moving_mass[2] - n as f64).abs() <= 1e-12 * n as f64);
    }
}

/// All modes together take part with all of the mass.
#[test]
fn effective_masses_add_up() {
    let found = beads(7, 2.0).modes(&MassGiven::default(), 21).unwrap();
    for axis in 0..3 {
        let sum: f64 = found.modes.iter().map(|mode| mode.effective_mass[axis]).sum();
        assert!((sum - 14.0).abs() <= 1e-9, "{axis}: {sum}");
    }
}

/// A mass in the middle of two strings without mass: the massless beads follow.
#[test]
fn beads_without_mass_follow_at_once() {
    let solved = beads(3, 0.0);
    let middle = MassGiven {
        nodes: vec![(NodeId::new(2), 4.0)],
        ..MassGiven::default()
    };
    let found = solved.modes(&middle, 5).unwrap();
    // Four springs of T/l, two on either side one after the other: k = T/l.
    let wanted = [3000.0 / 2.0 / 4.0, 3000.0 / 2.0 / 4.0, 1e6 * 1.003 / 2.0 / 4.0];
    assert_eq!(found.modes.len(), 3);
    assert!(found.is_complete());
    assert_eq!(found.massless, [NodeId::new(1), NodeId::new(3)]);
    for (mode, wanted) in found.modes.iter().zip(wanted) {
        assert!((mode.root - wanted).abs() <= 1e-9 * wanted, "{} {wanted}", mode.root);
    }
    assert!((found.modes[0].shape[1].norm() - 0.5).abs() <= 1e-9);
    assert_eq!(solved.modes(&MassGiven::default(), 5), Err(ModesError::NoMass));
}

/// A square net with cross ropes, some of them slack: nodes of slack ropes only float.
fn net(slack: impl Fn(usize) -> bool, mass: f64) -> Solved {
    let n = 7;
    let mut sketch = Sketch::default();
    let name = |i: usize, j: usize| format!("{i}.{j}");
    for i in 0..=n {
        for j in 0..=n {
            let (u, w) = (2.0 * i as f64 / n as f64 - 1.0, 2.0 * j as f64 / n as f64 - 1.0);
            let at = [1.7 * i as f64, 1.9 * j as f64, 1.5 * (u * u - w * w)];
            match [i, j].iter().any(|k| *k == 0 || *k == n) {
                true => sketch.held(&name(i, j), at),
                false => {
                    let node: &mut NodeGiven = sketch.node(&name(i, j), at);
                    node.attached_mass = if i == 3 { 5.0 } else { 0.0 };
                }
            }
        }
    }
    for k in 1..n {
        let along: Vec<String> = (0..=n).map(|i| name(i, k)).collect();
        sketch.cable(&format!("a{k}"), section(4e6, mass), &along.join(" "));
        let across: Vec<String> = (0..=n).map(|j| name(k, j)).collect();
        sketch.cable(&format!("b{k}"), section(5e6, 1.3 * mass), &across.join(" "));
    }
    Solved::new(sketch.net(), |e| if slack(e) { 0.8 } else { 1.002 }, Vector3::zeros())
}

/// All roots by the dense symmetric problem `M^−½ K M^−½`, `K` by differences of the residual.
fn dense_roots(solved: &Solved, given: &MassGiven) -> Vec<f64> {
    let structure = solved.analysis.structure();
    let case = &solved.case;
    let loading = crate::assembly::Loading::new(structure, case, &case.unstressed_lengths, 1.0).unwrap();
    let mut response = crate::assembly::Response::new(structure);
    let n = structure.n_dofs();
    let mut mass: Vec<f64> = vec![0.0; structure.net().nodes().len()];
    for (node, given) in structure.net().nodes().iter().enumerate() {
        mass[node] += given.attached_mass;
    }
    for (e, segment) in structure.net().segments().iter().enumerate() {
        let more: f64 = given
            .segments
            .iter()
            .filter(|(s, _)| s.index() == e)
            .map(|(_, m)| m)
            .sum();
        for end in segment.ends {
            mass[end.index()] += 0.5 * (segment.section.mass_per_length + more) * case.unstressed_lengths[e];
        }
    }
    let roots: Vec<f64> = (0..n)
        .map(|dof| mass[structure.dofs().node(dof).index()].sqrt())
        .collect();
    let mut dense = DMatrix::zeros(n, n);
    for column in 0..n {
        let mut at = |h: f64| {
            let mut unit = vec![0.0; n];
            unit[column] = h;
            let mut moved = solved.positions.clone();
            structure.dofs().move_nodes(&unit, 1.0, &mut moved);
            structure.response_into(&loading, &moved, &mut response);
            response.residual.clone()
        };
        // No segment may go slack or taut on the way.
        let h = 1e-8;
        let (ahead, behind) = (at(h), at(-h));
        for row in 0..n {
            dense[(row, column)] = -(ahead[row] - behind[row]) / (2.0 * h) / (roots[row] * roots[column]);
        }
    }
    let mut values: Vec<f64> = (0.5 * (&dense + dense.transpose()))
        .symmetric_eigenvalues()
        .iter()
        .copied()
        .collect();
    values.sort_by(f64::total_cmp);
    values
}

#[test]
fn a_net_with_slack_ropes_and_floating_nodes() {
    // Everything at two nodes is slack, and some more.
    let slack_at = ["2.2", "5.4"];
    let names = |solved: &Solved| -> Vec<bool> {
        let net = solved.analysis.structure().net().clone();
        net.segments()
            .iter()
            .map(|s| s.ends.iter().any(|n| slack_at.contains(&net.node_name(*n))))
            .collect()
    };
    let touching = names(&net(|_| false, 0.8));
    let solved = net(|e| touching[e] || e == 0, 0.8);
    let given = MassGiven {
        segments: vec![(SegmentId::new(11), 2.5)],
        ..MassGiven::default()
    };
    let found = solved.modes(&given, 15).unwrap();
    let floating: Vec<&str> = (found.floating.iter())
        .map(|n| solved.analysis.structure().net().node_name(*n))
        .collect();
    assert_eq!(floating, slack_at);
    assert!(found.is_complete(), "{:?}", found.counted);
    // The dense pencil has three zero roots for each floating node; the rest are the same.
    let all = dense_roots(&solved, &given);
    let largest = all.last().unwrap();
    assert!(
        all[..6].iter().all(|root| root.abs() <= 1e-9 * largest),
        "{:?}",
        &all[..8]
    );
    for (mode, wanted) in found.modes.iter().zip(&all[6..]) {
        assert!((mode.root - wanted).abs() <= 1e-6 * wanted, "{} {wanted}", mode.root);
    }
    let limit = found.counted.unwrap().limit;
    assert_eq!(all.iter().filter(|root| **root < limit).count(), 6 + found.modes.len());
}

/// Every bar between two held ends is its own string: very many equal roots.
#[test]
fn many_equal_roots() {
    let mut sketch = Sketch::default();
    for k in 0..25 {
        let (a, m, b) = (format!("a{k}"), format!("m{k}"), format!("b{k}"));
        sketch.held(&a, [0.0, k as f64, 0.0]);
        sketch.node(&m, [2.0, k as f64, 0.0]);
        sketch.held(&b, [4.0, k as f64, 0.0]);
        sketch.cable(&k.to_string(), section(1e6, 0.5), &format!("{a} {m} {b}"));
    }
    let solved = Solved::new(sketch.net(), |_| 1.002, Vector3::zeros());
    let found = solved.modes(&MassGiven::default(), 5).unwrap();
    assert_eq!(found.modes.len(), 50);
    assert!(found.is_complete(), "{:?}", found.counted);
    let mass = 0.5 * 2.0 / 1.002;
    let wanted = 2.0 * 2000.0 / 2.0 / mass;
    for mode in &found.modes {
        assert!((mode.root - wanted).abs() <= 1e-9 * wanted, "{} {wanted}", mode.root);
    }
}

/// Two struts in line that nothing holds across, without force and under compression.
#[test]
fn rigid_and_unstable_modes_are_named() {
    for (ratio, kind, root) in [
        (1.0, ModeKind::Rigid, 0.0),
        (0.999, ModeKind::Unstable, -1000.0 / 4.0 * 2.0),
    ] {
        let mut sketch = Sketch::default();
        sketch.held("a", [0.0; 3]);
        sketch.node("m", [2.0, 0.0, 0.0]).attached_mass = 2.0;
        sketch.held("b", [4.0, 0.0, 0.0]);
        sketch.strut("s1", section(1e6, 0.0), "a", "m");
        sketch.strut("s2", section(1e6, 0.0), "m", "b");
        let net = Arc::new(sketch.net());
        let start: Vec<_> = net.nodes().iter().map(|n| n.position.unwrap()).collect();
        let case = Case {
            nodal_forces: vec![Vector3::zeros(); 3],
            unstressed_lengths: vec![2.0 / ratio; 2],
            segments: vec![SegmentLoads::default(); 2],
            support_movements: vec![Vector3::zeros(); 3],
            removed: vec![false; 2],
            ..Case::default()
        };
        let solved = Solved {
            analysis: Analysis::new(net),
            lying: case.unstressed_lengths.clone(),
            axial_forces: vec![1e6 * (ratio - 1.0); 2],
            case,
            positions: start.clone(),
            start,
        };
        let found = solved.modes(&MassGiven::default(), 3).unwrap();
        let kinds: Vec<ModeKind> = found.modes.iter().map(|mode| mode.kind).collect();
        assert_eq!(kinds, [kind, kind, ModeKind::Vibrates]);
        assert!(
            (found.modes[0].root - root).abs() <= 1e-6,
            "{} {root}",
            found.modes[0].root
        );
    }
}

/// A strut that two slack ropes hold: an island with six movements that nothing resists, but turning about itself has no
/// mass.
#[test]
fn what_only_slack_ropes_join_is_an_island() {
    let mut sketch = Sketch::default();
    sketch.held("a", [0.0; 3]);
    sketch.node("m", [2.0, 0.0, 0.0]);
    sketch.node("n", [3.0, 0.0, 0.5]);
    sketch.held("b", [5.0, 0.0, 0.0]);
    sketch.cable("c1", section(1e6, 0.5), "a m");
    sketch.cable("c2", section(1e6, 0.5), "n b");
    sketch.strut("s", section(1e6, 3.0), "m", "n");
    let net = Arc::new(sketch.net());
    let start: Vec<_> = net.nodes().iter().map(|n| n.position.unwrap()).collect();
    let span = |e: usize| {
        let s = &net.segments()[e];
        (start[s.ends[1].index()] - start[s.ends[0].index()]).norm()
    };
    let case = Case {
        nodal_forces: vec![Vector3::zeros(); 4],
        unstressed_lengths: vec![1.1 * span(0), 1.1 * span(1), span(2)],
        segments: vec![SegmentLoads::default(); 3],
        support_movements: vec![Vector3::zeros(); 4],
        removed: vec![false; 3],
        ..Case::default()
    };
    let solved = Solved {
        lying: case.unstressed_lengths.clone(),
        axial_forces: vec![0.0; 3],
        case,
        positions: start.clone(),
        analysis: Analysis::new(net),
        start,
    };
    let found = solved.modes(&MassGiven::default(), 6).unwrap();
    assert_eq!(found.islands, [vec![NodeId::new(1), NodeId::new(2)]]);
    assert_eq!(found.floating, []);
    let rigid = found.modes.iter().filter(|mode| mode.kind == ModeKind::Rigid).count();
    assert_eq!((rigid, found.modes.len()), (5, 6));
}

/// A node in the middle of a square of 4 m that four ropes hold, under four triangles of skin.
fn tent(pressures: [f64; 4]) -> Solved {
    let mut sketch = Sketch::default();
    let corners = [[-2.0, -2.0], [2.0, -2.0], [2.0, 2.0], [-2.0, 2.0]];
    let middle = sketch.id("m");
    sketch.node("m", [0.0; 3]);
    for (k, [x, y]) in corners.iter().enumerate() {
        sketch.held(&k.to_string(), [*x, *y, 0.0]);
        sketch.cable(&format!("c{k}"), section(1e6, 0.0), &format!("m {k}"));
    }
    for k in 0..4 {
        sketch.given.panels.push(PanelGiven {
            name: k.to_string(),
            corners: vec![middle, NodeId::new(k + 1), NodeId::new((k + 1) % 4 + 1)],
        });
    }
    sketch.given.skins.push(Skin {
        name: "skin".to_owned(),
        mass_per_area: 3.0,
        panels: vec![0, 1, 2, 3],
    });
    let mut solved = Solved::new(sketch.net(), |_| 1.002, Vector3::zeros());
    solved.case.pressures = pressures.to_vec();
    solved
}

/// A third of each triangle lies on the node in the middle; air goes with the skin across it only.
#[test]
fn skins_and_air_move_along() {
    let given = MassGiven {
        areas: vec![(vec![Area::Skin(0)], 0.5)],
        air: 2.0,
        ..MassGiven::default()
    };
    let found = tent([0.0; 4]).modes(&given, 3).unwrap();
    for (moving, wanted) in found.moving_mass.iter().zip([3.5, 3.5, 5.5]) {
        assert!((moving - wanted * 16.0 / 3.0).abs() <= 1e-12 * wanted, "{moving}");
    }
    assert_eq!(found.unsymmetric, None);
    // Up and down: four ropes of 2 kN, k = Σ T / l.
    let length = 8.0_f64.sqrt();
    let root = 4.0 * 2000.0 / length / (5.5 * 16.0 / 3.0);
    assert!(
        (found.modes[0].root - root).abs() <= 1e-9 * root,
        "{} {root}",
        found.modes[0].root
    );
}

/// The same pressure on all panels inside a held rim has a potential; on one panel the slope of its force on the node is
/// `p/6` times the cross product with the opposite edge, whose two entries in each row and column are antisymmetric.
#[test]
fn what_pressure_makes_unsymmetric_is_told() {
    let even = tent([100.0; 4]).modes(&MassGiven::default(), 3).unwrap();
    assert!(even.unsymmetric.unwrap() <= 1e-12, "{:?}", even.unsymmetric);
    let odd = tent([100.0, 0.0, 0.0, 0.0]).modes(&MassGiven::default(), 3).unwrap();
    let roots: f64 = odd.modes.iter().map(|mode| mode.root.powi(2)).sum::<f64>().sqrt();
    let wanted = 100.0 / 6.0 * 4.0 * 2.0_f64.sqrt() / (3.0 * 16.0 / 3.0) / roots;
    assert!(
        (odd.unsymmetric.unwrap() - wanted).abs() <= 1e-9 * wanted,
        "{:?} {wanted}",
        odd.unsymmetric
    );
}

/// It is asked before every vector and factorisation, and stops at once wherever it is told to.
#[test]
fn a_search_stops_when_asked() {
    let solved = beads(40, 1.0);
    let about = About {
        case: &solved.case,
        positions: &solved.positions,
        reference: &solved.start,
        axial_forces: &solved.axial_forces,
        lying: &solved.lying,
    };
    let search = |until: usize| {
        let mut asked = 0;
        let found = natural_modes(&solved.analysis, &about, &MassGiven::default(), 3, &mut || {
            asked += 1;
            if asked == until {
                ControlFlow::Break(())
            } else {
                ControlFlow::Continue(())
            }
        });
        (found, asked)
    };
    let (found, all) = search(usize::MAX);
    // As many times as there are vectors in both spaces, and a few factorisations.
    let vectors = found.unwrap().vectors;
    assert!(all > vectors && all < vectors + 40, "{all} {vectors}");
    for until in 1..=all {
        assert_eq!(search(until), (Err(ModesError::Cancelled), until));
    }
}
