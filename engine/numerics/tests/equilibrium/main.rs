//! States of whole nets: families of random nets, published and own numbers, properties, endings.
#![allow(clippy::unwrap_used, clippy::print_stdout, reason = "tests")]

mod audited;
mod endings;
mod families;
mod held;
mod nets;
mod properties;
mod random;
mod saddle;
mod special;
mod struts;
