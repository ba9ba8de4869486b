//! One case: everything that acts at once, as plain numbers over the net.

use std::f64::consts::PI;

use nalgebra::Vector3;

use super::{Action, Load, Scope, Surface};
use crate::model::{Member, Net, ReferenceState, Section, Segment, SegmentId, fan};

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
    /// the full load. Empty: ropes slide without friction.
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
        // Measured once, and only if something lies on areas of it.
        let mut acting = factors.iter().filter(|(_, factor)| *factor != 0.0);
        let is_on_areas = |load: &Load| matches!(load, Load::OnPlan { .. } | Load::OnSurface { .. });
        let surface = if acting.any(|(action, _)| actions[*action].loads.iter().any(is_on_areas)) {
            Surface::new(net, &reference.positions)
        } else {
            Surface::default()
        };
        let mut adding = Adding {
            net,
            reference,
            surface: &surface,
            shares: vec![prestress_share; net.segments().len()],
            adjustments: Vec::new(),
        };
        for (action, factor) in factors.iter().filter(|(_, factor)| *factor != 0.0) {
            for load in &actions[*action].loads {
                adding.add(&mut case, load, *factor);
            }
        }
        let Adding {
            shares, adjustments, ..
        } = adding;
        case.apply_shares(net, reference, &shares);
        if net.has_friction() {
            case.lying = lying(net, reference, &case.unstressed_lengths);
        }
        for (length, segment, by) in adjustments {
            case.unstressed_lengths[length] += by;
            // What an end gives or takes is at that end until it slides.
            if let Some(lying) = case.lying.get_mut(segment) {
                *lying += by;
            }
        }
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

/// What loads are added up over.
struct Adding<'a> {
    net: &'a Net,
    reference: &'a ReferenceState,
    surface: &'a Surface,
    /// Share of prestress by segment.
    shares: Vec<f64>,
    /// Unstressed length, segment at the end, change (m).
    adjustments: Vec<(usize, usize, f64)>,
}

impl Adding<'_> {
    fn add(&mut self, case: &mut Case, load: &Load, factor: f64) {
        let net = self.net;
        match load {
            Load::Nodes { nodes, force } => {
                for node in nodes {
                    case.nodal_forces[node.index()] += factor * force;
                }
            }
            Load::OwnWeight { gravity } => {
                for (index, segment) in net.segments().iter().enumerate() {
                    self.add_per_length(case, index, factor * segment.section.mass_per_length * gravity);
                }
                for (force, node) in case.nodal_forces.iter_mut().zip(net.nodes()) {
                    *force += factor * node.attached_mass * gravity;
                }
                for skin in net.skins().iter().filter(|skin| skin.mass_per_area > 0.0) {
                    for panel in &skin.panels {
                        self.add_on_panel(case, *panel, factor * skin.mass_per_area * gravity, |a| a.norm());
                    }
                }
            }
            Load::PerUnstressedLength { scope, force } => {
                for index in segments(net, scope) {
                    self.add_per_length(case, index, factor * force);
                }
            }
            Load::PerPlanLength { scope, force } => {
                for index in segments(net, scope) {
                    let length = self.span(index).xy().norm();
                    self.share_between_ends(case, index, factor * length * force);
                }
            }
            Load::OnPlan { on, pressure } => {
                for panel in self.surface.panels_of(on) {
                    let corners = net.panels()[panel].places(&self.reference.positions);
                    let up = fan::signed_area_on_plan(&corners).signum();
                    self.add_on_panel(case, panel, Vector3::new(0.0, 0.0, -factor * pressure), |a| up * a.z);
                }
            }
            Load::OnSurface {
                pressure,
                coefficients,
                elsewhere,
            } => {
                case.pressures.resize(net.panels().len(), 0.0);
                for (panel, sum) in case.pressures.iter_mut().enumerate() {
                    let coefficient = self.surface.coefficient(panel, coefficients, *elsewhere);
                    *sum += factor * pressure * coefficient.unwrap_or(0.0);
                }
            }
            Load::WindOnRopes {
                scope,
                pressure,
                along,
                drag_coefficient,
            } => {
                for index in segments(net, scope) {
                    let Some(diameter) = net.segments()[index].section.diameter else {
                        continue;
                    };
                    let span = self.span(index);
                    let length = span.norm();
                    let across = if length > 0.0 {
                        along - span * (along.dot(&span) / (length * length))
                    } else {
                        Vector3::zeros()
                    };
                    let force = factor * pressure * drag_coefficient * diameter * length * across.norm() * across;
                    self.share_between_ends(case, index, force);
                }
            }
            Load::Ice {
                scope,
                thickness,
                density,
                gravity,
            } => {
                for index in segments(net, scope) {
                    let mass = ice_per_length(&net.segments()[index].section, *thickness, *density);
                    self.add_per_length(case, index, factor * mass * gravity);
                }
            }
            Load::Temperature { scope, change } => {
                for index in segments(net, scope) {
                    case.segments[index].temperature_change += factor * change;
                }
            }
            Load::Adjustment { length, segment, by } => {
                self.adjustments.push((*length, segment.index(), factor * by));
            }
            Load::SupportMovement { node, by } => case.support_movements[node.index()] += factor * by,
            Load::PrestressShare { scope, share } => {
                for index in segments(net, scope) {
                    self.shares[index] += factor * share;
                }
            }
        }
    }

    fn span(&self, segment: usize) -> Vector3<f64> {
        span(self.net, self.reference, segment)
    }

    /// A load per unstressed length: along the segment where it hangs, else half of it at each end.
    fn add_per_length(&self, case: &mut Case, segment: usize, per_length: Vector3<f64>) {
        if case.removed[segment] {
            return;
        }
        if self.net.segments()[segment].hangs {
            case.segments[segment].per_length += per_length;
        } else {
            let length = unstressed_length(self.net, self.reference, segment);
            self.share_between_ends(case, segment, length * per_length);
        }
    }

    fn share_between_ends(&self, case: &mut Case, segment: usize, force: Vector3<f64>) {
        if case.removed[segment] {
            return;
        }
        for node in self.net.segments()[segment].ends {
            case.nodal_forces[node.index()] += 0.5 * force;
        }
    }

    /// A load per area: `measure` says how much of it a triangle with this area vector counts for.
    fn add_on_panel(
        &self,
        case: &mut Case,
        panel: usize,
        per_area: Vector3<f64>,
        measure: impl Fn(&Vector3<f64>) -> f64,
    ) {
        let panel = &self.net.panels()[panel];
        let areas = fan::triangles(&panel.places(&self.reference.positions));
        let areas: Vec<f64> = areas.iter().map(measure).collect();
        for (corner, area) in panel.corners.iter().zip(fan::to_corners(&areas)) {
            case.nodal_forces[corner.index()] += area * per_area;
        }
    }
}

/// Mass of a ring of ice per length (kg/m): `ρ π t (d + t)`; none around what has no diameter.
#[must_use]
pub fn ice_per_length(section: &Section, thickness: f64, density: f64) -> f64 {
    let ring = |diameter: f64| density * PI * thickness * (diameter + thickness);
    section.diameter.map_or(0.0, ring)
}

/// Unstressed length of one segment (m): that of its reach, or what of it lies there in the reference state.
fn unstressed_length(net: &Net, reference: &ReferenceState, segment: usize) -> f64 {
    let index = net.segments()[segment].length;
    let whole = reference.unstressed_lengths[index];
    match net.reaches().get(index) {
        Some(reach) if reach.slides() => {
            let needed = |e| needed_length(net, reference, e);
            whole * needed(segment) / reach.segments.clone().map(needed).sum::<f64>()
        }
        _ => whole,
    }
}

/// Unstressed length that a segment takes up in the reference state (m): `l / (1 + T / EA)`.
fn needed_length(net: &Net, reference: &ReferenceState, segment: usize) -> f64 {
    let strain = reference.axial_forces[segment] / net.segments()[segment].section.axial_stiffness;
    span(net, reference, segment).norm() / (1.0 + strain)
}

/// Unstressed length (m) that lies in every segment while nothing slides from where it lay in the reference state.
fn lying(net: &Net, reference: &ReferenceState, unstressed_lengths: &[f64]) -> Vec<f64> {
    (net.segments().iter().enumerate())
        .map(|(e, segment)| {
            let index = segment.length;
            unstressed_length(net, reference, e) * unstressed_lengths[index] / reference.unstressed_lengths[index]
        })
        .collect()
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
