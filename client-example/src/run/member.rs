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

    /// The section that sizing chose for a member: results are those of it, not of the brief's.
    fn chosen_section(&self, id: &str, role: &str) -> Option<String> {
        let groups = |name: &String| {
            let groups = self.net().into_iter().flat_map(|net| &net.groups);
            groups
                .filter(move |group| group.id == *name)
                .any(|group| group.of.iter().any(|of| of == id || of == role))
        };
        let covers = |names: &[String]| names.iter().any(|name| name == id || name == role || groups(name));
        let choices = &self.sizing.as_ref()?.choices;
        let sizing = self.brief.sizing.as_ref();
        let named = choices
            .iter()
            .find(|choice| choice.members.iter().any(|member| member == id));
        // A choice lists its first members; the brief says of whom else it is.
        let asked = |choice: &&v1::SizedChoice| {
            let place = |list: &str| -> Option<usize> {
                let number = choice.path.strip_prefix(list)?.strip_prefix('[')?.split(']').next()?;
                number.parse().ok()
            };
            let single = || Some(sizing?.on.get(place("sizing.on")?)?.clone());
            let several = || Some(sizing?.choices.get(place("sizing.choices")?)?.on.clone());
            single().map_or_else(|| several().is_some_and(|names| covers(&names)), |name| covers(&[name]))
        };
        let choice = named.or_else(|| choices.iter().find(asked))?;
        Some(choice.section.clone())
    }

    /// Section of each segment of a cable, in path order.
    pub(crate) fn cable_sections(&self, cable: &v1::Cable) -> Vec<String> {
        if let Some(chosen) = self.chosen_section(&cable.id, &cable.role) {
            return vec![chosen; cable.nodes.len().saturating_sub(1)];
        }
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
        if let Some(chosen) = self.chosen_section(&strut.id, &strut.role) {
            return chosen;
        }
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
    fn a_chosen_section_wins_over_the_briefs() {
        let mut run = super::super::sample::run();
        let cable = run.cable("carrying").unwrap().clone();
        assert_eq!(run.cable_sections(&cable), ["r10", "r10"]);
        let choice = |path: &str, members: &[&str]| v1::SizedChoice {
            path: path.to_owned(),
            members: members.iter().map(ToString::to_string).collect(),
            section: "r20".to_owned(),
            ..Default::default()
        };
        let sized = |choice: v1::SizedChoice| {
            Some(v1::SizingResult {
                choices: vec![choice],
                ..Default::default()
            })
        };
        run.sizing = sized(choice("sizing.on[0]", &["carrying"]));
        assert_eq!(run.cable_sections(&cable), ["r20", "r20"]);
        // One of many members stands in the brief only.
        run.sizing = sized(choice("sizing.on[0]", &["other"]));
        assert_eq!(run.cable_sections(&cable), ["r10", "r10"]);
        run.brief.sizing = Some(v1::Sizing {
            on: vec!["carrying".to_owned()],
            ..Default::default()
        });
        assert_eq!(run.cable_sections(&cable), ["r20", "r20"]);
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
