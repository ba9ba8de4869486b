//! What is more than a straight bar between clamped nodes: sliding ropes, hanging ropes, pressure.
//!
//! Such a segment has no bar of its own in [`Loading::bars`]; its force and stiffness come from here. A substitute made
//! of bars and dead forces, right at one state and near it elsewhere, serves the methods that know bars only.

use nalgebra::{Matrix3, Vector3};

use super::structure::Clique;
use super::{Loading, Response, Structure};
use crate::element::{Bar, Catenary, Hanging, Sliding, axial_block, panel};
use crate::model::NodeId;

/// A segment that hangs.
#[derive(Clone, Debug, PartialEq)]
pub struct HangingSegment {
    /// The segment.
    pub segment: usize,
    /// Its law.
    pub catenary: Catenary,
}

/// Elements of a loading beyond bars.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Special {
    /// Pieces of rope that slide.
    pub sliding: Vec<Sliding>,
    /// Segments that hang.
    pub hanging: Vec<HangingSegment>,
    /// Pressure on the outer side of every panel (Pa); empty: none.
    pub pressures: Vec<f64>,
    /// Every segment as a straight bar with its share of the length: for sizes, and for the substitute.
    pub straight: Vec<Bar>,
}

/// How the special elements answer.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct SpecialResponse {
    /// Tension of every sliding piece (N).
    pub tensions: Vec<f64>,
    /// State of every hanging segment.
    pub hanging: Vec<Hanging>,
    /// Where it was asked (m).
    pub positions: Vec<Vector3<f64>>,
}

impl Structure {
    /// Adds the special elements to a response whose chords and lengths are there.
    pub(super) fn respond_special(&self, special: &Special, positions: &[Vector3<f64>], response: &mut Response) {
        let state = &mut response.special;
        state.positions.clear();
        state.positions.extend_from_slice(positions);
        state.tensions.clear();
        for piece in &special.sliding {
            let n = piece.tension(&response.lengths[piece.segments()]);
            state.tensions.push(n);
            for (e, factor) in piece.segments().zip(&piece.factors) {
                response.axial_forces[e] = factor * n;
            }
        }
        let guesses = std::mem::take(&mut state.hanging);
        for (place, hanging) in special.hanging.iter().enumerate() {
            let guess = guesses.get(place).map(|before| before.start);
            let at = hanging.catenary.at(&response.chords[hanging.segment], guess.as_ref());
            response.axial_forces[hanging.segment] = at.tension_start.max(at.tension_end);
            state.hanging.push(at);
        }
        let mut forces = std::mem::take(&mut response.out_of_balance);
        self.add_special_forces(special, response, &mut forces);
        response.out_of_balance = forces;
    }

    /// Adds the forces of the special elements of a response on every node (N).
    pub(crate) fn add_special_forces(&self, special: &Special, response: &Response, forces: &mut [Vector3<f64>]) {
        for piece in &special.sliding {
            for e in piece.segments() {
                if response.lengths[e] > 0.0 {
                    let pull = response.chords[e] * (response.axial_forces[e] / response.lengths[e]);
                    let [i, j] = self.ends[e];
                    forces[i as usize] += pull;
                    forces[j as usize] -= pull;
                }
            }
        }
        for (hanging, at) in special.hanging.iter().zip(&response.special.hanging) {
            let [i, j] = self.ends[hanging.segment];
            forces[i as usize] += at.start;
            forces[j as usize] += at.end;
        }
        self.add_pressure_forces(&special.pressures, &response.special.positions, forces);
    }

    /// Adds the forces of pressures (Pa, one a panel, or none) at given positions to one vector a node (N).
    pub fn add_pressure_forces(&self, pressures: &[f64], positions: &[Vector3<f64>], forces: &mut [Vector3<f64>]) {
        let (mut corners, mut each) = (Vec::new(), Vec::new());
        for (panel, pressure) in self.net().panels().iter().zip(pressures) {
            if *pressure != 0.0 {
                corners.clear();
                corners.extend(panel.corners.iter().map(|n| positions[n.index()]));
                each.resize(corners.len(), Vector3::zeros());
                panel::pressure_forces(&corners, *pressure, &mut each);
                for (node, force) in panel.corners.iter().zip(&each) {
                    forces[node.index()] += force;
                }
            }
        }
    }

    /// Blocks of the special segments: what turning them takes, and all of a hanging one.
    ///
    /// `tensions`: of every sliding piece, as the geometric part sees them (N). `least`: share of its axial stiffness that
    /// each segment gets in every direction (–).
    pub(crate) fn special_blocks(
        &self,
        special: &Special,
        response: &Response,
        tensions: &[f64],
        least: f64,
        blocks: &mut [Matrix3<f64>],
    ) {
        for (piece, n) in special.sliding.iter().zip(tensions) {
            for (e, factor) in piece.segments().zip(&piece.factors) {
                let length = response.lengths[e];
                let smallest = least * special.straight[e].stiffness;
                blocks[e] = if length > 0.0 {
                    let across = factor * n / length;
                    axial_block(smallest, across + smallest, &(response.chords[e] / length))
                } else {
                    Matrix3::from_diagonal_element(smallest)
                };
            }
        }
        for (hanging, at) in special.hanging.iter().zip(&response.special.hanging) {
            let e = hanging.segment;
            blocks[e] = at.stiffness + Matrix3::from_diagonal_element(least * special.straight[e].stiffness);
        }
    }

    /// Adds what couples more than two nodes: the stretch of sliding pieces and the symmetric part of the pressure.
    ///
    /// `taut`: whether a sliding piece resists.
    pub(crate) fn add_special_tangent(
        &self,
        special: &Special,
        response: &Response,
        taut: impl Fn(usize) -> bool,
        values: &mut [f64],
    ) {
        for (place, piece) in special.sliding.iter().enumerate() {
            if taut(place) {
                self.add_sliding(piece, response.special.tensions[place], response, values);
            }
        }
        let mut corners = Vec::new();
        for ((panel, clique), pressure) in self.net().panels().iter().zip(&self.panels).zip(&special.pressures) {
            if *pressure != 0.0 {
                corners.clear();
                corners.extend(panel.corners.iter().map(|n| response.special.positions[n.index()]));
                panel::symmetric_stiffness(&corners, *pressure, |row, column, block| {
                    self.add_clique_block(clique, row, column, block, values);
                });
            }
        }
    }

    /// The stretch of a sliding piece is `u vᵀ` with `u = Σ c_e ∂l_e/∂x`, `v = Σ ∂N/∂l_e ∂l_e/∂x`: symmetric by itself
    /// without friction. Where it slips against friction `γ v vᵀ` stands for it, of which the rest is
    /// [`Structure::slips`]: the symmetric part of `u vᵀ` has a stiffness below zero, large beside what little holds a
    /// rope along itself.
    fn add_sliding(&self, piece: &Sliding, tension: f64, response: &Response, values: &mut [f64]) {
        let mut slopes = vec![0.0; piece.factors.len()];
        piece.slopes_into(&response.lengths[piece.segments()], tension, &mut slopes);
        let factors = match piece.slips() {
            true => in_proportion(&piece.factors, &slopes),
            false => piece.factors.clone(),
        };
        self.add_stretch(
            piece.first,
            &factors,
            &slopes,
            &response.chords,
            &response.lengths,
            values,
        );
    }

    /// What the tangent of [`Structure::add_special_tangent`] lacks: `w vᵀ` for each piece that slips against friction, one
    /// entry a free direction (– and N/m).
    pub(crate) fn slips(
        &self,
        special: &Special,
        response: &Response,
        taut: impl Fn(usize) -> bool,
    ) -> Vec<(Vec<f64>, Vec<f64>)> {
        let slipping = special.sliding.iter().enumerate();
        let slipping = slipping.filter(|(place, piece)| piece.slips() && taut(*place));
        let pairs = slipping.map(|(place, piece)| {
            let mut slopes = vec![0.0; piece.factors.len()];
            let tension = response.special.tensions[place];
            piece.slopes_into(&response.lengths[piece.segments()], tension, &mut slopes);
            let symmetric = in_proportion(&piece.factors, &slopes);
            let rest: Vec<f64> = piece.factors.iter().zip(&symmetric).map(|(c, s)| c - s).collect();
            let along = |shares: &[f64]| {
                let mut nodal = vec![Vector3::zeros(); self.net().nodes().len()];
                for (e, share) in piece.segments().zip(shares) {
                    if response.lengths[e] > 0.0 {
                        let n = response.chords[e] * (share / response.lengths[e]);
                        let [i, j] = self.ends[e];
                        nodal[i as usize] -= n;
                        nodal[j as usize] += n;
                    }
                }
                let mut components = vec![0.0; self.n_dofs()];
                self.dofs().components_into(&nodal, &mut components);
                components
            };
            (along(&rest), along(&slopes))
        });
        pairs.collect()
    }

    /// Adds `½ (u vᵀ + v uᵀ)` for a reach that slides, with `u = Σ c_e ∂l_e/∂x` and `v = Σ k_e ∂l_e/∂x`.
    ///
    /// `first`: its first segment. `factors`, `slopes`: `c` (–) and `k` (N/m), one a segment of the reach. `chords`,
    /// `lengths`: one a segment of the net (m).
    pub(crate) fn add_stretch(
        &self,
        first: usize,
        factors: &[f64],
        slopes: &[f64],
        chords: &[Vector3<f64>],
        lengths: &[f64],
        values: &mut [f64],
    ) {
        let reach = self.net().segments()[first].length;
        let Some(clique) = self.slides[reach].as_ref() else {
            return;
        };
        let place = |node: u32| {
            let node = NodeId::new(node as usize);
            clique
                .nodes
                .iter()
                .position(|n| *n == node)
                .expect("a reach knows its nodes")
        };
        let (mut u, mut v) = (
            vec![Vector3::zeros(); clique.nodes.len()],
            vec![Vector3::zeros(); clique.nodes.len()],
        );
        for ((e, factor), slope) in (first..).zip(factors).zip(slopes) {
            if lengths[e] > 0.0 {
                let n = chords[e] / lengths[e];
                let [i, j] = self.ends[e].map(place);
                u[i] -= n * *factor;
                u[j] += n * *factor;
                v[i] -= n * *slope;
                v[j] += n * *slope;
            }
        }
        for row in 0..clique.nodes.len() {
            for column in 0..=row {
                let block = (u[row] * v[column].transpose() + v[row] * u[column].transpose()) * 0.5;
                self.add_clique_block(clique, row, column, &block, values);
            }
        }
    }

    /// Adds a block of a clique; off the diagonal it stands for both triangles.
    fn add_clique_block(&self, clique: &Clique, row: usize, column: usize, block: &Matrix3<f64>, values: &mut [f64]) {
        let (a, b) = (clique.nodes[row], clique.nodes[column]);
        if row == column {
            let first = self.dofs().first(a);
            let free = self.dofs().directions(a);
            let starts = self.pattern().column_starts();
            for (c, along_c) in free.iter().enumerate() {
                let along = block * along_c;
                for (r, along_r) in free.iter().enumerate().skip(c) {
                    values[starts[first + c] + r - c] += along_r.dot(&along);
                }
            }
            return;
        }
        let coupling = &clique.couplings[row * (row - 1) / 2 + column];
        // The lower-numbered node owns the columns.
        let (rows, columns, block) = if b < a {
            (self.dofs().directions(a), self.dofs().directions(b), *block)
        } else {
            (self.dofs().directions(b), self.dofs().directions(a), block.transpose())
        };
        for (along_c, position) in columns.iter().zip(coupling.positions) {
            let along = block * along_c;
            for (r, along_r) in rows.iter().enumerate() {
                values[position + r] += along_r.dot(&along);
            }
        }
    }

    /// The case as bars and dead forces that act alike at the state of `response`.
    #[must_use]
    pub(crate) fn substitute(&self, loading: &Loading, response: &Response) -> Loading {
        let Some(special) = &loading.special else {
            return loading.clone();
        };
        let mut substitute = Loading {
            nodal_forces: loading.nodal_forces.clone(),
            bars: loading.bars.clone(),
            support_movements: loading.support_movements.clone(),
            unstressed_lengths: loading.unstressed_lengths.clone(),
            special: None,
        };
        for (piece, n) in special.sliding.iter().zip(&response.special.tensions) {
            let mut shares = vec![0.0; piece.factors.len()];
            piece.shares_into(&response.lengths[piece.segments()], *n, &mut shares);
            for (place, e) in piece.segments().enumerate() {
                // A segment without length would have no stiffness either.
                let share = shares[place].max(1e-6 * piece.unstressed_length);
                substitute.bars[e] = Bar::new(
                    special.straight[e].law,
                    piece.axial_stiffness[place],
                    share,
                    piece.expansion[place] - 1.0,
                );
            }
        }
        for hanging in &special.hanging {
            let e = hanging.segment;
            substitute.bars[e] = special.straight[e];
            let half = hanging.catenary.load * (0.5 * hanging.catenary.unstressed_length);
            for node in self.ends[e] {
                substitute.nodal_forces[node as usize] += half;
            }
        }
        self.add_pressure_forces(
            &special.pressures,
            &response.special.positions,
            &mut substitute.nodal_forces,
        );
        substitute
    }
}

/// `γ k` that is nearest to `c`.
fn in_proportion(factors: &[f64], slopes: &[f64]) -> Vec<f64> {
    let dot = |a: &[f64], b: &[f64]| a.iter().zip(b).map(|(x, y)| x * y).sum::<f64>();
    let share = dot(factors, slopes) / dot(slopes, slopes);
    slopes.iter().map(|slope| share * slope).collect()
}
