//! Is every load held? A test on the graph, before anything is solved.
//!
//! The energy of a net grows without bound in every direction except along translations of whole parts that no support
//! resists. There it falls like the load along them. So a balanced state exists exactly when no part carries a net load
//! along a translation that is free to it.
//!
//! The same test on the taut segments alone tells which nodes have a place: within a part joined by taut segments all
//! chords are determined, and so is the place of a part that can not be translated.

use nalgebra::{DMatrix, DVector, Matrix3, Vector3};

use super::SolveError;
use crate::assembly::{Loading, Structure};
use crate::model::{ElasticSupport, Net, NodeId};

/// Eigenvalues below this share of the largest count as no resistance.
const NO_RESISTANCE: f64 = 1e-9;
/// Stiffness of a spring below this share of the stiffest at the same node is rounding of that one.
const NO_SPRING: f64 = 1e-12;
/// Share of the loads on a part below which their sum counts as zero.
const NO_LOAD: f64 = 1e-9;

/// A node and a direction that may be held without changing any force: it stops a part that could be translated freely.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Anchor {
    /// The node.
    pub node: NodeId,
    /// The direction (unit).
    pub direction: Vector3<f64>,
}

/// Checks that every load is held; returns where parts that may be anywhere can be anchored.
///
/// # Errors
/// [`SolveError::NotHeld`] for the first part, in node order, with a net load along a free translation.
pub fn check_loads_are_held(structure: &Structure, loading: &Loading) -> Result<Vec<Anchor>, SolveError> {
    let mut anchors = Vec::new();
    let parts = Parts::new(structure, |segment| loading.bars[segment].is_present());
    for group in parts.groups(structure.net()) {
        let translations = group.free_translations(structure);
        if translations.ncols() == 0 {
            continue;
        }
        let mut load = DVector::zeros(3 * group.parts.len());
        let mut size = 0.0;
        for (part, nodes) in group.parts.iter().enumerate() {
            for node in nodes {
                let force = loading.nodal_forces[node.index()];
                let mut sum = load.fixed_rows_mut::<3>(3 * part);
                sum += force;
                size += force.norm();
            }
        }
        let free = &translations * (translations.transpose() * load);
        let part = (0..group.parts.len())
            .max_by(|a, b| {
                block(&free, *a)
                    .norm()
                    .total_cmp(&block(&free, *b).norm())
                    .then(b.cmp(a))
            })
            .expect("a group has a part");
        let force = block(&free, part);
        if force.norm() > NO_LOAD * size {
            return Err(SolveError::NotHeld {
                nodes: group.parts[part].clone(),
                direction: force.normalize(),
                force: force.norm(),
            });
        }
        anchors.extend(
            translations
                .column_iter()
                .filter_map(|t| group.anchor(structure, &t.into_owned())),
        );
    }
    Ok(anchors)
}

/// Nodes whose place is not determined: no path of taut segments leads them to enough support.
///
/// `is_taut` tells it of each segment by index. In node order.
#[must_use]
pub fn loose_nodes(structure: &Structure, is_taut: impl Fn(usize) -> bool) -> Vec<NodeId> {
    let mut loose = Vec::new();
    for group in Parts::new(structure, is_taut).groups(structure.net()) {
        let translations = group.free_translations(structure);
        for (part, nodes) in group.parts.iter().enumerate() {
            if translations.rows(3 * part, 3).amax() > 1e-6 {
                let movable = |n: &&NodeId| !structure.dofs().directions(**n).is_empty();
                loose.extend(nodes.iter().filter(movable));
            }
        }
    }
    loose.sort_unstable();
    loose
}

fn block(vector: &DVector<f64>, part: usize) -> Vector3<f64> {
    vector.fixed_rows::<3>(3 * part).into_owned()
}

/// Parts of a net joined by segments, and which of them elastic supports couple.
struct Parts {
    part_of_node: Vec<usize>,
    nodes: Vec<Vec<NodeId>>,
    group_of_part: Vec<usize>,
    /// Number of a part within its group.
    place_in_group: Vec<usize>,
}

/// Parts that elastic supports couple: to be judged together.
struct Group<'a> {
    parts: Vec<Vec<NodeId>>,
    elastic_supports: Vec<&'a ElasticSupport>,
    all: &'a Parts,
}

impl Parts {
    fn new(structure: &Structure, is_joined: impl Fn(usize) -> bool) -> Self {
        let net = structure.net();
        let mut sets = Sets::new(net.nodes().len());
        for (index, segment) in net.segments().iter().enumerate() {
            if is_joined(index) {
                sets.join(segment.ends[0].index(), segment.ends[1].index());
            }
        }
        let (part_of_node, n_parts) = sets.numbers();
        let mut nodes = vec![Vec::new(); n_parts];
        for (node, part) in part_of_node.iter().enumerate() {
            nodes[*part].push(NodeId::new(node));
        }
        let mut groups = Sets::new(n_parts);
        for elastic in net.elastic_supports() {
            for pair in elastic.nodes().windows(2) {
                groups.join(part_of_node[pair[0].index()], part_of_node[pair[1].index()]);
            }
        }
        let (group_of_part, n_groups) = groups.numbers();
        let mut so_far = vec![0; n_groups];
        let place_in_group = (group_of_part.iter())
            .map(|group| {
                so_far[*group] += 1;
                so_far[*group] - 1
            })
            .collect();
        Self {
            part_of_node,
            nodes,
            group_of_part,
            place_in_group,
        }
    }

    fn groups<'a>(&'a self, net: &'a Net) -> Vec<Group<'a>> {
        let n_groups = self.group_of_part.iter().map(|g| g + 1).max().unwrap_or(0);
        let mut groups: Vec<Group<'_>> = (0..n_groups)
            .map(|_| Group {
                parts: Vec::new(),
                elastic_supports: Vec::new(),
                all: self,
            })
            .collect();
        for (part, group) in self.group_of_part.iter().enumerate() {
            groups[*group].parts.push(self.nodes[part].clone());
        }
        for elastic in net.elastic_supports() {
            if let Some(first) = elastic.nodes().first() {
                let part = self.part_of_node[first.index()];
                groups[self.group_of_part[part]].elastic_supports.push(elastic);
            }
        }
        groups
    }
}

impl Group<'_> {
    /// Orthonormal basis of the translations of the parts, three rows a part, that nothing resists.
    fn free_translations(&self, structure: &Structure) -> DMatrix<f64> {
        let size = 3 * self.parts.len();
        let mut resistance = DMatrix::zeros(size, size);
        for (part, nodes) in self.parts.iter().enumerate() {
            for node in nodes {
                let free = structure.dofs().directions(*node);
                if free.len() < 3 {
                    let mut held = Matrix3::identity();
                    for direction in free {
                        held -= direction * direction.transpose();
                    }
                    let mut block = resistance.fixed_view_mut::<3, 3>(3 * part, 3 * part);
                    block += held;
                }
            }
        }
        self.add_elastic(&mut resistance);
        let eigen = resistance.symmetric_eigen();
        let largest = eigen.eigenvalues.amax();
        let free: Vec<_> = (eigen.eigenvalues.iter().zip(eigen.eigenvectors.column_iter()))
            .filter(|(value, _)| **value <= NO_RESISTANCE * largest)
            .map(|(_, vector)| vector.into_owned())
            .collect();
        if free.is_empty() {
            DMatrix::zeros(size, 0)
        } else {
            DMatrix::from_columns(&free)
        }
    }

    /// Where a free translation shows most: the node to hold, and along what.
    fn anchor(&self, structure: &Structure, translation: &DVector<f64>) -> Option<Anchor> {
        let part = (0..self.parts.len()).max_by(|a, b| {
            (block(translation, *a).norm())
                .total_cmp(&block(translation, *b).norm())
                .then(b.cmp(a))
        })?;
        let direction = block(translation, part).try_normalize(0.0)?;
        let reach = |node: &NodeId| -> f64 {
            let free = structure.dofs().directions(*node);
            free.iter().map(|d| d.dot(&direction).powi(2)).sum()
        };
        let node = self.parts[part]
            .iter()
            .max_by(|a, b| reach(a).total_cmp(&reach(b)).then(b.cmp(a)))?;
        Some(Anchor { node: *node, direction })
    }

    fn add_elastic(&self, resistance: &mut DMatrix<f64>) {
        let place = |node: &NodeId| self.all.place_in_group[self.all.part_of_node[node.index()]];
        for elastic in &self.elastic_supports {
            // Only the directions matter, so that a soft support counts as much as a stiff one.
            if let [node] = elastic.nodes() {
                let mut block = resistance.fixed_view_mut::<3, 3>(3 * place(node), 3 * place(node));
                block += resisted(elastic.block(0, 0));
                continue;
            }
            let places: Vec<_> = elastic.nodes().iter().map(place).collect();
            let largest = elastic.stiffness().amax();
            if largest == 0.0 {
                continue;
            }
            for (row, a) in places.iter().enumerate() {
                for (column, b) in places.iter().enumerate() {
                    let mut block = resistance.fixed_view_mut::<3, 3>(3 * a, 3 * b);
                    block += elastic.block(row, column) / largest;
                }
            }
        }
    }
}

/// Projection on the directions in which a node on springs is resisted at all: a spring as good as rigid beside a soft
/// one must not hide it.
fn resisted(stiffness: Matrix3<f64>) -> Matrix3<f64> {
    let eigen = stiffness.symmetric_eigen();
    let largest = eigen.eigenvalues.max();
    let mut projection = Matrix3::zeros();
    for (value, along) in eigen.eigenvalues.iter().zip(eigen.eigenvectors.column_iter()) {
        if *value > NO_SPRING * largest {
            projection += along * along.transpose();
        }
    }
    projection
}

/// Disjoint sets with path halving.
struct Sets {
    parent: Vec<usize>,
}

impl Sets {
    fn new(n: usize) -> Self {
        Self {
            parent: (0..n).collect(),
        }
    }

    fn root(&mut self, mut i: usize) -> usize {
        while self.parent[i] != i {
            self.parent[i] = self.parent[self.parent[i]];
            i = self.parent[i];
        }
        i
    }

    /// The smaller root leads, so that numbers follow the order of the members.
    fn join(&mut self, a: usize, b: usize) {
        let (a, b) = (self.root(a), self.root(b));
        self.parent[a.max(b)] = a.min(b);
    }

    /// Number of its set for each member, in order of first members, and how many sets there are.
    fn numbers(mut self) -> (Vec<usize>, usize) {
        let n = self.parent.len();
        let (mut numbers, mut count) = (vec![0; n], 0);
        for i in 0..n {
            let root = self.root(i);
            if root == i {
                numbers[i] = count;
                count += 1;
            } else {
                numbers[i] = numbers[root];
            }
        }
        (numbers, count)
    }
}
