//! A state to start from: force densities, wanted tensions, given lengths, and members left to balance.

mod areas;
mod balance;
mod error;
mod find;
mod frozen;
mod gate;
mod given;
mod krylov;
mod loads;
mod parts;
mod report;
mod search;
mod sensitivity;
mod targets;
pub(crate) mod words;

#[cfg(test)]
mod tests;

pub use error::{ForceLeft, ShapeError, Target};
pub use find::{find, first_shape};
pub use gate::Found;
pub use given::{Prestress, PrestressRule};
pub use report::{BalanceReport, ShapeReport};
