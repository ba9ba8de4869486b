//! How far steps of central differences are divided.

use super::system::System;

/// Share of the largest stable step that is used.
const STABLE_SHARE: f64 = 0.9;

/// Equal parts of a step (–), as many as stability needs.
pub(super) fn explicit_divisions(system: &System) -> f64 {
    let stable = STABLE_SHARE * damped_step(system);
    (system.motion.step / stable).ceil().max(1.0)
}

/// The stable step where there is damping (s): `2/ω (√(1 + ξ²) − ξ)` with the largest damping ratio `ξ`.
fn damped_step(system: &System) -> f64 {
    let undamped = system.stable_step();
    let omega = 2.0 / undamped;
    let damping = &system.motion.damping;
    let dashpots = damping
        .segments
        .iter()
        .zip(system.bars())
        .filter(|(_, bar)| bar.is_present());
    let relative = dashpots.map(|(c, bar)| c / bar.stiffness).fold(0.0, f64::max);
    let ratio = 0.5 * ((damping.stiffness + relative) * omega + damping.mass / omega);
    undamped * ((1.0 + ratio * ratio).sqrt() - ratio)
}
