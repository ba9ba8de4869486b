//! The stream of an answer: bounded, so that a slow reader costs no memory, and always with an end of its own.

use std::pin::Pin;
use std::task::{Context, Poll, ready};

use tokio::sync::{mpsc, oneshot};
use tokio_stream::Stream;
use tonic::Status;

use crate::status::Refusal;

/// Messages that may lie ready for the transport: enough that a small run rarely waits for its reader. Each is below
/// 256 KiB.
const READY: usize = 16;

/// Where messages go in.
#[derive(Debug)]
pub(super) struct Outbox<Message>(mpsc::Sender<Message>);

/// How the stream ends, told apart from the messages: it needs no room among them.
#[derive(Debug)]
pub(super) struct Ending(oneshot::Sender<Result<(), Refusal>>);

/// Where messages come out: all of them, then the ending.
#[derive(Debug)]
pub struct Answer<Message> {
    messages: mpsc::Receiver<Message>,
    ending: Option<oneshot::Receiver<Result<(), Refusal>>>,
}

pub(super) fn channel<Message>() -> (Outbox<Message>, Answer<Message>, Ending) {
    let (outbox, messages) = mpsc::channel(READY);
    let (end, ending) = oneshot::channel();
    let answer = Answer {
        messages,
        ending: Some(ending),
    };
    (Outbox(outbox), answer, Ending(end))
}

impl<Message> Outbox<Message> {
    /// Sends messages, each as soon as the client has taken earlier ones.
    pub(super) async fn send(&self, messages: impl IntoIterator<Item = Message>) -> Result<(), Refusal> {
        for message in messages {
            self.0.send(message).await.map_err(|_| Refusal::ClientLeft)?;
        }
        Ok(())
    }

    /// Sends a message that a slow reader may miss.
    pub(super) fn send_if_idle(&self, message: Message) {
        if self.0.capacity() == self.0.max_capacity() {
            // Full or abandoned: missed.
            let _ = self.0.try_send(message);
        }
    }

    /// Waits until nobody takes messages any more.
    pub(super) async fn abandoned(&self) {
        self.0.closed().await;
    }
}

impl<Message> Clone for Outbox<Message> {
    fn clone(&self) -> Self {
        Self(self.0.clone())
    }
}

impl Ending {
    pub(super) fn end(self, outcome: Result<(), Refusal>) {
        // Nobody listens any more: the client has left.
        let _ = self.0.send(outcome);
    }
}

impl<Message> Stream for Answer<Message> {
    type Item = Result<Message, Status>;

    fn poll_next(mut self: Pin<&mut Self>, cx: &mut Context<'_>) -> Poll<Option<Self::Item>> {
        if let Some(message) = ready!(self.messages.poll_recv(cx)) {
            return Poll::Ready(Some(Ok(message)));
        }
        let Some(ending) = &mut self.ending else {
            return Poll::Ready(None);
        };
        let ended = ready!(Pin::new(ending).poll(cx));
        self.ending = None;
        // No ending at all: the task of the call broke.
        let outcome = ended.unwrap_or_else(|_| Err(Refusal::Internal(String::new())));
        Poll::Ready(outcome.err().map(|refusal| Err(refusal.into())))
    }
}

#[cfg(test)]
mod tests {
    use tokio_stream::StreamExt as _;

    use super::*;

    #[tokio::test]
    async fn the_ending_comes_last_and_needs_no_room() {
        let (outbox, mut answer, ending) = channel();
        outbox.send(0..READY).await.expect("there is room");
        outbox.send_if_idle(99);
        ending.end(Err(Refusal::DeadlineExceeded));
        drop(outbox);
        for expected in 0..READY {
            assert_eq!(answer.next().await.expect("a message").expect("a message"), expected);
        }
        let end = answer.next().await.expect("an end").expect_err("a status");
        assert_eq!(end.code(), tonic::Code::DeadlineExceeded);
        assert!(answer.next().await.is_none());
    }

    #[tokio::test]
    async fn a_task_that_breaks_is_told() {
        let (outbox, mut answer, ending) = channel::<()>();
        drop((outbox, ending));
        let end = answer.next().await.expect("an end").expect_err("a status");
        assert_eq!(end.code(), tonic::Code::Internal);
    }
}
