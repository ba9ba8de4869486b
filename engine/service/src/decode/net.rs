//! Nodes, cables and struts: ids, paths and places.

use std::cell::OnceCell;
use std::collections::HashMap;

use nalgebra::Vector3;
use ropewalk_api::ropewalk::v1;

use super::findings::{Findings, Path, is_id};
use super::names::{Names, Thing, bad_id};
use super::numbers::{ATTACHED_MASS, COORDINATE, GRAVITY, ORIGIN, Of, REFERENCE_TEMPERATURE};
use super::resolved::Resolved;
use super::stretch::visits;
use super::{places, reasons};
use crate::words::Quoted;

/// Acceleration of gravity where the brief gives none (m/s²), the conventional value (CGPM 1901).
pub(crate) const STANDARD_GRAVITY: f64 = 9.80665;

/// A node, listed or only named in a path.
#[derive(Debug)]
pub(crate) struct NodeDraft<'a> {
    pub(crate) id: &'a str,
    pub(crate) listed: Option<&'a v1::Node>,
    pub(crate) position: Option<Vector3<f64>>,
    pub(crate) attached_mass: f64,
    /// Places in paths: visits of members.
    pub(crate) uses: usize,
    /// The only or first member that uses it.
    pub(crate) user: &'a str,
    /// Whether one of the visits is an end of a member.
    pub(crate) at_end: bool,
}

/// A cable as a path over node indices.
#[derive(Debug)]
pub(crate) struct CableDraft<'a> {
    pub(crate) message: &'a v1::Cable,
    pub(crate) path: Vec<usize>,
    pub(crate) first_segment: usize,
    pub(crate) role: Option<usize>,
    /// Places of each node on the path, found when they are first asked for.
    visits: OnceCell<HashMap<usize, Vec<usize>>>,
}

impl CableDraft<'_> {
    /// Places at which the path meets a node; the end of a closed path is its beginning.
    pub(crate) fn visits(&self, node: usize) -> &[usize] {
        let visits = self.visits.get_or_init(|| visits(&self.path));
        visits.get(&node).map_or(&[], Vec::as_slice)
    }

    pub(crate) fn n_segments(&self) -> usize {
        self.path.len().saturating_sub(1)
    }
}

/// A strut between node indices.
#[derive(Debug)]
pub(crate) struct StrutDraft<'a> {
    pub(crate) message: &'a v1::Strut,
    pub(crate) ends: Option<[usize; 2]>,
    pub(crate) segment: usize,
    pub(crate) role: Option<usize>,
}

/// The member of a segment.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum MemberDraft {
    Cable(usize),
    Strut(usize),
}

/// Everything about the net that later parts ask for.
#[derive(Debug)]
pub(crate) struct NetDraft<'a> {
    pub(crate) message: &'a v1::Net,
    pub(crate) names: Names<'a, Thing>,
    pub(crate) nodes: Vec<NodeDraft<'a>>,
    pub(crate) cables: Vec<CableDraft<'a>>,
    pub(crate) struts: Vec<StrutDraft<'a>>,
    /// Ends and member of each segment.
    pub(crate) segments: Vec<([usize; 2], MemberDraft)>,
    pub(crate) gravity: f64,
    roles: Names<'a, usize>,
}

impl NodeDraft<'_> {
    /// Whether the brief gives it a place, readable or not.
    pub(crate) fn is_placed(&self) -> bool {
        self.listed.is_some_and(|node| !node.xyz_m.is_empty())
    }
}

impl<'a> NetDraft<'a> {
    /// Reads ids, paths and places.
    pub(crate) fn read(message: &'a v1::Net, findings: &mut Findings, resolved: &mut Resolved) -> Self {
        let mut net = Self {
            message,
            names: Names::new("nodes, cables, struts, roles, groups, skins and zones, which share one namespace"),
            nodes: Vec::with_capacity(message.nodes.len()),
            cables: Vec::with_capacity(message.cables.len()),
            struts: Vec::with_capacity(message.struts.len()),
            segments: Vec::new(),
            gravity: STANDARD_GRAVITY,
            roles: Names::new("roles"),
        };
        for (index, role) in message.roles.iter().enumerate() {
            net.roles.insert(&role.id, index);
        }
        net.read_scalars(findings, resolved);
        net.declare(findings);
        net.read_nodes(findings);
        let cables = Path::root("net.cables");
        for (index, cable) in message.cables.iter().enumerate() {
            net.read_cable(index, cable, &cables.element(&cable.id, index), findings);
        }
        let struts = Path::root("net.struts");
        for (index, strut) in message.struts.iter().enumerate() {
            net.read_strut(index, strut, &struts.element(&strut.id, index), findings);
        }
        if message.cables.is_empty() && message.struts.is_empty() {
            findings.error(
                reasons::EMPTY_NET,
                &Path::root("net"),
                "",
                "the net has no cable and no strut",
                "list at least one cable in net.cables",
            );
        }
        places::check_uses(&net, findings);
        places::check_places(&net, findings);
        net.tell_undeclared(resolved);
        net
    }

    /// Whether it has panels, or skins that span them.
    pub(crate) fn has_panels(&self) -> bool {
        !self.message.skins.is_empty() || !self.message.panels.is_empty()
    }

    fn read_scalars(&mut self, findings: &mut Findings, resolved: &mut Resolved) {
        let of = Of::new("net", "");
        let at = Path::root("net.gravity_m_per_s2");
        let gravity = self.message.gravity_m_per_s2;
        if gravity.is_none() {
            resolved.left_out(&at, STANDARD_GRAVITY);
        }
        self.gravity = findings
            .number_or(&at, of, &GRAVITY, gravity, STANDARD_GRAVITY)
            .unwrap_or(STANDARD_GRAVITY);
        if let Some(temperature) = self.message.reference_temperature_deg_c {
            let at = Path::root("net.reference_temperature_deg_c");
            findings.number(&at, of, &REFERENCE_TEMPERATURE, temperature);
        }
        if !self.message.origin_m.is_empty() {
            findings.vector(&Path::root("net.origin_m"), of, &ORIGIN, &self.message.origin_m);
        }
    }

    fn declare(&mut self, findings: &mut Findings) {
        let net = self.message;
        let mut declare = |list: &'static str, ids: &mut dyn Iterator<Item = (&'a str, Thing)>| {
            let list = Path::root(list);
            for (number, (id, thing)) in ids.enumerate() {
                self.names.declare(findings, &list, number, id, thing);
            }
        };
        let nodes = net.nodes.iter().enumerate();
        declare("net.nodes", &mut nodes.map(|(i, n)| (n.id.as_str(), Thing::Node(i))));
        let cables = net.cables.iter().enumerate();
        declare("net.cables", &mut cables.map(|(i, c)| (c.id.as_str(), Thing::Cable(i))));
        let struts = net.struts.iter().enumerate();
        declare("net.struts", &mut struts.map(|(i, s)| (s.id.as_str(), Thing::Strut(i))));
        let roles = net.roles.iter().enumerate();
        declare("net.roles", &mut roles.map(|(i, r)| (r.id.as_str(), Thing::Role(i))));
        let groups = net.groups.iter().enumerate();
        declare("net.groups", &mut groups.map(|(i, g)| (g.id.as_str(), Thing::Group(i))));
        let skins = net.skins.iter().enumerate();
        declare("net.skins", &mut skins.map(|(i, s)| (s.id.as_str(), Thing::Skin(i))));
        let zones = net.zones.iter().enumerate();
        declare("net.zones", &mut zones.map(|(i, z)| (z.id.as_str(), Thing::Zone(i))));
    }

    fn read_nodes(&mut self, findings: &mut Findings) {
        let list = Path::root("net.nodes");
        for (index, node) in self.message.nodes.iter().enumerate() {
            let at = list.element(&node.id, index);
            let of = Of::new("node", &node.id);
            let position = if node.xyz_m.is_empty() {
                if node.support.is_some() {
                    findings.error(
                        reasons::SUPPORT_WITHOUT_POSITION,
                        &at.field("xyz_m"),
                        &node.id,
                        format!("node {} is supported and has no coordinates", Quoted(&node.id)),
                        "give its place in xyz_m",
                    );
                }
                None
            } else {
                findings.vector(&at.field("xyz_m"), of, &COORDINATE, &node.xyz_m)
            };
            let mass = at.field("attached_mass_kg");
            let attached_mass = findings.number_or(&mass, of, &ATTACHED_MASS, node.attached_mass_kg, 0.0);
            self.nodes.push(NodeDraft {
                id: &node.id,
                listed: Some(node),
                position,
                attached_mass: attached_mass.unwrap_or(0.0),
                uses: 0,
                user: "",
                at_end: false,
            });
        }
    }

    /// The node that a path names at a place: a listed one, or one that is free and begins to be here.
    fn node_in_path(&mut self, id: &'a str, at: &Path<'_>, findings: &mut Findings) -> Option<usize> {
        match self.names.get(id) {
            Some(Thing::Node(index)) => Some(index),
            Some(other) => {
                let kind = other.kind();
                findings.error(
                    reasons::WRONG_KIND,
                    at,
                    id,
                    format!("{} is a {kind}, and a path names nodes", Quoted(id)),
                    "name a node; nodes share their namespace with members, roles and groups",
                );
                None
            }
            None if !is_id(id) => {
                bad_id(findings, at, id);
                None
            }
            None => {
                let index = self.nodes.len();
                self.names.insert(id, Thing::Node(index));
                self.nodes.push(NodeDraft {
                    id,
                    listed: None,
                    position: None,
                    attached_mass: 0.0,
                    uses: 0,
                    user: "",
                    at_end: false,
                });
                Some(index)
            }
        }
    }

    fn read_path(&mut self, ids: &'a [String], owner: Of<'a>, at: &Path<'_>, findings: &mut Findings) -> Vec<usize> {
        let list = at.field("nodes");
        let closed = ids.len() > 2 && ids.first() == ids.last();
        let mut path = Vec::with_capacity(ids.len());
        for (position, id) in ids.iter().enumerate() {
            let here = list.number(position);
            if position > 0 && ids[position - 1] == *id {
                findings.error(
                    reasons::NODE_TWICE_IN_A_ROW,
                    &here,
                    owner.id,
                    format!("{owner} names node {} twice in a row", Quoted(id)),
                    "name each node of the path once where the member passes it",
                );
            }
            let Some(node) = self.node_in_path(id, &here, findings) else {
                continue;
            };
            path.push(node);
            let last = position + 1 == ids.len();
            if closed && last {
                continue;
            }
            let draft = &mut self.nodes[node];
            draft.uses += 1;
            draft.at_end |= !closed && (position == 0 || last);
            if draft.user.is_empty() {
                draft.user = owner.id;
            }
        }
        path
    }

    fn read_cable(&mut self, index: usize, cable: &'a v1::Cable, at: &Path<'_>, findings: &mut Findings) {
        let owner = Of::new("cable", &cable.id);
        if cable.nodes.len() < 2 {
            findings
                .error(
                    reasons::TOO_FEW_NODES,
                    &at.field("nodes"),
                    &cable.id,
                    format!(
                        "{owner} runs through {} nodes: a rope needs two at least",
                        cable.nodes.len()
                    ),
                    "name its nodes in order, from one end to the other",
                )
                .value(cable.nodes.len());
        }
        let role = self.role(&cable.role, &at.field("role"), findings);
        let path = self.read_path(&cable.nodes, owner, at, findings);
        let first_segment = self.segments.len();
        for ends in path.windows(2) {
            self.segments.push(([ends[0], ends[1]], MemberDraft::Cable(index)));
        }
        self.cables.push(CableDraft {
            message: cable,
            path,
            first_segment,
            role,
            visits: OnceCell::new(),
        });
    }

    fn read_strut(&mut self, index: usize, strut: &'a v1::Strut, at: &Path<'_>, findings: &mut Findings) {
        let owner = Of::new("strut", &strut.id);
        if strut.nodes.len() != 2 {
            findings
                .error(
                    reasons::WRONG_COUNT,
                    &at.field("nodes"),
                    &strut.id,
                    format!(
                        "{owner} has {} nodes: a strut has two, foot and head",
                        strut.nodes.len()
                    ),
                    "name its foot and its head",
                )
                .value(strut.nodes.len());
        }
        let role = self.role(&strut.role, &at.field("role"), findings);
        let path = self.read_path(&strut.nodes, owner, at, findings);
        let ends = match path[..] {
            [foot, head] => Some([foot, head]),
            _ => None,
        };
        let segment = self.segments.len();
        if let Some(ends) = ends {
            self.segments.push((ends, MemberDraft::Strut(index)));
        }
        self.struts.push(StrutDraft {
            message: strut,
            ends,
            segment,
            role,
        });
    }

    fn role(&self, id: &str, at: &Path<'_>, findings: &mut Findings) -> Option<usize> {
        if id.is_empty() {
            return None;
        }
        match self.names.get(id) {
            Some(Thing::Role(role)) => Some(role),
            _ => self.roles.find(findings, at, "role", id),
        }
    }

    /// Place of the first path that names a node.
    pub(crate) fn place_in_path<'p>(&self, node: &NodeDraft<'_>, text: &'p mut String) -> Path<'p> {
        let user = node.user;
        *text = match self.names.get(user) {
            Some(Thing::Cable(_)) => format!("net.cables[{user}].nodes"),
            _ => format!("net.struts[{user}].nodes"),
        };
        Path::root(text)
    }

    fn tell_undeclared(&self, resolved: &mut Resolved) {
        let list = Path::root("net.nodes");
        for (index, node) in self.nodes.iter().enumerate().filter(|(_, n)| n.listed.is_none()) {
            let mut text = String::new();
            let origin = self.place_in_path(node, &mut text);
            resolved.inherited(&list.element(node.id, index), "free, its place is to be found", &origin);
        }
    }

    /// The client's id of a member.
    pub(crate) fn member_id(&self, member: MemberDraft) -> &'a str {
        match member {
            MemberDraft::Cable(cable) => &self.cables[cable].message.id,
            MemberDraft::Strut(strut) => &self.struts[strut].message.id,
        }
    }

    /// Distance between the ends of a segment, where both have coordinates (m).
    pub(crate) fn given_length(&self, segment: usize) -> Option<f64> {
        let [a, b] = self.segments[segment].0;
        Some((self.nodes[b].position? - self.nodes[a].position?).norm())
    }
}
