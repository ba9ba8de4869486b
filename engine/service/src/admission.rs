//! How many calls may compute: so many running, so many waiting, then a prompt refusal with a time to come back.

use std::sync::Arc;
use std::time::Duration;

use tokio::sync::{OwnedSemaphorePermit, Semaphore};
use tokio::time::Instant;

use crate::deadline::Deadline;
use crate::status::Refusal;

/// Shortest and longest time after which a refused client is asked to come back.
const COME_BACK: (Duration, Duration) = (Duration::from_millis(500), Duration::from_secs(30));

/// The door.
#[derive(Debug)]
pub struct Admission {
    running: Arc<Semaphore>,
    waiting: Semaphore,
    places: u32,
    /// Time that calls hold their place, smoothed (ms).
    held_ms: Arc<std::sync::atomic::AtomicU64>,
}

/// A place among the running calls; given back when dropped.
#[derive(Debug)]
pub struct Place {
    _permit: OwnedSemaphorePermit,
    since: Instant,
    held_ms: Arc<std::sync::atomic::AtomicU64>,
}

impl Admission {
    /// A door for `running` calls at a time and `waiting` more before it.
    #[must_use]
    pub fn new(running: usize, waiting: usize) -> Self {
        Self {
            running: Arc::new(Semaphore::new(running)),
            waiting: Semaphore::new(waiting),
            places: u32::try_from(running).unwrap_or(u32::MAX),
            held_ms: Arc::default(),
        }
    }

    /// Waits for a place, in the order of arrival.
    ///
    /// # Errors
    /// [`Refusal::ServerFull`] at once if too many wait already; [`Refusal::DeadlineExceeded`].
    pub async fn enter(&self, deadline: Deadline) -> Result<Place, Refusal> {
        // The semaphore is fair: a permit is free only while nobody waits for it.
        if let Ok(permit) = Arc::clone(&self.running).try_acquire_owned() {
            return Ok(self.place(permit));
        }
        let _turn = self.waiting.try_acquire().map_err(|_| Refusal::ServerFull {
            come_back: self.come_back(),
        })?;
        tokio::select! {
            biased;
            () = deadline.passed() => Err(Refusal::DeadlineExceeded),
            permit = Arc::clone(&self.running).acquire_owned() => Ok(self.place(permit.expect("never closed"))),
        }
    }

    fn place(&self, permit: OwnedSemaphorePermit) -> Place {
        Place {
            _permit: permit,
            since: Instant::now(),
            held_ms: Arc::clone(&self.held_ms),
        }
    }

    /// A guess of when a place gets free: the usual time that one is held, over the places.
    fn come_back(&self) -> Duration {
        let held = Duration::from_millis(self.held_ms.load(std::sync::atomic::Ordering::Relaxed));
        (held / self.places).clamp(COME_BACK.0, COME_BACK.1)
    }
}

impl Drop for Place {
    fn drop(&mut self) {
        let held = u64::try_from(self.since.elapsed().as_millis()).unwrap_or(u64::MAX);
        let smooth = |before: u64| Some(before - before / 8 + held / 8);
        let relaxed = std::sync::atomic::Ordering::Relaxed;
        // The closure always gives a value.
        let _ = self.held_ms.fetch_update(relaxed, relaxed, smooth);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn deadline(timeout: &str) -> Deadline {
        let mut headers = http::HeaderMap::new();
        headers.insert("grpc-timeout", timeout.parse().expect("a header"));
        Deadline::read(&headers, None, Instant::now()).expect("a timeout")
    }

    #[tokio::test]
    async fn so_many_run_so_many_wait_then_a_refusal() {
        let door = Admission::new(1, 1);
        let never = deadline("9H");
        let first = door.enter(never).await.expect("a free place");
        let (second, third) = tokio::join!(
            async {
                let place = door.enter(never).await;
                assert!(place.is_ok());
                drop(place);
            },
            async {
                let third = door.enter(never).await;
                drop(first);
                third
            }
        );
        let () = second;
        assert!(matches!(third, Err(Refusal::ServerFull { .. })));
        assert!(door.enter(never).await.is_ok());
    }

    #[tokio::test]
    async fn waiting_ends_at_the_deadline_and_leaves_no_trace() {
        let door = Admission::new(1, 1);
        let place = door.enter(deadline("9H")).await.expect("a free place");
        assert!(matches!(
            door.enter(deadline("50m")).await,
            Err(Refusal::DeadlineExceeded)
        ));
        assert!(matches!(
            door.enter(deadline("50m")).await,
            Err(Refusal::DeadlineExceeded)
        ));
        drop(place);
        assert!(door.enter(deadline("50m")).await.is_ok());
    }
}
