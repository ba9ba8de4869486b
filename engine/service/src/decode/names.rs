//! Names: what each one stands for, and which one was probably meant.

use std::collections::HashMap;

use super::findings::{Findings, Path, is_id};
use super::reasons;
use crate::words::{Quoted, shown};

/// What a name that may stand in `on` stands for.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(crate) enum Thing {
    /// A node, by its index.
    Node(usize),
    /// A cable.
    Cable(usize),
    /// A strut.
    Strut(usize),
    /// A role.
    Role(usize),
    /// A group.
    Group(usize),
    /// A skin.
    Skin(usize),
    /// A zone.
    Zone(usize),
}

impl Thing {
    pub(crate) fn kind(self) -> &'static str {
        match self {
            Self::Node(_) => "node",
            Self::Cable(_) => "cable",
            Self::Strut(_) => "strut",
            Self::Role(_) => "role",
            Self::Group(_) => "group",
            Self::Skin(_) => "skin",
            Self::Zone(_) => "zone",
        }
    }
}

/// Names of one namespace, each for one thing, in the order in which they came.
#[derive(Debug)]
pub(crate) struct Names<'a, T> {
    /// The kinds of things that share this namespace.
    together: &'static str,
    things: HashMap<&'a str, T>,
    order: Vec<&'a str>,
}

impl<'a, T: Copy> Names<'a, T> {
    pub(crate) fn new(together: &'static str) -> Self {
        Self {
            together,
            things: HashMap::new(),
            order: Vec::new(),
        }
    }

    pub(crate) fn get(&self, name: &str) -> Option<T> {
        self.things.get(name).copied()
    }

    /// Adds a name that is known to be new.
    pub(crate) fn insert(&mut self, name: &'a str, thing: T) {
        if self.things.insert(name, thing).is_none() {
            self.order.push(name);
        }
    }

    /// Adds the name of an element of a list; tells if it is no id or already stands for something.
    pub(crate) fn declare(&mut self, findings: &mut Findings, list: &Path<'_>, number: usize, id: &'a str, thing: T) {
        let element = list.number(number);
        let at = element.field("id");
        if !is_id(id) {
            bad_id(findings, &at, id);
        } else if self.things.contains_key(id) {
            findings
                .error(
                    reasons::DUPLICATE_ID,
                    &at,
                    id,
                    format!("the id {} stands twice among {}", Quoted(id), self.together),
                    "give one of them another id",
                )
                .value(shown(id));
        } else {
            self.insert(id, thing);
        }
    }

    /// What the name stands for; tells if it names nothing.
    pub(crate) fn find(&self, findings: &mut Findings, at: &Path<'_>, what: &str, name: &str) -> Option<T> {
        let thing = self.get(name);
        if thing.is_none() {
            self.unknown(findings, at, what, name);
        }
        thing
    }

    /// Tells that a name names nothing.
    pub(crate) fn unknown(&self, findings: &mut Findings, at: &Path<'_>, what: &str, name: &str) {
        let meant = findings.nearest(name, self.order.iter().copied());
        let question = meant.map_or(String::new(), |meant| format!(" Did you mean {}?", Quoted(meant)));
        let cure = meant.map_or_else(
            || format!("name a {what} that the brief has"),
            |meant| format!("write {}, or add a {what} {}", Quoted(meant), Quoted(name)),
        );
        findings
            .error(
                reasons::UNKNOWN_ID,
                at,
                name,
                format!("there is no {what} {}.{question}", Quoted(name)),
                cure,
            )
            .value(shown(name));
    }

    /// Names in the order in which they came.
    pub(crate) fn order(&self) -> &[&'a str] {
        &self.order
    }
}

/// Tells that a text is no id.
pub(crate) fn bad_id(findings: &mut Findings, at: &Path<'_>, id: &str) {
    let why = if id.is_empty() {
        "is empty".to_owned()
    } else if id.chars().count() > 128 {
        format!("has {} characters", id.chars().count())
    } else {
        let bad = id.chars().find(|c| !is_id(c.encode_utf8(&mut [0; 4])));
        let bad = bad.map_or_else(String::new, |c| format!(" {}", Quoted(c.encode_utf8(&mut [0; 4]))));
        format!("has the character{bad}, which ids must not have")
    };
    findings
        .error(
            reasons::BAD_ID,
            at,
            id,
            format!("the id {} {why}", Quoted(id)),
            "use 1 to 128 characters, no control characters, none of / [ ]",
        )
        .value(shown(id));
}

/// The form of a name in which letters that look alike are the same letter.
pub(crate) fn look_alike(name: &str) -> String {
    name.chars()
        .map(|c| match c {
            'l' | 'I' | 'i' | '|' => '1',
            'O' | 'o' => '0',
            '_' | ' ' => '-',
            c => c.to_lowercase().next().unwrap_or(c),
        })
        .collect()
}

/// The known name that was probably meant, if one is close enough: letters that look alike count as equal.
pub(crate) fn nearest<'a>(name: &str, known: impl Iterator<Item = &'a str>) -> Option<&'a str> {
    let form = look_alike(name);
    let length = form.chars().count();
    // A third of the letters may differ; of a single letter only its look.
    let allowed = (length + 1) / 3;
    known
        .filter(|other| *other != name)
        .filter(|other| other.len().abs_diff(name.len()) <= 4 * allowed)
        .filter_map(|other| {
            let distance = strsim::damerau_levenshtein(&form, &look_alike(other));
            (distance <= allowed).then(|| (distance, strsim::damerau_levenshtein(name, other), other))
        })
        .min_by_key(|(distance, exact, _)| (*distance, *exact))
        .map(|(_, _, other)| other)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn letters_that_look_alike_win() {
        let known = ["n11", "n33", "n32", "n31", "p4"];
        assert_eq!(nearest("n3l", known.into_iter()), Some("n31"));
        assert_eq!(nearest("snw", ["snow", "self"].into_iter()), Some("snow"));
        assert_eq!(nearest("x", known.into_iter()), None);
        assert_eq!(nearest("w", ["W", "E"].into_iter()), Some("W"));
        assert_eq!(nearest("ridge", ["wall-anchors"].into_iter()), None);
    }
}
