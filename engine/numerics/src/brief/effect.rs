//! Design effects: what a standard states on effects, worked out from cases, quantity by quantity. Never a state.

use crate::check::CaseDigest;

/// The rule that an effect follows.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum EffectRule {
    /// Sudden loss of a member: `E1 + k (E2 − E1)`, `E1` intact and `E2` without it (EN 1993-1-11:2006).
    Loss {
        /// Factor on the effect of the loss, `k` (–).
        factor: f64,
    },
    /// Partial factor on the effect of the unfactored actions: `γ E(F)` (EN 1990:2002, 6.3.2(4) b).
    OnEffect {
        /// Partial factor of the predominant action, `γ` (–).
        factor: f64,
    },
    /// Partial factors on effects part by part: `γ_G E(G+P) + γ_Q (E(G+P+Q) − E(G+P))`.
    OnParts {
        /// Partial factor of permanent actions, `γ_G` (–).
        permanent: f64,
        /// Partial factor of the predominant variable action, `γ_Q` (–).
        variable: f64,
    },
}

/// A sum of effects of cases.
#[derive(Clone, Debug, PartialEq)]
pub struct DesignEffect {
    /// Its id.
    pub name: String,
    /// Sets it belongs to.
    pub sets: Vec<String>,
    /// The rule.
    pub rule: EffectRule,
    /// Cases, by index, and their weights (–): each case once.
    pub terms: Vec<(usize, f64)>,
    /// The case to which it is the counterpart, by index: factored actions beside the factored effect.
    pub beside: Option<usize>,
}

impl DesignEffect {
    /// Cases that must be solved for it, the one that it stands beside included.
    pub fn cases(&self) -> impl Iterator<Item = usize> + '_ {
        let beside = self
            .beside
            .filter(|case| self.terms.iter().all(|(term, _)| term != case));
        self.terms.iter().map(|(case, _)| *case).chain(beside)
    }
}

/// Largest axial forces (N) of every segment by the ways to factor a single predominant action, over all design effects that
/// stand beside a case: the largest of the three governs.
#[derive(Clone, Debug, PartialEq)]
pub struct FactorRules {
    /// `E(γF)`: factors on actions.
    pub on_action: Vec<f64>,
    /// `γ E(F)`: the factor on the effect.
    pub on_effect: Vec<f64>,
    /// Factors on effects part by part; zeros where there are none.
    pub on_parts: Vec<f64>,
}

impl FactorRules {
    pub(super) fn new(n_segments: usize) -> Self {
        Self {
            on_action: vec![0.0; n_segments],
            on_effect: vec![0.0; n_segments],
            on_parts: vec![0.0; n_segments],
        }
    }

    /// Takes in a design effect and the case that it stands beside, whatever their order.
    pub(super) fn add(&mut self, rule: EffectRule, effect: &CaseDigest, beside: &CaseDigest) {
        let of_rule = match rule {
            EffectRule::Loss { .. } => return,
            EffectRule::OnEffect { .. } => &mut self.on_effect,
            EffectRule::OnParts { .. } => &mut self.on_parts,
        };
        for (known, forces) in [(of_rule, effect), (&mut self.on_action, beside)] {
            for (known, force) in known.iter_mut().zip(&forces.axial_forces) {
                *known = known.max(*force);
            }
        }
    }
}
