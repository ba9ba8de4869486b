//! The arrays of a state, as the contract lists them at `RunResponse`.

use nalgebra::Vector3;
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::StateResult;
use ropewalk_numerics::equilibrium::IterationReport;
use ropewalk_numerics::model::{Member, Net};
use v1::Range;
use v1::run_response::Event;

use super::parts::{NUMBERS, count, event};
use super::progress::way;
use crate::decode::REFERENCE;

/// An array before it is cut into parts.
pub(super) struct Array<'a> {
    pub(super) case: &'a str,
    /// With its unit at the end.
    pub(super) name: &'a str,
    pub(super) unit: &'a str,
    pub(super) over: Range,
    pub(super) components: u32,
    pub(super) baseline: &'a str,
    pub(super) values: Vec<f64>,
}

impl Array<'_> {
    /// The array in parts; an empty one has none.
    pub(super) fn parts(&self) -> impl Iterator<Item = v1::RunResponse> + '_ {
        // Vectors stay whole: a multiple of three.
        let size = NUMBERS - NUMBERS % 3;
        self.values.chunks(size).enumerate().map(move |(part, values)| {
            event(Event::Columns(v1::Columns {
                case: self.case.to_owned(),
                name: self.name.to_owned(),
                unit: self.unit.to_owned(),
                over: self.over.into(),
                components: self.components,
                baseline: self.baseline.to_owned(),
                offset: count(part * size),
                total: count(self.values.len()),
                values: values.to_vec(),
            }))
        })
    }
}

pub(super) fn flat<'a>(vectors: impl IntoIterator<Item = &'a Vector3<f64>>) -> Vec<f64> {
    vectors
        .into_iter()
        .flat_map(|vector| [vector.x, vector.y, vector.z])
        .collect()
}

/// Every array of a state. `reference`: the state that differences are measured from.
pub(super) fn arrays(net: &Net, case: &str, state: &StateResult, reference: &StateResult) -> Vec<v1::RunResponse> {
    let (reference_lengths, reference_lying) = (&reference.unstressed_lengths, &reference.lying);
    let ropes = net
        .segments()
        .iter()
        .filter(|s| matches!(s.member, Member::Cable(_)))
        .count();
    let mut messages = Vec::new();
    let mut send = |name: &str, over: Range, components: u32, values: Vec<f64>| {
        let array = Array {
            case,
            name,
            unit: unit(name),
            over,
            components,
            baseline: baseline(name),
            values,
        };
        messages.extend(array.parts());
    };
    send("position_m", Range::Node, 3, flat(&state.positions));
    send("displacement_m", Range::Node, 3, flat(&state.displacements));
    send("tension_n", Range::RopeSegment, 1, state.axial_forces[..ropes].to_vec());
    let slack = state.slack[..ropes].iter().map(|slack| f64::from(u8::from(*slack)));
    if net.segments().iter().any(|segment| segment.hangs) {
        for (name, end) in [("tension_start_n", 0), ("tension_end_n", 1)] {
            let values = state.pulls[..ropes].iter().map(|pulls| pulls[end].norm());
            send(name, Range::RopeSegment, 1, values.collect());
        }
    }
    send("slack", Range::RopeSegment, 1, slack.collect());
    send("axial_force_n", Range::Strut, 1, state.axial_forces[ropes..].to_vec());
    send("length_m", Range::Segment, 1, state.lengths.clone());
    send("stretch", Range::Segment, 1, state.stretches.clone());
    send("unstressed_length_m", Range::Reach, 1, state.unstressed_lengths.clone());
    let change = state
        .unstressed_lengths
        .iter()
        .zip(reference_lengths)
        .map(|(now, then)| now - then);
    send("unstressed_length_change_m", Range::Reach, 1, change.collect());
    send("slid_m", Range::Slide, 1, slid(net, state, reference_lying));

    let mut of_node = vec![None; net.nodes().len()];
    for support in &state.support_forces {
        of_node[support.node.index()] = Some(support);
    }
    let supports = || net.supports().iter().map(|support| of_node[support.node().index()]);
    let forces: Vec<Vector3<f64>> = supports().map(|s| s.map_or_else(Vector3::zeros, |s| s.force)).collect();
    send("support_force_n", Range::Support, 3, flat(&forces));
    let own: Vec<f64> = supports().flat_map(|s| s.map_or([0.0; 3], |s| s.own_axes)).collect();
    send("support_force_own_axes_n", Range::Support, 3, own);
    let ends = &state.end_forces;
    send("end_force_n", Range::End, 3, flat(ends.iter().map(|end| &end.force)));
    let plan = ends.iter().map(|end| angle_in_plan(&end.force).to_degrees());
    send("end_angle_plan_deg", Range::End, 1, plan.collect());
    let up = ends
        .iter()
        .map(|end| end.force.z.atan2(end.force.x.hypot(end.force.y)).to_degrees());
    send("end_angle_up_deg", Range::End, 1, up.collect());
    send("panel_area_m2", Range::Panel, 1, state.panel_areas.clone());
    send("panel_pressure_pa", Range::Panel, 1, state.panel_pressures.clone());
    messages
}

/// Unstressed rope that has passed each node through which one slides, towards the end of its cable (m): what of the reach
/// lies before the node less than in the reference state.
fn slid(net: &Net, state: &StateResult, reference: &[f64]) -> Vec<f64> {
    let mut slid = Vec::new();
    for reach in net.reaches().iter().filter(|reach| reach.slides()) {
        let mut before = 0.0;
        for segment in reach.segments.clone().take(reach.segments.len() - 1) {
            before += reference[segment] - state.lying[segment];
            slid.push(before);
        }
    }
    slid
}

/// Angle of a pull in plan, from x towards y (rad); zero where it is upright, since rounding would decide.
fn angle_in_plan(force: &Vector3<f64>) -> f64 {
    if force.x.hypot(force.y) <= 1e-12 * force.norm() {
        return 0.0;
    }
    force.y.atan2(force.x)
}

/// How the iterations of a state went.
pub(super) fn history(case: &str, history: &[IterationReport]) -> Vec<v1::RunResponse> {
    let mut messages = Vec::new();
    let mut send = |name: &str, value: &dyn Fn(&IterationReport) -> f64| {
        let array = Array {
            case,
            name,
            unit: unit(name),
            over: Range::Iteration,
            components: 1,
            baseline: "",
            values: history.iter().map(value).collect(),
        };
        messages.extend(array.parts());
    };
    send("iteration_residual_n", &|report| report.residual);
    send("iteration_load_factor", &|report| report.load_factor);
    send("iteration_step_length", &|report| report.step_length);
    send("iteration_strain_energy_j", &|report| report.strain_energy);
    send("iteration_slack", &|report| f64::from(count(report.slack)));
    send("iteration_way", &|report| f64::from(i32::from(way(report.way))));
    messages
}

pub(super) fn unit(name: &str) -> &'static str {
    match name.rsplit('_').next() {
        Some("m") => "m",
        Some("m2") => "m2",
        Some("pa") => "Pa",
        Some("n") => "N",
        Some("j") => "J",
        Some("deg") => "deg",
        _ => "",
    }
}

fn baseline(name: &str) -> &'static str {
    match name {
        "displacement_m" | "unstressed_length_change_m" => REFERENCE,
        _ => "",
    }
}
