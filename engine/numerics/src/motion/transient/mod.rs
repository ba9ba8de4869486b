//! Nonlinear motion, step by step.
//!
//! ```text
//! M a + C v + Σ T n = p(t),     x(0), v(0) given,     M lumped
//! ```
//!
//! | scheme | for |
//! |---|---|
//! | generalised-α (Chung & Hulbert 1993) | most motions; damps what the steps can not resolve, as much as its spectral radius says |
//! | conserving (Simo & Tarnow 1992; Gonzalez 1996) | snatching nets over long times: energy balances to the last digit |
//! | central differences | snatch and impact, where steps are small anyway |
//!
//! The step is halved where a snatch does not converge, and divided where an error is to be kept or loads jump. All
//! frames stand at whole steps. What is not conserved, dissipated or done by loads is told as the error of the steps.
//!
//! | file | subject |
//! |---|---|
//! | `given`, `history` | what is asked of a motion |
//! | `check` | whether it makes sense, and how large it is |
//! | `run` | [`Running`]: from frame to frame; may wait in between |
//! | `step` | one step of each scheme; errors of the implicit ones by the change of acceleration |
//! | `system`, `inertia` | forces, stiffness, mass; forces of supports |
//! | `record` | frames, peaks, events, the ledger of energy |
//! | `watch`, `spectrum` | quantities watched at every step, and their spectra |
//! | `settled` | the static case to compare with |
//! | `waves` | speeds of waves on ropes |
//!
//! Ropes that slide and segments that hang are refused. Pressure is left out of the tangent: the forces are exact, and
//! inertia outweighs its slope in a step.

mod check;
mod error;
mod explicit;
mod given;
mod history;
mod inertia;
mod record;
mod run;
mod settled;
mod spectrum;
mod step;
mod system;
#[cfg(test)]
mod tests;
mod watch;
mod waves;

pub use check::{Caution, Extent};
pub use error::MotionError;
pub use given::{Break, BreakWhen, Damping, Driven, Frames, Motion, Observer, Progress, Scheme, Settled};
pub use history::{History, HistoryError};
pub use record::{DynamicFactors, Event, EventKind, Events, Frame, Ledger, Peak, Peaks, SupportPeak};
pub use run::{Ending, Outcome, Outlook, Running, Stuck, StuckBy, Went, outlook, run};
pub use settled::settled_case;
pub use spectrum::{SpectraGiven, Spectrum, SpectrumPeak};
pub use watch::Watched;
pub use waves::{RopeField, WaveSpeeds};
