//! Why a motion did not begin, in the client's ids.

use std::fmt;

use crate::assembly::LoadingError;
use crate::brief::{Brief, Cause, DrivenWhat};
use crate::model::{Net, NodeId, SegmentId};
use crate::motion::Division;
use crate::motion::transient::MotionError;
use crate::shape::words::list;

/// Why a motion did not begin.
#[derive(Clone, Debug, PartialEq)]
pub enum MotionNotBegun {
    /// A state that it needs has no answer, or the audit does not confirm it.
    NoState {
        /// The state: a case by index, or the reference state.
        state: Option<usize>,
        /// Its name; empty for the reference state.
        name: String,
        /// Why it has none; `None` where it is in balance but not confirmed.
        cause: Option<Box<Cause>>,
    },
    /// Ropes slide.
    Slides {
        /// Ids of the cables.
        cables: Vec<String>,
    },
    /// Nodes can move but have no mass.
    NoMass {
        /// Ids of the nodes.
        nodes: Vec<String>,
        /// Ids of hanging cables without mass.
        cables: Vec<String>,
    },
    /// What is to break is taken out already.
    NotThere {
        /// Id of the cable or strut.
        member: String,
    },
    /// It is to break twice.
    BrokenTwice {
        /// Id of the cable or strut.
        member: String,
    },
    /// With hanging ropes divided the net did not come to balance.
    NotDivided {
        /// Ids of the hanging cables.
        cables: Vec<String>,
        /// Pieces of each segment.
        pieces: usize,
        /// What stood against it.
        why: String,
    },
    /// It is too much.
    TooLarge {
        /// Steps, as many as stability needs where they are explicit.
        steps: f64,
        /// Size of all frames (bytes).
        bytes: f64,
        /// Steps allowed.
        most_steps: f64,
        /// Size of frames allowed (bytes).
        most_bytes: f64,
    },
    /// What is given can not be used.
    Given {
        /// What is wrong.
        what: String,
        /// Ids of nodes to look at.
        nodes: Vec<String>,
        /// Ids of members to look at.
        members: Vec<String>,
    },
    /// The observer stopped it.
    Cancelled,
}

impl MotionNotBegun {
    /// What to try.
    #[must_use]
    pub fn cure(&self) -> &'static str {
        match self {
            Self::NoState { .. } => "mend that state first, or start the motion from another one",
            Self::Slides { .. } => "clamp these ropes where they slide, in a brief of its own for the motion",
            Self::NoMass { .. } => "give a rope at each of them a mass per length, or attach a mass",
            Self::NotThere { .. } => "break a rope that is there, or start from a state that has it",
            Self::BrokenTwice { .. } => "let each rope and each of its segments break once",
            Self::NotDivided { .. } => {
                "divide hanging ropes into more pieces, or into fewer where they are nearly straight"
            }
            Self::TooLarge { .. } => "shorten the time, lengthen the step, or show frames less often",
            Self::Given { .. } => "mend what is given of the motion",
            Self::Cancelled => "run it again",
        }
    }

    /// Ids of nodes to look at.
    #[must_use]
    pub fn nodes(&self) -> Vec<&str> {
        match self {
            Self::NoMass { nodes, .. } | Self::Given { nodes, .. } => nodes.iter().map(String::as_str).collect(),
            Self::NoState { cause: Some(cause), .. } => {
                cause.worst.iter().map(|culprit| culprit.node.as_str()).collect()
            }
            _ => Vec::new(),
        }
    }

    /// Ids of cables and struts to look at.
    #[must_use]
    pub fn members(&self) -> Vec<&str> {
        match self {
            Self::Slides { cables } | Self::NoMass { cables, .. } | Self::NotDivided { cables, .. } => {
                cables.iter().map(String::as_str).collect()
            }
            Self::Given { members, .. } => members.iter().map(String::as_str).collect(),
            Self::NotThere { member } | Self::BrokenTwice { member } => vec![member],
            Self::NoState { cause: Some(cause), .. } => cause.members.iter().map(String::as_str).collect(),
            _ => Vec::new(),
        }
    }
}

/// Ids that a sentence names before it counts.
const NAMED: usize = 6;

impl fmt::Display for MotionNotBegun {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::NoState { state, name, cause } => {
                match state {
                    None => f.write_str("the reference state")?,
                    Some(_) => write!(f, "the state of \"{name}\"")?,
                }
                match cause {
                    Some(cause) => write!(f, " has no answer: {cause}"),
                    None => f.write_str(" is no answer: an independent routine does not confirm it"),
                }
            }
            Self::Slides { cables } => write!(
                f,
                "motions know ropes that are clamped at every node; these slide: {}",
                list(cables, NAMED)
            ),
            Self::NoMass { nodes, cables } => {
                f.write_str("what can move must have mass. Without mass: ")?;
                match (nodes.is_empty(), cables.is_empty()) {
                    (false, false) => write!(f, "{}; along {}", list(nodes, NAMED), list(cables, NAMED)),
                    (true, _) => write!(f, "along {}", list(cables, NAMED)),
                    (_, true) => f.write_str(&list(nodes, NAMED)),
                }
            }
            Self::NotThere { member } => write!(
                f,
                "\"{member}\" is to break, but is taken out in the state that the motion starts from"
            ),
            Self::BrokenTwice { member } => write!(f, "\"{member}\" is to break twice"),
            Self::NotDivided { cables, pieces, why } => write!(
                f,
                "with hanging ropes divided into {pieces} straight pieces a segment the net does not come to balance, {why}: {}",
                list(cables, NAMED)
            ),
            Self::TooLarge {
                steps,
                bytes,
                most_steps,
                most_bytes,
            } => write!(
                f,
                "{steps:.3e} steps with {bytes:.3e} bytes of frames are too much: at most {most_steps:e} and {most_bytes:e}"
            ),
            Self::Given { what, .. } => f.write_str(what),
            Self::Cancelled => f.write_str("stopped on request"),
        }
    }
}

/// Parts of the net that moves, in the client's ids.
#[derive(Clone, Copy, Debug)]
pub(super) struct Names<'a> {
    pub(super) brief: &'a Brief,
    pub(super) division: Option<&'a Division>,
}

impl Names<'_> {
    fn net(&self) -> &Net {
        &self.brief.net
    }

    /// The segment of the net as given.
    pub(super) fn segment(&self, segment: SegmentId) -> SegmentId {
        self.division.map_or(segment, |division| division.segment(segment))
    }

    fn member(&self, segment: SegmentId) -> String {
        self.net().member_name(self.segment(segment)).to_owned()
    }

    /// A node by its id, a point of division by that of its cable.
    fn place(&self, node: NodeId) -> Result<String, String> {
        match self.division.and_then(|division| division.segment_at(node)) {
            None => Ok(self.net().node_name(node).to_owned()),
            Some(segment) => Err(self.net().member_name(segment).to_owned()),
        }
    }

    /// Nodes and hanging cables without mass.
    pub(super) fn no_mass(&self, at: impl Iterator<Item = NodeId>) -> MotionNotBegun {
        let (mut nodes, mut cables) = (Vec::new(), Vec::new());
        for node in at {
            match self.place(node) {
                Ok(node) => nodes.push(node),
                Err(cable) if cables.last() != Some(&cable) => cables.push(cable),
                Err(_) => {}
            }
        }
        MotionNotBegun::NoMass { nodes, cables }
    }

    fn given(&self, what: String, node: Option<NodeId>, segment: Option<SegmentId>) -> MotionNotBegun {
        let place = node.map(|node| self.place(node));
        let mut members: Vec<String> = segment.map(|segment| self.member(segment)).into_iter().collect();
        let mut nodes = Vec::new();
        match place {
            Some(Ok(node)) => nodes.push(node),
            Some(Err(cable)) => members.push(cable),
            None => {}
        }
        MotionNotBegun::Given { what, nodes, members }
    }

    /// An error of the kernel in the client's ids. `motion`: which one of the brief.
    pub(super) fn refusal(&self, motion: usize, error: &MotionError) -> MotionNotBegun {
        let at = |node: NodeId| match self.place(node) {
            Ok(node) => format!("\"{node}\""),
            Err(cable) => format!("a point of \"{cable}\""),
        };
        let driven = |place: usize| match self.brief.motions[motion].driven.get(place).map(|driven| &driven.what) {
            Some(DrivenWhat::Action(action)) => format!("driven action \"{}\"", self.brief.actions[*action].name),
            _ => format!("driven load {}", place + 1),
        };
        match error {
            MotionError::NoMass { node } => self.no_mass(std::iter::once(*node)),
            MotionError::Slides { segment } => MotionNotBegun::Slides {
                cables: vec![self.member(*segment)],
            },
            MotionError::NotThere { segment, .. } => MotionNotBegun::NotThere {
                member: self.member(*segment),
            },
            MotionError::BrokenTwice { segment, .. } => MotionNotBegun::BrokenTwice {
                member: self.member(*segment),
            },
            MotionError::TooLarge {
                steps,
                bytes,
                most_steps,
                most_bytes,
            } => MotionNotBegun::TooLarge {
                steps: *steps,
                bytes: *bytes,
                most_steps: *most_steps,
                most_bytes: *most_bytes,
            },
            MotionError::HeldVelocity { node } => {
                let what = format!("{} is held along the velocity that it is given", at(*node));
                self.given(what, Some(*node), None)
            }
            MotionError::Driven { driven: place, what } => {
                let what = format!(
                    "{} changes {what}: only forces, pressures and movements of supports may vary in time",
                    driven(*place)
                );
                self.given(what, None, None)
            }
            MotionError::History { driven: place, error } => {
                self.given(format!("the history of {}: {error}", driven(*place)), None, None)
            }
            MotionError::Loading(LoadingError::Node { node, what, value }) => self.given(
                format!("the {what} of {} would be {value:e}", at(*node)),
                Some(*node),
                None,
            ),
            MotionError::Loading(LoadingError::Segment { segment, what, value }) => {
                let what = format!("the {what} of \"{}\" would be {value:e}", self.member(*segment));
                self.given(what, None, Some(*segment))
            }
            MotionError::Loading(LoadingError::Panel { panel, value }) => {
                let name = &self.net().panels()[*panel].name;
                self.given(format!("the pressure on \"{name}\" would be {value:e}"), None, None)
            }
            other => self.given(other.to_string(), None, None),
        }
    }
}
