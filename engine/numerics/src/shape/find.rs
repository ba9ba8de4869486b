//! The reference state, from rules to a net that stands.

use std::ops::ControlFlow;
use std::sync::Arc;

use nalgebra::Vector3;

use super::fights::{targets, unmet};
use super::gate::{Found, finish};
use super::loads::ShapeLoads;
use super::parts::{Part, Parts, Sought};
use super::rows::Rows;
use super::search::{Point, Search};
use super::targets::Densities;
use super::{BalanceReport, Prestress, ShapeError, Target, Unmet, frozen};
use crate::assembly::Structure;
use crate::equilibrium::{Analysis, IterationReport, Settings, existence};
use crate::load::Action;
use crate::model::{Member, Net, NodeId, SegmentId};

/// Rounds between the search and members left to balance that end at nodes which can still move.
const MAX_ROUNDS: usize = 60;
/// Change of their forces, over the largest force, at which these rounds end.
const SETTLED: f64 = 1e-13;

/// Strain that leaves no trace in an unstressed length: the force could not be had back from it.
const NO_TRACE: f64 = 1e-14;
/// Forces below this share of the largest may be lost so.
const NOTABLE: f64 = 1e-6;

/// Finds the reference state: positions, unstressed lengths and forces that balance the actions of `prestress.under`.
///
/// Free nodes of `prestress.hold` stay where they were given while the shape of the rest is found; members left to
/// balance then bear what keeps them there. If every member has a given unstressed length and nothing is held, the net
/// is solved as an elastic one from the given coordinates.
///
/// `prestress`: one rule a segment, indices within `actions` and the net. `observe` hears of each iteration and may ask
/// to stop.
///
/// # Errors
/// [`ShapeError`], in the client's ids, if there is no such state or it was not found.
///
/// # Panics
/// If `prestress` does not have one rule a segment.
pub fn find(
    analysis: &Analysis,
    prestress: &Prestress,
    actions: &[Action],
    settings: &Settings,
    observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
) -> Result<Found, ShapeError> {
    let net = analysis.structure().net();
    assert_eq!(prestress.rules.len(), net.segments().len(), "one rule a segment");
    let parts = Parts::new(net, prestress)?;
    let mut loads = ShapeLoads::new(net, actions, &prestress.under)?;
    let nowhere = |nodes: &mut dyn Iterator<Item = NodeId>| -> Vec<String> {
        let missing = nodes.filter(|n| net.nodes()[n.index()].position.is_none());
        missing.map(|n| net.node_name(n).to_owned()).collect()
    };
    let missing = nowhere(&mut prestress.hold.iter().copied());
    if !missing.is_empty() {
        return Err(ShapeError::HeldWithoutPosition { nodes: missing });
    }
    parts.check_balance_ends(net, &prestress.hold)?;
    let rows = Rows::new(net, &parts, prestress)?;
    if !prestress.targets.is_empty() && parts.families.is_empty() {
        return Err(ShapeError::NothingAdjustable);
    }
    if parts.all_elastic() && prestress.hold.is_empty() {
        let missing = nowhere(&mut (0..net.nodes().len()).map(NodeId::new));
        if !missing.is_empty() {
            return Err(ShapeError::MissingCoordinates { nodes: missing });
        }
        return frozen::find(analysis, prestress, actions, settings, observe);
    }
    let kept;
    let searched = if prestress.hold.is_empty() {
        analysis
    } else {
        kept = Analysis::of(Structure::keeping(net.clone(), &prestress.hold));
        &kept
    };
    let wanted = Wanted {
        parts: &parts,
        loads: &mut loads,
        rows,
        hold: &prestress.hold,
    };
    let raw = shape(searched, wanted, observe)?.into_raw(net, &parts)?;
    finish(analysis, prestress, actions, settings, raw, observe)
}

/// What a search is after.
struct Wanted<'a> {
    parts: &'a Parts,
    loads: &'a mut ShapeLoads,
    rows: Rows,
    hold: &'a [NodeId],
}

/// Rounds in which force densities of families are fitted to the lengths of the first shape.
const FIRST_ROUNDS: usize = 4;

/// About where the nodes will be, for whoever has to know before the shape is searched for (m): where they were given,
/// or, if some were not, where force densities would put them without loads.
///
/// # Errors
/// [`ShapeError`] if not even this can be told; the search then fails for the same reason.
pub fn first_shape(net: &Arc<Net>, prestress: &Prestress) -> Result<Vec<Vector3<f64>>, ShapeError> {
    let given: Vec<Vector3<f64>> = net.nodes().iter().filter_map(|n| n.position).collect();
    if given.len() == net.nodes().len() {
        return Ok(given);
    }
    let parts = Parts::new(net, prestress)?;
    if prestress.hold.iter().any(|h| net.nodes()[h.index()].position.is_none()) {
        let held = prestress
            .hold
            .iter()
            .filter(|h| net.nodes()[h.index()].position.is_none());
        return Err(ShapeError::HeldWithoutPosition {
            nodes: names(net, &held.copied().collect::<Vec<_>>()),
        });
    }
    let analysis = if prestress.hold.is_empty() {
        Analysis::new(Arc::clone(net))
    } else {
        Analysis::of(Structure::keeping(Arc::clone(net), &prestress.hold))
    };
    let observe = &mut |_: &IterationReport| ControlFlow::Continue(());
    let mut first = start(&analysis, &parts, observe)?;
    for _ in 0..FIRST_ROUNDS {
        let (soft, unloaded) = (softened(&parts, &first.densities), ShapeLoads::none(net));
        let mut search = Search::new(&analysis, &soft, &unloaded, observe);
        first.positions = search.balanced(first.positions, &[])?.positions;
        fit(net, &parts, &first.positions, &mut first.densities);
    }
    Ok(first.positions)
}

/// What the search came to.
struct Shape {
    densities: Densities,
    balance: Option<BalanceReport>,
    targets: Vec<Target>,
    unmet: Option<Unmet>,
    iterations: u32,
}

/// A shape whose elastic balance has not been looked at yet.
pub(super) struct RawShape {
    pub(super) positions: Vec<Vector3<f64>>,
    pub(super) axial_forces: Vec<f64>,
    /// By segment (m).
    pub(super) unstressed: Vec<f64>,
    pub(super) iterations: u32,
    pub(super) targets: Vec<Target>,
    pub(super) unmet: Option<Unmet>,
    pub(super) balance: Option<BalanceReport>,
    pub(super) taut_given_lengths: Vec<SegmentId>,
}

fn shape(
    analysis: &Analysis,
    wanted: Wanted<'_>,
    observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
) -> Result<Shape, ShapeError> {
    let net = analysis.structure().net();
    let Wanted {
        parts,
        loads,
        rows,
        hold,
    } = wanted;
    let start = start(analysis, parts, observe)?;
    loads.place(net, &start.positions);
    let mut search = Search::new(analysis, parts, loads, observe);
    search.rows = rows;
    search.iterations = start.iterations;
    search.check_held()?;
    let members = parts.balance();
    let ends_move = members
        .iter()
        .flat_map(|e| net.segments()[*e].ends)
        .any(|end| !analysis.structure().dofs().directions(end).is_empty());
    let mut found = search.with_wanted(start.positions, start.densities)?;
    let mut balance = None;
    for _ in 0..MAX_ROUNDS {
        if hold.is_empty() && members.is_empty() {
            break;
        }
        sound(analysis, &found.point)?;
        let (report, change) = search.balance(hold, &mut found.point, &found.densities)?;
        balance = (!members.is_empty()).then_some(report);
        let largest = found.point.axial_forces.iter().fold(0.0, |m: f64, n| m.max(n.abs()));
        if !ends_move || change <= SETTLED * largest {
            break;
        }
        found = search.with_wanted(found.point.positions, found.densities)?;
    }
    sound(analysis, &found.point)?;
    let unmet = if found.met {
        None
    } else {
        Some(unmet(&mut search, &found)?)
    };
    Ok(Shape {
        targets: targets(&search, &found),
        unmet,
        densities: found,
        balance,
        iterations: search.iterations,
    })
}

/// Where a search starts.
struct Start {
    positions: Vec<Vector3<f64>>,
    /// Force density of each family (N/m).
    densities: Vec<f64>,
    /// Factorisations that it took.
    iterations: u32,
}

/// Positions and force densities of the families to start from.
///
/// A free node without coordinates starts where force densities alone would put it.
fn start(
    analysis: &Analysis,
    parts: &Parts,
    observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
) -> Result<Start, ShapeError> {
    let net = analysis.structure().net();
    let given: Vec<Vector3<f64>> = net.nodes().iter().filter_map(|n| n.position).collect();
    let middle = given.iter().sum::<Vector3<f64>>() / (given.len().max(1) as f64);
    let size = given
        .iter()
        .fold(0.0, |m: f64, x| m.max((x - middle).norm()))
        .max(f64::MIN_POSITIVE);
    let mut positions: Vec<Vector3<f64>> = net.nodes().iter().map(|n| n.position.unwrap_or(middle)).collect();
    // A tenth of the net is as good a guess of a segment's length as any; only its order of magnitude matters.
    let mut densities: Vec<f64> = (parts.families.iter())
        .map(|family| match family.sought {
            Sought::Mean(wanted) => wanted / (0.1 * size),
            Sought::Targets(given) => given.density,
        })
        .collect();
    let mut iterations = 0;
    let some_density = parts.of.iter().any(|part| !matches!(part, Part::Elastic(_)));
    if given.len() < net.nodes().len() && some_density {
        let soft = softened(parts, &densities);
        let unloaded = ShapeLoads::none(net);
        let mut search = Search::new(analysis, &soft, &unloaded, observe);
        search.check_held()?;
        positions = search.balanced(positions, &[])?.positions;
        iterations = search.iterations;
    }
    fit(net, parts, &positions, &mut densities);
    Ok(Start {
        positions,
        densities,
        iterations,
    })
}

/// The parts of a net without loads that stands whatever its forces are: densities alone, none of them negative.
fn softened(parts: &Parts, densities: &[f64]) -> Parts {
    let mut sorted: Vec<f64> = (parts.of.iter())
        .filter_map(|part| match part {
            Part::Density(q) if *q != 0.0 => Some(q.abs()),
            Part::Family(family) => Some(densities[*family].abs()),
            _ => None,
        })
        .collect();
    sorted.sort_by(f64::total_cmp);
    let typical = sorted.get(sorted.len() / 2).copied().unwrap_or(1.0);
    Parts {
        of: (parts.of.iter())
            .map(|part| match part {
                Part::Density(q) => Part::Density(q.abs()),
                Part::Family(family) => Part::Density(densities[*family].abs()),
                // Soft, so that ropes of given length hardly shape the start.
                Part::Elastic(_) => Part::Density(1e-2 * typical),
                Part::Balance => Part::Balance,
            })
            .collect(),
        families: Vec::new(),
        slides: Vec::new(),
        slide_of: Vec::new(),
    }
}

/// Force densities of the families that give them the wanted mean tension at these lengths.
fn fit(net: &Net, parts: &Parts, positions: &[Vector3<f64>], densities: &mut [f64]) {
    let given: Vec<Vector3<f64>> = net.nodes().iter().filter_map(|n| n.position).collect();
    let middle = given.iter().sum::<Vector3<f64>>() / (given.len().max(1) as f64);
    let size = given.iter().fold(0.0, |m: f64, x| m.max((x - middle).norm()));
    let length = |e: &usize| {
        let [i, j] = net.segments()[*e].ends.map(NodeId::index);
        (positions[j] - positions[i]).norm()
    };
    for (density, family) in densities.iter_mut().zip(&parts.families) {
        let Some(wanted) = family.wanted() else {
            continue;
        };
        let mean = family.segments.iter().map(length).sum::<f64>() / family.segments.len() as f64;
        if mean > 1e-6 * size {
            *density = wanted / mean;
        }
    }
}

/// Refuses a shape of which nodes hang on slack ropes alone, or both ends of a member coincide.
fn sound(analysis: &Analysis, point: &Point) -> Result<(), ShapeError> {
    let net = analysis.structure().net();
    let loose = existence::loose_nodes(analysis.structure(), |e| point.axial_forces[e] != 0.0);
    if !loose.is_empty() {
        return Err(ShapeError::Loose {
            nodes: names(net, &loose),
        });
    }
    let size = point.positions.iter().fold(0.0, |m: f64, x| m.max(x.amax()));
    match point.lengths.iter().position(|l| *l <= 1e-12 * size) {
        Some(index) => {
            let [from, to] = net.segments()[index].ends.map(|end| net.node_name(end).to_owned());
            Err(ShapeError::NoLength {
                member: net.member_name(SegmentId::new(index)).to_owned(),
                from,
                to,
            })
        }
        None => Ok(()),
    }
}

/// The client's ids.
pub(super) fn names(net: &Net, nodes: &[NodeId]) -> Vec<String> {
    nodes.iter().map(|n| net.node_name(*n).to_owned()).collect()
}

impl Shape {
    fn into_raw(self, net: &Net, parts: &Parts) -> Result<RawShape, ShapeError> {
        let point = &self.densities.point;
        let largest = point.axial_forces.iter().fold(0.0, |m: f64, n| m.max(n.abs()));
        for (index, segment) in net.segments().iter().enumerate() {
            let (force, stiffness) = (point.axial_forces[index], segment.section.axial_stiffness);
            if force.abs() > NOTABLE * largest && force.abs() <= NO_TRACE * stiffness {
                return Err(ShapeError::BeyondReckoning {
                    part: net.member_name(SegmentId::new(index)).to_owned(),
                    what: "axial stiffness",
                    value: stiffness,
                });
            }
            let is_given = matches!(parts.of[index], Part::Elastic(_));
            if !is_given && force <= -0.9 * stiffness {
                return Err(ShapeError::BeyondStiffness {
                    member: net.member_name(SegmentId::new(index)).to_owned(),
                    axial_force: force,
                    axial_stiffness: stiffness,
                });
            }
        }
        let taut = |e: &usize| match parts.of[*e] {
            Part::Elastic(_) if parts.slide(*e).is_some() => point.axial_forces[*e] > 0.0,
            Part::Elastic(bar) => {
                bar.is_taut(point.lengths[*e]) && matches!(net.segments()[*e].member, Member::Cable(_))
            }
            _ => false,
        };
        Ok(RawShape {
            taut_given_lengths: (0..parts.of.len()).filter(taut).map(SegmentId::new).collect(),
            targets: self.targets,
            unmet: self.unmet,
            positions: self.densities.point.positions,
            axial_forces: self.densities.point.axial_forces,
            unstressed: self.densities.point.unstressed,
            iterations: self.iterations,
            balance: self.balance,
        })
    }
}
