//! Targets of a shape: how they are read, what is refused of them, what is told of them.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::model::{NodeId, SegmentId};
use ropewalk_numerics::shape::{Adjustable, PrestressRule, SagMeasure, Wish};
use serde_json::{Value, json};
use v1::run_response::Event;

use crate::briefs::{changed, reading, terrace, work};
use crate::results::run;
use crate::violations::check;

/// The terrace with its ropes adjustable and some targets.
fn aimed(targets: Value) -> Value {
    changed(
        terrace(),
        &[
            (
                "/prestress/rules/0",
                json!({"on": ["rope"], "force_density_n_per_m": 3000, "adjust": {}}),
            ),
            ("/prestress/targets", targets),
        ],
    )
}

fn segments(list: &[usize]) -> Vec<SegmentId> {
    list.iter().map(|s| SegmentId::new(*s)).collect()
}

#[test]
fn targets_are_read() {
    let brief = work(&aimed(json!([
        {"id": "long", "length": {"on": ["saddle"], "length_m": 14}},
        {"weight": 2.5, "unstressed_length": {"parts": [{"cable": "carrying", "from": "A", "to": "m"}],
         "unstressed_length_m": 7}},
        {"tension": {"on": ["carrying"], "tension_n": 9000}},
        {"tension": {"on": ["carrying"], "mean_tension_n": 9000}},
        {"place": {"node": "m", "x_m": 4, "z_m": 1.2}},
        {"sag": {"cable": "bracing", "node": "m", "sag_m": -0.5}},
        {"sag": {"cable": "carrying", "node": "m", "from": "A", "to": "C", "sag_normal_m": 0.5}},
        {"equal_lengths": {"on": ["saddle"]}},
        {"equal_lengths": {"on": ["saddle"], "within_each": true}},
        {"radius": {"on": ["carrying"], "radius_m": 20}},
        {"surface": {"nodes": ["m"], "points_xyz_m": [0, 0, 1, 9, 0, 1, 0, 9, 2]}}
    ])))
    .brief;
    let prestress = &brief.prestress;
    let free = Adjustable {
        density: 3000.0,
        least: 0.0,
        most: f64::INFINITY,
    };
    assert_eq!(prestress.adjustables, [free; 2], "one for each cable");
    let adjustable = PrestressRule::Adjustable;
    assert_eq!(
        prestress.rules[..4],
        [adjustable(0), adjustable(0), adjustable(1), adjustable(1)]
    );
    let m = NodeId::new(brief.net.nodes().iter().position(|n| n.name == "m").expect("a node"));
    let node = |name: &str| NodeId::new(brief.net.nodes().iter().position(|n| n.name == name).expect("a node"));
    let tension = |list: &[usize]| Wish::Tension {
        segments: segments(list),
        tension: 9000.0,
    };
    let expected = [
        (
            "long",
            Wish::Length {
                segments: segments(&[0, 1]),
                length: 14.0,
            },
        ),
        (
            "long",
            Wish::Length {
                segments: segments(&[2, 3]),
                length: 14.0,
            },
        ),
        (
            "1",
            Wish::UnstressedLength {
                segments: segments(&[0]),
                length: 7.0,
            },
        ),
        ("2", tension(&[0])),
        ("2", tension(&[1])),
        ("3", tension(&[0, 1])),
        (
            "4",
            Wish::Coordinate {
                node: m,
                axis: 0,
                value: 4.0,
            },
        ),
        (
            "4",
            Wish::Coordinate {
                node: m,
                axis: 2,
                value: 1.2,
            },
        ),
        (
            "5",
            Wish::Sag {
                node: m,
                chord: [node("B"), node("D")],
                sag: -0.5,
                measure: SagMeasure::Vertical,
            },
        ),
        (
            "6",
            Wish::Sag {
                node: m,
                chord: [node("A"), node("C")],
                sag: 0.5,
                measure: SagMeasure::Normal,
            },
        ),
        (
            "7",
            Wish::EqualLengths {
                segments: segments(&[0, 1, 2, 3]),
            },
        ),
        (
            "8",
            Wish::EqualLengths {
                segments: segments(&[0, 1]),
            },
        ),
        (
            "8",
            Wish::EqualLengths {
                segments: segments(&[2, 3]),
            },
        ),
        (
            "9",
            Wish::Radius {
                nodes: [node("A"), m, node("C")],
                radius: 20.0,
            },
        ),
    ];
    for (found, (name, wish)) in prestress.targets.iter().zip(&expected) {
        assert_eq!((found.name.as_str(), &found.wish), (*name, wish));
        assert_eq!(found.weight, if *name == "1" { 2.5 } else { 1.0 });
    }
    assert_eq!(prestress.targets.len(), expected.len() + 1);
    let Wish::Surface { nodes, points } = &prestress.targets[expected.len()].wish else {
        panic!("a surface");
    };
    assert_eq!((nodes.as_slice(), points.len(), points[1].x), ([m].as_slice(), 3, 9.0));
}

#[test]
fn unknowns_are_one_for_each_segment_or_one_for_all_where_asked() {
    let rules = |adjust: Value| {
        let place = json!([{"place": {"node": "m", "z_m": 1}}]);
        let brief = work(&changed(aimed(place), &[("/prestress/rules/0/adjust", adjust)])).brief;
        brief.prestress
    };
    let adjustable = PrestressRule::Adjustable;
    let found = rules(json!({"each_segment": {}, "least_n_per_m": 100, "most_n_per_m": 9000}));
    assert_eq!(found.rules[..4], [0, 1, 2, 3].map(adjustable));
    assert_eq!((found.adjustables[3].least, found.adjustables[3].most), (100.0, 9000.0));
    assert_eq!(rules(json!({"together": {}})).rules[..4], [adjustable(0); 4]);
    assert_eq!(
        rules(json!({"each_member": {}})).rules[..4],
        [0, 0, 1, 1].map(adjustable)
    );
}

#[test]
fn targets_that_cannot_be_read() {
    let place = |node: &str| json!({"id": "t", "place": {"node": node, "z_m": 1}});
    let sag = |node: &str, from: &str, to: &str| json!({"id": "t", "sag": {"cable": "carrying", "node": node, "from": from, "to": to, "sag_m": 1}});
    for (target, reason, path) in [
        (json!({"id": "t"}), "TARGET_WITHOUT_WISH", "prestress.targets[t]"),
        (
            json!({"id": "t", "place": {"node": "m"}}),
            "TARGET_WITHOUT_WISH",
            "prestress.targets[t].place",
        ),
        (
            json!({"id": "t", "sag": {"cable": "carrying", "node": "m"}}),
            "TARGET_WITHOUT_WISH",
            "prestress.targets[t].sag",
        ),
        (
            json!({"id": "t", "tension": {"on": ["rope"]}}),
            "TARGET_WITHOUT_WISH",
            "prestress.targets[t].tension",
        ),
        (
            json!({"id": "t", "radius": {"on": ["g1"], "radius_m": 3}}),
            "TARGET_WITHOUT_WISH",
            "prestress.targets[t].radius",
        ),
        (
            json!({"id": "t", "equal_lengths": {"on": ["g1"]}}),
            "TARGET_WITHOUT_WISH",
            "prestress.targets[t].equal_lengths",
        ),
        (place("nowhere"), "UNKNOWN_ID", "prestress.targets[t].place.node"),
        (place("carrying"), "WRONG_KIND", "prestress.targets[t].place.node"),
        (place("B"), "TARGET_NOT_FREE", "prestress.targets[t].place.node"),
        (place("A"), "TARGET_NOT_FREE", "prestress.targets[t].place.node"),
        (sag("m", "m", "C"), "NOT_BETWEEN", "prestress.targets[t].sag.node"),
        (sag("m", "C", "A"), "NO_SUCH_STRETCH", "prestress.targets[t].sag"),
        (sag("m", "B", "C"), "NO_SUCH_STRETCH", "prestress.targets[t].sag.from"),
        (
            json!({"id": "t", "length": {"on": ["rope"], "length_m": -2}}),
            "NOT_POSITIVE",
            "prestress.targets[t].length.length_m",
        ),
        (
            json!({"id": "t", "length": {"length_m": 2}}),
            "COVERS_NOTHING",
            "prestress.targets[t].length.on",
        ),
        (
            json!({"id": "t", "weight": 0, "place": {"node": "m", "z_m": 1}}),
            "NOT_POSITIVE",
            "prestress.targets[t].weight",
        ),
        (
            json!({"id": "t", "tension": {"on": ["carrying"], "tension_n": -5}}),
            "CABLE_PUSHES",
            "prestress.targets[t].tension.tension_n",
        ),
        (
            json!({"id": "t", "tension": {"on": ["carrying"], "tension_n": 0}}),
            "NOT_POSITIVE",
            "prestress.targets[t].tension.tension_n",
        ),
        (
            json!({"id": "t", "tension": {"on": ["g1"], "tension_n": 5}}),
            "TARGET_ON_BALANCE",
            "prestress.targets[t].tension",
        ),
        (
            json!({"id": "t", "surface": {"nodes": ["m"], "points_xyz_m": [0, 0, 1, 9]}}),
            "WRONG_COUNT",
            "prestress.targets[t].surface.points_xyz_m",
        ),
        (
            json!({"id": "t", "surface": {"nodes": ["m"], "points_xyz_m": [0, 0, 1, 1, 1, 3, 2, 2, 0]}}),
            "NO_SURFACE",
            "prestress.targets[t].surface.points_xyz_m",
        ),
    ] {
        check(aimed(json!([target])), &[], reason, path);
    }
    let twice = json!([place("m"), place("m")]);
    check(aimed(twice), &[], "DUPLICATE_ID", "prestress.targets[1].id");
}

#[test]
fn what_cannot_be_adjusted() {
    let base = || aimed(json!([{"place": {"node": "m", "z_m": 1}}]));
    let without = ("/prestress/rules/0/adjust", Value::Null);
    check(base(), &[without], "NOTHING_ADJUSTABLE", "prestress.targets");
    let tension = (
        "/prestress/rules/0",
        json!({"on": ["rope"], "tension_n": 3000, "adjust": {}}),
    );
    check(base(), &[tension], "NOT_ADJUSTABLE", "prestress.rules[0].adjust");
    let least = ("/prestress/rules/0/adjust", json!({"least_n_per_m": 4000}));
    check(
        base(),
        &[least],
        "NOT_ADJUSTABLE",
        "prestress.rules[0].adjust.least_n_per_m",
    );
    let most = ("/prestress/rules/0/adjust", json!({"most_n_per_m": 2000}));
    check(
        base(),
        &[most],
        "NOT_ADJUSTABLE",
        "prestress.rules[0].adjust.most_n_per_m",
    );
    let zero = ("/prestress/rules/0/adjust", json!({"least_n_per_m": 0}));
    check(
        base(),
        &[zero],
        "NOT_POSITIVE",
        "prestress.rules[0].adjust.least_n_per_m",
    );
    let rising = (
        "/prestress/rules/0",
        json!({"on": ["rope"], "force_density_n_per_m": -3000, "adjust": {}}),
    );
    check(
        base(),
        &[rising],
        "CABLE_PUSHES",
        "prestress.rules[0].force_density_n_per_m",
    );
}

/// The report of a run.
fn report(events: &[Event]) -> v1::ShapeReport {
    let reports: Vec<&v1::ShapeReport> = events
        .iter()
        .filter_map(|event| match event {
            Event::ShapeReport(report) => Some(report),
            _ => None,
        })
        .collect();
    assert_eq!(reports.len(), 1);
    reports[0].clone()
}

#[test]
fn what_is_met_is_told() {
    let events = run(
        &work(&aimed(json!([{"id": "middle", "place": {"node": "m", "z_m": 1.8}}]))),
        &[],
    );
    let report = report(&events);
    assert_eq!(
        (report.total, report.met, report.nearly_met, report.rank),
        (1, 1, 1, Some(1))
    );
    let wish = &report.wishes[0];
    assert_eq!(
        (wish.path.as_str(), wish.on.as_str()),
        ("prestress.targets[middle]", "m")
    );
    assert_eq!(
        (wish.quantity(), wish.wanted, wish.met),
        (v1::TargetQuantity::Z, 1.8, true)
    );
    assert!((wish.found - 1.8).abs() < 1e-9 && report.fights.is_empty());
    assert!(
        !events
            .iter()
            .any(|event| matches!(event, Event::Finding(f) if f.reason == "TARGETS_UNMET"))
    );
}

#[test]
fn what_is_not_met_is_a_doubt_with_the_nearest_state() {
    let targets = json!([
        {"id": "low", "place": {"node": "m", "z_m": 1.2}},
        {"id": "high", "place": {"node": "m", "z_m": 1.8}}
    ]);
    let events = run(&work(&aimed(targets.clone())), &[]);
    let report = report(&events);
    assert_eq!((report.total, report.met, report.rank), (2, 0, Some(1)));
    let fight = &report.fights[0];
    let wanted = |place: u32| report.wishes[place as usize].wanted;
    assert!((fight.first_alone - wanted(fight.first)).abs() < 1e-6);
    assert!((fight.first_left_out - wanted(fight.second)).abs() < 1e-6);
    let closing = |events: &[Event]| {
        let summary = events.iter().find_map(|event| match event {
            Event::CaseSummary(summary) => Some(summary.clone()),
            _ => None,
        });
        summary.expect("a summary")
    };
    assert_eq!(closing(&events).outcome(), v1::CaseOutcome::Answered);
    assert!(closing(&events).audited);
    let doubt = |events: &[Event]| {
        let doubt = events.iter().find_map(|event| match event {
            Event::Finding(finding) if finding.reason == "TARGETS_UNMET" => Some(finding.clone()),
            _ => None,
        });
        doubt.expect("a doubt")
    };
    let found = doubt(&events);
    assert_eq!(found.severity(), v1::FindingSeverity::Doubt);
    assert!(found.message.contains("can not both be met") && found.accepted_note.is_empty());
    let accepted = json!([{"reason": "TARGETS_UNMET", "note": "the middle will do"}]);
    let events = run(&work(&changed(aimed(targets), &[("/accepted", accepted)])), &[]);
    assert_eq!(doubt(&events).accepted_note, "the middle will do");
}

/// A search that fails tells how it went all the same.
#[test]
fn a_reference_state_that_is_not_found_has_a_history() {
    // The rope from G1 by way of the held head to G2 cannot hold it up.
    let change = ("/prestress/rules/1/on", json!(["g1", "g2"]));
    let strut = (
        "/prestress/rules/-",
        json!({"on": ["post"], "force_density_n_per_m": 1000}),
    );
    let events = run(&work(&changed(terrace(), &[change, strut])), &[]);
    let failed = |event: &Event| matches!(event, Event::CaseSummary(s) if s.failure.is_some() && s.iterations > 0);
    assert!(events.iter().any(failed));
    let residuals = events.iter().any(|event| {
        matches!(event, Event::Columns(part) if part.case == "reference" && part.name == "iteration_residual_n")
    });
    assert!(residuals);
    assert!(reading(&terrace()).work.is_some());
}
