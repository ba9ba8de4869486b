//! A run as a file that it can be read back from: the request, then each event that the engine answered, all encoded as the
//! contract has them and each behind its length (a varint), as protobuf libraries write and read "delimited" messages.
//!
//! The first message is a `RunRequest`, all others are `RunResponse`; progress and wall times are left out.

use prost::Message as _;
use ropewalk_api::ropewalk::v1;

use super::{Collector, Run};

/// Name of the file.
pub(crate) const FILE: &str = "run.binpb";

/// The run that a record tells of.
///
/// # Errors
/// Why it is no record, in words.
pub(crate) fn read(mut bytes: &[u8]) -> Result<Run, String> {
    let request = v1::RunRequest::decode_length_delimited(&mut bytes)
        .map_err(|error| format!("does not begin with a request: {error}"))?;
    let mut collector = Collector::of(&request);
    let brief = request.brief.ok_or("has no brief")?;
    while !bytes.is_empty() {
        let response = v1::RunResponse::decode_length_delimited(&mut bytes)
            .map_err(|error| format!("holds an event that cannot be read: {error}"))?;
        let Some(event) = response.event else {
            return Err("holds an event that this client does not know; a newer one wrote it".to_owned());
        };
        collector.take(event).map_err(|odd| odd.to_string())?;
    }
    if collector.is_whole() {
        collector.finish(brief)
    } else {
        collector.finish_broken(brief, "The record ends without a summary.")
    }
    .map_err(|odd| odd.to_string())
}

#[cfg(test)]
mod tests {
    use super::super::sample;
    use super::*;

    #[test]
    fn a_record_makes_the_same_run_again() {
        let run = sample::run();
        let again = read(&run.record).unwrap();
        assert_eq!(again.record, run.record);
        assert_eq!(again.brief, run.brief);
        assert_eq!(again.summary, run.summary);
        assert_eq!(again.states.len(), run.states.len());
        for (one, other) in run.states.iter().zip(&again.states) {
            assert_eq!((&one.columns, &one.summary), (&other.columns, &other.summary));
        }
    }

    #[test]
    fn a_record_that_was_cut_is_refused_or_told_as_broken_off() {
        let whole = sample::run().record;
        let mut broken = 0;
        for length in 0..whole.len() {
            match read(&whole[..length]) {
                Ok(run) => {
                    assert!(run.broken_off.is_some(), "{length} bytes read as a whole run");
                    broken += 1;
                }
                Err(why) => assert!(!why.is_empty()),
            }
        }
        // Between closed states and the summary a cut at the end of an event leaves what can be told of.
        assert!(broken > 5, "{broken}");
    }
}
