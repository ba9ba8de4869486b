//! Live progress on standard error: a moving line on a terminal, plain lines elsewhere.

use std::io::IsTerminal as _;
use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressStyle};
use ropewalk_api::ropewalk::v1;

use crate::escape;
use crate::number::{order, percent, three};
use crate::run::MotionRun;
use crate::say;
use crate::sheet::{motion_outcome, way_words};

/// Time between plain lines about the same state.
const QUIET: Duration = Duration::from_secs(1);

/// Parts of the moving line while time runs in a motion.
const PARTS: u64 = 1000;

/// Shows what the engine is working on.
#[derive(Debug)]
pub(crate) struct Watch {
    bar: Option<ProgressBar>,
    told: Instant,
    /// Whether the moving line tells of time in a motion, and not of cases.
    in_motion: bool,
}

impl Watch {
    pub(crate) fn new() -> Self {
        let bar = std::io::stderr().is_terminal().then(|| {
            let bar = ProgressBar::new(0);
            bar.set_style(style("{bar:24} {pos}/{len}  {msg}"));
            bar
        });
        Self {
            bar,
            told: Instant::now(),
            in_motion: false,
        }
    }

    /// Takes a sign of life.
    pub(crate) fn progress(&mut self, progress: &v1::Progress) {
        let words = words(progress);
        if let Some(bar) = &self.bar {
            let in_motion = time_runs(progress);
            if in_motion != self.in_motion {
                self.in_motion = in_motion;
                bar.set_style(style(if in_motion {
                    "{bar:24} {percent:>3} %  {msg}"
                } else {
                    "{bar:24} {pos}/{len}  {msg}"
                }));
            }
            let (done, total) = if in_motion {
                (parts(progress), PARTS)
            } else {
                (progress.cases_done.into(), progress.cases_total.into())
            };
            bar.set_length(total);
            bar.set_position(done);
            bar.set_message(escape::terminal(&words));
        } else if self.told.elapsed() >= QUIET && time_runs(progress) {
            self.told = Instant::now();
            let share = percent(progress.simulated_s / progress.duration_s);
            say::err(&format!("{words} ({share} %)"));
        } else if self.told.elapsed() >= QUIET {
            self.told = Instant::now();
            say::err(&format!("{words} ({}/{})", progress.cases_done, progress.cases_total));
        }
    }

    /// Takes the end of a state.
    pub(crate) fn closed(&mut self, end: &v1::CaseSummary, done: usize) {
        let outcome = match end.outcome() {
            v1::CaseOutcome::Answered => "in balance".to_owned(),
            _ => match &end.failure {
                Some(failure) => format!("no answer: {}", failure.message),
                None => "no answer".to_owned(),
            },
        };
        let mut line = format!("{}: {outcome}, {} iterations", end.case, end.iterations);
        let way = way_words(end.way());
        if !way.is_empty() {
            line.push_str(&format!(" by {way}"));
        }
        match &self.bar {
            Some(bar) => {
                bar.inc_length(u64::from(bar.length().is_none_or(|length| length < as_count(done))));
                bar.set_position(as_count(done));
            }
            None => {
                self.told = Instant::now();
                say::err(&line);
            }
        }
    }

    /// Takes the end of a motion.
    pub(crate) fn motion_ended(&mut self, motion: &MotionRun) {
        if self.bar.is_none() {
            self.told = Instant::now();
            say::err(&format!("{}: {}", motion.id, motion_outcome(motion)));
        }
    }

    /// Clears the moving line.
    pub(crate) fn done(&self) {
        if let Some(bar) = &self.bar {
            bar.finish_and_clear();
        }
    }
}

fn as_count(count: usize) -> u64 {
    count.try_into().expect("a count fits 64 bits")
}

fn style(template: &str) -> ProgressStyle {
    let style = ProgressStyle::with_template(template).expect("the template is well formed");
    style.progress_chars("━╸ ")
}

/// Whether a motion is at work and has left the states behind that it starts from and is compared with.
fn time_runs(progress: &v1::Progress) -> bool {
    !progress.motion.is_empty() && progress.case.is_empty() && progress.duration_s > 0.0
}

/// How far a motion has come, in parts of the whole.
fn parts(progress: &v1::Progress) -> u64 {
    #[allow(clippy::cast_precision_loss, reason = "a thousand")]
    let parts = (progress.simulated_s / progress.duration_s).clamp(0.0, 1.0) * PARTS as f64;
    #[allow(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "between 0 and a thousand"
    )]
    let parts = parts as u64;
    parts
}

/// A guess of time for eyes: in seconds, minutes or hours.
fn about(seconds: f64) -> String {
    match seconds {
        s if s < 1.0 => "less than 1 s".to_owned(),
        s if s < 99.5 => format!("{s:.0} s"),
        s if s < 99.5 * 60.0 => format!("{:.0} min", s / 60.0),
        s => format!("{} h", three(s / 3600.0)),
    }
}

fn words(progress: &v1::Progress) -> String {
    if time_runs(progress) {
        let left = progress
            .left_s
            .filter(|left| left.is_finite() && *left >= 0.0)
            .map_or(String::new(), |left| format!(", about {} left", about(left)));
        return format!(
            "{}: {} s of {} s{left}",
            progress.motion,
            three(progress.simulated_s),
            three(progress.duration_s),
        );
    }
    let motion = if progress.motion.is_empty() {
        String::new()
    } else {
        format!("{}: ", progress.motion)
    };
    let place = if progress.worst_node.is_empty() {
        String::new()
    } else {
        format!(" at {}", progress.worst_node)
    };
    format!(
        "{motion}{}: {}, load {} %, iteration {}, residual {} N{place}, {} slack",
        progress.case,
        way_words(progress.way()),
        percent(progress.load_factor),
        progress.iteration,
        order(progress.residual_n),
        progress.slack_segments
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    fn at(simulated_s: f64, left_s: Option<f64>) -> v1::Progress {
        v1::Progress {
            motion: "gust".to_owned(),
            simulated_s,
            duration_s: 20.0,
            left_s,
            ..Default::default()
        }
    }

    #[test]
    fn a_motion_tells_time_done_and_time_left() {
        let progress = at(3.2, Some(410.0));
        assert_eq!(words(&progress), "gust: 3.20 s of 20.0 s, about 7 min left");
        assert_eq!(parts(&progress), 160);
        assert_eq!(words(&at(0.0, None)), "gust: 0 s of 20.0 s");
        assert_eq!(about(0.2), "less than 1 s");
        assert_eq!(about(7200.0), "2.00 h");
    }

    #[test]
    fn the_state_that_a_motion_starts_from_is_told_as_a_state() {
        let progress = v1::Progress {
            case: "storm".to_owned(),
            way: v1::SolutionWay::Newton.into(),
            ..at(0.0, None)
        };
        assert!(!time_runs(&progress));
        assert!(words(&progress).starts_with("gust: storm: "), "{}", words(&progress));
    }
}
