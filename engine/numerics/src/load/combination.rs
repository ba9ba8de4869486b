//! Combinations of actions by the rules of EN 1990:2002, from classes of actions with their factors.
//!
//! ```text
//! fundamental      Σ γ_G G + γ_P P + γ_Q,1 Q_1 + Σ γ_Q,i ψ_0,i Q_i                       (6.10)
//! or the worse of  Σ γ_G G + γ_P P + Σ γ_Q,i ψ_0,i Q_i                                   (6.10a)
//!             and  Σ ξ γ_G G + γ_P P + γ_Q,1 Q_1 + Σ γ_Q,i ψ_0,i Q_i                      (6.10b)
//! accidental       Σ G + P + A + (ψ_1,1 or ψ_2,1) Q_1 + Σ ψ_2,i Q_i                       (6.11b)
//! characteristic   Σ G + P + Q_1 + Σ ψ_0,i Q_i                                            (6.14b)
//! frequent         Σ G + P + ψ_1,1 Q_1 + Σ ψ_2,i Q_i                                      (6.15b)
//! quasi-permanent  Σ G + P + Σ ψ_2,i Q_i                                                  (6.16b)
//! ```
//!
//! Every permanent action acts, all of them adverse or all favourable: with the prestress they are one permanent action
//! (EN 1993-1-11:2006, 5.3). Of a class of variable actions at most one acts at a time. A variable action that is
//! favourable is left out: so each one leads in turn, with every selection of others beside it, none included. `P` stands
//! in no sum of forces: its factor changes lengths.

use std::collections::BTreeSet;

/// How the actions of a class behave, with their factors (–).
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Behaviour {
    /// All of them act, together with those of other permanent classes.
    Permanent {
        /// `γ_G,sup`.
        adverse: f64,
        /// `γ_G,inf`.
        favourable: f64,
    },
    /// At most one of them acts at a time.
    Variable {
        /// `γ_Q`.
        gamma: f64,
        /// `ψ_0`.
        psi0: f64,
        /// `ψ_1`.
        psi1: f64,
        /// `ψ_2`.
        psi2: f64,
    },
    /// One of them acts in accidental combinations, with its design value; none in others.
    Accidental,
}

/// A class of actions.
#[derive(Clone, Debug, PartialEq)]
pub struct Class {
    /// Its actions, by index; no action is in two classes.
    pub actions: Vec<usize>,
    /// How they behave.
    pub behaviour: Behaviour,
}

/// Classes, and what holds for all of them.
#[derive(Clone, Debug, PartialEq)]
pub struct Classes {
    /// The classes.
    pub list: Vec<Class>,
    /// `γ_P` on prestress in fundamental combinations, where much and where little of it is asked for (–).
    pub prestress: [f64; 2],
}

/// A rule that makes combinations.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Rule {
    /// Fundamental, by one expression.
    Fundamental,
    /// Fundamental, by two expressions of which the worse one counts.
    FundamentalPair {
        /// Factor on adverse permanent actions where a variable action leads, `ξ` (–).
        xi: f64,
    },
    /// Characteristic.
    Characteristic,
    /// Frequent.
    Frequent,
    /// Quasi-permanent.
    QuasiPermanent,
    /// Accidental.
    Accidental {
        /// Whether an accidental action acts; else the accident is a member lost.
        acts: bool,
        /// Whether the leading action has its quasi-permanent value `ψ_2`, not its frequent one `ψ_1`.
        leads_quasi_permanent: bool,
    },
}

/// What the permanent actions are in a combination.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Permanent {
    /// Adverse.
    Adverse,
    /// Favourable.
    Favourable,
    /// Neither: without partial factors.
    Unfactored,
}

/// Factors on actions that act together.
#[derive(Clone, Debug, PartialEq)]
pub struct Combination {
    /// Action and its factor, in the order of actions; none is zero.
    pub factors: Vec<(usize, f64)>,
    /// Factor on prestress (–).
    pub prestress: f64,
    /// How permanent actions stand in it.
    pub permanent: Permanent,
    /// The variable actions in it, in the order of classes.
    pub variable: Vec<usize>,
}

/// Values of a class in a rule.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Values {
    leading: f64,
    accompanying: f64,
}

/// One sum that a rule asks for.
#[derive(Clone, Copy, Debug)]
struct Sum {
    permanent: Permanent,
    /// Factor on adverse permanent actions beside their own.
    xi: f64,
    prestress: f64,
    /// Whether one action leads; else all accompany.
    leads: bool,
}

impl Rule {
    fn sums(self, prestress: [f64; 2]) -> Vec<Sum> {
        let alone = |leads| {
            vec![Sum {
                permanent: Permanent::Unfactored,
                xi: 1.0,
                prestress: 1.0,
                leads,
            }]
        };
        let expressions: &[(bool, f64)] = match self {
            Self::Fundamental => &[(true, 1.0)],
            Self::FundamentalPair { xi } => &[(false, 1.0), (true, xi)],
            Self::QuasiPermanent => return alone(false),
            Self::Characteristic | Self::Frequent | Self::Accidental { .. } => return alone(true),
        };
        let prestress = if prestress[0] == prestress[1] {
            &prestress[..1]
        } else {
            &prestress
        };
        let mut sums = Vec::new();
        for (leads, xi) in expressions.iter().copied() {
            for permanent in [Permanent::Adverse, Permanent::Favourable] {
                for prestress in prestress.iter().copied() {
                    sums.push(Sum {
                        permanent,
                        xi,
                        prestress,
                        leads,
                    });
                }
            }
        }
        sums
    }

    fn values(self, behaviour: Behaviour) -> Option<Values> {
        let Behaviour::Variable {
            gamma,
            psi0,
            psi1,
            psi2,
        } = behaviour
        else {
            return None;
        };
        let (leading, accompanying) = match self {
            Self::Fundamental | Self::FundamentalPair { .. } => (gamma, gamma * psi0),
            Self::Characteristic => (1.0, psi0),
            Self::Frequent => (psi1, psi2),
            Self::QuasiPermanent => (psi2, psi2),
            Self::Accidental {
                leads_quasi_permanent: true,
                ..
            } => (psi2, psi2),
            Self::Accidental { .. } => (psi1, psi2),
        };
        Some(Values { leading, accompanying })
    }

    /// Combinations that the rule makes, each once: first the permanent actions alone, then each variable action leading,
    /// in the order of classes and of actions in them, with every selection of the others.
    #[must_use]
    pub fn combinations(self, classes: &Classes) -> Vec<Combination> {
        let accidents: Vec<Option<usize>> = match self {
            Self::Accidental { acts: true, .. } => classes.accidental().map(Some).collect(),
            _ => vec![None],
        };
        let mut known = BTreeSet::new();
        let mut list = Vec::new();
        for accident in accidents {
            for sum in self.sums(classes.prestress) {
                for variable in self.variable(classes, sum.leads) {
                    let combination = Combination::new(classes, sum, accident, variable);
                    if known.insert(combination.key()) {
                        list.push(combination);
                    }
                }
            }
        }
        list
    }

    /// Selections of variable actions with their factors, in the order of classes.
    fn variable(self, classes: &Classes, leads: bool) -> Vec<Vec<(usize, f64)>> {
        let classes: Vec<(&[usize], Values)> = (classes.list.iter())
            .filter_map(|class| Some((class.actions.as_slice(), self.values(class.behaviour)?)))
            .collect();
        // Every selection of accompanying actions from all classes but one.
        let beside = |leading: Option<usize>| {
            let mut selections: Vec<Vec<(usize, f64)>> = vec![Vec::new()];
            for (number, (actions, values)) in classes.iter().enumerate() {
                if Some(number) == leading || values.accompanying == 0.0 {
                    continue;
                }
                let with = |selection: &Vec<(usize, f64)>| {
                    let one = |action: &usize| [selection.as_slice(), &[(*action, values.accompanying)]].concat();
                    std::iter::once(selection.clone())
                        .chain(actions.iter().map(one))
                        .collect::<Vec<_>>()
                };
                selections = selections.iter().flat_map(with).collect();
            }
            selections
        };
        if !leads {
            return beside(None);
        }
        let mut list = vec![Vec::new()];
        for (number, (actions, values)) in classes.iter().enumerate() {
            if values.leading == 0.0 {
                continue;
            }
            let selections = beside(Some(number));
            for action in *actions {
                list.extend(
                    selections
                        .iter()
                        .map(|selection| [&[(*action, values.leading)], selection.as_slice()].concat()),
                );
            }
        }
        list
    }

    /// How many combinations the rule makes, nearly: equal ones are not looked for. Nothing is made of them, so that it may
    /// be asked where they are far too many.
    #[must_use]
    pub fn count(self, classes: &Classes) -> f64 {
        let mut sums = self.sums(classes.prestress);
        let differ = |class: &Class| matches!(class.behaviour, Behaviour::Permanent { adverse, favourable } if adverse != favourable);
        if !classes
            .list
            .iter()
            .any(|class| differ(class) && !class.actions.is_empty())
        {
            sums.retain(|sum| sum.permanent != Permanent::Favourable);
        }
        let variable: Vec<(f64, Values)> = (classes.list.iter())
            .filter_map(|class| Some((class.actions.len() as f64, self.values(class.behaviour)?)))
            .collect();
        let beside = |leading: Option<usize>| {
            let others = variable.iter().enumerate();
            let others = others.filter(|(number, (_, values))| Some(*number) != leading && values.accompanying != 0.0);
            others.map(|(_, (actions, _))| 1.0 + actions).product::<f64>()
        };
        let one_sum = |sum: &Sum| {
            if sum.leads {
                let leading = variable
                    .iter()
                    .enumerate()
                    .filter(|(_, (_, values))| values.leading != 0.0);
                1.0 + leading
                    .map(|(number, (actions, _))| actions * beside(Some(number)))
                    .sum::<f64>()
            } else {
                beside(None)
            }
        };
        let accidents = match self {
            Self::Accidental { acts: true, .. } => classes.accidental().count() as f64,
            _ => 1.0,
        };
        accidents * sums.iter().map(one_sum).sum::<f64>()
    }
}

impl Classes {
    fn accidental(&self) -> impl Iterator<Item = usize> + '_ {
        let classes = self.list.iter();
        let accidental = classes.filter(|class| class.behaviour == Behaviour::Accidental);
        accidental.flat_map(|class| class.actions.iter().copied())
    }
}

impl Combination {
    fn new(classes: &Classes, sum: Sum, accident: Option<usize>, mut variable: Vec<(usize, f64)>) -> Self {
        let mut factors: Vec<(usize, f64)> = accident.map(|action| (action, 1.0)).into_iter().collect();
        for class in &classes.list {
            if let Behaviour::Permanent { adverse, favourable } = class.behaviour {
                let factor = match sum.permanent {
                    Permanent::Adverse => tidy(sum.xi * adverse),
                    Permanent::Favourable => favourable,
                    Permanent::Unfactored => 1.0,
                };
                factors.extend(class.actions.iter().map(|action| (*action, factor)));
            }
        }
        variable.iter_mut().for_each(|(_, factor)| *factor = tidy(*factor));
        factors.extend(&variable);
        factors.retain(|(_, factor)| *factor != 0.0);
        factors.sort_by_key(|(action, _)| *action);
        let acting = |action: &usize| variable.iter().any(|(other, _)| other == action);
        Self {
            variable: (classes.list.iter().flat_map(|class| class.actions.iter().copied()))
                .filter(acting)
                .collect(),
            factors,
            prestress: sum.prestress,
            permanent: sum.permanent,
        }
    }

    /// What makes it another combination than others.
    fn key(&self) -> (u64, Vec<(usize, u64)>) {
        let factors = self.factors.iter().map(|(action, factor)| (*action, factor.to_bits()));
        (self.prestress.to_bits(), factors.collect())
    }
}

/// A product of factors to twelve digits, so that 1.5 · 0.6 is 0.9, in words and in the loads.
fn tidy(factor: f64) -> f64 {
    format!("{factor:.11e}").parse().unwrap_or(factor)
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    fn permanent(actions: &[usize]) -> Class {
        Class {
            actions: actions.to_vec(),
            behaviour: Behaviour::Permanent {
                adverse: 1.35,
                favourable: 1.0,
            },
        }
    }

    fn variable(actions: &[usize], [psi0, psi1, psi2]: [f64; 3]) -> Class {
        Class {
            actions: actions.to_vec(),
            behaviour: Behaviour::Variable {
                gamma: 1.5,
                psi0,
                psi1,
                psi2,
            },
        }
    }

    fn classes(list: Vec<Class>) -> Classes {
        Classes {
            list,
            prestress: [1.0, 1.0],
        }
    }

    /// Own weight; two snows, two winds, hot and cold, with the recommended values of EN 1990:2002 Table A1.1, from memory.
    fn canopy() -> Classes {
        classes(vec![
            permanent(&[0]),
            variable(&[1, 2], [0.5, 0.2, 0.0]),
            variable(&[3, 4], [0.6, 0.2, 0.0]),
            variable(&[5, 6], [0.6, 0.5, 0.0]),
        ])
    }

    const ALL: [Rule; 8] = [
        Rule::Fundamental,
        Rule::FundamentalPair { xi: 0.85 },
        Rule::Characteristic,
        Rule::Frequent,
        Rule::QuasiPermanent,
        accidental(false, false),
        accidental(true, false),
        accidental(true, true),
    ];

    const fn accidental(acts: bool, leads_quasi_permanent: bool) -> Rule {
        Rule::Accidental {
            acts,
            leads_quasi_permanent,
        }
    }

    fn has(rule: Rule, classes: &Classes, factors: &[(usize, f64)]) -> bool {
        rule.combinations(classes).iter().any(|made| made.factors == factors)
    }

    /// Three classes of two alternatives: 1 + 6 leading times 3 times 3 others, for permanent actions adverse and favourable.
    #[test]
    fn a_canopy_has_110_ultimate_and_55_service_combinations() {
        let count = |rule: Rule| rule.combinations(&canopy()).len();
        assert_eq!(count(Rule::Fundamental), 110);
        assert_eq!(count(Rule::Characteristic), 55);
        // ψ2 of each is zero: nothing accompanies.
        assert_eq!(count(Rule::Frequent), 7);
        assert_eq!(count(Rule::QuasiPermanent), 1);
        assert_eq!(count(accidental(false, false)), 7);
        assert_eq!(count(accidental(false, true)), 1);
        // 27 selections without a leading action and 55 with one, twice; favourable ones without variable action are equal.
        assert_eq!(count(Rule::FundamentalPair { xi: 0.85 }), 2 * (27 + 55) - 1);
        assert_eq!(count(accidental(true, false)), 0);
    }

    #[test]
    fn factors_are_those_of_the_expressions() {
        let canopy = canopy();
        // 6.10, snow leads: 1.35 G + 1.5 S + 1.5 · 0.6 W + 1.5 · 0.6 T.
        assert!(has(
            Rule::Fundamental,
            &canopy,
            &[(0, 1.35), (2, 1.5), (4, 0.9), (5, 0.9)]
        ));
        // Wind leads: 1.5 · 0.5 S.
        assert!(has(Rule::Fundamental, &canopy, &[(0, 1.0), (1, 0.75), (3, 1.5)]));
        // 6.10a and 6.10b: 0.85 · 1.35.
        let pair = Rule::FundamentalPair { xi: 0.85 };
        assert!(has(pair, &canopy, &[(0, 1.35), (1, 0.75), (3, 0.9)]));
        assert!(has(pair, &canopy, &[(0, 1.1475), (1, 0.75), (3, 1.5)]));
        assert!(!has(pair, &canopy, &[(0, 1.35), (1, 0.75), (3, 1.5)]));
        // 6.14b, 6.15b, 6.16b, 6.11b.
        assert!(has(Rule::Characteristic, &canopy, &[(0, 1.0), (1, 0.5), (6, 1.0)]));
        assert!(has(Rule::Frequent, &canopy, &[(0, 1.0), (6, 0.5)]));
        assert!(has(Rule::QuasiPermanent, &canopy, &[(0, 1.0)]));
        assert!(has(accidental(false, false), &canopy, &[(0, 1.0), (3, 0.2)]));
    }

    #[test]
    fn prestress_is_factored_in_fundamental_combinations_alone() {
        let mut canopy = canopy();
        canopy.prestress = [1.2, 0.9];
        let made = Rule::Fundamental.combinations(&canopy);
        assert_eq!(made.len(), 220);
        assert_eq!(made.iter().filter(|c| c.prestress == 0.9).count(), 110);
        let serves = Rule::Characteristic.combinations(&canopy);
        assert!(serves.len() == 55 && serves.iter().all(|c| c.prestress == 1.0));
    }

    /// The rule, read the other way round: whether factors are one of the sums that it asks for.
    fn is_asked_for(rule: Rule, classes: &Classes, made: &Combination) -> bool {
        let factor = |action: usize| {
            made.factors
                .iter()
                .find(|(other, _)| *other == action)
                .map_or(0.0, |(_, f)| *f)
        };
        let near = |a: f64, b: f64| (a - b).abs() <= 1e-11 * b.abs();
        let fundamental = matches!(rule, Rule::Fundamental | Rule::FundamentalPair { .. });
        let xi_of = |leads: bool| match rule {
            Rule::FundamentalPair { xi } if leads => xi,
            _ => 1.0,
        };
        let permanents = classes.list.iter().filter_map(|class| match class.behaviour {
            Behaviour::Permanent { adverse, favourable } => Some((class, adverse, favourable)),
            _ => None,
        });
        let permanents: Vec<_> = permanents.collect();
        let permanent_as = |pick: &dyn Fn(f64, f64) -> f64| {
            permanents.iter().all(|(class, adverse, favourable)| {
                class
                    .actions
                    .iter()
                    .all(|action| near(factor(*action), pick(*adverse, *favourable)))
            })
        };
        let mut accidents = 0;
        // Actions that have their leading value and no other, their accompanying value and no other, either.
        let (mut leads, mut accompanies, mut either) = (0, 0, 0);
        for class in &classes.list {
            let acting: Vec<f64> = class.actions.iter().map(|a| factor(*a)).filter(|f| *f != 0.0).collect();
            match class.behaviour {
                Behaviour::Permanent { .. } => {}
                Behaviour::Accidental => {
                    accidents += acting.len();
                    if acting.iter().any(|f| *f != 1.0) {
                        return false;
                    }
                }
                Behaviour::Variable {
                    gamma,
                    psi0,
                    psi1,
                    psi2,
                } => {
                    if acting.len() > 1 {
                        return false;
                    }
                    let (first, other) = match rule {
                        _ if fundamental => (gamma, gamma * psi0),
                        Rule::Characteristic => (1.0, psi0),
                        Rule::Frequent
                        | Rule::Accidental {
                            leads_quasi_permanent: false,
                            ..
                        } => (psi1, psi2),
                        _ => (psi2, psi2),
                    };
                    for f in acting {
                        match (near(f, first), near(f, other)) {
                            (true, true) => either += 1,
                            (true, false) => leads += 1,
                            (false, true) => accompanies += 1,
                            (false, false) => return false,
                        }
                    }
                }
            }
        }
        let wanted = usize::from(matches!(rule, Rule::Accidental { acts: true, .. }));
        let one_leads = leads == 1 || (leads == 0 && (either > 0 || accompanies == 0));
        let none_leads = leads == 0;
        let sum_without_leader = matches!(rule, Rule::QuasiPermanent | Rule::FundamentalPair { .. }) && none_leads;
        let sum_with_leader = !matches!(rule, Rule::QuasiPermanent) && one_leads;
        let permanent = |leader: bool| {
            if fundamental {
                permanent_as(&|adverse, _| xi_of(leader) * adverse) || permanent_as(&|_, favourable| favourable)
            } else {
                permanent_as(&|_, _| 1.0)
            }
        };
        accidents == wanted && ((sum_without_leader && permanent(false)) || (sum_with_leader && permanent(true)))
    }

    /// Every way to let each action lead, accompany or stay away, tried out.
    fn by_trying(rule: Rule, classes: &Classes) -> BTreeSet<Vec<(usize, u64)>> {
        let n = classes.list.iter().map(|class| class.actions.len()).sum::<usize>();
        let class_of = |action: usize| classes.list.iter().find(|class| class.actions.contains(&action));
        let mut found = BTreeSet::new();
        for mut number in 0..3_usize.pow(u32::try_from(n).expect("few")) {
            let roles: Vec<usize> = (0..n)
                .map(|_| {
                    let role = number % 3;
                    number /= 3;
                    role
                })
                .collect();
            for permanent in 0..2 {
                for expression in 0..2 {
                    let mut factors = Vec::new();
                    for (action, role) in roles.iter().enumerate() {
                        let fundamental = matches!(rule, Rule::Fundamental | Rule::FundamentalPair { .. });
                        let factor = match class_of(action).expect("in a class").behaviour {
                            Behaviour::Permanent { adverse, favourable } => match (rule, permanent, expression) {
                                (Rule::FundamentalPair { xi }, 0, 1) => xi * adverse,
                                _ if !fundamental => 1.0,
                                (_, 0, _) => adverse,
                                _ => favourable,
                            },
                            Behaviour::Accidental => [0.0, 1.0, 1.0][*role],
                            Behaviour::Variable {
                                gamma,
                                psi0,
                                psi1,
                                psi2,
                            } => match rule {
                                _ if fundamental => [0.0, gamma, gamma * psi0][*role],
                                Rule::Characteristic => [0.0, 1.0, psi0][*role],
                                Rule::Frequent
                                | Rule::Accidental {
                                    leads_quasi_permanent: false,
                                    ..
                                } => [0.0, psi1, psi2][*role],
                                _ => [0.0, psi2, psi2][*role],
                            },
                        };
                        if factor != 0.0 {
                            factors.push((action, tidy(factor)));
                        }
                    }
                    let combination = Combination {
                        factors,
                        prestress: 1.0,
                        permanent: Permanent::Adverse,
                        variable: Vec::new(),
                    };
                    if is_asked_for(rule, classes, &combination) {
                        found.insert(combination.key().1);
                    }
                }
            }
        }
        found
    }

    fn some_classes() -> impl Strategy<Value = Classes> {
        let psi = || prop_oneof![Just(0.0), Just(0.2), Just(0.5), Just(0.7), Just(1.0)];
        let class = (0..4_u8, 1..3_usize, psi(), psi(), psi());
        prop::collection::vec(class, 1..5).prop_map(|list| {
            let mut next = 0;
            let list = list.into_iter().map(|(kind, n, psi0, psi1, psi2)| {
                let actions: Vec<usize> = (next..next + n).collect();
                next += n;
                match kind {
                    0 => permanent(&actions),
                    1 => Class {
                        actions,
                        behaviour: Behaviour::Accidental,
                    },
                    _ => variable(&actions, [psi0, psi1, psi2]),
                }
            });
            classes(list.collect())
        })
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(150))]

        /// What is made is what trying out every selection finds, nothing less and nothing more.
        #[test]
        fn rules_make_what_they_say(classes in some_classes(), rule in prop::sample::select(&ALL[..])) {
            let made = rule.combinations(&classes);
            prop_assert!(made.iter().all(|combination| is_asked_for(rule, &classes, combination)));
            let keys: BTreeSet<_> = made.iter().map(|combination| combination.key().1).collect();
            prop_assert_eq!(keys.len(), made.len());
            prop_assert!(made.len() as f64 <= rule.count(&classes));
            prop_assert_eq!(keys, by_trying(rule, &classes));
        }
    }
}
