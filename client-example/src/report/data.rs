//! The numbers that the turning shape reads: rounded to what a screen can show; the files beside the page have all digits.

use serde_json::{Value, json};

use crate::colour::{self, Scale};
use crate::run::{Member, Run, State};

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
    let scale: Vec<f64> = forces.iter().map(|force| rounded(force / 1e3, 3)).collect();
    let slack: Vec<usize> = run
        .slack(state)
        .iter()
        .enumerate()
        .filter(|(_, slack)| **slack)
        .map(|(at, _)| at)
        .collect();
    value["moves"] = json!(flat(&moves, 5));
    value["kn"] = json!(scale);
    value["slack"] = json!(slack);
    let pulls = state.vectors("support_force_n").unwrap_or_default();
    value["pulls"] = json!(
        pulls
            .iter()
            .map(|force| force.map(|part| rounded(-part / 1e3, 3)))
            .collect::<Vec<_>>()
    );
    value
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
