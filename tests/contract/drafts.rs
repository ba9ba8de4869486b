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
    let options = SerializeOptions::new()
        .use_proto_field_name(true)
        .skip_default_fields(true);
    let back = again
        .serialize_with_options(serde_json::value::Serializer, &options)
        .expect("a brief has a JSON form");
    assert_eq!(numbers_as_floats(&back), numbers_as_floats(json));
}

/// JSON writes 3 for 3.0; both are the same double.
fn numbers_as_floats(value: &Value) -> Value {
    match value {
        Value::Number(number) => Value::from(number.as_f64().expect("a double")),
        Value::Array(list) => list.iter().map(numbers_as_floats).collect(),
        Value::Object(object) => {
            // Sorted: JSON objects have no order.
            let mut entries: Vec<_> = object.iter().map(|(k, v)| (k.clone(), numbers_as_floats(v))).collect();
            entries.sort_by(|a, b| a.0.cmp(&b.0));
            Value::Object(entries.into_iter().collect())
        }
        other => other.clone(),
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
    for path in [
        "net.adjusters[winch]",
        "net.skins[cloth]",
        "net.zones[west]",
        "net.cables[b2].slides",
        "actions[snow].loads[0].on_plan",
        "actions[wind-lift].loads[0].on_surface",
        "factors",
        "combinations[2]",
        "checks[0].resistance",
        "checks[1].service_stress",
        "checks[3].buckling",
        "checks[5].clearance",
        "modes",
        "stages[masts]",
        "workshop",
        "keep",
    ] {
        assert!(paths.contains(&path), "{path} is not among {paths:?}");
    }
}
