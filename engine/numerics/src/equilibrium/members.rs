//! Forces and lengths of the segments, read from a response.

use nalgebra::Vector3;

use super::MemberStates;
use crate::assembly::{Loading, Response, Structure};
use crate::element::Hanging;
use crate::load::Case;
use crate::model::ReferenceState;

/// The segments in the reference state, whose ropes slide without friction.
///
/// `case`: what the state carries.
#[must_use]
pub fn member_states(structure: &Structure, case: &Case, state: &ReferenceState) -> MemberStates {
    if structure.net().is_plain() {
        let mut response = Response::new(structure);
        for (e, segment) in structure.net().segments().iter().enumerate() {
            let [i, j] = segment.ends.map(|n| state.positions[n.index()]);
            response.chords[e] = j - i;
            response.lengths[e] = (j - i).norm();
        }
        response.axial_forces.copy_from_slice(&state.axial_forces);
        let lying = structure
            .net()
            .segments()
            .iter()
            .map(|s| case.unstressed_lengths[s.length])
            .collect();
        return MemberStates {
            pulls: pulls(&response),
            lengths: response.lengths,
            lying,
        };
    }
    let loading = Loading::new(structure, case, &case.unstressed_lengths, 1.0).expect("a state fits its net");
    let mut response = Response::new(structure);
    structure.response_into(&loading, &state.positions, &mut response);
    of_response(&loading, &response)
}

/// The segments as they answer.
pub(super) fn of_response(loading: &Loading, response: &Response) -> MemberStates {
    let mut states = MemberStates {
        pulls: pulls(response),
        lengths: response.lengths.clone(),
        lying: lying(loading, response),
    };
    for (segment, at) in hanging(loading, response) {
        states.pulls[segment] = [at.start, at.end];
        states.lengths[segment] = at.length;
    }
    states
}

/// Unstressed length that lies in every segment (m).
pub(super) fn lying(loading: &Loading, response: &Response) -> Vec<f64> {
    let Some(special) = &loading.special else {
        return loading.unstressed_lengths.clone();
    };
    let mut lying = loading.unstressed_lengths.clone();
    for (piece, n) in special.sliding.iter().zip(&response.special.tensions) {
        piece.shares_into(&response.lengths[piece.segments()], *n, &mut lying[piece.segments()]);
    }
    lying
}

fn pulls(response: &Response) -> Vec<[Vector3<f64>; 2]> {
    let segments = response
        .chords
        .iter()
        .zip(&response.lengths)
        .zip(&response.axial_forces);
    segments
        .map(|((chord, length), axial)| {
            let force = if *length > 0.0 {
                *chord * (*axial / *length)
            } else {
                Vector3::zeros()
            };
            [force, -force]
        })
        .collect()
}

fn hanging<'a>(loading: &'a Loading, response: &'a Response) -> impl Iterator<Item = (usize, &'a Hanging)> {
    let segments = loading.special.iter().flat_map(|special| &special.hanging);
    segments.map(|h| h.segment).zip(&response.special.hanging)
}
