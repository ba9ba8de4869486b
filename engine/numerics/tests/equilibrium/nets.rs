//! Nets for the tests, and one place that solves them.

use std::ops::ControlFlow;
use std::sync::Arc;

use nalgebra::Vector3;
use ropewalk_numerics::equilibrium::{Analysis, Settings, Solution, SolveError, solve};
use ropewalk_numerics::load::{Case, SegmentLoads};
use ropewalk_numerics::model::{
    CableGiven, ElasticSupportGiven, Net, NetGiven, NodeGiven, NodeId, Section, StrutGiven, SupportGiven,
};

/// A net with one cable a segment, its lengths and its loads.
#[derive(Clone, Debug, Default)]
pub(crate) struct Example {
    pub(crate) positions: Vec<Vector3<f64>>,
    pub(crate) held: Vec<usize>,
    /// Held but for these directions.
    pub(crate) sliders: Vec<(usize, Vec<Vector3<f64>>)>,
    pub(crate) segments: Vec<(usize, usize, f64, f64)>,
    pub(crate) struts: Vec<(usize, usize, f64, f64)>,
    pub(crate) elastic: Vec<ElasticSupportGiven>,
    pub(crate) loads: Vec<Vector3<f64>>,
    /// Thermal strain of every segment, struts last.
    pub(crate) strains: Vec<f64>,
    pub(crate) movements: Vec<(usize, Vector3<f64>)>,
    pub(crate) removed: Vec<usize>,
}

impl Example {
    pub(crate) fn section(axial_stiffness: f64) -> Section {
        Section {
            axial_stiffness,
            mass_per_length: 0.0,
            expansion: 1.0,
            breaking_force: None,
            ..Section::default()
        }
    }

    pub(crate) fn net(&self) -> Arc<Net> {
        let nodes = self.positions.iter().enumerate().map(|(i, x)| NodeGiven {
            name: format!("n{i}"),
            position: Some(*x),
            support: if self.held.contains(&i) {
                Some(SupportGiven::default())
            } else {
                let free = self.sliders.iter().find(|s| s.0 == i);
                free.map(|(_, released)| SupportGiven {
                    released: released.clone(),
                })
            },
            attached_mass: 0.0,
        });
        let cables = self.segments.iter().enumerate().map(|(i, (a, b, ea, _))| CableGiven {
            name: format!("c{i}"),
            path: vec![NodeId::new(*a), NodeId::new(*b)],
            sections: vec![Self::section(*ea)],
            ..CableGiven::default()
        });
        let struts = self.struts.iter().enumerate().map(|(i, (a, b, ea, _))| StrutGiven {
            name: format!("s{i}"),
            ends: [NodeId::new(*a), NodeId::new(*b)],
            section: Self::section(*ea),
        });
        let given = NetGiven {
            nodes: nodes.collect(),
            cables: cables.collect(),
            struts: struts.collect(),
            elastic_supports: self.elastic.clone(),
            ..NetGiven::default()
        };
        Arc::new(Net::new(given).expect("a valid net"))
    }

    pub(crate) fn lengths(&self) -> Vec<f64> {
        self.segments.iter().chain(&self.struts).map(|s| s.3).collect()
    }

    pub(crate) fn case(&self) -> Case {
        let n_segments = self.segments.len() + self.struts.len();
        let mut movements = vec![Vector3::zeros(); self.positions.len()];
        for (node, by) in &self.movements {
            movements[*node] = *by;
        }
        let mut loads = self.loads.clone();
        loads.resize(self.positions.len(), Vector3::zeros());
        Case {
            nodal_forces: loads,
            unstressed_lengths: self.lengths(),
            segments: (0..n_segments)
                .map(|i| SegmentLoads {
                    temperature_change: self.strains.get(i).copied().unwrap_or(0.0),
                    ..SegmentLoads::default()
                })
                .collect(),
            support_movements: movements,
            removed: (0..n_segments).map(|i| self.removed.contains(&i)).collect(),
            ..Case::default()
        }
    }

    pub(crate) fn solve(&self) -> Result<Solution, SolveError> {
        self.solve_with(&Settings::default())
    }

    pub(crate) fn solve_with(&self, settings: &Settings) -> Result<Solution, SolveError> {
        let analysis = Analysis::new(self.net());
        let mut watch = |_: &_| ControlFlow::Continue(());
        solve(
            &analysis,
            &self.case(),
            &self.positions,
            &self.lengths(),
            settings,
            &mut watch,
        )
    }

    /// Out-of-balance force of every node by plain sums over the members, elastic supports and loads (N).
    pub(crate) fn imbalance(&self, solution: &Solution) -> Vec<Vector3<f64>> {
        let mut sums = self.case().nodal_forces;
        for (index, (a, b, ..)) in self.segments.iter().chain(&self.struts).enumerate() {
            let chord = solution.positions[*b] - solution.positions[*a];
            let pull = chord.normalize() * solution.axial_forces[index];
            sums[*a] += pull;
            sums[*b] -= pull;
        }
        sums
    }
}

/// Deterministic numbers without a library: splitmix64 (Steele, Lea & Flood 2014, from memory).
pub(crate) struct Random(u64);

impl Random {
    pub(crate) fn new(seed: u64) -> Self {
        Self(seed.wrapping_mul(0x9e37_79b9_7f4a_7c15) ^ 0x1234_5678)
    }

    /// Uniform in [0, 1).
    pub(crate) fn unit(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((z ^ (z >> 31)) >> 11) as f64 / (1_u64 << 53) as f64
    }

    pub(crate) fn range(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.unit()
    }

    /// `10^x` for uniform `x`.
    pub(crate) fn power(&mut self, low: f64, high: f64) -> f64 {
        10_f64.powf(self.range(low, high))
    }

    #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "small numbers")]
    pub(crate) fn index(&mut self, low: usize, high: usize) -> usize {
        low + (self.unit() * (high - low) as f64) as usize
    }
}

/// A rectangular net of `n` by `n` free nodes and a held rim without corners, height by `height(u, w)` in −1..1.
pub(crate) fn grid(n: usize, side: f64, ea: f64, height: impl Fn(f64, f64) -> f64) -> Example {
    let m = n + 2;
    let mut number = vec![usize::MAX; m * m];
    let mut example = Example::default();
    for i in 0..m {
        for j in 0..m {
            let edge = |k: usize| k == 0 || k == m - 1;
            if edge(i) && edge(j) {
                continue;
            }
            number[i * m + j] = example.positions.len();
            if edge(i) || edge(j) {
                example.held.push(example.positions.len());
            }
            let at = |k: usize| 2.0 * k as f64 / (m - 1) as f64 - 1.0;
            let (u, w) = (at(i), at(j));
            let half = side / 2.0;
            example
                .positions
                .push(Vector3::new(half * (u + 1.0), half * (w + 1.0), height(u, w)));
        }
    }
    for i in 0..m {
        for j in 0..m {
            for (k, l) in [(i + 1, j), (i, j + 1)] {
                let inner = |a: usize| a > 0 && a < m - 1;
                let along_i = l == j;
                let wanted = k < m && l < m && if along_i { inner(j) } else { inner(i) };
                if wanted {
                    let (a, b) = (number[i * m + j], number[k * m + l]);
                    let length = (example.positions[b] - example.positions[a]).norm();
                    example.segments.push((a, b, ea, length));
                }
            }
        }
    }
    example.loads = vec![Vector3::zeros(); example.positions.len()];
    example
}
