//! Reads a request as a whole, before the generated decoder does, and refuses what the contract does not have.
//!
//! The generated decoder answers INTERNAL to bytes that are not protobuf, and drops fields that it does not know. In
//! this layer both are errors of the request, with their place.

use std::future::Future;
use std::pin::Pin;
use std::sync::Arc;
use std::task::{Context, Poll};
use std::time::Duration;

use bytes::{Buf as _, Bytes, BytesMut};
use http::{Request, Response};
use http_body::Body as _;
use http_body_util::{BodyExt as _, Full};
use tokio::sync::{OwnedSemaphorePermit, Semaphore};
use tonic::Status;
use tonic::body::Body;
use tower::{Layer, Service};

use crate::call::Call;
use crate::pool::Pool;
use crate::schema::Schema;
use crate::status::Refusal;
use crate::wire;

/// Flag and length before each message.
const PREFIX_BYTES: usize = 5;

/// Up to here a message is read where it arrives; larger ones would hold up the runtime and are read on the pool.
const SMALL_BYTES: usize = 256 << 10;

/// Unit of the memory that requests share (bytes).
const PAGE_BYTES: usize = 64 << 10;

/// Time after which a client is asked to come back if too many large requests are held.
const COME_BACK: Duration = Duration::from_secs(2);

/// Makes [`Strict`] services.
#[derive(Clone, Debug)]
pub struct StrictLayer(Arc<Rules>);

#[derive(Debug)]
struct Rules {
    schema: Schema,
    pool: Arc<Pool>,
    /// Largest message (bytes).
    limit: usize,
    /// Longest time to receive one.
    receive: Duration,
    /// Memory left for messages (pages).
    memory: Arc<Semaphore>,
}

impl StrictLayer {
    /// Messages up to `limit` bytes that arrive within `receive`; of the largest ones `held` at a time.
    #[must_use]
    pub fn new(pool: Arc<Pool>, limit: usize, held: usize, receive: Duration) -> Self {
        let pages = (pages(limit) as usize).saturating_mul(held).min(Semaphore::MAX_PERMITS);
        Self(Arc::new(Rules {
            schema: Schema::of_the_contract(),
            pool,
            limit,
            receive,
            memory: Arc::new(Semaphore::new(pages)),
        }))
    }
}

impl<S> Layer<S> for StrictLayer {
    type Service = Strict<S>;

    fn layer(&self, inner: S) -> Self::Service {
        Strict {
            rules: Arc::clone(&self.0),
            inner,
        }
    }
}

/// The service behind sees only requests that the contract has.
#[derive(Clone, Debug)]
pub struct Strict<S> {
    rules: Arc<Rules>,
    inner: S,
}

/// Memory that the message of this call takes; travels with the request.
#[derive(Clone, Debug)]
pub struct HeldMemory(#[allow(dead_code, reason = "given back when dropped")] Arc<OwnedSemaphorePermit>);

impl<S> Service<Request<Body>> for Strict<S>
where
    S: Service<Request<Body>, Response = Response<Body>> + Clone + Send + 'static,
    S::Future: Send,
    S::Error: Send,
{
    type Response = Response<Body>;
    type Error = S::Error;
    type Future = Pin<Box<dyn Future<Output = Result<Self::Response, Self::Error>> + Send>>;

    fn poll_ready(&mut self, cx: &mut Context<'_>) -> Poll<Result<(), Self::Error>> {
        self.inner.poll_ready(cx)
    }

    fn call(&mut self, request: Request<Body>) -> Self::Future {
        // The clone takes the place of the service that was made ready.
        let clone = self.inner.clone();
        let mut inner = std::mem::replace(&mut self.inner, clone);
        let Some(message) = self.rules.schema.request(request.uri().path()) else {
            return Box::pin(inner.call(request));
        };
        let rules = Arc::clone(&self.rules);
        Box::pin(async move {
            match rules.read(request, message).await {
                Ok(request) => inner.call(request).await,
                Err(refusal) => Ok(Status::from(refusal).into_http()),
            }
        })
    }
}

impl Rules {
    async fn read(self: &Arc<Self>, request: Request<Body>, message: usize) -> Result<Request<Body>, Refusal> {
        let (mut parts, body) = request.into_parts();
        if let Some(encoding) = parts.headers.get("grpc-encoding")
            && encoding != "identity"
        {
            return Err(Refusal::Compressed);
        }
        let call = parts.extensions.get::<Call>().cloned();
        let deadline = async {
            match &call {
                Some(call) => call.deadline.passed().await,
                None => std::future::pending().await,
            }
        };
        let (frame, memory) = tokio::select! {
            biased;
            frame = self.receive(body) => frame?,
            () = deadline => return Err(Refusal::DeadlineExceeded),
            () = tokio::time::sleep(self.receive) => return Err(Refusal::TooSlow(self.receive.as_secs())),
        };
        let read = if frame.len() <= SMALL_BYTES {
            wire::read(&self.schema, message, &frame[PREFIX_BYTES..])
        } else {
            let (rules, frame) = (Arc::clone(self), frame.clone());
            self.pool
                .run(move || wire::read(&rules.schema, message, &frame[PREFIX_BYTES..]))
                .await
                .map_err(|_| Refusal::Internal(call.map(|call| call.id).unwrap_or_default()))?
        };
        let unknown = read.map_err(|malformed| Refusal::Malformed(malformed.to_string()))?;
        if unknown.total > 0 {
            return Err(Refusal::UnknownFields {
                paths: unknown.paths,
                total: unknown.total,
            });
        }
        parts.extensions.insert(HeldMemory(Arc::new(memory)));
        Ok(Request::from_parts(parts, Body::new(Full::new(frame))))
    }

    /// The one frame of a request, prefix included, with the memory that it takes.
    async fn receive(&self, mut body: Body) -> Result<(Bytes, OwnedSemaphorePermit), Refusal> {
        let mut received = BytesMut::new();
        let mut expected = None;
        while let Some(frame) = body.frame().await {
            let frame = frame.map_err(|_| Refusal::Malformed("the request breaks off".to_owned()))?;
            let Ok(data) = frame.into_data() else {
                // Trailers say nothing in a request.
                continue;
            };
            received.extend_from_slice(&data);
            if expected.is_none() && received.len() >= PREFIX_BYTES {
                expected = Some(self.admit(&received[..PREFIX_BYTES])?);
            }
            if let Some((length, _)) = &expected
                && received.len() > PREFIX_BYTES + length
            {
                let what = "the request goes on after its message; the length before it may be wrong";
                return Err(Refusal::Malformed(what.to_owned()));
            }
            if body.is_end_stream() {
                break;
            }
        }
        let what = match expected {
            Some((length, memory)) if received.len() == PREFIX_BYTES + length => {
                return Ok((received.freeze(), memory));
            }
            Some((length, _)) => {
                let there = received.len() - PREFIX_BYTES;
                format!("the message has {there} bytes where the length before it says {length}")
            }
            None => "there is no message".to_owned(),
        };
        Err(Refusal::Malformed(what))
    }

    /// The length of the message that follows `prefix`, if there is room for it.
    fn admit(&self, mut prefix: &[u8]) -> Result<(usize, OwnedSemaphorePermit), Refusal> {
        match prefix.get_u8() {
            0 => {}
            1 => return Err(Refusal::Compressed),
            flag => {
                return Err(Refusal::Malformed(format!(
                    "the flag before the message is {flag}; it must be 0"
                )));
            }
        }
        let length = prefix.get_u32() as usize;
        if length > self.limit {
            return Err(Refusal::TooLarge { limit: self.limit });
        }
        let memory = Arc::clone(&self.memory)
            .try_acquire_many_owned(pages(length))
            .map_err(|_| Refusal::ServerFull { come_back: COME_BACK })?;
        Ok((length, memory))
    }
}

/// Memory that a message takes. Small ones count for one page, so that their number is bounded too.
fn pages(length: usize) -> u32 {
    u32::try_from(length / PAGE_BYTES + 1).unwrap_or(u32::MAX)
}
