//! Motions of a brief.

mod given;

pub use given::{BreakGiven, DampingGiven, DrivenGiven, DrivenWhat, MotionGiven, SpectraGiven, StartGiven, Watched};
