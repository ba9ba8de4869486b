//! Sections chosen from lists: what is read, what is refused, what is told.

use std::ops::ControlFlow;

use ropewalk_api::ropewalk::v1;
use ropewalk_service::decode::Work;
use ropewalk_service::encode::sizing;
use serde_json::{Value, json};
use v1::run_response::Event;

use crate::briefs::{changed, terrace, work};
use crate::results::run;
use crate::violations::check;

const EN: &str = "EN 1993-1-11:2006";

/// The terrace with three ropes to choose from for its saddle and, by their role, for its guys.
fn given(sizing: Value) -> Value {
    let rope = |id: &str, diameter: f64, stiffness: f64, mass: f64, strength: f64| {
        json!({"id": id, "axial_stiffness_n": stiffness, "mass_kg_per_m": mass, "breaking_force_n": strength,
            "breaking_force_origin": format!("list of {id}"), "diameter_m": diameter})
    };
    changed(
        terrace(),
        &[
            ("/net/sections/-", rope("s8", 0.008, 4.1e6, 0.25, 41e3)),
            ("/net/sections/-", rope("s12", 0.012, 9.3e6, 0.57, 92e3)),
            ("/net/sections/-", rope("s16", 0.016, 16.5e6, 1.02, 163e3)),
            ("/net/sections/-", rope("s20", 0.020, 25.8e6, 1.59, 254e3)),
            ("/checks", json!([{"resistance": {"edition": EN, "gamma_r": 1.0}}])),
            ("/sizing", sizing),
        ],
    )
}

fn sized(work: &Work) -> (Work, v1::SizingResult) {
    let (work, told) = sizing(work, &mut |_, _| ControlFlow::Continue(())).expect("the brief asks for it");
    match told.event {
        Some(Event::Sizing(told)) => (work, told),
        other => panic!("{other:?} is no sizing"),
    }
}

#[test]
fn the_run_goes_on_with_the_chosen_sections() {
    let list = json!(["s8", "s12", "s16", "s20"]);
    let asked =
        json!({"sections": list, "on": ["carrying", "bracing"], "choices": [{"on": ["g1", "g2"], "sections": list}]});
    let given = work(&given(asked));
    let (work, told) = sized(&given);
    assert!(told.passes && told.proven, "{told:#?}");
    assert_eq!((told.choices.len(), told.choices_total), (3, 3));
    let paths: Vec<&str> = told.choices.iter().map(|choice| choice.path.as_str()).collect();
    assert_eq!(paths, ["sizing.on[0]", "sizing.on[1]", "sizing.choices[0]"]);
    assert_eq!(told.choices[2].members, ["g1", "g2"]);
    assert_eq!(told.runs as usize, told.rounds.len());
    assert!(told.needs.is_empty());
    assert_eq!(told.rounds[0].step(), v1::SizingStep::First);
    let mass: f64 = told.choices.iter().map(|choice| choice.mass_kg).sum();
    assert!((mass - told.mass_kg).abs() < 1e-9 * mass);
    for choice in &told.choices {
        assert_eq!(choice.check, "checks[0]");
        assert!(
            choice.ratio <= 1.0 && choice.ratio > 0.0 && !choice.governing_case.is_empty(),
            "{choice:#?}"
        );
    }

    // The results are those of the chosen sections, and say where their strength comes from.
    let cases: Vec<usize> = (0..work.brief.cases.len()).collect();
    let events = run(&work, &cases);
    let Some(Event::Summary(summary)) = events.last() else {
        panic!("a summary comes last");
    };
    let worst = told.choices.iter().map(|choice| choice.ratio).fold(0.0, f64::max);
    assert_eq!(summary.checks[0].ratio, worst);
    let section = &told
        .choices
        .iter()
        .find(|choice| choice.ratio == worst)
        .expect("a choice")
        .section;
    let origin = format!("list of {section}");
    assert!(
        summary.checks[0].source.contains(&origin),
        "{}",
        summary.checks[0].source
    );
    // Fittings count: the carrying rope keeps 0.8 of the bare strength.
    let carrying = &work.brief.net.segments()[0].section;
    let bare = work.message.net_source.as_ref().map(|source| match source {
        v1::brief::NetSource::Net(net) => net.sections.iter().find(|s| s.id == told.choices[0].section),
        v1::brief::NetSource::StoredNet(_) => None,
    });
    let bare = bare
        .flatten()
        .and_then(|section| section.breaking_force_n)
        .expect("a strength");
    assert_eq!(carrying.breaking_force, Some(0.8 * bare));
}

#[test]
fn what_cannot_pass_is_told_with_who_needs_what() {
    let work = work(&given(json!({"sections": ["s8"], "on": ["carrying", "guy"]})));
    let (_, told) = sized(&work);
    assert!(!told.passes && told.proven && told.runs == 1, "{told:#?}");
    let need = &told.needs[0];
    assert_eq!(need.check, "checks[0]");
    assert!(need.ratio > 1.0 && !need.governing_case.is_empty());
    assert!(
        need.message.contains(&need.id) && need.message.contains("kN"),
        "{}",
        need.message
    );
}

#[test]
fn sizing_that_cannot_be_read() {
    let list = ["s8", "s12"];
    for (sizing, reason, path) in [
        (json!({}), "MISSING", "sizing.choices"),
        (json!({"sections": list}), "MISSING", "sizing.on"),
        (json!({"on": ["guy"]}), "MISSING", "sizing.sections"),
        (
            json!({"choices": [{"on": ["guy"]}]}),
            "MISSING",
            "sizing.choices[0].sections",
        ),
        (
            json!({"choices": [{"sections": list}]}),
            "MISSING",
            "sizing.choices[0].on",
        ),
        (
            json!({"on": ["guy"], "sections": ["s8", "s9"]}),
            "UNKNOWN_ID",
            "sizing.sections[1]",
        ),
        (
            json!({"on": ["guy"], "sections": ["s8", "s8"]}),
            "REPEATED_IN_LIST",
            "sizing.sections[1]",
        ),
        (
            json!({"on": ["guys"], "sections": list}),
            "UNKNOWN_ID",
            "sizing.on[0][0]",
        ),
        (json!({"on": ["m"], "sections": list}), "WRONG_KIND", "sizing.on[0][0]"),
        (
            json!({"on": ["guy", "g1"], "sections": list}),
            "SIZED_TWICE",
            "sizing.on[1]",
        ),
        (
            json!({"on": ["guy"], "sections": list, "max_runs": 0}),
            "OUT_OF_RANGE",
            "sizing.max_runs",
        ),
        // r16 has no diameter, and the rope that it would replace has one.
        (
            json!({"on": ["bracing"], "sections": ["r16"]}),
            "MISSING",
            "sizing.on[0]",
        ),
    ] {
        check(given(sizing), &[], reason, path);
    }
    let sizing = json!({"on": ["guy"], "sections": list});
    check(given(sizing.clone()), &[("/checks", json!([]))], "MISSING", "checks");
    let massless = [("/net/sections/3/mass_kg_per_m", Value::Null)];
    check(given(sizing), &massless, "MISSING", "sizing.sections[0]");
}
