//! Actions: named groups of loads that are factored as one.

use nalgebra::Vector3;

use crate::model::{Area, NodeId, SegmentId};

/// Which segments a load acts on.
#[derive(Clone, Debug, PartialEq)]
pub enum Scope {
    /// Every cable and strut.
    All,
    /// These segments.
    Segments(Vec<SegmentId>),
}

/// One load. All but pressure on a surface are dead: fixed in size and direction once the reference state is known.
#[derive(Clone, Debug, PartialEq)]
pub enum Load {
    /// The same force (N) on each of these nodes.
    Nodes {
        /// The nodes.
        nodes: Vec<NodeId>,
        /// Force on each (N).
        force: Vector3<f64>,
    },
    /// Weight of every mass: members by their unstressed length, half to each end; attached masses; skins by their area
    /// in the reference state.
    OwnWeight {
        /// Acceleration (m/s²), pointing down for the usual case.
        gravity: Vector3<f64>,
    },
    /// Force per unstressed length (N/m), half of a segment's share to each end.
    PerUnstressedLength {
        /// Where.
        scope: Scope,
        /// Force per length (N/m).
        force: Vector3<f64>,
    },
    /// Force per length on plan in the reference state (N/m), half of a segment's share to each end.
    PerPlanLength {
        /// Where.
        scope: Scope,
        /// Force per length on plan (N/m).
        force: Vector3<f64>,
    },
    /// Pressure on the area on plan in the reference state, downward.
    OnPlan {
        /// Skins or zones, each panel once.
        on: Vec<Area>,
        /// Pressure (Pa), downward positive.
        pressure: f64,
    },
    /// Pressure on the outer side of panels; it stays normal to them as they move.
    OnSurface {
        /// Reference pressure (Pa).
        pressure: f64,
        /// Coefficients of zones and skins; a zone wins over its skin.
        coefficients: Vec<(Area, f64)>,
        /// Coefficient of all other panels; none: they get no pressure.
        elsewhere: Option<f64>,
    },
    /// Drag of wind on round ropes, across them, fixed at the reference geometry. With the wind along the unit vector `w`
    /// and the rope along `t`, `w⊥ = w − (w·t) t`:
    ///
    /// ```text
    /// force per length = pressure · drag coefficient · diameter · |w⊥| w⊥
    /// ```
    ///
    /// The part of the wind along the rope does nothing (cross-flow principle, Hoerner 1965).
    WindOnRopes {
        /// Where; every segment has a diameter.
        scope: Scope,
        /// Velocity pressure of the wind (Pa).
        pressure: f64,
        /// Direction in which the wind blows, a unit vector.
        along: Vector3<f64>,
        /// Drag coefficient on the diameter (–).
        drag_coefficient: f64,
    },
    /// A ring of ice around round ropes, `π t (d + t)` in section, along the unstressed length.
    Ice {
        /// Where; every segment has a diameter.
        scope: Scope,
        /// Thickness `t` of the ring (m).
        thickness: f64,
        /// Density of the ice (kg/m³).
        density: f64,
        /// Acceleration (m/s²).
        gravity: Vector3<f64>,
    },
    /// Change of temperature from the reference temperature (K).
    Temperature {
        /// Where.
        scope: Scope,
        /// Change (K).
        change: f64,
    },
    /// Movement of a support (m), along its held or sprung directions.
    SupportMovement {
        /// The supported node.
        node: NodeId,
        /// By how much (m).
        by: Vector3<f64>,
    },
    /// A piece of rope drawn in or let out at one of its ends: its unstressed length changes.
    Adjustment {
        /// Index of the unstressed length, see [`crate::model::Net::n_lengths`].
        length: usize,
        /// The segment at that end.
        segment: SegmentId,
        /// Change (m), positive = longer.
        by: f64,
    },
    /// Change of prestress through lengths: each reach gets the unstressed length for which its reference tension at
    /// the reference geometry is `(1 + share) T`. Reaches slack in the reference state and struts keep their length.
    PrestressShare {
        /// Where.
        scope: Scope,
        /// Share of the reference tension, greater than −1.
        share: f64,
    },
}

/// A named group of loads, factored as one.
#[derive(Clone, Debug, PartialEq)]
pub struct Action {
    /// The client's id.
    pub name: String,
    /// What it is made of.
    pub loads: Vec<Load>,
}
