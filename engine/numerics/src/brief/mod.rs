//! The roof: the whole work of a brief, planned and run.

mod given;
mod outcome;

pub use given::{Brief, CaseGiven, Check, CheckKind, Prestress, PrestressRule};
pub use outcome::*;
