//! The border between contract and kernel: what is read, what is refused, what is said.

mod absurd;
mod briefs;
mod checks;
mod combinations;
mod diagnosis;
mod drafts;
mod fields;
mod freezing;
mod golden;
mod minimal;
mod modes;
mod motions;
mod reasons;
mod results;
mod sizes;
mod sizing;
mod slides;
mod surfaces;
mod targets;
mod violations;
