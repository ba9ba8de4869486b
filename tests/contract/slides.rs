//! Ropes that slide and hang, and adjusters.

use ropewalk_api::ropewalk::v1::FindingSeverity;
use serde_json::json;

use crate::briefs::{changed, reading, terrace};
use crate::violations::{check, told};

#[test]
fn ropes_slide_at_inner_nodes() {
    for (slides, reason, path) in [
        (
            json!({"at": ["A"]}),
            "CAN_NOT_SLIDE",
            "net.cables[carrying].slides.at[0]",
        ),
        (
            json!({"at": ["nowhere"]}),
            "CAN_NOT_SLIDE",
            "net.cables[carrying].slides.at[0]",
        ),
        (
            json!({"friction_coefficient": -0.1}),
            "NEGATIVE",
            "net.cables[carrying].slides.friction_coefficient",
        ),
    ] {
        check(terrace(), &[("/net/cables/0/slides", slides)], reason, path);
    }
    check(
        terrace(),
        &[("/net/cables/0/slides", json!({})), ("/net/cables/0/hangs", json!({}))],
        "SLIDES_AND_HANGS",
        "net.cables[carrying].slides",
    );
}

fn adjuster(changes: serde_json::Value) -> serde_json::Value {
    let mut adjuster = json!({"id": "t", "cable": "g1", "at": "G1", "in_m": 0.1, "out_m": 0.2, "per_turn_m": 0.006});
    for (key, value) in changes.as_object().expect("an object") {
        adjuster[key] = value.clone();
    }
    json!([adjuster])
}

#[test]
fn adjusters_are_at_ends_and_have_travel() {
    for (changes, reason, path) in [
        (json!({"cable": "post"}), "WRONG_KIND", "net.adjusters[t].cable"),
        (json!({"cable": "g9"}), "UNKNOWN_ID", "net.adjusters[t].cable"),
        (json!({"at": "m"}), "NOT_AN_END", "net.adjusters[t].at"),
        (json!({"in_m": -0.1}), "NEGATIVE", "net.adjusters[t].in_m"),
        (json!({"out_m": null}), "MISSING", "net.adjusters[t]"),
        (json!({"per_turn_m": 0}), "NOT_POSITIVE", "net.adjusters[t].per_turn_m"),
    ] {
        check(terrace(), &[("/net/adjusters", adjuster(changes))], reason, path);
    }
}

#[test]
fn actions_turn_adjusters() {
    let turned = |amount: serde_json::Value| json!({"adjust": amount});
    for (adjuster, load, reason, path) in [
        (
            adjuster(json!({})),
            turned(json!({"adjuster": "u", "open_m": 0.1})),
            "UNKNOWN_ID",
            "actions[snow].loads[0].adjust.adjuster",
        ),
        (
            adjuster(json!({})),
            turned(json!({"adjuster": "t"})),
            "MISSING",
            "actions[snow].loads[0].adjust",
        ),
        (
            adjuster(json!({"per_turn_m": null})),
            turned(json!({"adjuster": "t", "turns": 3})),
            "NO_TRAVEL_PER_TURN",
            "actions[snow].loads[0].adjust.turns",
        ),
    ] {
        check(
            terrace(),
            &[("/net/adjusters", adjuster), ("/actions/1/loads/0", load)],
            reason,
            path,
        );
    }
}

#[test]
fn a_case_beyond_the_travel_is_doubted() {
    let base = changed(
        terrace(),
        &[
            ("/net/adjusters", adjuster(json!({}))),
            ("/actions/1/loads/0", json!({"adjust": {"adjuster": "t", "turns": 40}})),
        ],
    );
    told(
        &reading(&base),
        FindingSeverity::Doubt,
        "ADJUSTER_TOO_SHORT",
        "net.adjusters[t]",
    );
}
