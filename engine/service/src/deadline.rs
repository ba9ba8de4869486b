//! How long a call may take: read from its head, kept to the end of its stream.
//!
//! The transport applies `grpc-timeout` until the head of the response only; a stream would run on.

use std::time::Duration;

use http::HeaderMap;
use tokio::time::Instant;

/// The header that carries the client's wish.
const GRPC_TIMEOUT: &str = "grpc-timeout";

/// When a call has to end, if ever.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Deadline(Option<Instant>);

/// A `grpc-timeout` that is not one to eight digits and a unit.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct UnreadableTimeout;

impl Deadline {
    /// The earlier of what the client asks for and `longest`, counted from `now`.
    ///
    /// # Errors
    /// [`UnreadableTimeout`]: a client that believes to have a deadline must not run without one.
    pub fn read(headers: &HeaderMap, longest: Option<Duration>, now: Instant) -> Result<Self, UnreadableTimeout> {
        let asked = headers
            .get(GRPC_TIMEOUT)
            .map(|value| value.to_str().ok().and_then(timeout).ok_or(UnreadableTimeout))
            .transpose()?;
        let allowed = match (asked, longest) {
            (Some(asked), Some(longest)) => Some(asked.min(longest)),
            (asked, longest) => asked.or(longest),
        };
        // A time beyond what the clock can count is no deadline.
        Ok(Self(allowed.and_then(|allowed| now.checked_add(allowed))))
    }

    /// Waits until the deadline has passed; for ever where there is none.
    pub async fn passed(self) {
        match self.0 {
            Some(at) => tokio::time::sleep_until(at).await,
            None => std::future::pending().await,
        }
    }
}

/// `TimeoutValue TimeoutUnit` of the gRPC protocol over HTTP/2.
fn timeout(text: &str) -> Option<Duration> {
    let (digits, unit) = text.split_at_checked(text.len().checked_sub(1)?)?;
    if !(1..=8).contains(&digits.len()) || !digits.bytes().all(|b| b.is_ascii_digit()) {
        return None;
    }
    let count: u64 = digits.parse().ok()?;
    match unit {
        "H" => Some(Duration::from_secs(count * 3600)),
        "M" => Some(Duration::from_secs(count * 60)),
        "S" => Some(Duration::from_secs(count)),
        "m" => Some(Duration::from_millis(count)),
        "u" => Some(Duration::from_micros(count)),
        "n" => Some(Duration::from_nanos(count)),
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_unit_is_read_and_nothing_else() {
        assert_eq!(timeout("2H"), Some(Duration::from_secs(7200)));
        assert_eq!(timeout("3M"), Some(Duration::from_secs(180)));
        assert_eq!(timeout("99999999S"), Some(Duration::from_secs(99_999_999)));
        assert_eq!(timeout("250m"), Some(Duration::from_millis(250)));
        assert_eq!(timeout("7u"), Some(Duration::from_micros(7)));
        assert_eq!(timeout("8n"), Some(Duration::from_nanos(8)));
        for text in ["", "S", "1", "1s", "-1S", "+1S", "123456789S", "1.5S", "1µ", "µ"] {
            assert_eq!(timeout(text), None, "{text:?}");
        }
    }

    #[test]
    fn the_earlier_one_counts() {
        let now = Instant::now();
        let mut headers = HeaderMap::new();
        let second = Duration::from_secs(1);
        assert_eq!(Deadline::read(&headers, None, now), Ok(Deadline(None)));
        assert_eq!(
            Deadline::read(&headers, Some(second), now),
            Ok(Deadline(Some(now + second)))
        );
        headers.insert(GRPC_TIMEOUT, "500m".parse().expect("a header"));
        assert_eq!(
            Deadline::read(&headers, Some(second), now),
            Ok(Deadline(Some(now + second / 2)))
        );
        headers.insert(GRPC_TIMEOUT, "soon".parse().expect("a header"));
        assert_eq!(Deadline::read(&headers, None, now), Err(UnreadableTimeout));
    }
}
