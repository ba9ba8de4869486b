//! Domain to message. Every message stays well below 1 MiB, so that a client with default limits never fails: arrays,
//! tables and lists go out in parts.
//!
//! | file | says |
//! |---|---|
//! | `head` | what is about to run: sizes, settings, tables of ids |
//! | `progress` | what is being worked on |
//! | `state`, `outcome`, `failure`, `doubts` | a state: arrays, closing words, why there is none, what is odd about it |
//! | `shape` | how the reference state meets what was wanted |
//! | `certificate` | how far a state can be from the true one |
//! | `surface` | panels, and what each action does in the reference state |
//! | `effects` | sums of effects, paths of cases, losses of members |
//! | `diagnosis` | free movements, states of self-stress, least stiffnesses |
//! | `modes` | natural modes: frequencies, shapes, what is odd about them |
//! | `motions`, `motion_doubts` | motions in time: frames, events, spectra, extremes, what is odd about them |
//! | `closing`, `verdicts`, `rules`, `anchors`, `cautions` | the end of a run |
//! | `sizing` | sections chosen from lists |
//! | `freeze` | the brief with what was found written in |
//! | `report` | what reading the brief told |
//! | `parts` | how much fits a message |

mod anchors;
mod cautions;
mod certificate;
mod closing;
mod diagnosis;
mod doubts;
mod effects;
mod failure;
mod freeze;
mod head;
mod modes;
mod motion_doubts;
mod motions;
mod outcome;
mod parts;
mod progress;
mod report;
mod rules;
mod shape;
mod sizing;
mod state;
mod surface;
mod verdicts;

pub use cautions::cautions;
pub use closing::{Noted, Tally, closing};
pub use effects::{design_effect, path};
pub use freeze::freeze;
pub use head::{id_tables, started};
pub use motions::{
    NotedMotion, motion_broke, motion_end, motion_frame, motion_head, motion_not_begun, motion_progress,
};
pub use outcome::{case, engine_error, reference};
pub use progress::progress;
pub use report::check_report;
pub use sizing::sizing;
