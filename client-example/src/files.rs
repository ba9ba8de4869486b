//! The folder of results.

use std::collections::BTreeSet;
use std::fs;
use std::io::{self, Write as _};
use std::path::{Path, PathBuf};

use prost::Message as _;
use serde_json::{Map, Value, json};

use crate::brief_file::{self, message_json};
use crate::colour::Scale;
use crate::escape::{csv_text, free_file_name};
use crate::run::{Column, Run, State, record};
use crate::sheet::{self, Sheet};
use crate::{draw, json_text, motion_files, report};

/// Plans that are drawn; beyond it those without answer and with the worst ratios count.
const PLANS: usize = 60;

/// Names of the files that a run wrote, so that the next one into the same folder leaves none of them behind.
const LIST: &str = "files.txt";

/// What was written.
#[derive(Debug)]
pub(crate) struct Written {
    pub(crate) files: usize,
    /// States without a plan, for their number.
    pub(crate) plans_left_out: usize,
}

/// Writes all files of a run into a folder, which is made where it is missing.
///
/// # Errors
/// The file that could not be written, and why.
pub(crate) fn write(run: &Run, folder: &Path) -> Result<Written, (PathBuf, io::Error)> {
    fs::create_dir_all(folder).map_err(|error| (folder.to_owned(), error))?;
    let mut count = 1;
    let mut list = begin_list(folder)?;
    let mut put = |name: &str, content: &[u8]| -> Result<(), (PathBuf, io::Error)> {
        // Listed before it is there: a run that is stopped while it writes leaves nothing unlisted.
        writeln!(list, "{name}").map_err(|error| (folder.join(LIST), error))?;
        let path = folder.join(name);
        count += 1;
        fs::write(&path, content).map_err(|error| (path, error))
    };
    put("brief.json", brief_file::to_json(&run.brief).as_bytes())?;
    put(record::FILE, &run.record)?;
    put("results.json", results(run).as_bytes())?;
    put("nodes.csv", nodes(run).as_bytes())?;
    put("segments.csv", segments(run).as_bytes())?;
    let sheets = all_sheets(run);
    for sheet in &sheets {
        put(&format!("{}.csv", sheet.file), sheet.csv().as_bytes())?;
    }
    let scale = scale(run);
    let mut names = BTreeSet::new();
    let drawn: Vec<&State> = run
        .reference()
        .into_iter()
        .chain(sheet::by_need(run).into_iter().filter(|state| state.id != "reference"))
        .collect();
    for state in drawn.iter().take(PLANS) {
        if let Some(plan) = draw::plan(run, state, &scale) {
            put(
                &format!("plan-{}.svg", free_file_name(&state.id, &mut names)),
                plan.as_bytes(),
            )?;
        }
    }
    let mut names = BTreeSet::new();
    for (state, path) in run.load_paths().into_iter().take(PLANS) {
        let name = free_file_name(&state.id, &mut names);
        put(
            &format!("doubling-{name}.svg"),
            draw::doubling(run, state, &path).as_bytes(),
        )?;
    }
    if let Some(sections) = draw::sections(run) {
        put("sections.svg", sections.as_bytes())?;
    }
    let mut names = BTreeSet::new();
    for state in drawn.iter().take(PLANS) {
        let pages = draw::modes(run, state);
        if pages.is_empty() {
            continue;
        }
        let name = free_file_name(&state.id, &mut names);
        for (number, page) in (1..).zip(&pages) {
            put(&format!("modes-{name}-{number}.svg"), page.as_bytes())?;
        }
    }
    for motion in &run.motions {
        for sheet in sheet::motion_sheets(run, motion, sheet::Told::All) {
            put(&format!("{}.csv", sheet.file), sheet.csv().as_bytes())?;
        }
        for (name, text) in motion_files::tables(run, motion) {
            put(&name, text.as_bytes())?;
        }
        for (name, drawing) in draw::motion(run, motion) {
            put(&format!("motion-{}-{name}.svg", motion.name), drawing.as_bytes())?;
        }
    }
    // These are long, and the page shows what they tell in other ways.
    let on_page: Vec<Sheet> = sheets
        .into_iter()
        .filter(|sheet| !["anchors", "loss-cells", "panel-loads"].contains(&sheet.file.as_ref()))
        .collect();
    put("report.html", report::page(run, &on_page, &scale).as_bytes())?;
    Ok(Written {
        files: count,
        plans_left_out: drawn.len().saturating_sub(PLANS),
    })
}

/// Removes what the list of an earlier run names, and begins the list anew. Files that no list names are left alone.
fn begin_list(folder: &Path) -> Result<fs::File, (PathBuf, io::Error)> {
    let list = folder.join(LIST);
    match fs::read_to_string(&list) {
        Ok(names) => {
            for name in names.lines().filter(|name| is_ours(name)) {
                let path = folder.join(name);
                match fs::remove_file(&path) {
                    Err(error) if error.kind() != io::ErrorKind::NotFound => return Err((path, error)),
                    _ => {}
                }
            }
        }
        Err(error) if error.kind() == io::ErrorKind::NotFound => {}
        Err(error) => return Err((list, error)),
    }
    fs::File::create(&list).map_err(|error| (list, error))
}

/// Whether a run may have written a file of that name: in the folder itself, of a kind that it writes.
fn is_ours(name: &str) -> bool {
    let path = Path::new(name);
    let plain = path.file_name().is_some_and(|last| last == path.as_os_str());
    let kind = path.extension().and_then(|ending| ending.to_str());
    plain && kind.is_some_and(|kind| ["binpb", "csv", "html", "json", "svg"].contains(&kind))
}

/// All sheets, in the order in which they are read.
pub(crate) fn all_sheets(run: &Run) -> Vec<Sheet> {
    let mut sheets = vec![
        sheet::checks(run),
        sheet::cases(run),
        sheet::ropes(run),
        sheet::struts(run),
        sheet::anchor_peaks(run),
        sheet::anchor_sets(run),
        sheet::anchors(run),
        sheet::sums(run),
    ];
    // Of interest only where it was asked for.
    if let Some(sizing) = &run.sizing {
        sheets.extend([sheet::sized(sizing), sheet::sizing_rounds(sizing)]);
    }
    if !run.diagnoses.is_empty() {
        sheets.push(sheet::diagnoses(run));
    }
    let if_any = [
        sheet::modes(run),
        sheet::motions(run),
        sheet::shape(run),
        sheet::judgements(run),
        sheet::slides(run),
        sheet::losses(run),
        sheet::loss_cells(run),
        sheet::effects(run),
        sheet::over_linearity(run),
        sheet::doubling(run),
        sheet::loads(run),
        sheet::panel_loads(run),
    ];
    sheets.extend(if_any.into_iter().flatten());
    sheets
}

/// One scale for all states, so that colours can be compared.
fn scale(run: &Run) -> Scale {
    let ropes = run.n_rope_segments();
    let answered = run.states.iter().filter(|state| state.answered());
    Scale::over(
        answered
            .filter_map(|state| Some(run.axial_forces(state)?[..ropes].to_vec()))
            .flatten(),
    )
}

/// Everything, as the contract names it, but for frames of motions, which are in tables of their own; wall times are left out,
/// so that equal runs give equal files.
fn results(run: &Run) -> String {
    let columns = |columns: &std::collections::BTreeMap<String, Column>| -> Value {
        let entries = columns.iter().map(|(name, column)| {
            let value = json!({
                "unit": column.unit, "over": column.over.as_str_name(), "components": column.components,
                "baseline": column.baseline, "values": column.values,
            });
            (name.clone(), value)
        });
        Value::Object(entries.collect::<Map<_, _>>())
    };
    let states: Vec<Value> = run
        .states
        .iter()
        .map(|state| {
            json!({
                "id": state.id, "in_words": state.in_words, "sets": state.sets,
                "summary": message_json("CaseSummary", &state.summary.encode_to_vec()),
                "columns": columns(&state.columns),
            })
        })
        .collect();
    let segments: Vec<Value> = (0..run.segments.len())
        .map(|at| {
            json!([
                run.member_id(at),
                run.nodes[run.segments[at].nodes[0]],
                run.nodes[run.segments[at].nodes[1]]
            ])
        })
        .collect();
    let ends: Vec<Value> = run
        .ends
        .iter()
        .map(|end| json!([run.member_id(end.segment), run.nodes[end.node]]))
        .collect();
    let value = json!({
        "started": message_json("Started", &run.started.encode_to_vec()),
        "summary": message_json("Summary", &run.summary.encode_to_vec()),
        "findings": run.findings.iter().map(|finding| message_json("Finding", &finding.encode_to_vec())).collect::<Vec<_>>(),
        "nodes": run.nodes,
        "cables": run.cables,
        "struts": run.struts,
        "segments": segments,
        "supports": run.supports.iter().map(|&node| run.nodes[node].as_str()).collect::<Vec<_>>(),
        "ends": ends,
        "cases": run.case_ids,
        "states": states,
        "design_effects": run.effects.iter().map(|effect| {
            json!({
                "effect": message_json("DesignEffect", &effect.effect.encode_to_vec()),
                "columns": columns(&effect.columns),
            })
        }).collect::<Vec<_>>(),
        "shape_report": run.shape_report.as_ref().map(|report| message_json("ShapeReport", &report.encode_to_vec())),
        "losses": run.losses.iter().map(|row| message_json("LossRow", &row.encode_to_vec())).collect::<Vec<_>>(),
        "modes": run.modes.iter().map(|part| message_json("StateModes", &part.encode_to_vec())).collect::<Vec<_>>(),
        "motions": run.motions.iter().map(|motion| {
            json!({
                "id": motion.id,
                "begin": motion.begin.as_ref().map(|begin| message_json("MotionBegin", &begin.encode_to_vec())),
                "shown": message_json("MotionShown", &motion.shown.encode_to_vec()),
                "waves": motion.waves.iter().map(|waves| message_json("RopeWaves", &waves.encode_to_vec())).collect::<Vec<_>>(),
                "events": motion.events.iter().map(|event| message_json("MotionEvent", &event.encode_to_vec())).collect::<Vec<_>>(),
                "spectra": motion.spectra.iter().map(|spectrum| message_json("MotionSpectrum", &spectrum.encode_to_vec())).collect::<Vec<_>>(),
                "end": motion.end.as_ref().map(|end| message_json("MotionEnd", &end.encode_to_vec())),
                "columns": columns(&motion.columns),
            })
        }).collect::<Vec<_>>(),
        "panels": run.panels.iter().map(|panel| message_json("PanelEntry", &panel.encode_to_vec())).collect::<Vec<_>>(),
        "load_pictures": run.loads.iter().map(|picture| message_json("LoadPicture", &picture.encode_to_vec())).collect::<Vec<_>>(),
        "envelope": columns(&run.envelope),
        "broken_off": run.broken_off,
    });
    let mut text = json_text::pretty(&value);
    text.push('\n');
    text
}

/// Nodes in every state that has positions, in SI units with all digits. `answered` 0 marks the last good state of a case
/// without answer, `loose` 1 a place that means nothing.
fn nodes(run: &Run) -> String {
    let mut text = String::from("case,answered,node,x_m,y_m,z_m,dx_m,dy_m,dz_m,loose\r\n");
    for state in &run.states {
        let (Some(positions), Some(moves)) = (state.vectors("position_m"), state.vectors("displacement_m")) else {
            continue;
        };
        let loose: BTreeSet<&str> = state.summary.loose_nodes.iter().map(String::as_str).collect();
        let case = csv_text(&state.id);
        for ((id, place), step) in run.nodes.iter().zip(&positions).zip(&moves) {
            text.push_str(&format!(
                "{case},{},{},{},{},{},{},{},{},{}\r\n",
                u8::from(state.answered()),
                csv_text(id),
                place[0],
                place[1],
                place[2],
                step[0],
                step[1],
                step[2],
                u8::from(loose.contains(id.as_str()))
            ));
        }
    }
    text
}

/// Segments in every state that has forces, in SI units with all digits; tension positive.
fn segments(run: &Run) -> String {
    let mut text = String::from("case,answered,member,from,to,axial_force_n,slack,length_m,stretch\r\n");
    for state in &run.states {
        let Some(forces) = run.axial_forces(state) else {
            continue;
        };
        let slack = run.slack(state);
        let told = |name: &str, at: usize| {
            state
                .numbers(name)
                .and_then(|numbers| numbers.get(at))
                .map(ToString::to_string)
                .unwrap_or_default()
        };
        let case = csv_text(&state.id);
        for (at, segment) in run.segments.iter().enumerate() {
            text.push_str(&format!(
                "{case},{},{},{},{},{},{},{},{}\r\n",
                u8::from(state.answered()),
                csv_text(run.member_id(at)),
                csv_text(&run.nodes[segment.nodes[0]]),
                csv_text(&run.nodes[segment.nodes[1]]),
                forces[at],
                u8::from(slack[at]),
                told("length_m", at),
                told("stretch", at)
            ));
        }
    }
    text
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::escape::file_name;
    use crate::run::motion_sample;
    use crate::run::sample::{self, Names};

    #[test]
    fn a_later_run_leaves_no_file_of_an_earlier_one_and_touches_no_other() {
        let base = std::env::temp_dir().join(format!("ropewalk-stale-{}", std::process::id()));
        let folder = base.join("out");
        write(&sample::run(), &folder).unwrap();
        let plan = folder.join("plan-full-snow.svg");
        assert!(plan.exists());
        for own in ["notes.txt", "mine.svg", "../outside.csv"] {
            fs::write(folder.join(own), "mine").unwrap();
        }
        // A list that was tampered with reaches nothing outside of the folder, and no kind of file that is never written.
        let mut list = fs::read_to_string(folder.join(LIST)).unwrap();
        list.push_str("../outside.csv\nnotes.txt\n..\n/\n\ngone.svg\n");
        fs::write(folder.join(LIST), list).unwrap();
        let names = Names {
            middle: "m",
            rope: "r",
            case: "wind",
            title: "t",
        };
        write(&sample::run_named(names), &folder).unwrap();
        assert!(!plan.exists(), "a plan of another run stays");
        assert!(folder.join("plan-wind.svg").exists());
        for own in ["notes.txt", "mine.svg", "../outside.csv"] {
            assert!(folder.join(own).exists(), "{own} is gone");
        }
        fs::remove_dir_all(base).unwrap();
    }

    #[test]
    fn a_motion_is_written_inside_the_folder_and_small() {
        let base = std::env::temp_dir().join(format!("ropewalk-motion-{}", std::process::id()));
        let folder = base.join("out");
        write(&motion_sample::run_named("../gust & <b>"), &folder).unwrap();
        let listed = fs::read_to_string(folder.join(LIST)).unwrap();
        for name in listed.lines().filter(|name| name.starts_with("motion")) {
            assert!(is_ours(name) && folder.join(name).exists(), "{name}");
        }
        let base_name = format!("motion-{}", file_name("../gust & <b>"));
        for end in [
            "frames.csv",
            "nodes.csv",
            "rope-main.csv",
            "events.csv",
            "waves.csv",
            "peaks-ropes.csv",
            "spectrum.csv",
            "spectrum-peaks.csv",
            "watched-1.svg",
            "energy.svg",
            "rope-main.svg",
            "spectra-1.svg",
        ] {
            let name = format!("{base_name}-{end}");
            assert!(listed.lines().any(|known| known == name), "no {name} in {listed}");
        }
        for name in listed.lines().filter(|name| name.ends_with(".svg")) {
            let drawing = fs::read_to_string(folder.join(name)).unwrap();
            assert!(drawing.len() < 300_000, "{name} has {} bytes", drawing.len());
            assert!(
                !drawing.contains("<b>") && !drawing.contains("NaN") && !drawing.contains("inf"),
                "{name}"
            );
        }
        let page = fs::read_to_string(folder.join("report.html")).unwrap();
        assert!(page.contains("<h2>Motion ../gust &amp; &lt;b&gt;</h2>") && !page.contains("<b>"));
        assert_eq!(page.matches("Motions: an aid.").count(), 2);
        fs::remove_dir_all(base).unwrap();
    }

    #[test]
    fn equal_runs_give_equal_files() {
        let base = std::env::temp_dir().join(format!("ropewalk-files-{}", std::process::id()));
        let names = Names {
            middle: "m",
            rope: "=cmd()",
            case: "../../escape",
            title: "t",
        };
        for folder in ["a", "b"] {
            let written = write(&sample::run_named(names), &base.join(folder)).unwrap();
            assert_eq!(
                written.files,
                5 + 8 + 3 + 1 + 1 + 1,
                "brief, record, tables, sheets, plans, sections, page, list"
            );
        }
        let mut listed: Vec<_> = fs::read_dir(base.join("a"))
            .unwrap()
            .map(|entry| entry.unwrap().file_name())
            .collect();
        listed.sort();
        assert!(listed.iter().any(|name| name == "plan-_.._escape.svg"), "{listed:?}");
        for name in listed {
            let (one, two) = (
                fs::read(base.join("a").join(&name)).unwrap(),
                fs::read(base.join("b").join(&name)).unwrap(),
            );
            assert!(one == two, "{} differs", name.display());
        }
        let segments = fs::read_to_string(base.join("a/segments.csv")).unwrap();
        assert!(segments.contains("\"'=cmd()\""), "{segments}");
        fs::remove_dir_all(base).unwrap();
    }
}
