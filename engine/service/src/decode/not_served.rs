//! Parts that the contract has and this server does not serve yet: refused by name, each at its place.

use ropewalk_api::ropewalk::v1;

use super::findings::{Findings, Path};
use super::reasons;

/// Parts of a brief that are served.
pub const SERVED: &[&str] = &[
    "net.nodes",
    "net.sections",
    "net.roles",
    "net.cables",
    "net.struts",
    "net.groups",
    "net.support_groups",
    "net.skins",
    "net.zones",
    "net.panels",
    "net.adjusters",
    "prestress",
    "actions.loads.nodes",
    "actions.loads.own_weight",
    "actions.loads.on_length",
    "actions.loads.on_plan_length",
    "actions.loads.on_plan",
    "actions.loads.on_surface",
    "actions.loads.wind_on_ropes",
    "actions.loads.ice",
    "actions.loads.temperature",
    "actions.loads.move",
    "actions.loads.prestress",
    "actions.loads.adjust",
    "factors",
    "combinations",
    "cases",
    "checks.safety",
    "checks.slackness",
    "checks.movement",
    "checks.anchor_pull",
    "checks.resistance",
    "checks.service_stress",
    "checks.construction_stress",
    "checks.buckling",
    "checks.clearance",
    "checks.clamp",
    "checks.saddle",
    "checks.drainage",
    "sizing",
    "diagnosis",
    "modes",
    "motions",
    "solving",
    "keep",
    "accepted",
    "frozen_from",
];

/// Parts of a brief that are refused.
pub const NOT_SERVED: &[&str] = &["stored_net", "stages", "workshop", "readings", "variants"];

/// Refuses every part of the brief that is not served.
pub(crate) fn refuse(brief: &v1::Brief, findings: &mut Findings) {
    let mut part = |path: &Path<'_>, id: &str| {
        findings
            .error(
                reasons::NOT_SERVED,
                path,
                id,
                format!("this server does not serve {path} yet"),
                "take it out of the brief; GetInfo tells which parts are served",
            )
            .value(id);
    };
    match &brief.net_source {
        Some(v1::brief::NetSource::StoredNet(digest)) => part(&Path::root("stored_net"), digest),
        Some(v1::brief::NetSource::Net(_)) | None => {}
    }
    for (list, ids) in [
        ("stages", brief.stages.iter().map(|s| s.id.as_str()).collect::<Vec<_>>()),
        ("readings", brief.readings.iter().map(|r| r.id.as_str()).collect()),
        ("variants", brief.variants.iter().map(|v| v.id.as_str()).collect()),
    ] {
        let elements = Path::root(list);
        for (number, id) in ids.iter().enumerate() {
            part(&elements.element(id, number), id);
        }
    }
    if brief.workshop.is_some() {
        part(&Path::root("workshop"), "");
    }
}
