//! What must not matter, and what must scale.

use nalgebra::{Rotation3, Vector3};
use proptest::prelude::*;
use ropewalk_numerics::equilibrium::{Settings, Solution, Termination};

use crate::nets::{Example, Random};
use crate::saddle::saddle_net;

/// The saddle with random lengths, stiffnesses and loads: taut enough for every node to have its place.
fn net(seed: u64) -> Example {
    let mut random = Random::new(seed);
    let mut net = saddle_net();
    for segment in &mut net.segments {
        segment.2 *= random.power(-0.5, 0.5);
        segment.3 *= 1.0 - random.range(0.0, 0.004);
    }
    for load in &mut net.loads {
        *load = Vector3::new(
            random.range(-1.0, 1.0),
            random.range(-1.0, 1.0),
            -random.range(0.0, 4.0),
        ) * 1e3;
    }
    net
}

#[track_caller]
fn check(net: &Example) -> Solution {
    let settings = Settings {
        tolerance: 1e-12,
        ..Settings::default()
    };
    let solution = net.solve_with(&settings).unwrap();
    assert_eq!(solution.termination, Termination::Converged);
    solution
}

fn largest(forces: &[f64]) -> f64 {
    forces.iter().fold(0.0, |m: f64, t| m.max(*t))
}

#[track_caller]
fn same_forces(found: &[f64], wanted: &[f64]) {
    let scale = largest(wanted);
    for (a, b) in found.iter().zip(wanted) {
        assert!((a - b).abs() <= 1e-8 * scale, "{a} {b}");
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 24, ..ProptestConfig::default() })]

    #[test]
    fn rigid_motion_and_mirror(seed in 0_u64..1000, angles in [-3.0..3.0_f64, -3.0..3.0, -3.0..3.0], mirror: bool) {
        let net = net(seed);
        let before = check(&net);
        let turn = Rotation3::from_euler_angles(angles[0], angles[1], angles[2]);
        let flip = Vector3::new(if mirror { -1.0 } else { 1.0 }, 1.0, 1.0);
        let moved = |v: &Vector3<f64>| turn * v.component_mul(&flip);
        let shift = Vector3::new(31.0, -7.0, 12.0);
        let mut other = net.clone();
        other.positions.iter_mut().for_each(|x| *x = moved(x) + shift);
        other.loads.iter_mut().for_each(|p| *p = moved(p));
        let after = check(&other);
        same_forces(&after.axial_forces, &before.axial_forces);
        for (a, b) in after.positions.iter().zip(&before.positions) {
            prop_assert!((a - moved(b) - shift).amax() < 1e-7);
        }
    }

    #[test]
    fn renumbering(seed in 0_u64..1000) {
        let net = net(seed);
        let before = check(&net);
        let n = net.positions.len();
        let mut random = Random::new(seed + 1);
        let mut new: Vec<usize> = (0..n).collect();
        (1..n).rev().for_each(|i| new.swap(i, random.index(0, i + 1)));
        let mut other = net.clone();
        for (old, new) in new.iter().enumerate() {
            other.positions[*new] = net.positions[old];
            other.loads[*new] = net.loads[old];
        }
        other.held.iter_mut().for_each(|h| *h = new[*h]);
        // Ends are swapped too: the direction of a segment means nothing.
        other.segments.iter_mut().for_each(|s| (s.0, s.1) = (new[s.1], new[s.0]));
        other.segments.reverse();
        let after = check(&other);
        let mut forces = after.axial_forces.clone();
        forces.reverse();
        same_forces(&forces, &before.axial_forces);
    }

    #[test]
    fn scaling(seed in 0_u64..1000, length in 0.01..100.0_f64, force in 1e-3..1e3_f64) {
        let net = net(seed);
        let before = check(&net);
        let mut other = net.clone();
        other.positions.iter_mut().for_each(|x| *x *= length);
        other.segments.iter_mut().for_each(|s| { s.2 *= force; s.3 *= length });
        other.loads.iter_mut().for_each(|p| *p *= force);
        let after = check(&other);
        let wanted: Vec<f64> = before.axial_forces.iter().map(|t| t * force).collect();
        same_forces(&after.axial_forces, &wanted);
        for (a, b) in after.positions.iter().zip(&before.positions) {
            prop_assert!((a / length - b).amax() < 1e-7);
        }
    }

    #[test]
    fn reactions_balance_loads(seed in 0_u64..1000) {
        let net = net(seed);
        let solution = check(&net);
        let imbalance = net.imbalance(&solution);
        let reactions: Vector3<f64> = net.held.iter().map(|h| -imbalance[*h]).sum();
        let loads: Vector3<f64> = net.loads.iter().sum();
        prop_assert!((reactions + loads).norm() <= 1e-9 * largest(&solution.axial_forces));
    }

    #[test]
    fn equal_input_equal_bits(seed in 0_u64..1000) {
        let net = net(seed);
        prop_assert_eq!(check(&net), check(&net));
    }
}
