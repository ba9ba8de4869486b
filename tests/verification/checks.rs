//! Checks against formulas worked by hand, and against beams, arcs and planes computed another way.

use std::f64::consts::PI;

use nalgebra::{DMatrix, DVector, Vector3};
use ropewalk_numerics::check::{
    CheckKind, Clamp, Clearance, Lack, Measure, PullLimits, Saddle, SaddleRadius, SaddleSlip, Stage, eccentric_moment,
};
use ropewalk_numerics::model::{NodeId, Section};

use crate::problem::{Problem, stiff};
use crate::report::{Tolerance, check, check_second_order};
use crate::scalar::halving_limit;
use ropewalk_numerics::brief::PrestressRule;

const EXACT: Tolerance = Tolerance::Relative(1e-12);
const BY_HAND: &str = "EN 1993-1-11:2006, formula from memory, worked by hand";

/// A rope of two segments through `n1`, from (−4, 0, 3) over the origin to `to`.
fn bent(section: Section, to: [f64; 3]) -> (Problem, NodeId) {
    let mut problem = Problem::default();
    let a = problem.fixed(-4.0, 0.0, 3.0);
    let m = problem.free(0.0, 0.0, 0.0);
    let b = problem.fixed(to[0], to[1], to[2]);
    problem.cable(&[a, m, b], section, [PrestressRule::ForceDensity(1.0); 2]);
    (problem, m)
}

fn rope() -> Section {
    Section {
        breaking_force: Some(331e3),
        diameter: Some(0.020),
        ..stiff(35e6)
    }
}

#[test]
fn strength_by_the_standard() {
    let tensions = [150e3, 180e3];
    let judge = |section: Section, kind| {
        let (problem, _) = bent(section, [4.0, 0.0, 3.0]);
        problem.judge(kind, &[], &tensions, &[]).expect("judged")
    };
    let resistance = |gamma_r| CheckKind::Resistance {
        gamma_r,
        strength_divisor: 1.5,
    };
    let proof = Section {
        proof_force: Some(200e3),
        ..rope()
    };
    // 331 kN / 1.5; / 1.35; 200 kN / 0.9.
    for (name, section, gamma_r, limit) in [
        ("F_Rd, gamma_R 1.00", rope(), 1.0, 220_666.666_666_666_67),
        ("F_Rd, gamma_R 0.90", rope(), 0.9, 245_185.185_185_185_2),
        ("F_Rd, proof force governs", proof, 0.9, 222_222.222_222_222_2),
    ] {
        let judged = judge(section, resistance(gamma_r));
        check(name, BY_HAND, limit, judged.limit, EXACT);
        check(&format!("{name}: use"), BY_HAND, 180e3 / limit, judged.ratio, EXACT);
        assert_eq!((judged.passes, judged.measure), (true, Measure::Tension));
    }
    for (name, share, stage, limit, passes) in [
        ("service stress as a force", 0.45, Stage::Service, 148_950.0, false),
        (
            "construction stress as a force",
            0.60,
            Stage::Construction,
            198_600.0,
            true,
        ),
    ] {
        let judged = judge(rope(), CheckKind::ShareOfStrength { share, stage });
        check(name, BY_HAND, limit, judged.limit, EXACT);
        assert_eq!(judged.passes, passes);
    }
    let (problem, _) = bent(stiff(1e6), [4.0, 0.0, 3.0]);
    assert_eq!(
        problem.judge(resistance(1.0), &[], &tensions, &[]),
        Err(Lack::BreakingForce)
    );
}

/// Moment at mid-length of a hinged bar under `compression` off its axis, by central differences over `n` pieces.
fn moment_by_differences(stiffness: f64, length: f64, compression: f64, eccentricity: f64, n: usize) -> f64 {
    let h = length / n as f64;
    let share = compression * h * h / stiffness;
    let mut matrix = DMatrix::zeros(n - 1, n - 1);
    for i in 0..n - 1 {
        matrix[(i, i)] = share - 2.0;
        if i > 0 {
            matrix[(i, i - 1)] = 1.0;
            matrix[(i - 1, i)] = 1.0;
        }
    }
    let bent = matrix.lu().solve(&DVector::from_element(n - 1, -share * eccentricity));
    compression * (bent.expect("below the critical force")[n / 2 - 1] + eccentricity)
}

#[test]
fn struts_buckle_and_bend() {
    let mast = Section {
        bending_stiffness: Some(2.72e6),
        ..stiff(844e6)
    };
    let judge = |section: Section, force: f64, eccentricity| {
        let mut problem = Problem::default();
        let foot = problem.fixed(-9.0, 0.0, 0.0);
        let head = problem.fixed(-9.0, 0.0, 5.2);
        problem.strut(foot, head, section, PrestressRule::ForceDensity(-1.0));
        let kind = CheckKind::Buckling {
            length_factor: 1.0,
            safety: 1.5,
            eccentricity,
        };
        problem.judge(kind, &[], &[force], &[])
    };
    let judged = judge(mast, -326e3, Some(0.02)).expect("judged");
    // π² · 2.72e6 / 5.2² = 992 800.4 N, in another language.
    check(
        "Euler over 1.5 (N)",
        "Euler 1757, by hand",
        992_800.442_713 / 1.5,
        judged.limit,
        Tolerance::Relative(1e-9),
    );
    check("compression (N)", "as given", 326e3, judged.demand, EXACT);
    let by_differences: Vec<f64> = (0..5)
        .map(|k| moment_by_differences(2.72e6, 5.2, 326e3, 0.02, 16 << k))
        .collect();
    let limit = halving_limit(&by_differences);
    let moment = judged.moment.expect("an eccentricity was given");
    check(
        "moment of an eccentric strut (N m)",
        "central differences, extrapolated",
        limit,
        moment,
        Tolerance::Relative(1e-9),
    );
    let errors: Vec<f64> = by_differences.iter().map(|m| m - moment).collect();
    check_second_order("moment of an eccentric strut", "central differences", &errors[..3]);
    assert_eq!(eccentric_moment(1e6, 0.02, 1e6), None);
    // A strut that is pulled does not buckle; one of unknown stiffness is not judged.
    let pulled = judge(mast, 50e3, Some(0.02)).expect("judged");
    assert_eq!((pulled.demand, pulled.ratio, pulled.moment), (0.0, 0.0, Some(0.0)));
    assert_eq!(judge(stiff(844e6), -1.0, None), Err(Lack::BendingStiffness));
}

#[test]
fn ropes_slip_over_saddles() {
    let saddle = |radius, slip| CheckKind::Saddle(Saddle { radius, slip });
    let slip = |friction| Some(SaddleSlip { friction, gamma: 1.65 });
    // From direction (4, 0, −3) the rope turns by a right angle into (3, 0, 4), or goes straight on.
    for (name, to, friction, held) in [
        ("slip over a right angle", [3.0, 0.0, 4.0], 0.10, 1.099_878_564_04),
        ("slip over a rope that goes straight", [4.0, 0.0, -3.0], 0.10, 1.0),
    ] {
        let (problem, m) = bent(rope(), to);
        let judged = problem.judge(saddle(None, slip(friction)), &[m], &[100e3, 105e3], &[]);
        let judged = judged.expect("judged");
        check(
            name,
            "exp(mu alpha / 1.65), by hand",
            held,
            judged.limit,
            Tolerance::Relative(1e-9),
        );
        check(&format!("{name}: tensions"), "by hand", 1.05, judged.demand, EXACT);
        assert_eq!(judged.passes, held > 1.05);
    }
    // Many small pulleys in a row: the growth of tension over each is (1 + μ dα / γ).
    let arc: f64 = (0..1_000_000)
        .map(|_| (0.1 * (PI / 2.0 / 1e6) / 1.65_f64).ln_1p())
        .sum();
    check(
        "the same over many small turns",
        "product over an arc",
        arc.exp(),
        1.099_878_564_04,
        Tolerance::Relative(1e-7),
    );

    let radius = |radius, of_wires| {
        Some(SaddleRadius {
            radius,
            over_diameter: 30.0,
            of_wires,
        })
    };
    for (name, of_wires, wanted) in [("30 rope diameters", 0.5, 0.6), ("400 wire diameters", 0.8, 0.8)] {
        let (problem, m) = bent(rope(), [4.0, 0.0, 3.0]);
        let judged = problem.judge(saddle(radius(0.7, of_wires), None), &[m], &[1.0, 1.0], &[]);
        let judged = judged.expect("judged");
        check(name, BY_HAND, wanted, judged.demand, EXACT);
        assert_eq!((judged.passes, judged.measure), (wanted < 0.7, Measure::Radius));
    }
    let (problem, m) = bent(stiff(1e6), [4.0, 0.0, 3.0]);
    assert_eq!(
        problem.judge(saddle(radius(1.0, 0.0), None), &[m], &[1.0, 1.0], &[]),
        Err(Lack::Diameter)
    );
    // Slack on one side, whatever the friction: it slips.
    let (problem, m) = bent(rope(), [3.0, 0.0, 4.0]);
    let loose = problem
        .judge(saddle(None, slip(0.5)), &[m], &[0.0, 1.0], &[])
        .expect("judged");
    assert!(!loose.passes && loose.ratio == 1000.0);
}

#[test]
fn ropes_slip_through_clamps() {
    let clamp = |deviation_share| {
        CheckKind::Clamp(Clamp {
            clamp_force: 60e3,
            friction: 0.1,
            gamma: 1.65,
            deviation_share,
        })
    };
    // Both sides rise 3 over 5: with equal tensions T the force across is 2 T 3/5. The ends pull up, the rope runs level.
    let across = (50e3 + 52e3) * 0.6;
    for (name, share, limit) in [
        ("clamp force alone", 0.0, 60e3 * 0.1 / 1.65),
        ("pressed together", 1.0, (across + 60e3) * 0.1 / 1.65),
        ("pulled apart", -1.0, 0.0),
    ] {
        let (problem, m) = bent(rope(), [4.0, 0.0, 3.0]);
        let judged = problem.judge(clamp(share), &[m], &[50e3, 52e3], &[]).expect("judged");
        check(name, BY_HAND, limit, judged.limit, Tolerance::Absolute(1e-8));
        check(&format!("{name}: difference"), "by hand", 2e3, judged.demand, EXACT);
        assert_eq!(judged.passes, limit > 2e3);
    }
    // Where a rope only ends, none runs on.
    let (problem, _) = bent(rope(), [4.0, 0.0, 3.0]);
    let end = NodeId::new(0);
    assert_eq!(
        problem.judge(clamp(0.0), &[end], &[1.0, 1.0], &[]),
        Err(Lack::ClampedRope)
    );
}

/// A rope along the x axis at height 3 and a square panel of 4 m, its corners at x, y = ±2, rising by 5 % along y.
fn shelf() -> Problem {
    let mut problem = Problem::default();
    let ends = [problem.fixed(-6.0, 0.0, 3.0), problem.fixed(6.0, 0.0, 3.0)];
    problem.cable(&ends, rope(), [PrestressRule::ForceDensity(1.0)]);
    let corners = [(-2.0, -2.0), (2.0, -2.0), (2.0, 2.0), (-2.0, 2.0)];
    let corners = corners.map(|(x, y)| problem.fixed(x, y, 2.0 + 0.05 * y));
    problem.panel(&corners);
    problem
}

#[test]
fn points_are_kept_clear_of() {
    let clear = |point: [f64; 3], height_within| {
        let kind = CheckKind::Clearance(Clearance {
            point: Vector3::from(point),
            least: 0.5,
            height_within,
        });
        shelf().judge(kind, &[], &[1.0], &[])
    };
    let judged = clear([8.0, 0.0, 1.5], None).expect("judged");
    check("to the end of a rope", "3-4-5 triangle", 2.5, judged.demand, EXACT);
    let judged = clear([1.0, 0.3, 1.0], None).expect("judged");
    // The plane z = 2 + 0.05 y: distance 1.015 / √(1 + 0.05²).
    let distance = 1.015 / (1.0_f64 + 0.0025).sqrt();
    check("to a panel", "plane and its normal", distance, judged.demand, EXACT);
    assert_eq!((judged.panel, judged.segment, judged.passes), (Some(0), None, true));
    let judged = clear([1.0, 0.3, 1.0], Some(0.5)).expect("judged");
    check("height below a panel", "plane", 1.015, judged.demand, EXACT);
    let judged = clear([1.0, 0.3, 1.8], Some(0.5)).expect("judged");
    check("use of a least height", "0.5 / 0.215", 0.5 / 0.215, judged.ratio, EXACT);
    assert!(!judged.passes);
    // Beyond the panel and too far from the rope in plan.
    assert_eq!(clear([5.0, 4.0, 1.0], Some(0.5)), Err(Lack::Over));
}

#[test]
fn panels_fall() {
    let judge = |least_fall| shelf().judge(CheckKind::Drainage { least_fall }, &[], &[1.0], &[]);
    let judged = judge(0.02).expect("judged");
    check(
        "fall of a plane panel",
        "5 % by construction",
        0.05,
        judged.demand,
        EXACT,
    );
    assert!(judged.passes && !judge(0.06).expect("judged").passes);
    // A saddle z = x y / 10 over a square: its four triangles lie as steep as their edges and the middle say.
    let mut saddle = Problem::default();
    let corners = [(-1.0, -1.0), (1.0, -1.0), (1.0, 1.0), (-1.0, 1.0)];
    let corners = corners.map(|(x, y)| saddle.fixed(x, y, 0.1 * x * y));
    saddle.cable(&corners, rope(), [PrestressRule::ForceDensity(1.0); 3]);
    saddle.panel(&corners);
    let judged = saddle.judge(CheckKind::Drainage { least_fall: 0.02 }, &[], &[1.0; 3], &[]);
    // Each triangle has an edge that rises 0.2 over 2 and its third corner in the middle of the plane of symmetry.
    check(
        "fall of a saddle",
        "by hand",
        0.1,
        judged.expect("judged").demand,
        EXACT,
    );
}

#[test]
fn anchors_have_limits_and_angles() {
    let judge = |limits: PullLimits, pull: [f64; 3]| {
        let (problem, _) = bent(rope(), [4.0, 0.0, 3.0]);
        let anchor = NodeId::new(0);
        let support = -Vector3::from(pull);
        problem.judge(
            CheckKind::AnchorPull(limits),
            &[anchor],
            &[100e3, 100e3],
            &[(anchor, support)],
        )
    };
    let all = PullLimits {
        resultant: Some(150e3),
        horizontal: Some(40e3),
        uplift: Some(130e3),
        ..PullLimits::default()
    };
    // Parts 30, 40 and 120 kN: 50 level, 130 in all.
    let judged = judge(all, [30e3, 40e3, 120e3]).expect("judged");
    check(
        "use of the worst of three limits",
        "3-4-5 and 5-12-13",
        1.25,
        judged.ratio,
        EXACT,
    );
    assert_eq!((judged.measure, judged.passes), (Measure::HorizontalPull, false));
    let degree = PI / 180.0;
    let angles = PullLimits {
        up_angle: Some([30.0 * degree, 50.0 * degree]),
        plan_angle: Some([170.0 * degree, 30.0 * degree]),
        ..PullLimits::default()
    };
    // Level angle 180° + 5.71°, upwards 45°: 15.71° of 30° off, against 5° of 10°.
    let judged = judge(angles, [-10.0, -1.0, 101.0_f64.sqrt()]).expect("judged");
    let off = 10.0 + 0.1_f64.atan() / degree;
    check(
        "angle off a direction, across 180 deg",
        "by hand",
        off,
        judged.demand / degree,
        EXACT,
    );
    check("use of a sector", "by hand", off / 30.0, judged.ratio, EXACT);
    let judged = judge(angles, [-1.0, 0.0, 2.0]).expect("judged");
    let use_of_range = (2.0_f64.atan() / degree - 40.0) / 10.0;
    check("use of a range of angles", "by hand", use_of_range, judged.ratio, EXACT);
    assert!(!judged.passes && judged.measure == Measure::UpAngle);
}
