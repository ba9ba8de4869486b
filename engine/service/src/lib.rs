//! The engine: serves the contract over gRPC and runs the mechanics on threads of their own.
//!
//! # Map, along the way of a call
//! | module | does |
//! |---|---|
//! | [`config`] | every setting, its default and its check |
//! | [`telemetry`] | the log |
//! | [`call`], [`deadline`] | what the head of a call tells |
//! | [`strict`], `schema`, `wire` | refuses what the contract does not have |
//! | [`rpc`] | the generated traits |
//! | [`admission`] | so many running, so many waiting |
//! | [`pool`] | the threads that compute |
//! | [`decode`], [`encode`] | message to domain and back |
//! | [`status`] | every way in which a call may fail |
//! | [`server`], [`signals`] | all of it put together, up to the end of the drain |
#![forbid(unsafe_code)]

pub mod admission;
pub mod build_info;
pub mod call;
pub mod config;
pub mod deadline;
pub mod decode;
pub mod encode;
pub mod pool;
pub mod rpc;
mod schema;
pub mod server;
pub mod signals;
pub mod status;
pub mod strict;
pub mod telemetry;
mod wire;
mod words;
