//! Quantities that are watched at every step.

use nalgebra::Vector3;

use super::system::{Moment, System};
use super::{Motion, MotionError};
use crate::model::{NodeId, SegmentId};

/// A quantity to be watched. Each direction is a unit vector.
#[derive(Clone, Debug, PartialEq)]
pub enum Watched {
    /// Movement of a node from the start (m).
    Movement {
        /// The node.
        node: NodeId,
        /// Direction in which it counts.
        along: Vector3<f64>,
    },
    /// Velocity of a node (m/s); along held directions that of its support, the mean over the step.
    Velocity {
        /// The node.
        node: NodeId,
        /// Direction in which it counts.
        along: Vector3<f64>,
    },
    /// Acceleration of a node (m/s²): what the forces on it at that moment make of its mass, in every scheme. Along held
    /// directions that of its support, without what a kink of its history does at once.
    Acceleration {
        /// The node.
        node: NodeId,
        /// Direction in which it counts.
        along: Vector3<f64>,
    },
    /// Axial force of a segment (N), tension positive, without dashpots.
    AxialForce {
        /// The segment.
        segment: SegmentId,
    },
    /// Largest axial force of several segments (N).
    LargestForce {
        /// The segments, at least one.
        segments: Vec<SegmentId>,
    },
    /// Force of a support, rigid or elastic, on the net (N): all that the support does, damping and the inertia of a
    /// moving support among it.
    ///
    /// It follows from the state at the end of a step, and is as exact as that, in every scheme: also with the conserving
    /// scheme, whose own forces are means over the steps. Explicit differences damp by the velocity foreseen at the start of a
    /// step: what damping by mass and stiffness adds here is by that at its end.
    SupportForce {
        /// The supported node.
        node: NodeId,
        /// Direction in which it counts.
        along: Vector3<f64>,
    },
}

impl Watched {
    /// Its value at a moment.
    pub(super) fn value(&self, system: &System, moment: &Moment<'_>) -> f64 {
        let axial = |segment: &SegmentId| system.axial_force(&moment.state.positions, segment.index());
        match self {
            Self::Movement { node, along } => {
                let start = system.motion.positions[node.index()];
                (moment.state.positions[node.index()] - start).dot(along)
            }
            Self::Velocity { node, along } => system.velocity(*node, moment.state).dot(along),
            Self::Acceleration { node, along } => system.acceleration(*node, moment).dot(along),
            Self::AxialForce { segment } => axial(segment),
            Self::LargestForce { segments } => segments.iter().map(axial).fold(f64::NEG_INFINITY, f64::max),
            Self::SupportForce { node, along } => system.support_force(*node, moment).dot(along),
        }
    }
}

/// Whether all that is watched is there.
pub(super) fn check_watched(system: &System) -> Result<(), MotionError> {
    let motion: &Motion = &system.motion;
    let net = system.structure.net();
    for (place, watched) in motion.watched.iter().enumerate() {
        let refuse = |what| Err(MotionError::Watched { place, what });
        let (node, segments): (Option<(&NodeId, &Vector3<f64>)>, &[SegmentId]) = match watched {
            Watched::Movement { node, along }
            | Watched::Velocity { node, along }
            | Watched::Acceleration { node, along }
            | Watched::SupportForce { node, along } => (Some((node, along)), &[]),
            Watched::AxialForce { segment } => (None, std::slice::from_ref(segment)),
            Watched::LargestForce { segments } if segments.is_empty() => return refuse("names no segments"),
            Watched::LargestForce { segments } => (None, segments),
        };
        if let Some((node, along)) = node {
            if node.index() >= net.nodes().len() {
                return refuse("names a node that is not in the net");
            }
            // What is not a number is refused as well.
            let is_unit = (along.norm() - 1.0).abs() < 1e-9;
            if !is_unit {
                return refuse("has a direction that is not a unit vector");
            }
        }
        if segments.iter().any(|segment| segment.index() >= net.segments().len()) {
            return refuse("names a segment that is not in the net");
        }
        if let Watched::SupportForce { node, .. } = watched
            && system.supported().binary_search(node).is_err()
        {
            return refuse("asks for the force of a support at a node that has none");
        }
    }
    Ok(())
}
