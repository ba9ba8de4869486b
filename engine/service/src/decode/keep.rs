//! Which states are told with all their arrays, and over which sets envelopes are gathered.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::EnvelopeGiven;

use super::cases::{Cases, REFERENCE};
use super::findings::{Findings, Path};
use super::reasons;
use crate::words::Quoted;

/// The word for the cases that govern a check.
const GOVERNING: &str = "governing";

/// States that are told with their arrays. The reference state always is.
#[derive(Clone, Debug)]
pub struct Kept {
    /// One entry a case.
    full: Vec<bool>,
    /// Whether cases that govern a check are told again, with their arrays.
    pub governing: bool,
}

impl Kept {
    /// Whether a case is told with its arrays at once.
    #[must_use]
    pub fn is_full(&self, case: usize) -> bool {
        self.full[case]
    }
}

/// Reads what is kept; without the part everything is.
pub(crate) fn read(
    keep: Option<&v1::Keep>,
    cases: &Cases<'_>,
    findings: &mut Findings,
) -> (Option<Kept>, Vec<EnvelopeGiven>) {
    let Some(keep) = keep else {
        return (None, Vec::new());
    };
    let at = Path::root("keep");
    let n_cases = cases.list.len();
    let mut kept = Kept {
        full: vec![false; n_cases],
        // The default: the reference state, and what governs.
        governing: keep.full.is_empty() || keep.full.iter().any(|name| name == GOVERNING),
    };
    let named: Vec<String> = (keep.full.iter())
        .filter(|name| *name != GOVERNING && *name != REFERENCE)
        .cloned()
        .collect();
    if !named.is_empty()
        && let Some(list) = cases.named(&named, &at.field("full"), findings)
    {
        list.into_iter()
            .filter(|case| *case < n_cases)
            .for_each(|case| kept.full[case] = true);
    }
    let list = at.field("envelopes");
    let mut envelopes: Vec<EnvelopeGiven> = Vec::with_capacity(keep.envelopes.len());
    for (number, set) in keep.envelopes.iter().enumerate() {
        let at = list.number(number);
        if envelopes.iter().any(|given| given.name == *set) {
            findings.error(
                reasons::REPEATED_IN_LIST,
                &at,
                set,
                format!("set {} stands twice in keep.envelopes", Quoted(set)),
                "name each set once",
            );
            continue;
        }
        let Some(members) = cases.of_set(set) else {
            cases.unknown(set, &at, findings);
            continue;
        };
        envelopes.push(EnvelopeGiven {
            name: set.clone(),
            cases: members,
        });
    }
    (Some(kept), envelopes)
}
