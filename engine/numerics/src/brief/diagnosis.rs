//! What a state allows beside bearing its load: free movements, states of self-stress, its least stiffness.

use super::StateResult;
use crate::assembly::Loading;
use crate::diagnose::mobility::{Members, Mobility, mobility};
use crate::equilibrium::Analysis;
use crate::equilibrium::stability::{LeastStiffness, least_stiffnesses};
use crate::load::Case;

/// States that are to be looked into.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct DiagnosisGiven {
    /// Whether the reference state is one of them.
    pub reference: bool,
    /// Cases, by index in rising order.
    pub cases: Vec<usize>,
    /// How many of the least stiffnesses are told, from the least.
    pub stiffnesses: usize,
}

impl Default for DiagnosisGiven {
    fn default() -> Self {
        Self {
            reference: true,
            cases: Vec::new(),
            stiffnesses: 3,
        }
    }
}

/// How firmly a state stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Standing {
    /// Nothing to remark.
    Firm,
    /// Little stiffness is left beside that of the reference state, see [`LITTLE_LEFT`].
    Weak,
    /// There is a movement without stiffness, or driven by what presses.
    Unstable,
}

/// Least stiffness over that of the reference state below which a state stands weakly (–).
pub const LITTLE_LEFT: f64 = 0.1;
/// Least stiffness over the largest entry of the tangent below which there is none (–).
const NONE: f64 = 1e-11;

/// What was found of a state.
#[derive(Clone, Debug, PartialEq)]
pub struct StateDiagnosis {
    /// What all members together leave free or bear without load; `None` where the numbers are beyond use.
    pub all: Option<Mobility>,
    /// The same for struts and ropes that are not slack; `None` where no rope is slack.
    pub taut: Option<Mobility>,
    /// Least stiffnesses of the state, rising. Nodes without a place of their own are left out of the question.
    pub stiffnesses: Vec<LeastStiffness>,
    /// How firmly it stands.
    pub standing: Standing,
}

/// Looks into a state of `case`. `reference`: the least stiffness of the reference state (N/m), where it is known.
pub(super) fn diagnose(
    analysis: &Analysis,
    asked: &DiagnosisGiven,
    case: &Case,
    state: &StateResult,
    reference: Option<f64>,
) -> Option<StateDiagnosis> {
    let loading = Loading::new(analysis.structure(), case, &case.unstressed_lengths, 1.0).ok()?;
    let forces = &state.axial_forces;
    let of = |members| mobility(analysis, &loading, &state.positions, forces, members);
    let is_slack = (state.slack.iter().zip(&case.removed)).any(|(slack, removed)| *slack && !removed);
    let stiffnesses = least_stiffnesses(
        analysis,
        &loading,
        &state.positions,
        &state.loose_nodes,
        asked.stiffnesses,
    );
    let largest = loading.bars.iter().map(|bar| bar.stiffness).fold(0.0, f64::max);
    let standing = match stiffnesses.first().map(|least| least.stiffness) {
        Some(least) if least <= NONE * largest => Standing::Unstable,
        Some(least) if reference.is_some_and(|before| least < LITTLE_LEFT * before) => Standing::Weak,
        _ => Standing::Firm,
    };
    Some(StateDiagnosis {
        all: of(Members::All),
        taut: is_slack.then(|| of(Members::Taut)).flatten(),
        stiffnesses,
        standing,
    })
}
