//! Ropes that slide and hang, and pressure that follows.

use std::ops::ControlFlow;
use std::sync::Arc;

use nalgebra::Vector3;
use ropewalk_numerics::element::panel::vector_area;
use ropewalk_numerics::equilibrium::audit::audit_members;
use ropewalk_numerics::equilibrium::{Analysis, Settings, Solution, Termination, solve};
use ropewalk_numerics::load::{Case, SegmentLoads};
use ropewalk_numerics::model::{
    CableGiven, Net, NetGiven, NodeGiven, NodeId, PanelGiven, Section, Slide, StrutGiven, SupportGiven,
};

const EA: f64 = 1e6;

fn section() -> Section {
    Section {
        axial_stiffness: EA,
        ..Section::default()
    }
}

fn node(index: usize, x: [f64; 3], held: bool) -> NodeGiven {
    NodeGiven {
        name: format!("n{index}"),
        position: Some(Vector3::from(x)),
        support: held.then(SupportGiven::default),
        attached_mass: 0.0,
    }
}

fn rope(path: &[usize]) -> CableGiven {
    CableGiven {
        name: format!("{path:?}"),
        path: path.iter().copied().map(NodeId::new).collect(),
        sections: vec![section(); path.len() - 1],
        ..CableGiven::default()
    }
}

fn sliding(path: &[usize], friction: f64) -> CableGiven {
    CableGiven {
        slides: (1..path.len() - 1).map(|place| Slide { place, friction }).collect(),
        ..rope(path)
    }
}

fn case(net: &Net, unstressed_lengths: Vec<f64>) -> Case {
    Case {
        nodal_forces: vec![Vector3::zeros(); net.nodes().len()],
        unstressed_lengths,
        segments: vec![SegmentLoads::default(); net.segments().len()],
        support_movements: vec![Vector3::zeros(); net.nodes().len()],
        removed: vec![false; net.segments().len()],
        ..Case::default()
    }
}

#[track_caller]
fn answer(net: &Arc<Net>, case: &Case) -> Solution {
    let analysis = Analysis::new(Arc::clone(net));
    let start: Vec<_> = net.nodes().iter().map(|n| n.position.expect("given")).collect();
    let mut watch = |_: &_| ControlFlow::Continue(());
    let solution = solve(
        &analysis,
        case,
        &start,
        &case.unstressed_lengths,
        &Settings::default(),
        &mut watch,
    )
    .expect("held");
    assert_eq!(solution.termination, Termination::Converged);
    let audit = audit_members(
        net,
        case,
        &solution.positions,
        &solution.axial_forces,
        &solution.members,
    );
    assert!(audit.passed, "{audit:?}");
    assert!(
        solution
            .axial_forces
            .iter()
            .zip(net.segments())
            .all(|(n, s)| { *n >= 0.0 || matches!(s.member, ropewalk_numerics::model::Member::Strut(_)) })
    );
    solution
}

fn net(nodes: Vec<NodeGiven>, cables: Vec<CableGiven>) -> Arc<Net> {
    Arc::new(
        Net::new(NetGiven {
            nodes,
            cables,
            ..NetGiven::default()
        })
        .expect("valid"),
    )
}

/// A weight on a pulley that runs along a rope between two points of unlike height. The rope makes equal angles with the
/// vertical: `l sin φ = span`, so that `T = W / (2 cos φ)` with `l` the stretched length.
#[test]
fn a_pulley_finds_the_lowest_point_of_its_rope() {
    let net = net(
        vec![
            node(0, [0.0, 0.0, 3.0], true),
            node(1, [1.0, 0.2, 0.0], false),
            node(2, [9.0, 0.0, 1.0], true),
        ],
        vec![sliding(&[0, 1, 2], 0.0)],
    );
    let mut case = case(&net, vec![11.0]);
    case.nodal_forces[1] = Vector3::new(0.0, 0.0, -3000.0);
    let solution = answer(&net, &case);
    let t = solution.axial_forces[0];
    assert!((solution.axial_forces[1] - t).abs() < 1e-9 * t);
    let length = 11.0 * (1.0 + t / EA);
    let cosine = (1.0 - (9.0 / length) * (9.0 / length)).sqrt();
    assert!((t - 3000.0 / (2.0 * cosine)).abs() < 1e-6 * t, "{t}");
    assert!(solution.positions[1].y.abs() < 1e-6);
    assert!((solution.members.lying.iter().sum::<f64>() - 11.0).abs() < 1e-10);
}

/// Euler–Eytelwein: a rope from an anchor over a fixed edge to a weight slips until the anchor feels `W exp(−μ θ)`.
#[test]
fn friction_at_an_edge_keeps_its_share() {
    for (mu, weight) in [(0.1, 2000.0), (0.3, 2000.0), (0.0, 2000.0)] {
        let net = net(
            vec![
                node(0, [-4.0, 0.0, 0.0], true),
                node(1, [0.0, 0.0, 0.0], true),
                node(2, [0.0, 0.0, -3.0], false),
            ],
            vec![sliding(&[0, 1, 2], mu)],
        );
        let mut case = case(&net, vec![7.0]);
        case.nodal_forces[2] = Vector3::new(0.0, 0.0, -weight);
        case.lying = vec![4.0, 3.0];
        let solution = answer(&net, &case);
        let kept = weight * (-mu * std::f64::consts::FRAC_PI_2).exp();
        assert!((solution.axial_forces[1] - weight).abs() < 1e-6);
        assert!(
            (solution.axial_forces[0] - kept).abs() < 1e-6 * kept,
            "{mu}: {}",
            solution.axial_forces[0]
        );
    }
}

/// With much friction and little difference nothing slips: the rope behaves as if clamped where it lay.
#[test]
fn enough_friction_is_a_clamp() {
    let nodes = || {
        vec![
            node(0, [0.0, 0.0, 0.0], true),
            node(1, [4.0, 0.0, 1.0], false),
            node(2, [8.0, 0.0, 0.0], true),
            node(3, [4.0, 3.0, -1.0], true),
            node(4, [4.0, -3.0, -1.0], true),
        ]
    };
    let side = || vec![rope(&[1, 3]), rope(&[1, 4])];
    let mut cables = vec![sliding(&[0, 1, 2], 2.0)];
    cables.extend(side());
    let slides = net(nodes(), cables);
    let mut cables = vec![rope(&[0, 1, 2])];
    cables.extend(side());
    let clamped = net(nodes(), cables);
    let mut of_slides = case(&slides, vec![8.2, 3.58, 3.58]);
    of_slides.nodal_forces[1] = Vector3::new(300.0, 0.0, -500.0);
    of_slides.lying = vec![4.1, 4.1, 3.58, 3.58];
    let mut of_clamped = case(&clamped, vec![4.1, 4.1, 3.58, 3.58]);
    of_clamped.nodal_forces[1] = Vector3::new(300.0, 0.0, -500.0);
    let (a, b) = (answer(&slides, &of_slides), answer(&clamped, &of_clamped));
    for (x, y) in a.positions.iter().zip(&b.positions) {
        assert!((x - y).norm() < 1e-8, "{x} {y}");
    }
    // Freely sliding it would go elsewhere.
    let mut cables = vec![sliding(&[0, 1, 2], 0.0)];
    cables.extend(side());
    let free = net(nodes(), cables);
    let c = answer(&free, &of_slides);
    assert!((c.positions[1] - b.positions[1]).norm() > 1e-3);
    assert!((c.axial_forces[0] - c.axial_forces[1]).abs() < 1e-6 * c.axial_forces[0]);
}

/// One rope hung from two points, as one piece and as four: the inner nodes lie on the curve.
#[test]
fn pieces_of_a_hanging_rope_make_one_curve() {
    let ends = [[0.0, 0.0, 5.0], [40.0, 3.0, 2.0]];
    let hanging = |inner: usize| {
        let mut nodes = vec![node(0, ends[0], true)];
        for i in 1..=inner {
            let share = i as f64 / (inner + 1) as f64;
            nodes.push(node(i, [40.0 * share, 3.0 * share, 5.0 - 3.0 * share], false));
        }
        nodes.push(node(inner + 1, ends[1], true));
        let path: Vec<usize> = (0..inner + 2).collect();
        let net = net(
            nodes,
            vec![CableGiven {
                hangs: true,
                ..rope(&path)
            }],
        );
        let mut case = case(&net, vec![42.0 / (inner + 1) as f64; inner + 1]);
        case.segments
            .iter_mut()
            .for_each(|s| s.per_length = Vector3::new(0.0, 0.0, -20.0));
        answer(&net, &case)
    };
    let (one, four) = (hanging(0), hanging(3));
    assert!((one.members.pulls[0][0] - four.members.pulls[0][0]).norm() < 1e-7 * one.axial_forces[0]);
    assert!((one.members.pulls[0][1] - four.members.pulls[3][1]).norm() < 1e-7 * one.axial_forces[0]);
    assert!((one.members.lengths[0] - four.members.lengths.iter().sum::<f64>()).abs() < 1e-9);
}

/// A square net with a fixed rim under pressure: the loads sum to the pressure on the area that the rim spans.
#[test]
fn pressure_follows_the_net() {
    for (pressure, prestrain) in [(-400.0, 0.003), (600.0, 0.001), (-3000.0, -0.02), (900.0, -0.1)] {
        let n = 5;
        let at = |i: usize, j: usize| i * n + j;
        let rim = |i: usize, j: usize| i == 0 || j == 0 || i == n - 1 || j == n - 1;
        let mut nodes = Vec::new();
        for i in 0..n {
            for j in 0..n {
                let (x, y) = (2.0 * i as f64, 2.0 * j as f64);
                nodes.push(node(
                    at(i, j),
                    [x, y, 0.02 * (x - 4.0) * (x - 4.0) - 0.015 * (y - 4.0) * (y - 4.0)],
                    rim(i, j),
                ));
            }
        }
        let mut cables = Vec::new();
        for i in 1..n - 1 {
            cables.push(rope(&(0..n).map(|j| at(i, j)).collect::<Vec<_>>()));
            cables.push(rope(&(0..n).map(|j| at(j, i)).collect::<Vec<_>>()));
        }
        let panels = (0..(n - 1) * (n - 1)).map(|p| {
            let (i, j) = (p / (n - 1), p % (n - 1));
            PanelGiven {
                name: format!("p{p}"),
                corners: [at(i, j), at(i + 1, j), at(i + 1, j + 1), at(i, j + 1)]
                    .map(NodeId::new)
                    .to_vec(),
            }
        });
        let net = Arc::new(
            Net::new(NetGiven {
                nodes,
                cables,
                panels: panels.collect(),
                ..NetGiven::default()
            })
            .expect("valid"),
        );
        let place = |n: NodeId| net.nodes()[n.index()].position.expect("given");
        let lengths = net
            .segments()
            .iter()
            .map(|s| (place(s.ends[1]) - place(s.ends[0])).norm() / (1.0 + prestrain));
        let mut case = case(&net, lengths.collect());
        case.pressures = vec![pressure; net.panels().len()];
        let solution = answer(&net, &case);
        eprintln!("{pressure} {prestrain}: {} factorisations", solution.factorisations);
        let areas = net.panels().iter().map(|panel| {
            let corners: Vec<_> = panel.corners.iter().map(|n| solution.positions[n.index()]).collect();
            vector_area(&corners)
        });
        let sum: Vector3<f64> = areas.sum::<Vector3<f64>>() * -pressure;
        let audit = audit_members(
            &net,
            &case,
            &solution.positions,
            &solution.axial_forces,
            &solution.members,
        );
        assert!((audit.load_sum - sum).norm() < 1e-9 * sum.norm());
        assert!((audit.load_sum.z + pressure * 64.0).abs() < 1e-9 * sum.norm());
    }
}

/// Masts, sliding guys, a hanging rope and pressure in one net.
#[test]
fn all_kinds_in_one_net() {
    let nodes = vec![
        node(0, [0.0, 0.0, 4.0], false),
        node(1, [0.0, 0.0, 0.0], true),
        node(2, [-4.0, 3.0, 0.0], true),
        node(3, [-4.0, -3.0, 0.0], true),
        node(4, [6.0, 4.0, 1.0], true),
        node(5, [6.0, -4.0, 1.0], true),
        node(6, [3.0, 0.0, 2.4], false),
    ];
    let cables = vec![
        sliding(&[2, 0, 3], 0.15),
        rope(&[0, 6]),
        rope(&[6, 4]),
        rope(&[6, 5]),
        CableGiven {
            hangs: true,
            ..rope(&[0, 4])
        },
        rope(&[0, 5]),
    ];
    let net = Arc::new(
        Net::new(NetGiven {
            nodes,
            cables,
            struts: vec![StrutGiven {
                name: "mast".into(),
                ends: [NodeId::new(1), NodeId::new(0)],
                section: Section {
                    axial_stiffness: 1e8,
                    ..Section::default()
                },
            }],
            panels: vec![
                PanelGiven {
                    name: "a".into(),
                    corners: [0, 5, 6].map(NodeId::new).to_vec(),
                },
                PanelGiven {
                    name: "b".into(),
                    corners: [0, 6, 4].map(NodeId::new).to_vec(),
                },
            ],
            ..NetGiven::default()
        })
        .expect("valid"),
    );
    let mut case = case(&net, vec![12.7, 3.38, 5.16, 5.16, 7.85, 7.77, 4.0]);
    case.segments[5].per_length = Vector3::new(0.0, 0.0, -30.0);
    case.pressures = vec![-500.0, -350.0];
    let solution = answer(&net, &case);
    assert!(solution.axial_forces[7] < 0.0);
}

/// The audit denies rope that is missing, tensions beyond friction, and a hanging rope that misses its node.
#[test]
fn false_claims_are_denied() {
    let slides = net(
        vec![
            node(0, [-4.0, 0.0, 0.0], true),
            node(1, [0.0, 0.0, 0.0], true),
            node(2, [0.0, 0.0, -3.0], false),
        ],
        vec![sliding(&[0, 1, 2], 0.1)],
    );
    let mut loaded = case(&slides, vec![7.0]);
    loaded.nodal_forces[2] = Vector3::new(0.0, 0.0, -2000.0);
    loaded.lying = vec![4.0, 3.0];
    let solution = answer(&slides, &loaded);
    let passes = |net: &Net, case: &Case, solution: &Solution| {
        audit_members(
            net,
            case,
            &solution.positions,
            &solution.axial_forces,
            &solution.members,
        )
        .passed
    };
    let mut short = solution.clone();
    short.members.lying[0] -= 1e-6;
    assert!(!passes(&slides, &loaded, &short));
    let without_friction = net(
        slides
            .nodes()
            .iter()
            .enumerate()
            .map(|(i, n)| node(i, n.position.expect("given").into(), i != 2))
            .collect(),
        vec![sliding(&[0, 1, 2], 0.0)],
    );
    assert!(passes(&slides, &loaded, &solution) && !passes(&without_friction, &loaded, &solution));

    let hangs = net(
        vec![node(0, [0.0, 0.0, 0.0], true), node(1, [20.0, 0.0, 1.0], true)],
        vec![CableGiven {
            hangs: true,
            ..rope(&[0, 1])
        }],
    );
    let mut heavy = case(&hangs, vec![20.5]);
    heavy.segments[0].per_length = Vector3::new(0.0, 0.0, -50.0);
    let mut solution = answer(&hangs, &heavy);
    solution.members.pulls[0][0].x *= 1.0 + 1e-6;
    assert!(!passes(&hangs, &heavy, &solution));
}
