//! Checks as they are given.

use nalgebra::Vector3;

use super::Covered;
use crate::model::{CableId, NodeId, StrutId};

/// What is checked.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum CheckKind {
    /// Largest tension times `factor` against the breaking force.
    Safety {
        /// Wanted factor, at least 1.
        factor: f64,
    },
    /// Largest tension against `F_Rd = min(F_uk / (d γ_R), F_k / γ_R)`; without a proof force its term is left out.
    Resistance {
        /// Partial factor `γ_R` (–).
        gamma_r: f64,
        /// Divisor `d` of the characteristic breaking force beside `γ_R` (–).
        strength_divisor: f64,
    },
    /// Largest tension against a share of the characteristic breaking force.
    ShareOfStrength {
        /// The share (–), positive.
        share: f64,
        /// When it holds.
        stage: Stage,
    },
    /// Least tension against a share of the tension in the reference state.
    Slackness {
        /// Wanted share, from 0 to less than 1.
        min_share_of_reference: f64,
    },
    /// Largest compression of a strut against Euler's critical force over a safety.
    Buckling {
        /// Buckling length over the length in the reference state (–).
        length_factor: f64,
        /// Wanted safety (–).
        safety: f64,
        /// Distance of the force from the axis at both ends, to the same side (m): gives the moment that comes of it.
        eccentricity: Option<f64>,
    },
    /// Distance of a node from where it was.
    Movement {
        /// Limit.
        limit: MovementLimit,
        /// The case whose state it is measured from, by index; `None`: the reference state.
        from: Option<usize>,
    },
    /// Distance of a point from the covered members and panels.
    Clearance(Clearance),
    /// Force on a support.
    AnchorPull(PullLimits),
    /// Difference of tension of a rope across a node at which it is clamped, against what the clamp holds.
    Clamp(Clamp),
    /// Radius and slip of a rope over a saddle.
    Saddle(Saddle),
    /// Fall of panels, in the reference state too.
    Drainage {
        /// Wanted slope of the steepest line (m per m).
        least_fall: f64,
    },
}

/// When a limit of stress holds.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Stage {
    /// In use.
    Service,
    /// While the net is built.
    Construction,
}

/// How far a node may move.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum MovementLimit {
    /// So far (m).
    Length(f64),
    /// A part of the distance of two nodes in the reference state.
    OfChord {
        /// The two nodes.
        between: [NodeId; 2],
        /// What the distance is divided by (–).
        divided_by: f64,
    },
}

/// A point to keep clear of.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Clearance {
    /// The point (m).
    pub point: Vector3<f64>,
    /// Wanted distance (m).
    pub least: f64,
    /// `None`: the true distance. Else the height above or below the point, whichever it is in the reference state, of
    /// panels over it and of members not farther in plan than this (m).
    pub height_within: Option<f64>,
}

/// Limits on the pull on an anchor; those that are `None` are not looked at.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct PullLimits {
    /// Of its size (N).
    pub resultant: Option<f64>,
    /// Of its horizontal part (N).
    pub horizontal: Option<f64>,
    /// Of its upward part (N).
    pub uplift: Option<f64>,
    /// Least and largest angle above the horizontal (rad).
    pub up_angle: Option<[f64; 2]>,
    /// Direction in plan, from x towards y, and the largest angle off it (rad).
    pub plan_angle: Option<[f64; 2]>,
}

/// A clamp at a node.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Clamp {
    /// Force with which the clamp grips the rope, `F_r` (N).
    pub clamp_force: f64,
    /// Friction coefficient `μ` (–).
    pub friction: f64,
    /// Partial factor of friction `γ_M,fr` (–).
    pub gamma: f64,
    /// Share of the rope's deviation force that presses it into the clamp (–): 1 where the ropes of a crossing press
    /// on each other, −1 where they pull apart, 0 where it does not count.
    pub deviation_share: f64,
}

/// A saddle at a node.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Saddle {
    /// Its radius, if it is to be checked.
    pub radius: Option<SaddleRadius>,
    /// Its grip, if it is to be checked.
    pub slip: Option<SaddleSlip>,
}

/// Radius of a saddle and what it must be.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SaddleRadius {
    /// The radius (m).
    pub radius: f64,
    /// Least radius over rope diameter (–).
    pub over_diameter: f64,
    /// Least radius that the wires ask for (m); zero: not looked at.
    pub of_wires: f64,
}

/// Grip of a saddle.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SaddleSlip {
    /// Friction coefficient `μ` (–).
    pub friction: f64,
    /// Partial factor of friction `γ_M,fr` (–).
    pub gamma: f64,
}

/// A check over members and cases.
#[derive(Clone, Debug, PartialEq)]
pub struct Check {
    /// What is checked.
    pub kind: CheckKind,
    /// Cables it covers.
    pub cables: Vec<CableId>,
    /// Struts it covers.
    pub struts: Vec<StrutId>,
    /// Nodes it covers.
    pub nodes: Vec<NodeId>,
    /// Panels it covers, by index.
    pub panels: Vec<usize>,
    /// Cases it covers, by index; design effects are counted on from the last case, see `brief::Brief`.
    pub cases: Vec<usize>,
}

impl Check {
    /// The parts that are judged: cables, then struts, then nodes, then panels; of a clearance the point alone.
    #[must_use]
    pub fn covered(&self) -> Vec<Covered> {
        if matches!(self.kind, CheckKind::Clearance(_)) {
            return vec![Covered::Point];
        }
        (self.cables.iter().map(|cable| Covered::Cable(*cable)))
            .chain(self.struts.iter().map(|strut| Covered::Strut(*strut)))
            .chain(self.nodes.iter().map(|node| Covered::Node(*node)))
            .chain(self.panels.iter().map(|panel| Covered::Panel(*panel)))
            .collect()
    }

    /// Whether the reference state is judged beside the cases.
    #[must_use]
    pub fn judges_reference(&self) -> bool {
        matches!(self.kind, CheckKind::Drainage { .. })
    }
}
