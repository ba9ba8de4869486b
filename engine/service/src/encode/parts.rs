//! How much fits a message.

use prost::Message;
use ropewalk_api::ropewalk::v1;
use v1::run_response::Event;

/// Numbers of an array in one message: 64 KiB of them.
pub(super) const NUMBERS: usize = 8192;
/// Bytes of lists in one message.
pub(super) const BYTES: usize = 192 * 1024;

pub(super) fn event(event: Event) -> v1::RunResponse {
    v1::RunResponse { event: Some(event) }
}

/// Splits a list so that each part stays below [`BYTES`], or has one element.
pub(super) fn split<M: Message>(list: Vec<M>) -> Vec<Vec<M>> {
    let mut parts: Vec<Vec<M>> = Vec::new();
    let mut size = BYTES;
    for element in list {
        let own = element.encoded_len() + 8;
        match parts.last_mut() {
            Some(part) if size + own <= BYTES => {
                size += own;
                part.push(element);
            }
            _ => {
                size = own;
                parts.push(vec![element]);
            }
        }
    }
    parts
}

/// The first of many messages: [`BYTES`] in all.
pub(super) fn fitting<M: Message>(messages: impl Iterator<Item = M>) -> Vec<M> {
    let mut size = 0;
    messages
        .take_while(|message| {
            size += message.encoded_len() + 8;
            size <= BYTES
        })
        .collect()
}

/// The first of many ids: at most `count` of them and [`BYTES`] in all.
pub(super) fn first_ids<'a>(ids: impl Iterator<Item = &'a str>, count: usize) -> Vec<String> {
    let mut size = 0;
    ids.take(count)
        .take_while(|id| {
            size += id.len() + 4;
            size <= BYTES
        })
        .map(str::to_owned)
        .collect()
}

/// Positions and counts on the wire: a net has fewer than 2³² parts of a kind.
pub(super) fn count(value: usize) -> u32 {
    u32::try_from(value).unwrap_or(u32::MAX)
}
