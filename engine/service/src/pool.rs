//! The threads that compute. Nothing else computes: the threads of the runtime only move bytes.

use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use tokio::sync::oneshot;

/// Threads of their own for computing.
#[derive(Debug)]
pub struct Pool {
    threads: rayon::ThreadPool,
}

/// The task broke a promise of our own code. What was computing lives on.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Panicked;

/// The answer of a task that has been handed in.
#[derive(Debug)]
pub struct Pending<T>(oneshot::Receiver<Result<T, Panicked>>);

impl Pool {
    /// Starts `threads` threads.
    ///
    /// # Errors
    /// If the system gives no more threads.
    pub fn new(threads: usize) -> Result<Self, rayon::ThreadPoolBuildError> {
        let threads = rayon::ThreadPoolBuilder::new()
            .num_threads(threads)
            .thread_name(|index| format!("compute-{index}"))
            .build()?;
        Ok(Self { threads })
    }

    /// How many tasks can be computed at a time.
    #[must_use]
    pub fn width(&self) -> usize {
        self.threads.current_num_threads()
    }

    /// Hands a task in; first come, first served. It runs to its end whether or not anybody waits for it.
    pub fn start<T: Send + 'static>(&self, task: impl FnOnce() -> T + Send + 'static) -> Pending<T> {
        let (answer, pending) = oneshot::channel();
        self.threads.spawn_fifo(move || {
            // The task owns what it works on, so nothing half-done can be seen from outside.
            let outcome = catch_unwind(AssertUnwindSafe(task)).map_err(|_| Panicked);
            // Nobody waits any more: the client has left.
            let _ = answer.send(outcome);
        });
        Pending(pending)
    }

    /// Hands a task in and waits for its answer.
    ///
    /// # Errors
    /// [`Panicked`] if it broke.
    pub async fn run<T: Send + 'static>(&self, task: impl FnOnce() -> T + Send + 'static) -> Result<T, Panicked> {
        self.start(task).answer().await
    }
}

impl<T> Pending<T> {
    /// Waits for the answer; may be called again if the wait was given up.
    ///
    /// # Errors
    /// [`Panicked`] if the task broke.
    pub async fn answer(&mut self) -> Result<T, Panicked> {
        (&mut self.0).await.unwrap_or(Err(Panicked))
    }
}

/// Tells tasks on the pool that nobody wants their answer any more.
#[derive(Clone, Debug, Default)]
pub struct Stop(Arc<AtomicBool>);

impl Stop {
    /// Whether to stop.
    #[must_use]
    pub fn is_asked(&self) -> bool {
        self.0.load(Ordering::Relaxed)
    }

    /// Asks to stop as soon as the guard is dropped.
    #[must_use]
    pub fn on_drop(&self) -> StopOnDrop {
        StopOnDrop(self.clone())
    }
}

/// Asks to stop when dropped.
#[derive(Debug)]
pub struct StopOnDrop(Stop);

impl Drop for StopOnDrop {
    fn drop(&mut self) {
        self.0.0.store(true, Ordering::Relaxed);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[tokio::test]
    async fn a_panic_stays_in_its_task() {
        let pool = Pool::new(1).expect("a thread");
        let index = 7;
        assert_eq!(pool.run(move || [1, 2][index]).await, Err(Panicked));
        assert_eq!(pool.run(|| 5).await, Ok(5));
    }

    #[tokio::test]
    async fn dropping_the_guard_stops_the_task() {
        let pool = Pool::new(1).expect("a thread");
        let stop = Stop::default();
        let seen = stop.clone();
        let mut pending = pool.start(move || {
            while !seen.is_asked() {
                std::hint::spin_loop();
            }
        });
        drop(stop.on_drop());
        assert_eq!(pending.answer().await, Ok(()));
    }
}
