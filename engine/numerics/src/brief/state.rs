//! Everything that is told of a state, worked out from positions and forces.

use nalgebra::Vector3;

use super::{EndForce, Resultant, StateResult, SupportForce};
use crate::element::panel::pressure_forces;
use crate::equilibrium::{MemberStates, audit};
use crate::load::Case;
use crate::model::{AxialLaw, Net, NodeId, SegmentId, fan};

/// Positions and forces as a solver leaves them.
pub(super) struct Bare<'a> {
    pub(super) positions: &'a [Vector3<f64>],
    pub(super) axial_forces: &'a [f64],
    pub(super) members: &'a MemberStates,
    pub(super) loose_nodes: &'a [NodeId],
}

/// Tells everything of a state of `case`, movements from `reference`.
pub(super) fn state_result(net: &Net, case: &Case, reference: &[Vector3<f64>], state: &Bare<'_>) -> StateResult {
    let positions = state.positions;
    let n_segments = net.segments().len();
    let axial_forces = state.axial_forces;
    let MemberStates { pulls, lengths, lying } = state.members;
    let (mut stretches, mut slack) = (vec![0.0; n_segments], vec![false; n_segments]);
    // What the members and loads exert on every node.
    let loads = loads(net, case, positions);
    let mut exerted = loads.clone();
    for (index, segment) in net.segments().iter().enumerate() {
        let [i, j] = segment.ends.map(NodeId::index);
        let strain = segment.section.expansion * case.segments[index].temperature_change;
        let stress_free = lying[index] * (1.0 + strain);
        if !case.removed[index] {
            stretches[index] = lengths[index] / stress_free;
        }
        let is_slack = match segment.law {
            AxialLaw::TwoWay => false,
            // Where the rope slides, rounding of the share must not decide.
            _ if net.slides(SegmentId::new(index)) => axial_forces[index] == 0.0,
            AxialLaw::TensionOnly => lengths[index] <= stress_free,
        };
        slack[index] = !case.removed[index] && is_slack;
        exerted[i] += pulls[index][0];
        exerted[j] += pulls[index][1];
    }
    let support_forces = support_forces(net, case, positions, exerted);
    // What hangs from the ends of a rope pulls at them as its load does, forces and moments alike.
    let hanging = (net.segments().iter().zip(pulls)).filter(|(segment, _)| segment.hangs);
    let hanging = hanging.flat_map(|(segment, pulls)| {
        let at = segment.ends.map(|end| &positions[end.index()]);
        [(&pulls[0], at[0]), (&pulls[1], at[1])]
    });
    let of_loads = Resultant::of(loads.iter().zip(positions).chain(hanging));
    let places = support_forces.iter().map(|s| (&s.force, &positions[s.node.index()]));
    let of_supports = Resultant::of(places);
    let mut supported = vec![false; net.nodes().len()];
    for support in &support_forces {
        supported[support.node.index()] = true;
    }
    let end_forces = net
        .segments()
        .iter()
        .enumerate()
        .flat_map(|(index, segment)| {
            let [from, to] = segment.ends;
            [(from, pulls[index][0]), (to, pulls[index][1])].map(|(node, force)| EndForce {
                node,
                segment: SegmentId::new(index),
                force,
            })
        })
        .filter(|end| supported[end.node.index()])
        .collect();
    StateResult {
        displacements: positions.iter().zip(reference).map(|(x, from)| x - from).collect(),
        positions: positions.to_vec(),
        axial_forces: axial_forces.to_vec(),
        pulls: pulls.clone(),
        stretches,
        slack,
        lengths: lengths.clone(),
        lying: lying.clone(),
        unstressed_lengths: case.unstressed_lengths.clone(),
        end_forces,
        load_sum: loads.iter().sum::<Vector3<f64>>() + hanging_load(net, case),
        load_moment: of_loads.moment,
        support_sum: of_supports.force,
        support_moment: of_supports.moment,
        panel_areas: (net.panels().iter())
            .map(|panel| fan::area(&panel.places(positions)))
            .collect(),
        panel_pressures: if case.pressures.is_empty() {
            vec![0.0; net.panels().len()]
        } else {
            case.pressures.clone()
        },
        support_forces,
        loose_nodes: state.loose_nodes.to_vec(),
        removed: (0..n_segments)
            .filter(|e| case.removed[*e])
            .map(SegmentId::new)
            .collect(),
        ponding: None,
        audit: audit::audit_members(net, case, positions, axial_forces, state.members),
        certificate: None,
        loads,
        diagnosis: None,
        modes: None,
    }
}

/// Sum of the loads along hanging ropes (N): it reaches the nodes by the ends of these.
fn hanging_load(net: &Net, case: &Case) -> Vector3<f64> {
    let segments = net.segments().iter().enumerate();
    segments
        .filter(|(index, segment)| segment.hangs && !case.removed[*index])
        .map(|(index, segment)| case.segments[index].per_length * case.unstressed_lengths[segment.length])
        .sum()
}

/// Load on every node (N): dead forces, and pressure where the panels are now.
pub(super) fn loads(net: &Net, case: &Case, positions: &[Vector3<f64>]) -> Vec<Vector3<f64>> {
    let mut loads = case.nodal_forces.clone();
    let mut corners = Vec::new();
    for (panel, pressure) in net.panels().iter().zip(&case.pressures) {
        corners.clear();
        corners.extend(panel.corners.iter().map(|n| positions[n.index()]));
        let mut forces = vec![Vector3::zeros(); corners.len()];
        pressure_forces(&corners, *pressure, &mut forces);
        for (node, force) in panel.corners.iter().zip(forces) {
            loads[node.index()] += force;
        }
    }
    loads
}

/// `exerted`: loads and member forces on every node (N).
fn support_forces(
    net: &Net,
    case: &Case,
    positions: &[Vector3<f64>],
    mut exerted: Vec<Vector3<f64>>,
) -> Vec<SupportForce> {
    let mut elastic_forces: Vec<Option<Vector3<f64>>> = vec![None; net.nodes().len()];
    let mut elastic_order = Vec::new();
    for elastic in net.elastic_supports() {
        let moved: Vec<Vector3<f64>> = (elastic.nodes().iter().zip(elastic.rest()))
            .map(|(node, rest)| positions[node.index()] - rest - case.support_movements[node.index()])
            .collect();
        for (row, node) in elastic.nodes().iter().enumerate() {
            let force: Vector3<f64> = moved
                .iter()
                .enumerate()
                .map(|(column, m)| -(elastic.block(row, column) * m))
                .sum();
            exerted[node.index()] += force;
            let so_far = elastic_forces[node.index()];
            if so_far.is_none() && net.support_of(*node).is_none() {
                elastic_order.push(*node);
            }
            elastic_forces[node.index()] = Some(so_far.unwrap_or_else(Vector3::zeros) + force);
        }
    }
    let rigid = net.supports().iter().map(|support| {
        let node = support.node();
        let resisted = -support.held_part(&exerted[node.index()]);
        let force = resisted + elastic_forces[node.index()].unwrap_or_else(Vector3::zeros);
        let mut own_axes = [0.0; 3];
        for (component, axis) in own_axes.iter_mut().zip(support.held().iter().chain(support.free())) {
            *component = force.dot(axis);
        }
        SupportForce { node, force, own_axes }
    });
    let elastic = elastic_order.iter().map(|node| {
        let force = elastic_forces[node.index()].expect("listed because it has one");
        SupportForce {
            node: *node,
            force,
            own_axes: force.into(),
        }
    });
    rigid.chain(elastic).collect()
}
