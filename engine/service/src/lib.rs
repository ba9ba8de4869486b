//! The engine behind the contract: reads briefs, runs the mechanics, streams what came of them.
#![forbid(unsafe_code)]

pub mod build_info;
pub mod config;
pub mod decode;
pub mod encode;
mod words;
