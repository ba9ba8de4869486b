//! A frozen brief merges from its parts, names what it came from, and has the reference state of the brief it came from.

use std::ops::ControlFlow;

use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use ropewalk_service::decode::{Work, digest, read};
use ropewalk_service::encode::freeze;
use serde_json::{Value, json};
use v1::freeze_response::Part;

use crate::briefs::{LIMITS, changed, first_net, found, terrace, work};

/// The frozen brief, merged from its parts, and the summary.
#[track_caller]
fn frozen(work: &Work) -> (v1::Brief, v1::FreezeSummary) {
    let (plan, reference) = found(work);
    let parts = freeze(work, &plan, &Ok(reference)).expect("a reference state");
    let mut joined = Vec::new();
    let mut summary = None;
    for part in parts {
        assert!(part.encoded_len() < 256 * 1024);
        match part.part.expect("a part") {
            // Encodings may simply be joined.
            Part::Brief(brief) => joined.extend(brief.encode_to_vec()),
            Part::Summary(found) => summary = Some(found),
            Part::Progress(_) => panic!("no progress among the parts"),
        }
    }
    let brief = v1::Brief::decode(joined.as_slice()).expect("parts merge");
    (brief, summary.expect("the summary comes last"))
}

#[track_caller]
fn check(json: &Value) {
    let first = work(json);
    let (_, before) = found(&first);
    let (brief, summary) = frozen(&first);
    assert_eq!(summary.from_digest, digest(&first.message));
    assert_eq!(summary.digest, digest(&brief));
    let from = brief.frozen_from.as_ref().expect("says where it came from");
    assert_eq!(from.digest, summary.from_digest);
    let prestress = brief.prestress.as_ref().expect("has rules");
    assert!(prestress.hold.is_empty());
    assert_eq!(
        prestress.under,
        first.message.prestress.as_ref().expect("had rules").under
    );
    assert_eq!(brief.cases, first.message.cases);
    assert_eq!(brief.checks, first.message.checks);
    let Some(v1::brief::NetSource::Net(net)) = &brief.net_source else {
        panic!("a net");
    };
    assert_eq!(from.sections, net.sections);
    assert_eq!(net.nodes.len(), before.state.positions.len());

    let reading = read(brief, &LIMITS);
    let again = reading.work.unwrap_or_else(|| panic!("{:#?}", reading.findings));
    assert!(again.frozen);
    let (_, after) = found(&again);
    let largest = before
        .state
        .axial_forces
        .iter()
        .fold(0.0_f64, |largest, force| largest.max(force.abs()));
    for (before, after) in before.state.axial_forces.iter().zip(&after.state.axial_forces) {
        assert!((before - after).abs() < 1e-6 * largest, "{before} and {after}");
    }
    for (before, after) in before.state.positions.iter().zip(&after.state.positions) {
        assert!((before - after).norm() < 1e-6, "{before} and {after}");
    }
    for (before, after) in before
        .state
        .unstressed_lengths
        .iter()
        .zip(&after.state.unstressed_lengths)
    {
        assert!((before - after).abs() < 1e-12, "lengths are kept");
    }
}

#[test]
fn frozen_briefs_keep_their_state() {
    check(&first_net());
    check(&terrace());
}

#[test]
fn visits_tell_stretches_of_a_rope_that_comes_back() {
    // A figure of eight through m: A m C D m B.
    let cables = json!([{"id": "eight", "section": "r10", "nodes": ["A", "m", "C", "n", "D", "m", "B"]},
        {"id": "tie", "section": "r10", "nodes": ["n", "A"]}]);
    let rules =
        json!([{"on": ["eight"], "force_density_n_per_m": 3000}, {"on": ["tie"], "force_density_n_per_m": 2000}]);
    let json = changed(first_net(), &[("/net/cables", cables), ("/prestress/rules", rules)]);
    check(&json);
    let (brief, _) = frozen(&work(&json));
    let rules = brief.prestress.expect("rules").rules;
    let visits: Vec<Option<u32>> = rules
        .iter()
        .flat_map(|rule| &rule.parts)
        .map(|part| part.from_visit)
        .collect();
    assert_eq!(visits, [None, None, None, None, None, Some(2)]);
}

#[test]
fn a_brief_without_a_reference_state_is_not_frozen() {
    let work = work(&first_net());
    let plan = ropewalk_numerics::brief::Plan::new(work.brief.clone());
    let found = plan.reference(&mut |_| ControlFlow::Break(()));
    let why = freeze(&work, &plan, &found).expect_err("stopped on request");
    assert!(why.contains("no reference state"), "{why}");
}
