//! How nodes are held: rigidly in some directions, elastically in others.

use nalgebra::{DMatrix, Matrix3, Vector3};

use super::NodeId;

/// How one node is held, as given.
///
/// The node is rigidly held in every direction that is not released. A direction with a spring is released as well.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct SupportGiven {
    /// Directions in which the node moves freely; any length but zero.
    pub released: Vec<Vector3<f64>>,
}

/// Rigid directions of one node, as an orthonormal basis of the held and of the free directions.
#[derive(Clone, Debug, PartialEq)]
pub struct Support {
    node: NodeId,
    held: Vec<Vector3<f64>>,
    free: Vec<Vector3<f64>>,
}

/// Released directions closer to dependence than this (sine of the angle) count as one.
const SAME_DIRECTION: f64 = 1e-9;

impl Support {
    /// Splits space at a node into held and free directions.
    ///
    /// `released`: the directions that are not held, any length but zero, not necessarily independent.
    pub(crate) fn new(node: NodeId, released: &[Vector3<f64>]) -> Self {
        let mut free: Vec<Vector3<f64>> = Vec::with_capacity(3);
        let axes = [Vector3::x(), Vector3::y(), Vector3::z()];
        for direction in released {
            add_independent(&mut free, &[], direction.normalize());
        }
        if free.len() == 3 {
            // Nothing is held: the global axes serve as well as any and keep the arithmetic simple.
            free = axes.to_vec();
        }
        let mut held: Vec<Vector3<f64>> = Vec::with_capacity(3);
        if free.is_empty() {
            held = axes.to_vec();
        } else {
            // The axis least covered first, so that the complement is well conditioned.
            let mut order = [0_usize, 1, 2];
            let covered = |axis: usize| free.iter().map(|f| f[axis] * f[axis]).sum::<f64>();
            order.sort_by(|a, b| covered(*a).total_cmp(&covered(*b)));
            for axis in order {
                if held.len() + free.len() < 3 {
                    add_independent(&mut held, &free, axes[axis]);
                }
            }
        }
        Self { node, held, free }
    }

    /// The node that is held.
    #[must_use]
    pub fn node(&self) -> NodeId {
        self.node
    }

    /// Orthonormal directions that are rigidly held (none to three).
    #[must_use]
    pub fn held(&self) -> &[Vector3<f64>] {
        &self.held
    }

    /// Orthonormal directions in which the node may move (none to three); with `held` they span space.
    #[must_use]
    pub fn free(&self) -> &[Vector3<f64>] {
        &self.free
    }

    /// The part of `vector` along the held directions.
    #[must_use]
    pub fn held_part(&self, vector: &Vector3<f64>) -> Vector3<f64> {
        self.held.iter().map(|h| h * h.dot(vector)).sum()
    }
}

fn add_independent(basis: &mut Vec<Vector3<f64>>, others: &[Vector3<f64>], direction: Vector3<f64>) {
    let mut rest = direction;
    // Twice is enough for a basis orthonormal to rounding (Parlett 1980, Kahan's remark).
    for _ in 0..2 {
        for b in others.iter().chain(basis.iter()) {
            rest -= b * b.dot(&rest);
        }
    }
    let norm = rest.norm();
    if norm > SAME_DIRECTION {
        basis.push(rest / norm);
    }
}

/// An elastic support as given: one node on springs, or several nodes coupled by a stiffness matrix.
#[derive(Clone, Debug, PartialEq)]
pub struct ElasticSupportGiven {
    /// The nodes it touches, each once.
    pub nodes: Vec<NodeId>,
    /// Stiffness (N/m), symmetric and positive semi-definite, `3 n × 3 n` in the order of `nodes`, then x, y, z.
    pub stiffness: DMatrix<f64>,
}

/// An elastic support: force on the net `−S (x − rest − movement)` at its nodes.
///
/// It is at rest where its nodes were given.
#[derive(Clone, Debug, PartialEq)]
pub struct ElasticSupport {
    nodes: Vec<NodeId>,
    stiffness: DMatrix<f64>,
    rest: Vec<Vector3<f64>>,
}

impl ElasticSupport {
    pub(crate) fn new(given: ElasticSupportGiven, rest: Vec<Vector3<f64>>) -> Self {
        Self {
            nodes: given.nodes,
            stiffness: given.stiffness,
            rest,
        }
    }

    /// The nodes it touches.
    #[must_use]
    pub fn nodes(&self) -> &[NodeId] {
        &self.nodes
    }

    /// Stiffness (N/m), `3 n × 3 n`.
    #[must_use]
    pub fn stiffness(&self) -> &DMatrix<f64> {
        &self.stiffness
    }

    /// Stiffness block of the pair (`row`, `column`) of its nodes (N/m).
    #[must_use]
    pub fn block(&self, row: usize, column: usize) -> Matrix3<f64> {
        self.stiffness.fixed_view::<3, 3>(3 * row, 3 * column).into_owned()
    }

    /// Largest sum of absolute stiffnesses along a row of one of its nodes (N/m): no unit movement of its nodes along the
    /// axes brings more force to that node.
    #[must_use]
    pub(crate) fn largest_row_sum(&self, node: usize) -> f64 {
        self.stiffness.rows(3 * node, 3).abs().column_sum().amax()
    }

    /// Positions of its nodes at which it bears no force (m).
    #[must_use]
    pub fn rest(&self) -> &[Vector3<f64>] {
        &self.rest
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn held_and_free_directions_span_space() {
        let skew = Vector3::new(1.0, 2.0, -0.5);
        for released in [
            vec![],
            vec![skew],
            vec![skew, Vector3::z()],
            vec![skew, 2.0 * skew],
            vec![skew, Vector3::z(), Vector3::x()],
        ] {
            let support = Support::new(NodeId::new(0), &released);
            let all: Vec<_> = support.held().iter().chain(support.free()).collect();
            assert_eq!(all.len(), 3);
            for (i, a) in all.iter().enumerate() {
                for (j, b) in all.iter().enumerate() {
                    let expected = if i == j { 1.0 } else { 0.0 };
                    assert!((a.dot(b) - expected).abs() < 1e-14);
                }
            }
            for direction in &released {
                assert!(support.held_part(direction).norm() < 1e-14);
            }
        }
    }
}
