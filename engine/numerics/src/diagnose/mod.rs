//! Why there is no good answer: free movements, and numbers that can not be meant.

mod echelon;
pub mod mechanism;
pub mod mobility;
pub mod plausible;
