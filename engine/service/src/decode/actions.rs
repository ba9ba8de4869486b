//! Actions and their loads.

use nalgebra::Vector3;
use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::load::Kind;
use ropewalk_numerics::load::{Action, Load, Scope as Segments};
use ropewalk_numerics::model::{NodeId, SegmentId};

use super::findings::{Findings, Path};
use super::names::{Names, Thing};
use super::net::NetDraft;
use super::numbers::{FORCE, FORCE_PER_LENGTH, MOVEMENT, Of, PRESTRESS_SHARE, TEMPERATURE_CHANGE};
use super::reasons;
use super::scope::{Allowed, CABLES, MEMBERS, NODES, Scopes};
use super::supports::Supports;
use crate::words::{Quoted, rounded};

/// Movement along a direction that nothing holds, over the whole movement, that still counts as rounding.
const ROUNDING: f64 = 1e-9;

/// Actions as read.
#[derive(Debug)]
pub(crate) struct Actions<'a> {
    pub(crate) names: Names<'a, usize>,
    pub(crate) messages: &'a [v1::Action],
    pub(crate) list: Vec<Action>,
    /// Cables and share of each change of prestress, by action.
    pub(crate) shares: Vec<Vec<(Vec<usize>, f64)>>,
}

impl<'a> Actions<'a> {
    pub(crate) fn read(
        messages: &'a [v1::Action],
        net: &NetDraft<'a>,
        scopes: &Scopes,
        supports: &Supports,
        findings: &mut Findings,
    ) -> Self {
        let at = Path::root("actions");
        let mut actions = Self {
            names: Names::new("actions"),
            messages,
            list: Vec::with_capacity(messages.len()),
            shares: vec![Vec::new(); messages.len()],
        };
        for (index, message) in messages.iter().enumerate() {
            actions.names.declare(findings, &at, index, message.id.as_str(), index);
            let at = at.element(&message.id, index);
            if message.loads.is_empty() {
                findings.doubt(
                    reasons::ACTION_WITHOUT_LOADS,
                    &at.field("loads"),
                    &message.id,
                    format!("action {} has no loads", Quoted(&message.id)),
                    "give its loads, or take it out",
                );
            }
            let list = at.field("loads");
            let mut reader = Reader {
                action: &message.id,
                net,
                scopes,
                supports,
                shares: &mut actions.shares[index],
                findings,
            };
            let loads = message.loads.iter().enumerate();
            let loads = loads.filter_map(|(number, load)| reader.load(load, &list.number(number)));
            let loads = loads.collect();
            actions.list.push(Action {
                name: message.id.clone(),
                loads,
            });
        }
        actions
    }

    /// The kind of a load that is not dead, if the action has one.
    pub(crate) fn not_dead(&self, action: usize) -> Option<&'static str> {
        self.messages[action].loads.iter().find_map(|load| match load.kind {
            Some(Kind::Temperature(_)) => Some("change of temperature"),
            Some(Kind::Move(_)) => Some("movement of a support"),
            Some(Kind::Prestress(_)) => Some("change of prestress"),
            Some(Kind::OnSurface(_)) => Some("pressure that follows the surface"),
            Some(Kind::Nodes(_) | Kind::OwnWeight(_) | Kind::OnLength(_) | Kind::OnPlanLength(_) | Kind::OnPlan(_))
            | None => None,
        })
    }

    /// Whether an action has loads that the test asks for.
    pub(crate) fn has(&self, action: usize, test: impl Fn(&Kind) -> bool) -> bool {
        self.messages[action]
            .loads
            .iter()
            .any(|load| load.kind.as_ref().is_some_and(&test))
    }
}

/// Reads the loads of one action.
struct Reader<'r, 'a> {
    action: &'a str,
    net: &'r NetDraft<'a>,
    scopes: &'r Scopes,
    supports: &'r Supports,
    shares: &'r mut Vec<(Vec<usize>, f64)>,
    findings: &'r mut Findings,
}

impl Reader<'_, '_> {
    fn load(&mut self, load: &v1::Load, at: &Path<'_>) -> Option<Load> {
        match load.kind.as_ref() {
            Some(Kind::Nodes(load)) => self.nodes(load, &at.field("nodes")),
            Some(Kind::OwnWeight(_)) => Some(Load::OwnWeight {
                gravity: Vector3::new(0.0, 0.0, -self.net.gravity),
            }),
            Some(Kind::OnLength(load)) => {
                let at = at.field("on_length");
                let force = self.force_per_length(&load.force_n_per_m, &at);
                let scope = self.segments(&load.on, &at, MEMBERS, None);
                Some(Load::PerUnstressedLength {
                    scope: scope?,
                    force: force?,
                })
            }
            Some(Kind::OnPlanLength(load)) => {
                let at = at.field("on_plan_length");
                let force = self.force_per_length(&load.force_n_per_m, &at);
                let scope = self.segments(&load.on, &at, MEMBERS, None);
                Some(Load::PerPlanLength {
                    scope: scope?,
                    force: force?,
                })
            }
            Some(Kind::Temperature(load)) => {
                let at = at.field("temperature");
                let of = Of::new("action", self.action);
                let field = at.field("change_k");
                let change = self.findings.number(&field, of, &TEMPERATURE_CHANGE, load.change_k);
                let scope = self.segments(&load.on, &at, MEMBERS, Some(Segments::All));
                Some(Load::Temperature {
                    scope: scope?,
                    change: change?,
                })
            }
            Some(Kind::Move(load)) => self.movement(load, &at.field("move")),
            Some(Kind::Prestress(load)) => self.share(load, &at.field("prestress")),
            // Refused by name elsewhere.
            Some(Kind::OnPlan(_) | Kind::OnSurface(_)) => None,
            None => {
                self.findings.error(
                    reasons::MISSING,
                    at,
                    self.action,
                    format!("a load of action {} says not what acts", Quoted(self.action)),
                    "give one of nodes, own_weight, on_length, on_plan_length, temperature, move, prestress",
                );
                None
            }
        }
    }

    fn nodes(&mut self, load: &v1::NodeLoad, at: &Path<'_>) -> Option<Load> {
        let of = Of::new("action", self.action);
        let force = self.findings.vector(&at.field("force_n"), of, &FORCE, &load.force_n);
        let on = at.field("on");
        if self.covers_nothing(&load.on, &on) {
            return None;
        }
        let scope = self.scopes.of(self.net, &load.on, &on, NODES, self.findings);
        Some(Load::Nodes {
            nodes: scope.nodes().map(NodeId::new).collect(),
            force: force?,
        })
    }

    fn force_per_length(&mut self, force: &[f64], at: &Path<'_>) -> Option<Vector3<f64>> {
        let of = Of::new("action", self.action);
        self.findings
            .vector(&at.field("force_n_per_m"), of, &FORCE_PER_LENGTH, force)
    }

    fn covers_nothing(&mut self, on: &[String], field: &Path<'_>) -> bool {
        if on.is_empty() {
            self.findings.error(
                reasons::COVERS_NOTHING,
                field,
                self.action,
                format!("a load of action {} acts on nothing", Quoted(self.action)),
                "name in on what it acts on",
            );
        }
        on.is_empty()
    }

    fn segments(&mut self, on: &[String], at: &Path<'_>, allowed: Allowed, all: Option<Segments>) -> Option<Segments> {
        let field = at.field("on");
        if let (true, Some(all)) = (on.is_empty(), all) {
            return Some(all);
        }
        if self.covers_nothing(on, &field) {
            return None;
        }
        let scope = self.scopes.of(self.net, on, &field, allowed, self.findings);
        let segments = scope.segments(self.net).into_iter().map(SegmentId::new).collect();
        Some(Segments::Segments(segments))
    }

    fn movement(&mut self, load: &v1::SupportMovement, at: &Path<'_>) -> Option<Load> {
        let of = Of::new("action", self.action);
        let by_at = at.field("by_m");
        let by = self.findings.vector(&by_at, of, &MOVEMENT, &load.by_m);
        let field = at.field("node");
        let node = match self.net.names.find(self.findings, &field, "node", &load.node)? {
            Thing::Node(node) => node,
            other => {
                self.findings.error(
                    reasons::WRONG_KIND,
                    &field,
                    &load.node,
                    format!(
                        "{} is a {}, and only supported nodes can be moved",
                        Quoted(&load.node),
                        other.kind()
                    ),
                    "name a supported node",
                );
                return None;
            }
        };
        let Some(support) = &self.supports.of_node[node] else {
            self.findings.error(
                reasons::MOVE_WITHOUT_SUPPORT,
                &field,
                &load.node,
                format!(
                    "action {} moves node {}, which has no support to move with",
                    Quoted(self.action),
                    Quoted(&load.node)
                ),
                "name a supported node, or give the node a support",
            );
            return None;
        };
        let by = by?;
        if let Some(loose) = support
            .loose
            .iter()
            .find(|loose| loose.dot(&by).abs() > ROUNDING * by.norm())
        {
            self.findings.error(
                reasons::MOVE_ALONG_FREE,
                &by_at,
                &load.node,
                format!(
                    "action {} moves node {} along ({}, {}, {}), where its support does not hold it",
                    Quoted(self.action),
                    Quoted(&load.node),
                    rounded(loose.x, 3),
                    rounded(loose.y, 3),
                    rounded(loose.z, 3)
                ),
                "move it along held directions only",
            );
        }
        Some(Load::SupportMovement {
            node: NodeId::new(node),
            by,
        })
    }

    fn share(&mut self, load: &v1::PrestressShare, at: &Path<'_>) -> Option<Load> {
        let of = Of::new("action", self.action);
        let share = self
            .findings
            .number(&at.field("share"), of, &PRESTRESS_SHARE, load.share);
        let (cables, scope) = if load.on.is_empty() {
            ((0..self.net.cables.len()).collect(), Segments::All)
        } else {
            let scope = self
                .scopes
                .of(self.net, &load.on, &at.field("on"), CABLES, self.findings);
            let segments = scope.segments(self.net).into_iter().map(SegmentId::new).collect();
            (scope.cables().collect(), Segments::Segments(segments))
        };
        let share = share?;
        self.shares.push((cables, share));
        Some(Load::PrestressShare { scope, share })
    }
}
