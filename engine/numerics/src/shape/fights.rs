//! What was wanted beside what was found, and which wishes fight.
//!
//! At the nearest shape `Σ_j c_j g_j = 0`, `g_j` the derivatives of deviation `c_j` by the unknowns: what would lessen one
//! deviation makes others larger. The wish that stands most against wish `i` is the `j` with the largest
//! `−c_i c_j g_i·g_j`. What each comes to alone is found by going on without the other one.

use nalgebra::Vector3;

use super::balance::forces_left;
use super::given::SagMeasure;
use super::parts::Sought;
use super::rows::{MET_TARGET, Measure};
use super::search::Search;
use super::targets::{Densities, MET};
use super::{Fight, Quantity, ShapeError, Target, Unmet};
use crate::model::{Member, Net, NodeId, SegmentId};

/// Pairs of wishes that are looked for.
const MOST_FIGHTS: usize = 3;
/// Share of the resistance to a wish from which on another one counts as the one that stands against it.
const NOTABLE: f64 = 0.05;

/// Everything wanted with what was found: families with a wanted tension, then the targets.
pub(super) fn targets(search: &Search<'_, '_>, found: &Densities) -> Vec<Target> {
    let net = search.net();
    let families = search.parts.families.iter().zip(&found.means);
    let tensions = families.filter_map(|(family, mean)| {
        let wanted = family.wanted()?;
        Some(Target {
            name: None,
            on: stretch(net, &family.segments),
            quantity: if family.segments.len() > 1 {
                Quantity::MeanTension
            } else {
                Quantity::Tension
            },
            wanted,
            found: *mean,
            miss: (mean / wanted).max(1e-30).ln(),
            met: (mean / wanted - 1.0).abs() <= MET,
        })
    });
    let rows = search.rows.list.iter().map(|row| {
        let (found, wanted) = search.rows.found_and_wanted(&found.point, &row.measure);
        let miss = search.rows.share(&row.measure, found, wanted);
        let (quantity, on) = described(net, &row.measure);
        Target {
            name: Some(search.rows.names[row.target].clone()),
            on,
            quantity,
            wanted,
            found,
            miss,
            met: miss.abs() <= MET_TARGET,
        }
    });
    tensions.chain(rows).collect()
}

fn described(net: &Net, measure: &Measure) -> (Quantity, String) {
    let node = |index: &usize| net.nodes()[*index].name.clone();
    match measure {
        Measure::Tension { segments, .. } if segments.len() == 1 => (Quantity::Tension, stretch(net, segments)),
        Measure::Tension { segments, .. } => (Quantity::MeanTension, stretch(net, segments)),
        Measure::Length { segments, .. } => (Quantity::Length, stretch(net, segments)),
        Measure::UnstressedLength { segments, .. } => (Quantity::UnstressedLength, stretch(net, segments)),
        Measure::Coordinate { node: index, axis, .. } => {
            let quantity = [Quantity::X, Quantity::Y, Quantity::Z][*axis];
            (quantity, node(index))
        }
        Measure::Sag {
            node: index, measure, ..
        } => {
            let quantity = match measure {
                SagMeasure::Vertical => Quantity::Sag,
                SagMeasure::Normal => Quantity::SagNormal,
            };
            (quantity, node(index))
        }
        Measure::Equal { segments } => (Quantity::MeshWidth, stretch(net, &segments[1..])),
        Measure::Radius { nodes, .. } => (Quantity::Radius, node(&nodes[1])),
        Measure::Height { node: index, .. } => (Quantity::Surface, node(index)),
    }
}

/// A member, or a stretch of a cable by its end nodes.
fn stretch(net: &Net, segments: &[usize]) -> String {
    let (first, last) = (segments[0], segments[segments.len() - 1]);
    let segment = net.segments()[first];
    let name = net.member_name(SegmentId::new(first));
    match segment.member {
        Member::Cable(cable) if net.cables()[cable.index()].segments.len() > segments.len() => {
            let to = net.segments()[last].ends[1];
            format!("{name} ({}-{})", net.node_name(segment.ends[0]), net.node_name(to))
        }
        _ => name.to_owned(),
    }
}

/// Says what the wanted tensions would leave at the nodes, which wishes fight, and what stays at a bound.
pub(super) fn unmet(search: &mut Search<'_, '_>, found: &Densities) -> Result<Unmet, ShapeError> {
    let net = search.net();
    let point = &found.point;
    let mut nodal = vec![Vector3::zeros(); net.nodes().len()];
    for (family, mean) in search.parts.families.iter().zip(&found.means) {
        let Some(wanted) = family.wanted() else {
            continue;
        };
        for &e in &family.segments {
            let more = point.axial_forces[e] * (wanted / mean - 1.0);
            let [i, j] = net.segments()[e].ends.map(NodeId::index);
            nodal[i] += point.chords[e] * (more / point.lengths[e]);
            nodal[j] -= point.chords[e] * (more / point.lengths[e]);
        }
    }
    let dofs = search.structure.dofs();
    let forces = (0..net.nodes().len())
        .map(|n| {
            let free = dofs.directions(NodeId::new(n));
            (NodeId::new(n), free.iter().map(|d| d * d.dot(&nodal[n])).sum())
        })
        .collect();
    let largest = point.axial_forces.iter().fold(0.0, |m: f64, n| m.max(n.abs()));
    let at_bounds = search.parts.families.iter().zip(&found.densities);
    let at_bounds = at_bounds.filter(|(family, q)| match family.sought {
        Sought::Mean(_) => false,
        Sought::Targets(given) => (q.abs() <= given.least && given.least > 0.0) || q.abs() >= given.most,
    });
    Ok(Unmet {
        left: forces_left(net, &point.positions, forces, MET * largest),
        rank: found.rank,
        at_bounds: at_bounds.map(|(family, _)| stretch(net, &family.segments)).collect(),
        fights: fights(search, found)?,
    })
}

fn fights(search: &mut Search<'_, '_>, found: &Densities) -> Result<Vec<Fight>, ShapeError> {
    let n = found.misses.len();
    let mut fights: Vec<Fight> = Vec::new();
    if found.densities.is_empty() {
        return Ok(fights);
    }
    let mut worst: Vec<usize> = (0..n).filter(|row| found.misses[*row].abs() > MET_TARGET).collect();
    worst.sort_by(|a, b| found.misses[*b].abs().total_cmp(&found.misses[*a].abs()));
    for first in worst.into_iter().take(2 * MOST_FIGHTS) {
        let told = fights.iter().any(|fight| fight.targets.contains(&first));
        if told || fights.len() == MOST_FIGHTS {
            continue;
        }
        let Some(second) = opponent(search, found, first)? else {
            continue;
        };
        let without_second = search.without(second, found)?;
        let without_first = search.without(first, found)?;
        let value = |search: &Search<'_, '_>, at: &Densities, row: usize| targets(search, at)[row].found;
        fights.push(Fight {
            targets: [first, second],
            alone: [
                value(search, &without_second, first),
                value(search, &without_first, second),
            ],
            left_out: [
                value(search, &without_first, first),
                value(search, &without_second, second),
            ],
        });
    }
    Ok(fights)
}

/// The wish that stands most against another one.
fn opponent(search: &mut Search<'_, '_>, found: &Densities, row: usize) -> Result<Option<usize>, ShapeError> {
    let (point, densities) = (&found.point, &found.densities);
    search.factorise(point, densities, 0.0)?;
    let slopes = search.slopes(point);
    let mut one = vec![0.0; slopes.len()];
    one[row] = 1.0;
    let gradient = search.backward(point, densities, &slopes, &one);
    let together = search.forward(point, densities, &slopes, &gradient);
    let own = found.misses[row].powi(2) * together[row];
    let against = |other: usize| -found.misses[row] * found.misses[other] * together[other];
    Ok((0..slopes.len())
        .filter(|other| *other != row && against(*other) > NOTABLE * own)
        .max_by(|a, b| against(*a).total_cmp(&against(*b))))
}
