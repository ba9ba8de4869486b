//! Mechanisms and states of self-stress of nets whose counts are known.
#![allow(clippy::unwrap_used, clippy::print_stdout, reason = "tests")]

use std::ops::ControlFlow;
use std::sync::Arc;

use nalgebra::{DMatrix, Vector3};
use ropewalk_numerics::assembly::Loading;
use ropewalk_numerics::diagnose::mobility::{Members, Mobility, MobilityWay, mobility};
use ropewalk_numerics::equilibrium::stability::{LeastStiffness, least_stiffnesses};
use ropewalk_numerics::equilibrium::{Analysis, Settings, Termination, solve};
use ropewalk_numerics::load::{Case, SegmentLoads};
use ropewalk_numerics::model::{
    CableGiven, ElasticSupportGiven, Net, NetGiven, NodeGiven, NodeId, SegmentId, Slide, SupportGiven,
};

#[path = "equilibrium/nets.rs"]
#[allow(dead_code, reason = "another test uses the rest")]
mod nets;

use nets::{Example, Random, grid};

/// What the state of a net that is in balance as given allows, under the forces of its lengths.
fn as_given(net: &Example, members: Members) -> Mobility {
    of_state(net, &net.positions, members)
}

fn of_state(net: &Example, positions: &[Vector3<f64>], members: Members) -> Mobility {
    let analysis = Analysis::new(net.net());
    let case = net.case();
    let loading = Loading::new(analysis.structure(), &case, &net.lengths(), 1.0).unwrap();
    let forces: Vec<f64> = (net.segments.iter().chain(&net.struts).zip(&loading.bars))
        .map(|((a, b, ..), bar)| bar.axial_force((positions[*b] - positions[*a]).norm()))
        .collect();
    mobility(&analysis, &loading, positions, &forces, members).unwrap()
}

#[track_caller]
fn counts(found: &Mobility, self_stresses: usize, mechanisms: usize, not_stiffened: usize) {
    let told = (found.n_self_stresses, found.n_mechanisms, found.n_not_stiffened);
    assert_eq!(told, (self_stresses, mechanisms, not_stiffened), "{found:#?}");
    assert_eq!(found.members - found.rank, found.n_self_stresses);
    assert_eq!(found.directions - found.rank, found.n_mechanisms);
}

/// Every mechanism listed leaves every member as long as it is to first order, and every state of self-stress leaves
/// every free node in balance: by plain sums over the members.
fn check_listed(net: &Example, found: &Mobility) {
    let members: Vec<_> = net.segments.iter().chain(&net.struts).collect();
    let along = |a: usize, b: usize| (net.positions[b] - net.positions[a]).normalize();
    for mechanism in &found.mechanisms {
        let mut moved = vec![Vector3::zeros(); net.positions.len()];
        mechanism
            .movements
            .iter()
            .for_each(|(node, by)| moved[node.index()] = *by);
        for (_, (a, b, ..)) in members
            .iter()
            .enumerate()
            .filter(|(index, _)| !net.removed.contains(index))
        {
            let stretched = along(*a, *b).dot(&(moved[*b] - moved[*a]));
            // Movements below a thousandth are not told.
            assert!(stretched.abs() < 3e-3, "{mechanism:?} stretches {a}–{b} by {stretched}");
        }
    }
    for state in &found.self_stresses {
        let mut sums = vec![Vector3::<f64>::zeros(); net.positions.len()];
        for (segment, force) in &state.forces {
            let (a, b, ..) = members[segment.index()];
            sums[*a] += along(*a, *b) * *force;
            sums[*b] -= along(*a, *b) * *force;
        }
        for node in (0..sums.len()).filter(|n| !net.held.contains(n)) {
            assert!(sums[node].norm() < 1e-5, "{state:?} leaves {} at {node}", sums[node]);
        }
    }
}

/// Two bars on one line, their joint free in all directions: Pellegrino & Calladine 1986 take this as their first example
/// of a mechanism that prestress stiffens (in the plane m = 1, s = 1; in space one more direction across).
#[test]
fn two_bars_on_a_line() {
    let tension = 18e3;
    let mut net = Example {
        positions: vec![
            Vector3::zeros(),
            Vector3::new(6.0, 0.0, 0.0),
            Vector3::new(12.0, 0.0, 0.0),
        ],
        held: vec![0, 2],
        segments: vec![
            (0, 1, 2.4e6, 6.0 / (1.0 + tension / 2.4e6)),
            (1, 2, 2.4e6, 6.0 / (1.0 + tension / 2.4e6)),
        ],
        ..Example::default()
    };
    let found = as_given(&net, Members::All);
    counts(&found, 1, 2, 0);
    assert_eq!(found.way, MobilityWay::Dense);
    // By hand: 2 T / l across the line.
    for mechanism in &found.mechanisms {
        assert_eq!(mechanism.movements.len(), 1);
        assert_eq!(mechanism.movements[0].1.x, 0.0);
        assert!((mechanism.stiffness - 2.0 * tension / 6.0).abs() < 1e-6 && mechanism.stiffened);
    }
    let forces = &found.self_stresses[0].forces;
    assert_eq!(
        forces.iter().map(|f| f.0).collect::<Vec<_>>(),
        [0, 1].map(SegmentId::new)
    );
    assert!(forces.iter().all(|f| (f.1 - 1.0).abs() < 1e-9));

    // In the plane: the joint slides in it.
    net.sliders = vec![(1, vec![Vector3::x(), Vector3::z()])];
    counts(&as_given(&net, Members::All), 1, 1, 0);
    // Without prestress nothing stiffens it, and slack ropes are no members.
    net.segments.iter_mut().for_each(|s| s.3 = 6.1);
    counts(&as_given(&net, Members::All), 1, 1, 1);
    counts(&as_given(&net, Members::Taut), 0, 2, 2);
}

/// The joint of two bars in an open angle: rigid in their plane, free across it, and no self-stress (by hand: the rows
/// of the two directions are independent).
#[test]
fn two_bars_at_an_angle() {
    let net = Example {
        positions: vec![
            Vector3::zeros(),
            Vector3::new(3.0, 0.0, -4.0),
            Vector3::new(6.0, 0.0, 0.0),
        ],
        held: vec![0, 2],
        struts: vec![(0, 1, 1e6, 5.0), (1, 2, 1e6, 5.0)],
        ..Example::default()
    };
    let found = as_given(&net, Members::All);
    counts(&found, 0, 1, 1);
    assert_eq!(found.mechanisms[0].movements, [(NodeId::new(1), Vector3::y())]);
}

/// A flat net of n by n nodes on a held rim: 2 n (n + 1) segments in 2 n straight ropes. By hand: each rope of n free
/// nodes has n + 1 segments on n directions along it, so s = 2 n, the rank is 2 n², and every node moves across: m = n².
#[test]
fn a_flat_square_net() {
    for n in [3, 7] {
        let mut net = grid(n, 12.0, 4e6, |_, _| 0.0);
        net.segments.iter_mut().for_each(|s| s.3 /= 1.002);
        let found = as_given(&net, Members::All);
        counts(&found, 2 * n, n * n, 0);
        check_listed(&net, &found);
        assert_eq!(found.mechanisms.len(), n * n);
        assert!(
            found
                .mechanisms
                .iter()
                .all(|m| m.movements.len() == 1 && m.movements[0].1 == Vector3::z())
        );
        assert!(
            found.self_stresses.iter().all(|s| s.forces.len() == n + 1),
            "one rope each"
        );
        // By hand: four segments of tension T and length l hold a node that moves alone.
        let (tension, length) = (4e6 * 0.002, 12.0 / (n + 1) as f64);
        let stiffness = found.mechanisms[0].stiffness;
        assert!((stiffness - 4.0 * tension / length).abs() < 1e-6 * stiffness);
    }
}

/// The same net larger than what is found in full: the counts by signs of pivots are those by hand.
#[test]
fn a_large_flat_net() {
    let n = 14;
    let mut net = grid(n, 12.0, 4e6, |_, _| 0.0);
    net.segments.iter_mut().for_each(|s| s.3 /= 1.002);
    let found = as_given(&net, Members::All);
    assert_eq!(found.way, MobilityWay::Sparse);
    counts(&found, 2 * n, n * n, 0);
    check_listed(&net, &found);
    // By hand: the softest movement of an n by n net is the product of two half waves.
    let (tension, length) = (4e6 * 0.002, 12.0 / (n + 1) as f64);
    let half = std::f64::consts::PI / (2 * (n + 1)) as f64;
    let wanted = 2.0 * 4.0 * half.sin().powi(2) * tension / length;
    let softest = found.mechanisms[0].stiffness;
    assert!((softest - wanted).abs() < 1e-5 * wanted, "{softest} {wanted}");
}

/// A prism of three struts and nine ropes in space, its triangles turned by 150° (30° beyond the
/// trigonal prism): 12 members, 18 directions. Known (Calladine 1978; Pellegrino & Calladine 1986): one state
/// of self-stress, so 18 − 11 = 7 mechanisms, six of them rigid motions and one that prestress stiffens.
fn simplex(turn: f64, bottom_held: bool) -> Example {
    let at = |i: usize, turn: f64, z: f64| {
        let angle = std::f64::consts::TAU * i as f64 / 3.0 + turn;
        Vector3::new(angle.cos(), angle.sin(), z)
    };
    let mut net = Example {
        positions: (0..3)
            .map(|i| at(i, 0.0, 0.0))
            .chain((0..3).map(|i| at(i, turn, 1.3)))
            .collect(),
        held: if bottom_held { vec![0, 1, 2] } else { Vec::new() },
        ..Example::default()
    };
    for i in 0..3 {
        let next = (i + 1) % 3;
        if !bottom_held {
            net.segments.push((i, next, 1e6, 1.0));
        }
        net.segments.push((3 + i, 3 + next, 1e6, 1.0));
        net.segments.push((next, 3 + i, 1e6, 1.0));
        net.struts.push((i, 3 + i, 1e7, 1.0));
    }
    net
}

/// Lengths that give every member the force of a state of self-stress.
fn prestressed(mut net: Example, state: &[(SegmentId, f64)], force: f64) -> Example {
    let n_ropes = net.segments.len();
    let lengths: Vec<f64> = (net.segments.iter().chain(&net.struts))
        .map(|(a, b, ..)| (net.positions[*b] - net.positions[*a]).norm())
        .collect();
    // Ropes pull.
    let sense = state.iter().find(|(s, _)| s.index() < n_ropes).unwrap().1.signum();
    for (segment, share) in state {
        let index = segment.index();
        let member = if index < n_ropes {
            &mut net.segments[index]
        } else {
            &mut net.struts[index - n_ropes]
        };
        member.3 = lengths[index] / (1.0 + sense * force * share / member.2);
    }
    net
}

#[test]
fn a_tensegrity_prism_in_space() {
    let turn = 150_f64.to_radians();
    let net = simplex(turn, false);
    let found = as_given(&net, Members::All);
    assert_eq!((found.members, found.directions), (12, 18));
    assert_eq!((found.n_self_stresses, found.n_mechanisms), (1, 7));
    check_listed(&net, &found);
    let state = &found.self_stresses[0].forces;
    assert_eq!(state.len(), 12);
    let pull = |s: &(SegmentId, f64)| s.1 > 0.0;
    let (ropes, struts): (Vec<_>, Vec<_>) = state.iter().copied().partition(|s| s.0.index() < 9);
    assert!(ropes.iter().all(pull) && !struts.iter().any(pull) || !ropes.iter().any(pull) && struts.iter().all(pull));

    let net = prestressed(net, state, 5e3);
    let found = as_given(&net, Members::All);
    // Rigid motions: translations gain nothing from prestress, nor do turns; the last one does.
    counts(&found, 1, 7, 6);
    let last = found.mechanisms.last().unwrap();
    assert!(last.stiffened && last.stiffness > 100.0, "{last:?}");

    // On held feet the rigid motions are gone.
    let held = simplex(turn, true);
    let loose = as_given(&held, Members::All);
    assert_eq!((loose.n_self_stresses, loose.n_mechanisms), (1, 1));
    let held = prestressed(held, &loose.self_stresses[0].forces.clone(), 5e3);
    counts(&as_given(&held, Members::All), 1, 1, 0);
    // Another turn has no state of self-stress and no mechanism: nine members on nine directions.
    counts(&as_given(&simplex(100_f64.to_radians(), true), Members::All), 0, 0, 0);
}

/// A chain of n segments between two supports: n members, 3 (n − 1) directions, no self-stress while it sags (by hand: at
/// each node two directions differ), so m = 3 (n − 1) − n; its own weight stiffens all of them.
#[test]
fn a_hanging_chain() {
    let n = 9;
    let mut net = Example {
        held: vec![0, n],
        ..Example::default()
    };
    for i in 0..=n {
        net.positions
            .push(Vector3::new(i as f64, 0.0, -0.05 * (i * (n - i)) as f64));
        if i > 0 {
            net.segments.push((i - 1, i, 1e6, 1.05));
        }
    }
    net.loads = vec![Vector3::new(0.0, 0.0, -800.0); n + 1];
    let solution = net.solve().unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    let found = of_state(&net, &solution.positions, Members::All);
    counts(&found, 0, 3 * (n - 1) - n, 0);
    assert!(found.mechanisms.iter().all(|m| m.stiffness > 0.0));
}

/// A mast with guys in one plane: the one mechanism is its head across the plane, and prestress does not stiffen it.
#[test]
fn a_mast_with_guys_in_its_plane() {
    let net = Example {
        positions: [[0.0, 0.0, 0.0], [0.0, 0.0, 5.0], [-4.0, 0.0, 0.0], [4.0, 0.0, 0.0]]
            .map(Vector3::from)
            .to_vec(),
        held: vec![0, 2, 3],
        segments: vec![(1, 2, 5e6, 41_f64.sqrt() / 1.003), (1, 3, 5e6, 41_f64.sqrt() / 1.003)],
        struts: vec![(0, 1, 2e7, 5.0 / (1.0 - 2.0 * 15e3 * 5.0 / 41_f64.sqrt() / 2e7))],
        ..Example::default()
    };
    let found = as_given(&net, Members::All);
    counts(&found, 1, 1, 1);
    assert_eq!(found.mechanisms[0].movements, [(NodeId::new(1), Vector3::y())]);
    // A spring across counts as a member and ends it.
    let mut sprung = net.clone();
    sprung.elastic = vec![ElasticSupportGiven {
        nodes: vec![NodeId::new(1)],
        stiffness: DMatrix::from_diagonal(&nalgebra::DVector::from_vec(vec![0.0, 1e4, 0.0])),
    }];
    let found = as_given(&sprung, Members::All);
    counts(&found, 1, 0, 0);
    assert_eq!(found.members, 4);
}

/// Nodes that no member leads to move in all three directions, each told by itself.
#[test]
fn loose_nodes_move_alone() {
    let mut net = grid(4, 12.0, 4e6, |u, w| u * u - w * w);
    net.segments.iter_mut().for_each(|s| s.3 /= 1.002);
    let base = as_given(&net, Members::Taut);
    let (a, b) = (net.positions.len(), net.positions.len() + 1);
    net.positions
        .extend([Vector3::new(5.0, 5.0, 5.0), Vector3::new(6.0, 5.0, 5.0)]);
    net.segments
        .extend([(0, a, 4e6, 100.0), (a, b, 4e6, 100.0), (b, 1, 4e6, 100.0)]);
    let found = as_given(&net, Members::Taut);
    counts(
        &found,
        base.n_self_stresses,
        base.n_mechanisms + 6,
        base.n_not_stiffened + 6,
    );
    let alone = found.mechanisms[..6]
        .iter()
        .filter(|m| m.movements.len() == 1 && m.movements[0].0.index() >= a);
    assert_eq!(alone.count(), 6);
}

/// Rank and null spaces by the plain normal equations of a dense eigensolver, on random nets, below and above the size
/// that is found in full.
#[test]
fn counts_against_a_dense_eigensolver() {
    for (seed, n) in [(1, 3), (2, 4), (3, 6), (4, 12), (5, 13)] {
        let mut random = Random::new(seed);
        let rise = random.range(0.5, 2.0);
        let mut net = grid(n, 12.0, 4e6, |u, w| rise * (u * u - w * w));
        net.segments.iter_mut().for_each(|s| s.3 /= 1.003);
        // Some ropes fewer, so that the counts are no round numbers.
        for _ in 0..n {
            let index = random.index(0, net.segments.len());
            net.removed.push(index);
        }
        net.removed.sort_unstable();
        net.removed.dedup();
        let found = as_given(&net, Members::All);
        let present: Vec<_> = (0..net.segments.len()).filter(|i| !net.removed.contains(i)).collect();
        let mut matrix = DMatrix::zeros(present.len(), 3 * net.positions.len());
        for (row, index) in present.iter().enumerate() {
            let (a, b, ..) = net.segments[*index];
            let along = (net.positions[b] - net.positions[a]).normalize();
            for axis in 0..3 {
                for (node, sense) in [(a, -1.0), (b, 1.0)] {
                    if !net.held.contains(&node) {
                        matrix[(row, 3 * node + axis)] = sense * along[axis];
                    }
                }
            }
        }
        let squares = (&matrix * matrix.transpose()).symmetric_eigen().eigenvalues;
        let rank = squares.iter().filter(|v| **v > 1e-11 * squares.amax()).count();
        let directions = 3 * (net.positions.len() - net.held.len());
        assert_eq!(
            (found.rank, found.members, found.directions),
            (rank, present.len(), directions),
            "n {n}"
        );
        check_listed(&net, &found);
    }
}

/// A weight on a pulley: its rope is one member over both of its segments, so that of three directions two are free, along
/// the ellipse of equal length and across it. Its pull stiffens both: the pulley hangs at the lowest point.
#[test]
fn a_pulley_on_a_rope() {
    let at = |x: f64, z: f64, held: bool| NodeGiven {
        name: format!("{x}"),
        position: Some(Vector3::new(x, 0.0, z)),
        support: held.then(SupportGiven::default),
        attached_mass: 0.0,
    };
    let section = Example::section(1e6);
    let net = Arc::new(
        Net::new(NetGiven {
            nodes: vec![at(-4.0, 3.0, true), at(0.0, 0.0, false), at(4.0, 3.0, true)],
            cables: vec![CableGiven {
                name: "rope".into(),
                path: [0, 1, 2].map(NodeId::new).to_vec(),
                sections: vec![section; 2],
                slides: vec![Slide {
                    place: 1,
                    friction: 0.0,
                }],
                ..CableGiven::default()
            }],
            ..NetGiven::default()
        })
        .unwrap(),
    );
    let analysis = Analysis::new(Arc::clone(&net));
    let tension = 5e3;
    let case = Case {
        nodal_forces: vec![Vector3::zeros(); 3],
        unstressed_lengths: vec![10.0 / (1.0 + tension / 1e6)],
        segments: vec![SegmentLoads::default(); 2],
        support_movements: vec![Vector3::zeros(); 3],
        removed: vec![false; 2],
        ..Case::default()
    };
    let loading = Loading::new(analysis.structure(), &case, &case.unstressed_lengths, 1.0).unwrap();
    let positions: Vec<_> = net.nodes().iter().filter_map(|n| n.position).collect();
    let found = mobility(&analysis, &loading, &positions, &[tension; 2], Members::All).unwrap();
    assert_eq!((found.members, found.directions), (1, 3));
    counts(&found, 0, 2, 0);
    // By hand: across 2 T / l; along the ellipse 2 T / l (1 - n_x²) with n_x = 4/5.
    let mut stiffnesses: Vec<f64> = found.mechanisms.iter().map(|m| m.stiffness).collect();
    stiffnesses.sort_by(f64::total_cmp);
    for (found, wanted) in stiffnesses
        .iter()
        .zip([0.36 * 2.0 * tension / 5.0, 2.0 * tension / 5.0])
    {
        assert!((found - wanted).abs() < 1e-6 * wanted, "{stiffnesses:?}");
    }
}

fn softest(net: &Example, count: usize) -> (Vec<LeastStiffness>, Vec<f64>) {
    let analysis = Analysis::new(net.net());
    let case = net.case();
    let solution = solve(
        &analysis,
        &case,
        &net.positions,
        &net.lengths(),
        &Settings::default(),
        &mut |_| ControlFlow::Continue(()),
    )
    .unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    let loading = Loading::new(analysis.structure(), &case, &net.lengths(), 1.0).unwrap();
    let found = least_stiffnesses(&analysis, &loading, &solution.positions, &solution.loose_nodes, count);
    // The whole tangent by plain sums, and all of its eigenvalues.
    let free: Vec<usize> = (0..net.positions.len()).filter(|n| !net.held.contains(n)).collect();
    let place = |node: usize| free.iter().position(|n| *n == node).map(|p| 3 * p);
    let mut tangent = DMatrix::zeros(3 * free.len(), 3 * free.len());
    for ((a, b, ea, l0), force) in net.segments.iter().chain(&net.struts).zip(&solution.axial_forces) {
        let chord = solution.positions[*b] - solution.positions[*a];
        let n = chord.normalize();
        let stiffness = if *force == 0.0 { 0.0 } else { ea / l0 };
        let across = force / chord.norm();
        let block = n * n.transpose() * (stiffness - across) + nalgebra::Matrix3::identity() * across;
        for (i, j, sense) in [(a, a, 1.0), (b, b, 1.0), (a, b, -1.0), (b, a, -1.0)] {
            if let (Some(i), Some(j)) = (place(*i), place(*j)) {
                let mut entry = tangent.fixed_view_mut::<3, 3>(i, j);
                entry += block * sense;
            }
        }
    }
    let mut all: Vec<f64> = tangent.symmetric_eigen().eigenvalues.iter().copied().collect();
    all.sort_by(f64::total_cmp);
    (found, all)
}

#[test]
fn least_stiffness_against_a_dense_eigensolver() {
    let mut net = grid(9, 12.0, 4e6, |u, w| 1.2 * (u * u - w * w));
    net.segments.iter_mut().for_each(|s| s.3 /= 1.003);
    for load in [0.0, 200.0, 900.0] {
        net.loads = net
            .positions
            .iter()
            .map(|x| Vector3::new(0.0, 0.0, if x.x < 6.0 { -load } else { 0.0 }))
            .collect();
        let (found, all) = softest(&net, 5);
        assert_eq!(found.len(), 5);
        for (mode, wanted) in found.iter().zip(&all) {
            assert!(
                (mode.stiffness - wanted).abs() <= 1e-7 * wanted,
                "{} {wanted}",
                mode.stiffness
            );
            assert!(mode.residual <= 1e-5 * wanted);
            assert!((mode.movements[0].1.norm() - 1.0).abs() < 1e-5);
        }
    }
}
