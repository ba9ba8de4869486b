//! Motions of a brief.
//!
//! | file | subject |
//! |---|---|
//! | `given` | what is asked for |
//! | `begin` | the state that a motion starts from, hanging ropes divided, what peaks are compared with |
//! | `begun` | a motion under way, and what came of it, in the net as given |
//! | `refused` | why a motion did not begin |
//! | `doubts` | what to doubt of what came of it |

mod begin;
mod begun;
mod doubts;
mod given;
mod refused;

pub use begun::{Compared, Divided, MotionBegun, MotionExtreme, MotionExtremes, MotionFound, ShownRope};
pub use doubts::MotionDoubt;
pub use given::{BreakGiven, DampingGiven, DrivenGiven, DrivenWhat, MotionGiven, StartGiven};
pub use refused::MotionNotBegun;

pub use crate::motion::transient::{SpectraGiven, Watched};
