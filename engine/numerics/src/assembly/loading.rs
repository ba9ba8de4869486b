//! A case at one load factor, as the equations see it.

use nalgebra::Vector3;
use thiserror::Error;

use super::{HangingSegment, Special, Structure};
use crate::element::{Bar, Catenary, Sliding};
use crate::load::Case;
use crate::model::{NodeId, Reach, SegmentId};

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
    /// A pressure is not finite, or beyond reckoning.
    #[error("the pressure on panel {panel} is {value:e}: it must be finite and below {LARGEST:e}")]
    Panel {
        /// The panel, by index.
        panel: usize,
        /// The pressure (Pa).
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
    /// Unstressed length of every segment at the reference temperature (m); where it slides, of all of its piece shared
    /// alike; zero where it is taken out.
    pub unstressed_lengths: Vec<f64>,
    /// What is more than bars: sliding and hanging ropes, pressure. Their segments have absent bars.
    pub special: Option<Box<Special>>,
}

/// Where ropes stick and where they slip, and what rope lies where.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Gripping {
    /// One list a reach, in it one entry for each node through which it slides.
    pub grips: Vec<Vec<Grip>>,
    /// Unstressed length in every segment while nothing slides (m).
    pub lying: Vec<f64>,
}

/// How a rope behaves at a node through which it may slide.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Grip {
    /// Friction holds it: no rope passes from where it lay in the reference state.
    Sticks,
    /// It slips; the tension beyond the node is this many times that before it (–). 1: no friction.
    Slips(f64),
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
        Self::gripping(structure, case, reference_lengths, factor, None)
    }

    /// The same with ropes that stick or slip against friction.
    ///
    /// `gripping`: none: all slip without friction.
    ///
    /// # Errors
    /// As [`Loading::new`].
    pub fn gripping(
        structure: &Structure,
        case: &Case,
        reference_lengths: &[f64],
        factor: f64,
        gripping: Option<&Gripping>,
    ) -> Result<Self, LoadingError> {
        let net = structure.net();
        let lengths = [
            ("nodal forces", case.nodal_forces.len(), net.nodes().len()),
            ("support movements", case.support_movements.len(), net.nodes().len()),
            ("unstressed lengths", case.unstressed_lengths.len(), net.n_lengths()),
            ("reference lengths", reference_lengths.len(), net.n_lengths()),
            ("segments", case.segments.len(), net.segments().len()),
            ("removal marks", case.removed.len(), net.segments().len()),
            (
                "pressures",
                case.pressures.len(),
                // None at all is as good as zeros.
                if case.pressures.is_empty() {
                    0
                } else {
                    net.panels().len()
                },
            ),
        ];
        for (what, given, needed) in lengths {
            if given != needed {
                return Err(LoadingError::WrongLength { what, given, needed });
            }
        }
        check_vectors("force", &case.nodal_forces)?;
        check_vectors("movement", &case.support_movements)?;
        let mut bars = Vec::with_capacity(net.segments().len());
        let mut unstressed_lengths = vec![0.0; net.segments().len()];
        for (index, segment) in net.segments().iter().enumerate() {
            if case.removed[index] {
                bars.push(Bar::absent());
                continue;
            }
            let start = reference_lengths[segment.length];
            // The plain difference form would not give the case's own length to the last bit at factor 1.
            let length = factor * case.unstressed_lengths[segment.length] + (1.0 - factor) * start;
            unstressed_lengths[index] = length;
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
        if let Some(panel) = case.pressures.iter().position(|p| p.is_nan() || p.abs() >= LARGEST) {
            return Err(LoadingError::Panel {
                panel,
                value: case.pressures[panel],
            });
        }
        let special = special(
            structure,
            case,
            reference_lengths,
            factor,
            gripping,
            &mut bars,
            &mut unstressed_lengths,
        );
        Ok(Self {
            nodal_forces: case.nodal_forces.iter().map(|f| f * factor).collect(),
            bars,
            support_movements: case.support_movements.iter().map(|m| m * factor).collect(),
            unstressed_lengths,
            special,
        })
    }

    /// Every segment as a straight bar, sliding and hanging ones too.
    #[must_use]
    pub fn straight_bars(&self) -> &[Bar] {
        self.special.as_ref().map_or(&self.bars, |special| &special.straight)
    }

    /// Whether equilibrium is that of a convex energy but for struts: no pressure that follows, no slip against friction.
    #[must_use]
    pub fn has_energy(&self) -> bool {
        self.special.as_ref().is_none_or(|special| {
            let is_free = |piece: &Sliding| piece.factors.iter().all(|c| *c == 1.0);
            special.pressures.is_empty() && special.sliding.iter().all(is_free)
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

/// Takes the special segments out of the bars. Each reach that slides has been a bar for each of its segments, as long as
/// the whole reach; it is shared out here.
fn special(
    structure: &Structure,
    case: &Case,
    reference_lengths: &[f64],
    factor: f64,
    gripping: Option<&Gripping>,
    bars: &mut [Bar],
    unstressed_lengths: &mut [f64],
) -> Option<Box<Special>> {
    let net = structure.net();
    let pressures: Vec<f64> = if case.pressures.iter().any(|p| *p != 0.0) {
        case.pressures.iter().map(|p| p * factor).collect()
    } else {
        Vec::new()
    };
    if net.is_plain() && pressures.is_empty() {
        return None;
    }
    let mut special = Special {
        pressures,
        ..Special::default()
    };
    let strain = |e: usize| factor * net.segments()[e].section.expansion * case.segments[e].temperature_change;
    for (index, reach) in net.reaches().iter().enumerate().filter(|(_, reach)| reach.slides()) {
        if case.removed[reach.segments.start] {
            continue;
        }
        let whole = factor * case.unstressed_lengths[index] + (1.0 - factor) * reference_lengths[index];
        for piece in pieces(reach, gripping.map(|g| g.grips[index].as_slice())) {
            let sections = net.segments()[piece.first..piece.first + piece.factors.len()]
                .iter()
                .map(|s| s.section.axial_stiffness);
            let sliding = Sliding {
                axial_stiffness: sections.collect(),
                expansion: piece.segments().map(|e| 1.0 + strain(e)).collect(),
                unstressed_length: gripping.map_or(whole, |g| piece.segments().map(|e| g.lying[e]).sum()),
                ..piece
            };
            let share = sliding.unstressed_length / sliding.factors.len() as f64;
            for (place, e) in sliding.segments().enumerate() {
                unstressed_lengths[e] = share;
                bars[e] = Bar::new(
                    net.segments()[e].law,
                    sliding.axial_stiffness[place],
                    share,
                    sliding.expansion[place] - 1.0,
                );
            }
            if sliding.factors.len() > 1 {
                special.sliding.push(sliding);
            }
        }
    }
    special.straight = bars.to_vec();
    for (e, segment) in net.segments().iter().enumerate() {
        if segment.hangs && !case.removed[e] {
            let length =
                factor * case.unstressed_lengths[segment.length] + (1.0 - factor) * reference_lengths[segment.length];
            special.hanging.push(HangingSegment {
                segment: e,
                catenary: Catenary {
                    axial_stiffness: segment.section.axial_stiffness,
                    unstressed_length: length,
                    stress_free_length: length * (1.0 + strain(e)),
                    load: case.segments[e].per_length * factor,
                },
            });
            bars[e] = Bar::absent();
        }
    }
    for piece in &special.sliding {
        for e in piece.segments() {
            bars[e] = Bar::absent();
        }
    }
    Some(Box::new(special))
}

/// A reach cut where it sticks, with the share of the tension that friction leaves every segment.
fn pieces(reach: &Reach, grips: Option<&[Grip]>) -> Vec<Sliding> {
    let begin = |first| Sliding {
        first,
        axial_stiffness: Vec::new(),
        expansion: Vec::new(),
        factors: vec![1.0],
        unstressed_length: 0.0,
    };
    let mut pieces = vec![begin(reach.segments.start)];
    for (place, e) in reach.segments.clone().skip(1).enumerate() {
        match grips.map_or(Grip::Slips(1.0), |grips| grips[place]) {
            Grip::Sticks => pieces.push(begin(e)),
            Grip::Slips(ratio) => {
                let piece = pieces.last_mut().expect("never empty");
                let before = *piece.factors.last().expect("never empty");
                piece.factors.push(before * ratio);
            }
        }
    }
    pieces
}
