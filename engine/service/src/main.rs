//! The engine as a program: settings, log, address, serve, drain.
#![forbid(unsafe_code)]

use std::io::Write as _;
use std::process::ExitCode;

use clap::Parser as _;
use ropewalk_service::config::Config;
use ropewalk_service::{server, signals, telemetry};

fn main() -> ExitCode {
    let config = Config::parse();
    if let Err(error) = config.check() {
        return fail(&error);
    }
    telemetry::start(&config);
    let runtime = match tokio::runtime::Builder::new_multi_thread().enable_all().build() {
        Ok(runtime) => runtime,
        Err(error) => return fail(&error),
    };
    let ended = runtime.block_on(serve(config));
    // Tasks for clients that do not read any more do not hold up the end.
    runtime.shutdown_background();
    match ended {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => fail(error.as_ref()),
    }
}

async fn serve(config: Config) -> Result<(), Box<dyn std::error::Error>> {
    let stop = signals::first_to_stop()?;
    let announce = config.announce;
    let threads = config.threads();
    let server = server::bind(config)?;
    let listen = server.local_addr();
    tracing::info!(%listen, threads, version = env!("CARGO_PKG_VERSION"), "serving");
    if announce {
        writeln!(std::io::stdout(), "{{\"listen\":\"{listen}\"}}")?;
    }
    server.serve(stop).await?;
    tracing::info!("ended");
    Ok(())
}

fn fail(error: &dyn std::error::Error) -> ExitCode {
    let mut words = error.to_string();
    let mut source = error.source();
    while let Some(cause) = source {
        words = format!("{words}: {cause}");
        source = cause.source();
    }
    // Where standard error is gone there is nobody to tell.
    let _ = writeln!(std::io::stderr(), "ropewalk-engine: {words}");
    ExitCode::FAILURE
}
