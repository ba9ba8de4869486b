//! Mass along the free directions.
//!
//! ```text
//! M = diag(m) + Σ A_i        m alike in every direction, with the diagonal of A;  A_i: air across skins at node i, 3 × 3
//! ```

use nalgebra::{Matrix3, Vector3};

use crate::assembly::Structure;
use crate::model::NodeId;
use crate::motion::mass::Masses;

/// Least over largest mass of a node by direction, below which a direction has none (–).
const NO_MASS: f64 = 1e-12;

/// The mass matrix.
#[derive(Debug)]
pub(super) struct Inertia {
    /// On the diagonal, one a free direction (kg).
    diagonal: Vec<f64>,
    /// Nodes with entries beside it.
    coupled: Vec<Coupled>,
    /// Least mass of every node in any free direction (kg); zero where there is none.
    least: Vec<f64>,
    masses: Masses,
}

/// A node whose mass differs with the direction.
#[derive(Clone, Copy, Debug)]
struct Coupled {
    /// Its first free direction, and how many it has.
    first: usize,
    n: usize,
    /// Mass among its free directions (kg); that of a direction it does not have is 1 on the diagonal.
    mass: Matrix3<f64>,
    inverse: Matrix3<f64>,
}

impl Inertia {
    pub(super) fn new(structure: &Structure, masses: Masses) -> Self {
        let dofs = structure.dofs();
        let mut inertia = Self {
            diagonal: Vec::with_capacity(dofs.len()),
            coupled: Vec::new(),
            least: masses.alike.clone(),
            masses,
        };
        for index in 0..inertia.least.len() {
            let node = NodeId::new(index);
            let (first, free) = (dofs.first(node), dofs.directions(node));
            let (alike, air) = (inertia.masses.alike[index], inertia.masses.air[index]);
            if free.is_empty() || air == Matrix3::zeros() {
                inertia.diagonal.extend(free.iter().map(|_| alike));
                continue;
            }
            let mut mass = Matrix3::identity();
            for (c, along_c) in free.iter().enumerate() {
                for (r, along_r) in free.iter().enumerate() {
                    let own = if r == c { alike } else { 0.0 };
                    mass[(r, c)] = own + along_r.dot(&(air * along_c));
                }
                inertia.diagonal.push(mass[(c, c)]);
            }
            let n = free.len();
            let roots = mass.view((0, 0), (n, n)).clone_owned().symmetric_eigenvalues();
            let (least, largest) = (roots.iter().copied().fold(f64::INFINITY, f64::min), roots.amax());
            inertia.least[index] = if least > NO_MASS * largest { least } else { 0.0 };
            inertia.coupled.push(Coupled {
                first,
                n,
                mass,
                inverse: mass.try_inverse().unwrap_or_default(),
            });
        }
        inertia
    }

    /// Least mass of a node in any free direction (kg); zero where there is none.
    pub(super) fn least(&self, node: usize) -> f64 {
        self.least[node]
    }

    /// Mass of a node in every direction, held ones too (kg).
    pub(super) fn of_node(&self, node: usize) -> Matrix3<f64> {
        Matrix3::from_diagonal_element(self.masses.alike[node]) + self.masses.air[node]
    }

    /// `Σ weight M v` added to a sum.
    pub(super) fn add_product(&self, weight: f64, vector: &[f64], sum: &mut [f64]) {
        for ((sum, mass), v) in sum.iter_mut().zip(&self.diagonal).zip(vector) {
            *sum += weight * mass * v;
        }
        for Coupled { first, n, mass, .. } in &self.coupled {
            for r in 0..*n {
                for c in (0..*n).filter(|c| *c != r) {
                    sum[first + r] += weight * mass[(r, c)] * vector[first + c];
                }
            }
        }
    }

    /// `vᵀ M v`.
    pub(super) fn square(&self, vector: &[f64]) -> f64 {
        let mut sum: f64 = self.diagonal.iter().zip(vector).map(|(mass, v)| mass * v * v).sum();
        for Coupled { first, n, mass, .. } in &self.coupled {
            for r in 0..*n {
                for c in (0..*n).filter(|c| *c != r) {
                    sum += vector[first + r] * mass[(r, c)] * vector[first + c];
                }
            }
        }
        sum
    }

    /// `M⁻¹ r`.
    pub(super) fn divide_into(&self, right_hand_side: &[f64], quotient: &mut [f64]) {
        for ((q, mass), r) in quotient.iter_mut().zip(&self.diagonal).zip(right_hand_side) {
            *q = r / mass;
        }
        for Coupled { first, n, inverse, .. } in &self.coupled {
            let mut right = Vector3::zeros();
            right.as_mut_slice()[..*n].copy_from_slice(&right_hand_side[*first..first + n]);
            let solved = inverse * right;
            quotient[*first..first + n].copy_from_slice(&solved.as_slice()[..*n]);
        }
    }

    /// Adds `weight M` to the entries of the pattern.
    pub(super) fn add_to(&self, structure: &Structure, weight: f64, values: &mut [f64]) {
        // The diagonal is the head of each column.
        let starts = structure.pattern().column_starts();
        for (mass, head) in self.diagonal.iter().zip(starts) {
            values[*head] += weight * mass;
        }
        for Coupled { first, n, mass, .. } in &self.coupled {
            for c in 0..*n {
                for r in c + 1..*n {
                    values[starts[first + c] + r - c] += weight * mass[(r, c)];
                }
            }
        }
    }
}
