//! Supports: rigid directions, springs, and groups of nodes held by a stiffness matrix.

use std::collections::BTreeMap;

use nalgebra::{DMatrix, Matrix3, Vector3};
use ropewalk_numerics::model::{ElasticSupportGiven, NodeId};

use super::findings::{Findings, Path};
use super::names::{Names, Thing};
use super::net::NetDraft;
use super::numbers::{MATRIX_STIFFNESS, Of, SPRING_STIFFNESS};
use super::reasons;
use crate::words::{Quoted, number, quoted_list, rounded};

/// Nodes of a support group: its matrix must fit a message from the server.
const LARGEST_GROUP: usize = 100;
/// Asymmetry and negative eigenvalue that still count as rounding, over the largest entry.
const ROUNDING: f64 = 1e-9;
/// Directions closer to dependence than this (sine of the angle) count as one.
const SAME_DIRECTION: f64 = 1e-9;

/// How one node is held.
#[derive(Clone, Debug, Default)]
pub(crate) struct SupportDraft {
    /// Directions that are not rigidly held.
    pub(crate) released: Vec<Vector3<f64>>,
    /// Orthonormal directions that nothing holds, neither rigidly nor by a spring.
    pub(crate) loose: Vec<Vector3<f64>>,
}

/// How nodes are held.
#[derive(Debug)]
pub(crate) struct Supports {
    /// One entry a node.
    pub(crate) of_node: Vec<Option<SupportDraft>>,
    pub(crate) elastic: Vec<ElasticSupportGiven>,
    /// Whether a node is on springs or in a support group.
    pub(crate) is_elastic: Vec<bool>,
}

impl Supports {
    /// Whether a node cannot move at all.
    pub(crate) fn holds(&self, node: usize) -> bool {
        !self.is_elastic[node]
            && self.of_node[node]
                .as_ref()
                .is_some_and(|support| support.released.is_empty())
    }

    /// The part of a vector along which a node can move.
    pub(crate) fn movable_part(&self, node: usize, vector: Vector3<f64>) -> Vector3<f64> {
        let Some(support) = &self.of_node[node] else {
            return vector;
        };
        let basis = orthonormal(&[], &support.released);
        if basis.len() == 3 {
            return vector;
        }
        basis.iter().map(|unit| unit * unit.dot(&vector)).sum()
    }

    pub(crate) fn read(net: &NetDraft<'_>, findings: &mut Findings) -> Self {
        let mut supports = Self {
            of_node: vec![None; net.nodes.len()],
            elastic: Vec::new(),
            is_elastic: vec![false; net.nodes.len()],
        };
        for index in 0..net.nodes.len() {
            supports.read_node(net, index, findings);
        }
        supports.read_groups(net, findings);
        supports.check_held(net, findings);
        supports
    }

    fn read_node(&mut self, net: &NetDraft<'_>, index: usize, findings: &mut Findings) {
        let node = &net.nodes[index];
        let Some(support) = node.listed.and_then(|node| node.support.as_ref()) else {
            return;
        };
        let list = Path::root("net.nodes");
        let at = list.element(node.id, index);
        let at = at.field("support");
        let of = Of::new("support of node", node.id);
        let free_at = at.field("free");
        let free: Vec<Vector3<f64>> = (support.free.iter().enumerate())
            .filter_map(|(number, free)| {
                let at = free_at.number(number);
                findings.direction(&at.field("along"), of, &free.along)
            })
            .collect();
        let springs_at = at.field("springs");
        let mut sprung = Vec::new();
        let mut stiffness = Matrix3::zeros();
        for (position, spring) in support.springs.iter().enumerate() {
            let at = springs_at.number(position);
            let along = findings.direction(&at.field("along"), of, &spring.along);
            let value = at.field("stiffness_n_per_m");
            let value = findings.number(&value, of, &SPRING_STIFFNESS, spring.stiffness_n_per_m);
            if let (Some(along), Some(value)) = (along, value) {
                stiffness += value * along * along.transpose();
                sprung.push(along);
            }
            if along.is_some_and(|along| free.iter().any(|free| free.cross(&along).norm() < SAME_DIRECTION)) {
                findings.error(
                    reasons::SUPPORT_CONTRADICTS,
                    &at.field("along"),
                    node.id,
                    format!("{of}: a direction is released and on a spring at the same time"),
                    "name the direction in only one of free and springs",
                );
            }
        }
        let mut basis = orthonormal(&[], &sprung);
        let n_sprung = basis.len();
        basis.extend(orthonormal(&basis, &free));
        let loose = basis.split_off(n_sprung);
        if loose.len() == 3 {
            findings.doubt(
                reasons::SUPPORT_HOLDS_NOTHING,
                &at.field("free"),
                node.id,
                format!(
                    "node {} is supported, but every direction is released: nothing is held",
                    Quoted(node.id)
                ),
                "leave the support out, or release fewer directions",
            );
        }
        if !sprung.is_empty() {
            self.is_elastic[index] = true;
            self.elastic.push(ElasticSupportGiven {
                nodes: vec![NodeId::new(index)],
                stiffness: DMatrix::from_iterator(3, 3, stiffness.iter().copied()),
            });
        }
        self.of_node[index] = Some(SupportDraft {
            released: free.into_iter().chain(sprung).collect(),
            loose,
        });
    }

    fn read_groups(&mut self, net: &NetDraft<'_>, findings: &mut Findings) {
        let list = Path::root("net.support_groups");
        let mut names = Names::new("support groups");
        let mut group_of: Vec<Option<usize>> = vec![None; net.nodes.len()];
        for (index, group) in net.message.support_groups.iter().enumerate() {
            names.declare(findings, &list, index, group.id.as_str(), index);
            let at = list.element(&group.id, index);
            let of = Of::new("support group", &group.id);
            let nodes_at = at.field("nodes");
            let mut nodes = Vec::new();
            for (position, id) in group.nodes.iter().enumerate() {
                let here = nodes_at.number(position);
                match net.names.find(findings, &here, "node", id) {
                    Some(Thing::Node(node)) => {
                        self.join_group(net, node, index, &mut group_of, &here, findings);
                        nodes.push(node);
                    }
                    Some(other) => {
                        findings.error(
                            reasons::WRONG_KIND,
                            &here,
                            id,
                            format!("{} is a {}, and a support group holds nodes", Quoted(id), other.kind()),
                            "name a node",
                        );
                    }
                    None => {}
                }
            }
            let matrix = read_matrix(&group.stiffness_n_per_m, group.nodes.len(), of, &at, findings);
            let (Some(stiffness), true) = (matrix, nodes.len() == group.nodes.len()) else {
                continue;
            };
            for (position, node) in nodes.iter().enumerate() {
                let block = stiffness.fixed_view::<3, 3>(3 * position, 3 * position).into_owned();
                let eigen = block.symmetric_eigen();
                let largest = eigen.eigenvalues.max();
                let vectors = eigen.eigenvalues.iter().zip(eigen.eigenvectors.column_iter());
                self.of_node[*node] = Some(SupportDraft {
                    released: vec![Vector3::x(), Vector3::y(), Vector3::z()],
                    loose: vectors
                        .filter(|(value, _)| **value <= 1e-12 * largest)
                        .map(|(_, vector)| vector.into_owned())
                        .collect(),
                });
                self.is_elastic[*node] = true;
            }
            self.elastic.push(ElasticSupportGiven {
                nodes: nodes.iter().copied().map(NodeId::new).collect(),
                stiffness,
            });
        }
    }

    fn join_group(
        &self,
        net: &NetDraft<'_>,
        node: usize,
        group: usize,
        group_of: &mut [Option<usize>],
        at: &Path<'_>,
        findings: &mut Findings,
    ) {
        let id = net.nodes[node].id;
        let groups = &net.message.support_groups;
        if let Some(other) = group_of[node].replace(group) {
            findings.error(
                reasons::REPEATED_IN_LIST,
                at,
                id,
                format!(
                    "node {} stands twice in support groups: {}",
                    Quoted(id),
                    quoted_list([groups[other].id.as_str(), groups[group].id.as_str()])
                ),
                "name each node in one support group, once",
            );
            return;
        }
        match net.nodes[node].listed.and_then(|node| node.support.as_ref()) {
            None => {
                findings.error(
                    reasons::MISSING,
                    at,
                    id,
                    format!("node {} stands in a support group and is not supported", Quoted(id)),
                    "list the node with its place in xyz_m and with support {}",
                );
            }
            Some(support) if !support.free.is_empty() || !support.springs.is_empty() => {
                findings.error(
                    reasons::SUPPORT_CONTRADICTS,
                    at,
                    id,
                    format!(
                        "node {} has a support of its own and stands in a support group",
                        Quoted(id)
                    ),
                    "write support {} for it: the group's stiffness takes its place",
                );
            }
            Some(_) => {}
        }
    }

    /// Every connected part of the net must lead to something that holds it.
    fn check_held(&self, net: &NetDraft<'_>, findings: &mut Findings) {
        let mut part: Vec<usize> = (0..net.nodes.len()).collect();
        for ([a, b], _) in &net.segments {
            let (a, b) = (root(&mut part, *a), root(&mut part, *b));
            part[a.max(b)] = a.min(b);
        }
        let mut held = vec![false; net.nodes.len()];
        for (index, support) in self.of_node.iter().enumerate() {
            if support.as_ref().is_some_and(|support| support.loose.len() < 3) {
                held[root(&mut part, index)] = true;
            }
        }
        let mut nodes_of: BTreeMap<usize, Vec<&str>> = BTreeMap::new();
        for (index, node) in net.nodes.iter().enumerate() {
            let of = root(&mut part, index);
            if !held[of] {
                nodes_of.entry(of).or_default().push(node.id);
            }
        }
        for (ends, member) in &net.segments {
            let Some(nodes) = nodes_of.remove(&root(&mut part, ends[0])) else {
                continue;
            };
            findings.error(
                reasons::PART_NOT_HELD,
                &Path::root("net.nodes"),
                net.member_id(*member),
                format!(
                    "nothing holds the part with {} and nodes {}: none of them is supported",
                    Quoted(net.member_id(*member)),
                    quoted_list(nodes.iter().copied())
                ),
                "write support {} for the nodes that are anchored, or join the part to the rest",
            );
        }
    }
}

fn root(part: &mut [usize], mut node: usize) -> usize {
    while part[node] != node {
        part[node] = part[part[node]];
        node = part[node];
    }
    node
}

/// An orthonormal basis of what `directions` add to `others`.
fn orthonormal(others: &[Vector3<f64>], directions: &[Vector3<f64>]) -> Vec<Vector3<f64>> {
    let mut basis: Vec<Vector3<f64>> = Vec::with_capacity(3);
    for direction in directions {
        let mut rest = *direction;
        // Twice is enough for a basis orthonormal to rounding (Parlett 1980, Kahan's remark).
        for _ in 0..2 {
            for unit in others.iter().chain(&basis) {
                rest -= unit * unit.dot(&rest);
            }
        }
        let norm = rest.norm();
        if norm > SAME_DIRECTION {
            basis.push(rest / norm);
        }
    }
    basis
}

fn read_matrix(
    values: &[f64],
    n_nodes: usize,
    of: Of<'_>,
    at: &Path<'_>,
    findings: &mut Findings,
) -> Option<DMatrix<f64>> {
    let field = at.field("stiffness_n_per_m");
    if n_nodes == 0 || n_nodes > LARGEST_GROUP {
        findings
            .error(
                reasons::WRONG_COUNT,
                &at.field("nodes"),
                of.id,
                format!("{of} has {n_nodes} nodes: from 1 to {LARGEST_GROUP} can be held together"),
                "name its nodes; split a larger one where the matrix decouples",
            )
            .value(n_nodes);
        return None;
    }
    let size = 3 * n_nodes;
    if values.len() != size * size {
        findings
            .error(
                reasons::WRONG_COUNT,
                &field,
                of.id,
                format!(
                    "{of}: the stiffness has {} numbers; {n_nodes} nodes need {size} rows of {size}, {} in all",
                    values.len(),
                    size * size
                ),
                "give the matrix row by row, in the order of nodes, then x, y, z",
            )
            .value(values.len());
        return None;
    }
    let mut valid = true;
    for (position, value) in values.iter().enumerate() {
        valid &= findings
            .number(&field.number(position), of, &MATRIX_STIFFNESS, *value)
            .is_some();
    }
    if !valid {
        return None;
    }
    let matrix = DMatrix::from_row_slice(size, size, values);
    let largest = matrix.amax();
    let asymmetry = &matrix - matrix.transpose();
    if asymmetry.amax() > ROUNDING * largest {
        let (row, column) = asymmetry.iamax_full();
        findings
            .error(
                reasons::NOT_SYMMETRIC,
                &field.number(row * size + column),
                of.id,
                format!(
                    "{of}: the stiffness is not symmetric: {} in row {row}, column {column}, and {} across",
                    number(matrix[(row, column)]),
                    number(matrix[(column, row)])
                ),
                "give a symmetric matrix: both entries alike within 1e-9 of the largest",
            )
            .value(number(matrix[(row, column)]));
        return None;
    }
    let least = matrix.clone().symmetric_eigenvalues().min();
    if least < -ROUNDING * largest {
        findings
            .error(
                reasons::NOT_SEMI_DEFINITE,
                &field,
                of.id,
                format!(
                    "{of}: the stiffness has an eigenvalue of {} N/m: a support would push its nodes away",
                    rounded(least, 3)
                ),
                "give a matrix without negative eigenvalues: a condensed stiffness, not a flexibility",
            )
            .value(rounded(least, 6));
        return None;
    }
    if largest == 0.0 {
        findings.doubt(
            reasons::SUPPORT_HOLDS_NOTHING,
            &field,
            of.id,
            format!("{of} has no stiffness: nothing is held"),
            "give its stiffness",
        );
    }
    Some(matrix)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_nothing_holds_is_what_free_adds_to_springs() {
        let sprung = orthonormal(&[], &[Vector3::y()]);
        let loose = orthonormal(&sprung, &[Vector3::new(0.0, 1.0, 1.0).normalize(), Vector3::y()]);
        assert_eq!(loose.len(), 1);
        assert!((loose[0] - Vector3::z()).norm() < 1e-15);
    }
}
