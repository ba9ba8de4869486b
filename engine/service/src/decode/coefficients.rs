//! Coefficients of pressures on the surface, by zone and skin.

use std::collections::BTreeMap;

use ropewalk_numerics::model::Area;

use super::findings::{Findings, Path};
use super::names::Thing;
use super::net::NetDraft;
use super::numbers::{Of, PRESSURE_COEFFICIENT};
use super::reasons;
use crate::words::Quoted;

/// Coefficients of zones and skins, in brief order, and that of all other panels.
pub(crate) type Coefficients = (Vec<(Area, f64)>, Option<f64>);

/// Reads coefficients, and the one elsewhere, of a pressure that `what` names. `at`: the load that has both fields.
pub(crate) fn read(
    (given, elsewhere): (&BTreeMap<String, f64>, Option<f64>),
    what: &str,
    of: Of<'_>,
    at: &Path<'_>,
    net: &NetDraft<'_>,
    findings: &mut Findings,
) -> Option<Coefficients> {
    let list = at.field("coefficients");
    let mut coefficients = Vec::with_capacity(given.len());
    let mut complete = true;
    for (name, value) in given {
        let at = list.key(name);
        let value = findings.number(&at, of, &PRESSURE_COEFFICIENT, *value);
        let area = match net.names.find(findings, &at, "zone", name) {
            Some(Thing::Zone(zone)) => Some(Area::Zone(zone)),
            Some(Thing::Skin(skin)) => Some(Area::Skin(skin)),
            Some(other) => {
                findings.error(
                    reasons::WRONG_KIND,
                    &at,
                    name,
                    format!(
                        "{} is a {}, and coefficients are of zones and skins",
                        Quoted(name),
                        other.kind()
                    ),
                    "name zones or skins",
                );
                None
            }
            None => None,
        };
        complete &= area.is_some() && value.is_some();
        coefficients.extend(area.zip(value));
    }
    // Brief order: the first zone around a panel is the one that comes first there.
    coefficients.sort_by_key(|(area, _)| match area {
        Area::Zone(zone) => (0, *zone),
        Area::Skin(skin) => (1, *skin),
    });
    if let Some(value) = elsewhere {
        let value = findings.number(&at.field("elsewhere"), of, &PRESSURE_COEFFICIENT, value);
        complete &= value.is_some();
    }
    if (given.is_empty() && elsewhere.is_none()) || !net.has_panels() {
        findings.error(
            reasons::COVERS_NOTHING,
            &list,
            of.id,
            format!("{what} acts on nothing"),
            "give coefficients of zones or skins, or elsewhere, in a net that has skins",
        );
        return None;
    }
    complete.then_some((coefficients, elsewhere))
}
