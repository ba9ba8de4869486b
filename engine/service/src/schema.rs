//! The contract as tables: which fields each message has, for reading requests strictly.

use std::collections::HashMap;

use prost_reflect::{DescriptorPool, FieldDescriptor, Kind, MessageDescriptor};

/// Package whose services are read strictly.
const PACKAGE: &str = "ropewalk.v1";

/// All messages that a request may be made of.
#[derive(Debug)]
pub(crate) struct Schema {
    messages: Vec<Message>,
    /// Message of each request by the path of its method, `/ropewalk.v1.BriefService/Run`.
    requests: HashMap<String, usize>,
}

/// A message.
#[derive(Debug)]
pub(crate) struct Message {
    /// Fields by number.
    fields: HashMap<u32, Field>,
    /// Number of the field that names an element of a list: `id`, or the key of a map.
    pub(crate) name_field: Option<u32>,
}

/// A field.
#[derive(Clone, Debug)]
pub(crate) struct Field {
    pub(crate) name: String,
    pub(crate) content: Content,
    pub(crate) repeated: bool,
    pub(crate) map: bool,
}

/// What stands in a field.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Content {
    /// A number of varying length.
    Varint,
    /// Four bytes.
    Fixed32,
    /// Eight bytes.
    Fixed64,
    /// UTF-8.
    Text,
    /// Anything.
    Bytes,
    /// A message, by index.
    Message(usize),
}

impl Schema {
    /// Tables of the contract that this engine was built with.
    #[must_use]
    pub(crate) fn of_the_contract() -> Self {
        let pool = DescriptorPool::decode(ropewalk_api::FILE_DESCRIPTOR_SET).expect("our own descriptors can be read");
        let mut schema = Self {
            messages: Vec::new(),
            requests: HashMap::new(),
        };
        let mut known = HashMap::new();
        for service in pool.services().filter(|service| service.package_name() == PACKAGE) {
            for method in service.methods() {
                let request = schema.add(&method.input(), &mut known);
                schema
                    .requests
                    .insert(format!("/{}/{}", service.full_name(), method.name()), request);
            }
        }
        schema
    }

    /// The request of a method; `None` for methods of other packages.
    pub(crate) fn request(&self, path: &str) -> Option<usize> {
        self.requests.get(path).copied()
    }

    pub(crate) fn message(&self, index: usize) -> &Message {
        &self.messages[index]
    }

    fn add(&mut self, message: &MessageDescriptor, known: &mut HashMap<String, usize>) -> usize {
        if let Some(index) = known.get(message.full_name()) {
            return *index;
        }
        let index = self.messages.len();
        known.insert(message.full_name().to_owned(), index);
        self.messages.push(Message {
            fields: HashMap::new(),
            name_field: name_field(message),
        });
        for field in message.fields() {
            let content = self.content(&field, known);
            let entry = Field {
                name: field.name().to_owned(),
                content,
                repeated: field.is_list(),
                map: field.is_map(),
            };
            self.messages[index].fields.insert(field.number(), entry);
        }
        index
    }

    fn content(&mut self, field: &FieldDescriptor, known: &mut HashMap<String, usize>) -> Content {
        match field.kind() {
            Kind::Double | Kind::Fixed64 | Kind::Sfixed64 => Content::Fixed64,
            Kind::Float | Kind::Fixed32 | Kind::Sfixed32 => Content::Fixed32,
            Kind::Int32
            | Kind::Int64
            | Kind::Uint32
            | Kind::Uint64
            | Kind::Sint32
            | Kind::Sint64
            | Kind::Bool
            | Kind::Enum(_) => Content::Varint,
            Kind::String => Content::Text,
            Kind::Bytes => Content::Bytes,
            Kind::Message(message) => Content::Message(self.add(&message, known)),
        }
    }
}

impl Message {
    pub(crate) fn field(&self, number: u32) -> Option<&Field> {
        self.fields.get(&number)
    }
}

fn name_field(message: &MessageDescriptor) -> Option<u32> {
    let field = message.get_field_by_name(if message.is_map_entry() { "key" } else { "id" })?;
    matches!(field.kind(), Kind::String).then(|| field.number())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_request_of_the_contract_is_there() {
        let schema = Schema::of_the_contract();
        for method in [
            "BriefService/Check",
            "BriefService/Run",
            "BriefService/Freeze",
            "ServerService/GetInfo",
        ] {
            assert!(schema.request(&format!("/ropewalk.v1.{method}")).is_some(), "{method}");
        }
        assert!(schema.request("/grpc.health.v1.Health/Check").is_none());
        let run = schema.message(schema.request("/ropewalk.v1.BriefService/Run").expect("known"));
        assert_eq!(run.field(1).expect("the brief").name, "brief");
        assert_eq!(run.field(2).expect("only").content, Content::Text);
        assert!(run.field(3).is_none());
    }
}
