//! A run as it came over the wire, put together: the only thing that tables and drawings read.

mod collect;
mod factors;
mod member;
mod motion;
mod path;
pub(crate) mod record;

use std::collections::BTreeMap;

use ropewalk_api::ropewalk::v1;

pub(crate) use collect::Collector;
pub(crate) use motion::MotionRun;
pub(crate) use path::{Growth, LoadPath};

/// A result array.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Column {
    pub(crate) unit: String,
    pub(crate) over: v1::Range,
    pub(crate) components: usize,
    pub(crate) baseline: String,
    pub(crate) values: Vec<f64>,
}

/// The reference state or a case.
#[derive(Clone, Debug)]
pub(crate) struct State {
    pub(crate) id: String,
    pub(crate) in_words: String,
    pub(crate) sets: Vec<String>,
    pub(crate) columns: BTreeMap<String, Column>,
    pub(crate) summary: v1::CaseSummary,
}

impl State {
    /// Whether its arrays are an answer.
    pub(crate) fn answered(&self) -> bool {
        self.summary.outcome() == v1::CaseOutcome::Answered
    }

    /// A result array; none where the engine sent none.
    pub(crate) fn numbers(&self, name: &str) -> Option<&[f64]> {
        self.columns.get(name).map(|column| column.values.as_slice())
    }

    /// An array of vectors.
    pub(crate) fn vectors(&self, name: &str) -> Option<Vec<[f64; 3]>> {
        let column = self.columns.get(name).filter(|column| column.components == 3)?;
        Some(
            column
                .values
                .chunks_exact(3)
                .map(|vector| [vector[0], vector[1], vector[2]])
                .collect(),
        )
    }
}

/// A sum of effects of states, which is no state.
#[derive(Clone, Debug)]
pub(crate) struct Effect {
    pub(crate) effect: v1::DesignEffect,
    pub(crate) columns: BTreeMap<String, Column>,
}

/// What a segment belongs to, by position among the cables or struts.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Member {
    Cable(usize),
    Strut(usize),
}

/// A straight piece between two nodes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct Segment {
    pub(crate) member: Member,
    pub(crate) nodes: [usize; 2],
}

/// The end of a segment at a support.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct End {
    pub(crate) node: usize,
    pub(crate) segment: usize,
}

/// Everything that a run answered, beside the brief that asked for it.
#[derive(Clone, Debug)]
pub(crate) struct Run {
    pub(crate) brief: v1::Brief,
    pub(crate) started: v1::Started,
    pub(crate) nodes: Vec<String>,
    pub(crate) cables: Vec<String>,
    pub(crate) struts: Vec<String>,
    pub(crate) segments: Vec<Segment>,
    /// Supported nodes, by position among the nodes.
    pub(crate) supports: Vec<usize>,
    pub(crate) ends: Vec<End>,
    pub(crate) case_ids: Vec<String>,
    /// The reference state, then the cases in the order in which they came.
    pub(crate) states: Vec<State>,
    pub(crate) envelope: BTreeMap<String, Column>,
    pub(crate) findings: Vec<v1::Finding>,
    /// Where ropes slide: the rope, and the position of the node.
    pub(crate) slides: Vec<(String, usize)>,
    /// The rope or strut of each reach, and its first segment; empty: each segment is a reach of its own.
    pub(crate) reaches: Vec<(String, usize)>,
    /// What was wanted of the reference state, its parts joined.
    pub(crate) shape_report: Option<v1::ShapeReport>,
    pub(crate) effects: Vec<Effect>,
    /// What the loss of members came to.
    pub(crate) losses: Vec<v1::LossRow>,
    pub(crate) panels: Vec<v1::PanelEntry>,
    /// What each action does, the parts of each joined.
    pub(crate) loads: Vec<v1::LoadPicture>,
    /// What was found of states beside their balance, in order.
    pub(crate) diagnoses: Vec<v1::StateDiagnosis>,
    /// Natural modes of states, in order.
    pub(crate) modes: Vec<v1::StateModes>,
    /// Motions in brief order; each has its end.
    pub(crate) motions: Vec<MotionRun>,
    /// Sections that were chosen; none where the brief asks for none.
    pub(crate) sizing: Option<v1::SizingResult>,
    pub(crate) summary: v1::Summary,
    pub(crate) timing: Option<v1::Timing>,
    /// Why the stream broke off before its summary; none where it came whole.
    pub(crate) broken_off: Option<String>,
    /// The request and its events, encoded: what `record::read` makes this run of again.
    pub(crate) record: Vec<u8>,
}

impl Run {
    /// The net of the brief.
    pub(crate) fn net(&self) -> Option<&v1::Net> {
        match &self.brief.net_source {
            Some(v1::brief::NetSource::Net(net)) => Some(net),
            _ => None,
        }
    }

    /// The reference state, if the engine told of one.
    pub(crate) fn reference(&self) -> Option<&State> {
        self.states.iter().find(|state| state.id == "reference")
    }

    /// The natural modes of a state, from the lowest.
    pub(crate) fn modes_of(&self, state: &str) -> Vec<&v1::Mode> {
        let parts = self.modes.iter().filter(|part| part.case == state);
        let modes = parts.filter_map(|part| match part.part.as_ref() {
            Some(v1::state_modes::Part::Mode(mode)) => Some(mode),
            _ => None,
        });
        modes.collect()
    }

    /// What holds for all natural modes of a state.
    pub(crate) fn modes_found(&self, state: &str) -> Option<&v1::ModesFound> {
        let mut parts = self.modes.iter().filter(|part| part.case == state);
        parts.find_map(|part| match part.part.as_ref() {
            Some(v1::state_modes::Part::Found(found)) => Some(found),
            _ => None,
        })
    }

    /// Rope segments: the first of all segments.
    pub(crate) fn n_rope_segments(&self) -> usize {
        self.segments
            .iter()
            .take_while(|segment| matches!(segment.member, Member::Cable(_)))
            .count()
    }

    /// Axial force of every segment in a state (N), tension positive.
    pub(crate) fn axial_forces(&self, state: &State) -> Option<Vec<f64>> {
        let mut forces = state.numbers("tension_n")?.to_vec();
        forces.extend_from_slice(state.numbers("axial_force_n").unwrap_or_default());
        (forces.len() == self.segments.len()).then_some(forces)
    }

    /// Whether each segment is slack in a state; struts never are.
    pub(crate) fn slack(&self, state: &State) -> Vec<bool> {
        let mut slack: Vec<bool> = state
            .numbers("slack")
            .unwrap_or_default()
            .iter()
            .map(|flag| *flag != 0.0)
            .collect();
        slack.resize(self.segments.len(), false);
        slack
    }

    /// Id of the cable or strut that a segment belongs to.
    pub(crate) fn member_id(&self, segment: usize) -> &str {
        match self.segments[segment].member {
            Member::Cable(cable) => &self.cables[cable],
            Member::Strut(strut) => &self.struts[strut],
        }
    }

    /// Segments of each cable in path order.
    pub(crate) fn cable_segments(&self) -> Vec<Vec<usize>> {
        let mut lists = vec![Vec::new(); self.cables.len()];
        for (position, segment) in self.segments.iter().enumerate() {
            if let Member::Cable(cable) = segment.member {
                lists[cable].push(position);
            }
        }
        lists
    }

    /// Unstressed length of each cable in the reference state (m), and of each strut; none where the engine told of none.
    pub(crate) fn unstressed_lengths(&self) -> Option<[Vec<f64>; 2]> {
        let reference = self.reference().filter(|state| state.answered())?;
        let lengths = reference.numbers("unstressed_length_m")?;
        let mut sums = [vec![0.0; self.cables.len()], vec![0.0; self.struts.len()]];
        let first: Vec<usize> = if self.reaches.is_empty() {
            (0..self.segments.len()).collect()
        } else {
            self.reaches.iter().map(|(_, segment)| *segment).collect()
        };
        if first.len() != lengths.len() {
            return None;
        }
        for (segment, length) in first.into_iter().zip(lengths) {
            match self.segments[segment].member {
                Member::Cable(cable) => sums[0][cable] += length,
                Member::Strut(strut) => sums[1][strut] += length,
            }
        }
        Some(sums)
    }

    /// Findings beside those that only repeat why a case has no answer.
    pub(crate) fn other_findings(&self) -> Vec<v1::Finding> {
        let failures: Vec<(&str, &str)> = self
            .states
            .iter()
            .filter_map(|state| Some((state.id.as_str(), state.summary.failure.as_ref()?.message.as_str())))
            .collect();
        let repeats = |finding: &v1::Finding| {
            failures.iter().any(|(case, message)| {
                finding.message == *message || finding.reason == "NO_ANSWER" && finding.case == *case
            })
        };
        self.findings
            .iter()
            .filter(|finding| !repeats(finding))
            .cloned()
            .collect()
    }

    /// Cases that the stream did not come to; the reference state is named like them.
    pub(crate) fn cases_missing(&self) -> Vec<&str> {
        if self.broken_off.is_none() {
            return Vec::new();
        }
        std::iter::once("reference")
            .chain(self.case_ids.iter().map(String::as_str))
            .filter(|id| !self.states.iter().any(|state| state.id == *id))
            .collect()
    }

    /// Title for people, or the id.
    pub(crate) fn title(&self) -> &str {
        if self.brief.title.is_empty() {
            &self.brief.id
        } else {
            &self.brief.title
        }
    }
}

#[cfg(test)]
pub(crate) mod motion_sample;
#[cfg(test)]
pub(crate) mod sample;
