//! Actions and their loads.

use nalgebra::Vector3;
use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::load::Kind;
use ropewalk_numerics::load::{Action, Load, Scope as Segments};
use ropewalk_numerics::model::{NodeId, SegmentId};

use super::adjusters::Adjusters;
use super::coefficients;
use super::findings::{Findings, Path};
use super::names::{Names, Thing};
use super::net::NetDraft;
use super::numbers::{
    DRAG_COEFFICIENT, FORCE, FORCE_PER_LENGTH, ICE_DENSITY, ICE_THICKNESS, MOVEMENT, Of, PRESSURE, PRESTRESS_SHARE,
    TEMPERATURE_CHANGE, WIND_PRESSURE,
};
use super::reasons;
use super::resolved::Resolved;
use super::scope::{AREAS, Allowed, CABLES, MEMBERS, NODES, Scopes};
use super::sections::Sections;
use super::supports::Supports;
use crate::words::{Quoted, number, quoted_list, rounded};

/// Movement along a direction that nothing holds, over the whole movement, that still counts as rounding.
const ROUNDING: f64 = 1e-9;
/// Density of clear ice (kg/m³), common practice.
const ICE: f64 = 900.0;
/// Pressures of wind and snow outside these are doubted (Pa): snow on high mountains has some 30 kPa.
const PRESSURES: (f64, f64) = (5.0, 50e3);
/// Ice thicker than this is doubted (m).
const THICK_ICE: f64 = 0.3;

/// Actions as read.
#[derive(Debug)]
pub(crate) struct Actions<'a> {
    pub(crate) names: Names<'a, usize>,
    pub(crate) messages: &'a [v1::Action],
    pub(crate) list: Vec<Action>,
    /// Cables and share of each change of prestress, by action.
    pub(crate) shares: Vec<Vec<(Vec<usize>, f64)>>,
    /// Adjuster and opening (m) of each use, by action.
    pub(crate) adjustments: Vec<Vec<(usize, f64)>>,
}

impl<'a> Actions<'a> {
    #[allow(clippy::too_many_arguments, reason = "what was read before, and where findings go")]
    pub(crate) fn read(
        messages: &'a [v1::Action],
        net: &NetDraft<'a>,
        sections: &Sections<'a>,
        scopes: &Scopes,
        supports: &Supports,
        adjusters: &Adjusters<'a>,
        findings: &mut Findings,
        resolved: &mut Resolved,
    ) -> Self {
        let at = Path::root("actions");
        let mut actions = Self {
            names: Names::new("actions"),
            messages,
            list: Vec::with_capacity(messages.len()),
            shares: vec![Vec::new(); messages.len()],
            adjustments: vec![Vec::new(); messages.len()],
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
                sections,
                scopes,
                supports,
                resolved,
                shares: &mut actions.shares[index],
                adjusters,
                adjustments: &mut actions.adjustments[index],
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
            Some(Kind::Adjust(_)) => Some("turn of an adjuster"),
            Some(Kind::OnSurface(_)) => Some("pressure that follows the surface"),
            Some(Kind::WindOnRopes(_)) => Some("wind on ropes"),
            Some(
                Kind::Nodes(_)
                | Kind::OwnWeight(_)
                | Kind::OnLength(_)
                | Kind::OnPlanLength(_)
                | Kind::OnPlan(_)
                | Kind::Ice(_),
            )
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
    sections: &'r Sections<'a>,
    scopes: &'r Scopes,
    supports: &'r Supports,
    resolved: &'r mut Resolved,
    shares: &'r mut Vec<(Vec<usize>, f64)>,
    adjusters: &'r Adjusters<'a>,
    adjustments: &'r mut Vec<(usize, f64)>,
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
            Some(Kind::Adjust(load)) => {
                let at = at.field("adjust");
                let (adjuster, by, load) = self.adjusters.load(self.action, load, &at, self.findings)?;
                self.adjustments.push((adjuster, by));
                Some(load)
            }
            Some(Kind::OnPlan(load)) => self.on_plan(load, &at.field("on_plan")),
            Some(Kind::OnSurface(load)) => self.on_surface(load, &at.field("on_surface")),
            Some(Kind::WindOnRopes(load)) => self.wind_on_ropes(load, &at.field("wind_on_ropes")),
            Some(Kind::Ice(load)) => self.ice(load, &at.field("ice")),
            None => {
                self.findings.error(
                    reasons::MISSING,
                    at,
                    self.action,
                    format!("a load of action {} says not what acts", Quoted(self.action)),
                    "give one of nodes, own_weight, on_length, on_plan_length, on_plan, on_surface, wind_on_ropes, ice, temperature, \
                     move, prestress, adjust",
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

    fn on_plan(&mut self, load: &v1::PlanLoad, at: &Path<'_>) -> Option<Load> {
        let of = Of::new("action", self.action);
        let field = at.field("pressure_pa");
        let pressure = self.findings.number(&field, of, &PRESSURE, load.pressure_pa);
        self.doubt_pressure(load.pressure_pa, &field);
        let on = at.field("on");
        if self.covers_nothing(&load.on, &on) {
            return None;
        }
        let scope = self.scopes.of(self.net, &load.on, &on, AREAS, self.findings);
        Some(Load::OnPlan {
            on: scope.areas().collect(),
            pressure: pressure?,
        })
    }

    fn on_surface(&mut self, load: &v1::SurfaceLoad, at: &Path<'_>) -> Option<Load> {
        let of = Of::new("action", self.action);
        let field = at.field("pressure_pa");
        let pressure = self.findings.number(&field, of, &PRESSURE, load.pressure_pa);
        self.doubt_pressure(load.pressure_pa, &field);
        let what = format!("a pressure of {of}");
        let given = (&load.coefficients, load.elsewhere);
        let coefficients = coefficients::read(given, &what, of, at, self.net, self.findings);
        let (coefficients, elsewhere) = coefficients?;
        Some(Load::OnSurface {
            pressure: pressure?,
            coefficients,
            elsewhere,
        })
    }

    fn wind_on_ropes(&mut self, load: &v1::WindOnRopes, at: &Path<'_>) -> Option<Load> {
        let of = Of::new("action", self.action);
        let field = at.field("pressure_pa");
        let pressure = self.findings.number(&field, of, &WIND_PRESSURE, load.pressure_pa);
        self.doubt_pressure(load.pressure_pa, &field);
        let along = self.findings.direction(&at.field("along"), of, &load.along);
        let field = at.field("drag_coefficient");
        let drag = self
            .findings
            .number(&field, of, &DRAG_COEFFICIENT, load.drag_coefficient);
        let scope = self.segments_with_diameter(&load.on, at);
        Some(Load::WindOnRopes {
            scope: scope?,
            pressure: pressure?,
            along: along?,
            drag_coefficient: drag?,
        })
    }

    fn ice(&mut self, load: &v1::IceLoad, at: &Path<'_>) -> Option<Load> {
        let of = Of::new("action", self.action);
        let field = at.field("thickness_m");
        let thickness = self.findings.number(&field, of, &ICE_THICKNESS, load.thickness_m);
        if let Some(thickness) = thickness.filter(|thickness| *thickness > THICK_ICE) {
            self.findings
                .doubt(
                    reasons::UNIT_SLIP,
                    &field,
                    self.action,
                    format!("{of}: the ice is {} m thick: was it in mm?", number(thickness)),
                    "check the unit, or accept this doubt",
                )
                .value(number(thickness));
        }
        let field = at.field("density_kg_per_m3");
        if load.density_kg_per_m3.is_none() {
            self.resolved.left_out(&field, number(ICE));
        }
        let density = self
            .findings
            .number_or(&field, of, &ICE_DENSITY, load.density_kg_per_m3, ICE);
        let scope = self.segments_with_diameter(&load.on, at);
        Some(Load::Ice {
            scope: scope?,
            thickness: thickness?,
            density: density?,
            gravity: Vector3::new(0.0, 0.0, -self.net.gravity),
        })
    }

    /// Segments that a list covers; tells sections among them that have no diameter.
    fn segments_with_diameter(&mut self, on: &[String], at: &Path<'_>) -> Option<Segments> {
        let scope = self.segments(on, at, MEMBERS, None)?;
        let Segments::Segments(segments) = &scope else {
            return Some(scope);
        };
        let sections = segments
            .iter()
            .filter_map(|segment| self.sections.of_segment[segment.index()]);
        let bare = sections.map(|(section, _)| section);
        let mut bare: Vec<usize> = bare
            .filter(|section| self.sections.list[*section].message.diameter_m.is_none())
            .collect();
        bare.sort_unstable();
        bare.dedup();
        let ids: Vec<&str> = (bare.iter())
            .map(|section| self.sections.list[*section].message.id.as_str())
            .collect();
        if let Some(first) = ids.first() {
            self.findings
                .error(
                    reasons::NO_DIAMETER,
                    &at.field("on"),
                    first,
                    format!(
                        "action {} needs the diameter of section {}",
                        Quoted(self.action),
                        quoted_list(ids.iter().copied())
                    ),
                    "give diameter_m of the section, or name other members",
                )
                .value(ids.len());
            return None;
        }
        Some(scope)
    }

    /// Doubts pressures that no wind and no snow has.
    fn doubt_pressure(&mut self, pressure: f64, at: &Path<'_>) {
        let size = pressure.abs();
        if size == 0.0 || !size.is_finite() || (PRESSURES.0..=PRESSURES.1).contains(&size) {
            return;
        }
        let hint = if size < 1.0 * PRESSURES.0 {
            "was it in kPa?"
        } else {
            "was it in Pa already and multiplied again?"
        };
        self.findings
            .doubt(
                reasons::UNIT_SLIP,
                at,
                self.action,
                format!(
                    "action {}: the pressure is {} Pa: {hint}",
                    Quoted(self.action),
                    number(pressure)
                ),
                "check the unit, or accept this doubt",
            )
            .value(number(pressure));
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
