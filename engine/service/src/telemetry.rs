//! The log: structured, on standard error, without the content of briefs.

use tracing_subscriber::EnvFilter;
use tracing_subscriber::util::SubscriberInitExt as _;

use crate::config::{Config, LogFormat};

/// Starts the log of this process. An engine inside another program leaves the log to that program.
pub fn start(config: &Config) {
    // The filter has been checked with the other settings.
    let filter = EnvFilter::try_new(&config.log).unwrap_or_default();
    let log = tracing_subscriber::fmt()
        .with_env_filter(filter)
        .with_writer(std::io::stderr);
    let started = match config.log_format {
        LogFormat::Text => log.with_ansi(false).finish().try_init(),
        LogFormat::Json => log.json().flatten_event(true).finish().try_init(),
    };
    // A log that is there already stays.
    drop(started);
    std::panic::set_hook(Box::new(|panic| {
        let place = panic.location().map(ToString::to_string).unwrap_or_default();
        // Only fixed words: composed ones may hold ids or values of a brief.
        let words = panic
            .payload()
            .downcast_ref::<&'static str>()
            .copied()
            .unwrap_or_default();
        tracing::error!(place, words, "panic");
    }));
}
