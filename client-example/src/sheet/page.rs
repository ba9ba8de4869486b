//! Sheets on a page.

use super::{Cell, Place, Sheet};
use crate::escape;

/// Rows of a sheet that the page shows.
const ROWS: usize = 400;

/// The sheet as a table with its title.
pub(crate) fn html(sheet: &Sheet) -> String {
    let columns: Vec<usize> = (0..sheet.heads.len())
        .filter(|&column| sheet.heads[column].place != Place::FileOnly)
        .collect();
    let right: Vec<bool> = columns
        .iter()
        .map(|&column| sheet.rows.iter().any(|row| row.cells[column].is_number()))
        .collect();
    let long: Vec<bool> = columns
        .iter()
        .map(|&column| {
            sheet
                .rows
                .iter()
                .any(|row| matches!(&row.cells[column], Cell::Text(text) if text.len() > 22))
        })
        .collect();
    let class = |at: usize| match (right[at], long[at]) {
        (true, _) => " class=\"r\"",
        (false, true) => " class=\"long\"",
        (false, false) => "",
    };
    let mut text = format!(
        "<section id=\"{}\"><h2>{}</h2>\n",
        sheet.file,
        escape::markup(&sheet.title)
    );
    if !sheet.note.is_empty() {
        text.push_str(&format!("<p class=\"note\">{}</p>\n", escape::markup(sheet.note)));
    }
    text.push_str("<div class=\"wide\"><table><thead><tr>");
    for (at, &column) in columns.iter().enumerate() {
        let head = &sheet.heads[column];
        let unit = if head.unit.is_empty() {
            String::new()
        } else {
            format!(" <small>{}</small>", escape::markup(head.unit))
        };
        text.push_str(&format!(
            "<th scope=\"col\"{}>{}{unit}</th>",
            class(at),
            escape::markup(head.title)
        ));
    }
    text.push_str("</tr></thead><tbody>\n");
    for row in sheet.rows.iter().take(ROWS) {
        text.push_str(&format!("<tr class=\"{}\">", row.mark.name()));
        for (at, &column) in columns.iter().enumerate() {
            let cell = &row.cells[column];
            if let Cell::Range(range) = cell {
                text.push_str(&bar(*range));
                continue;
            }
            let empty = if *cell == Cell::Empty {
                " class=\"none\""
            } else {
                class(at)
            };
            text.push_str(&format!("<td{empty}>{}</td>", escape::markup(&cell.shown())));
        }
        text.push_str("</tr>\n");
    }
    text.push_str("</tbody></table></div>\n");
    if sheet.rows.is_empty() {
        text.push_str("<p class=\"note\">Nothing to list.</p>\n");
    }
    if sheet.rows.len() > ROWS {
        text.push_str(&format!(
            "<p class=\"note\">{} more rows in {}.csv.</p>\n",
            sheet.rows.len() - ROWS,
            sheet.file
        ));
    }
    text.push_str("</section>\n");
    text
}

/// A bar from least to most with a tick at the reference.
fn bar(range: [f64; 3]) -> String {
    let [least, reference, most] = range.map(|share| share.clamp(0.0, 1.0) * 100.0);
    format!(
        "<td class=\"range\"><span class=\"rail\"><i style=\"left:{least:.1}%;width:{:.1}%\"></i>\
         <b style=\"left:{reference:.1}%\"></b></span></td>",
        most - least
    )
}
