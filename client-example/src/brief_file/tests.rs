use super::*;

#[track_caller]
fn complaint(text: &str) -> String {
    let found = parse("b.json", text).expect_err("the text is wrong");
    found.iter().map(ToString::to_string).collect::<Vec<_>>().join("\n")
}

#[test]
fn names_the_place_and_the_nearest_name_of_an_unknown_key() {
    let text = r#"{"id": "b", "net": {"nodes": [{"id": "A", "xyz": [0, 0, 0]}]}}"#;
    assert_eq!(
        complaint(text),
        r#"b.json: net.nodes[A].xyz: unknown name "xyz"; did you mean "xyz_m"?"#
    );
}

#[test]
fn lists_known_names_where_none_is_near() {
    let found = complaint(r#"{"prestress": {"qqqq": 1}}"#);
    assert_eq!(
        found,
        r#"b.json: prestress.qqqq: unknown name "qqqq"; known here: under, hold, rules, note, targets"#
    );
}

#[test]
fn finds_keys_that_stand_twice_in_either_spelling() {
    let found =
        complaint(r#"{"net": {"nodes": [{"xyz_m": [1, 2, 3], "id": "A", "xyzM": [0, 0, 0]}]}, "id": "a", "id": "b"}"#);
    assert!(found.contains(r#"net.nodes[A].xyzM: "xyzM" stands twice"#), "{found}");
    assert!(found.contains(r#"id: "id" stands twice"#), "{found}");
    let found = complaint(r#"{"cases": [{"id": "c", "factors": {"snow": 1, "snow": 2}}]}"#);
    assert_eq!(
        found,
        r#"b.json: cases[c].factors[snow]: "snow" stands twice; keep one"#
    );
}

#[test]
fn refuses_numbers_that_are_spelled_as_text() {
    let found = complaint(r#"{"net": {"sections": [{"id": "r", "axial_stiffness_n": "NaN"}]}}"#);
    assert_eq!(
        found,
        r#"b.json: net.sections[r].axial_stiffness_n: a number is wanted here, found the text "NaN""#
    );
    let found = complaint(r#"{"net": {"nodes": [{"id": "A", "xyz_m": [0, "1.5", 0]}]}}"#);
    assert!(
        found.contains("net.nodes[A].xyz_m[1]") && found.contains("leave out the quotes"),
        "{found}"
    );
}

#[test]
fn tells_line_and_column_of_what_is_not_json() {
    let found = complaint("{\n  \"id\": \"b\",\n  \"net\": NaN\n}");
    assert!(found.starts_with("b.json: line 3, column 10: is not JSON:"), "{found}");
    let found = complaint("{\"id\": \"b\"} x");
    assert!(found.contains("line 1, column 13"), "{found}");
    let found = complaint("{\"net\": {\"gravity_m_per_s2\": 1e999}}");
    assert!(found.contains("number out of range"), "{found}");
}

#[test]
fn refuses_a_nest_that_is_too_deep() {
    assert!(complaint(&"[".repeat(100_000)).contains("recursion limit exceeded"));
}

#[test]
fn refuses_wrong_kinds_and_two_choices_at_once() {
    let text = r#"{"id": 3, "cases": {}, "actions": [{"id": "a", "loads": [7]}], "solving": {"load_steps": 2.5},
        "prestress": {"rules": [{"on": ["c"], "tension_n": 1, "balance": {}}]}}"#;
    let found = complaint(text);
    for wanted in [
        "id: a text in quotes is wanted here, found a number",
        "cases: a list [...] is wanted here, found an object",
        "actions[a].loads[0]: an object {...} is wanted here, found a number",
        "solving.load_steps: a whole number from 0 to 4294967295 is wanted here, found 2.5",
        "prestress.rules[0].balance: \"balance\" and \"tension_n\" exclude each other",
    ] {
        assert!(found.contains(wanted), "{wanted} is missing in\n{found}");
    }
}

#[test]
fn reads_both_spellings_alike() {
    let hand = parse(
        "a",
        r#"{"id": "b", "net": {"sections": [{"id": "r", "axial_stiffness_n": 5e6}]}}"#,
    )
    .unwrap();
    let camel = parse(
        "b",
        r#"{"id": "b", "net": {"sections": [{"id": "r", "axialStiffnessN": 5e6}]}}"#,
    )
    .unwrap();
    assert_eq!(hand, camel);
}

#[test]
fn merges_files_as_protobuf_merges_messages() {
    let folder = std::env::temp_dir().join(format!("ropewalk-merge-{}", std::process::id()));
    std::fs::create_dir_all(&folder).unwrap();
    let office = folder.join("office.json");
    let net = folder.join("net.json");
    std::fs::write(
        &office,
        r#"{"net": {"sections": [{"id": "r10"}], "gravity_m_per_s2": 9.81}}"#,
    )
    .unwrap();
    std::fs::write(
        &net,
        r#"{"id": "n", "net": {"sections": [{"id": "r12"}], "gravity_m_per_s2": 9.8}}"#,
    )
    .unwrap();
    let brief = read(&[office.clone(), net.clone()]).unwrap();
    let Some(v1::brief::NetSource::Net(merged)) = brief.net_source else {
        panic!("the net is given")
    };
    assert_eq!(
        merged
            .sections
            .iter()
            .map(|section| section.id.as_str())
            .collect::<Vec<_>>(),
        ["r10", "r12"]
    );
    assert_eq!(merged.gravity_m_per_s2, Some(9.8));

    std::fs::write(&office, r#"{"nett": {}}"#).unwrap();
    std::fs::remove_file(&net).unwrap();
    let found = read(&[office, net]).unwrap_err();
    assert_eq!(found.len(), 2, "both files are looked at: {found:?}");
    std::fs::remove_dir_all(folder).unwrap();
}

#[test]
fn every_shipped_brief_is_read_and_written_back_alike() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("briefs");
    let mut count = 0;
    let files = std::fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().path());
    for file in files.filter(|file| file.extension().is_some_and(|ending| ending == "json")) {
        let brief = read(&[file]).unwrap();
        let again = parse("again", &to_json(&brief)).unwrap();
        assert_eq!(brief, again);
        count += 1;
    }
    assert!(count >= 5, "{count} briefs");
}

#[test]
fn says_that_a_file_is_empty() {
    for text in ["", " \n", "\u{feff}"] {
        let found = complaint(text);
        assert!(
            found.starts_with("b.json: is empty: a brief is a JSON object"),
            "{found}"
        );
    }
}
