//! What the brief says of a state: whether its loads are factored, and whether members are taken out.

use ropewalk_api::ropewalk::v1;

use super::{Run, State};

/// How the actions of a state are factored.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(crate) enum Factoring {
    /// The reference state: what acts while the prestress is measured, unfactored.
    Reference,
    /// No action with a factor above 1; or by a serviceability rule.
    Characteristic,
    /// Some action with a factor above 1, or by a rule for ultimate states.
    Factored,
    /// By a rule that this client does not know.
    Unknown,
}

impl Factoring {
    pub(crate) fn word(self) -> &'static str {
        match self {
            Self::Reference => "reference",
            Self::Characteristic => "characteristic",
            Self::Factored => "factored",
            Self::Unknown => "",
        }
    }
}

impl Run {
    /// How the actions of a state are factored, by the brief.
    pub(crate) fn factoring(&self, state: &State) -> Factoring {
        if state.id == "reference" {
            return Factoring::Reference;
        }
        if let Some(case) = self.brief.cases.iter().find(|case| case.id == state.id) {
            return if case.factors.values().all(|factor| factor.abs() <= 1.0) {
                Factoring::Characteristic
            } else {
                Factoring::Factored
            };
        }
        let rules = self
            .brief
            .combinations
            .iter()
            .filter(|rule| state.sets.contains(&rule.set));
        let of_rule = |rule: &v1::Combination| match &rule.rule {
            Some(v1::combination::Rule::Fundamental(_) | v1::combination::Rule::Accidental(_)) => Factoring::Factored,
            Some(
                v1::combination::Rule::Characteristic(_)
                | v1::combination::Rule::Frequent(_)
                | v1::combination::Rule::QuasiPermanent(_),
            ) => Factoring::Characteristic,
            None => Factoring::Unknown,
        };
        rules.map(of_rule).max().unwrap_or(Factoring::Unknown)
    }
}

impl Run {
    /// Whether a case takes members out of the net.
    pub(crate) fn takes_out(&self, state: &State) -> bool {
        let by_hand = self.brief.cases.iter().find(|case| case.id == state.id);
        // Cases that a rule made say so in their words.
        by_hand.map_or(state.in_words.contains(" without "), |case| !case.remove.is_empty())
    }
}

#[cfg(test)]
mod tests {
    use super::super::sample;
    use super::*;

    #[test]
    fn one_factor_above_1_makes_a_state_factored() {
        let mut run = sample::run();
        let of = |run: &Run, at: usize| run.factoring(&run.states[at]);
        assert_eq!(of(&run, 0), Factoring::Reference);
        assert_eq!(of(&run, 1), Factoring::Characteristic);
        run.brief.cases[0].factors.insert("wind".to_owned(), 0.6);
        assert_eq!(of(&run, 1), Factoring::Characteristic);
        run.brief.cases[0].factors.insert("snow".to_owned(), 1.5);
        assert_eq!(of(&run, 1), Factoring::Factored);
    }

    #[test]
    fn cases_of_a_rule_are_factored_as_the_rule_is() {
        let mut run = sample::run();
        run.brief.cases.clear();
        run.states[1].sets = vec!["strength".to_owned()];
        assert_eq!(run.factoring(&run.states[1]), Factoring::Unknown);
        run.brief.combinations.push(v1::Combination {
            set: "strength".to_owned(),
            rule: Some(v1::combination::Rule::Fundamental(v1::FundamentalRule::default())),
            ..Default::default()
        });
        assert_eq!(run.factoring(&run.states[1]), Factoring::Factored);
    }
}
