//! What a list called `on` covers.

use std::collections::{HashMap, HashSet};

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::model::Area;

use super::findings::{Findings, Path};
use super::names::Thing;
use super::net::NetDraft;
use super::reasons;
use crate::words::{Quoted, quoted_list};

/// Which kinds a list may cover.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Allowed {
    pub(crate) nodes: bool,
    pub(crate) cables: bool,
    pub(crate) struts: bool,
    /// Skins and zones.
    pub(crate) areas: bool,
    /// In words, for messages.
    pub(crate) words: &'static str,
}

pub(crate) const MEMBERS: Allowed = Allowed {
    nodes: false,
    cables: true,
    struts: true,
    areas: false,
    words: "cables, struts, roles or groups of them",
};
pub(crate) const CABLES: Allowed = Allowed {
    nodes: false,
    cables: true,
    struts: false,
    areas: false,
    words: "cables, roles of cables or groups of them",
};
pub(crate) const NODES: Allowed = Allowed {
    nodes: true,
    cables: false,
    struts: false,
    areas: false,
    words: "nodes or groups of nodes",
};
pub(crate) const AREAS: Allowed = Allowed {
    nodes: false,
    cables: false,
    struts: false,
    areas: true,
    words: "skins, zones or groups of them",
};
pub(crate) const PIECES: Allowed = Allowed {
    nodes: false,
    cables: true,
    struts: true,
    areas: true,
    words: "cables, struts, skins, zones, roles or groups",
};
pub(crate) const ANYTHING: Allowed = Allowed {
    nodes: true,
    cables: true,
    struts: true,
    areas: true,
    words: "nodes, members, skins, zones, roles or groups",
};

/// How narrowly a list names a thing.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(crate) enum Narrowness {
    /// Through a group.
    Group,
    /// Through its role.
    Role,
    /// By its own id.
    Own,
    /// As a part of a cable.
    Part,
}

/// A node, cable, strut, skin or zone that a list covers.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Covered {
    pub(crate) thing: Thing,
    pub(crate) narrowness: Narrowness,
}

/// Everything that a list covers, each thing once.
#[derive(Debug, Default)]
pub(crate) struct Scope {
    pub(crate) covered: Vec<Covered>,
    /// Whether each name could be read.
    pub(crate) complete: bool,
}

impl Scope {
    pub(crate) fn nodes(&self) -> impl Iterator<Item = usize> + '_ {
        self.covered.iter().filter_map(|covered| match covered.thing {
            Thing::Node(node) => Some(node),
            _ => None,
        })
    }

    pub(crate) fn cables(&self) -> impl Iterator<Item = usize> + '_ {
        self.covered.iter().filter_map(|covered| match covered.thing {
            Thing::Cable(cable) => Some(cable),
            _ => None,
        })
    }

    pub(crate) fn struts(&self) -> impl Iterator<Item = usize> + '_ {
        self.covered.iter().filter_map(|covered| match covered.thing {
            Thing::Strut(strut) => Some(strut),
            _ => None,
        })
    }

    pub(crate) fn areas(&self) -> impl Iterator<Item = Area> + '_ {
        self.covered.iter().filter_map(|covered| match covered.thing {
            Thing::Skin(skin) => Some(Area::Skin(skin)),
            Thing::Zone(zone) => Some(Area::Zone(zone)),
            _ => None,
        })
    }

    /// Segments of the covered members, in order.
    pub(crate) fn segments(&self, net: &NetDraft<'_>) -> Vec<usize> {
        let mut segments = Vec::new();
        for cable in self.cables() {
            let draft = &net.cables[cable];
            segments.extend(draft.first_segment..draft.first_segment + draft.n_segments());
        }
        segments.extend(self.struts().filter_map(|strut| {
            let draft = &net.struts[strut];
            draft.ends.map(|_| draft.segment)
        }));
        segments.sort_unstable();
        segments
    }
}

/// Roles and groups with what belongs to them.
#[derive(Debug)]
pub(crate) struct Scopes {
    /// Members of each role: cables, then struts.
    of_role: Vec<Vec<Thing>>,
}

impl Scopes {
    /// Reads groups; tells unknown names in them and cycles.
    pub(crate) fn read(net: &NetDraft<'_>, findings: &mut Findings) -> Self {
        let mut of_role = vec![Vec::new(); net.message.roles.len()];
        for (index, cable) in net.cables.iter().enumerate() {
            if let Some(role) = cable.role {
                of_role[role].push(Thing::Cable(index));
            }
        }
        for (index, strut) in net.struts.iter().enumerate() {
            if let Some(role) = strut.role {
                of_role[role].push(Thing::Strut(index));
            }
        }
        let list = Path::root("net.groups");
        for (index, group) in net.message.groups.iter().enumerate() {
            let at = list.element(&group.id, index);
            let of = at.field("of");
            tell_repeated(&group.of, &of, findings);
            for (number, id) in group.of.iter().enumerate() {
                net.names.find(
                    findings,
                    &of.number(number),
                    "member, node, role, skin, zone or group",
                    id,
                );
            }
            if group.of.is_empty() {
                findings.doubt(
                    reasons::COVERS_NOTHING,
                    &of,
                    &group.id,
                    format!("group {} is empty", Quoted(&group.id)),
                    "name what belongs to it, or take it out",
                );
            }
        }
        tell_cycles(net, findings);
        Self { of_role }
    }

    /// What a list covers. `field`: place of the list.
    pub(crate) fn of(
        &self,
        net: &NetDraft<'_>,
        on: &[String],
        field: &Path<'_>,
        allowed: Allowed,
        findings: &mut Findings,
    ) -> Scope {
        tell_repeated(on, field, findings);
        let mut scope = Scope {
            covered: Vec::new(),
            complete: true,
        };
        let mut seen: HashMap<Thing, usize> = HashMap::new();
        for (number, id) in on.iter().enumerate() {
            let at = field.number(number);
            let Some(thing) = net.names.find(findings, &at, "part of the net", id) else {
                scope.complete = false;
                continue;
            };
            let before = scope.covered.len();
            let wrong = self.expand(net, thing, allowed, &mut seen, &mut scope);
            if let Some(wrong) = wrong {
                scope.complete = false;
                let through = match thing {
                    Thing::Role(_) | Thing::Group(_) => {
                        format!(
                            "{} {} covers {} {}",
                            thing.kind(),
                            Quoted(id),
                            wrong.kind(),
                            name(net, wrong)
                        )
                    }
                    _ => format!("{} is a {}", Quoted(id), thing.kind()),
                };
                findings
                    .error(
                        reasons::WRONG_KIND,
                        &at,
                        id,
                        format!("{through}, and only {} can stand here", allowed.words),
                        format!("name {}", allowed.words),
                    )
                    .value(id);
            } else if matches!(thing, Thing::Role(_)) && scope.covered.len() == before && scope.complete {
                let empty = matches!(thing, Thing::Role(role) if self.of_role[role].is_empty());
                if empty {
                    findings.doubt(
                        reasons::COVERS_NOTHING,
                        &at,
                        id,
                        format!("role {} is named here, and no member has it", Quoted(id)),
                        "give the role to members, or take the name out",
                    );
                }
            }
        }
        scope
    }

    /// Adds what a thing stands for. Answers the first thing that must not stand here.
    fn expand(
        &self,
        net: &NetDraft<'_>,
        thing: Thing,
        allowed: Allowed,
        seen: &mut HashMap<Thing, usize>,
        scope: &mut Scope,
    ) -> Option<Thing> {
        let narrowness = match thing {
            Thing::Group(_) => Narrowness::Group,
            Thing::Role(_) => Narrowness::Role,
            _ => Narrowness::Own,
        };
        let mut wrong = None;
        let mut visited: HashSet<Thing> = HashSet::from([thing]);
        // Last in, first out; pushed in reverse, so that things come in the order of the lists.
        let mut waiting = vec![thing];
        while let Some(thing) = waiting.pop() {
            let fits = match thing {
                Thing::Group(group) => {
                    for id in net.message.groups[group].of.iter().rev() {
                        waiting.extend(net.names.get(id).filter(|inner| visited.insert(*inner)));
                    }
                    continue;
                }
                Thing::Role(role) => {
                    waiting.extend(self.of_role[role].iter().rev().filter(|inner| visited.insert(**inner)));
                    continue;
                }
                Thing::Node(_) => allowed.nodes,
                Thing::Cable(_) => allowed.cables,
                Thing::Strut(_) => allowed.struts,
                Thing::Skin(_) | Thing::Zone(_) => allowed.areas,
            };
            if !fits {
                wrong = wrong.or(Some(thing));
                continue;
            }
            match seen.get(&thing) {
                Some(place) => {
                    let known = &mut scope.covered[*place].narrowness;
                    *known = narrowness.max(*known);
                }
                None => {
                    seen.insert(thing, scope.covered.len());
                    scope.covered.push(Covered { thing, narrowness });
                }
            }
        }
        wrong
    }
}

fn name<'a>(net: &NetDraft<'a>, thing: Thing) -> Quoted<'a> {
    Quoted(match thing {
        Thing::Node(node) => net.nodes[node].id,
        Thing::Cable(cable) => &net.cables[cable].message.id,
        Thing::Strut(strut) => &net.struts[strut].message.id,
        Thing::Role(role) => &net.message.roles[role].id,
        Thing::Group(group) => &net.message.groups[group].id,
        Thing::Skin(skin) => &net.message.skins[skin].id,
        Thing::Zone(zone) => &net.message.zones[zone].id,
    })
}

/// Tells names that stand twice in one list.
pub(crate) fn tell_repeated(list: &[String], field: &Path<'_>, findings: &mut Findings) {
    let mut seen = HashSet::new();
    for (number, id) in list.iter().enumerate() {
        if !seen.insert(id) {
            findings
                .error(
                    reasons::REPEATED_IN_LIST,
                    &field.number(number),
                    id,
                    format!("{} stands twice in this list", Quoted(id)),
                    "name it once",
                )
                .value(id);
        }
    }
}

/// Tells groups that contain each other: each cycle once.
fn tell_cycles(net: &NetDraft<'_>, findings: &mut Findings) {
    let groups: &[v1::Group] = &net.message.groups;
    let inner = |group: usize, position: usize| -> Option<Option<usize>> {
        groups[group].of.get(position).map(|id| match net.names.get(id) {
            Some(Thing::Group(inner)) => Some(inner),
            _ => None,
        })
    };
    let list = Path::root("net.groups");
    // 0: not met, 1: on the way, 2: done.
    let mut state = vec![0_u8; groups.len()];
    for start in 0..groups.len() {
        if state[start] != 0 {
            continue;
        }
        state[start] = 1;
        let mut way = vec![(start, 0_usize)];
        while let Some((group, position)) = way.last_mut() {
            let (group, next) = (*group, inner(*group, *position));
            *position += 1;
            match next {
                None => {
                    state[group] = 2;
                    way.pop();
                }
                Some(Some(next)) if state[next] == 0 => {
                    state[next] = 1;
                    way.push((next, 0));
                }
                Some(Some(next)) if state[next] == 1 => {
                    let cycle = way.iter().map(|(group, _)| *group).skip_while(|group| *group != next);
                    let ids: Vec<&str> = cycle.map(|group| groups[group].id.as_str()).collect();
                    let at = list.element(&groups[next].id, next);
                    findings.error(
                        reasons::GROUP_CYCLE,
                        &at.field("of"),
                        &groups[next].id,
                        format!("groups contain each other in a circle: {}", quoted_list(ids)),
                        "take one of them out of the next one's list",
                    );
                }
                Some(_) => {}
            }
        }
    }
}
