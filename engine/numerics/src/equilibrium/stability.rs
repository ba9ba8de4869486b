//! Can a balanced state move freely?
//!
//! Ropes alone never give an unstable balance. With struts the tangent may have directions of no or negative stiffness:
//! then a balance on paper is none in the air.

use nalgebra::Vector3;

use super::Analysis;
use super::linear::Factor;
use crate::assembly::{Loading, Response, Structure};
use crate::model::{NodeId, SegmentId};

/// Stiffness below this share of the largest is none: rounding reaches there.
const NO_STIFFNESS: f64 = 1e-11;
/// Components of a movement below this share of the largest do not count as moving.
const STANDS_STILL: f64 = 1e-3;
const INVERSE_ITERATIONS: u32 = 30;

/// A movement against which a balanced state has no stiffness, or less than none.
#[derive(Clone, Debug, PartialEq)]
pub struct FreeMovement {
    /// Nodes that move, most first.
    pub nodes: Vec<NodeId>,
    /// How the first moves (unit).
    pub direction: Vector3<f64>,
    /// Stiffness against the movement, for a unit of the root of the squared movements (N/m).
    pub stiffness: f64,
    /// Segments at the first node.
    pub segments: Vec<SegmentId>,
}

/// The movement of least stiffness of a balanced state, if that stiffness is not positive.
///
/// `loose`: nodes without a place of their own, left out of the question.
#[must_use]
pub fn free_movement(
    analysis: &Analysis,
    loading: &Loading,
    positions: &[Vector3<f64>],
    loose: &[NodeId],
) -> Option<FreeMovement> {
    let structure = analysis.structure();
    let mut factor = analysis.new_factor();
    let mut values = tangent(structure, loading, positions);
    let starts = structure.pattern().column_starts();
    let largest = (0..structure.n_dofs())
        .map(|dof| values[starts[dof]].abs())
        .fold(0.0, f64::max);
    // Where nothing has stiffness any measure serves, but zero is none.
    let largest = if largest > 0.0 { largest } else { 1.0 };
    for node in loose {
        let first = structure.dofs().first(*node);
        for dof in first..first + structure.dofs().directions(*node).len() {
            values[starts[dof]] += largest;
        }
    }
    let shifted = |shift: f64, factor: &mut Factor| {
        let mut shifted = values.clone();
        for dof in 0..structure.n_dofs() {
            shifted[starts[dof]] -= shift;
        }
        factor.cholesky(&shifted).is_ok()
    };
    let least = NO_STIFFNESS * largest;
    if structure.n_dofs() == 0 || shifted(least, &mut factor) {
        return None;
    }
    // A shift just below the least eigenvalue makes inverse iteration find that one.
    let mut shift = -least;
    while !shifted(shift, &mut factor) {
        shift *= 4.0;
        if !shift.is_finite() {
            return None;
        }
    }
    let (movement, stiffness) = least_stiff(structure, &values, &mut factor);
    Some(describe(structure, &movement, stiffness))
}

/// Exact but for the antisymmetric part of pressure and friction, by the entries of the pattern (N/m).
pub(super) fn tangent(structure: &Structure, loading: &Loading, positions: &[Vector3<f64>]) -> Vec<f64> {
    let blocks: Vec<_> = (structure.net().segments().iter().zip(&loading.bars))
        .map(|(s, bar)| bar.stiffness_block(&(positions[s.ends[1].index()] - positions[s.ends[0].index()])))
        .collect();
    let mut values = vec![0.0; structure.pattern().n_entries()];
    let Some(special) = &loading.special else {
        structure.tangent_into(&blocks, &mut values);
        structure.add_elastic_supports(&mut values);
        return values;
    };
    let mut blocks = blocks;
    let mut response = Response::new(structure);
    structure.response_into(loading, positions, &mut response);
    let tensions = response.special.tensions.clone();
    structure.special_blocks(special, &response, &tensions, 0.0, &mut blocks);
    structure.tangent_into(&blocks, &mut values);
    structure.add_special_tangent(special, &response, |piece| tensions[piece] > 0.0, &mut values);
    structure.add_elastic_supports(&mut values);
    values
}

/// Eigenvector nearest to the shift of `factor`, and its Rayleigh quotient with the matrix of `values`.
fn least_stiff(structure: &Structure, values: &[f64], factor: &mut Factor) -> (Vec<f64>, f64) {
    // A start without symmetry, so that it has a part along every eigenvector.
    let mut vector: Vec<f64> = (0..structure.n_dofs())
        .map(|i| 1.0 + ((i * 37 % 101) as f64) / 101.0)
        .collect();
    let mut product = vec![0.0; vector.len()];
    let mut quotient = f64::INFINITY;
    for _ in 0..INVERSE_ITERATIONS {
        factor.solve_in_place(&mut vector);
        let norm = vector.iter().map(|v| v * v).sum::<f64>().sqrt();
        vector.iter_mut().for_each(|v| *v /= norm);
        structure.pattern().product_into(values, &vector, &mut product);
        let next: f64 = vector.iter().zip(&product).map(|(v, p)| v * p).sum();
        if (next - quotient).abs() <= 1e-9 * next.abs() {
            return (vector, next);
        }
        quotient = next;
    }
    (vector, quotient)
}

fn describe(structure: &Structure, movement: &[f64], stiffness: f64) -> FreeMovement {
    let mut nodal = vec![Vector3::zeros(); structure.net().nodes().len()];
    structure.dofs().nodal_into(movement, &mut nodal);
    let mut nodes: Vec<NodeId> = (0..nodal.len()).map(NodeId::new).collect();
    nodes.sort_by(|a, b| {
        nodal[b.index()]
            .norm()
            .total_cmp(&nodal[a.index()].norm())
            .then(a.cmp(b))
    });
    let first = nodes[0];
    let most = nodal[first.index()].norm();
    nodes.retain(|n| nodal[n.index()].norm() > STANDS_STILL * most);
    let mut direction = nodal[first.index()] / most;
    // Either sense is as good; the one whose largest component is positive reads better.
    if direction[direction.iamax()] < 0.0 {
        direction = -direction;
    }
    let segments = (structure.net().segments().iter().enumerate())
        .filter(|(_, s)| s.ends.contains(&first))
        .map(|(index, _)| SegmentId::new(index))
        .collect();
    FreeMovement {
        nodes,
        direction,
        stiffness,
        segments,
    }
}
