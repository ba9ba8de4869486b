//! Forces of the members left to balance, from the balance of the held nodes.
//!
//! ```text
//! Σ n_m N_m = −r_h   at every held node h, in the directions in which it is free outside the search
//! ```
//!
//! Least squares by singular values: of many solutions the one of least square sum. If a rope pushes in that one, and it is
//! one of many, another is looked for in which none does. Own weight of these members depends
//! on their force, so the solve is repeated until the forces settle.
//!
//! # Reference
//! Forces that must not push: Lawson & Hanson 1974.

use nalgebra::{DMatrix, DVector, Vector3};

use super::nonnegative::non_negative;
use super::search::{Point, Search};
use super::{BalanceReport, ForceLeft, ShapeError};
use crate::model::{AxialLaw, Net, NodeId, SegmentId};

/// Singular values smaller than this share of the largest count as zero.
const RANK: f64 = 1e-10;
/// Forces left at the held nodes, over the largest force, at which they count as balanced.
const BALANCED: f64 = 1e-10;
const MAX_ROUNDS: usize = 50;

impl Search<'_, '_> {
    /// Finds the forces, leaves them in `balance_forces` and updates the point for them.
    ///
    /// Returns what is told of them and their largest change (N).
    pub(super) fn balance(
        &mut self,
        hold: &[NodeId],
        point: &mut Point,
        family_densities: &[f64],
    ) -> Result<(BalanceReport, f64), ShapeError> {
        let net = self.net();
        // One force each; a reach that slides has one tension in all of its segments.
        let groups = self.parts.balance_groups();
        let members: Vec<usize> = groups.iter().map(|group| group[0]).collect();
        let rows: Vec<(NodeId, Vector3<f64>)> = hold.iter().flat_map(|h| free_directions(net, *h)).collect();
        let directions = DMatrix::from_fn(rows.len(), members.len(), |row, column| {
            let one = |segment: &usize| {
                let [from, to] = net.segments()[*segment].ends;
                let (node, along) = &rows[row];
                let n = point.chords[*segment] / point.lengths[*segment];
                let sign = f64::from(u8::from(from == *node)) - f64::from(u8::from(to == *node));
                sign * along.dot(&n)
            };
            groups[column].iter().map(one).sum()
        });
        let whole = directions.clone();
        // Without held nodes or members there is nothing to decompose, only something to be left over.
        let svd = (!directions.is_empty()).then(|| directions.svd(true, true));
        let values = || svd.iter().flat_map(|svd| svd.singular_values.iter().copied());
        let largest = values().fold(0.0, f64::max);
        let rank = values().filter(|v| *v > RANK * largest).count();
        let before: Vec<f64> = members.iter().map(|e| self.balance_forces[*e]).collect();
        let mut left = DVector::zeros(rows.len());
        for round in 0..=MAX_ROUNDS {
            // Out of balance with the forces as they are: what they have to take up in addition.
            left = out_of_balance(&rows, point);
            let Some(svd) = svd.as_ref().filter(|_| rank > 0 && round < MAX_ROUNDS) else {
                break;
            };
            let more = svd.solve(&-&left, RANK * largest).expect("both sides were asked for");
            if more.amax() <= 1e-14 * point_force(self, point) {
                break;
            }
            for (group, force) in groups.iter().zip(&more) {
                group.iter().for_each(|segment| self.balance_forces[*segment] += force);
            }
            *point = self.point(std::mem::take(&mut point.positions), family_densities);
        }
        let pushes = |search: &Self, e: &usize| {
            net.segments()[*e].law == AxialLaw::TensionOnly
                && search.balance_forces[*e] < -BALANCED * point_force(search, point)
        };
        if rank < members.len() && members.iter().any(|e| pushes(self, e)) {
            let any_sign: Vec<bool> = (members.iter())
                .map(|e| net.segments()[*e].law == AxialLaw::TwoWay)
                .collect();
            for _ in 0..MAX_ROUNDS {
                let forces = DVector::from_iterator(members.len(), members.iter().map(|e| self.balance_forces[*e]));
                let Some(others) = non_negative(&whole, &(&whole * &forces - &left), &any_sign) else {
                    break;
                };
                for (group, force) in groups.iter().zip(&others) {
                    group.iter().for_each(|segment| self.balance_forces[*segment] = *force);
                }
                *point = self.point(std::mem::take(&mut point.positions), family_densities);
                left = out_of_balance(&rows, point);
                if (&others - forces).amax() <= 1e-14 * point_force(self, point) {
                    break;
                }
            }
        }
        self.check_forces(hold, &members, rank, &left, point)?;
        let change = members
            .iter()
            .zip(before)
            .map(|(e, before)| (self.balance_forces[*e] - before).abs())
            .fold(0.0, f64::max);
        let report = BalanceReport {
            unique: rank == members.len(),
            rank,
            residual: left.iter().fold(0.0, |m: f64, l| m.max(l.abs())),
            segments: groups.concat().into_iter().map(SegmentId::new).collect(),
        };
        Ok((report, change))
    }

    fn check_forces(
        &self,
        hold: &[NodeId],
        members: &[usize],
        rank: usize,
        left: &DVector<f64>,
        point: &Point,
    ) -> Result<(), ShapeError> {
        let net = self.net();
        let scale = point_force(self, point);
        if left.iter().any(|l| l.abs() > BALANCED * scale) {
            let force = |h: &NodeId| -> Vector3<f64> {
                let along = free_directions(net, *h);
                along
                    .iter()
                    .map(|(node, d)| d * d.dot(&point.out_of_balance[node.index()]))
                    .sum()
            };
            let forces = hold.iter().map(|h| (*h, force(h))).collect();
            return Err(ShapeError::BalanceUnsolvable {
                members: members.len(),
                left: forces_left(net, &point.positions, forces, BALANCED * scale),
            });
        }
        let pushing: Vec<(String, f64)> = members
            .iter()
            .filter(|e| {
                net.segments()[**e].law == AxialLaw::TensionOnly && self.balance_forces[**e] < -BALANCED * scale
            })
            .map(|e| (net.member_name(SegmentId::new(*e)).to_owned(), self.balance_forces[*e]))
            .collect();
        if pushing.is_empty() {
            Ok(())
        } else {
            Err(ShapeError::BalancePushes {
                members: pushing,
                unique: rank == members.len(),
            })
        }
    }
}

fn out_of_balance(rows: &[(NodeId, Vector3<f64>)], point: &Point) -> DVector<f64> {
    let each = rows
        .iter()
        .map(|(node, along)| along.dot(&point.out_of_balance[node.index()]));
    DVector::from_iterator(rows.len(), each)
}

fn point_force(search: &Search<'_, '_>, point: &Point) -> f64 {
    let loads = search.loads.nodal.iter().map(|p| p.amax());
    point
        .axial_forces
        .iter()
        .map(|n| n.abs())
        .chain(loads)
        .fold(0.0, f64::max)
}

/// Directions in which a held node is free outside the search.
fn free_directions(net: &Net, node: NodeId) -> Vec<(NodeId, Vector3<f64>)> {
    let axes = [Vector3::x(), Vector3::y(), Vector3::z()];
    let free: &[Vector3<f64>] = net.support_of(node).map_or(&axes, |support| support.free());
    free.iter().map(|direction| (node, *direction)).collect()
}

/// Forces above `least`, largest first, each with the neighbour towards which it points best.
pub(super) fn forces_left(
    net: &Net,
    positions: &[Vector3<f64>],
    forces: Vec<(NodeId, Vector3<f64>)>,
    least: f64,
) -> Vec<ForceLeft> {
    let mut forces: Vec<_> = forces.into_iter().filter(|(_, f)| f.norm() > least).collect();
    forces.sort_by(|(_, a), (_, b)| b.norm().total_cmp(&a.norm()));
    let towards = |node: NodeId, force: &Vector3<f64>| {
        let neighbours = net.segments().iter().filter_map(|s| match s.ends {
            [a, b] if a == node => Some(b),
            [a, b] if b == node => Some(a),
            _ => None,
        });
        let alignment = |other: NodeId| {
            let d = positions[other.index()] - positions[node.index()];
            if d.norm() > 0.0 {
                d.dot(force) / (d.norm() * force.norm())
            } else {
                0.0
            }
        };
        // Within 30° it is a help to name the neighbour; beyond, the direction says more.
        neighbours
            .map(|other| (alignment(other), other))
            .filter(|(along, _)| *along > 0.866)
            .max_by(|a, b| a.0.total_cmp(&b.0))
            .map(|(_, other)| net.node_name(other).to_owned())
    };
    forces
        .into_iter()
        .map(|(node, force)| ForceLeft {
            towards: towards(node, &force),
            node: net.node_name(node).to_owned(),
            force,
        })
        .collect()
}
