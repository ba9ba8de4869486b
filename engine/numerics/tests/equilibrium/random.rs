//! Many small random nets with everything at once: whatever comes of them, no panic, no rope that pushes, and no claim of
//! balance that the audit denies.

use std::collections::BTreeMap;

use nalgebra::{DMatrix, Vector3};
use ropewalk_numerics::equilibrium::audit::audit;
use ropewalk_numerics::equilibrium::{LoadSteps, Settings, Solution, SolveError, Termination, Way};
use ropewalk_numerics::model::ElasticSupportGiven;

use crate::families::{mesh, saddle, tent};
use crate::nets::{Example, Random};

/// What came of some nets.
#[derive(Debug, Default)]
struct Count {
    of: u32,
    endings: BTreeMap<String, u32>,
    factorisations: Vec<u32>,
}

impl Count {
    fn add(&mut self, outcome: &Result<Solution, SolveError>) {
        self.of += 1;
        let ending = match outcome {
            Ok(solution) => {
                self.factorisations.push(solution.factorisations);
                match (solution.termination, solution.way) {
                    (Termination::Converged, Way::Newton) => "solved".to_owned(),
                    (Termination::Converged, way) => format!("solved by {way:?}"),
                    (other, _) => format!("{other:?}"),
                }
            }
            Err(SolveError::FreeMovement { .. }) => "free movement".to_owned(),
            Err(SolveError::NotHeld { .. }) => "not held".to_owned(),
            Err(SolveError::Loading(_)) => "numbers".to_owned(),
        };
        *self.endings.entry(ending).or_default() += 1;
    }

    fn print(&mut self, name: &str) {
        self.factorisations.sort_unstable();
        let count = self.factorisations.len();
        let at = |share: usize| {
            self.factorisations
                .get((count * share / 100).min(count.max(1) - 1))
                .copied()
        };
        println!(
            "random {name}: {} nets, {:?}, factorisations median {:?}, 95 % {:?}, worst {:?}",
            self.of,
            self.endings,
            at(50),
            at(95),
            at(100)
        );
    }

    fn gave_up(&self) -> u32 {
        ["IterationLimit", "StepTooSmall", "RunsAway"]
            .iter()
            .filter_map(|key| self.endings.get(*key))
            .sum()
    }
}

/// What must hold of every ending.
#[track_caller]
fn check(name: &str, seed: u64, net: &Example, outcome: &Result<Solution, SolveError>) {
    let Ok(solution) = outcome else { return };
    let model = net.net();
    assert!(
        solution.positions.iter().all(|x| x.iter().all(|c| c.is_finite())),
        "{name} {seed}"
    );
    let ropes = &solution.axial_forces[..net.segments.len()];
    assert!(
        ropes.iter().all(|force| *force >= 0.0),
        "{name} {seed}: a rope pushes: {ropes:?}"
    );
    if solution.termination == Termination::Converged {
        assert_eq!(solution.load_factor, 1.0, "{name} {seed}");
        let state = audit(&model, &net.case(), &solution.positions, &solution.axial_forces);
        assert!(state.passed, "{name} {seed}: {state:?}");
    }
}

fn run(name: &str, seeds: std::ops::Range<u64>, draw: impl Fn(&mut Random) -> Example) -> Count {
    let mut count = Count::default();
    for seed in seeds {
        let mut random = Random::new(seed);
        let net = draw(&mut random);
        let steps = if random.unit() < 0.1 {
            LoadSteps::Equal(3)
        } else {
            LoadSteps::FullFirst
        };
        let settings = Settings {
            load_steps: steps,
            ..Settings::default()
        };
        let outcome = net.solve_with(&settings);
        check(name, seed, &net, &outcome);
        count.add(&outcome);
    }
    count.print(name);
    count
}

/// Temperatures, moved supports, ropes taken out, springs, sliding supports: each with some likelihood.
fn everything(net: &mut Example, random: &mut Random) {
    let chance = |random: &mut Random| random.unit() < 0.4;
    let n_segments = net.segments.len() + net.struts.len();
    if chance(random) {
        net.strains = (0..n_segments).map(|_| random.range(-2e-3, 2e-3)).collect();
    }
    if chance(random) {
        let by = Vector3::from_fn(|_, _| random.range(-0.3, 0.3));
        let node = net.held[random.index(0, net.held.len())];
        net.movements.push((node, by));
    }
    if chance(random) {
        net.removed = (0..random.index(1, 4))
            .map(|_| random.index(0, net.segments.len()))
            .collect();
        net.removed.sort_unstable();
        net.removed.dedup();
    }
    if chance(random) && net.held.len() > 3 {
        let node = net.held.remove(random.index(0, net.held.len()));
        net.movements.retain(|(moved, _)| *moved != node);
        let along = Vector3::from_fn(|_, _| random.range(-1.0, 1.0));
        net.sliders.push((node, vec![along]));
    }
    if chance(random) && net.held.len() > 3 {
        let node = net.held.remove(random.index(0, net.held.len()));
        net.movements.retain(|(moved, _)| *moved != node);
        let stiffness = random.power(4.0, 8.0);
        net.elastic.push(ElasticSupportGiven {
            nodes: vec![ropewalk_numerics::model::NodeId::new(node)],
            stiffness: DMatrix::identity(3, 3) * stiffness,
        });
    }
}

/// A prism of struts between ropes on a held triangle, its top given far from where it will be.
fn far_prism(random: &mut Random) -> Example {
    let turn = random.range(0.3, 2.8);
    let at = |i: usize, turn: f64, z: f64| {
        let angle = std::f64::consts::TAU * i as f64 / 3.0 + turn;
        Vector3::new(2.0 * angle.cos(), 2.0 * angle.sin(), z)
    };
    let mut net = Example {
        positions: (0..3)
            .map(|i| at(i, 0.0, 0.0))
            .chain((0..3).map(|i| at(i, turn, 3.0)))
            .collect(),
        held: vec![0, 1, 2],
        ..Example::default()
    };
    let (rope, strut, tight) = (random.power(4.0, 6.5), random.power(6.0, 7.5), random.range(0.95, 1.03));
    for i in 0..3 {
        let apart = |a: usize, b: usize| (net.positions[a] - net.positions[b]).norm();
        let (top, next, foot) = (3 + i, 3 + (i + 1) % 3, (i + 1) % 3);
        net.segments.push((top, next, rope, tight * apart(top, next)));
        net.segments.push((i, top, rope, tight * apart(i, top)));
        net.struts.push((foot, top, strut, apart(foot, top)));
    }
    let force = rope * random.power(-4.0, -2.0);
    net.loads = vec![Vector3::zeros(); 3];
    for i in 0..3 {
        net.positions[3 + i] += Vector3::from_fn(|_, _| random.range(-2.0, 2.0));
        net.loads
            .push(Vector3::from_fn(|_, _| random.range(-force, force)) - Vector3::z() * force);
    }
    net
}

/// A mast of some lengths with three guys at each joint, somewhat off its place.
fn leaning_mast(random: &mut Random) -> Example {
    let n = random.index(1, 5);
    let off = random.range(0.0, 1.5);
    let mut net = Example {
        positions: vec![Vector3::zeros()],
        held: vec![0],
        loads: vec![Vector3::zeros()],
        ..Example::default()
    };
    let tight = random.range(0.985, 1.03);
    let force = random.power(2.5, 4.3);
    for joint in 1..=n {
        let place = Vector3::new(0.0, 0.0, 3.0 * joint as f64) + Vector3::from_fn(|_, _| random.range(-off, off));
        net.positions.push(place);
        net.loads
            .push(Vector3::from_fn(|_, _| random.range(-force, force)) - Vector3::z() * force);
        net.struts.push((joint - 1, joint, 2e7, 3.0));
    }
    for joint in 1..=n {
        let first = random.range(0.0, 2.0);
        for guy in 0..3 {
            let angle = first + std::f64::consts::TAU * f64::from(guy) / 3.0;
            net.held.push(net.positions.len());
            net.segments.push((
                joint,
                net.positions.len(),
                5e6,
                tight * 6.0_f64.hypot(3.0 * joint as f64),
            ));
            net.positions
                .push(Vector3::new(6.0 * angle.cos(), 6.0 * angle.sin(), 0.0));
        }
    }
    net.loads.resize(net.positions.len(), Vector3::zeros());
    net
}

#[test]
fn meshes_with_everything() {
    run("meshes", 1000..1700, |random| {
        let mut net = small_mesh(random);
        everything(&mut net, random);
        net
    });
}

fn small_mesh(random: &mut Random) -> Example {
    loop {
        let net = mesh(random);
        if net.positions.len() <= 40 {
            return net;
        }
    }
}

#[test]
fn saddles_with_everything() {
    run("saddles", 2000..2300, |random| {
        let mut net = loop {
            let net = saddle(random);
            if net.positions.len() <= 60 {
                break net;
            }
        };
        everything(&mut net, random);
        net
    });
}

#[test]
fn tents_with_everything() {
    run("tents", 3000..3300, |random| {
        let mut net = loop {
            let net = tent(random);
            if net.positions.len() <= 60 {
                break net;
            }
        };
        everything(&mut net, random);
        net
    });
}

#[test]
fn strut_nets_far_from_their_place() {
    let prisms = run("far prisms", 4000..4300, far_prism);
    let masts = run("leaning masts", 5000..5300, leaning_mast);
    // Before relaxation had its share of the allowance, 22 of these prisms ended without an answer.
    assert_eq!((prisms.gave_up(), masts.gave_up()), (0, 0));
}

/// A part that nothing holds carries a load: it is named, and never "converges" far away.
#[test]
fn loaded_parts_that_nothing_holds_are_named() {
    for seed in 6000..6200 {
        let mut random = Random::new(seed);
        let mut net = small_mesh(&mut random);
        let island = small_mesh(&mut random);
        let first = net.positions.len();
        net.loads.resize(first, Vector3::zeros());
        net.positions
            .extend(island.positions.iter().map(|x| x + Vector3::new(30.0, 0.0, 0.0)));
        net.segments.extend(
            island
                .segments
                .iter()
                .map(|(a, b, ea, l)| (a + first, b + first, *ea, *l)),
        );
        // The island keeps no support, or slides on them all along one line.
        if seed % 2 == 0 {
            net.sliders
                .extend(island.held.iter().map(|node| (node + first, vec![Vector3::z()])));
        }
        let force = random.power(-2.0, 3.0);
        net.loads.extend(island.positions.iter().map(|_| Vector3::zeros()));
        // On the part of the island that its first segment belongs to.
        let loaded = island.segments[random.index(0, island.segments.len())].0 + first;
        net.loads[loaded] = Vector3::new(0.0, 0.0, -force);
        match net.solve() {
            Err(SolveError::NotHeld {
                nodes,
                direction,
                force: left,
            }) => {
                assert!(nodes.iter().any(|node| node.index() == loaded), "{seed}: {nodes:?}");
                assert!(nodes.iter().all(|node| node.index() >= first), "{seed}: {nodes:?}");
                assert!(
                    (direction.z + 1.0).abs() < 1e-6 && (left - force).abs() < 1e-6 * force,
                    "{seed}"
                );
            }
            other => panic!("{seed}: {other:?}"),
        }
    }
}
