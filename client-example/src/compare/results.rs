//! Differences between two runs: words (verdicts, answers, findings) and numbers, each number by case and id.

use std::borrow::Cow;
use std::collections::{BTreeMap, BTreeSet, HashMap};

use ropewalk_api::ropewalk::v1;

use super::thresholds::Thresholds;
use crate::number::{for_eyes, percent, three};
use crate::run::{Column, MotionRun, Run};
use crate::sheet::{self, verdict_word};

/// Two runs that say something different.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Said {
    pub(super) what: String,
    /// None: the run does not say it.
    pub(super) was: Option<String>,
    pub(super) now: Option<String>,
}

/// A number that differs by more than its threshold, in the units of the contract.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Number {
    /// Position among the quantities.
    pub(super) quantity: usize,
    /// Case, `reference` or `envelope`.
    pub(super) case: String,
    pub(super) id: String,
    pub(super) was: f64,
    pub(super) now: f64,
    /// Size of the larger of both, of whole vectors where it is a component.
    larger: f64,
}

impl Number {
    pub(super) fn difference(&self) -> f64 {
        self.now - self.was
    }

    /// The difference as a share of the larger number.
    pub(super) fn share(&self) -> f64 {
        if self.larger > 0.0 {
            self.difference() / self.larger
        } else {
            0.0
        }
    }
}

/// A result array, or a component of one.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Quantity {
    /// Its name for people.
    pub(super) name: String,
    pub(super) unit: String,
    /// Numbers that were compared.
    pub(super) compared: usize,
}

impl Quantity {
    /// Its place in a list: what ropes and anchors carry first, lengths, then where things are.
    fn rank(&self) -> usize {
        let first = ["tension", "slack", "axial force", "anchor pull", "unstressed"];
        let last = ["position", "displacement"];
        let starts = |names: &[&str]| names.iter().position(|name| self.name.starts_with(name));
        match (starts(&first), starts(&last)) {
            (Some(at), _) => at,
            (None, Some(at)) => first.len() + 1 + at,
            (None, None) => first.len(),
        }
    }
}

/// What came of comparing two runs.
#[derive(Clone, Debug, Default)]
pub(super) struct Comparison {
    pub(super) said: Vec<Said>,
    pub(super) quantities: Vec<Quantity>,
    /// By quantity, then the largest difference first.
    pub(super) numbers: Vec<Number>,
    /// States that both runs answered, `reference` among them.
    pub(super) states: usize,
    /// What could not be compared, in words.
    pub(super) apart: Vec<String>,
}

/// Arrays that repeat others in another form, or tell of the way and not of the result.
const LEFT_OUT: [&str; 10] = [
    "spectrum_amplitude",
    "stretch",
    "length_m",
    "path_load_factor",
    "path_movement_m",
    "path_tension_n",
    "support_force_own_axes_n",
    "end_force_n",
    "end_angle_plan_deg",
    "end_angle_up_deg",
];

/// A largest value of a motion, its unit and where the end of the motion tells it.
type Extreme = (
    &'static str,
    &'static str,
    fn(&v1::MotionEnd) -> &Option<v1::MotionExtreme>,
);

const EXTREMES: [Extreme; 5] = [
    ("largest tension", "N", |end| &end.largest_tension_n),
    ("largest movement", "m", |end| &end.largest_movement_m),
    ("largest pull on a support", "N", |end| &end.largest_support_force_n),
    ("largest tension over static", "", |end| &end.largest_tension_factor),
    ("largest movement over static", "", |end| &end.largest_movement_factor),
];

impl Comparison {
    pub(super) fn new(a: &Run, b: &Run, limits: &Thresholds) -> Self {
        let mut comparison = Self::default();
        comparison.words(a, b, limits);
        let labels = Labels::of(a, b, &mut comparison.apart);
        let mut unlike = BTreeSet::new();
        for old in a.states.iter().filter(|state| state.answered()) {
            let Some(new) = b.states.iter().find(|state| state.id == old.id && state.answered()) else {
                continue;
            };
            comparison.states += 1;
            comparison.columns(&old.id, [&old.columns, &new.columns], &labels, limits, &mut unlike);
        }
        for old in &a.effects {
            let Some(new) = b.effects.iter().find(|other| other.effect.id == old.effect.id) else {
                continue;
            };
            comparison.columns(
                &old.effect.id,
                [&old.columns, &new.columns],
                &labels,
                limits,
                &mut unlike,
            );
        }
        comparison.columns("envelope", [&a.envelope, &b.envelope], &labels, limits, &mut unlike);
        comparison.motions([a, b], &labels, limits, &mut unlike);
        if !unlike.is_empty() {
            let names: Vec<&str> = unlike.iter().map(String::as_str).collect();
            comparison
                .apart
                .push(format!("not compared, as only one side has it: {}", names.join(", ")));
        }
        let ranks: Vec<usize> = comparison.quantities.iter().map(Quantity::rank).collect();
        comparison.numbers.sort_by(|one, other| {
            let place = |number: &Number| (ranks[number.quantity], number.quantity);
            let size = |number: &Number| number.difference().abs();
            (place(one).cmp(&place(other))).then(size(other).total_cmp(&size(one)))
        });
        comparison
    }

    pub(super) fn differs(&self) -> bool {
        !self.said.is_empty() || !self.numbers.is_empty()
    }

    fn say(&mut self, what: impl Into<String>, was: Option<String>, now: Option<String>) {
        if was != now {
            self.said.push(Said {
                what: what.into(),
                was,
                now,
            });
        }
    }

    fn words(&mut self, a: &Run, b: &Run, limits: &Thresholds) {
        let verdict = |run: &Run| Some(verdict_word(run.summary.verdict()).to_owned());
        self.say("verdict", verdict(a), verdict(b));
        let ids: Vec<&str> = std::iter::once("reference")
            .chain(a.case_ids.iter().chain(&b.case_ids).map(String::as_str))
            .collect();
        let mut met = BTreeSet::new();
        for id in ids {
            if !met.insert(id) {
                continue;
            }
            let answer = |run: &Run| -> Option<String> {
                let state = run.states.iter().find(|state| state.id == id);
                match state {
                    Some(state) if state.answered() => Some("has an answer".to_owned()),
                    Some(state) => {
                        let failure = state.summary.failure.as_ref();
                        let why = failure.map_or("", |failure| failure.message.as_str());
                        Some(format!("{}: {why}", sheet::outcome_words(state)))
                    }
                    None if id == "reference" || run.case_ids.iter().any(|known| known == id) => {
                        Some("was not run to its end".to_owned())
                    }
                    None => None,
                }
            };
            self.say(format!("case \"{id}\""), answer(a), answer(b));
            let acting = |run: &Run| {
                let state = run.states.iter().find(|state| state.id == id)?;
                Some(state.in_words.clone())
            };
            if let (Some(old), Some(new)) = (acting(a), acting(b)) {
                self.say(format!("acting in \"{id}\""), Some(old), Some(new));
            }
        }
        self.checks(a, b, limits);
        self.findings(a, b);
    }

    /// Checks are the same where kind, sets and kind of demand are; of several such, in order.
    fn checks(&mut self, a: &Run, b: &Run, limits: &Thresholds) {
        let named = |run: &Run| -> Vec<(String, v1::CheckResult)> {
            let mut times: BTreeMap<String, usize> = BTreeMap::new();
            let results = run.summary.checks.iter().map(|result| {
                let mut name = format!("check {}", result.kind.replace('_', " "));
                if !result.over.is_empty() {
                    name = format!("{name} over {}", result.over.join(", "));
                }
                let count = times.entry(name.clone()).or_default();
                *count += 1;
                if *count > 1 {
                    name = format!("{name} ({count})");
                }
                (name, result.clone())
            });
            results.collect()
        };
        let words = |result: &v1::CheckResult| {
            let worst = if result.worst.is_empty() {
                String::new()
            } else {
                format!(
                    ", \"{}\" uses {} % in \"{}\"",
                    result.worst,
                    percent(result.ratio),
                    result.governing_case
                )
            };
            let open = if result.not_judged > 0 {
                format!(", {} not judged", result.not_judged)
            } else {
                String::new()
            };
            format!("{}{worst}{open}", verdict_word(result.verdict()))
        };
        let (old, new) = (named(a), named(b));
        let find = |list: &[(String, v1::CheckResult)], name: &str| {
            list.iter()
                .find(|(other, _)| other == name)
                .map(|(_, result)| result.clone())
        };
        for (name, was) in &old {
            match find(&new, name) {
                Some(now) => {
                    let larger = was.ratio.abs().max(now.ratio.abs());
                    let same = was.verdict == now.verdict
                        && was.not_judged == now.not_judged
                        && !limits.passes("", (was.ratio - now.ratio).abs(), larger);
                    if !same {
                        self.say(name, Some(words(was)), Some(words(&now)));
                    }
                }
                None => self.say(name, Some(words(was)), None),
            }
        }
        for (name, now) in new.iter().filter(|(name, _)| find(&old, name).is_none()) {
            self.say(name, None, Some(words(now)));
        }
    }

    fn findings(&mut self, a: &Run, b: &Run) {
        let named = |run: &Run| -> BTreeMap<String, String> {
            let findings = run.other_findings().into_iter().map(|finding| {
                let place = [&finding.case, &finding.path, &finding.id];
                let place: Vec<&str> = place
                    .into_iter()
                    .filter(|part| !part.is_empty())
                    .map(String::as_str)
                    .collect();
                (
                    format!("finding {} {}", finding.reason, place.join(" · ")),
                    finding.message,
                )
            });
            findings.collect()
        };
        let (old, new) = (named(a), named(b));
        // Messages quote numbers; a finding that both have is the same finding.
        for (what, message) in old.iter().filter(|(what, _)| !new.contains_key(*what)) {
            self.say(what, Some(message.clone()), None);
        }
        for (what, message) in new.iter().filter(|(what, _)| !old.contains_key(*what)) {
            self.say(what, None, Some(message.clone()));
        }
    }

    /// Motions by id: how they ended, what was largest, how often ropes went slack and snatched, and their arrays.
    fn motions(&mut self, [a, b]: [&Run; 2], labels: &Labels, limits: &Thresholds, unlike: &mut BTreeSet<String>) {
        let ids: BTreeSet<&str> = (a.motions.iter().chain(&b.motions))
            .map(|motion| motion.id.as_str())
            .collect();
        for id in ids {
            let of = |run: &'_ Run| run.motions.iter().find(|motion| motion.id == id).cloned();
            let (was, now) = (of(a), of(b));
            let outcome = |motion: &Option<MotionRun>| motion.as_ref().map(sheet::motion_outcome);
            self.say(format!("motion \"{id}\""), outcome(&was), outcome(&now));
            let (Some(was), Some(now)) = (was, now) else { continue };
            let (Some(old), Some(new)) = (&was.end, &now.end) else {
                continue;
            };
            for (name, unit, of) in EXTREMES {
                let (old, new) = (of(old), of(new));
                let words = |extreme: &Option<v1::MotionExtreme>| {
                    extreme.as_ref().map(|extreme| {
                        let (unit, scale) = for_eyes(unit);
                        let value = format!("{} {unit}", three(extreme.value * scale));
                        format!(
                            "{} of \"{}\" at {} s",
                            value.trim_end(),
                            extreme.id,
                            three(extreme.time_s)
                        )
                    })
                };
                let differs = match (old, new) {
                    (Some(old), Some(new)) => {
                        let larger = old.value.abs().max(new.value.abs());
                        limits.passes(unit, (old.value - new.value).abs(), larger)
                    }
                    (None, None) => false,
                    _ => true,
                };
                if differs {
                    self.say(format!("motion \"{id}\", {name}"), words(old), words(new));
                }
            }
            let count = |end: &v1::MotionEnd| {
                Some(format!(
                    "went slack {} times, came taut again {} times",
                    end.slackenings, end.snatches
                ))
            };
            self.say(format!("motion \"{id}\", segments"), count(old), count(new));
            self.columns(&was.key(), [&was.columns, &now.columns], labels, limits, unlike);
        }
    }

    fn columns(
        &mut self,
        case: &str,
        [was, now]: [&BTreeMap<String, Column>; 2],
        labels: &Labels,
        limits: &Thresholds,
        unlike: &mut BTreeSet<String>,
    ) {
        let wanted = |name: &str, column: &Column| {
            column.over != v1::Range::Iteration
                && !name.ends_with("_case")
                && !name.ends_with("_time_s")
                && !LEFT_OUT.contains(&name)
        };
        for (name, column) in was.iter().filter(|(name, column)| wanted(name, column)) {
            match now.get(name) {
                Some(other) => self.column(case, name, [column, other], labels, limits),
                None => _ = unlike.insert(name.clone()),
            }
        }
        let more = now
            .iter()
            .filter(|(name, column)| wanted(name, column) && !was.contains_key(*name));
        unlike.extend(more.map(|(name, _)| name.clone()));
    }

    fn column(&mut self, case: &str, name: &str, [was, now]: [&Column; 2], labels: &Labels, limits: &Thresholds) {
        let width = was.components;
        let pairs = labels.pairs(was, now);
        if width != now.components || pairs.is_empty() {
            return;
        }
        // Views show the pull on an anchor, the opposite of the force on the net.
        let sign = if name == "support_force_n" { -1.0 } else { 1.0 };
        let at: Vec<usize> = (0..width)
            .map(|component| self.quantity(name, &was.unit, width, component, pairs.len()))
            .collect();
        for (id, old, new) in pairs {
            let numbers = |column: &Column, entry: usize| -> Vec<f64> {
                let entry = &column.values[entry * width..(entry + 1) * width];
                entry.iter().map(|number| sign * number + 0.0).collect()
            };
            let (old, new) = (numbers(was, old), numbers(now, new));
            let size = |vector: &[f64]| vector.iter().map(|part| part * part).sum::<f64>().sqrt();
            let larger = size(&old).max(size(&new));
            for (component, (&was_number, &now_number)) in old.iter().zip(&new).enumerate() {
                if limits.passes(&was.unit, (was_number - now_number).abs(), larger) {
                    self.numbers.push(Number {
                        quantity: at[component],
                        case: case.to_owned(),
                        id: id.clone().into_owned(),
                        was: was_number,
                        now: now_number,
                        larger,
                    });
                }
            }
        }
    }

    /// Position of a quantity, which is entered where it is new.
    fn quantity(&mut self, name: &str, unit: &str, width: usize, component: usize, compared: usize) -> usize {
        let name = quantity_name(name, width, component);
        let at = self
            .quantities
            .iter()
            .position(|known| known.name == name && known.unit == unit);
        let at = at.unwrap_or_else(|| {
            self.quantities.push(Quantity {
                name,
                unit: unit.to_owned(),
                compared: 0,
            });
            self.quantities.len() - 1
        });
        self.quantities[at].compared += compared;
        at
    }
}

/// Name of an array for people, without its unit: "tension", "anchor pull x".
fn quantity_name(name: &str, width: usize, component: usize) -> String {
    let name = match name {
        "support_force_n" => "anchor_pull_n",
        other => other,
    };
    let unit = ["_n_per_m", "_n", "_m", "_deg", "_pa", "_j", "_m2", "_k"];
    let bare = unit.iter().find_map(|unit| name.strip_suffix(unit)).unwrap_or(name);
    let bare = bare.replace('_', " ");
    match (width, component) {
        (3, 0) => format!("{bare} x"),
        (3, 1) => format!("{bare} y"),
        (3, _) => format!("{bare} z"),
        (1, _) => bare,
        _ => format!("{bare} {}", component + 1),
    }
}

/// Names of the entries of each range, for both runs, and which of them they share.
struct Labels {
    of: HashMap<i32, Vec<(String, usize, usize)>>,
}

impl Labels {
    fn of(a: &Run, b: &Run, apart: &mut Vec<String>) -> Self {
        let mut of = HashMap::new();
        let ranges = [
            (v1::Range::Node, "nodes"),
            (v1::Range::Segment, "segments"),
            (v1::Range::Cable, "ropes"),
            (v1::Range::Strut, "struts"),
            (v1::Range::Support, "anchors"),
            (v1::Range::End, "ends"),
            (v1::Range::Case, "cases"),
            (v1::Range::Panel, "panels"),
            (v1::Range::Slide, "slides"),
            (v1::Range::Reach, "reaches"),
        ];
        for (range, words) in ranges {
            let (old, new) = (entries(a, range), entries(b, range));
            let places: HashMap<&str, usize> = new.iter().enumerate().map(|(at, id)| (id.as_str(), at)).collect();
            let shared: Vec<(String, usize, usize)> = old
                .iter()
                .enumerate()
                .filter_map(|(at, id)| Some((id.clone(), at, *places.get(id.as_str())?)))
                .collect();
            let (less, more) = (old.len() - shared.len(), new.len() - shared.len());
            // Cases that one side lacks are told one by one; reaches are pieces of what is told.
            if less + more > 0 && ![v1::Range::Case, v1::Range::Reach].contains(&range) {
                apart.push(format!(
                    "{words}: {less} only in A, {more} only in B, {} in both",
                    shared.len()
                ));
            }
            of.insert(range as i32, shared);
        }
        Self { of }
    }

    /// Entries that two columns share: label, position in the one and in the other.
    fn pairs(&self, was: &Column, now: &Column) -> Vec<(Cow<'_, str>, usize, usize)> {
        let entries = |column: &Column| column.values.len() / column.components.max(1);
        let (n_was, n_now) = (entries(was), entries(now));
        let listed = |range: v1::Range| {
            let shared = self.of.get(&(range as i32)).map(Vec::as_slice).unwrap_or_default();
            let kept = shared.iter().filter(|(_, old, new)| *old < n_was && *new < n_now);
            kept.map(|(id, old, new)| (Cow::Borrowed(id.as_str()), *old, *new))
                .collect::<Vec<_>>()
        };
        match was.over {
            // Rope segments are the first of all segments.
            v1::Range::RopeSegment | v1::Range::Segment => listed(v1::Range::Segment),
            over if self.of.contains_key(&(over as i32)) => listed(over),
            // Entries without a name of their own are compared where both runs have as many of them.
            _ if n_was == n_now => (0..n_was)
                .map(|at| (Cow::Owned(format!("number {at}")), at, at))
                .collect(),
            _ => Vec::new(),
        }
    }
}

/// Names of the entries of a range; of what occurs twice the later ones are numbered.
fn entries(run: &Run, range: v1::Range) -> Vec<String> {
    let names: Vec<String> = match range {
        v1::Range::Node => run.nodes.clone(),
        v1::Range::Segment => (0..run.segments.len())
            .map(|at| {
                let [from, to] = run.segments[at].nodes;
                format!("{} {} to {}", run.member_id(at), run.nodes[from], run.nodes[to])
            })
            .collect(),
        v1::Range::Cable => run.cables.clone(),
        v1::Range::Strut => run.struts.clone(),
        v1::Range::Support => run.supports.iter().map(|&node| run.nodes[node].clone()).collect(),
        v1::Range::End => run
            .ends
            .iter()
            .map(|end| format!("{} at {}", run.member_id(end.segment), run.nodes[end.node]))
            .collect(),
        v1::Range::Case => run.case_ids.clone(),
        v1::Range::Slide => run
            .slides
            .iter()
            .map(|(rope, node)| format!("{rope} at {}", run.nodes[*node]))
            .collect(),
        // Without a table each segment is a reach of its own.
        v1::Range::Reach if run.reaches.is_empty() => entries(run, v1::Range::Segment),
        v1::Range::Reach => (run.reaches.iter())
            .map(|(member, segment)| format!("{member} from {}", run.nodes[run.segments[*segment].nodes[0]]))
            .collect(),
        v1::Range::Panel => run.panels.iter().map(|panel| panel.id.clone()).collect(),
        _ => Vec::new(),
    };
    let mut times: HashMap<String, usize> = HashMap::new();
    let numbered = names.into_iter().map(|name| {
        let count = times.entry(name.clone()).or_default();
        *count += 1;
        if *count > 1 { format!("{name} ({count})") } else { name }
    });
    numbered.collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::run::motion_sample;
    use crate::run::sample::{self, Names};

    fn limits() -> Thresholds {
        Thresholds::default()
    }

    #[test]
    fn a_run_equals_itself() {
        let run = sample::run();
        let none = Thresholds::read(&["force=0", "length=0", "share=0", "ratio=0"].map(str::to_owned)).unwrap();
        let comparison = Comparison::new(&run, &run, &none);
        assert!(!comparison.differs(), "{comparison:?}");
        assert_eq!(comparison.states, 2);
        assert!(
            comparison
                .quantities
                .iter()
                .any(|quantity| quantity.name == "tension" && quantity.compared == 8)
        );
    }

    #[test]
    fn differences_are_told_by_case_and_id_above_the_threshold() {
        let (one, mut other) = (sample::run(), sample::run());
        let column = other.states[1].columns.get_mut("tension_n").unwrap();
        // 24.820 kN and 14.484 kN in each: 1 % of them, and 50 N, are no difference.
        column.values[0] += 300.0;
        column.values[1] += 240.0;
        column.values[2] += 50.0;
        other.states[0].columns.get_mut("position_m").unwrap().values[14] -= 0.004;
        other.summary.checks[0].ratio = 0.99;
        other.summary.checks[0].verdict = v1::Verdict::Passes.into();
        let comparison = Comparison::new(&one, &other, &limits());
        let told: Vec<(&str, &str, &str)> = comparison
            .numbers
            .iter()
            .map(|number| {
                (
                    comparison.quantities[number.quantity].name.as_str(),
                    number.case.as_str(),
                    number.id.as_str(),
                )
            })
            .collect();
        assert_eq!(
            told,
            [
                ("tension", "full-snow", "carrying A to m"),
                ("position z", "reference", "m")
            ]
        );
        assert!((comparison.numbers[0].difference() - 300.0).abs() < 1e-9);
        assert_eq!(comparison.said.len(), 1, "{:?}", comparison.said);
        assert_eq!(
            comparison.said[0].now.as_deref(),
            Some("passes, \"A\" uses 99 % in \"full-snow\"")
        );
    }

    #[test]
    fn ids_pair_members_and_what_one_side_lacks_is_told() {
        let one = sample::run();
        let other = sample::run_named(Names {
            middle: "m",
            rope: "main",
            case: "full-snow",
            title: "t",
        });
        let comparison = Comparison::new(&one, &other, &limits());
        assert!(comparison.numbers.is_empty());
        assert!(
            comparison
                .apart
                .contains(&"segments: 2 only in A, 2 only in B, 2 in both".to_owned()),
            "{:?}",
            comparison.apart
        );
    }

    #[test]
    fn motions_tell_what_was_largest_and_what_happened() {
        let (one, mut other) = (motion_sample::run_named("gust"), motion_sample::run_named("gust"));
        assert!(!Comparison::new(&one, &other, &limits()).differs());
        let motion = &mut other.motions[0];
        let end = motion.end.as_mut().unwrap();
        // 28.14 kN in both to 0.1 kN and 1 %; 160 mm to 1 mm; 1.98 to 0.01.
        end.largest_tension_n.as_mut().unwrap().value += 200.0;
        end.largest_movement_m.as_mut().unwrap().value += 0.004;
        end.largest_movement_factor.as_mut().unwrap().value = 1.5;
        end.largest_tension_factor = None;
        end.snatches = 13;
        motion.columns.get_mut("tension_max_n").unwrap().values[3] += 900.0;
        motion.columns.get_mut("tension_max_time_s").unwrap().values[3] += 0.2;
        let comparison = Comparison::new(&one, &other, &limits());
        let said: Vec<(&str, &str)> = (comparison.said.iter())
            .map(|said| (said.what.as_str(), said.now.as_deref().unwrap_or("-")))
            .collect();
        assert_eq!(
            said,
            [
                ("motion \"gust\", largest movement", "164 mm of \"n10\" at 0 s"),
                ("motion \"gust\", largest tension over static", "-"),
                (
                    "motion \"gust\", largest movement over static",
                    "1.50 of \"n30\" at 0.188 s"
                ),
                (
                    "motion \"gust\", segments",
                    "went slack 12 times, came taut again 13 times"
                ),
            ]
        );
        assert_eq!(comparison.numbers.len(), 1);
        assert_eq!(
            (comparison.numbers[0].case.as_str(), comparison.numbers[0].id.as_str()),
            ("motion/gust", "main n3 to n4")
        );
        other.motions.clear();
        let comparison = Comparison::new(&one, &other, &limits());
        assert_eq!(comparison.said[0].what, "motion \"gust\"");
        assert_eq!(comparison.said[0].now, None);
    }

    #[test]
    fn pulls_have_the_sign_of_the_sheets() {
        let (one, mut other) = (sample::run(), sample::run());
        let column = other.states[1].columns.get_mut("support_force_n").unwrap();
        let before = column.values[2];
        column.values[2] += 1e3;
        let comparison = Comparison::new(&one, &other, &limits());
        let number = &comparison.numbers[0];
        assert_eq!(comparison.quantities[number.quantity].name, "anchor pull z");
        assert_eq!((number.was, number.difference()), (-before, -1e3));
    }
}
