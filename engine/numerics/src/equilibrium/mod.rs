//! One balanced state.
//!
//! ```text
//! existence      is every load held?                            a graph test, before anything is solved
//! carried        Newton with carried forces                     first, where most is taut
//! newton         Newton on the energy with a line search        where that fails, unless much is slack at the start
//! interior point, then carried forces as a polish               pure tension, hard starts
//! load steps, relaxation                                        with struts, hard starts
//! stability      can the balanced state move freely?            with struts
//! certificate    how far can it be from the true state?         after it is found
//! eigen          least eigenvalues of a sparse matrix           where asked for
//! ```

mod analysis;
pub mod audit;
mod carried;
pub mod certificate;
pub mod eigen;
pub mod existence;
mod friction;
mod interior_point;
mod line_search;
pub mod linear;
mod load_steps;
mod members;
mod newton;
mod relaxation;
mod run;
mod settings;
mod solution;
pub mod stability;

pub use analysis::Analysis;
pub use load_steps::solve;
pub use members::member_states;
pub use settings::{LoadSteps, Settings, Yardstick};
pub use solution::{IterationReport, LoadStepState, MemberStates, Solution, SolveError, Termination, Way};
