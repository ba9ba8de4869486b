//! The work as it is given: everything resolved, nothing inherited any more.

use std::sync::Arc;

use super::{DiagnosisGiven, ModesGiven, MotionGiven};
use crate::check::Check;
use crate::equilibrium::{LoadSteps, Settings};
use crate::load::{Action, Case};
use crate::model::{Member, Net, ReferenceState};
use crate::shape::Prestress;

use super::{DesignEffect, PondingGiven};

/// States on the way to a case and beyond, each solved from the one before.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LoadPath {
    /// Last load factor (–).
    pub to_factor: f64,
    /// Equal steps, at least one.
    pub steps: u32,
}

/// A case as given: factors on actions.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct CaseGiven {
    /// The client's id.
    pub name: String,
    /// Sets it belongs to.
    pub sets: Vec<String>,
    /// Action and its factor.
    pub factors: Vec<(usize, f64)>,
    /// How its load is put on; `None`: as the settings say.
    pub load_steps: Option<LoadSteps>,
    /// Members that are taken out.
    pub removed: Vec<Member>,
    /// Share of prestress of all ropes on top of that of the actions: a partial factor on prestress, less one (–).
    pub prestress_share: f64,
    /// Water that gathers on skins, where that is asked for.
    pub ponding: Option<PondingGiven>,
    /// How the net gets there, where that is asked for.
    pub path: Option<LoadPath>,
}

impl CaseGiven {
    /// The case as plain numbers over the reference state.
    pub(super) fn case(&self, net: &Net, reference: &ReferenceState, actions: &[Action]) -> Case {
        let (removed, share) = (&self.removed, self.prestress_share);
        Case::changed(net, reference, actions, &self.factors, removed, share)
    }
}

/// An envelope over some cases.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct EnvelopeGiven {
    /// Name of their set.
    pub name: String,
    /// The cases, by index.
    pub cases: Vec<usize>,
}

/// The whole work.
#[derive(Clone, Debug)]
pub struct Brief {
    /// The net.
    pub net: Arc<Net>,
    /// How its reference state arises.
    pub prestress: Prestress,
    /// Actions.
    pub actions: Vec<Action>,
    /// Cases, in result order.
    pub cases: Vec<CaseGiven>,
    /// Design effects, in result order. Where checks name cases by index, effects are counted on from the last case.
    pub effects: Vec<DesignEffect>,
    /// Checks, in result order.
    pub checks: Vec<Check>,
    /// States that are looked into, if any.
    pub diagnosis: Option<DiagnosisGiven>,
    /// States whose natural frequencies are wanted, if any.
    pub modes: Option<ModesGiven>,
    /// Motions, in result order.
    pub motions: Vec<MotionGiven>,
    /// Envelopes beside that over all cases, in result order.
    pub envelopes: Vec<EnvelopeGiven>,
    /// How states are solved for.
    pub settings: Settings,
}

impl Brief {
    /// Name of a case or, counted on from the last case, of a design effect.
    #[must_use]
    pub fn case_name(&self, index: usize) -> &str {
        match self.cases.get(index) {
            Some(case) => &case.name,
            None => &self.effects[index - self.cases.len()].name,
        }
    }
}
