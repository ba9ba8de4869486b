//! Cases: which actions act together, and in words.

use std::collections::HashSet;

use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::load::Kind;
use ropewalk_numerics::brief::CaseGiven;
use ropewalk_numerics::equilibrium::LoadSteps;

use super::actions::Actions;
use super::findings::{Findings, Path, is_id};
use super::names::{Names, bad_id};
use super::net::NetDraft;
use super::numbers::{FACTOR, LOAD_STEPS, Of};
use super::reasons;
use super::scope::tell_repeated;
use crate::words::{Quoted, number, quoted_list, shown};

/// Name of the reference state in results.
pub(crate) const REFERENCE: &str = "reference";
/// Name in results of what is gathered over all cases.
pub(crate) const ENVELOPE: &str = "envelope";
/// Names that cases and sets must not have.
const RESERVED: [&str; 3] = [REFERENCE, "governing", ENVELOPE];
/// Bytes of a case: its beginning is told in one message.
pub(super) const LARGEST: usize = 96 * 1024;

/// Cases as read, with the names that checks may read.
#[derive(Debug)]
pub(crate) struct Cases<'a> {
    pub(crate) messages: &'a [v1::Case],
    pub(crate) list: Vec<CaseGiven>,
    names: Names<'a, usize>,
    sets: Names<'a, ()>,
    /// Sets that only combinations fill, which are not served.
    not_served: HashSet<&'a str>,
}

impl<'a> Cases<'a> {
    pub(crate) fn read(brief: &'a v1::Brief, actions: &Actions<'a>, findings: &mut Findings) -> Self {
        let mut cases = Self {
            messages: &brief.cases,
            list: Vec::with_capacity(brief.cases.len()),
            names: Names::new("cases"),
            sets: Names::new("sets"),
            not_served: brief.combinations.iter().map(|rule| rule.set.as_str()).collect(),
        };
        let list = Path::root("cases");
        for (index, case) in brief.cases.iter().enumerate() {
            cases.names.declare(findings, &list, index, case.id.as_str(), index);
            reserved(&case.id, &list.number(index).field("id"), findings);
        }
        for (index, case) in brief.cases.iter().enumerate() {
            let at = list.element(&case.id, index);
            cases.read_sets(case, &at, findings);
            let factors = read_factors(case, &at, actions, findings);
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
            if self.names.get(set).is_some() {
                findings
                    .error(
                        reasons::DUPLICATE_ID,
                        &at,
                        set,
                        format!(
                            "{} is a case and a set: checks could not tell which is meant",
                            Quoted(set)
                        ),
                        "give the set another name than any case",
                    )
                    .value(set);
            }
            self.sets.insert(set, ());
        }
    }

    /// Cases that a list of sets and cases names, in brief order; all of them where it is empty.
    pub(crate) fn named(&self, over: &[String], field: &Path<'_>, findings: &mut Findings) -> Option<Vec<usize>> {
        tell_repeated(over, field, findings);
        if over.is_empty() {
            return Some((0..self.messages.len()).collect());
        }
        let mut wanted = vec![false; self.messages.len()];
        let mut complete = true;
        for (number, name) in over.iter().enumerate() {
            let at = field.number(number);
            if let Some(case) = self.names.get(name) {
                wanted[case] = true;
            } else if self.sets.get(name).is_some() {
                for (case, message) in self.messages.iter().enumerate() {
                    wanted[case] |= message.sets.contains(name);
                }
            } else {
                complete = false;
                if !self.not_served.contains(name.as_str()) {
                    self.unknown(name, &at, findings);
                }
            }
        }
        complete.then(|| (0..wanted.len()).filter(|case| wanted[*case]).collect())
    }

    fn unknown(&self, name: &str, at: &Path<'_>, findings: &mut Findings) {
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
        for known in self.names.order().iter().chain(self.sets.order()) {
            both.insert(known, ());
        }
        both.unknown(findings, at, "set or case", name);
    }

    /// What the cases leave out or say twice.
    pub(crate) fn doubts(&self, net: &NetDraft<'_>, actions: &Actions<'_>, under: &[usize], findings: &mut Findings) {
        let list = Path::root("cases");
        for (index, case) in self.list.iter().enumerate() {
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
        self.unused(actions, under, findings);
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
        if self.messages.is_empty() || weights.iter().any(|weight| acting[*weight]) {
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

    fn unused(&self, actions: &Actions<'_>, under: &[usize], findings: &mut Findings) {
        let mut acting = self.acting(actions);
        under.iter().for_each(|action| acting[*action] = true);
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

fn reserved(id: &str, at: &Path<'_>, findings: &mut Findings) {
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

/// Shares of prestress add up; what is left must pull.
fn check_shares(case: &CaseGiven, at: &Path<'_>, net: &NetDraft<'_>, actions: &Actions<'_>, findings: &mut Findings) {
    if case
        .factors
        .iter()
        .all(|(action, _)| actions.shares[*action].is_empty())
    {
        return;
    }
    let mut left = vec![1.0_f64; net.cables.len()];
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
}

/// What acts in a case, in words: "1.35 self + 1.5 snow-west".
pub(crate) fn in_words(case: &CaseGiven, actions: &[v1::Action]) -> String {
    /// Actions that are written out.
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
    text
}
