//! The roof: the whole work of a brief, planned and run.

mod cause;
mod diagnosis;
mod effect;
mod estimate;
mod given;
mod loss;
mod modes;
mod motion;
mod outcome;
mod path;
mod picture;
mod plan;
mod ponding;
mod sizing;
mod state;
mod summary;
mod tally;

#[cfg(test)]
mod tests;

pub use cause::{Cause, Culprit, LikelyCause};
pub use diagnosis::{DiagnosisGiven, LITTLE_LEFT, Standing, StateDiagnosis};
pub use effect::{DesignEffect, EffectRule, FactorRules};
pub use estimate::Estimate;
pub use given::{Brief, CaseGiven, EnvelopeGiven, LoadPath};
pub use loss::{Loss, LossExtreme, LossForce};
pub use modes::{GustNote, ModesGiven};
pub use motion::{
    BreakGiven, Compared, DampingGiven, Divided, DrivenGiven, DrivenWhat, MotionBegun, MotionDoubt, MotionExtreme,
    MotionExtremes, MotionFound, MotionGiven, MotionNotBegun, ShownRope, SpectraGiven, StartGiven, Watched,
};
pub use outcome::{CaseOutcome, EndForce, ReferenceOutcome, StateResult, SupportForce, Task};
pub use path::PathResult;
pub use picture::{LoadPicture, Resultant};
pub use plan::Plan;
pub use ponding::{Ponding, PondingEnd, PondingGiven};
pub use sizing::{Sizing, SizingNeed, SizingOutcome, SizingRound, SizingStep, SizingUnit, size};
pub use summary::{Caution, Summary};
pub use tally::{Effect, Tally};

pub use crate::check::{Check, CheckKind, CheckResult, Verdict};
pub use crate::shape::{Prestress, PrestressRule};
