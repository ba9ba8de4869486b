use std::ops::ControlFlow;
use std::sync::Arc;

use super::*;
use crate::equilibrium::{Settings, Solution, Termination, members, solve, stability};
use crate::load::SegmentLoads;
use crate::model::{Net, PanelGiven, Slide};
use crate::test_nets::{Sketch, section};

/// Numbers in (0, 1), the same every time (xorshift).
struct Dice(u64);

impl Dice {
    fn roll(&mut self) -> f64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        ((self.0 >> 11) as f64 + 0.5) / (1_u64 << 53) as f64
    }

    fn two_to_six(&mut self) -> usize {
        let roll = self.roll();
        2 + [0.2, 0.4, 0.6, 0.8].into_iter().filter(|step| roll > *step).count()
    }

    fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.roll()
    }
}

struct Problem {
    analysis: Analysis,
    case: Case,
    start: Vec<Vector3<f64>>,
}

impl Problem {
    fn new(net: Net, case: impl FnOnce(&Net, &[Vector3<f64>]) -> Case) -> Self {
        let start: Vec<_> = net.nodes().iter().map(|n| n.position.expect("given")).collect();
        let case = case(&net, &start);
        Self {
            analysis: Analysis::new(Arc::new(net)),
            case,
            start,
        }
    }

    fn solution(&self) -> Solution {
        self.answer().expect("converges")
    }

    fn answer(&self) -> Option<Solution> {
        let lengths = &self.case.unstressed_lengths;
        let settings = Settings::default();
        let solution = solve(&self.analysis, &self.case, &self.start, lengths, &settings, &mut |_| {
            ControlFlow::Continue(())
        });
        solution.ok().filter(|s| s.termination == Termination::Converged)
    }

    fn certificate(&self, positions: &[Vector3<f64>]) -> Certificate {
        let (loading, response) = (self.loading(), self.response(positions));
        let state = State {
            positions,
            axial_forces: &response.axial_forces,
            members: &members::of_response(&loading, &response),
        };
        certificate(&self.analysis, &self.case, &state)
            .expect("fits")
            .expect("balanced")
    }

    fn loading(&self) -> Loading {
        Loading::new(
            self.analysis.structure(),
            &self.case,
            &self.case.unstressed_lengths,
            1.0,
        )
        .expect("fits")
    }

    fn response(&self, positions: &[Vector3<f64>]) -> Response {
        let mut response = Response::new(self.analysis.structure());
        self.analysis
            .structure()
            .response_into(&self.loading(), positions, &mut response);
        response
    }

    /// `Π`, without the constant of the loads (J).
    fn energy(&self, positions: &[Vector3<f64>]) -> f64 {
        let response = self.response(positions);
        let loading = self.loading();
        let mut energy = response.strain_energy(&loading);
        let hanging = loading.special.iter().flat_map(|special| &special.hanging);
        for (hanging, at) in hanging.zip(&response.special.hanging) {
            let first = self.analysis.structure().net().segments()[hanging.segment].ends[0].index();
            let total = hanging.catenary.load * hanging.catenary.unstressed_length;
            energy += at.potential - at.strain_energy - total.dot(&(positions[first] - self.start[first]));
        }
        for ((force, x), from) in loading.nodal_forces.iter().zip(positions).zip(&self.start) {
            energy -= force.dot(&(x - from));
        }
        for elastic in self.analysis.structure().net().elastic_supports() {
            let u = |n: usize| positions[elastic.nodes()[n].index()] - elastic.rest()[n];
            for row in 0..elastic.nodes().len() {
                for column in 0..elastic.nodes().len() {
                    energy += 0.5 * u(row).dot(&(elastic.block(row, column) * u(column)));
                }
            }
        }
        energy
    }
}

fn case(net: &Net, lengths: Vec<f64>, forces: Vec<Vector3<f64>>) -> Case {
    Case {
        nodal_forces: forces,
        unstressed_lengths: lengths,
        segments: vec![SegmentLoads::default(); net.segments().len()],
        support_movements: vec![Vector3::zeros(); net.nodes().len()],
        removed: vec![false; net.segments().len()],
        ..Case::default()
    }
}

fn span(net: &Net, start: &[Vector3<f64>], segment: usize) -> f64 {
    let [i, j] = net.segments()[segment].ends.map(NodeId::index);
    (start[j] - start[i]).norm()
}

/// What some ropes of a net do.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Ropes {
    AreStraight,
    Hang,
    Slide,
}

/// A saddle on a rim, one side of which may be on springs; ropes of random stiffness, prestress and load, some of them
/// too long.
fn random_saddle(dice: &mut Dice, ropes: Ropes) -> Problem {
    let (nx, ny) = (dice.two_to_six(), dice.two_to_six());
    let rise = dice.between(0.0, 2.0);
    let mut sketch = Sketch::default();
    let sprung = dice.roll() < 0.5;
    for i in 0..nx + 2 {
        for j in 0..ny + 2 {
            let rim_i = i == 0 || i == nx + 1;
            let rim_j = j == 0 || j == ny + 1;
            if rim_i && rim_j {
                continue;
            }
            let (u, w) = (
                2.0 * i as f64 / (nx + 1) as f64 - 1.0,
                2.0 * j as f64 / (ny + 1) as f64 - 1.0,
            );
            let at = [6.0 * u, 6.0 * w, rise * (u * u - w * w)];
            let name = format!("{i}_{j}");
            if rim_i && i == 0 && sprung {
                sketch.sprung(&name, at, [3e5, 1e6, 2e5]);
            } else if rim_i || rim_j {
                sketch.held(&name, at);
            } else {
                sketch.node(&name, at);
            }
        }
    }
    let ea = 10_f64.powf(dice.between(5.5, 7.5));
    for i in 1..=nx {
        let path: Vec<_> = (0..ny + 2).map(|j| format!("{i}_{j}")).collect();
        sketch.cable(
            &format!("y{i}"),
            section(ea * dice.between(0.3, 3.0), 0.0),
            &path.join(" "),
        );
    }
    for j in 1..=ny {
        let path: Vec<_> = (0..nx + 2).map(|i| format!("{i}_{j}")).collect();
        sketch.cable(
            &format!("x{j}"),
            section(ea * dice.between(0.3, 3.0), 0.0),
            &path.join(" "),
        );
    }
    for (place, cable) in sketch.given.cables.iter_mut().enumerate() {
        match ropes {
            Ropes::AreStraight => {}
            Ropes::Hang => cable.hangs = place % 2 == 0,
            Ropes::Slide if place < nx => {}
            Ropes::Slide => {
                let slide = |place| Slide { place, friction: 0.0 };
                cable.slides = (1..cable.path.len() - 1)
                    .filter(|n| (n + place) % 3 > 0)
                    .map(slide)
                    .collect();
            }
        }
    }
    let prestress = 10_f64.powf(dice.between(-3.5, -2.2));
    let load = ea * 10_f64.powf(dice.between(-4.5, -2.8));
    let slack = dice.roll() * 0.2;
    Problem::new(sketch.net(), |net, start| {
        let lengths = (net.reaches().iter())
            .map(|reach| {
                let strain = if dice.roll() < slack { -0.02 } else { prestress };
                reach.segments.clone().map(|e| span(net, start, e)).sum::<f64>() / (1.0 + strain)
            })
            .collect();
        let forces = (0..net.nodes().len())
            .map(|_| {
                load * Vector3::new(
                    dice.between(-0.2, 0.2),
                    dice.between(-0.2, 0.2),
                    dice.between(-1.0, 0.3),
                )
            })
            .collect();
        let mut case = case(net, lengths, forces);
        for (segment, loads) in net.segments().iter().zip(&mut case.segments) {
            if segment.hangs {
                loads.per_length = load * Vector3::new(0.1, 0.0, -dice.between(0.01, 0.3));
            }
        }
        case
    })
}

/// A state beside the true one: what the certificate bounds is what it is off by.
fn check_bounds(problem: &Problem, truth: &Solution, positions: &[Vector3<f64>], tightness: &mut [Vec<f64>; 3]) {
    let certificate = problem.certificate(positions);
    assert_eq!(certificate.kind, Kind::Full);
    assert!(certificate.gap >= 0.0 && certificate.leftover <= certificate.gap);
    let response = problem.response(positions);
    // The solved state has rounding of its own.
    let rounding = problem.certificate(&truth.positions);
    let excess = problem.energy(positions) - problem.energy(&truth.positions);
    let size = rounding.strain_energy.abs() + problem.energy(positions).abs();
    assert!(
        excess <= certificate.gap + 1e-13 * size,
        "{excess:e} {:e}",
        certificate.gap
    );
    let mut largest = 0.0_f64;
    for e in 0..truth.axial_forces.len() {
        let off = (response.axial_forces[e] - truth.axial_forces[e]).abs();
        let bound = certificate.force_bounds[e];
        assert!(off <= bound + rounding.force_bounds[e], "{off:e} > {bound:e}");
        largest = largest.max(off / bound);
    }
    tightness[0].push(excess / certificate.gap);
    tightness[1].push(largest);
    let mut largest = 0.0_f64;
    for (n, x) in positions.iter().enumerate() {
        let off = (x - truth.positions[n]).norm();
        if let Some(bound) = certificate.position_bounds[n] {
            let own = rounding.position_bounds[n].unwrap_or(f64::INFINITY);
            assert!(off <= bound + own, "node {n}: {off:e} > {bound:e}");
            if bound > 0.0 {
                largest = largest.max(off / bound);
            }
        }
    }
    tightness[2].push(largest);
}

/// No state within the bounds of another may be outside of them.
#[test]
fn perturbed_states_of_random_nets_are_within_their_bounds() {
    for (ropes, seed) in [(Ropes::AreStraight, 4711), (Ropes::Hang, 4712), (Ropes::Slide, 4713)] {
        perturbed_states(ropes, &mut Dice(seed));
    }
}

fn perturbed_states(ropes: Ropes, dice: &mut Dice) {
    let mut tightness = [Vec::new(), Vec::new(), Vec::new()];
    let (mut bounded, mut answered) = (0, 0);
    for _ in 0..80 {
        let problem = random_saddle(dice, ropes);
        // Sliding ropes may leave a node at the end of its segment, where the solver stops.
        let Some(truth) = problem.answer() else {
            assert_eq!(ropes, Ropes::Slide);
            continue;
        };
        answered += 1;
        let certificate = problem.certificate(&truth.positions);
        assert!(
            certificate.certified,
            "{:e} of {:e}",
            certificate.gap, certificate.strain_energy
        );
        bounded += certificate.position_bounds.iter().flatten().count();
        for exponent in [-1.0, -2.0, -3.0, -5.0] {
            let size = 10_f64.powf(exponent);
            let mut positions = truth.positions.clone();
            let dofs = problem.analysis.structure().dofs();
            let movement: Vec<f64> = (0..dofs.len()).map(|_| size * dice.between(-1.0, 1.0)).collect();
            dofs.move_nodes(&movement, 1.0, &mut positions);
            check_bounds(&problem, &truth, &positions, &mut tightness);
        }
    }
    println!("{ropes:?}: {answered} nets, {bounded} nodes with a bound");
    assert!(bounded > 500 && answered > 40);
    // The bounds are of use: some state uses up a good part of each.
    for shares in tightness {
        let most = shares.iter().copied().fold(0.0, f64::max);
        println!("{ropes:?}: largest share of a bound that was used: {most:.3}");
        assert!(most > 0.05 && most <= 1.0 + 1e-6, "{most}");
    }
}

/// The lower bound itself, as its definition has it: the forces balance the loads, and their dual value is below the
/// energy by the gap.
#[test]
fn dual_value_is_below_the_energy_by_the_gap() {
    let mut dice = Dice(99);
    for _ in 0..30 {
        let problem = random_saddle(&mut dice, Ropes::AreStraight);
        let truth = problem.solution();
        let mut positions = truth.positions.clone();
        let structure = problem.analysis.structure();
        let movement: Vec<f64> = (0..structure.n_dofs()).map(|_| dice.between(-0.05, 0.05)).collect();
        structure.dofs().move_nodes(&movement, 1.0, &mut positions);
        let (loading, response) = (problem.loading(), problem.response(&positions));
        let state = State {
            positions: &positions,
            axial_forces: &response.axial_forces,
            members: &members::of_response(&loading, &response),
        };
        let work = Work {
            analysis: &problem.analysis,
            loading: &loading,
            response: &response,
            state: &state,
        };
        let balanced = work.balance().expect("balanced");
        // D = v·(C x0) − p·0 − Σ ψ*(v) − ½ ρ·S⁻¹ρ, all from the start positions x0 where the springs are at rest and the
        // loads have done no work; v = T n + δ balances p with ρ = S (u + y) up to what is left.
        let mut dual = 0.0;
        for (e, segment) in structure.net().segments().iter().enumerate() {
            let [i, j] = segment.ends.map(NodeId::index);
            let v = along(&response, e) * response.axial_forces[e] + balanced.beyond[e];
            let bar = &loading.bars[e];
            dual += v.dot(&(problem.start[j] - problem.start[i]));
            dual -= bar.stress_free_length * v.norm() + v.norm_squared() / (2.0 * bar.stiffness);
        }
        for elastic in structure.net().elastic_supports() {
            let node = elastic.nodes()[0].index();
            let moved = positions[node] + balanced.movement[node] - elastic.rest()[0];
            dual -= 0.5 * moved.dot(&(elastic.block(0, 0) * moved));
        }
        let certificate = problem.certificate(&positions);
        let gap = problem.energy(&positions) - dual;
        assert!(dual <= problem.energy(&truth.positions) + 1e-9 * certificate.strain_energy);
        let own = certificate.gap - certificate.leftover;
        assert!(
            (gap - own).abs() <= 1e-10 * certificate.strain_energy + 1e-9 * own,
            "{gap:e} {own:e}"
        );
    }
}

/// 6 × 6 net of our own, reckoned in another language in double precision, its energy by a conic program too.
#[test]
fn known_net_is_certified() {
    let mut sketch = Sketch::default();
    let at = |i: usize, j: usize| {
        let (u, w) = (2.0 * i as f64 / 7.0 - 1.0, 2.0 * j as f64 / 7.0 - 1.0);
        [12.0 * i as f64 / 7.0, 12.0 * j as f64 / 7.0, 1.2 * (u * u - w * w)]
    };
    let rim = |i: usize| i == 0 || i == 7;
    for i in 0..8 {
        for j in 0..8 {
            let name = format!("{i}_{j}");
            match (rim(i), rim(j)) {
                (true, true) => {}
                (false, false) => {
                    sketch.node(&name, at(i, j));
                }
                _ => sketch.held(&name, at(i, j)),
            }
        }
    }
    for i in 1..7 {
        let path: Vec<_> = (0..8).map(|j| format!("{i}_{j}")).collect();
        sketch.cable(&format!("y{i}"), section(4e6, 0.0), &path.join(" "));
        let path: Vec<_> = (0..8).map(|j| format!("{j}_{i}")).collect();
        sketch.cable(&format!("x{i}"), section(4e6, 0.0), &path.join(" "));
    }
    let problem = Problem::new(sketch.net(), |net, start| {
        let lengths = (0..net.segments().len()).map(|e| span(net, start, e) / 1.003).collect();
        let forces = (start.iter().enumerate())
            .map(|(n, x)| match net.support_of(NodeId::new(n)) {
                Some(_) => Vector3::zeros(),
                None => Vector3::new(0.0, 0.0, if x.x < 6.0 { -9000.0 } else { -600.0 }),
            })
            .collect();
        case(net, lengths, forces)
    });
    let solution = problem.solution();
    let certificate = problem.certificate(&solution.positions);
    assert!((certificate.strain_energy - 21326.537356).abs() < 1e-5);
    let work: f64 = (problem.case.nodal_forces.iter().zip(&solution.positions))
        .map(|(p, x)| p.dot(x))
        .sum();
    assert!((certificate.strain_energy - work + 17986.756634).abs() < 1e-5);
    println!(
        "gap {:e} J, leftover {:e} J, {:?}",
        certificate.gap, certificate.leftover, certificate.reach
    );
    println!(
        "forces within {:e} N, positions within {:e} m, {} nodes without",
        certificate.largest_force_bound(),
        certificate.largest_position_bound(),
        certificate.n_without_bound()
    );
    assert!(certificate.certified);
    assert!(certificate.gap <= 1e-12 * certificate.strain_energy);
    assert_eq!(certificate.n_without_bound(), 0);
    assert!(certificate.largest_position_bound() < 1e-4);
}

fn mast(with_guy_force: f64) -> Problem {
    let mut sketch = Sketch::default();
    sketch.held("foot", [0.0, 0.0, 0.0]);
    sketch.node("top", [0.0, 0.0, 5.0]);
    sketch.strut("mast", section(1e8, 0.0), "foot", "top");
    for (name, x, y) in [("a", 4.0, 0.0), ("b", -2.0, 3.0), ("c", -2.0, -3.0)] {
        sketch.held(name, [x, y, 0.0]);
        sketch.cable(&format!("guy{name}"), section(2e6, 0.0), &format!("top {name}"));
    }
    Problem::new(sketch.net(), |net, start| {
        let lengths = (0..net.segments().len())
            .map(|e| span(net, start, e) / 1.001)
            .collect::<Vec<_>>();
        let mut forces = vec![Vector3::zeros(); start.len()];
        forces[1] = Vector3::new(300.0, 100.0, with_guy_force);
        let mut lengths = lengths;
        // Cables come first, the mast last.
        lengths[3] = 5.0;
        case(net, lengths, forces)
    })
}

#[test]
fn a_pushing_strut_makes_it_conditional_a_pulling_one_does_not() {
    let pushed = mast(-2000.0);
    let solution = pushed.solution();
    assert!(solution.axial_forces[3] < 0.0);
    let certificate = pushed.certificate(&solution.positions);
    assert_eq!(certificate.kind, Kind::Conditional(vec![Condition::Struts]));
    assert!(certificate.certified, "{certificate:?}");
    assert_eq!(certificate.force_bounds[3], 0.0);
    let pulled = mast(20e3);
    let solution = pulled.solution();
    assert!(solution.axial_forces[3] > 0.0);
    let certificate = pulled.certificate(&solution.positions);
    assert_eq!(certificate.kind, Kind::Full);
    assert!(certificate.certified);
}

#[test]
fn a_node_on_slack_ropes_has_no_bound() {
    let mut sketch = Sketch::default();
    sketch.held("a", [0.0, 0.0, 0.0]);
    sketch.held("b", [4.0, 0.0, 0.0]);
    sketch.node("m", [2.0, 0.0, 0.0]);
    sketch.node("loose", [2.0, 1.0, 0.0]);
    sketch.held("c", [2.0, 3.0, 0.0]);
    sketch.cable("taut", section(1e6, 0.0), "a m b");
    sketch.cable("slack", section(1e6, 0.0), "m loose c");
    let problem = Problem::new(sketch.net(), |net, start| {
        let stretch = [1.002, 1.002, 0.9, 0.9];
        let lengths = (0..4).map(|e| span(net, start, e) / stretch[e]).collect();
        case(net, lengths, vec![Vector3::zeros(); start.len()])
    });
    let solution = problem.solution();
    let certificate = problem.certificate(&solution.positions);
    assert!(certificate.certified);
    assert_eq!(certificate.n_without_bound(), 1);
    assert_eq!(certificate.position_bounds[3], None);
}

/// Frictionless sliding rope of our own, reckoned in another language: tension and least eigenvalue of the tangent.
#[test]
fn known_sliding_rope_is_certified() {
    let mut sketch = Sketch::default();
    sketch.held("a", [0.0, 0.0, 0.0]);
    sketch.node("b", [3.0, 0.5, -1.0]);
    sketch.node("c", [6.0, -0.2, -1.4]);
    sketch.held("d", [9.0, 0.0, 0.5]);
    sketch.cable("rope", section(1e6, 0.0), "a b c d");
    sketch.given.cables[0].slides = [1, 2].map(|place| Slide { place, friction: 0.0 }).to_vec();
    let mut problem = Problem::new(sketch.net(), |net, start| {
        case(net, vec![9.6], vec![Vector3::zeros(); start.len()])
    });
    // The loads that this state balances.
    let response = problem.response(&problem.start);
    for e in 0..3 {
        assert!((response.axial_forces[e] - 27571.9668).abs() < 1e-4);
    }
    problem.case.nodal_forces = response.out_of_balance.iter().map(|r| -r).collect();
    let structure = problem.analysis.structure();
    let values = stability::tangent(structure, &problem.loading(), &problem.start);
    let full = nalgebra::DMatrix::from(&structure.pattern().full_matrix(&values));
    assert!((full.symmetric_eigenvalues().min() - 516.6).abs() < 0.05);
    let certificate = problem.certificate(&problem.start);
    assert_eq!(certificate.kind, Kind::Full);
    assert!(certificate.certified, "{certificate:?}");
    // Its nodes are held across the rope only.
    assert_eq!(certificate.n_without_bound(), 2);
}

#[test]
fn tangent_of_a_rope_that_slips_against_differences() {
    let mut sketch = Sketch::default();
    sketch.held("a", [0.0, 0.0, 0.0]);
    sketch.node("b", [3.0, 0.5, -1.0]);
    sketch.node("c", [6.0, -0.2, -1.4]);
    sketch.held("d", [9.0, 0.0, 0.5]);
    sketch.cable("rope", section(1e6, 0.0), "a b c d");
    sketch.given.cables[0].slides = [1, 2].map(|place| Slide { place, friction: 0.2 }).to_vec();
    let problem = Problem::new(sketch.net(), |net, start| {
        case(net, vec![9.6], vec![Vector3::zeros(); start.len()])
    });
    let structure = problem.analysis.structure();
    let mut loading = problem.loading();
    let special = loading.special.as_mut().expect("it slides");
    special.sliding[0].factors = vec![1.0, 1.17, 0.9];
    let residual = |positions: &[Vector3<f64>]| {
        let mut response = Response::new(structure);
        structure.response_into(&loading, positions, &mut response);
        response
    };
    let values = stability::tangent(structure, &loading, &problem.start);
    let mut whole = nalgebra::DMatrix::from(&structure.pattern().full_matrix(&values));
    assert!(whole.symmetric_eigenvalues().min() > 0.0);
    let special = loading.special.as_ref().expect("it slides");
    for (w, v) in structure.slips(special, &residual(&problem.start), |_| true) {
        whole += nalgebra::DVector::from_vec(w) * nalgebra::DVector::from_vec(v).transpose();
    }
    let h = 1e-6;
    for column in 0..structure.n_dofs() {
        let moved = |by: f64| {
            let mut positions = problem.start.clone();
            let direction = structure.dofs().direction(column);
            positions[structure.dofs().node(column).index()] += direction * by;
            residual(&positions).residual
        };
        let (there, back) = (moved(h), moved(-h));
        for row in 0..structure.n_dofs() {
            let difference = (back[row] - there[row]) / (2.0 * h);
            assert!(
                (difference - whole[(row, column)]).abs() < 1e-6 * whole.amax(),
                "{row} {column}"
            );
        }
    }
}

#[test]
fn friction_and_pressure_are_conditions() {
    let mut sketch = Sketch::default();
    sketch.held("a", [0.0, 0.0, 0.0]);
    sketch.held("b", [4.0, 0.0, 0.0]);
    sketch.held("c", [2.0, 2.0, 0.5]);
    sketch.held("d", [2.0, -2.0, 0.5]);
    sketch.node("m", [2.0, 0.0, 0.0]);
    sketch.cable("slides", section(1e6, 0.0), "a m b");
    sketch.cable("holds", section(1e6, 0.0), "c m d");
    sketch.given.cables[0].slides = vec![Slide {
        place: 1,
        friction: 0.1,
    }];
    sketch.given.panels = vec![PanelGiven {
        name: "sail".to_owned(),
        corners: [0, 4, 2].map(NodeId::new).to_vec(),
    }];
    let problem = Problem::new(sketch.net(), |net, start| {
        let lengths = [3.99, 2.05, 2.05].to_vec();
        let mut case = case(net, lengths, vec![Vector3::zeros(); start.len()]);
        case.pressures = vec![200.0];
        case
    });
    let solution = problem.solution();
    let state = State {
        positions: &solution.positions,
        axial_forces: &solution.axial_forces,
        members: &solution.members,
    };
    let certificate = certificate(&problem.analysis, &problem.case, &state);
    let certificate = certificate.expect("fits").expect("balanced");
    let conditions = vec![Condition::Pressure, Condition::Friction];
    assert_eq!(certificate.kind, Kind::Conditional(conditions));
    assert!(certificate.certified, "{certificate:?}");
    // The forces of the rope that slides are a condition, those of the other are bounded.
    assert_eq!(certificate.force_bounds[0..2], [0.0, 0.0]);
    assert!(certificate.force_bounds[2] > 0.0);
}
