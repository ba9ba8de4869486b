//! Natural modes about one state.

use std::ops::ControlFlow;

use nalgebra::{DMatrix, Vector3};
use thiserror::Error;

use super::krylov::{self, dot, lowest};
use super::mass::{MassGiven, Masses};
use super::pencil::Pencil;
use crate::assembly::{Loading, LoadingError, Structure};
use crate::equilibrium::{Analysis, stability};
use crate::load::Case;
use crate::model::{AxialLaw, NodeId};

/// Stiffness against a mode, over the largest entry of the tangent and a unit of movement, below which there is none (–).
const NO_STIFFNESS: f64 = 1e-11;
/// Tension over the median one below which a taut rope is nearly slack (–).
const NEARLY_SLACK: f64 = 0.02;

/// The state that moves.
#[derive(Clone, Copy, Debug)]
pub struct About<'a> {
    /// What it carries.
    pub case: &'a Case,
    /// Position of every node (m).
    pub positions: &'a [Vector3<f64>],
    /// Position of every node in the reference state (m), where skins have their mass per area.
    pub reference: &'a [Vector3<f64>],
    /// Axial force of every segment (N).
    pub axial_forces: &'a [f64],
    /// Unstressed length that lies in every segment (m).
    pub lying: &'a [f64],
}

/// What a mode is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ModeKind {
    /// `ω² > 0`.
    Vibrates,
    /// Nothing resists it to first order: `ω² = 0` within rounding.
    Rigid,
    /// `ω² < 0`: the state is not stable.
    Unstable,
}

/// One natural mode.
#[derive(Clone, Debug, PartialEq)]
pub struct Mode {
    /// What it is.
    pub kind: ModeKind,
    /// `ω²` (rad²/s²).
    pub root: f64,
    /// `ω / 2π` (Hz); zero unless it vibrates.
    pub frequency: f64,
    /// Movement of every node (–); the largest has length 1, and its largest component is positive.
    pub shape: Vec<Vector3<f64>>,
    /// `xᵀ M x` of that shape (kg).
    pub modal_mass: f64,
    /// Mass that takes part along x, y and z (kg): `(xᵀ M e)² / xᵀ M x`.
    pub effective_mass: [f64; 3],
    /// `|K x − ω² M x|` over `|ω² M x|`, or where that is less over the smallest stiffness that counts times `|x|` (–).
    pub residual: f64,
}

/// Roots counted by the signs of pivots (Sylvester's law of inertia).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RootCount {
    /// Where they were counted, `ω²` (rad²/s²): in the gap above the last mode.
    pub limit: f64,
    /// Roots below it.
    pub below: usize,
}

/// Natural modes about a state.
#[derive(Clone, Debug, PartialEq)]
pub struct Modes {
    /// In rising order of `ω²`: as many as were wanted, more where the last of them is multiple, fewer where there are
    /// fewer.
    pub modes: Vec<Mode>,
    /// The count that proves the list complete; `None` where pivots left it open.
    pub counted: Option<RootCount>,
    /// Largest `|xᵢᵀ M xⱼ|` of two modes, each with `xᵀ M x = 1` (–).
    pub orthogonality: f64,
    /// Mass that can move along x, y and z (kg).
    pub moving_mass: [f64; 3],
    /// Nodes without stiffness, because all that leads to them is slack: taken out.
    pub floating: Vec<NodeId>,
    /// Parts of two or more nodes that only slack ropes join to what is held.
    pub islands: Vec<Vec<NodeId>>,
    /// Nodes without mass, though something holds them: they follow the others at once.
    pub massless: Vec<NodeId>,
    /// Size of what pressure and friction make unsymmetric, which was left out, over the symmetric part, both among the
    /// modes (–); `None` where nothing is unsymmetric.
    pub unsymmetric: Option<f64>,
    /// Taut rope segments with less than 2 % of the median tension: a small movement changes their stiffness.
    pub nearly_slack: usize,
    /// Shift (rad²/s²).
    pub shift: f64,
    /// Vectors of the Krylov space.
    pub vectors: usize,
}

impl Modes {
    /// Whether the count shows that no root was missed.
    #[must_use]
    pub fn is_complete(&self) -> bool {
        self.counted.is_some_and(|counted| counted.below == self.modes.len())
    }

    /// The lowest mode that vibrates.
    #[must_use]
    pub fn lowest_vibrating(&self) -> Option<&Mode> {
        self.modes.iter().find(|mode| mode.kind == ModeKind::Vibrates)
    }
}

/// Why there are no modes.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum ModesError {
    /// The case does not fit the net.
    #[error(transparent)]
    Loading(#[from] LoadingError),
    /// Nothing that has stiffness has mass.
    #[error("nothing that is held has mass")]
    NoMass,
    /// Some nodes have no mass, and the tangent on them alone is not positive definite.
    #[error("{n} nodes have no mass, and what holds them leaves some movement of theirs free", n = nodes.len())]
    MasslessNotHeld {
        /// Nodes without mass.
        nodes: Vec<NodeId>,
    },
    /// Numbers are beyond use.
    #[error("numbers are beyond use")]
    BeyondUse,
    /// The observer stopped the search.
    #[error("the search was stopped")]
    Cancelled,
}

/// Asked before each factorisation and each vector of a search whether it goes on.
pub type Observer<'a> = &'a mut dyn FnMut() -> ControlFlow<()>;

/// Asks whether to go on.
pub(super) fn go_on(observe: Observer<'_>) -> Result<(), ModesError> {
    match observe() {
        ControlFlow::Continue(()) => Ok(()),
        ControlFlow::Break(()) => Err(ModesError::Cancelled),
    }
}

/// The lowest `count` natural modes about a state.
///
/// Straight and hanging segments have half of their mass at each end; where a rope slides, by what lies in each segment.
/// What sliding against friction and pressure make unsymmetric is left out, and its size told.
///
/// # Errors
/// [`ModesError`] if the pencil of stiffness and mass has no roots, or none that can be found; [`ModesError::Cancelled`] as
/// soon as `observe` breaks, which is asked before each factorisation and each vector.
pub fn natural_modes(
    analysis: &Analysis,
    about: &About<'_>,
    given: &MassGiven,
    count: usize,
    observe: Observer<'_>,
) -> Result<Modes, ModesError> {
    let structure = analysis.structure();
    let loading = Loading::new(structure, about.case, &about.case.unstressed_lengths, 1.0)?;
    let masses = Masses::new(structure, given, about);
    let pencil = Pencil::new(
        structure,
        stability::tangent(structure, &loading, about.positions),
        masses.matrix(structure),
    );
    let is_floating = |node: &NodeId| pencil.floating.binary_search(node).is_ok();
    let massless: Vec<NodeId> = (0..structure.net().nodes().len())
        .map(NodeId::new)
        .filter(|node| !structure.dofs().directions(*node).is_empty() && !is_floating(node))
        .filter(|node| masses.alike[node.index()] == 0.0)
        .collect();
    if (0..pencil.size()).all(|dof| pencil.on_diagonal(&pencil.mass, dof) == 0.0) {
        return Err(ModesError::NoMass);
    }
    let mut factor = analysis.new_factor();
    if !massless.is_empty() {
        go_on(observe)?;
        if !pencil.holds_massless(&mut factor) {
            return Err(ModesError::MasslessNotHeld { nodes: massless });
        }
    }
    let found = lowest(&pencil, &mut factor, count, observe)?;
    let (along, moving_mass) = along_axes(structure, &pencil);
    let modes = (found.pairs.iter())
        .map(|pair| mode(structure, &pencil, pair, &along))
        .collect();
    Ok(Modes {
        modes,
        counted: found.counted.map(|counted| RootCount {
            limit: counted.limit,
            below: counted.below,
        }),
        orthogonality: orthogonality(&pencil, &found.pairs),
        moving_mass,
        islands: islands(structure, about),
        massless,
        unsymmetric: unsymmetric(structure, &loading, about, &found.pairs),
        nearly_slack: nearly_slack(structure, about.axial_forces),
        shift: found.shift,
        vectors: found.vectors,
        floating: pencil.floating,
    })
}

/// `M e` for a unit movement of all that moves along each axis, and the mass in it.
fn along_axes(structure: &Structure, pencil: &Pencil<'_>) -> ([Vec<f64>; 3], [f64; 3]) {
    let mut moving = [0.0; 3];
    let along = [0, 1, 2].map(|axis| {
        let unit: Vec<f64> = (0..pencil.size())
            .map(|dof| structure.dofs().direction(dof)[axis])
            .collect();
        let mut image = vec![0.0; pencil.size()];
        pencil.pattern.product_into(&pencil.mass, &unit, &mut image);
        moving[axis] = dot(&unit, &image);
        image
    });
    (along, moving)
}

fn mode(structure: &Structure, pencil: &Pencil<'_>, pair: &krylov::Pair, along: &[Vec<f64>; 3]) -> Mode {
    let (x, root) = (&pair.vector, pair.root);
    let (mut stiff, mut heavy) = (vec![0.0; x.len()], vec![0.0; x.len()]);
    pencil.pattern.product_into(&pencil.stiffness, x, &mut stiff);
    pencil.pattern.product_into(&pencil.mass, x, &mut heavy);
    let length = |of: &[f64]| dot(of, of).sqrt();
    let left: Vec<f64> = stiff.iter().zip(&heavy).map(|(k, m)| k - root * m).collect();
    let mass = dot(x, &heavy);
    let least = NO_STIFFNESS * pencil.largest;
    let kind = match root * mass {
        stiffness if stiffness.abs() <= least * dot(x, x) => ModeKind::Rigid,
        stiffness if stiffness < 0.0 => ModeKind::Unstable,
        _ => ModeKind::Vibrates,
    };
    let mut shape = vec![Vector3::zeros(); structure.net().nodes().len()];
    structure.dofs().nodal_into(x, &mut shape);
    // Nodes that move alike but for rounding: the first of them decides the sense.
    let size = |v: &Vector3<f64>| v.norm();
    let most = shape.iter().map(size).fold(0.0, f64::max);
    let first = shape
        .iter()
        .find(|v| v.norm() >= most * (1.0 - 1e-6))
        .copied()
        .unwrap_or_default();
    let first_axis = (0..3)
        .find(|axis| first[*axis].abs() >= first.amax() * (1.0 - 1e-6))
        .unwrap_or(0);
    let scale = if most == 0.0 {
        1.0
    } else {
        most.copysign(first[first_axis])
    };
    shape.iter_mut().for_each(|v| *v /= scale);
    Mode {
        kind,
        root,
        frequency: match kind {
            ModeKind::Vibrates => root.sqrt() / std::f64::consts::TAU,
            ModeKind::Rigid | ModeKind::Unstable => 0.0,
        },
        shape,
        modal_mass: mass / (scale * scale),
        effective_mass: [0, 1, 2].map(|axis| dot(x, &along[axis]).powi(2) / mass),
        residual: length(&left) / (root.abs() * length(&heavy)).max(least * length(x)),
    }
}

fn orthogonality(pencil: &Pencil<'_>, pairs: &[krylov::Pair]) -> f64 {
    let mut most: f64 = 0.0;
    let mut image = vec![0.0; pencil.size()];
    for (i, a) in pairs.iter().enumerate() {
        pencil.pattern.product_into(&pencil.mass, &a.vector, &mut image);
        for b in &pairs[..i] {
            most = most.max(dot(&b.vector, &image).abs());
        }
    }
    most
}

/// Parts of two or more nodes that struts and taut ropes join, of which no node has a support.
fn islands(structure: &Structure, about: &About<'_>) -> Vec<Vec<NodeId>> {
    let net = structure.net();
    let mut part: Vec<usize> = (0..net.nodes().len()).collect();
    fn root(part: &mut [usize], mut node: usize) -> usize {
        while part[node] != node {
            part[node] = part[part[node]];
            node = part[node];
        }
        node
    }
    let mut join = |a: NodeId, b: NodeId| {
        let (a, b) = (root(&mut part, a.index()), root(&mut part, b.index()));
        part[a.max(b)] = a.min(b);
    };
    for (index, segment) in net.segments().iter().enumerate() {
        let carries = segment.law == AxialLaw::TwoWay || about.axial_forces[index] > 0.0;
        if carries && !about.case.removed[index] {
            join(segment.ends[0], segment.ends[1]);
        }
    }
    let mut is_held = vec![false; part.len()];
    for elastic in net.elastic_supports() {
        for node in elastic.nodes() {
            is_held[root(&mut part, node.index())] = true;
        }
    }
    for support in net.supports() {
        is_held[root(&mut part, support.node().index())] = true;
    }
    let mut islands = vec![Vec::new(); part.len()];
    for node in 0..part.len() {
        let part = root(&mut part, node);
        if !is_held[part] {
            islands[part].push(NodeId::new(node));
        }
    }
    islands.retain(|nodes| nodes.len() > 1);
    islands
}

/// Size of the antisymmetric part of the stiffness of pressure over the symmetric tangent, both among the modes.
///
/// The forces of pressure are of second degree in the positions, so that central differences give their slope without error
/// but rounding.
fn unsymmetric(structure: &Structure, loading: &Loading, about: &About<'_>, pairs: &[krylov::Pair]) -> Option<f64> {
    let pressures = &loading.special.as_ref()?.pressures;
    if pressures.iter().all(|pressure| *pressure == 0.0) {
        return None;
    }
    let n_nodes = about.positions.len();
    let mut slopes = Vec::with_capacity(pairs.len());
    for pair in pairs {
        let most = pair.vector.iter().map(|x| x.abs()).fold(0.0, f64::max);
        let forces = [1.0, -1.0].map(|sense| {
            let mut moved = about.positions.to_vec();
            structure.dofs().move_nodes(&pair.vector, sense / most, &mut moved);
            let mut forces = vec![Vector3::zeros(); n_nodes];
            structure.add_pressure_forces(pressures, &moved, &mut forces);
            forces
        });
        let slope: Vec<Vector3<f64>> = (forces[0].iter().zip(&forces[1]))
            .map(|(ahead, behind)| (ahead - behind) * (0.5 * most))
            .collect();
        let mut components = vec![0.0; structure.n_dofs()];
        structure.dofs().components_into(&slope, &mut components);
        slopes.push(components);
    }
    let among = DMatrix::from_fn(pairs.len(), pairs.len(), |i, j| dot(&pairs[i].vector, &slopes[j]));
    let rest = 0.5 * (&among - among.transpose());
    let symmetric = pairs.iter().map(|pair| pair.root.powi(2)).sum::<f64>().sqrt();
    Some(rest.norm() / symmetric)
}

fn nearly_slack(structure: &Structure, axial_forces: &[f64]) -> usize {
    let mut taut: Vec<f64> = (structure.net().segments().iter().zip(axial_forces))
        .filter(|(segment, force)| segment.law == AxialLaw::TensionOnly && **force > 0.0)
        .map(|(_, force)| *force)
        .collect();
    taut.sort_by(f64::total_cmp);
    let Some(median) = taut.get(taut.len() / 2) else {
        return 0;
    };
    taut.iter().filter(|force| **force < NEARLY_SLACK * median).count()
}
