//! One balanced state.

pub mod audit;
mod settings;
mod solution;

pub use settings::{LoadSteps, Settings};
pub use solution::{IterationReport, Solution, SolveError, Termination, Way};
