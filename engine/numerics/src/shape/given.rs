//! How the reference state is wanted.

use crate::model::{NodeId, SegmentId};

/// How the prestress of one segment arises.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum PrestressRule {
    /// Force over length (N/m); negative in a strut only.
    ForceDensity(f64),
    /// Axial force in this segment (N); negative in a strut only.
    Tension(f64),
    /// One force density along a family of segments, such that the mean of their tensions is as wanted; index into
    /// [`Prestress::mean_tensions`].
    MeanTension(usize),
    /// One force density along a family of segments, which the search may change so that targets are met; index into
    /// [`Prestress::adjustables`].
    Adjustable(usize),
    /// Unstressed length (m): takes part in the search as an elastic member.
    UnstressedLength(f64),
    /// Whatever force keeps the nodes of [`Prestress::hold`] in place.
    Balance,
}

/// How the reference state arises.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Prestress {
    /// One rule a segment.
    pub rules: Vec<PrestressRule>,
    /// Wanted mean tension of each family (N).
    pub mean_tensions: Vec<f64>,
    /// Free nodes that stay where they were given while the shape is found.
    pub hold: Vec<NodeId>,
    /// Actions under which the reference state is in balance, by index; dead loads only.
    pub under: Vec<usize>,
    /// Force densities that may change so that targets are met.
    pub adjustables: Vec<Adjustable>,
    /// What the shape is to meet beside wanted tensions.
    pub targets: Vec<ShapeTarget>,
}

/// A force density that may change.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Adjustable {
    /// Where the search starts, and what it changes as little as the targets allow (N/m); not zero. Its sign stays.
    pub density: f64,
    /// Least size (N/m); zero or more.
    pub least: f64,
    /// Largest size (N/m); may be infinite.
    pub most: f64,
}

/// What the shape is to meet.
#[derive(Clone, Debug, PartialEq)]
pub struct ShapeTarget {
    /// The client's name of it.
    pub name: String,
    /// What is wanted.
    pub wish: Wish,
    /// By how much its deviation counts more than others (–), positive.
    pub weight: f64,
}

/// How a sag is measured.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum SagMeasure {
    /// Vertically from the chord, positive where the node is below.
    Vertical,
    /// Perpendicular to the chord, never negative.
    Normal,
}

/// What is wanted of a shape.
#[derive(Clone, Debug, PartialEq)]
pub enum Wish {
    /// Mean tension of some segments (N); negative in struts only.
    Tension {
        /// The segments.
        segments: Vec<SegmentId>,
        /// Wanted mean (N), not zero.
        tension: f64,
    },
    /// Length of some segments together (m).
    Length {
        /// The segments.
        segments: Vec<SegmentId>,
        /// Wanted sum (m), positive.
        length: f64,
    },
    /// Unstressed length of some segments together (m).
    UnstressedLength {
        /// The segments.
        segments: Vec<SegmentId>,
        /// Wanted sum (m), positive.
        length: f64,
    },
    /// A coordinate of a node.
    Coordinate {
        /// The node.
        node: NodeId,
        /// 0, 1, 2: x, y, z.
        axis: usize,
        /// Wanted coordinate (m).
        value: f64,
    },
    /// Sag of a node from the chord between two others.
    Sag {
        /// The node.
        node: NodeId,
        /// Ends of the chord.
        chord: [NodeId; 2],
        /// Wanted sag (m).
        sag: f64,
        /// How it is measured.
        measure: SagMeasure,
    },
    /// Equal lengths of some segments, whatever they are: an equal mesh width.
    EqualLengths {
        /// At least two segments.
        segments: Vec<SegmentId>,
    },
    /// Radius of the circle through a node and its two neighbours (m).
    Radius {
        /// The neighbour before, the node, the neighbour behind.
        nodes: [NodeId; 3],
        /// Wanted radius (m), positive.
        radius: f64,
    },
    /// Nodes on a surface over plan that scattered points give.
    Surface {
        /// The nodes.
        nodes: Vec<NodeId>,
        /// Points of the surface (m).
        points: Vec<nalgebra::Vector3<f64>>,
    },
}
