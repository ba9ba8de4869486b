//! A comparison for the terminal and as CSV files.

use std::collections::BTreeMap;
use std::io;
use std::path::{Path, PathBuf};

use super::brief::Change;
use super::results::{Comparison, Number, Quantity, Said};
use super::thresholds::Thresholds;
use super::{Side, short};
use crate::number::{for_eyes, three};
use crate::sheet::{self, Cell, Mark, Row, Sheet, head};

/// Lines of a list that a terminal shows.
const LINES: usize = 40;
/// Letters of a value that a terminal shows.
const LETTERS: usize = 90;

/// Writes what differs into a folder.
///
/// # Errors
/// The file that could not be written, and why.
pub(super) fn write(folder: &Path, brief: &[Change], results: Option<&Comparison>) -> Result<(), (PathBuf, io::Error)> {
    std::fs::create_dir_all(folder).map_err(|error| (folder.to_owned(), error))?;
    let mut sheets = vec![brief_sheet(brief)];
    if let Some(results) = results {
        sheets.push(said_sheet(&results.said));
        sheets.push(all_numbers(results));
    }
    for sheet in sheets {
        let path = folder.join(format!("{}.csv", sheet.file));
        std::fs::write(&path, sheet.csv()).map_err(|error| (path, error))?;
    }
    Ok(())
}

/// The comparison for a terminal.
pub(super) fn text(
    a: &Side,
    b: &Side,
    brief: &[Change],
    results: Option<&Comparison>,
    limits: &Thresholds,
    out: Option<&Path>,
) -> String {
    let mut text = format!("A  {}\nB  {}\n", side_line(a), side_line(b));
    for remark in remarks(a, b) {
        text.push_str(&format!("! {}\n", sheet::wrap(&remark, 116, "  ")));
    }
    text.push_str(&brief_text(brief));
    match results {
        Some(results) => text.push_str(&results_text(results, limits)),
        None => text.push_str("\nResults are not compared: that takes two folders of results.\n"),
    }
    match out {
        Some(folder) => text.push_str(&format!("\nEverything that differs is in {}.\n", folder.display())),
        None if text.contains("left out here") => {
            text.push_str("\nWith --out DIR all of it is written as CSV.\n");
        }
        None => {}
    }
    text.trim_end().to_owned()
}

fn side_line(side: &Side) -> String {
    let what = match &side.run {
        None => "brief".to_owned(),
        Some(run) => {
            let engine = run.started.engine.clone().unwrap_or_default();
            format!(
                "results, {}, engine {} ({}), of brief",
                sheet::verdict_word(run.summary.verdict()),
                engine.version,
                engine.instruction_set
            )
        }
    };
    format!(
        "{}: {what} \"{}\", digest {}",
        side.name,
        side.brief.id,
        short(&side.digest)
    )
}

/// What a reader must know before any difference.
fn remarks(a: &Side, b: &Side) -> Vec<String> {
    let mut remarks: Vec<String> = a.doubts.iter().chain(&b.doubts).cloned().collect();
    let same = a.digest == b.digest;
    match (&a.run, &b.run) {
        (Some(_), Some(_)) if same => remarks.push("Both are results of one and the same brief.".to_owned()),
        (Some(_), Some(_)) => remarks.push(
            "The digests differ: these are results of two briefs, and differences of results may come from any of the \
             differences of the briefs."
                .to_owned(),
        ),
        (None, None) => {}
        (Some(_), None) | (None, Some(_)) => {
            let (brief, results) = if a.run.is_some() { (b, a) } else { (a, b) };
            remarks.push(if same {
                format!("The results in {} are those of {}.", results.name, brief.name)
            } else {
                format!(
                    "The results in {} are read against another brief: they answer {}, {} is {}. Run it again before you \
                     decide by them.",
                    results.name,
                    short(&results.digest),
                    brief.name,
                    short(&brief.digest)
                )
            });
        }
    }
    if let (Some(one), Some(other)) = (&a.run, &b.run) {
        let build = |run: &crate::run::Run| {
            let engine = run.started.engine.clone().unwrap_or_default();
            (engine.version, engine.instruction_set)
        };
        if build(one) != build(other) {
            remarks.push("Two builds of the engine, or two kinds of processor: last digits may differ.".to_owned());
        }
        let only_some = one.case_ids.len() != other.case_ids.len();
        if same && only_some {
            remarks.push("One of the runs was asked for some cases only.".to_owned());
        }
    }
    remarks
}

fn cut(text: &str) -> String {
    if text.chars().count() <= LETTERS {
        return text.to_owned();
    }
    let mut cut: String = text.chars().take(LETTERS - 1).collect();
    cut.push('…');
    cut
}

fn told(was: Option<&str>, now: Option<&str>) -> String {
    match (was, now) {
        (Some(was), Some(now)) => format!("{} → {}", cut(was), cut(now)),
        (Some(was), None) => format!("only in A: {}", cut(was)),
        (None, Some(now)) => format!("only in B: {}", cut(now)),
        (None, None) => String::new(),
    }
}

/// Lines of a list, the first ones; what is left out is told.
fn list(lines: Vec<(String, String)>) -> String {
    let more = lines.len().saturating_sub(LINES);
    let wide = |name: &str| name.chars().count();
    let width = lines
        .iter()
        .take(LINES)
        .map(|(name, _)| wide(name))
        .filter(|width| *width <= 50)
        .max()
        .unwrap_or(0);
    let mut text = String::new();
    for (name, what) in lines.into_iter().take(LINES) {
        let pad = " ".repeat(width.saturating_sub(wide(&name)));
        text.push_str(&format!("  {name}{pad}  {what}\n"));
    }
    if more > 0 {
        text.push_str(&format!("  left out here: {more} more\n"));
    }
    text
}

fn brief_text(changes: &[Change]) -> String {
    if changes.is_empty() {
        return "\nThe briefs are the same.\n".to_owned();
    }
    let count = if changes.len() == 1 {
        "1 difference".to_owned()
    } else {
        format!("{} differences", changes.len())
    };
    let lines = changes
        .iter()
        .map(|change| (change.place.clone(), told(change.was.as_deref(), change.now.as_deref())));
    format!("\nBriefs: {count}\n{}", list(lines.collect()))
}

fn results_text(results: &Comparison, limits: &Thresholds) -> String {
    let mut text = String::from("\nResults\n");
    let said = results
        .said
        .iter()
        .map(|said| (said.what.clone(), told(said.was.as_deref(), said.now.as_deref())));
    text.push_str(&list(said.collect()));
    let compared = format!(
        "{} states that both answered were compared; told is what differs by more than {}.",
        results.states,
        limits.words()
    );
    text.push_str(&format!("  {}\n", sheet::wrap(&compared, 114, "  ")));
    for words in &results.apart {
        text.push_str(&format!("  {words}\n"));
    }
    if results.numbers.is_empty() {
        text.push_str("  no number differs by more than that\n");
        return text;
    }
    text.push('\n');
    text.push_str(&sheet::terminal(&worst_numbers(results)));
    let alike: Vec<&str> = results
        .quantities
        .iter()
        .enumerate()
        .filter(|(at, _)| results.numbers.iter().all(|number| number.quantity != *at))
        .map(|(_, quantity)| quantity.name.as_str())
        .collect();
    if !alike.is_empty() {
        let words = format!("Alike within these thresholds: {}.", alike.join(", "));
        text.push_str(&format!("{}\n", sheet::wrap(&words, 116, "  ")));
    }
    text
}

fn brief_sheet(changes: &[Change]) -> Sheet {
    let cell = |text: &Option<String>| Cell::maybe(text.as_ref().map(Cell::text));
    let rows = changes.iter().map(|change| {
        plain(
            vec![Cell::text(&change.place), cell(&change.was), cell(&change.now)],
            "",
        )
    });
    Sheet {
        file: "brief-differs".into(),
        title: "Differences of the briefs".into(),
        heads: vec![head("place", ""), head("A", ""), head("B", "")],
        rows: rows.collect(),
        note: "",
    }
}

fn said_sheet(said: &[Said]) -> Sheet {
    let cell = |text: &Option<String>| Cell::maybe(text.as_ref().map(Cell::text));
    let rows = said
        .iter()
        .map(|said| plain(vec![Cell::text(&said.what), cell(&said.was), cell(&said.now)], ""));
    Sheet {
        file: "words-differ".into(),
        title: "Differences of verdicts, answers and findings".into(),
        heads: vec![head("what", ""), head("A", ""), head("B", "")],
        rows: rows.collect(),
        note: "",
    }
}

fn plain(cells: Vec<Cell>, group: &str) -> Row {
    Row {
        cells,
        mark: Mark::Plain,
        group: group.to_owned(),
    }
}

/// Every number that differs.
fn all_numbers(results: &Comparison) -> Sheet {
    let rows = results.numbers.iter().map(|number| {
        let quantity = &results.quantities[number.quantity];
        plain(
            vec![
                Cell::text(&quantity.name),
                Cell::text(&quantity.unit),
                Cell::text(&number.case),
                Cell::text(&number.id),
                Cell::three(number.was),
                Cell::three(number.now),
                Cell::three(number.difference()),
                Cell::percent(number.share()),
            ],
            "",
        )
    });
    Sheet {
        file: "results-differ".into(),
        title: "Differences of results".into(),
        heads: vec![
            head("quantity", ""),
            head("unit", ""),
            head("case", ""),
            head("id", ""),
            head("A", ""),
            head("B", ""),
            head("B less A", ""),
            head("of the larger", "%"),
        ],
        rows: rows.collect(),
        note: "",
    }
}

/// For each quantity and id the case where it differs most, with the number of cases where it differs.
fn worst_numbers(results: &Comparison) -> Sheet {
    let mut at: BTreeMap<(usize, &str), usize> = BTreeMap::new();
    let mut worst: Vec<(&Number, u64)> = Vec::new();
    for number in &results.numbers {
        let place = *at.entry((number.quantity, number.id.as_str())).or_insert(worst.len());
        match worst.get_mut(place) {
            Some((_, count)) => *count += 1,
            None => worst.push((number, 1)),
        }
    }
    let rows = worst.into_iter().map(|(number, count)| {
        let Quantity { name, unit, .. } = &results.quantities[number.quantity];
        let (eyes, scale) = for_eyes(unit);
        let value = |number: f64| match (name.as_str(), unit.as_str()) {
            ("slack", _) => Cell::text(if number == 0.0 { "taut" } else { "slack" }),
            // Places and lengths are metres; movements, and what differs in them, are millimetres.
            (name, "m")
                if !["displacement", "movement"].iter().any(|word| name.starts_with(word))
                    && !name.ends_with("change") =>
            {
                Cell::text(format!("{number:.4} m"))
            }
            _ => Cell::text(format!("{} {eyes}", three(number * scale)).trim_end().to_owned()),
        };
        let by = match (name.as_str(), unit.as_str()) {
            ("slack", _) => Cell::Empty,
            _ => Cell::text(format!(
                "{}{} {eyes}",
                sign(number.difference()),
                three(number.difference() * scale)
            )),
        };
        plain(
            vec![
                Cell::text(name),
                Cell::text(&number.id),
                Cell::text(&number.case),
                value(number.was),
                value(number.now),
                by,
                if unit == "m" || name == "slack" {
                    Cell::Empty
                } else {
                    Cell::percent(number.share())
                },
                Cell::Count(count),
            ],
            name,
        )
    });
    Sheet {
        file: "results-differ".into(),
        title: "Largest differences".into(),
        heads: vec![
            head("quantity", ""),
            head("id", ""),
            head("case", ""),
            head("A", ""),
            head("B", ""),
            head("B less A", ""),
            head("of the larger", "%"),
            head("cases", ""),
        ],
        rows: rows.collect(),
        note: "",
    }
}

fn sign(number: f64) -> &'static str {
    if number > 0.0 { "+" } else { "" }
}
