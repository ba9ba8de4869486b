//! Nodal balance, found again by a routine that shares no code with assembly.
//!
//! Plain loops over what is given and what is claimed; no numbering, no matrices, no element. It goes back to `EA`, `α`,
//! `ΔT` and `L0`, and compares the claimed axial forces with the law, the nodes with their loads, and the held nodes with
//! where the case puts their supports.

use nalgebra::Vector3;

use crate::load::Case;
use crate::model::{AxialLaw, Net, NodeId, SegmentId};

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

/// Checks a claimed state.
///
/// `case`: with the loads that the state carries. `positions`: one a node (m). `axial_forces`: claimed, one a segment (N).
/// Numbers that are not finite never pass.
///
/// # Panics
/// If a list does not have one entry for each of what it ranges over.
#[must_use]
pub fn audit(net: &Net, case: &Case, positions: &[Vector3<f64>], axial_forces: &[f64]) -> Audit {
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
        let natural = case.unstressed_lengths[segment.length] * expanded;
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
