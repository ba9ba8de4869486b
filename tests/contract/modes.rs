//! Natural modes: read from a brief, and told between the arrays and the end of a state.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::ModesGiven;
use ropewalk_numerics::model::{NodeId, SegmentId};
use ropewalk_numerics::motion::MassGiven;
use serde_json::{Value, json};
use v1::run_response::Event;
use v1::state_modes::Part;

use crate::briefs::{changed, errors, first_net, reading, terrace, work};
use crate::results::run;

fn asking(base: Value, modes: Value) -> Value {
    changed(base, &[("/modes", modes)])
}

#[test]
fn states_masses_and_limits_reach_the_work() {
    let default = ModesGiven {
        cases: vec![0, 1, 2],
        ..ModesGiven::default()
    };
    assert_eq!(
        (default.count, default.wind_study_below, default.flexible_below),
        (6, 5.0, 1.0)
    );
    for (modes, wanted) in [
        (json!({}), default.clone()),
        (
            json!({"about": ["iced"], "count": 100, "wind_study_below_hz": 0.5, "note": "for the file"}),
            ModesGiven {
                reference: false,
                cases: vec![1],
                count: 100,
                wind_study_below: 0.5,
                flexible_below: 0.5,
                ..default.clone()
            },
        ),
        (
            json!({"about": ["reference"], "wind_study_below_hz": 3, "flexible_below_hz": 2, "count": 1}),
            ModesGiven {
                cases: Vec::new(),
                count: 1,
                wind_study_below: 3.0,
                flexible_below: 2.0,
                ..default.clone()
            },
        ),
    ] {
        assert_eq!(work(&asking(terrace(), modes)).brief.modes, Some(wanted));
    }
    assert_eq!(work(&terrace()).brief.modes, None);
    let added = json!([
        {"on": ["m"], "mass_kg": 12.5},
        {"on": ["carrying"], "mass_per_length_kg_per_m": 0.75, "note": "ice that stays"}
    ]);
    let net = work(&first_net()).brief.net;
    let m = net
        .nodes()
        .iter()
        .position(|node| node.name == "m")
        .expect("the crossing");
    let carrying = net
        .cables()
        .iter()
        .find(|cable| cable.name == "carrying")
        .expect("a cable")
        .segments
        .clone();
    let given = work(&asking(first_net(), json!({"added": added})))
        .brief
        .modes
        .expect("modes");
    assert_eq!(
        given.masses,
        MassGiven {
            nodes: vec![(NodeId::new(m), 12.5)],
            segments: carrying.map(|segment| (SegmentId::new(segment), 0.75)).collect(),
            ..MassGiven::default()
        }
    );
}

#[test]
fn bad_names_and_numbers_are_told() {
    for (modes, reason, path) in [
        (json!({"about": ["snowd"]}), "UNKNOWN_ID", "modes.about[0]"),
        (json!({"about": ["iced", "iced"]}), "REPEATED_IN_LIST", "modes.about[1]"),
        (json!({"count": 0}), "OUT_OF_RANGE", "modes.count"),
        (json!({"count": 101}), "OUT_OF_RANGE", "modes.count"),
        (
            json!({"air_mass_kg_per_m2": -1}),
            "NEGATIVE",
            "modes.air_mass_kg_per_m2",
        ),
        (
            json!({"air_mass_kg_per_m2": "NaN"}),
            "NOT_FINITE",
            "modes.air_mass_kg_per_m2",
        ),
        (
            json!({"wind_study_below_hz": -5}),
            "NEGATIVE",
            "modes.wind_study_below_hz",
        ),
        (
            json!({"flexible_below_hz": "Infinity"}),
            "NOT_FINITE",
            "modes.flexible_below_hz",
        ),
        (
            json!({"flexible_below_hz": 6}),
            "OUT_OF_RANGE",
            "modes.flexible_below_hz",
        ),
        (json!({"added": [{"on": ["m"]}]}), "MISSING", "modes.added[0]"),
        (
            json!({"added": [{"mass_kg": 1}]}),
            "COVERS_NOTHING",
            "modes.added[0].on",
        ),
        (
            json!({"added": [{"on": ["m"], "mass_kg": -1}]}),
            "NEGATIVE",
            "modes.added[0].mass_kg",
        ),
        (
            json!({"added": [{"on": ["mm"], "mass_kg": 1}]}),
            "UNKNOWN_ID",
            "modes.added[0].on[0]",
        ),
        (
            json!({"added": [{"on": ["carrying"], "mass_kg": 1}]}),
            "WRONG_KIND",
            "modes.added[0].on[0]",
        ),
        (
            json!({"added": [{"on": ["m"], "mass_per_length_kg_per_m": 1}]}),
            "WRONG_KIND",
            "modes.added[0].on[0]",
        ),
        (
            json!({"added": [{"on": ["carrying"], "mass_per_area_kg_per_m2": 1}]}),
            "WRONG_KIND",
            "modes.added[0].on[0]",
        ),
    ] {
        let about = modes.get("about").is_some();
        let reading = reading(&asking(if about { terrace() } else { first_net() }, modes));
        let found = reading.findings.iter().find(|f| f.reason == reason && f.path == path);
        assert!(
            found.is_some_and(|f| !f.cure.is_empty()),
            "{reason} {path}: {:#?}",
            reading.findings
        );
        assert!(reason == "REPEATED_IN_LIST" || errors(&reading).count() == 1);
    }
    let reading = reading(&asking(first_net(), json!({"air_mass_kg_per_m2": 1})));
    assert!(
        reading
            .findings
            .iter()
            .any(|f| f.reason == "DATA_NOT_USED" && f.path == "modes.air_mass_kg_per_m2")
    );
}

/// Parts of the modes of a state, and its array of shapes, which lie between its beginning and its end.
fn parts(events: &[Event], case: &str) -> (Vec<Part>, Option<v1::Columns>) {
    let mut open = None;
    let (mut parts, mut shapes) = (Vec::new(), None);
    for event in events {
        match event {
            Event::CaseBegin(begin) => open = Some(begin.case.clone()),
            Event::CaseSummary(_) => open = None,
            Event::Modes(part) => {
                assert_eq!(open.as_deref(), Some(part.case.as_str()));
                if part.case == case {
                    parts.extend(part.part.clone());
                }
            }
            Event::Columns(columns) if columns.name == "mode_shape" && columns.case == case => {
                shapes = Some(columns.clone());
            }
            _ => {}
        }
    }
    (parts, shapes)
}

/// The crossing of two ropes has three directions and so three modes, however many are asked for.
#[test]
fn the_minimal_draft_has_three_modes() {
    let massive = changed(first_net(), &[("/net/sections/0/mass_kg_per_m", json!(0.5))]);
    let work = work(&asking(massive, json!({"count": 9})));
    let events = run(&work, &[0]);
    for case in ["reference", "full-snow"] {
        let (parts, shapes) = parts(&events, case);
        let Part::Found(found) = &parts[0] else {
            panic!("{parts:#?}")
        };
        assert_eq!((found.modes, found.counted, found.complete), (3, Some(3), true));
        assert!(found.unsymmetric_share.is_none() && found.orthogonality < 1e-12);
        let mut effective = [0.0; 3];
        let mut last = 0.0;
        for (number, part) in parts[1..].iter().enumerate() {
            let Part::Mode(mode) = part else { panic!("{parts:#?}") };
            assert_eq!(
                (mode.number, mode.kind()),
                (u32::try_from(number).unwrap(), v1::ModeKind::Vibrates)
            );
            assert!(mode.frequency_hz >= last && mode.residual < 1e-9);
            assert_eq!(mode.nodes, ["m"]);
            last = mode.frequency_hz;
            effective
                .iter_mut()
                .zip(&mode.effective_mass_kg)
                .for_each(|(sum, mass)| *sum += mass);
        }
        assert_eq!(parts.len(), 4);
        for (sum, moving) in effective.iter().zip(&found.moving_mass_kg) {
            assert!(*moving > 0.0 && (sum - moving).abs() <= 1e-12 * moving);
        }
        let shapes = shapes.expect("shapes");
        assert_eq!(
            (shapes.over(), shapes.components, shapes.values.len()),
            (v1::Range::Node, 9, 45)
        );
    }
}

/// Without any mass there is nothing to vibrate: an error says so, and how to mend it.
#[test]
fn a_net_without_mass_has_no_modes() {
    let massless = changed(first_net(), &[("/net/sections/0/mass_kg_per_m", json!(0))]);
    let events = run(&work(&asking(massless, json!({"about": ["reference"]}))), &[0]);
    assert_eq!(parts(&events, "reference"), (Vec::new(), None));
    let told = events.iter().find_map(|event| match event {
        Event::Finding(finding) if finding.reason == "NO_MODES" => Some(finding),
        _ => None,
    });
    let told = told.expect("an error");
    assert_eq!(
        (told.case.as_str(), told.severity()),
        ("reference", v1::FindingSeverity::Error)
    );
    assert!(told.message.contains("mass") && told.cure.contains("mass"), "{told:#?}");
}

/// A lowest frequency below a limit asks for a study of the wind, and the brief may accept that.
#[test]
fn a_low_frequency_asks_for_a_study() {
    let heavy = |limits: [f64; 2], accepted: Value| {
        let modes = json!({
            "about": ["reference"], "added": [{"on": ["m"], "mass_kg": 4000}],
            "wind_study_below_hz": limits[0], "flexible_below_hz": limits[1]
        });
        let brief = changed(asking(first_net(), modes), &[("/accepted", accepted)]);
        let events = run(&work(&brief), &[0]);
        let (parts, _) = parts(&events, "reference");
        let Part::Found(found) = &parts[0] else {
            panic!("{parts:#?}")
        };
        let told = events.into_iter().find_map(|event| match event {
            Event::Finding(finding) if finding.reason == "LOW_FREQUENCY" => Some(finding),
            _ => None,
        });
        (found.lowest_frequency_hz.expect("a frequency"), told)
    };
    let (lowest, _) = heavy([5.0, 1.0], json!([]));
    assert_eq!(heavy([0.9 * lowest, 0.0], json!([])).1, None);
    let told = heavy([1.1 * lowest, 0.9 * lowest], json!([])).1.expect("a doubt");
    assert_eq!((told.severity(), told.id.as_str()), (v1::FindingSeverity::Doubt, "m"));
    assert!(!told.message.contains("flexible") && told.accepted_note.is_empty());
    let accepted = json!([{"reason": "LOW_FREQUENCY", "on": "m", "note": "wind tunnel"}]);
    let told = heavy([1.2 * lowest, 1.1 * lowest], accepted).1.expect("a doubt");
    assert!(
        told.message.contains("flexible") && told.accepted_note == "wind tunnel",
        "{told:#?}"
    );
}
