//! The engine as a program, over its network: how it streams, refuses, survives and ends.
//!
//! The tests drive the built binary, whose path stands in the environment variable `ROPEWALK_ENGINE_BIN`.

mod admission;
mod briefs;
mod client;
mod drain;
mod effects;
mod engine;
mod faults;
mod hostile;
mod http2;
mod motions;
mod operation;
mod overhead;
mod requests;
mod runs;
mod slow;
mod web;
