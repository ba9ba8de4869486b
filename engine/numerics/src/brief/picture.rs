//! What one action does to the net in its reference state.

use nalgebra::Vector3;

use super::state::loads;
use super::{Brief, ReferenceOutcome};
use crate::load::{Case, Load, Surface};
use crate::model::{Net, NodeId};

/// A system of forces reduced to the origin.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Resultant {
    /// Sum of the forces (N).
    pub force: Vector3<f64>,
    /// Moment about the origin (N m).
    pub moment: Vector3<f64>,
}

impl Resultant {
    /// Of forces (N) at positions (m).
    pub fn of<'a>(forces: impl IntoIterator<Item = (&'a Vector3<f64>, &'a Vector3<f64>)>) -> Self {
        let mut sum = Self::default();
        for (force, position) in forces {
            sum.force += force;
            sum.moment += position.cross(force);
        }
        sum
    }

    /// The central axis: its point in the plane through `near` (m) across the force, and the moment along it (N m). None
    /// where the force vanishes beside `size` (N), the sum of what it is made of.
    ///
    /// ```text
    /// x = F × M / F² + F (near·F) / F²        moment along = M·F / |F|
    /// ```
    #[must_use]
    pub fn central_axis(&self, near: &Vector3<f64>, size: f64) -> Option<(Vector3<f64>, f64)> {
        let (force, squared) = (&self.force, self.force.norm_squared());
        if squared == 0.0 || squared.sqrt() <= 1e-12 * size {
            return None;
        }
        let foot = force.cross(&self.moment) / squared;
        Some((
            foot + force * (near.dot(force) / squared),
            self.moment.dot(force) / squared.sqrt(),
        ))
    }
}

/// What an action does with the factor 1 in the reference state.
#[derive(Clone, Debug, PartialEq)]
pub struct LoadPicture {
    /// Sum and moment of its forces.
    pub resultant: Resultant,
    /// Point of the central axis beside the mean of the loaded nodes (m), and the moment along it (N m).
    pub axis: Option<(Vector3<f64>, f64)>,
    /// Pressure normal to each panel (Pa), positive on the outer side; empty where there is none.
    pub pressures: Vec<f64>,
    /// Pressure on the area on plan of each panel (Pa), downward positive; empty where there is none.
    pub on_plan: Vec<f64>,
    /// Panels without a value for a pressure on the surface, by index.
    pub without_value: Vec<usize>,
}

impl LoadPicture {
    pub(super) fn new(brief: &Brief, reference: &ReferenceOutcome, surface: &Surface, action: usize) -> Self {
        let net = &brief.net;
        let positions = &reference.state.positions;
        let case = Case::new(net, &reference.state, &brief.actions, &[(action, 1.0)]);
        let forces = forces_at(net, &case, positions);
        let loaded: Vec<&Vector3<f64>> = forces
            .iter()
            .zip(positions)
            .filter(|(force, _)| **force != Vector3::zeros())
            .map(|(_, position)| position)
            .collect();
        let mean = loaded.iter().copied().sum::<Vector3<f64>>() / loaded.len().max(1) as f64;
        let size = forces.iter().map(|force| force.norm()).sum();
        let resultant = Resultant::of(forces.iter().zip(positions));
        let (mut on_plan, mut without_value) = (Vec::new(), vec![false; net.panels().len()]);
        for load in &brief.actions[action].loads {
            match load {
                Load::OnPlan { on, pressure } => {
                    on_plan.resize(net.panels().len(), 0.0);
                    surface.panels_of(on).for_each(|panel| on_plan[panel] += pressure);
                }
                Load::OnSurface {
                    coefficients,
                    elsewhere,
                    ..
                } => {
                    for (panel, without) in without_value.iter_mut().enumerate() {
                        *without |= surface.coefficient(panel, coefficients, *elsewhere).is_none();
                    }
                }
                _ => {}
            }
        }
        Self {
            axis: resultant.central_axis(&mean, size),
            resultant,
            pressures: case.pressures,
            on_plan,
            without_value: (0..without_value.len()).filter(|panel| without_value[*panel]).collect(),
        }
    }
}

/// Every load of a case as forces on nodes at `positions` (m): loads along hanging segments half to each end.
fn forces_at(net: &Net, case: &Case, positions: &[Vector3<f64>]) -> Vec<Vector3<f64>> {
    let mut forces = loads(net, case, positions);
    for (segment, loads) in net.segments().iter().zip(&case.segments).filter(|(s, _)| s.hangs) {
        let half = 0.5 * case.unstressed_lengths[segment.length] * loads.per_length;
        segment
            .ends
            .map(NodeId::index)
            .into_iter()
            .for_each(|end| forces[end] += half);
    }
    forces
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Three parallel forces have their centre of force on the axis; a couple across it adds to the moment along.
    #[test]
    fn the_central_axis_runs_through_the_centre_of_force() {
        let positions = [[0.0, 0.0, 1.0], [6.0, 0.0, 2.0], [0.0, 3.0, 3.0]].map(Vector3::from);
        let forces = [1.0, 2.0, 3.0].map(|size| Vector3::new(0.0, 0.0, -size));
        let mut sum = Resultant::of(forces.iter().zip(&positions));
        let near = Vector3::new(7.0, 7.0, 2.5);
        let (point, along) = sum.central_axis(&near, 6.0).expect("a force");
        assert!((point - Vector3::new(2.0, 1.5, 2.5)).norm() < 1e-14 && along.abs() < 1e-14);
        sum.moment += Vector3::new(0.0, 0.0, 5.0);
        let (again, along) = sum.central_axis(&near, 6.0).expect("a force");
        assert!((again - point).norm() < 1e-14 && (along + 5.0).abs() < 1e-14);
        assert_eq!(Resultant::default().central_axis(&near, 0.0), None);
    }

    /// A pressure on a closed surface has neither force nor moment (divergence theorem); here on a skew octahedron.
    #[test]
    fn a_pressure_all_around_balances_itself() {
        use crate::model::PanelGiven;
        use crate::test_nets::{Sketch, section};
        let mut sketch = Sketch::default();
        for (name, position) in [
            ("e", [2.0, 0.3, 0.1]),
            ("n", [0.2, 1.5, 0.0]),
            ("w", [-1.0, 0.0, 0.4]),
            ("s", [0.1, -2.0, -0.2]),
            ("t", [0.3, 0.2, 1.7]),
            ("b", [0.0, 0.1, -1.1]),
        ] {
            sketch.held(name, position);
        }
        sketch.cable("rope", section(1e6, 0.0), "e n w s e");
        for path in ["e n t", "n w t", "w s t", "s e t", "n e b", "w n b", "s w b", "e s b"] {
            let corners = path.split(' ').map(|name| sketch.id(name)).collect();
            sketch.given.panels.push(PanelGiven {
                name: path.to_owned(),
                corners,
            });
        }
        let net = sketch.net();
        let positions: Vec<_> = net.nodes().iter().filter_map(|n| n.position).collect();
        let case = Case {
            nodal_forces: vec![Vector3::zeros(); net.nodes().len()],
            segments: vec![crate::load::SegmentLoads::default(); net.segments().len()],
            pressures: vec![700.0; 8],
            ..Case::default()
        };
        let forces = forces_at(&net, &case, &positions);
        let sum = Resultant::of(forces.iter().zip(&positions));
        assert!(forces.iter().all(|force| force.norm() > 100.0));
        assert!(sum.force.norm() < 1e-12 * 700.0 && sum.moment.norm() < 1e-12 * 700.0);
        // From inside out against the pressure: the forces on the upper nodes press down.
        assert!(forces[4].z < 0.0 && forces[5].z > 0.0);
    }
}
