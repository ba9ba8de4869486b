//! `ropewalk compare A B`: what differs between two briefs, two folders of results, or one of each, by id.

mod brief;
mod results;
mod tell;
mod thresholds;

use std::fmt::Write as _;
use std::fs;
use std::path::{Path, PathBuf};

use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use sha2::{Digest as _, Sha256};

use crate::end::{End, Stop};
use crate::run::{Run, record};
use crate::{brief_file, say};

use thresholds::Thresholds;

/// One side of a comparison.
#[derive(Debug)]
struct Side {
    /// As the user named it.
    name: String,
    brief: v1::Brief,
    /// Digest of the brief, computed here.
    digest: String,
    /// Results, if it is a folder of them.
    run: Option<Run>,
    /// What is odd about it by itself.
    doubts: Vec<String>,
}

/// Compares two sides; the end tells whether they differ.
pub(crate) fn run(a: &Path, b: &Path, above: &[String], out: Option<&Path>) -> Result<End, Stop> {
    let limits = Thresholds::read(above).map_err(|why| Stop::new(End::BriefHasErrors, why))?;
    let (a, b) = (side(a)?, side(b)?);
    let in_brief = brief::changes(&a.brief, &b.brief);
    let in_results = match (&a.run, &b.run) {
        (Some(one), Some(other)) => Some(results::Comparison::new(one, other, &limits)),
        _ => None,
    };
    let differs = !in_brief.is_empty() || in_results.as_ref().is_some_and(results::Comparison::differs);
    if let Some(folder) = out {
        tell::write(folder, &in_brief, in_results.as_ref()).map_err(|(path, error)| {
            Stop::new(End::CannotWrite, format!("cannot write {}: {error}", path.display()))
        })?;
    }
    say::out(&tell::text(&a, &b, &in_brief, in_results.as_ref(), &limits, out));
    Ok(if differs { End::Differs } else { End::Passes })
}

/// Reads a brief (a JSON file), or the results in a folder.
fn side(path: &Path) -> Result<Side, Stop> {
    let name = path.display().to_string();
    let stop = |why: String| Stop::new(End::BriefHasErrors, why);
    if !path.is_dir() {
        let brief = brief_file::read(&[path.to_owned()])
            .map_err(|found| stop(found.iter().map(ToString::to_string).collect::<Vec<_>>().join("\n")))?;
        return Ok(Side {
            name,
            digest: digest(&brief),
            brief,
            run: None,
            doubts: Vec::new(),
        });
    }
    let file = path.join(record::FILE);
    let bytes = fs::read(&file).map_err(|error| {
        stop(format!(
            "{name} holds no results that can be compared: {}: {error}\nA folder that `ropewalk run` wrote has them; run \
             the brief again.",
            file.display()
        ))
    })?;
    let run = record::read(&bytes).map_err(|why| stop(format!("{} {why}", file.display())))?;
    let digest = digest(&run.brief);
    let mut doubts = Vec::new();
    if digest != run.started.digest {
        doubts.push(format!(
            "{name}: the results are of brief {}, the brief recorded with them is {}",
            short(&run.started.digest),
            short(&digest)
        ));
    }
    let beside: PathBuf = path.join("brief.json");
    if beside.exists() {
        match brief_file::read(std::slice::from_ref(&beside)) {
            Ok(brief) if self::digest(&brief) == digest => {}
            Ok(_) => doubts.push(format!(
                "{} is no longer the brief that these results answer; compared is the one recorded with them",
                beside.display()
            )),
            Err(_) => doubts.push(format!("{} cannot be read as a brief any more", beside.display())),
        }
    }
    if let Some(why) = &run.broken_off {
        doubts.push(format!(
            "{name}: the run broke off after {} states; the others are not compared. {why}",
            run.states.len()
        ));
    }
    Ok(Side {
        name,
        brief: run.brief.clone(),
        digest,
        run: Some(run),
        doubts,
    })
}

/// SHA-256, in lower-case hexadecimal, of a brief encoded in tag order with sorted maps, as the contract defines it.
fn digest(brief: &v1::Brief) -> String {
    let mut text = String::with_capacity(64);
    for byte in Sha256::digest(brief.encode_to_vec()) {
        write!(text, "{byte:02x}").expect("a string takes every text");
    }
    text
}

/// The beginning of a digest, enough for eyes.
fn short(digest: &str) -> &str {
    digest.get(..12).unwrap_or(digest)
}
