//! Briefs as files: JSON for hands, checked against the contract before anything is sent.

mod tree;
mod walk;

use std::fmt;
use std::io::Read as _;
use std::path::{Path, PathBuf};
use std::sync::LazyLock;

use prost::Message as _;
use prost_reflect::{DescriptorPool, DeserializeOptions, DynamicMessage, MessageDescriptor, SerializeOptions};
use ropewalk_api::ropewalk::v1;
use serde::Deserialize as _;

use tree::Tree;

static CONTRACT: LazyLock<DescriptorPool> =
    LazyLock::new(|| DescriptorPool::decode(ropewalk_api::FILE_DESCRIPTOR_SET).expect("the contract describes itself"));

/// Descriptor of a message of the contract, by its short name.
pub(crate) fn descriptor(name: &str) -> MessageDescriptor {
    CONTRACT
        .get_message_by_name(&format!("ropewalk.v1.{name}"))
        .expect("the contract has this message")
}

/// Something wrong in a brief file.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Complaint {
    /// The file, as it was named.
    pub(crate) file: String,
    /// Place in the brief, or line and column; empty: the whole file.
    pub(crate) place: String,
    /// What is wrong.
    pub(crate) message: String,
}

impl fmt::Display for Complaint {
    fn fmt(&self, formatter: &mut fmt::Formatter) -> fmt::Result {
        let Self { file, place, message } = self;
        if place.is_empty() {
            write!(formatter, "{file}: {message}")
        } else {
            write!(formatter, "{file}: {place}: {message}")
        }
    }
}

/// Reads briefs and merges them as protobuf merges messages: lists are appended, single values replace earlier ones.
///
/// # Errors
/// Everything wrong in all files; never empty.
pub(crate) fn read(files: &[PathBuf]) -> Result<v1::Brief, Vec<Complaint>> {
    let mut parts = Vec::new();
    let mut complaints = Vec::new();
    for file in files {
        let name = if file == Path::new("-") {
            "standard input".to_owned()
        } else {
            file.display().to_string()
        };
        match text_of(file) {
            Ok(text) => match encode(&name, &text) {
                Ok(part) => parts.push(part),
                Err(found) => complaints.extend(found),
            },
            Err(error) => {
                complaints.push(Complaint {
                    file: name,
                    place: String::new(),
                    message: format!("cannot be read: {error}"),
                });
            }
        }
    }
    if complaints.is_empty() {
        Ok(merge(&parts))
    } else {
        Err(complaints)
    }
}

/// Reads one brief from a text that has a name for messages.
///
/// # Errors
/// Everything wrong in it.
pub(crate) fn parse(name: &str, text: &str) -> Result<v1::Brief, Vec<Complaint>> {
    encode(name, text).map(|part| merge(&[part]))
}

/// The brief as JSON with the contract's field names.
pub(crate) fn to_json(brief: &v1::Brief) -> String {
    let value = message_json("Brief", &brief.encode_to_vec());
    let mut text = crate::json_text::pretty(&value);
    text.push('\n');
    text
}

/// An encoded message of the contract as JSON with the contract's field names.
pub(crate) fn message_json(name: &str, encoded: &[u8]) -> serde_json::Value {
    let message = DynamicMessage::decode(descriptor(name), encoded).expect("own encoding is read back");
    // Everything is written as the contract names it; 64-bit counts stay numbers.
    let options = SerializeOptions::new()
        .use_proto_field_name(true)
        .stringify_64_bit_integers(false);
    let mut value = message
        .serialize_with_options(serde_json::value::Serializer, &options)
        .expect("a message is a JSON value");
    sort_maps(&mut value, &descriptor(name));
    value
}

/// Puts the entries of maps into the order of their keys, as they have none of their own: equal messages read alike.
fn sort_maps(value: &mut serde_json::Value, message: &MessageDescriptor) {
    let Some(fields) = value.as_object_mut() else { return };
    for (name, value) in fields.iter_mut() {
        let Some(field) = message.get_field_by_name(name) else {
            continue;
        };
        if field.is_map() {
            if let Some(entries) = value.as_object_mut() {
                entries.sort_keys();
            }
        } else if let Some(inner) = field.kind().as_message() {
            match value {
                serde_json::Value::Array(items) => items.iter_mut().for_each(|item| sort_maps(item, inner)),
                single => sort_maps(single, inner),
            }
        }
    }
}

fn text_of(file: &Path) -> std::io::Result<String> {
    if file == Path::new("-") {
        let mut text = String::new();
        std::io::stdin().read_to_string(&mut text)?;
        return Ok(text);
    }
    std::fs::read_to_string(file)
}

/// Encoded parts, one after the other, decode to the merged message.
fn merge(parts: &[Vec<u8>]) -> v1::Brief {
    v1::Brief::decode(parts.concat().as_slice()).expect("each part is an encoded brief")
}

fn encode(file: &str, text: &str) -> Result<Vec<u8>, Vec<Complaint>> {
    let complaint = |place: String, message: String| Complaint {
        file: file.to_owned(),
        place,
        message,
    };
    // Some editors put a mark in front of UTF-8; it means nothing.
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    if text.trim().is_empty() {
        let message = "is empty: a brief is a JSON object, with its id and its net at least";
        return Err(vec![complaint(String::new(), message.to_owned())]);
    }
    let mut reader = serde_json::Deserializer::from_str(text);
    let tree = Tree::deserialize(&mut reader)
        .and_then(|tree| reader.end().map(|()| tree))
        .map_err(|error| {
            vec![complaint(
                format!("line {}, column {}", error.line(), error.column()),
                not_json(&error),
            )]
        })?;

    let message = descriptor("Brief");
    let faults = walk::faults(&tree, &message);
    if !faults.is_empty() {
        return Err(faults
            .into_iter()
            .map(|fault| complaint(fault.place, fault.message))
            .collect());
    }
    let options = DeserializeOptions::new().deny_unknown_fields(true);
    let message = DynamicMessage::deserialize_with_options(message, tree.into_value(), &options)
        .map_err(|error| vec![complaint(String::new(), format!("is not a brief: {error}"))])?;
    Ok(message.encode_to_vec())
}

/// The parser's sentence without the place, which is told apart.
fn not_json(error: &serde_json::Error) -> String {
    let text = error.to_string();
    let sentence = text
        .rsplit_once(" at line ")
        .map_or(text.as_str(), |(sentence, _)| sentence);
    format!("is not JSON: {sentence}")
}

#[cfg(test)]
mod tests;
