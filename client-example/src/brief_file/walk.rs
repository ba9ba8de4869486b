//! Compares a JSON text with the message that it should be, and names every place that differs.
//!
//! The message types are read from the contract itself, so that this walk knows each new field without being told.

use std::collections::BTreeSet;

use prost_reflect::{FieldDescriptor, Kind, MessageDescriptor};

use super::tree::Tree;

/// Something wrong at a place, in the contract's grammar of places.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Fault {
    /// Place, `net.cables[ridge].section`; empty: the whole.
    pub(crate) place: String,
    /// What is wrong and how to mend it.
    pub(crate) message: String,
}

/// All differences between a text and its message.
pub(crate) fn faults(tree: &Tree, message: &MessageDescriptor) -> Vec<Fault> {
    let mut found = Vec::new();
    visit_message(tree, message, "", &mut found);
    found
}

fn fault(found: &mut Vec<Fault>, place: &str, message: String) {
    found.push(Fault {
        place: place.to_owned(),
        message,
    });
}

fn visit_message(tree: &Tree, message: &MessageDescriptor, place: &str, found: &mut Vec<Fault>) {
    let Tree::Object(entries) = tree else {
        fault(
            found,
            place,
            format!("an object {{...}} is wanted here, found {}", tree.kind()),
        );
        return;
    };
    let mut seen = BTreeSet::new();
    let mut choices: Vec<(String, String)> = Vec::new();
    for (key, value) in entries {
        let inner = if place.is_empty() {
            key.clone()
        } else {
            format!("{place}.{key}")
        };
        let known = message
            .get_field_by_name(key)
            .or_else(|| message.get_field_by_json_name(key));
        let Some(field) = known else {
            fault(found, &inner, unknown(key, message));
            continue;
        };
        // Both spellings of one field are the same key.
        if !seen.insert(field.number()) {
            fault(found, &inner, format!("\"{key}\" stands twice; keep one"));
            continue;
        }
        if *value == Tree::Null {
            continue;
        }
        if let Some(choice) = field.containing_oneof().filter(|oneof| !oneof.is_synthetic()) {
            match choices.iter().find(|(name, _)| name == choice.name()) {
                Some((_, other)) => {
                    fault(
                        found,
                        &inner,
                        format!("\"{key}\" and \"{other}\" exclude each other; keep one"),
                    );
                }
                None => choices.push((choice.name().to_owned(), key.clone())),
            }
        }
        visit_field(value, &field, &inner, found);
    }
}

fn visit_field(value: &Tree, field: &FieldDescriptor, place: &str, found: &mut Vec<Fault>) {
    if field.is_map() {
        let Tree::Object(entries) = value else {
            fault(
                found,
                place,
                format!("an object of named values is wanted here, found {}", value.kind()),
            );
            return;
        };
        let kind = field.kind();
        let entry = kind.as_message().expect("a map field is a list of entries");
        let mut seen = BTreeSet::new();
        for (key, value) in entries {
            let inner = format!("{place}[{key}]");
            if !seen.insert(key) {
                fault(found, &inner, format!("\"{key}\" stands twice; keep one"));
            }
            visit_single(value, &entry.map_entry_value_field().kind(), &inner, found);
        }
    } else if field.is_list() {
        let Tree::List(items) = value else {
            fault(
                found,
                place,
                format!("a list [...] is wanted here, found {}", value.kind()),
            );
            return;
        };
        for (position, item) in items.iter().enumerate() {
            let inner = match id_of(item) {
                Some(id) => format!("{place}[{id}]"),
                None => format!("{place}[{position}]"),
            };
            visit_single(item, &field.kind(), &inner, found);
        }
    } else {
        visit_single(value, &field.kind(), place, found);
    }
}

fn visit_single(value: &Tree, kind: &Kind, place: &str, found: &mut Vec<Fault>) {
    match (kind, value) {
        (Kind::Message(message), _) => visit_message(value, message, place, found),
        (Kind::Double | Kind::Float, Tree::Text(text)) => {
            let cure = if text.trim().parse::<f64>().is_ok_and(f64::is_finite) {
                "; leave out the quotes"
            } else {
                ""
            };
            fault(
                found,
                place,
                format!("a number is wanted here, found the text \"{text}\"{cure}"),
            );
        }
        (Kind::Double | Kind::Float, Tree::Number(_))
        | (Kind::String, Tree::Text(_))
        | (Kind::Bool, Tree::Truth(_))
        | (Kind::Enum(_), Tree::Text(_) | Tree::Number(_)) => {}
        (Kind::Double | Kind::Float, _) => {
            fault(found, place, format!("a number is wanted here, found {}", value.kind()));
        }
        (Kind::Uint32 | Kind::Fixed32, Tree::Number(number)) => {
            let whole = number.as_u64().is_some_and(|number| u32::try_from(number).is_ok());
            if !whole {
                let wanted = format!("a whole number from 0 to {} is wanted here, found {number}", u32::MAX);
                fault(found, place, wanted);
            }
        }
        (Kind::Uint32 | Kind::Fixed32, _) => {
            fault(
                found,
                place,
                format!("a whole number is wanted here, found {}", value.kind()),
            );
        }
        (Kind::String, _) => fault(
            found,
            place,
            format!("a text in quotes is wanted here, found {}", value.kind()),
        ),
        (Kind::Bool, _) => fault(
            found,
            place,
            format!("true or false is wanted here, found {}", value.kind()),
        ),
        (Kind::Enum(_), _) => fault(found, place, format!("a name is wanted here, found {}", value.kind())),
        // Other kinds do not occur in a brief; the decoder after this walk refuses what does not fit them.
        _ => {}
    }
}

/// Id of a list's element, if it has one.
fn id_of(item: &Tree) -> Option<&str> {
    let Tree::Object(entries) = item else { return None };
    entries.iter().find_map(|(key, value)| match value {
        Tree::Text(id) if key == "id" && !id.is_empty() => Some(id.as_str()),
        _ => None,
    })
}

fn unknown(key: &str, message: &MessageDescriptor) -> String {
    let nearest = message
        .fields()
        .map(|field| (strsim::jaro_winkler(key, field.name()), field.name().to_owned()))
        .max_by(|a, b| a.0.total_cmp(&b.0));
    match nearest {
        Some((likeness, name)) if likeness > 0.8 => format!("unknown name \"{key}\"; did you mean \"{name}\"?"),
        _ => {
            let known: Vec<String> = message.fields().map(|field| field.name().to_owned()).collect();
            format!("unknown name \"{key}\"; known here: {}", known.join(", "))
        }
    }
}
