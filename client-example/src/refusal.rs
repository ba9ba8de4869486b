//! Answers that are not results: findings for people, and what a status means for the end of the program.

use ropewalk_api::ropewalk::v1;
use tonic::{Code, Status};
use tonic_types::StatusExt as _;

use crate::end::{End, Stop};
use crate::sheet::wrap;

/// Whether the engine refused the brief for its errors, so that `Check` tells all of them.
pub(crate) fn brief_has_errors(status: &Status) -> bool {
    reason(status).as_deref() == Some("BRIEF_HAS_ERRORS")
}

fn reason(status: &Status) -> Option<String> {
    status.get_details_error_info().map(|info| info.reason)
}

/// What a status means.
pub(crate) fn stop(status: &Status) -> Stop {
    let details = status.get_error_details();
    let mut told = match status.code() {
        // The library that carries the call has no better word for a connection that went away.
        _ if connection_lost(status) => format!("the connection to the engine broke: {}", status.message()),
        Code::Unavailable => format!("the engine is not available: {}", status.message()),
        Code::Internal | Code::Unknown | Code::DataLoss => format!("the engine failed: {}", status.message()),
        _ => format!("the engine refuses: {}", status.message()),
    };
    if let Some(request) = details.bad_request() {
        for violation in &request.field_violations {
            told.push_str(&format!("\n  {}: {}", violation.field, violation.description));
        }
    }
    if let Some(delay) = details.retry_info().and_then(|retry| retry.retry_delay) {
        told.push_str(&format!("\nTry again in {:.1} s.", delay.as_secs_f64()));
    }
    let end = match status.code() {
        _ if connection_lost(status) => End::EngineAway,
        Code::InvalidArgument | Code::NotFound | Code::OutOfRange => End::BriefHasErrors,
        Code::FailedPrecondition if reason(status).as_deref() == Some("NO_REFERENCE_STATE") => End::NoAnswer,
        Code::Unavailable | Code::ResourceExhausted | Code::DeadlineExceeded | Code::Unimplemented => End::EngineAway,
        _ => End::EngineFailed,
    };
    Stop { end, told }
}

/// Whether the status was made at this end because the connection broke.
fn connection_lost(status: &Status) -> bool {
    matches!(status.code(), Code::Unknown | Code::Internal | Code::Unavailable)
        && std::error::Error::source(status).is_some()
}

/// A severity as a word.
pub(crate) fn severity_word(severity: v1::FindingSeverity) -> &'static str {
    match severity {
        v1::FindingSeverity::Error => "error",
        v1::FindingSeverity::Doubt => "doubt",
        v1::FindingSeverity::Note | v1::FindingSeverity::Unspecified => "note",
    }
}

/// What weighs most comes first.
pub(crate) fn severity_rank(severity: v1::FindingSeverity) -> u8 {
    match severity {
        v1::FindingSeverity::Error => 0,
        v1::FindingSeverity::Doubt => 1,
        v1::FindingSeverity::Note | v1::FindingSeverity::Unspecified => 2,
    }
}

/// Findings for eyes: errors first, each with what, where and how to mend it.
pub(crate) fn findings_text(findings: &[v1::Finding]) -> String {
    findings_text_up_to(findings, usize::MAX)
}

/// The same, for the first so many.
pub(crate) fn findings_text_up_to(findings: &[v1::Finding], most: usize) -> String {
    let mut sorted: Vec<&v1::Finding> = findings.iter().collect();
    sorted.sort_by_key(|finding| (severity_rank(finding.severity()), !finding.accepted_note.is_empty()));
    let mut text = String::new();
    let left_out = sorted.len().saturating_sub(most);
    for finding in sorted.into_iter().take(most) {
        let mut place = finding.path.clone();
        if place.is_empty() {
            place = [finding.case.as_str(), finding.id.as_str()]
                .iter()
                .filter(|part| !part.is_empty())
                .copied()
                .collect::<Vec<_>>()
                .join(", ");
        } else if !finding.case.is_empty() {
            place = format!("{place}, case {}", finding.case);
        }
        let accepted = if finding.accepted_note.is_empty() {
            String::new()
        } else {
            format!(", accepted: {}", finding.accepted_note)
        };
        text.push_str(&format!(
            "{} {}  {place}{accepted}\n",
            severity_word(finding.severity()),
            finding.reason
        ));
        text.push_str(&format!("  {}\n", wrap(&finding.message, 110, "  ")));
        if !finding.cure.is_empty() {
            text.push_str(&format!(
                "  {}\n",
                wrap(&format!("cure: {}", finding.cure), 110, "        ")
            ));
        }
    }
    if left_out > 0 {
        text.push_str(&format!("... and {left_out} more findings\n"));
    }
    text
}

/// How many findings of each severity, accepted doubts apart: "2 errors, 1 doubt".
pub(crate) fn count_words(findings: &[v1::Finding]) -> String {
    let mut parts = Vec::new();
    for severity in [
        v1::FindingSeverity::Error,
        v1::FindingSeverity::Doubt,
        v1::FindingSeverity::Note,
    ] {
        let open = |finding: &&v1::Finding| finding.severity() == severity && finding.accepted_note.is_empty();
        let count = findings.iter().filter(open).count();
        if count > 0 {
            parts.push(format!(
                "{count} {}{}",
                severity_word(severity),
                if count == 1 { "" } else { "s" }
            ));
        }
    }
    let accepted = findings
        .iter()
        .filter(|finding| !finding.accepted_note.is_empty())
        .count();
    if accepted > 0 {
        parts.push(format!("{accepted} accepted"));
    }
    if parts.is_empty() {
        "no findings".to_owned()
    } else {
        parts.join(", ")
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn finding(severity: v1::FindingSeverity, reason: &str) -> v1::Finding {
        v1::Finding {
            severity: severity.into(),
            reason: reason.to_owned(),
            path: "net.cables[c3].nodes".to_owned(),
            message: "node \"n3l\" is used once".to_owned(),
            cure: "did you mean \"n31\"?".to_owned(),
            ..Default::default()
        }
    }

    #[test]
    fn errors_come_first_with_place_and_cure() {
        let findings = [
            finding(v1::FindingSeverity::Note, "A"),
            finding(v1::FindingSeverity::Error, "NODE_USED_ONCE"),
        ];
        let text = findings_text(&findings);
        assert!(
            text.starts_with(
                "error NODE_USED_ONCE  net.cables[c3].nodes\n  node \"n3l\" is used once\n  cure: did you mean"
            ),
            "{text}"
        );
        assert_eq!(count_words(&findings), "1 error, 1 note");
        assert_eq!(count_words(&[]), "no findings");
    }

    #[test]
    fn statuses_have_their_ends() {
        for (code, end) in [
            (Code::InvalidArgument, End::BriefHasErrors),
            (Code::Unavailable, End::EngineAway),
            (Code::ResourceExhausted, End::EngineAway),
            (Code::Internal, End::EngineFailed),
        ] {
            assert_eq!(stop(&Status::new(code, "x")).end, end);
        }
        assert!(!brief_has_errors(&Status::invalid_argument("x")));
    }
}
