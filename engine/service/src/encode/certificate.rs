//! How far a state can be from the true one.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::equilibrium::certificate::{Certificate, Kind};
use ropewalk_numerics::model::{Net, NodeId, SegmentId};

use super::parts::count;
use crate::decode::Work;

/// The certificate of a state.
pub(super) fn of(work: &Work, net: &Net, certificate: &Certificate) -> v1::Certificate {
    let energies = (work.message.solving.as_ref()).is_some_and(|solving| solving.energies.unwrap_or(false));
    let force = largest(certificate.force_bounds.iter().copied());
    let place = largest(certificate.position_bounds.iter().map(|bound| bound.unwrap_or(0.0)));
    v1::Certificate {
        condition: match &certificate.kind {
            Kind::Full => String::new(),
            Kind::Conditional(conditions) => {
                let words: Vec<String> = conditions.iter().map(ToString::to_string).collect();
                words.join("; ")
            }
        },
        certified: certificate.certified,
        tension_within_n: force.map_or(0.0, |(_, bound)| bound),
        tension_within_member: force.map_or_else(String::new, |(segment, _)| {
            net.member_name(SegmentId::new(segment)).to_owned()
        }),
        position_within_m: place.map_or(0.0, |(_, bound)| bound),
        position_within_node: place.map_or_else(String::new, |(node, _)| net.node_name(NodeId::new(node)).to_owned()),
        nodes_without_bound_total: count(certificate.n_without_bound()),
        gap_j: energies.then_some(certificate.gap),
        strain_energy_j: energies.then_some(certificate.strain_energy),
    }
}

/// The first of the largest that are more than zero, and its place.
fn largest(bounds: impl Iterator<Item = f64>) -> Option<(usize, f64)> {
    (bounds.enumerate().filter(|(_, bound)| *bound > 0.0))
        .reduce(|largest, next| if next.1 > largest.1 { next } else { largest })
}
