//! Why there is no good answer: free movements, and numbers that can not be meant.

pub mod mechanism;
pub mod plausible;
