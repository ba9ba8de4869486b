//! States of whole nets: families of random nets, published and own numbers, properties, endings.
#![allow(clippy::unwrap_used, reason = "tests")]

mod audited;
mod families;
mod nets;
mod saddle;
