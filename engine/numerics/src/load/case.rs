//! One case: everything that acts at once, as plain numbers over the net.

use nalgebra::Vector3;

use super::{Action, Load, Scope};
use crate::model::{Member, Net, ReferenceState, Segment, SegmentId};

/// What a case changes about the segments.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct SegmentLoads {
    /// Change of temperature (K).
    pub temperature_change: f64,
    /// Dead load per unstressed length (N/m) of a segment that hangs; zero for a straight one, whose load is in the
    /// nodal forces.
    pub per_length: Vector3<f64>,
}

/// A case ready to be solved. Neither the net nor its analysis is rebuilt for it.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Case {
    /// Dead force on every node (N), held ones too.
    pub nodal_forces: Vec<Vector3<f64>>,
    /// Unstressed lengths (m) in the order of [`crate::model::Net::n_lengths`].
    pub unstressed_lengths: Vec<f64>,
    /// One entry a segment.
    pub segments: Vec<SegmentLoads>,
    /// Movement of every supported node (m); zero elsewhere.
    pub support_movements: Vec<Vector3<f64>>,
    /// Segments taken out, by index.
    pub removed: Vec<bool>,
    /// Unstressed length (m) that lies in every segment while nothing slides from where it lay in the reference state, at
    /// the full load. Read where ropes slide against friction; empty: there is none.
    pub lying: Vec<f64>,
    /// Pressure on the outer side of every panel (Pa); it stays normal to the panel as that moves. Empty: none.
    pub pressures: Vec<f64>,
}

impl Case {
    /// Puts factored actions together over the reference state.
    ///
    /// Weights and loads per length act on the reference lengths, so that every load is dead: its size does not depend
    /// on the deflection. Temperature changes, support movements and prestress shares are summed with their factors.
    /// A prestress share of `s` in all gives each reach the unstressed length
    ///
    /// ```text
    /// L0' = Σ l / (1 + (1 + s) T / EA)   over its segments
    /// ```
    ///
    /// for which its reference tension `T` at the reference geometry is `(1 + s) T`; a share below −1 counts as −1,
    /// since a rope can not push. Struts, and reaches slack in the reference state, keep their length.
    ///
    /// `factors`: index into `actions` and its factor; a factor of zero leaves no trace.
    #[must_use]
    pub fn new(net: &Net, reference: &ReferenceState, actions: &[Action], factors: &[(usize, f64)]) -> Self {
        Self::changed(net, reference, actions, factors, &[], 0.0)
    }

    /// The same with members taken out, and with a share of prestress of all ropes on top of that of the actions.
    ///
    /// What is taken out carries nothing, and neither its weight nor loads along it act any more.
    #[must_use]
    pub fn changed(
        net: &Net,
        reference: &ReferenceState,
        actions: &[Action],
        factors: &[(usize, f64)],
        removed: &[Member],
        prestress_share: f64,
    ) -> Self {
        let is_removed = |segment: &Segment| removed.contains(&segment.member);
        let mut case = Self {
            nodal_forces: vec![Vector3::zeros(); net.nodes().len()],
            unstressed_lengths: reference.unstressed_lengths.clone(),
            segments: vec![SegmentLoads::default(); net.segments().len()],
            support_movements: vec![Vector3::zeros(); net.nodes().len()],
            removed: net.segments().iter().map(is_removed).collect(),
            lying: Vec::new(),
            pressures: Vec::new(),
        };
        let mut shares = vec![prestress_share; net.segments().len()];
        for (action, factor) in factors.iter().filter(|(_, factor)| *factor != 0.0) {
            for load in &actions[*action].loads {
                case.add(net, reference, load, *factor, &mut shares);
            }
        }
        case.apply_shares(net, reference, &shares);
        case
    }

    /// The case at `factor` of its load: forces, movements and temperatures multiplied, lengths on the way from
    /// `reference_lengths` (m).
    #[must_use]
    pub fn scaled(&self, reference_lengths: &[f64], factor: f64) -> Self {
        let mut scaled = self.clone();
        if factor == 1.0 {
            return scaled;
        }
        scaled.nodal_forces.iter_mut().for_each(|f| *f *= factor);
        scaled.support_movements.iter_mut().for_each(|m| *m *= factor);
        for segment in &mut scaled.segments {
            segment.temperature_change *= factor;
            segment.per_length *= factor;
        }
        scaled.pressures.iter_mut().for_each(|p| *p *= factor);
        for (length, start) in scaled.unstressed_lengths.iter_mut().zip(reference_lengths) {
            *length = factor * *length + (1.0 - factor) * start;
        }
        scaled
    }

    fn add(&mut self, net: &Net, reference: &ReferenceState, load: &Load, factor: f64, shares: &mut [f64]) {
        match load {
            Load::Nodes { nodes, force } => {
                for node in nodes {
                    self.nodal_forces[node.index()] += factor * force;
                }
            }
            Load::OwnWeight { gravity } => {
                for (index, segment) in net.segments().iter().enumerate() {
                    let mass = segment.section.mass_per_length * unstressed_length(net, reference, index);
                    self.share_between_ends(net, index, factor * mass * gravity);
                }
                for (force, node) in self.nodal_forces.iter_mut().zip(net.nodes()) {
                    *force += factor * node.attached_mass * gravity;
                }
            }
            Load::PerUnstressedLength { scope, force } => {
                for index in segments(net, scope) {
                    let length = unstressed_length(net, reference, index);
                    self.share_between_ends(net, index, factor * length * force);
                }
            }
            Load::PerPlanLength { scope, force } => {
                for index in segments(net, scope) {
                    let length = span(net, reference, index).xy().norm();
                    self.share_between_ends(net, index, factor * length * force);
                }
            }
            Load::Temperature { scope, change } => {
                for index in segments(net, scope) {
                    self.segments[index].temperature_change += factor * change;
                }
            }
            Load::SupportMovement { node, by } => self.support_movements[node.index()] += factor * by,
            Load::PrestressShare { scope, share } => {
                for index in segments(net, scope) {
                    shares[index] += factor * share;
                }
            }
        }
    }

    fn share_between_ends(&mut self, net: &Net, segment: usize, force: Vector3<f64>) {
        if self.removed[segment] {
            return;
        }
        for node in net.segments()[segment].ends {
            self.nodal_forces[node.index()] += 0.5 * force;
        }
    }

    fn apply_shares(&mut self, net: &Net, reference: &ReferenceState, shares: &[f64]) {
        for (index, reach) in net.reaches().iter().enumerate() {
            let untouched = shares[reach.segments.clone()].iter().all(|share| *share == 0.0);
            let slack = reach.segments.clone().all(|e| reference.axial_forces[e] <= 0.0);
            if untouched || slack {
                continue;
            }
            self.unstressed_lengths[index] = reach
                .segments
                .clone()
                .map(|e| {
                    let tension = (1.0 + shares[e]).max(0.0) * reference.axial_forces[e];
                    span(net, reference, e).norm() / (1.0 + tension / net.segments()[e].section.axial_stiffness)
                })
                .sum();
        }
    }
}

/// Unstressed length of one segment (m): that of its reach, shared by current length where a reach has several.
fn unstressed_length(net: &Net, reference: &ReferenceState, segment: usize) -> f64 {
    let index = net.segments()[segment].length;
    let whole = reference.unstressed_lengths[index];
    match net.reaches().get(index) {
        Some(reach) if reach.segments.len() > 1 => {
            let total: f64 = reach.segments.clone().map(|e| span(net, reference, e).norm()).sum();
            whole * span(net, reference, segment).norm() / total
        }
        _ => whole,
    }
}

fn span(net: &Net, reference: &ReferenceState, segment: usize) -> Vector3<f64> {
    let [from, to] = net.segments()[segment].ends;
    reference.positions[to.index()] - reference.positions[from.index()]
}

fn segments<'a>(net: &'a Net, scope: &'a Scope) -> Box<dyn Iterator<Item = usize> + 'a> {
    match scope {
        Scope::All => Box::new(0..net.segments().len()),
        Scope::Segments(list) => Box::new(list.iter().copied().map(SegmentId::index)),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::{CableGiven, NetGiven, NodeGiven, NodeId, Section, StrutGiven, SupportGiven};

    const EA: f64 = 1e6;

    /// A rope of two segments, 3-4-5 and level, on a strut below its middle.
    fn net() -> Net {
        let section = Section {
            axial_stiffness: EA,
            mass_per_length: 2.0,
            expansion: 12e-6,
            breaking_force: None,
            ..Section::default()
        };
        let node = |name: &str, x, y, z, held: bool, attached_mass| NodeGiven {
            name: name.to_owned(),
            position: Some(Vector3::new(x, y, z)),
            support: held.then(SupportGiven::default),
            attached_mass,
        };
        Net::new(NetGiven {
            nodes: vec![
                node("a", 0.0, 0.0, 4.0, true, 0.0),
                node("b", 3.0, 0.0, 0.0, false, 10.0),
                node("c", 5.0, 0.0, 0.0, true, 0.0),
                node("d", 3.0, 0.0, -1.0, true, 0.0),
            ],
            cables: vec![CableGiven {
                name: "rope".to_owned(),
                path: [0, 1, 2].map(NodeId::new).to_vec(),
                sections: vec![section; 2],
                ..CableGiven::default()
            }],
            struts: vec![StrutGiven {
                name: "post".to_owned(),
                ends: [NodeId::new(3), NodeId::new(1)],
                section,
            }],
            elastic_supports: Vec::new(),
            ..NetGiven::default()
        })
        .expect("a valid net")
    }

    fn reference(net: &Net) -> ReferenceState {
        ReferenceState {
            positions: net.nodes().iter().map(|n| n.position.expect("given")).collect(),
            unstressed_lengths: vec![5.0 / 1.002, 2.0, 1.001],
            axial_forces: vec![2000.0, 0.0, -1000.0],
        }
    }

    fn case(loads: Vec<Load>, factor: f64) -> Case {
        let net = net();
        let action = Action {
            name: "a".to_owned(),
            loads,
        };
        Case::new(&net, &reference(&net), &[action], &[(0, factor)])
    }

    #[test]
    fn weight_acts_on_unstressed_lengths_and_attached_masses() {
        let gravity = Vector3::new(0.0, 0.0, -10.0);
        let case = case(vec![Load::OwnWeight { gravity }], 1.5);
        let halves = [1.5 * 10.0 * 5.0 / 1.002, 1.5 * 10.0 * 2.0, 1.5 * 10.0 * 1.001];
        let expected = [halves[0], halves.iter().sum::<f64>() + 150.0, halves[1], halves[2]];
        for (force, expected) in case.nodal_forces.iter().zip(expected) {
            assert!((force + Vector3::z() * expected).norm() < 1e-12 * expected);
        }
    }

    #[test]
    fn loads_per_length_split_between_ends() {
        let force = Vector3::new(1.0, 2.0, 3.0);
        let scope = Scope::Segments(vec![SegmentId::new(0)]);
        let slanted = |load| case(vec![load], 2.0).nodal_forces[1];
        let unstressed = slanted(Load::PerUnstressedLength {
            scope: scope.clone(),
            force,
        });
        assert!((unstressed - force * 5.0 / 1.002).norm() < 1e-14);
        assert!((slanted(Load::PerPlanLength { scope, force }) - force * 3.0).norm() < 1e-14);
    }

    #[test]
    fn factors_multiply_and_sum() {
        let net = net();
        let actions = [
            Action {
                name: "one".to_owned(),
                loads: vec![
                    Load::Temperature {
                        scope: Scope::All,
                        change: 10.0,
                    },
                    Load::SupportMovement {
                        node: NodeId::new(2),
                        by: Vector3::x(),
                    },
                ],
            },
            Action {
                name: "two".to_owned(),
                loads: vec![
                    Load::Temperature {
                        scope: Scope::Segments(vec![SegmentId::new(1)]),
                        change: 4.0,
                    },
                    Load::Nodes {
                        nodes: vec![NodeId::new(1); 2],
                        force: Vector3::y(),
                    },
                ],
            },
        ];
        let case = Case::new(&net, &reference(&net), &actions, &[(0, 2.0), (1, -1.0), (0, 0.5)]);
        let changes: Vec<f64> = case.segments.iter().map(|s| s.temperature_change).collect();
        assert_eq!(changes, [25.0, 21.0, 25.0]);
        assert_eq!(case.support_movements[2], 2.5 * Vector3::x());
        assert_eq!(case.nodal_forces[1], -2.0 * Vector3::y());
        assert!(case.removed.iter().all(|removed| !removed));
    }

    #[test]
    fn a_zero_factor_leaves_no_trace() {
        let net = net();
        let infinite = Action {
            name: "odd".to_owned(),
            loads: vec![Load::Nodes {
                nodes: vec![NodeId::new(1)],
                force: Vector3::new(f64::INFINITY, 0.0, 0.0),
            }],
        };
        let case = Case::new(&net, &reference(&net), &[infinite], &[(0, 0.0)]);
        assert!(case.nodal_forces.iter().all(|force| *force == Vector3::zeros()));
    }

    #[test]
    fn prestress_shares_change_taut_ropes_only() {
        let share = Load::PrestressShare {
            scope: Scope::All,
            share: 0.1,
        };
        let case = case(vec![share.clone()], 2.0);
        // At the reference geometry the new length gives (1 + 0.2) T.
        let tension = EA * (5.0 / case.unstressed_lengths[0] - 1.0);
        assert!((tension - 1.2 * 2000.0).abs() < 1e-9 * tension);
        assert_eq!(case.unstressed_lengths[1..], [2.0, 1.001]);
    }

    #[test]
    fn a_share_of_a_case_is_a_share_of_everything() {
        let mut case = case(
            vec![Load::Temperature {
                scope: Scope::All,
                change: 8.0,
            }],
            1.0,
        );
        case.nodal_forces[1] = Vector3::x();
        case.support_movements[2] = Vector3::z();
        let half = case.scaled(&[4.0, 2.0, 1.0], 0.5);
        assert_eq!(half.segments[1].temperature_change, 4.0);
        assert_eq!(half.nodal_forces[1], 0.5 * Vector3::x());
        assert_eq!(half.support_movements[2], 0.5 * Vector3::z());
        assert!((half.unstressed_lengths[0] - 0.5 * (4.0 + 5.0 / 1.002)).abs() < 1e-15);
        assert_eq!(case.scaled(&[4.0, 2.0, 1.0], 1.0), case);
    }

    #[test]
    fn a_rope_can_not_be_made_to_push() {
        let share = Load::PrestressShare {
            scope: Scope::All,
            share: -0.9,
        };
        assert!((case(vec![share], 1e9).unstressed_lengths[0] - 5.0).abs() < 1e-14);
    }
}
