//! Every setting, its default and its check; read once, before anything binds.

use std::net::SocketAddr;
use std::num::NonZeroUsize;
use std::str::FromStr;
use std::time::Duration;

use clap::{Parser, ValueEnum};
use thiserror::Error;

/// Largest message that the engine sends (bytes); the encoders keep well below it.
pub const RESPONSE_BYTES: u64 = 1 << 20;

/// Environment variable without which faults are refused.
pub const FAULTS_ALLOWED: &str = "ROPEWALK_FAULTS";

/// The settings of the engine. Each may be given as a flag or in the environment; a flag wins.
#[derive(Clone, Debug, Parser)]
#[command(
    name = "ropewalk-engine",
    version,
    about = "Computes cable nets: answers ropewalk.v1 over gRPC and gRPC-Web"
)]
pub struct Config {
    /// Address to listen on; port 0 takes a free one
    #[arg(long, env = "ROPEWALK_LISTEN", default_value = "127.0.0.1:7410")]
    pub listen: SocketAddr,
    /// Threads that compute; by default one for each core
    #[arg(long, env = "ROPEWALK_THREADS")]
    pub threads: Option<usize>,
    /// Calls that may run at a time
    #[arg(long, env = "ROPEWALK_RUNNING", default_value_t = 4)]
    pub running: usize,
    /// Calls that may wait for their turn; further ones are refused at once
    #[arg(long, env = "ROPEWALK_WAITING", default_value_t = 16)]
    pub waiting: usize,
    /// Largest request (MiB)
    #[arg(long, env = "ROPEWALK_REQUEST_LIMIT_MIB", default_value_t = 64)]
    pub request_limit_mib: usize,
    /// Most bytes of requests held in memory at a time, as a multiple of the largest request
    #[arg(long, env = "ROPEWALK_REQUESTS_HELD", default_value_t = 4)]
    pub requests_held: usize,
    /// Longest time to receive a request (s)
    #[arg(long, env = "ROPEWALK_RECEIVE_SECONDS", default_value_t = 60)]
    pub receive_seconds: u64,
    /// Longest time for a call (s); 0: no limit
    #[arg(long, env = "ROPEWALK_MAX_CALL_SECONDS", default_value_t = 3600)]
    pub max_call_seconds: u64,
    /// Time that running calls get to finish when the engine is told to stop (s)
    #[arg(long, env = "ROPEWALK_DRAIN_SECONDS", default_value_t = 20)]
    pub drain_seconds: u64,
    /// Most nodes of a net
    #[arg(long, env = "ROPEWALK_MAX_NODES", default_value_t = 200_000)]
    pub max_nodes: u32,
    /// Most segments of a net
    #[arg(long, env = "ROPEWALK_MAX_SEGMENTS", default_value_t = 400_000)]
    pub max_segments: u32,
    /// Most cases of a run
    #[arg(long, env = "ROPEWALK_MAX_CASES", default_value_t = 20_000)]
    pub max_cases: u32,
    /// Time between signs of life asked of a quiet client (s)
    #[arg(long, env = "ROPEWALK_KEEPALIVE_SECONDS", default_value_t = 20)]
    pub keepalive_seconds: u64,
    /// Time to answer them (s), after which the client counts as gone
    #[arg(long, env = "ROPEWALK_KEEPALIVE_TIMEOUT_SECONDS", default_value_t = 10)]
    pub keepalive_timeout_seconds: u64,
    /// Web origins that may call from a browser, separated by commas; `*`: all
    #[arg(long, env = "ROPEWALK_WEB_ORIGINS", default_value = "*", value_delimiter = ',')]
    pub web_origins: Vec<String>,
    /// Form of the log on standard error
    #[arg(long, env = "ROPEWALK_LOG_FORMAT", value_enum, default_value_t = LogFormat::Text)]
    pub log_format: LogFormat,
    /// What is logged, such as `info` or `ropewalk_service=debug`
    #[arg(long, env = "ROPEWALK_LOG", default_value = "info")]
    pub log: String,
    /// Print the bound address as one line of JSON to standard output
    #[arg(long, env = "ROPEWALK_ANNOUNCE")]
    pub announce: bool,
    /// Makes the engine fail on purpose, for tests of what happens then; refused unless `ROPEWALK_FAULTS=1`
    #[arg(long, env = "ROPEWALK_FAULT", hide = true)]
    pub fault: Option<Fault>,
}

/// Form of the log.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum LogFormat {
    /// For eyes.
    Text,
    /// One JSON object a line.
    Json,
}

/// A failure on purpose.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Fault {
    /// Panics while a brief is read.
    PanicInReading,
    /// Panics while the reference state is searched for.
    PanicInReference,
    /// Panics in the case with this id.
    PanicInCase(String),
    /// Panics in the motion with this id.
    PanicInMotion(String),
}

impl FromStr for Fault {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, Self::Err> {
        match text.split_once('=') {
            None if text == "panic-in-reading" => Ok(Self::PanicInReading),
            None if text == "panic-in-reference" => Ok(Self::PanicInReference),
            Some(("panic-in-case", id)) if !id.is_empty() => Ok(Self::PanicInCase(id.to_owned())),
            Some(("panic-in-motion", id)) if !id.is_empty() => Ok(Self::PanicInMotion(id.to_owned())),
            _ => Err(
                "known faults: panic-in-reading, panic-in-reference, panic-in-case=ID, panic-in-motion=ID".to_owned(),
            ),
        }
    }
}

/// Limits that a request is held against.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Limits {
    /// Largest request (bytes).
    pub request_bytes: usize,
    /// Nodes of a net.
    pub nodes: u32,
    /// Segments of a net.
    pub segments: u32,
    /// Cases of a run.
    pub cases: u32,
}

/// A setting that cannot be.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
pub enum ConfigError {
    /// A number outside of its range.
    #[error("--{setting} {value}: must be {least} to {most}")]
    OutOfRange {
        /// The flag, without dashes.
        setting: &'static str,
        /// What was given.
        value: u64,
        /// The least allowed.
        least: u64,
        /// The most allowed.
        most: u64,
    },
    /// A web origin that is neither `*` nor `scheme://host`.
    #[error("--web-origins {0:?}: give `*`, or origins such as https://office.example")]
    WebOrigin(String),
    /// A log filter that cannot be read.
    #[error("--log {0:?}: give a level such as `info`, or target=level pairs separated by commas")]
    LogFilter(String),
    /// A fault without leave.
    #[error("--fault makes the engine fail on purpose and is for tests only: set {FAULTS_ALLOWED}=1 if that is meant")]
    FaultWithoutLeave,
}

impl Config {
    /// The defaults, whatever the environment says, on any free port of this machine; for an engine inside another
    /// program.
    #[must_use]
    pub fn embedded() -> Self {
        Self {
            listen: SocketAddr::from(([127, 0, 0, 1], 0)),
            threads: None,
            running: 4,
            waiting: 16,
            request_limit_mib: 64,
            requests_held: 4,
            receive_seconds: 60,
            max_call_seconds: 0,
            drain_seconds: 0,
            max_nodes: 200_000,
            max_segments: 400_000,
            max_cases: 20_000,
            keepalive_seconds: 20,
            keepalive_timeout_seconds: 10,
            web_origins: Vec::new(),
            log_format: LogFormat::Text,
            log: "info".to_owned(),
            announce: false,
            fault: None,
        }
    }

    /// Holds every setting against its range.
    ///
    /// # Errors
    /// [`ConfigError`] for the first setting that cannot be.
    pub fn check(&self) -> Result<(), ConfigError> {
        const DAY: u64 = 86_400;
        let ranges: [(&'static str, u64, u64, u64); 13] = [
            ("threads", self.threads() as u64, 1, 1024),
            ("running", self.running as u64, 1, 100_000),
            ("waiting", self.waiting as u64, 0, 100_000),
            // A frame of gRPC has its length in four bytes.
            ("request-limit-mib", self.request_limit_mib as u64, 1, 2048),
            ("requests-held", self.requests_held as u64, 1, 1000),
            ("receive-seconds", self.receive_seconds, 1, DAY),
            ("max-call-seconds", self.max_call_seconds, 0, 365 * DAY),
            ("drain-seconds", self.drain_seconds, 0, DAY),
            ("max-nodes", self.max_nodes.into(), 1, 100_000_000),
            ("max-segments", self.max_segments.into(), 1, 100_000_000),
            ("max-cases", self.max_cases.into(), 1, 100_000_000),
            ("keepalive-seconds", self.keepalive_seconds, 1, DAY),
            ("keepalive-timeout-seconds", self.keepalive_timeout_seconds, 1, DAY),
        ];
        for (setting, value, least, most) in ranges {
            if !(least..=most).contains(&value) {
                return Err(ConfigError::OutOfRange {
                    setting,
                    value,
                    least,
                    most,
                });
            }
        }
        for origin in &self.web_origins {
            let named = origin.contains("://") && http::HeaderValue::from_str(origin).is_ok();
            if origin != "*" && !named {
                return Err(ConfigError::WebOrigin(origin.clone()));
            }
        }
        if tracing_subscriber::EnvFilter::try_new(&self.log).is_err() {
            return Err(ConfigError::LogFilter(self.log.clone()));
        }
        if self.fault.is_some() && std::env::var(FAULTS_ALLOWED).as_deref() != Ok("1") {
            return Err(ConfigError::FaultWithoutLeave);
        }
        Ok(())
    }

    /// Threads that compute.
    #[must_use]
    pub fn threads(&self) -> usize {
        self.threads
            .unwrap_or_else(|| std::thread::available_parallelism().map_or(1, NonZeroUsize::get))
    }

    /// Limits that a request is held against.
    #[must_use]
    pub fn limits(&self) -> Limits {
        Limits {
            request_bytes: self.request_limit_mib << 20,
            nodes: self.max_nodes,
            segments: self.max_segments,
            cases: self.max_cases,
        }
    }

    /// Longest time for a call.
    #[must_use]
    pub fn max_call(&self) -> Option<Duration> {
        (self.max_call_seconds > 0).then(|| Duration::from_secs(self.max_call_seconds))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_defaults_of_the_flags_can_be() {
        let config = Config::try_parse_from(["ropewalk-engine"]).expect("no flag is needed");
        assert_eq!(config.check(), Ok(()));
        assert_eq!(Config::embedded().check(), Ok(()));
    }

    #[test]
    fn what_cannot_be_is_named() {
        let told = |change: fn(&mut Config)| {
            let mut config = Config::embedded();
            change(&mut config);
            config.check().expect_err("cannot be").to_string()
        };
        assert_eq!(told(|c| c.threads = Some(0)), "--threads 0: must be 1 to 1024");
        assert_eq!(
            told(|c| c.request_limit_mib = 4096),
            "--request-limit-mib 4096: must be 1 to 2048"
        );
        assert!(told(|c| c.web_origins = vec!["office".to_owned()]).contains("\"office\""));
        assert!(told(|c| c.log = "a=b=c".to_owned()).contains("a=b=c"));
    }

    #[test]
    fn faults_are_read_by_name() {
        assert_eq!("panic-in-case=snow".parse(), Ok(Fault::PanicInCase("snow".to_owned())));
        assert!("panic-in-case=".parse::<Fault>().is_err());
        assert!("panic".parse::<Fault>().is_err());
    }
}
