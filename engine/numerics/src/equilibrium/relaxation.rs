//! Dynamic relaxation with kinetic damping: slow, and hard to lead astray.
//!
//! ```text
//! v ← v + r / m,   x ← x + v        fictitious masses m from the stiffness at the node, time step 1
//! at each peak of the kinetic energy: back to the peak, v = 0
//! ```
//! Day 1965; kinetic damping as in Barnes 1999 (both from memory).

use std::ops::ControlFlow;

use nalgebra::Vector3;

use super::run::Run;
use super::{Termination, Way};
use crate::assembly::Loading;

const LIMIT: u32 = 20_000;
/// Masses above the least stable ones, `½ Σ k`, by this factor.
const MASS_RESERVE: f64 = 2.0;
/// Share of the largest force at which Newton takes over.
const NEAR: f64 = 1e-5;

/// Moves `positions` towards balance; converged means near enough for Newton.
pub(super) fn solve(run: &mut Run<'_>, loading: &Loading, positions: &mut [Vector3<f64>]) -> Termination {
    let structure = run.structure;
    let mut velocity = vec![0.0; structure.n_dofs()];
    let mut energy_before = 0.0;
    run.respond(loading, positions);
    let mut masses = masses(run, loading);
    for step in 0..LIMIT {
        let report = run.report_of(Way::Relaxation, loading, 1.0);
        if step == 0 {
            run.history.push(report);
        }
        if let ControlFlow::Break(end) = run.tell(&report) {
            return end;
        }
        if !report.residual.is_finite() {
            return Termination::StepTooSmall;
        }
        if run.runs_away(positions) {
            return Termination::RunsAway;
        }
        if report.residual <= NEAR * run.load.max(run.response.largest_axial_force()) {
            run.history.push(report);
            return Termination::Converged;
        }
        let mut energy = 0.0;
        for ((v, r), m) in velocity.iter_mut().zip(&run.response.residual).zip(&masses) {
            *v += r / m;
            energy += m * *v * *v;
        }
        if energy >= energy_before {
            structure.dofs().move_nodes(&velocity, 1.0, positions);
            energy_before = energy;
        } else {
            // The energy peaked in the step before; its middle lies half a step back along the velocity of then.
            for ((v, r), m) in velocity.iter_mut().zip(&run.response.residual).zip(&masses) {
                *v -= r / m;
            }
            structure.dofs().move_nodes(&velocity, -0.5, positions);
            velocity.fill(0.0);
            energy_before = 0.0;
            run.history.push(report);
            run.respond(loading, positions);
            masses = self::masses(run, loading);
            continue;
        }
        run.respond(loading, positions);
    }
    Termination::StepTooSmall
}

/// Fictitious mass of each free direction: `½ Σ (k + |T| / l)` of all that meets there, with a reserve (N/m, step 1).
fn masses(run: &Run<'_>, loading: &Loading) -> Vec<f64> {
    let structure = run.structure;
    let mut nodal = vec![0.0; structure.net().nodes().len()];
    for (index, (bar, segment)) in loading.bars.iter().zip(structure.net().segments()).enumerate() {
        let length = run.response.lengths[index].max(bar.stress_free_length);
        for end in segment.ends {
            nodal[end.index()] += bar.stiffness + run.response.axial_forces[index].abs() / length;
        }
    }
    for elastic in structure.net().elastic_supports() {
        for (position, end) in elastic.nodes().iter().enumerate() {
            nodal[end.index()] += elastic.largest_row_sum(position);
        }
    }
    (0..structure.n_dofs())
        .map(|dof| (MASS_RESERVE * 0.5 * nodal[structure.dofs().node(dof).index()]).max(f64::MIN_POSITIVE))
        .collect()
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use nalgebra::DMatrix;

    use super::*;
    use crate::equilibrium::{Analysis, IterationReport, Settings};
    use crate::load::{Case, SegmentLoads};
    use crate::model::{
        CableGiven, ElasticSupportGiven, Net, NetGiven, NodeGiven, NodeId, Section, StrutGiven, SupportGiven,
    };

    fn section(axial_stiffness: f64) -> Section {
        Section {
            axial_stiffness,
            mass_per_length: 0.0,
            expansion: 0.0,
            breaking_force: None,
            ..Section::default()
        }
    }

    /// A case of the same load on every node.
    fn case(net: &Net, load: Vector3<f64>, unstressed_lengths: Vec<f64>) -> Case {
        Case {
            nodal_forces: vec![load; net.nodes().len()],
            unstressed_lengths,
            segments: vec![SegmentLoads::default(); net.segments().len()],
            support_movements: vec![Vector3::zeros(); net.nodes().len()],
            removed: vec![false; net.segments().len()],
            ..Case::default()
        }
    }

    /// A mast of 5 m on three guys, its head given far from balance.
    fn mast() -> (Net, Case) {
        let places = [
            [0.0, 0.0, 0.0],
            [1.5, -1.0, 3.0],
            [4.0, 0.0, 0.0],
            [-2.0, 3.5, 0.0],
            [-2.0, -3.5, 0.0],
        ];
        let node = |(i, p): (usize, &[f64; 3])| NodeGiven {
            name: format!("n{i}"),
            position: Some(Vector3::from(*p)),
            support: (i != 1).then(SupportGiven::default),
            attached_mass: 0.0,
        };
        let guy = |i| CableGiven {
            name: format!("g{i}"),
            path: vec![NodeId::new(1), NodeId::new(i)],
            sections: vec![section(1e6)],
            ..CableGiven::default()
        };
        let net = Net::new(NetGiven {
            nodes: places.iter().enumerate().map(node).collect(),
            cables: (2..5).map(guy).collect(),
            struts: vec![StrutGiven {
                name: "mast".into(),
                ends: [NodeId::new(0), NodeId::new(1)],
                section: section(5e6),
            }],
            elastic_supports: vec![],
            ..NetGiven::default()
        })
        .expect("valid");
        let case = case(&net, Vector3::new(50.0, 20.0, -500.0), vec![6.35, 6.35, 6.35, 5.0]);
        (net, case)
    }

    /// Nodes that each hang on a rope, and on a building that moves as one.
    fn hung_from_a_building(n: usize) -> (Net, Case) {
        let node = |i: usize| NodeGiven {
            name: format!("n{i}"),
            position: Some(Vector3::new((i % n) as f64, 0.0, 5.0 * (i / n) as f64)),
            support: (i >= n).then(SupportGiven::default),
            attached_mass: 0.0,
        };
        let rope = |i: usize| CableGiven {
            name: format!("r{i}"),
            path: vec![NodeId::new(i + n), NodeId::new(i)],
            sections: vec![section(1e6)],
            ..CableGiven::default()
        };
        let net = Net::new(NetGiven {
            nodes: (0..2 * n).map(node).collect(),
            cables: (0..n).map(rope).collect(),
            struts: vec![],
            elastic_supports: vec![ElasticSupportGiven {
                nodes: (0..n).map(NodeId::new).collect(),
                stiffness: DMatrix::from_fn(3 * n, 3 * n, |i, j| if i % 3 == j % 3 { 1e5 } else { 0.0 }),
            }],
            ..NetGiven::default()
        })
        .expect("valid");
        let case = case(&net, Vector3::new(30.0, 0.0, -500.0), vec![4.99; n]);
        (net, case)
    }

    fn relax(
        (net, case): (Net, Case),
        observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
    ) -> (Termination, Vec<Vector3<f64>>, f64) {
        let start: Vec<Vector3<f64>> = net.nodes().iter().filter_map(|n| n.position).collect();
        let analysis = Analysis::new(Arc::new(net));
        let settings = Settings::default();
        let loading = Loading::new(analysis.structure(), &case, &case.unstressed_lengths, 1.0).expect("fits");
        let mut run = Run::new(&analysis, &settings, &start, &[], observe);
        run.begin(1, 1.0, &loading);
        let mut positions = start.clone();
        let outcome = solve(&mut run, &loading, &mut positions);
        let left = run.response.largest_residual(analysis.structure()).0 / run.response.largest_axial_force();
        (outcome, positions, left)
    }

    #[test]
    fn a_mast_far_from_balance_gets_there() {
        let mut energies = Vec::new();
        let (outcome, positions, left) = relax(mast(), &mut |r| {
            energies.push(r.residual);
            ControlFlow::Continue(())
        });
        assert_eq!(outcome, Termination::Converged);
        assert!(left <= NEAR && positions[1].z > 4.9, "{left} {}", positions[1]);
        assert!(energies.len() < 5000, "{}", energies.len());
    }

    /// Many nodes on one stiffness matrix: the sum over all of them is what the step has to be stable for.
    #[test]
    fn a_stiffness_that_couples_many_nodes_stays_stable() {
        let (outcome, positions, left) = relax(hung_from_a_building(24), &mut |_| ControlFlow::Continue(()));
        assert_eq!(outcome, Termination::Converged);
        // By hand: a rope of 4.99 m over 5 m lifts each node by 2004 N, less 500 N of load, against 24 × 1e5 N/m and its own.
        let stiffness = 1e6 / 4.99;
        let lifted = (stiffness * 0.01 - 500.0) / (24e5 + stiffness);
        assert!(
            left <= NEAR && (positions[0].z - lifted).abs() < 1e-6,
            "{left} {}",
            positions[0].z
        );
    }

    #[test]
    fn it_stops_when_asked() {
        let mut reports = 0;
        let (outcome, ..) = relax(mast(), &mut |_| {
            reports += 1;
            if reports == 7 {
                ControlFlow::Break(())
            } else {
                ControlFlow::Continue(())
            }
        });
        assert_eq!((outcome, reports), (Termination::Cancelled, 7));
    }
}
