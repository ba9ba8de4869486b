//! The generated traits, one file a service: decode, compute, stream; nothing else.

mod brief;
mod desk;
mod freeze;
mod motions;
mod run;
mod server;
mod stream;

use std::sync::Arc;

use tokio::sync::watch;
use tokio_util::sync::CancellationToken;
use tracing::Instrument as _;

use crate::admission::{Admission, Place};
use crate::call::Call;
use crate::config::{Fault, Limits};
use crate::pool::{Panicked, Pool, Stop};
use crate::status::Refusal;
use crate::strict::HeldMemory;

pub use brief::BriefApi;
pub use server::ServerApi;

use stream::{Answer, Outbox};

/// What all calls share.
#[derive(Debug)]
pub struct Shared {
    /// Threads that compute.
    pub pool: Arc<Pool>,
    /// The door for calls that compute.
    pub admission: Admission,
    /// Limits that a brief is held against.
    pub limits: Limits,
    /// Once cancelled, running calls end.
    pub closing: CancellationToken,
    /// Calls with a stream.
    pub streams: Streams,
    /// A failure on purpose.
    pub fault: Option<Fault>,
}

/// Counts the calls with a stream.
#[derive(Clone, Debug, Default)]
pub struct Streams(watch::Sender<usize>);

impl Streams {
    fn begin(&self) -> StreamGuard {
        self.0.send_modify(|count| *count += 1);
        StreamGuard(self.clone())
    }

    /// Waits until there is none.
    pub async fn none(&self) {
        // The sender lives as long as `self`.
        let _ = self.0.subscribe().wait_for(|count| *count == 0).await;
    }
}

#[derive(Debug)]
struct StreamGuard(Streams);

impl Drop for StreamGuard {
    fn drop(&mut self) {
        self.0.0.send_modify(|count| *count -= 1);
    }
}

/// A call that has been let in, at work.
#[derive(Debug)]
struct Work {
    shared: Arc<Shared>,
    call: Call,
    stop: Stop,
    /// Held by each task on the pool too, so that a place is free only when nothing computes for it any more.
    place: Arc<Place>,
    waiting: std::time::Duration,
}

impl Work {
    /// Computes on the pool.
    async fn compute<T: Send + 'static>(&self, task: impl FnOnce() -> T + Send + 'static) -> Result<T, Refusal> {
        let place = Arc::clone(&self.place);
        let computed = self.shared.pool.run(move || {
            let value = task();
            drop(place);
            value
        });
        computed.await.map_err(|panicked| self.internal(panicked))
    }

    fn internal(&self, _: Panicked) -> Refusal {
        Refusal::Internal(self.call.id.clone())
    }

    fn fault(&self, fault: &Fault) -> bool {
        self.shared.fault.as_ref() == Some(fault)
    }
}

/// Lets a call in and answers it with a stream; `work` runs until it ends, the client leaves, the deadline passes, or
/// the engine closes.
async fn answer<Message, F>(
    shared: &Arc<Shared>,
    request: (Call, Option<HeldMemory>),
    work: impl FnOnce(Work, Outbox<Message>) -> F,
) -> Result<tonic::Response<Answer<Message>>, tonic::Status>
where
    Message: Send + 'static,
    F: Future<Output = Result<(), Refusal>> + Send + 'static,
{
    let (call, memory) = request;
    let closing = shared.closing.clone();
    let place = tokio::select! {
        place = shared.admission.enter(call.deadline) => place?,
        () = closing.cancelled() => return Err(Refusal::ShuttingDown.into()),
    };
    let stop = Stop::default();
    let asks_to_stop = stop.on_drop();
    let guard = shared.streams.begin();
    let (outbox, answer, ending) = stream::channel();
    let (deadline, arrived, span) = (call.deadline, call.arrived, call.span.clone());
    let work = work(
        Work {
            shared: Arc::clone(shared),
            waiting: call.arrived.elapsed(),
            call,
            stop,
            place: Arc::new(place),
        },
        outbox.clone(),
    );
    let task = async move {
        let _guards = (asks_to_stop, guard, memory);
        let outcome = tokio::select! {
            biased;
            () = outbox.abandoned() => Err(Refusal::ClientLeft),
            () = deadline.passed() => Err(Refusal::DeadlineExceeded),
            () = closing.cancelled() => Err(Refusal::ShuttingDown),
            outcome = work => outcome,
        };
        let reason = outcome
            .as_ref()
            .err()
            .map_or("OK", |refusal| refusal.code_and_reason().1);
        tracing::info!(reason, seconds = arrived.elapsed().as_secs_f64(), "ended");
        ending.end(outcome);
    };
    tokio::spawn(task.instrument(span));
    Ok(tonic::Response::new(answer))
}
