//! What is known of a call from its head: its id, its deadline, the span that its events are logged in.

use std::future::Future;
use std::hash::{BuildHasher as _, RandomState};
use std::pin::Pin;
use std::sync::atomic::{AtomicU64, Ordering};
use std::task::{Context, Poll};
use std::time::Duration;

use http::{HeaderMap, HeaderValue, Request, Response};
use tokio::time::Instant;
use tokio_util::sync::CancellationToken;
use tonic::Status;
use tonic::body::Body;
use tower::{Layer, Service};
use tracing::{Instrument as _, Span};

use crate::deadline::Deadline;
use crate::status::Refusal;

/// Metadata by which a client names a call, and by which it gets the name back.
pub const REQUEST_ID: &str = "x-request-id";

/// Calls of this package are ours; health and reflection pass.
const PACKAGE_PATH: &str = "/ropewalk.v1.";

/// A call, as far as its head tells.
#[derive(Clone, Debug)]
pub struct Call {
    /// The client's name for it, or one that the engine made up.
    pub id: String,
    /// When it has to end.
    pub deadline: Deadline,
    /// When it arrived.
    pub arrived: Instant,
    /// What its events are logged in.
    pub span: Span,
}

/// Makes [`Calls`] services.
#[derive(Clone, Debug)]
pub struct CallLayer {
    longest: Option<Duration>,
    draining: CancellationToken,
}

impl CallLayer {
    /// Calls of at most `longest`; once `draining` is cancelled, none.
    #[must_use]
    pub fn new(longest: Option<Duration>, draining: CancellationToken) -> Self {
        Self { longest, draining }
    }

    fn begin(&self, request: &Request<Body>) -> Result<Call, Refusal> {
        if self.draining.is_cancelled() {
            return Err(Refusal::ShuttingDown);
        }
        let arrived = Instant::now();
        let headers = request.headers();
        let deadline = Deadline::read(headers, self.longest, arrived).map_err(|_| Refusal::UnreadableTimeout)?;
        let id = request_id(headers);
        let method = request.uri().path();
        let trace = headers
            .get("traceparent")
            .and_then(|value| value.to_str().ok())
            .and_then(trace_parent);
        let (trace_id, parent_id) = trace.unzip();
        let span = tracing::info_span!("call", method, request_id = id, trace_id, parent_id);
        Ok(Call {
            id,
            deadline,
            arrived,
            span,
        })
    }
}

impl<S> Layer<S> for CallLayer {
    type Service = Calls<S>;

    fn layer(&self, inner: S) -> Self::Service {
        Calls {
            layer: self.clone(),
            inner,
        }
    }
}

/// The service behind finds a [`Call`] in the extensions of each request of our package.
#[derive(Clone, Debug)]
pub struct Calls<S> {
    layer: CallLayer,
    inner: S,
}

impl<S> Service<Request<Body>> for Calls<S>
where
    S: Service<Request<Body>, Response = Response<Body>>,
    S::Future: Send + 'static,
    S::Error: Send + 'static,
{
    type Response = Response<Body>;
    type Error = S::Error;
    type Future = Pin<Box<dyn Future<Output = Result<Self::Response, Self::Error>> + Send>>;

    fn poll_ready(&mut self, cx: &mut Context<'_>) -> Poll<Result<(), Self::Error>> {
        self.inner.poll_ready(cx)
    }

    fn call(&mut self, mut request: Request<Body>) -> Self::Future {
        if !request.uri().path().starts_with(PACKAGE_PATH) {
            return Box::pin(self.inner.call(request));
        }
        let call = match self.layer.begin(&request) {
            Ok(call) => call,
            Err(refusal) => return Box::pin(async { Ok(Status::from(refusal).into_http()) }),
        };
        let (span, id) = (call.span.clone(), call.id.clone());
        request.extensions_mut().insert(call);
        let answer = self.inner.call(request);
        let answer = async move {
            let mut response = answer.await?;
            if let Some(status) = response.headers().get("grpc-status") {
                tracing::info!(code = ?status, "ended without a stream");
            }
            if let Ok(id) = HeaderValue::from_str(&id) {
                response.headers_mut().insert(REQUEST_ID, id);
            }
            Ok(response)
        };
        Box::pin(answer.instrument(span))
    }
}

/// The client's id for the call if it is short and printable, otherwise a new one.
fn request_id(headers: &HeaderMap) -> String {
    let given = headers.get(REQUEST_ID).and_then(|value| value.to_str().ok());
    match given {
        Some(id) if (1..=128).contains(&id.len()) => id.to_owned(),
        _ => new_id(),
    }
}

/// Sixteen hexadecimal digits that tell calls apart; not a secret.
fn new_id() -> String {
    static COUNT: AtomicU64 = AtomicU64::new(0);
    let count = COUNT.fetch_add(1, Ordering::Relaxed);
    format!("{:016x}", RandomState::new().hash_one(count))
}

/// Trace and parent of a `traceparent` of version 00 (W3C Trace Context).
fn trace_parent(text: &str) -> Option<(&str, &str)> {
    let lower_hex = |part: &str| part.bytes().all(|b| matches!(b, b'0'..=b'9' | b'a'..=b'f'));
    let given = |part: &str| lower_hex(part) && part.bytes().any(|b| b != b'0');
    let parts: Vec<&str> = text.split('-').collect();
    match parts[..] {
        ["00", trace, parent, flags]
            if (trace.len(), parent.len(), flags.len()) == (32, 16, 2)
                && given(trace)
                && given(parent)
                && lower_hex(flags) =>
        {
            Some((trace, parent))
        }
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_trace_parent_is_taken_as_the_standard_has_it() {
        // Example of W3C Trace Context, section 3.2.2.
        let text = "00-4bf92f3577b34da6a3ce929d0e0e4736-00f067aa0ba902b7-01";
        assert_eq!(
            trace_parent(text),
            Some(("4bf92f3577b34da6a3ce929d0e0e4736", "00f067aa0ba902b7"))
        );
        for bad in [
            "",
            "00-4BF92F3577B34DA6A3CE929D0E0E4736-00f067aa0ba902b7-01",
            "00-00000000000000000000000000000000-00f067aa0ba902b7-01",
            "00-4bf92f3577b34da6a3ce929d0e0e4736-0000000000000000-01",
            "00-4bf92f3577b34da6a3ce929d0e0e4736-00f067aa0ba902b7",
            "00-4bf92f3577b34da6a3ce929d0e0e4736-00f067aa0ba902b7-0g",
        ] {
            assert_eq!(trace_parent(bad), None, "{bad:?}");
        }
    }

    #[test]
    fn ids_are_kept_or_made_up() {
        let mut headers = HeaderMap::new();
        assert_eq!(request_id(&headers).len(), 16);
        assert_ne!(request_id(&headers), request_id(&headers));
        headers.insert(REQUEST_ID, "office-7".parse().expect("a header"));
        assert_eq!(request_id(&headers), "office-7");
        headers.insert(REQUEST_ID, "x".repeat(129).parse().expect("a header"));
        assert_eq!(request_id(&headers).len(), 16);
    }
}
