//! What the methods share: room for their numbers, the stop rule, and the line to the observer.

use std::ops::ControlFlow;

use nalgebra::{DMatrix, DVector, Matrix3, Vector3};

use super::existence::Anchor;
use super::linear::{Factor, FactorError};
use super::{Analysis, IterationReport, Settings, Termination, Way, Yardstick};
use crate::assembly::{Loading, Response, Structure};

/// Watches a solve and may stop it.
pub(super) type Observer<'a> = &'a mut dyn FnMut(&IterationReport) -> ControlFlow<()>;

/// Displacements beyond this many times the size of the input count as running away.
const RUNS_AWAY: f64 = 1e3;

/// Share of the forces up to which rounding in the positions may hide a residual along one axis: half of what the audit
/// allows a node along all three.
const HIDDEN_BY_ROUNDING: f64 = 5e-5;

pub(super) fn anchor_entries(structure: &Structure, anchors: &[Anchor]) -> Vec<(usize, f64)> {
    let mut entries = Vec::new();
    for anchor in anchors {
        let first = structure.dofs().first(anchor.node);
        let free = structure.dofs().directions(anchor.node);
        for (column, along) in free.iter().enumerate() {
            for (row, across) in free.iter().enumerate().skip(column) {
                let position = structure
                    .pattern()
                    .position(first + row, first + column)
                    .expect("the block of a node is full");
                entries.push((position, along.dot(&anchor.direction) * across.dot(&anchor.direction)));
            }
        }
    }
    entries
}

/// `w vᵀ` beyond the factor, one entry a free direction.
struct Slip {
    w: Vec<f64>,
    v: Vec<f64>,
}

/// One solve: buffers, counters, and who watches.
pub(super) struct Run<'a> {
    pub(super) structure: &'a Structure,
    pub(super) settings: &'a Settings,
    start: &'a [Vector3<f64>],
    box_size: f64,
    observe: Observer<'a>,
    pub(super) history: Vec<IterationReport>,
    pub(super) load_step: u32,
    pub(super) load_factor: f64,
    pub(super) iteration: u32,
    pub(super) factorisations: u32,
    /// Factorisations allowed for now: what the settings allow, or less while a part of it is kept for what comes after.
    pub(super) allowance: u32,
    /// Largest load on a free direction in this load step (N).
    pub(super) load: f64,
    rounding: Vec<f64>,
    /// Entries of the tangent, and their shares of the largest stiffness, that hold parts free to be anywhere.
    anchors: Vec<(usize, f64)>,
    largest_stiffness: f64,
    factor: Factor,
    /// What slips against friction brings to the tangent beyond the factor.
    slips: Vec<Slip>,
    pub(super) values: Vec<f64>,
    pub(super) blocks: Vec<Matrix3<f64>>,
    pub(super) response: Response,
    pub(super) trial: Response,
    pub(super) trial_positions: Vec<Vector3<f64>>,
    /// Step along the free directions (m).
    pub(super) step: Vec<f64>,
    /// The same, one vector a node (m).
    pub(super) nodal_step: Vec<Vector3<f64>>,
}

impl<'a> Run<'a> {
    pub(super) fn new(
        analysis: &'a Analysis,
        settings: &'a Settings,
        start: &'a [Vector3<f64>],
        anchors: &[Anchor],
        observe: Observer<'a>,
    ) -> Self {
        let structure = analysis.structure();
        Self {
            structure,
            settings,
            start,
            box_size: 0.0,
            observe,
            history: Vec::new(),
            load_step: 1,
            load_factor: 1.0,
            iteration: 0,
            factorisations: 0,
            allowance: settings.max_iterations,
            load: 0.0,
            rounding: vec![0.0; structure.n_dofs()],
            anchors: anchor_entries(structure, anchors),
            largest_stiffness: 0.0,
            factor: analysis.new_factor(),
            slips: Vec::new(),
            values: vec![0.0; structure.pattern().n_entries()],
            blocks: vec![Matrix3::zeros(); structure.net().segments().len()],
            response: Response::new(structure),
            trial: Response::new(structure),
            trial_positions: start.to_vec(),
            step: vec![0.0; structure.n_dofs()],
            nodal_step: vec![Vector3::zeros(); start.len()],
        }
    }

    /// Begins a load step: counts anew, and works out what rounding may hide at each free direction.
    ///
    /// Positions are known to their last bit only, of the size of the input; a segment turns that into a force by its
    /// stiffness. The size is that of the input, never of the iterate: a net that flies off would else pass.
    pub(super) fn begin(&mut self, load_step: u32, load_factor: f64, loading: &Loading) {
        self.load_step = load_step;
        self.load_factor = load_factor;
        self.iteration = 0;
        self.load = self.largest_load(loading);
        let coordinates = self.start.iter().map(Vector3::amax);
        let lengths = loading
            .straight_bars()
            .iter()
            .filter(|b| b.is_present())
            .map(|b| b.stress_free_length);
        self.box_size = coordinates.chain(lengths).fold(0.0, f64::max);
        self.largest_stiffness = loading.straight_bars().iter().map(|b| b.stiffness).fold(0.0, f64::max);
        let mut stiffness = vec![0.0; self.start.len()];
        for (bar, segment) in loading.straight_bars().iter().zip(self.structure.net().segments()) {
            for end in segment.ends {
                stiffness[end.index()] += bar.stiffness;
            }
        }
        for elastic in self.structure.net().elastic_supports() {
            for (position, end) in elastic.nodes().iter().enumerate() {
                stiffness[end.index()] += elastic.largest_row_sum(position);
            }
        }
        for (dof, rounding) in self.rounding.iter_mut().enumerate() {
            let node = self.structure.dofs().node(dof);
            *rounding = 4.0 * f64::EPSILON * stiffness[node.index()] * self.box_size;
        }
    }

    /// Largest load on a free direction (N), pressure taken where it began.
    fn largest_load(&self, loading: &Loading) -> f64 {
        match &loading.special {
            Some(special) if !special.pressures.is_empty() || !special.hanging.is_empty() => {
                let mut forces = loading.nodal_forces.clone();
                self.structure
                    .add_pressure_forces(&special.pressures, self.start, &mut forces);
                for hanging in &special.hanging {
                    let half = hanging.catenary.load * (0.5 * hanging.catenary.unstressed_length);
                    for node in self.structure.net().segments()[hanging.segment].ends {
                        forces[node.index()] += half;
                    }
                }
                let whole = Loading {
                    nodal_forces: forces,
                    ..loading.clone()
                };
                whole.largest_force(self.structure)
            }
            _ => loading.largest_force(self.structure),
        }
    }

    /// Whether a response is in balance: within tolerance, or within what rounding of the positions hides.
    pub(super) fn is_balanced(&self, response: &Response) -> bool {
        let load = self.load;
        let force = response.largest_axial_force();
        let yardstick = match self.settings.yardstick {
            Yardstick::Load if load > 0.0 => load,
            _ => load.max(force),
        };
        let tolerance = self.settings.tolerance * yardstick;
        // Without load all forces may fade, and rounding is all that is left of them.
        let most_hidden = if load > 0.0 {
            HIDDEN_BY_ROUNDING * load.max(force)
        } else {
            f64::INFINITY
        };
        response
            .residual
            .iter()
            .zip(&self.rounding)
            .all(|(r, rounding)| r.abs() <= tolerance.max(rounding.min(most_hidden)))
    }

    /// Largest force that rounding of the positions makes at a free direction (N).
    pub(super) fn largest_rounding(&self) -> f64 {
        self.rounding.iter().copied().fold(0.0, f64::max)
    }

    /// Whether `positions` have left the neighbourhood of the input.
    pub(super) fn runs_away(&self, positions: &[Vector3<f64>]) -> bool {
        let limit = RUNS_AWAY * self.box_size;
        let near = |(x, start): (&Vector3<f64>, &Vector3<f64>)| (x - start).iter().all(|c| c.abs() <= limit);
        !positions.iter().zip(self.start).all(near)
    }

    /// Assembles the blocks, adds the elastic supports and factorises; false if not positive definite.
    ///
    /// `taut`: whether a sliding piece resists its stretching.
    pub(super) fn factorise_blocks(&mut self, loading: &Loading, taut: impl Fn(usize) -> bool) -> bool {
        self.structure.tangent_into(&self.blocks, &mut self.values);
        self.slips.clear();
        if let Some(special) = &loading.special {
            self.structure
                .add_special_tangent(special, &self.response, &taut, &mut self.values);
            let slips = self.structure.slips(special, &self.response, &taut);
            self.slips.extend(slips.into_iter().map(|(w, v)| Slip { w, v }));
        }
        self.structure.add_elastic_supports(&mut self.values);
        for (position, share) in &self.anchors {
            self.values[*position] += share * self.largest_stiffness;
        }
        self.factorisations += 1;
        let outcome: Result<(), FactorError> = self.factor.cholesky(&self.values);
        outcome.is_ok()
    }

    /// Whether the allowance of factorisations is used up.
    pub(super) fn is_spent(&self) -> bool {
        self.factorisations >= self.allowance
    }

    pub(super) fn solve_in_place(&mut self, right_hand_side: &mut [f64]) {
        self.factor.solve_in_place(right_hand_side);
    }

    /// Turns what was solved with the factor into what the whole tangent gives, slips against friction with it
    /// (Sherman & Morrison 1950; Woodbury 1950):
    ///
    /// ```text
    /// (B + W Vᵀ)⁻¹ r = y − Z (I + Vᵀ Z)⁻¹ Vᵀ y,     y = B⁻¹ r,   Z = B⁻¹ W
    /// ```
    pub(super) fn add_slips(&mut self, solved: &mut [f64]) {
        let n = self.slips.len();
        if n == 0 {
            return;
        }
        let dot = |a: &[f64], b: &[f64]| a.iter().zip(b).map(|(x, y)| x * y).sum::<f64>();
        let columns: Vec<Vec<f64>> = (self.slips.iter())
            .map(|slip| {
                let mut column = slip.w.clone();
                self.factor.solve_in_place(&mut column);
                column
            })
            .collect();
        let coupled = DMatrix::from_fn(n, n, |i, j| {
            f64::from(u8::from(i == j)) + dot(&self.slips[i].v, &columns[j])
        });
        let right = DVector::from_fn(n, |i, _| dot(&self.slips[i].v, solved));
        let Some(shares) = coupled.lu().solve(&right) else {
            return;
        };
        for (column, share) in columns.iter().zip(shares.iter()) {
            for (x, z) in solved.iter_mut().zip(column) {
                *x -= share * z;
            }
        }
    }

    /// Newton step from the current residual and factor, into `step` and `nodal_step`; returns its slope `r·dx` (J).
    ///
    /// Slips against friction are left out where they would make it lead uphill.
    pub(super) fn newton_step(&mut self) -> f64 {
        let mut step = std::mem::take(&mut self.step);
        step.copy_from_slice(&self.response.residual);
        self.factor.solve_in_place(&mut step);
        let slope = |step: &[f64], run: &Self| step.iter().zip(&run.response.residual).map(|(u, r)| u * r).sum::<f64>();
        if !self.slips.is_empty() {
            let without = step.clone();
            self.add_slips(&mut step);
            let downhill = slope(&step, self) > 0.0;
            if !downhill {
                step = without;
            }
        }
        self.structure.dofs().nodal_into(&step, &mut self.nodal_step);
        let slope = slope(&step, self);
        self.step = step;
        slope
    }

    /// Response at the given positions, into `response`.
    pub(super) fn respond(&mut self, loading: &Loading, positions: &[Vector3<f64>]) {
        self.structure.response_into(loading, positions, &mut self.response);
    }

    /// Tells the observer of the state in `response` and keeps the report.
    pub(super) fn report(&mut self, way: Way, loading: &Loading, step_length: f64) -> ControlFlow<Termination> {
        let report = self.report_of(way, loading, step_length);
        self.history.push(report);
        self.tell(&report)
    }

    /// Tells the observer only.
    pub(super) fn tell(&mut self, report: &IterationReport) -> ControlFlow<Termination> {
        self.iteration += 1;
        match (self.observe)(report) {
            ControlFlow::Continue(()) => ControlFlow::Continue(()),
            ControlFlow::Break(()) => ControlFlow::Break(Termination::Cancelled),
        }
    }

    pub(super) fn report_of(&self, way: Way, loading: &Loading, step_length: f64) -> IterationReport {
        let (residual, worst_node) = self.response.largest_residual(self.structure);
        IterationReport {
            way,
            load_step: self.load_step,
            load_factor: self.load_factor,
            iteration: self.iteration,
            residual,
            worst_node,
            strain_energy: self.response.strain_energy(loading),
            slack: self.response.n_slack(loading),
            step_length,
        }
    }
}
