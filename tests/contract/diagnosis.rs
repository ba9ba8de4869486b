//! What states allow beside bearing their load: read from a brief, and told between the arrays and the end of a state.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::DiagnosisGiven;
use serde_json::{Value, json};
use v1::run_response::Event;
use v1::state_diagnosis::Part;

use crate::briefs::{changed, errors, first_net, reading, terrace, work};
use crate::results::run;

fn asking(base: Value, diagnosis: Value) -> Value {
    changed(base, &[("/diagnosis", diagnosis)])
}

#[test]
fn states_and_numbers_reach_the_work() {
    for (diagnosis, reference, cases, stiffnesses) in [
        (json!({}), true, vec![0, 1, 2], 3),
        (json!({"about": ["reference"], "note": "for the file"}), true, vec![], 3),
        (
            json!({"about": ["winter", "summer"], "modes_of_stiffness": 20}),
            false,
            vec![0, 1, 2],
            20,
        ),
        (
            json!({"about": ["iced", "reference"], "modes_of_stiffness": 1}),
            true,
            vec![1],
            1,
        ),
    ] {
        let given = work(&asking(terrace(), diagnosis)).brief.diagnosis;
        assert_eq!(
            given,
            Some(DiagnosisGiven {
                reference,
                cases,
                stiffnesses
            })
        );
    }
    assert_eq!(work(&terrace()).brief.diagnosis, None);
}

#[test]
fn bad_names_and_numbers_are_told() {
    for (diagnosis, reason, path) in [
        (json!({"about": ["snowd"]}), "UNKNOWN_ID", "diagnosis.about[0]"),
        (
            json!({"about": ["reference", "iced", "iced"]}),
            "REPEATED_IN_LIST",
            "diagnosis.about[2]",
        ),
        (
            json!({"modes_of_stiffness": 0}),
            "OUT_OF_RANGE",
            "diagnosis.modes_of_stiffness",
        ),
        (
            json!({"modes_of_stiffness": 21}),
            "OUT_OF_RANGE",
            "diagnosis.modes_of_stiffness",
        ),
    ] {
        let reading = reading(&asking(terrace(), diagnosis));
        let found = reading.findings.iter().find(|f| f.reason == reason && f.path == path);
        assert!(
            found.is_some_and(|f| !f.cure.is_empty()),
            "{reason} {path}: {:#?}",
            reading.findings
        );
        assert!(reason == "REPEATED_IN_LIST" || errors(&reading).count() == 1);
    }
}

/// Parts of what was found, in order, with the place of each event.
fn parts(events: &[Event], case: &str) -> Vec<Part> {
    let mut open = None;
    let mut parts = Vec::new();
    for event in events {
        match event {
            Event::CaseBegin(begin) => open = Some(begin.case.clone()),
            Event::CaseSummary(_) => open = None,
            Event::Diagnosis(part) => {
                assert_eq!(
                    open.as_deref(),
                    Some(part.case.as_str()),
                    "between beginning and end of its state"
                );
                if part.case == case {
                    parts.extend(part.part.clone());
                }
            }
            _ => {}
        }
    }
    parts
}

/// The crossing of two ropes: four segments, three directions. By hand: the chords to A and C, to B and D lie in two
/// vertical planes and dip or rise alike, so the rank is 3 and one state of self-stress is left.
#[test]
fn the_minimal_draft_has_one_self_stress_and_no_mechanism() {
    let work = work(&asking(
        first_net(),
        json!({"about": ["reference", "full-snow"], "modes_of_stiffness": 2}),
    ));
    let events = run(&work, &[0]);
    for case in ["reference", "full-snow"] {
        let parts = parts(&events, case);
        let Part::Mobility(found) = &parts[0] else {
            panic!("{parts:#?}")
        };
        assert_eq!((found.members, found.free_directions, found.rank), (4, 3, 3));
        assert_eq!((found.self_stresses, found.mechanisms, found.not_stiffened), (1, 0, 0));
        assert_eq!(found.way(), v1::MobilityWay::Dense);
        let Part::SelfStress(state) = &parts[1] else {
            panic!("{parts:#?}")
        };
        assert_eq!(state.segments_total, 4);
        // At the reference the two ropes balance each other with equal forces.
        assert!(case != "reference" || state.shares.iter().all(|share| (share - 1.0).abs() < 1e-6));
        let least: Vec<&v1::LeastStiffness> = parts[2..]
            .iter()
            .map(|part| match part {
                Part::LeastStiffness(least) => least,
                other => panic!("{other:#?}"),
            })
            .collect();
        assert_eq!(least.len(), 2);
        assert!(least[0].stiffness_n_per_m > 0.0 && least[0].stiffness_n_per_m <= least[1].stiffness_n_per_m);
        assert_eq!(least[0].nodes, ["m"]);
        let closing = events.iter().find_map(|event| match event {
            Event::CaseSummary(closing) if closing.case == case => Some(closing),
            _ => None,
        });
        let told = closing.expect("a summary").smallest_stiffness_n_per_m;
        assert_eq!(told, Some(least[0].stiffness_n_per_m));
    }
}

#[test]
fn nothing_is_told_unasked() {
    let events = run(&work(&first_net()), &[0]);
    assert!(!events.iter().any(|event| matches!(event, Event::Diagnosis(_))));
    assert!(
        !events.iter().any(|event| {
            matches!(event, Event::CaseSummary(closing) if closing.smallest_stiffness_n_per_m.is_some())
        })
    );
}

#[test]
fn little_stiffness_left_is_a_doubt() {
    // Two ropes on one line: only their pull holds the node between them across it.
    let brief = json!({
        "id": "line",
        "net": {
            "nodes": [
                {"id": "a", "xyz_m": [0, 0, 0], "support": {}},
                {"id": "n", "xyz_m": [4, 0, 0]},
                {"id": "b", "xyz_m": [8, 0, 0], "support": {}}
            ],
            "sections": [{"id": "rope", "axial_stiffness_n": 1e7}],
            "cables": [
                {"id": "left", "section": "rope", "nodes": ["a", "n"]},
                {"id": "right", "section": "rope", "nodes": ["n", "b"]}
            ]
        },
        "prestress": {"rules": [{"on": ["left", "right"], "tension_n": 5000}]},
        "actions": [{"id": "cold", "loads": [{"prestress": {"share": -0.95}}]}],
        "cases": [{"id": "weak", "factors": {"cold": 1}}],
        "diagnosis": {}
    });
    let work = work(&brief);
    let events = run(&work, &[0]);
    let parts = parts(&events, "reference");
    let mechanisms: Vec<_> = parts.iter().filter(|part| matches!(part, Part::Mechanism(_))).collect();
    assert_eq!(mechanisms.len(), 2, "{parts:#?}");
    let doubts: Vec<&v1::Finding> = events
        .iter()
        .filter_map(|event| match event {
            Event::Finding(finding) if finding.reason == "LITTLE_STIFFNESS" => Some(finding),
            _ => None,
        })
        .collect();
    // A twentieth of the tension leaves a twentieth of the stiffness across: by hand 2 T / l.
    assert_eq!(doubts.len(), 1, "{doubts:#?}");
    assert_eq!((doubts[0].case.as_str(), doubts[0].id.as_str()), ("weak", "n"));
    let stiffness: f64 = doubts[0].value.parse().expect("a number");
    assert!((stiffness - 2.0 * 250.0 / 4.0).abs() < 1.0, "{stiffness}");
}
