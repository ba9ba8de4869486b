//! Puts the events of a stream together and refuses a stream that breaks the contract.

use std::collections::{BTreeMap, HashMap};

use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::run_response::Event;

use super::motion::Motions;
use super::{Column, Effect, End, Member, MotionRun, Run, Segment, State};

/// A stream that does not keep to the contract.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[error("the engine's answer does not keep to the contract: {0}")]
pub(crate) struct Oddity(String);

pub(super) fn odd(what: impl Into<String>) -> Oddity {
    Oddity(what.into())
}

#[derive(Debug, Default)]
struct Table {
    total: usize,
    ids: Vec<String>,
    from_nodes: Vec<u32>,
    to_nodes: Vec<u32>,
    segments: Vec<u32>,
}

/// Takes events one by one.
#[derive(Debug, Default)]
pub(crate) struct Collector {
    /// What was asked and answered, as `run/record.rs` tells.
    record: Vec<u8>,
    started: Option<v1::Started>,
    tables: BTreeMap<i32, Table>,
    columns: BTreeMap<String, BTreeMap<String, (Column, usize)>>,
    begun: Vec<v1::CaseBegin>,
    ended: Vec<v1::CaseSummary>,
    /// The case that is being told again with its arrays.
    told_again: Option<String>,
    findings: Vec<v1::Finding>,
    diagnoses: Vec<v1::StateDiagnosis>,
    modes: Vec<v1::StateModes>,
    motions: Motions,
    sizing: Option<v1::SizingResult>,
    shape_report: Option<v1::ShapeReport>,
    effects: Vec<v1::DesignEffect>,
    losses: Vec<v1::LossRow>,
    panels: Vec<v1::PanelEntry>,
    loads: Vec<v1::LoadPicture>,
    timing: Option<v1::Timing>,
    summary: Option<v1::Summary>,
}

impl Collector {
    /// A collector of what answers a request.
    pub(crate) fn of(request: &v1::RunRequest) -> Self {
        Self {
            record: request.encode_length_delimited_to_vec(),
            ..Self::default()
        }
    }

    /// Whether the engine took the brief and began to answer.
    pub(crate) fn has_begun(&self) -> bool {
        self.started.is_some()
    }

    /// Whether the summary came.
    pub(crate) fn is_whole(&self) -> bool {
        self.summary.is_some()
    }

    /// States that are closed so far.
    pub(crate) fn closed(&self) -> &[v1::CaseSummary] {
        &self.ended
    }

    /// The motion that ended last, as long as no other one has begun.
    pub(crate) fn ended_motion(&self) -> Option<&MotionRun> {
        self.motions.last_ended()
    }

    /// Takes an event.
    ///
    /// # Errors
    /// [`Oddity`] if it does not fit what came before.
    pub(crate) fn take(&mut self, event: Event) -> Result<(), Oddity> {
        if self.summary.is_some() {
            return Err(odd("events after the summary"));
        }
        let event = self.keep(event);
        match event {
            Event::Started(started) => self.started = Some(started),
            Event::Ids(part) => self.take_ids(part)?,
            Event::Columns(part) => self.take_columns(part)?,
            // Told before without its arrays: these follow, and the same summary.
            Event::CaseBegin(begin) if begin.again => self.told_again = Some(begin.case),
            Event::CaseSummary(end) if self.told_again.as_ref() == Some(&end.case) => self.told_again = None,
            Event::CaseBegin(begin) => self.begun.push(begin),
            Event::CaseSummary(end) => {
                if self.begun.last().is_none_or(|begin| begin.case != end.case) {
                    return Err(odd(format!("\"{}\" ends without a beginning", end.case)));
                }
                self.ended.push(end);
            }
            Event::Finding(finding) => self.findings.push(finding),
            Event::Timing(timing) => self.timing = Some(timing),
            Event::Summary(summary) => self.summary = Some(summary),
            Event::Diagnosis(part) => self.diagnoses.push(part),
            Event::Modes(part) => self.modes.push(part),
            Event::Sizing(sizing) => self.sizing = Some(sizing),
            Event::DesignEffect(effect) => self.effects.push(effect),
            Event::LossTable(part) => {
                if size(part.offset) != self.losses.len() {
                    return Err(odd(format!("the table of losses has a gap at {}", part.offset)));
                }
                self.losses.extend(part.rows);
            }
            Event::Panels(part) => {
                if size(part.offset) != self.panels.len() {
                    return Err(odd(format!("the table of panels has a gap at {}", part.offset)));
                }
                self.panels.extend(part.panels);
            }
            Event::LoadPicture(part) => self.take_load_picture(part)?,
            Event::ShapeReport(part) => self.take_shape_report(part)?,
            Event::Motion(part) => self.motions.take(part)?,
            Event::Progress(_) => {}
        }
        Ok(())
    }

    /// Writes an event into the record; progress and wall times are left out, so that equal runs give equal records.
    fn keep(&mut self, event: Event) -> Event {
        if matches!(event, Event::Progress(_) | Event::Timing(_)) {
            return event;
        }
        let response = v1::RunResponse { event: Some(event) };
        response
            .encode_length_delimited(&mut self.record)
            .expect("memory takes every message");
        response.event.expect("it was put there")
    }

    fn take_ids(&mut self, part: v1::IdTable) -> Result<(), Oddity> {
        let table = self.tables.entry(part.over).or_default();
        if size(part.offset) != table.ids.len() {
            return Err(odd(format!("a table of ids has a gap at {}", part.offset)));
        }
        table.total = size(part.total);
        table.ids.extend(part.ids);
        table.from_nodes.extend(part.from_nodes);
        table.to_nodes.extend(part.to_nodes);
        table.segments.extend(part.segments);
        Ok(())
    }

    fn take_shape_report(&mut self, part: v1::ShapeReport) -> Result<(), Oddity> {
        let Some(known) = self.shape_report.as_mut() else {
            self.shape_report = Some(part);
            return Ok(());
        };
        if size(part.offset) != known.wishes.len() {
            return Err(odd(format!("the report on the shape has a gap at {}", part.offset)));
        }
        known.wishes.extend(part.wishes);
        known.fights.extend(part.fights);
        known.left.extend(part.left);
        known.at_bounds.extend(part.at_bounds);
        Ok(())
    }

    fn take_load_picture(&mut self, part: v1::LoadPicture) -> Result<(), Oddity> {
        match self.loads.last_mut().filter(|known| known.action == part.action) {
            None => self.loads.push(part),
            Some(known) => {
                if size(part.offset) != known.pressure_pa.len().max(known.on_plan_pa.len()) {
                    return Err(odd(format!(
                        "the picture of \"{}\" has a gap at {}",
                        part.action, part.offset
                    )));
                }
                known.pressure_pa.extend(part.pressure_pa);
                known.on_plan_pa.extend(part.on_plan_pa);
            }
        }
        Ok(())
    }

    fn take_columns(&mut self, part: v1::Columns) -> Result<(), Oddity> {
        let over = part.over();
        let columns = self.columns.entry(part.case).or_default();
        let (column, total) = columns.entry(part.name.clone()).or_insert_with(|| {
            let column = Column {
                unit: part.unit,
                over,
                components: size(part.components).max(1),
                baseline: part.baseline,
                values: Vec::new(),
            };
            (column, size(part.total))
        });
        if size(part.offset) != column.values.len() {
            return Err(odd(format!("array \"{}\" has a gap at {}", part.name, part.offset)));
        }
        column.values.extend(part.values);
        if column.values.len() > *total {
            return Err(odd(format!("array \"{}\" is longer than announced", part.name)));
        }
        Ok(())
    }

    /// The run.
    ///
    /// # Errors
    /// [`Oddity`] if something is missing.
    pub(crate) fn finish(mut self, brief: v1::Brief) -> Result<Run, Oddity> {
        let summary = self
            .summary
            .take()
            .ok_or_else(|| odd("the stream ended without a summary"))?;
        self.put_together(brief, summary, None)
    }

    /// What came before a stream broke off: states that were closed, without a verdict. The state that was open is left
    /// out.
    ///
    /// # Errors
    /// [`Oddity`] if that is not enough to tell of.
    pub(crate) fn finish_broken(mut self, brief: v1::Brief, why: &str) -> Result<Run, Oddity> {
        if self.ended.is_empty() {
            return Err(odd("the stream broke off before the first state was closed"));
        }
        // Design effects may lack their arrays, and stand beside what has no verdict.
        self.effects.clear();
        // Arrays of states that were not closed may lack their ends; those over all states mean nothing without all.
        self.motions.cut();
        let mut closed = self.motions.keys();
        closed.extend(self.ended.iter().map(|end| end.case.clone()));
        self.columns.retain(|case, _| closed.contains(case));
        let count = |of: usize| u32::try_from(of).unwrap_or(u32::MAX);
        let answered: Vec<&v1::CaseSummary> = self
            .ended
            .iter()
            .filter(|end| end.outcome() == v1::CaseOutcome::Answered)
            .collect();
        let audited = answered.iter().filter(|end| end.audited).count();
        let asked = self
            .tables
            .get(&(v1::Range::Case as i32))
            .map_or(self.begun.len(), |table| table.total + 1);
        let summary = v1::Summary {
            verdict: v1::Verdict::NoAnswer.into(),
            answered: Some(v1::Share {
                count: count(answered.len()),
                of: count(asked),
            }),
            audited: Some(v1::Share {
                count: count(audited),
                of: count(answered.len()),
            }),
            cautions: vec![
                format!(
                    "This run is not complete: it broke off after {} of {asked} states, and no check was judged. Run it \
                     again before you decide by it.",
                    self.ended.len()
                ),
                "An aid: the local code and a licensed engineer decide.".to_owned(),
            ],
            ..Default::default()
        };
        self.put_together(brief, summary, Some(why.to_owned()))
    }

    fn put_together(
        mut self,
        brief: v1::Brief,
        summary: v1::Summary,
        broken_off: Option<String>,
    ) -> Result<Run, Oddity> {
        let started = self
            .started
            .take()
            .ok_or_else(|| odd("the stream did not begin with its head"))?;
        for table in self.tables.values() {
            if table.ids.len() != table.total {
                return Err(odd(format!("{} of {} ids in a table", table.ids.len(), table.total)));
            }
        }
        let mut run = Run {
            brief,
            started,
            nodes: self.ids(v1::Range::Node),
            cables: self.ids(v1::Range::Cable),
            struts: self.ids(v1::Range::Strut),
            segments: Vec::new(),
            supports: Vec::new(),
            ends: Vec::new(),
            case_ids: self.ids(v1::Range::Case),
            states: Vec::new(),
            envelope: BTreeMap::new(),
            findings: std::mem::take(&mut self.findings),
            diagnoses: std::mem::take(&mut self.diagnoses),
            modes: std::mem::take(&mut self.modes),
            motions: std::mem::take(&mut self.motions).finish()?,
            sizing: self.sizing.take(),
            effects: Vec::new(),
            slides: Vec::new(),
            reaches: Vec::new(),
            shape_report: self.shape_report.take(),
            losses: std::mem::take(&mut self.losses),
            panels: std::mem::take(&mut self.panels),
            loads: std::mem::take(&mut self.loads),
            summary,
            timing: self.timing.take(),
            broken_off,
            record: std::mem::take(&mut self.record),
        };
        run.segments = self.segments(&run)?;
        run.supports = self.supports(&run)?;
        run.ends = self.ends(&run)?;
        run.slides = self.places(v1::Range::Slide, |table| &table.from_nodes, run.nodes.len())?;
        run.reaches = self.places(v1::Range::Reach, |table| &table.segments, run.segments.len())?;
        if run
            .panels
            .iter()
            .flat_map(|panel| &panel.corners)
            .any(|&corner| size(corner) >= run.nodes.len())
        {
            return Err(odd("a panel at a node that is not there"));
        }
        run.envelope = self.checked_columns("envelope", &run)?;
        for effect in std::mem::take(&mut self.effects) {
            let columns = self.checked_columns(&effect.id, &run)?;
            run.effects.push(Effect { effect, columns });
        }
        let mut motions = std::mem::take(&mut run.motions);
        for motion in &mut motions {
            motion.columns = self.checked_columns(&motion.key(), &run)?;
            motion.check_spectra()?;
        }
        run.motions = motions;
        let ended = std::mem::take(&mut self.ended);
        for end in ended {
            let begin = self
                .begun
                .iter()
                .find(|begin| begin.case == end.case)
                .expect("checked when it ended");
            let (in_words, sets) = (begin.in_words.clone(), begin.sets.clone());
            let columns = self.checked_columns(&end.case, &run)?;
            run.states.push(State {
                id: end.case.clone(),
                in_words,
                sets,
                columns,
                summary: end,
            });
        }
        Ok(run)
    }

    fn ids(&self, over: v1::Range) -> Vec<String> {
        self.tables
            .get(&(over as i32))
            .map(|table| table.ids.clone())
            .unwrap_or_default()
    }

    fn segments(&self, run: &Run) -> Result<Vec<Segment>, Oddity> {
        let Some(table) = self.tables.get(&(v1::Range::Segment as i32)) else {
            return Ok(Vec::new());
        };
        let cables: HashMap<&str, usize> = run
            .cables
            .iter()
            .enumerate()
            .map(|(at, id)| (id.as_str(), at))
            .collect();
        let struts: HashMap<&str, usize> = run
            .struts
            .iter()
            .enumerate()
            .map(|(at, id)| (id.as_str(), at))
            .collect();
        if table.from_nodes.len() != table.ids.len() || table.to_nodes.len() != table.ids.len() {
            return Err(odd("segments without their nodes"));
        }
        let mut segments = Vec::with_capacity(table.ids.len());
        for (id, (from, to)) in table.ids.iter().zip(table.from_nodes.iter().zip(&table.to_nodes)) {
            let cable = cables.get(id.as_str()).map(|&at| Member::Cable(at));
            let member = cable.or_else(|| struts.get(id.as_str()).map(|&at| Member::Strut(at)));
            let member = member.ok_or_else(|| odd(format!("a segment of \"{id}\", which is no cable or strut")))?;
            let nodes = [size(*from), size(*to)];
            if nodes.iter().any(|&node| node >= run.nodes.len()) {
                return Err(odd(format!("a segment of \"{id}\" at a node that is not there")));
            }
            segments.push(Segment { member, nodes });
        }
        Ok(segments)
    }

    fn supports(&self, run: &Run) -> Result<Vec<usize>, Oddity> {
        let places: HashMap<&str, usize> = run.nodes.iter().enumerate().map(|(at, id)| (id.as_str(), at)).collect();
        let place = |id: &String| {
            places
                .get(id.as_str())
                .copied()
                .ok_or_else(|| odd(format!("support \"{id}\" is no node")))
        };
        self.ids(v1::Range::Support).iter().map(place).collect()
    }

    fn ends(&self, run: &Run) -> Result<Vec<End>, Oddity> {
        let Some(table) = self.tables.get(&(v1::Range::End as i32)) else {
            return Ok(Vec::new());
        };
        if table.from_nodes.len() != table.ids.len() || table.segments.len() != table.ids.len() {
            return Err(odd("ends without their nodes"));
        }
        let pairs = table.from_nodes.iter().zip(&table.segments);
        let ends: Vec<End> = pairs
            .map(|(node, segment)| End {
                node: size(*node),
                segment: size(*segment),
            })
            .collect();
        if ends
            .iter()
            .any(|end| end.node >= run.nodes.len() || end.segment >= run.segments.len())
        {
            return Err(odd("an end at a node that is not there"));
        }
        Ok(ends)
    }

    /// Ids of a table, each with a position that must be below a number.
    fn places(
        &self,
        over: v1::Range,
        of: impl Fn(&Table) -> &Vec<u32>,
        below: usize,
    ) -> Result<Vec<(String, usize)>, Oddity> {
        let Some(table) = self.tables.get(&(over as i32)) else {
            return Ok(Vec::new());
        };
        let positions = of(table);
        if positions.len() != table.ids.len() || positions.iter().any(|&at| size(at) >= below) {
            return Err(odd(format!(
                "a table of ids names what is not there ({})",
                over.as_str_name()
            )));
        }
        Ok(table
            .ids
            .iter()
            .cloned()
            .zip(positions.iter().map(|&at| size(at)))
            .collect())
    }

    fn checked_columns(&mut self, case: &str, run: &Run) -> Result<BTreeMap<String, Column>, Oddity> {
        let mut checked = BTreeMap::new();
        for (name, (column, total)) in self.columns.remove(case).unwrap_or_default() {
            let entries = match column.over {
                v1::Range::Node => Some(run.nodes.len()),
                v1::Range::Segment => Some(run.segments.len()),
                v1::Range::RopeSegment => Some(run.n_rope_segments()),
                v1::Range::Cable => Some(run.cables.len()),
                v1::Range::Strut => Some(run.struts.len()),
                v1::Range::Support => Some(run.supports.len()),
                v1::Range::End => Some(run.ends.len()),
                v1::Range::Panel => Some(run.panels.len()),
                v1::Range::Slide => Some(run.slides.len()),
                v1::Range::Reach if !run.reaches.is_empty() => Some(run.reaches.len()),
                _ => None,
            };
            let fits = entries.is_none_or(|entries| column.values.len() == entries * column.components);
            if column.values.len() != total || !fits {
                return Err(odd(format!(
                    "array \"{name}\" of \"{case}\" has {} numbers",
                    column.values.len()
                )));
            }
            checked.insert(name, column);
        }
        Ok(checked)
    }
}

pub(super) fn size(count: u32) -> usize {
    usize::try_from(count).expect("this machine counts beyond 32 bits")
}

#[cfg(test)]
mod tests {
    use super::super::sample;
    use super::*;

    #[test]
    fn a_stream_makes_a_run() {
        let run = sample::run();
        assert_eq!(run.nodes, ["A", "B", "C", "D", "m"]);
        assert_eq!(run.segments.len(), 4);
        assert_eq!(run.states.len(), 3);
        assert_eq!(run.n_rope_segments(), 4);
        assert_eq!(run.states[1].vectors("position_m").unwrap()[4], [4.5, 4.5, 1.477_41]);
    }

    #[test]
    fn a_broken_stream_is_refused() {
        let events = sample::events();
        for (position, event) in events.iter().enumerate() {
            if matches!(event, Event::Finding(_) | Event::Timing(_) | Event::Progress(_)) {
                continue;
            }
            let mut collector = Collector::default();
            let rest = events
                .iter()
                .enumerate()
                .filter(|(other, _)| *other != position)
                .map(|(_, event)| event.clone());
            let taken: Result<(), Oddity> = rest.into_iter().try_for_each(|event| collector.take(event));
            let outcome = taken.and_then(|()| collector.finish(sample::brief()));
            let optional = matches!(event, Event::Columns(_))
                || matches!(event, Event::Ids(table) if matches!(table.over(), v1::Range::Case | v1::Range::End))
                || matches!(event, Event::CaseSummary(_));
            assert!(
                outcome.is_err() || optional,
                "nobody misses event {position}: {event:?}"
            );
        }
    }

    #[test]
    fn parts_of_long_tables_are_joined_and_gaps_refused() {
        let loss = |offset: u32, removed: &str| {
            Event::LossTable(v1::LossTable {
                offset,
                total: 2,
                rows: vec![v1::LossRow {
                    removed: vec![removed.to_owned()],
                    ..Default::default()
                }],
            })
        };
        let picture = |action: &str, offset: u32, pressures: &[f64]| {
            Event::LoadPicture(v1::LoadPicture {
                action: action.to_owned(),
                offset,
                total: 3,
                pressure_pa: pressures.to_vec(),
                on_plan_pa: vec![0.0; pressures.len()],
                ..Default::default()
            })
        };
        let collected = |more: Vec<Event>| {
            let mut collector = Collector::default();
            let mut events = sample::events();
            let summary = events.pop().unwrap();
            let all = events.into_iter().chain(more).chain([summary]);
            all.into_iter().try_for_each(|event| collector.take(event))?;
            collector.finish(sample::brief())
        };
        let parts = vec![
            loss(0, "a"),
            loss(1, "b"),
            picture("snow", 0, &[1.0, 2.0]),
            picture("snow", 2, &[3.0]),
            picture("lift", 0, &[4.0]),
        ];
        let run = collected(parts).unwrap();
        assert_eq!(run.losses.len(), 2);
        assert_eq!(run.loads.len(), 2);
        assert_eq!(run.loads[0].pressure_pa, [1.0, 2.0, 3.0]);
        assert!(collected(vec![loss(1, "b")]).is_err());
        assert!(collected(vec![picture("snow", 0, &[1.0]), picture("snow", 2, &[3.0])]).is_err());
    }
}
