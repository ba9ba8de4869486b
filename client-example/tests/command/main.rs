//! The built program, as a user starts it: it brings its engine along, and what it leaves behind is read back.

mod broken;
mod compare;
mod support;

use std::collections::HashMap;
use std::fs;

use support::{Folder, attributes, brief, command, csv, finish, json, ropewalk};

#[test]
fn the_demo_shows_a_case_without_answer_and_writes_everything() {
    let folder = Folder::new("demo");
    let ended = ropewalk(&["demo", "--out", folder.path("demo").to_str().unwrap()]);
    assert_eq!(ended.code, 3, "{}", ended.told);
    assert!(
        ended
            .out
            .contains("NO ANSWER: 1 of 12 states without an answer: \"star-on-prop\""),
        "{}",
        ended.out
    );
    for wanted in [
        "Verdict sheet",
        "Rope ledger",
        "Anchor sheet",
        "Case ledger",
        "Audit: 11 of 11",
        "Cautions",
    ] {
        assert!(ended.out.contains(wanted), "{wanted} is missing in\n{}", ended.out);
    }
    assert!(
        ended.told.contains("star-on-prop: no answer:"),
        "progress on standard error: {}",
        ended.told
    );

    let results = json(&folder.path("demo/results.json"));
    let states = results["states"].as_array().unwrap();
    let outcome = |id: &str| {
        let state = states.iter().find(|state| state["id"] == id).unwrap();
        state["summary"]["outcome"].as_str().unwrap_or_default().to_owned()
    };
    assert_eq!(outcome("star-on-prop"), "CASE_OUTCOME_NO_EQUILIBRIUM");
    assert!(states.len() >= 9 && results["nodes"].as_array().unwrap().len() >= 200);
    let slack = |id: &str| {
        let state = states.iter().find(|state| state["id"] == id).unwrap();
        state["summary"]["slack_segments"].as_u64().unwrap_or(0)
    };
    assert!(slack("full-snow") > 0, "snow slackens bracing ropes");
    assert_eq!(slack("cold-snap"), 0);

    for name in [
        "nodes",
        "segments",
        "cables",
        "struts",
        "anchors",
        "anchor-peaks",
        "cases",
        "checks",
        "sums",
    ] {
        assert!(
            csv(&folder.path(&format!("demo/{name}.csv"))).len() > 1,
            "{name}.csv is empty"
        );
    }
    let page = fs::read_to_string(folder.path("demo/report.html")).unwrap();
    for outside in ["src=", "@import", "https:", "<link"] {
        assert!(!page.contains(outside), "the page needs {outside}");
    }
}

#[test]
fn numbers_in_drawings_are_those_of_the_tables() {
    let folder = Folder::new("drawings");
    ropewalk(&["demo", "--out", folder.path("demo").to_str().unwrap()]);

    // Column by name, so that the test reads the tables as a program of the office would.
    let segments = csv(&folder.path("demo/segments.csv"));
    let column = |table: &[Vec<String>], name: &str| table[0].iter().position(|head| head == name).unwrap();
    let at = ["case", "member", "from", "to", "axial_force_n", "slack"].map(|name| column(&segments, name));
    let mut forces: HashMap<[&str; 4], (&str, &str)> = HashMap::new();
    for row in &segments[1..] {
        let key = [
            row[at[0]].as_str(),
            row[at[1]].as_str(),
            row[at[2]].as_str(),
            row[at[3]].as_str(),
        ];
        forces.insert(key, (row[at[4]].as_str(), row[at[5]].as_str()));
    }
    let anchors = csv(&folder.path("demo/anchors.csv"));
    let pulls: HashMap<(&str, &str), &str> = anchors[1..]
        .iter()
        .map(|row| {
            let cell = |name: &str| row[column(&anchors, name)].as_str();
            ((cell("case"), cell("anchor")), cell("pull (kN)"))
        })
        .collect();

    let mut compared = 0;
    for case in ["reference", "full-snow", "design-uplift", "cold-snap"] {
        let plan = fs::read_to_string(folder.path(&format!("demo/plan-{case}.svg"))).unwrap();
        for line in attributes(&plan, "data-from") {
            let member = line.get("data-rope").or(line.get("data-strut")).unwrap();
            let key = [
                case,
                member.as_str(),
                line["data-from"].as_str(),
                line["data-to"].as_str(),
            ];
            let (force, slack) = forces[&key];
            assert_eq!(
                (line["data-axial-force-n"].as_str(), line["data-slack"].as_str()),
                (force, slack),
                "{key:?}"
            );
            compared += 1;
        }
        for label in attributes(&plan, "data-pull-kn") {
            assert_eq!(label["data-pull-kn"], pulls[&(case, label["data-anchor"].as_str())]);
            let shown: f64 = label["text"].trim_end_matches(" kN").parse().unwrap();
            let exact: f64 = label["data-pull-kn"].parse().unwrap();
            assert!(
                (shown - exact).abs() <= 0.005 * exact.abs() + 1e-9,
                "{shown} is written for {exact}"
            );
            compared += 1;
        }
        for label in attributes(&plan, "data-of") {
            let shown: f64 = label["text"].parse().unwrap();
            let exact = label["data-axial-force-n"].parse::<f64>().unwrap() / 1e3;
            // Three digits: half a unit of the third; nothing is shown below a millionth.
            assert!(
                (shown - exact).abs() <= 0.005 * exact.abs() + 1e-6,
                "{shown} is written for {exact}"
            );
            let known = segments[1..].iter().any(|row| {
                row[at[0]] == case && row[at[1]] == label["data-of"] && row[at[4]] == label["data-axial-force-n"]
            });
            assert!(known, "{label:?}");
            compared += 1;
        }
    }
    assert!(compared > 2000, "{compared} numbers");

    let nodes = csv(&folder.path("demo/nodes.csv"));
    let at = ["case", "node", "z_m", "dx_m", "dy_m", "dz_m"].map(|name| column(&nodes, name));
    let places: HashMap<(&str, &str), &Vec<String>> = nodes[1..]
        .iter()
        .map(|row| ((row[at[0]].as_str(), row[at[1]].as_str()), row))
        .collect();
    let sections = fs::read_to_string(folder.path("demo/sections.svg")).unwrap();
    let mut compared = 0;
    for point in attributes(&sections, "data-node") {
        let row = places[&(point["data-case"].as_str(), point["data-node"].as_str())];
        if let Some(height) = point.get("data-z-m") {
            assert_eq!(*height, row[at[2]]);
        } else {
            let [x, y, z] = [3, 4, 5].map(|part| row[at[part]].parse::<f64>().unwrap());
            let moved = (x * x + y * y + z * z).sqrt() * 1e3;
            let told: f64 = point["data-moved-mm"].parse().unwrap();
            assert!((moved - told).abs() <= 1e-7 * moved, "{told} for {moved}");
        }
        compared += 1;
    }
    assert!(compared > 100, "{compared} points");
}

/// Pulls of all plans of the demo: no two overlap, none runs off the sheet, into the foot or over an anchor.
#[test]
fn pulls_stand_clear_of_each_other() {
    let folder = Folder::new("clear");
    ropewalk(&["demo", "--out", folder.path("demo").to_str().unwrap()]);
    let mut plans = 0;
    for entry in fs::read_dir(folder.path("demo")).unwrap() {
        let path = entry.unwrap().path();
        let name = path.file_name().unwrap().to_str().unwrap().to_owned();
        if !name.starts_with("plan-") || name == "plan-star-on-prop.svg" {
            continue;
        }
        plans += 1;
        let plan = fs::read_to_string(&path).unwrap();
        let number = |line: &HashMap<String, String>, of: &str| line[of].parse::<f64>().unwrap();
        let lines = plan.lines().filter(|line| line.contains("class=\"pull\""));
        // Text of 13 px: 7.2 px a letter, two lines 15 px apart.
        let boxes: Vec<[f64; 4]> = lines
            .map(|line| {
                let text = &attributes(line, "paint-order")[0];
                let (x, y) = (number(text, "x"), number(text, "y"));
                let letters = attributes(line, "data-pull-kn")[0]["text"].len()
                    + 1
                    + attributes(line, "data-pull-kn")[0]["data-anchor"].len();
                let half = 3.6 * f64::from(u32::try_from(letters).unwrap());
                [x - half, y - 11.0, x + half, y + 17.0]
            })
            .collect();
        assert_eq!(boxes.len(), 11, "{name}");
        let bottom = attributes(&plan, "viewBox")[0]["viewBox"]
            .rsplit(' ')
            .next()
            .unwrap()
            .parse::<f64>()
            .unwrap();
        let apart = |a: &[f64; 4], b: &[f64; 4]| a[2] <= b[0] || b[2] <= a[0] || a[3] <= b[1] || b[3] <= a[1];
        for (at, one) in boxes.iter().enumerate() {
            assert!(
                one[0] >= 0.0 && one[2] <= 1060.0 && one[1] >= 100.0 && one[3] <= bottom - 60.0,
                "{name}: {one:?}"
            );
            assert!(boxes[..at].iter().all(|other| apart(one, other)), "{name}: {one:?}");
        }
        let anchors = attributes(&plan, "stroke-width").into_iter();
        for anchor in anchors.filter(|shape| shape.get("width").is_some_and(|width| width == "11")) {
            let Some(x) = anchor.get("x").and_then(|x| x.parse::<f64>().ok()) else {
                continue;
            };
            let y = number(&anchor, "y");
            // The sign in the key stands in its own coordinates.
            if y > 100.0 {
                let square = [x, y, x + 11.0, y + 11.0];
                assert!(boxes.iter().all(|label| apart(label, &square)), "{name}: {square:?}");
            }
        }
    }
    assert_eq!(plans, 11);
}

/// `market-square.svg` beside the briefs is the plan of `drifted-snow` as this client draws it, for readers of the
/// repository. Draw it anew with
/// `ropewalk demo --out out/demo && cp out/demo/plan-drifted-snow.svg client-example/briefs/market-square.svg`.
#[test]
fn the_shown_plan_is_the_drawn_one() {
    let folder = Folder::new("shown");
    ropewalk(&["demo", "--out", folder.path("demo").to_str().unwrap()]);
    let drawn = fs::read_to_string(folder.path("demo/plan-drifted-snow.svg")).unwrap();
    let shown = fs::read_to_string(brief("market-square").replace(".json", ".svg")).unwrap();
    // The last digits of forces depend on the instructions of the processor, and with them which of two equal ropes lies
    // on top and has its number written; what is seen beside that does not.
    let seen = |text: &str| -> Vec<String> {
        let lines = text
            .lines()
            .filter(|line| !line.contains("class=\"tension\"") && !line.contains("y up the sheet"));
        let mut lines: Vec<String> = lines
            .map(|line| {
                let parts = line.split_inclusive("=\"");
                let mut exact = false;
                let parts = parts.map(|part| {
                    let kept = if exact {
                        part.split_once('"').map_or(part, |(_, rest)| rest)
                    } else {
                        part
                    };
                    exact = part.ends_with("data-axial-force-n=\"") || part.ends_with("data-pull-kn=\"");
                    kept
                });
                parts.collect()
            })
            .collect();
        lines.sort();
        lines
    };
    assert!(
        seen(&shown) == seen(&drawn),
        "draw client-example/briefs/market-square.svg anew, as told beside this test"
    );
}

#[test]
fn equal_runs_leave_equal_files() {
    let folder = Folder::new("equal");
    for name in ["one", "two"] {
        let ended = ropewalk(&[
            "run",
            &brief("rill-footbridge"),
            "--out",
            folder.path(name).to_str().unwrap(),
        ]);
        assert_eq!(ended.code, 0, "{}", ended.told);
    }
    let mut count = 0;
    for entry in fs::read_dir(folder.path("one")).unwrap() {
        let name = entry.unwrap().file_name();
        let [one, two] = ["one", "two"].map(|run| fs::read(folder.path(run).join(&name)).unwrap());
        assert!(one == two, "{} differs", name.display());
        count += 1;
    }
    assert!(count > 15, "{count} files");
}

#[test]
fn each_verdict_has_its_exit_code() {
    let folder = Folder::new("verdicts");
    let out = folder.path("out");
    let out = out.to_str().unwrap();
    let first = ropewalk(&["run", &brief("first-net"), "--out", out]);
    assert_eq!(first.code, 2, "nothing is checked: {}", first.out);
    assert!(first.out.contains("NOT JUDGED"));
    // The worked numbers of this brief: m sinks 22.59 mm, 24.820 and 14.484 kN.
    for wanted in ["22.6", "24.8", "14.5"] {
        assert!(first.out.contains(wanted), "{wanted} is missing in\n{}", first.out);
    }
    let results = json(&folder.path("out/results.json"));
    let snow = &results["states"][1]["columns"]["tension_n"]["values"];
    let near = |value: &serde_json::Value, wanted: f64| (value.as_f64().unwrap() - wanted).abs() < 0.5;
    assert!(near(&snow[0], 24_820.0) && near(&snow[2], 14_484.0), "{snow}");

    assert_eq!(ropewalk(&["run", &brief("lantern-yard"), "--out", out]).code, 0);
    let strict = folder.write("strict.json", r#"{"checks": [{"movement": {"limit_m": 0.001}}]}"#);
    assert_eq!(
        ropewalk(&["run", &brief("lantern-yard"), &strict, "--out", out]).code,
        1
    );
    let ended = ropewalk(&["run", &brief("lantern-yard"), "--only", "heat", "--out", out]);
    assert!(
        ended.told.contains("heat: in balance") && !ended.told.contains("fair:"),
        "{}",
        ended.told
    );
}

#[test]
fn errors_are_told_with_their_places() {
    let folder = Folder::new("errors");
    let slip = folder.write(
        "slip.json",
        r#"{"id": "s", "net": {"nodes": [{"id": "A", "xyz": [0, 0, 0]}]}}"#,
    );
    let ended = ropewalk(&["check", &slip]);
    assert_eq!(ended.code, 64);
    assert!(
        ended
            .told
            .contains("net.nodes[A].xyz: unknown name \"xyz\"; did you mean \"xyz_m\"?"),
        "{}",
        ended.told
    );

    // The engine refuses parts that it does not serve, all of them by name.
    let ended = ropewalk(&[
        "run",
        &brief("quince-yard"),
        "--out",
        folder.path("out").to_str().unwrap(),
    ]);
    assert_eq!(ended.code, 64);
    for part in ["stages[masts]", "stages[pull-winch]", "workshop"] {
        assert!(
            ended.told.contains(&format!("error NOT_SERVED  {part}\n")),
            "{part}:\n{}",
            ended.told
        );
    }
    assert!(!folder.path("out").exists(), "a refused brief leaves no files");
    assert_eq!(ropewalk(&["check", &brief("quince-yard")]).code, 64);
    assert_eq!(ropewalk(&["check", &brief("first-net")]).code, 0);

    assert_eq!(ropewalk(&["run"]).code, 64, "usage");
    assert_eq!(ropewalk(&["run", "no-such-file.json"]).code, 64);
    let away = ropewalk(&["--engine", "http://127.0.0.1:1", "check", &brief("first-net")]);
    assert_eq!(away.code, 69, "{}", away.told);
    assert!(away.told.contains("no engine answers"), "{}", away.told);
    let blocked = folder.write("blocked", "a file where a folder is wanted");
    assert_eq!(ropewalk(&["run", &brief("first-net"), "--out", &blocked]).code, 73);
    let help = ropewalk(&["--help"]);
    assert!(help.code == 0 && help.out.contains("Exit codes:") && help.out.contains("no answer"));
}

#[test]
fn a_frozen_brief_keeps_shape_and_tensions() {
    let folder = Folder::new("frozen");
    let file = folder.path("frozen.json");
    let ended = ropewalk(&["freeze", &brief("first-net"), "-o", file.to_str().unwrap()]);
    assert_eq!(ended.code, 0, "{}", ended.told);
    let frozen = json(&file);
    let length = frozen["prestress"]["rules"][0]["unstressed_length_m"].as_f64().unwrap();
    // Worked by hand: 19.615 kN on EA 6.5 MN over 6.5383 m.
    assert!((length - 6.518_677).abs() < 1e-6, "{length}");
    assert_eq!(frozen["frozen_from"]["digest"].as_str().unwrap().len(), 64);
    for (source, name) in [
        (brief("first-net"), "found"),
        (file.to_str().unwrap().to_owned(), "fixed"),
    ] {
        assert_eq!(
            ropewalk(&["run", &source, "--out", folder.path(name).to_str().unwrap()]).code,
            2
        );
    }
    let tensions = |name: &str| -> Vec<f64> {
        let table = csv(&folder.path(name).join("segments.csv"));
        table[1..].iter().map(|row| row[5].parse().unwrap()).collect()
    };
    let pairs = tensions("found").into_iter().zip(tensions("fixed"));
    for (found, fixed) in pairs {
        assert!((found - fixed).abs() < 1e-6 * found.abs(), "{found} and {fixed}");
    }
}

#[test]
fn nasty_ids_do_no_harm() {
    let folder = Folder::new("nasty");
    let id = "<script>alert(1)<"; // a slash may not stand in an id
    let nasty = fs::read_to_string(brief("first-net"))
        .unwrap()
        .replace("\"m\"", &format!("\"{id}\""))
        .replace("\"carrying\"", "\"=HYPERLINK('x')\"")
        .replace("\"full-snow\"", "\"\\\"><img src=x> ä\"");
    let file = folder.write("nasty.json", &nasty);
    let out = folder.path("out");
    let ended = ropewalk(&["run", &file, "--out", out.to_str().unwrap()]);
    assert_eq!(ended.code, 2, "{}", ended.told);
    for entry in fs::read_dir(&out).unwrap() {
        let path = entry.unwrap().path();
        // The record is no text, and no program takes it for one.
        let text = String::from_utf8_lossy(&fs::read(&path).unwrap()).into_owned();
        match path.extension().and_then(|ending| ending.to_str()) {
            Some("svg") => assert!(
                !text.contains("<script") && !text.contains("<img"),
                "{}",
                path.display()
            ),
            Some("html") => {
                assert_eq!(text.matches("<script").count(), 2, "the page's own two");
                assert!(!text.contains("<img"));
            }
            Some("csv") => assert!(!text.contains("\n=") && !text.contains(",="), "{}", path.display()),
            _ => {}
        }
    }
}

#[test]
fn a_set_that_is_not_there_is_named() {
    let folder = Folder::new("only");
    let out = folder.path("out");
    let ended = ropewalk(&[
        "run",
        &brief("first-net"),
        "--only",
        "ful-snow",
        "--out",
        out.to_str().unwrap(),
    ]);
    assert_eq!(ended.code, 64, "{}", ended.told);
    assert!(
        ended.told.contains("\"ful-snow\"") && ended.told.contains("only"),
        "{}",
        ended.told
    );
    assert!(!out.exists(), "nothing ran, nothing is written");
}

#[test]
fn sheets_that_cannot_be_written_are_not_passed_over() {
    let folder = Folder::new("full");
    let brief = brief("first-net");
    let out = folder.path("out");
    for args in [
        vec!["check", &brief],
        vec!["run", &brief, "--out", out.to_str().unwrap()],
    ] {
        // A device that is always full.
        let full = fs::OpenOptions::new()
            .write(true)
            .open("/dev/full")
            .expect("Linux has it");
        let ended = finish(
            command(&args)
                .stdout(full)
                .stderr(std::process::Stdio::piped())
                .spawn()
                .and_then(std::process::Child::wait_with_output)
                .expect("the program starts"),
        );
        assert_eq!(ended.code, 73, "{args:?}: {}", ended.told);
        assert!(ended.told.contains("standard output"), "{}", ended.told);
    }
}

#[test]
fn freezing_makes_its_folder_and_leaves_no_halves() {
    let folder = Folder::new("freeze-folder");
    let file = folder.path("new/frozen.json");
    let ended = ropewalk(&["freeze", &brief("first-net"), "-o", file.to_str().unwrap()]);
    assert_eq!(ended.code, 0, "{}", ended.told);
    let names: Vec<_> = fs::read_dir(file.parent().unwrap())
        .unwrap()
        .map(|entry| entry.unwrap().file_name())
        .collect();
    assert_eq!(names, ["frozen.json"]);

    // A folder stands where the file should go: it stays, and nothing is left beside it.
    let ended = ropewalk(&[
        "freeze",
        &brief("first-net"),
        "-o",
        folder.path("new").to_str().unwrap(),
    ]);
    assert_eq!(ended.code, 73, "{}", ended.told);
    assert!(file.exists() && !folder.path("new.part").exists());
}
