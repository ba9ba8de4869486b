//! Stiffness and mass without what has no stiffness, shifts, and counts of roots.
//!
//! ```text
//! S (K − σ M) S = L D Lᵀ,   S = diag(|K| + |σ| M)^−½      negative pivots = roots below σ (Sylvester)
//! ```
//! A floating node, all of whose segments are slack, has zero rows in `K`. Its rows get a stiffness of their own and no mass:
//! no root is left of it, exactly. Directions without mass follow the others at once; they have no root of their own and add
//! nothing to the count while `K` on them alone is positive definite, which is tested first.

use super::modes::{ModesError, Observer, go_on};
use crate::assembly::{Pattern, Structure};
use crate::equilibrium::eigen::largest_on_diagonal;
use crate::equilibrium::linear::Factor;
use crate::model::NodeId;

/// A pivot of the scaled matrix that is smaller does not tell its sign for certain.
const LEAST_PIVOT: f64 = 1e-8;
/// Nor does any where elimination went through larger numbers.
const LARGEST_STEP: f64 = 1e6;
/// Least pivot of the scaled stiffness of what has no mass.
const NO_STIFFNESS: f64 = 1e-11;
/// Rounding of roots over the largest quotient of stiffness and mass on the diagonal.
const ROUNDING: f64 = 1e-11;
/// First shift over the least quotient of stiffness and mass on the diagonal: no lowest root is above that (Rayleigh).
const FIRST_SHIFT: f64 = 1e-4;

/// `K − λ M` over the free directions.
pub(super) struct Pencil<'a> {
    pub(super) pattern: &'a Pattern,
    /// Stiffness by the entries of the pattern (N/m).
    pub(super) stiffness: Vec<f64>,
    /// Mass by the entries of the pattern (kg).
    pub(super) mass: Vec<f64>,
    /// Largest stiffness on the diagonal (N/m).
    pub(super) largest: f64,
    /// Nodes that were taken out because nothing holds them.
    pub(super) floating: Vec<NodeId>,
}

impl<'a> Pencil<'a> {
    pub(super) fn new(structure: &'a Structure, mut stiffness: Vec<f64>, mut mass: Vec<f64>) -> Self {
        let pattern = structure.pattern();
        let (starts, rows) = (pattern.column_starts(), pattern.rows());
        let mut has_stiffness = vec![false; pattern.size()];
        for column in 0..pattern.size() {
            for entry in starts[column]..starts[column + 1] {
                if stiffness[entry] != 0.0 {
                    has_stiffness[column] = true;
                    has_stiffness[rows[entry]] = true;
                }
            }
        }
        let largest = largest_on_diagonal(pattern, &stiffness);
        let mut floating = Vec::new();
        for index in 0..structure.net().nodes().len() {
            let node = NodeId::new(index);
            let first = structure.dofs().first(node);
            let dofs = first..first + structure.dofs().directions(node).len();
            if !dofs.is_empty() && dofs.clone().all(|dof| !has_stiffness[dof]) {
                floating.push(node);
                for dof in dofs {
                    mass[starts[dof]..starts[dof + 1]].fill(0.0);
                    stiffness[starts[dof]] = largest;
                }
            }
        }
        Self {
            pattern,
            stiffness,
            mass,
            largest,
            floating,
        }
    }

    pub(super) fn size(&self) -> usize {
        self.pattern.size()
    }

    pub(super) fn on_diagonal(&self, values: &[f64], dof: usize) -> f64 {
        values[self.pattern.column_starts()[dof]]
    }

    /// `K − σ M` by the entries of the pattern.
    fn shifted(&self, shift: f64) -> Vec<f64> {
        (self.stiffness.iter().zip(&self.mass))
            .map(|(k, m)| k - shift * m)
            .collect()
    }

    /// Factorises `K − σ M`; whether `σ` (rad²/s²) is below every root.
    pub(super) fn take_shift(&self, factor: &mut Factor, shift: f64) -> bool {
        factor.cholesky(&self.shifted(shift)).is_ok()
    }

    /// Positive quotients of stiffness and mass on the diagonal (rad²/s²).
    fn quotients(&self) -> impl Iterator<Item = f64> {
        (0..self.size()).filter_map(|dof| {
            let mass = self.on_diagonal(&self.mass, dof);
            let quotient = self.on_diagonal(&self.stiffness, dof).abs() / mass;
            (mass > 0.0 && quotient > 0.0).then_some(quotient)
        })
    }

    /// What rounding may make of a root that is zero (rad²/s²).
    pub(super) fn rounding(&self) -> f64 {
        ROUNDING * self.quotients().fold(0.0, f64::max)
    }

    /// A shift below every root, with the shifted matrix factorised.
    ///
    /// # Errors
    /// Where numbers are beyond use, or `observe` stops it before a factorisation.
    pub(super) fn shift_below(&self, factor: &mut Factor, observe: Observer<'_>) -> Result<f64, ModesError> {
        let size = (FIRST_SHIFT * self.quotients().fold(f64::INFINITY, f64::min)).max(self.rounding());
        let mut shift = -if size > 0.0 && size.is_finite() { size } else { 1.0 };
        loop {
            go_on(observe)?;
            if self.take_shift(factor, shift) {
                return Ok(shift);
            }
            shift *= 4.0;
            if !shift.is_finite() {
                return Err(ModesError::BeyondUse);
            }
        }
    }

    /// How many roots lie below `limit` (rad²/s²); `None` where a pivot or the growth of the elimination leaves it open.
    pub(super) fn count_below(&self, factor: &mut Factor, limit: f64) -> Option<usize> {
        self.negative_pivots(factor, limit, LEAST_PIVOT)
    }

    /// Whether what has no mass is held by the rest: positive definite on its own.
    ///
    /// The limit of `K + τ M` as `τ` grows.
    pub(super) fn holds_massless(&self, factor: &mut Factor) -> bool {
        let masses = (0..self.size()).map(|dof| self.on_diagonal(&self.mass, dof));
        let least = masses.filter(|mass| *mass > 0.0).fold(f64::INFINITY, f64::min);
        let far = -1e6 * self.largest / least;
        self.negative_pivots(factor, far, NO_STIFFNESS) == Some(0)
    }

    fn negative_pivots(&self, factor: &mut Factor, shift: f64, least_pivot: f64) -> Option<usize> {
        let mut values = self.shifted(shift);
        let scale: Vec<f64> = (0..self.size())
            .map(|dof| {
                let size =
                    self.on_diagonal(&self.stiffness, dof).abs() + shift.abs() * self.on_diagonal(&self.mass, dof);
                if size > 0.0 {
                    size.sqrt().recip()
                } else {
                    self.largest.sqrt().recip()
                }
            })
            .collect();
        let starts = self.pattern.column_starts();
        for column in 0..self.size() {
            let range = starts[column]..starts[column + 1];
            for (value, row) in values[range.clone()].iter_mut().zip(&self.pattern.rows()[range]) {
                *value *= scale[column] * scale[*row];
            }
        }
        let inertia = factor.ldlt(&values).ok()?;
        let is_sure = inertia.smallest.abs() >= least_pivot && inertia.largest <= LARGEST_STEP;
        is_sure.then_some(inertia.negative)
    }
}
