//! Doubts that the author of a brief knows of.

use ropewalk_api::ropewalk::v1;

use super::findings::{Findings, Path};
use super::reasons;
use crate::words::Quoted;

/// Reads the accepted doubts and marks the findings that they speak of. To be called when every finding is there.
pub(crate) fn read(accepted: &[v1::AcceptedDoubt], findings: &mut Findings) {
    let list = Path::root("accepted");
    for (number, doubt) in accepted.iter().enumerate() {
        let at = list.number(number);
        if doubt.note.is_empty() {
            findings.error(
                reasons::MISSING,
                &at.field("note"),
                &doubt.on,
                format!("the doubt {} is accepted without saying why", Quoted(&doubt.reason)),
                "say in note why it is accepted",
            );
        }
        let known = || reasons::ALL.iter().map(|(reason, _)| *reason);
        if !known().any(|reason| reason == doubt.reason) {
            let meant = findings.nearest(&doubt.reason, known());
            let question = meant.map_or(String::new(), |meant| format!(" Did you mean {meant}?"));
            findings
                .doubt(
                    reasons::ACCEPTED_UNKNOWN,
                    &at.field("reason"),
                    &doubt.on,
                    format!(
                        "there is no reason {}: nothing is accepted.{question}",
                        Quoted(&doubt.reason)
                    ),
                    "give the reason as in the finding",
                )
                .value(&doubt.reason);
            continue;
        }
        let found = findings.accept(doubt);
        if !found && !reasons::OF_RESULTS.contains(&doubt.reason.as_str()) {
            findings
                .note(
                    reasons::ACCEPTED_NOT_FOUND,
                    &at,
                    &doubt.on,
                    format!("a doubt {} is accepted, and there is no such doubt", doubt.reason),
                    "take it out; errors cannot be accepted",
                )
                .value(&doubt.reason);
        }
    }
}
