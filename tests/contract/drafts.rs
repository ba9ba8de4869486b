//! The drafts of the contract: JSON to binary and back, and what is refused of them.

use prost::Message as _;
use prost_reflect::{DynamicMessage, SerializeOptions};
use ropewalk_api::ropewalk::v1;
use ropewalk_service::decode::{digest, reasons};
use serde_json::Value;

use crate::briefs::{descriptor, errors, first_net, message, quince_yard, reading, terrace};

#[track_caller]
fn round_trip(json: &Value) {
    let dynamic = DynamicMessage::deserialize(descriptor(), json).expect("the JSON form of a brief");
    let binary = dynamic.encode_to_vec();
    let typed = v1::Brief::decode(binary.as_slice()).expect("a brief");
    let again = DynamicMessage::decode(descriptor(), typed.encode_to_vec().as_slice()).expect("a brief");
    let written = |skip_defaults: bool| {
        let options = SerializeOptions::new()
            .use_proto_field_name(true)
            .skip_default_fields(skip_defaults);
        again
            .serialize_with_options(serde_json::value::Serializer, &options)
            .expect("a brief has a JSON form")
    };
    // Everything that the file says comes back, a zero that need not be said included; and nothing is added.
    contains(&written(false), json, "");
    contains(json, &written(true), "");
}

/// Every entry of `part` is in `whole`, with the same value.
#[track_caller]
fn contains(whole: &Value, part: &Value, place: &str) {
    match (whole, part) {
        (Value::Object(whole), Value::Object(part)) => {
            for (key, value) in part {
                let place = format!("{place}/{key}");
                contains(
                    whole.get(key).unwrap_or_else(|| panic!("{place} is lost")),
                    value,
                    &place,
                );
            }
        }
        (Value::Array(whole), Value::Array(part)) => {
            assert_eq!(whole.len(), part.len(), "{place}");
            for (position, (whole, part)) in whole.iter().zip(part).enumerate() {
                contains(whole, part, &format!("{place}/{position}"));
            }
        }
        // JSON writes 3 for 3.0; both are the same double.
        (Value::Number(whole), Value::Number(part)) => assert_eq!(whole.as_f64(), part.as_f64(), "{place}"),
        _ => assert_eq!(whole, part, "{place}"),
    }
}

#[test]
fn drafts_pass_through_binary_unchanged() {
    round_trip(&first_net());
    round_trip(&quince_yard());
    round_trip(&terrace());
}

#[test]
fn json_and_binary_have_one_digest() {
    let typed = message(&first_net());
    let again = v1::Brief::decode(typed.encode_to_vec().as_slice()).expect("a brief");
    assert_eq!(digest(&typed), digest(&again));
    let text = digest(&typed);
    assert!(text.len() == 64 && text.chars().all(|c| matches!(c, '0'..='9' | 'a'..='f')));
    let mut other = typed;
    other.cases[0].factors.insert("snow".to_owned(), 1.5);
    assert_ne!(digest(&other), digest(&again));
}

/// The realistic draft has parts that are not served: each is refused by its name, and nothing else is wrong with it.
#[test]
fn the_realistic_draft_is_refused_part_by_part() {
    let reading = reading(&quince_yard());
    assert!(reading.work.is_none());
    let mut paths = Vec::new();
    for error in errors(&reading) {
        assert_eq!(error.reason, reasons::NOT_SERVED, "{error:#?}");
        paths.push(error.path.as_str());
    }
    for path in ["stages[masts]", "workshop"] {
        assert!(paths.contains(&path), "{path} is not among {paths:?}");
    }
}
