//! Waves on ropes: their speeds, and the field along a rope.

use nalgebra::Vector3;

use super::Motion;
use crate::model::{CableId, Net};

/// How fast waves run along a rope at the start, over its unstressed length.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct WaveSpeeds {
    /// The rope.
    pub cable: CableId,
    /// Least and largest speed of transverse waves over its segments (m/s); zero in a slack one. With the length `l` of a
    /// segment of unstressed length `L`: `√(T L / (m l))`, since the slope of a wave is that over `l`.
    pub transverse: [f64; 2],
    /// Largest speed of axial waves `√(EA/m)` (m/s).
    pub axial: f64,
    /// Step in which the fastest transverse wave crosses one segment (s): longer ones smear it. Infinite where all is
    /// slack.
    pub transverse_step: f64,
    /// The same for axial waves (s).
    pub axial_step: f64,
}

/// Speeds on every rope that has a mass per length throughout.
pub(super) fn wave_speeds(net: &Net, motion: &Motion) -> Vec<WaveSpeeds> {
    let mut all = Vec::new();
    for (index, cable) in net.cables().iter().enumerate() {
        let has_mass = cable
            .segments
            .clone()
            .all(|e| net.segments()[e].section.mass_per_length > 0.0);
        let is_there = cable.segments.clone().all(|e| !motion.case.removed[e]);
        if !has_mass || !is_there {
            continue;
        }
        let mut speeds = WaveSpeeds {
            cable: CableId::new(index),
            transverse: [f64::INFINITY, 0.0],
            axial: 0.0,
            transverse_step: f64::INFINITY,
            axial_step: f64::INFINITY,
        };
        for e in cable.segments.clone() {
            let segment = &net.segments()[e];
            let (mass, stiffness) = (segment.section.mass_per_length, segment.section.axial_stiffness);
            let length = motion.case.unstressed_lengths[segment.length];
            let strain = segment.section.expansion * motion.case.segments[e].temperature_change;
            let stress_free = length * (1.0 + strain);
            let [from, to] = segment.ends.map(|end| motion.positions[end.index()]);
            let stretched = (to - from).norm();
            let tension = stiffness * (stretched / stress_free - 1.0).max(0.0);
            let slack = tension == 0.0;
            let transverse = if slack {
                0.0
            } else {
                (tension / mass * (length / stretched)).sqrt()
            };
            let axial = (stiffness / mass).sqrt();
            speeds.transverse = [
                speeds.transverse[0].min(transverse),
                speeds.transverse[1].max(transverse),
            ];
            speeds.axial = speeds.axial.max(axial);
            speeds.transverse_step = speeds.transverse_step.min(length / transverse);
            speeds.axial_step = speeds.axial_step.min(length / axial);
        }
        all.push(speeds);
    }
    all
}

/// A rope at one moment, along its unstressed length.
#[derive(Clone, Debug, PartialEq)]
pub struct RopeField {
    /// The rope.
    pub cable: CableId,
    /// Unstressed length from its start to every node of its path (m).
    pub material: Vec<f64>,
    /// Position of every node of its path (m).
    pub positions: Vec<Vector3<f64>>,
    /// Velocity of every node of its path (m/s).
    pub velocities: Vec<Vector3<f64>>,
    /// Length over stress-free length of every segment (–).
    pub stretches: Vec<f64>,
    /// Axial force of every segment (N).
    pub tensions: Vec<f64>,
}
