//! What each command does, from the files it reads to the words it ends with.

use std::path::{Path, PathBuf};

use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use tonic::Status;

use crate::brief_file::{self, Complaint};
use crate::end::{End, Stop};
use crate::engine::Engine;
use crate::escape::file_name;
use crate::number::counted;
use crate::progress::Watch;
use crate::run::{Collector, Run};
use crate::{files, refusal, say, sheet};

/// The brief of the demo, as it lies beside the others.
const DEMO: &str = include_str!("../briefs/market-square.json");

/// Findings that a run lists; the page and results.json have more.
const FINDINGS_LISTED: usize = 20;

/// Cases that `check` lists.
const CASES_LISTED: usize = 40;

/// Runs the demo.
pub(crate) async fn demo(url: Option<&str>, out: Option<PathBuf>) -> Result<End, Stop> {
    let brief = brief_file::parse("market-square.json", DEMO).map_err(|found| complaints(&found))?;
    run_brief(url, brief, out, Vec::new()).await
}

/// Runs a brief.
pub(crate) async fn run(
    url: Option<&str>,
    briefs: &[PathBuf],
    out: Option<PathBuf>,
    only: Vec<String>,
) -> Result<End, Stop> {
    run_brief(url, read(briefs)?, out, only).await
}

async fn run_brief(url: Option<&str>, brief: v1::Brief, out: Option<PathBuf>, only: Vec<String>) -> Result<End, Stop> {
    let mut engine = Engine::reach(url).await?;
    let answered = answer(&mut engine, &brief, only).await;
    engine.leave().await;
    let (run, broken) = answered?;
    let folder = out.unwrap_or_else(|| Path::new("out").join(file_name(&brief.id)));
    let written = files::write(&run, &folder)
        .map_err(|(path, error)| Stop::new(End::CannotWrite, format!("cannot write {}: {error}", path.display())))?;
    say::out(&ending(&run));
    let mut line = format!(
        "{} files in {}; open {} first.",
        written.files,
        folder.display(),
        folder.join("report.html").display()
    );
    if written.plans_left_out > 0 {
        line.push_str(&format!(
            " {} plans were left out for their number.",
            written.plans_left_out
        ));
    }
    say::out(&line);
    match broken {
        Some(stop) => Err(stop),
        None => Ok(End::of(run.summary.verdict())),
    }
}

/// The run; if its stream broke off after some states, what came of it and why to stop.
async fn answer(engine: &mut Engine, brief: &v1::Brief, only: Vec<String>) -> Result<(Run, Option<Stop>), Stop> {
    let request = v1::RunRequest {
        brief: Some(brief.clone()),
        only,
    };
    let mut watch = Watch::new();
    let mut collector = Collector::of(&request);
    let ended = receive(engine, request, &mut collector, &mut watch).await;
    watch.done();
    match ended {
        Ok(()) => collector
            .finish(brief.clone())
            .map(|run| (run, None))
            .map_err(|odd| Stop::new(End::EngineFailed, odd.to_string())),
        Err(Broken::Odd(stop)) => Err(stop),
        Err(Broken::Status(status)) if refusal::brief_has_errors(&status) => {
            Err(all_errors(engine, brief, &status).await)
        }
        Err(Broken::Status(status)) => {
            let mut stop = refusal::stop(&status);
            if !collector.has_begun() {
                return Err(stop);
            }
            let n_closed = collector.closed().len();
            match collector.finish_broken(brief.clone(), &stop.told) {
                Ok(run) => {
                    stop.told.push_str(&format!(
                        "\nThe run broke off after {n_closed} of {} states. What they answered is written; there is no \
                         verdict.",
                        run.case_ids.len() + 1
                    ));
                    Ok((run, Some(stop)))
                }
                Err(_) => {
                    stop.told
                        .push_str("\nThe run broke off before its first state had an answer; nothing was written.");
                    Err(stop)
                }
            }
        }
    }
}

/// How a stream may break.
enum Broken {
    Status(Box<Status>),
    Odd(Stop),
}

impl From<Status> for Broken {
    fn from(status: Status) -> Self {
        Self::Status(Box::new(status))
    }
}

async fn receive(
    engine: &mut Engine,
    request: v1::RunRequest,
    collector: &mut Collector,
    watch: &mut Watch,
) -> Result<(), Broken> {
    let mut stream = engine.briefs.run(request).await?.into_inner();
    while let Some(response) = stream.message().await? {
        // An event of a later contract has no meaning here.
        let Some(event) = response.event else { continue };
        if let v1::run_response::Event::Progress(progress) = &event {
            watch.progress(progress);
        }
        let ended = matches!(event, v1::run_response::Event::CaseSummary(_));
        let in_motion = matches!(event, v1::run_response::Event::Motion(_));
        collector
            .take(event)
            .map_err(|odd| Broken::Odd(Stop::new(End::EngineFailed, odd.to_string())))?;
        if let Some(last) = collector.closed().last().filter(|_| ended) {
            watch.closed(last, collector.closed().len());
        }
        if let Some(motion) = collector.ended_motion().filter(|_| in_motion) {
            watch.motion_ended(motion);
        }
    }
    Ok(())
}

/// A refused call names the first errors only; a check tells all of them.
async fn all_errors(engine: &mut Engine, brief: &v1::Brief, status: &Status) -> Stop {
    match check_report(engine, brief).await {
        // Nothing is wrong with the brief itself: the refusal is about what was asked of it.
        Ok(report) if !has_errors(&report) => refusal::stop(status),
        Ok(report) => Stop::new(
            End::BriefHasErrors,
            format!(
                "{}\nThe brief has {}.",
                refusal::findings_text(&report.findings).trim_end(),
                refusal::count_words(&report.findings)
            ),
        ),
        // What the refusal itself says is still true.
        Err(_) => refusal::stop(status),
    }
}

async fn check_report(engine: &mut Engine, brief: &v1::Brief) -> Result<v1::CheckResponse, Status> {
    let request = v1::CheckRequest {
        brief: Some(brief.clone()),
    };
    let mut stream = engine.briefs.check(request).await?.into_inner();
    let mut report = v1::CheckResponse::default();
    while let Some(part) = stream.message().await? {
        report.findings.extend(part.findings);
        report.resolved.extend(part.resolved);
        report.cases.extend(part.cases);
        report.totals = part.totals.or(report.totals);
    }
    Ok(report)
}

/// Checks a brief and tells how it is understood.
pub(crate) async fn check(url: Option<&str>, briefs: &[PathBuf], values: bool) -> Result<End, Stop> {
    let brief = read(briefs)?;
    let mut engine = Engine::reach(url).await?;
    let report = check_report(&mut engine, &brief).await;
    engine.leave().await;
    let report = report.map_err(|status| refusal::stop(&status))?;

    let mut text = refusal::findings_text(&report.findings);
    for case in report.cases.iter().take(CASES_LISTED) {
        let sets = if case.sets.is_empty() {
            String::new()
        } else {
            format!("  ({})", case.sets.join(", "))
        };
        text.push_str(&format!("case {}: {}{sets}\n", case.case, case.in_words));
    }
    if report.cases.len() > CASES_LISTED {
        text.push_str(&format!("... and {} more cases\n", report.cases.len() - CASES_LISTED));
    }
    if values {
        for value in &report.resolved {
            text.push_str(&format!("{} = {}  ({})\n", value.path, value.value, value.origin));
        }
    } else if !report.resolved.is_empty() {
        text.push_str(&format!(
            "{} values come from defaults, roles and rules; --values lists them\n",
            report.resolved.len()
        ));
    }
    let totals = report.totals.clone().unwrap_or_default();
    if let Some(sizes) = totals.sizes {
        text.push_str(&format!(
            "{}, {}, {}, {}, {}; {} in about {:.1} s, {:.1} MB\n",
            counted(sizes.nodes as usize, "node"),
            counted(sizes.segments as usize, "segment"),
            counted(sizes.cables as usize, "cable"),
            counted(sizes.struts as usize, "strut"),
            counted(sizes.supports as usize, "support"),
            counted(totals.cases as usize, "case"),
            totals.seconds,
            // Sizes of streams are far below 2^52 bytes.
            totals.bytes as f64 / 1e6
        ));
    }
    text.push_str(&format!(
        "digest {}\n{}: {}",
        totals.digest,
        brief.id,
        refusal::count_words(&report.findings)
    ));
    say::out(&text);
    Ok(if has_errors(&report) {
        End::BriefHasErrors
    } else {
        End::Passes
    })
}

fn has_errors(report: &v1::CheckResponse) -> bool {
    let mut findings = report.findings.iter();
    findings.any(|finding| finding.severity() == v1::FindingSeverity::Error)
}

/// Freezes a brief.
pub(crate) async fn freeze(url: Option<&str>, briefs: &[PathBuf], output: &Path) -> Result<End, Stop> {
    let brief = read(briefs)?;
    let mut engine = Engine::reach(url).await?;
    let mut watch = Watch::new();
    let frozen = frozen(&mut engine, &brief, &mut watch).await;
    watch.done();
    let outcome = match frozen {
        Err(status) if refusal::brief_has_errors(&status) => Err(all_errors(&mut engine, &brief, &status).await),
        Err(status) => Err(refusal::stop(&status)),
        Ok(parts) => Ok(parts),
    };
    engine.leave().await;
    let (parts, summary) = outcome?;
    let broken = |what: &str| {
        Stop::new(
            End::EngineFailed,
            format!("the engine's answer does not keep to the contract: {what}"),
        )
    };
    let summary = summary.ok_or_else(|| broken("the stream ended without a summary"))?;
    let frozen = v1::Brief::decode(parts.as_slice()).map_err(|error| broken(&error.to_string()))?;
    replace(output, &brief_file::to_json(&frozen))
        .map_err(|error| Stop::new(End::CannotWrite, format!("cannot write {}: {error}", output.display())))?;
    let mut text = format!(
        "{} is frozen into {}.\nfrom digest {}\nto digest   {}\n",
        brief.id,
        output.display(),
        summary.from_digest,
        summary.digest
    );
    if let Some(reference) = &summary.reference {
        text.push_str(&format!(
            "reference state: {} iterations by {}, largest imbalance {} N of {} N allowed\n",
            reference.iterations,
            sheet::way_words(reference.way()),
            crate::number::order(reference.imbalance_n),
            crate::number::order(reference.imbalance_allowed_n)
        ));
    }
    text.push_str(&cautions(&summary.cautions));
    say::out(text.trim_end());
    Ok(End::Passes)
}

/// Writes a file whole or not at all, so that a full disk does not cost the one that was there.
fn replace(path: &Path, text: &str) -> std::io::Result<()> {
    if let Some(folder) = path.parent() {
        std::fs::create_dir_all(folder)?;
    }
    let mut name = path.file_name().unwrap_or_default().to_owned();
    name.push(".part");
    let part = path.with_file_name(name);
    std::fs::write(&part, text)
        .and_then(|()| std::fs::rename(&part, path))
        .inspect_err(|_| {
            // What is left of it is of no use; the error that counts is the first.
            let _ = std::fs::remove_file(&part);
        })
}

async fn frozen(
    engine: &mut Engine,
    brief: &v1::Brief,
    watch: &mut Watch,
) -> Result<(Vec<u8>, Option<v1::FreezeSummary>), Status> {
    let request = v1::FreezeRequest {
        brief: Some(brief.clone()),
    };
    let mut stream = engine.briefs.freeze(request).await?.into_inner();
    let mut parts = Vec::new();
    let mut summary = None;
    while let Some(response) = stream.message().await? {
        match response.part {
            // Parts merge as protobuf merges messages: their encodings one after the other.
            Some(v1::freeze_response::Part::Brief(part)) => parts.extend(part.encode_to_vec()),
            Some(v1::freeze_response::Part::Progress(progress)) => watch.progress(&progress),
            Some(v1::freeze_response::Part::Summary(end)) => summary = Some(end),
            None => {}
        }
    }
    Ok((parts, summary))
}

fn read(briefs: &[PathBuf]) -> Result<v1::Brief, Stop> {
    brief_file::read(briefs).map_err(|found| complaints(&found))
}

fn complaints(found: &[Complaint]) -> Stop {
    Stop::new(
        End::BriefHasErrors,
        found.iter().map(ToString::to_string).collect::<Vec<_>>().join("\n"),
    )
}

/// What a run says at its end.
fn ending(run: &Run) -> String {
    let mut text = format!("\n{} ({})\n", run.title(), run.brief.id);
    let word = sheet::verdict_word(run.summary.verdict()).to_uppercase();
    text.push_str(&format!("{}\n\n", wrapped(&format!("{word}: {}", sheet::why(run)))));
    text.push_str(&sheet::terminal(&sheet::checks(run)));
    text.push('\n');
    text.push_str(&sheet::terminal(&sheet::ropes(run)));
    text.push('\n');
    if !run.struts.is_empty() {
        text.push_str(&sheet::terminal(&sheet::struts(run)));
        text.push('\n');
    }
    text.push_str(&sheet::terminal(&sheet::anchor_peaks(run)));
    text.push('\n');
    text.push_str(&sheet::terminal(&sheet::cases(run)));
    if let Some(sizing) = &run.sizing {
        let words = sheet::sizing_words(sizing);
        text.push_str(&format!("\n{}\n{words}\n", sheet::terminal(&sheet::sized(sizing))));
    }
    for extra in [sheet::shape(run), sheet::losses(run), sheet::effects(run)]
        .into_iter()
        .flatten()
    {
        text.push_str(&format!("\n{}", sheet::terminal(&extra)));
    }
    if let Some(modes) = sheet::modes(run) {
        text.push_str(&format!("\n{}", sheet::terminal(&modes)));
    }
    if !run.diagnoses.is_empty() {
        text.push_str(&format!("\n{}", sheet::terminal(&sheet::diagnoses(run))));
    }
    for motion in &run.motions {
        text.push_str(&format!("\n{}", sheet::motion_text(run, motion)));
    }
    let causes = sheet::causes(run);
    if !causes.is_empty() {
        text.push_str("\nWithout an answer\n");
    }
    for cause in causes {
        let culprit = if cause.culprit.is_empty() {
            cause.reason.clone()
        } else {
            format!("\"{}\"", cause.culprit)
        };
        text.push_str(&format!("  {}\n", wrapped(&format!("{culprit}: {}", cause.message))));
        if !cause.cure.is_empty() {
            text.push_str(&format!("  {}\n", wrapped(&format!("try: {}", cause.cure))));
        }
        text.push_str(&format!("  {}\n", wrapped(&format!("in {}", cause.cases.join(", ")))));
    }
    let findings = run.other_findings();
    if !findings.is_empty() {
        text.push_str(&format!(
            "\n{}",
            refusal::findings_text_up_to(&findings, FINDINGS_LISTED)
        ));
    }
    text.push_str(&format!(
        "\n{}\n{}\n\n{}",
        wrapped(&sheet::audit_line(run)),
        wrapped(&sheet::proof_line(run)),
        cautions(&run.summary.cautions)
    ));
    if let Some(timing) = &run.timing {
        text.push_str(&format!("\n{} states in {:.2} s", run.states.len(), timing.total_s));
        if timing.waiting_s >= 0.1 {
            text.push_str(&format!(", {:.2} s of them waiting", timing.waiting_s));
        }
        text.push('.');
    }
    text
}

fn wrapped(text: &str) -> String {
    sheet::wrap(text, 116, "    ")
}

fn cautions(cautions: &[String]) -> String {
    let lines: Vec<String> = cautions
        .iter()
        .map(|caution| format!("  {}", wrapped(&format!("! {caution}"))))
        .collect();
    if lines.is_empty() {
        String::new()
    } else {
        format!("Cautions\n{}\n", lines.join("\n"))
    }
}
