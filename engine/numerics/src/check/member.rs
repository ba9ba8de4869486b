//! Ropes and struts: strength, slackness, buckling.

use std::f64::consts::{FRAC_PI_2, PI};

use super::judgement::{Covered, Judgement, Lack, Measure};
use super::{Against, CaseDigest, CheckKind};
use crate::model::{Section, SegmentId};

/// A rope checked by its tension: the worst of its segments, if each can be judged.
pub(super) fn rope(
    against: &Against<'_>,
    kind: CheckKind,
    part: Covered,
    digest: &CaseDigest,
) -> Result<Judgement, Lack> {
    let Covered::Cable(cable) = part else {
        return Err(Lack::Rope);
    };
    let mut worst: Option<Judgement> = None;
    for index in against.net.cables()[cable.index()].segments.clone() {
        let section = &against.net.segments()[index].section;
        let tension = digest.axial_forces[index];
        let next = match kind {
            CheckKind::Slackness { min_share_of_reference } => {
                slackness(part, tension, against.axial_forces[index], min_share_of_reference)?
            }
            _ => {
                let (factor, limit) = strength(kind, section).ok_or(Lack::BreakingForce)?;
                Judgement::at_most(part, Measure::Tension, factor * tension, limit)?
            }
        };
        let next = next.on(SegmentId::new(index));
        worst = Some(worst.map_or(next, |worst| worst.worse(next)));
    }
    worst.ok_or(Lack::Rope)
}

/// Factor on the tension, and what the tension must not exceed (N).
fn strength(kind: CheckKind, section: &Section) -> Option<(f64, f64)> {
    let strength = section.breaking_force?;
    match kind {
        CheckKind::Safety { factor } => Some((factor, strength)),
        CheckKind::Resistance {
            gamma_r,
            strength_divisor,
        } => Some((
            1.0,
            resistance(strength, section.proof_force, gamma_r, strength_divisor),
        )),
        CheckKind::ShareOfStrength { share, .. } => Some((1.0, share * strength)),
        _ => None,
    }
}

/// Design resistance of a tension component (N).
///
/// ```text
/// F_Rd = min(F_uk / (d γ_R), F_k / γ_R)
/// ```
///
/// `strength`: `F_uk`, the breaking force with end fittings (N). `proof_force`: `F_k` (N); without it its term is left
/// out. `gamma_r`: `γ_R` (–). `strength_divisor`: `d` (–), 1.5 in the standard.
///
/// # Reference
/// EN 1993-1-11:2006, 6.2 (from memory: verify).
#[must_use]
pub fn resistance(strength: f64, proof_force: Option<f64>, gamma_r: f64, strength_divisor: f64) -> f64 {
    let of_strength = strength / (strength_divisor * gamma_r);
    proof_force.map_or(of_strength, |proof| of_strength.min(proof / gamma_r))
}

fn slackness(part: Covered, tension: f64, whole: f64, least: f64) -> Result<Judgement, Lack> {
    if whole <= 0.0 || least >= 1.0 {
        return Err(Lack::TautReference);
    }
    let share = tension / whole;
    let ratio = (1.0 - share) / (1.0 - least);
    // A slack rope fails a wanted share of zero too: it asks for "not slack".
    let passes = share >= least && share > 0.0;
    Judgement::with_ratio(part, Measure::TensionShare, share, least, ratio, passes)
}

/// How a strut is checked for buckling.
pub(super) struct Buckling {
    pub(super) length_factor: f64,
    pub(super) safety: f64,
    pub(super) eccentricity: Option<f64>,
}

/// A strut checked by its compression, with its length in the reference state.
pub(super) fn strut(
    against: &Against<'_>,
    given: &Buckling,
    part: Covered,
    digest: &CaseDigest,
) -> Result<Judgement, Lack> {
    let Covered::Strut(strut) = part else {
        return Err(Lack::Strut);
    };
    let id = against.net.struts()[strut.index()].segment;
    let segment = &against.net.segments()[id.index()];
    let bending_stiffness = segment.section.bending_stiffness.ok_or(Lack::BendingStiffness)?;
    let [foot, head] = segment.ends.map(|end| against.positions[end.index()]);
    let critical = critical_force(bending_stiffness, given.length_factor * (head - foot).norm());
    let compression = (-digest.axial_forces[id.index()]).max(0.0);
    let judgement = Judgement::at_most(part, Measure::Compression, compression, critical / given.safety)?;
    Ok(Judgement {
        moment: given
            .eccentricity
            .and_then(|eccentricity| eccentric_moment(compression, eccentricity, critical)),
        ..judgement.on(id)
    })
}

/// Euler's critical force (N): `π² EI / s²`. `bending_stiffness`: `EI` (N m²). `buckling_length`: `s` (m).
#[must_use]
pub fn critical_force(bending_stiffness: f64, buckling_length: f64) -> f64 {
    PI * PI * bending_stiffness / (buckling_length * buckling_length)
}

/// Largest bending moment of a bar compressed beside its axis, at both ends alike (N m): the secant formula.
///
/// ```text
/// M = C e / cos(π/2 √(C / N_cr))
/// ```
///
/// `compression`: `C` (N). `eccentricity`: `e` (m). `critical`: Euler's `N_cr` (N). `None` from `N_cr` on, where the bar
/// buckles.
#[must_use]
pub fn eccentric_moment(compression: f64, eccentricity: f64, critical: f64) -> Option<f64> {
    let share = compression / critical;
    (share < 1.0).then(|| compression * eccentricity / (FRAC_PI_2 * share.sqrt()).cos())
}
