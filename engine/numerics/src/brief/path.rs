//! States on the way to a case and beyond it: does twice the load give twice the effect?

use std::ops::ControlFlow;

use super::{CaseGiven, Plan, ReferenceOutcome};
use crate::equilibrium::audit::audit_members;
use crate::equilibrium::{self, IterationReport, Termination};

/// States along a path, each with an answer that the audit confirms.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct PathResult {
    /// Load factors (–), from 0 on.
    pub load_factors: Vec<f64>,
    /// Largest axial force of each cable (N), one list a load factor.
    pub tensions: Vec<Vec<f64>>,
    /// Largest movement of a node from the reference state (m), one a load factor.
    pub movements: Vec<f64>,
    /// Whether the path got to its end.
    pub complete: bool,
}

impl Plan {
    /// Walks the path of a case, where it has one: actions under which the reference state was found keep their factors,
    /// the others are multiplied by the load factor, and each state starts from the one before. Ends at the first load
    /// factor without an answer.
    pub fn path(
        &self,
        reference: &ReferenceOutcome,
        case: usize,
        observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
    ) -> Option<PathResult> {
        let brief = self.brief();
        let given = &brief.cases[case];
        let path = given.path?;
        let under = &brief.prestress.under;
        let mut found = PathResult::default();
        let mut positions = reference.state.positions.clone();
        let steps = path.steps.max(1);
        for step in 0..=steps {
            let load_factor = path.to_factor * f64::from(step) / f64::from(steps);
            let grown = |(action, factor): &(usize, f64)| {
                let grows = !under.contains(action);
                (*action, if grows { factor * load_factor } else { *factor })
            };
            let at_factor = CaseGiven {
                factors: given.factors.iter().map(grown).collect(),
                ..given.clone()
            };
            let loads = at_factor.case(&brief.net, &reference.state, &brief.actions);
            let solved = equilibrium::solve(
                self.analysis(),
                &loads,
                &positions,
                &reference.state.unstressed_lengths,
                &brief.settings,
                observe,
            );
            let Ok(solution) = solved else { return Some(found) };
            let audit = audit_members(
                &brief.net,
                &loads,
                &solution.positions,
                &solution.axial_forces,
                &solution.members,
            );
            if solution.termination != Termination::Converged || !audit.passed {
                return Some(found);
            }
            let largest =
                |segments: std::ops::Range<usize>| solution.axial_forces[segments].iter().copied().fold(0.0, f64::max);
            let moved = solution.positions.iter().zip(&reference.state.positions);
            let loose: Vec<usize> = solution.loose_nodes.iter().map(|node| node.index()).collect();
            let moved = moved.enumerate().filter(|(node, _)| !loose.contains(node));
            found.load_factors.push(load_factor);
            found.tensions.push(
                brief
                    .net
                    .cables()
                    .iter()
                    .map(|cable| largest(cable.segments.clone()))
                    .collect(),
            );
            found
                .movements
                .push(moved.map(|(_, (x, from))| (x - from).norm()).fold(0.0, f64::max));
            positions = solution.positions;
        }
        found.complete = true;
        Some(found)
    }
}
