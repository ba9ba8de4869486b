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
//! Ropes that slide without friction and ropes that hang have convex energies of their own (`gap`). What has none is
//! taken as a dead load as found: struts that push, pressure that follows, ropes that slide against friction. The bounds
//! then tell of the rest under these forces. Where all struts pull they are as good as ropes.
//!
//! # Reference
//! Rockafellar 1970 for the duality; the bounds are derived in the text above.

mod gap;
mod places;

use std::fmt;

use nalgebra::{Matrix3, Vector3};

use super::run::anchor_entries;
use super::{Analysis, MemberStates, existence};
use crate::assembly::{Loading, LoadingError, Response, Structure};
use crate::element::{Bar, Hanging, Sliding, axial_block};
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
    /// Pressure on panels where they are.
    Pressure,
    /// Forces of ropes that slide against friction.
    Friction,
    /// Forces of ropes that slide and change their section or temperature on the way.
    ChangingSection,
}

impl fmt::Display for Condition {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Self::Struts => {
                "with the forces of the struts as found: another state with other strut forces is not excluded"
            }
            Self::Pressure => "with the pressure on the panels where they are: it would follow other shapes",
            Self::Friction => {
                "with the forces of ropes that slide against friction as found: they depend on how the load came on"
            }
            Self::ChangingSection => {
                "with the forces of ropes as found that slide and change section or temperature on the way"
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

/// A state as told.
#[derive(Clone, Copy, Debug)]
pub struct State<'a> {
    /// Position of every node (m), held nodes where the case puts them.
    pub positions: &'a [Vector3<f64>],
    /// Axial force of every segment (N); what it differs from the law at these positions is added to its bound.
    pub axial_forces: &'a [f64],
    /// Ends of the segments: read where their forces are a condition.
    pub members: &'a MemberStates,
}

/// Certifies a state of a case.
///
/// `case`: with the loads that the state carries. `None` where no forces in balance were found, so that nothing can be
/// said.
///
/// # Errors
/// [`LoadingError`] if the case does not fit the net.
pub fn certificate(analysis: &Analysis, case: &Case, state: &State<'_>) -> Result<Option<Certificate>, LoadingError> {
    let structure = analysis.structure();
    let mut loading = Loading::new(structure, case, &case.unstressed_lengths, 1.0)?;
    let mut conditions = freeze_special(structure, &mut loading, state);
    let worth = |conditions: &[Condition]| match conditions {
        [] => Kind::Full,
        some => Kind::Conditional(some.to_vec()),
    };
    let of = |loading: &Loading, kind: Kind| {
        let mut response = Response::new(structure);
        structure.response_into(loading, state.positions, &mut response);
        Work {
            analysis,
            loading,
            response: &response,
            state,
        }
        .certificate(kind)
    };
    let is_strut = |e: &usize| loading.bars[*e].law == AxialLaw::TwoWay && loading.bars[*e].is_present();
    let struts: Vec<usize> = (0..loading.bars.len()).filter(is_strut).collect();
    if struts.iter().all(|e| state.axial_forces[*e] > 0.0)
        && let Some(certificate) = of(&loading, worth(&conditions))
        && struts
            .iter()
            .all(|e| state.axial_forces[*e] > certificate.force_bounds[*e])
    {
        return Ok(Some(certificate));
    }
    if struts.is_empty() {
        return Ok(None);
    }
    freeze(structure, &mut loading, state, struts.into_iter());
    conditions.insert(0, Condition::Struts);
    Ok(of(&loading, worth(&conditions)))
}

/// Makes dead loads of segments.
fn freeze(structure: &Structure, loading: &mut Loading, state: &State<'_>, segments: impl Iterator<Item = usize>) {
    for e in segments {
        loading.bars[e] = Bar::absent();
        for (node, pull) in structure.net().segments()[e].ends.iter().zip(&state.members.pulls[e]) {
            loading.nodal_forces[node.index()] += pull;
        }
    }
}

/// Makes dead loads of what has no energy of its own, and bars of hanging ropes without load.
fn freeze_special(structure: &Structure, loading: &mut Loading, state: &State<'_>) -> Vec<Condition> {
    let Some(mut special) = loading.special.take() else {
        return Vec::new();
    };
    let mut conditions = Vec::new();
    if !special.pressures.is_empty() {
        structure.add_pressure_forces(&special.pressures, state.positions, &mut loading.nodal_forces);
        special.pressures.clear();
        conditions.push(Condition::Pressure);
    }
    let net = structure.net();
    let mut kept = Vec::new();
    for piece in std::mem::take(&mut special.sliding) {
        let reach = &net.reaches()[net.segments()[piece.first].length];
        let condition = if reach.friction.iter().any(|mu| *mu > 0.0) {
            Condition::Friction
        } else if is_uniform(&piece) {
            kept.push(piece);
            continue;
        } else {
            Condition::ChangingSection
        };
        freeze(structure, loading, state, piece.segments());
        if !conditions.contains(&condition) {
            conditions.push(condition);
        }
    }
    special.sliding = kept;
    let straight = &special.straight;
    special.hanging.retain(|hanging| {
        let loaded = hanging.catenary.load != Vector3::zeros();
        if !loaded {
            loading.bars[hanging.segment] = straight[hanging.segment];
        }
        loaded
    });
    if !(special.sliding.is_empty() && special.hanging.is_empty()) {
        loading.special = Some(special);
    }
    conditions
}

/// Whether a piece has one stiffness and one temperature: then its energy is that of one long spring.
fn is_uniform(piece: &Sliding) -> bool {
    piece.axial_stiffness.iter().all(|ea| *ea == piece.axial_stiffness[0])
        && piece.expansion.iter().all(|theta| *theta == piece.expansion[0])
}

/// A piece without friction as one long spring, `a = θ L0`, `k = EA/a`.
fn spring(piece: &Sliding) -> Bar {
    Bar::new(
        AxialLaw::TensionOnly,
        piece.axial_stiffness[0],
        piece.unstressed_length,
        piece.expansion[0] - 1.0,
    )
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

/// One look at a state: a loading that has a convex energy, and the answer to it.
struct Work<'a> {
    analysis: &'a Analysis,
    loading: &'a Loading,
    response: &'a Response,
    state: &'a State<'a>,
}

impl Work<'_> {
    fn sliding(&self) -> impl Iterator<Item = (&Sliding, f64)> {
        let pieces = self.loading.special.iter().flat_map(|special| &special.sliding);
        pieces.zip(self.response.special.tensions.iter().copied())
    }

    fn hanging(&self) -> impl Iterator<Item = (usize, &Hanging)> {
        let segments = self.loading.special.iter().flat_map(|special| &special.hanging);
        segments.map(|h| h.segment).zip(&self.response.special.hanging)
    }

    /// Stiffness of every segment against a change of its force (N/m); zero where that is none of ours.
    fn stiffnesses(&self) -> Vec<f64> {
        let mut stiffnesses: Vec<f64> = self.loading.bars.iter().map(|bar| bar.stiffness).collect();
        for (piece, _) in self.sliding() {
            stiffnesses[piece.segments()].fill(spring(piece).stiffness);
        }
        for hanging in self.loading.special.iter().flat_map(|special| &special.hanging) {
            let rope = &hanging.catenary;
            stiffnesses[hanging.segment] = rope.axial_stiffness / rope.stress_free_length;
        }
        stiffnesses
    }

    fn certificate(&self, kind: Kind) -> Option<Certificate> {
        let (structure, loading) = (self.analysis.structure(), self.loading);
        let balanced = self.balance()?;
        let mut gap = 0.0;
        for (index, bar) in loading.bars.iter().enumerate().filter(|(_, bar)| bar.is_present()) {
            let (length, force) = (self.response.lengths[index], self.response.axial_forces[index]);
            gap += gap::of_bar(
                bar,
                length,
                force,
                &along(self.response, index),
                &balanced.beyond[index],
            );
        }
        for (piece, tension) in self.sliding() {
            let segments = piece
                .segments()
                .map(|e| (self.response.lengths[e], along(self.response, e), balanced.beyond[e]));
            gap += gap::of_sliding(&spring(piece), tension, segments);
        }
        for (segment, hanging) in self.hanging() {
            gap += hanging.gap(&balanced.beyond[segment]);
        }
        gap += gap::of_elastic_supports(structure.net(), &balanced.movement);
        let stiffnesses = self.stiffnesses();

        let width = width(loading, self.state.positions);
        let left: f64 = balanced.left.iter().map(Vector3::norm).sum();
        let mut certificate = Certificate {
            kind,
            gap: gap + left * width,
            leftover: left * width,
            reach: Reach::Width,
            strain_energy: self.response.strain_energy(loading),
            certified: false,
            force_bounds: Vec::new(),
            position_bounds: Vec::new(),
        };
        if !certificate.gap.is_finite() {
            return None;
        }
        let places = Places::new(
            self.analysis,
            &self.least_densities(&stiffnesses, certificate.gap),
            structure.net().elastic_supports(),
        );
        self.tighten(&mut certificate, gap, &balanced.left, &places, width);
        certificate.certified = certificate.gap <= CERTIFIED * certificate.strain_energy;
        let g = certificate.gap;
        certificate.force_bounds = (stiffnesses.iter().enumerate())
            .map(|(e, stiffness)| {
                let told = (self.state.axial_forces[e] - self.response.axial_forces[e]).abs();
                if *stiffness > 0.0 {
                    (2.0 * stiffness * g).sqrt() + told
                } else {
                    0.0
                }
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

    /// Lowest force density that each segment can have in the true state (N/m); zero for sliding ones, which hold a node
    /// across the rope only.
    ///
    /// A hanging rope is a chain of short bars: the inverses of their force densities add up to `a/EA + ∫ dX/T`.
    fn least_densities(&self, stiffnesses: &[f64], gap: f64) -> Vec<f64> {
        let off = |e: usize| (2.0 * stiffnesses[e] * gap).sqrt();
        let mut densities: Vec<f64> = (self.loading.bars.iter().enumerate())
            .map(|(e, bar)| {
                let least = self.response.axial_forces[e] - off(e);
                if bar.is_present() && least > 0.0 {
                    least / (bar.stress_free_length + least / bar.stiffness)
                } else {
                    0.0
                }
            })
            .collect();
        for (e, hanging) in self.hanging() {
            let least = hanging.tension_least - off(e);
            if least > 0.0 {
                let slenderness = hanging.slenderness * (hanging.tension_least / least);
                densities[e] = 1.0 / (1.0 / stiffnesses[e] + slenderness);
            }
        }
        densities
    }

    /// Stiffness of every segment, with a little in every direction, but for the stretch of sliding pieces.
    fn blocks(&self, smallest: f64) -> Vec<Matrix3<f64>> {
        let block = |(index, bar): (usize, &Bar)| {
            let (length, least) = (self.response.lengths[index], smallest * bar.stiffness);
            if bar.is_present() && bar.is_taut(length) && length > 0.0 {
                let across = self.response.axial_forces[index] / length;
                axial_block(bar.stiffness + least, across + least, &along(self.response, index))
            } else {
                Matrix3::from_diagonal_element(least)
            }
        };
        let mut blocks: Vec<_> = self.loading.bars.iter().enumerate().map(block).collect();
        if let Some(special) = &self.loading.special {
            let (structure, tensions) = (self.analysis.structure(), &self.response.special.tensions);
            structure.special_blocks(special, self.response, tensions, smallest, &mut blocks);
        }
        blocks
    }

    /// Corrects the forces of the state until they balance the loads, up to rounding.
    fn balance(&self) -> Option<Balanced> {
        let (structure, loading) = (self.analysis.structure(), self.loading);
        let net = structure.net();
        // Where a part is not held by ropes alone its leftover force counts with the width of the net.
        let bars_only = structure.substitute(loading, self.response);
        let anchors = existence::check_loads_are_held(structure, &bars_only).unwrap_or_default();
        let anchors = anchor_entries(structure, &anchors);
        let stiffest = bars_only.bars.iter().map(|b| b.stiffness).fold(0.0, f64::max);
        let stiffest = if stiffest > 0.0 { stiffest } else { 1.0 };
        let tensions = &self.response.special.tensions;
        let mut factor = self.analysis.new_factor();
        let mut values = vec![0.0; structure.pattern().n_entries()];
        let blocks = SMALLEST_STIFFNESS.into_iter().find_map(|smallest| {
            let blocks = self.blocks(smallest);
            structure.tangent_into(&blocks, &mut values);
            if let Some(special) = &loading.special {
                let taut = |piece: usize| tensions[piece] > 0.0;
                structure.add_special_tangent(special, self.response, taut, &mut values);
            }
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
        let mut step = vec![Vector3::zeros(); net.nodes().len()];
        let mut last = f64::INFINITY;
        for round in 0..=CORRECTIONS {
            let forces = self.out_of_balance(&balanced);
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
            structure.dofs().nodal_into(&left, &mut step);
            self.add_forces_of(&step, &blocks, &mut balanced.beyond);
        }
        Some(balanced)
    }

    /// Adds what a movement (m, one a node) makes of the forces of the segments (N).
    fn add_forces_of(&self, step: &[Vector3<f64>], blocks: &[Matrix3<f64>], beyond: &mut [Vector3<f64>]) {
        let segments = self.analysis.structure().net().segments();
        let change = |e: usize| {
            let [i, j] = segments[e].ends.map(NodeId::index);
            step[j] - step[i]
        };
        for (e, (beyond, block)) in beyond.iter_mut().zip(blocks).enumerate() {
            *beyond += block * change(e);
        }
        let mut slopes = Vec::new();
        for (piece, tension) in self.sliding().filter(|(_, tension)| *tension > 0.0) {
            slopes.resize(piece.factors.len(), 0.0);
            piece.slopes_into(&self.response.lengths[piece.segments()], tension, &mut slopes);
            let more: f64 = (piece.segments().zip(&slopes))
                .map(|(e, slope)| slope * along(self.response, e).dot(&change(e)))
                .sum();
            for e in piece.segments() {
                beyond[e] += along(self.response, e) * more;
            }
        }
    }

    /// Loads less the corrected forces, one a node (N).
    fn out_of_balance(&self, balanced: &Balanced) -> Vec<Vector3<f64>> {
        let (structure, loading) = (self.analysis.structure(), self.loading);
        let mut forces = loading.nodal_forces.clone();
        let moved: Vec<Vector3<f64>> = (self.state.positions.iter().zip(&balanced.movement))
            .map(|(x, y)| x + y)
            .collect();
        structure.add_elastic_forces(loading, &moved, &mut forces);
        if let Some(special) = &loading.special {
            structure.add_special_forces(special, self.response, &mut forces);
        }
        for (index, segment) in structure.net().segments().iter().enumerate() {
            let mut force = balanced.beyond[index];
            if loading.bars[index].is_present() {
                force += along(self.response, index) * self.response.axial_forces[index];
            }
            forces[segment.ends[0].index()] += force;
            forces[segment.ends[1].index()] -= force;
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
    let longest = (loading.straight_bars().iter().filter(|b| b.is_present()))
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
