//! Motions: their parts put together, frames whole, and what does not fit refused.

use std::collections::{BTreeMap, BTreeSet};

use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::motion_part::Part;

use super::collect::{Oddity, odd, size};
use super::{Column, Run};
use crate::escape::free_file_name;

/// What was told of a motion.
#[derive(Clone, Debug, Default, PartialEq)]
pub(crate) struct MotionRun {
    pub(crate) id: String,
    /// A name for files that no other motion of the run has.
    pub(crate) name: String,
    /// None where it could not begin.
    pub(crate) begin: Option<v1::MotionBegin>,
    /// What frames show, its parts joined.
    pub(crate) shown: v1::MotionShown,
    pub(crate) waves: Vec<v1::RopeWaves>,
    /// Moments in order of time, each whole: one entry of `ropes` for each shown rope.
    pub(crate) frames: Vec<v1::MotionFrame>,
    pub(crate) events: Vec<v1::MotionEvent>,
    pub(crate) spectra: Vec<v1::MotionSpectrum>,
    /// There in every motion of a [`Run`].
    pub(crate) end: Option<v1::MotionEnd>,
    /// Arrays over all steps.
    pub(crate) columns: BTreeMap<String, Column>,
}

impl MotionRun {
    /// The key of its arrays.
    pub(crate) fn key(&self) -> String {
        format!("motion/{}", self.id)
    }

    /// Whether it was followed to its end.
    pub(crate) fn finished(&self) -> bool {
        self.outcome() == v1::MotionOutcome::Finished
    }

    pub(crate) fn outcome(&self) -> v1::MotionOutcome {
        self.end
            .as_ref()
            .map_or(v1::MotionOutcome::Unspecified, v1::MotionEnd::outcome)
    }

    /// Times of the frames (s).
    pub(crate) fn times(&self) -> Vec<f64> {
        self.frames.iter().map(|frame| frame.time_s).collect()
    }

    /// A watched quantity over the frames, in its unit.
    pub(crate) fn watched(&self, number: usize) -> Vec<f64> {
        self.frames.iter().map(|frame| frame.watched[number]).collect()
    }

    /// Amplitudes of the spectrum of a watched quantity, in its unit, from frequency 0 on; none where there is none.
    pub(crate) fn amplitudes(&self, number: usize) -> Option<Vec<f64>> {
        let column = self.columns.get("spectrum_amplitude")?;
        (number < column.components).then(|| {
            let lines = column.values.chunks_exact(column.components);
            lines.map(|line| line[number]).collect()
        })
    }

    /// The spectrum of a watched quantity.
    pub(crate) fn spectrum(&self, number: usize) -> Option<&v1::MotionSpectrum> {
        let watched = self.shown.watched.get(number)?;
        self.spectra.iter().find(|spectrum| spectrum.watched == watched.id)
    }

    /// Speeds of waves on a rope.
    pub(crate) fn waves_of(&self, cable: &str) -> Option<&v1::RopeWaves> {
        self.waves.iter().find(|waves| waves.cable == cable)
    }

    fn odd(&self, what: impl std::fmt::Display) -> Oddity {
        odd(format!("motion \"{}\" {what}", self.id))
    }

    fn take(&mut self, part: Part) -> Result<(), Oddity> {
        if self.end.is_some() {
            return Err(self.odd("goes on after its end"));
        }
        match part {
            Part::Begin(_) if self.begin.is_some() => return Err(self.odd("begins twice")),
            Part::Begin(begin) => self.begin = Some(begin),
            Part::End(end) => {
                self.close_frame()?;
                self.close(&end)?;
                self.end = Some(end);
            }
            _ if self.begin.is_none() => return Err(self.odd("is told of before it begins")),
            Part::Shown(_) | Part::Waves(_) if !self.frames.is_empty() => {
                return Err(self.odd("tells after its first frame what frames show"));
            }
            Part::Shown(more) => {
                self.shown.nodes.extend(more.nodes);
                for rope in more.ropes {
                    self.take_rope(rope)?;
                }
                self.shown.watched.extend(more.watched);
            }
            Part::Waves(more) => self.waves.extend(more.ropes),
            Part::Frame(frame) => self.take_frame(frame)?,
            Part::Events(more) => {
                self.close_frame()?;
                self.events.extend(more.events);
            }
            Part::Spectrum(spectrum) => {
                self.close_frame()?;
                if self.shown.watched.iter().all(|watched| watched.id != spectrum.watched) {
                    return Err(self.odd(format!(
                        "has a spectrum of \"{}\", which nobody watches",
                        spectrum.watched
                    )));
                }
                self.spectra.push(spectrum);
            }
        }
        Ok(())
    }

    /// A shown rope, or a part that goes on with the last one.
    fn take_rope(&mut self, more: v1::ShownRope) -> Result<(), Oddity> {
        if more.from == 0 {
            self.shown.ropes.push(more);
            return Ok(());
        }
        let goes_on =
            |known: &&mut v1::ShownRope| known.cable == more.cable && known.material_m.len() == more.from as usize;
        let Some(known) = self.shown.ropes.last_mut().filter(goes_on) else {
            return Err(self.odd(format!("goes on with rope \"{}\", which it has not begun", more.cable)));
        };
        known.material_m.extend(more.material_m);
        known.nodes.extend(more.nodes);
        Ok(())
    }

    fn take_frame(&mut self, frame: v1::MotionFrame) -> Result<(), Oddity> {
        if !self.events.is_empty() || !self.spectra.is_empty() {
            return Err(self.odd("has a frame after its last one"));
        }
        if frame.continues {
            if self.frames.is_empty() {
                return Err(self.odd("goes on with a frame that has not begun"));
            }
        } else {
            self.close_frame()?;
            let after = self
                .frames
                .last()
                .is_none_or(|last| last.step < frame.step && last.time_s < frame.time_s);
            if !after || !frame.time_s.is_finite() {
                return Err(self.odd(format!("has a frame out of order, at step {}", frame.step)));
            }
            let ropes = (0..).take(self.shown.ropes.len()).map(|rope| v1::RopeFrame {
                rope,
                ..Default::default()
            });
            self.frames.push(v1::MotionFrame {
                step: frame.step,
                time_s: frame.time_s,
                energy: frame.energy,
                slack_segments: frame.slack_segments,
                watched: frame.watched,
                ropes: ropes.collect(),
                ..Default::default()
            });
        }
        let misfit = self.odd(format!(
            "has a part of a rope that does not fit, at step {}",
            frame.step
        ));
        let open = self.frames.last_mut().expect("there is one");
        open.positions_m.extend(frame.positions_m);
        open.velocities_m_per_s.extend(frame.velocities_m_per_s);
        for part in frame.ropes {
            let Some(rope) = open.ropes.get_mut(size(part.rope)) else {
                return Err(misfit);
            };
            let points = part.positions_m.len() / 3;
            let fits = rope.positions_m.len() == 3 * size(part.from)
                && part.positions_m.len() == 3 * points
                && part.velocities_m_per_s.len() == 3 * points
                && part.stretch.len() == part.tension_n.len()
                && rope.tension_n.len() == size(part.from);
            if !fits {
                return Err(misfit);
            }
            rope.positions_m.extend(part.positions_m);
            rope.velocities_m_per_s.extend(part.velocities_m_per_s);
            rope.stretch.extend(part.stretch);
            rope.tension_n.extend(part.tension_n);
        }
        Ok(())
    }

    /// Holds the last frame against what frames show.
    fn close_frame(&self) -> Result<(), Oddity> {
        let Some(frame) = self.frames.last() else {
            return Ok(());
        };
        let nodes = 3 * self.shown.nodes.len();
        let plain = frame.energy.is_some()
            && frame.watched.len() == self.shown.watched.len()
            && frame.positions_m.len() == nodes
            && frame.velocities_m_per_s.len() == nodes;
        let ropes = self.shown.ropes.iter().zip(&frame.ropes).all(|(shown, rope)| {
            let points = shown.material_m.len();
            rope.positions_m.len() == 3 * points
                && rope.velocities_m_per_s.len() == 3 * points
                && rope.tension_n.len() + 1 == points
                && rope.stretch.len() + 1 == points
        });
        if plain && ropes {
            Ok(())
        } else {
            Err(self.odd(format!("has a frame that is not whole, at step {}", frame.step)))
        }
    }

    fn close(&self, end: &v1::MotionEnd) -> Result<(), Oddity> {
        let shown = &self.shown.ropes;
        if shown.iter().any(|rope| rope.nodes.len() != rope.material_m.len()) {
            return Err(self.odd("shows a rope whose points and nodes differ in number"));
        }
        match (&self.begin, end.outcome()) {
            (_, v1::MotionOutcome::Unspecified) => Err(self.odd("ends without saying how")),
            (None, v1::MotionOutcome::Finished | v1::MotionOutcome::Stopped) => {
                Err(self.odd("ends without a beginning"))
            }
            (Some(begin), v1::MotionOutcome::Finished) if begin.frames != as_count(self.frames.len()) => {
                Err(self.odd(format!("has {} of {} frames", self.frames.len(), begin.frames)))
            }
            _ => Ok(()),
        }
    }

    /// Holds spectra against their array.
    pub(super) fn check_spectra(&self) -> Result<(), Oddity> {
        let watched = self.shown.watched.len();
        match self.columns.get("spectrum_amplitude") {
            Some(column) if column.components != watched => {
                Err(self.odd("has spectra of other quantities than it watches"))
            }
            _ => Ok(()),
        }
    }
}

/// Motions as they come.
#[derive(Debug, Default)]
pub(super) struct Motions {
    list: Vec<MotionRun>,
}

impl Motions {
    /// Takes a part of a motion.
    ///
    /// # Errors
    /// [`Oddity`] if it does not fit what came before.
    pub(super) fn take(&mut self, part: v1::MotionPart) -> Result<(), Oddity> {
        // A part of a later contract has no meaning here.
        let Some(what) = part.part else { return Ok(()) };
        let at = self.list.iter().position(|known| known.id == part.motion);
        let is_last = at.is_none_or(|at| at + 1 == self.list.len());
        let at = match at {
            Some(at) if is_last => at,
            Some(at) => return Err(self.list[at].odd("is told of in pieces")),
            None => {
                if let Some(open) = self.list.last().filter(|last| last.end.is_none()) {
                    return Err(open.odd("has not ended when another one begins"));
                }
                self.list.push(MotionRun {
                    id: part.motion,
                    ..Default::default()
                });
                self.list.len() - 1
            }
        };
        self.list[at].take(what)
    }

    /// The last motion, if it has ended.
    pub(super) fn last_ended(&self) -> Option<&MotionRun> {
        self.list.last().filter(|motion| motion.end.is_some())
    }

    /// Leaves out one that has not ended.
    pub(super) fn cut(&mut self) {
        self.list.retain(|motion| motion.end.is_some());
    }

    /// Keys of the arrays of all motions.
    pub(super) fn keys(&self) -> Vec<String> {
        self.list.iter().map(MotionRun::key).collect()
    }

    /// All of them, with names for their files.
    ///
    /// # Errors
    /// [`Oddity`] if the last one has not ended.
    pub(super) fn finish(self) -> Result<Vec<MotionRun>, Oddity> {
        if let Some(open) = self.list.iter().find(|motion| motion.end.is_none()) {
            return Err(open.odd("has no end"));
        }
        let mut taken = BTreeSet::new();
        let named = self.list.into_iter().map(|mut motion| {
            motion.name = free_file_name(&motion.id, &mut taken);
            motion
        });
        Ok(named.collect())
    }
}

impl Run {
    /// Natural frequencies of a state that vibrate (Hz), each with the number of its mode, from 1.
    pub(crate) fn natural_frequencies(&self, state: &str) -> Vec<(u32, f64)> {
        let modes = self.modes_of(state);
        let vibrates = modes
            .iter()
            .filter(|mode| mode.kind() == v1::ModeKind::Vibrates && mode.frequency_hz > 0.0);
        vibrates.map(|mode| (mode.number + 1, mode.frequency_hz)).collect()
    }
}

fn as_count(count: usize) -> u64 {
    count.try_into().expect("a count fits 64 bits")
}

#[cfg(test)]
mod tests {
    use ropewalk_api::ropewalk::v1::run_response::Event;

    use super::super::{Collector, motion_sample, record};
    use super::*;

    #[test]
    fn parts_of_frames_and_lists_are_joined() {
        let run = motion_sample::run_named("gust");
        let [motion] = run.motions.as_slice() else {
            panic!("{} motions", run.motions.len());
        };
        assert_eq!(
            (motion.frames.len(), motion.events.len(), motion.spectra.len()),
            (201, 25, 3)
        );
        assert!(motion.frames.iter().all(|frame| frame.ropes[0].tension_n.len() == 40));
        // Frame 1 came in two messages: its points are those of the solution all the same.
        for (at, place) in (0..).zip(motion.frames[1].ropes[0].positions_m.chunks_exact(3)) {
            let material = motion_sample::PIECE_M * f64::from(at);
            assert_eq!(
                place,
                [
                    f64::from(at),
                    0.0,
                    motion_sample::height(material, motion_sample::STEP_S)
                ]
            );
        }
        assert_eq!(motion.shown.ropes[0].nodes.len(), 41);
        assert_eq!(motion.shown.ropes[0].material_m.len(), 41);
        assert_eq!(motion.amplitudes(1).unwrap().len(), 80);
        assert_eq!(run.summary.motions, Some(v1::Share { count: 1, of: 1 }));
    }

    #[test]
    fn a_record_keeps_motions() {
        let run = motion_sample::run_named("gust");
        let again = record::read(&run.record).unwrap();
        assert_eq!(again.motions, run.motions);
        // What has not ended when the stream breaks is left out, and the rest is told.
        let mut collector = Collector::default();
        let events = motion_sample::events("gust");
        let half = events.len() / 2;
        events
            .into_iter()
            .take(half)
            .try_for_each(|event| collector.take(event))
            .unwrap();
        let cut = collector.finish_broken(motion_sample::brief("gust"), "cut").unwrap();
        assert!(cut.states.len() == 1 && cut.motions.is_empty());
    }

    fn refused(change: impl Fn(usize, &mut v1::MotionPart) -> bool) -> String {
        let mut number = 0;
        let events = motion_sample::events("gust")
            .into_iter()
            .filter_map(|event| match event {
                Event::Motion(mut part) => {
                    number += 1;
                    change(number - 1, &mut part).then_some(Event::Motion(part))
                }
                other => Some(other),
            });
        motion_sample::collected(events.collect()).expect_err("nobody noticed")
    }

    fn frame_of(part: &mut v1::MotionPart) -> Option<&mut v1::MotionFrame> {
        match part.part.as_mut() {
            Some(Part::Frame(frame)) => Some(frame),
            _ => None,
        }
    }

    #[test]
    fn broken_motions_are_refused() {
        // Parts: beginning, shown twice, waves, frames (the second of them in two messages), events, spectra, end.
        let twice = refused(|at, part| {
            if at == 1 {
                part.part = Some(Part::Begin(v1::MotionBegin::default()));
            }
            true
        });
        assert!(twice.contains("begins twice"), "{twice}");
        assert!(refused(|at, _| at != 0).contains("before it begins"));
        assert!(refused(|at, _| at != 10).contains("200 of 201 frames"));
        let second_half = refused(|at, part| at != 6 || frame_of(part).is_none_or(|frame| !frame.continues));
        assert!(second_half.contains("not whole, at step 10"), "{second_half}");
        let order = refused(|_, part| {
            if let Some(frame) = frame_of(part).filter(|frame| frame.step == 500) {
                frame.time_s = 0.01;
            }
            true
        });
        assert!(order.contains("out of order, at step 500"), "{order}");
        type Spoil = fn(&mut v1::MotionFrame);
        let short: [Spoil; 5] = [
            |frame| _ = frame.watched.pop(),
            |frame| _ = frame.positions_m.pop(),
            |frame| frame.velocities_m_per_s.push(0.0),
            |frame| _ = frame.ropes.pop(),
            |frame| frame.energy = None,
        ];
        for spoil in short {
            let told = refused(|_, part| {
                if let Some(frame) = frame_of(part).filter(|frame| frame.step == 700) {
                    spoil(frame);
                }
                true
            });
            assert!(told.contains("not whole, at step 700"), "{told}");
        }
        let parts: [Spoil; 3] = [
            |frame| frame.ropes[0].rope = 1,
            |frame| frame.ropes[0].from = 3,
            |frame| _ = frame.ropes[0].stretch.pop(),
        ];
        for spoil in parts {
            let told = refused(|_, part| {
                if let Some(frame) = frame_of(part).filter(|frame| frame.step == 700) {
                    spoil(frame);
                }
                true
            });
            assert!(told.contains("does not fit, at step 700"), "{told}");
        }
        let no_end = refused(|_, part| !matches!(part.part, Some(Part::End(_))));
        assert!(no_end.contains("has no end"), "{no_end}");
        let stranger = refused(|_, part| {
            if let Some(Part::Spectrum(spectrum)) = part.part.as_mut() {
                spectrum.watched = "other".to_owned();
            }
            true
        });
        assert!(stranger.contains("which nobody watches"), "{stranger}");
    }

    #[test]
    fn nothing_comes_after_the_end_and_motions_come_in_one_piece() {
        let mut events = motion_sample::events("gust");
        let summary = events.pop().unwrap();
        let frame = events
            .iter()
            .rev()
            .find(|event| matches!(event, Event::Motion(part) if matches!(part.part, Some(Part::Frame(_)))));
        let late = frame.unwrap().clone();
        events.extend([late, summary]);
        assert!(
            motion_sample::collected(events)
                .unwrap_err()
                .contains("goes on after its end")
        );
        let mut events = motion_sample::events("gust");
        let other = Event::Motion(v1::MotionPart {
            motion: "other".to_owned(),
            part: Some(Part::Begin(v1::MotionBegin::default())),
        });
        let middle = events.len() / 2;
        events.insert(middle, other);
        let told = motion_sample::collected(events).unwrap_err();
        assert!(told.contains("has not ended when another one begins"), "{told}");
    }

    #[test]
    fn a_motion_that_cannot_begin_has_an_end_only() {
        let mut events = motion_sample::events("gust");
        events.retain(|event| {
            !matches!(event, Event::Motion(_))
                && !matches!(event, Event::Columns(part) if part.case.starts_with("motion/"))
        });
        let end = Event::Motion(v1::MotionPart {
            motion: "gust".to_owned(),
            part: Some(Part::End(v1::MotionEnd {
                outcome: v1::MotionOutcome::NotBegun.into(),
                ..Default::default()
            })),
        });
        events.insert(events.len() - 1, end);
        let run = motion_sample::collected(events).unwrap();
        assert!(run.motions[0].begin.is_none() && !run.motions[0].finished());
    }
}
