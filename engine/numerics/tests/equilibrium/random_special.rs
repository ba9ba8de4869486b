//! Random nets with ropes that slide, freely or against friction, and hang, and with pressure that follows: no panic, no
//! rope that pushes, and no claim of balance that the audit denies.

use std::ops::ControlFlow;
use std::sync::Arc;

use nalgebra::Vector3;
use ropewalk_numerics::equilibrium::audit::audit_members;
use ropewalk_numerics::equilibrium::{Analysis, Settings, Solution, SolveError, Termination, solve};
use ropewalk_numerics::load::{Case, SegmentLoads};
use ropewalk_numerics::model::{
    CableGiven, Net, NetGiven, NodeGiven, NodeId, PanelGiven, Section, Slide, SupportGiven,
};

use crate::nets::Random;

/// A saddle of `n` by `n` free nodes of whole ropes, of which some slide, some hang under their weight, with a case.
///
/// Ropes slide with friction coefficients up to `most_friction`.
fn draw(random: &mut Random, with_pressure: bool, most_friction: f64) -> (Arc<Net>, Case) {
    let n = random.index(2, 6);
    let m = n + 2;
    let (rise, ea) = (random.range(0.5, 2.0), random.power(5.5, 7.0));
    let edge = |k: usize| k == 0 || k == m - 1;
    let mut number = vec![usize::MAX; m * m];
    let mut nodes = Vec::new();
    for i in 0..m {
        for j in 0..m {
            if edge(i) && edge(j) {
                continue;
            }
            number[i * m + j] = nodes.len();
            let at = |k: usize| 2.0 * k as f64 / (m - 1) as f64 - 1.0;
            let (u, w) = (at(i), at(j));
            nodes.push(NodeGiven {
                name: format!("n{i}-{j}"),
                position: Some(Vector3::new(6.0 * u, 6.0 * w, rise * (u * u - w * w))),
                support: (edge(i) || edge(j)).then(SupportGiven::default),
                attached_mass: 0.0,
            });
        }
    }
    let mut cables = Vec::new();
    for k in 1..m - 1 {
        for along_i in [true, false] {
            let place = |l: usize| if along_i { number[l * m + k] } else { number[k * m + l] };
            let hangs = random.unit() < 0.2;
            // Ropes slide over those of the other direction, at a few of their nodes.
            let slides: Vec<_> = (1..m - 1)
                .filter(|_| along_i && !hangs && random.unit() < 0.3)
                .collect();
            let friction = match most_friction > 0.0 {
                true => random.range(0.0, most_friction),
                false => 0.0,
            };
            cables.push(CableGiven {
                name: format!("c{k}-{along_i}"),
                path: (0..m).map(|l| NodeId::new(place(l))).collect(),
                sections: vec![
                    Section {
                        axial_stiffness: ea,
                        ..Section::default()
                    };
                    m - 1
                ],
                slides: slides.into_iter().map(|place| Slide { place, friction }).collect(),
                hangs,
            });
        }
    }
    let mut panels = Vec::new();
    if with_pressure {
        for i in 1..m - 2 {
            for j in 1..m - 2 {
                let corner = |a: usize, b: usize| NodeId::new(number[a * m + b]);
                panels.push(PanelGiven {
                    name: format!("p{i}-{j}"),
                    corners: vec![corner(i, j), corner(i + 1, j), corner(i + 1, j + 1), corner(i, j + 1)],
                });
            }
        }
    }
    let n_panels = panels.len();
    let net = Net::new(NetGiven {
        nodes,
        cables,
        panels,
        ..NetGiven::default()
    })
    .expect("valid");
    let strain = random.range(-0.01, 4e-3);
    let chord = |s: usize| {
        let [a, b] = net.segments()[s]
            .ends
            .map(|node| net.nodes()[node.index()].position.expect("given"));
        (b - a).norm()
    };
    let lengths = net
        .reaches()
        .iter()
        .map(|reach| reach.segments.clone().map(chord).sum::<f64>() / (1.0 + strain));
    let force = ea * random.power(-5.0, -3.0);
    let weight = Vector3::new(0.0, 0.0, -0.1 * force);
    let case = Case {
        nodal_forces: net
            .nodes()
            .iter()
            .map(|_| Vector3::new(0.0, 0.0, -force * random.unit()))
            .collect(),
        unstressed_lengths: lengths.collect(),
        segments: (net.segments().iter())
            .map(|segment| SegmentLoads {
                per_length: if segment.hangs { weight } else { Vector3::zeros() },
                ..SegmentLoads::default()
            })
            .collect(),
        support_movements: vec![Vector3::zeros(); net.nodes().len()],
        removed: vec![false; net.segments().len()],
        pressures: (0..n_panels).map(|_| 0.3 * force * random.range(-1.0, 1.0)).collect(),
        ..Case::default()
    };
    (Arc::new(net), case)
}

fn run(name: &str, seeds: std::ops::Range<u64>, with_pressure: bool) -> (usize, usize) {
    let (mut of, mut solved) = (0, 0);
    let mut endings = std::collections::BTreeMap::<String, u32>::new();
    for seed in seeds {
        let (net, case) = draw(&mut Random::new(seed), with_pressure, 0.0);
        let analysis = Analysis::new(Arc::clone(&net));
        let start: Vec<_> = net.nodes().iter().filter_map(|node| node.position).collect();
        let outcome = solve(
            &analysis,
            &case,
            &start,
            &case.unstressed_lengths,
            &Settings::default(),
            &mut |_| ControlFlow::Continue(()),
        );
        of += 1;
        let ending = match &outcome {
            Ok(solution) => format!("{:?}", solution.termination),
            Err(SolveError::FreeMovement { .. }) => "free movement".to_owned(),
            Err(other) => panic!("{name} {seed}: {other}"),
        };
        *endings.entry(ending).or_default() += 1;
        let Ok(solution) = outcome else { continue };
        assert!(
            solution.positions.iter().all(|x| x.iter().all(|c| c.is_finite())),
            "{name} {seed}"
        );
        assert!(
            solution.axial_forces.iter().all(|force| *force >= 0.0),
            "{name} {seed}: a rope pushes"
        );
        if solution.termination == Termination::Converged {
            solved += 1;
            let audit = audit_members(
                &net,
                &case,
                &solution.positions,
                &solution.axial_forces,
                &solution.members,
            );
            assert!(audit.passed, "{name} {seed}: {audit:?}");
        }
    }
    println!("random {name}: {endings:?}");
    (solved, of)
}

#[test]
fn ropes_that_slide_and_hang() {
    // Ropes that slide without friction and hang keep the energy convex, so that each has an answer.
    let (solved, of) = run("sliding and hanging", 7000..7150, false);
    assert_eq!(solved, of);
}

#[test]
fn pressure_that_follows() {
    let (solved, of) = run("pressed", 8000..8100, true);
    // No existence is claimed there; a pressure of this size carries nearly every net.
    assert!(10 * solved >= 9 * of, "{solved} of {of}");
}

/// What friction did at the nodes through which ropes slide.
#[derive(Debug, Default)]
struct Held {
    stick: u32,
    slip: u32,
}

/// Every node through which a rope slides, against Euler–Eytelwein, by sums that share no code with the solver: the ratio
/// of tensions is within `exp(μ θ)`, and where rope has passed it is at that limit, with the larger tension ahead.
fn check_friction(name: &str, net: &Net, before: &[f64], solution: &Solution, held: &mut Held) {
    for reach in net.reaches().iter().filter(|reach| reach.slides()) {
        let whole: f64 = before[reach.segments.clone()].iter().sum();
        for (place, friction) in reach.friction.iter().enumerate() {
            let e = reach.segments.start + place;
            let direction = |segment: usize| {
                let [a, b] = net.segments()[segment].ends.map(|n| solution.positions[n.index()]);
                (b - a).normalize()
            };
            let (into, out) = (direction(e), direction(e + 1));
            let turn = into.dot(&out).clamp(-1.0, 1.0).acos();
            let [behind, ahead] = [solution.axial_forces[e], solution.axial_forces[e + 1]];
            if behind == 0.0 && ahead == 0.0 {
                continue;
            }
            let (ratio, most) = ((ahead / behind).ln(), friction * turn);
            assert!(ratio.abs() <= most + 1e-6, "{name}: {ratio} beyond {most}");
            let gone = |lying: &[f64]| lying[e + 1..reach.segments.end].iter().sum::<f64>();
            let passed = gone(&solution.members.lying) - gone(before);
            if passed.abs() > 1e-8 * whole {
                held.slip += 1;
                assert!(
                    (ratio - passed.signum() * most).abs() < 1e-6,
                    "{name}: {passed} m passed at {ratio} of {most}"
                );
            } else {
                held.stick += 1;
            }
        }
    }
}

#[test]
fn ropes_that_slide_against_friction() {
    let mut held = Held::default();
    let mut endings = std::collections::BTreeMap::<String, u32>::new();
    let (mut of, mut solved) = (0, 0);
    for seed in 9000..9120 {
        let (net, case) = draw(&mut Random::new(seed), false, 0.15);
        let name = format!("friction {seed}");
        let analysis = Analysis::new(Arc::clone(&net));
        let given: Vec<_> = net.nodes().iter().filter_map(|node| node.position).collect();
        let answer = |case: &Case, start: &[Vector3<f64>]| {
            let lengths = &case.unstressed_lengths;
            let watch = &mut |_: &_| ControlFlow::Continue(());
            solve(&analysis, case, start, lengths, &Settings::default(), watch)
        };
        // The reference state slides freely, under a third of the loads.
        let mut dead = case.clone();
        dead.nodal_forces.iter_mut().for_each(|force| *force *= 0.3);
        let Ok(reference) = answer(&dead, &given) else { continue };
        assert_eq!(reference.termination, Termination::Converged, "{name}");
        let mut full = case;
        full.lying.clone_from(&reference.members.lying);
        of += 1;
        let solution = match answer(&full, &reference.positions) {
            Ok(solution) => solution,
            Err(error) => panic!("{name}: {error}"),
        };
        *endings.entry(format!("{:?}", solution.termination)).or_default() += 1;
        assert!(
            solution.positions.iter().all(|x| x.iter().all(|c| c.is_finite())),
            "{name}"
        );
        assert!(
            solution.axial_forces.iter().all(|force| *force >= 0.0),
            "{name}: a rope pushes"
        );
        if solution.termination == Termination::Converged {
            solved += 1;
            let audit = audit_members(
                &net,
                &full,
                &solution.positions,
                &solution.axial_forces,
                &solution.members,
            );
            assert!(audit.passed, "{name}: {audit:?}");
            check_friction(&name, &net, &reference.members.lying, &solution, &mut held);
        }
    }
    println!("random friction: {endings:?}, {held:?}");
    assert!(held.stick > 20 && held.slip > 20, "{held:?}: both must occur");
    // Friction has no energy, so that no theorem promises a state; ropes of this kind all have one.
    assert_eq!(solved, of);
}
