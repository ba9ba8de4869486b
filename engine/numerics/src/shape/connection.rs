//! What leads to a support, and what does not.

use nalgebra::{Matrix3, Vector3};

use crate::model::{Net, NodeId};

/// A part of the net that is not held, and a direction in which it is free.
pub(super) struct FreePart {
    pub(super) nodes: Vec<NodeId>,
    pub(super) direction: Vector3<f64>,
}

/// The first part, joined by the segments that `joins`, that is free to be moved as a whole; nodes of `kept` are held.
///
/// A part is held if the directions in which its nodes are held, rigidly or by springs, span space.
pub(super) fn free_part(net: &Net, kept: &[NodeId], joins: impl Fn(usize) -> bool) -> Option<FreePart> {
    let n_nodes = net.nodes().len();
    let mut root: Vec<usize> = (0..n_nodes).collect();
    for (index, segment) in net.segments().iter().enumerate() {
        if joins(index) {
            let [a, b] = segment.ends.map(|end| find(&mut root, end.index()));
            root[a.max(b)] = a.min(b);
        }
    }
    let mut held = vec![Matrix3::zeros(); n_nodes];
    for node in kept {
        held[find(&mut root, node.index())] += Matrix3::identity();
    }
    for support in net.supports() {
        let part = find(&mut root, support.node().index());
        for h in support.held() {
            held[part] += h * h.transpose();
        }
    }
    for elastic in net.elastic_supports() {
        let largest = elastic.stiffness().amax();
        if largest > 0.0 {
            for (position, node) in elastic.nodes().iter().enumerate() {
                held[find(&mut root, node.index())] += elastic.block(position, position) / largest;
            }
        }
    }
    for part in 0..n_nodes {
        if find(&mut root, part) != part {
            continue;
        }
        let eigen = held[part].symmetric_eigen();
        let least = eigen.eigenvalues.imin();
        if eigen.eigenvalues[least] <= 1e-12 * eigen.eigenvalues.max() {
            let nodes = (0..n_nodes).filter(|node| find(&mut root, *node) == part);
            return Some(FreePart {
                direction: eigen.eigenvectors.column(least).into_owned(),
                nodes: nodes.map(NodeId::new).collect(),
            });
        }
    }
    None
}

fn find(root: &mut [usize], mut node: usize) -> usize {
    while root[node] != node {
        root[node] = root[root[node]];
        node = root[node];
    }
    node
}
