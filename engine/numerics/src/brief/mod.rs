//! The roof: the whole work of a brief, planned and run.

mod given;
mod outcome;

pub use crate::check::{Check, CheckKind, CheckResult, Verdict};
pub use crate::shape::{Prestress, PrestressRule};
pub use given::{Brief, CaseGiven};
pub use outcome::*;
