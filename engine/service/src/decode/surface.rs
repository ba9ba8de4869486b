//! Skins, zones and panels: what the brief says of them, and, once the net is known, the panels themselves.

use std::collections::{BTreeMap, HashMap, HashSet};
use std::fmt;

use nalgebra::{Vector2, Vector3};
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::load::{Action, Load, Surface};
use ropewalk_numerics::model::mesh::{MeshError, meshes};
use ropewalk_numerics::model::{Area, Net, NodeId, PanelGiven, Skin, Zone};

use super::findings::{Findings, Path};
use super::names::{Names, Thing};
use super::net::{MemberDraft, NetDraft};
use super::numbers::{COORDINATE, MASS_PER_AREA, Of};
use super::reasons;
use super::resolved::Resolved;
use super::scope::{CABLES, Scopes};
use super::supports::Supports;
use crate::words::{Quoted, quoted_list, rounded};

/// Corners of an outline: it is compared with each panel.
const MOST_CORNERS: usize = 1000;
/// Characters of the name of a panel.
const LONGEST_NAME: usize = 128;

/// Skins, zones and panels as read. It keeps nothing of the message, since it is used when the net is built.
#[derive(Debug, Default)]
pub(crate) struct SurfaceDraft {
    skins: Vec<SkinDraft>,
    zones: Vec<Zone>,
    panels: Vec<PanelDraft>,
    /// Nodes that have no support, which checks of movement judge.
    free: Vec<bool>,
}

#[derive(Debug)]
struct SkinDraft {
    id: String,
    mass_per_area: f64,
    /// Segments between which it spans.
    edges: Vec<EdgeDraft>,
    /// Whether it names any ropes.
    spans: bool,
}

#[derive(Debug)]
struct EdgeDraft {
    ends: [NodeId; 2],
    cable: String,
}

#[derive(Debug)]
struct PanelDraft {
    id: String,
    skin: usize,
    corners: Vec<NodeId>,
}

impl SurfaceDraft {
    pub(crate) fn read(net: &NetDraft<'_>, scopes: &Scopes, supports: &Supports, findings: &mut Findings) -> Self {
        let message = net.message;
        let mut draft = Self {
            free: supports.of_node.iter().map(Option::is_none).collect(),
            ..Self::default()
        };
        let list = Path::root("net.skins");
        for (index, skin) in message.skins.iter().enumerate() {
            let at = list.element(&skin.id, index);
            draft.skins.push(read_skin(net, scopes, skin, &at, findings));
        }
        let list = Path::root("net.zones");
        for (index, zone) in message.zones.iter().enumerate() {
            draft
                .zones
                .extend(read_zone(net, zone, &list.element(&zone.id, index), findings));
        }
        let list = Path::root("net.panels");
        let mut names = Names::new("panels");
        for (index, panel) in message.panels.iter().enumerate() {
            names.declare(findings, &list, index, panel.id.as_str(), index);
            let at = list.element(&panel.id, index);
            draft.panels.extend(read_panel(net, panel, &at, findings));
        }
        for (index, skin) in draft.skins.iter().enumerate() {
            let has_panels = message.panels.iter().any(|panel| panel.skin == skin.id);
            if !skin.spans && !has_panels {
                findings.error(
                    reasons::SKIN_WITHOUT_PANELS,
                    &list_of_skins(&skin.id, index).field("between"),
                    &skin.id,
                    format!("skin {} spans between nothing and has no panels", Quoted(&skin.id)),
                    "name in between the ropes that it spans between, or give its panels in net.panels",
                );
            }
        }
        draft
    }

    /// Whether there is nothing to find.
    pub(crate) fn is_empty(&self) -> bool {
        self.skins.is_empty() && self.zones.is_empty() && self.panels.is_empty()
    }

    /// The net with its panels, found at `positions` (m), where nodes are or about are. Tells what stands in the way.
    pub(crate) fn complete(
        &self,
        net: Net,
        positions: &[Vector3<f64>],
        findings: &mut Findings,
        resolved: &mut Resolved,
    ) -> Option<Net> {
        let plan: Vec<Vector2<f64>> = positions.iter().map(Vector3::xy).collect();
        let mut found = FoundPanels {
            names: self.panels.iter().map(|panel| panel.id.clone()).collect(),
            ..FoundPanels::default()
        };
        for (index, skin) in self.skins.iter().enumerate() {
            let path = list_of_skins(&skin.id, index);
            let at = path.field("between");
            let edges: Vec<[NodeId; 2]> = skin.edges.iter().map(|edge| edge.ends).collect();
            let before = found.panels.len();
            match meshes(&edges, &plan) {
                Ok(meshes) => {
                    let encloses = !meshes.corners.is_empty();
                    for corners in meshes.corners {
                        let name = found.unique(name_of(&net, &corners));
                        found.add(&net, index, name, corners, &at, findings);
                    }
                    if !encloses && skin.spans {
                        findings.error(
                            reasons::SKIN_WITHOUT_PANELS,
                            &at,
                            &skin.id,
                            format!("the ropes of skin {} enclose no mesh in plan", Quoted(&skin.id)),
                            "name all ropes that it spans between, edges included",
                        );
                    }
                    tell_loose(&net, skin, &meshes.loose, &at, findings);
                }
                Err(errors) => {
                    for error in errors {
                        tell_mesh_error(&net, skin, &error, &at, findings);
                    }
                }
            }
            let meshes = found.panels.len() - before;
            for panel in self.panels.iter().filter(|panel| panel.skin == index) {
                let list = Path::root("net.panels");
                let at = list.element(&panel.id, 0);
                found.add(&net, index, panel.id.clone(), panel.corners.clone(), &at, findings);
            }
            let words = format!("{meshes} panels between the named ropes in plan");
            if skin.spans {
                resolved.inherited(&Path::root("net.panels"), words, &at);
            }
        }
        if findings.has_errors() {
            return None;
        }
        let mut of_skin = vec![Vec::new(); self.skins.len()];
        for (panel, skin) in found.skins.iter().enumerate() {
            of_skin[*skin].push(panel);
        }
        let skins = self.skins.iter().enumerate().map(|(index, skin)| Skin {
            name: skin.id.clone(),
            mass_per_area: skin.mass_per_area,
            panels: of_skin[index].clone(),
        });
        let skins = skins.collect();
        let net = net.with_surface(found.panels, skins, self.zones.clone());
        let net = net.map_err(|errors| {
            // The border checks everything that the model does; should it ever not, the model has the last word.
            for error in errors {
                findings.error(
                    reasons::OUT_OF_RANGE,
                    &Path::root("net"),
                    "",
                    error.to_string(),
                    "mend this part of the net",
                );
            }
        });
        let net = net.ok()?;
        self.tell_zones(&net, positions, findings, resolved);
        Some(net)
    }

    /// Tells zones without panels, and the panels as far as they are known.
    fn tell_zones(&self, net: &Net, positions: &[Vector3<f64>], findings: &mut Findings, resolved: &mut Resolved) {
        let surface = Surface::new(net, positions);
        let about = about(net);
        let list = Path::root("net.panels");
        for (index, panel) in net.panels().iter().enumerate() {
            let Some(skin) = surface.skins[index] else {
                continue;
            };
            let zones = surface.zones[index].iter().map(|zone| net.zones()[*zone].name.as_str());
            let zones: Vec<&str> = zones.collect();
            let words = format!(
                "{} corners, {about}{} m2 on plan{}{}",
                panel.corners.len(),
                rounded(surface.areas_on_plan[index], 3),
                if zones.is_empty() { "" } else { ", in " },
                zones.join(", ")
            );
            let origin = list_of_skins(&net.skins()[skin].name, skin);
            resolved.inherited(&list.element(&panel.name, index), words, &origin.field("between"));
        }
        let zones = Path::root("net.zones");
        for (index, zone) in net.zones().iter().enumerate() {
            if surface.panels_of(&[Area::Zone(index)]).next().is_none() {
                findings.doubt(
                    reasons::COVERS_NOTHING,
                    &zones.element(&zone.name, index).field("outline_xy_m"),
                    &zone.name,
                    format!(
                        "zone {} covers no panel of skin {}: the centre of none lies within its outline",
                        Quoted(&zone.name),
                        Quoted(&net.skins()[zone.skin].name)
                    ),
                    "check the outline, which is in plan, x and y in turn",
                );
            }
        }
    }

    /// Tells pressures that zones contradict, or that leave panels without a value, as far as panels are known.
    pub(crate) fn tell_actions(
        &self,
        net: &Net,
        positions: &[Vector3<f64>],
        actions: &[Action],
        findings: &mut Findings,
    ) {
        let surface = Surface::new(net, positions);
        let list = Path::root("actions");
        for (index, action) in actions.iter().enumerate() {
            let at = list.element(&action.name, index);
            let loads = at.field("loads");
            for (number, load) in action.loads.iter().enumerate() {
                let Load::OnSurface {
                    coefficients,
                    elsewhere,
                    ..
                } = load
                else {
                    continue;
                };
                let at = loads.number(number);
                let at = at.field("on_surface");
                let of = Of::new("action", &action.name);
                tell_contradiction(net, &surface, coefficients, of, &at, findings);
                if let Some(found) = WithoutValue::of(net, &surface, coefficients, *elsewhere) {
                    findings
                        .note(
                            reasons::PANELS_WITHOUT_VALUE,
                            &at.field("coefficients"),
                            &action.name,
                            found.message(net, of, about(net)),
                            WithoutValue::CURE,
                        )
                        .value(found.panels.len());
                }
            }
        }
    }

    /// Free nodes at the corners of the panels of some areas, in order.
    pub(crate) fn corners(&self, net: &Net, positions: &[Vector3<f64>], areas: &[Area]) -> Vec<NodeId> {
        let surface = Surface::new(net, positions);
        let mut wanted = vec![false; net.nodes().len()];
        for panel in surface.panels_of(areas) {
            for corner in &net.panels()[panel].corners {
                wanted[corner.index()] = self.free[corner.index()];
            }
        }
        (0..wanted.len())
            .filter(|node| wanted[*node])
            .map(NodeId::new)
            .collect()
    }
}

/// A word before areas that are found before the shape is, unless it is given.
pub(super) fn about(net: &Net) -> &'static str {
    if net.nodes().iter().all(|node| node.position.is_some()) {
        ""
    } else {
        "about "
    }
}

/// Tells the first panel that lies in two zones with different coefficients. `at`: what has the coefficients.
pub(super) fn tell_contradiction(
    net: &Net,
    surface: &Surface,
    coefficients: &[(Area, f64)],
    of: Of<'_>,
    at: &Path<'_>,
    findings: &mut Findings,
) {
    if let Some((panel, zones)) = surface.contradictions(coefficients).first() {
        let [first, second] = zones.map(|zone| Quoted(&net.zones()[zone].name));
        findings.error(
            reasons::ZONES_CONTRADICT,
            &at.field("coefficients"),
            of.id,
            format!(
                "{of}: zones {first} and {second} both cover panel {}, with different coefficients",
                Quoted(&net.panels()[*panel].name)
            ),
            "draw the zones apart, or give them one coefficient",
        );
    }
}

/// Panels that a pressure on the surface leaves without a value.
#[derive(Debug)]
pub(crate) struct WithoutValue {
    pub(crate) panels: Vec<usize>,
    /// Area of all panels, and of those with a value, on plan (m²).
    area: f64,
    covered: f64,
    of: usize,
    /// In words: what has coefficients.
    with: String,
}

impl WithoutValue {
    pub(crate) const CURE: &'static str = "give elsewhere, or widen the zones";

    pub(crate) fn of(
        net: &Net,
        surface: &Surface,
        coefficients: &[(Area, f64)],
        elsewhere: Option<f64>,
    ) -> Option<Self> {
        let none = |panel: &usize| surface.coefficient(*panel, coefficients, elsewhere).is_none();
        let panels: Vec<usize> = (0..net.panels().len()).filter(none).collect();
        if panels.is_empty() {
            return None;
        }
        let area: f64 = surface.areas_on_plan.iter().sum();
        let without: f64 = panels.iter().map(|panel| surface.areas_on_plan[*panel]).sum();
        let names = |is_zone: bool| -> Vec<&str> {
            let of_kind = coefficients.iter().filter_map(move |(area, _)| match area {
                Area::Zone(zone) if is_zone => Some(net.zones()[*zone].name.as_str()),
                Area::Skin(skin) if !is_zone => Some(net.skins()[*skin].name.as_str()),
                _ => None,
            });
            of_kind.collect()
        };
        let (zones, skins) = (names(true), names(false));
        let mut with = Vec::new();
        if !zones.is_empty() {
            with.push(format!("zones {}", plain_list(&zones)));
        }
        if !skins.is_empty() {
            with.push(format!("skins {}", plain_list(&skins)));
        }
        Some(Self {
            of: net.panels().len(),
            area,
            covered: area - without,
            panels,
            with: with.join(" and "),
        })
    }

    /// `of`: whose pressure it is. `about`: a word before the areas, where they are not known exactly.
    pub(crate) fn message(&self, net: &Net, of: impl fmt::Display, about: &str) -> String {
        let ids: Vec<&str> = self
            .panels
            .iter()
            .map(|panel| net.panels()[*panel].name.as_str())
            .collect();
        format!(
            "{of}: coefficients for {} cover {} of {} panels ({about}{} of {} m2 on plan). Without value: {}",
            self.with,
            self.of - self.panels.len(),
            self.of,
            rounded(self.covered, 3),
            rounded(self.area, 3),
            plain_list(&ids)
        )
    }
}

/// The first few of many ids, without quotation marks.
fn plain_list(ids: &[&str]) -> String {
    const FIRST: usize = 12;
    let mut text = ids[..ids.len().min(FIRST)].join(", ");
    if ids.len() > FIRST {
        text.push_str(&format!(" and {} more", ids.len() - FIRST));
    }
    text
}

/// Panels in the making.
#[derive(Default)]
struct FoundPanels {
    panels: Vec<PanelGiven>,
    /// Skin of each.
    skins: Vec<usize>,
    by_corners: HashMap<Vec<NodeId>, usize>,
    /// Names that are taken, of panels given one by one at first.
    names: HashSet<String>,
}

impl FoundPanels {
    fn add(
        &mut self,
        net: &Net,
        skin: usize,
        name: String,
        corners: Vec<NodeId>,
        at: &Path<'_>,
        findings: &mut Findings,
    ) {
        let mut sorted = corners.clone();
        sorted.sort_unstable();
        let index = self.panels.len();
        if let Some(other) = self.by_corners.insert(sorted, index) {
            let ids: Vec<&str> = corners.iter().map(|corner| net.node_name(*corner)).collect();
            findings.error(
                reasons::PANEL_TWICE,
                at,
                &name,
                format!(
                    "panels {} and {} have the same corners: {}",
                    Quoted(&self.panels[other].name),
                    Quoted(&name),
                    quoted_list(ids)
                ),
                "let one skin have it; two layers are one skin with the mass of both",
            );
            return;
        }
        self.skins.push(skin);
        self.panels.push(PanelGiven { name, corners });
    }

    /// A name that no other panel has: names of corners may have the joint in them.
    fn unique(&mut self, name: String) -> String {
        let mut unique = name.clone();
        let mut number = 2;
        while !self.names.insert(unique.clone()) {
            unique = format!("{name}~{number}");
            number += 1;
        }
        unique
    }
}

/// The name of a panel: its corners, the first of them where they are many.
fn name_of(net: &Net, corners: &[NodeId]) -> String {
    let mut name = String::new();
    for (count, corner) in corners.iter().enumerate() {
        let next = net.node_name(*corner);
        // Room for what may be appended.
        if count > 1 && name.len() + next.len() > LONGEST_NAME - 16 {
            name.push_str(&format!("-+{}", corners.len() - count));
            break;
        }
        if count > 0 {
            name.push('-');
        }
        name.push_str(next);
    }
    name
}

fn list_of_skins<'p>(id: &'p str, index: usize) -> Path<'p> {
    const LIST: Path<'static> = Path::root("net.skins");
    LIST.element(id, index)
}

fn read_skin(
    net: &NetDraft<'_>,
    scopes: &Scopes,
    skin: &v1::Skin,
    at: &Path<'_>,
    findings: &mut Findings,
) -> SkinDraft {
    let of = Of::new("skin", &skin.id);
    let mass_at = at.field("mass_kg_per_m2");
    let mass = findings.number_or(&mass_at, of, &MASS_PER_AREA, skin.mass_kg_per_m2, 0.0);
    let between = at.field("between");
    let scope = scopes.of(net, &skin.between, &between, CABLES, findings);
    let mut edges = Vec::new();
    for segment in scope.segments(net) {
        let (ends, member) = net.segments[segment];
        if let MemberDraft::Cable(cable) = member
            && ends[0] != ends[1]
        {
            edges.push(EdgeDraft {
                ends: ends.map(NodeId::new),
                cable: net.cables[cable].message.id.clone(),
            });
        }
    }
    SkinDraft {
        id: skin.id.clone(),
        mass_per_area: mass.unwrap_or(0.0),
        edges,
        spans: !skin.between.is_empty(),
    }
}

fn read_zone(net: &NetDraft<'_>, zone: &v1::Zone, at: &Path<'_>, findings: &mut Findings) -> Option<Zone> {
    let of = Of::new("zone", &zone.id);
    let skin = skin_of(net, &zone.skin, of, &at.field("skin"), findings);
    let field = at.field("outline_xy_m");
    let numbers = zone.outline_xy_m.len();
    if numbers < 6 || !numbers.is_multiple_of(2) {
        findings
            .error(
                reasons::WRONG_COUNT,
                &field,
                &zone.id,
                format!("{of}: its outline has {numbers} numbers"),
                "give three corners at least, x and y of each in turn",
            )
            .value(numbers);
        return None;
    }
    if numbers > 2 * MOST_CORNERS {
        findings
            .error(
                reasons::TOO_MANY,
                &field,
                &zone.id,
                format!(
                    "{of}: its outline has {} corners: at most {MOST_CORNERS} are taken",
                    numbers / 2
                ),
                "draw the outline with fewer corners",
            )
            .value(numbers / 2);
        return None;
    }
    let mut complete = true;
    for (number, value) in zone.outline_xy_m.iter().enumerate() {
        complete &= findings
            .number(&field.number(number), of, &COORDINATE, *value)
            .is_some();
    }
    let outline: Vec<Vector2<f64>> = zone
        .outline_xy_m
        .chunks_exact(2)
        .map(|p| Vector2::new(p[0], p[1]))
        .collect();
    if complete && !is_simple(&outline) {
        findings.error(
            reasons::BAD_OUTLINE,
            &field,
            &zone.id,
            format!("{of}: its outline crosses itself or encloses nothing"),
            "give its corners in order around it, each once",
        );
        complete = false;
    }
    Some(Zone {
        name: zone.id.clone(),
        skin: skin?,
        outline: complete.then_some(outline)?,
    })
}

/// Whether the outline bounds one mesh: its corners are nodes and its sides ropes.
fn is_simple(outline: &[Vector2<f64>]) -> bool {
    let sides = (0..outline.len()).map(|k| [NodeId::new(k), NodeId::new((k + 1) % outline.len())]);
    let sides: Vec<_> = sides.collect();
    meshes(&sides, outline).is_ok_and(|found| found.corners.len() == 1)
}

fn read_panel(net: &NetDraft<'_>, panel: &v1::Panel, at: &Path<'_>, findings: &mut Findings) -> Option<PanelDraft> {
    let of = Of::new("panel", &panel.id);
    let skin = skin_of(net, &panel.skin, of, &at.field("skin"), findings);
    let list = at.field("nodes");
    let mut corners = Vec::with_capacity(panel.nodes.len());
    let mut complete = true;
    for (number, id) in panel.nodes.iter().enumerate() {
        let at = list.number(number);
        match net.names.find(findings, &at, "node", id) {
            Some(Thing::Node(node)) if corners.contains(&NodeId::new(node)) => {
                findings
                    .error(
                        reasons::REPEATED_IN_LIST,
                        &at,
                        id,
                        format!("{of} names node {} twice", Quoted(id)),
                        "name each corner once; the last is joined to the first",
                    )
                    .value(id);
                complete = false;
            }
            Some(Thing::Node(node)) => corners.push(NodeId::new(node)),
            Some(other) => {
                findings.error(
                    reasons::WRONG_KIND,
                    &at,
                    id,
                    format!("{} is a {}, and corners are nodes", Quoted(id), other.kind()),
                    "name nodes",
                );
                complete = false;
            }
            None => complete = false,
        }
    }
    if panel.nodes.len() < 3 {
        findings
            .error(
                reasons::WRONG_COUNT,
                &list,
                &panel.id,
                format!("{of} has {} corners: a panel has three at least", panel.nodes.len()),
                "name its corners in order, counter-clockwise seen from the outer side",
            )
            .value(panel.nodes.len());
        complete = false;
    }
    Some(PanelDraft {
        id: panel.id.clone(),
        skin: skin?,
        corners: complete.then_some(corners)?,
    })
}

fn skin_of(net: &NetDraft<'_>, id: &str, of: Of<'_>, at: &Path<'_>, findings: &mut Findings) -> Option<usize> {
    if id.is_empty() {
        findings.error(
            reasons::MISSING,
            at,
            of.id,
            format!("{of} names no skin"),
            "name the skin that it belongs to",
        );
        return None;
    }
    match net.names.find(findings, at, "skin", id)? {
        Thing::Skin(skin) => Some(skin),
        other => {
            findings.error(
                reasons::WRONG_KIND,
                at,
                id,
                format!("{} is a {}, not a skin", Quoted(id), other.kind()),
                "name the skin that it belongs to",
            );
            None
        }
    }
}

/// Notes stretches of ropes that bound no panel: rope by rope.
fn tell_loose(net: &Net, skin: &SkinDraft, loose: &[usize], at: &Path<'_>, findings: &mut Findings) {
    let mut ropes: BTreeMap<&str, Vec<String>> = BTreeMap::new();
    for edge in loose {
        let edge = &skin.edges[*edge];
        let [from, to] = edge.ends.map(|end| net.node_name(end));
        ropes.entry(&edge.cable).or_default().push(format!("{from} to {to}"));
    }
    for (rope, stretches) in ropes {
        let words: Vec<&str> = stretches.iter().map(String::as_str).collect();
        findings
            .note(
                reasons::ROPE_BOUNDS_NO_PANEL,
                at,
                rope,
                format!(
                    "skin {}: rope {} bounds no panel from {}",
                    Quoted(&skin.id),
                    Quoted(rope),
                    plain_list(&words)
                ),
                "nothing to mend, if the skin ends there",
            )
            .value(stretches.len());
    }
}

fn tell_mesh_error(net: &Net, skin: &SkinDraft, error: &MeshError, at: &Path<'_>, findings: &mut Findings) {
    let stretch = |edge: usize| {
        let edge = &skin.edges[edge];
        let [from, to] = edge.ends.map(|end| net.node_name(end));
        format!("{} from {from} to {to}", Quoted(&edge.cable))
    };
    let (id, what, cure) = match error {
        MeshError::Upright { edge } => (
            skin.edges[*edge].cable.as_str(),
            format!(
                "rope {} is upright: its ends lie above each other in plan",
                stretch(*edge)
            ),
            "leave it out of between, or give the panels beside it in net.panels",
        ),
        MeshError::Crossing { edges: [first, second] } => (
            skin.edges[*first].cable.as_str(),
            format!(
                "ropes {} and {} cross or touch in plan without a common node",
                stretch(*first),
                stretch(*second)
            ),
            "give both ropes a node where they cross, or leave one of them out of between",
        ),
        MeshError::TouchesItself { node } => (
            net.node_name(*node),
            format!("the mesh around node {} meets it twice", Quoted(net.node_name(*node))),
            "join the ropes within the mesh to its rim at one more node, or leave them out of between",
        ),
        MeshError::Nested { node } => (
            net.node_name(*node),
            format!(
                "the ropes at node {} lie within a mesh, and nothing joins them to its rim",
                Quoted(net.node_name(*node))
            ),
            "join them to the rim, or leave them out of between",
        ),
        MeshError::TooMany => (
            skin.id.as_str(),
            "too many ropes lie beside each other to look for crossings".to_owned(),
            "split the skin, or turn the axes so that fewer ropes lie along y",
        ),
    };
    findings.error(
        reasons::MESHES_UNCLEAR,
        at,
        id,
        format!("skin {}: {what}", Quoted(&skin.id)),
        cure,
    );
}
