//! The loss matrix: what is lost against what is left, each cell with its number beside its colour.

use ropewalk_api::ropewalk::v1;

use crate::colour;
use crate::escape::markup;
use crate::number::{percent, three};
use crate::run::Run;
use crate::sheet;

/// Losses that the page lists.
const ROWS: usize = 200;

/// The matrix; empty where nothing is lost.
pub(super) fn losses(run: &Run) -> String {
    let rows = sheet::losses_by_need(run);
    let columns = sheet::survivors(run);
    if rows.is_empty() || columns.is_empty() {
        return String::new();
    }
    let heads: String = columns
        .iter()
        .map(|member| format!("<th scope=\"col\" class=\"r\">{}</th>", markup(member)))
        .collect();
    let lines: String = rows.iter().take(ROWS).map(|row| line(row, &columns)).collect();
    let more = match rows.len().saturating_sub(ROWS) {
        0 => String::new(),
        count => format!("<p class=\"note\">{count} more rows in losses.csv.</p>"),
    };
    format!(
        "<section id=\"loss-matrix\"><h2>Loss matrix</h2>\n<p class=\"note\">Rows: what is lost, the worst first. Columns: the members that \
         losses work hardest; cell: largest share of the breaking force, %. An empty cell: not among the 20 worst of that loss. All \
         cells are in loss-cells.csv.</p>\n<div class=\"wide\"><table class=\"matrix\"><thead><tr><th scope=\"col\">lost</th>{heads}\
         <th scope=\"col\" class=\"r\">moves <small>mm</small></th><th scope=\"col\" class=\"r\">slack</th>\
         <th scope=\"col\">mechanism</th><th scope=\"col\">answer</th></tr></thead><tbody>\n{lines}</tbody></table></div>{more}</section>\n"
    )
}

fn line(row: &v1::LossRow, columns: &[&str]) -> String {
    let cells: String = columns
        .iter()
        .map(|member| {
            let cell = row.worst.iter().find(|cell| cell.member == *member);
            match cell.and_then(|cell| cell.share_of_breaking.map(|share| (cell, share))) {
                None if row.removed.iter().any(|lost| lost == member) => "<td class=\"none\">lost</td>".to_owned(),
                None => "<td></td>".to_owned(),
                Some((cell, share)) => format!(
                    "<td class=\"r\" style=\"{}\" title=\"{} kN in {}\">{}</td>",
                    paint(share),
                    three(cell.force_n / 1e3),
                    markup(&cell.case),
                    percent(share)
                ),
            }
        })
        .collect();
    let none = row.unanswered_total;
    let mark = if none > 0 { "gone" } else { "plain" };
    let answer = if none > 0 {
        format!("none in {none} of {}", row.cases)
    } else {
        "all".to_owned()
    };
    let moves = if row.cases > none {
        three(row.largest_movement_m * 1e3)
    } else {
        "–".to_owned()
    };
    let mechanism = match row.loose_nodes {
        0 => "no".to_owned(),
        nodes => format!("yes, {nodes} nodes"),
    };
    format!(
        "<tr class=\"{mark}\"><td>{}</td>{cells}<td class=\"r\">{moves}</td><td class=\"r\">{}</td><td>{mechanism}</td><td>{answer}</td></tr>\n",
        markup(&sheet::lost_words(row)),
        row.slack_segments
    )
}

/// Colours of a cell: pale for little, dark for much, red beyond the breaking force; letters that can be read on it.
fn paint(share: f64) -> String {
    if share > 1.0 {
        return "background:#b3261e;color:#fff;font-weight:600".to_owned();
    }
    let ink = if share > 0.55 { "#fff" } else { "#1d2733" };
    format!("background:{};color:{ink}", colour::at(share))
}
