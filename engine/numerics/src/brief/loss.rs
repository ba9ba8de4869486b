//! What comes of taking members out: one row for each member, or members together, that some case lacks.

use super::{Brief, EffectRule};
use crate::check::CaseDigest;
use crate::model::{AxialLaw, Member, NodeId, SegmentId};

/// A value and where it comes from.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LossExtreme {
    /// The value.
    pub value: f64,
    /// The case or, counted on from the last case, the design effect.
    pub case: usize,
}

/// What the loss of some members came to, over every case without them and every design effect of their loss.
#[derive(Clone, Debug, PartialEq)]
pub struct Loss {
    /// What is taken out.
    pub removed: Vec<Member>,
    /// Cases without it, by index.
    pub cases: Vec<usize>,
    /// Those of them that have no sound answer.
    pub unanswered: Vec<usize>,
    /// Largest factor on the effect of the loss (–); 1 where only states without the members were found.
    pub factor: f64,
    /// Axial force of every segment that is largest in size (N); `None` where nothing was found, or it is taken out.
    pub largest_forces: Vec<Option<LossExtreme>>,
    /// Largest movement from the reference state (m) of nodes whose place is determined.
    pub largest_movement: Option<(NodeId, LossExtreme)>,
    /// Most ropes' segments slack in one state.
    pub slack: Option<LossExtreme>,
    /// Most nodes whose place only slack ropes determine, in one state: the loss made a mechanism of them.
    pub loose: Option<LossExtreme>,
}

/// Losses on their way through the cases, whatever their order.
#[derive(Clone, Debug)]
pub(super) struct LossTally {
    rows: Vec<Loss>,
    /// Row of each case that lacks something.
    row_of_case: Vec<Option<usize>>,
}

impl LossTally {
    pub(super) fn new(brief: &Brief) -> Self {
        let mut rows: Vec<Loss> = Vec::new();
        let row_of_case = brief.cases.iter().map(|case| {
            if case.removed.is_empty() {
                return None;
            }
            let known = rows.iter().position(|row| row.removed == case.removed);
            Some(known.unwrap_or_else(|| {
                rows.push(Loss {
                    removed: case.removed.clone(),
                    cases: Vec::new(),
                    unanswered: Vec::new(),
                    factor: 1.0,
                    largest_forces: vec![None; brief.net.segments().len()],
                    largest_movement: None,
                    slack: None,
                    loose: None,
                });
                rows.len() - 1
            }))
        });
        let row_of_case = row_of_case.collect();
        Self { rows, row_of_case }
    }

    /// Takes in a case of the run, with a sound answer or without.
    pub(super) fn add_case(&mut self, brief: &Brief, case: usize, digest: &CaseDigest) {
        let Some(row) = self.row_of_case[case] else {
            return;
        };
        let row = &mut self.rows[row];
        row.cases.push(case);
        if !digest.is_sound() {
            row.unanswered.push(case);
            return;
        }
        row.take(case, digest);
        let slack = |segment: usize| {
            brief.net.segments()[segment].law == AxialLaw::TensionOnly
                && digest.axial_forces[segment] <= 0.0
                && !digest.removed.contains(&SegmentId::new(segment))
        };
        let slack = (0..digest.axial_forces.len()).filter(|segment| slack(*segment)).count();
        worse(&mut row.slack, slack as f64, case);
        worse(&mut row.loose, digest.loose_nodes.len() as f64, case);
    }

    /// Takes in a design effect.
    pub(super) fn add_effect(&mut self, brief: &Brief, effect: usize, digest: &CaseDigest) {
        let given = &brief.effects[effect];
        let EffectRule::Loss { factor } = given.rule else {
            return;
        };
        for row in given.terms.iter().filter_map(|(case, _)| self.row_of_case[*case]) {
            let row = &mut self.rows[row];
            row.factor = row.factor.max(factor);
            row.take(brief.cases.len() + effect, digest);
        }
    }

    /// The rows for which there was a case.
    pub(super) fn finish(mut self) -> Vec<Loss> {
        for row in &mut self.rows {
            row.cases.sort_unstable();
            row.unanswered.sort_unstable();
        }
        self.rows.retain(|row| !row.cases.is_empty());
        self.rows
    }
}

impl Loss {
    fn take(&mut self, case: usize, digest: &CaseDigest) {
        let mut removed = vec![false; digest.axial_forces.len()];
        digest
            .removed
            .iter()
            .for_each(|segment| removed[segment.index()] = true);
        for (segment, force) in digest
            .axial_forces
            .iter()
            .enumerate()
            .filter(|(segment, _)| !removed[*segment])
        {
            worse(&mut self.largest_forces[segment], *force, case);
        }
        let mut loose = vec![false; digest.displacements.len()];
        digest.loose_nodes.iter().for_each(|node| loose[node.index()] = true);
        for (node, moved) in digest
            .displacements
            .iter()
            .enumerate()
            .filter(|(node, _)| !loose[*node])
        {
            let (node, next) = (
                NodeId::new(node),
                LossExtreme {
                    value: moved.norm(),
                    case,
                },
            );
            let is_worse = self.largest_movement.is_none_or(|(known, old)| {
                next.value > old.value || (next.value == old.value && (case, node) < (old.case, known))
            });
            if is_worse {
                self.largest_movement = Some((node, next));
            }
        }
    }
}

/// The one larger in size; of equals the one that comes first in the brief.
fn worse(known: &mut Option<LossExtreme>, value: f64, case: usize) {
    let is_worse = |old: LossExtreme| {
        let (new, old_size) = (value.abs(), old.value.abs());
        new > old_size || (new == old_size && case < old.case)
    };
    if known.is_none_or(is_worse) {
        *known = Some(LossExtreme { value, case });
    }
}
