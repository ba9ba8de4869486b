//! How much the lists of motions cover: each element of a list may name the whole net, and all of it is written out.

use std::cell::Cell;

use super::findings::{Findings, Path};
use super::numbers::Of;
use super::reasons;
use crate::words::number;

/// Nodes and segments that lists of all motions together may cover.
const MOST: usize = 10_000_000;

/// What has been covered so far.
#[derive(Debug, Default)]
pub(crate) struct Covered(Cell<usize>);

impl Covered {
    /// Takes in what an element of a list at `at` covers. Answers whether to go on; the first that is too much is told.
    pub(super) fn add(&self, count: usize, of: Of<'_>, at: &Path<'_>, findings: &mut Findings) -> bool {
        let (before, after) = (self.0.get(), self.0.get().saturating_add(count));
        self.0.set(after);
        if before <= MOST && after > MOST {
            let most = number(MOST as f64);
            findings
                .error(
                    reasons::TOO_MANY,
                    at,
                    of.id,
                    format!(
                        "{of}: up to here lists of motions cover more than {most} nodes and segments, each time anew"
                    ),
                    "name what several elements have in common in one of them, or leave out motions",
                )
                .value(after);
        }
        after <= MOST
    }
}
