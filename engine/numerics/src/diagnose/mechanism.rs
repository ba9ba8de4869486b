//! A free movement in terms of the net: what moves, what meets there, and what would stop it.

use nalgebra::Vector3;

use crate::equilibrium::stability::FreeMovement;
use crate::model::{Member, Net, NodeId, SegmentId};

/// Members flatter than this (least over largest principal extent of their directions) lie in one plane or line.
const FLAT: f64 = 1e-3;

/// How the members at a node lie, as far as it lets the node move.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Arrangement {
    /// All along one line.
    OneLine {
        /// Direction of the line (unit).
        along: Vector3<f64>,
    },
    /// All in one plane.
    OnePlane {
        /// Normal of the plane (unit).
        normal: Vector3<f64>,
    },
    /// In space: the movement runs through several nodes.
    Space,
}

/// A free movement, described.
#[derive(Clone, Debug, PartialEq)]
pub struct Mechanism {
    /// The node that moves most.
    pub node: NodeId,
    /// How it moves (unit).
    pub direction: Vector3<f64>,
    /// Stiffness against the movement (N/m): negative where compression drives it.
    pub stiffness: f64,
    /// Other nodes that move along, most first.
    pub others: Vec<NodeId>,
    /// Cables that meet at the node, by a segment each.
    pub cables: Vec<SegmentId>,
    /// Struts that meet at the node.
    pub struts: Vec<SegmentId>,
    /// How all of them lie.
    pub arrangement: Arrangement,
    /// Global axis nearest to the movement (0, 1, 2): holding the node along it stops the movement.
    pub axis: usize,
}

/// Describes a free movement at given positions (m).
#[must_use]
pub fn describe(net: &Net, positions: &[Vector3<f64>], movement: &FreeMovement) -> Mechanism {
    let is_strut = |s: &SegmentId| matches!(net.segments()[s.index()].member, Member::Strut(_));
    let (struts, cables): (Vec<SegmentId>, Vec<SegmentId>) = movement.segments.iter().copied().partition(is_strut);
    Mechanism {
        node: movement.nodes[0],
        direction: movement.direction,
        stiffness: movement.stiffness,
        others: movement.nodes[1..].to_vec(),
        cables,
        struts,
        arrangement: arrangement(net, positions, &movement.segments),
        axis: movement.direction.iamax(),
    }
}

fn arrangement(net: &Net, positions: &[Vector3<f64>], segments: &[SegmentId]) -> Arrangement {
    let mut spread = nalgebra::Matrix3::zeros();
    for segment in segments {
        let [a, b] = net.segments()[segment.index()].ends;
        let chord = positions[b.index()] - positions[a.index()];
        if let Some(n) = chord.try_normalize(0.0) {
            spread += n * n.transpose();
        }
    }
    let eigen = spread.symmetric_eigen();
    let mut order = [0, 1, 2];
    order.sort_by(|a, b| eigen.eigenvalues[*a].total_cmp(&eigen.eigenvalues[*b]));
    let extent = order.map(|i| eigen.eigenvalues[i].max(0.0).sqrt());
    let vector = |i: usize| eigen.eigenvectors.column(order[i]).into_owned();
    if extent[1] <= FLAT * extent[2] {
        Arrangement::OneLine { along: vector(2) }
    } else if extent[0] <= FLAT * extent[2] {
        Arrangement::OnePlane { normal: vector(0) }
    } else {
        Arrangement::Space
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::{CableGiven, NetGiven, NodeGiven, Section, StrutGiven, SupportGiven};

    #[test]
    fn a_mast_with_guys_in_its_own_plane() {
        let at = |name: &str, x: f64, z: f64, held: bool| NodeGiven {
            name: name.into(),
            position: Some(Vector3::new(x, 0.0, z)),
            support: held.then(SupportGiven::default),
            attached_mass: 0.0,
        };
        let section = Section {
            axial_stiffness: 1e7,
            mass_per_length: 0.0,
            expansion: 0.0,
            breaking_force: None,
            ..Section::default()
        };
        let cable = |name: &str, a, b| CableGiven {
            name: name.into(),
            path: vec![NodeId::new(a), NodeId::new(b)],
            sections: vec![section],
            ..CableGiven::default()
        };
        let net = Net::new(NetGiven {
            nodes: vec![
                at("foot", 0.0, 0.0, true),
                at("head", 0.0, 5.0, false),
                at("w", -4.0, 0.0, true),
                at("e", 4.0, 0.0, true),
            ],
            cables: vec![cable("gw", 1, 2), cable("ge", 1, 3)],
            struts: vec![StrutGiven {
                name: "mast".into(),
                ends: [NodeId::new(0), NodeId::new(1)],
                section,
            }],
            elastic_supports: vec![],
            ..NetGiven::default()
        })
        .expect("valid");
        let positions: Vec<_> = net.nodes().iter().filter_map(|n| n.position).collect();
        let movement = FreeMovement {
            nodes: vec![NodeId::new(1)],
            direction: Vector3::y(),
            stiffness: -13.0,
            segments: [0, 1, 2].map(SegmentId::new).to_vec(),
        };
        let mechanism = describe(&net, &positions, &movement);
        assert_eq!(mechanism.axis, 1);
        assert_eq!(mechanism.cables, [0, 1].map(SegmentId::new));
        assert_eq!(mechanism.struts, [SegmentId::new(2)]);
        let Arrangement::OnePlane { normal } = mechanism.arrangement else {
            panic!("{:?}", mechanism.arrangement)
        };
        assert!((normal.y.abs() - 1.0).abs() < 1e-12);
    }
}
