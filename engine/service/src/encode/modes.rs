//! Natural modes of a state: numbers, modes, shapes, and what is odd about them.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{GustNote, ModesGiven, StateResult};
use ropewalk_numerics::model::{Net, NodeId};
use ropewalk_numerics::motion::{Mode, ModeKind, Modes, ModesError};
use v1::run_response::Event;
use v1::state_modes::Part;

use super::doubts::finding;
use super::parts::{count, event, first_ids};
use super::state::{Array, flat};
use crate::decode::reasons;
use crate::words::{Quoted, quoted_list, rounded};

/// Nodes that are listed.
const NODES: usize = 1000;
/// Parts that are listed, and nodes of each.
const ISLANDS: usize = 100;
const NODES_OF_ISLAND: usize = 20;
/// Moving nodes of a mode that are listed.
const MOVING: usize = 10;
/// Movements below this share of the largest do not count as moving.
const STANDS_STILL: f64 = 1e-3;

/// The parts of what was found, in the order that the contract states.
pub(super) fn parts(net: &Net, case: &str, state: &StateResult, lowest_share: Option<f64>) -> Vec<v1::RunResponse> {
    let Some(Ok(found)) = state.modes.as_deref() else {
        return Vec::new();
    };
    let told = std::iter::once(Part::Found(numbers(net, found, lowest_share))).chain(
        found
            .modes
            .iter()
            .enumerate()
            .map(|(number, of)| Part::Mode(mode(net, number, of))),
    );
    let told = told.map(|part| {
        event(Event::Modes(v1::StateModes {
            case: case.to_owned(),
            part: Some(part),
        }))
    });
    let shapes = (0..net.nodes().len()).flat_map(|node| found.modes.iter().map(move |mode| &mode.shape[node]));
    let shapes = Array {
        case,
        name: "mode_shape",
        unit: "",
        over: v1::Range::Node,
        components: count(3 * found.modes.len()),
        baseline: "",
        values: flat(shapes),
    };
    told.chain(shapes.parts()).collect()
}

fn numbers(net: &Net, found: &Modes, lowest_share: Option<f64>) -> v1::ModesFound {
    let names = |nodes: &[NodeId], most| first_ids(nodes.iter().map(|node| net.node_name(*node)), most);
    v1::ModesFound {
        modes: count(found.modes.len()),
        complete: found.is_complete(),
        counted_below_rad2_per_s2: found.counted.map(|counted| counted.limit),
        counted: found.counted.map(|counted| count(counted.below)),
        orthogonality: found.orthogonality,
        moving_mass_kg: found.moving_mass.to_vec(),
        floating_nodes: names(&found.floating, NODES),
        floating_nodes_total: count(found.floating.len()),
        islands: (found.islands.iter().take(ISLANDS))
            .map(|nodes| v1::NodePart {
                nodes: names(nodes, NODES_OF_ISLAND),
                nodes_total: count(nodes.len()),
            })
            .collect(),
        massless_nodes: names(&found.massless, NODES),
        massless_nodes_total: count(found.massless.len()),
        unsymmetric_share: found.unsymmetric,
        nearly_slack_segments: count(found.nearly_slack),
        lowest_tension_share: lowest_share,
        lowest_frequency_hz: found.lowest_vibrating().map(|mode| mode.frequency),
        shift_rad2_per_s2: found.shift,
        vectors: count(found.vectors),
    }
}

fn mode(net: &Net, number: usize, of: &Mode) -> v1::Mode {
    let kind = match of.kind {
        ModeKind::Vibrates => v1::ModeKind::Vibrates,
        ModeKind::Rigid => v1::ModeKind::Rigid,
        ModeKind::Unstable => v1::ModeKind::Unstable,
    };
    v1::Mode {
        number: count(number),
        kind: kind.into(),
        frequency_hz: of.frequency,
        root_rad2_per_s2: of.root,
        modal_mass_kg: of.modal_mass,
        effective_mass_kg: of.effective_mass.to_vec(),
        residual: of.residual,
        nodes: moving(of)
            .take(MOVING)
            .map(|node| net.nodes()[node].name.clone())
            .collect(),
    }
}

/// Nodes that move, most first; those that move alike but for rounding in node order.
fn moving(mode: &Mode) -> impl Iterator<Item = usize> {
    let mut nodes: Vec<(f64, usize)> = (mode.shape.iter().enumerate())
        .map(|(node, by)| ((by.norm() * 1e6).round(), node))
        .filter(|(size, _)| *size > STANDS_STILL * 1e6)
        .collect();
    nodes.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
    nodes.into_iter().map(|(_, node)| node)
}

/// What is odd about the modes of a state.
pub(super) fn findings(net: &Net, given: Option<&ModesGiven>, state: &StateResult) -> Vec<v1::Finding> {
    let (Some(given), Some(modes)) = (given, state.modes.as_deref()) else {
        return Vec::new();
    };
    match modes {
        Ok(found) => [low_frequency(net, given, found), loose(net, found), not_proven(found)]
            .into_iter()
            .flatten()
            .collect(),
        Err(error) => vec![none(net, error)],
    }
}

fn none(net: &Net, error: &ModesError) -> v1::Finding {
    let (id, named, cure) = match error {
        ModesError::MasslessNotHeld { nodes } => (
            nodes.first().map_or("", |node| net.node_name(*node)),
            quoted_list(nodes.iter().map(|node| net.node_name(*node))),
            "give the members there their mass per length, or the nodes an attached or added mass",
        ),
        ModesError::NoMass => (
            "",
            String::new(),
            "give sections their mass per length, or nodes an attached or added mass; a hanging rope has its mass at its ends \
             here: give it nodes in between",
        ),
        ModesError::Loading(_) | ModesError::BeyondUse => ("", String::new(), "check units of masses and stiffnesses"),
        ModesError::Cancelled => ("", String::new(), "run the brief again"),
    };
    let colon = if named.is_empty() { "" } else { ": " };
    finding(
        v1::FindingSeverity::Error,
        reasons::NO_MODES,
        id,
        String::new(),
        format!("no natural modes: {error}{colon}{named}"),
        cure,
    )
}

fn low_frequency(net: &Net, given: &ModesGiven, found: &Modes) -> Option<v1::Finding> {
    let lowest = found.lowest_vibrating()?;
    let how = match given.gust_note(lowest.frequency)? {
        GustNote::StudyWind => format!("below {} Hz", rounded(given.wind_study_below, 3)),
        GustNote::Flexible => format!(
            "below {} Hz, which counts as flexible: resonance with gusts is likely",
            rounded(given.flexible_below, 3)
        ),
    };
    let id = moving(lowest).next().map_or("", |node| &net.nodes()[node].name);
    Some(finding(
        v1::FindingSeverity::Doubt,
        reasons::LOW_FREQUENCY,
        id,
        rounded(lowest.frequency, 3),
        format!(
            "the lowest natural frequency is {} Hz, {how}; most moves {}. The limit is common practice and no proof: static \
             wind pressures may not cover what gusts do here",
            rounded(lowest.frequency, 3),
            Quoted(id)
        ),
        "have the wind studied (gusts, flutter, damping), give more prestress, or accept this doubt",
    ))
}

fn loose(net: &Net, found: &Modes) -> Option<v1::Finding> {
    let first = found.modes.iter().find(|mode| mode.kind != ModeKind::Vibrates)?;
    let rigid = found.modes.iter().filter(|mode| mode.kind == ModeKind::Rigid).count();
    let unstable = found
        .modes
        .iter()
        .filter(|mode| mode.kind == ModeKind::Unstable)
        .count();
    let id = moving(first).next().map_or("", |node| &net.nodes()[node].name);
    let islands = found.islands.first().map_or_else(String::new, |nodes| {
        let names = quoted_list(nodes.iter().map(|node| net.node_name(*node)));
        format!("; only slack ropes join {names} to what is held")
    });
    Some(finding(
        v1::FindingSeverity::Doubt,
        reasons::LITTLE_STIFFNESS,
        id,
        rounded(first.root, 3),
        format!(
            "of the natural modes, {rigid} meet no resistance and {unstable} are not stable; in the first of them most \
             moves {}{islands}",
            Quoted(id)
        ),
        "give more prestress there, or hold the node along that direction",
    ))
}

fn not_proven(found: &Modes) -> Option<v1::Finding> {
    if found.is_complete() {
        return None;
    }
    let told = found.modes.len();
    let (value, message) = match found.counted {
        Some(counted) => (
            counted.below.to_string(),
            format!("{told} natural modes were found where a count says {}", counted.below),
        ),
        None => (
            String::new(),
            format!("{told} natural modes were found, and whether some lower one was missed is open"),
        ),
    };
    Some(finding(
        v1::FindingSeverity::Doubt,
        reasons::MODES_NOT_PROVEN,
        "",
        value,
        message,
        "ask for a few modes more or fewer; masses and stiffnesses of very different size make it hard",
    ))
}
