//! Can a balanced state move freely?
//!
//! Ropes alone never give an unstable balance. With struts the tangent may have directions of no or negative stiffness:
//! then a balance on paper is none in the air.

use nalgebra::Vector3;

use super::{Analysis, eigen};
use crate::assembly::{Loading, Response, Structure};
use crate::model::{NodeId, SegmentId};

/// Stiffness below this share of the largest is none: rounding reaches there.
const NO_STIFFNESS: f64 = 1e-11;
/// Components of a movement below this share of the largest do not count as moving.
const STANDS_STILL: f64 = 1e-3;

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
    let largest = eigen::largest_on_diagonal(structure.pattern(), &values);
    stiffen(structure, loose, largest, &mut values);
    let mut shifted = values.clone();
    for dof in 0..structure.n_dofs() {
        shifted[starts[dof]] -= NO_STIFFNESS * largest;
    }
    if structure.n_dofs() == 0 || factor.cholesky(&shifted).is_ok() {
        return None;
    }
    let pair = eigen::least(structure.pattern(), &mut factor, &values, 1).pop()?;
    let movements = moving_nodes(structure, &pair.vector);
    (!movements.is_empty()).then(|| free_movement_of(structure, &movements, pair.value))
}

/// A movement to which a balanced state has little stiffness.
#[derive(Clone, Debug, PartialEq)]
pub struct LeastStiffness {
    /// Eigenvalue of the tangent (N/m): stiffness against the movement, for a unit of the root of the squared movements.
    /// Negative where the state is not stable.
    pub stiffness: f64,
    /// `|K d − λ d|` of the unit movement (N/m): some eigenvalue lies that near.
    pub residual: f64,
    /// Nodes that move, most first, with their movement over the largest one (–).
    pub movements: Vec<(NodeId, Vector3<f64>)>,
}

/// The least eigenvalues of the tangent at a state, in rising order; empty where nothing can move.
///
/// `loose`: nodes without a place of their own, left out of the question.
#[must_use]
pub fn least_stiffnesses(
    analysis: &Analysis,
    loading: &Loading,
    positions: &[Vector3<f64>],
    loose: &[NodeId],
    count: usize,
) -> Vec<LeastStiffness> {
    let structure = analysis.structure();
    let mut values = tangent(structure, loading, positions);
    // Beyond every other stiffness, so that they come last.
    let out_of_question = 1e3 * eigen::largest_on_diagonal(structure.pattern(), &values);
    stiffen(structure, loose, out_of_question, &mut values);
    let pairs = eigen::least(structure.pattern(), &mut analysis.new_factor(), &values, count);
    (pairs.into_iter().filter(|pair| pair.value < 0.5 * out_of_question))
        .map(|pair| LeastStiffness {
            stiffness: pair.value,
            residual: pair.residual,
            movements: moving_nodes(structure, &pair.vector),
        })
        .collect()
}

/// Nodes that a movement along the free directions moves, most first, with their movement over the largest one.
#[must_use]
pub fn moving_nodes(structure: &Structure, movement: &[f64]) -> Vec<(NodeId, Vector3<f64>)> {
    let mut nodal = vec![Vector3::zeros(); structure.net().nodes().len()];
    structure.dofs().nodal_into(movement, &mut nodal);
    let most = nodal.iter().map(Vector3::norm).fold(0.0, f64::max);
    if most == 0.0 {
        return Vec::new();
    }
    // Movements that differ by rounding only are told in node order.
    let size = |node: &usize| (nodal[*node].norm() / most * 1e6).round();
    let mut nodes: Vec<usize> = (0..nodal.len())
        .filter(|n| nodal[*n].norm() > STANDS_STILL * most)
        .collect();
    nodes.sort_by(|a, b| size(b).total_cmp(&size(a)).then(a.cmp(b)));
    // Either sense is as good; the one whose largest component is positive reads better.
    let first = nodal[nodes[0]];
    let scale = if first[first.iamax()] < 0.0 { -most } else { most };
    nodes
        .into_iter()
        .map(|node| (NodeId::new(node), nodal[node] / scale))
        .collect()
}

fn stiffen(structure: &Structure, nodes: &[NodeId], stiffness: f64, values: &mut [f64]) {
    for node in nodes {
        let first = structure.dofs().first(*node);
        for dof in first..first + structure.dofs().directions(*node).len() {
            values[structure.pattern().column_starts()[dof]] += stiffness;
        }
    }
}

/// Exact but for the antisymmetric part of pressure and for [`Structure::slips`], by the entries of the pattern (N/m).
pub(crate) fn tangent(structure: &Structure, loading: &Loading, positions: &[Vector3<f64>]) -> Vec<f64> {
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

/// A free movement with what meets at the node that moves most.
fn free_movement_of(structure: &Structure, movements: &[(NodeId, Vector3<f64>)], stiffness: f64) -> FreeMovement {
    let (first, direction) = movements[0];
    let segments = (structure.net().segments().iter().enumerate())
        .filter(|(_, s)| s.ends.contains(&first))
        .map(|(index, _)| SegmentId::new(index))
        .collect();
    FreeMovement {
        nodes: movements.iter().map(|(node, _)| *node).collect(),
        direction: direction.normalize(),
        stiffness,
        segments,
    }
}
