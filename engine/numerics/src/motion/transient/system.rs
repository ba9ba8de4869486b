//! The net in motion as the schemes see it: masses, loads at a time, forces, stiffness.

use std::collections::BTreeSet;
use std::sync::Arc;

use nalgebra::{Matrix3, Vector3};

use super::check::moves_supports;
use super::history::Side;
use super::inertia::Inertia;
use super::{Driven, Motion, MotionError};
use crate::assembly::{Loading, Structure};
use crate::element::{Bar, axial_block};
use crate::load::Case;
use crate::model::{AxialLaw, NodeId, Segment};
use crate::motion::About;
use crate::motion::mass::Masses;

/// Loads at one moment.
#[derive(Clone, Debug)]
pub(super) struct Loads {
    /// Driven dead force on every node (N), without what acts throughout.
    pub(super) driven: Vec<Vector3<f64>>,
    /// Pressure on every panel (Pa), without that of wind; empty: none.
    pressures: Vec<f64>,
    /// Speed of every wind (m/s).
    winds: Vec<f64>,
    /// Movement of every supported node (m).
    pub(super) movements: Vec<Vector3<f64>>,
}

impl Loads {
    /// The mean of two moments.
    pub(super) fn mean(&self, other: &Self) -> Self {
        let vectors = |a: &[Vector3<f64>], b: &[Vector3<f64>]| a.iter().zip(b).map(|(a, b)| (a + b) * 0.5).collect();
        let numbers = |a: &[f64], b: &[f64]| a.iter().zip(b).map(|(a, b)| (a + b) * 0.5).collect();
        Self {
            driven: vectors(&self.driven, &other.driven),
            pressures: numbers(&self.pressures, &other.pressures),
            winds: numbers(&self.winds, &other.winds),
            movements: vectors(&self.movements, &other.movements),
        }
    }
}

/// A moving state.
#[derive(Clone, Debug)]
pub(super) struct State {
    /// Position of every node (m).
    pub(super) positions: Vec<Vector3<f64>>,
    /// Velocity along every free direction (m/s).
    pub(super) velocities: Vec<f64>,
    /// Acceleration along every free direction (m/s²).
    pub(super) accelerations: Vec<f64>,
    /// Velocity of every node along held directions (m/s).
    pub(super) held_velocities: Vec<Vector3<f64>>,
}

/// Forces at one state, or in the middle of a step.
#[derive(Clone, Debug)]
pub(super) struct Forces {
    /// External minus internal force on every node (N), inertia left out, damping let in.
    pub(super) out_of_balance: Vec<Vector3<f64>>,
    /// Driven dead force, pressure and wind on every node (N).
    pub(super) applied: Vec<Vector3<f64>>,
    /// Force of every elastic support on its nodes (N).
    elastic: Vec<Vector3<f64>>,
    /// Components of the out-of-balance force along the free directions (N).
    pub(super) residual: Vec<f64>,
    /// Power that damping takes (W); in the middle of a step, the mean.
    pub(super) damping_power: f64,
    /// Largest axial force by size (N).
    pub(super) largest_axial: f64,
}

/// All that is known of a moment.
#[derive(Clone, Copy, Debug)]
pub(super) struct Moment<'a> {
    /// Time (s).
    pub(super) time: f64,
    pub(super) state: &'a State,
    pub(super) forces: &'a Forces,
    /// What the forces make of the masses, along every free direction (m/s²).
    pub(super) accelerations: &'a [f64],
}

/// Elastic and other energies of a state (J).
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Energies {
    pub(super) kinetic: f64,
    pub(super) elastic: f64,
    pub(super) potential: f64,
}

/// The net in motion.
#[derive(Debug)]
pub(super) struct System {
    pub(super) structure: Arc<Structure>,
    pub(super) motion: Arc<Motion>,
    /// What acts throughout; its support movements are those of the present.
    loading: Loading,
    pub(super) inertia: Inertia,
    /// Share of every segment's force that still acts: 1 whole, 0 broken.
    pub(super) shares: Vec<f64>,
    /// Ends of every segment.
    ends: Vec<[usize; 2]>,
    /// Entries of the stiffness of elastic supports.
    elastic_entries: Vec<f64>,
    /// Entries of the damping matrix `b K`, and its block of every segment; empty: none.
    damping_entries: Vec<f64>,
    damping_blocks: Vec<Matrix3<f64>>,
    /// Nodes with a support, rigid or elastic, in rising order.
    supported: Vec<NodeId>,
    /// Segments at each of them.
    at_supports: Vec<Vec<usize>>,
    /// Whether supports move.
    pub(super) supports_move: bool,
    start: Vec<Vector3<f64>>,
}

/// The case of a driven load, if it is one.
pub(super) fn driven_case(driven: &Driven) -> Option<&Case> {
    match driven {
        Driven::Case { case, .. } => Some(case),
        Driven::Wind { .. } => None,
    }
}

impl System {
    /// Puts a motion on a net.
    ///
    /// # Errors
    /// What [`Loading::new`] finds.
    pub(super) fn new(structure: Arc<Structure>, motion: Arc<Motion>) -> Result<Self, MotionError> {
        let net = structure.net();
        // Pressure follows the moving panels and is added moment by moment.
        let case = Case {
            pressures: Vec::new(),
            ..motion.case.clone()
        };
        let loading = Loading::new(&structure, &case, &motion.case.unstressed_lengths, 1.0)?;
        let of_segment = |segment: &Segment| motion.case.unstressed_lengths[segment.length];
        let lying: Vec<f64> = net.segments().iter().map(of_segment).collect();
        let about = About {
            case: &motion.case,
            positions: &motion.positions,
            reference: &motion.reference.positions,
            axial_forces: &[],
            lying: &lying,
        };
        let inertia = Inertia::new(&structure, Masses::new(&structure, &motion.masses, &about));
        let rigid = net.supports().iter().filter(|support| !support.held().is_empty());
        let elastic = net.elastic_supports().iter().flat_map(|elastic| elastic.nodes());
        let supported: BTreeSet<NodeId> = rigid.map(|support| support.node()).chain(elastic.copied()).collect();
        let at_supports = (supported.iter())
            .map(|node| {
                let segments = net.segments().iter().enumerate();
                let at_node = segments.filter(|(_, segment)| segment.ends.contains(node));
                at_node.map(|(e, _)| e).collect()
            })
            .collect();
        let mut elastic_entries = vec![0.0; structure.pattern().n_entries()];
        structure.add_elastic_supports(&mut elastic_entries);
        let mut system = Self {
            inertia,
            shares: vec![1.0; net.segments().len()],
            ends: net.segments().iter().map(|s| s.ends.map(NodeId::index)).collect(),
            elastic_entries,
            damping_entries: Vec::new(),
            damping_blocks: Vec::new(),
            supported: supported.into_iter().collect(),
            at_supports,
            supports_move: motion.driven.iter().filter_map(driven_case).any(moves_supports),
            start: motion.positions.clone(),
            loading,
            structure,
            motion,
        };
        system.damp_by_stiffness();
        Ok(system)
    }

    /// Works out `b K` with the tangent `K` at the start.
    fn damp_by_stiffness(&mut self) {
        let share = self.motion.damping.stiffness;
        if share == 0.0 {
            return;
        }
        let mut entries = vec![0.0; self.structure.pattern().n_entries()];
        let mut blocks: Vec<_> = (0..self.ends.len())
            .map(|e| self.bars()[e].stiffness_block(&self.chord(&self.start, e)))
            .collect();
        self.structure.tangent_into(&blocks, &mut entries);
        self.structure.add_elastic_supports(&mut entries);
        entries.iter_mut().for_each(|entry| *entry *= share);
        blocks.iter_mut().for_each(|block| *block *= share);
        self.damping_entries = entries;
        self.damping_blocks = blocks;
    }

    /// Whether a driven load moves the support of a node.
    pub(super) fn moves(&self, node: NodeId) -> bool {
        let mut cases = self.motion.driven.iter().filter_map(driven_case);
        cases.any(|case| case.support_movements[node.index()] != Vector3::zeros())
    }

    pub(super) fn bars(&self) -> &[Bar] {
        &self.loading.bars
    }

    fn chord(&self, positions: &[Vector3<f64>], segment: usize) -> Vector3<f64> {
        let [i, j] = self.ends[segment];
        positions[j] - positions[i]
    }

    pub(super) fn length(&self, positions: &[Vector3<f64>], segment: usize) -> f64 {
        self.chord(positions, segment).norm()
    }

    /// Axial force that a segment exerts (N).
    pub(super) fn axial_force(&self, positions: &[Vector3<f64>], segment: usize) -> f64 {
        self.shares[segment] * self.bars()[segment].axial_force(self.length(positions, segment))
    }

    /// Node of a free direction; the first of all where nothing can move.
    pub(super) fn node_of(&self, dof: usize) -> NodeId {
        let dofs = self.structure.dofs();
        if dofs.is_empty() {
            NodeId::new(0)
        } else {
            dofs.node(dof)
        }
    }

    /// Loads at a time (s), at a jump those on one side of it.
    pub(super) fn loads_at(&self, time: f64, side: Side) -> Loads {
        let net = self.structure.net();
        let base = &self.motion.case;
        let mut loads = Loads {
            driven: vec![Vector3::zeros(); net.nodes().len()],
            pressures: base.pressures.clone(),
            winds: Vec::new(),
            movements: base.support_movements.clone(),
        };
        for driven in &self.motion.driven {
            match driven {
                Driven::Case { case, history } => {
                    let factor = history.value(time, side);
                    if factor == 0.0 {
                        continue;
                    }
                    for (sum, force) in loads.driven.iter_mut().zip(&case.nodal_forces) {
                        *sum += factor * force;
                    }
                    for (sum, movement) in loads.movements.iter_mut().zip(&case.support_movements) {
                        *sum += factor * movement;
                    }
                    if !case.pressures.is_empty() {
                        loads.pressures.resize(net.panels().len(), 0.0);
                        for (sum, pressure) in loads.pressures.iter_mut().zip(&case.pressures) {
                            *sum += factor * pressure;
                        }
                    }
                }
                Driven::Wind { speed, .. } => loads.winds.push(speed.value(time, side)),
            }
        }
        // A case without pressure on one side of a jump still needs a list as long as that on the other.
        if self
            .motion
            .driven
            .iter()
            .filter_map(driven_case)
            .any(|c| !c.pressures.is_empty())
        {
            loads.pressures.resize(net.panels().len(), 0.0);
        }
        loads
    }

    /// Puts held nodes where their supports are.
    pub(super) fn place_supports(&mut self, loads: &Loads, positions: &mut [Vector3<f64>]) {
        self.loading.support_movements.copy_from_slice(&loads.movements);
        self.loading.place_supports(&self.structure, positions);
    }

    /// Velocity of every node along held directions (m/s), that of its support; at a kink that on one side of it.
    pub(super) fn support_velocities(&self, time: f64, side: Side) -> Vec<Vector3<f64>> {
        let mut held = vec![Vector3::zeros(); self.start.len()];
        for driven in &self.motion.driven {
            if let Driven::Case { case, history } = driven {
                let rate = history.first_derivative(time, side);
                for support in self.structure.net().supports() {
                    let node = support.node().index();
                    held[node] += support.held_part(&case.support_movements[node]) * rate;
                }
            }
        }
        held
    }

    /// Velocity of every node (m/s).
    pub(super) fn nodal_velocities(&self, along_free: &[f64], held: &[Vector3<f64>]) -> Vec<Vector3<f64>> {
        let mut nodal = held.to_vec();
        self.structure.dofs().move_nodes(along_free, 1.0, &mut nodal);
        nodal
    }

    /// Velocity of one node (m/s).
    pub(super) fn velocity(&self, node: NodeId, state: &State) -> Vector3<f64> {
        state.held_velocities[node.index()] + self.along_free(node, &state.velocities)
    }

    /// Acceleration of one node (m/s²).
    pub(super) fn acceleration(&self, node: NodeId, moment: &Moment<'_>) -> Vector3<f64> {
        let mut acceleration = self.along_free(node, moment.accelerations);
        if let Some(support) = self.structure.net().support_of(node).filter(|_| self.supports_move) {
            for driven in &self.motion.driven {
                if let Driven::Case { case, history } = driven {
                    let movement = case.support_movements[node.index()];
                    acceleration += support.held_part(&movement) * history.second_derivative(moment.time);
                }
            }
        }
        acceleration
    }

    /// Vector of one node from components along the free directions.
    fn along_free(&self, node: NodeId, components: &[f64]) -> Vector3<f64> {
        let dofs = self.structure.dofs();
        let own = &components[dofs.first(node)..];
        dofs.directions(node).iter().zip(own).map(|(d, c)| d * *c).sum()
    }

    /// Nodes with a support, rigid or elastic, in rising order.
    pub(super) fn supported(&self) -> &[NodeId] {
        &self.supported
    }

    /// Force of the support of a node on the net (N); zero where it has none.
    ///
    /// ```text
    /// elastic   −S (x − rest − movement) − b S v
    /// rigid     along held directions:  M (a + α v) + b K v − (all other forces)
    /// ```
    pub(super) fn support_force(&self, node: NodeId, moment: &Moment<'_>) -> Vector3<f64> {
        let Ok(place) = self.supported.binary_search(&node) else {
            return Vector3::zeros();
        };
        let net = self.structure.net();
        let share = self.motion.damping.stiffness;
        let mut elastic = moment.forces.elastic[node.index()];
        if share > 0.0 {
            for support in net.elastic_supports() {
                for row in (0..support.nodes().len()).filter(|row| support.nodes()[*row] == node) {
                    for (column, other) in support.nodes().iter().enumerate() {
                        elastic -= support.block(row, column) * self.velocity(*other, moment.state) * share;
                    }
                }
            }
        }
        let Some(support) = net.support_of(node).filter(|support| !support.held().is_empty()) else {
            return elastic;
        };
        let velocity = self.velocity(node, moment.state);
        let rate = self.acceleration(node, moment) + velocity * self.motion.damping.mass;
        // What damping by stiffness does through elastic supports acts on the node beside what these exert.
        let mut resisted = self.inertia.of_node(node.index()) * rate - moment.forces.out_of_balance[node.index()]
            + (moment.forces.elastic[node.index()] - elastic);
        if share > 0.0 {
            for e in &self.at_supports[place] {
                let [i, j] = self.ends[*e];
                let other = NodeId::new(if i == node.index() { j } else { i });
                resisted += self.damping_blocks[*e] * (velocity - self.velocity(other, moment.state));
            }
        }
        elastic + support.held_part(&resisted)
    }

    /// Part of one vector a node along held directions.
    pub(super) fn held_parts(&self, nodal: &[Vector3<f64>]) -> Vec<Vector3<f64>> {
        let dofs = self.structure.dofs();
        let mut along_free = vec![0.0; dofs.len()];
        dofs.components_into(nodal, &mut along_free);
        let mut held = vec![Vector3::zeros(); nodal.len()];
        for support in self.structure.net().supports() {
            held[support.node().index()] = nodal[support.node().index()];
        }
        for (dof, component) in along_free.iter().enumerate() {
            let node = dofs.node(dof);
            if self.structure.net().support_of(node).is_some() {
                held[node.index()] -= dofs.direction(dof) * *component;
            }
        }
        held
    }

    /// Room for forces.
    pub(super) fn new_forces(&self) -> Forces {
        let nodes = self.start.len();
        Forces {
            out_of_balance: vec![Vector3::zeros(); nodes],
            applied: vec![Vector3::zeros(); nodes],
            elastic: vec![Vector3::zeros(); nodes],
            residual: vec![0.0; self.structure.n_dofs()],
            damping_power: 0.0,
            largest_axial: 0.0,
        }
    }

    /// Forces of everything but bars and dashpots: loads, pressure, elastic supports, damping by mass and stiffness.
    fn begin_forces(
        &mut self,
        loads: &Loads,
        positions: &[Vector3<f64>],
        along_free: &[f64],
        velocities: &[Vector3<f64>],
        forces: &mut Forces,
    ) {
        forces.applied.copy_from_slice(&loads.driven);
        self.add_following(loads, positions, velocities, &mut forces.applied);
        for ((sum, base), applied) in (forces.out_of_balance.iter_mut())
            .zip(&self.loading.nodal_forces)
            .zip(&forces.applied)
        {
            *sum = base + applied;
        }
        if !self.structure.net().elastic_supports().is_empty() {
            self.loading.support_movements.copy_from_slice(&loads.movements);
            forces.elastic.fill(Vector3::zeros());
            self.structure
                .add_elastic_forces(&self.loading, positions, &mut forces.elastic);
            for (sum, elastic) in forces.out_of_balance.iter_mut().zip(&forces.elastic) {
                *sum += elastic;
            }
        }
        forces.damping_power = 0.0;
        forces.largest_axial = 0.0;
        forces.residual.fill(0.0);
        if !self.damping_entries.is_empty() {
            self.structure
                .pattern()
                .product_into(&self.damping_entries, along_free, &mut forces.residual);
        }
        if self.motion.damping.mass > 0.0 {
            self.inertia
                .add_product(self.motion.damping.mass, along_free, &mut forces.residual);
        }
        forces.damping_power = forces.residual.iter().zip(along_free).map(|(f, v)| f * v).sum();
    }

    /// Ends what [`Self::begin_forces`] began: `residual` holds the damping along the free directions so far.
    fn end_forces(&self, forces: &mut Forces) {
        let dofs = self.structure.dofs();
        for (dof, residual) in forces.residual.iter_mut().enumerate() {
            let node = dofs.node(dof).index();
            *residual = dofs.direction(dof).dot(&forces.out_of_balance[node]) - *residual;
        }
    }

    fn add_following(
        &self,
        loads: &Loads,
        positions: &[Vector3<f64>],
        velocities: &[Vector3<f64>],
        forces: &mut [Vector3<f64>],
    ) {
        if !loads.pressures.is_empty() {
            self.structure.add_pressure_forces(&loads.pressures, positions, forces);
        }
        let mut speeds = loads.winds.iter();
        for driven in &self.motion.driven {
            let Driven::Wind {
                coefficients,
                density,
                along,
                ..
            } = driven
            else {
                continue;
            };
            let speed = speeds.next().expect("one speed a wind");
            let pressures: Vec<f64> = (self.structure.net().panels().iter().zip(coefficients))
                .map(|(panel, c)| {
                    let own: Vector3<f64> = panel.corners.iter().map(|n| velocities[n.index()]).sum();
                    let relative = speed - own.dot(along) / panel.corners.len() as f64;
                    0.5 * density * c * relative.abs() * relative
                })
                .collect();
            self.structure.add_pressure_forces(&pressures, positions, forces);
        }
    }

    fn dashpot(&self, segment: usize) -> f64 {
        let given = self.motion.damping.segments.get(segment);
        given.map_or(0.0, |c| c * self.shares[segment])
    }

    /// Forces at a state.
    ///
    /// `was_taut`: whether each segment was taut at the start of the step, so that its dashpot acts. `blocks`: stiffness
    /// and damping of every segment, `K + (damping_weight) c n nᵀ` (N/m), where asked for.
    pub(super) fn forces_at(
        &mut self,
        loads: &Loads,
        state: &State,
        was_taut: &[bool],
        forces: &mut Forces,
        blocks: Option<(&mut [Matrix3<f64>], f64)>,
    ) {
        let velocities = self.nodal_velocities(&state.velocities, &state.held_velocities);
        self.begin_forces(loads, &state.positions, &state.velocities, &velocities, forces);
        let (mut blocks, weight) = blocks.map_or((None, 0.0), |(blocks, weight)| (Some(blocks), weight));
        for e in 0..self.ends.len() {
            let bar = self.loading.bars[e];
            let share = self.shares[e];
            let chord = self.chord(&state.positions, e);
            let length = chord.norm();
            let axial = share * bar.axial_force(length);
            forces.largest_axial = forces.largest_axial.max(axial.abs());
            let [i, j] = self.ends[e];
            let dashpot = if was_taut[e] { self.dashpot(e) } else { 0.0 };
            let mut total = axial;
            let mut acts = false;
            if dashpot > 0.0 && length > 0.0 {
                let rate = chord.dot(&(velocities[j] - velocities[i])) / length;
                total += dashpot * rate;
                acts = true;
                if bar.law == AxialLaw::TensionOnly && total < 0.0 {
                    total = 0.0;
                    acts = false;
                }
                forces.damping_power += (total - axial) * rate;
            }
            if let Some(blocks) = &mut blocks {
                blocks[e] = bar.stiffness_block(&chord) * share;
                if acts {
                    blocks[e] += axial_block(weight * dashpot, 0.0, &(chord / length));
                }
            }
            if total != 0.0 && length > 0.0 {
                let pull = chord * (total / length);
                forces.out_of_balance[i] += pull;
                forces.out_of_balance[j] -= pull;
            }
        }
        self.end_forces(forces);
    }

    /// Forces in the middle of a step from `from` to `to` that lasts `h` (s), such that energy balances.
    ///
    /// ```text
    /// f = q d_m,   q = 2 (W1 − W0) / (l1² − l0²)   by four cases without a limit
    /// ```
    ///
    /// `blocks`: where asked for, the symmetric part of the derivative of `q d_m` by the chord at the end (N/m).
    pub(super) fn forces_between(
        &mut self,
        loads: &Loads,
        [from, to]: [&[Vector3<f64>]; 2],
        h: f64,
        was_taut: &[bool],
        forces: &mut Forces,
        mut blocks: Option<&mut [Matrix3<f64>]>,
    ) {
        let middle: Vec<_> = from.iter().zip(to).map(|(a, b)| (a + b) * 0.5).collect();
        let velocities: Vec<_> = from.iter().zip(to).map(|(a, b)| (b - a) / h).collect();
        let mut along_free = vec![0.0; self.structure.n_dofs()];
        self.structure.dofs().components_into(&velocities, &mut along_free);
        self.begin_forces(loads, &middle, &along_free, &velocities, forces);
        for e in 0..self.ends.len() {
            let bar = self.loading.bars[e];
            let (d0, d1) = (self.chord(from, e), self.chord(to, e));
            let [i, j] = self.ends[e];
            let step = (to[j] - from[j]) - (to[i] - from[i]);
            let mean = (d0 + d1) * 0.5;
            let (l0, l1) = (d0.norm(), d1.norm());
            let quotient = Quotient::new(&bar, l0, l1, 2.0 * mean.dot(&step)).scaled(self.shares[e]);
            let axial = self.shares[e] * bar.axial_force(l1);
            forces.largest_axial = forces.largest_axial.max(axial.abs());
            let dashpot = if was_taut[e] { self.dashpot(e) } else { 0.0 };
            let mean_square = mean.norm_squared();
            let mut density = quotient.density;
            let mut acts = false;
            if dashpot > 0.0 && mean_square > 0.0 {
                let rate = mean.dot(&step) / (mean_square * h);
                density += dashpot * rate;
                acts = true;
                if bar.law == AxialLaw::TensionOnly && density < 0.0 {
                    density = 0.0;
                    acts = false;
                }
                forces.damping_power += (density - quotient.density) * mean.dot(&step) / h;
            }
            if let Some(blocks) = &mut blocks {
                let mut block = Matrix3::from_diagonal_element(0.5 * quotient.density);
                if l1 > 0.0 && quotient.slope != 0.0 {
                    let one_sided = mean * (d1 / l1).transpose() * quotient.slope;
                    block += (one_sided + one_sided.transpose()) * 0.5;
                }
                if acts {
                    block += axial_block(dashpot / h, 0.0, &(mean / mean_square.sqrt()));
                }
                blocks[e] = block;
            }
            if density != 0.0 {
                let pull = mean * density;
                forces.out_of_balance[i] += pull;
                forces.out_of_balance[j] -= pull;
            }
        }
        self.end_forces(forces);
    }

    /// Entries of `mass_weight M + damping_weight C + Σ blocks + elastic_weight S`.
    pub(super) fn matrix_into(
        &self,
        blocks: &[Matrix3<f64>],
        mass_weight: f64,
        damping_weight: f64,
        elastic_weight: f64,
        values: &mut [f64],
    ) {
        self.structure.tangent_into(blocks, values);
        for (value, elastic) in values.iter_mut().zip(&self.elastic_entries) {
            *value += elastic_weight * elastic;
        }
        for (value, damping) in values.iter_mut().zip(&self.damping_entries) {
            *value += damping_weight * damping;
        }
        let weight = mass_weight + damping_weight * self.motion.damping.mass;
        self.inertia.add_to(&self.structure, weight, values);
    }

    /// Which segments bear force at these positions.
    pub(super) fn taut(&self, positions: &[Vector3<f64>]) -> Vec<bool> {
        (0..self.ends.len())
            .map(|e| self.shares[e] > 0.0 && self.bars()[e].is_taut(self.length(positions, e)))
            .collect()
    }

    /// Largest force that acts throughout on a free direction (N).
    pub(super) fn largest_force(&self) -> f64 {
        self.loading.largest_force(&self.structure)
    }

    /// Strain energy of one segment (J), as far as it still acts.
    pub(super) fn segment_energy(&self, positions: &[Vector3<f64>], segment: usize) -> f64 {
        self.shares[segment] * self.bars()[segment].energy(self.length(positions, segment))
    }

    /// Energies of a state under `movements` of the supports (m).
    pub(super) fn energies(&self, state: &State, movements: &[Vector3<f64>]) -> Energies {
        let positions = &state.positions;
        let mut elastic: f64 = (0..self.ends.len()).map(|e| self.segment_energy(positions, e)).sum();
        for support in self.structure.net().elastic_supports() {
            let strain = |place: usize| {
                let node = support.nodes()[place].index();
                positions[node] - support.rest()[place] - movements[node]
            };
            for row in 0..support.nodes().len() {
                for column in 0..support.nodes().len() {
                    elastic += 0.5 * strain(row).dot(&(support.block(row, column) * strain(column)));
                }
            }
        }
        let moved = positions.iter().zip(&self.start).zip(&self.loading.nodal_forces);
        Energies {
            kinetic: 0.5 * self.inertia.square(&state.velocities),
            elastic,
            potential: -moved.map(|((x, start), force)| force.dot(&(x - start))).sum::<f64>(),
        }
    }

    /// Work that driven loads, pressure and moving supports do over a step, by the forces at both ends or in the middle.
    pub(super) fn work(&self, forces: [&Forces; 2], [from, to]: [&State; 2], movements: [&[Vector3<f64>]; 2]) -> f64 {
        let half = |f: fn(&Forces) -> &[Vector3<f64>], node: usize| (f(forces[0])[node] + f(forces[1])[node]) * 0.5;
        let steps: Vec<_> = (from.positions.iter().zip(&to.positions)).map(|(a, b)| b - a).collect();
        let mut work: f64 = (steps.iter().enumerate())
            .map(|(node, step)| half(|f| &f.applied, node).dot(step))
            .sum();
        if self.supports_move {
            // A rigid support resists what is out of balance along its held directions and moves with it.
            for (node, step) in self.held_parts(&steps).iter().enumerate() {
                work -= half(|f| &f.out_of_balance, node).dot(step);
            }
            for (node, (before, after)) in movements[0].iter().zip(movements[1]).enumerate() {
                work += half(|f| &f.elastic, node).dot(&(after - before));
            }
        }
        work
    }

    /// A step below which explicit differences are stable (s): `2/ω`, with a bound on the highest frequency.
    ///
    /// ```text
    /// ω² ≤ max over nodes of  2 Σ k / m,   k = EA / a of the segments at the node,  more where springs are
    /// ```
    /// The block of a segment is never stiffer than `k`, and `m` is the least mass of the node in any direction, so that this
    /// holds in any state (Gershgorin, by blocks).
    pub(super) fn stable_step(&self) -> f64 {
        let mut stiffness = vec![0.0; self.start.len()];
        for (bar, ends) in self.bars().iter().zip(&self.ends) {
            for end in ends {
                stiffness[*end] += 2.0 * bar.stiffness;
            }
        }
        for elastic in self.structure.net().elastic_supports() {
            for (place, node) in elastic.nodes().iter().enumerate() {
                stiffness[node.index()] += elastic.largest_row_sum(place);
            }
        }
        let mut largest: f64 = 0.0;
        for dof in 0..self.structure.n_dofs() {
            let node = self.structure.dofs().node(dof).index();
            largest = largest.max(stiffness[node] / self.inertia.least(node));
        }
        2.0 / largest.sqrt()
    }
}

/// The force of a bar over a step by the length of its mean chord.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Quotient {
    /// `q` (N/m).
    density: f64,
    /// `dq / dl1` (N/m²).
    slope: f64,
}

impl Quotient {
    /// `difference`: `l1² − l0²` (m²), worked out without cancellation.
    fn new(bar: &Bar, l0: f64, l1: f64, difference: f64) -> Self {
        let (a, k) = (bar.stress_free_length, bar.stiffness);
        let excess = [l0, l1].map(|l| (l - a).max(0.0));
        match [l0, l1].map(|l| bar.is_taut(l)) {
            [true, true] => {
                let sum = l0 + l1;
                Self {
                    density: (bar.axial_force(l0) + bar.axial_force(l1)) / sum,
                    slope: 2.0 * k * a / (sum * sum),
                }
            }
            [false, true] if difference > 0.0 => Self {
                density: k * excess[1] * excess[1] / difference,
                slope: 2.0 * k * excess[1] / difference
                    - 2.0 * l1 * k * excess[1] * excess[1] / (difference * difference),
            },
            [true, false] if difference < 0.0 => Self {
                density: -k * excess[0] * excess[0] / difference,
                slope: 2.0 * l1 * k * excess[0] * excess[0] / (difference * difference),
            },
            // Slack at both ends; or a change of length that is lost in rounding, about the length without force.
            _ => Self {
                density: 0.0,
                slope: 0.0,
            },
        }
    }

    fn scaled(self, share: f64) -> Self {
        Self {
            density: share * self.density,
            slope: share * self.slope,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const LENGTHS: [(f64, f64); 5] = [(2.1, 2.3), (1.9, 2.2), (2.2, 1.7), (1.7, 1.8), (2.2, 2.1)];

    #[test]
    fn the_quotient_is_that_of_the_energies() {
        for law in [AxialLaw::TensionOnly, AxialLaw::TwoWay] {
            let bar = Bar::new(law, 5e4, 2.0, 0.0);
            for (l0, l1) in LENGTHS {
                let difference = l1 * l1 - l0 * l0;
                let expected = 2.0 * (bar.energy(l1) - bar.energy(l0)) / difference;
                let computed = Quotient::new(&bar, l0, l1, difference).density;
                assert!((computed - expected).abs() <= 1e-10 * bar.stiffness, "{l0} {l1}");
            }
        }
    }

    #[test]
    fn its_slope_is_that_of_differences() {
        for law in [AxialLaw::TensionOnly, AxialLaw::TwoWay] {
            let bar = Bar::new(law, 5e4, 2.0, 0.0);
            for (l0, l1) in LENGTHS {
                let density = |l1: f64| Quotient::new(&bar, l0, l1, l1 * l1 - l0 * l0).density;
                let h = 1e-4;
                let expected = (8.0 * (density(l1 + h) - density(l1 - h)) - density(l1 + 2.0 * h)
                    + density(l1 - 2.0 * h))
                    / (12.0 * h);
                let computed = Quotient::new(&bar, l0, l1, l1 * l1 - l0 * l0).slope;
                assert!(
                    (computed - expected).abs() <= 1e-6 * bar.stiffness,
                    "{l0} {l1} {computed} {expected}"
                );
            }
        }
    }
}
