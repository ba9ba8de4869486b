//! Cases with known answers, solved through the kernel's public interface.
//!
//! Each comparison prints one line, which the test command shows:
//!
//! ```text
//! case: NAME | source | published | computed | deviation | tolerance | pass
//! ```
//!
//! "Published" is the printed value, the closed form or the independent solution that the source names. The files in
//! `data/` tell where each of their numbers came from; numbers that stand in the code are closed forms written out
//! beside the check, or come from the source named there.
//!
//! `report` compares, `problem` holds every call of the kernel, `properties` tries any net, the other modules are cases.
#![forbid(unsafe_code)]
#![allow(clippy::print_stdout, reason = "the report of a comparison is its printed line")]

mod chains;
mod checks;
mod data;
mod hanging;
mod loads;
mod modes;
mod motion;
mod nets;
mod prestress;
mod problem;
mod properties;
mod report;
mod scalar;
mod shapes;
mod sliding;
mod straight;
mod supports;
mod surfaces;
mod targets;
