//! What was found of a state beside its balance: mechanisms, states of self-stress, least stiffnesses.

use nalgebra::Vector3;
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::StateDiagnosis;
use ropewalk_numerics::diagnose::mobility::{Mechanism, Mobility, MobilityWay, SelfStress};
use ropewalk_numerics::equilibrium::stability::LeastStiffness;
use ropewalk_numerics::model::{Net, NodeId};
use v1::run_response::Event;
use v1::state_diagnosis::Part;

use super::parts::{count, event};

/// Moving nodes that are listed: with the longest ids they stay far below a message.
const NODES: usize = 1000;
/// Stressed segments that are listed.
const SEGMENTS: usize = 10_000;

/// The parts of what was found, in the order that the contract states.
pub(super) fn parts(net: &Net, case: &str, found: &StateDiagnosis) -> Vec<v1::RunResponse> {
    let mut parts = Vec::new();
    for (considered, mobility) in [
        (v1::MembersConsidered::All, &found.all),
        (v1::MembersConsidered::Taut, &found.taut),
    ] {
        let Some(mobility) = mobility else { continue };
        parts.push(Part::Mobility(numbers(considered, mobility)));
        let mechanisms = mobility.mechanisms.iter().enumerate();
        parts.extend(mechanisms.map(|(number, of)| Part::Mechanism(mechanism(net, considered, number, of))));
        let states = mobility.self_stresses.iter().enumerate();
        parts.extend(states.map(|(number, of)| Part::SelfStress(self_stress(considered, number, of))));
    }
    let stiffnesses = found.stiffnesses.iter().enumerate();
    parts.extend(stiffnesses.map(|(number, of)| Part::LeastStiffness(least_stiffness(net, number, of))));
    let told = parts.into_iter().map(|part| {
        event(Event::Diagnosis(v1::StateDiagnosis {
            case: case.to_owned(),
            part: Some(part),
        }))
    });
    told.collect()
}

fn numbers(considered: v1::MembersConsidered, of: &Mobility) -> v1::Mobility {
    let way = match of.way {
        MobilityWay::Dense => v1::MobilityWay::Dense,
        MobilityWay::Sparse => v1::MobilityWay::Sparse,
    };
    v1::Mobility {
        members_considered: considered.into(),
        way: way.into(),
        members: count(of.members),
        free_directions: count(of.directions),
        rank: count(of.rank),
        self_stresses: count(of.n_self_stresses),
        mechanisms: count(of.n_mechanisms),
        not_stiffened: count(of.n_not_stiffened),
        zero_below: of.zero_below,
        least_kept: of.least_kept,
    }
}

fn mechanism(net: &Net, considered: v1::MembersConsidered, number: usize, of: &Mechanism) -> v1::Mechanism {
    let (nodes, movements) = moving(net, &of.movements);
    v1::Mechanism {
        members_considered: considered.into(),
        number: count(number),
        nodes,
        movements,
        nodes_total: count(of.movements.len()),
        stiffness_n_per_m: of.stiffness,
        stiffened: of.stiffened,
    }
}

fn self_stress(considered: v1::MembersConsidered, number: usize, of: &SelfStress) -> v1::SelfStress {
    let listed = || of.forces.iter().take(SEGMENTS);
    v1::SelfStress {
        members_considered: considered.into(),
        number: count(number),
        segments: listed().map(|(segment, _)| count(segment.index())).collect(),
        shares: listed().map(|(_, share)| *share).collect(),
        segments_total: count(of.forces.len()),
        with_supports: of.with_supports,
    }
}

fn least_stiffness(net: &Net, number: usize, of: &LeastStiffness) -> v1::LeastStiffness {
    let (nodes, movements) = moving(net, &of.movements);
    v1::LeastStiffness {
        number: count(number),
        stiffness_n_per_m: of.stiffness,
        residual_n_per_m: of.residual,
        nodes,
        movements,
        nodes_total: count(of.movements.len()),
    }
}

fn moving(net: &Net, movements: &[(NodeId, Vector3<f64>)]) -> (Vec<String>, Vec<f64>) {
    let listed = || movements.iter().take(NODES);
    let nodes = listed().map(|(node, _)| net.node_name(*node).to_owned()).collect();
    let by = listed().flat_map(|(_, by)| [by.x, by.y, by.z]).collect();
    (nodes, by)
}
