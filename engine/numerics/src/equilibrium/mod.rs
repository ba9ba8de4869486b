//! One balanced state.

mod analysis;
pub mod audit;
pub mod linear;
mod settings;
mod solution;

pub use analysis::Analysis;
pub use settings::{LoadSteps, Settings};
pub use solution::{IterationReport, Solution, SolveError, Termination, Way};
