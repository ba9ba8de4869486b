//! About which states natural frequencies are wanted, and what moves along.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::ModesGiven;
use ropewalk_numerics::model::{NodeId, SegmentId};
use ropewalk_numerics::motion::MassGiven;
use v1::added_mass::Mass;

use super::cases::Cases;
use super::findings::{Findings, Path};
use super::net::NetDraft;
use super::numbers::{ADDED_MASS, AIR_MASS, FREQUENCY, MASS_PER_AREA, MASS_PER_LENGTH, MODES, Of};
use super::reasons;
use super::resolved::Resolved;
use super::scope::{AREAS, MEMBERS, NODES, Scopes};
use crate::words::number;

const OF: Of<'_> = Of::new("part of the brief", "");

/// What the parts of a brief name.
pub(crate) struct Context<'a, 'b> {
    pub(crate) net: &'a NetDraft<'b>,
    pub(crate) scopes: &'a Scopes,
    pub(crate) cases: &'a Cases<'b>,
}

pub(crate) fn read(
    modes: Option<&v1::Modes>,
    context: &Context<'_, '_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<ModesGiven> {
    let modes = modes?;
    let at = Path::root("modes");
    let default = ModesGiven::default();
    let about = at.field("about");
    let states = context.cases.states(&modes.about, &about, findings);
    if modes.about.is_empty() {
        resolved.left_out(&about, "the reference state and all cases");
    }
    let field = at.field("count");
    let count = match modes.count {
        Some(count) => {
            (findings.number(&field, OF, &MODES, f64::from(count))).and_then(|_| usize::try_from(count).ok())
        }
        None => {
            resolved.left_out(&field, default.count);
            Some(default.count)
        }
    };
    let air = read_air(modes.air_mass_kg_per_m2, OF, &at, context.net, findings);
    let limits = limits(modes, &at, &default, findings, resolved);
    let mut masses = MassGiven {
        air: air.unwrap_or(0.0),
        ..MassGiven::default()
    };
    let list = at.field("added");
    for (position, added) in modes.added.iter().enumerate() {
        let at = list.number(position);
        read_added(added, &at, context.net, context.scopes, &mut masses, findings);
    }
    let (reference, cases) = states?;
    let (wind_study_below, flexible_below) = limits?;
    air?;
    Some(ModesGiven {
        reference,
        cases,
        count: count?,
        masses,
        wind_study_below,
        flexible_below,
    })
}

/// Limits of the lowest frequency (Hz): for a study of the wind, and for flexible.
fn limits(
    modes: &v1::Modes,
    at: &Path<'_>,
    default: &ModesGiven,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<(f64, f64)> {
    let (study, flexible) = (at.field("wind_study_below_hz"), at.field("flexible_below_hz"));
    if modes.wind_study_below_hz.is_none() {
        resolved.left_out(&study, number(default.wind_study_below));
    }
    let limit = modes.wind_study_below_hz;
    let study = findings.number_or(&study, OF, &FREQUENCY, limit, default.wind_study_below);
    let least = default.flexible_below.min(study.unwrap_or(default.flexible_below));
    if modes.flexible_below_hz.is_none() {
        resolved.left_out(&flexible, number(least));
    }
    let below = findings.number_or(&flexible, OF, &FREQUENCY, modes.flexible_below_hz, least)?;
    let study = study?;
    if below > study {
        findings
            .error(
                reasons::OUT_OF_RANGE,
                &flexible,
                "",
                format!(
                    "a net is to count as flexible below {} Hz, and the wind to be studied only below {} Hz",
                    number(below),
                    number(study)
                ),
                "give flexible_below_hz at most wind_study_below_hz",
            )
            .value(number(below));
        return None;
    }
    Some((study, below))
}

/// Mass of the air that moves with panels (kg/m²).
pub(super) fn read_air(
    given: Option<f64>,
    of: Of<'_>,
    at: &Path<'_>,
    net: &NetDraft<'_>,
    findings: &mut Findings,
) -> Option<f64> {
    let field = at.field("air_mass_kg_per_m2");
    let air = findings.number_or(&field, of, &AIR_MASS, given, 0.0)?;
    if air > 0.0 && !net.has_panels() {
        findings.doubt(
            reasons::DATA_NOT_USED,
            &field,
            of.id,
            "air is to move with panels, and the net has none",
            format!("give skins, or put the mass of air on cables in {at}.added"),
        );
    }
    Some(air)
}

/// Reads what lies on nodes, members or areas, into `masses`.
pub(super) fn read_added(
    added: &v1::AddedMass,
    at: &Path<'_>,
    net: &NetDraft<'_>,
    scopes: &Scopes,
    masses: &mut MassGiven,
    findings: &mut Findings,
) {
    let of = Of::new("added mass", "");
    let on = at.field("on");
    if added.on.is_empty() {
        findings.error(
            reasons::COVERS_NOTHING,
            &on,
            "",
            "an added mass lies on nothing",
            "name in on what carries it",
        );
    }
    let (name, value, quantity, allowed) = match added.mass {
        Some(Mass::MassKg(mass)) => ("mass_kg", mass, &ADDED_MASS, NODES),
        Some(Mass::MassPerLengthKgPerM(mass)) => ("mass_per_length_kg_per_m", mass, &MASS_PER_LENGTH, MEMBERS),
        Some(Mass::MassPerAreaKgPerM2(mass)) => ("mass_per_area_kg_per_m2", mass, &MASS_PER_AREA, AREAS),
        None => {
            findings.error(
                reasons::MISSING,
                at,
                "",
                "it is not said how much this added mass is",
                "give one of mass_kg, mass_per_length_kg_per_m and mass_per_area_kg_per_m2",
            );
            return;
        }
    };
    let mass = findings.number(&at.field(name), of, quantity, value);
    let scope = scopes.of(net, &added.on, &on, allowed, findings);
    let Some(mass) = mass else { return };
    match added.mass {
        Some(Mass::MassKg(_)) => masses.nodes.extend(scope.nodes().map(|node| (NodeId::new(node), mass))),
        Some(Mass::MassPerLengthKgPerM(_)) => {
            let segments = scope.segments(net).into_iter();
            masses
                .segments
                .extend(segments.map(|segment| (SegmentId::new(segment), mass)));
        }
        _ => masses.areas.push((scope.areas().collect(), mass)),
    }
}
