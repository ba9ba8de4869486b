//! Rules that make cases and design effects from classes of actions.

use std::collections::BTreeMap;

use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::combination::Rule as Given;
use ropewalk_numerics::brief::{CaseGiven, DesignEffect, EffectRule};
use ropewalk_numerics::load::combination::{Combination, Permanent, Rule};
use ropewalk_numerics::model::{CableId, Member, StrutId};

use super::actions::Actions;
use super::cases::{Cases, check_shares, reserved};
use super::factors::{Factors, multiplying, stem};
use super::findings::{Findings, Path, is_id};
use super::names::{Thing, bad_id};
use super::net::NetDraft;
use super::numbers::{EFFECT_FACTOR, Of, XI};
use super::reasons;
use super::resolved::Resolved;
use super::scope::{MEMBERS, Scopes};
use crate::config::Limits;
use crate::words::{Quoted, number, quoted_list};

/// Recommended `ξ` of EN 1990:2002, from memory.
const XI_DEFAULT: f64 = 0.85;

/// What rules are read against.
pub(crate) struct Context<'r, 'a> {
    pub(crate) net: &'r NetDraft<'a>,
    pub(crate) scopes: &'r Scopes,
    pub(crate) actions: &'r Actions<'a>,
    /// Actions under which the reference state is found.
    pub(crate) under: &'r [usize],
    pub(crate) limits: &'r Limits,
}

/// A rule as read.
struct Asked<'a> {
    set: &'a str,
    rules: Vec<Rule>,
    /// Members of which each is taken out in turn, with their ids.
    removed: Vec<(Member, &'a str)>,
    /// Factor on the effect of a loss.
    loss: Option<f64>,
    /// Sets that factors on effects fill, where they are asked for.
    on_effect: Option<Vec<String>>,
}

/// Makes the cases and design effects of all rules.
pub(crate) fn read<'a>(
    brief: &'a v1::Brief,
    factors: Option<&Factors<'a>>,
    context: &Context<'_, 'a>,
    cases: &mut Cases<'a>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) {
    let list = Path::root("combinations");
    if !brief.combinations.is_empty() && brief.factors.is_none() {
        findings.error(
            reasons::MISSING,
            &Path::root("factors"),
            "",
            "rules combine actions by the factors of their classes, and there are none",
            "give factors with their source and classes",
        );
    }
    let asked: Vec<Option<Asked<'a>>> = (brief.combinations.iter().enumerate())
        .map(|(position, rule)| read_rule(rule, &list.number(position), context, cases, findings, resolved))
        .collect();
    let Some(factors) = factors.filter(|factors| factors.complete) else {
        return;
    };
    let mut maker = Maker::new(context, factors, cases);
    for (position, asked) in asked.iter().enumerate() {
        let Some(asked) = asked else { continue };
        let at = list.number(position);
        if !maker.fits(asked, &at, findings) {
            return;
        }
        maker.make(asked, &at, findings);
    }
}

fn read_rule<'a>(
    rule: &'a v1::Combination,
    at: &Path<'_>,
    context: &Context<'_, 'a>,
    cases: &mut Cases<'a>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<Asked<'a>> {
    let set = cases.declare_set(&rule.set, &at.field("set"), findings);
    let mut asked = Asked {
        set: &rule.set,
        rules: Vec::new(),
        removed: Vec::new(),
        loss: None,
        on_effect: None,
    };
    match rule.rule.as_ref() {
        Some(Given::Fundamental(given)) => {
            let at = at.field("fundamental");
            asked.rules.push(match &given.pair {
                None => Rule::Fundamental,
                Some(pair) => {
                    let (pair_at, of) = (at.field("pair"), Of::new("rule", &rule.set));
                    let at = pair_at.field("xi");
                    if pair.xi.is_none() {
                        resolved.left_out(&at, "0.85 (EN 1990:2002, recommended value, from memory: verify)");
                    }
                    let xi = findings.number_or(&at, of, &XI, pair.xi, XI_DEFAULT);
                    Rule::FundamentalPair { xi: xi? }
                }
            });
            asked.removed = members(&given.remove_each, &at.field("remove_each"), context, findings)?;
            if let Some(effects) = &given.on_effect {
                let mut sets = Vec::new();
                if !effects.set.is_empty() {
                    let at = at.field("on_effect");
                    sets.extend(cases.declare_set(&effects.set, &at.field("set"), findings));
                }
                asked.on_effect = Some(sets);
            }
        }
        Some(Given::Characteristic(_)) => asked.rules.push(Rule::Characteristic),
        Some(Given::Frequent(_)) => asked.rules.push(Rule::Frequent),
        Some(Given::QuasiPermanent(_)) => asked.rules.push(Rule::QuasiPermanent),
        Some(Given::Accidental(given)) => read_accidental(given, &rule.set, at, context, &mut asked, findings)?,
        None => {
            findings.error(
                reasons::MISSING,
                at,
                &rule.set,
                format!(
                    "the rule for set {} says not which combinations it makes",
                    Quoted(&rule.set)
                ),
                "give one of fundamental, characteristic, frequent, quasi_permanent, accidental",
            );
            return None;
        }
    }
    set.map(|_| asked)
}

fn read_accidental<'a>(
    given: &'a v1::AccidentalRule,
    set: &str,
    at: &Path<'_>,
    context: &Context<'_, 'a>,
    asked: &mut Asked<'a>,
    findings: &mut Findings,
) -> Option<()> {
    let at = at.field("accidental");
    let leads_quasi_permanent = given.leads_quasi_permanent;
    let rule = |acts| Rule::Accidental {
        acts,
        leads_quasi_permanent,
    };
    asked.rules = vec![rule(true)];
    let field = at.field("effect_factor");
    if let Some(factor) = given.effect_factor {
        if given.remove_each.is_empty() {
            findings.error(
                reasons::COVERS_NOTHING,
                &field,
                set,
                format!(
                    "the rule for set {} has a factor on the effect of a loss, and nothing is lost",
                    Quoted(set)
                ),
                "name in remove_each what is lost, or take the factor out",
            );
        }
        asked.loss = findings.number(&field, Of::new("rule", set), &EFFECT_FACTOR, factor);
    }
    if !given.remove_each.is_empty() {
        asked.removed = members(&given.remove_each, &at.field("remove_each"), context, findings)?;
        asked.rules.push(rule(false));
    }
    Some(())
}

/// Members that a list names, each once, with their ids.
pub(crate) fn members<'a>(
    on: &[String],
    at: &Path<'_>,
    context: &Context<'_, 'a>,
    findings: &mut Findings,
) -> Option<Vec<(Member, &'a str)>> {
    let scope = context.scopes.of(context.net, on, at, MEMBERS, findings);
    let members = scope.covered.iter().filter_map(|covered| match covered.thing {
        Thing::Cable(cable) => {
            let id = context.net.cables[cable].message.id.as_str();
            Some((Member::Cable(CableId::new(cable)), id))
        }
        Thing::Strut(strut) => {
            let id = context.net.struts[strut].message.id.as_str();
            Some((Member::Strut(StrutId::new(strut)), id))
        }
        _ => None,
    });
    scope.complete.then(|| members.collect())
}

/// What makes cases the same: share of prestress, factors, what is taken out.
type Key = (u64, Vec<(usize, u64)>, Vec<(u8, usize)>);

fn key(case: &CaseGiven) -> Key {
    let factors = case.factors.iter().filter(|(_, factor)| *factor != 0.0);
    let mut removed: Vec<_> = (case.removed.iter())
        .map(|member| match member {
            Member::Cable(cable) => (0, cable.index()),
            Member::Strut(strut) => (1, strut.index()),
        })
        .collect();
    removed.sort_unstable();
    (
        case.prestress_share.to_bits(),
        factors.map(|(action, factor)| (*action, factor.to_bits())).collect(),
        removed,
    )
}

struct Maker<'m, 'r, 'a> {
    context: &'m Context<'r, 'a>,
    factors: &'m Factors<'a>,
    cases: &'m mut Cases<'a>,
    known: BTreeMap<Key, usize>,
    /// Combinations made so far, by set.
    numbers: BTreeMap<&'a str, usize>,
    /// Design effects by rule, its factor, their last case and the one that they stand beside.
    effects: BTreeMap<(u8, u64, usize, Option<usize>), usize>,
}

impl<'m, 'r, 'a> Maker<'m, 'r, 'a> {
    fn new(context: &'m Context<'r, 'a>, factors: &'m Factors<'a>, cases: &'m mut Cases<'a>) -> Self {
        let mut known = BTreeMap::new();
        for (index, case) in cases.list.iter().enumerate() {
            // A case with a wish of its own is another one.
            if case.load_steps.is_none() && case.path.is_none() {
                known.entry(key(case)).or_insert(index);
            }
        }
        Self {
            context,
            factors,
            cases,
            known,
            numbers: BTreeMap::new(),
            effects: BTreeMap::new(),
        }
    }

    /// Refuses more cases than the server takes, before any is made.
    fn fits(&self, asked: &Asked<'_>, at: &Path<'_>, findings: &mut Findings) -> bool {
        let count = |factors: &Factors<'_>| {
            let removed = asked.removed.len() as f64;
            let one = |rule: &Rule| {
                let made = rule.count(&factors.classes);
                match rule {
                    Rule::Accidental { acts: true, .. } => made,
                    _ => made * (1.0 + removed),
                }
            };
            asked.rules.iter().map(one).sum::<f64>()
        };
        let (made, limit) = (count(self.factors), f64::from(self.context.limits.cases));
        if self.cases.list.len() as f64 + made <= limit {
            return true;
        }
        let mut message = format!(
            "rule {} makes {} cases, and this server takes {} in all",
            Quoted(asked.set),
            number(made),
            number(limit)
        );
        let mut cure =
            "put actions that never act together into one class, or write the cases that matter by hand".to_owned();
        if let Some([a, b]) = multiplying(self.factors) {
            let ids = [self.factors.ids[a], self.factors.ids[b]];
            let mut merged = Factors {
                classes: self.factors.classes.clone(),
                ids: self.factors.ids.clone(),
                class_of: Vec::new(),
                complete: true,
            };
            let moved = merged.classes.list.remove(b).actions;
            merged.classes.list[a].actions.extend(moved);
            message.push_str(&format!(
                ": classes {} and {} are not alternatives, so they add up",
                Quoted(ids[0]),
                Quoted(ids[1])
            ));
            let name =
                stem(ids[0], ids[1]).map_or_else(|| "one class".to_owned(), |stem| format!("class {}", Quoted(stem)));
            cure = format!(
                "put both into {name} (then {} cases), if they never act together",
                number(count(&merged))
            );
        }
        if asked.removed.len() > 1 {
            message.push_str(&format!(
                "; each is made again for each of {} members taken out",
                asked.removed.len()
            ));
        }
        findings
            .error(reasons::TOO_MANY, at, asked.set, message, cure)
            .value(made);
        false
    }

    fn make(&mut self, asked: &Asked<'a>, at: &Path<'_>, findings: &mut Findings) {
        let before = (self.cases.list.len(), self.cases.effects.len());
        let mut named = Vec::new();
        for rule in &asked.rules {
            // Where members are lost the whole net is but their counterpart.
            let loses = matches!(rule, Rule::Accidental { acts: false, .. });
            for combination in rule.combinations(&self.factors.classes) {
                if combination.factors.is_empty() && !loses {
                    continue;
                }
                let count = self.numbers.entry(asked.set).or_default();
                *count += 1;
                let id = format!("{}-{count:03}", asked.set);
                let given = CaseGiven {
                    factors: combination.factors.clone(),
                    prestress_share: combination.prestress - 1.0,
                    ..CaseGiven::default()
                };
                let set = if loses { None } else { Some(asked.set) };
                if !loses {
                    named.push(self.case(id.clone(), given.clone(), set, at, findings));
                } else if asked.loss.is_some() {
                    self.case(id.clone(), given.clone(), set, at, findings);
                }
                for (member, name) in &asked.removed {
                    if matches!(rule, Rule::Accidental { acts: true, .. }) {
                        continue;
                    }
                    let without = CaseGiven {
                        removed: vec![*member],
                        ..given.clone()
                    };
                    let case = self.case(format!("{id}-without-{name}"), without, Some(asked.set), at, findings);
                    named.push(case);
                    if let (true, Some(factor)) = (loses, asked.loss) {
                        self.loss(&given, case, factor, asked.set, at, findings);
                    }
                }
                if let Some(sets) = &asked.on_effect {
                    self.on_effect(&combination, &given, sets, at, findings);
                }
            }
        }
        self.tell(asked, before, &named, at, findings);
    }

    /// What a rule came to.
    fn tell(&self, asked: &Asked<'_>, before: (usize, usize), named: &[usize], at: &Path<'_>, findings: &mut Findings) {
        if named.is_empty() {
            let message = match asked.rules[..] {
                [Rule::Accidental { .. }] => format!(
                    "the rule for set {} names no member that is lost, and no action is of an accidental class",
                    Quoted(asked.set)
                ),
                _ => format!(
                    "no action is of a class that the rule for set {} combines",
                    Quoted(asked.set)
                ),
            };
            findings.error(
                reasons::COMBINATION_WITHOUT_ACTIONS,
                at,
                asked.set,
                message,
                "name classes of factors.classes in the class of actions; for a loss, name members in remove_each",
            );
            return;
        }
        let (cases, effects) = (self.cases.list.len() - before.0, self.cases.effects.len() - before.1);
        let mut message = format!("the rule for set {} asks for {} cases", Quoted(asked.set), named.len());
        let shared: Vec<&str> = (named.iter().filter(|case| **case < before.0))
            .map(|case| self.cases.list[*case].name.as_str())
            .collect();
        if !shared.is_empty() {
            message.push_str(&format!(
                ", of which there were {} before: {}",
                shared.len(),
                quoted_list(shared)
            ));
        }
        message.push_str(&format!("; it adds {cases} cases and {effects} design effects"));
        findings
            .note(reasons::CASES_MADE, at, asked.set, message, "Check lists them in words")
            .value(named.len());
        for action in self.context.under {
            if !self.factors.is_permanent(*action) {
                let id = &self.context.actions.messages[*action].id;
                findings.doubt(
                    reasons::CASE_WITHOUT_DEAD_LOAD,
                    at,
                    asked.set,
                    format!(
                        "combinations of set {} leave out action {}, under which the reference state is found: its class is not permanent",
                        Quoted(asked.set),
                        Quoted(id)
                    ),
                    format!("give {} a permanent class, or accept this doubt", Quoted(id)),
                );
            }
        }
        for case in named.iter().filter(|case| **case >= before.0) {
            let case = &self.cases.list[*case];
            if check_shares(case, at, self.context.net, self.context.actions, findings) {
                break;
            }
        }
    }

    /// The case, made if it is not there yet.
    fn case(
        &mut self,
        id: String,
        mut given: CaseGiven,
        set: Option<&str>,
        at: &Path<'_>,
        findings: &mut Findings,
    ) -> usize {
        let key = key(&given);
        if let Some(known) = self.known.get(&key) {
            let sets = &mut self.cases.list[*known].sets;
            if let Some(set) = set.filter(|set| !sets.iter().any(|other| other == set)) {
                sets.push(set.to_owned());
            }
            return *known;
        }
        let index = self.cases.list.len();
        self.known.insert(key, index);
        self.cases.declare_made(&id, index, at, findings);
        given.name = id;
        given.sets.extend(set.map(str::to_owned));
        self.cases.list.push(given);
        index
    }

    fn effect(&mut self, effect: DesignEffect, at: &Path<'_>, findings: &mut Findings) {
        // Where rules share a case they share its effects.
        let (rule, factor) = match effect.rule {
            EffectRule::Loss { factor } => (0, factor),
            EffectRule::OnEffect { factor } => (1, factor),
            EffectRule::OnParts { variable, .. } => (2, variable),
        };
        let last = effect.terms.last().map_or(0, |(case, _)| *case);
        let key = (rule, factor.to_bits(), last, effect.beside);
        if let Some(known) = self.effects.get(&key) {
            let known = &mut self.cases.effects[*known];
            for set in effect.sets {
                if !known.sets.contains(&set) {
                    known.sets.push(set);
                }
            }
            return;
        }
        self.effects.insert(key, self.cases.effects.len());
        self.cases.declare_effect(&effect.name, at, findings);
        self.cases.effects.push(effect);
    }

    /// `E1 + k (E2 − E1)`.
    fn loss(
        &mut self,
        intact: &CaseGiven,
        lost: usize,
        factor: f64,
        set: &str,
        at: &Path<'_>,
        findings: &mut Findings,
    ) {
        let Some(intact) = self.known.get(&key(intact)).copied() else {
            return;
        };
        let effect = DesignEffect {
            name: format!("{}-effect", self.cases.list[lost].name),
            sets: vec![set.to_owned()],
            rule: EffectRule::Loss { factor },
            terms: vec![(intact, 1.0 - factor), (lost, factor)],
            beside: None,
        };
        self.effect(effect, at, findings);
    }

    /// `γ E(F)` and `γ_G E(G+P) + γ_Q (E(G+P+Q) − E(G+P))`, where one action is predominant.
    fn on_effect(
        &mut self,
        combination: &Combination,
        given: &CaseGiven,
        sets: &[String],
        at: &Path<'_>,
        findings: &mut Findings,
    ) {
        let Some(beside) = self.known.get(&key(given)).copied() else {
            return;
        };
        let name = self.cases.list[beside].name.clone();
        let of = |action: usize| {
            given
                .factors
                .iter()
                .find(|(other, _)| *other == action)
                .map(|(_, factor)| *factor)
        };
        let permanent = (given.factors.iter()).find(|(action, _)| self.factors.is_permanent(*action));
        let permanent = permanent.map(|(_, factor)| *factor).filter(|_| {
            self.factors
                .common_permanent(|adverse, favourable| match combination.permanent {
                    Permanent::Adverse => adverse,
                    _ => favourable,
                })
                .is_some()
        });
        let unfactored = |variable: bool| CaseGiven {
            factors: (given.factors.iter())
                .filter(|(action, _)| variable || self.factors.is_permanent(*action))
                .map(|(action, _)| (*action, 1.0))
                .collect(),
            ..given.clone()
        };
        let (whole, permanents) = (unfactored(true), unfactored(false));
        let factor = match combination.variable[..] {
            [] => permanent,
            [leading] => of(leading),
            _ => None,
        };
        let Some(factor) = factor.filter(|factor| *factor != 1.0) else {
            return;
        };
        let whole = self.case(format!("{name}-unfactored"), whole, None, at, findings);
        self.effect(
            DesignEffect {
                name: format!("{name}-on-effect"),
                sets: sets.to_vec(),
                rule: EffectRule::OnEffect { factor },
                terms: vec![(whole, factor)],
                beside: Some(beside),
            },
            at,
            findings,
        );
        let (Some(permanent), [_]) = (permanent, &combination.variable[..]) else {
            return;
        };
        let permanents = self.case(format!("{name}-permanent"), permanents, None, at, findings);
        self.effect(
            DesignEffect {
                name: format!("{name}-on-parts"),
                sets: sets.to_vec(),
                rule: EffectRule::OnParts {
                    permanent,
                    variable: factor,
                },
                terms: vec![(permanents, permanent - factor), (whole, factor)],
                beside: Some(beside),
            },
            at,
            findings,
        );
    }
}

impl<'a> Cases<'a> {
    /// Adds a set that a rule fills. Answers it, if it can be one.
    pub(crate) fn declare_set(&mut self, set: &'a str, at: &Path<'_>, findings: &mut Findings) -> Option<String> {
        if !is_id(set) {
            bad_id(findings, at, set);
            return None;
        }
        reserved(set, at, findings);
        self.add_set(set, at, findings);
        Some(set.to_owned())
    }
}
