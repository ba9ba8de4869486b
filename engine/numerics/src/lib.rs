//! Mechanics of cable nets, tents and canopies: pure and synchronous.
//!
//! ```text
//! given   nodes, supports, members with EA, mass, expansion; how the prestress arises; actions; cases
//! find    the reference state: positions x and the unstressed length L0 of every reach,
//!         with every member in balance; then, for each case, the positions that balance its loads:
//!
//!           r(x) = p − Σ N n = 0,   N = EA (l/a − 1), zero in a cable while l ≤ a,   a = L0 (1 + α ΔT)
//!
//! carried L0, at the reference temperature: shape → cases → workshop → site. Mass and weight go with it.
//! ```
//!
//! # Conventions
//! SI base units throughout: m, N, kg, s, K, rad. Axis z points up. Axial forces are positive in tension.
//! The residual is external minus internal force; the tangent is its negative derivative.
//! Forces of a support act on the net.
//!
//! # Map, from the ground up
//! | floor | modules |
//! |---|---|
//! | 0 | [`model`]: the net and its states |
//! | 1 | [`element`]: one member; [`load`]: what acts on it |
//! | 2 | [`assembly`]: all members together; [`check`]: is it good enough |
//! | 3 | [`equilibrium`]: one balanced state |
//! | 4 | [`shape`]: a state to start from; [`diagnose`]: why there is none; [`motion`]: how it vibrates and moves |
//! | 5 | [`brief`]: the whole work, planned and run |
//!
//! A module uses those below it only. Nothing here reads a clock or a file, logs, or starts a thread.
#![forbid(unsafe_code)]

pub mod assembly;
pub mod brief;
pub mod check;
pub mod diagnose;
pub mod element;
pub mod equilibrium;
pub mod load;
pub mod model;
pub mod motion;
pub mod shape;

#[cfg(test)]
mod test_nets;
