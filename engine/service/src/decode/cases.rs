//! Cases: which actions act together, and in words.

use std::collections::BTreeMap;

use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::load::Kind;
use ropewalk_numerics::brief::{CaseGiven, DesignEffect, LoadPath, PondingGiven};
use ropewalk_numerics::equilibrium::LoadSteps;
use ropewalk_numerics::model::Member;

use super::actions::Actions;
use super::combinations::{Context, members};
use super::factors::Factors;
use super::findings::{Findings, Path, is_id};
use super::names::{Names, bad_id};
use super::net::NetDraft;
use super::numbers::{FACTOR, LOAD_STEPS, Of, PATH_END, PATH_STEPS, WATER_DENSITY};
use super::reasons;
use super::resolved::Resolved;
use super::scope::tell_repeated;
use crate::words::{Quoted, number, quoted_list, rounded, shown};

/// Name of the reference state in results.
pub(crate) const REFERENCE: &str = "reference";
/// Name in results of what is gathered over all cases.
pub(crate) const ENVELOPE: &str = "envelope";
/// Names that cases and sets must not have.
const RESERVED: [&str; 3] = [REFERENCE, "governing", ENVELOPE];
/// Density of water where the brief gives none (kg/m³), common practice.
const WATER: f64 = 1000.0;
const PATH_END_DEFAULT: f64 = 1.5;
const PATH_STEPS_DEFAULT: u32 = 15;
/// Bytes of a case: its beginning is told in one message.
pub(super) const LARGEST: usize = 96 * 1024;

/// Cases as read, with the names that checks may read.
#[derive(Debug)]
pub(crate) struct Cases<'a> {
    pub(crate) messages: &'a [v1::Case],
    /// Those written by hand, then those that rules make.
    pub(crate) list: Vec<CaseGiven>,
    /// Design effects that rules make.
    pub(crate) effects: Vec<DesignEffect>,
    names: Names<'a, usize>,
    sets: Names<'a, ()>,
    /// Ids that rules made, of cases and of effects.
    made: BTreeMap<String, Made>,
}

/// What an id stands for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Known {
    Case(usize),
    Set,
    Effect,
}

/// What an id that a rule made stands for.
#[derive(Clone, Copy, Debug)]
enum Made {
    Case(usize),
    Effect(usize),
}

impl<'a> Cases<'a> {
    pub(crate) fn read(
        brief: &'a v1::Brief,
        context: &Context<'_, 'a>,
        findings: &mut Findings,
        resolved: &mut Resolved,
    ) -> Self {
        let mut cases = Self {
            messages: &brief.cases,
            list: Vec::with_capacity(brief.cases.len()),
            effects: Vec::new(),
            names: Names::new("cases"),
            sets: Names::new("sets"),
            made: BTreeMap::new(),
        };
        let list = Path::root("cases");
        for (index, case) in brief.cases.iter().enumerate() {
            cases.names.declare(findings, &list, index, case.id.as_str(), index);
            reserved(&case.id, &list.number(index).field("id"), findings);
        }
        for (index, case) in brief.cases.iter().enumerate() {
            let at = list.element(&case.id, index);
            cases.read_sets(case, &at, findings);
            let factors = read_factors(case, &at, context.actions, findings);
            let steps_at = at.field("load_steps");
            let of = Of::new("case", &case.id);
            let steps = case.load_steps;
            let load_steps =
                steps.filter(|steps| findings.number(&steps_at, of, &LOAD_STEPS, f64::from(*steps)).is_some());
            if case.encoded_len() > LARGEST {
                findings
                    .error(
                        reasons::TOO_LARGE,
                        &at,
                        &case.id,
                        format!(
                            "case {} takes {} bytes: at most {LARGEST} can be told",
                            Quoted(&case.id),
                            case.encoded_len()
                        ),
                        "gather loads in fewer actions, and name fewer sets",
                    )
                    .value(case.encoded_len());
            }
            cases.list.push(CaseGiven {
                name: case.id.clone(),
                sets: case.sets.clone(),
                factors,
                load_steps: load_steps.map(LoadSteps::Equal),
                removed: read_removed(case, &at, context, findings),
                ponding: read_ponding(case, &at, context, findings, resolved),
                path: read_path(case, &at, findings, resolved),
                prestress_share: 0.0,
            });
        }
        cases
    }

    fn read_sets(&mut self, case: &'a v1::Case, at: &Path<'_>, findings: &mut Findings) {
        let field = at.field("sets");
        tell_repeated(&case.sets, &field, findings);
        for (number, set) in case.sets.iter().enumerate() {
            let at = field.number(number);
            if !is_id(set) {
                bad_id(findings, &at, set);
                continue;
            }
            reserved(set, &at, findings);
            self.add_set(set, &at, findings);
        }
    }

    pub(super) fn add_set(&mut self, set: &'a str, at: &Path<'_>, findings: &mut Findings) {
        if self.names.get(set).is_some() {
            case_and_set(set, at, findings);
        }
        self.sets.insert(set, ());
    }

    /// Adds the id of a case that a rule makes.
    pub(super) fn declare_made(&mut self, id: &str, case: usize, at: &Path<'_>, findings: &mut Findings) {
        self.declare(id, Made::Case(case), at, findings);
    }

    /// Adds the id of the next design effect.
    pub(super) fn declare_effect(&mut self, id: &str, at: &Path<'_>, findings: &mut Findings) {
        self.declare(id, Made::Effect(self.effects.len()), at, findings);
    }

    fn declare(&mut self, id: &str, made: Made, at: &Path<'_>, findings: &mut Findings) {
        let at = at.field("set");
        if !is_id(id) {
            bad_id(findings, &at, id);
        } else if self.sets.get(id).is_some() {
            case_and_set(id, &at, findings);
        } else if self.names.get(id).is_some() || self.made.contains_key(id) {
            findings
                .error(
                    reasons::DUPLICATE_ID,
                    &at,
                    id,
                    format!(
                        "this rule makes a case {}, and there is another with this id",
                        Quoted(id)
                    ),
                    "give that case, or the set, another name",
                )
                .value(id);
        } else {
            self.made.insert(id.to_owned(), made);
        }
    }

    /// Cases that a list of sets and cases names, in brief order; all of them where it is empty. Design effects that it
    /// names are counted on from the last case; where it is empty, those that fill a set.
    pub(crate) fn named(&self, over: &[String], field: &Path<'_>, findings: &mut Findings) -> Option<Vec<usize>> {
        let n_cases = self.list.len();
        let mut wanted = vec![over.is_empty(); n_cases + self.effects.len()];
        if over.is_empty() {
            for (wanted, effect) in wanted[n_cases..].iter_mut().zip(&self.effects) {
                *wanted = !effect.sets.is_empty();
            }
        }
        self.find(over, field, None, wanted, findings)
    }

    /// States that a list of sets, cases and the word `reference` names: whether the reference state is one of them, and
    /// the cases in brief order; all of them where the list is empty. Design effects are no states.
    pub(crate) fn states(
        &self,
        about: &[String],
        field: &Path<'_>,
        findings: &mut Findings,
    ) -> Option<(bool, Vec<usize>)> {
        let n_cases = self.list.len();
        if about.is_empty() {
            return Some((true, (0..n_cases).collect()));
        }
        let mut reference = false;
        let wanted = vec![false; n_cases + self.effects.len()];
        let cases = self.find(about, field, Some(&mut reference), wanted, findings);
        cases.map(|mut cases| {
            cases.retain(|case| *case < n_cases);
            (reference, cases)
        })
    }

    /// Cases and design effects that a list names beside those `wanted`, in brief order; `reference`: where the word may
    /// stand, and is noted.
    fn find(
        &self,
        over: &[String],
        field: &Path<'_>,
        mut reference: Option<&mut bool>,
        mut wanted: Vec<bool>,
        findings: &mut Findings,
    ) -> Option<Vec<usize>> {
        tell_repeated(over, field, findings);
        let n_cases = self.list.len();
        let mut complete = true;
        for (number, name) in over.iter().enumerate() {
            let at = field.number(number);
            if let Some(reference) = reference.as_deref_mut().filter(|_| name == REFERENCE) {
                *reference = true;
            } else if let Some(case) = self.names.get(name) {
                wanted[case] = true;
            } else if let Some(made) = self.made.get(name) {
                wanted[match *made {
                    Made::Case(case) => case,
                    Made::Effect(effect) => n_cases + effect,
                }] = true;
            } else if self.sets.get(name).is_some() {
                let sets =
                    (self.list.iter().map(|case| &case.sets)).chain(self.effects.iter().map(|effect| &effect.sets));
                for (wanted, sets) in wanted.iter_mut().zip(sets) {
                    *wanted |= sets.contains(name);
                }
            } else {
                complete = false;
                self.unknown(name, &at, findings);
            }
        }
        complete.then(|| (0..wanted.len()).filter(|case| wanted[*case]).collect())
    }

    /// Cases of a set, in brief order; `None` if there is no such set.
    pub(crate) fn of_set(&self, set: &str) -> Option<Vec<usize>> {
        self.sets.get(set)?;
        let cases = self.list.iter().enumerate();
        let of_set = cases.filter(|(_, case)| case.sets.iter().any(|name| name == set));
        Some(of_set.map(|(case, _)| case).collect())
    }

    /// What an id stands for, if it is taken.
    pub(crate) fn known(&self, id: &str) -> Option<Known> {
        if let Some(case) = self.names.get(id) {
            return Some(Known::Case(case));
        }
        match self.made.get(id) {
            Some(Made::Case(case)) => Some(Known::Case(*case)),
            Some(Made::Effect(_)) => Some(Known::Effect),
            None => self.sets.get(id).map(|()| Known::Set),
        }
    }

    /// The one case with a name, by hand or made; tells sets, design effects and unknown names.
    pub(crate) fn one(&self, name: &str, at: &Path<'_>, findings: &mut Findings) -> Option<usize> {
        let what = match self.known(name) {
            Some(Known::Case(case)) => return Some(case),
            Some(Known::Set) => "set",
            Some(Known::Effect) => "design effect",
            None => {
                let mut cases: Names<'_, ()> = Names::new("cases");
                let made = self.made.iter().filter(|(_, made)| matches!(made, Made::Case(_)));
                let made = made.map(|(id, _)| id.as_str());
                for known in self.names.order().iter().copied().chain(made) {
                    cases.insert(known, ());
                }
                cases.unknown(findings, at, "case", name);
                return None;
            }
        };
        findings
            .error(
                reasons::WRONG_KIND,
                at,
                name,
                format!("{} is a {what}, and one state is wanted here", Quoted(name)),
                "name a case",
            )
            .value(name);
        None
    }

    /// The case with a name; tells if there is none.
    pub(crate) fn case(&self, name: &str, at: &Path<'_>, findings: &mut Findings) -> Option<usize> {
        self.names.find(findings, at, "case", name)
    }

    pub(super) fn unknown(&self, name: &str, at: &Path<'_>, findings: &mut Findings) {
        if name == REFERENCE {
            findings.error(
                reasons::RESERVED_ID,
                at,
                name,
                "the reference state is no case: checks read cases",
                "name sets or cases",
            );
            return;
        }
        let mut both: Names<'_, ()> = Names::new("cases and sets");
        let made = self.made.keys().map(String::as_str);
        for known in self.names.order().iter().chain(self.sets.order()).copied().chain(made) {
            both.insert(known, ());
        }
        both.unknown(findings, at, "set or case", name);
    }

    /// What the cases leave out or say twice. `driven`: actions that act in motions.
    pub(crate) fn doubts(
        &self,
        context: &Context<'_, 'a>,
        factors: Option<&Factors<'a>>,
        driven: &[usize],
        findings: &mut Findings,
    ) {
        let Context {
            net, actions, under, ..
        } = *context;
        let list = Path::root("cases");
        let by_hand = self.list.iter().take(self.messages.len());
        for (index, case) in by_hand.enumerate() {
            let at = list.element(&case.name, index);
            for action in under {
                if case.factors.iter().all(|(other, _)| other != action) {
                    let id = &actions.messages[*action].id;
                    findings.doubt(
                        reasons::CASE_WITHOUT_DEAD_LOAD,
                        &at.field("factors"),
                        &case.name,
                        format!(
                            "case {} leaves out action {}, under which the reference state is found",
                            Quoted(&case.name),
                            Quoted(id)
                        ),
                        format!("add {}: 1, or accept this doubt", Quoted(id)),
                    );
                }
            }
            check_shares(case, &at, net, actions, findings);
        }
        self.own_weight(net, actions, findings);
        self.temperature(net, actions, findings);
        self.unused(actions, &[under, driven].concat(), findings);
        self.permanent(actions, under, factors, findings);
    }

    /// Permanent actions that no case takes as favourable, or none as they are.
    fn permanent(
        &self,
        actions: &Actions<'_>,
        under: &[usize],
        factors: Option<&Factors<'_>>,
        findings: &mut Findings,
    ) {
        let list = Path::root("actions");
        for (action, message) in actions.messages.iter().enumerate() {
            let is_permanent = factors.is_some_and(|factors| factors.is_permanent(action));
            if !is_permanent && !under.contains(&action) {
                continue;
            }
            let of_it = self.list.iter().flat_map(|case| &case.factors);
            let of_it = of_it.filter(|(other, factor)| *other == action && *factor != 0.0);
            let (least, largest) = of_it.fold((f64::INFINITY, f64::NEG_INFINITY), |(least, largest), (_, factor)| {
                (least.min(*factor), largest.max(*factor))
            });
            let at = list.element(&message.id, action);
            if largest < 1.0 && largest > f64::NEG_INFINITY {
                findings
                    .doubt(
                        reasons::PERMANENT_BELOW_ONE,
                        &at,
                        &message.id,
                        format!(
                            "the permanent action {} has a factor below 1 in every case, {} at most",
                            Quoted(&message.id),
                            number(largest)
                        ),
                        "add cases in which it is adverse",
                    )
                    .value(number(largest));
            } else if least > 1.0 && least < f64::INFINITY {
                findings
                    .doubt(
                        reasons::NO_FAVOURABLE_CASE,
                        &at,
                        &message.id,
                        format!(
                            "the permanent action {} has a factor above 1 in every case: none shows least tension or uplift",
                            Quoted(&message.id)
                        ),
                        "add cases in which it is favourable, with a factor of 1 or less",
                    )
                    .value(number(least));
            }
        }
    }

    /// Whether each action acts in some case.
    fn acting(&self, actions: &Actions<'_>) -> Vec<bool> {
        let mut acting = vec![false; actions.messages.len()];
        for (action, factor) in self.list.iter().flat_map(|case| &case.factors) {
            acting[*action] |= *factor != 0.0;
        }
        acting
    }

    fn own_weight(&self, net: &NetDraft<'_>, actions: &Actions<'_>, findings: &mut Findings) {
        let weighs = |action: &usize| actions.has(*action, |kind| matches!(kind, Kind::OwnWeight(_)));
        let weights: Vec<usize> = (0..actions.messages.len()).filter(weighs).collect();
        let mass = net
            .message
            .sections
            .iter()
            .any(|section| section.mass_kg_per_m.is_some_and(|mass| mass > 0.0))
            || net.nodes.iter().any(|node| node.attached_mass > 0.0)
            || (net.message.skins.iter()).any(|skin| skin.mass_kg_per_m2.is_some_and(|mass| mass > 0.0));
        if let (Some(weight), false) = (weights.first(), mass) {
            let id = &actions.messages[*weight].id;
            let list = Path::root("actions");
            findings.doubt(
                reasons::NO_MASS,
                &list.element(id, *weight),
                id,
                format!("action {} is own weight, and nothing has a mass", Quoted(id)),
                "give mass_kg_per_m of the sections",
            );
        }
        let acting = self.acting(actions);
        if self.list.is_empty() || weights.iter().any(|weight| acting[*weight]) {
            return;
        }
        if mass {
            let cure = match weights.first() {
                Some(weight) => format!("name action {} in the cases", Quoted(&actions.messages[*weight].id)),
                None => "add an action with own_weight {} and name it in the cases".to_owned(),
            };
            findings.doubt(
                reasons::NO_OWN_WEIGHT,
                &Path::root("cases"),
                "",
                "own weight acts in no case, and the net has masses",
                cure,
            );
        } else {
            findings.note(
                reasons::NO_MASS,
                &Path::root("net.sections"),
                "",
                "nothing has a mass, and own weight acts in no case: results are without weight",
                "give mass_kg_per_m of the sections and an action with own_weight {}",
            );
        }
    }

    fn temperature(&self, net: &NetDraft<'_>, actions: &Actions<'_>, findings: &mut Findings) {
        if net.message.reference_temperature_deg_c.is_some() {
            return;
        }
        let warms = |action: &usize| actions.has(*action, |kind| matches!(kind, Kind::Temperature(_)));
        if let Some(action) = (0..actions.messages.len()).find(warms) {
            let id = &actions.messages[action].id;
            findings.doubt(
                reasons::NO_REFERENCE_TEMPERATURE,
                &Path::root("net.reference_temperature_deg_c"),
                id,
                format!(
                    "action {} changes the temperature, and the one that lengths are meant at is not stated",
                    Quoted(id)
                ),
                "give net.reference_temperature_deg_c",
            );
        }
    }

    fn unused(&self, actions: &Actions<'_>, others: &[usize], findings: &mut Findings) {
        let mut acting = self.acting(actions);
        others.iter().for_each(|action| acting[*action] = true);
        let idle = |action: &usize| !acting[*action];
        let unused: Vec<&str> = (0..actions.messages.len())
            .filter(idle)
            .map(|action| actions.messages[action].id.as_str())
            .collect();
        if !unused.is_empty() {
            findings
                .note(
                    reasons::ACTION_UNUSED,
                    &Path::root("actions"),
                    unused[0],
                    format!("no case names {}", quoted_list(unused.iter().copied())),
                    "name them in the factors of a case",
                )
                .value(unused.len());
        }
    }
}

fn case_and_set(id: &str, at: &Path<'_>, findings: &mut Findings) {
    findings
        .error(
            reasons::DUPLICATE_ID,
            at,
            id,
            format!(
                "{} is a case and a set: checks could not tell which is meant",
                Quoted(id)
            ),
            "give the set another name than any case",
        )
        .value(id);
}

/// What a case takes out.
fn read_removed(case: &v1::Case, at: &Path<'_>, context: &Context<'_, '_>, findings: &mut Findings) -> Vec<Member> {
    let field = at.field("remove");
    let members = members(&case.remove, &field, context, findings).unwrap_or_default();
    let removed: Vec<Member> = members.iter().map(|(member, _)| *member).collect();
    let all = context.net.cables.len() + context.net.struts.len();
    if removed.len() == all && all > 0 {
        findings.error(
            reasons::REMOVES_ALL,
            &field,
            &case.id,
            format!("case {} takes out every member of the net", Quoted(&case.id)),
            "name fewer members",
        );
    }
    removed
}

fn read_path(case: &v1::Case, at: &Path<'_>, findings: &mut Findings, resolved: &mut Resolved) -> Option<LoadPath> {
    let given = case.path.as_ref()?;
    let (at, of) = (at.field("path"), Of::new("case", &case.id));
    let (end_at, steps_at) = (at.field("to_factor"), at.field("steps"));
    if given.to_factor.is_none() {
        resolved.left_out(&end_at, PATH_END_DEFAULT);
    }
    if given.steps.is_none() {
        resolved.left_out(&steps_at, PATH_STEPS_DEFAULT);
    }
    let to_factor = findings.number_or(&end_at, of, &PATH_END, given.to_factor, PATH_END_DEFAULT);
    let steps = given.steps.unwrap_or(PATH_STEPS_DEFAULT);
    findings.number(&steps_at, of, &PATH_STEPS, f64::from(steps))?;
    Some(LoadPath {
        to_factor: to_factor?,
        steps,
    })
}

fn read_ponding(
    case: &v1::Case,
    at: &Path<'_>,
    context: &Context<'_, '_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<PondingGiven> {
    let given = case.ponding.as_ref()?;
    let (at, of) = (at.field("ponding"), Of::new("case", &case.id));
    let density_at = at.field("density_kg_per_m3");
    if given.density_kg_per_m3.is_none() {
        resolved.left_out(&density_at, number(WATER));
    }
    let density = findings.number_or(&density_at, of, &WATER_DENSITY, given.density_kg_per_m3, WATER);
    let net = context.net.message;
    if net.skins.is_empty() {
        findings.error(
            reasons::COVERS_NOTHING,
            &at,
            &case.id,
            format!("case {} gathers water, and the net has no skin", Quoted(&case.id)),
            "give the net a skin, or take ponding out",
        );
    }
    if case.path.is_some() {
        findings.error(
            reasons::PONDING_WITH_PATH,
            &at,
            &case.id,
            format!(
                "case {} asks for ponding and for a path: the states of a path have no water",
                Quoted(&case.id)
            ),
            "make two cases of it",
        );
    }
    Some(PondingGiven {
        density: density?,
        gravity: context.net.gravity,
    })
}

pub(super) fn reserved(id: &str, at: &Path<'_>, findings: &mut Findings) {
    if RESERVED.contains(&id) {
        findings
            .error(
                reasons::RESERVED_ID,
                at,
                id,
                format!("{} is a reserved word", Quoted(id)),
                "use another name: reference, governing and envelope have a meaning in results",
            )
            .value(id);
    }
}

fn read_factors(case: &v1::Case, at: &Path<'_>, actions: &Actions<'_>, findings: &mut Findings) -> Vec<(usize, f64)> {
    let field = at.field("factors");
    if case.factors.is_empty() {
        findings.doubt(
            reasons::CASE_WITHOUT_ACTIONS,
            &field,
            &case.id,
            format!("nothing acts in case {}", Quoted(&case.id)),
            "name its actions with their factors, or accept this doubt",
        );
    }
    let mut factors = Vec::with_capacity(case.factors.len());
    for (name, factor) in &case.factors {
        let at = field.key(name);
        let factor = findings.number(&at, Of::new("case", &case.id), &FACTOR, *factor);
        let action = actions.names.find(findings, &at, "action", name);
        if let (Some(action), Some(factor)) = (action, factor) {
            if factor == 0.0 {
                findings.note(
                    reasons::FACTOR_ZERO,
                    &at,
                    name,
                    format!("action {} has the factor 0 in case {}", Quoted(name), Quoted(&case.id)),
                    "take it out of the case, if nothing is meant by it",
                );
            }
            factors.push((action, factor));
        }
    }
    // The order of the actions, not of their names: sums of loads are taken in brief order.
    factors.sort_by_key(|(action, _)| *action);
    factors
}

/// Shares of prestress add up; what is left must pull. Answers whether it does not.
pub(super) fn check_shares(
    case: &CaseGiven,
    at: &Path<'_>,
    net: &NetDraft<'_>,
    actions: &Actions<'_>,
    findings: &mut Findings,
) -> bool {
    if case
        .factors
        .iter()
        .all(|(action, _)| actions.shares[*action].is_empty())
    {
        return false;
    }
    let mut left = vec![1.0 + case.prestress_share; net.cables.len()];
    for (action, factor) in &case.factors {
        for (cables, share) in &actions.shares[*action] {
            for cable in cables {
                left[*cable] += factor * share;
            }
        }
    }
    let gone: Vec<&str> = (0..left.len())
        .filter(|cable| left[*cable] <= 0.0)
        .map(|cable| net.cables[cable].message.id.as_str())
        .collect();
    if !gone.is_empty() {
        let least = left.iter().copied().fold(f64::INFINITY, f64::min);
        findings
            .error(
                reasons::SHARE_TAKES_ALL,
                &at.field("factors"),
                &case.name,
                format!(
                    "case {} takes away all of the prestress of {}: shares add up to {}",
                    Quoted(&case.name),
                    quoted_list(gone.iter().copied()),
                    number(least - 1.0)
                ),
                "keep the sum of factor times share above -1 for each cable",
            )
            .value(number(least - 1.0));
    }
    !gone.is_empty()
}

/// What acts in a case, in words: "1.35 self + 1.5 snow-west without gW1".
pub(crate) fn in_words<'n>(
    case: &CaseGiven,
    actions: &[v1::Action],
    member_name: &dyn Fn(Member) -> &'n str,
) -> String {
    /// Actions, and members taken out, that are written out.
    const WRITTEN_OUT: usize = 100;
    let mut text = String::new();
    for (count, (action, factor)) in case.factors.iter().take(WRITTEN_OUT).enumerate() {
        let sign = match (count, *factor < 0.0) {
            (0, false) => "",
            (0, true) => "-",
            (_, false) => " + ",
            (_, true) => " - ",
        };
        text.push_str(&format!(
            "{sign}{} {}",
            number(factor.abs()),
            shown(&actions[*action].id)
        ));
    }
    if case.factors.len() > WRITTEN_OUT {
        text.push_str(&format!(" and {} more", case.factors.len() - WRITTEN_OUT));
    }
    if text.is_empty() {
        text.push_str("nothing");
    }
    if case.prestress_share != 0.0 {
        text.push_str(&format!(
            ", prestress times {}",
            rounded(1.0 + case.prestress_share, 12)
        ));
    }
    if case.ponding.is_some() {
        text.push_str(" + ponding water");
    }
    for (count, member) in case.removed.iter().take(WRITTEN_OUT).enumerate() {
        let before = if count == 0 { " without " } else { ", " };
        text.push_str(&format!("{before}{}", shown(member_name(*member))));
    }
    if case.removed.len() > WRITTEN_OUT {
        text.push_str(&format!(" and {} more", case.removed.len() - WRITTEN_OUT));
    }
    text
}
