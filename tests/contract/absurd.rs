//! Briefs broken in every single place, and in random ones: always an answer, never a panic.

use std::ops::ControlFlow;

use proptest::prelude::*;
use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::Plan;
use ropewalk_service::decode::{Reading, read, reasons};
use ropewalk_service::encode::{check_report, reference};
use serde_json::{Value, json};

use crate::briefs::{LIMITS, changed, message, terrace};

/// Every finding says what, why and how to mend it; a brief without errors can be run.
#[track_caller]
fn check(reading: Reading, what: &str) {
    for finding in &reading.findings {
        let known = reasons::ALL.iter().any(|(reason, _)| *reason == finding.reason);
        assert!(
            known && !finding.message.is_empty() && !finding.cure.is_empty(),
            "{what}: {finding:#?}"
        );
        assert!(
            !finding.path.is_empty() || finding.reason == reasons::MORE_OF_THE_SAME,
            "{what}: {finding:#?}"
        );
    }
    let has_errors = reading
        .findings
        .iter()
        .any(|finding| finding.severity() == v1::FindingSeverity::Error);
    assert_eq!(reading.work.is_none(), has_errors, "{what}");
    if let Some(work) = &reading.work {
        let plan = Plan::new(work.brief.clone());
        let found = plan.reference(&mut |_| ControlFlow::Continue(()));
        assert!(!reference(work, &plan, &found, &[]).is_empty());
    }
    assert!(check_report(reading).iter().any(|part| part.totals.is_some()));
}

fn pointers(value: &Value, place: &str, found: &mut Vec<String>) {
    match value {
        Value::Object(object) => {
            for (key, value) in object {
                let place = format!("{place}/{key}");
                found.push(place.clone());
                pointers(value, &place, found);
            }
        }
        Value::Array(list) => {
            for (position, value) in list.iter().enumerate() {
                let place = format!("{place}/{position}");
                found.push(place.clone());
                pointers(value, &place, found);
            }
        }
        _ => {}
    }
}

/// The value without what a pointer names.
fn without(mut json: Value, pointer: &str) -> Value {
    let (parent, key) = pointer.rsplit_once('/').expect("a JSON pointer");
    match json.pointer_mut(parent).expect("the pointer came from the value") {
        Value::Array(list) => drop(list.remove(key.parse().expect("a position"))),
        Value::Object(object) => drop(object.remove(key)),
        _ => unreachable!("pointers lead into lists and objects"),
    }
    json
}

#[test]
fn briefs_broken_in_one_place_are_answered() {
    let base = terrace();
    let mut places = Vec::new();
    pointers(&base, "", &mut places);
    assert!(places.len() > 200);
    for place in &places {
        check(read(message(&without(base.clone(), place)), &LIMITS), place);
        let others = match base.pointer(place) {
            Some(Value::Number(number)) if number.is_u64() && (place.contains("steps") || place.contains("max_it")) => {
                vec![json!(0), json!(u32::MAX)]
            }
            Some(Value::Number(_)) => vec![
                json!("NaN"),
                json!("-Infinity"),
                json!(0),
                json!(-1),
                json!(1e300),
                json!(1e-300),
            ],
            Some(Value::String(_)) => vec![json!(""), json!("zz"), json!("A"), json!("rope"), json!("reference")],
            Some(Value::Array(_)) => vec![json!([])],
            _ => Vec::new(),
        };
        for other in others {
            let what = format!("{place} = {other}");
            check(read(message(&changed(base.clone(), &[(place, other)])), &LIMITS), &what);
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::with_cases(500) })]

    /// Bytes changed at random: whatever still is a brief is answered.
    #[test]
    fn briefs_broken_at_random_are_answered(
        changes in prop::collection::vec((any::<prop::sample::Index>(), any::<u8>()), 1..6),
    ) {
        let mut bytes = message(&terrace()).encode_to_vec();
        for (place, byte) in changes {
            let place = place.index(bytes.len());
            bytes[place] = byte;
        }
        if let Ok(brief) = v1::Brief::decode(bytes.as_slice()) {
            let reading = read(brief, &LIMITS);
            let has_errors = reading.findings.iter().any(|finding| finding.severity() == v1::FindingSeverity::Error);
            prop_assert_eq!(reading.work.is_none(), has_errors);
        }
    }
}
