//! Loads of the reference state that depend on the areas of panels.

use nalgebra::Vector3;

use super::loads::ShapeLoads;
use super::search::Point;
use crate::model::{Net, fan};

impl ShapeLoads {
    /// Adds what lies on panels at the positions of the point to its forces.
    pub(super) fn add_on_panels(&self, net: &Net, point: &mut Point) {
        for (panel, per_area, per_plan_area) in self.loaded_panels(net) {
            let corners = panel.places(&point.positions);
            let areas = fan::triangles(&corners);
            let up = areas.iter().map(|a| a.z).sum::<f64>().signum();
            let loads: Vec<Vector3<f64>> = areas
                .iter()
                .map(|a| per_area * a.norm() + per_plan_area * (up * a.z))
                .collect();
            for (corner, load) in panel.corners.iter().zip(fan::to_corners(&loads)) {
                point.out_of_balance[corner.index()] += load;
                point.largest_force = point.largest_force.max(load.amax());
            }
        }
    }

    /// Adds the derivative of these loads as the nodes move by `moved` (m), to `change` (N).
    pub(super) fn add_panel_changes(
        &self,
        net: &Net,
        point: &Point,
        moved: &[Vector3<f64>],
        change: &mut [Vector3<f64>],
    ) {
        for (panel, per_area, per_plan_area) in self.loaded_panels(net) {
            let corners = panel.places(&point.positions);
            let areas = fan::triangles(&corners);
            let changes = fan::triangle_changes(&corners, &panel.places(moved));
            let up = areas.iter().map(|a| a.z).sum::<f64>().signum();
            let loads: Vec<Vector3<f64>> = areas
                .iter()
                .zip(&changes)
                .map(|(a, da)| {
                    let size = a.norm();
                    let larger = if size > 0.0 { a.dot(da) / size } else { 0.0 };
                    per_area * larger + per_plan_area * (up * da.z)
                })
                .collect();
            for (corner, load) in panel.corners.iter().zip(fan::to_corners(&loads)) {
                change[corner.index()] += load;
            }
        }
    }

    /// Adds the transposed derivative of these loads, times `forces`, to `change`.
    pub(super) fn add_panel_changes_transposed(
        &self,
        net: &Net,
        point: &Point,
        forces: &[Vector3<f64>],
        change: &mut [Vector3<f64>],
    ) {
        for (panel, per_area, per_plan_area) in self.loaded_panels(net) {
            let corners = panel.places(&point.positions);
            let areas = fan::triangles(&corners);
            let up = areas.iter().map(|a| a.z).sum::<f64>().signum();
            let weights: Vec<Vector3<f64>> = areas
                .iter()
                .zip(fan::from_corners(&panel.places(forces)))
                .map(|(a, force)| {
                    let size = a.norm();
                    let along = if size > 0.0 { a / size } else { Vector3::zeros() };
                    along * per_area.dot(&force) + Vector3::z() * (up * per_plan_area.dot(&force))
                })
                .collect();
            let back = fan::triangle_changes_transposed(&corners, &weights);
            for (corner, back) in panel.corners.iter().zip(back) {
                change[corner.index()] += back;
            }
        }
    }

    fn loaded_panels<'a>(
        &'a self,
        net: &'a Net,
    ) -> impl Iterator<Item = (&'a crate::model::Panel, Vector3<f64>, Vector3<f64>)> + 'a {
        let of = |list: &[Vector3<f64>], panel: usize| list.get(panel).copied().unwrap_or_else(Vector3::zeros);
        let panels = net.panels().iter().enumerate();
        let loads =
            panels.map(move |(index, panel)| (panel, of(&self.per_area, index), of(&self.per_plan_area, index)));
        loads.filter(|(_, a, b)| *a != Vector3::zeros() || *b != Vector3::zeros())
    }
}
