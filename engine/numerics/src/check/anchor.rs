//! Anchors: limits on the pull, and the largest pulls with everything that acts in the same case.

use nalgebra::Vector3;

use super::judgement::{Covered, Judgement, Lack, Measure};
use super::{CaseDigest, PullLimits};
use crate::model::NodeId;

/// Share of the limits of a pull below which its direction is noise.
const NO_DIRECTION: f64 = 1e-9;

/// The worst of the limits given on the pull on an anchor, the opposite of the support force.
pub(super) fn pull(limits: &PullLimits, part: Covered, digest: &CaseDigest) -> Result<Judgement, Lack> {
    let Covered::Node(node) = part else {
        return Err(Lack::Support);
    };
    let force = -digest.support_forces[node.index()].ok_or(Lack::Support)?;
    let mut worst: Option<Judgement> = None;
    let mut add = |judgement: Judgement| worst = Some(worst.map_or(judgement, |worst| worst.worse(judgement)));
    let horizontal = force.xy().norm();
    for (measure, demand, limit) in [
        (Measure::Pull, force.norm(), limits.resultant),
        (Measure::HorizontalPull, horizontal, limits.horizontal),
        (Measure::Uplift, force.z.max(0.0), limits.uplift),
    ] {
        if let Some(limit) = limit {
            add(Judgement::at_most(part, measure, demand, limit)?);
        }
    }
    let largest_force = digest
        .axial_forces
        .iter()
        .fold(0.0_f64, |most, force| most.max(force.abs()));
    let has_direction = |size: f64| size > NO_DIRECTION * largest_force;
    if let Some([least, largest]) = limits.up_angle {
        let angle = if has_direction(force.norm()) {
            force.z.atan2(horizontal)
        } else {
            0.5 * (least + largest)
        };
        let off = (angle - 0.5 * (least + largest)) / (0.5 * (largest - least));
        let limit = if off < 0.0 { least } else { largest };
        let passes = (least..=largest).contains(&angle);
        add(Judgement::with_ratio(
            part,
            Measure::UpAngle,
            angle,
            limit,
            off.abs(),
            passes,
        )?);
    }
    if let Some([direction, within]) = limits.plan_angle {
        let off = if has_direction(horizontal) {
            let (sin, cos) = (force.y.atan2(force.x) - direction).sin_cos();
            sin.atan2(cos).abs()
        } else {
            0.0
        };
        add(Judgement::at_most(part, Measure::PlanAngle, off, within)?);
    }
    worst.ok_or(Lack::Support)
}

/// The whole pull on an anchor in one case: its parts act together.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct AnchorPull {
    /// Force on the anchor, global axes (N).
    pub force: Vector3<f64>,
    /// The case, by index; `None` stands for the reference state.
    pub case: Option<usize>,
}

/// The pulls on an anchor that its foundation is designed for, each with all of its parts.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct AnchorExtremes {
    /// The supported node.
    pub node: NodeId,
    /// The largest pull.
    pub largest: AnchorPull,
    /// The one with the largest horizontal part.
    pub most_horizontal: AnchorPull,
    /// The one that lifts most, or presses least.
    pub most_up: AnchorPull,
    /// The one that presses most, or lifts least.
    pub most_down: AnchorPull,
}

/// Anchors on their way through the cases, whatever their order and number.
#[derive(Clone, Debug)]
pub struct AnchorTally(Vec<AnchorExtremes>);

impl AnchorTally {
    /// Anchors in the reference state alone. `support_forces`: node and force on the net (N), in result order.
    #[must_use]
    pub fn new(support_forces: impl IntoIterator<Item = (NodeId, Vector3<f64>)>) -> Self {
        let alone = |(node, force): (NodeId, Vector3<f64>)| {
            let pull = AnchorPull {
                force: -force,
                case: None,
            };
            AnchorExtremes {
                node,
                largest: pull,
                most_horizontal: pull,
                most_up: pull,
                most_down: pull,
            }
        };
        Self(support_forces.into_iter().map(alone).collect())
    }

    /// Takes in a case; one without a sound answer is not looked at.
    pub fn add(&mut self, case: usize, digest: &CaseDigest) {
        if !digest.is_sound() {
            return;
        }
        for anchor in &mut self.0 {
            let Some(force) = digest.support_forces[anchor.node.index()] else {
                continue;
            };
            let pull = AnchorPull {
                force: -force,
                case: Some(case),
            };
            take(&mut anchor.largest, pull, |pull| pull.norm());
            take(&mut anchor.most_horizontal, pull, |pull| pull.xy().norm());
            take(&mut anchor.most_up, pull, |pull| pull.z);
            take(&mut anchor.most_down, pull, |pull| -pull.z);
        }
    }

    /// One entry an anchor, in the order given.
    #[must_use]
    pub fn finish(self) -> Vec<AnchorExtremes> {
        self.0
    }
}

/// Keeps the larger of two, of equals the reference state, then the first case of the brief.
fn take(most: &mut AnchorPull, next: AnchorPull, value: impl Fn(&Vector3<f64>) -> f64) {
    let (so_far, new) = (value(&most.force), value(&next.force));
    if new > so_far || (new == so_far && next.case < most.case) {
        *most = next;
    }
}
