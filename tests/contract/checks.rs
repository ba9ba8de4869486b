//! Checks: read with their factors, refused with a reason, judged and told.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::CheckKind;
use ropewalk_numerics::check::{Clamp, MovementLimit, PullLimits, Saddle, SaddleRadius, SaddleSlip, Stage};
use ropewalk_numerics::model::NodeId;
use ropewalk_service::decode::Reading;
use serde_json::{Value, json};
use v1::FindingSeverity::{Doubt, Error, Note};
use v1::run_response::Event;

use crate::briefs::{changed, errors, reading, terrace, work};
use crate::results::run;
use crate::surfaces::awning;

const EN: &str = "EN 1993-1-11:2006";

/// The terrace with this check as its only one.
fn with(check: Value) -> Value {
    changed(terrace(), &[("/checks", json!([check]))])
}

fn kind(check: Value) -> CheckKind {
    work(&with(check)).brief.checks[0].kind
}

#[track_caller]
fn told<'r>(reading: &'r Reading, severity: v1::FindingSeverity, reason: &str, path: &str) -> &'r v1::Finding {
    let found = reading
        .findings
        .iter()
        .find(|finding| finding.reason == reason && finding.path == path);
    let found = found.unwrap_or_else(|| panic!("no {reason} at {path} in {:#?}", reading.findings));
    assert_eq!(found.severity(), severity, "{found:#?}");
    assert!(!found.message.is_empty() && !found.cure.is_empty(), "{found:#?}");
    found
}

/// A check, and the only kind of error that it makes.
#[track_caller]
fn refused(check: Value, reason: &str, path: &str) {
    let reading = reading(&with(check.clone()));
    told(&reading, Error, reason, path);
    assert!(reading.work.is_none());
    let others: Vec<_> = errors(&reading).filter(|error| error.reason != reason).collect();
    assert!(others.is_empty(), "{check} also gives {others:#?}");
}

/// What came of the only check of a brief.
#[track_caller]
fn result(brief: &Value) -> (v1::CheckResult, v1::Summary) {
    let work = work(brief);
    let cases: Vec<usize> = (0..work.brief.cases.len()).collect();
    match run(&work, &cases).pop() {
        Some(Event::Summary(summary)) => (summary.checks[0].clone(), summary),
        other => panic!("{other:?} comes last"),
    }
}

#[test]
fn factors_come_from_the_brief_or_the_edition() {
    assert_eq!(
        kind(json!({"resistance": {"edition": EN, "gamma_r": 0.9}})),
        CheckKind::Resistance {
            gamma_r: 0.9,
            strength_divisor: 1.5
        }
    );
    // Another edition is taken at its word, with every factor given.
    assert_eq!(
        kind(json!({"resistance": {"edition": "House rule 7", "gamma_r": 1.1, "strength_divisor": 1.6}})),
        CheckKind::Resistance {
            gamma_r: 1.1,
            strength_divisor: 1.6
        }
    );
    assert_eq!(
        kind(json!({"service_stress": {"edition": EN, "share_of_strength": 0.45}})),
        CheckKind::ShareOfStrength {
            share: 0.45,
            stage: Stage::Service
        }
    );
    assert_eq!(
        kind(json!({"construction_stress": {"edition": EN, "share_of_strength": 0.55}})),
        CheckKind::ShareOfStrength {
            share: 0.55,
            stage: Stage::Construction
        }
    );
    assert_eq!(
        kind(json!({"clamp": {"clamp_force_n": 20000, "friction_coefficient": 0.1}, "on": ["m"]})),
        CheckKind::Clamp(Clamp {
            clamp_force: 20000.0,
            friction: 0.1,
            gamma: 1.65,
            deviation_share: 0.0
        })
    );
    let saddle = |check: Value| kind(json!({"saddle": check, "on": ["m"]}));
    assert_eq!(
        saddle(json!({"radius_m": 0.4, "wire_diameter_m": 0.002, "friction_coefficient": 0.1})),
        CheckKind::Saddle(Saddle {
            radius: Some(SaddleRadius {
                radius: 0.4,
                over_diameter: 30.0,
                of_wires: 0.8
            }),
            slip: Some(SaddleSlip {
                friction: 0.1,
                gamma: 1.65
            })
        })
    );
    let soft = json!({"radius_m": 0.4, "wire_diameter_m": 0.002, "soft_bed": {}});
    assert_eq!(
        saddle(soft),
        CheckKind::Saddle(Saddle {
            radius: Some(SaddleRadius {
                radius: 0.4,
                over_diameter: 20.0,
                of_wires: 0.0
            }),
            slip: None
        })
    );
}

#[test]
fn limits_and_places_are_read() {
    assert_eq!(
        kind(json!({"movement": {"chord": {"between": ["B", "D"], "divided_by": 250}, "from": "iced"}})),
        CheckKind::Movement {
            limit: MovementLimit::OfChord {
                between: [NodeId::new(1), NodeId::new(3)],
                divided_by: 250.0
            },
            from: Some(1)
        }
    );
    let clearance = |check: Value| match kind(json!({"clearance": check})) {
        CheckKind::Clearance(clearance) => clearance,
        other => panic!("{other:?}"),
    };
    let given = clearance(json!({"point_m": [1, 2, 0], "min_m": 0.5, "height": {}}));
    assert_eq!((given.least, given.height_within), (0.5, Some(0.5)));
    let given = clearance(json!({"point_m": [1, 2, 0], "min_m": 0.5}));
    assert_eq!(given.height_within, None);
    let pull = json!({"uplift_limit_n": 5e3, "up_angle": {"least_deg": -90, "largest_deg": 90},
        "plan_angle": {"direction_deg": 180, "within_deg": 45}});
    let pi = std::f64::consts::PI;
    assert_eq!(
        kind(json!({"anchor_pull": pull})),
        CheckKind::AnchorPull(PullLimits {
            uplift: Some(5e3),
            up_angle: Some([-pi / 2.0, pi / 2.0]),
            plan_angle: Some([pi, pi / 4.0]),
            ..PullLimits::default()
        })
    );
    let covers = |check: Value| {
        let work = work(&with(check));
        (work.brief.checks[0].nodes.clone(), work.brief.checks[0].struts.len())
    };
    // The post alone; the one node where two ropes cross.
    let buckling = json!({"buckling": {"length_factor": 1, "safety": 1.5, "eccentricity_m": 0.02}});
    assert_eq!(covers(buckling), (Vec::new(), 1));
    let clamp = json!({"clamp": {"clamp_force_n": 0, "friction_coefficient": 0.1}});
    let m = work(&terrace())
        .brief
        .net
        .nodes()
        .iter()
        .position(|node| node.name == "m");
    assert_eq!(covers(clamp), (vec![NodeId::new(m.expect("a node m"))], 0));
}

#[test]
fn checks_that_cannot_be_read() {
    for (check, reason, path) in [
        (
            json!({"resistance": {"gamma_r": 1}}),
            "MISSING",
            "checks[0].resistance.edition",
        ),
        (
            json!({"resistance": {"edition": EN}}),
            "OUT_OF_RANGE",
            "checks[0].resistance.gamma_r",
        ),
        (
            json!({"resistance": {"edition": "EN 1993-1-11:2026", "gamma_r": 1}}),
            "EDITION_UNKNOWN",
            "checks[0].resistance.strength_divisor",
        ),
        (
            json!({"service_stress": {"share_of_strength": 0.45}}),
            "MISSING",
            "checks[0].service_stress.edition",
        ),
        (
            json!({"service_stress": {"edition": EN}}),
            "NOT_POSITIVE",
            "checks[0].service_stress.share_of_strength",
        ),
        (
            json!({"construction_stress": {"edition": EN, "share_of_strength": 1.1}}),
            "OUT_OF_RANGE",
            "checks[0].construction_stress.share_of_strength",
        ),
        (
            json!({"buckling": {"safety": 1.5}}),
            "OUT_OF_RANGE",
            "checks[0].buckling.length_factor",
        ),
        (
            json!({"buckling": {"length_factor": 1, "safety": 1.5, "eccentricity_m": -1}}),
            "NOT_POSITIVE",
            "checks[0].buckling.eccentricity_m",
        ),
        (json!({"movement": {}}), "MISSING", "checks[0].movement.limit_m"),
        (
            json!({"movement": {"limit_m": 1, "chord": {"between": ["B", "D"], "divided_by": 200}}}),
            "MISSING",
            "checks[0].movement.limit_m",
        ),
        (
            json!({"movement": {"chord": {"between": ["B"], "divided_by": 200}}}),
            "WRONG_COUNT",
            "checks[0].movement.chord.between",
        ),
        (
            json!({"movement": {"chord": {"between": ["B", "B"], "divided_by": 200}}}),
            "NO_LENGTH",
            "checks[0].movement.chord.between",
        ),
        (
            json!({"movement": {"chord": {"between": ["B", "guy"], "divided_by": 200}}}),
            "WRONG_KIND",
            "checks[0].movement.chord.between[1]",
        ),
        (
            json!({"movement": {"chord": {"between": ["B", "D"], "divided_by": 0}}}),
            "OUT_OF_RANGE",
            "checks[0].movement.chord.divided_by",
        ),
        (
            json!({"movement": {"limit_m": 1, "from": "icd"}}),
            "UNKNOWN_ID",
            "checks[0].movement.from",
        ),
        (
            json!({"clearance": {"min_m": 1}}),
            "WRONG_COUNT",
            "checks[0].clearance.point_m",
        ),
        (
            json!({"clearance": {"point_m": [0, 0, 1], "min_m": 0}}),
            "NOT_POSITIVE",
            "checks[0].clearance.min_m",
        ),
        (
            json!({"clearance": {"point_m": [0, 0, 1], "min_m": 1, "height": {"within_m": 0}}}),
            "NOT_POSITIVE",
            "checks[0].clearance.height.within_m",
        ),
        (json!({"anchor_pull": {}}), "MISSING", "checks[0].anchor_pull.limit_n"),
        (
            json!({"anchor_pull": {"uplift_limit_n": 0}}),
            "NOT_POSITIVE",
            "checks[0].anchor_pull.uplift_limit_n",
        ),
        (
            json!({"anchor_pull": {"up_angle": {"least_deg": 30, "largest_deg": 20}}}),
            "OUT_OF_RANGE",
            "checks[0].anchor_pull.up_angle.largest_deg",
        ),
        (
            json!({"anchor_pull": {"plan_angle": {"direction_deg": 30}}}),
            "NOT_POSITIVE",
            "checks[0].anchor_pull.plan_angle.within_deg",
        ),
        (
            json!({"clamp": {"friction_coefficient": 0.1}}),
            "MISSING",
            "checks[0].clamp.clamp_force_n",
        ),
        (
            json!({"clamp": {"clamp_force_n": 1, "friction_coefficient": 0.1, "edition": "House rule 7"}}),
            "EDITION_UNKNOWN",
            "checks[0].clamp.gamma_m_fr",
        ),
        (
            json!({"clamp": {"clamp_force_n": 1, "friction_coefficient": 0.1, "deviation_share": 2}}),
            "OUT_OF_RANGE",
            "checks[0].clamp.deviation_share",
        ),
        (
            json!({"saddle": {}, "on": ["m"]}),
            "MISSING",
            "checks[0].saddle.radius_m",
        ),
        (
            json!({"saddle": {"radius_m": 1, "edition": "House rule 7"}, "on": ["m"]}),
            "EDITION_UNKNOWN",
            "checks[0].saddle.radius_over_diameter",
        ),
        (
            json!({"saddle": {"friction_coefficient": 0.1, "gamma_m_fr": 0}, "on": ["m"]}),
            "OUT_OF_RANGE",
            "checks[0].saddle.gamma_m_fr",
        ),
        // There are no panels.
        (
            json!({"drainage": {"min_fall": 0.05}}),
            "COVERS_NOTHING",
            "checks[0].on",
        ),
        (
            json!({"drainage": {"min_fall": 0.05}, "on": ["m"]}),
            "WRONG_KIND",
            "checks[0].on[0]",
        ),
        // No rope slides anywhere.
        (
            json!({"saddle": {"friction_coefficient": 0.1}}),
            "COVERS_NOTHING",
            "checks[0].on",
        ),
        (
            json!({"clamp": {"clamp_force_n": 1, "friction_coefficient": 0.1}, "on": ["carrying"]}),
            "WRONG_KIND",
            "checks[0].on[0]",
        ),
    ] {
        refused(check, reason, path);
    }
}

#[test]
fn an_unknown_edition_is_named() {
    let reading = reading(&with(
        json!({"resistance": {"edition": "EN 1993-1-11:2026", "gamma_r": 1}}),
    ));
    let finding = told(
        &reading,
        Error,
        "EDITION_UNKNOWN",
        "checks[0].resistance.strength_divisor",
    );
    assert!(finding.message.contains("\"EN 1993-1-11:2026\""), "{finding:#?}");
    assert!(finding.cure.contains(EN), "{finding:#?}");
}

#[test]
fn what_a_check_cannot_judge_is_a_doubt() {
    for (check, path) in [
        (
            json!({"resistance": {"edition": EN, "gamma_r": 1}, "on": ["post"]}),
            "checks[0].on",
        ),
        (
            json!({"buckling": {"length_factor": 1, "safety": 2}, "on": ["g1"]}),
            "checks[0].on",
        ),
        (
            json!({"clamp": {"clamp_force_n": 1, "friction_coefficient": 0.1}, "on": ["A"]}),
            "checks[0].on",
        ),
    ] {
        told(&reading(&with(check)), Doubt, "NOT_JUDGEABLE", path);
    }
    let limp = [
        ("/net/sections/2/bending_stiffness_n_m2", Value::Null),
        (
            "/checks",
            json!([{"buckling": {"length_factor": 1, "safety": 2}, "over": ["winter"]}]),
        ),
    ];
    let limp = changed(terrace(), &limp);
    told(&reading(&limp), Doubt, "NOT_JUDGEABLE", "checks[0].buckling");
    let (result, _) = result(&limp);
    assert_eq!(result.verdict(), v1::Verdict::NotJudged);
    assert_eq!(result.not_judged_why, "no bending stiffness is given");
    // A share that the edition does not name may be right by a national annex.
    told(
        &reading(&with(
            json!({"service_stress": {"edition": EN, "share_of_strength": 0.4}}),
        )),
        Note,
        "FACTOR_NOT_OF_EDITION",
        "checks[0].service_stress.share_of_strength",
    );
}

/// The formula of the standard beside what the run tells, from the tension that the run tells.
#[test]
fn a_resistance_tells_its_rule_and_its_numbers() {
    let check = json!({"resistance": {"edition": EN, "gamma_r": 0.9}, "on": ["bracing"], "over": ["winter"]});
    let (result, summary) = result(&with(check));
    assert_eq!((result.kind.as_str(), result.unit.as_str()), ("resistance", "N"));
    assert_eq!(result.worst, "bracing");
    // F_uk 82 kN over 1.5 · 0.9.
    assert!((result.limit - 82e3 / 1.35).abs() < 1e-6, "{}", result.limit);
    assert!((result.ratio - result.demand / result.limit).abs() < 1e-15);
    for word in [EN, "6.2", "gamma_R 0.9", "verify", "certificate 17"] {
        assert!(result.source.contains(word), "no {word} in {}", result.source);
    }
    assert!(
        result.notes.iter().any(|note| note.contains("F_k")),
        "{:?}",
        result.notes
    );
    assert_eq!(result.judgements.len(), 1);
    assert_eq!(result.judgements[0].measure, "tension");
    assert_eq!(result.judgements[0].governing_case, result.governing_case);
    // With a proof force its term governs: 54 kN over 0.9.
    let proof = changed(
        terrace(),
        &[
            ("/net/sections/0/proof_force_n", json!(54e3)),
            (
                "/checks",
                json!([{"resistance": {"edition": EN, "gamma_r": 0.9}, "on": ["bracing"]}]),
            ),
        ],
    );
    let (result, _) = self::result(&proof);
    assert!((result.limit - 54e3 / 0.9).abs() < 1e-6, "{}", result.limit);
    assert_eq!(result.notes, Vec::<String>::new());

    let anchors = summary.anchors.expect("an anchor sheet");
    assert_eq!(anchors.total as usize, anchors.anchors.len());
    let corner = anchors
        .anchors
        .iter()
        .find(|anchor| anchor.node == "C")
        .expect("anchor C");
    let largest = corner.largest.as_ref().expect("a pull");
    let size = (largest.horizontal_n.powi(2) + largest.up_n.powi(2)).sqrt();
    assert!((size - largest.size_n).abs() < 1e-9 * size);
    assert!((largest.x_n.hypot(largest.y_n) - largest.horizontal_n).abs() < 1e-9 * size);
}

#[test]
fn movement_from_a_case_is_zero_in_that_case() {
    let moved = |over: &str, from: &str| {
        let mut check = json!({"movement": {"limit_m": 0.2}, "on": ["m"], "over": [over]});
        if !from.is_empty() {
            check["movement"]["from"] = json!(from);
        }
        result(&with(check)).0
    };
    assert_eq!(moved("snowed", "snowed").demand, 0.0);
    let (there, back) = (moved("snowed", "iced").demand, moved("iced", "snowed").demand);
    assert!(there > 1e-3 && there == back, "{there} {back}");
    assert!(moved("snowed", "iced").source.contains("case \"iced\""));
    // From the reference state one goes down by less than the sum.
    assert!(moved("snowed", "").demand <= there + moved("iced", "").demand);
}

#[test]
fn a_clearance_names_the_nearest_rope() {
    // B lies at (9, 0, 0): the bracing rope begins there.
    let check = json!({"clearance": {"point_m": [9, 0, -0.5], "min_m": 1}, "over": ["snowed"]});
    let (result, _) = result(&with(check));
    assert_eq!((result.worst.as_str(), result.unit.as_str()), ("bracing", "m"));
    assert!((result.demand - 0.5).abs() < 1e-12 && (result.ratio - 2.0).abs() < 1e-12);
    assert_eq!(result.verdict(), v1::Verdict::Exceeds);
    assert_eq!((result.judged, result.not_judged), (1, 0));
}

#[test]
fn angles_are_told_in_degrees() {
    // The guy at G1 pulls towards the mast at A: up, and inwards.
    let check =
        json!({"anchor_pull": {"up_angle": {"least_deg": 0, "largest_deg": 10}}, "on": ["G1"], "over": ["snowed"]});
    let (result, _) = result(&with(check));
    assert_eq!(result.unit, "deg");
    assert_eq!(result.judgements[0].measure, "angle above the horizontal");
    assert_eq!((result.limit * 1e9).round(), 10e9);
    assert!(result.demand > 10.0 && result.demand < 90.0, "{}", result.demand);
    assert!((result.ratio - (result.demand - 5.0) / 5.0).abs() < 1e-9);
}

#[test]
fn panels_are_judged_in_the_reference_state_too() {
    // West and east are alike; their nodes are held, so that nothing moves. Corners 3, 3, 3 and 4 m high on a square of
    // 3 m: the mean lies at 3.25 m, the triangles rise by 1 in 6 and by the root of 10 in 6.
    let check = json!([{"drainage": {"min_fall": 0.2}, "on": ["west"]}]);
    let (result, _) = result(&changed(awning(), &[("/checks", check)]));
    assert_eq!((result.judged, result.verdict()), (1, v1::Verdict::Exceeds));
    assert_eq!(result.governing_case, "reference");
    assert!((result.demand - 1.0 / 6.0).abs() < 1e-12, "{}", result.demand);
    assert!((result.ratio - 1.2).abs() < 1e-12);
    let whole = json!([{"drainage": {"min_fall": 0.1}}, {"clearance": {"point_m": [1.5, 1.5, 3.0], "min_m": 0.2, "height": {}}}]);
    let (result, summary) = self::result(&changed(awning(), &[("/checks", whole)]));
    assert_eq!((result.judged, result.verdict()), (2, v1::Verdict::Passes));
    // The panel stands a quarter of a metre above the point.
    let clear = &summary.checks[1];
    assert!((clear.demand - 0.25).abs() < 1e-12, "{clear:#?}");
    assert_eq!(clear.judgements[0].measure, "height");
}
