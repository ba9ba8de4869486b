//! Why a case has no answer, in the client's ids.

use std::collections::BTreeSet;
use std::fmt;

use nalgebra::Vector3;

use super::{Ponding, PondingEnd, StateResult};
use crate::diagnose::mechanism::{self, Arrangement};
use crate::diagnose::plausible;
use crate::equilibrium::stability::FreeMovement;
use crate::equilibrium::{Solution, SolveError, Termination};
use crate::load::{Case, Place};
use crate::model::{Member, Net, NodeId, ReferenceState, SegmentId};
use crate::shape::words::{direction, kilonewtons, list, three_digits};

/// A node to blame.
#[derive(Clone, Debug, PartialEq)]
pub struct Culprit {
    /// The client's id of the node.
    pub node: String,
    /// Force out of balance there (N).
    pub imbalance: f64,
    /// How far it has moved from the reference state (m).
    pub moved: f64,
}

/// What is likely behind it.
#[derive(Clone, Debug, PartialEq)]
pub enum LikelyCause {
    /// The numbers of the case can not be used.
    Numbers {
        /// What is wrong, with the id of the part.
        what: String,
    },
    /// A part that nothing holds carries a load.
    NotHeld {
        /// Ids of the nodes.
        nodes: Vec<String>,
        /// The load on them (N).
        force: Vector3<f64>,
    },
    /// The net can move freely.
    Mechanism {
        /// Id of the node that moves most.
        node: String,
        /// How (unit).
        direction: Vector3<f64>,
        /// Stiffness against the movement (N/m).
        stiffness: f64,
        /// Ids of the members at the node.
        members: Vec<String>,
        /// Whether they lie in one plane or on one line.
        flat: bool,
    },
    /// Strains beyond what any material bears: units are likely mixed up.
    UnitSlip {
        /// Id of the member.
        member: String,
        /// Its `EA` as given (N).
        axial_stiffness: f64,
        /// Its strain (–).
        strain: f64,
        /// Factor on `EA` that would make sense of it.
        likely_factor: Option<f64>,
    },
    /// Most ropes are slack, so that little resists.
    MuchSlack {
        /// Ids of slack cables at the nodes to blame.
        cables: Vec<String>,
        /// Slack segments.
        slack: usize,
        /// Cable segments.
        of: usize,
    },
    /// The net left its place under the load.
    RanAway,
    /// The load tips the net: beyond the share reached there is no near state of balance.
    Tips {
        /// Ids of slack cables.
        slack_cables: Vec<String>,
        /// Sum of the loads (N).
        load_sum: Vector3<f64>,
    },
    /// A node on a sliding rope runs to the next one: contact there is not part of the model.
    RanToTheEnd {
        /// Id of the rope.
        cable: String,
        /// Id of the node that runs.
        node: String,
        /// Id of the node that it runs to.
        end: String,
        /// Distance between them in the reference state (m).
        lay: f64,
    },
    /// Water that gathers on a skin makes more room than it fills, or does not settle.
    Pond {
        /// Where it is deepest: id of a node or a panel.
        place: String,
        /// Depth there (m).
        depth: f64,
        /// Volume of all water (m³).
        volume: f64,
        /// What the last round added (m³), and the one before.
        growth: (f64, f64),
        /// Whether it grows: the last round added no less than the one before.
        grows: bool,
        /// Rounds.
        rounds: usize,
    },
    /// The allowance of iterations was used up before the forces were in balance.
    OutOfIterations,
    /// Each method came to an end of its own, for no reason that the state shows: more iterations would not help.
    GaveUp,
}

/// Why a case has no answer, and what to change.
#[derive(Clone, Debug, PartialEq)]
pub struct Cause {
    /// What is likely behind it.
    pub likely: LikelyCause,
    /// Nodes with the largest imbalance, or else the largest movement; worst first.
    pub worst: Vec<Culprit>,
    /// Ids of the members at the worst node.
    pub members: Vec<String>,
    /// Share of the load of the last good state; zero where there is none, or where it means nothing: a net of ropes under
    /// dead loads has a state at every share.
    pub last_good_load_factor: f64,
    /// The least share of the load beyond the last good state that was tried in vain, where smaller and smaller steps
    /// were taken.
    pub stopped_at: Option<f64>,
    /// Whether an equilibrium is known to exist, so that the solver gave up and not the net: ropes alone, dead loads, and
    /// each of them held.
    pub exists: bool,
    /// Ids of the members that the case takes out.
    pub taken_out: Vec<String>,
}

/// Share of slack segments from which slackness is to blame.
const MUCH_SLACK: f64 = 0.5;
/// Ids that a sentence names before it counts.
const NAMED: usize = 6;
/// A limit of fewer factorisations is itself to blame: hard nets have taken 70.
const FAIR_LIMIT: u32 = 100;

/// A solve that stopped short.
pub(super) struct Stop<'a> {
    pub(super) reference: &'a ReferenceState,
    /// The case that was wanted.
    pub(super) case: &'a Case,
    pub(super) solution: &'a Solution,
    /// The last state under the share that it carries.
    pub(super) result: &'a StateResult,
    /// Factorisations that were allowed.
    pub(super) limit: u32,
}

/// Reads the cause from the last state.
pub(super) fn cause_of_stop(net: &Net, stop: &Stop<'_>) -> Cause {
    let Stop {
        reference,
        case,
        solution,
        result,
        limit,
    } = *stop;
    let worst = culprits(net, result);
    let worst_node = worst.first().map(|(node, _)| *node);
    let slack_cables = |near: Option<NodeId>| -> Vec<String> {
        let touches = |index: &usize| near.is_none_or(|n| net.segments()[*index].ends.contains(&n));
        let slack = (0..net.segments().len())
            .filter(|index| result.slack[*index])
            .filter(touches);
        distinct(slack.map(|index| net.member_name(SegmentId::new(index)).to_owned()))
    };
    let n_cable_segments = net
        .segments()
        .iter()
        .filter(|s| matches!(s.member, Member::Cable(_)))
        .count();
    let n_slack = result.slack.iter().filter(|slack| **slack).count();
    // Forces out of balance say little about strain; those of a balanced state do.
    let balanced = result.audit.passed.then_some(&solution.axial_forces);
    let strained = std::iter::once(&reference.axial_forces)
        .chain(balanced)
        .flat_map(|forces| plausible::strained_members(net, case, forces))
        .max_by(|a, b| a.strain.abs().total_cmp(&b.strain.abs()));
    let odd = plausible::odd_stiffnesses(net);
    let is_spent = solution.termination == Termination::IterationLimit;
    // Struts, friction and pressure that follows the shape leave the question open.
    let exists = net.is_pure_tension() && !net.has_friction() && case.pressures.iter().all(|p| *p == 0.0);
    let ran_to_the_end = worst_node.and_then(|worst| ran_to_the_end(net, reference, result, worst));
    let exists = exists && ran_to_the_end.is_none();
    let likely = match (strained, odd.first()) {
        _ if ran_to_the_end.is_some() => ran_to_the_end.expect("looked at"),
        (Some(strained), _) if strained.likely_factor.is_some() => LikelyCause::UnitSlip {
            member: net.member_name(strained.segment).to_owned(),
            axial_stiffness: strained.axial_stiffness,
            strain: strained.strain,
            likely_factor: strained.likely_factor,
        },
        (_, Some(odd)) if odd.is_borne_out(&reference.axial_forces) => LikelyCause::UnitSlip {
            member: net.member_name(odd.segment).to_owned(),
            axial_stiffness: odd.axial_stiffness,
            strain: solution.axial_forces[odd.segment.index()] / odd.axial_stiffness,
            likely_factor: Some(odd.likely_factor),
        },
        _ if solution.termination == Termination::RunsAway => LikelyCause::RanAway,
        _ if is_spent && limit < FAIR_LIMIT => LikelyCause::OutOfIterations,
        _ if n_slack > 0 && n_slack as f64 >= MUCH_SLACK * n_cable_segments as f64 => LikelyCause::MuchSlack {
            cables: slack_cables(worst_node),
            slack: n_slack,
            of: n_cable_segments,
        },
        _ if !exists => LikelyCause::Tips {
            slack_cables: slack_cables(None),
            load_sum: case.nodal_forces.iter().sum(),
        },
        _ if is_spent => LikelyCause::OutOfIterations,
        _ => LikelyCause::GaveUp,
    };
    // A last state that balances carries its share of the load; one that does not is no good state.
    let has_good_state = result.audit.passed && !exists;
    let last_good_load_factor = if has_good_state { solution.load_factor } else { 0.0 };
    let beyond = (solution.history.iter())
        .map(|report| report.load_factor)
        .filter(|factor| *factor > solution.load_factor);
    let stopped_at = beyond.clone().fold(f64::INFINITY, f64::min);
    let is_halved = beyond.clone().any(|factor| factor > stopped_at);
    Cause {
        stopped_at: (has_good_state && is_halved).then_some(stopped_at),
        exists,
        taken_out: taken_out(net, case),
        likely,
        members: worst_node.map_or_else(Vec::new, |node| members_at(net, node)),
        worst: worst.into_iter().map(|(_, culprit)| culprit).collect(),
        last_good_load_factor,
    }
}

/// Cosine between the force left at a sliding node and its rope from which nothing but the rope's end would stop the node.
const ALONG_THE_ROPE: f64 = 0.9;
/// Distance of a sliding node from the next one, over what both pieces span, at which it has arrived there.
const ARRIVED: f64 = 1e-4;

/// The worst node, if it slides and the force left there drives it along its rope, or it stands at the next node already:
/// there the rope may hold it in any direction.
fn ran_to_the_end(net: &Net, reference: &ReferenceState, result: &StateResult, worst: NodeId) -> Option<LikelyCause> {
    let left = unbalanced(net, result)[worst.index()];
    let at = |node: NodeId| result.positions[node.index()];
    let sliding = net.reaches().iter().filter(|reach| reach.slides());
    for first in sliding.flat_map(|reach| reach.segments.start..reach.segments.end - 1) {
        let [before, node] = net.segments()[first].ends;
        let after = net.segments()[first + 1].ends[1];
        if node != worst {
            continue;
        }
        let whole = at(after) - at(before);
        let along = whole.try_normalize(0.0)?.dot(&left);
        let is_at = |end: NodeId| (at(end) - at(node)).norm() < ARRIVED * whole.norm();
        let driven = along.abs() > ALONG_THE_ROPE * left.norm();
        if driven || is_at(before) || is_at(after) {
            let goes_on = if driven { along > 0.0 } else { is_at(after) };
            let end = if goes_on { after } else { before };
            return Some(LikelyCause::RanToTheEnd {
                cable: net.member_name(SegmentId::new(first)).to_owned(),
                node: net.node_name(node).to_owned(),
                end: net.node_name(end).to_owned(),
                lay: (reference.positions[end.index()] - reference.positions[node.index()]).norm(),
            });
        }
    }
    None
}

/// Why water on skins has not settled; `None` if it has.
pub(super) fn cause_of_pond(net: &Net, ponding: &Ponding) -> Option<Cause> {
    if ponding.end == PondingEnd::Settled {
        return None;
    }
    let deepest = ponding.ponds.iter().max_by(|a, b| a.depth.total_cmp(&b.depth));
    let place = deepest.map_or_else(String::new, |pond| match pond.deepest {
        Place::Node(node) => net.node_name(node).to_owned(),
        Place::Panel(panel) => net.panels()[panel].name.clone(),
    });
    Some(Cause {
        likely: LikelyCause::Pond {
            place,
            depth: deepest.map_or(0.0, |pond| pond.depth),
            volume: ponding.volume(),
            growth: ponding.last_growth().unwrap_or((0.0, 0.0)),
            grows: ponding.end == PondingEnd::Growing,
            rounds: ponding.volumes.len(),
        },
        worst: Vec::new(),
        members: Vec::new(),
        last_good_load_factor: 1.0,
        stopped_at: None,
        exists: false,
        taken_out: Vec::new(),
    })
}

/// Force out of balance on every node (N).
fn unbalanced(net: &Net, result: &StateResult) -> Vec<Vector3<f64>> {
    let mut exerted = result.loads.clone();
    for (pulls, segment) in result.pulls.iter().zip(net.segments()) {
        for (pull, end) in pulls.iter().zip(segment.ends) {
            exerted[end.index()] += pull;
        }
    }
    for support in &result.support_forces {
        exerted[support.node.index()] += support.force;
    }
    exerted
}

fn culprits(net: &Net, result: &StateResult) -> Vec<(NodeId, Culprit)> {
    let exerted = unbalanced(net, result);
    let mut all: Vec<(NodeId, Culprit)> = (0..net.nodes().len())
        .map(|index| {
            let culprit = Culprit {
                node: net.nodes()[index].name.clone(),
                imbalance: exerted[index].norm(),
                moved: result.displacements[index].norm(),
            };
            (NodeId::new(index), culprit)
        })
        .collect();
    // Imbalance first where there is any, else movement.
    let weight = |c: &Culprit| if result.audit.passed { c.moved } else { c.imbalance };
    all.sort_by(|(_, a), (_, b)| weight(b).total_cmp(&weight(a)));
    all.truncate(5);
    all
}

fn members_at(net: &Net, node: NodeId) -> Vec<String> {
    let touching = net
        .segments()
        .iter()
        .enumerate()
        .filter(|(_, s)| s.ends.contains(&node));
    distinct(touching.map(|(index, _)| net.member_name(SegmentId::new(index)).to_owned()))
}

/// Each name once, in order of first mention.
fn distinct(names: impl Iterator<Item = String>) -> Vec<String> {
    let mut seen = BTreeSet::new();
    names.filter(|name| seen.insert(name.clone())).collect()
}

/// Tells a free movement in the client's ids. `positions`: where the net is (m).
pub(super) fn cause_of_movement(net: &Net, positions: &[Vector3<f64>], movement: &FreeMovement) -> LikelyCause {
    let told = mechanism::describe(net, positions, movement);
    LikelyCause::Mechanism {
        node: net.node_name(told.node).to_owned(),
        direction: told.direction,
        stiffness: told.stiffness,
        members: distinct(movement.segments.iter().map(|s| net.member_name(*s).to_owned())),
        flat: told.arrangement != Arrangement::Space,
    }
}

/// Ids of the members that a case takes out.
fn taken_out(net: &Net, case: &Case) -> Vec<String> {
    let removed = (0..case.removed.len()).filter(|segment| case.removed[*segment]);
    distinct(removed.map(|segment| net.member_name(SegmentId::new(segment)).to_owned()))
}

/// Tells an error of the solver in `case` in the client's ids. `positions`: where the net was (m).
pub(super) fn cause_of_error(net: &Net, case: &Case, positions: &[Vector3<f64>], error: &SolveError) -> Cause {
    use crate::assembly::LoadingError;
    let likely = match error {
        SolveError::Loading(LoadingError::Segment { segment, what, value }) => LikelyCause::Numbers {
            what: format!("the {what} of \"{}\" would be {value:e}", net.member_name(*segment)),
        },
        SolveError::Loading(LoadingError::Node { node, what, value }) => LikelyCause::Numbers {
            what: format!("the {what} of \"{}\" would be {value:e}", net.node_name(*node)),
        },
        SolveError::Loading(LoadingError::Panel { panel, value }) => LikelyCause::Numbers {
            what: format!("the pressure on \"{}\" would be {value:e}", net.panels()[*panel].name),
        },
        SolveError::Loading(error @ LoadingError::WrongLength { .. }) => LikelyCause::Numbers {
            what: error.to_string(),
        },
        SolveError::NotHeld {
            nodes,
            direction,
            force,
        } => LikelyCause::NotHeld {
            nodes: nodes.iter().map(|n| net.node_name(*n).to_owned()).collect(),
            force: direction * *force,
        },
        SolveError::FreeMovement {
            nodes,
            direction,
            stiffness,
            segments,
        } => {
            let movement = FreeMovement {
                nodes: nodes.clone(),
                direction: *direction,
                stiffness: *stiffness,
                segments: segments.clone(),
            };
            cause_of_movement(net, positions, &movement)
        }
    };
    Cause {
        members: match &likely {
            LikelyCause::Mechanism { members, .. } => members.clone(),
            _ => Vec::new(),
        },
        likely,
        worst: Vec::new(),
        last_good_load_factor: 0.0,
        stopped_at: None,
        exists: false,
        taken_out: taken_out(net, case),
    }
}

/// A sum of loads (N) with a word for its sense, where it is mainly upright.
fn sum_in_words(sum: &Vector3<f64>) -> String {
    if sum.z.abs() >= 0.9 * sum.norm() && sum.z != 0.0 {
        let sense = if sum.z > 0.0 { "upwards" } else { "downwards" };
        return format!("{} {sense}", kilonewtons(sum.z.abs()));
    }
    format!("{} kN", direction(&(sum / 1e3)))
}

impl fmt::Display for Cause {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let mut text = self.likely.to_string();
        let mut add = |sentence: String| {
            text.push_str(if text.ends_with('?') { " " } else { ". " });
            text.push_str(&sentence);
        };
        if !self.taken_out.is_empty() {
            add(format!("Taken out in this case: {}", list(&self.taken_out, NAMED)));
        }
        if self.exists {
            add(
                "Ropes alone under held dead loads always have an equilibrium: the solver gave up, not the net"
                    .to_owned(),
            );
        }
        if let Some(worst) = self.worst.first() {
            add(format!(
                "Worst at \"{}\": {:.3} kN out of balance, moved {:.3} m",
                worst.node,
                worst.imbalance / 1e3,
                worst.moved
            ));
        }
        if self.last_good_load_factor > 0.0 {
            add(format!(
                "Last good state kept at {} % of the load",
                three_digits(self.last_good_load_factor * 100.0)
            ));
        }
        if let Some(stopped_at) = self.stopped_at {
            add(format!(
                "Half the step and less gave the same stop, down to {} %",
                three_digits(stopped_at * 100.0)
            ));
        }
        f.write_str(&text)
    }
}

impl fmt::Display for LikelyCause {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Numbers { what } => write!(f, "{what}: check the units and factors of the case"),
            Self::NotHeld { nodes, force } => write!(
                f,
                "nothing holds {} along the load of {:.3} kN on them",
                list(nodes, NAMED),
                force.norm() / 1e3
            ),
            Self::Mechanism {
                node,
                direction: along,
                stiffness,
                members,
                flat,
            } => {
                let lie = if *flat { "lie in one plane" } else { "do not resist" };
                write!(
                    f,
                    "nothing holds \"{node}\" along {}: {} {lie}. Prestress does not stiffen it ({stiffness:.0} N/m)",
                    direction(along),
                    list(members, NAMED)
                )
            }
            Self::UnitSlip {
                member,
                axial_stiffness,
                strain,
                likely_factor,
            } => {
                let percent = strain * 100.0;
                write!(
                    f,
                    "\"{member}\" has EA {axial_stiffness:.0} N and would be strained by {percent:.1} %"
                )?;
                match likely_factor {
                    Some(factor) => write!(f, ": was EA given in a unit {factor:e} times another?"),
                    None => Ok(()),
                }
            }
            Self::MuchSlack { cables, slack, of } => write!(
                f,
                "{slack} of {of} cable segments are slack, at the worst node {}: more pull there, or less load",
                list(cables, NAMED)
            ),
            Self::RanAway => f.write_str(
                "the net ran away from its place: check the size and sign of the loads, and what holds the nodes below",
            ),
            Self::Tips { slack_cables, load_sum } => {
                let sum = sum_in_words(load_sum);
                write!(f, "the load tips the net; its sum is {sum}")?;
                if slack_cables.is_empty() {
                    f.write_str(". Try to put the load on in steps, or check its sign")
                } else {
                    let slack = list(slack_cables, NAMED);
                    write!(
                        f,
                        "; slack: {slack}. Try more pull in these, or check the sign of the loads"
                    )
                }
            }
            Self::RanToTheEnd { cable, node, end, lay } => write!(
                f,
                "nothing stops \"{node}\" from running along \"{cable}\" to \"{end}\", {lay:.2} m away in the reference state, and what \
                 happens on contact is not part of the model"
            ),
            Self::Pond {
                place,
                depth,
                volume,
                growth: (last, before),
                grows,
                rounds,
            } => {
                write!(
                    f,
                    "water gathers on the skin, {:.0} mm deep at \"{place}\" and {volume:.3} m3 in all after {rounds} rounds of \
                     filling; the last round added {last:.3e} m3, the one before {before:.3e} m3",
                    depth * 1e3
                )?;
                f.write_str(if *grows {
                    ": more water makes more room than it fills, and the pond grows without end"
                } else {
                    ": it has not settled"
                })
            }
            Self::OutOfIterations => {
                f.write_str("the allowed iterations were used up before the forces were in balance: allow more")
            }
            Self::GaveUp => f.write_str(
                "each method ended before the forces were in balance, and more iterations would not help: put the load on \
                 in steps, or give more prestress",
            ),
        }
    }
}
