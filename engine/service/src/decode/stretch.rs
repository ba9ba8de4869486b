//! Stretches of a cable between two of its nodes, in path order; on a closed ring they may wrap.

use std::collections::HashMap;

use super::findings::{Findings, Path};
use super::names::Thing;
use super::net::NetDraft;
use super::reasons;
use crate::words::Quoted;

/// A stretch as a brief names it.
pub(crate) struct Stretch<'a> {
    pub(crate) from: &'a str,
    pub(crate) to: &'a str,
    pub(crate) from_visit: Option<u32>,
    pub(crate) to_visit: Option<u32>,
}

/// Positions of the segments of a stretch within their cable.
pub(crate) fn stretch(
    net: &NetDraft<'_>,
    cable: usize,
    wanted: &Stretch<'_>,
    at: &Path<'_>,
    findings: &mut Findings,
) -> Option<Vec<usize>> {
    let draft = &net.cables[cable];
    let id = &draft.message.id;
    // Positions in the kept path are those in the message only where every name could be read.
    if draft.path.len() != draft.message.nodes.len() || draft.path.len() < 2 {
        return None;
    }
    let on_path = |node: &str, field: &'static str, findings: &mut Findings| {
        let visits = match net.names.get(node) {
            Some(Thing::Node(index)) => draft.visits(index),
            _ => &[],
        };
        if visits.is_empty() {
            let what = if node.is_empty() {
                "no node".to_owned()
            } else {
                format!("node {}", Quoted(node))
            };
            findings
                .error(
                    reasons::NO_SUCH_STRETCH,
                    &at.field(field),
                    id,
                    format!(
                        "{what} is named as an end of the stretch, and cable {} does not pass it",
                        Quoted(id)
                    ),
                    format!("name two nodes of cable {}, in the order of its path", Quoted(id)),
                )
                .value(node);
        }
        visits
    };
    let from_visits = on_path(wanted.from, "from", findings);
    let to_visits = on_path(wanted.to, "to", findings);
    if from_visits.is_empty() || to_visits.is_empty() {
        return None;
    }
    match positions(&draft.path, wanted, from_visits, to_visits) {
        Some(positions) => Some(positions),
        None => {
            findings.error(
                reasons::NO_SUCH_STRETCH,
                at,
                id,
                format!(
                    "cable {} has no stretch from {} to {} as asked: in path order the second does not follow the first",
                    Quoted(id),
                    Quoted(wanted.from),
                    Quoted(wanted.to)
                ),
                "name the two nodes in path order; visits count from 1, and only a closed rope may wrap",
            );
            None
        }
    }
}

fn is_closed(path: &[usize]) -> bool {
    path.len() > 2 && path.first() == path.last()
}

/// Positions at which a path meets each of its nodes; the end of a closed path is its beginning.
pub(crate) fn visits(path: &[usize]) -> HashMap<usize, Vec<usize>> {
    let places = if is_closed(path) { path.len() - 1 } else { path.len() };
    let mut visits: HashMap<usize, Vec<usize>> = HashMap::new();
    for (place, node) in path[..places].iter().enumerate() {
        visits.entry(*node).or_default().push(place);
    }
    visits
}

fn positions(path: &[usize], wanted: &Stretch<'_>, from: &[usize], to: &[usize]) -> Option<Vec<usize>> {
    let visit = |visits: &[usize], number: u32| -> Option<usize> {
        visits.get(usize::try_from(number).ok()?.checked_sub(1)?).copied()
    };
    let first = visit(from, wanted.from_visit.unwrap_or(1))?;
    let n_segments = path.len() - 1;
    // Distance along the path from the first node to a place; a full turn where they are the same.
    let along = |place: usize| -> Option<usize> {
        if place > first {
            Some(place - first)
        } else if is_closed(path) {
            Some(place + n_segments - first)
        } else {
            None
        }
    };
    let count = match wanted.to_visit {
        Some(number) => along(visit(to, number)?)?,
        None => to.iter().filter_map(|place| along(*place)).min()?,
    };
    Some((first..first + count).map(|position| position % n_segments).collect())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[track_caller]
    fn check(path: &str, from: (&str, Option<u32>), to: (&str, Option<u32>), expected: Option<&[usize]>) {
        let number = |name: &str| usize::from(name.as_bytes()[0]);
        let path: Vec<usize> = path.split(' ').map(number).collect();
        let wanted = Stretch {
            from: from.0,
            to: to.0,
            from_visit: from.1,
            to_visit: to.1,
        };
        let visits = visits(&path);
        let found = positions(&path, &wanted, &visits[&number(from.0)], &visits[&number(to.0)]);
        assert_eq!(found.as_deref(), expected);
    }

    #[test]
    fn stretches_follow_the_path() {
        check("a b c d", ("b", None), ("d", None), Some(&[1, 2]));
        check("a b c d", ("d", None), ("b", None), None);
        check("a b c b d", ("b", Some(2)), ("d", None), Some(&[3]));
        check("a b c b d", ("a", None), ("b", None), Some(&[0]));
        check("a b c b d", ("a", None), ("b", Some(2)), Some(&[0, 1, 2]));
        check("a b c b d", ("b", Some(3)), ("d", None), None);
        check("a b c b d", ("b", Some(0)), ("d", None), None);
    }

    #[test]
    fn rings_wrap() {
        check("a b c a", ("c", None), ("b", None), Some(&[2, 0]));
        check("a b c a", ("a", None), ("a", None), Some(&[0, 1, 2]));
        check("a b c a", ("a", None), ("c", None), Some(&[0, 1]));
        check("a b c a", ("c", None), ("a", None), Some(&[2]));
    }
}
