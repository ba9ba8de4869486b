//! Numbering of the directions in which nodes can move.

use nalgebra::Vector3;

use crate::model::{Net, NodeId};

/// The free directions of all nodes, numbered in node order.
///
/// A node without rigid support moves along the global axes; a supported one along the free basis of its support,
/// none to three directions.
#[derive(Clone, Debug)]
pub struct Dofs {
    first: Vec<usize>,
    directions: Vec<Vector3<f64>>,
    nodes: Vec<NodeId>,
}

impl Dofs {
    /// Numbers the free directions of `net`; the nodes of `kept` can not move at all.
    #[must_use]
    pub(crate) fn new(net: &Net, kept: &[NodeId]) -> Self {
        let axes = [Vector3::x(), Vector3::y(), Vector3::z()];
        let mut is_kept = vec![false; net.nodes().len()];
        for node in kept {
            is_kept[node.index()] = true;
        }
        let mut dofs = Self {
            first: vec![0],
            directions: Vec::new(),
            nodes: Vec::new(),
        };
        for (index, kept) in is_kept.into_iter().enumerate() {
            let node = NodeId::new(index);
            let free: &[Vector3<f64>] = match net.support_of(node) {
                _ if kept => &[],
                Some(support) => support.free(),
                None => &axes,
            };
            dofs.directions.extend_from_slice(free);
            dofs.nodes.extend(free.iter().map(|_| node));
            dofs.first.push(dofs.directions.len());
        }
        dofs
    }

    /// How many there are.
    #[must_use]
    pub fn len(&self) -> usize {
        self.directions.len()
    }

    /// Whether nothing can move.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.directions.is_empty()
    }

    /// Number of the first free direction of a node.
    #[must_use]
    pub fn first(&self, node: NodeId) -> usize {
        self.first[node.index()]
    }

    /// Orthonormal free directions of a node (none to three).
    #[must_use]
    pub fn directions(&self, node: NodeId) -> &[Vector3<f64>] {
        &self.directions[self.first[node.index()]..self.first[node.index() + 1]]
    }

    /// Direction of one free direction by its number (unit).
    #[must_use]
    pub fn direction(&self, dof: usize) -> Vector3<f64> {
        self.directions[dof]
    }

    /// The node that moves.
    #[must_use]
    pub fn node(&self, dof: usize) -> NodeId {
        self.nodes[dof]
    }

    /// Components of one vector a node along the free directions.
    pub fn components_into(&self, nodal: &[Vector3<f64>], components: &mut [f64]) {
        for ((component, direction), node) in components.iter_mut().zip(&self.directions).zip(&self.nodes) {
            *component = direction.dot(&nodal[node.index()]);
        }
    }

    /// Adds `step` times a movement along the free directions (m) to the positions of the nodes.
    pub fn move_nodes(&self, movement: &[f64], step: f64, positions: &mut [Vector3<f64>]) {
        for ((component, direction), node) in movement.iter().zip(&self.directions).zip(&self.nodes) {
            positions[node.index()] += direction * (step * component);
        }
    }

    /// One vector a node from components along the free directions; zero where a node can not move.
    pub fn nodal_into(&self, components: &[f64], nodal: &mut [Vector3<f64>]) {
        nodal.fill(Vector3::zeros());
        self.move_nodes(components, 1.0, nodal);
    }
}
