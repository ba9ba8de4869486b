//! What the tests do with answers.

use std::collections::BTreeMap;

use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use tonic::{Code, Status, Streaming};
use tonic_types::StatusExt as _;
use v1::run_response::Event;

/// All events of a run up to its end, and how it ended.
pub(crate) async fn collect<T>(mut stream: Streaming<T>) -> (Vec<T>, Result<(), Status>) {
    let mut messages = Vec::new();
    loop {
        match stream.message().await {
            Ok(Some(message)) => messages.push(message),
            Ok(None) => return (messages, Ok(())),
            Err(status) => return (messages, Err(status)),
        }
    }
}

/// The events that have to be the same in equal runs, encoded: all but progress and timing.
pub(crate) fn lasting_bytes(events: &[v1::RunResponse]) -> Vec<u8> {
    let mut bytes = Vec::new();
    for event in events {
        if !matches!(event.event, Some(Event::Progress(_) | Event::Timing(_))) {
            event.encode_length_delimited(&mut bytes).expect("a vector grows");
        }
    }
    bytes
}

pub(crate) fn case_summaries(events: &[v1::RunResponse]) -> Vec<&v1::CaseSummary> {
    let summary = |event: &'_ v1::RunResponse| matches!(event.event, Some(Event::CaseSummary(_)));
    let found = events.iter().filter(|event| summary(event));
    found
        .filter_map(|event| match &event.event {
            Some(Event::CaseSummary(summary)) => Some(summary),
            _ => None,
        })
        .collect()
}

/// The whole arrays of a case by name, put together from their parts.
pub(crate) fn columns(events: &[v1::RunResponse], case: &str) -> BTreeMap<String, Vec<f64>> {
    let mut arrays: BTreeMap<String, Vec<f64>> = BTreeMap::new();
    for event in events {
        if let Some(Event::Columns(part)) = &event.event
            && part.case == case
        {
            let array = arrays.entry(part.name.clone()).or_default();
            assert_eq!(
                array.len(),
                part.offset as usize,
                "{}: parts in order, without gaps",
                part.name
            );
            array.extend(&part.values);
        }
    }
    arrays
}

/// The code of a status and the reason in its one `ErrorInfo`.
#[track_caller]
pub(crate) fn code_and_reason(status: &Status) -> (Code, String) {
    let details = status.get_error_details();
    let info = details
        .error_info()
        .unwrap_or_else(|| panic!("no ErrorInfo in {status:?}"));
    assert_eq!(info.domain, "ropewalk");
    (status.code(), info.reason.clone())
}
