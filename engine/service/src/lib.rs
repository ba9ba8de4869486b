//! The engine: serves the contract over gRPC and runs the mechanics on threads of their own.
//!
//! # Map, along the way of a call
//! | module | does |
//! |---|---|
//! | [`config`] | every setting, its default and its check |
//! | [`telemetry`] | the log |
//! | [`call`], [`deadline`] | what the head of a call tells |
//! | [`strict`], `schema`, `wire` | refuses what the contract does not have |
//! | [`admission`] | so many running, so many waiting |
//! | [`pool`] | the threads that compute |
//! | [`status`] | every way in which a call may fail |
#![forbid(unsafe_code)]

pub mod admission;
pub mod build_info;
pub mod call;
pub mod config;
pub mod deadline;
pub mod pool;
mod schema;
pub mod status;
pub mod strict;
pub mod telemetry;
mod wire;
