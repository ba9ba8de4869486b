//! Where tasks on the pool report while they compute, and how long they do.

use std::ops::ControlFlow;
use std::sync::atomic::{AtomicU32, AtomicU64, Ordering};
use std::time::{Duration, Instant};

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics as numerics;
use ropewalk_numerics::brief::Task;
use tokio::sync::watch;

use super::run::Prepared;
use super::stream::Outbox;
use crate::encode;
use crate::pool::{Panicked, Pending, Stop};

/// Shortest time between two reports of progress in a run.
const BETWEEN_PROGRESS: Duration = Duration::from_millis(200);

/// Where tasks on the pool report, and the run picks up what the client shall see.
#[derive(Debug)]
pub(super) struct ProgressDesk {
    latest: watch::Sender<Option<v1::Progress>>,
    began: Instant,
    /// Time from which on the next report is wanted (ms since the beginning).
    wanted_from_ms: AtomicU64,
    done: AtomicU32,
    total: u32,
}

impl ProgressDesk {
    pub(super) fn new(cases: usize) -> Self {
        Self {
            latest: watch::Sender::new(None),
            began: Instant::now(),
            wanted_from_ms: AtomicU64::new(0),
            done: AtomicU32::new(0),
            total: u32::try_from(cases).unwrap_or(u32::MAX),
        }
    }

    /// Called in each iteration, on the pool; says whether to go on.
    pub(super) fn observe(
        &self,
        about: &Prepared,
        task: Task,
        report: &numerics::equilibrium::IterationReport,
        stop: &Stop,
    ) -> ControlFlow<()> {
        self.watch(stop, || encode::progress(&about.plan, task, report))
    }

    /// Says whether to go on, and asks for a report of progress where it is time for one.
    pub(super) fn watch(&self, stop: &Stop, report: impl FnOnce() -> v1::Progress) -> ControlFlow<()> {
        if stop.is_asked() {
            return ControlFlow::Break(());
        }
        let now = u64::try_from(self.began.elapsed().as_millis()).unwrap_or(u64::MAX);
        let wanted = self.wanted_from_ms.load(Ordering::Relaxed);
        let between = u64::try_from(BETWEEN_PROGRESS.as_millis()).unwrap_or(u64::MAX);
        let turn = now >= wanted
            && self
                .wanted_from_ms
                .compare_exchange(wanted, now + between, Ordering::Relaxed, Ordering::Relaxed)
                .is_ok();
        if turn {
            self.latest.send_replace(Some(v1::Progress {
                cases_done: self.done.load(Ordering::Relaxed),
                cases_total: self.total,
                ..report()
            }));
        }
        ControlFlow::Continue(())
    }

    /// A case is done.
    pub(super) fn one_more_done(&self) {
        self.done.fetch_add(1, Ordering::Relaxed);
    }

    /// Waits for an answer and meanwhile passes progress on to a client that keeps up.
    pub(super) async fn relay<T, Message>(
        &self,
        pending: &mut Pending<T>,
        outbox: &Outbox<Message>,
        message: impl Fn(v1::Progress) -> Message,
    ) -> Result<T, Panicked> {
        self.relay_until(pending.answer(), outbox, message).await
    }

    /// Waits for something and meanwhile passes progress on.
    pub(super) async fn relay_until<T, Message>(
        &self,
        awaited: impl Future<Output = T>,
        outbox: &Outbox<Message>,
        message: impl Fn(v1::Progress) -> Message,
    ) -> T {
        let mut latest = self.latest.subscribe();
        let mut awaited = std::pin::pin!(awaited);
        loop {
            tokio::select! {
                biased;
                answer = &mut awaited => return answer,
                Ok(()) = latest.changed() => {
                    let progress = latest.borrow_and_update().clone();
                    if let Some(progress) = progress {
                        outbox.send_if_idle(message(progress));
                    }
                }
            }
        }
    }
}

/// Sums the time spent computing (µs).
#[derive(Debug, Default)]
pub(super) struct Clock(AtomicU64);

impl Clock {
    pub(super) fn time<T>(&self, task: impl FnOnce() -> T) -> T {
        let began = Instant::now();
        let value = task();
        let spent = u64::try_from(began.elapsed().as_micros()).unwrap_or(u64::MAX);
        self.0.fetch_add(spent, Ordering::Relaxed);
        value
    }

    pub(super) fn seconds(&self) -> f64 {
        Duration::from_micros(self.0.load(Ordering::Relaxed)).as_secs_f64()
    }
}
