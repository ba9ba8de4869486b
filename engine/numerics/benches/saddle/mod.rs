//! The saddle net of the benches.

use nalgebra::{Matrix3, Vector3};
use ropewalk_numerics::equilibrium::Analysis;
use ropewalk_numerics::load::{Case, SegmentLoads};
use ropewalk_numerics::model::{CableGiven, Net, NetGiven, NodeGiven, NodeId, Section, SupportGiven};

/// Side of the square (m).
pub(crate) const SPAN: f64 = 60.0;
const SAG: f64 = 6.0;
const STIFFNESS: f64 = 20.0e6;
const PRESTRESS: f64 = 25.0e3;
const SNOW: f64 = 900.0;

/// The net on its rim, free nodes not yet in place, with corners left out.
pub(crate) fn rim_net(n: usize) -> NetGiven {
    let m = n + 2;
    let h = SPAN / (n + 1) as f64;
    let mut number = vec![usize::MAX; m * m];
    let mut given = NetGiven::default();
    let edge = |k: usize| k == 0 || k == m - 1;
    for i in 0..m {
        for j in (0..m).filter(|j| !(edge(i) && edge(*j))) {
            number[i * m + j] = given.nodes.len();
            let (x, y) = (i as f64 * h - SPAN / 2.0, j as f64 * h - SPAN / 2.0);
            let z = SAG * (x * x - y * y) / (SPAN * SPAN / 4.0);
            given.nodes.push(NodeGiven {
                name: format!("n{i}-{j}"),
                position: Some(Vector3::new(x, y, z)),
                support: (edge(i) || edge(j)).then(SupportGiven::default),
                attached_mass: 0.0,
            });
        }
    }
    let section = Section {
        axial_stiffness: STIFFNESS * h,
        mass_per_length: 0.0,
        expansion: 0.0,
        breaking_force: None,
        ..Section::default()
    };
    let mut rope = |name: String, path: Vec<NodeId>| {
        given.cables.push(CableGiven {
            name,
            sections: vec![section; path.len() - 1],
            path,
            ..CableGiven::default()
        });
    };
    for k in 1..m - 1 {
        rope(
            format!("x{k}"),
            (0..m).map(|i| NodeId::new(number[i * m + k])).collect(),
        );
        rope(
            format!("y{k}"),
            (0..m).map(|j| NodeId::new(number[k * m + j])).collect(),
        );
    }
    given
}

/// Positions in balance with one force density everywhere: one linear system for three directions at once.
pub(crate) fn shape(analysis: &Analysis) -> Vec<Vector3<f64>> {
    let structure = analysis.structure();
    let net = structure.net();
    let blocks = vec![Matrix3::from_diagonal_element(PRESTRESS); net.segments().len()];
    let mut values = vec![0.0; structure.pattern().n_entries()];
    structure.tangent_into(&blocks, &mut values);
    let mut positions: Vec<Vector3<f64>> = net.nodes().iter().map(|n| n.position.expect("given")).collect();
    let mut forces = vec![Vector3::zeros(); positions.len()];
    for segment in net.segments() {
        let [a, b] = segment.ends.map(NodeId::index);
        let pull = (positions[b] - positions[a]) * PRESTRESS;
        forces[a] += pull;
        forces[b] -= pull;
    }
    let mut step = vec![0.0; structure.n_dofs()];
    structure.dofs().components_into(&forces, &mut step);
    let mut factor = analysis.new_factor();
    factor.cholesky(&values).expect("a held net");
    factor.solve_in_place(&mut step);
    structure.dofs().move_nodes(&step, 1.0, &mut positions);
    positions
}

/// Snow on the net.
pub(crate) fn case(net: &Net, positions: &[Vector3<f64>], n: usize) -> Case {
    let h = SPAN / (n + 1) as f64;
    let length = |ends: [NodeId; 2]| (positions[ends[1].index()] - positions[ends[0].index()]).norm();
    let unstressed = net.segments().iter().map(|s| {
        let l = length(s.ends);
        l / (1.0 + PRESTRESS * l / s.section.axial_stiffness)
    });
    let load = |(node, x): (usize, &Vector3<f64>)| {
        let share = if x.x >= 0.0 { 1.0 } else { 0.5 };
        let is_free = net.support_of(NodeId::new(node)).is_none();
        Vector3::new(0.0, 0.0, if is_free { -SNOW * h * h * share } else { 0.0 })
    };
    Case {
        nodal_forces: positions.iter().enumerate().map(load).collect(),
        unstressed_lengths: unstressed.collect(),
        segments: vec![SegmentLoads::default(); net.segments().len()],
        support_movements: vec![Vector3::zeros(); positions.len()],
        removed: vec![false; net.segments().len()],
        ..Case::default()
    }
}

/// Processor time of this process so far (s), in the 10 ms ticks of Linux; zero elsewhere. On a busy machine it is the
/// better measure.
pub(crate) fn processor_seconds() -> f64 {
    let stat = std::fs::read_to_string("/proc/self/stat").unwrap_or_default();
    let after_name = stat.rsplit(')').next().unwrap_or_default();
    let ticks = |field: usize| {
        after_name
            .split_whitespace()
            .nth(field)
            .and_then(|t| t.parse::<f64>().ok())
    };
    (ticks(11).unwrap_or(0.0) + ticks(12).unwrap_or(0.0)) / 100.0
}
