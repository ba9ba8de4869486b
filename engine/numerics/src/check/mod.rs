//! Whether a net is good enough: demands against limits, and what was not judged.

mod envelope;
mod given;
mod judge;
#[cfg(test)]
mod tests_support;
mod verdict;

pub use envelope::{Envelope, EnvelopeTally, Extreme};
pub use given::{Check, CheckKind};
pub use judge::{CaseDigest, CheckResult, CheckTally, Covered, Judgement, worst_ratio};
pub use verdict::{Facts, Share, Verdict};
