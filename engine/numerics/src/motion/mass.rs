//! Lumped masses.
//!
//! ```text
//! m_i = Σ ½ m L0   over segments at node i (L0 lies in the segment in this state, at the reference temperature)
//!     + attached + skins (a third of each triangle of the fan of a panel, as own weight does) + added
//! M_i = m_i I + Σ m_air A n nᵀ        air goes with a panel across it, not along it
//! ```
//! Velocity is linear in the material coordinate of a straight segment, so that its mass does not change as it stretches or
//! turns.

use nalgebra::{Matrix3, Vector3};

use super::About;
use crate::assembly::Structure;
use crate::load::Surface;
use crate::model::{Area, NodeId, SegmentId, fan};

/// Masses beside those of the net itself.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct MassGiven {
    /// Mass on nodes (kg), zero or more.
    pub nodes: Vec<(NodeId, f64)>,
    /// Mass per unstressed length of segments (kg/m), zero or more.
    pub segments: Vec<(SegmentId, f64)>,
    /// Mass per area of what lies on areas (kg/m², on the area in the reference state), zero or more.
    pub areas: Vec<(Vec<Area>, f64)>,
    /// Mass of air that moves with panels (kg/m² of panel, both faces together), zero or more.
    pub air: f64,
}

/// Mass of every node that moves alike in every direction (kg): that of the net, without what is taken out, and what is given
/// besides; air left out.
#[must_use]
pub fn nodal_masses(structure: &Structure, given: &MassGiven, about: &About<'_>) -> Vec<f64> {
    Masses::new(structure, given, about).alike
}

/// Masses of the nodes.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Masses {
    /// Mass that moves alike in every direction, one a node (kg).
    pub(super) alike: Vec<f64>,
    /// Mass of air, one a node (kg).
    pub(super) air: Vec<Matrix3<f64>>,
}

impl Masses {
    pub(super) fn new(structure: &Structure, given: &MassGiven, about: &About<'_>) -> Self {
        let net = structure.net();
        let n_nodes = net.nodes().len();
        let mut alike: Vec<f64> = net.nodes().iter().map(|node| node.attached_mass).collect();
        let mut per_length: Vec<f64> = (net.segments().iter())
            .map(|segment| segment.section.mass_per_length)
            .collect();
        for (segment, more) in &given.segments {
            per_length[segment.index()] += more;
        }
        for (index, segment) in net.segments().iter().enumerate() {
            if !about.case.removed[index] {
                for node in segment.ends {
                    alike[node.index()] += 0.5 * per_length[index] * about.lying[index];
                }
            }
        }
        let mut per_area = vec![0.0; net.panels().len()];
        for skin in net.skins() {
            skin.panels
                .iter()
                .for_each(|panel| per_area[*panel] += skin.mass_per_area);
        }
        if !given.areas.is_empty() {
            let surface = Surface::new(net, about.reference);
            for (on, more) in &given.areas {
                surface.panels_of(on).for_each(|panel| per_area[panel] += more);
            }
        }
        for (panel, mass) in net.panels().iter().zip(per_area).filter(|(_, mass)| *mass > 0.0) {
            let areas = fan::triangles(&panel.places(about.reference));
            let areas: Vec<f64> = areas.iter().map(Vector3::norm).collect();
            for (corner, area) in panel.corners.iter().zip(fan::to_corners(&areas)) {
                alike[corner.index()] += mass * area;
            }
        }
        for (node, more) in &given.nodes {
            alike[node.index()] += more;
        }
        let mut air = vec![Matrix3::zeros(); n_nodes];
        if given.air > 0.0 {
            for panel in net.panels() {
                let across: Vec<_> = (fan::triangles(&panel.places(about.positions)).iter())
                    .map(|area| match area.norm() {
                        size if size > 0.0 => area * area.transpose() * (given.air / size),
                        _ => Matrix3::zeros(),
                    })
                    .collect();
                for (corner, mass) in panel.corners.iter().zip(fan::to_corners(&across)) {
                    air[corner.index()] += mass;
                }
            }
        }
        Self { alike, air }
    }

    /// The mass matrix by the entries of the pattern (kg).
    pub(super) fn matrix(&self, structure: &Structure) -> Vec<f64> {
        let (dofs, starts) = (structure.dofs(), structure.pattern().column_starts());
        let mut values = vec![0.0; structure.pattern().n_entries()];
        for index in 0..self.alike.len() {
            let node = NodeId::new(index);
            let block = Matrix3::from_diagonal_element(self.alike[index]) + self.air[index];
            let (first, free) = (dofs.first(node), dofs.directions(node));
            for (c, along_c) in free.iter().enumerate() {
                for (r, along_r) in free.iter().enumerate().skip(c) {
                    values[starts[first + c] + r - c] = along_r.dot(&(block * along_c));
                }
            }
        }
        values
    }
}
