//! How the reference state was found.

use super::ForceLeft;
use super::error::forces_left;
use super::words::{kilonewtons, list, three_digits};
use crate::equilibrium::Way;
use crate::model::SegmentId;

/// What came of the members left to balance.
#[derive(Clone, Debug, PartialEq)]
pub struct BalanceReport {
    /// Their segments.
    pub segments: Vec<SegmentId>,
    /// How many of their forces the held nodes determine.
    pub rank: usize,
    /// Whether they determine all; otherwise the forces of least square sum were taken, or,
    /// if a rope pushed with those, ones with which none does.
    pub unique: bool,
    /// Largest force left at a held node (N).
    pub residual: f64,
}

/// Deviation, as a share, up to which something counts as nearly met.
pub const WITHIN: f64 = 2e-3;

/// A quantity that can be wanted.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Quantity {
    /// Axial force of one segment (N).
    Tension,
    /// Mean axial force of several segments (N).
    MeanTension,
    /// Length of one or several segments (m).
    Length,
    /// Unstressed length of one or several segments (m).
    UnstressedLength,
    /// Coordinate x of a node (m).
    X,
    /// Coordinate y of a node (m).
    Y,
    /// Coordinate z of a node (m).
    Z,
    /// Sag of a node below a chord (m).
    Sag,
    /// Sag of a node across a chord (m).
    SagNormal,
    /// Length of a segment beside the mean of those that are to be equal (m).
    MeshWidth,
    /// Radius of the circle through a node and its neighbours (m).
    Radius,
    /// Height of a node beside that of a surface (m).
    Surface,
}

impl Quantity {
    /// In words.
    #[must_use]
    pub fn words(self) -> &'static str {
        match self {
            Self::Tension => "tension",
            Self::MeanTension => "mean tension",
            Self::Length => "length",
            Self::UnstressedLength => "unstressed length",
            Self::X => "x",
            Self::Y => "y",
            Self::Z => "z",
            Self::Sag => "sag",
            Self::SagNormal => "sag across the chord",
            Self::MeshWidth => "mesh width",
            Self::Radius => "radius",
            Self::Surface => "height",
        }
    }

    /// Whether it is a force (N); otherwise it is a length (m).
    #[must_use]
    pub fn is_force(self) -> bool {
        matches!(self, Self::Tension | Self::MeanTension)
    }
}

/// Something wanted, and what was found.
#[derive(Clone, Debug, PartialEq)]
pub struct Target {
    /// Name of the target; `None`: a rule wants it.
    pub name: Option<String>,
    /// The member, part or node.
    pub on: String,
    /// What is measured.
    pub quantity: Quantity,
    /// What is wanted (N or m).
    pub wanted: f64,
    /// What was found (N or m).
    pub found: f64,
    /// Deviation as a share, with the sign of found less wanted (–).
    pub miss: f64,
    /// Whether it was met.
    pub met: bool,
}

impl Target {
    fn in_words(&self) -> String {
        let what = format!("{} of \"{}\"", self.quantity.words(), self.on);
        match &self.name {
            Some(name) => format!("target \"{name}\" ({what})"),
            None => what,
        }
    }

    fn value(&self, value: f64) -> String {
        if self.quantity.is_force() {
            kilonewtons(value)
        } else {
            format!("{} m", three_digits(value))
        }
    }
}

/// Two wishes that can not be met together.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Fight {
    /// Their indices in [`ShapeReport::targets`].
    pub targets: [usize; 2],
    /// What each comes to where the other one is left out (N or m).
    pub alone: [f64; 2],
    /// What each comes to where it is itself left out, and the other one kept (N or m).
    pub left_out: [f64; 2],
}

/// Why not everything is met.
#[derive(Clone, Debug, PartialEq)]
pub struct Unmet {
    /// What the wanted tensions would leave at the nodes of the nearest shape, largest first.
    pub left: Vec<ForceLeft>,
    /// How much of what is wanted can be chosen independently near that shape; `None` for many unknowns, where it is not
    /// worked out.
    pub rank: Option<usize>,
    /// Wishes that fight, the largest miss first.
    pub fights: Vec<Fight>,
    /// Members whose force density is at a bound.
    pub at_bounds: Vec<String>,
}

/// How the reference state was found.
#[derive(Clone, Debug, PartialEq)]
pub struct ShapeReport {
    /// The method that gave the state.
    pub way: Way,
    /// Factorisations.
    pub iterations: u32,
    /// What was wanted, each with what was found: tensions of rules first, then targets in their order.
    pub targets: Vec<Target>,
    /// What stands in the way where not everything is met: the state is then the nearest that balances.
    pub unmet: Option<Unmet>,
    /// Members left to balance, if any.
    pub balance: Option<BalanceReport>,
    /// Ropes of given length that are taut in the state.
    pub taut_given_lengths: Vec<SegmentId>,
    /// Largest out-of-balance force of the elastic net at the state, as the independent routine finds it (N).
    pub imbalance: f64,
    /// Largest axial force (N), the measure for `imbalance`.
    pub largest_force: f64,
    /// Whether the state had to be corrected as an elastic net to balance.
    pub polished: bool,
    /// Largest strain and its segment: a unit slip in `EA` shows here.
    pub largest_strain: Option<(SegmentId, f64)>,
}

impl ShapeReport {
    /// Indices of the targets, the largest miss first.
    #[must_use]
    pub fn ranked(&self) -> Vec<usize> {
        let mut order: Vec<usize> = (0..self.targets.len()).collect();
        order.sort_by(|a, b| self.targets[*b].miss.abs().total_cmp(&self.targets[*a].miss.abs()));
        order
    }

    /// What is not met, and what stands in the way, in words; `None` if all is met.
    #[must_use]
    pub fn unmet_in_words(&self) -> Option<String> {
        let unmet = self.unmet.as_ref()?;
        let mut words = String::new();
        if !unmet.left.is_empty() {
            words.push_str(&format!("the given tensions leave {}. ", forces_left(&unmet.left)));
        }
        for fight in &unmet.fights {
            let [a, b] = fight.targets.map(|t| &self.targets[t]);
            words.push_str(&format!(
                "{} {} and {} {} can not both be met: with the first kept and the second left out the second comes to {}, \
                 and the other way round the first to {}. ",
                a.in_words(),
                a.value(a.wanted),
                b.in_words(),
                b.value(b.wanted),
                b.value(fight.left_out[1]),
                a.value(fight.left_out[0])
            ));
        }
        let worst = self
            .ranked()
            .into_iter()
            .map(|t| &self.targets[t])
            .filter(|t| !t.met)
            .take(6);
        let nearest: Vec<String> = worst
            .map(|t| format!("{} {} instead of {}", t.in_words(), t.value(t.found), t.value(t.wanted)))
            .collect();
        words.push_str(&format!("Nearest balanced set: {}. ", nearest.join(", ")));
        let within = self.targets.iter().filter(|t| t.miss.abs() <= WITHIN).count();
        words.push_str(&format!(
            "Met within {} %: {within} of {}",
            100.0 * WITHIN,
            self.targets.len()
        ));
        if let Some(rank) = unmet.rank {
            words.push_str(&format!(", independent: {rank}"));
        }
        if !unmet.at_bounds.is_empty() {
            words.push_str(&format!("; force densities at a bound: {}", list(&unmet.at_bounds, 6)));
        }
        Some(words)
    }
}
