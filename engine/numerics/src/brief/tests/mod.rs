//! Briefs from end to end.

mod effects;
mod motions;
mod outcomes;
mod sizing;
mod worked_numbers;

use std::ops::ControlFlow;
use std::sync::Arc;

use nalgebra::Vector3;

use super::*;
use crate::equilibrium::Settings;
use crate::load::{Action, Load};
use crate::model::{Net, NodeId};
use crate::test_nets::{Sketch, node, section};

fn run_on(_: &crate::equilibrium::IterationReport) -> ControlFlow<()> {
    ControlFlow::Continue(())
}

fn action(name: &str, loads: Vec<Load>) -> Action {
    Action {
        name: name.to_owned(),
        loads,
    }
}

fn case(name: &str, factors: &[(usize, f64)]) -> CaseGiven {
    CaseGiven {
        name: name.to_owned(),
        factors: factors.to_vec(),
        ..CaseGiven::default()
    }
}

fn own_weight() -> Load {
    Load::OwnWeight {
        gravity: Vector3::new(0.0, 0.0, -9.80665),
    }
}

fn force(nodes: &[NodeId], force: [f64; 3]) -> Load {
    Load::Nodes {
        nodes: nodes.to_vec(),
        force: Vector3::from(force),
    }
}

fn brief(net: Net, prestress: Prestress, actions: Vec<Action>, cases: Vec<CaseGiven>) -> Brief {
    Brief {
        net: Arc::new(net),
        prestress,
        actions,
        cases,
        effects: Vec::new(),
        checks: Vec::new(),
        diagnosis: None,
        modes: None,
        motions: Vec::new(),
        envelopes: Vec::new(),
        settings: Settings::default(),
    }
}

/// The same force density in all members.
fn densities(net: &Net, density: f64) -> Prestress {
    Prestress {
        rules: vec![PrestressRule::ForceDensity(density); net.segments().len()],
        mean_tensions: Vec::new(),
        ..Prestress::default()
    }
}

/// Two ropes that cross at `m`, between two high and two low points: the smallest net worth a brief.
fn crossing() -> Sketch {
    let mut sketch = Sketch::default();
    sketch.held("A", [0.0, 0.0, 3.0]);
    sketch.held("B", [9.0, 0.0, 0.0]);
    sketch.held("C", [9.0, 9.0, 3.0]);
    sketch.held("D", [0.0, 9.0, 0.0]);
    let rope = crate::model::Section {
        breaking_force: Some(82e3),
        ..section(6.5e6, 0.0)
    };
    sketch.cable("carrying", rope, "A m C");
    sketch.cable("bracing", rope, "B m D");
    sketch
}

#[track_caller]
fn close(found: f64, wanted: f64, tolerance: f64) {
    assert!(
        (found - wanted).abs() <= tolerance,
        "found {found:.12e}, wanted {wanted:.12e} within {tolerance:e}"
    );
}

fn state(outcome: CaseOutcome) -> Box<StateResult> {
    match outcome {
        CaseOutcome::State {
            result, cause: None, ..
        } => result,
        other => panic!("no answer: {other:?}"),
    }
}
