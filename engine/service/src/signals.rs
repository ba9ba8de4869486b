//! Signals: the first one asks to stop, a second one ends the process at once.

use std::io;

/// Exit code after a second signal.
const IMPATIENT: i32 = 1;

/// Resolves at the first signal to stop. From then on, another one ends the process.
///
/// # Errors
/// If the system does not let signals be handled.
#[cfg(unix)]
pub fn first_to_stop() -> io::Result<impl Future<Output = ()>> {
    use tokio::signal::unix::{SignalKind, signal};

    let mut terminate = signal(SignalKind::terminate())?;
    let mut interrupt = signal(SignalKind::interrupt())?;
    let mut next = async move || {
        tokio::select! {
            _ = terminate.recv() => {}
            _ = interrupt.recv() => {}
        }
    };
    Ok(async move {
        next().await;
        tokio::spawn(async move {
            next().await;
            std::process::exit(IMPATIENT);
        });
    })
}

/// Resolves at the first interrupt. From then on, another one ends the process.
///
/// # Errors
/// If the system does not let signals be handled.
#[cfg(not(unix))]
pub fn first_to_stop() -> io::Result<impl Future<Output = ()>> {
    async fn next() {
        // Without a handler the process cannot be asked: it ends when it is killed.
        if tokio::signal::ctrl_c().await.is_err() {
            std::future::pending().await
        }
    }
    Ok(async move {
        next().await;
        tokio::spawn(async move {
            next().await;
            std::process::exit(IMPATIENT);
        });
    })
}
