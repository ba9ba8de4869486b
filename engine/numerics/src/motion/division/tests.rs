//! Pieces beside the catenary.

use std::f64::consts::PI;
use std::ops::ControlFlow;

use super::*;
use crate::equilibrium::{Analysis, Settings, Solution, Termination, solve};
use crate::model::CableGiven;
use crate::motion::{About, natural_modes};
use crate::test_nets::{Sketch, node, section};

const GRAVITY: f64 = 9.80665;
const EA: f64 = 80e6;
const MASS: f64 = 8.0;

/// A rope of `length` (m) that hangs from `a` to `b`, with a straight one and a strut beside it, and what acts on it.
fn hanging(to: [f64; 3], length: f64) -> (Arc<Net>, ReferenceState, Case) {
    let mut sketch = Sketch::default();
    sketch.held("a", [0.0; 3]);
    sketch.held("b", to);
    sketch.held("c", [0.0, 9.0, 0.0]);
    sketch.cable("straight", section(2e6, 1.5), "a c");
    sketch.cable("rope", section(EA, MASS), "a b");
    sketch.strut("post", section(3e6, 4.0), "c", "b");
    let hangs = |cable: &mut CableGiven| cable.hangs = cable.name == "rope";
    sketch.given.cables.iter_mut().for_each(hangs);
    let net = sketch.net();
    let post = (Vector3::from(to) - Vector3::new(0.0, 9.0, 0.0)).norm();
    let reference = ReferenceState {
        positions: net.nodes().iter().map(|n| n.position.expect("given")).collect(),
        unstressed_lengths: vec![9.0, length, post],
        axial_forces: vec![0.0; 3],
    };
    let mut case = Case {
        nodal_forces: vec![Vector3::new(0.0, 3.0, 1.0); 3],
        unstressed_lengths: reference.unstressed_lengths.clone(),
        segments: vec![SegmentLoads::default(); 3],
        support_movements: vec![Vector3::zeros(); 3],
        removed: vec![false; 3],
        ..Case::default()
    };
    case.segments[1] = SegmentLoads {
        temperature_change: 20.0,
        per_length: Vector3::new(0.0, 0.0, -MASS * GRAVITY),
    };
    (Arc::new(net), reference, case)
}

fn balanced(division: &Division, case: &Case, positions: &[Vector3<f64>]) -> (Analysis, Case, Solution) {
    let analysis = Analysis::new(Arc::clone(division.net()));
    let start = division.positions(case, positions);
    let case = division.case(case);
    let go_on = &mut |_: &_| ControlFlow::Continue(());
    let lengths = &case.unstressed_lengths;
    let found = solve(&analysis, &case, &start, lengths, &Settings::default(), go_on).expect("a state");
    assert_eq!(found.termination, Termination::Converged);
    (analysis, case, found)
}

/// Convergence to the closed form of the elastic catenary (Irvine 1981), warmed by 20 K.
#[test]
fn forces_at_the_ends_come_near_the_catenary_with_the_square_of_the_pieces() {
    let to = [30.0, 4.0, -8.0];
    let (net, reference, case) = hanging(to, 33.0);
    let rope = Catenary {
        axial_stiffness: EA,
        unstressed_length: 33.0,
        stress_free_length: 33.0 * (1.0 + 12e-6 * 20.0),
        load: case.segments[1].per_length,
    };
    let exact = rope.at(&Vector3::from(to), None);
    let errors: Vec<[f64; 3]> = [8, 16, 32, 64]
        .into_iter()
        .map(|n| {
            let division = Division::new(&net, &case.removed, n).expect("a rope hangs");
            let (_, divided, found) = balanced(&division, &case, &reference.positions);
            let pieces = division.pieces(SegmentId::new(1));
            assert_eq!(pieces.len(), n);
            let half = 0.5 * 33.0 / n as f64 * rope.load;
            let [first, last] = [pieces.start, pieces.end - 1];
            let start = found.members.pulls[first][0] + half - exact.start;
            let end = found.members.pulls[last][1] + half - exact.end;
            let middle = divided.nodal_forces.len() - n / 2;
            let moved = found.positions[middle] - exact.point(16.5);
            [start.norm(), end.norm(), moved.norm()]
        })
        .collect();
    for (coarse, fine) in errors.iter().zip(&errors[1..]) {
        for (coarse, fine) in coarse.iter().zip(fine) {
            let order = (coarse / fine).log2();
            assert!((order - 2.0).abs() < 0.1, "order {order}: {errors:?}");
        }
    }
    assert!(errors[3][0] < 2e-4 * exact.tension_start, "{errors:?}");
}

#[test]
fn totals_and_what_does_not_hang_stay_as_they_are() {
    let (net, reference, case) = hanging([30.0, 4.0, -8.0], 33.0);
    let division = Division::new(&net, &case.removed, 7).expect("a rope hangs");
    let divided = division.case(&case);
    let mapped = division.reference(&case, &reference);
    let sum: Vector3<f64> = divided.nodal_forces.iter().sum();
    let whole = case.nodal_forces.iter().sum::<Vector3<f64>>() + 33.0 * case.segments[1].per_length;
    assert!((sum - whole).norm() < 1e-14 * whole.norm());
    let mass = |net: &Net, state: &ReferenceState| -> f64 {
        let of = |s: &crate::model::Segment| s.section.mass_per_length * state.unstressed_lengths[s.length];
        net.segments().iter().map(of).sum()
    };
    let (before, after) = (mass(&net, &reference), mass(division.net(), &mapped));
    assert!((before - after).abs() < 1e-14 * before);
    // Nodes keep their place; names of points are no ids.
    for (index, given) in net.nodes().iter().enumerate() {
        assert_eq!(division.net().nodes()[index], *given);
        assert!(division.is_given(NodeId::new(index)));
    }
    let points = &division.net().nodes()[net.nodes().len()..];
    assert!(points.len() == 6 && points.iter().all(|point| point.name.contains('/')));
    // A straight rope, seven pieces, a strut with its own length.
    assert_eq!(division.pieces(SegmentId::new(0)), 0..1);
    assert_eq!(division.pieces(SegmentId::new(1)), 1..8);
    assert_eq!(division.pieces(SegmentId::new(2)), 8..9);
    assert_eq!(division.segment(SegmentId::new(5)), SegmentId::new(1));
    let strut = division.net().segments()[8];
    assert_eq!(mapped.unstressed_lengths[strut.length], reference.unstressed_lengths[2]);
    assert_eq!(strut.ends, [node(&net, "c"), node(&net, "b")]);
    assert!(division.net().is_plain());
    assert_eq!(divided.segments[4].temperature_change, 20.0);
    let masses = division.masses(&MassGiven {
        segments: vec![(SegmentId::new(1), 0.5)],
        ..MassGiven::default()
    });
    assert_eq!(masses.segments.len(), 7);
}

#[test]
fn nothing_is_divided_that_does_not_hang_or_is_taken_out() {
    let (net, reference, mut case) = hanging([30.0, 4.0, -8.0], 33.0);
    case.removed[1] = true;
    let division = Division::new(&net, &case.removed, 7).expect("a rope hangs");
    assert_eq!((division.n_divided(), division.net().nodes().len()), (0, 3));
    assert!(division.net().is_plain() && division.case(&case).removed[1]);
    assert_eq!(division.positions(&case, &reference.positions), reference.positions);
    let straight = division.net();
    assert!(Division::new(straight, &case.removed, 7).is_none());
}

/// First frequency in the plane of a shallow cable (Irvine & Caughey 1974), by bisection:
/// `tan(z/2) = z/2 − (4/λ²) (z/2)³`,  `f = z/(2π l) √(H/m)`.
#[test]
fn the_first_frequency_of_a_taut_rope_comes_near_irvine_and_caughey() {
    let (span, pull) = (40.0, 100e3);
    let weight = MASS * GRAVITY;
    let bisect = |mut low: f64, mut high: f64, is_below: &dyn Fn(f64) -> bool| {
        for _ in 0..200 {
            let middle = 0.5 * (low + high);
            if is_below(middle) {
                low = middle;
            } else {
                high = middle;
            }
        }
        low
    };
    // Unstressed length of an elastic catenary between level supports with the horizontal force `pull`.
    let reach = |l: f64| pull * l / EA + 2.0 * pull / weight * (weight * l / (2.0 * pull)).asinh();
    let length = bisect(span * 0.9, span * 1.1, &|l| reach(l) < span);
    let sag_ratio = weight * span / (8.0 * pull);
    let lambda2 = (8.0 * sag_ratio).powi(2) * EA / (pull * (1.0 + 8.0 * sag_ratio * sag_ratio));
    // Below 4π² the first root lies between π/2 and π.
    assert!(lambda2 < 4.0 * PI * PI);
    let half = bisect(0.5 * PI + 1e-9, PI, &|x| x.tan() < x - 4.0 / lambda2 * x.powi(3));
    let expected = half / (PI * span) * (pull / MASS).sqrt();
    let (net, reference, mut case) = hanging([span, 0.0, 0.0], length);
    case.segments[1].temperature_change = 0.0;
    let errors: Vec<f64> = [8, 16, 32, 64]
        .into_iter()
        .map(|n| {
            let division = Division::new(&net, &case.removed, n).expect("a rope hangs");
            let (analysis, case, found) = balanced(&division, &case, &reference.positions);
            let about = About {
                case: &case,
                positions: &found.positions,
                reference: &found.positions,
                axial_forces: &found.axial_forces,
                lying: &found.members.lying,
            };
            let modes = natural_modes(&analysis, &about, &MassGiven::default(), 3, &mut || {
                ControlFlow::Continue(())
            })
            .expect("modes");
            let upright = modes.modes.iter().find(|mode| mode.effective_mass[2] > 1.0);
            let frequency = upright.expect("one moves up and down").frequency;
            (frequency / expected - 1.0).abs()
        })
        .collect();
    // What is left is that the theory is one of shallow cables.
    assert!(errors[0] > errors[1] && errors[3] < 1e-3, "{errors:?}");
}
