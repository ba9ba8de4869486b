//! Out-of-balance forces at given positions.

use nalgebra::Vector3;

use super::{Loading, SpecialResponse, Structure};
use crate::model::{AxialLaw, NodeId};

/// How a net answers at given positions.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Response {
    /// From the first to the second end of every segment (m).
    pub chords: Vec<Vector3<f64>>,
    /// Length of every segment (m).
    pub lengths: Vec<f64>,
    /// Axial force of every segment (N), tension positive.
    pub axial_forces: Vec<f64>,
    /// External minus internal force on every node (N); at a held node, what its rigid support has to resist.
    pub out_of_balance: Vec<Vector3<f64>>,
    /// Components of the out-of-balance forces along the free directions (N).
    pub residual: Vec<f64>,
    /// State of what is more than bars; empty where there is none.
    pub special: SpecialResponse,
}

impl Response {
    /// Room for the response of a net.
    #[must_use]
    pub fn new(structure: &Structure) -> Self {
        let (nodes, segments) = (structure.net().nodes().len(), structure.net().segments().len());
        Self {
            chords: vec![Vector3::zeros(); segments],
            lengths: vec![0.0; segments],
            axial_forces: vec![0.0; segments],
            out_of_balance: vec![Vector3::zeros(); nodes],
            residual: vec![0.0; structure.n_dofs()],
            special: SpecialResponse::default(),
        }
    }

    /// Largest residual (N) and where it is; the first of equals. Not finite if any residual is not.
    #[must_use]
    pub fn largest_residual(&self, structure: &Structure) -> (f64, Option<NodeId>) {
        let mut largest = (0.0, None);
        for (dof, r) in self.residual.iter().enumerate() {
            if !r.is_finite() {
                return (f64::INFINITY, Some(structure.dofs().node(dof)));
            }
            if r.abs() > largest.0 {
                largest = (r.abs(), Some(structure.dofs().node(dof)));
            }
        }
        largest
    }

    /// Largest axial force by size (N).
    #[must_use]
    pub fn largest_axial_force(&self) -> f64 {
        self.axial_forces.iter().fold(0.0, |largest, t| t.abs().max(largest))
    }

    /// Slack cable segments that are part of the net.
    #[must_use]
    pub fn n_slack(&self, loading: &Loading) -> usize {
        let slack = |(bar, length): &(&crate::element::Bar, &f64)| bar.is_present() && !bar.is_taut(**length);
        let sliding = loading.special.iter().flat_map(|special| &special.sliding);
        let slack_sliding: usize = sliding
            .zip(&self.special.tensions)
            .filter(|(_, n)| **n == 0.0)
            .map(|(piece, _)| piece.factors.len())
            .sum();
        loading.bars.iter().zip(&self.lengths).filter(slack).count() + slack_sliding
    }

    /// Strain energy of all segments (J).
    #[must_use]
    pub fn strain_energy(&self, loading: &Loading) -> f64 {
        let bars: f64 = loading.bars.iter().zip(&self.lengths).map(|(b, l)| b.energy(*l)).sum();
        let Some(special) = &loading.special else {
            return bars;
        };
        let sliding: f64 = (special.sliding.iter().zip(&self.special.tensions))
            .map(|(piece, n)| piece.energy(&self.lengths[piece.segments()], *n))
            .sum();
        bars + sliding + self.special.hanging.iter().map(|h| h.strain_energy).sum::<f64>()
    }
}

impl Structure {
    /// Lengths, axial forces and out-of-balance forces at `positions` (m), one a node; allocates nothing.
    ///
    /// ```text
    /// r = p − Σ T n − S (x − rest − movement)
    /// ```
    pub fn response_into(&self, loading: &Loading, positions: &[Vector3<f64>], response: &mut Response) {
        response.out_of_balance.copy_from_slice(&loading.nodal_forces);
        let segments = response
            .chords
            .iter_mut()
            .zip(&mut response.lengths)
            .zip(&mut response.axial_forces);
        for (((chord, length), axial), (bar, ends)) in segments.zip(loading.bars.iter().zip(&self.ends)) {
            let (i, j) = (ends[0] as usize, ends[1] as usize);
            *chord = positions[j] - positions[i];
            *length = chord.norm();
            *axial = bar.axial_force(*length);
            if *axial != 0.0 {
                let force = if *length > 0.0 {
                    *chord * (*axial / *length)
                } else {
                    // A strut squeezed to nothing pushes nowhere in particular.
                    debug_assert_eq!(bar.law, AxialLaw::TwoWay);
                    Vector3::zeros()
                };
                response.out_of_balance[i] += force;
                response.out_of_balance[j] -= force;
            }
        }
        if let Some(special) = &loading.special {
            self.respond_special(special, positions, response);
        }
        self.add_elastic_forces(loading, positions, &mut response.out_of_balance);
        self.dofs()
            .components_into(&response.out_of_balance, &mut response.residual);
    }

    /// Adds the forces of all elastic supports on the net, `−S (x − rest − movement)` (N), to one vector a node.
    pub fn add_elastic_forces(&self, loading: &Loading, positions: &[Vector3<f64>], forces: &mut [Vector3<f64>]) {
        for elastic in self.net().elastic_supports() {
            for (row, node) in elastic.nodes().iter().enumerate() {
                let mut force = Vector3::zeros();
                for (column, other) in elastic.nodes().iter().enumerate() {
                    let at_rest = elastic.rest()[column] + loading.support_movements[other.index()];
                    force += elastic.block(row, column) * (positions[other.index()] - at_rest);
                }
                forces[node.index()] -= force;
            }
        }
    }
}
