//! Loads of the reference state, which depend on the lengths that are being sought.

use nalgebra::Vector3;

use super::ShapeError;
use crate::load::{Action, Load, Scope};
use crate::model::Net;

/// Dead loads, apart by what they depend on.
#[derive(Clone, Debug)]
pub(super) struct ShapeLoads {
    /// Force on every node (N).
    pub(super) nodal: Vec<Vector3<f64>>,
    /// Force per unstressed length on every segment (N/m).
    pub(super) per_length: Vec<Vector3<f64>>,
    /// Force per length on plan on every segment (N/m).
    pub(super) per_plan_length: Vec<Vector3<f64>>,
    /// Whether any segment carries a load that depends on its length.
    pub(super) depend_on_lengths: bool,
}

impl ShapeLoads {
    /// No load at all.
    pub(super) fn none(net: &Net) -> Self {
        Self {
            nodal: vec![Vector3::zeros(); net.nodes().len()],
            per_length: vec![Vector3::zeros(); net.segments().len()],
            per_plan_length: vec![Vector3::zeros(); net.segments().len()],
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
        loads.depend_on_lengths = loaded(&loads.per_length) || loaded(&loads.per_plan_length);
        Ok(loads)
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
            }
            Load::PerUnstressedLength { scope, force } => on(&mut self.per_length, scope, force),
            Load::PerPlanLength { scope, force } => on(&mut self.per_plan_length, scope, force),
            Load::Temperature { .. } => return Err("change of temperature"),
            Load::SupportMovement { .. } => return Err("support movement"),
            Load::PrestressShare { .. } => return Err("change of prestress"),
        }
        Ok(())
    }
}
