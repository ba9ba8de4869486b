//! How far a balanced state can be from the true one: bounds that need no knowledge of the true one.
//!
//! The energy of ropes under dead loads is convex, so that any forces `v` in balance with the loads bound it from below:
//!
//! ```text
//! Π(x) = Σ ψ(d_e) − p·x + ½ Σ u·S u        ψ(d) = (k/2) max(0, |d| − a)²,   ψ*(v) = a |v| + |v|²/(2k)
//! D(v, ρ) ≤ Π* ≤ Π(x)                       for every x, and every v, ρ in balance with p
//! gap = Π(x) − D = Σ gap_e + Σ ½ y·S y      each term ≥ 0, and formed without a difference of like numbers
//! ```
//!
//! The forces in balance are those of the state, corrected by a Newton step read as forces: `K y = r`,
//! `δ_e = K_e (C y)_e`, `ρ = S (u + y)`. What rounding leaves out of balance, `r`, enters as `Σ |r_i| Y_i` with bounds `Y`
//! on the distance of nodes from their true place. From the gap `g` follow
//!
//! ```text
//! forces      |T − T*| ≤ √(2 k g)
//! positions   |x_i − x_i*| ≤ √(2 g (D_lo⁻¹)_ii),   D_lo = Cᵀ diag(q_lo) C,   q_lo = t/(a (1 + t/EA)),   t = max(0, T − √(2 k g))
//! ```
//!
//! With struts the energy is not convex. Then their end forces are taken as dead loads, and the bounds tell of the ropes
//! under these; but where all struts pull they are as good as ropes.
//!
//! # Reference
//! Rockafellar 1970 for the duality; the bounds are derived in the text above.

mod gap;
mod places;

use std::fmt;

use nalgebra::{Matrix3, Vector3};

use super::run::anchor_entries;
use super::{Analysis, existence};
use crate::assembly::{Loading, LoadingError, Response, Structure};
use crate::element::axial_block;
use crate::load::Case;
use crate::model::{AxialLaw, NodeId};
use places::Places;

/// Gap over strain energy up to which a state counts as certified.
const CERTIFIED: f64 = 1e-9;
/// Isotropic stiffness of a segment over its axial stiffness, so that forces can be balanced where nothing is stiff;
/// raised where rounding still breaks a pivot.
const SMALLEST_STIFFNESS: [f64; 3] = [1e-11, 1e-9, 1e-6];
/// Corrections of the forces: the first takes what is out of balance, the others what rounding left of it.
const CORRECTIONS: usize = 3;

/// Something that was held fixed as found.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Condition {
    /// Forces of struts.
    Struts,
}

impl fmt::Display for Condition {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Self::Struts => {
                "with the forces of the struts as found: another state with other strut forces is not excluded"
            }
        })
    }
}

/// What a certificate is worth.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Kind {
    /// Against every state that the net can take.
    Full,
    /// Against states in which these stay as found; the state itself was found stable.
    Conditional(Vec<Condition>),
}

/// How far the distance of nodes from their true place was bounded, for what rounding leaves out of balance.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Reach {
    /// By the bounds on positions, themselves found on the assumption that no node is farther away than the net is wide.
    Positions,
    /// Some node with a force left has no bound: it was taken to be no farther away than the net is wide.
    Width,
}

/// How far a state can be from the true one.
#[derive(Clone, Debug, PartialEq)]
pub struct Certificate {
    /// What it is worth.
    pub kind: Kind,
    /// By how much the energy can be above the least one (J), `leftover` included.
    pub gap: f64,
    /// Share of the gap for what rounding leaves out of balance (J).
    pub leftover: f64,
    /// How that share was bounded.
    pub reach: Reach,
    /// Strain energy of the ropes (J).
    pub strain_energy: f64,
    /// Whether the gap is at most 1e-9 of the strain energy.
    pub certified: bool,
    /// By how much the axial force of each segment can be wrong (N); zero where it is taken out, and for struts whose
    /// force is a condition.
    pub force_bounds: Vec<f64>,
    /// By how much each node can be out of place (m); zero where it is held, `None` where taut ropes do not lead to enough
    /// support.
    pub position_bounds: Vec<Option<f64>>,
}

impl Certificate {
    /// Largest bound on an axial force (N).
    #[must_use]
    pub fn largest_force_bound(&self) -> f64 {
        self.force_bounds.iter().copied().fold(0.0, f64::max)
    }

    /// Largest bound on a position among the nodes that have one (m).
    #[must_use]
    pub fn largest_position_bound(&self) -> f64 {
        self.position_bounds.iter().flatten().copied().fold(0.0, f64::max)
    }

    /// Nodes without a bound on their position.
    #[must_use]
    pub fn n_without_bound(&self) -> usize {
        self.position_bounds.iter().filter(|bound| bound.is_none()).count()
    }
}

/// Certifies a state of a case.
///
/// `case`: with the loads that the state carries. `positions`: one a node (m), held nodes where the case puts them.
/// `axial_forces`: as told, one a segment (N); what they differ from the law at these positions is added to their bounds.
///
/// `None` where no forces in balance were found, so that nothing can be said, and for nets that are not made of straight
/// members between clamped nodes.
///
/// # Errors
/// [`LoadingError`] if the case does not fit the net.
pub fn certificate(
    analysis: &Analysis,
    case: &Case,
    positions: &[Vector3<f64>],
    axial_forces: &[f64],
) -> Result<Option<Certificate>, LoadingError> {
    let structure = analysis.structure();
    if !structure.net().is_plain() || case.pressures.iter().any(|p| *p != 0.0) {
        return Ok(None);
    }
    let loading = Loading::new(structure, case, &case.unstressed_lengths, 1.0)?;
    let mut response = Response::new(structure);
    structure.response_into(&loading, positions, &mut response);
    let state = State {
        analysis,
        positions,
        response: &response,
        told: axial_forces,
    };
    let is_strut = |e: &usize| loading.bars[*e].law == AxialLaw::TwoWay;
    let struts: Vec<usize> = (0..loading.bars.len()).filter(is_strut).collect();
    if struts.iter().all(|e| response.axial_forces[*e] > 0.0)
        && let Some(certificate) = state.certificate(&loading, Kind::Full)
        && struts
            .iter()
            .all(|e| response.axial_forces[*e] > certificate.force_bounds[*e])
    {
        return Ok(Some(certificate));
    }
    if struts.is_empty() {
        return Ok(None);
    }
    let frozen = with_frozen_struts(structure, &loading, &response);
    Ok(state.certificate(&frozen, Kind::Conditional(vec![Condition::Struts])))
}

/// The same loading with the end forces of all struts as dead loads.
fn with_frozen_struts(structure: &Structure, loading: &Loading, response: &Response) -> Loading {
    let mut frozen = loading.clone();
    for (index, segment) in structure.net().segments().iter().enumerate() {
        if loading.bars[index].law == AxialLaw::TwoWay {
            frozen.bars[index] = crate::element::Bar::absent();
            let force = along(response, index) * response.axial_forces[index];
            frozen.nodal_forces[segment.ends[0].index()] += force;
            frozen.nodal_forces[segment.ends[1].index()] -= force;
        }
    }
    frozen
}

/// Direction of a segment (unit); zero where it has no length.
fn along(response: &Response, segment: usize) -> Vector3<f64> {
    let length = response.lengths[segment];
    if length > 0.0 {
        response.chords[segment] / length
    } else {
        Vector3::zeros()
    }
}

/// Forces in balance with the loads, told from those of the state.
struct Balanced {
    /// Beyond the axial force, one a segment (N).
    beyond: Vec<Vector3<f64>>,
    /// Movement whose elastic support forces are beyond those of the state, one a node (m).
    movement: Vec<Vector3<f64>>,
    /// What is still out of balance, one a node (N); zero in held directions.
    left: Vec<Vector3<f64>>,
}

struct State<'a> {
    analysis: &'a Analysis,
    positions: &'a [Vector3<f64>],
    response: &'a Response,
    told: &'a [f64],
}

impl State<'_> {
    fn certificate(&self, loading: &Loading, kind: Kind) -> Option<Certificate> {
        let structure = self.analysis.structure();
        let balanced = self.balance(loading)?;
        let (mut gap, mut strain_energy) = (0.0, 0.0);
        for (index, bar) in loading.bars.iter().enumerate().filter(|(_, bar)| bar.is_present()) {
            let (length, force) = (self.response.lengths[index], self.response.axial_forces[index]);
            strain_energy += bar.energy(length);
            gap += gap::of_bar(
                bar,
                length,
                force,
                &along(self.response, index),
                &balanced.beyond[index],
            );
        }
        gap += gap::of_elastic_supports(structure.net(), &balanced.movement);

        let width = width(loading, self.positions);
        let left: f64 = balanced.left.iter().map(Vector3::norm).sum();
        let mut certificate = Certificate {
            kind,
            gap: gap + left * width,
            leftover: left * width,
            reach: Reach::Width,
            strain_energy,
            certified: false,
            force_bounds: Vec::new(),
            position_bounds: Vec::new(),
        };
        if !certificate.gap.is_finite() {
            return None;
        }
        let places = Places::new(
            self.analysis,
            |e| self.least_density(loading, e, certificate.gap),
            structure.net().elastic_supports(),
        );
        self.tighten(&mut certificate, gap, &balanced.left, &places, width);
        certificate.certified = certificate.gap <= CERTIFIED * certificate.strain_energy;
        let g = certificate.gap;
        certificate.force_bounds = (loading.bars.iter().enumerate())
            .map(|(e, bar)| {
                let told = (self.told[e] - self.response.axial_forces[e]).abs();
                (2.0 * bar.stiffness * g).sqrt() + told
            })
            .collect();
        certificate.position_bounds = places
            .flexibilities
            .iter()
            .map(|f| f.map(|f| (2.0 * g * f).sqrt()))
            .collect();
        Some(certificate)
    }

    /// Takes the bounds on positions in place of the width for what is left out of balance.
    ///
    /// `G ≤ g + Σ |r_i| √(2 G f_i)` for the true excess of energy `G`: a quadratic in its root.
    fn tighten(&self, certificate: &mut Certificate, gap: f64, left: &[Vector3<f64>], places: &Places, width: f64) {
        let (mut rooted, mut far) = (0.0, 0.0);
        for (force, flexibility) in left.iter().zip(&places.flexibilities) {
            match flexibility {
                Some(f) => rooted += force.norm() * f.sqrt(),
                None => far += force.norm() * width,
            }
        }
        let b = rooted * std::f64::consts::SQRT_2;
        let root = 0.5 * (b + (b * b + 4.0 * (gap + far)).sqrt());
        let leftover = far + b * root;
        if leftover < certificate.leftover {
            certificate.leftover = leftover;
            certificate.gap = gap + leftover;
            if far == 0.0 {
                certificate.reach = Reach::Positions;
            }
        }
    }

    /// Lowest force density that a segment can have in the true state (N/m).
    fn least_density(&self, loading: &Loading, segment: usize, gap: f64) -> f64 {
        let bar = &loading.bars[segment];
        let least = self.response.axial_forces[segment] - (2.0 * bar.stiffness * gap).sqrt();
        if !bar.is_present() || least <= 0.0 {
            return 0.0;
        }
        let a = bar.stress_free_length;
        least / (a + least / bar.stiffness)
    }

    /// Corrects the forces of the state until they balance the loads, up to rounding.
    fn balance(&self, loading: &Loading) -> Option<Balanced> {
        let structure = self.analysis.structure();
        let net = structure.net();
        let blocks = |smallest: f64| -> Vec<Matrix3<f64>> {
            let block = |(index, bar): (usize, &crate::element::Bar)| {
                let (length, least) = (self.response.lengths[index], smallest * bar.stiffness);
                if bar.is_present() && bar.is_taut(length) && length > 0.0 {
                    let across = self.response.axial_forces[index] / length;
                    axial_block(bar.stiffness + least, across + least, &along(self.response, index))
                } else {
                    Matrix3::from_diagonal_element(least)
                }
            };
            loading.bars.iter().enumerate().map(block).collect()
        };
        // Where a part is not held by ropes alone its leftover force counts with the width of the net.
        let anchors = existence::check_loads_are_held(structure, loading).unwrap_or_default();
        let anchors = anchor_entries(structure, &anchors);
        let stiffest = loading.bars.iter().map(|b| b.stiffness).fold(0.0, f64::max);
        let stiffest = if stiffest > 0.0 { stiffest } else { 1.0 };
        let mut factor = self.analysis.new_factor();
        let mut values = vec![0.0; structure.pattern().n_entries()];
        let blocks = SMALLEST_STIFFNESS.into_iter().find_map(|smallest| {
            let blocks = blocks(smallest);
            structure.tangent_into(&blocks, &mut values);
            structure.add_elastic_supports(&mut values);
            for (position, share) in &anchors {
                values[*position] += share * stiffest;
            }
            hold_the_idle(structure, stiffest, &mut values);
            factor.cholesky(&values).is_ok().then_some(blocks)
        })?;

        let mut balanced = Balanced {
            beyond: vec![Vector3::zeros(); net.segments().len()],
            movement: vec![Vector3::zeros(); net.nodes().len()],
            left: vec![Vector3::zeros(); net.nodes().len()],
        };
        let mut left = vec![0.0; structure.n_dofs()];
        let mut last = f64::INFINITY;
        for round in 0..=CORRECTIONS {
            let forces = self.out_of_balance(loading, &balanced);
            structure.dofs().components_into(&forces, &mut left);
            let size = left.iter().map(|r| r * r).sum::<f64>().sqrt();
            if !size.is_finite() {
                return None;
            }
            if round == CORRECTIONS || size == 0.0 || size > 0.5 * last {
                structure.dofs().nodal_into(&left, &mut balanced.left);
                break;
            }
            last = size;
            factor.solve_in_place(&mut left);
            structure.dofs().move_nodes(&left, 1.0, &mut balanced.movement);
            let mut step = vec![Vector3::zeros(); net.nodes().len()];
            structure.dofs().nodal_into(&left, &mut step);
            for ((beyond, block), segment) in balanced.beyond.iter_mut().zip(&blocks).zip(net.segments()) {
                let [i, j] = segment.ends.map(NodeId::index);
                *beyond += block * (step[j] - step[i]);
            }
        }
        Some(balanced)
    }

    /// Loads less the corrected forces, one a node (N).
    fn out_of_balance(&self, loading: &Loading, balanced: &Balanced) -> Vec<Vector3<f64>> {
        let structure = self.analysis.structure();
        let mut forces = loading.nodal_forces.clone();
        let moved: Vec<Vector3<f64>> = (self.positions.iter().zip(&balanced.movement))
            .map(|(x, y)| x + y)
            .collect();
        structure.add_elastic_forces(loading, &moved, &mut forces);
        for (index, segment) in structure.net().segments().iter().enumerate() {
            if loading.bars[index].is_present() {
                let force = along(self.response, index) * self.response.axial_forces[index] + balanced.beyond[index];
                forces[segment.ends[0].index()] += force;
                forces[segment.ends[1].index()] -= force;
            }
        }
        forces
    }
}

/// Gives directions that nothing stiffens at all a stiffness, so that the rest can be solved for.
fn hold_the_idle(structure: &Structure, stiffness: f64, values: &mut [f64]) {
    for &start in &structure.pattern().column_starts()[..structure.n_dofs()] {
        if values[start] == 0.0 {
            values[start] = stiffness;
        }
    }
}

/// How wide the net is: the diagonal of the box around its nodes, or its longest rope (m).
fn width(loading: &Loading, positions: &[Vector3<f64>]) -> f64 {
    let (mut low, mut high) = (Vector3::repeat(f64::INFINITY), Vector3::repeat(f64::NEG_INFINITY));
    for x in positions {
        low = low.inf(x);
        high = high.sup(x);
    }
    let longest = (loading.bars.iter().filter(|b| b.is_present()))
        .map(|b| b.stress_free_length)
        .fold(0.0, f64::max);
    if positions.is_empty() {
        0.0
    } else {
        (high - low).norm().max(longest)
    }
}

#[cfg(test)]
mod tests;
