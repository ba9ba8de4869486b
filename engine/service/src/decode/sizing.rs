//! Sizing: what gets one section together, and the sections to choose from.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{Sizing, SizingUnit};
use ropewalk_numerics::model::SegmentId;

use super::findings::{Findings, Path};
use super::net::NetDraft;
use super::numbers::{Of, SIZING_RUNS};
use super::reasons;
use super::resolved::Resolved;
use super::scope::{MEMBERS, Scopes, tell_repeated};
use super::sections::Sections;
use crate::words::Quoted;

/// Runs that are allowed where the brief says nothing.
const DEFAULT_RUNS: u32 = 200;

/// A choice of sections for the kernel, and the names that its result needs.
#[derive(Clone, Debug)]
pub struct SizingWork {
    pub(crate) given: Sizing,
    /// One entry a unit.
    pub(crate) choices: Vec<ChoiceNames>,
}

/// Names of a choice.
#[derive(Clone, Debug)]
pub(crate) struct ChoiceNames {
    /// Its place in the brief.
    pub(crate) path: String,
    pub(crate) members: Vec<String>,
    /// Candidates: id, and where its breaking force comes from.
    pub(crate) sections: Vec<(String, String)>,
}

/// Everything that sizing is read against.
pub(crate) struct Context<'c, 'a> {
    pub(crate) net: &'c NetDraft<'a>,
    pub(crate) scopes: &'c Scopes,
    pub(crate) sections: &'c Sections<'a>,
    pub(crate) has_checks: bool,
}

pub(crate) fn read(
    sizing: Option<&v1::Sizing>,
    context: &Context<'_, '_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<SizingWork> {
    let sizing = sizing?;
    let at = Path::root("sizing");
    if !context.has_checks {
        findings.error(
            reasons::MISSING,
            &Path::root("checks"),
            "",
            "sizing looks for sections with which every check holds, and the brief has no check",
            "add checks, or take sizing out",
        );
    }
    let runs_at = at.field("max_runs");
    let runs = match sizing.max_runs {
        Some(runs) => findings
            .number(&runs_at, Of::new("sizing", ""), &SIZING_RUNS, f64::from(runs))
            .map(|_| runs),
        None => {
            resolved.left_out(&runs_at, DEFAULT_RUNS);
            Some(DEFAULT_RUNS)
        }
    };
    let mut reader = Reader {
        context,
        findings,
        owner: vec![None; context.net.segments.len()],
        units: Vec::new(),
        choices: Vec::new(),
    };
    let (on, list) = (at.field("on"), at.field("sections"));
    if !(sizing.on.is_empty() && sizing.sections.is_empty()) {
        tell_repeated(&sizing.on, &on, reader.findings);
        let sections = reader.candidates(&sizing.sections, &list);
        if sizing.on.is_empty() {
            reader.missing(
                &on,
                "sizing has a list of sections and names nothing to size",
                "name members, roles or groups",
            );
        }
        for (number, id) in sizing.on.iter().enumerate() {
            reader.unit(std::slice::from_ref(id), &on.number(number), sections.as_deref());
        }
    }
    let choices_at = at.field("choices");
    for (number, choice) in sizing.choices.iter().enumerate() {
        let at = choices_at.number(number);
        let sections = reader.candidates(&choice.sections, &at.field("sections"));
        if choice.on.is_empty() {
            reader.missing(
                &at.field("on"),
                "this choice names nothing to size",
                "name members, roles or groups",
            );
        }
        reader.unit(&choice.on, &at, sections.as_deref());
    }
    if sizing.on.is_empty() && sizing.sections.is_empty() && sizing.choices.is_empty() {
        reader.missing(
            &choices_at,
            "sizing names nothing to size",
            "give on and sections, or choices, or take sizing out",
        );
    }
    let Reader { units, choices, .. } = reader;
    Some(SizingWork {
        given: Sizing {
            units,
            max_evaluations: usize::try_from(runs?).ok()?,
        },
        choices,
    })
}

struct Reader<'r, 'c, 'a> {
    context: &'r Context<'c, 'a>,
    findings: &'r mut Findings,
    /// The choice of each segment that has one.
    owner: Vec<Option<usize>>,
    units: Vec<SizingUnit>,
    choices: Vec<ChoiceNames>,
}

impl Reader<'_, '_, '_> {
    fn missing(&mut self, at: &Path<'_>, message: &str, cure: &str) {
        self.findings.error(reasons::MISSING, at, "", message, cure);
    }

    /// Indices of the sections that a list names, if each can be used.
    fn candidates(&mut self, ids: &[String], at: &Path<'_>) -> Option<Vec<usize>> {
        tell_repeated(ids, at, self.findings);
        if ids.is_empty() {
            self.missing(
                at,
                "there is no section to choose from",
                "name sections, smallest first",
            );
            return None;
        }
        let sections = self.context.sections;
        let mut candidates = Vec::with_capacity(ids.len());
        for (number, id) in ids.iter().enumerate() {
            let at = at.number(number);
            let Some(index) = sections.names.find(self.findings, &at, "section", id) else {
                continue;
            };
            if sections.list[index].message.mass_kg_per_m.is_none() {
                self.findings
                    .error(
                        reasons::MISSING,
                        &at,
                        id,
                        format!("section {} has no mass: sizing looks for the least mass", Quoted(id)),
                        "give its mass_kg_per_m",
                    )
                    .value(id);
                continue;
            }
            candidates.push(index);
        }
        (candidates.len() == ids.len()).then_some(candidates)
    }

    /// Tells candidates without a diameter where the sections that they replace have one: ice and wind ask for it.
    fn tell_diameters(&mut self, segments: &[usize], candidates: &[usize], at: &Path<'_>) {
        let sections = self.context.sections;
        let has_one = |section: usize| sections.list[section].message.diameter_m.is_some();
        if !segments
            .iter()
            .any(|segment| sections.of_segment[*segment].is_some_and(|(section, _)| has_one(section)))
        {
            return;
        }
        for section in candidates.iter().filter(|section| !has_one(**section)) {
            let id = &sections.list[*section].message.id;
            self.findings
                .error(
                    reasons::MISSING,
                    at,
                    id,
                    format!(
                        "section {} has no diameter, and what it would replace has one",
                        Quoted(id)
                    ),
                    "give its diameter_m",
                )
                .value(id);
        }
    }

    /// Members that get one section together.
    fn unit(&mut self, on: &[String], at: &Path<'_>, candidates: Option<&[usize]>) {
        let Context {
            net, scopes, sections, ..
        } = self.context;
        let scope = scopes.of(net, on, at, MEMBERS, self.findings);
        let segments = scope.segments(net);
        if scope.complete && segments.is_empty() && !on.is_empty() {
            self.findings.error(
                reasons::COVERS_NOTHING,
                at,
                "",
                "this choice covers no member",
                "name members, or give the role to some",
            );
        }
        for segment in &segments {
            let owner = &mut self.owner[*segment];
            if let Some(other) = owner
                .replace(self.units.len())
                .filter(|other| *other != self.units.len())
            {
                let id = net.member_id(net.segments[*segment].1);
                self.findings
                    .error(
                        reasons::SIZED_TWICE,
                        at,
                        id,
                        format!("{} is sized here and at {}", Quoted(id), self.choices[other].path),
                        "leave it in one of the two",
                    )
                    .value(id);
                return;
            }
        }
        let candidates = candidates.unwrap_or_default();
        self.tell_diameters(&segments, candidates, at);
        let of_segments = |section: &usize| {
            let of_segment = |segment: &usize| {
                let (_, factor) = sections.of_segment[*segment]?;
                sections.with_fittings(*section, factor)
            };
            segments.iter().map(of_segment).collect::<Option<Vec<_>>>()
        };
        let mut members: Vec<String> = Vec::new();
        for segment in &segments {
            let id = net.member_id(net.segments[*segment].1);
            if members.last().is_none_or(|last| last != id) {
                members.push(id.to_owned());
            }
        }
        let names = candidates.iter().map(|section| &sections.list[*section].message);
        self.choices.push(ChoiceNames {
            path: at.to_string(),
            members,
            sections: names
                .map(|section| (section.id.clone(), section.breaking_force_origin.clone()))
                .collect(),
        });
        self.units.push(SizingUnit {
            candidates: candidates.iter().filter_map(of_segments).collect(),
            segments: segments.into_iter().map(SegmentId::new).collect(),
        });
    }
}
