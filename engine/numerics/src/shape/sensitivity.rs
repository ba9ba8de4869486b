//! How a balanced shape and what is wanted of it answer to force densities, and the systems that this takes.
//!
//! ```text
//! J = A S + B,   S = (K − P)⁻¹ F      F: forces by the logarithms of the force densities, a column a family
//! ```
//!
//! `A` and `B` are the derivatives of what is wanted by positions and by force densities. `J` is formed by columns or by
//! rows, whichever are fewer, or only applied: forward by one solve, backward by one with the transposed matrix.

use std::ops::Range;

use nalgebra::{DMatrix, Vector3};

use super::ShapeError;
use super::krylov::gmres;
use super::loads::ShapeLoads;
use super::parts::{Part, Parts};
use super::rows::Slope;
use super::search::{Point, Search};
use crate::assembly::Structure;
use crate::model::NodeId;

/// Right-hand sides that are solved for together: enough to stream the factor seldom, few enough to bound the memory.
const TOGETHER: usize = 32;
/// The same where each of them takes room for a basis.
const TOGETHER_BY_KRYLOV: usize = 8;

/// Whether a system or the transposed one is solved.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Side {
    Plain,
    Transposed,
}

impl Search<'_, '_> {
    /// Derivatives of everything wanted at a balanced point: of `ln (mean T)` of the families that have one wanted, then of
    /// the deviations of the targets, by `ln q` of the families.
    pub(super) fn jacobian(&mut self, point: &Point, densities: &[f64]) -> Result<DMatrix<f64>, ShapeError> {
        self.factorise(point, densities, 0.0)?;
        let slopes = self.slopes(point);
        let n_means = slopes.len() - self.rows.list.len();
        let (rows, n, size) = (slopes.len(), densities.len(), self.structure.n_dofs());
        let mut jacobian = self.direct(&slopes[n_means..], n, n_means);
        let wanted = self.parts.families.iter().enumerate();
        for (row, (column, _)) in wanted.filter(|(_, family)| family.wanted().is_some()).enumerate() {
            jacobian[(row, column)] = 1.0;
        }
        if size == 0 || rows == 0 {
            return Ok(jacobian);
        }
        let together = if self.loads.depend_on_lengths {
            TOGETHER_BY_KRYLOV
        } else {
            TOGETHER
        };
        if rows < n {
            self.add_by_rows(point, densities, &slopes, &mut jacobian, together);
        } else {
            self.add_by_columns(point, densities, &slopes, &mut jacobian, together);
        }
        self.dropped.iter().for_each(|row| jacobian.row_mut(*row).fill(0.0));
        Ok(jacobian)
    }

    fn add_by_columns(
        &mut self,
        point: &Point,
        densities: &[f64],
        slopes: &[Slope],
        jacobian: &mut DMatrix<f64>,
        together: usize,
    ) {
        let (n, size) = (densities.len(), self.structure.n_dofs());
        let n_means = slopes.len() - self.rows.list.len();
        let total: Vec<f64> = (self.parts.families.iter())
            .filter(|family| family.wanted().is_some())
            .map(|family| family.segments.iter().map(|e| point.lengths[*e]).sum())
            .collect();
        let mut nodal = vec![Vector3::zeros(); point.positions.len()];
        for first in (0..n).step_by(together) {
            let columns = first..n.min(first + together);
            let movements = self.sensitivities(point, columns.clone(), densities);
            for (column, movement) in columns.zip(movements.chunks_exact(size)) {
                self.structure.dofs().nodal_into(movement, &mut nodal);
                let families = self.parts.families.iter().filter(|family| family.wanted().is_some());
                for (row, family) in families.enumerate().filter(|(row, _)| total[*row] > 0.0) {
                    let longer: f64 = family.segments.iter().map(|e| self.longer(point, *e, &nodal)).sum();
                    jacobian[(row, column)] += longer / total[row];
                }
                for (row, slope) in slopes.iter().enumerate().skip(n_means) {
                    jacobian[(row, column)] += slope.moves.iter().map(|(node, by)| by.dot(&nodal[*node])).sum::<f64>();
                }
            }
        }
    }

    /// Derivatives of everything wanted by positions and by the force densities of segments.
    pub(super) fn slopes(&self, point: &Point) -> Vec<Slope> {
        let net = self.net();
        let means = self.parts.families.iter().filter(|family| family.wanted().is_some());
        let means = means.map(|family| {
            let total: f64 = family.segments.iter().map(|e| point.lengths[*e]).sum();
            let mut slope = Slope::default();
            for &e in family.segments.iter().filter(|_| total > 0.0) {
                slope.longer(net, point, e, 1.0 / total);
                slope.densities.push((e, point.lengths[e] / total));
            }
            slope
        });
        let rows = self.rows.list.iter();
        let rows = rows.map(|row| self.rows.slope(net, self.parts, point, row));
        let mut slopes: Vec<Slope> = means.chain(rows).collect();
        if let Some(row) = self.dropped {
            slopes[row] = Slope::default();
        }
        slopes
    }

    /// The part of `J` that force densities have without any movement, below `above` empty rows.
    fn direct(&self, slopes: &[Slope], n: usize, above: usize) -> DMatrix<f64> {
        let mut direct = DMatrix::zeros(above + slopes.len(), n);
        for (row, slope) in slopes.iter().enumerate() {
            for (segment, by) in &slope.densities {
                if let Part::Family(family) = self.parts.of[*segment] {
                    direct[(above + row, family)] += by;
                }
            }
        }
        direct
    }

    fn add_by_rows(
        &mut self,
        point: &Point,
        densities: &[f64],
        slopes: &[Slope],
        jacobian: &mut DMatrix<f64>,
        together: usize,
    ) {
        let size = self.structure.n_dofs();
        let forces: Vec<Vec<(usize, Vector3<f64>)>> = (0..densities.len())
            .map(|family| self.forces_of(point, family, densities))
            .collect();
        let mut nodal = vec![Vector3::zeros(); point.positions.len()];
        for first in (0..slopes.len()).step_by(together) {
            let rows = first..slopes.len().min(first + together);
            let mut right_hand_sides = vec![0.0; size * rows.len()];
            for (row, components) in rows.clone().zip(right_hand_sides.chunks_exact_mut(size)) {
                nodal.fill(Vector3::zeros());
                slopes[row].moves.iter().for_each(|(node, by)| nodal[*node] += by);
                self.structure.dofs().components_into(&nodal, components);
            }
            let solved = self.solve(point, right_hand_sides, Side::Transposed);
            for (row, components) in rows.zip(solved.chunks_exact(size)) {
                self.structure.dofs().nodal_into(components, &mut nodal);
                for (column, forces) in forces.iter().enumerate() {
                    jacobian[(row, column)] += forces.iter().map(|(node, f)| f.dot(&nodal[*node])).sum::<f64>();
                }
            }
        }
    }

    /// `J v`, at the point whose stiffness is factorised.
    pub(super) fn forward(&mut self, point: &Point, densities: &[f64], slopes: &[Slope], v: &[f64]) -> Vec<f64> {
        let mut nodal = vec![Vector3::zeros(); point.positions.len()];
        for (family, by) in v.iter().enumerate().filter(|(_, by)| **by != 0.0) {
            for (node, force) in self.forces_of(point, family, densities) {
                nodal[node] += force * *by;
            }
        }
        let mut components = vec![0.0; self.structure.n_dofs()];
        self.structure.dofs().components_into(&nodal, &mut components);
        let movement = self.solve(point, components, Side::Plain);
        self.structure.dofs().nodal_into(&movement, &mut nodal);
        let one = |slope: &Slope| -> f64 {
            let moves: f64 = slope.moves.iter().map(|(node, by)| by.dot(&nodal[*node])).sum();
            let direct = slope.densities.iter().map(|(e, by)| match self.parts.of[*e] {
                Part::Family(family) => by * v[family],
                _ => 0.0,
            });
            moves + direct.sum::<f64>()
        };
        slopes.iter().map(one).collect()
    }

    /// `Jᵀ u`, at the point whose stiffness is factorised.
    pub(super) fn backward(&mut self, point: &Point, densities: &[f64], slopes: &[Slope], u: &[f64]) -> Vec<f64> {
        let mut nodal = vec![Vector3::zeros(); point.positions.len()];
        let mut result = vec![0.0; densities.len()];
        for (slope, by) in slopes.iter().zip(u) {
            slope.moves.iter().for_each(|(node, m)| nodal[*node] += m * *by);
            for (e, m) in &slope.densities {
                if let Part::Family(family) = self.parts.of[*e] {
                    result[family] += m * by;
                }
            }
        }
        let mut components = vec![0.0; self.structure.n_dofs()];
        self.structure.dofs().components_into(&nodal, &mut components);
        let solved = self.solve(point, components, Side::Transposed);
        self.structure.dofs().nodal_into(&solved, &mut nodal);
        for (family, result) in result.iter_mut().enumerate() {
            let forces = self.forces_of(point, family, densities);
            *result += forces.iter().map(|(node, f)| f.dot(&nodal[*node])).sum::<f64>();
        }
        result
    }

    /// Change of the length of a segment as the nodes move, to the first order (m).
    fn longer(&self, point: &Point, segment: usize, nodal: &[Vector3<f64>]) -> f64 {
        let [i, j] = self.net().segments()[segment].ends.map(NodeId::index);
        if point.lengths[segment] > 0.0 {
            point.chords[segment].dot(&(nodal[j] - nodal[i])) / point.lengths[segment]
        } else {
            0.0
        }
    }

    /// Changes of the positions with the logarithms of the force densities of some families, at balance, in the free
    /// directions, one after the other. The stiffness must be that of the point.
    fn sensitivities(&mut self, point: &Point, families: Range<usize>, densities: &[f64]) -> Vec<f64> {
        let size = self.structure.n_dofs();
        let mut right_hand_sides = vec![0.0; size * families.len()];
        let mut change = vec![Vector3::zeros(); point.positions.len()];
        for (family, components) in families.zip(right_hand_sides.chunks_exact_mut(size)) {
            change.fill(Vector3::zeros());
            for (node, force) in self.forces_of(point, family, densities) {
                change[node] += force;
            }
            self.structure.dofs().components_into(&change, components);
        }
        self.solve(point, right_hand_sides, Side::Plain)
    }

    /// Forces on nodes by the logarithm of the force density of a family (N).
    fn forces_of(&self, point: &Point, family: usize, densities: &[f64]) -> Vec<(usize, Vector3<f64>)> {
        let segments = &self.parts.families[family].segments;
        let mut forces = Vec::with_capacity(2 * segments.len());
        for &index in segments {
            let [i, j] = self.net().segments()[index].ends.map(NodeId::index);
            let force = point.chords[index] * densities[family];
            // With more force the same length needs less rope, which weighs less.
            let unstressed = point.unstressed[index];
            let shorter = if unstressed > 0.0 {
                unstressed * (1.0 - unstressed / point.lengths[index])
            } else {
                0.0
            };
            let load = self.loads.per_length[index] * (-0.5 * shorter);
            forces.push((i, force + load));
            forces.push((j, load - force));
        }
        forces
    }

    /// Solves `(K − P) v = b`, or the transposed system, for right-hand sides one after the other, `K` as factorised, `P`
    /// at the point.
    pub(super) fn solve(&mut self, point: &Point, right_hand_sides: Vec<f64>, side: Side) -> Vec<f64> {
        let (structure, parts, loads) = (self.structure, self.parts, self.loads);
        let (factor, values) = (&mut self.factor, &self.values);
        if !loads.depend_on_lengths {
            let mut solutions = right_hand_sides;
            factor.solve_in_place(&mut solutions);
            return solutions;
        }
        gmres(
            structure.n_dofs(),
            |v| {
                let mut product = vec![0.0; v.len()];
                structure.pattern().product_into(values, v, &mut product);
                let change = match side {
                    Side::Plain => load_change(structure, parts, loads, point, v),
                    Side::Transposed => load_change_transposed(structure, parts, loads, point, v),
                };
                product.iter_mut().zip(change).for_each(|(p, c)| *p -= c);
                product
            },
            |v| factor.solve_in_place(v),
            right_hand_sides,
        )
    }
}

/// Derivative of the loads by a movement of the nodes, in the free directions: `P v`.
fn load_change(structure: &Structure, parts: &Parts, loads: &ShapeLoads, point: &Point, movement: &[f64]) -> Vec<f64> {
    let net = structure.net();
    let n_nodes = net.nodes().len();
    let (mut nodal, mut change) = (vec![Vector3::zeros(); n_nodes], vec![Vector3::zeros(); n_nodes]);
    structure.dofs().nodal_into(movement, &mut nodal);
    for (index, segment) in net.segments().iter().enumerate() {
        let (length, plan) = (point.lengths[index], point.chords[index].xy().norm());
        let [i, j] = segment.ends.map(NodeId::index);
        let moved = nodal[j] - nodal[i];
        let mut load = Vector3::zeros();
        if length > 0.0 {
            let longer = point.chords[index].dot(&moved) / length;
            load += loads.per_length[index] * (0.5 * unstressed_slope(parts, point, index) * longer);
        }
        if plan > 0.0 {
            let longer = point.chords[index].xy().dot(&moved.xy()) / plan;
            load += loads.per_plan_length[index] * (0.5 * longer);
        }
        change[i] += load;
        change[j] += load;
    }
    loads.add_panel_changes(net, point, &nodal, &mut change);
    let mut components = vec![0.0; structure.n_dofs()];
    structure.dofs().components_into(&change, &mut components);
    components
}

/// `Pᵀ u`.
fn load_change_transposed(
    structure: &Structure,
    parts: &Parts,
    loads: &ShapeLoads,
    point: &Point,
    forces: &[f64],
) -> Vec<f64> {
    let net = structure.net();
    let n_nodes = net.nodes().len();
    let (mut nodal, mut change) = (vec![Vector3::zeros(); n_nodes], vec![Vector3::zeros(); n_nodes]);
    structure.dofs().nodal_into(forces, &mut nodal);
    for (index, segment) in net.segments().iter().enumerate() {
        let (length, plan) = (point.lengths[index], point.chords[index].xy().norm());
        let [i, j] = segment.ends.map(NodeId::index);
        let both = nodal[i] + nodal[j];
        let mut along = Vector3::zeros();
        if length > 0.0 {
            let by = 0.5 * unstressed_slope(parts, point, index) * loads.per_length[index].dot(&both);
            along += point.chords[index] * (by / length);
        }
        if plan > 0.0 {
            let by = 0.5 * loads.per_plan_length[index].dot(&both) / plan;
            along += Vector3::new(point.chords[index].x, point.chords[index].y, 0.0) * by;
        }
        change[i] -= along;
        change[j] += along;
    }
    loads.add_panel_changes_transposed(net, point, &nodal, &mut change);
    let mut components = vec![0.0; structure.n_dofs()];
    structure.dofs().components_into(&change, &mut components);
    components
}

/// `dL0/dl` at the force density as it is.
fn unstressed_slope(parts: &Parts, point: &Point, segment: usize) -> f64 {
    let stretch = point.lengths[segment] / point.unstressed[segment];
    match parts.of[segment] {
        Part::Elastic(_) => 0.0,
        Part::Balance => 1.0 / stretch,
        Part::Density(_) | Part::Family(_) => 1.0 / (stretch * stretch),
    }
}
