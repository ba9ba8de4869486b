//! What members are made of, as the brief says: role, section, strength. A member's own field wins over its role's.

use ropewalk_api::ropewalk::v1;

use super::Run;

impl Run {
    /// A role by its id.
    fn role(&self, id: &str) -> Option<&v1::Role> {
        self.net()?.roles.iter().find(|role| role.id == id)
    }

    fn section(&self, id: &str) -> Option<&v1::Section> {
        self.net()?.sections.iter().find(|section| section.id == id)
    }

    /// A cable of the brief.
    pub(crate) fn cable(&self, id: &str) -> Option<&v1::Cable> {
        self.net()?.cables.iter().find(|cable| cable.id == id)
    }

    /// A strut of the brief.
    pub(crate) fn strut(&self, id: &str) -> Option<&v1::Strut> {
        self.net()?.struts.iter().find(|strut| strut.id == id)
    }

    /// Section of each segment of a cable, in path order.
    pub(crate) fn cable_sections(&self, cable: &v1::Cable) -> Vec<String> {
        let own = if cable.section.is_empty() {
            self.role(&cable.role)
                .map(|role| role.section.clone())
                .unwrap_or_default()
        } else {
            cable.section.clone()
        };
        let n_segments = cable.nodes.len().saturating_sub(1);
        let mut sections = vec![own; n_segments];
        for part in cable.parts.iter().filter(|part| !part.section.is_empty()) {
            for segment in part_segments(&cable.nodes, part) {
                sections[segment].clone_from(&part.section);
            }
        }
        sections
    }

    /// Section of a strut.
    pub(crate) fn strut_section(&self, strut: &v1::Strut) -> String {
        if strut.section.is_empty() {
            self.role(&strut.role)
                .map(|role| role.section.clone())
                .unwrap_or_default()
        } else {
            strut.section.clone()
        }
    }

    /// Breaking force of each segment of a cable with its end fittings (N); none without data.
    pub(crate) fn breaking_forces(&self, cable: &v1::Cable) -> Vec<Option<f64>> {
        let fitting = cable
            .end_fitting
            .as_ref()
            .or_else(|| self.role(&cable.role)?.end_fitting.as_ref());
        let kept = fitting.and_then(|fitting| fitting.strength_factor).unwrap_or(1.0);
        let sections = self.cable_sections(cable);
        sections
            .iter()
            .map(|id| self.section(id)?.breaking_force_n.map(|force| force * kept))
            .collect()
    }

    /// Nodes that a list of ids names, groups unfolded.
    pub(crate) fn nodes_named(&self, on: &[String]) -> Vec<usize> {
        let mut found = Vec::new();
        let mut open: Vec<&str> = on.iter().map(String::as_str).collect();
        let mut met = std::collections::BTreeSet::new();
        while let Some(id) = open.pop() {
            // A group that contains itself is the engine's to refuse; here it must only end.
            if !met.insert(id) {
                continue;
            }
            if let Some(node) = self.nodes.iter().position(|node| node == id) {
                found.push(node);
            } else if let Some(group) = self
                .net()
                .and_then(|net| net.groups.iter().find(|group| group.id == id))
            {
                open.extend(group.of.iter().map(String::as_str));
            }
        }
        found.sort_unstable();
        found
    }
}

/// Segments of a part, by position along the path; on a closed ring it may wrap.
fn part_segments(path: &[String], part: &v1::CablePart) -> Vec<usize> {
    let ring = path.len() > 2 && path.first() == path.last();
    let n_segments = path.len().saturating_sub(1);
    let visits = |id: &str| -> Vec<usize> {
        let visits: Vec<usize> = (0..path.len()).filter(|&position| path[position] == id).collect();
        // The closing node of a ring is its first one again.
        if ring {
            visits.into_iter().filter(|&position| position < n_segments).collect()
        } else {
            visits
        }
    };
    let nth = |visit: u32| usize::try_from(visit).unwrap_or(usize::MAX).saturating_sub(1);
    let Some(&from) = visits(&part.from).get(nth(part.from_visit.unwrap_or(1))) else {
        return Vec::new();
    };
    let ends = visits(&part.to);
    let to = match part.to_visit {
        Some(visit) => ends.get(nth(visit)).copied(),
        None => ends
            .iter()
            .copied()
            .find(|&position| position > from)
            .or_else(|| ends.first().copied().filter(|_| ring)),
    };
    match to {
        Some(to) if to > from => (from..to).collect(),
        Some(to) if ring => (from..n_segments).chain(0..to).collect(),
        _ => Vec::new(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn path(text: &str) -> Vec<String> {
        text.chars().map(String::from).collect()
    }

    fn part(from: &str, to: &str) -> v1::CablePart {
        v1::CablePart {
            from: from.to_owned(),
            to: to.to_owned(),
            ..Default::default()
        }
    }

    #[test]
    fn parts_run_in_path_order_and_wrap_on_rings() {
        assert_eq!(part_segments(&path("abcd"), &part("b", "d")), [1, 2]);
        assert_eq!(part_segments(&path("abcd"), &part("d", "b")), [] as [usize; 0]);
        assert_eq!(part_segments(&path("abcda"), &part("d", "b")), [3, 0]);
        assert_eq!(part_segments(&path("abcda"), &part("c", "a")), [2, 3]);
        assert_eq!(
            part_segments(
                &path("abab"),
                &v1::CablePart {
                    to_visit: Some(2),
                    ..part("a", "b")
                }
            ),
            [0, 1, 2]
        );
    }
}
