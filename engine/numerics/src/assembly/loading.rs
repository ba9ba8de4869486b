//! A case at one load factor, as the equations see it.

use nalgebra::Vector3;
use thiserror::Error;

use super::Structure;
use crate::element::Bar;
use crate::load::Case;
use crate::model::{NodeId, SegmentId};

/// Why a case can not be put on a net.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum LoadingError {
    /// A list of the case has the wrong length.
    #[error("the case has {given} {what}, the net needs {needed}")]
    WrongLength {
        /// Which list.
        what: &'static str,
        /// Its length.
        given: usize,
        /// The length that fits the net.
        needed: usize,
    },
    /// A segment would have no length, no stiffness, or numbers beyond reckoning.
    #[error("the {what} of {segment} is {value:e}: it must be positive and below {LARGEST:e}")]
    Segment {
        /// The segment.
        segment: SegmentId,
        /// The quantity.
        what: &'static str,
        /// Its value.
        value: f64,
    },
    /// A force, movement or position is not finite, or beyond reckoning.
    #[error("the {what} of {node} has the component {value:e}: it must be finite and below {LARGEST:e}")]
    Node {
        /// The node.
        node: NodeId,
        /// The quantity.
        what: &'static str,
        /// The component.
        value: f64,
    },
}

/// Numbers beyond this overflow when energies are formed from them, and nothing built comes near.
const LARGEST: f64 = 1e100;

/// The first of one vector a node that can not be reckoned with.
pub(crate) fn check_vectors(what: &'static str, vectors: &[Vector3<f64>]) -> Result<(), LoadingError> {
    for (node, vector) in vectors.iter().enumerate() {
        if let Some(value) = vector.iter().find(|c| c.is_nan() || c.abs() >= LARGEST) {
            return Err(LoadingError::Node {
                node: NodeId::new(node),
                what,
                value: *value,
            });
        }
    }
    Ok(())
}

/// Forces, bars and supports at one share of the load.
#[derive(Clone, Debug, PartialEq)]
pub struct Loading {
    /// Dead force on every node (N).
    pub nodal_forces: Vec<Vector3<f64>>,
    /// One bar a segment; absent where it is taken out.
    pub bars: Vec<Bar>,
    /// Movement of every supported node (m).
    pub support_movements: Vec<Vector3<f64>>,
}

impl Loading {
    /// The case at `factor` of its load.
    ///
    /// Forces, movements and changes of temperature are multiplied; unstressed lengths go from `reference_lengths`
    /// (by [`crate::model::Net::n_lengths`], m) to those of the case. Removed segments are absent at any factor.
    ///
    /// # Errors
    /// [`LoadingError`] if the case does not fit the net or its numbers are beyond use.
    pub fn new(
        structure: &Structure,
        case: &Case,
        reference_lengths: &[f64],
        factor: f64,
    ) -> Result<Self, LoadingError> {
        let net = structure.net();
        let lengths = [
            ("nodal forces", case.nodal_forces.len(), net.nodes().len()),
            ("support movements", case.support_movements.len(), net.nodes().len()),
            ("unstressed lengths", case.unstressed_lengths.len(), net.n_lengths()),
            ("reference lengths", reference_lengths.len(), net.n_lengths()),
            ("segments", case.segments.len(), net.segments().len()),
            ("removal marks", case.removed.len(), net.segments().len()),
        ];
        for (what, given, needed) in lengths {
            if given != needed {
                return Err(LoadingError::WrongLength { what, given, needed });
            }
        }
        check_vectors("force", &case.nodal_forces)?;
        check_vectors("movement", &case.support_movements)?;
        let mut bars = Vec::with_capacity(net.segments().len());
        for (index, segment) in net.segments().iter().enumerate() {
            if case.removed[index] {
                bars.push(Bar::absent());
                continue;
            }
            let start = reference_lengths[segment.length];
            // The plain difference form would not give the case's own length to the last bit at factor 1.
            let length = factor * case.unstressed_lengths[segment.length] + (1.0 - factor) * start;
            let strain = factor * segment.section.expansion * case.segments[index].temperature_change;
            let bar = Bar::new(segment.law, segment.section.axial_stiffness, length, strain);
            let checks = [
                ("stress-free length", bar.stress_free_length),
                ("stiffness", bar.stiffness),
            ];
            for (what, value) in checks {
                if !(value > 0.0 && value < LARGEST) {
                    return Err(LoadingError::Segment {
                        segment: SegmentId::new(index),
                        what,
                        value,
                    });
                }
            }
            bars.push(bar);
        }
        Ok(Self {
            nodal_forces: case.nodal_forces.iter().map(|f| f * factor).collect(),
            bars,
            support_movements: case.support_movements.iter().map(|m| m * factor).collect(),
        })
    }

    /// Puts held nodes where their supports are: given position and movement along held directions, `positions`
    /// along free ones.
    pub fn place_supports(&self, structure: &Structure, positions: &mut [Vector3<f64>]) {
        let net = structure.net();
        for support in net.supports() {
            let index = support.node().index();
            if structure.dofs().directions(support.node()).len() == support.free().len() {
                let given = net.nodes()[index].position.expect("a held node has a position");
                let held = given + self.support_movements[index] - positions[index];
                positions[index] += support.held_part(&held);
                if support.free().is_empty() {
                    positions[index] = given + self.support_movements[index];
                }
            }
        }
    }

    /// Largest force on a node along a free direction, by component in global axes (N).
    #[must_use]
    pub fn largest_force(&self, structure: &Structure) -> f64 {
        let dofs = structure.dofs();
        (0..dofs.len())
            .map(|dof| {
                self.nodal_forces[dofs.node(dof).index()]
                    .dot(&dofs.direction(dof))
                    .abs()
            })
            .fold(0.0, f64::max)
    }
}
