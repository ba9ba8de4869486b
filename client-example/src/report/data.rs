//! The numbers that the turning shape reads: rounded to what a screen can show; the files beside the page have all digits.

use ropewalk_api::ropewalk::v1;
use serde_json::{Value, json};

use crate::colour::{self, Scale};
use crate::run::{Member, Run, State};
use crate::sheet;

/// Numbers that a page may hold; states beyond it show their words only.
const NUMBERS: usize = 4_000_000;

pub(crate) fn data(run: &Run, scale: &Scale) -> Value {
    let reference = run
        .reference()
        .and_then(|state| state.vectors("position_m"))
        .unwrap_or_default();
    let mut room = NUMBERS;
    let states: Vec<Value> = run
        .states
        .iter()
        .map(|state| state_data(run, state, &mut room))
        .collect();
    let n_cables = run.cables.len();
    let segments: Vec<Value> = run
        .segments
        .iter()
        .map(|segment| {
            let member = match segment.member {
                Member::Cable(cable) => cable,
                Member::Strut(strut) => n_cables + strut,
            };
            json!([segment.nodes[0], segment.nodes[1], member])
        })
        .collect();
    let mut breaking = Vec::new();
    for (cable, segments) in run.cables.iter().zip(run.cable_segments()) {
        let forces = run
            .cable(cable)
            .map(|cable| run.breaking_forces(cable))
            .unwrap_or_default();
        breaking.extend(
            (0..segments.len()).map(|at| forces.get(at).copied().flatten().map(|force| rounded(force / 1e3, 3))),
        );
    }
    json!({
        "nodes": run.nodes,
        "members": run.cables.iter().chain(&run.struts).collect::<Vec<_>>(),
        "cables": n_cables,
        "segments": segments,
        "breaking": breaking,
        "supports": run.supports,
        "reference": flat(&reference, 4),
        "states": states,
        "panels": run.panels.iter().map(panel).collect::<Vec<_>>(),
        "actions": run.loads.iter().map(action).collect::<Vec<_>>(),
        "worst": worst(run),
        "top": top_share(run),
        "pullScale": pull_scale(run),
        "scale": {
            "colours": (0..=64).map(|step| colour::at(f64::from(step) / 64.0)).collect::<Vec<_>>(),
            "low": scale.ends_kn()[0], "high": scale.ends_kn()[1], "log": scale.logarithmic,
        },
    })
}

fn state_data(run: &Run, state: &State, room: &mut usize) -> Value {
    let failure = state.summary.failure.clone().unwrap_or_default();
    let place = |ids: &[String], known: &[String]| -> Vec<usize> {
        ids.iter()
            .filter_map(|id| known.iter().position(|other| other == id))
            .collect()
    };
    let members: Vec<String> = run.cables.iter().chain(&run.struts).cloned().collect();
    let mut value = json!({
        "id": state.id,
        "words": state.in_words,
        "answered": state.answered(),
        "why": failure.message,
        "lookNodes": place(&failure.nodes, &run.nodes),
        "lookMembers": place(&failure.members, &members),
    });
    let moves = state.vectors("displacement_m");
    let (Some(moves), Some(forces), true) = (moves, run.axial_forces(state), state.answered()) else {
        return value;
    };
    let n_numbers = 3 * moves.len() + 2 * forces.len();
    if n_numbers > *room {
        return value;
    }
    *room -= n_numbers;
    let is_slack = run.slack(state);
    // What is neither slack nor carries anything is taken out of the net, in a case that takes members out.
    let takes_out = run.takes_out(state);
    let kn: Vec<Option<f64>> = (forces.iter().zip(&is_slack))
        .map(|(force, slack)| (!takes_out || *slack || *force != 0.0).then(|| rounded(force / 1e3, 3)))
        .collect();
    let slack: Vec<usize> = is_slack
        .iter()
        .enumerate()
        .filter(|(_, slack)| **slack)
        .map(|(at, _)| at)
        .collect();
    value["moves"] = json!(flat(&moves, 5));
    value["kn"] = json!(kn);
    value["slack"] = json!(slack);
    let loads = &state.summary.load_sum_n;
    value["loads"] = json!(
        (0..3)
            .map(|axis| rounded(loads.get(axis).copied().unwrap_or(0.0) / 1e3, 3))
            .collect::<Vec<_>>()
    );
    let pulls = state.vectors("support_force_n").unwrap_or_default();
    value["pulls"] = json!(
        pulls
            .iter()
            .map(|force| force.map(|part| rounded(-part / 1e3, 3)))
            .collect::<Vec<_>>()
    );
    value
}

/// The largest tension of each rope segment and the largest pull on each anchor over all answered states, with the positions
/// of the states they come from; -1: the reference state.
fn worst(run: &Run) -> Value {
    let envelope = |name: &str| run.envelope.get(name).map(|column| column.values.as_slice());
    let state_of = |position: f64| -> i64 {
        let id = sheet::envelope_case(run, position);
        let found = run.states.iter().position(|state| state.id == id);
        found.and_then(|at| i64::try_from(at).ok()).unwrap_or(-1)
    };
    let states = |name: &str| -> Vec<i64> {
        let positions = envelope(name).unwrap_or_default();
        positions.iter().map(|&position| state_of(position)).collect()
    };
    // Struts have no envelope.
    let kn: Option<Vec<Option<f64>>> = envelope("tension_max_n").map(|most| {
        let ropes = most.iter().map(|force| Some(rounded(force / 1e3, 3)));
        ropes
            .chain(std::iter::repeat_n(None, run.segments.len().saturating_sub(most.len())))
            .collect()
    });
    let lows = envelope("tension_min_n").unwrap_or_default();
    let slack: Vec<usize> = (0..lows.len()).filter(|&at| lows[at] <= 0.0).collect();
    let mut pulls = vec![([0.0; 3], -1_i64); run.supports.len()];
    for (at, state) in run.states.iter().enumerate().filter(|(_, state)| state.answered()) {
        for (worst, force) in pulls
            .iter_mut()
            .zip(state.vectors("support_force_n").unwrap_or_default())
        {
            let size = |force: [f64; 3]| force.iter().map(|part| part * part).sum::<f64>();
            if size(force) > size(worst.0) {
                *worst = (force, i64::try_from(at).unwrap_or(-1));
            }
        }
    }
    json!({
        "kn": kn,
        "from": states("tension_max_case"),
        "slack": slack,
        "slackFrom": states("tension_min_case"),
        "pulls": pulls.iter().map(|(force, _)| force.map(|part| rounded(-part / 1e3, 3))).collect::<Vec<_>>(),
        "pullFrom": pulls.iter().map(|(_, from)| from).collect::<Vec<_>>(),
    })
}

fn panel(panel: &v1::PanelEntry) -> Value {
    json!({
        "id": panel.id, "corners": panel.corners, "skin": panel.skin, "zones": panel.zones.join(", "),
        "area": rounded(panel.area_m2, 3), "onPlan": rounded(panel.area_on_plan_m2, 3),
    })
}

fn action(picture: &v1::LoadPicture) -> Value {
    let size = picture.force_n.iter().map(|part| part * part).sum::<f64>().sqrt();
    // What is left of zero by rounding is no force.
    let part = |axis: usize| {
        picture
            .force_n
            .get(axis)
            .copied()
            .filter(|part| part.abs() > 1e-9 * size)
            .unwrap_or(0.0)
    };
    let pressures = |list: &[f64]| list.iter().map(|pressure| rounded(*pressure, 2)).collect::<Vec<_>>();
    json!({
        "id": picture.action,
        "force": (0..3).map(|axis| rounded(part(axis) / 1e3, 4)).collect::<Vec<_>>(),
        "point": picture.point_m.iter().map(|part| rounded(*part, 3)).collect::<Vec<_>>(),
        "panels": picture.loaded_panels,
        "area": rounded(picture.loaded_area_m2, 3), "onPlan": rounded(picture.loaded_area_on_plan_m2, 3),
        "without": picture.without_value, "withoutTotal": picture.without_value_total,
        "pressure": pressures(&picture.pressure_pa), "plan": pressures(&picture.on_plan_pa),
    })
}

/// Upper end of the scale of shares of breaking forces: the next tenth above the largest, at most 1; 0 without any.
pub(super) fn top_share(run: &Run) -> f64 {
    let Some(most) = run.envelope.get("tension_max_n") else {
        return 0.0;
    };
    let mut largest = 0.0_f64;
    for (cable, segments) in run.cables.iter().zip(run.cable_segments()) {
        let forces = run
            .cable(cable)
            .map(|cable| run.breaking_forces(cable))
            .unwrap_or_default();
        for (segment, force) in segments.into_iter().zip(forces) {
            if let (Some(tension), Some(force)) = (most.values.get(segment), force) {
                largest = largest.max(tension / force);
            }
        }
    }
    (largest * 10.0).ceil().min(10.0) / 10.0
}

/// Size of the largest pull (kN), against which a sum is zero or not.
fn pull_scale(run: &Run) -> f64 {
    let states = run.states.iter().filter(|state| state.answered());
    let pulls = states.flat_map(|state| state.vectors("support_force_n").unwrap_or_default());
    pulls
        .map(|force| force.iter().map(|part| part * part).sum::<f64>().sqrt() / 1e3)
        .fold(0.0, f64::max)
}

fn flat(vectors: &[[f64; 3]], decimals: usize) -> Vec<f64> {
    vectors
        .iter()
        .flatten()
        .map(|number| rounded(*number, decimals))
        .collect()
}

fn rounded(number: f64, decimals: usize) -> f64 {
    let value: f64 = format!("{number:.decimals$}")
        .parse()
        .expect("a formatted number is a number");
    // No negative zeros.
    value + 0.0
}
