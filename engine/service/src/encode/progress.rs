//! What is being worked on.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{Plan, Task};
use ropewalk_numerics::equilibrium::{IterationReport, Way};

use super::parts::count;
use crate::decode::{REFERENCE, Work};

/// One iteration, on its way to the client.
#[must_use]
pub fn progress(
    _work: &Work,
    plan: &Plan,
    task: Task,
    report: &IterationReport,
    done: u32,
    total: u32,
) -> v1::Progress {
    let brief = plan.brief();
    let (case, motion) = match task {
        Task::Reference => (REFERENCE, ""),
        Task::Case(case) => (brief.cases[case].name.as_str(), ""),
        Task::Motion(motion) => ("", brief.motions[motion].name.as_str()),
    };
    v1::Progress {
        case: case.to_owned(),
        motion: motion.to_owned(),
        way: way(report.way).into(),
        load_step: report.load_step,
        load_factor: report.load_factor,
        iteration: report.iteration,
        residual_n: report.residual,
        worst_node: report
            .worst_node
            .map_or_else(String::new, |node| brief.net.node_name(node).to_owned()),
        strain_energy_j: report.strain_energy,
        slack_segments: count(report.slack),
        cases_done: done,
        cases_total: total,
        ..v1::Progress::default()
    }
}

pub(super) fn way(way: Way) -> v1::SolutionWay {
    match way {
        Way::ForceDensities => v1::SolutionWay::ForceDensities,
        Way::Newton => v1::SolutionWay::Newton,
        Way::InteriorPoint => v1::SolutionWay::InteriorPoint,
        Way::Polish => v1::SolutionWay::Polish,
        Way::Relaxation => v1::SolutionWay::Relaxation,
    }
}
