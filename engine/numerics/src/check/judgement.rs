//! One part, judged or not.

use super::{CheckKind, Share, Verdict};
use crate::model::{CableId, NodeId, SegmentId, StrutId};

/// Ratios are not told beyond this: where nothing is allowed or a distance is gone they would have no end.
pub const LARGEST_RATIO: f64 = 1000.0;

/// A part that a check covers.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Covered {
    /// A cable.
    Cable(CableId),
    /// A strut.
    Strut(StrutId),
    /// A node.
    Node(NodeId),
    /// A panel, by index.
    Panel(usize),
    /// The point of a clearance.
    Point,
}

/// What was measured, and so the unit of demand and limit.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Measure {
    /// Tension (N), times a factor where one is asked for.
    Tension,
    /// Tension over the tension in the reference state (–).
    TensionShare,
    /// Compression (N).
    Compression,
    /// Movement (m).
    Movement,
    /// True distance (m).
    Distance,
    /// Height above or below a point (m).
    Height,
    /// Size of the pull on an anchor (N).
    Pull,
    /// Its horizontal part (N).
    HorizontalPull,
    /// Its upward part (N).
    Uplift,
    /// Its angle above the horizontal (rad).
    UpAngle,
    /// Its angle off the wanted direction in plan (rad).
    PlanAngle,
    /// Difference of tension across a clamp (N).
    TensionDifference,
    /// Wanted radius of a saddle against the one given (m).
    Radius,
    /// Larger over smaller tension across a saddle (–).
    TensionRatio,
    /// Slope of a panel (m per m).
    Fall,
}

/// Why a part could not be judged.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Lack {
    /// No case with a sound answer.
    Answer,
    /// The check is for ropes, and this is a strut.
    Rope,
    /// The check is for struts, and this is a rope.
    Strut,
    /// The breaking force is not known.
    BreakingForce,
    /// The bending stiffness is not known.
    BendingStiffness,
    /// The diameter is not known.
    Diameter,
    /// Slack in the reference state.
    TautReference,
    /// Not supported.
    Support,
    /// No rope runs on through the node, clamped there.
    ClampedRope,
    /// No rope runs on through the node.
    PassingRope,
    /// Nothing lies above or below the point.
    Over,
    /// The case that movements are measured from has no sound answer.
    Base,
    /// The place is not determined, because only slack ropes lead there.
    Place,
    /// A design effect is no state: it has no places.
    State,
    /// The numbers do not give a finite ratio.
    Finite,
}

impl Lack {
    /// Whether another section could mend it.
    #[must_use]
    pub fn is_of_section(self) -> bool {
        matches!(self, Self::BreakingForce | Self::BendingStiffness | Self::Diameter)
    }
}

/// One part, judged.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Judgement {
    /// The part.
    pub of: Covered,
    /// The segment that governs, where one does.
    pub segment: Option<SegmentId>,
    /// The panel that governs a clearance, by index.
    pub panel: Option<usize>,
    /// The case that governs, by index; `None` stands for the reference state.
    pub case: Option<usize>,
    /// What was measured.
    pub measure: Measure,
    /// What is demanded, in the unit of `measure`.
    pub demand: f64,
    /// What is allowed, in the same unit; a least value for distances, heights, falls and shares of tension.
    pub limit: f64,
    /// Use of the limit (–): above 1 fails; at most [`LARGEST_RATIO`]. For slackness the share of tension lost over the
    /// share that may be lost; a slack rope of which only that it is not slack is asked stands at 1, and fails. For an
    /// angle the distance from the middle of its range over half of the range.
    pub ratio: f64,
    /// Whether the demand keeps within the limit.
    pub passes: bool,
    /// Largest bending moment of an eccentrically compressed strut (N m), where one is asked for and there is one.
    pub moment: Option<f64>,
}

impl Judgement {
    /// A demand that must not be more than `limit`. Fails to judge where the ratio would be no number.
    pub(super) fn at_most(of: Covered, measure: Measure, demand: f64, limit: f64) -> Result<Self, Lack> {
        let ratio = match (demand > 0.0, limit > 0.0) {
            (false, false) => 0.0,
            (true, false) => LARGEST_RATIO,
            (_, true) => demand / limit,
        };
        Self::with_ratio(of, measure, demand, limit, ratio, demand <= limit)
    }

    /// A demand that must not be less than `least`, which is positive.
    pub(super) fn at_least(of: Covered, measure: Measure, demand: f64, least: f64) -> Result<Self, Lack> {
        let ratio = if demand > 0.0 { least / demand } else { LARGEST_RATIO };
        Self::with_ratio(of, measure, demand, least, ratio, demand >= least)
    }

    pub(super) fn with_ratio(
        of: Covered,
        measure: Measure,
        demand: f64,
        limit: f64,
        ratio: f64,
        passes: bool,
    ) -> Result<Self, Lack> {
        if !(ratio.is_finite() && demand.is_finite() && limit.is_finite()) {
            return Err(Lack::Finite);
        }
        Ok(Self {
            of,
            segment: None,
            panel: None,
            case: None,
            measure,
            demand,
            limit,
            ratio: ratio.min(LARGEST_RATIO),
            passes,
            moment: None,
        })
    }

    pub(super) fn on(self, segment: SegmentId) -> Self {
        Self {
            segment: Some(segment),
            ..self
        }
    }

    /// Of two the one with the larger ratio, of equals the first.
    pub(super) fn worse(self, next: Self) -> Self {
        if next.ratio > self.ratio { next } else { self }
    }
}

/// What came of one check.
#[derive(Clone, Debug, PartialEq)]
pub struct CheckResult {
    /// What was checked.
    pub kind: CheckKind,
    /// One entry a judged part, each with its governing case, in the order of the check.
    pub judgements: Vec<Judgement>,
    /// Covered parts that could not be judged, and why.
    pub not_judged: Vec<(Covered, Lack)>,
    /// Covered cases without a sound answer.
    pub unanswered: Vec<usize>,
}

impl CheckResult {
    /// The judged part with the largest ratio.
    #[must_use]
    pub fn worst(&self) -> Option<&Judgement> {
        self.judgements.iter().max_by(|a, b| a.ratio.total_cmp(&b.ratio))
    }

    /// Judged parts of those covered.
    #[must_use]
    pub fn judged(&self) -> Share {
        Share {
            count: self.judgements.len(),
            of: self.judgements.len() + self.not_judged.len(),
        }
    }

    /// The word for this check alone. A check over nothing judges nothing.
    #[must_use]
    pub fn verdict(&self) -> Verdict {
        if !self.unanswered.is_empty() {
            Verdict::NoAnswer
        } else if self.judgements.iter().any(|j| !j.passes) {
            Verdict::Exceeds
        } else if self.judgements.is_empty() || !self.not_judged.is_empty() {
            Verdict::NotJudged
        } else {
            Verdict::Passes
        }
    }
}
