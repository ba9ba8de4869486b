//! Every way in which a call may fail, and the only place that names the codes of gRPC.
//!
//! Each answer has exactly one `google.rpc.ErrorInfo` of domain `ropewalk`; its reason never changes its meaning.

use std::collections::{HashMap, HashSet};
use std::time::Duration;

use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use thiserror::Error;
use tonic::{Code, Status};
use tonic_types::{ErrorDetails, FieldViolation, StatusExt as _};

/// Domain of all reasons.
const DOMAIN: &str = "ropewalk";

/// Room for the violations of a bad request (bytes). With the rest of the details, in base64, the header stays below
/// 8 KiB, the least limit of common clients.
const VIOLATIONS_BYTES: usize = 5 * 1024;

/// Most fields unknown to the contract that are named.
const UNKNOWN_NAMED: usize = 20;

/// Why a call gets no answer, or no further one.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum Refusal {
    /// The brief has errors; findings of any severity, of which the errors are told.
    #[error("the brief has {} error(s): {}", count_errors(.0), first_error(.0))]
    BriefHasErrors(Vec<v1::Finding>),
    /// The message is not protobuf of this contract.
    #[error("the request cannot be read: {0}")]
    Malformed(String),
    /// `grpc-timeout` cannot be read.
    #[error("the header grpc-timeout cannot be read: give one to eight digits and a unit of H, M, S, m, u, n")]
    UnreadableTimeout,
    /// Fields that this contract does not know.
    #[error("the request has {total} field(s) unknown to ropewalk.v1, such as {first:?}; is the client newer than this server?", first = paths.first().map_or("", String::as_str))]
    UnknownFields {
        /// Places of the first ones, each with its field number at the end.
        paths: Vec<String>,
        /// All of them.
        total: usize,
    },
    /// Over the limit.
    #[error("the request is larger than {limit} bytes, the limit told by ServerService.GetInfo")]
    TooLarge {
        /// The limit (bytes).
        limit: usize,
    },
    /// Compressed requests are not served.
    #[error("compressed requests are not served: send grpc-encoding identity")]
    Compressed,
    /// Too many calls.
    #[error("the server is full: come back in {:.1} s", come_back.as_secs_f64())]
    ServerFull {
        /// When to come back.
        come_back: Duration,
    },
    /// Nothing to freeze.
    #[error("there is no reference state to freeze: {0}")]
    NoReferenceState(String),
    /// The server is going down.
    #[error("the server is shutting down")]
    ShuttingDown,
    /// The deadline has passed.
    #[error("the deadline has passed")]
    DeadlineExceeded,
    /// The request did not arrive in time.
    #[error("the request did not arrive within {0} s")]
    TooSlow(u64),
    /// The client has left; never seen by anybody.
    #[error("the client has left")]
    ClientLeft,
    /// A promise of our own code is broken.
    #[error("the engine failed; please report it with request id {0:?}")]
    Internal(String),
}

impl Refusal {
    /// The code and the stable reason.
    #[must_use]
    pub fn code_and_reason(&self) -> (Code, &'static str) {
        match self {
            Self::BriefHasErrors(_) => (Code::InvalidArgument, "BRIEF_HAS_ERRORS"),
            Self::Malformed(_) => (Code::InvalidArgument, "MALFORMED_MESSAGE"),
            Self::UnreadableTimeout => (Code::InvalidArgument, "MALFORMED_TIMEOUT"),
            Self::UnknownFields { .. } => (Code::InvalidArgument, "UNKNOWN_FIELDS"),
            Self::TooLarge { .. } => (Code::InvalidArgument, "MESSAGE_TOO_LARGE"),
            Self::Compressed => (Code::Unimplemented, "COMPRESSION_NOT_SERVED"),
            Self::ServerFull { .. } => (Code::ResourceExhausted, "SERVER_FULL"),
            Self::NoReferenceState(_) => (Code::FailedPrecondition, "NO_REFERENCE_STATE"),
            Self::ShuttingDown => (Code::Unavailable, "SHUTTING_DOWN"),
            Self::DeadlineExceeded => (Code::DeadlineExceeded, "DEADLINE_EXCEEDED"),
            Self::TooSlow(_) => (Code::DeadlineExceeded, "REQUEST_TOO_SLOW"),
            Self::ClientLeft => (Code::Cancelled, "CLIENT_LEFT"),
            Self::Internal(_) => (Code::Internal, "INTERNAL"),
        }
    }
}

impl From<Refusal> for Status {
    fn from(refusal: Refusal) -> Self {
        let (code, reason) = refusal.code_and_reason();
        let mut details = ErrorDetails::new();
        let mut metadata = HashMap::new();
        let mut tell = |key: &str, value: String| metadata.insert(key.to_owned(), value);
        match &refusal {
            Refusal::BriefHasErrors(findings) => {
                details.set_bad_request(violations(findings));
                tell("errors", count_errors(findings).to_string());
                tell("all", "ropewalk.v1.BriefService/Check".to_owned());
            }
            Refusal::UnknownFields { paths, total } => {
                details.set_bad_request(unknown_fields(paths));
                tell("fields", total.to_string());
            }
            Refusal::TooLarge { limit } => {
                tell("limit_bytes", limit.to_string());
            }
            Refusal::ServerFull { come_back } => {
                details.set_retry_info(Some(*come_back));
                tell("come_back_s", format!("{:.1}", come_back.as_secs_f64()));
            }
            Refusal::TooSlow(seconds) => {
                tell("limit_s", seconds.to_string());
            }
            Refusal::Internal(request_id) => {
                tell("request_id", request_id.clone());
            }
            Refusal::Malformed(_)
            | Refusal::UnreadableTimeout
            | Refusal::Compressed
            | Refusal::NoReferenceState(_)
            | Refusal::ShuttingDown
            | Refusal::DeadlineExceeded
            | Refusal::ClientLeft => {}
        }
        details.set_error_info(reason, DOMAIN, metadata);
        Self::with_error_details(code, cut(&refusal.to_string(), 600), details)
    }
}

fn errors(findings: &[v1::Finding]) -> impl Iterator<Item = &v1::Finding> {
    findings
        .iter()
        .filter(|finding| finding.severity() == v1::FindingSeverity::Error)
}

/// All errors: a finding that stands for those left out counts as many as it tells.
fn count_errors(findings: &[v1::Finding]) -> usize {
    errors(findings)
        .map(|finding| {
            if finding.reason == crate::decode::reasons::MORE_OF_THE_SAME {
                finding.value.parse().unwrap_or(1)
            } else {
                1
            }
        })
        .sum()
}

fn first_error(findings: &[v1::Finding]) -> &str {
    errors(findings).next().map_or("", |finding| finding.message.as_str())
}

/// One violation of each kind, then the others in their order, as many as there is room for.
fn violations(findings: &[v1::Finding]) -> Vec<FieldViolation> {
    let mut kinds = HashSet::new();
    let (first, further): (Vec<_>, Vec<_>) =
        errors(findings).partition(|finding| kinds.insert(finding.reason.as_str()));
    // With many kinds every description gets shorter, so that none is missing.
    let length = (VIOLATIONS_BYTES / first.len().max(1))
        .saturating_sub(120)
        .clamp(40, 400);
    let mut room = VIOLATIONS_BYTES;
    let mut kept = Vec::new();
    for finding in first.into_iter().chain(further) {
        let words = if finding.cure.is_empty() {
            finding.message.clone()
        } else {
            format!("{}. {}", finding.message, finding.cure)
        };
        let violation = FieldViolation {
            field: cut(&finding.path, 200),
            description: cut(&words, length),
            reason: cut(&finding.reason, 63),
            ..FieldViolation::new("", "")
        };
        let size = encoded_length(&violation);
        if size <= room {
            room -= size;
            kept.push(violation);
        }
    }
    kept
}

fn unknown_fields(paths: &[String]) -> Vec<FieldViolation> {
    let mut room = VIOLATIONS_BYTES;
    let mut kept = Vec::new();
    for path in paths.iter().take(UNKNOWN_NAMED) {
        let violation = FieldViolation::new(cut(path, 400), "unknown to ropewalk.v1");
        let size = encoded_length(&violation);
        if size <= room {
            room -= size;
            kept.push(violation);
        }
    }
    kept
}

/// Bytes of a violation within the message that holds it.
fn encoded_length(violation: &FieldViolation) -> usize {
    let message = tonic_types::pb::bad_request::FieldViolation {
        field: violation.field.clone(),
        description: violation.description.clone(),
        reason: violation.reason.clone(),
        localized_message: None,
    };
    message.encoded_len() + 3
}

/// The text, at most `longest` bytes of it.
fn cut(text: &str, longest: usize) -> String {
    if text.len() <= longest {
        return text.to_owned();
    }
    let end = (0..=longest - '…'.len_utf8())
        .rev()
        .find(|end| text.is_char_boundary(*end))
        .unwrap_or(0);
    format!("{}…", &text[..end])
}

#[cfg(test)]
mod tests {
    use super::*;

    fn finding(reason: &str, path: &str, words: usize) -> v1::Finding {
        let mut finding = v1::Finding {
            reason: reason.to_owned(),
            path: path.to_owned(),
            message: "é".repeat(words),
            cure: "mend it".to_owned(),
            ..v1::Finding::default()
        };
        finding.set_severity(v1::FindingSeverity::Error);
        finding
    }

    #[test]
    fn many_errors_fit_with_one_of_each_kind() {
        let mut findings = Vec::new();
        for kind in 0..40 {
            for number in 0..50 {
                findings.push(finding(
                    &format!("KIND_{kind}"),
                    &format!("net.cables[c{number}].section"),
                    300,
                ));
            }
        }
        let status = Status::from(Refusal::BriefHasErrors(findings));
        assert_eq!(status.code(), Code::InvalidArgument);
        assert!(status.details().len() <= 6 * 1024, "{} bytes", status.details().len());
        let details = status.get_error_details();
        let violations = &details.bad_request().expect("violations").field_violations;
        let kinds: HashSet<&str> = violations.iter().map(|violation| violation.reason.as_str()).collect();
        assert_eq!(kinds.len(), 40);
        let info = details.error_info().expect("exactly one");
        assert_eq!(
            (info.reason.as_str(), info.domain.as_str()),
            ("BRIEF_HAS_ERRORS", "ropewalk")
        );
        assert_eq!(info.metadata["errors"], "2000");
        assert!(info.metadata["all"].contains("Check"));
    }

    #[test]
    fn doubts_are_not_violations() {
        let mut doubt = finding("HEAVY_SAG", "net", 1);
        doubt.set_severity(v1::FindingSeverity::Doubt);
        let status = Status::from(Refusal::BriefHasErrors(vec![finding("NO_NET", "net", 1), doubt]));
        let details = status.get_error_details();
        assert_eq!(details.bad_request().expect("violations").field_violations.len(), 1);
        assert_eq!(details.error_info().expect("one").metadata["errors"], "1");
    }

    #[test]
    fn a_full_server_says_when_to_come_back() {
        let come_back = Duration::from_secs(3);
        let status = Status::from(Refusal::ServerFull { come_back });
        assert_eq!(status.code(), Code::ResourceExhausted);
        let details = status.get_error_details();
        assert_eq!(details.retry_info().expect("a time").retry_delay, Some(come_back));
        assert_eq!(details.error_info().expect("one").reason, "SERVER_FULL");
    }

    #[test]
    fn cutting_respects_characters() {
        assert_eq!(cut("abc", 3), "abc");
        assert_eq!(cut("ééééé", 8), "éé…");
    }
}
