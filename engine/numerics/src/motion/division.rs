//! Hanging ropes as straight pieces, for motion: the same net with points of division in between.
//!
//! ```text
//! L0 → n pieces of L0 / n      mass and load of a piece half at each of its ends      points on the catenary of the state
//! ```
//! Totals of mass and load stay what they are. Forces at the ends of the rope, shapes and low frequencies come near those of
//! the catenary with the square of `1 / n`.

use std::ops::Range;
use std::sync::Arc;

use nalgebra::Vector3;

use super::MassGiven;
use crate::element::Catenary;
use crate::load::{Case, SegmentLoads};
use crate::model::{Net, NodeId, ReferenceState, SegmentId};

/// A point between two pieces.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Point {
    /// The hanging segment, in the net as given.
    segment: usize,
    /// Share of its unstressed length up to there (–).
    share: f64,
}

/// A net whose hanging segments are divided into straight pieces, beside the net as given.
#[derive(Clone, Debug)]
pub struct Division {
    whole: Arc<Net>,
    net: Arc<Net>,
    /// Segments that each segment of the whole net became.
    pieces: Vec<Range<usize>>,
    /// The segment of the whole net to which each piece belongs.
    segments: Vec<SegmentId>,
    /// Points of division, in the order of the nodes beyond those of the whole net.
    points: Vec<Point>,
    /// Segments that were divided.
    n_divided: usize,
}

impl Division {
    /// Divides every hanging segment that is there into `pieces`; what is taken out only becomes straight, since nothing
    /// would hold its points. `None` where nothing hangs: then the net is what it is.
    ///
    /// `removed`: one a segment. `pieces`: at least 1.
    #[must_use]
    pub fn new(whole: &Arc<Net>, removed: &[bool], pieces: usize) -> Option<Self> {
        if !whole.segments().iter().any(|segment| segment.hangs) {
            return None;
        }
        let of_segment = |(segment, removed): (&crate::model::Segment, &bool)| match segment.hangs && !removed {
            true => pieces.max(1),
            false => 1,
        };
        let numbers: Vec<usize> = whole.segments().iter().zip(removed).map(of_segment).collect();
        let (mut ranges, mut segments, mut points) = (Vec::with_capacity(numbers.len()), Vec::new(), Vec::new());
        for (segment, n) in numbers.iter().enumerate() {
            ranges.push(segments.len()..segments.len() + n);
            segments.resize(segments.len() + n, SegmentId::new(segment));
            points.extend((1..*n).map(|place| Point {
                segment,
                share: place as f64 / *n as f64,
            }));
        }
        Some(Self {
            net: Arc::new(whole.divided(&numbers)),
            whole: Arc::clone(whole),
            pieces: ranges,
            segments,
            points,
            n_divided: numbers.iter().filter(|n| **n > 1).count(),
        })
    }

    /// The net of straight segments. Nodes of the whole net come first, with the indices that they have there.
    #[must_use]
    pub fn net(&self) -> &Arc<Net> {
        &self.net
    }

    /// The net as given.
    #[must_use]
    pub fn whole(&self) -> &Arc<Net> {
        &self.whole
    }

    /// How many segments were divided.
    #[must_use]
    pub fn n_divided(&self) -> usize {
        self.n_divided
    }

    /// Segments that a segment of the whole net became, by index.
    #[must_use]
    pub fn pieces(&self, whole: SegmentId) -> Range<usize> {
        self.pieces[whole.index()].clone()
    }

    /// The segment of the whole net to which a piece belongs.
    #[must_use]
    pub fn segment(&self, piece: SegmentId) -> SegmentId {
        self.segments[piece.index()]
    }

    /// Whether a node is one of the whole net, and not a point of division.
    #[must_use]
    pub fn is_given(&self, node: NodeId) -> bool {
        node.index() < self.whole.nodes().len()
    }

    /// The node of the whole net that is nearest to a node along its rope.
    #[must_use]
    pub fn nearest(&self, node: NodeId) -> NodeId {
        let beyond = node.index().checked_sub(self.whole.nodes().len());
        match beyond.map(|place| self.points[place]) {
            None => node,
            Some(point) => self.whole.segments()[point.segment].ends[usize::from(point.share > 0.5)],
        }
    }

    /// The hanging segment to which a point of division belongs; `None` for nodes of the whole net.
    #[must_use]
    pub fn segment_at(&self, node: NodeId) -> Option<SegmentId> {
        let place = node.index().checked_sub(self.whole.nodes().len())?;
        Some(SegmentId::new(self.points[place].segment))
    }

    /// One entry a segment for one a segment of the whole net: each piece has that of its segment.
    #[must_use]
    pub fn by_piece<T: Clone>(&self, by_segment: &[T]) -> Vec<T> {
        self.segments.iter().map(|s| by_segment[s.index()].clone()).collect()
    }

    /// One entry a node for one a node of the whole net: points have what is between the ends of their segment.
    #[must_use]
    pub fn by_node(&self, nodal: &[Vector3<f64>]) -> Vec<Vector3<f64>> {
        let points = self.points.iter().map(|point| {
            let [from, to] = self.whole.segments()[point.segment].ends.map(|n| nodal[n.index()]);
            from * (1.0 - point.share) + to * point.share
        });
        nodal.iter().copied().chain(points).collect()
    }

    /// Unstressed lengths (m), for those of the whole net.
    fn lengths(&self, whole: &[f64]) -> Vec<f64> {
        let mut lengths = vec![0.0; self.net.n_lengths()];
        for (piece, of) in self.net.segments().iter().zip(&self.segments) {
            let segment = self.whole.segments()[of.index()];
            // Pieces of a sliding rope share one length with one another, there and here.
            lengths[piece.length] = whole[segment.length] / self.pieces[of.index()].len() as f64;
        }
        lengths
    }

    /// Position of every node (m) in a state of the whole net: points on the catenaries of what acts there, on the chord
    /// where the case takes the segment out.
    ///
    /// `case`: what the state carries. `positions`: of its nodes (m).
    #[must_use]
    pub fn positions(&self, case: &Case, positions: &[Vector3<f64>]) -> Vec<Vector3<f64>> {
        let mut all = self.by_node(positions);
        let mut points = self.points.iter().zip(&mut all[positions.len()..]).peekable();
        while let Some((point, _)) = points.peek() {
            let index = point.segment;
            let segment = &self.whole.segments()[index];
            let unstressed = case.unstressed_lengths[segment.length];
            let [from, to] = segment.ends.map(|n| positions[n.index()]);
            let strain = segment.section.expansion * case.segments[index].temperature_change;
            let rope = Catenary {
                axial_stiffness: segment.section.axial_stiffness,
                unstressed_length: unstressed,
                stress_free_length: unstressed * (1.0 + strain),
                load: case.segments[index].per_length,
            };
            let hanging = (!case.removed[index]).then(|| rope.at(&(to - from), None));
            while let Some((point, position)) = points.next_if(|(point, _)| point.segment == index) {
                if let Some(hanging) = &hanging {
                    *position = from + hanging.point(point.share * unstressed);
                }
            }
        }
        all
    }

    /// The reference state in pieces: lengths and masses come from it.
    ///
    /// `case`: what it carries.
    #[must_use]
    pub fn reference(&self, case: &Case, reference: &ReferenceState) -> ReferenceState {
        ReferenceState {
            positions: self.positions(case, &reference.positions),
            unstressed_lengths: self.lengths(&reference.unstressed_lengths),
            axial_forces: self.by_piece(&reference.axial_forces),
        }
    }

    /// A case in pieces: what acts along a hanging segment stands half at each end of each of its pieces.
    #[must_use]
    pub fn case(&self, case: &Case) -> Case {
        let n_nodes = self.net.nodes().len();
        let mut forces = case.nodal_forces.clone();
        forces.resize(n_nodes, Vector3::zeros());
        let mut movements = case.support_movements.clone();
        movements.resize(n_nodes, Vector3::zeros());
        let lengths = self.lengths(&case.unstressed_lengths);
        for (piece, of) in self.net.segments().iter().zip(&self.segments) {
            let half = case.segments[of.index()].per_length * (0.5 * lengths[piece.length]);
            for end in piece.ends {
                forces[end.index()] += half;
            }
        }
        let segments = self.segments.iter().map(|of| SegmentLoads {
            temperature_change: case.segments[of.index()].temperature_change,
            per_length: Vector3::zeros(),
        });
        let lying = self.segments.iter().filter(|_| !case.lying.is_empty());
        Case {
            nodal_forces: forces,
            segments: segments.collect(),
            support_movements: movements,
            removed: self.by_piece(&case.removed),
            lying: lying
                .map(|of| case.lying[of.index()] / self.pieces[of.index()].len() as f64)
                .collect(),
            pressures: case.pressures.clone(),
            unstressed_lengths: lengths,
        }
    }

    /// Masses beside those of the net, in pieces.
    #[must_use]
    pub fn masses(&self, given: &MassGiven) -> MassGiven {
        let of_pieces = |(segment, mass): &(SegmentId, f64)| {
            let mass = *mass;
            self.pieces(*segment).map(move |piece| (SegmentId::new(piece), mass))
        };
        MassGiven {
            segments: given.segments.iter().flat_map(of_pieces).collect(),
            ..given.clone()
        }
    }
}

#[cfg(test)]
mod tests;
