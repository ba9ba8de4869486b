//! Whether a net is good enough: demands against limits, and what was not judged.

mod anchor;
mod digest;
mod envelope;
mod given;
mod grip;
mod judge;
mod judgement;
mod member;
mod place;
#[cfg(test)]
mod tests_support;
mod verdict;

pub use anchor::{AnchorExtremes, AnchorPull, AnchorTally};
pub use digest::{Against, Base, CaseDigest};
pub use envelope::{Envelope, EnvelopeTally, Extreme, MovementTally};
pub use given::{
    Check, CheckKind, Clamp, Clearance, MovementLimit, PullLimits, Saddle, SaddleRadius, SaddleSlip, Stage,
};
pub use judge::{CheckTally, worst_ratio};
pub use judgement::{CheckResult, Covered, Judgement, LARGEST_RATIO, Lack, Measure};
pub use member::{critical_force, eccentric_moment, resistance};
pub use verdict::{Facts, Share, Verdict};
