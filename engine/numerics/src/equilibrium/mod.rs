//! One balanced state.
//!
//! ```text
//! existence      is every load held?                            a graph test, before anything is solved
//! newton         Newton on the energy with a line search        first, unless much is slack at the start
//! interior point, polish                                        pure tension, hard starts
//! load steps, relaxation                                        with struts, hard starts
//! stability      can the balanced state move freely?            with struts
//! ```

mod analysis;
pub mod audit;
pub mod existence;
mod interior_point;
mod line_search;
pub mod linear;
mod load_steps;
mod newton;
mod polish;
mod relaxation;
mod run;
mod settings;
mod solution;
pub mod stability;

pub use analysis::Analysis;
pub use load_steps::solve;
pub use settings::{LoadSteps, Settings, Yardstick};
pub use solution::{IterationReport, LoadStepState, Solution, SolveError, Termination, Way};
