//! How far nodes can move for a given excess of energy.

use super::super::Analysis;
use super::super::linear::Factor;
use crate::model::{ElasticSupport, NodeId};

/// Up to this many nodes each flexibility is solved for; in larger nets a bound from one solve serves all.
const EACH: usize = 150;
/// Components below this count as none: rounding of a direction.
const NO_COMPONENT: f64 = 1e-12;

/// Largest diagonal entry of `D_lo⁻¹` over the three axes, by node: `|x − x*|² ≤ 2 G f` for an excess of energy `G`.
pub(super) struct Places {
    /// `f` (m/N); zero where a node is held, `None` where its place is not bounded.
    pub(super) flexibilities: Vec<Option<f64>>,
}

/// What is known along one axis.
#[derive(Clone, Debug, PartialEq)]
struct Axis {
    /// Whether the node can not move along it.
    held: Vec<bool>,
    /// Stiffness of a spring along it (N/m).
    springs: Vec<f64>,
}

impl Places {
    /// `densities`: least force density of each segment (N/m), zero or more.
    ///
    /// Along each axis the matrix is that of a network of resistances: its inverse has no negative entry, so that the sum
    /// along a row bounds the entry on the diagonal. In a large net one solve with a vector of ones thus serves all nodes.
    pub(super) fn new(analysis: &Analysis, densities: &[f64], elastic: &[ElasticSupport]) -> Self {
        let axes = [0, 1, 2].map(|axis| Axis::new(analysis, elastic, axis));
        let mut flexibilities = along(analysis, densities, &axes[0]);
        for axis in 1..3 {
            if axes[axis] == axes[axis - 1] {
                continue;
            }
            for (all, one) in flexibilities.iter_mut().zip(along(analysis, densities, &axes[axis])) {
                *all = all.zip(one).map(|(a, b)| a.max(b));
            }
        }
        Self { flexibilities }
    }
}

impl Axis {
    fn new(analysis: &Analysis, elastic: &[ElasticSupport], axis: usize) -> Self {
        let dofs = analysis.structure().dofs();
        let n = analysis.structure().net().nodes().len();
        let stands = |node: usize| {
            let free = dofs.directions(NodeId::new(node));
            free.iter().all(|direction| direction[axis].abs() <= NO_COMPONENT)
        };
        let mut springs = vec![0.0; n];
        for support in elastic {
            // A matrix that couples nodes may be soft in some joint movement; it is left out.
            if let [node] = support.nodes() {
                let block = support.block(0, 0);
                let coupling = block - nalgebra::Matrix3::from_diagonal(&block.diagonal());
                springs[node.index()] += if coupling.amax() == 0.0 {
                    block[(axis, axis)]
                } else {
                    block.symmetric_eigenvalues().min().max(0.0)
                };
            }
        }
        Self {
            held: (0..n).map(stands).collect(),
            springs,
        }
    }
}

/// Flexibilities along one axis.
fn along(analysis: &Analysis, densities: &[f64], axis: &Axis) -> Vec<Option<f64>> {
    let net = analysis.structure().net();
    let n = net.nodes().len();
    let bounded = led_to_support(analysis, densities, axis);
    let graph = analysis.node_graph();
    let starts = graph.pattern.column_starts();
    let mut values = vec![0.0; graph.pattern.n_entries()];
    let moves = |node: usize| bounded[node] && !axis.held[node];
    for node in 0..n {
        values[starts[node]] = if moves(node) { axis.springs[node] } else { 1.0 };
    }
    for (segment, q) in net.segments().iter().zip(densities) {
        let [i, j] = segment.ends.map(NodeId::index);
        if *q == 0.0 || i == j {
            continue;
        }
        for node in [i, j] {
            if moves(node) {
                values[starts[node]] += q;
            }
        }
        if moves(i) && moves(j) {
            let position = graph
                .pattern
                .position(i.max(j), i.min(j))
                .expect("segments join their ends");
            values[position] -= q;
        }
    }
    let mut factor = Factor::new(graph.symbolic.clone());
    if factor.cholesky(&values).is_err() {
        return (0..n).map(|node| axis.held[node].then_some(0.0)).collect();
    }
    let mut ones = vec![1.0; n];
    (0..n).for_each(|node| ones[node] = f64::from(u8::from(moves(node))));
    factor.solve_in_place(&mut ones);
    let n_moving = (0..n).filter(|node| moves(*node)).count();
    if n_moving <= EACH {
        let mut unit = vec![0.0; n];
        for node in (0..n).filter(|node| moves(*node)) {
            unit.fill(0.0);
            unit[node] = 1.0;
            factor.solve_in_place(&mut unit);
            ones[node] = unit[node];
        }
    }
    (0..n)
        .map(|node| {
            if axis.held[node] {
                Some(0.0)
            } else {
                (bounded[node] && ones[node].is_finite()).then_some(ones[node])
            }
        })
        .collect()
}

/// Whether segments with a force density lead a node to one that is held or sprung along the axis.
fn led_to_support(analysis: &Analysis, densities: &[f64], axis: &Axis) -> Vec<bool> {
    let net = analysis.structure().net();
    let n = net.nodes().len();
    let mut neighbours = vec![Vec::new(); n];
    for (segment, q) in net.segments().iter().zip(densities) {
        if *q > 0.0 {
            let [i, j] = segment.ends.map(NodeId::index);
            neighbours[i].push(j);
            neighbours[j].push(i);
        }
    }
    let mut led: Vec<bool> = (0..n).map(|node| axis.held[node] || axis.springs[node] > 0.0).collect();
    let mut open: Vec<usize> = (0..n).filter(|node| led[*node]).collect();
    while let Some(node) = open.pop() {
        for &other in &neighbours[node] {
            if !led[other] {
                led[other] = true;
                open.push(other);
            }
        }
    }
    led
}
