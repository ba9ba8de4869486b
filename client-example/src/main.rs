//! `ropewalk`: a client of the engine that knows the contract only. It reads briefs, shows progress, and leaves tables,
//! drawings and one page to decide by.
#![forbid(unsafe_code)]

mod args;
mod brief_file;
mod colour;
mod commands;
mod compare;
mod draw;
mod end;
mod engine;
mod escape;
mod files;
mod json_text;
mod motion_files;
mod number;
mod progress;
mod refusal;
mod report;
mod run;
mod say;
mod sheet;

use std::process::ExitCode;

use clap::Parser as _;

use args::{Args, Command};
use end::{End, Stop};

fn main() -> ExitCode {
    let args = match Args::try_parse() {
        Ok(args) => args,
        Err(error) => {
            // Help and version come this way too. The exit codes 0 to 3 belong to verdicts.
            let _ = error.print();
            return if error.use_stderr() {
                ExitCode::from(End::BriefHasErrors.code())
            } else {
                ExitCode::SUCCESS
            };
        }
    };
    let ended = match tokio::runtime::Builder::new_multi_thread().enable_all().build() {
        Ok(runtime) => {
            let ended = runtime.block_on(until_interrupted(args));
            runtime.shutdown_background();
            ended
        }
        Err(error) => Err(Stop::new(End::EngineFailed, format!("cannot start: {error}"))),
    };
    match ended {
        Ok(_) if say::is_lost() => {
            say::err("cannot write to standard output: what was to be said there is lost");
            ExitCode::from(End::CannotWrite.code())
        }
        Ok(end) => ExitCode::from(end.code()),
        Err(stop) => {
            say::err(&stop.told);
            ExitCode::from(stop.end.code())
        }
    }
}

async fn until_interrupted(args: Args) -> Result<End, Stop> {
    tokio::select! {
        ended = execute(args) => ended,
        // Dropping the call tells the engine to stop.
        _ = tokio::signal::ctrl_c() => Err(Stop::new(End::Interrupted, "interrupted: nothing of this run was written, and what lies in its folder is older")),
    }
}

async fn execute(args: Args) -> Result<End, Stop> {
    let url = args.engine.as_deref();
    match args.command {
        Command::Demo { out } => commands::demo(url, out).await,
        Command::Run { briefs, out, only } => commands::run(url, &briefs, out, only).await,
        Command::Check { briefs, values } => commands::check(url, &briefs, values).await,
        Command::Compare { a, b, above, out } => compare::run(&a, &b, &above, out.as_deref()),
        Command::Freeze { briefs, output } => commands::freeze(url, &briefs, &output).await,
    }
}
