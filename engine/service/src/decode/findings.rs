//! Findings, collected on the way through a brief, and the places that they name.

use std::collections::BTreeMap;
use std::fmt;

use ropewalk_api::ropewalk::v1;

use super::names::nearest;
use super::reasons;
use crate::words::shown;

/// Findings of one reason that are written out; further ones are only counted.
const WRITTEN_OUT: usize = 1000;
/// Comparisons of names in one brief: some seconds of a brief with nothing but slips of typing, at most.
const COMPARISONS: usize = 500_000;

#[derive(Clone, Copy, Debug)]
enum Step<'a> {
    Root(&'a str),
    Field(&'a str),
    Key(&'a str),
    Number(usize),
}

/// A place in a brief, in the grammar told at `Brief`. Written out only where something is found.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Path<'a> {
    parent: Option<&'a Path<'a>>,
    step: Step<'a>,
}

impl<'a> Path<'a> {
    pub(crate) const fn root(path: &'a str) -> Self {
        Self {
            parent: None,
            step: Step::Root(path),
        }
    }

    pub(crate) fn field<'b>(&'b self, name: &'b str) -> Path<'b> {
        self.with(Step::Field(name))
    }

    /// An element of a list: by its id, or by its number where the id cannot stand in a path.
    pub(crate) fn element<'b>(&'b self, id: &'b str, number: usize) -> Path<'b> {
        self.with(if is_id(id) { Step::Key(id) } else { Step::Number(number) })
    }

    pub(crate) fn number(&self, number: usize) -> Path<'_> {
        self.with(Step::Number(number))
    }

    pub(crate) fn key<'b>(&'b self, key: &'b str) -> Path<'b> {
        self.with(Step::Key(key))
    }

    fn with<'b>(&'b self, step: Step<'b>) -> Path<'b> {
        Path {
            parent: Some(self),
            step,
        }
    }
}

impl fmt::Display for Path<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if let Some(parent) = self.parent {
            parent.fmt(f)?;
        }
        match self.step {
            Step::Root(path) => f.write_str(path),
            Step::Field(name) => write!(f, ".{name}"),
            Step::Key(key) => write!(f, "[{}]", shown(key)),
            Step::Number(number) => write!(f, "[{number}]"),
        }
    }
}

/// Whether a text may be an id: 1 to 128 characters, no control characters, none of `/ [ ]`.
pub(crate) fn is_id(id: &str) -> bool {
    !id.is_empty() && id.chars().count() <= 128 && !id.chars().any(|c| c.is_control() || matches!(c, '/' | '[' | ']'))
}

/// A finding that was just added.
pub(crate) struct Added<'a>(Option<&'a mut v1::Finding>);

impl Added<'_> {
    /// The value found there, written out.
    pub(crate) fn value(self, value: impl fmt::Display) {
        if let Some(finding) = self.0 {
            finding.value = shown(&value.to_string());
        }
    }
}

/// Everything found so far.
#[derive(Debug)]
pub(crate) struct Findings {
    list: Vec<v1::Finding>,
    counts: BTreeMap<(i32, &'static str), usize>,
    /// Names that may still be compared in search of the one that was meant.
    comparisons: usize,
}

impl Default for Findings {
    fn default() -> Self {
        Self {
            list: Vec::new(),
            counts: BTreeMap::new(),
            comparisons: COMPARISONS,
        }
    }
}

impl Findings {
    /// The work cannot be done as asked.
    pub(crate) fn error(
        &mut self,
        reason: &'static str,
        path: &Path<'_>,
        id: &str,
        message: impl Into<String>,
        cure: impl Into<String>,
    ) -> Added<'_> {
        self.add(
            v1::FindingSeverity::Error,
            reason,
            path,
            id,
            message.into(),
            cure.into(),
        )
    }

    /// The work can be done, but somebody should look first.
    pub(crate) fn doubt(
        &mut self,
        reason: &'static str,
        path: &Path<'_>,
        id: &str,
        message: impl Into<String>,
        cure: impl Into<String>,
    ) -> Added<'_> {
        self.add(
            v1::FindingSeverity::Doubt,
            reason,
            path,
            id,
            message.into(),
            cure.into(),
        )
    }

    /// Worth knowing.
    pub(crate) fn note(
        &mut self,
        reason: &'static str,
        path: &Path<'_>,
        id: &str,
        message: impl Into<String>,
        cure: impl Into<String>,
    ) -> Added<'_> {
        self.add(v1::FindingSeverity::Note, reason, path, id, message.into(), cure.into())
    }

    /// Something of a severity that depends.
    pub(crate) fn add(
        &mut self,
        severity: v1::FindingSeverity,
        reason: &'static str,
        path: &Path<'_>,
        id: &str,
        message: String,
        cure: String,
    ) -> Added<'_> {
        let count = self.counts.entry((severity.into(), reason)).or_default();
        *count += 1;
        if *count > WRITTEN_OUT {
            return Added(None);
        }
        self.list.push(v1::Finding {
            severity: severity.into(),
            reason: reason.to_owned(),
            path: path.to_string(),
            id: shown(id),
            message,
            cure,
            ..v1::Finding::default()
        });
        Added(self.list.last_mut())
    }

    /// The known name that was probably meant, as long as looking for it is worth the time.
    pub(crate) fn nearest<'a>(&mut self, name: &str, known: impl Iterator<Item = &'a str>) -> Option<&'a str> {
        let left = &mut self.comparisons;
        nearest(
            name,
            known.take_while(|_| {
                *left = left.saturating_sub(1);
                *left > 0
            }),
        )
    }

    /// Whether the work cannot be done.
    pub(crate) fn has_errors(&self) -> bool {
        let errors = i32::from(v1::FindingSeverity::Error);
        self.counts.keys().any(|(severity, _)| *severity == errors)
    }

    /// Marks the doubts that the brief accepts. Answers whether there was one with this reason and id.
    pub(crate) fn accept(&mut self, accepted: &v1::AcceptedDoubt) -> bool {
        let mut found = false;
        for finding in self.list.iter_mut().filter(|finding| accepts(accepted, finding)) {
            finding.accepted_note.clone_from(&accepted.note);
            found = true;
        }
        found
    }

    /// Everything: errors first, then doubts, then notes, each in the order of the brief.
    pub(crate) fn into_list(self) -> Vec<v1::Finding> {
        let mut list = self.list;
        for ((severity, reason), count) in self.counts {
            if count > WRITTEN_OUT {
                list.push(v1::Finding {
                    severity,
                    reason: reasons::MORE_OF_THE_SAME.to_owned(),
                    value: (count - WRITTEN_OUT).to_string(),
                    message: format!(
                        "{} more findings with the reason {reason} are left out",
                        count - WRITTEN_OUT
                    ),
                    cure: "mend the ones shown first".to_owned(),
                    ..v1::Finding::default()
                });
            }
        }
        list.sort_by_key(|finding| finding.severity);
        list
    }
}

/// Whether an accepted doubt speaks of this finding.
pub(crate) fn accepts(accepted: &v1::AcceptedDoubt, finding: &v1::Finding) -> bool {
    finding.severity() == v1::FindingSeverity::Doubt
        && finding.reason == accepted.reason
        && (accepted.on.is_empty() || accepted.on == finding.id)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn places_follow_the_grammar() {
        let cables = Path::root("net.cables");
        let cable = cables.element("ridge", 4);
        assert_eq!(cable.field("section").to_string(), "net.cables[ridge].section");
        assert_eq!(cables.element("no/id", 4).to_string(), "net.cables[4]");
        let rules = Path::root("prestress.rules");
        let rule = rules.number(2);
        assert_eq!(rule.field("on").to_string(), "prestress.rules[2].on");
    }

    #[test]
    fn very_many_findings_are_counted() {
        let mut findings = Findings::default();
        for _ in 0..WRITTEN_OUT + 7 {
            findings.error(reasons::NOT_FINITE, &Path::root("net"), "", "m", "c");
        }
        findings.doubt(reasons::UNIT_SLIP, &Path::root("net"), "a", "m", "c");
        let accepted = v1::AcceptedDoubt {
            reason: reasons::UNIT_SLIP.to_owned(),
            note: "known".to_owned(),
            ..v1::AcceptedDoubt::default()
        };
        assert!(findings.accept(&accepted));
        let list = findings.into_list();
        assert_eq!(list.len(), WRITTEN_OUT + 2);
        assert_eq!(list[WRITTEN_OUT].value, "7");
        assert_eq!(list[WRITTEN_OUT + 1].accepted_note, "known");
    }
}
