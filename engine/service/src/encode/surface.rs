//! Panels in the reference state, and what each action does there.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{LoadPicture, Plan, Ponding, PondingEnd, ReferenceOutcome};
use ropewalk_numerics::load::{Load, Place, Surface};
use ropewalk_numerics::model::{Net, fan};
use v1::run_response::Event;

use super::doubts::finding;
use super::parts::{NUMBERS, count, event, first_ids, split};
use crate::decode::{REFERENCE, WithoutValue, Work, reasons};
use crate::words::{Quoted, quoted_list};

/// Panels without a value that are listed.
const WITHOUT_VALUE: usize = 100;

/// The table of panels, then the picture of each action.
pub(super) fn tables(plan: &Plan, reference: &ReferenceOutcome) -> Vec<v1::RunResponse> {
    let net = &plan.brief().net;
    let surface = plan.surface(reference);
    let mut messages = panels(net, &surface);
    for (action, picture) in plan.brief().actions.iter().zip(plan.load_pictures(reference)) {
        messages.extend(pictures(net, &surface, &action.name, &picture));
    }
    messages
}

fn panels(net: &Net, surface: &Surface) -> Vec<v1::RunResponse> {
    let entries = net.panels().iter().enumerate().map(|(index, panel)| v1::PanelEntry {
        id: panel.name.clone(),
        corners: panel.corners.iter().map(|corner| count(corner.index())).collect(),
        skin: surface.skins[index].map_or_else(String::new, |skin| net.skins()[skin].name.clone()),
        zones: surface.zones[index]
            .iter()
            .map(|zone| net.zones()[*zone].name.clone())
            .collect(),
        area_m2: surface.areas[index],
        area_on_plan_m2: surface.areas_on_plan[index],
    });
    let total = count(net.panels().len());
    let mut offset = 0;
    split(entries.collect())
        .into_iter()
        .map(|panels| {
            let part = v1::PanelTable {
                offset: count(offset),
                total,
                panels,
            };
            offset += part.panels.len();
            event(Event::Panels(part))
        })
        .collect()
}

/// The picture of an action in parts; the first has the totals.
fn pictures(net: &Net, surface: &Surface, action: &str, picture: &LoadPicture) -> Vec<v1::RunResponse> {
    let acts = |panel: &usize| {
        let on = |list: &[f64]| list.get(*panel).is_some_and(|pressure| *pressure != 0.0);
        on(&picture.pressures) || on(&picture.on_plan)
    };
    let loaded: Vec<usize> = (0..net.panels().len()).filter(acts).collect();
    let area = |areas: &[f64], panels: &[usize]| panels.iter().map(|panel| areas[*panel]).sum::<f64>();
    let without = picture
        .without_value
        .iter()
        .map(|panel| net.panels()[*panel].name.as_str());
    let is_on_panels = !loaded.is_empty();
    let mut parts = vec![v1::LoadPicture {
        action: action.to_owned(),
        force_n: picture.resultant.force.iter().copied().collect(),
        moment_nm: picture.resultant.moment.iter().copied().collect(),
        point_m: picture
            .axis
            .map_or_else(Vec::new, |(point, _)| point.iter().copied().collect()),
        moment_along_nm: picture.axis.map_or(0.0, |(_, along)| along),
        loaded_panels: count(loaded.len()),
        loaded_area_m2: area(&surface.areas, &loaded),
        loaded_area_on_plan_m2: area(&surface.areas_on_plan, &loaded),
        without_value: first_ids(without, WITHOUT_VALUE),
        without_value_total: count(picture.without_value.len()),
        without_value_area_m2: area(&surface.areas, &picture.without_value),
        ..v1::LoadPicture::default()
    }];
    if is_on_panels {
        let total = net.panels().len();
        for offset in (0..total).step_by(NUMBERS) {
            if offset > 0 {
                parts.push(v1::LoadPicture {
                    action: action.to_owned(),
                    ..v1::LoadPicture::default()
                });
            }
            let part = parts.last_mut().expect("there is a first part");
            let slice = |list: &[f64]| -> Vec<f64> {
                let end = total.min(offset + NUMBERS);
                (offset..end)
                    .map(|panel| list.get(panel).copied().unwrap_or(0.0))
                    .collect()
            };
            part.offset = count(offset);
            part.total = count(total);
            part.pressure_pa = slice(&picture.pressures);
            part.on_plan_pa = slice(&picture.on_plan);
        }
    }
    parts.into_iter().map(|part| event(Event::LoadPicture(part))).collect()
}

/// Water on skins.
pub(super) fn ponding(net: &Net, ponding: &Ponding) -> v1::PondingResult {
    /// Ponds that are listed.
    const LISTED: usize = 100;
    let ponds = ponding.ponds.iter().take(LISTED).map(|pond| {
        let (node, panel) = match pond.deepest {
            Place::Node(node) => (net.node_name(node), ""),
            Place::Panel(panel) => ("", net.panels()[panel].name.as_str()),
        };
        v1::Pond {
            node: node.to_owned(),
            panel: panel.to_owned(),
            xyz_m: pond.position.iter().copied().collect(),
            depth_m: pond.depth,
            level_m: pond.level,
            volume_m3: pond.volume,
            mass_kg: ponding.density * pond.volume,
            area_m2: pond.area,
        }
    });
    v1::PondingResult {
        end: match ponding.end {
            PondingEnd::Settled => v1::PondingEnd::Settled,
            PondingEnd::Growing => v1::PondingEnd::Growing,
            PondingEnd::NotSettled => v1::PondingEnd::NotSettled,
        }
        .into(),
        volume_m3: ponding.volume(),
        mass_kg: ponding.density * ponding.volume(),
        ponds: ponds.collect(),
        ponds_total: count(ponding.ponds.len()),
        round_volume_m3: ponding.volumes.clone(),
    }
}

/// What is odd about panels and pressures in the reference state.
pub(super) fn doubts(work: &Work, plan: &Plan, reference: &ReferenceOutcome) -> Vec<v1::Finding> {
    let brief = plan.brief();
    let net = &brief.net;
    if net.panels().is_empty() {
        return Vec::new();
    }
    let surface = plan.surface(reference);
    let mut findings = Vec::new();
    let (given, positions) = (work.given_panels(), &reference.state.positions);
    let turned: Vec<&str> = (net.panels().iter())
        .filter(|panel| {
            !given.contains(panel.name.as_str()) && fan::signed_area_on_plan(&panel.places(positions)) <= 0.0
        })
        .map(|panel| panel.name.as_str())
        .collect();
    if let Some(first) = turned.first() {
        findings.push(finding(
            v1::FindingSeverity::Doubt,
            reasons::PANEL_TURNED,
            first,
            turned.len().to_string(),
            format!(
                "panels found in plan have turned over in the reference state: {}",
                quoted_list(turned.iter().copied())
            ),
            "give coordinates near the shape, so that meshes are found in it; or give these panels in net.panels",
        ));
    }
    for action in &brief.actions {
        for load in &action.loads {
            let Load::OnSurface {
                coefficients,
                elsewhere,
                ..
            } = load
            else {
                continue;
            };
            if let Some(found) = WithoutValue::of(net, &surface, coefficients, *elsewhere) {
                findings.push(finding(
                    v1::FindingSeverity::Doubt,
                    reasons::PANELS_WITHOUT_VALUE,
                    &action.name,
                    found.panels.len().to_string(),
                    found.message(net, format_args!("action {}", Quoted(&action.name)), ""),
                    WithoutValue::CURE,
                ));
            }
            if let Some((panel, zones)) = surface.contradictions(coefficients).first() {
                let [first, second] = zones.map(|zone| Quoted(&net.zones()[zone].name));
                findings.push(finding(
                    v1::FindingSeverity::Doubt,
                    reasons::ZONES_CONTRADICT,
                    &action.name,
                    net.panels()[*panel].name.clone(),
                    format!(
                        "action {}: zones {first} and {second} both cover panel {} in the reference state, with different \
                         coefficients; that of {first} was taken",
                        Quoted(&action.name),
                        Quoted(&net.panels()[*panel].name)
                    ),
                    "draw the zones apart, or give them one coefficient",
                ));
            }
        }
    }
    for finding in &mut findings {
        finding.case = REFERENCE.to_owned();
        work.accept(finding);
    }
    findings
}
