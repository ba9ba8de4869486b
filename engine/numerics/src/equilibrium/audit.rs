//! Nodal balance, found again by a routine that shares no code with assembly.
//!
//! Plain loops over what is given and what is claimed; no numbering, no matrices, no element. It goes back to `EA`, `α`,
//! `ΔT` and `L0`, and compares the claimed axial forces with the law, the nodes with their loads, and the held nodes with
//! where the case puts their supports.

use nalgebra::Vector3;

use super::MemberStates;
use crate::load::Case;
use crate::model::{AxialLaw, Net, NodeId, Panel, SegmentId};

mod hanging;

/// Share of the largest force on the net that may be out of balance, or in doubt in a member.
const SHARE: f64 = 1e-8;

/// Share of the largest coordinate or length by which a held node may be off its support: some thousand last bits, since
/// a node that slides along its support gathers one with each step.
const MISPLACED: f64 = 1e-12;

/// What it found.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct Audit {
    /// Largest out-of-balance force at a node in its free directions (N).
    pub largest_imbalance: f64,
    /// Where.
    pub node: Option<NodeId>,
    /// Largest difference between a claimed axial force and the law (N).
    pub largest_force_error: f64,
    /// Where.
    pub segment: Option<SegmentId>,
    /// Largest distance of a held node from where the case puts its support, along its held directions (m).
    pub largest_misplacement: f64,
    /// What is allowed of both forces (N): 1e−8 of the largest of loads and forces, or the force that the last bits of the
    /// positions make at the stiffest node (8 ε × `Σ EA/L0` × largest coordinate or length), whichever is more; never
    /// more than 1e−4 of the largest force, unless there is no load and no force beyond that rounding.
    pub allowed: f64,
    /// Force of its supports on every node (N), rigid and elastic together; zero at nodes without.
    pub support_forces: Vec<Vector3<f64>>,
    /// Sum of the loads (N).
    pub load_sum: Vector3<f64>,
    /// Sum of the support forces (N).
    pub support_sum: Vector3<f64>,
    /// Whether the state passes.
    pub passed: bool,
}

/// Checks a claimed state of a net whose ropes are clamped and straight.
///
/// `case`: with the loads that the state carries. `positions`: one a node (m). `axial_forces`: claimed, one a segment (N).
/// Numbers that are not finite never pass.
///
/// # Panics
/// If a list does not have one entry for each of what it ranges over.
#[must_use]
pub fn audit(net: &Net, case: &Case, positions: &[Vector3<f64>], axial_forces: &[f64]) -> Audit {
    let members = MemberStates {
        lying: net
            .segments()
            .iter()
            .map(|s| case.unstressed_lengths[s.length])
            .collect(),
        ..MemberStates::default()
    };
    audit_members(net, case, positions, axial_forces, &members)
}

/// Checks a claimed state of any net.
///
/// `members`: claimed as well. Of a rope that slides: the lengths that lie in its segments have to fill the rope, and the
/// tensions beside each node to differ by no more than friction allows. Of a rope that hangs: the curve is integrated
/// from the claimed force at its first end, and has to arrive at its second node.
///
/// # Panics
/// If a list does not have one entry for each of what it ranges over.
#[must_use]
pub fn audit_members(
    net: &Net,
    case: &Case,
    positions: &[Vector3<f64>],
    axial_forces: &[f64],
    members: &MemberStates,
) -> Audit {
    assert_eq!(positions.len(), net.nodes().len(), "one position a node");
    assert_eq!(axial_forces.len(), net.segments().len(), "one force a segment");
    let mut audit = Audit::default();
    let mut unbalanced = case.nodal_forces.clone();
    let mut largest: f64 = 0.0;
    let mut stiffness = vec![0.0; net.nodes().len()];
    let mut finite = true;
    let mut size = positions
        .iter()
        .flat_map(|x| x.iter().copied())
        .fold(0.0_f64, |m, c| m.max(c.abs()));
    for load in &case.nodal_forces {
        largest = largest.max(load.x.abs()).max(load.y.abs()).max(load.z.abs());
        audit.load_sum += load;
    }

    for (index, segment) in net.segments().iter().enumerate() {
        let claimed = axial_forces[index];
        let (from, to) = (positions[segment.ends[0].index()], positions[segment.ends[1].index()]);
        let (dx, dy, dz) = (to.x - from.x, to.y - from.y, to.z - from.z);
        let length = (dx * dx + dy * dy + dz * dz).sqrt();
        let expanded = 1.0 + segment.section.expansion * case.segments[index].temperature_change;
        let natural = members.lying[index] * expanded;
        let stretch = length / natural;
        let mut expected = segment.section.axial_stiffness * (stretch - 1.0);
        if segment.law == AxialLaw::TensionOnly && stretch <= 1.0 {
            expected = 0.0;
        }
        let mut spring = segment.section.axial_stiffness / natural;
        if case.removed[index] {
            expected = 0.0;
            spring = 0.0;
        }
        if segment.hangs && !case.removed[index] {
            let load = case.segments[index].per_length;
            let rope = hanging::Rope {
                axial_stiffness: segment.section.axial_stiffness,
                unstressed: members.lying[index],
                expanded,
                load: [load.x, load.y, load.z],
            };
            let start = members.pulls[index][0];
            let arrives = hanging::end_of(&rope, [start.x, start.y, start.z]);
            let miss = ((arrives[0] - dx).powi(2) + (arrives[1] - dy).powi(2) + (arrives[2] - dz).powi(2)).sqrt();
            let end = load * members.lying[index] - start;
            let claimed_end = members.pulls[index][1];
            expected = start.norm().max(end.norm());
            // What is missed at the end, by the stiffness of the whole rope.
            let error = (miss * spring)
                .max((claimed_end - end).norm())
                .max((claimed - expected).abs());
            finite &= error.is_finite();
            if error > audit.largest_force_error {
                audit.largest_force_error = error;
                audit.segment = Some(SegmentId::new(index));
            }
            largest = largest.max(expected);
            size = size.max(length).max(natural);
            for (node, pull) in segment.ends.iter().zip([start, end]) {
                stiffness[node.index()] += spring;
                unbalanced[node.index()] += pull;
            }
            audit.load_sum += load * members.lying[index];
            continue;
        }
        let error = (claimed - expected).abs();
        finite &= error.is_finite();
        if error > audit.largest_force_error {
            audit.largest_force_error = error;
            audit.segment = Some(SegmentId::new(index));
        }
        largest = largest.max(expected.abs());
        size = size.max(length).max(natural);
        for end in segment.ends {
            stiffness[end.index()] += spring;
        }
        if length > 0.0 {
            // The law speaks here, not the claim: the claim has been compared above.
            let pull = Vector3::new(dx, dy, dz) * (expected / length);
            unbalanced[segment.ends[0].index()] += pull;
            unbalanced[segment.ends[1].index()] -= pull;
        }
    }

    for (panel, pressure) in net.panels().iter().zip(&case.pressures) {
        for (node, force) in pressed(panel, *pressure, positions) {
            unbalanced[node.index()] += force;
            audit.load_sum += force;
            largest = largest.max(force.norm());
        }
    }
    let (slip, slipping) = sliding_error(net, case, axial_forces, members, positions);
    finite &= slip.is_finite();
    if slip > audit.largest_force_error {
        audit.largest_force_error = slip;
        audit.segment = slipping;
    }

    let mut elastic = vec![Vector3::zeros(); net.nodes().len()];
    for support in net.elastic_supports() {
        let mut movement = Vec::new();
        for (node, rest) in support.nodes().iter().zip(support.rest()) {
            let moved = positions[node.index()] - rest - case.support_movements[node.index()];
            movement.extend([moved.x, moved.y, moved.z]);
        }
        for (place, node) in support.nodes().iter().enumerate() {
            for (axis, along) in elastic[node.index()].iter_mut().enumerate() {
                let row = 3 * place + axis;
                let mut force = 0.0;
                let mut resistance = 0.0;
                for (column, moved) in movement.iter().enumerate() {
                    force -= support.stiffness()[(row, column)] * moved;
                    resistance += support.stiffness()[(row, column)].abs();
                }
                stiffness[node.index()] += resistance;
                *along += force;
                largest = largest.max(force.abs());
            }
        }
    }

    audit.support_forces = vec![Vector3::zeros(); net.nodes().len()];
    for index in 0..net.nodes().len() {
        let node = NodeId::new(index);
        let rest = unbalanced[index] + elastic[index];
        let mut held = Vector3::zeros();
        if let Some(support) = net.support_of(node) {
            let given = net.nodes()[index].position.unwrap_or(positions[index]);
            let off = positions[index] - given - case.support_movements[index];
            for direction in support.held() {
                held -= direction * direction.dot(&rest);
                let distance = direction.dot(&off).abs();
                finite &= distance.is_finite();
                audit.largest_misplacement = audit.largest_misplacement.max(distance);
            }
        }
        let free = (rest + held).norm();
        finite &= free.is_finite();
        if free > audit.largest_imbalance {
            audit.largest_imbalance = free;
            audit.node = Some(node);
        }
        audit.support_forces[index] = held + elastic[index];
        audit.support_sum += audit.support_forces[index];
    }
    let rounding = 8.0 * f64::EPSILON * size * stiffness.iter().copied().fold(0.0, f64::max);
    // Without load all forces may fade, and rounding is all that is left of them.
    let is_faded = largest <= rounding && case.nodal_forces.iter().all(|load| *load == Vector3::zeros());
    let hidden = if is_faded {
        rounding
    } else {
        rounding.min(1e-4 * largest)
    };
    audit.allowed = (SHARE * largest).max(hidden);
    audit.passed = finite
        && audit.largest_imbalance <= audit.allowed
        && audit.largest_force_error <= audit.allowed
        && audit.largest_misplacement <= MISPLACED * size;
    audit
}

/// Forces of a pressure on the corners of a panel (N): a third of each triangle between two corners and their mean to each
/// of the three, the share of the mean to all corners.
fn pressed(panel: &Panel, pressure: f64, positions: &[Vector3<f64>]) -> Vec<(NodeId, Vector3<f64>)> {
    let count = panel.corners.len();
    let mut mean = Vector3::zeros();
    for corner in &panel.corners {
        mean += positions[corner.index()] / count as f64;
    }
    let mut forces: Vec<(NodeId, Vector3<f64>)> = panel.corners.iter().map(|c| (*c, Vector3::zeros())).collect();
    for first in 0..count {
        let second = if first + 1 == count { 0 } else { first + 1 };
        let a = positions[panel.corners[first].index()];
        let b = positions[panel.corners[second].index()];
        // The area of the triangle (a, b, mean) as half the product of its sides from a; it points outward.
        let (u, v) = (b - a, mean - a);
        let area = 0.5 * Vector3::new(u.y * v.z - u.z * v.y, u.z * v.x - u.x * v.z, u.x * v.y - u.y * v.x);
        let third = -pressure / 3.0 * area;
        forces[first].1 += third;
        forces[second].1 += third;
        for force in &mut forces {
            force.1 += third / count as f64;
        }
    }
    forces
}

/// Largest contradiction to sliding, as a force (N), and where: rope that is missing or too much, tensions that differ by
/// more than friction allows.
fn sliding_error(
    net: &Net,
    case: &Case,
    axial_forces: &[f64],
    members: &MemberStates,
    positions: &[Vector3<f64>],
) -> (f64, Option<SegmentId>) {
    let mut worst = (0.0, None);
    for (index, reach) in net.reaches().iter().enumerate() {
        if reach.segments.len() == 1 || case.removed[reach.segments.start] {
            continue;
        }
        let mut note = |error: f64, segment: usize| {
            if error > worst.0 || error.is_nan() {
                worst = (error, Some(SegmentId::new(segment)));
            }
        };
        let mut lies = 0.0;
        for segment in reach.segments.clone() {
            lies += members.lying[segment];
        }
        let whole = case.unstressed_lengths[index];
        let stiffness = net.segments()[reach.segments.start].section.axial_stiffness / whole;
        note((lies - whole).abs() * stiffness, reach.segments.start);
        for (place, mu) in reach.friction.iter().enumerate() {
            let (before, after) = (reach.segments.start + place, reach.segments.start + place + 1);
            let direction = |segment: usize| {
                let [from, to] = net.segments()[segment].ends;
                (positions[to.index()] - positions[from.index()]).normalize()
            };
            let angle = direction(before).dot(&direction(after)).clamp(-1.0, 1.0).acos();
            let most = (mu * angle).exp();
            let (less, more) = if axial_forces[before] < axial_forces[after] {
                (axial_forces[before], axial_forces[after])
            } else {
                (axial_forces[after], axial_forces[before])
            };
            note(more - most * less, after);
        }
    }
    worst
}
