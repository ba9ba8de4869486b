//! A small net and its numbers for the tests of this floor.

use nalgebra::Vector3;

use super::CaseDigest;
use crate::model::{CableGiven, Net, NetGiven, NodeGiven, NodeId, Section, StrutGiven, SupportGiven};

/// Cable 0 with two segments (breaking force 10 kN), cable 1 with one (unknown), one strut.
pub(super) fn net() -> Net {
    let section = |breaking_force| Section {
        axial_stiffness: 1e6,
        mass_per_length: 0.0,
        expansion: 0.0,
        breaking_force,
        ..Section::default()
    };
    let node = |index: u32| NodeGiven {
        name: format!("n{index}"),
        position: Some(Vector3::new(f64::from(index), 0.0, 0.0)),
        support: (index != 1).then(SupportGiven::default),
        attached_mass: 0.0,
    };
    let path = |nodes: &[usize]| nodes.iter().copied().map(NodeId::new).collect();
    Net::new(NetGiven {
        nodes: (0..3).map(node).collect(),
        cables: vec![
            CableGiven {
                name: "known".to_owned(),
                path: path(&[0, 1, 2]),
                sections: vec![section(Some(10_000.0)); 2],
                ..CableGiven::default()
            },
            CableGiven {
                name: "unknown".to_owned(),
                path: path(&[0, 2]),
                sections: vec![section(None)],
                ..CableGiven::default()
            },
        ],
        struts: vec![StrutGiven {
            name: "post".to_owned(),
            ends: [NodeId::new(0), NodeId::new(1)],
            section: section(None),
        }],
        elastic_supports: Vec::new(),
        ..NetGiven::default()
    })
    .expect("a valid net")
}

/// Axial forces in the reference state (N).
pub(super) fn reference_forces() -> [f64; 4] {
    [2000.0, 1000.0, 0.0, -500.0]
}

/// Places in the reference state (m).
pub(super) fn positions() -> Vec<Vector3<f64>> {
    (0..3).map(|index| Vector3::new(f64::from(index), 0.0, 0.0)).collect()
}

/// A sound case with these forces in the cables.
pub(super) fn digest(cable_forces: &[f64; 3]) -> CaseDigest {
    CaseDigest {
        answered: true,
        audited: true,
        axial_forces: cable_forces.iter().copied().chain([-500.0]).collect(),
        displacements: vec![Vector3::z() * 0.01; 3],
        positions: positions(),
        support_forces: vec![
            Some(Vector3::new(6.0, 0.0, 8.0)),
            None,
            Some(Vector3::new(6.0, 0.0, 8.0)),
        ],
        loose_nodes: Vec::new(),
        removed: Vec::new(),
    }
}
