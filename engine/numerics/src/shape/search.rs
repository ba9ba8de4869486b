//! Positions that balance given force densities, elastic members of given length and loads that depend on lengths and areas.
//!
//! ```text
//! r(x) = p(x) − Σ f_e − S (x − rest) = 0
//! f_e = q_e d_e                       force density q, given or for the time being
//! f_e = T(l_e) n_e                    member of given unstressed length
//! f_e = N_e n_e                       member left to balance, N as last found
//! p   = p0 + ½ Σ (w L0 + v plan) + Σ (u A)_corner    L0 = l / (1 + N/EA), plan = length in the x-y plane,
//!                                     A = area of a panel, or its area on plan
//! ```
//!
//! The matrix `K` of the forces is symmetric; the part `P` of loads that depend on lengths is not, and small. Systems
//! in `K − P` are solved by a Krylov iteration that `K`, factorised, preconditions.

use std::ops::ControlFlow;

use nalgebra::{Matrix3, Vector3};

use super::ShapeError;
use super::loads::ShapeLoads;
use super::parts::{Part, Parts, Slide};
use super::rows::Rows;
use super::sensitivity::Side;
use crate::assembly::Structure;
use crate::element::axial_block;
use crate::equilibrium::linear::Factor;
use crate::equilibrium::{Analysis, IterationReport, Termination, Way, existence};
use crate::model::{AxialLaw, Net, NodeId};

/// A call for each iteration; it may ask to stop.
pub(super) type Observer<'a> = dyn FnMut(&IterationReport) -> ControlFlow<()> + 'a;

/// Largest residual over the largest force at which positions count as balanced.
const BALANCED: f64 = 1e-14;
/// The same where rounding forbids more.
const BALANCED_BUT_FOR_ROUNDING: f64 = 1e-11;
const MAX_ITERATIONS: u32 = 300;
const MAX_EVALUATIONS: u32 = 40;
/// Stiffness left to slack ropes, over the largest in the net, so that a slack rope does not make the matrix singular.
const SLACK_STIFFNESS: f64 = 1e-10;

/// Pivot over the largest stiffness in the net at which compression cancels tension.
const CANCELS: f64 = 1e-12;

/// The net at some positions.
#[derive(Clone, Debug)]
pub(super) struct Point {
    pub(super) positions: Vec<Vector3<f64>>,
    pub(super) chords: Vec<Vector3<f64>>,
    pub(super) lengths: Vec<f64>,
    /// Axial force (N).
    pub(super) axial_forces: Vec<f64>,
    /// Unstressed lengths by segment (m).
    pub(super) unstressed: Vec<f64>,
    /// Loads less forces of members and elastic supports (N).
    pub(super) out_of_balance: Vec<Vector3<f64>>,
    /// Change of the tension of each reach that slides with the length of each of its segments (N/m).
    pub(super) slide_slopes: Vec<Vec<f64>>,
    residual: Vec<f64>,
    worst: (f64, Option<NodeId>),
    pub(super) largest_force: f64,
}

/// The search and its room.
pub(super) struct Search<'a, 'o> {
    pub(super) structure: &'a Structure,
    pub(super) parts: &'a Parts,
    pub(super) loads: &'a ShapeLoads,
    /// Axial forces of the members left to balance (N), as last found; zero elsewhere.
    pub(super) balance_forces: Vec<f64>,
    /// Factorisations so far.
    pub(super) iterations: u32,
    pub(super) factor: Factor,
    pub(super) values: Vec<f64>,
    /// Targets beside wanted tensions.
    pub(super) rows: Rows,
    /// An equation that is left out for the time being.
    pub(super) dropped: Option<usize>,
    /// Densities of the families (N/m) whose stiffness is factorised, where nothing else decides the stiffness.
    factorised_for: Option<Vec<f64>>,
    observe: &'o mut Observer<'o>,
}

impl<'a, 'o> Search<'a, 'o> {
    /// `analysis`: of the net with the nodes to be held kept in place.
    pub(super) fn new(
        analysis: &'a Analysis,
        parts: &'a Parts,
        loads: &'a ShapeLoads,
        observe: &'o mut Observer<'o>,
    ) -> Self {
        let structure = analysis.structure();
        Self {
            structure,
            parts,
            loads,
            balance_forces: vec![0.0; structure.net().segments().len()],
            iterations: 0,
            factor: analysis.new_factor(),
            values: vec![0.0; structure.pattern().n_entries()],
            rows: Rows::default(),
            dropped: None,
            factorised_for: None,
            observe,
        }
    }

    pub(super) fn net(&self) -> &'a Net {
        self.structure.net()
    }

    /// The force density of a segment, if it has one.
    fn density(&self, segment: usize, family_densities: &[f64]) -> Option<f64> {
        match self.parts.of[segment] {
            Part::Density(q) => Some(q),
            Part::Family(family) => Some(family_densities[family]),
            Part::Elastic(_) | Part::Balance => None,
        }
    }

    /// The net at given positions and densities of the families (N/m).
    pub(super) fn point(&self, positions: Vec<Vector3<f64>>, family_densities: &[f64]) -> Point {
        let net = self.net();
        let n_segments = net.segments().len();
        let mut point = Point {
            chords: Vec::with_capacity(n_segments),
            lengths: Vec::with_capacity(n_segments),
            axial_forces: Vec::with_capacity(n_segments),
            unstressed: Vec::with_capacity(n_segments),
            out_of_balance: self.loads.nodal.clone(),
            slide_slopes: Vec::new(),
            residual: vec![0.0; self.structure.n_dofs()],
            worst: (0.0, None),
            largest_force: self.loads.nodal.iter().fold(0.0, |m: f64, p| m.max(p.amax())),
            positions,
        };
        let slides = self.slide_tensions(&mut point, family_densities);
        for (index, segment) in net.segments().iter().enumerate() {
            let [i, j] = segment.ends.map(NodeId::index);
            let chord = point.positions[j] - point.positions[i];
            let length = chord.norm();
            // Where both ends coincide there is no direction to pull in.
            let pull = |axial: f64| {
                if length > 0.0 {
                    chord * (axial / length)
                } else {
                    Vector3::zeros()
                }
            };
            let (axial, unstressed, force) = match self.parts.of[index] {
                _ if self.parts.slide(index).is_some() => {
                    let axial = slides[self.parts.slide(index).expect("it slides")];
                    let force = pull(axial);
                    (
                        axial,
                        unstressed_length(length, axial, segment.section.axial_stiffness),
                        force,
                    )
                }
                Part::Elastic(bar) => {
                    let axial = bar.axial_force(length);
                    let force = pull(axial);
                    (axial, bar.stress_free_length, force)
                }
                Part::Balance => {
                    let axial = self.balance_forces[index];
                    let force = pull(axial);
                    (
                        axial,
                        unstressed_length(length, axial, segment.section.axial_stiffness),
                        force,
                    )
                }
                Part::Density(_) | Part::Family(_) => {
                    let q = self.density(index, family_densities).expect("a part with a density");
                    let axial = q * length;
                    (
                        axial,
                        unstressed_length(length, axial, segment.section.axial_stiffness),
                        chord * q,
                    )
                }
            };
            let load = 0.5
                * (self.loads.per_length[index] * unstressed + self.loads.per_plan_length[index] * chord.xy().norm());
            point.out_of_balance[i] += force + load;
            point.out_of_balance[j] += load - force;
            point.largest_force = point.largest_force.max(axial.abs()).max(load.amax());
            point.chords.push(chord);
            point.lengths.push(length);
            point.axial_forces.push(axial);
            point.unstressed.push(unstressed);
        }
        self.loads.add_on_panels(net, &mut point);
        for elastic in net.elastic_supports() {
            for (row, node) in elastic.nodes().iter().enumerate() {
                let force: Vector3<f64> = (elastic.nodes().iter().zip(elastic.rest()).enumerate())
                    .map(|(column, (other, rest))| elastic.block(row, column) * (point.positions[other.index()] - rest))
                    .sum();
                point.out_of_balance[node.index()] -= force;
                point.largest_force = point.largest_force.max(force.amax());
            }
        }
        let dofs = self.structure.dofs();
        dofs.components_into(&point.out_of_balance, &mut point.residual);
        for (dof, r) in point.residual.iter().enumerate() {
            if !r.is_finite() {
                point.worst = (f64::INFINITY, Some(dofs.node(dof)));
                break;
            }
            if r.abs() > point.worst.0 {
                point.worst = (r.abs(), Some(dofs.node(dof)));
            }
        }
        point
    }

    /// Tension of each reach that slides (N); notes how it changes with the lengths of its segments.
    ///
    /// A force density is tension over the mean length of the segments that count.
    fn slide_tensions(&self, point: &mut Point, family_densities: &[f64]) -> Vec<f64> {
        let one = |slide: &Slide| {
            let lengths: Vec<f64> = (self.net().segments()[slide.segments.clone()].iter())
                .map(|s| {
                    let [i, j] = s.ends.map(NodeId::index);
                    (point.positions[j] - point.positions[i]).norm()
                })
                .collect();
            let counted = || slide.counts.iter().filter(|counts| **counts).count() as f64;
            let first = slide.segments.start;
            let mut slopes = vec![0.0; lengths.len()];
            let tension = match (&slide.elastic, self.density(first, family_densities)) {
                (Some(rope), _) => {
                    let tension = rope.tension(&lengths);
                    if tension > 0.0 {
                        rope.slopes_into(&lengths, tension, &mut slopes);
                    }
                    tension
                }
                (None, Some(q)) => {
                    let n = counted();
                    let mut whole = 0.0;
                    for ((slope, length), _) in slopes.iter_mut().zip(&lengths).zip(&slide.counts).filter(|(_, c)| **c)
                    {
                        *slope = q / n;
                        whole += length;
                    }
                    q * whole / n
                }
                (None, None) => self.balance_forces[first],
            };
            (tension, slopes)
        };
        let (tensions, slopes) = self.parts.slides.iter().map(one).unzip();
        point.slide_slopes = slopes;
        tensions
    }

    /// Factorises the stiffness at a point. `floor`: least force across a member of given length (N).
    ///
    /// Without members of given length the densities alone decide it: what is factorised for them already, stays.
    pub(super) fn factorise(&mut self, point: &Point, family_densities: &[f64], floor: f64) -> Result<(), ShapeError> {
        if self.factorised_for.as_deref() == Some(family_densities) {
            return Ok(());
        }
        self.factorised_for = None;
        self.iterations += 1;
        let n_segments = self.net().segments().len();
        let mut blocks = vec![Matrix3::zeros(); n_segments];
        let mut largest: f64 = 0.0;
        let mut definite = true;
        for (index, block) in blocks.iter_mut().enumerate() {
            match self.parts.of[index] {
                Part::Balance => {}
                _ if self.parts.slide(index).is_some() => {
                    let (length, axial) = (point.lengths[index], point.axial_forces[index]);
                    if length == 0.0 {
                        continue;
                    }
                    definite &= axial >= 0.0;
                    let is_elastic = matches!(self.parts.of[index], Part::Elastic(_));
                    let across = if is_elastic { axial.max(floor) } else { axial } / length;
                    largest = largest.max(across);
                    // What its stretch resists is added below. Where the rope is straight that is nothing, so that on the
                    // way there is a little, which ends with the residual; a slack rope is held like one across.
                    let along = if is_elastic && axial == 0.0 {
                        across
                    } else {
                        across.min(floor / length)
                    };
                    *block = axial_block(along, across, &(point.chords[index] / length));
                }
                Part::Elastic(bar) => {
                    let length = point.lengths[index];
                    if length == 0.0 {
                        continue;
                    }
                    let axial = point.axial_forces[index];
                    definite &= axial >= 0.0;
                    let across = if bar.law == AxialLaw::TensionOnly {
                        axial.max(floor) / length.max(bar.stress_free_length)
                    } else {
                        axial / length
                    };
                    let along = if bar.is_taut(length) { bar.stiffness } else { across };
                    largest = largest.max(along);
                    *block = axial_block(along, across, &(point.chords[index] / length));
                }
                Part::Density(_) | Part::Family(_) => {
                    let q = self.density(index, family_densities).expect("a part with a density");
                    definite &= q >= 0.0;
                    largest = largest.max(q.abs());
                    *block = Matrix3::from_diagonal_element(q);
                }
            }
        }
        for (block, part) in blocks.iter_mut().zip(&self.parts.of) {
            if matches!(part, Part::Elastic(_)) {
                *block += Matrix3::from_diagonal_element(SLACK_STIFFNESS * largest);
            }
        }
        self.structure.tangent_into(&blocks, &mut self.values);
        self.structure.add_elastic_supports(&mut self.values);
        for (slide, slopes) in self.parts.slides.iter().zip(&point.slide_slopes) {
            let (ones, first) = (vec![1.0; slopes.len()], slide.segments.start);
            let (chords, lengths) = (&point.chords, &point.lengths);
            let values = &mut self.values;
            self.structure
                .add_stretch(first, &ones, slopes, chords, lengths, values);
        }
        let mut cancels = false;
        let outcome = if definite {
            self.factor.cholesky(&self.values)
        } else {
            // Without pivoting, a pivot that all but vanishes leaves no digits: compression cancels the tension there.
            self.factor.ldlt(&self.values).map(|inertia| {
                cancels = inertia.smallest.abs() <= CANCELS * largest;
            })
        };
        outcome.map_err(|error| match error {
            crate::equilibrium::linear::FactorError::Pivot { dof } => ShapeError::Singular {
                nodes: vec![self.net().node_name(self.structure.dofs().node(dof)).to_owned()],
            },
            crate::equilibrium::linear::FactorError::NotFinite => self.unbounded(point),
        })?;
        if cancels {
            let mut movement = vec![1.0; self.structure.n_dofs()];
            self.factor.solve_in_place(&mut movement);
            return Err(self.singular(&movement));
        }
        let by_densities = !self.parts.of.iter().any(|part| matches!(part, Part::Elastic(_)));
        if by_densities && self.parts.slides.is_empty() {
            self.factorised_for = Some(family_densities.to_vec());
        }
        Ok(())
    }

    fn unbounded(&self, point: &Point) -> ShapeError {
        let node = point.worst.1.unwrap_or(NodeId::new(0));
        ShapeError::Unbounded {
            node: self.net().node_name(node).to_owned(),
        }
    }

    /// Positions at balance, from `start`, at given densities of the families (N/m).
    pub(super) fn balanced(&mut self, start: Vec<Vector3<f64>>, family_densities: &[f64]) -> Result<Point, ShapeError> {
        let mut point = self.point(start, family_densities);
        let mut step = 0.0;
        for iteration in 0..MAX_ITERATIONS {
            self.report(&point, iteration, step)?;
            if !point.worst.0.is_finite() {
                return Err(self.unbounded(&point));
            }
            let allowed = self.allowed(&point, family_densities);
            if point.worst.0 <= allowed {
                return Ok(point);
            }
            self.factorise(&point, family_densities, point.worst.0)?;
            let movement = self.solve(&point, point.residual.clone(), Side::Plain);
            if movement.iter().any(|m| !m.is_finite()) {
                return Err(self.singular(&movement));
            }
            let (next, taken) = self.line_search(&point, &movement, family_densities);
            let stuck = next.worst.0 > 0.5 * point.worst.0 || taken == 0.0;
            if stuck && point.worst.0 <= BALANCED_BUT_FOR_ROUNDING * point.largest_force {
                return Ok(if next.worst.0 < point.worst.0 { next } else { point });
            }
            if taken == 0.0 {
                return Err(self.not_converged(&point, Termination::StepTooSmall));
            }
            (point, step) = (next, taken);
        }
        Err(self.not_converged(&point, Termination::IterationLimit))
    }

    /// Largest residual that counts as balance: the rounding of forces and of stiffness times coordinates.
    fn allowed(&self, point: &Point, family_densities: &[f64]) -> f64 {
        let stiffest = (0..self.parts.of.len())
            .map(|e| match self.parts.of[e] {
                Part::Elastic(bar) if self.parts.slide(e).is_none() && bar.is_taut(point.lengths[e]) => bar.stiffness,
                _ if self.parts.slide(e).is_some() => self.slide_stiffness(point, e),
                _ => self.density(e, family_densities).unwrap_or(0.0).abs(),
            })
            .fold(0.0, f64::max);
        let size = point.positions.iter().fold(0.0, |m: f64, x| m.max(x.amax()));
        (BALANCED * point.largest_force).max(2.0 * f64::EPSILON * stiffest * size)
    }

    /// The largest stiffness in the reach of a segment that slides (N/m).
    fn slide_stiffness(&self, point: &Point, segment: usize) -> f64 {
        let slopes = self.parts.slide(segment).map(|slide| &point.slide_slopes[slide]);
        let across = point.axial_forces[segment].abs() / point.lengths[segment].max(f64::MIN_POSITIVE);
        slopes.map_or(0.0, |slopes| slopes.iter().fold(across, |m: f64, k| m.max(*k)))
    }

    /// The step along `movement` at which the residual no longer points along it, and its length.
    ///
    /// With given force densities alone the equations are linear and the full step ends them.
    fn line_search(&self, point: &Point, movement: &[f64], family_densities: &[f64]) -> (Point, f64) {
        let slope = |p: &Point| -> f64 { p.residual.iter().zip(movement).map(|(r, m)| r * m).sum() };
        let size = |p: &Point| p.residual.iter().map(|r| r * r).sum::<f64>().sqrt();
        let at = |t: f64| {
            let mut positions = point.positions.clone();
            self.structure.dofs().move_nodes(movement, t, &mut positions);
            self.point(positions, family_densities)
        };
        let (start_slope, start_size) = (slope(point), size(point));
        let (mut low, mut low_slope, mut high) = (0.0, start_slope, f64::INFINITY);
        let mut high_slope = 0.0;
        let mut t = 1.0;
        for evaluation in 0..MAX_EVALUATIONS {
            let trial = at(t);
            let trial_slope = slope(&trial);
            if size(&trial) <= (1.0 - 1e-4 * t) * start_size || trial_slope.abs() <= 0.3 * start_slope.abs() {
                return (trial, t);
            }
            if trial_slope * start_slope > 0.0 && trial_slope.is_finite() {
                (low, low_slope) = (t, trial_slope);
            } else {
                (high, high_slope) = (t, trial_slope);
            }
            t = if high.is_finite() {
                // Secant on the slope, kept off the ends of the bracket; every other time its middle, since the slope
                // jumps where a rope comes taut.
                let secant = low + (high - low) * low_slope / (low_slope - high_slope);
                let (near, far) = (low + 0.1 * (high - low), high - 0.1 * (high - low));
                if secant.is_finite() && evaluation % 2 == 0 {
                    secant.clamp(near, far)
                } else {
                    0.5 * (low + high)
                }
            } else {
                2.0 * t
            };
        }
        // Up to `low` the slope kept its sign: there the energy is less than at the start.
        if low > 0.0 {
            (at(low), low)
        } else {
            (point.clone(), 0.0)
        }
    }

    fn report(&mut self, point: &Point, iteration: u32, step_length: f64) -> Result<(), ShapeError> {
        let energy = |e: usize| 0.5 * point.axial_forces[e] * (point.lengths[e] - point.unstressed[e]);
        let slack = |e: &usize| match self.parts.of[*e] {
            Part::Elastic(_) if self.parts.slide(*e).is_some() => point.axial_forces[*e] == 0.0,
            Part::Elastic(bar) => !bar.is_taut(point.lengths[*e]),
            _ => false,
        };
        let n_segments = point.lengths.len();
        let report = IterationReport {
            way: Way::ForceDensities,
            load_step: 1,
            load_factor: 1.0,
            iteration,
            residual: point.worst.0,
            worst_node: point.worst.1,
            strain_energy: (0..n_segments).map(energy).sum(),
            slack: (0..n_segments).filter(slack).count(),
            step_length,
        };
        match (self.observe)(&report) {
            ControlFlow::Continue(()) => Ok(()),
            ControlFlow::Break(()) => Err(ShapeError::Cancelled),
        }
    }

    fn not_converged(&self, point: &Point, termination: Termination) -> ShapeError {
        ShapeError::NotConverged {
            iterations: self.iterations,
            residual: point.worst.0,
            node: self.net().node_name(point.worst.1.unwrap_or(NodeId::new(0))).to_owned(),
            termination,
        }
    }

    fn singular(&self, movement: &[f64]) -> ShapeError {
        let mut nodal = vec![Vector3::zeros(); self.net().nodes().len()];
        self.structure.dofs().nodal_into(movement, &mut nodal);
        let mut order: Vec<usize> = (0..nodal.len()).filter(|n| nodal[*n].norm() != 0.0).collect();
        let size = |n: usize| {
            if nodal[n].norm().is_nan() {
                f64::INFINITY
            } else {
                nodal[n].norm()
            }
        };
        order.sort_by(|a, b| size(*b).total_cmp(&size(*a)));
        ShapeError::Singular {
            nodes: order
                .iter()
                .take(6)
                .map(|n| self.net().nodes()[*n].name.clone())
                .collect(),
        }
    }

    /// Refuses a net of which a part is led to too little support by members with force, or with a given length.
    pub(super) fn check_held(&self) -> Result<(), ShapeError> {
        let free = existence::loose_nodes(self.structure, |e| match self.parts.of[e] {
            Part::Density(q) => q != 0.0,
            Part::Family(_) | Part::Elastic(_) => true,
            Part::Balance => false,
        });
        if free.is_empty() {
            return Ok(());
        }
        Err(ShapeError::NotHeld {
            nodes: free.iter().map(|n| self.net().node_name(*n).to_owned()).collect(),
        })
    }
}

/// `L0 = l / (1 + N/EA)`; where a strut would be crushed to less than a tenth, that of a tenth: the end of the search
/// tells it apart.
fn unstressed_length(length: f64, axial_force: f64, axial_stiffness: f64) -> f64 {
    length / (1.0 + axial_force / axial_stiffness).max(0.1)
}
