//! What comes of taking members out: one row for each member, or members together, that some case lacks.

use std::cmp::Ordering;
use std::collections::BTreeMap;

use super::{Brief, EffectRule};
use crate::check::CaseDigest;
use crate::model::{AxialLaw, Member, Net, NodeId, SegmentId};

/// Members that a row keeps: of all of them, a row for each member would grow with the square of the net.
const KEPT: usize = 20;

/// A value and where it comes from.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LossExtreme {
    /// The value.
    pub value: f64,
    /// The case or, counted on from the last case, the design effect.
    pub case: usize,
}

/// What a loss does to a member that is left.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LossForce {
    /// The member.
    pub member: Member,
    /// Its axial force that is worst (N), tension positive.
    pub force: f64,
    /// The share of the breaking force (–), where that is known.
    pub share: Option<f64>,
    /// The case or, counted on from the last case, the design effect.
    pub case: usize,
}

impl LossForce {
    /// Worse ones first: by the share of the breaking force, then by the size of the force.
    fn worse_first(&self, other: &Self) -> Ordering {
        let rank = |force: &Self| (force.share.unwrap_or(-1.0), force.force.abs());
        let (own, others) = (rank(self), rank(other));
        others.0.total_cmp(&own.0).then(others.1.total_cmp(&own.1))
    }
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
    /// Members that are left, worst first: the first 20.
    pub worst: Vec<LossForce>,
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
        let mut known: BTreeMap<Vec<(u8, usize)>, usize> = BTreeMap::new();
        let row_of_case = brief.cases.iter().map(|case| {
            if case.removed.is_empty() {
                return None;
            }
            let row = *known
                .entry(case.removed.iter().map(order).collect())
                .or_insert_with(|| {
                    rows.push(Loss {
                        removed: case.removed.clone(),
                        cases: Vec::new(),
                        unanswered: Vec::new(),
                        factor: 1.0,
                        worst: Vec::new(),
                        largest_movement: None,
                        slack: None,
                        loose: None,
                    });
                    rows.len() - 1
                });
            Some(row)
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
        row.take(&brief.net, case, digest);
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
            row.take(&brief.net, brief.cases.len() + effect, digest);
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
    /// Keeps a force if it is among the worst, whatever the order of offers: what is pushed out had enough worse ones, and
    /// those only grow worse.
    fn offer(&mut self, force: LossForce) {
        let place = |a: &LossForce, b: &LossForce| a.worse_first(b).then(order(&a.member).cmp(&order(&b.member)));
        if let Some(known) = self.worst.iter().position(|known| known.member == force.member) {
            let old = self.worst[known];
            if force.worse_first(&old).then(force.case.cmp(&old.case)).is_ge() {
                return;
            }
            self.worst.remove(known);
        }
        let position = self.worst.partition_point(|known| place(known, &force).is_lt());
        self.worst.insert(position, force);
        self.worst.truncate(KEPT);
    }

    fn take(&mut self, net: &Net, case: usize, digest: &CaseDigest) {
        let mut removed = vec![false; digest.axial_forces.len()];
        digest
            .removed
            .iter()
            .for_each(|segment| removed[segment.index()] = true);
        // Of each member its worst segment: segments of a member follow one another.
        let mut of_member: Option<LossForce> = None;
        for (index, segment) in net.segments().iter().enumerate().filter(|(index, _)| !removed[*index]) {
            let force = digest.axial_forces[index];
            let breaking = segment
                .section
                .breaking_force
                .filter(|_| segment.law == AxialLaw::TensionOnly);
            let next = LossForce {
                member: segment.member,
                force,
                share: breaking.map(|breaking| force / breaking),
                case,
            };
            of_member = Some(match of_member {
                Some(last) if last.member != segment.member => {
                    self.offer(last);
                    next
                }
                Some(last) if last.worse_first(&next).is_le() => last,
                _ => next,
            });
        }
        if let Some(last) = of_member {
            self.offer(last);
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

/// Cables, then struts, each in the order of the net.
fn order(member: &Member) -> (u8, usize) {
    match member {
        Member::Cable(cable) => (0, cable.index()),
        Member::Strut(strut) => (1, strut.index()),
    }
}

/// The larger one; of equals the one that comes first in the brief.
fn worse(known: &mut Option<LossExtreme>, value: f64, case: usize) {
    if known.is_none_or(|old| value > old.value || (value == old.value && case < old.case)) {
        *known = Some(LossExtreme { value, case });
    }
}
