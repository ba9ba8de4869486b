//! Clamps and saddles: whether a rope slips, and how sharply it is bent.

use std::ops::Range;

use nalgebra::Vector3;

use super::judgement::{Covered, Judgement, LARGEST_RATIO, Lack, Measure};
use super::{CaseDigest, Clamp, Saddle, SaddleRadius, SaddleSlip};
use crate::model::{Net, NodeId, SegmentId};

/// Places in the path of each cable that is there at which it runs on through a node: the segments before and after.
fn passages<'a>(net: &'a Net, node: NodeId, digest: &'a CaseDigest) -> impl Iterator<Item = [usize; 2]> + 'a {
    let is_there = |segments: &[usize; 2]| !segments.iter().any(|s| digest.removed.contains(&SegmentId::new(*s)));
    let all = net.cables().iter().flat_map(move |cable| {
        let first = cable.segments.start;
        let inner: Range<usize> = 1..cable.path.len() - 1;
        inner
            .filter(move |place| cable.path[*place] == node)
            .map(move |place| [first + place - 1, first + place])
    });
    all.filter(is_there)
}

/// Unit vectors along a rope through a node, in path order: on the way in and on the way out.
fn directions(
    net: &Net,
    node: NodeId,
    [before, after]: [usize; 2],
    digest: &CaseDigest,
) -> Result<[Vector3<f64>; 2], Lack> {
    let at = |node: NodeId| digest.positions.get(node.index()).ok_or(Lack::State);
    let (previous, next) = (net.segments()[before].ends[0], net.segments()[after].ends[1]);
    if [previous, node, next].iter().any(|n| digest.loose_nodes.contains(n)) {
        return Err(Lack::Place);
    }
    let chords = [at(node)? - at(previous)?, at(next)? - at(node)?];
    if chords.iter().any(|chord| chord.norm() == 0.0) {
        return Err(Lack::Finite);
    }
    Ok(chords.map(|chord| chord.normalize()))
}

/// A clamp at a node, by the worst of the ropes that run on through it clamped.
///
/// ```text
/// |T2 − T1| ≤ (F_⊥ + F_r) μ / γ_M,fr
/// ```
///
/// with the tensions `T1`, `T2` of a rope before and behind the clamp, the clamp force `F_r` and the given share of the
/// force `F_⊥` across the rope that its change of direction makes.
///
/// # Reference
/// EN 1993-1-11:2006, 6.4 (from memory: verify).
pub(super) fn clamp(net: &Net, given: &Clamp, part: Covered, digest: &CaseDigest) -> Result<Judgement, Lack> {
    let Covered::Node(node) = part else {
        return Err(Lack::ClampedRope);
    };
    let mut worst: Option<Judgement> = None;
    let clamped = |[before, after]: &[usize; 2]| net.segments()[*before].length != net.segments()[*after].length;
    for passage in passages(net, node, digest).filter(clamped) {
        let [one, other] = passage.map(|segment| digest.axial_forces[segment]);
        let across = if given.deviation_share == 0.0 {
            0.0
        } else {
            let [way_in, way_out] = directions(net, node, passage, digest)?;
            let pull = other * way_out - one * way_in;
            let along = (way_in + way_out).try_normalize(0.0).ok_or(Lack::Finite)?;
            (pull - pull.dot(&along) * along).norm()
        };
        let grip = (given.deviation_share * across + given.clamp_force).max(0.0);
        let limit = grip * given.friction / given.gamma;
        let next = Judgement::at_most(part, Measure::TensionDifference, (other - one).abs(), limit)?
            .on(SegmentId::new(passage[usize::from(other > one)]));
        worst = Some(worst.map_or(next, |worst| worst.worse(next)));
    }
    worst.ok_or(Lack::ClampedRope)
}

/// A saddle at a node, by the worst of the ropes that run on over it, clamped or sliding.
pub(super) fn saddle(net: &Net, given: &Saddle, part: Covered, digest: &CaseDigest) -> Result<Judgement, Lack> {
    let Covered::Node(node) = part else {
        return Err(Lack::PassingRope);
    };
    let mut worst: Option<Judgement> = None;
    let mut add = |next: Judgement| worst = Some(worst.map_or(next, |worst| worst.worse(next)));
    for passage in passages(net, node, digest) {
        if let Some(radius) = &given.radius {
            add(bend(net, radius, part, passage)?);
        }
        if let Some(slip) = &given.slip {
            add(slips(net, slip, (part, node), passage, digest)?);
        }
    }
    worst.ok_or(Lack::PassingRope)
}

/// The radius wanted against the one given: a multiple of the diameter of the thicker side, and what the wires ask for.
fn bend(net: &Net, given: &SaddleRadius, part: Covered, passage: [usize; 2]) -> Result<Judgement, Lack> {
    let mut thickest = (0.0, passage[0]);
    for segment in passage {
        let diameter = net.segments()[segment].section.diameter.ok_or(Lack::Diameter)?;
        if diameter > thickest.0 {
            thickest = (diameter, segment);
        }
    }
    let wanted = (given.over_diameter * thickest.0).max(given.of_wires);
    Ok(Judgement::at_most(part, Measure::Radius, wanted, given.radius)?.on(SegmentId::new(thickest.1)))
}

/// ```text
/// F1 / F2 ≤ exp(μ α / γ_M,fr)
/// ```
///
/// with the larger and the smaller tension and the angle `α` by which the rope turns at the node.
///
/// # Reference
/// EN 1993-1-11:2006, 6.3 (from memory: verify).
fn slips(
    net: &Net,
    given: &SaddleSlip,
    (part, node): (Covered, NodeId),
    passage: [usize; 2],
    digest: &CaseDigest,
) -> Result<Judgement, Lack> {
    let [way_in, way_out] = directions(net, node, passage, digest)?;
    let angle = way_in.cross(&way_out).norm().atan2(way_in.dot(&way_out));
    let held = (given.friction * angle / given.gamma).exp();
    let [one, other] = passage.map(|segment| digest.axial_forces[segment]);
    let (larger, smaller) = (one.max(other), one.min(other));
    // Slack on both sides nothing pulls; on one side anything slips.
    let found = if larger <= 0.0 {
        1.0
    } else {
        (larger / smaller.max(0.0)).min(LARGEST_RATIO * held)
    };
    let segment = SegmentId::new(passage[usize::from(other > one)]);
    Ok(Judgement::at_most(part, Measure::TensionRatio, found, held)?.on(segment))
}
