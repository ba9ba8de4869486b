//! Live progress on standard error: a moving line on a terminal, plain lines elsewhere.

use std::io::IsTerminal as _;
use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressStyle};
use ropewalk_api::ropewalk::v1;

use crate::escape;
use crate::number::{order, percent};
use crate::say;
use crate::sheet::way_words;

/// Time between plain lines about the same state.
const QUIET: Duration = Duration::from_secs(1);

/// Shows what the engine is working on.
#[derive(Debug)]
pub(crate) struct Watch {
    bar: Option<ProgressBar>,
    told: Instant,
}

impl Watch {
    pub(crate) fn new() -> Self {
        let bar = std::io::stderr().is_terminal().then(|| {
            let bar = ProgressBar::new(0);
            let style =
                ProgressStyle::with_template("{bar:24} {pos}/{len}  {msg}").expect("the template is well formed");
            bar.set_style(style.progress_chars("━╸ "));
            bar
        });
        Self {
            bar,
            told: Instant::now(),
        }
    }

    /// Takes a sign of life.
    pub(crate) fn progress(&mut self, progress: &v1::Progress) {
        let words = words(progress);
        if let Some(bar) = &self.bar {
            bar.set_length(progress.cases_total.into());
            bar.set_position(progress.cases_done.into());
            bar.set_message(escape::terminal(&words));
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

fn words(progress: &v1::Progress) -> String {
    let place = if progress.worst_node.is_empty() {
        String::new()
    } else {
        format!(" at {}", progress.worst_node)
    };
    format!(
        "{}: {}, load {} %, iteration {}, residual {} N{place}, {} slack",
        progress.case,
        way_words(progress.way()),
        percent(progress.load_factor),
        progress.iteration,
        order(progress.residual_n),
        progress.slack_segments
    )
}
