//! The command line.

use std::path::PathBuf;

use clap::{Parser, Subcommand};

const AFTER: &str = "\
Exit codes:
  0   the verdict is: passes; for check and freeze: done; for compare: nothing differs
  1   the verdict is: exceeds; for compare: something differs
  2   the verdict is: not judged
  3   the verdict is: no answer; for freeze: there is no reference state
  64  the brief or the command line has errors
  69  the engine cannot be reached, or is full
  70  the engine failed, or broke its contract
  73  files cannot be written
  130 interrupted";

/// Finds the shape of cable nets and answers their load cases.
#[derive(Debug, Parser)]
#[command(name = "ropewalk", version, after_help = AFTER, max_term_width = 100)]
pub(crate) struct Args {
    /// Engine to ask, such as http://127.0.0.1:7410; without it one is started inside this program
    #[arg(long, global = true, value_name = "URL", env = "ROPEWALK_ENGINE")]
    pub(crate) engine: Option<String>,
    #[command(subcommand)]
    pub(crate) command: Command,
}

#[derive(Debug, Subcommand)]
pub(crate) enum Command {
    /// Run the invented canopy over a market square and write its page, tables and drawings
    #[command(after_help = AFTER)]
    Demo {
        /// Folder for the results; default: out/market-square
        #[arg(long, value_name = "DIR")]
        out: Option<PathBuf>,
    },
    /// Run a brief: find its reference state, solve its cases, judge its checks
    #[command(after_help = AFTER)]
    Run {
        /// Files that make up the brief; several are merged, `-` is standard input
        #[arg(required = true, value_name = "BRIEF.json")]
        briefs: Vec<PathBuf>,
        /// Folder for the results; default: out/ and the id of the brief
        #[arg(long, value_name = "DIR")]
        out: Option<PathBuf>,
        /// Run only this set, case or motion; may be given several times. Motions run only where they are named
        #[arg(long, value_name = "ID")]
        only: Vec<String>,
    },
    /// Tell everything that is wrong or odd about a brief, and how it is understood; compute nothing
    #[command(after_help = AFTER)]
    Check {
        /// Files that make up the brief; several are merged, `-` is standard input
        #[arg(required = true, value_name = "BRIEF.json")]
        briefs: Vec<PathBuf>,
        /// List every value that the brief leaves to a default, a role or a rule
        #[arg(long)]
        values: bool,
    },
    /// Find the reference state and write the brief with found coordinates and unstressed lengths
    #[command(after_help = AFTER)]
    Freeze {
        /// Files that make up the brief; several are merged, `-` is standard input
        #[arg(required = true, value_name = "BRIEF.json")]
        briefs: Vec<PathBuf>,
        /// File for the frozen brief
        #[arg(short, long, value_name = "FILE")]
        output: PathBuf,
    },
    /// Tell what differs between two briefs, two folders of results, or a brief and results, by id
    #[command(after_help = AFTER)]
    Compare {
        /// A brief, or a folder that `run` wrote
        #[arg(value_name = "A")]
        a: PathBuf,
        /// Another one
        #[arg(value_name = "B")]
        b: PathBuf,
        /// Pass over differences of results up to this: force=0.1 (kN), share=1 (% of the force), length=1 (mm),
        /// angle=1 (deg), ratio=1 (% points) are the defaults; forces must exceed both; may be given several times
        #[arg(long, value_name = "NAME=NUMBER")]
        above: Vec<String>,
        /// Folder for everything that differs, as CSV
        #[arg(long, value_name = "DIR")]
        out: Option<PathBuf>,
    },
}
