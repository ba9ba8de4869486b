//! The roof: the whole work of a brief, planned and run.

mod cause;
mod estimate;
mod given;
mod outcome;
mod plan;
mod sizing;
mod state;
mod summary;
mod tally;

#[cfg(test)]
mod tests;

pub use cause::{Cause, Culprit, LikelyCause};
pub use estimate::Estimate;
pub use given::{Brief, CaseGiven};
pub use outcome::{CaseOutcome, EndForce, ReferenceOutcome, StateResult, SupportForce, Task};
pub use plan::Plan;
pub use sizing::{Sizing, SizingNeed, SizingOutcome, SizingRound, SizingStep, SizingUnit, size};
pub use summary::{Caution, Summary};
pub use tally::Tally;

pub use crate::check::{Check, CheckKind, CheckResult, Verdict};
pub use crate::shape::{Prestress, PrestressRule};
