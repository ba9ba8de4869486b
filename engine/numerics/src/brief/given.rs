//! The work as it is given: everything resolved, nothing inherited any more.

use std::sync::Arc;

use super::DiagnosisGiven;
use crate::check::Check;
use crate::equilibrium::{LoadSteps, Settings};
use crate::load::Action;
use crate::model::Net;
use crate::shape::Prestress;

/// A case as given: factors on actions.
#[derive(Clone, Debug, PartialEq)]
pub struct CaseGiven {
    /// The client's id.
    pub name: String,
    /// Sets it belongs to.
    pub sets: Vec<String>,
    /// Action and its factor.
    pub factors: Vec<(usize, f64)>,
    /// How its load is put on; `None`: as the settings say.
    pub load_steps: Option<LoadSteps>,
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
    /// Checks, in result order.
    pub checks: Vec<Check>,
    /// States that are looked into, if any.
    pub diagnosis: Option<DiagnosisGiven>,
    /// How states are solved for.
    pub settings: Settings,
}
