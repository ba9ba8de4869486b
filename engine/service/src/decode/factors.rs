//! Classes of actions with their factors.

use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::action_class::Behaviour as Given;
use ropewalk_numerics::load::combination::{Behaviour, Class, Classes};

use super::actions::Actions;
use super::findings::{Findings, Path};
use super::names::Names;
use super::numbers::{Of, PARTIAL_FACTOR, PRESTRESS_FACTOR, PSI, Quantity};
use super::reasons;
use super::resolved::Resolved;
use crate::words::{Quoted, number, shown};

/// Classes as read, for rules to combine.
#[derive(Debug)]
pub(crate) struct Factors<'a> {
    /// Those that could be read.
    pub(crate) classes: Classes,
    /// Their ids.
    pub(crate) ids: Vec<&'a str>,
    /// The class of each action, by position in `classes`; `None`: it enters cases written by hand only.
    pub(crate) class_of: Vec<Option<usize>>,
    /// Whether all of them could be read.
    pub(crate) complete: bool,
}

impl<'a> Factors<'a> {
    pub(crate) fn read(
        factors: &'a v1::Factors,
        actions: &Actions<'a>,
        findings: &mut Findings,
        resolved: &mut Resolved,
    ) -> Self {
        let root = Path::root("factors");
        if factors.source.trim().is_empty() {
            findings.doubt(
                reasons::NO_SOURCE,
                &root.field("source"),
                "",
                "nobody can tell which standard, edition and annex the factors are from",
                "name in source the standard, its edition and the national annex, or the office's rule",
            );
        }
        let list = root.field("classes");
        let mut names = Names::new("classes of actions");
        let mut read = Self {
            classes: Classes {
                list: Vec::new(),
                prestress: prestress(factors.prestress.as_ref(), &root.field("prestress"), findings, resolved),
            },
            ids: Vec::new(),
            class_of: vec![None; actions.messages.len()],
            complete: true,
        };
        for (position, class) in factors.classes.iter().enumerate() {
            names.declare(findings, &list, position, class.id.as_str(), read.ids.len());
            let Some(behaviour) = behaviour(class, &list.element(&class.id, position), findings) else {
                read.complete = false;
                continue;
            };
            read.ids.push(&class.id);
            read.classes.list.push(Class {
                actions: Vec::new(),
                behaviour,
            });
        }
        let known = |id: &str| factors.classes.iter().any(|class| class.id == id);
        let mut left_out = Vec::new();
        for (action, message) in actions.messages.iter().enumerate() {
            match names.get(&message.class).filter(|class| *class < read.ids.len()) {
                Some(class) => {
                    read.class_of[action] = Some(class);
                    read.classes.list[class].actions.push(action);
                }
                None if known(&message.class) => {}
                None => left_out.push(action),
            }
        }
        read.without_actions(&list, findings);
        read.not_combined(&left_out, &names, actions, findings);
        read
    }

    fn without_actions(&self, list: &Path<'_>, findings: &mut Findings) {
        for (position, class) in self.classes.list.iter().enumerate() {
            if class.actions.is_empty() {
                let id = self.ids[position];
                findings.note(
                    reasons::CLASS_WITHOUT_ACTIONS,
                    &list.element(id, position),
                    id,
                    format!("no action is of class {}", Quoted(id)),
                    "name it in the class of an action, or take it out",
                );
            }
        }
    }

    /// Actions that no rule combines: perhaps on purpose, perhaps by a slip of typing.
    fn not_combined(
        &self,
        left_out: &[usize],
        names: &Names<'_, usize>,
        actions: &Actions<'_>,
        findings: &mut Findings,
    ) {
        let list = Path::root("actions");
        for action in left_out {
            let message = &actions.messages[*action];
            let at = list.element(&message.id, *action);
            let (id, class) = (Quoted(&message.id), Quoted(&message.class));
            if message.class.is_empty() {
                findings.doubt(
                    reasons::ACTION_NOT_COMBINED,
                    &at.field("class"),
                    &message.id,
                    format!("action {id} has no class: it enters only cases written by hand"),
                    "give its class, or accept this doubt",
                );
            } else if let Some(meant) = findings.nearest(&message.class, names.order().iter().copied()) {
                findings
                    .doubt(
                        reasons::ACTION_NOT_COMBINED,
                        &at.field("class"),
                        &message.id,
                        format!(
                            "action {id} enters only cases written by hand: its class {class} has no factors. Did you mean {}?",
                            Quoted(meant)
                        ),
                        format!("write {}, or accept this doubt", Quoted(meant)),
                    )
                    .value(shown(&message.class));
            } else {
                findings
                    .note(
                        reasons::ACTION_NOT_COMBINED,
                        &at.field("class"),
                        &message.id,
                        format!("action {id} enters only cases written by hand: its class {class} has no factors"),
                        "add the class to factors.classes, if rules shall combine it",
                    )
                    .value(shown(&message.class));
            }
        }
    }

    /// Whether an action is permanent.
    pub(crate) fn is_permanent(&self, action: usize) -> bool {
        let class = self.class_of[action].map(|class| self.classes.list[class].behaviour);
        matches!(class, Some(Behaviour::Permanent { .. }))
    }

    /// The one factor on adverse or favourable permanent actions, if they have but one.
    pub(crate) fn common_permanent(&self, pick: impl Fn(f64, f64) -> f64) -> Option<f64> {
        let classes = self.classes.list.iter().filter(|class| !class.actions.is_empty());
        let mut factors = classes.filter_map(|class| match class.behaviour {
            Behaviour::Permanent { adverse, favourable } => Some(pick(adverse, favourable)),
            _ => None,
        });
        let first = factors.next()?;
        factors.all(|factor| factor == first).then_some(first)
    }
}

fn prestress(
    given: Option<&v1::PrestressFactors>,
    at: &Path<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> [f64; 2] {
    let mut one = |name: &'static str, value: Option<f64>| {
        let at = at.field(name);
        match value {
            Some(value) => findings
                .number(&at, Of::new("factors", ""), &PRESTRESS_FACTOR, value)
                .unwrap_or(1.0),
            None => {
                resolved.left_out(&at, 1);
                1.0
            }
        }
    };
    let factors = [
        one("high", given.and_then(|g| g.high)),
        one("low", given.and_then(|g| g.low)),
    ];
    if factors[0] < factors[1] {
        out_of_order(findings, at, "", "high", factors[0], "low", factors[1]);
    }
    factors
}

fn behaviour(class: &v1::ActionClass, at: &Path<'_>, findings: &mut Findings) -> Option<Behaviour> {
    let of = Of::new("class", &class.id);
    let mut read = |kind: &'static str, name: &'static str, quantity: &Quantity, value| {
        findings.number(&at.field(kind).field(name), of, quantity, value)
    };
    match class.behaviour.as_ref() {
        Some(Given::Permanent(given)) => {
            let adverse = read("permanent", "adverse", &PARTIAL_FACTOR, given.adverse);
            let favourable = read("permanent", "favourable", &PARTIAL_FACTOR, given.favourable);
            let (adverse, favourable) = (adverse?, favourable?);
            if adverse < favourable {
                let at = at.field("permanent");
                out_of_order(findings, &at, &class.id, "adverse", adverse, "favourable", favourable);
            }
            Some(Behaviour::Permanent { adverse, favourable })
        }
        Some(Given::Variable(given)) => {
            let gamma = read("variable", "gamma", &PARTIAL_FACTOR, given.gamma);
            let psi0 = read("variable", "psi0", &PSI, given.psi0);
            let psi1 = read("variable", "psi1", &PSI, given.psi1);
            let psi2 = read("variable", "psi2", &PSI, given.psi2);
            let (gamma, psi0, psi1, psi2) = (gamma?, psi0?, psi1?, psi2?);
            for (higher, above, lower, below) in [("psi0", psi0, "psi1", psi1), ("psi1", psi1, "psi2", psi2)] {
                if above < below {
                    out_of_order(findings, &at.field("variable"), &class.id, higher, above, lower, below);
                }
            }
            Some(Behaviour::Variable {
                gamma,
                psi0,
                psi1,
                psi2,
            })
        }
        Some(Given::Accidental(_)) => Some(Behaviour::Accidental),
        None => {
            findings.error(
                reasons::MISSING,
                at,
                &class.id,
                format!("class {} says not how its actions behave", Quoted(&class.id)),
                "give one of permanent, variable, accidental",
            );
            None
        }
    }
}

fn out_of_order(findings: &mut Findings, at: &Path<'_>, id: &str, higher: &str, above: f64, lower: &str, below: f64) {
    findings.doubt(
        reasons::FACTORS_OUT_OF_ORDER,
        at,
        id,
        format!("{higher} is {}, below {lower}, {}", number(above), number(below)),
        format!("{higher} is as a rule the larger one: were they exchanged?"),
    );
}

/// Two classes of variable actions that add up though they might be meant as alternatives: where their names begin alike,
/// those; else the two with most actions.
pub(crate) fn multiplying(factors: &Factors<'_>) -> Option<[usize; 2]> {
    let list = &factors.classes.list;
    let variable = |class: &usize| {
        matches!(list[*class].behaviour, Behaviour::Variable { .. }) && !list[*class].actions.is_empty()
    };
    let classes: Vec<usize> = (0..list.len()).filter(variable).collect();
    let pairs = (classes.iter().enumerate()).flat_map(|(at, a)| classes[at + 1..].iter().map(move |b| [*a, *b]));
    pairs.max_by_key(|[a, b]| {
        let stem = stem(factors.ids[*a], factors.ids[*b]).map_or(0, str::len);
        let actions = list[*a].actions.len() * list[*b].actions.len();
        (stem, actions, std::cmp::Reverse((*a, *b)))
    })
}

/// What two names begin with, if that is a name.
pub(crate) fn stem<'a>(a: &'a str, b: &str) -> Option<&'a str> {
    let alike = a.char_indices().zip(b.chars()).find(|((_, a), b)| a != b);
    let end = alike.map_or(a.len().min(b.len()), |((position, _), _)| position);
    let stem = a.get(..end)?.trim_end_matches(['-', '_', ' ', '.']);
    (stem.chars().count() >= 3).then_some(stem)
}
