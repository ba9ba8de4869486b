//! Differences between two briefs, each with its place in the contract's grammar of places.
//!
//! Fields are read from the contract itself, so that this walk knows each new one without being told. Elements of a list
//! are the same where their ids are; where they have none, equal ones at both ends are laid aside and the rest is paired in
//! order.

use std::collections::{BTreeMap, BTreeSet};

use prost::Message as _;
use prost_reflect::{DynamicMessage, MapKey, ReflectMessage as _, SerializeOptions, Value};
use ropewalk_api::ropewalk::v1;
use serde_json::Value as Json;

use crate::brief_file::descriptor;

/// A place where two briefs differ.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Change {
    /// Place, `net.cables[ridge].section`; of what only the second brief has, its place there.
    pub(super) place: String,
    /// In the first brief, as JSON; none: not given there.
    pub(super) was: Option<String>,
    /// In the second.
    pub(super) now: Option<String>,
}

/// Every difference, in the order of the contract's fields.
pub(super) fn changes(was: &v1::Brief, now: &v1::Brief) -> Vec<Change> {
    let dynamic = |brief: &v1::Brief| {
        DynamicMessage::decode(descriptor("Brief"), brief.encode_to_vec().as_slice())
            .expect("own encoding is read back")
    };
    let mut found = Vec::new();
    messages(&dynamic(was), &dynamic(now), "", &mut found);
    found
}

fn join(place: &str, name: &str) -> String {
    if place.is_empty() {
        name.to_owned()
    } else {
        format!("{place}.{name}")
    }
}

fn messages(was: &DynamicMessage, now: &DynamicMessage, place: &str, found: &mut Vec<Change>) {
    if was == now {
        return;
    }
    for field in was.descriptor().fields() {
        let inner = join(place, field.name());
        let (old, new) = (was.get_field(&field), now.get_field(&field));
        match (was.has_field(&field), now.has_field(&field)) {
            (false, false) => {}
            (true, true) => values(&old, &new, &inner, found),
            // Of a list or a map that one brief lacks each entry counts by itself.
            (_, _) if field.is_list() || field.is_map() => values(&old, &new, &inner, found),
            (true, false) => found.push(only(&old, inner, Side::Was)),
            (false, true) => found.push(only(&new, inner, Side::Now)),
        }
    }
}

#[derive(Clone, Copy, PartialEq)]
enum Side {
    Was,
    Now,
}

fn only(value: &Value, place: String, side: Side) -> Change {
    let text = Some(json(value).to_string());
    match side {
        Side::Was => Change {
            place,
            was: text,
            now: None,
        },
        Side::Now => Change {
            place,
            was: None,
            now: text,
        },
    }
}

fn values(was: &Value, now: &Value, place: &str, found: &mut Vec<Change>) {
    if was == now {
        return;
    }
    match (was, now) {
        (Value::Message(was), Value::Message(now)) => messages(was, now, place, found),
        (Value::Map(was), Value::Map(now)) => {
            let named = |map: &std::collections::HashMap<MapKey, Value>| -> BTreeMap<String, Value> {
                map.iter().map(|(key, value)| (key_text(key), value.clone())).collect()
            };
            let (was, now) = (named(was), named(now));
            let keys: BTreeSet<&String> = was.keys().chain(now.keys()).collect();
            for key in keys {
                let inner = format!("{place}[{key}]");
                match (was.get(key), now.get(key)) {
                    (Some(old), Some(new)) => values(old, new, &inner, found),
                    (Some(old), None) => found.push(only(old, inner, Side::Was)),
                    (None, Some(new)) => found.push(only(new, inner, Side::Now)),
                    (None, None) => {}
                }
            }
        }
        (Value::List(was), Value::List(now)) => lists(was, now, place, found),
        _ => found.push(whole(was, now, place)),
    }
}

fn whole(was: &Value, now: &Value, place: &str) -> Change {
    Change {
        place: place.to_owned(),
        was: Some(json(was).to_string()),
        now: Some(json(now).to_string()),
    }
}

fn lists(was: &[Value], now: &[Value], place: &str, found: &mut Vec<Change>) {
    let of_messages = was.iter().chain(now).all(|item| matches!(item, Value::Message(_)));
    if !of_messages {
        // A list of numbers or names is one value: a path, a place, a choice.
        let list = |items: &[Value]| Value::List(items.to_vec());
        found.push(whole(&list(was), &list(now), place));
    } else if let (Some(old), Some(new)) = (ids(was), ids(now)) {
        by_id(&old, &new, place, found);
    } else {
        by_order(was, now, place, found);
    }
}

/// Ids of all elements in order; none where one lacks an id, or two have the same.
fn ids(items: &[Value]) -> Option<Vec<(String, &Value)>> {
    let mut seen = BTreeSet::new();
    let mut named = Vec::with_capacity(items.len());
    for item in items {
        let id = item.as_message()?.get_field_by_name("id")?;
        let id = id.as_str()?.to_owned();
        if id.is_empty() || !seen.insert(id.clone()) {
            return None;
        }
        named.push((id, item));
    }
    Some(named)
}

fn by_id(was: &[(String, &Value)], now: &[(String, &Value)], place: &str, found: &mut Vec<Change>) {
    let old: BTreeMap<&str, &Value> = was.iter().map(|(id, item)| (id.as_str(), *item)).collect();
    let new: BTreeMap<&str, &Value> = now.iter().map(|(id, item)| (id.as_str(), *item)).collect();
    for (id, item) in was {
        let inner = format!("{place}[{id}]");
        match new.get(id.as_str()) {
            Some(other) => values(item, other, &inner, found),
            None => found.push(only(item, inner, Side::Was)),
        }
    }
    for (id, item) in now.iter().filter(|(id, _)| !old.contains_key(id.as_str())) {
        found.push(only(item, format!("{place}[{id}]"), Side::Now));
    }
    // The order of a list is that of the results; it tells nothing but that.
    let common = |list: &[(String, &Value)], other: &BTreeMap<&str, &Value>| -> Vec<String> {
        let ids = list
            .iter()
            .map(|(id, _)| id)
            .filter(|id| other.contains_key(id.as_str()));
        ids.cloned().collect()
    };
    let (first, second) = (common(was, &new), common(now, &old));
    if let Some(at) = (0..first.len()).find(|&at| first[at] != second[at]) {
        found.push(Change {
            place: format!("{place} (order)"),
            was: Some(format!(
                "\"{}\" stands as number {} of those in both",
                first[at],
                at + 1
            )),
            now: Some(format!("\"{}\" stands there", second[at])),
        });
    }
}

fn by_order(was: &[Value], now: &[Value], place: &str, found: &mut Vec<Change>) {
    let shorter = was.len().min(now.len());
    let head = (0..shorter).take_while(|&at| was[at] == now[at]).count();
    let tail = (0..shorter - head)
        .take_while(|&at| was[was.len() - 1 - at] == now[now.len() - 1 - at])
        .count();
    let (old, new) = (&was[head..was.len() - tail], &now[head..now.len() - tail]);
    for at in 0..old.len().max(new.len()) {
        let inner = format!("{place}[{}]", head + at);
        match (old.get(at), new.get(at)) {
            (Some(old), Some(new)) => values(old, new, &inner, found),
            (Some(old), None) => found.push(only(old, inner, Side::Was)),
            (None, Some(new)) => found.push(only(new, inner, Side::Now)),
            (None, None) => {}
        }
    }
}

fn key_text(key: &MapKey) -> String {
    match key {
        MapKey::String(text) => text.clone(),
        MapKey::Bool(truth) => truth.to_string(),
        MapKey::I32(number) => number.to_string(),
        MapKey::I64(number) => number.to_string(),
        MapKey::U32(number) => number.to_string(),
        MapKey::U64(number) => number.to_string(),
    }
}

fn json(value: &Value) -> Json {
    match value {
        Value::Message(message) => {
            let options = SerializeOptions::new()
                .use_proto_field_name(true)
                .stringify_64_bit_integers(false);
            message
                .serialize_with_options(serde_json::value::Serializer, &options)
                .expect("a message is a JSON value")
        }
        Value::List(items) => Json::Array(items.iter().map(json).collect()),
        Value::Bool(truth) => Json::from(*truth),
        Value::I32(number) | Value::EnumNumber(number) => Json::from(*number),
        Value::I64(number) => Json::from(*number),
        Value::U32(number) => Json::from(*number),
        Value::U64(number) => Json::from(*number),
        Value::F32(number) => number_json((*number).into()),
        Value::F64(number) => number_json(*number),
        Value::String(text) => Json::from(text.as_str()),
        // A brief has no bytes, and maps are compared entry by entry.
        Value::Bytes(_) | Value::Map(_) => Json::Null,
    }
}

/// Whole numbers without a point, as hands write them.
fn number_json(number: f64) -> Json {
    #[allow(clippy::cast_possible_truncation, reason = "checked to be a whole number that fits")]
    if number == number.trunc() && number.abs() < 1e15 {
        Json::from(number as i64)
    } else {
        Json::from(number)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::brief_file::parse;

    fn found(was: &str, now: &str) -> Vec<(String, Option<String>, Option<String>)> {
        let read = |text: &str| parse("test", text).unwrap();
        let changes = changes(&read(was), &read(now));
        changes
            .into_iter()
            .map(|change| (change.place, change.was, change.now))
            .collect()
    }

    fn some(text: &str) -> Option<String> {
        Some(text.to_owned())
    }

    #[test]
    fn elements_are_known_by_their_ids_wherever_they_stand() {
        let was = r#"{"id": "x", "net": {"sections": [{"id": "r10", "axial_stiffness_n": 8.9e6}, {"id": "r12"}],
            "nodes": [{"id": "A", "xyz_m": [0, 0, 3]}]}}"#;
        let now = r#"{"id": "x", "net": {"sections": [{"id": "r20"}, {"id": "r10", "axial_stiffness_n": 7.45e6}],
            "nodes": [{"id": "A", "xyz_m": [0, 0, 3.5], "support": {}}]}}"#;
        assert_eq!(
            found(was, now),
            [
                ("net.nodes[A].xyz_m".to_owned(), some("[0,0,3]"), some("[0,0,3.5]")),
                ("net.nodes[A].support".to_owned(), None, some("{}")),
                (
                    "net.sections[r10].axial_stiffness_n".to_owned(),
                    some("8900000"),
                    some("7450000")
                ),
                ("net.sections[r12]".to_owned(), some(r#"{"id":"r12"}"#), None),
                ("net.sections[r20]".to_owned(), None, some(r#"{"id":"r20"}"#)),
            ]
        );
        assert_eq!(found(was, was), []);
    }

    #[test]
    fn entries_of_maps_and_lists_without_ids_have_their_places() {
        let was = r#"{"cases": [{"id": "storm", "factors": {"snow": 1, "wind": 0.9}}],
            "prestress": {"rules": [{"on": ["a"], "tension_n": 1e3}, {"on": ["b"], "tension_n": 2e3}, {"on": ["c"], "tension_n": 3e3}]}}"#;
        let now = r#"{"cases": [{"id": "storm", "factors": {"snow": 1.5, "hot": 1}}],
            "prestress": {"rules": [{"on": ["a"], "tension_n": 1e3}, {"on": ["c"], "tension_n": 3e3}]}}"#;
        assert_eq!(
            found(was, now),
            [
                (
                    "prestress.rules[1]".to_owned(),
                    some(r#"{"on":["b"],"tension_n":2000.0}"#),
                    None
                ),
                ("cases[storm].factors[hot]".to_owned(), None, some("1")),
                ("cases[storm].factors[snow]".to_owned(), some("1"), some("1.5")),
                ("cases[storm].factors[wind]".to_owned(), some("0.9"), None),
            ]
        );
    }

    #[test]
    fn another_order_is_told_once() {
        let was = r#"{"cases": [{"id": "a"}, {"id": "b"}, {"id": "c"}]}"#;
        let now = r#"{"cases": [{"id": "c"}, {"id": "a"}, {"id": "b"}]}"#;
        let changes = found(was, now);
        assert_eq!(changes.len(), 1);
        assert_eq!(changes[0].0, "cases (order)");
    }
}
