//! Reads the protobuf encoding of a request against the schema, before anything is made of it.
//!
//! A generated decoder drops fields that it does not know. Here nothing given is ignored, so each is found and named.

use std::fmt;

use crate::schema::{Content, Field, Schema};

/// Most unknown fields that are named; all are counted.
const NAMED: usize = 20;

/// Memory that a message takes once it is decoded, beside what stands in it: a rough mean (bytes).
const ELEMENT_BYTES: usize = 128;

/// Memory that any request may make of its elements (bytes), and how many times its size a request may make.
///
/// An empty element takes two bytes of a request and a hundred times that in memory. Briefs of short ids come to 13
/// times their size.
const ROOM: (usize, usize) = (1 << 20, 16);

/// Fields that the contract does not know.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub(crate) struct Unknown {
    /// Places of the first ones, in the grammar of the contract, with the field number at the end.
    pub(crate) paths: Vec<String>,
    /// All of them.
    pub(crate) total: usize,
}

/// Why bytes are not a message of the contract.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct Malformed {
    /// Where, in the grammar of the contract; empty: in the request itself.
    path: String,
    what: &'static str,
}

impl fmt::Display for Malformed {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.path.is_empty() {
            f.write_str(self.what)
        } else {
            write!(f, "{} at {:?}", self.what, self.path)
        }
    }
}

/// Reads `bytes` as the request with this index.
///
/// # Errors
/// [`Malformed`] where a decoder would fail, or would make far more of the bytes than briefs are like.
pub(crate) fn read(schema: &Schema, request: usize, bytes: &[u8]) -> Result<Unknown, Malformed> {
    let mut reader = Reader {
        schema,
        way: Vec::new(),
        unknown: Unknown::default(),
        room: ROOM.0.saturating_add(bytes.len().saturating_mul(ROOM.1)),
    };
    match reader.message(request, bytes) {
        Ok(()) => Ok(reader.unknown),
        Err(what) => Err(Malformed {
            path: reader.path(None),
            what,
        }),
    }
}

/// How the reader got to where it is: the message it came through, where in it the field began, and what is inside.
struct Step<'a> {
    field: &'a Field,
    number: u32,
    before: &'a [u8],
    inside: &'a [u8],
}

struct Reader<'a> {
    schema: &'a Schema,
    way: Vec<Step<'a>>,
    unknown: Unknown,
    /// Memory that elements may still take (bytes).
    room: usize,
}

impl<'a> Reader<'a> {
    fn message(&mut self, index: usize, bytes: &'a [u8]) -> Result<(), &'static str> {
        let schema = self.schema;
        let message = schema.message(index);
        let mut rest = bytes;
        while !rest.is_empty() {
            let before = &bytes[..bytes.len() - rest.len()];
            let (number, wire) = tag(&mut rest)?;
            let value = value(&mut rest, number, wire, 0)?;
            let Some(field) = message.field(number) else {
                self.note_unknown(number);
                continue;
            };
            match (field.content, value) {
                (Content::Varint, Value::Varint)
                | (Content::Fixed32, Value::Fixed32)
                | (Content::Fixed64, Value::Fixed64)
                | (Content::Bytes, Value::Bytes(_)) => {}
                (Content::Text, Value::Bytes(text)) => {
                    if std::str::from_utf8(text).is_err() {
                        self.enter(field, number, before, &[]);
                        return Err("text that is not UTF-8");
                    }
                    if field.repeated {
                        self.take_room(field, number, before, size_of::<String>())?;
                    }
                }
                (Content::Message(inner), Value::Bytes(inside)) => {
                    self.take_room(field, number, before, ELEMENT_BYTES)?;
                    self.enter(field, number, before, inside);
                    self.message(inner, inside)?;
                    self.way.pop();
                }
                (content, Value::Bytes(packed)) if field.repeated && is_packed(content, packed) => {}
                _ => {
                    self.enter(field, number, before, &[]);
                    return Err("a value of another type than the contract has");
                }
            }
        }
        Ok(())
    }

    fn enter(&mut self, field: &'a Field, number: u32, before: &'a [u8], inside: &'a [u8]) {
        self.way.push(Step {
            field,
            number,
            before,
            inside,
        });
    }

    fn take_room(&mut self, field: &'a Field, number: u32, before: &'a [u8], bytes: usize) -> Result<(), &'static str> {
        if let Some(left) = self.room.checked_sub(bytes) {
            self.room = left;
            return Ok(());
        }
        self.enter(field, number, before, &[]);
        Err("far more elements than its size allows for")
    }

    fn note_unknown(&mut self, number: u32) {
        self.unknown.total += 1;
        if self.unknown.paths.len() < NAMED {
            let path = self.path(Some(number));
            self.unknown.paths.push(path);
        }
    }

    /// The place where the reader is. Places start inside of the brief, wherever the request has it.
    fn path(&self, number: Option<u32>) -> String {
        let mut path = String::new();
        let within_brief = self.way.first().is_some_and(|step| step.field.name == "brief");
        let mut entry_of_map = false;
        for step in self.way.iter().skip(usize::from(within_brief)) {
            // The value of an entry is the entry itself.
            if std::mem::replace(&mut entry_of_map, step.field.map) && step.field.name == "value" {
                continue;
            }
            if !path.is_empty() {
                path.push('.');
            }
            path.push_str(&step.field.name);
            if step.field.map || (step.field.repeated && matches!(step.field.content, Content::Message(_))) {
                path.push('[');
                path.push_str(&self.name_of(step));
                path.push(']');
            }
        }
        if let Some(number) = number {
            if !path.is_empty() {
                path.push('.');
            }
            path.push_str(&number.to_string());
        }
        path
    }

    /// An element of a list by its id, an entry of a map by its key, anything else by its position.
    fn name_of(&self, step: &Step<'_>) -> String {
        let named = match step.field.content {
            Content::Message(index) => self.schema.message(index).name_field,
            _ => None,
        };
        let id = named.and_then(|number| fields(step.inside).filter(|(n, _)| *n == number).last());
        if let Some((_, Value::Bytes(id))) = id
            && let Ok(id) = std::str::from_utf8(id)
            && !id.is_empty()
        {
            return id.to_owned();
        }
        fields(step.before)
            .filter(|(n, _)| *n == step.number)
            .count()
            .to_string()
    }
}

#[derive(Clone, Copy)]
enum Value<'a> {
    Varint,
    Fixed32,
    Fixed64,
    Bytes(&'a [u8]),
    Group,
}

/// Groups are an old form that the contract does not use; unknown ones are skipped this deep.
const GROUPS_DEEP: u32 = 100;

/// The fields of a message up to the first that cannot be read.
fn fields(mut bytes: &[u8]) -> impl Iterator<Item = (u32, Value<'_>)> {
    std::iter::from_fn(move || {
        if bytes.is_empty() {
            return None;
        }
        let (number, wire) = tag(&mut bytes).ok()?;
        Some((number, value(&mut bytes, number, wire, 0).ok()?))
    })
}

fn tag(rest: &mut &[u8]) -> Result<(u32, u8), &'static str> {
    let key = u32::try_from(varint(rest)?).map_err(|_| "a field number out of range")?;
    let (number, wire) = (key >> 3, key & 7);
    if number == 0 {
        return Err("a field number 0");
    }
    Ok((number, u8::try_from(wire).expect("three bits")))
}

fn value<'a>(rest: &mut &'a [u8], number: u32, wire: u8, deep: u32) -> Result<Value<'a>, &'static str> {
    match wire {
        0 => varint(rest).map(|_| Value::Varint),
        1 => take(rest, 8).map(|_| Value::Fixed64),
        2 => {
            let length = varint(rest)?;
            let length = usize::try_from(length).map_err(|_| "a length beyond the end")?;
            take(rest, length).map(Value::Bytes)
        }
        3 => {
            if deep == GROUPS_DEEP {
                return Err("groups nested too deeply");
            }
            loop {
                let (inner, wire) = tag(rest)?;
                if wire == 4 {
                    return if inner == number {
                        Ok(Value::Group)
                    } else {
                        Err("a group that ends as another")
                    };
                }
                value(rest, inner, wire, deep + 1)?;
            }
        }
        5 => take(rest, 4).map(|_| Value::Fixed32),
        4 => Err("the end of a group that did not begin"),
        _ => Err("a wire type that does not exist"),
    }
}

fn varint(rest: &mut &[u8]) -> Result<u64, &'static str> {
    let mut number = 0;
    for (position, byte) in rest.iter().enumerate().take(10) {
        if position == 9 && *byte > 1 {
            return Err("a number of more than 64 bits");
        }
        number |= u64::from(byte & 0x7f) << (7 * position);
        if byte & 0x80 == 0 {
            *rest = &rest[position + 1..];
            return Ok(number);
        }
    }
    Err("a number that does not end")
}

fn take<'a>(rest: &mut &'a [u8], length: usize) -> Result<&'a [u8], &'static str> {
    let (taken, left) = rest.split_at_checked(length).ok_or("a length beyond the end")?;
    *rest = left;
    Ok(taken)
}

fn is_packed(content: Content, mut packed: &[u8]) -> bool {
    match content {
        Content::Fixed64 => packed.len().is_multiple_of(8),
        Content::Fixed32 => packed.len().is_multiple_of(4),
        Content::Varint => {
            while !packed.is_empty() {
                if varint(&mut packed).is_err() {
                    return false;
                }
            }
            true
        }
        Content::Text | Content::Bytes | Content::Message(_) => false,
    }
}

#[cfg(test)]
mod tests;
