//! Motions on the page: for each its lines, its drawings and its tables.

use crate::draw;
use crate::escape::markup;
use crate::run::{MotionRun, Run};
use crate::sheet::{self, Told};

/// Drawings of all motions that the page holds; all lie beside it.
const DRAWINGS: usize = 24;

/// The motions one after the other.
pub(super) fn sections(run: &Run) -> String {
    let mut room = DRAWINGS;
    run.motions
        .iter()
        .map(|motion| section(run, motion, &mut room))
        .collect()
}

fn section(run: &Run, motion: &MotionRun, room: &mut usize) -> String {
    let lines: String = sheet::motion_lines(run, motion)
        .iter()
        .map(|(name, words)| format!("<tr><th scope=\"row\">{name}</th><td>{}</td></tr>", markup(words)))
        .collect();
    let drawings = draw::motion(run, motion);
    let shown = drawings.len().min(*room);
    *room -= shown;
    let pictures: String = (drawings.iter().take(shown))
        .map(|(_, drawing)| format!("<div class=\"wide\">{drawing}</div>\n"))
        .collect();
    let more = match drawings.len() - shown {
        0 => String::new(),
        count => format!("<p class=\"note\">{count} more drawings lie beside this page.</p>\n"),
    };
    let tables: String = sheet::motion_sheets(run, motion, Told::Telling)
        .iter()
        .map(sheet::html)
        .collect();
    format!(
        "<section id=\"motion-{}\" class=\"drawings\"><h2>Motion {}</h2>\n<div class=\"wide\"><table class=\"pairs\">{lines}</table></div>\n\
         {pictures}{more}</section>\n{tables}",
        motion.name,
        markup(&motion.id)
    )
}
