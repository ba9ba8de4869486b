//! The saddle net of our own reckoning: double precision in another language, and a conic program for the energy.

use nalgebra::Vector3;
use ropewalk_numerics::equilibrium::{LoadSteps, Settings, Solution, Termination, Way};

use crate::nets::{Example, grid};

pub(crate) fn saddle_net() -> Example {
    let mut net = grid(6, 12.0, 4e6, |u, w| 1.2 * (u * u - w * w));
    net.segments.iter_mut().for_each(|s| s.3 /= 1.003);
    for node in 0..net.positions.len() {
        if !net.held.contains(&node) {
            let force = if net.positions[node].x < 6.0 { -9000.0 } else { -600.0 };
            net.loads[node] = Vector3::new(0.0, 0.0, force);
        }
    }
    net
}

#[track_caller]
fn check_numbers(net: &Example, solution: &Solution) {
    assert_eq!(solution.termination, Termination::Converged);
    assert_eq!(net.segments.len(), 84);
    let forces = &solution.axial_forces;
    assert_eq!(forces.iter().filter(|t| **t == 0.0).count(), 6);
    let largest = forces.iter().fold(0.0_f64, |m, t| m.max(*t));
    let least = forces
        .iter()
        .filter(|t| **t > 0.0)
        .fold(f64::INFINITY, |m, t| m.min(*t));
    assert!((largest - 49765.512595).abs() < 1e-6, "{largest}");
    assert!((least - 3.637634).abs() < 1e-6, "{least}");
    let strain: f64 = forces
        .iter()
        .zip(&net.segments)
        .map(|(t, s)| t * t * s.3 / (2.0 * s.2))
        .sum();
    assert!((strain - 21326.537356).abs() < 1e-6, "{strain}");
    let work: f64 = net.loads.iter().zip(&solution.positions).map(|(p, x)| p.dot(x)).sum();
    assert!((strain - work + 17986.756634).abs() < 1e-6);
    let free = (0..net.positions.len()).filter(|n| !net.held.contains(n));
    let lowest = free.map(|n| solution.positions[n].z).fold(f64::INFINITY, f64::min);
    assert!((lowest + 0.819426025).abs() < 1e-9);
}

#[test]
fn the_full_load_at_once() {
    let net = saddle_net();
    // The least tension is known to 1e-6 N, below what the usual tolerance leaves out of balance.
    let settings = Settings {
        tolerance: 1e-13,
        ..Settings::default()
    };
    let solution = net.solve_with(&settings).unwrap();
    check_numbers(&net, &solution);
    assert_eq!(solution.way, Way::Newton);
    assert!(solution.loose_nodes.is_empty());
    assert!(solution.factorisations <= 10, "{}", solution.factorisations);
}

#[test]
fn equal_load_steps_lead_to_the_same_state() {
    let net = saddle_net();
    let settings = Settings {
        load_steps: LoadSteps::Equal(5),
        tolerance: 1e-13,
        ..Settings::default()
    };
    let solution = net.solve_with(&settings).unwrap();
    check_numbers(&net, &solution);
    let factors: Vec<f64> = solution.steps.iter().map(|s| s.load_factor).collect();
    assert_eq!(factors, [0.2, 0.4, 0.6, 0.8, 1.0]);
    assert_eq!(solution.steps[4].positions, solution.positions);
}

/// A net of ropes alone has one equilibrium: in how many steps the load comes does not matter, nor that each step is told.
#[test]
fn as_many_equal_steps_as_wanted_reach_the_state_of_full_load() {
    let net = saddle_net();
    let sharp = |load_steps| Settings {
        load_steps,
        tolerance: 1e-13,
        ..Settings::default()
    };
    let full = net.solve_with(&sharp(LoadSteps::FullFirst)).unwrap();
    assert!(full.steps.is_empty());
    let size = full.positions.iter().fold(0.0, |m: f64, x| m.max(x.amax()));
    let largest = full.axial_forces.iter().fold(0.0, |m: f64, n| m.max(*n));
    for (given, n) in [(0, 1), (1, 1), (3, 3), (8, 8)] {
        let stepped = net.solve_with(&sharp(LoadSteps::Equal(given))).unwrap();
        assert_eq!(stepped.termination, Termination::Converged);
        assert_eq!((stepped.load_factor, stepped.steps.len()), (1.0, n));
        for (index, step) in stepped.steps.iter().enumerate() {
            assert_eq!(step.load_factor, (index + 1) as f64 / n as f64);
            let told: Vec<_> = (stepped.history.iter())
                .filter(|r| r.load_step as usize == index + 1)
                .collect();
            assert!(!told.is_empty() && told.iter().all(|r| r.load_factor == step.load_factor));
        }
        for (a, b) in stepped.positions.iter().zip(&full.positions) {
            assert!((a - b).amax() <= 1e-8 * size, "{n} steps: {a} {b}");
        }
        for (a, b) in stepped.axial_forces.iter().zip(&full.axial_forces) {
            assert!((a - b).abs() <= 1e-8 * largest, "{n} steps: {a} {b}");
        }
    }
}

#[test]
fn the_end_game_is_quadratic() {
    let solution = saddle_net().solve().unwrap();
    let residuals: Vec<f64> = solution.history.iter().map(|r| r.residual / 49765.5).collect();
    // Of the last three steps above rounding, each leaves about the square of what it found.
    let end: Vec<f64> = residuals.iter().copied().filter(|r| *r > 1e-12).collect();
    let [a, b, c] = end[end.len() - 3..] else {
        panic!("too few")
    };
    assert!(b < a.powf(1.5) && c < b.powf(1.5), "{end:?}");
}
