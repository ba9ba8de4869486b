//! Sheets on a terminal.

use std::collections::BTreeMap;

use super::{Place, Sheet};
use crate::escape;

/// Rows of a group that a terminal shows.
const ROWS_A_GROUP: usize = 5;
/// Rows of a sheet that a terminal shows.
const ROWS: usize = 40;

/// The sheet as lines; long groups are cut, and what is left out is told.
pub(crate) fn terminal(sheet: &Sheet) -> String {
    terminal_up_to(sheet, ROWS)
}

/// The sheet as lines, so many rows of it at most.
pub(crate) fn terminal_up_to(sheet: &Sheet, rows: usize) -> String {
    let columns: Vec<usize> = (0..sheet.heads.len())
        .filter(|&column| sheet.heads[column].place == Place::Everywhere)
        .collect();
    let mut grid: Vec<Vec<String>> = Vec::new();
    let mut shown_of: BTreeMap<&str, usize> = BTreeMap::new();
    let mut left_out: Vec<(&str, usize)> = Vec::new();
    for row in &sheet.rows {
        let shown = shown_of.entry(row.group.as_str()).or_default();
        if *shown >= ROWS_A_GROUP && !row.group.is_empty() || grid.len() >= rows {
            match left_out.iter_mut().find(|(group, _)| *group == row.group) {
                Some((_, count)) => *count += 1,
                None => left_out.push((row.group.as_str(), 1)),
            }
            continue;
        }
        *shown += 1;
        grid.push(
            columns
                .iter()
                .map(|&column| escape::terminal(&row.cells[column].shown()))
                .collect(),
        );
    }
    let right: Vec<bool> = columns
        .iter()
        .map(|&column| sheet.rows.iter().any(|row| row.cells[column].is_number()))
        .collect();
    let heads: Vec<Vec<String>> = columns
        .iter()
        .enumerate()
        .map(|(at, &column)| {
            let cells = grid.iter().map(|line| line[at].chars().count()).max().unwrap_or(0);
            stacked(sheet.heads[column].title, sheet.heads[column].unit, cells)
        })
        .collect();
    let n_head_lines = heads.iter().map(Vec::len).max().unwrap_or(0);
    let mut lines: Vec<Vec<String>> = Vec::new();
    for number in 0..n_head_lines {
        // Heads stand on the line above the cells, however many lines each takes.
        let line = heads.iter().map(|head| {
            (number + head.len())
                .checked_sub(n_head_lines)
                .map_or(String::new(), |at| head[at].clone())
        });
        lines.push(line.collect());
    }
    lines.extend(grid);
    let widths: Vec<usize> = (0..columns.len())
        .map(|column| lines.iter().map(|line| line[column].chars().count()).max().unwrap_or(0))
        .collect();

    let mut text = format!("{}\n", sheet.title);
    for line in &lines {
        let mut out = String::from(" ");
        for (column, cell) in line.iter().enumerate() {
            let pad = " ".repeat(widths[column] - cell.chars().count());
            let cell = if right[column] {
                format!("{pad}{cell}")
            } else {
                format!("{cell}{pad}")
            };
            out.push(' ');
            out.push_str(&cell);
            out.push(' ');
        }
        text.push_str(out.trim_end());
        text.push('\n');
    }
    if sheet.rows.is_empty() {
        text.push_str("  (nothing)\n");
    }
    if !left_out.is_empty() {
        let parts: Vec<String> = left_out
            .iter()
            .map(|(group, count)| {
                if group.is_empty() {
                    count.to_string()
                } else {
                    format!("{count} of {group}")
                }
            })
            .collect();
        text.push_str(&escape::terminal(&format!(
            "  left out here: {}; all in {}.csv\n",
            parts.join(", "),
            sheet.file
        )));
    }
    text
}

/// A head in lines no wider than its cells, if its words allow that; the unit stands below.
fn stacked(title: &str, unit: &str, width: usize) -> Vec<String> {
    let widest = title.split(' ').map(|word| word.chars().count()).max().unwrap_or(0);
    let mut lines: Vec<String> = wrap(title, width.max(widest), "").lines().map(str::to_owned).collect();
    if !unit.is_empty() {
        lines.push(unit.to_owned());
    }
    lines
}

/// A paragraph in lines of at most `width` letters, each after the first behind `indent`.
pub(crate) fn wrap(text: &str, width: usize, indent: &str) -> String {
    let mut lines = vec![String::new()];
    for word in text.split_whitespace() {
        let line = lines.last_mut().expect("there is a line");
        if !line.trim().is_empty() && line.chars().count() + 1 + word.chars().count() > width {
            lines.push(format!("{indent}{word}"));
        } else {
            if !line.is_empty() {
                line.push(' ');
            }
            line.push_str(word);
        }
    }
    lines.join("\n")
}
