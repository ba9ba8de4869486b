//! Lumped mass.

use crate::model::{Net, ReferenceState, fan};

/// Mass of every node (kg): half of each of its segments, what is attached, its share of skins.
///
/// ```text
/// M_i = Σ m L0 / 2  + attached mass + Σ (mass per area) (share of the panel's area in the reference state)
/// ```
/// Velocity is linear in the material coordinate of a straight segment, so that neither stretch nor turning changes it.
///
/// `removed`: segments taken out; they have no mass. Empty: none.
#[must_use]
pub(super) fn lumped(net: &Net, reference: &ReferenceState, removed: &[bool]) -> Vec<f64> {
    let mut masses: Vec<f64> = net.nodes().iter().map(|node| node.attached_mass).collect();
    for (index, segment) in net.segments().iter().enumerate() {
        if removed.get(index).is_some_and(|removed| *removed) {
            continue;
        }
        // A reach that slides is one length for several segments; motion refuses it before it asks for masses.
        let half = 0.5 * segment.section.mass_per_length * reference.unstressed_lengths[segment.length];
        for end in segment.ends {
            masses[end.index()] += half;
        }
    }
    for skin in net.skins().iter().filter(|skin| skin.mass_per_area > 0.0) {
        for panel in &skin.panels {
            let panel = &net.panels()[*panel];
            let areas = fan::triangles(&panel.places(&reference.positions));
            let areas: Vec<f64> = areas.iter().map(|area| area.norm()).collect();
            for (corner, area) in panel.corners.iter().zip(fan::to_corners(&areas)) {
                masses[corner.index()] += skin.mass_per_area * area;
            }
        }
    }
    masses
}
