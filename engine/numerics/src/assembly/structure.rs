//! What is worked out once for a net: numbering, pattern, and where each member's stiffness goes.

use std::sync::Arc;

use nalgebra_sparse::{CooMatrix, CsrMatrix};

use super::{Dofs, Pattern};
use crate::model::{Net, NodeId, Reach};

/// A net with its numbering and pattern; shared by every state, case and thread.
#[derive(Clone, Debug)]
pub struct Structure {
    net: Arc<Net>,
    dofs: Dofs,
    pattern: Pattern,
    pub(super) ends: Vec<[u32; 2]>,
    pub(super) couplings: Vec<Coupling>,
    pub(super) elastic: Vec<(usize, f64)>,
    /// One a reach that slides.
    pub(super) slides: Vec<Option<Clique>>,
    /// One a panel.
    pub(super) panels: Vec<Clique>,
}

/// Nodes of which each is coupled to each other.
#[derive(Clone, Debug)]
pub(super) struct Clique {
    /// Each once.
    pub(super) nodes: Vec<NodeId>,
    /// Of every pair `(row, column)` with `row > column`, row by row.
    pub(super) couplings: Vec<Coupling>,
}

impl Clique {
    fn new(dofs: &Dofs, pattern: &Pattern, nodes: Vec<NodeId>) -> Self {
        let pairs = (0..nodes.len()).flat_map(|row| (0..row).map(move |column| (row, column)));
        let couplings = pairs
            .map(|(row, column)| coupling(dofs, pattern, [nodes[row], nodes[column]]))
            .collect();
        Self { nodes, couplings }
    }
}

/// Where the block that couples the two ends of a segment goes.
#[derive(Clone, Copy, Debug)]
pub(super) struct Coupling {
    /// The lower-numbered node owns the columns, the other the rows.
    pub(super) column_node: u32,
    pub(super) row_node: u32,
    /// Position of the first row of the block in each of its columns.
    pub(super) positions: [usize; 3],
    pub(super) shape: Shape,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Shape {
    /// Both nodes move along the global axes.
    BothFree,
    /// At least one end is held or moves along skew directions.
    Mixed,
}

impl Structure {
    /// Numbers the net and finds the pattern of its matrices.
    #[must_use]
    pub fn new(net: Arc<Net>) -> Self {
        Self::keeping(net, &[])
    }

    /// The same for a net of which some more nodes are kept in place, whatever holds them.
    #[must_use]
    pub fn keeping(net: Arc<Net>, kept: &[NodeId]) -> Self {
        let dofs = Dofs::new(&net, kept);
        let sizes: Vec<usize> = (0..net.nodes().len())
            .map(|node| dofs.directions(NodeId::new(node)).len())
            .collect();
        let pattern = Pattern::new(&sizes, &node_graph(&net));
        let ends = net
            .segments()
            .iter()
            .map(|s| s.ends.map(|n| u32::try_from(n.index()).expect("an id fits 32 bits")))
            .collect();
        let couplings = net
            .segments()
            .iter()
            .map(|segment| coupling(&dofs, &pattern, segment.ends))
            .collect();
        let elastic = elastic_entries(&net, &dofs, &pattern);
        let slides = (net.reaches().iter())
            .map(|reach| {
                reach
                    .slides()
                    .then(|| Clique::new(&dofs, &pattern, nodes_along(&net, reach)))
            })
            .collect();
        let panels = (net.panels().iter())
            .map(|panel| Clique::new(&dofs, &pattern, panel.corners.clone()))
            .collect();
        Self {
            net,
            dofs,
            pattern,
            ends,
            couplings,
            elastic,
            slides,
            panels,
        }
    }

    /// The net.
    #[must_use]
    pub fn net(&self) -> &Arc<Net> {
        &self.net
    }

    /// Its free directions.
    #[must_use]
    pub fn dofs(&self) -> &Dofs {
        &self.dofs
    }

    /// Number of free directions.
    #[must_use]
    pub fn n_dofs(&self) -> usize {
        self.dofs.len()
    }

    /// Pattern of matrices with one row a node, held nodes too, coupled as the net couples them.
    #[must_use]
    pub fn node_pattern(&self) -> Pattern {
        Pattern::new(&vec![1; self.net.nodes().len()], &node_graph(&self.net))
    }

    /// Where its matrices have entries.
    #[must_use]
    pub fn pattern(&self) -> &Pattern {
        &self.pattern
    }
}

/// Nodes of a reach, each once, in path order.
fn nodes_along(net: &Net, reach: &Reach) -> Vec<NodeId> {
    let mut nodes = Vec::new();
    for segment in &net.segments()[reach.segments.clone()] {
        for node in segment.ends {
            if !nodes.contains(&node) {
                nodes.push(node);
            }
        }
    }
    nodes
}

/// Nodes coupled by segments, `|C|ᵀ|C|`, by sliding ropes, panels and elastic supports.
fn node_graph(net: &Net) -> CsrMatrix<f64> {
    let mut incidence = net.branch_node_matrix().clone();
    incidence.values_mut().iter_mut().for_each(|v| *v = v.abs());
    let mut graph = incidence.transpose() * &incidence;
    let mut coupled = CooMatrix::new(graph.nrows(), graph.ncols());
    for elastic in net.elastic_supports() {
        for (row, a) in elastic.nodes().iter().enumerate() {
            for (column, b) in elastic.nodes().iter().enumerate() {
                if row != column && elastic.block(row, column).amax() > 0.0 {
                    coupled.push(a.index(), b.index(), 1.0);
                }
            }
        }
    }
    let sliding = net.reaches().iter().filter(|reach| reach.slides());
    let cliques = sliding.map(|reach| nodes_along(net, reach));
    for nodes in cliques.chain(net.panels().iter().map(|panel| panel.corners.clone())) {
        for a in &nodes {
            for b in nodes.iter().filter(|b| *b != a) {
                coupled.push(a.index(), b.index(), 1.0);
            }
        }
    }
    if coupled.nnz() > 0 {
        graph = graph + CsrMatrix::from(&coupled);
    }
    graph
}

fn coupling(dofs: &Dofs, pattern: &Pattern, ends: [NodeId; 2]) -> Coupling {
    let (column_node, row_node) = if ends[0] < ends[1] {
        (ends[0], ends[1])
    } else {
        (ends[1], ends[0])
    };
    let (columns, rows) = (dofs.directions(column_node).len(), dofs.directions(row_node).len());
    let mut positions = [0; 3];
    if rows > 0 {
        for (offset, position) in positions.iter_mut().enumerate().take(columns) {
            *position = pattern
                .position(dofs.first(row_node), dofs.first(column_node) + offset)
                .expect("the graph has an edge for each segment");
        }
    }
    let along_axes = |node| {
        let free = dofs.directions(node);
        free.len() == 3 && free.iter().enumerate().all(|(axis, f)| f[axis] == 1.0)
    };
    Coupling {
        column_node: u32::try_from(column_node.index()).expect("an id fits 32 bits"),
        row_node: u32::try_from(row_node.index()).expect("an id fits 32 bits"),
        positions,
        shape: if along_axes(column_node) && along_axes(row_node) {
            Shape::BothFree
        } else {
            Shape::Mixed
        },
    }
}

/// Entries of the matrices of all elastic supports, in the free directions.
fn elastic_entries(net: &Net, dofs: &Dofs, pattern: &Pattern) -> Vec<(usize, f64)> {
    let mut entries = Vec::new();
    for elastic in net.elastic_supports() {
        for (i, a) in elastic.nodes().iter().enumerate() {
            for (j, b) in elastic.nodes().iter().enumerate() {
                let block = elastic.block(i, j);
                for (r, along_a) in dofs.directions(*a).iter().enumerate() {
                    for (c, along_b) in dofs.directions(*b).iter().enumerate() {
                        let (row, column) = (dofs.first(*a) + r, dofs.first(*b) + c);
                        let value = along_a.dot(&(block * along_b));
                        if row >= column && value != 0.0 {
                            let position = pattern
                                .position(row, column)
                                .expect("the graph has an edge for each coupling");
                            entries.push((position, value));
                        }
                    }
                }
            }
        }
    }
    entries
}

#[cfg(test)]
mod tests {
    use nalgebra::{DMatrix, Vector3};

    use super::*;
    use crate::assembly::{Loading, Response};
    use crate::load::{Case, SegmentLoads};
    use crate::model::{CableGiven, ElasticSupportGiven, NetGiven, NodeGiven, Section, StrutGiven, SupportGiven};

    /// Free, skew, sprung and held nodes; ropes, one of them slack, and a strut.
    fn net() -> Net {
        let at = |x: f64, y: f64, z: f64, released: Option<Vec<Vector3<f64>>>| NodeGiven {
            name: format!("{x} {y}"),
            position: Some(Vector3::new(x, y, z)),
            support: released.map(|released| SupportGiven { released }),
            attached_mass: 0.0,
        };
        let section = Section {
            axial_stiffness: 2e5,
            mass_per_length: 0.0,
            expansion: 0.0,
            breaking_force: None,
            ..Section::default()
        };
        let cable = |a, b| CableGiven {
            name: format!("{a}-{b}"),
            path: vec![NodeId::new(a), NodeId::new(b)],
            sections: vec![section],
            ..CableGiven::default()
        };
        let half = DMatrix::from_fn(6, 6, |i, j| ((3 * i + 5 * j) % 7) as f64);
        Net::new(NetGiven {
            nodes: vec![
                at(0.0, 0.0, 0.0, Some(vec![])),
                at(2.0, 0.1, 0.3, None),
                at(2.2, 1.9, -0.2, Some(vec![Vector3::new(1.0, 0.5, 0.2)])),
                at(0.1, 2.1, 0.4, None),
                at(1.0, 1.0, 1.0, Some(vec![Vector3::new(0.0, 1.0, 1.0), Vector3::x()])),
            ],
            cables: vec![
                cable(0, 1),
                cable(2, 1),
                cable(2, 3),
                cable(3, 0),
                cable(4, 1),
                cable(2, 4),
                cable(1, 3),
            ],
            struts: vec![StrutGiven {
                name: "strut".into(),
                ends: [NodeId::new(3), NodeId::new(4)],
                section,
            }],
            elastic_supports: vec![ElasticSupportGiven {
                nodes: vec![NodeId::new(3), NodeId::new(1)],
                stiffness: &half * half.transpose() * 50.0,
            }],
            ..NetGiven::default()
        })
        .expect("valid")
    }

    #[test]
    fn tangent_is_the_negative_slope_of_the_residual() {
        let structure = Structure::new(Arc::new(net()));
        let n_segments = structure.net().segments().len();
        let positions: Vec<_> = structure.net().nodes().iter().filter_map(|n| n.position).collect();
        let mut case = Case {
            nodal_forces: vec![Vector3::new(10.0, 20.0, -30.0); positions.len()],
            unstressed_lengths: vec![1.3; structure.net().n_lengths()],
            segments: vec![SegmentLoads::default(); n_segments],
            support_movements: vec![Vector3::new(0.01, 0.0, 0.02); positions.len()],
            removed: vec![false; n_segments],
            ..Case::default()
        };
        case.unstressed_lengths[1] = 4.0;
        case.unstressed_lengths[7] = 4.0;
        let loading = Loading::new(&structure, &case, &case.unstressed_lengths, 1.0).expect("fits");
        let mut response = Response::new(&structure);
        structure.response_into(&loading, &positions, &mut response);
        assert_eq!(response.axial_forces[1], 0.0);
        assert!(response.axial_forces[7] < 0.0);
        let blocks: Vec<_> = (loading.bars.iter().zip(&response.chords))
            .map(|(bar, chord)| bar.stiffness_block(chord))
            .collect();
        let mut values = vec![0.0; structure.pattern().n_entries()];
        structure.tangent_into(&blocks, &mut values);
        structure.add_elastic_supports(&mut values);
        let tangent = DMatrix::from(&structure.pattern().full_matrix(&values));
        assert_eq!(structure.n_dofs(), 9);
        for column in 0..structure.n_dofs() {
            let mut residual = |h: f64| {
                let mut unit = vec![0.0; structure.n_dofs()];
                unit[column] = h;
                let mut moved = positions.clone();
                structure.dofs().move_nodes(&unit, 1.0, &mut moved);
                structure.response_into(&loading, &moved, &mut response);
                response.residual.clone()
            };
            let h = 1e-3;
            let sides = [residual(h), residual(-h), residual(2.0 * h), residual(-2.0 * h)];
            for row in 0..structure.n_dofs() {
                let slope = (8.0 * (sides[0][row] - sides[1][row]) - (sides[2][row] - sides[3][row])) / (12.0 * h);
                let error = (tangent[(row, column)] + slope).abs();
                assert!(error <= 1e-8 * tangent.amax(), "{row} {column}: {error}");
            }
        }
    }
}
