//! Sheets to decide by: each is made once and then written for the terminal, as CSV and as HTML, so that they agree.

mod anchor_sets;
mod anchors;
mod cases;
mod checks;
mod diagnosis;
mod doubling;
mod effects;
mod judgements;
mod loads;
mod losses;
mod modes;
mod motions;
mod page;
mod ropes;
mod shape;
mod sizing;
mod slides;
mod text;
mod verdict;

use std::borrow::Cow;

use crate::escape;
use crate::number;
use crate::run::Run;

pub(crate) use anchor_sets::anchor_sets;
pub(crate) use anchors::{anchor_peaks, anchors};
pub(crate) use cases::{by_need, cases, causes, outcome_words, sums, way_words};
pub(crate) use checks::checks;
pub(crate) use diagnosis::diagnoses;
pub(crate) use doubling::doubling;
pub(crate) use effects::{effects, over_linearity};
pub(crate) use judgements::judgements;
pub(crate) use loads::{loads, panel_loads};
pub(crate) use losses::{loss_cells, losses, losses_by_need, lost_words, survivors};
pub(crate) use modes::modes;
pub(crate) use motions::{Told, energy_words, motion_lines, motion_outcome, motion_sheets, motion_text, motions};
pub(crate) use page::html;
pub(crate) use ropes::{ropes, struts};
pub(crate) use shape::shape;
pub(crate) use sizing::{sized, sizing_rounds, sizing_words};
pub(crate) use slides::slides;
pub(crate) use text::{terminal, wrap};
pub(crate) use verdict::{audit_line, largest_difference, proof_line, verdict_word, why};

/// How a number is shown to eyes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Show {
    /// Three digits.
    Three,
    /// A share, shown as a percentage without its sign.
    Percent,
    /// Whole degrees.
    Whole,
    /// One digit and a power of ten.
    Order,
    /// So many decimals: a component of something that has three digits with them.
    Decimals(usize),
}

/// A cell.
#[derive(Clone, Debug, PartialEq)]
pub(crate) enum Cell {
    Text(String),
    Number(f64, Show),
    Count(u64),
    /// A range and a place in it, as shares of the width of the column: least, reference, most. For pages only.
    Range([f64; 3]),
    /// Nothing to tell.
    Empty,
}

impl Cell {
    pub(crate) fn text(text: impl Into<String>) -> Self {
        let text = text.into();
        if text.is_empty() { Self::Empty } else { Self::Text(text) }
    }

    pub(crate) fn three(number: f64) -> Self {
        Self::Number(number, Show::Three)
    }

    /// Components of a vector, with the decimals that its size has with three digits.
    pub(crate) fn components<const N: usize>(parts: [f64; N], size: f64) -> [Self; N] {
        let decimals = number::three(size)
            .split_once('.')
            .map_or(0, |(_, decimals)| decimals.len());
        parts.map(|part| Self::Number(part, Show::Decimals(decimals)))
    }

    pub(crate) fn percent(share: f64) -> Self {
        Self::Number(share, Show::Percent)
    }

    pub(crate) fn maybe(cell: Option<Self>) -> Self {
        cell.unwrap_or(Self::Empty)
    }

    /// For eyes.
    pub(crate) fn shown(&self) -> String {
        match self {
            Self::Text(text) => text.clone(),
            Self::Number(number, Show::Three) => number::three(*number),
            Self::Number(number, Show::Percent) => number::percent(*number),
            Self::Number(number, Show::Whole) => number::fixed(*number, 0),
            Self::Number(number, Show::Decimals(decimals)) => number::fixed(*number, *decimals),
            Self::Number(number, Show::Order) => number::order(*number),
            Self::Count(count) => count.to_string(),
            Self::Range(_) => String::new(),
            Self::Empty => "–".to_owned(),
        }
    }

    /// For other programs: nine digits in the unit of the column.
    pub(crate) fn csv(&self) -> String {
        match self {
            Self::Text(text) => escape::csv_text(text),
            Self::Number(number, Show::Percent) => format!("{}", number::clean(number * 100.0)),
            Self::Number(number, _) => format!("{}", number::clean(*number)),
            Self::Count(count) => count.to_string(),
            Self::Range(_) | Self::Empty => String::new(),
        }
    }

    /// Whether it stands at the right of its column.
    pub(crate) fn is_number(&self) -> bool {
        matches!(self, Self::Number(..) | Self::Count(_))
    }
}

/// The head of a column.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct Head {
    pub(crate) title: &'static str,
    /// Unit; empty: none.
    pub(crate) unit: &'static str,
    /// Whether it stands on the terminal and on the page too, or only in the CSV file.
    pub(crate) place: Place,
}

/// Where a column stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Place {
    Everywhere,
    PageAndFile,
    FileOnly,
    PageOnly,
}

pub(crate) const fn head(title: &'static str, unit: &'static str) -> Head {
    Head {
        title,
        unit,
        place: Place::Everywhere,
    }
}

pub(crate) const fn page_head(title: &'static str, unit: &'static str) -> Head {
    Head {
        title,
        unit,
        place: Place::PageAndFile,
    }
}

pub(crate) const fn file_head(title: &'static str, unit: &'static str) -> Head {
    Head {
        title,
        unit,
        place: Place::FileOnly,
    }
}

/// How a row stands out.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Mark {
    Plain,
    /// Passes.
    Good,
    /// Exceeds.
    Bad,
    /// Not judged.
    Open,
    /// No answer.
    Gone,
}

impl Mark {
    /// Name for style sheets.
    pub(crate) fn name(self) -> &'static str {
        match self {
            Self::Plain => "plain",
            Self::Good => "good",
            Self::Bad => "bad",
            Self::Open => "open",
            Self::Gone => "gone",
        }
    }
}

/// A row.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Row {
    pub(crate) cells: Vec<Cell>,
    pub(crate) mark: Mark,
    /// Rows of a group follow each other; a terminal shows the first ones of each.
    pub(crate) group: String,
}

/// A table with a title.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Sheet {
    /// Name of its CSV file, without ending.
    pub(crate) file: Cow<'static, str>,
    pub(crate) title: Cow<'static, str>,
    pub(crate) heads: Vec<Head>,
    pub(crate) rows: Vec<Row>,
    /// What a reader must know about the columns.
    pub(crate) note: &'static str,
}

impl Sheet {
    /// The whole sheet as CSV (RFC 4180, UTF-8), units in the heads.
    pub(crate) fn csv(&self) -> String {
        let columns: Vec<usize> = (0..self.heads.len())
            .filter(|&column| self.heads[column].place != Place::PageOnly)
            .collect();
        let heads = columns
            .iter()
            .map(|&column| &self.heads[column])
            .map(|head| match head.unit {
                "" => escape::csv_text(head.title),
                unit => escape::csv_text(&format!("{} ({unit})", head.title)),
            });
        let mut text = heads.collect::<Vec<_>>().join(",");
        text.push_str("\r\n");
        for row in &self.rows {
            let cells = columns.iter().map(|&column| row.cells[column].csv());
            text.push_str(&cells.collect::<Vec<_>>().join(","));
            text.push_str("\r\n");
        }
        text
    }
}

/// The case that a position in an envelope stands for.
pub(crate) fn envelope_case(run: &Run, position: f64) -> &str {
    // Positions are whole numbers from the engine; -1 stands for the reference state.
    #[allow(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "checked to be a small whole number"
    )]
    let found = if position >= 0.0 {
        run.case_ids.get(position as usize)
    } else {
        None
    };
    found.map_or("reference", String::as_str)
}

#[cfg(test)]
mod tests;
