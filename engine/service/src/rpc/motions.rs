//! Motions of a run: followed side by side, told one after the other.
//!
//! A motion is computed in short jobs. Its messages go into a channel of its own with little room; where that is full, no job
//! is handed in before the client has taken some, so that a slow reader holds no thread.

use std::collections::VecDeque;
use std::sync::Arc;
use std::time::{Duration, Instant};

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{MotionBegun, ReferenceOutcome};
use ropewalk_numerics::motion::transient;
use tokio::sync::mpsc;
use tracing::Instrument as _;

use super::Shared;
use super::desk::{Clock, ProgressDesk};
use super::run::{Prepared, Solver, break_on_purpose, progress};
use super::stream::Outbox;
use crate::admission::Place;
use crate::config::Fault;
use crate::encode;
use crate::pool::{Panicked, Pending, Stop};
use crate::status::Refusal;

/// Messages of a motion that may lie ready while those of an earlier one are told. Each is below 256 KiB.
const AHEAD: usize = 32;
/// A job hands over what it has once it has computed this long, or
const JOB: Duration = Duration::from_millis(100);
/// once it has this many messages.
const MESSAGES_OF_JOB: usize = 8;

/// What comes of a motion on its way.
enum Told {
    Message(Box<v1::RunResponse>),
    End(encode::NotedMotion),
}

/// A motion between two jobs, or what is left of it at its end.
type Standing = Result<Box<Following>, encode::NotedMotion>;

/// A motion that goes on.
struct Following {
    begun: MotionBegun,
    /// Time computed so far.
    spent: Duration,
    /// Segments that were slack in the last frame.
    slack: usize,
}

impl Solver<'_> {
    /// As many motions at a time as there are threads.
    pub(super) async fn follow_in_order(
        &self,
        motions: &[usize],
        tally: &mut encode::Tally,
        outbox: &Outbox<v1::RunResponse>,
    ) -> Result<(), Refusal> {
        let width = self.work.shared.pool.width();
        let mut next = motions.iter().copied();
        let mut at_work = VecDeque::with_capacity(width);
        loop {
            let free = width - at_work.len();
            at_work.extend(next.by_ref().take(free).map(|motion| (motion, self.follow(motion))));
            let Some((motion, mut told)) = at_work.pop_front() else {
                return Ok(());
            };
            loop {
                match self.desk.relay_until(told.recv(), outbox, progress).await {
                    Some(Told::Message(message)) => outbox.send([*message]).await?,
                    Some(Told::End(noted)) => {
                        tally.add_motion(motion, &noted);
                        break;
                    }
                    // The task of the motion broke.
                    None => return Err(self.work.internal(Panicked)),
                }
            }
        }
    }

    fn follow(&self, motion: usize) -> mpsc::Receiver<Told> {
        let name = &self.prepared.plan.brief().motions[motion].name;
        let follower = Follower {
            motion,
            breaks: matches!(&self.work.shared.fault, Some(Fault::PanicInMotion(id)) if id == name),
            shared: Arc::clone(&self.work.shared),
            stop: self.work.stop.clone(),
            place: Arc::clone(&self.work.place),
            prepared: Arc::clone(self.prepared),
            reference: Arc::clone(self.reference),
            desk: Arc::clone(self.desk),
            clock: Arc::clone(self.clock),
        };
        let (tell, told) = mpsc::channel(AHEAD);
        tokio::spawn(follower.follow(tell).in_current_span());
        told
    }
}

/// What the jobs of one motion share.
#[derive(Clone)]
struct Follower {
    motion: usize,
    /// Whether to fail on purpose.
    breaks: bool,
    shared: Arc<Shared>,
    stop: Stop,
    #[expect(dead_code, reason = "held until nothing computes any more")]
    place: Arc<Place>,
    prepared: Arc<Prepared>,
    reference: Arc<ReferenceOutcome>,
    desk: Arc<ProgressDesk>,
    clock: Arc<Clock>,
}

impl Follower {
    /// Hands in job after job; ends where nobody listens any more.
    async fn follow(self, tell: mpsc::Sender<Told>) {
        let mut job = self.start(None);
        loop {
            let (messages, standing) = match job.answer().await {
                Ok(answer) => answer,
                Err(Panicked) => {
                    tracing::error!(
                        position = self.motion,
                        "the engine failed in a motion; the others go on"
                    );
                    let (messages, noted) = encode::motion_broke(&self.prepared.work, &self.prepared.plan, self.motion);
                    (messages, Err(noted))
                }
            };
            for message in messages {
                if tell.send(Told::Message(Box::new(message))).await.is_err() {
                    return;
                }
            }
            match standing {
                Ok(following) => job = self.start(Some(following)),
                Err(noted) => {
                    // Nobody listens any more: the client has left.
                    let _ = tell.send(Told::End(noted)).await;
                    return;
                }
            }
        }
    }

    /// Hands in the next job.
    fn start(&self, standing: Option<Box<Following>>) -> Pending<(Vec<v1::RunResponse>, Standing)> {
        let follower = self.clone();
        self.shared.pool.start(move || {
            break_on_purpose(follower.breaks);
            follower.clock.time(|| match standing {
                None => follower.begin(),
                Some(following) => follower.go_on(following),
            })
        })
    }

    fn begin(&self) -> (Vec<v1::RunResponse>, Standing) {
        let Prepared { work, plan } = &*self.prepared;
        let observe = &mut |state, report: &_| {
            (self.desk).watch(&self.stop, || {
                encode::motion_state_progress(plan, self.motion, state, report)
            })
        };
        match plan.motion(&self.reference, self.motion, observe) {
            Ok(begun) => {
                let messages = encode::motion_head(work, plan, self.motion, &begun);
                let following = Following {
                    begun,
                    spent: Duration::ZERO,
                    slack: 0,
                };
                (messages, Ok(Box::new(following)))
            }
            Err(why) => {
                let (messages, noted) = encode::motion_not_begun(work, plan, self.motion, &why);
                (messages, Err(noted))
            }
        }
    }

    fn go_on(&self, mut following: Box<Following>) -> (Vec<v1::RunResponse>, Standing) {
        let Prepared { work, plan } = &*self.prepared;
        let (began, spent) = (Instant::now(), following.spent);
        let is_over = || began.elapsed() >= JOB;
        let mut messages = Vec::new();
        while messages.len() < MESSAGES_OF_JOB && !is_over() {
            let slack = following.slack;
            let observe = &mut |report: transient::Progress<'_>| {
                (self.desk).watch(&self.stop, || {
                    encode::motion_progress(plan, self.motion, &report, spent + began.elapsed(), slack)
                })
            };
            match following.begun.go_on(&mut || is_over(), observe) {
                transient::Went::Frame(frame) => {
                    following.slack = frame.slack;
                    messages.extend(encode::motion_frame(plan, self.motion, &frame));
                }
                transient::Went::Paused => {}
                // Nobody is there any more: spectra of what was sampled would only take time.
                transient::Went::Ended if self.stop.is_asked() => {
                    return (Vec::new(), Err(encode::NotedMotion::default()));
                }
                transient::Went::Ended => {
                    let (end, noted) = encode::motion_end(work, plan, self.motion, following.begun);
                    messages.extend(end);
                    return (messages, Err(noted));
                }
            }
        }
        following.spent += began.elapsed();
        (messages, Ok(following))
    }
}
