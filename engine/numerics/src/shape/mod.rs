//! A state to start from: force densities, wanted tensions and other targets, given lengths, and members left to balance.

mod areas;
mod balance;
mod error;
mod fights;
mod find;
mod frozen;
mod gate;
mod given;
mod krylov;
mod loads;
mod lsqr;
mod parts;
mod report;
mod rows;
mod search;
mod sensitivity;
mod surface;
mod targets;
pub(crate) mod words;

#[cfg(test)]
mod tests;

pub use error::{ForceLeft, ShapeError};
pub use find::{find, first_shape};
pub use gate::Found;
pub use given::{Adjustable, Prestress, PrestressRule, SagMeasure, ShapeTarget, Wish};
pub use report::{BalanceReport, Fight, Quantity, ShapeReport, Target, Unmet, WITHIN};
pub use surface::gives_surface;
