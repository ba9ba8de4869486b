//! `ServerService`.

use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::server_service_server::ServerService;
use tonic::{Request, Response, Status};

use crate::build_info::engine_build;
use crate::config::{Config, RESPONSE_BYTES};
use crate::decode::{NOT_SERVED, SERVED};
use crate::encode;

/// Tells what this server is and what it can do.
#[derive(Clone, Debug)]
pub struct ServerApi(v1::GetInfoResponse);

impl ServerApi {
    /// An engine with these settings.
    #[must_use]
    pub fn new(config: &Config) -> Self {
        let count = |number: usize| u32::try_from(number).unwrap_or(u32::MAX);
        let limits = config.limits();
        Self(v1::GetInfoResponse {
            engine: Some(engine_build()),
            limits: Some(v1::Limits {
                request_bytes: limits.request_bytes as u64,
                response_bytes: RESPONSE_BYTES,
                nodes: limits.nodes,
                segments: limits.segments,
                cases: limits.cases,
                running: count(config.running),
                waiting: count(config.waiting),
                call_s: config.max_call().map_or(0.0, |longest| longest.as_secs_f64()),
            }),
            served: SERVED.iter().copied().map(str::to_owned).collect(),
            not_served: NOT_SERVED.iter().copied().map(str::to_owned).collect(),
            cautions: encode::cautions(),
        })
    }
}

#[tonic::async_trait]
impl ServerService for ServerApi {
    async fn get_info(&self, _: Request<v1::GetInfoRequest>) -> Result<Response<v1::GetInfoResponse>, Status> {
        Ok(Response::new(self.0.clone()))
    }
}

#[cfg(test)]
mod tests {
    use std::collections::BTreeSet;

    use prost_reflect::{DescriptorPool, Kind, MessageDescriptor};

    use super::*;

    /// Fields under `message` whose comment says that they are not served yet, as places.
    fn told(message: &MessageDescriptor, place: &str, found: &mut BTreeSet<String>) {
        for field in message.fields() {
            let place = if place.is_empty() {
                field.name().to_owned()
            } else {
                format!("{place}.{}", field.name())
            };
            let file = field.parent_file();
            let file = file.file_descriptor_proto();
            let comment = file
                .source_code_info
                .iter()
                .flat_map(|info| &info.location)
                .find(|l| l.path == field.path());
            if comment.is_some_and(|location| location.leading_comments().contains("Not served yet")) {
                found.insert(place);
            } else if let Kind::Message(inner) = field.kind()
                && !inner.is_map_entry()
            {
                told(&inner, &place, found);
            }
        }
    }

    #[test]
    fn what_is_not_served_is_what_the_contract_says() {
        let pool = DescriptorPool::decode(ropewalk_api::FILE_DESCRIPTOR_SET).expect("descriptors");
        let brief = pool.get_message_by_name("ropewalk.v1.Brief").expect("a brief");
        let mut found = BTreeSet::new();
        told(&brief, "", &mut found);
        let listed: BTreeSet<String> = NOT_SERVED.iter().copied().map(str::to_owned).collect();
        assert_eq!(listed, found);
    }
}
