//! What each anchor must take.

use nalgebra::Vector3;
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::Plan;
use ropewalk_numerics::check::{AnchorExtremes, AnchorPull};

use super::parts::{count, fitting};
use super::verdicts::case_name;

/// Share of the largest pull below which a vertical part is noise.
const NOISE: f64 = 1e-3;

/// The anchors in node order, as many as fit.
pub(super) fn sheet(plan: &Plan, anchors: &[AnchorExtremes]) -> v1::AnchorSheet {
    v1::AnchorSheet {
        anchors: fitting(anchors.iter().map(|anchor| forces(plan, anchor))),
        total: count(anchors.len()),
    }
}

fn forces(plan: &Plan, anchor: &AnchorExtremes) -> v1::AnchorForces {
    let noise = NOISE * anchor.largest.force.norm();
    v1::AnchorForces {
        node: plan.brief().net.node_name(anchor.node).to_owned(),
        largest: Some(pull(plan, &anchor.largest)),
        most_horizontal: Some(pull(plan, &anchor.most_horizontal)),
        most_up: Some(pull(plan, &anchor.most_up)),
        most_down: Some(pull(plan, &anchor.most_down)),
        reverses: anchor.most_up.force.z > noise && anchor.most_down.force.z < -noise,
    }
}

fn pull(plan: &Plan, pull: &AnchorPull) -> v1::AnchorPull {
    // Zero stays zero: a force of -0 would read oddly, and turn its angle round.
    let force = pull.force + Vector3::zeros();
    let horizontal = force.xy().norm();
    v1::AnchorPull {
        case: case_name(plan.brief(), pull.case).to_owned(),
        x_n: force.x,
        y_n: force.y,
        up_n: force.z,
        horizontal_n: horizontal,
        size_n: force.norm(),
        plan_angle_deg: force.y.atan2(force.x).to_degrees(),
        up_angle_deg: force.z.atan2(horizontal).to_degrees(),
    }
}
