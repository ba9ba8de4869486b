//! One page that holds everything: no network, no other file, readable on a phone and on paper.

mod data;
mod matrix;
mod motions;
mod pictures;

use ropewalk_api::ropewalk::v1;

use crate::colour::Scale;
use crate::draw;
use crate::escape::{markup, script_json};
use crate::refusal::{count_words, severity_rank, severity_word};
use crate::run::Run;
use crate::sheet::{self, Sheet};

const STYLE: &str = include_str!("report.css");
/// Parts of the script in their order: what all share comes first.
const SCRIPT: [&str; 7] = [
    include_str!("wide.js"),
    include_str!("common.js"),
    include_str!("shape.js"),
    include_str!("tension_map.js"),
    include_str!("together.js"),
    include_str!("section.js"),
    include_str!("load_picture.js"),
];

/// Findings that the page lists.
const FINDINGS: usize = 200;

/// Load paths that the page draws.
const DOUBLINGS: usize = 6;

/// The page.
pub(crate) fn page(run: &Run, sheets: &[Sheet], scale: &Scale) -> String {
    let mut body = String::new();
    body.push_str(&head(run));
    body.push_str(&cautions(run, "Cautions"));
    body.push_str(&causes(run));
    body.push_str(&pictures::shape(run, scale));
    for sheet in sheets {
        body.push_str(&sheet::html(sheet));
        match sheet.file.as_ref() {
            // What a sheet tells in numbers is drawn behind it.
            "checks" => body.push_str(&pictures::tension_map(run)),
            "anchor-sets" => body.push_str(&pictures::together(run)),
            "losses" => body.push_str(&matrix::losses(run)),
            "motions" => body.push_str(&motions::sections(run)),
            "loads" => body.push_str(&pictures::load_picture(run)),
            "doubling" => body.push_str(&doubling(run)),
            _ => {}
        }
    }
    body.push_str(&pictures::section(run));
    body.push_str(&convergence(run));
    body.push_str(&drawings(run, scale));
    body.push_str(&findings(run));
    body.push_str(&origin(run));
    body.push_str(&cautions(run, "Cautions, once more"));
    format!(
        "<!doctype html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n\
         <meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n\
         <meta http-equiv=\"Content-Security-Policy\" content=\"default-src 'none'; style-src 'unsafe-inline'; \
         script-src 'unsafe-inline'; img-src data:\">\n\
         <title>{}: {}</title>\n<style>\n{STYLE}</style>\n</head>\n<body>\n{body}\
         <script type=\"application/json\" id=\"run-data\">{}</script>\n<script>\n{}</script>\n</body>\n</html>\n",
        markup(run.title()),
        sheet::verdict_word(run.summary.verdict()),
        script_json(&data::data(run, scale)),
        SCRIPT.concat()
    )
}

fn head(run: &Run) -> String {
    let verdict = run.summary.verdict();
    let class = match verdict {
        v1::Verdict::Passes => "good",
        v1::Verdict::NotJudged => "open",
        v1::Verdict::Exceeds => "bad",
        v1::Verdict::NoAnswer | v1::Verdict::Unspecified => "gone",
    };
    let share = |share: &Option<v1::Share>, of: &str| {
        let share = share.unwrap_or_default();
        format!(
            "<div><dt>{of}</dt><dd>{} <small>of {}</small></dd></div>",
            share.count, share.of
        )
    };
    let summary = &run.summary;
    let sizes = run.started.sizes.unwrap_or_default();
    let note = if run.brief.note.is_empty() {
        String::new()
    } else {
        format!("<p class=\"note\">{}</p>", markup(&run.brief.note))
    };
    format!(
        "<header>\n<p class=\"over\">{}</p>\n<h1>{}</h1>\n{note}\n\
         <div class=\"verdict {class}\"><strong>{}</strong><span>{}</span></div>\n\
         <dl class=\"facts\">{}{}{}{}{}<div><dt>nodes</dt><dd>{}</dd></div><div><dt>segments</dt><dd>{}</dd></div></dl>\n\
         <p class=\"audit\">{}<br>{}</p>\n<nav id=\"contents\" class=\"contents\" aria-label=\"Contents\"></nav>\n</header>\n",
        markup(&run.brief.id),
        markup(run.title()),
        sheet::verdict_word(verdict),
        markup(&sheet::why(run)),
        share(&summary.answered, "states answered"),
        share(&summary.audited, "audited"),
        share(&summary.judged, "judged"),
        share(&summary.passes, "pass"),
        // Only where motions were asked for.
        summary
            .motions
            .map_or(String::new(), |motions| share(&Some(motions), "motions followed")),
        sizes.nodes,
        sizes.segments,
        markup(&sheet::audit_line(run)),
        markup(&sheet::proof_line(run))
    )
}

fn cautions(run: &Run, title: &str) -> String {
    let items: String = run
        .summary
        .cautions
        .iter()
        .map(|caution| format!("<li>{}</li>", markup(caution)))
        .collect();
    format!("<aside class=\"cautions\"><h2>{title}</h2><ul>{items}</ul></aside>\n")
}

fn causes(run: &Run) -> String {
    let causes = sheet::causes(run);
    if causes.is_empty() {
        return String::new();
    }
    let items: String = causes
        .iter()
        .map(|cause| {
            let culprit = if cause.culprit.is_empty() {
                &cause.reason
            } else {
                &cause.culprit
            };
            let cure = if cause.cure.is_empty() {
                String::new()
            } else {
                format!("<br><em>Try:</em> {}", markup(&cause.cure))
            };
            format!(
                "<li><strong>{}</strong> {}{cure}<br><small>in {}</small></li>",
                markup(culprit),
                markup(&cause.message),
                markup(&cause.cases.join(", "))
            )
        })
        .collect();
    format!("<section id=\"causes\" class=\"causes\"><h2>Without an answer</h2><ol>{items}</ol></section>\n")
}

fn convergence(run: &Run) -> String {
    match draw::convergence(run) {
        None => String::new(),
        Some(plot) => format!(
            "<section id=\"convergence\"><h2>Convergence</h2><p class=\"note\">Largest out-of-balance force (N, log scale) over iterations.</p>\
             <div class=\"wide\">{plot}</div></section>\n"
        ),
    }
}

/// Load paths, the first ones; all lie beside the page.
fn doubling(run: &Run) -> String {
    let plots: String = run
        .load_paths()
        .iter()
        .take(DOUBLINGS)
        .map(|(state, path)| format!("<div class=\"wide\">{}</div>\n", draw::doubling(run, state, path)))
        .collect();
    format!("<section id=\"load-paths\" class=\"drawings\"><h2>Load paths</h2>\n{plots}</section>\n")
}

fn drawings(run: &Run, scale: &Scale) -> String {
    let mut text = String::new();
    let worst = sheet::by_need(run)
        .into_iter()
        .find(|state| state.answered() && state.id != "reference");
    for state in run.reference().into_iter().chain(worst) {
        if let Some(plan) = draw::plan(run, state, scale) {
            text.push_str(&format!("<div class=\"wide\">{plan}</div>\n"));
        }
    }
    if let Some(sections) = draw::sections(run) {
        text.push_str(&format!("<div class=\"wide\">{sections}</div>\n"));
    }
    let pages = run
        .reference()
        .map_or_else(Vec::new, |reference| draw::modes(run, reference));
    if let Some(page) = pages.first() {
        text.push_str(&format!("<div class=\"wide\">{page}</div>\n"));
    }
    if text.is_empty() {
        return text;
    }
    format!(
        "<section id=\"drawings\" class=\"drawings\"><h2>Drawings</h2><p class=\"note\">Drawn here: the reference state and the case with the worst ratio. More plans lie beside this page.</p>\n{text}</section>\n"
    )
}

fn findings(run: &Run) -> String {
    let findings = run.other_findings();
    if findings.is_empty() {
        return String::new();
    }
    let mut sorted: Vec<&v1::Finding> = findings.iter().collect();
    sorted.sort_by_key(|finding| (!finding.accepted_note.is_empty(), severity_rank(finding.severity())));
    let more = match sorted.len().saturating_sub(FINDINGS) {
        0 => String::new(),
        count => format!("<p class=\"note\">{count} more in results.json.</p>"),
    };
    let items: String = sorted
        .into_iter()
        .take(FINDINGS)
        .map(|finding| {
            let place = [&finding.case, &finding.path, &finding.id]
                .into_iter()
                .filter(|part| !part.is_empty());
            let place: Vec<&str> = place.map(String::as_str).collect();
            let cure = if finding.cure.is_empty() {
                String::new()
            } else {
                format!(" <em>{}</em>", markup(&finding.cure))
            };
            let accepted = if finding.accepted_note.is_empty() {
                String::new()
            } else {
                format!(
                    "<br><small>accepted in the brief: {}</small>",
                    markup(&finding.accepted_note)
                )
            };
            format!(
                "<li><strong>{}</strong> <small>{}</small> {}{cure}{accepted}</li>",
                severity_word(finding.severity()),
                markup(&place.join(" · ")),
                markup(&finding.message)
            )
        })
        .collect();
    format!(
        "<section id=\"findings\"><h2>Findings</h2><p class=\"note\">{}</p><ul>{items}</ul>{more}</section>\n",
        count_words(&findings)
    )
}

fn origin(run: &Run) -> String {
    let engine = run.started.engine.clone().unwrap_or_default();
    let settings = run.started.settings.unwrap_or_default();
    let sizes = run.started.sizes.unwrap_or_default();
    let steps = if settings.load_steps == 0 {
        "full load first".to_owned()
    } else {
        settings.load_steps.to_string()
    };
    let rows = [
        ("brief", run.brief.id.clone()),
        ("digest of the brief", run.started.digest.clone()),
        (
            "lengths",
            if run.started.frozen {
                "fixed, from a frozen brief"
            } else {
                "found by this run"
            }
            .to_owned(),
        ),
        ("engine", format!("{}, contract {}", engine.version, engine.contract)),
        ("instruction set", engine.instruction_set),
        ("load steps", steps),
        ("tolerance", format!("{:e}", settings.tolerance)),
        ("iterations allowed", settings.max_iterations.to_string()),
        ("gravity (m/s²)", settings.gravity_m_per_s2.to_string()),
        ("unknown displacements", sizes.unknowns.to_string()),
    ];
    let rows: String = rows
        .iter()
        .map(|(name, value)| format!("<tr><th scope=\"row\">{name}</th><td>{}</td></tr>", markup(value)))
        .collect();
    format!(
        "<section id=\"origin\"><h2>Where this comes from</h2><div class=\"wide\"><table class=\"pairs\">{rows}</table></div></section>\n"
    )
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::run::sample::{self, Names};

    fn page_of(run: &Run) -> String {
        let scale = Scale::over([14e3, 25e3]);
        let mut sheets = vec![
            sheet::checks(run),
            sheet::ropes(run),
            sheet::cases(run),
            sheet::anchor_sets(run),
        ];
        sheets.extend(
            [sheet::losses(run), sheet::loads(run), sheet::doubling(run)]
                .into_iter()
                .flatten(),
        );
        page(run, &sheets, &scale)
    }

    #[test]
    fn ids_cannot_write_on_the_page() {
        let mut run = sample::run_named(Names {
            middle: "m</script><script>alert(1)</script>",
            rope: "\"><img src=x onerror=alert(1)>",
            case: "<b>'c'</b>",
            title: "<script>alert(2)</script>",
        });
        let nasty = "<img src=x>".to_owned();
        run.losses = vec![v1::LossRow {
            removed: vec![nasty.clone()],
            worst: vec![v1::LossCell {
                member: nasty.clone(),
                share_of_breaking: Some(0.7),
                case: "\"><b>".to_owned(),
                ..Default::default()
            }],
            ..Default::default()
        }];
        run.loads = vec![v1::LoadPicture {
            action: nasty,
            ..Default::default()
        }];
        sample::give_path(&mut run, &[0.0, 1.0, 1.5]);
        let page = page_of(&run);
        assert!(page.contains("loss-matrix") && page.contains("load-picture") && page.contains("load-paths"));
        assert_eq!(page.matches("<script").count(), 2, "only the page's own two");
        assert_eq!(page.matches("</script").count(), 2);
        assert!(!page.contains("<img") && !page.contains("<b>"));
    }

    #[test]
    fn the_page_needs_nothing_else_and_shows_the_cautions_twice() {
        let page = page_of(&sample::run());
        assert_eq!(page.matches("Ropewalk is an aid.").count(), 2);
        let page = page.replace("http://www.w3.org/2000/svg", "");
        for outside in ["http:", "https:", "src=", "@import", "url("] {
            assert!(!page.contains(outside), "{outside}");
        }
        assert!(page.contains(&"00".repeat(32)));
    }
}
