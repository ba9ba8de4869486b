//! Numbers that are balanced, and yet can not be meant.

use crate::load::Case;
use crate::model::{AxialLaw, Net, SegmentId};

/// Strain beyond which no rope or strut of a building is still whole (–).
const BROKEN: f64 = 0.05;
/// Factors by which units are mistaken: N for kN, mm² for m² and the like.
const SLIPS: [f64; 2] = [1e3, 1e6];
/// Strains that ropes are built for lie below this (–).
const USUAL: f64 = 0.02;
/// Decades between an `EA` and the median of its kind from which it counts as a slip.
const SLIP_DECADES: f64 = 2.3;

/// A member that is stretched or squeezed more than any material bears.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Strained {
    /// The segment, the worst of its cable.
    pub segment: SegmentId,
    /// Its strain (–).
    pub strain: f64,
    /// Its axial force (N).
    pub axial_force: f64,
    /// Its `EA` as given (N).
    pub axial_stiffness: f64,
    /// A factor on `EA` that would bring the strain to what ropes are built for: likely a slip of units.
    pub likely_factor: Option<f64>,
}

/// Members strained beyond belief, one for each cable and strut, in segment order.
///
/// `axial_forces`: one a segment (N). Slack and removed segments do not count.
#[must_use]
pub fn strained_members(net: &Net, case: &Case, axial_forces: &[f64]) -> Vec<Strained> {
    let mut worst: Vec<Strained> = Vec::new();
    let mut member = None;
    for (index, (segment, force)) in net.segments().iter().zip(axial_forces).enumerate() {
        let stiffness = segment.section.axial_stiffness;
        let strain = force / stiffness;
        // Not a number is as implausible as too large a number.
        let is_believable = strain.abs() <= BROKEN;
        if case.removed[index] || is_believable {
            continue;
        }
        let found = Strained {
            segment: SegmentId::new(index),
            strain,
            axial_force: *force,
            axial_stiffness: stiffness,
            likely_factor: SLIPS.into_iter().find(|f| strain.abs() / f <= USUAL),
        };
        match worst.last_mut() {
            Some(last) if member == Some(segment.member) => {
                if strain.abs() > last.strain.abs() {
                    *last = found;
                }
            }
            _ => worst.push(found),
        }
        member = Some(segment.member);
    }
    worst
}

/// An `EA` that, beside the others of the net, looks like a slip of units.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct OddStiffness {
    /// A segment of the member.
    pub segment: SegmentId,
    /// Its `EA` as given (N).
    pub axial_stiffness: f64,
    /// Median `EA` of members of its kind (N).
    pub median: f64,
    /// Factor that brings it nearest to the median.
    pub likely_factor: f64,
    /// Breaking force of its section (N), if known.
    pub breaking_force: Option<f64>,
}

impl OddStiffness {
    /// Whether more than the spread speaks for a slip: a net may have a thin tie beside a thick edge. Its strain under
    /// `axial_forces` (N, one a segment), or its strain at breaking, is none that a rope has.
    #[must_use]
    pub fn is_borne_out(&self, axial_forces: &[f64]) -> bool {
        let strain = axial_forces[self.segment.index()].abs() / self.axial_stiffness;
        let at_breaking = self.breaking_force.map(|force| force / self.axial_stiffness);
        strain > USUAL || at_breaking.is_some_and(|strain| !(BREAKS_AT.0..=BREAKS_AT.1).contains(&strain))
    }
}

/// Strains at which ropes and bars break, by their breaking force over `EA` (–): from stiff steel to soft fibre, with a
/// margin (common practice).
const BREAKS_AT: (f64, f64) = (1e-3, 0.3);

/// Ropes whose `EA` differs from the median of all ropes by a factor of 200 or more, and struts likewise.
#[must_use]
pub fn odd_stiffnesses(net: &Net) -> Vec<OddStiffness> {
    let mut odd = Vec::new();
    for law in [AxialLaw::TensionOnly, AxialLaw::TwoWay] {
        let of_kind = || net.segments().iter().enumerate().filter(move |(_, s)| s.law == law);
        let mut all: Vec<f64> = of_kind().map(|(_, s)| s.section.axial_stiffness).collect();
        all.sort_by(f64::total_cmp);
        let Some(&median) = all.get(all.len() / 2) else {
            continue;
        };
        let mut last = None;
        for (index, segment) in of_kind() {
            let ratio = median / segment.section.axial_stiffness;
            // Ropes of one net span about a decade either way, with a thin tie beside a thick edge two.
            let decades = ratio.log10();
            let size = if decades.abs() < 4.5 { SLIPS[0] } else { SLIPS[1] };
            let likely_factor = if decades > 0.0 { size } else { 1.0 / size };
            if decades.abs() >= SLIP_DECADES && last != Some(segment.member) {
                last = Some(segment.member);
                odd.push(OddStiffness {
                    segment: SegmentId::new(index),
                    axial_stiffness: segment.section.axial_stiffness,
                    median,
                    likely_factor,
                    breaking_force: segment.section.breaking_force,
                });
            }
        }
    }
    odd.sort_by_key(|o| o.segment);
    odd
}

#[cfg(test)]
mod tests {
    use nalgebra::Vector3;

    use super::*;
    use crate::load::SegmentLoads;
    use crate::model::{CableGiven, NetGiven, NodeGiven, NodeId, Section};

    fn net(stiffnesses: &[f64]) -> Net {
        let nodes = (0..=stiffnesses.len())
            .map(|i| NodeGiven {
                name: format!("n{i}"),
                position: Some(Vector3::new(i as f64, 0.0, 0.0)),
                ..NodeGiven::default()
            })
            .collect();
        let cables = stiffnesses
            .iter()
            .enumerate()
            .map(|(i, ea)| CableGiven {
                name: format!("c{i}"),
                path: vec![NodeId::new(i), NodeId::new(i + 1)],
                sections: vec![Section {
                    axial_stiffness: *ea,
                    mass_per_length: 0.0,
                    expansion: 0.0,
                    breaking_force: None,
                    ..Section::default()
                }],
                ..CableGiven::default()
            })
            .collect();
        Net::new(NetGiven {
            nodes,
            cables,
            ..NetGiven::default()
        })
        .expect("valid")
    }

    #[test]
    fn a_stiffness_in_kilonewtons_stands_out() {
        let net = net(&[8.9e6, 8900.0, 3.5e7, 8.9e6]);
        let odd = odd_stiffnesses(&net);
        assert_eq!(odd.len(), 1);
        assert_eq!(odd[0].segment, SegmentId::new(1));
        assert_eq!(odd[0].likely_factor, 1000.0);
        assert!(odd[0].is_borne_out(&[13_500.0; 4]) && !odd[0].is_borne_out(&[13.0; 4]));
        let case = Case {
            nodal_forces: vec![],
            unstressed_lengths: vec![],
            segments: vec![SegmentLoads::default(); 4],
            support_movements: vec![],
            removed: vec![false; 4],
            ..Case::default()
        };
        let strained = strained_members(&net, &case, &[13_500.0, 13_500.0, 0.0, 13_500.0]);
        assert_eq!(strained.len(), 1);
        assert!((strained[0].strain - 1.517).abs() < 1e-3);
        assert_eq!(strained[0].likely_factor, Some(1000.0));
    }

    #[test]
    fn a_thin_tie_is_odd_and_blamed_for_nothing() {
        let ropes = net(&[5e7, 2e5, 5e7, 4e7]);
        let odd = odd_stiffnesses(&ropes);
        assert_eq!(odd.len(), 1);
        assert!(!odd[0].is_borne_out(&[1e5, 500.0, 1e5, 1e5]));
        // With a breaking force that its EA can not reach without tearing, or reaches unstretched, it is.
        for (breaking, is_borne_out) in [(5e3, false), (1e5, true), (100.0, true)] {
            let known = OddStiffness {
                breaking_force: Some(breaking),
                ..odd[0]
            };
            assert_eq!(known.is_borne_out(&[0.0; 4]), is_borne_out, "{breaking}");
        }
    }

    #[test]
    fn usual_nets_raise_nothing() {
        let net = net(&[8.9e6, 3.5e7, 5.1e7]);
        assert!(odd_stiffnesses(&net).is_empty());
    }
}
