//! What a net does in time.

pub mod mass;
pub mod transient;
