//! Which ropes and cases are worth a drawing.

use crate::run::{Run, State};

/// Ropes drawn in section.
const ROPES: usize = 4;
/// Cases drawn beside the reference state.
const CASES: usize = 3;

/// The longest rope of each role, ropes of a single segment left out; at most four, longest first.
pub(crate) fn ropes(run: &Run) -> Vec<usize> {
    let Some(lengths) = run.reference().and_then(|state| state.numbers("length_m")) else {
        return Vec::new();
    };
    let segments = run.cable_segments();
    let long = |cable: usize| segments[cable].iter().map(|&segment| lengths[segment]).sum::<f64>();
    let mut cables: Vec<usize> = (0..run.cables.len())
        .filter(|&cable| segments[cable].len() > 1)
        .collect();
    cables.sort_by(|&a, &b| long(b).total_cmp(&long(a)).then(a.cmp(&b)));
    let mut roles = Vec::new();
    let mut picked = Vec::new();
    for &cable in &cables {
        let role = run
            .cable(&run.cables[cable])
            .map(|cable| cable.role.clone())
            .unwrap_or_default();
        // Ropes without a role stand for themselves.
        if role.is_empty() || !roles.contains(&role) {
            roles.push(role);
            picked.push(cable);
        }
    }
    // The longest ropes of the net say more than a lantern line: those with most segments come first.
    picked.sort_by(|&a, &b| {
        segments[b]
            .len()
            .cmp(&segments[a].len())
            .then(long(b).total_cmp(&long(a)))
    });
    picked.truncate(ROPES);
    picked
}

/// Answered cases that move some nodes most.
pub(crate) fn cases<'a>(run: &'a Run, nodes: &[usize]) -> Vec<&'a State> {
    let mut moved: Vec<(f64, &State)> = run
        .states
        .iter()
        .filter(|state| state.answered() && state.id != "reference")
        .filter_map(|state| {
            let moves = state.vectors("displacement_m")?;
            let largest = nodes.iter().map(|&node| size(moves[node])).fold(0.0, f64::max);
            Some((largest, state))
        })
        .collect();
    moved.sort_by(|a, b| b.0.total_cmp(&a.0));
    moved.truncate(CASES);
    moved.into_iter().map(|(_, state)| state).collect()
}

/// Answered cases that move a rope most.
pub(crate) fn moved_cases(run: &Run, cable: usize) -> Vec<&State> {
    let nodes: Vec<usize> = run.cable_segments()[cable]
        .iter()
        .flat_map(|&at| run.segments[at].nodes)
        .collect();
    cases(run, &nodes)
}

pub(crate) fn size(vector: [f64; 3]) -> f64 {
    vector.iter().map(|part| part * part).sum::<f64>().sqrt()
}
