//! Whether a motion makes sense, how large it is, and what its steps can not resolve.

use nalgebra::Vector3;

use super::explicit::explicit_divisions;
use super::record::sampled_steps;
use super::spectrum::LEAST_SAMPLES;
use super::system::{System, driven_case};
use super::waves::wave_speeds;
use super::{BreakWhen, Driven, Motion, MotionError, Scheme};
use crate::assembly::Structure;
use crate::load::Case;
use crate::model::{Area, CableId, Net, NodeId, SegmentId};

/// Steps allowed in one motion.
const MOST_STEPS: f64 = 1e8;

/// Bytes allowed for all frames of one motion.
const MOST_BYTES: f64 = 4e9;

/// Bytes allowed for the samples of one motion, which are kept to its end.
const MOST_SAMPLE_BYTES: f64 = 2.56e8;

/// Bytes of the ledger and other numbers of a frame.
const FRAME_BYTES: f64 = 80.0;

/// How large a motion is.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Extent {
    /// Steps as given.
    pub steps: u64,
    /// Steps in all, as many as stability needs where they are explicit; halved ones not foreseen.
    pub divided_steps: f64,
    /// Frames.
    pub frames: u64,
    /// Size of all frames in double precision (bytes).
    pub bytes: f64,
    /// Size of the samples for spectra, which are kept to the end, and of working out one of them (bytes).
    pub sample_bytes: f64,
    /// Largest stable explicit step (s).
    pub stable_step: f64,
}

/// What a step does not resolve. It is told, not refused.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Caution {
    /// A wave crosses a segment in less than one step.
    Wave {
        /// The rope.
        cable: CableId,
        /// Step as given (s).
        step: f64,
        /// Step that resolves transverse waves on it (s).
        needed: f64,
    },
    /// A history changes faster than the steps follow.
    History {
        /// Which driven load, from 0.
        driven: usize,
        /// Step as given (s).
        step: f64,
        /// Step that resolves it (s).
        needed: f64,
    },
}

fn number(what: &'static str, value: f64, is_right: bool, needed: &'static str) -> Result<(), MotionError> {
    if is_right {
        Ok(())
    } else {
        Err(MotionError::Number { what, value, needed })
    }
}

fn length(what: &'static str, given: usize, needed: usize, may_be_empty: bool) -> Result<(), MotionError> {
    if given == needed || (may_be_empty && given == 0) {
        Ok(())
    } else {
        Err(MotionError::WrongLength { what, given, needed })
    }
}

/// Everything that can be told before the net is put in motion.
pub(super) fn check_given(structure: &Structure, motion: &Motion) -> Result<(), MotionError> {
    let net = structure.net();
    let (nodes, segments) = (net.nodes().len(), net.segments().len());
    if let Some(reach) = net.reaches().iter().find(|reach| reach.slides()) {
        return Err(MotionError::Slides {
            segment: SegmentId::new(reach.segments.start),
        });
    }
    if let Some(hanging) = net.segments().iter().position(|segment| segment.hangs) {
        return Err(MotionError::Hangs {
            segment: SegmentId::new(hanging),
        });
    }
    length("positions", motion.positions.len(), nodes, false)?;
    length("velocities", motion.velocities.len(), nodes, true)?;
    length("dashpots", motion.damping.segments.len(), segments, true)?;
    let lengths = motion.reference.unstressed_lengths.len();
    length("reference lengths", lengths, net.n_lengths(), false)?;
    length("reference positions", motion.reference.positions.len(), nodes, false)?;
    crate::assembly::check_vectors("position", &motion.positions)?;
    crate::assembly::check_vectors("velocity", &motion.velocities)?;
    if let Some(settled) = &motion.settled {
        length("settled positions", settled.positions.len(), nodes, false)?;
        length("settled forces", settled.axial_forces.len(), segments, false)?;
    }
    let positive = |value: f64| value > 0.0 && value.is_finite();
    let not_negative = |value: f64| value >= 0.0 && value.is_finite();
    number("duration", motion.duration, positive(motion.duration), "positive")?;
    number("step", motion.step, positive(motion.step), "positive")?;
    let within = motion.step <= motion.duration;
    number("step", motion.step, within, "no longer than the duration")?;
    let damping = &motion.damping;
    number(
        "damping by mass",
        damping.mass,
        not_negative(damping.mass),
        "zero or more",
    )?;
    number(
        "damping by stiffness",
        damping.stiffness,
        not_negative(damping.stiffness),
        "zero or more",
    )?;
    for c in &damping.segments {
        number("dashpot of a segment", *c, not_negative(*c), "zero or more")?;
    }
    check_added(net, motion)?;
    if let Scheme::GeneralisedAlpha { spectral_radius, .. } = motion.scheme {
        let within = (0.0..=1.0).contains(&spectral_radius);
        number("spectral radius", spectral_radius, within, "0 to 1")?;
    }
    if let Some(error) = motion.scheme.allowed_error() {
        number("error of a step", error, positive(error), "positive")?;
    }
    for (node, velocity) in motion.velocities.iter().enumerate() {
        let node = NodeId::new(node);
        let free = structure.dofs().directions(node);
        let along_free: Vector3<f64> = free.iter().map(|d| d * d.dot(velocity)).sum();
        if (velocity - along_free).norm() > 1e-12 * velocity.norm() {
            return Err(MotionError::HeldVelocity { node });
        }
    }
    check_spectra(motion)?;
    check_frames(net, motion)?;
    check_driven(net, motion)?;
    check_breaks(net, motion)
}

fn check_added(net: &Net, motion: &Motion) -> Result<(), MotionError> {
    let given = &motion.masses;
    let in_range = |what, index: usize, present: usize| {
        if index < present {
            Ok(())
        } else {
            Err(MotionError::NoPlaceForMass { what, index, present })
        }
    };
    for (node, _) in &given.nodes {
        in_range("node", node.index(), net.nodes().len())?;
    }
    for (segment, _) in &given.segments {
        in_range("segment", segment.index(), net.segments().len())?;
    }
    for area in given.areas.iter().flat_map(|(on, _)| on) {
        match *area {
            Area::Skin(skin) => in_range("skin", skin, net.skins().len())?,
            Area::Zone(zone) => in_range("zone", zone, net.zones().len())?,
        }
    }
    let values = (given.nodes.iter().map(|(_, mass)| mass))
        .chain(given.segments.iter().map(|(_, mass)| mass))
        .chain(given.areas.iter().map(|(_, mass)| mass))
        .chain([&given.air]);
    for mass in values {
        number("added mass", *mass, *mass >= 0.0 && mass.is_finite(), "zero or more")?;
    }
    Ok(())
}

fn check_spectra(motion: &Motion) -> Result<(), MotionError> {
    let Some(given) = &motion.spectra else {
        return Ok(());
    };
    if motion.watched.is_empty() {
        return Err(MotionError::NothingWatched);
    }
    let within = given.from >= 0.0 && given.from < motion.duration;
    let needed = "zero or more, and before the end of the motion";
    number("beginning of spectra", given.from, within, needed)?;
    if let Some(limit) = given.up_to {
        let within = limit > 0.0 && limit <= 0.5 / motion.step * (1.0 + 1e-9);
        let needed = "positive, and at most the Nyquist frequency 1/(2 step)";
        number("highest frequency of spectra", limit, within, needed)?;
    }
    let samples = sampled_steps(motion).map_or(0, |[first, last]| (last + 1).saturating_sub(first));
    if samples < LEAST_SAMPLES {
        return Err(MotionError::TooFewSamples {
            from: given.from,
            samples,
            least: LEAST_SAMPLES,
        });
    }
    Ok(())
}

fn check_frames(net: &Net, motion: &Motion) -> Result<(), MotionError> {
    let nodes = motion.frames.nodes.iter().map(|node| node.index());
    let cables = motion.frames.cables.iter().map(|cable| cable.index());
    let outside = |what, index, present| Err(MotionError::NotShown { what, index, present });
    if let Some(index) = nodes.into_iter().find(|index| *index >= net.nodes().len()) {
        return outside("node", index, net.nodes().len());
    }
    match cables.into_iter().find(|index| *index >= net.cables().len()) {
        Some(index) => outside("cable", index, net.cables().len()),
        None => Ok(()),
    }
}

fn check_driven(net: &Net, motion: &Motion) -> Result<(), MotionError> {
    for (place, driven) in motion.driven.iter().enumerate() {
        let history = match driven {
            Driven::Case { history, .. } | Driven::Wind { speed: history, .. } => history,
        };
        history
            .check()
            .map_err(|error| MotionError::History { driven: place, error })?;
        let refuse = |what| Err(MotionError::Driven { driven: place, what });
        match driven {
            Driven::Case { case, .. } => {
                length("driven forces", case.nodal_forces.len(), net.nodes().len(), false)?;
                let movements = case.support_movements.len();
                length("driven support movements", movements, net.nodes().len(), false)?;
                length("driven pressures", case.pressures.len(), net.panels().len(), true)?;
                crate::assembly::check_vectors("force", &case.nodal_forces)?;
                crate::assembly::check_vectors("movement", &case.support_movements)?;
                if case.segments.iter().any(|segment| segment.temperature_change != 0.0) {
                    return refuse("temperatures");
                }
                if case.unstressed_lengths != motion.reference.unstressed_lengths {
                    return refuse("unstressed lengths");
                }
                if case.removed.iter().any(|removed| *removed) {
                    return refuse("which members are there");
                }
                if moves_supports(case) {
                    if history.first_jump(motion.duration).is_some() {
                        return refuse("where supports are by a jump");
                    }
                    if history.at_start() != 0.0 {
                        return refuse("where supports are at the start: its factor must begin at zero, which");
                    }
                }
            }
            Driven::Wind {
                coefficients,
                density,
                along,
                ..
            } => {
                length("wind coefficients", coefficients.len(), net.panels().len(), false)?;
                for c in coefficients {
                    number("wind coefficient", *c, c.is_finite(), "finite")?;
                }
                let is_density = *density > 0.0 && density.is_finite();
                number("density of air", *density, is_density, "positive")?;
                let norm = along.norm();
                number("length of the wind's direction", norm, (norm - 1.0).abs() < 1e-9, "1")?;
            }
        }
    }
    let moving = motion.driven.iter().filter_map(driven_case).any(moves_supports);
    if moving && motion.damping.stiffness > 0.0 {
        return Err(MotionError::DampedGround);
    }
    Ok(())
}

pub(super) fn moves_supports(case: &Case) -> bool {
    case.support_movements.iter().any(|m| *m != Vector3::zeros())
}

fn check_breaks(net: &Net, motion: &Motion) -> Result<(), MotionError> {
    let mut broken = vec![false; net.segments().len()];
    for (place, given) in motion.breaks.iter().enumerate() {
        if given.segments.is_empty() {
            return Err(MotionError::NothingBreaks { place });
        }
        let is_removed = |e: usize| motion.case.removed.get(e).is_some_and(|removed| *removed);
        for segment in given.segments.iter().copied() {
            match broken.get_mut(segment.index()) {
                None => return Err(MotionError::NotThere { place, segment }),
                Some(_) if is_removed(segment.index()) => return Err(MotionError::NotThere { place, segment }),
                Some(true) => return Err(MotionError::BrokenTwice { place, segment }),
                Some(mark) => *mark = true,
            }
        }
        let release = given.release >= 0.0 && given.release.is_finite();
        number("release of a break", given.release, release, "zero or more")?;
        match given.when {
            BreakWhen::Time(t) => {
                let within = (0.0..motion.duration).contains(&t);
                number("time of a break", t, within, "zero or more, and before the end")?;
            }
            BreakWhen::Tension(t) => number("tension of a break", t, t > 0.0 && t.is_finite(), "positive")?,
        }
    }
    Ok(())
}

/// What can be told once masses are known.
pub(super) fn check_masses(system: &System) -> Result<(), MotionError> {
    for dof in 0..system.structure.n_dofs() {
        let node = system.structure.dofs().node(dof);
        let mass = system.inertia.least(node.index());
        if !(mass > 0.0 && mass.is_finite()) {
            return Err(MotionError::NoMass { node });
        }
    }
    // Air across a skin would pass on the inertia of a support that moves to directions in which its node is free.
    let held = system
        .structure
        .net()
        .supports()
        .iter()
        .filter(|_| system.supports_move);
    for support in held.filter(|support| system.moves(support.node())) {
        let mass = system.inertia.of_node(support.node().index());
        let is_coupled =
            |held: &Vector3<f64>, free: &Vector3<f64>| held.dot(&(mass * free)).abs() > 1e-12 * mass.norm();
        if (support.held().iter()).any(|held| support.free().iter().any(|free| is_coupled(held, free))) {
            return Err(MotionError::AirAtMovingSupport { node: support.node() });
        }
    }
    Ok(())
}

/// How large the motion is.
#[allow(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "beyond u64 it saturates, and is refused"
)]
pub(super) fn extent(system: &System) -> Extent {
    let motion = &system.motion;
    let steps = (motion.duration / motion.step - 1e-9).ceil().max(1.0);
    let divided = match motion.scheme {
        Scheme::CentralDifferences => explicit_divisions(system),
        _ => 1.0,
    };
    let stride = motion.frames.stride;
    let frames = match stride {
        0 => 2.0,
        stride => (steps / stride as f64).ceil() + 1.0,
    };
    let net = system.structure.net();
    let along: usize = (motion.frames.cables.iter())
        .map(|cable| {
            let n = net.cables()[cable.index()].segments.len();
            7 * (n + 1) + 2 * n
        })
        .sum();
    let values = (6 * motion.frames.nodes.len() + along + motion.watched.len()) as f64;
    let samples = sampled_steps(motion).map_or(0, |[first, last]| (last + 1).saturating_sub(first));
    Extent {
        steps: steps as u64,
        divided_steps: steps * divided,
        frames: frames as u64,
        bytes: frames * (FRAME_BYTES + 8.0 * values),
        // The spectra have half as many numbers; a transform works on complex numbers, with as much room beside them.
        sample_bytes: samples as f64 * (12.0 * motion.watched.len() as f64 + 64.0),
        stable_step: system.stable_step(),
    }
}

/// Refuses what would never end.
pub(super) fn check_extent(extent: &Extent) -> Result<(), MotionError> {
    if extent.sample_bytes > MOST_SAMPLE_BYTES {
        return Err(MotionError::TooManySamples {
            bytes: extent.sample_bytes,
            most: MOST_SAMPLE_BYTES,
        });
    }
    // What is not a number is refused as well.
    if extent.divided_steps <= MOST_STEPS && extent.bytes <= MOST_BYTES {
        return Ok(());
    }
    Err(MotionError::TooLarge {
        steps: extent.divided_steps,
        bytes: extent.bytes,
        most_steps: MOST_STEPS,
        most_bytes: MOST_BYTES,
    })
}

/// What the steps can not resolve.
pub(super) fn cautions(net: &Net, motion: &Motion) -> Vec<Caution> {
    let step = motion.step;
    let mut all = Vec::new();
    for speeds in wave_speeds(net, motion) {
        if speeds.transverse_step < step {
            all.push(Caution::Wave {
                cable: speeds.cable,
                step,
                needed: speeds.transverse_step,
            });
        }
    }
    for (place, driven) in motion.driven.iter().enumerate() {
        let (Driven::Case { history, .. } | Driven::Wind { speed: history, .. }) = driven;
        // Times of a table are rounded.
        if let Some(needed) = history.finest().filter(|needed| *needed * (1.0 + 1e-9) < step) {
            all.push(Caution::History {
                driven: place,
                step,
                needed,
            });
        }
    }
    all
}
