//! Loads of the reference state, which depend on the lengths that are being sought.

use nalgebra::Vector3;

use super::ShapeError;
use crate::load::{Action, Load, Scope, Surface, ice_per_length};
use crate::model::{Area, Net, SegmentId};

/// Dead loads, apart by what they depend on.
#[derive(Clone, Debug)]
pub(super) struct ShapeLoads {
    /// Force on every node (N).
    pub(super) nodal: Vec<Vector3<f64>>,
    /// Force per unstressed length on every segment (N/m).
    pub(super) per_length: Vec<Vector3<f64>>,
    /// Force per length on plan on every segment (N/m).
    pub(super) per_plan_length: Vec<Vector3<f64>>,
    /// Force per area of every panel (N/m²); empty where none has any.
    pub(super) per_area: Vec<Vector3<f64>>,
    /// Force per area on plan of every panel (N/m²); empty where none has any.
    pub(super) per_plan_area: Vec<Vector3<f64>>,
    /// Loads on areas on plan (N/m²), of which panels are to be told.
    on_areas: Vec<(Vec<Area>, Vector3<f64>)>,
    /// Whether anything carries a load that depends on lengths or areas.
    pub(super) depend_on_lengths: bool,
}

impl ShapeLoads {
    /// No load at all.
    pub(super) fn none(net: &Net) -> Self {
        Self {
            nodal: vec![Vector3::zeros(); net.nodes().len()],
            per_length: vec![Vector3::zeros(); net.segments().len()],
            per_plan_length: vec![Vector3::zeros(); net.segments().len()],
            per_area: Vec::new(),
            per_plan_area: Vec::new(),
            on_areas: Vec::new(),
            depend_on_lengths: false,
        }
    }

    pub(super) fn new(net: &Net, actions: &[Action], under: &[usize]) -> Result<Self, ShapeError> {
        let mut loads = Self::none(net);
        for action in under.iter().map(|index| &actions[*index]) {
            for load in &action.loads {
                loads.add(net, load).map_err(|what| ShapeError::NotDead {
                    action: action.name.clone(),
                    what,
                })?;
            }
        }
        let loaded = |forces: &[Vector3<f64>]| forces.iter().any(|f| *f != Vector3::zeros());
        loads.depend_on_lengths = loaded(&loads.per_length)
            || loaded(&loads.per_plan_length)
            || loaded(&loads.per_area)
            || !loads.on_areas.is_empty();
        Ok(loads)
    }

    /// Gives loads on zones to the panels whose centres lie in them at `positions` (m). The search keeps them there.
    pub(super) fn place(&mut self, net: &Net, positions: &[Vector3<f64>]) {
        if self.on_areas.is_empty() {
            return;
        }
        let surface = Surface::new(net, positions);
        self.per_plan_area = vec![Vector3::zeros(); net.panels().len()];
        for (on, force) in &self.on_areas {
            for panel in surface.panels_of(on) {
                self.per_plan_area[panel] += force;
            }
        }
    }

    fn add(&mut self, net: &Net, load: &Load) -> Result<(), &'static str> {
        let on = |forces: &mut [Vector3<f64>], scope: &Scope, force: &Vector3<f64>| match scope {
            Scope::All => forces.iter_mut().for_each(|f| *f += force),
            Scope::Segments(list) => list.iter().for_each(|segment| forces[segment.index()] += force),
        };
        match load {
            Load::Nodes { nodes, force } => nodes.iter().for_each(|node| self.nodal[node.index()] += force),
            Load::OwnWeight { gravity } => {
                for (force, segment) in self.per_length.iter_mut().zip(net.segments()) {
                    *force += segment.section.mass_per_length * gravity;
                }
                for (force, node) in self.nodal.iter_mut().zip(net.nodes()) {
                    *force += node.attached_mass * gravity;
                }
                for skin in net.skins().iter().filter(|skin| skin.mass_per_area > 0.0) {
                    self.per_area.resize(net.panels().len(), Vector3::zeros());
                    for panel in &skin.panels {
                        self.per_area[*panel] += skin.mass_per_area * gravity;
                    }
                }
            }
            Load::PerUnstressedLength { scope, force } => on(&mut self.per_length, scope, force),
            Load::PerPlanLength { scope, force } => on(&mut self.per_plan_length, scope, force),
            Load::Ice {
                scope,
                thickness,
                density,
                gravity,
            } => {
                let all: Vec<_> = (0..net.segments().len()).map(SegmentId::new).collect();
                let list = match scope {
                    Scope::All => &all,
                    Scope::Segments(list) => list,
                };
                for segment in list.iter().copied().map(SegmentId::index) {
                    let mass = ice_per_length(&net.segments()[segment].section, *thickness, *density);
                    self.per_length[segment] += mass * gravity;
                }
            }
            Load::OnPlan { on, pressure } => {
                self.on_areas.push((on.clone(), Vector3::new(0.0, 0.0, -pressure)));
            }
            Load::OnSurface { .. } => return Err("pressure that follows the surface"),
            Load::WindOnRopes { .. } => return Err("wind on ropes"),
            Load::Temperature { .. } => return Err("change of temperature"),
            Load::SupportMovement { .. } => return Err("support movement"),
            Load::PrestressShare { .. } => return Err("change of prestress"),
            Load::Adjustment { .. } => return Err("turn of an adjuster"),
        }
        Ok(())
    }
}
