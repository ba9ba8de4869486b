//! Shapes with known answers.

mod bad_input;
mod closed_form;
mod courtyard;
mod grids;
mod properties;
mod published;
mod sensitivity;
mod skins;
mod sliding;
mod targets;
mod tent;

use std::ops::ControlFlow;
use std::sync::Arc;

use nalgebra::Vector3;

use super::{Adjustable, Found, Prestress, PrestressRule, Quantity, SagMeasure, ShapeError, ShapeTarget, Wish, find};
use crate::equilibrium::{Analysis, Settings};
use crate::load::{Action, Load};
use crate::model::{Net, NodeId};

/// Finds the shape of a net under loads.
fn shape(net: &Arc<Net>, prestress: &Prestress, loads: Vec<Load>) -> Result<Found, ShapeError> {
    let prestress = Prestress {
        under: vec![0],
        ..prestress.clone()
    };
    let action = Action {
        name: "self".to_owned(),
        loads,
    };
    let analysis = Analysis::new(Arc::clone(net));
    find(&analysis, &prestress, &[action], &Settings::default(), &mut |_| {
        ControlFlow::Continue(())
    })
}

/// The same rule for all.
fn all(net: &Net, rule: PrestressRule) -> Prestress {
    Prestress {
        rules: vec![rule; net.segments().len()],
        ..Prestress::default()
    }
}

fn down(node: NodeId, force: f64) -> Load {
    Load::Nodes {
        nodes: vec![node],
        force: Vector3::new(0.0, 0.0, -force),
    }
}

fn own_weight() -> Load {
    Load::OwnWeight {
        gravity: Vector3::new(0.0, 0.0, -9.80665),
    }
}

#[track_caller]
fn close(found: f64, wanted: f64, tolerance: f64) {
    assert!(
        (found - wanted).abs() <= tolerance,
        "found {found:.12e}, wanted {wanted:.12e} within {tolerance:e}"
    );
}
