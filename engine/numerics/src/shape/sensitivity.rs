//! How a balanced shape and its tensions answer to force densities, and the systems that this takes.

use std::ops::Range;

use nalgebra::{DMatrix, Vector3};

use super::ShapeError;
use super::krylov::gmres;
use super::loads::ShapeLoads;
use super::parts::{Part, Parts};
use super::search::{Point, Search};
use crate::assembly::Structure;
use crate::model::NodeId;

/// Right-hand sides that are solved for together: enough to stream the factor seldom, few enough to bound the memory.
const TOGETHER: usize = 32;
/// The same where each of them takes room for a basis.
const TOGETHER_BY_KRYLOV: usize = 8;

impl Search<'_, '_> {
    /// `∂ ln (mean T) / ∂ ln q` at a balanced point, families by families.
    pub(super) fn jacobian(&mut self, point: &Point, densities: &[f64]) -> Result<DMatrix<f64>, ShapeError> {
        self.factorise(point, densities, 0.0)?;
        let (n, size) = (densities.len(), self.structure.n_dofs());
        let total: Vec<f64> = (self.parts.families.iter())
            .map(|family| family.segments.iter().map(|e| point.lengths[*e]).sum())
            .collect();
        let mut jacobian = DMatrix::identity(n, n);
        if size == 0 {
            return Ok(jacobian);
        }
        let together = if self.loads.depend_on_lengths {
            TOGETHER_BY_KRYLOV
        } else {
            TOGETHER
        };
        let mut nodal = vec![Vector3::zeros(); point.positions.len()];
        for first in (0..n).step_by(together) {
            let columns = first..n.min(first + together);
            let movements = self.sensitivities(point, columns.clone(), densities);
            for (column, movement) in columns.zip(movements.chunks_exact(size)) {
                self.structure.dofs().nodal_into(movement, &mut nodal);
                for (row, family) in self
                    .parts
                    .families
                    .iter()
                    .enumerate()
                    .filter(|(row, _)| total[*row] > 0.0)
                {
                    let longer: f64 = family.segments.iter().map(|e| self.longer(point, *e, &nodal)).sum();
                    jacobian[(row, column)] += longer / total[row];
                }
            }
        }
        Ok(jacobian)
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
            for &index in &self.parts.families[family].segments {
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
                change[i] += force + load;
                change[j] += load - force;
            }
            self.structure.dofs().components_into(&change, components);
        }
        self.solve(point, right_hand_sides)
    }

    /// Solves `(K − P) v = b` for right-hand sides one after the other, `K` as factorised, `P` at the point.
    pub(super) fn solve(&mut self, point: &Point, right_hand_sides: Vec<f64>) -> Vec<f64> {
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
                let change = load_change(structure, parts, loads, point, v);
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

/// `dL0/dl` at the force density as it is.
fn unstressed_slope(parts: &Parts, point: &Point, segment: usize) -> f64 {
    let stretch = point.lengths[segment] / point.unstressed[segment];
    match parts.of[segment] {
        Part::Elastic(_) => 0.0,
        Part::Balance => 1.0 / stretch,
        Part::Density(_) | Part::Family(_) => 1.0 / (stretch * stretch),
    }
}
