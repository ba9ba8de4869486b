use super::*;

fn rope(ea: f64, l0: f64, w: f64) -> Catenary {
    Catenary {
        axial_stiffness: ea,
        unstressed_length: l0,
        stress_free_length: l0,
        load: Vector3::new(0.0, 0.0, -w),
    }
}

fn close(computed: f64, expected: f64, tolerance: f64) {
    assert!(
        (computed - expected).abs() <= tolerance,
        "{computed} instead of {expected}"
    );
}

/// Numbers in (0, 1), the same every time (xorshift).
struct Dice(u64);

impl Dice {
    fn roll(&mut self) -> f64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        ((self.0 >> 11) as f64 + 0.5) / (1_u64 << 53) as f64
    }

    fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.roll()
    }

    fn direction(&mut self) -> Vector3<f64> {
        loop {
            let v = Vector3::from_fn(|_, _| self.between(-1.0, 1.0));
            if v.norm() > 0.1 && v.norm() < 1.0 {
                return v.normalize();
            }
        }
    }
}

/// Force, chord and stiffness by quadrature and bisection in another language (closed form checked there): H 35 kN,
/// V 9 kN, L0 70 m, w 0.2 kN/m, EA 42 MN.
#[test]
fn rope_of_known_chord_force_and_stiffness() {
    let rope = rope(42e6, 70.0, 200.0);
    let hanging = rope.at(&Vector3::new(69.492353, 0.0, -3.919748), None);
    assert!(hanging.converged);
    // The chord is given to six digits behind the point; the stiffness turns half a digit into 0.02 N.
    assert!((hanging.start - Vector3::new(35e3, 0.0, -9e3)).norm() < 0.05);
    close(hanging.tension_start, 36138.622, 0.05);
    close(hanging.tension_end, 35355.339, 0.05);
    let k = hanging.stiffness;
    close(k[(0, 0)], 36638.797443, 0.05);
    close(k[(0, 2)], -2011.645818, 0.05);
    close(k[(2, 2)], 622.225329, 1e-3);
    close(k[(1, 1)], 503.652540, 1e-3);
    let turned = rope.at(&Vector3::new(0.8 * 69.492353, 0.6 * 69.492353, -3.919748), None);
    assert!((turned.start - Vector3::new(28e3, 21e3, -9e3)).norm() < 0.05);
    // Energies of neighbouring chords differ by force times distance: 5e-7 m of 36 kN.
    close(turned.potential, -58560.2444, 0.03);
}

/// Closed form solved for both ends in another language (Irvine 1981): span, height, then H, V at the lower end, tensions,
/// middle.
#[test]
fn level_inclined_taut_and_deep_ropes() {
    let cases = [
        (
            105.0,
            20e6,
            60.0,
            100.0,
            0.0,
            5499.834109531494,
            3150.0,
            6338.03401950211,
            6338.03401950211,
            50.0,
            -13.97413287451028,
        ),
        (
            130.0,
            5e6,
            120.0,
            100.0,
            40.0,
            5175.616458435498,
            4879.781001211519,
            7113.316269126047,
            11904.205185849827,
            59.51273316468702,
            -9.768572867713269,
        ),
        (
            99.8,
            10e6,
            45.0,
            100.0,
            0.0,
            29604.216060932336,
            2245.5,
            29689.255275812564,
            29689.255275812564,
            50.0,
            -1.8953628531716997,
        ),
        (
            210.0,
            30e6,
            80.0,
            60.0,
            -50.0,
            792.8829442676387,
            10408.857417161564,
            10439.012218314041,
            6440.137178467651,
            15.95646299340151,
            -103.51351747863231,
        ),
    ];
    for (l0, ea, w, dx, dz, h, v, ta, tb, mid_x, mid_z) in cases {
        let hanging = rope(ea, l0, w).at(&Vector3::new(dx, 0.0, dz), None);
        assert!(hanging.converged);
        close(hanging.start.x, h, 1e-8 * ta);
        close(hanging.start.z, -v, 1e-8 * ta);
        close(hanging.tension_start, ta, 1e-8 * ta);
        close(hanging.tension_end, tb, 1e-8 * tb);
        let middle = hanging.point(0.5 * l0);
        close(middle.x, mid_x, 1e-8 * l0);
        close(middle.z, mid_z, 1e-8 * l0);
        assert!((hanging.point(l0) - Vector3::new(dx, 0.0, dz)).norm() < 1e-10 * l0);
    }
    let level = rope(20e6, 105.0, 60.0).at(&Vector3::new(100.0, 0.0, 0.0), None);
    close(level.sag(), 13.97413287451028, 1e-7);
}

/// Karnovsky & Lebed 2010, p. 132: span 20 m, supports 18 m apart in height, 1.25 kN/m, H 5.6 kN.
#[test]
fn inextensible_rope_from_a_textbook() {
    let l0 = 45.026486040561856;
    let hanging = rope(1e13, l0, 1250.0).at(&Vector3::new(20.0, 0.0, -18.0), None);
    close(hanging.start.x, 5600.0, 1e-2);
    close(hanging.tension_start, 40047.083543048975, 2e-2);
    close(hanging.tension_end, 17547.08354304898, 2e-2);
    close(
        (-hanging.start.z).atan2(hanging.start.x).to_degrees(),
        81.9616782520572,
        1e-5,
    );
    close(hanging.length, l0, 1e-6);
}

/// Jayaraman & Knudson 1981 (from memory): 1000 ft span, 100 ft sag, 8 kip at 400 ft. The published displacement of the
/// loaded point, −2.819 ft and −18.458 ft, and the digits of a 30-digit reckoning of our own.
#[test]
fn two_ropes_meet_at_a_loaded_point() {
    let (ea, w, p) = (71838779.08645707, 46.11673328157211, 35585.772922084);
    let left = rope(ea, 125.846983220479, w);
    let right = rope(ea, 186.85523339161762, w);
    let (from, to) = (Vector3::zeros(), Vector3::new(304.8, 0.0, 0.0));
    let place = |load: f64, mut x: Vector3<f64>| {
        for _ in 0..60 {
            let (a, b) = (left.at(&(x - from), None), right.at(&(to - x), None));
            let r = a.end + b.start - Vector3::new(0.0, 0.0, load);
            let step = (a.stiffness + b.stiffness).try_inverse().expect("definite") * r;
            x += step * (10.0 / step.norm()).min(1.0);
        }
        x
    };
    let before = place(0.0, Vector3::new(121.92, 0.0, -29.275887535391504));
    close(before.x, 121.92, 1e-6);
    close(before.z, -29.275887535391504, 1e-6);
    let after = place(p, before);
    close(after.x - before.x, -0.8593644354128738, 1e-7);
    close(after.z - before.z, -5.625616120526385, 1e-7);
}

/// Ropes from taut to deep, in any direction under a load in any direction.
fn random_rope(dice: &mut Dice) -> (Catenary, Vector3<f64>) {
    let l0 = 10_f64.powf(dice.between(-1.0, 2.7));
    let ea = 10_f64.powf(dice.between(4.0, 8.5));
    let theta = 1.0 + dice.between(-1e-3, 1e-3);
    let w = ea / l0 * 10_f64.powf(dice.between(-9.0, -2.0));
    let ratio = if dice.roll() < 0.5 {
        // Taut, or slack by a hair.
        1.0 + 10_f64.powf(dice.between(-8.0, -1.3)) * if dice.roll() < 0.7 { 1.0 } else { -1.0 }
    } else {
        dice.between(0.05, 1.0)
    };
    let rope = Catenary {
        axial_stiffness: ea,
        unstressed_length: l0,
        stress_free_length: theta * l0,
        load: w * dice.direction(),
    };
    let chord = if dice.roll() < 0.1 {
        // Nearly along the load.
        (rope.load.normalize() + dice.direction() * 10_f64.powf(dice.between(-12.0, -2.0))).normalize()
    } else {
        dice.direction()
    };
    (rope, chord * (ratio * rope.stress_free_length))
}

#[test]
fn five_thousand_ropes_find_their_force() {
    let mut dice = Dice(20_250_301);
    let mut counts = Vec::new();
    for case in 0..5000 {
        let (rope, chord) = random_rope(&mut dice);
        let hanging = rope.at(&chord, None);
        assert!(hanging.converged, "{case}: {rope:?} {chord:?} {hanging:?}");
        let total = rope.load * rope.unstressed_length;
        let forces = hanging.tension_start + hanging.tension_end;
        assert!((hanging.start + hanging.end - total).norm() <= 1e-14 * forces);
        assert!(
            (hanging.point(rope.unstressed_length) - chord).norm() <= 2e-11 * rope.unstressed_length,
            "{case}"
        );
        assert!(hanging.tension_least <= hanging.tension_start.min(hanging.tension_end));
        assert!(hanging.stiffness.symmetric_eigenvalues().min() >= 0.0, "{case}");
        counts.push(hanging.iterations);
        // A start from the force of a neighbouring chord leads to the same force.
        let near = rope.at(&(chord * 1.0001), None);
        let again = rope.at(&chord, Some(&near.start));
        let floor = 4e-11 * rope.stress_free_length * hanging.stiffness.norm();
        assert!(
            (again.start - hanging.start).norm() <= floor.max(1e-9 * forces),
            "{case}"
        );
    }
    counts.sort_unstable();
    assert!(
        counts[2500] <= 8 && counts[4999] <= 40,
        "median {}, worst {}",
        counts[2500],
        counts[4999]
    );
}

#[test]
fn stiffness_is_the_slope_of_the_force_and_force_that_of_the_energy() {
    let mut dice = Dice(7);
    for case in 0..300 {
        let (mut rope, mut chord) = random_rope(&mut dice);
        // Light ropes leave too few digits to differences.
        rope.load *= 10.0_f64.max(1e-4 * rope.axial_stiffness / rope.unstressed_length / rope.load.norm());
        let across = chord - rope.load * (chord.dot(&rope.load) / rope.load.norm_squared());
        if across.norm() < 0.02 * rope.unstressed_length {
            chord += dice.direction() * 0.1 * rope.unstressed_length;
        }
        let hanging = rope.at(&chord, None);
        let across = chord - rope.load * (chord.dot(&rope.load) / rope.load.norm_squared());
        let h = 1e-3 * across.norm().min(0.02 * rope.unstressed_length);
        for axis in 0..3 {
            let at = |step: f64| {
                let mut moved = chord;
                moved[axis] += step;
                rope.at(&moved, None)
            };
            // Sixth order.
            let sides = [1.0, 2.0, 3.0].map(|n| (at(n * h), at(-n * h)));
            let slope = |f: &dyn Fn(&Hanging) -> f64| {
                let d = |n: usize| f(&sides[n].0) - f(&sides[n].1);
                (45.0 * d(0) - 9.0 * d(1) + d(2)) / (60.0 * h)
            };
            for row in 0..3 {
                let by_differences = slope(&|s| s.start[row]);
                let error = (by_differences - hanging.stiffness[(row, axis)]).abs();
                assert!(
                    error <= 1e-8 * hanging.stiffness.norm(),
                    "{case}: {error:e} of {:e}",
                    hanging.stiffness.norm()
                );
            }
            let force = slope(&|s| s.potential);
            let expected = -hanging.end[axis];
            let size = hanging.tension_start + hanging.tension_end;
            assert!(
                (force - expected).abs() <= 1e-8 * size,
                "{case}: {force:e} {expected:e}"
            );
        }
    }
}

#[test]
fn a_vanishing_load_leaves_a_straight_bar() {
    let bar = Bar::new(AxialLaw::TensionOnly, 2.4e6, 5.955335, 12e-6 * 25.0);
    for d in [
        Vector3::new(3.0, 4.0, 3.4),
        Vector3::new(3.0, 4.0, 2.0),
        Vector3::new(0.0, 0.0, 6.0),
    ] {
        let length = d.norm();
        for w in [0.0, 1e-300, 1e-70, 1e-12, 1e-8] {
            let rope = Catenary {
                axial_stiffness: 2.4e6,
                unstressed_length: 5.955335,
                stress_free_length: bar.stress_free_length,
                load: Vector3::new(0.3 * w, 0.0, -w),
            };
            let hanging = rope.at(&d, None);
            assert!(hanging.converged);
            close(hanging.tension_start, bar.axial_force(length), 1e-7);
            close((hanging.start - d / length * bar.axial_force(length)).norm(), 0.0, 1e-7);
            let k = bar.stiffness_block(&d);
            assert!(
                (hanging.stiffness - k).norm() <= 1e-8 * bar.stiffness,
                "{w}: {} {k}",
                hanging.stiffness
            );
            close(hanging.strain_energy, bar.energy(length), 1e-7);
        }
    }
}

#[test]
fn a_folded_rope_bears_nothing_across_its_load() {
    let (ea, l0, w) = (1e6, 10.0, 50.0);
    let rope = rope(ea, l0, w);
    for rise in [0.0, 4.0, -7.5, 9.99] {
        let hanging = rope.at(&Vector3::new(0.0, 0.0, rise), None);
        assert!(hanging.converged);
        assert_eq!((hanging.start.x, hanging.start.y), (0.0, 0.0));
        // The fold lies where the two legs differ by the rise.
        let stretched = 1.0 + 0.5 * w * l0 / ea;
        close(hanging.start.z, -0.5 * w * (l0 - rise / stretched), 1e-9);
        close(hanging.stiffness[(2, 2)], 1.0 / (l0 / ea + 2.0 / w), 1e-9);
        let leg = 0.5 * (l0 - rise.abs() / stretched);
        close(hanging.sag(), leg * (1.0 + 0.5 * w * leg / ea), 1e-9);
        // Continuous at the fold: a little aside, a little force.
        let mut last = f64::INFINITY;
        for aside in [1e-2, 1e-4, 1e-6, 1e-9, 1e-12, 1e-100] {
            let near = rope.at(&Vector3::new(aside, 0.0, rise), None);
            assert!(near.converged, "{aside} {rise}");
            assert!(near.start.x > 0.0 && near.start.x < last);
            assert!(near.start.x <= w * aside);
            close(near.start.z, hanging.start.z, 5.0 * w * aside + 1e-9);
            last = near.start.x;
        }
        let secant = rope.at(&Vector3::new(1e-6 * l0, 0.0, rise), None).start.x / (1e-6 * l0);
        close(hanging.stiffness[(0, 0)], secant, 1e-6 * secant);
        close(hanging.stiffness[(1, 1)], secant, 1e-6 * secant);
    }
    // Stretched along its load: a bar with its weight at half height, and a string across.
    let hanging = rope.at(&Vector3::new(0.0, 0.0, 10.1), None);
    close(hanging.start.z, ea * 0.01 - 250.0, 1e-6);
    close(hanging.stiffness[(2, 2)], ea / l0, 1e-6);
    let flexible = l0 / ea + (hanging.tension_end / hanging.tension_start).ln() / w;
    close(hanging.stiffness[(0, 0)], 1.0 / flexible, 1e-8);
    // Just long enough to touch without a fold: the first node bears nothing.
    let touching = rope.at(&Vector3::new(0.0, 0.0, l0 * (1.0 + 0.5 * w * l0 / ea)), None);
    close(touching.tension_start, 0.0, 1e-9);
    assert!(touching.stiffness.iter().all(|k| k.is_finite()));
}

#[test]
fn temperature_changes_the_length_and_not_the_load() {
    let cold = rope(1e6, 20.0, 30.0);
    let warm = Catenary {
        stress_free_length: 20.0 * 1.001,
        ..cold
    };
    let d = Vector3::new(18.0, 3.0, 1.0);
    let hanging = warm.at(&d, None);
    assert!((hanging.start + hanging.end - Vector3::new(0.0, 0.0, -600.0)).norm() < 1e-9);
    // The same rope made of the longer length under the same total load.
    let same = rope(1e6, 20.0 * 1.001, 600.0 / (20.0 * 1.001)).at(&d, None);
    assert!((hanging.start - same.start).norm() < 1e-9);
    assert!(hanging.length > 20.02);
}

/// The gap as its definition has it, from the energies of two chords: `v + δ` is the force of the second.
#[test]
fn gap_is_that_of_its_definition() {
    // Gauss's rule is exact for x^14: 1/15 on (0, 1), twice.
    let power: f64 = GAUSS.iter().map(|(x, w)| w * x.powi(14)).sum();
    close(power, 1.0 / 15.0, 1e-15);
    let mut dice = Dice(31);
    for case in 0..200 {
        let (mut rope, chord) = random_rope(&mut dice);
        rope.load *= 10.0_f64.max(1e-3 * rope.axial_stiffness / rope.unstressed_length / rope.load.norm());
        let chord = if case % 10 == 0 {
            rope.load.normalize() * (chord.norm().min(0.9 * rope.stress_free_length))
        } else {
            chord
        };
        let other = chord * dice.between(0.6, 1.0) + dice.direction() * (dice.between(0.05, 0.3) * chord.norm());
        let (at, beside) = (rope.at(&chord, None), rope.at(&other, None));
        // Conjugate: Cc(v) = v·d − W·d − potential, the load's work taken out on both sides.
        let total = rope.load * rope.unstressed_length;
        let conjugate = |h: &Hanging, d: &Vector3<f64>| (h.start - total).dot(d) - h.potential;
        let delta = beside.start - at.start;
        let expected = conjugate(&beside, &other) - conjugate(&at, &chord) - delta.dot(&chord);
        let gap = at.gap(&delta);
        let size = conjugate(&beside, &other).abs() + conjugate(&at, &chord).abs();
        assert!(gap >= 0.0);
        assert!(
            (gap - expected).abs() <= 1e-2 * gap + 1e-12 * size,
            "{case}: {gap:e} {expected:e} {size:e}"
        );
    }
}
