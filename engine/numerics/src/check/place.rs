//! Places: movement, clearance, fall of panels.

use nalgebra::{Vector2, Vector3};

use super::judgement::{Covered, Judgement, Lack, Measure};
use super::{Against, CaseDigest, Check, Clearance, MovementLimit};
use crate::model::{NodeId, SegmentId, fan};

/// Slopes are not told beyond this (m per m): a panel that stands upright has none.
const STEEPEST: f64 = 1e6;

/// A node against a limit of movement.
pub(super) fn movement(
    against: &Against<'_>,
    limit: MovementLimit,
    from: Option<usize>,
    part: Covered,
    digest: &CaseDigest,
) -> Result<Judgement, Lack> {
    let Covered::Node(node) = part else {
        return Err(Lack::Place);
    };
    if digest.loose_nodes.contains(&node) {
        return Err(Lack::Place);
    }
    let moved = match from {
        None => digest.displacements[node.index()].norm(),
        Some(case) => {
            let base = against.bases.iter().find(|base| base.case == case);
            let base = base.map(|base| &base.digest).filter(|digest| digest.is_sound());
            let base = base.ok_or(Lack::Base)?;
            if base.loose_nodes.contains(&node) {
                return Err(Lack::Place);
            }
            let at = |digest: &CaseDigest| digest.positions.get(node.index()).copied().ok_or(Lack::State);
            (at(digest)? - at(base)?).norm()
        }
    };
    let limit = match limit {
        MovementLimit::Length(limit) => limit,
        MovementLimit::OfChord { between, divided_by } => {
            let [from, to] = between.map(|node| against.positions[node.index()]);
            (to - from).norm() / divided_by
        }
    };
    Judgement::at_most(part, Measure::Movement, moved, limit)
}

/// The piece of the net that comes nearest to a point. Ropes are taken straight between their nodes, panels as triangles
/// about the mean of their corners.
pub(super) fn clearance(
    against: &Against<'_>,
    check: &Check,
    given: &Clearance,
    digest: &CaseDigest,
) -> Result<Judgement, Lack> {
    if digest.positions.is_empty() {
        return Err(Lack::State);
    }
    let net = against.net;
    let measure = if given.height_within.is_some() {
        Measure::Height
    } else {
        Measure::Distance
    };
    let is_loose = |nodes: &[NodeId]| nodes.iter().any(|node| digest.loose_nodes.contains(node));
    let mut loose = false;
    let mut nearest: Option<(f64, Option<SegmentId>, Option<usize>)> = None;
    let mut take = |clear: Option<f64>, segment, panel| {
        if let Some(clear) = clear.filter(|clear| nearest.is_none_or(|(least, ..)| *clear < least)) {
            nearest = Some((clear, segment, panel));
        }
    };
    let cables = check
        .cables
        .iter()
        .flat_map(|cable| net.cables()[cable.index()].segments.clone());
    let struts = check
        .struts
        .iter()
        .map(|strut| net.struts()[strut.index()].segment.index());
    let is_there = |index: &usize| !digest.removed.contains(&SegmentId::new(*index));
    for index in cables.chain(struts).filter(is_there) {
        let ends = net.segments()[index].ends;
        if is_loose(&ends) {
            loose = true;
            continue;
        }
        let [now, before] =
            [&digest.positions[..], against.positions].map(|places| ends.map(|end| places[end.index()]));
        take(to_segment(given, &now, &before), Some(SegmentId::new(index)), None);
    }
    for panel in &check.panels {
        let corners = &net.panels()[*panel].corners;
        if is_loose(corners) {
            loose = true;
            continue;
        }
        let places = |positions: &[Vector3<f64>]| corners.iter().map(|c| positions[c.index()]).collect::<Vec<_>>();
        let (now, before) = (triangles(&places(&digest.positions)), places(against.positions));
        let above = middle(&before).z >= given.point.z;
        let clear = now.iter().filter_map(|triangle| to_triangle(given, triangle, above));
        take(clear.reduce(f64::min), None, Some(*panel));
    }
    let lack = if loose { Lack::Place } else { Lack::Over };
    let (clear, segment, panel) = nearest.ok_or(lack)?;
    let judgement = Judgement::at_least(Covered::Point, measure, clear, given.least)?;
    // A piece that hangs anywhere could come nearer.
    if loose && judgement.passes {
        return Err(Lack::Place);
    }
    Ok(Judgement {
        segment,
        panel,
        ..judgement
    })
}

fn to_segment(given: &Clearance, now: &[Vector3<f64>; 2], before: &[Vector3<f64>; 2]) -> Option<f64> {
    match given.height_within {
        None => Some((on_segment(now, &given.point) - given.point).norm()),
        Some(within) => {
            let over = on_segment_in_plan(now, &given.point);
            let above = on_segment_in_plan(before, &given.point).z >= given.point.z;
            let near = (over - given.point).xy().norm() <= within;
            near.then(|| height(over.z - given.point.z, above))
        }
    }
}

fn to_triangle(given: &Clearance, triangle: &[Vector3<f64>; 3], above: bool) -> Option<f64> {
    match given.height_within {
        None => Some((on_triangle(triangle, &given.point) - given.point).norm()),
        Some(_) => Some(height(height_over(triangle, &given.point.xy())? - given.point.z, above)),
    }
}

fn height(over: f64, above: bool) -> f64 {
    if above { over } else { -over }
}

fn on_segment([a, b]: &[Vector3<f64>; 2], point: &Vector3<f64>) -> Vector3<f64> {
    let chord = b - a;
    let square = chord.norm_squared();
    let share = if square > 0.0 {
        (point - a).dot(&chord) / square
    } else {
        0.0
    };
    a + share.clamp(0.0, 1.0) * chord
}

/// The place of a segment that is nearest in plan; of an upright one the place at the height of the point.
fn on_segment_in_plan(ends @ [a, b]: &[Vector3<f64>; 2], point: &Vector3<f64>) -> Vector3<f64> {
    let chord = b - a;
    let square = chord.xy().norm_squared();
    if square <= 1e-24 * chord.norm_squared() {
        return on_segment(ends, point);
    }
    let share = (point - a).xy().dot(&chord.xy()) / square;
    a + share.clamp(0.0, 1.0) * chord
}

/// The nearest place of a triangle: the foot of the plumb line on its plane, where that lies inside, else on an edge.
fn on_triangle(corners @ [a, b, c]: &[Vector3<f64>; 3], point: &Vector3<f64>) -> Vector3<f64> {
    let normal = (b - a).cross(&(c - a));
    let square = normal.norm_squared();
    if square > 0.0 {
        let foot = point - (point - a).dot(&normal) / square * normal;
        let inside = |i: usize| {
            let (from, to) = (corners[i], corners[(i + 1) % 3]);
            (to - from).cross(&(foot - from)).dot(&normal) >= 0.0
        };
        if (0..3).all(inside) {
            return foot;
        }
    }
    let edges = [[*a, *b], [*b, *c], [*c, *a]].map(|edge| on_segment(&edge, point));
    let distance = |place: &Vector3<f64>| (place - point).norm();
    edges.into_iter().fold(
        *a,
        |best, next| if distance(&next) < distance(&best) { next } else { best },
    )
}

/// Height of a triangle at a place in plan, where it covers that.
fn height_over([a, b, c]: &[Vector3<f64>; 3], plan: &Vector2<f64>) -> Option<f64> {
    let (u, v, w) = ((b - a).xy(), (c - a).xy(), plan - a.xy());
    let area = u.perp(&v);
    if area == 0.0 {
        return None;
    }
    let (s, t) = (w.perp(&v) / area, u.perp(&w) / area);
    (s >= 0.0 && t >= 0.0 && s + t <= 1.0).then(|| a.z + s * (b.z - a.z) + t * (c.z - a.z))
}

fn middle(corners: &[Vector3<f64>]) -> Vector3<f64> {
    corners.iter().sum::<Vector3<f64>>() / corners.len() as f64
}

/// A panel as triangles: itself, or those between its edges and the mean of its corners.
fn triangles(corners: &[Vector3<f64>]) -> Vec<[Vector3<f64>; 3]> {
    if let [a, b, c] = corners {
        return vec![[*a, *b, *c]];
    }
    let centre = middle(corners);
    (0..corners.len())
        .map(|i| [corners[i], corners[(i + 1) % corners.len()], centre])
        .collect()
}

/// A panel against a least fall: that of its flattest triangle.
pub(super) fn fall(against: &Against<'_>, least: f64, part: Covered, digest: &CaseDigest) -> Result<Judgement, Lack> {
    let Covered::Panel(panel) = part else {
        return Err(Lack::Place);
    };
    if digest.positions.is_empty() {
        return Err(Lack::State);
    }
    let corners = &against.net.panels()[panel].corners;
    if corners.iter().any(|corner| digest.loose_nodes.contains(corner)) {
        return Err(Lack::Place);
    }
    let places: Vec<_> = corners.iter().map(|corner| digest.positions[corner.index()]).collect();
    let slopes = fan::triangles(&places).into_iter().map(|area| slope(&area));
    let flattest = slopes.reduce(f64::min).ok_or(Lack::Place)?;
    Judgement::at_least(part, Measure::Fall, flattest, least)
}

/// Slope of the steepest line of a triangle (m per m), from its area vector (m²).
fn slope(area: &Vector3<f64>) -> f64 {
    let flat = area.xy().norm();
    if flat < STEEPEST * area.z.abs() {
        flat / area.z.abs()
    } else {
        STEEPEST
    }
}
