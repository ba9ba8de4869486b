//! Six families of random nets, drawn as in the study behind the recipe; every net has to be solved.

use nalgebra::Vector3;
use ropewalk_numerics::equilibrium::audit::audit;
use ropewalk_numerics::equilibrium::{Solution, Termination};

use crate::nets::{Example, Random, grid};

const NETS_A_FAMILY: u32 = 50;

/// Downward, patterned, uplift or lateral loads on the free nodes, of size `force`.
fn load(example: &mut Example, random: &mut Random, force: f64) {
    let kind = random.index(0, 4);
    let middle = example.positions.iter().map(|x| x.x).sum::<f64>() / example.positions.len() as f64;
    for node in 0..example.positions.len() {
        if example.held.contains(&node) {
            continue;
        }
        let left = example.positions[node].x < middle;
        example.loads[node] = match kind {
            0 => Vector3::new(0.0, 0.0, -force),
            1 => Vector3::new(0.0, 0.0, if left { -force } else { -0.1 * force }),
            2 => Vector3::new(0.0, 0.0, 0.7 * force),
            _ => Vector3::new(0.5 * force, 0.1 * force, -0.5 * force),
        };
    }
}

pub(crate) fn saddle(random: &mut Random) -> Example {
    let ea = random.power(5.5, 7.5);
    let (rise, n) = (random.range(0.3, 2.0), random.index(3, 13));
    let mut net = grid(n, 12.0, ea, |u, w| rise * (u * u - w * w));
    let strain = random.power(-3.5, -2.2);
    net.segments.iter_mut().for_each(|s| s.3 /= 1.0 + strain);
    let force = ea * random.power(-4.5, -2.3);
    load(&mut net, random, force);
    net
}

fn flat(random: &mut Random) -> Example {
    let ea = random.power(5.5, 7.5);
    let mut net = grid(random.index(3, 13), 12.0, ea, |_, _| 0.0);
    let force = ea * random.power(-4.5, -2.3);
    load(&mut net, random, force);
    net
}

fn slack(random: &mut Random) -> Example {
    let ea = random.power(5.5, 7.5);
    let rise = random.range(0.0, 1.5);
    let mut net = grid(random.index(3, 11), 12.0, ea, |u, w| rise * (u * u - w * w));
    let excess = random.power(-3.0, -0.7);
    net.segments.iter_mut().for_each(|s| s.3 *= 1.0 + excess);
    let force = ea * random.power(-4.5, -2.3);
    load(&mut net, random, force);
    net
}

fn chain(random: &mut Random) -> Example {
    let n = random.index(4, 60);
    let ea = random.power(5.5, 7.5);
    let excess = random.power(-3.0, 0.0);
    let mut net = Example {
        held: vec![0, n],
        ..Example::default()
    };
    for i in 0..=n {
        let t = i as f64 / n as f64;
        net.positions.push(Vector3::new(20.0 * t, 0.0, 3.0 * t));
        if i > 0 {
            let length = (net.positions[i] - net.positions[i - 1]).norm();
            net.segments.push((i - 1, i, ea, length * (1.0 + excess)));
        }
    }
    net.loads = vec![Vector3::new(0.0, 0.0, -ea * random.power(-5.5, -3.5)); n + 1];
    net
}

/// A prestressed saddle from which slack side nets hang that nothing loads.
fn floating(random: &mut Random) -> Example {
    let mut net = saddle(random);
    for _ in 0..random.index(1, 6) {
        let (a, b) = (
            random.index(0, net.positions.len()),
            random.index(0, net.positions.len()),
        );
        if a == b {
            continue;
        }
        let middle = (net.positions[a] + net.positions[b]) / 2.0;
        let node = net.positions.len();
        net.positions.push(middle);
        net.loads.push(Vector3::zeros());
        let long = 2.0 * (net.positions[a] - middle).norm() + 3.0;
        let ea = net.segments[0].2;
        net.segments.push((a, node, ea, long));
        net.segments.push((node, b, ea, long));
    }
    net
}

/// Triangles of a Delaunay mesh by insertion (Bowyer 1981, Watson 1981, from memory).
fn delaunay(points: &[[f64; 2]]) -> Vec<[usize; 3]> {
    let n = points.len();
    let mut all = points.to_vec();
    all.extend([[-100.0, -100.0], [200.0, -100.0], [50.0, 300.0]]);
    let mut triangles = vec![[n, n + 1, n + 2]];
    for p in 0..n {
        let inside = |t: &[usize; 3]| {
            let [ax, ay] = [all[t[0]][0] - all[p][0], all[t[0]][1] - all[p][1]];
            let [bx, by] = [all[t[1]][0] - all[p][0], all[t[1]][1] - all[p][1]];
            let [cx, cy] = [all[t[2]][0] - all[p][0], all[t[2]][1] - all[p][1]];
            let (a, b, c) = (ax * ax + ay * ay, bx * bx + by * by, cx * cx + cy * cy);
            let turn = (bx - ax) * (cy - ay) - (by - ay) * (cx - ax);
            (ax * (by * c - b * cy) - ay * (bx * c - b * cx) + a * (bx * cy - by * cx)) * turn > 0.0
        };
        let (bad, good): (Vec<_>, Vec<_>) = triangles.into_iter().partition(inside);
        triangles = good;
        let edges: Vec<[usize; 2]> = bad
            .iter()
            .flat_map(|t| [[t[0], t[1]], [t[1], t[2]], [t[2], t[0]]])
            .collect();
        for [a, b] in &edges {
            if !edges.contains(&[*b, *a]) {
                triangles.push([*a, *b, p]);
            }
        }
    }
    triangles.retain(|t| t.iter().all(|v| *v < n));
    triangles
}

pub(crate) fn mesh(random: &mut Random) -> Example {
    let n = random.index(8, 91);
    let points: Vec<[f64; 2]> = (0..n)
        .map(|_| [random.range(0.0, 10.0), random.range(0.0, 10.0)])
        .collect();
    let ea = random.power(5.5, 7.5);
    let fixed = random.range(0.05, 0.4);
    let spread = random.power(-3.0, -0.7);
    let mut net = Example::default();
    for p in &points {
        net.positions.push(Vector3::new(p[0], p[1], random.range(0.0, 1.0)));
    }
    for node in 0..n {
        if random.unit() < fixed || node < 2 {
            net.held.push(node);
        }
    }
    let mut edges: Vec<[usize; 2]> = delaunay(&points)
        .iter()
        .flat_map(|t| [[t[0], t[1]], [t[1], t[2]], [t[2], t[0]]])
        .map(|[a, b]| [a.min(b), a.max(b)])
        .collect();
    edges.sort_unstable();
    edges.dedup();
    for [a, b] in edges {
        let length = (net.positions[a] - net.positions[b]).norm();
        let change = 1.0 + random.range(-spread, spread);
        net.segments.push((a, b, ea * random.power(-1.0, 1.0), length * change));
    }
    net.loads = vec![Vector3::zeros(); n];
    let force = ea * random.power(-4.5, -2.3);
    load(&mut net, random, force);
    net
}

/// A tent: a prestressed net over masts that stand on the ground and push some of its nodes up.
pub(crate) fn tent(random: &mut Random) -> Example {
    let ea = random.power(5.5, 7.5);
    let n = random.index(4, 12);
    let mut net = grid(n, 12.0, ea, |u, w| 2.0 * (1.0 - u * u) * (1.0 - w * w));
    let strain = random.power(-3.0, -2.0);
    net.segments.iter_mut().for_each(|s| s.3 /= 1.0 + strain);
    for _ in 0..random.index(1, 4) {
        let top = random.index(0, net.positions.len());
        if net.held.contains(&top) {
            continue;
        }
        let foot = net.positions.len();
        let lean = Vector3::new(random.range(-0.5, 0.5), random.range(-0.5, 0.5), 0.0);
        net.positions
            .push(net.positions[top] + lean - Vector3::new(0.0, 0.0, 4.0));
        net.loads.push(Vector3::zeros());
        net.held.push(foot);
        let length = (net.positions[top] - net.positions[foot]).norm();
        net.struts
            .push((foot, top, 30.0 * ea, length * random.range(1.0, 1.05)));
    }
    let force = ea * random.power(-5.0, -3.0);
    load(&mut net, random, force);
    net
}

/// What the solver calls converged passes the audit.
fn check_audit(name: &str, seed: u32, net: &Example, solution: &Solution) {
    let state = audit(&net.net(), &net.case(), &solution.positions, &solution.axial_forces);
    assert!(
        state.passed,
        "{name} {seed}: {:e} N out of balance, {:e} N off the law, {:e} N allowed",
        state.largest_imbalance, state.largest_force_error, state.allowed
    );
}

#[track_caller]
fn check_family(name: &str, draw: fn(&mut Random) -> Example, most_in_the_middle: u32) {
    let mut counts = Vec::new();
    let mut failures = Vec::new();
    for seed in 0..NETS_A_FAMILY {
        let net = draw(&mut Random::new(seed.into()));
        let solution = net.solve().unwrap_or_else(|e| panic!("{name} {seed}: {e}"));
        counts.push(solution.factorisations);
        if solution.termination == Termination::Converged {
            check_audit(name, seed, &net, &solution);
            let largest = solution.axial_forces.iter().fold(0.0_f64, |m, t| m.max(*t));
            let load = net.loads.iter().map(|p| p.amax()).fold(0.0, f64::max);
            let imbalance = net.imbalance(&solution);
            for node in (0..imbalance.len()).filter(|n| !net.held.contains(n)) {
                // Rounding of the positions of slack-start nets of high stiffness reaches 1e-8 of the forces.
                assert!(
                    imbalance[node].amax() <= 3e-8 * largest.max(load),
                    "{name} {seed} node {node}"
                );
            }
            // Far from the origin, where the last bits of the positions make more force.
            let mut far = net.clone();
            far.positions
                .iter_mut()
                .for_each(|x| *x += Vector3::new(9000.0, -9500.0, 0.0));
            let solution = far.solve().unwrap_or_else(|e| panic!("{name} {seed} far away: {e}"));
            if solution.termination == Termination::Converged {
                check_audit(name, seed, &far, &solution);
            }
        } else {
            let r = solution.history.last().unwrap();
            failures.push((seed, solution.termination, r.residual, solution.factorisations));
        }
    }
    counts.sort_unstable();
    println!(
        "{name}: {} of {} solved, factorisations median {} worst {}",
        counts.len() - failures.len(),
        NETS_A_FAMILY,
        counts[counts.len() / 2],
        counts[counts.len() - 1],
    );
    assert!(failures.is_empty(), "{name}: {failures:?}");
    assert!(
        counts[counts.len() / 2] <= most_in_the_middle,
        "{name}: median has grown"
    );
}

#[test]
fn prestressed_saddles() {
    check_family("saddle", saddle, 7);
}

#[test]
fn flat_nets_without_prestress() {
    check_family("flat", flat, 9);
}

#[test]
fn nets_all_slack_at_the_start() {
    check_family("slack", slack, 14);
}

#[test]
fn random_meshes() {
    check_family("mesh", mesh, 17);
}

#[test]
fn hanging_chains() {
    check_family("chain", chain, 14);
}

#[test]
fn tents_on_masts() {
    check_family("tent", tent, 22);
}

#[test]
fn nets_with_floating_parts() {
    check_family("floating", floating, 7);
}
