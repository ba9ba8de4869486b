//! `ropewalk compare`, from briefs and folders to its words, files and exit code.

use std::fs;

use super::support::{Folder, brief, csv, ropewalk};

#[test]
fn what_differs_is_told_by_id_and_by_the_exit_code() {
    let folder = Folder::new("compare");
    let text = fs::read_to_string(brief("first-net")).unwrap();
    let heavier = folder.write("heavier.json", &text.replace("-5000", "-6000"));
    let [one, two, out] = ["one", "two", "out"].map(|name| folder.path(name).to_str().unwrap().to_owned());
    ropewalk(&["run", &brief("first-net"), "--out", &one]);
    ropewalk(&["run", &heavier, "--out", &two]);

    let same = ropewalk(&["compare", &one, &one]);
    assert_eq!(same.code, 0, "{}", same.out);
    assert!(same.out.contains("no number differs"), "{}", same.out);

    let ended = ropewalk(&["compare", &one, &two, "--out", &out]);
    assert_eq!(ended.code, 1, "{}", ended.told);
    assert!(ended.out.contains("The digests differ"), "{}", ended.out);
    let briefs = csv(&folder.path("out/brief-differs.csv"));
    assert_eq!(briefs.len(), 2, "{briefs:?}");
    assert_eq!(briefs[1][0], "actions[snow].loads[0].nodes.force_n");
    assert_eq!(briefs[1][1..], ["[0,0,-5000]", "[0,0,-6000]"].map(str::to_owned));

    // The numbers are those of the two runs' own tables.
    let tension = |name: &str| -> f64 {
        let rows = csv(&folder.path(&format!("{name}/segments.csv")));
        let row = rows
            .iter()
            .find(|row| row[0] == "full-snow" && row[2] == "carrying" && row[3] == "A")
            .unwrap();
        row[5].parse().unwrap()
    };
    let rows = csv(&folder.path("out/results-differ.csv"));
    let row = rows
        .iter()
        .find(|row| row[0] == "tension" && row[2] == "full-snow" && row[3] == "carrying A to m")
        .unwrap();
    let number = |at: usize| row[at].parse::<f64>().unwrap();
    for (at, expected) in [
        (4, tension("one")),
        (5, tension("two")),
        (6, tension("two") - tension("one")),
    ] {
        assert!((number(at) - expected).abs() < 1e-4, "{row:?}");
    }
    assert!(
        rows.iter().all(|row| row[2] != "reference"),
        "the reference state is the same"
    );

    let passed_over = ropewalk(&["compare", &one, &two, "--above", "force=1000", "--above", "length=1000"]);
    assert!(passed_over.out.contains("no number differs"), "{}", passed_over.out);
    assert_eq!(passed_over.code, 1, "the briefs still differ");
}

#[test]
fn results_of_another_brief_are_said_to_be_so() {
    let folder = Folder::new("another");
    let text = fs::read_to_string(brief("first-net")).unwrap();
    let other = folder.write("other.json", &text.replace("82e3", "80e3"));
    let results = folder.path("results").to_str().unwrap().to_owned();
    ropewalk(&["run", &brief("first-net"), "--out", &results]);

    let own = ropewalk(&["compare", &brief("first-net"), &results]);
    assert_eq!(own.code, 0, "{}", own.out);
    let ended = ropewalk(&["compare", &other, &results]);
    assert_eq!(ended.code, 1);
    assert!(ended.out.contains("read against another brief"), "{}", ended.out);
    assert!(
        ended.out.contains("net.sections[r10].breaking_force_n"),
        "{}",
        ended.out
    );

    // A brief that was edited where the results lie is not what they answer.
    fs::copy(&other, folder.path("results/brief.json")).unwrap();
    let ended = ropewalk(&["compare", &results, &results]);
    assert!(ended.out.contains("no longer the brief"), "{}", ended.out);
}

#[test]
fn what_cannot_be_compared_is_told() {
    let folder = Folder::new("nothing");
    let empty = folder.path("empty");
    fs::create_dir_all(&empty).unwrap();
    let empty = empty.to_str().unwrap();
    let ended = ropewalk(&["compare", &brief("first-net"), empty]);
    assert_eq!(ended.code, 64);
    assert!(ended.told.contains("holds no results"), "{}", ended.told);

    fs::write(folder.path("empty/run.binpb"), "no record").unwrap();
    let ended = ropewalk(&["compare", &brief("first-net"), empty]);
    assert_eq!(ended.code, 64);
    assert!(ended.told.contains("run.binpb"), "{}", ended.told);

    let slip = ropewalk(&[
        "compare",
        &brief("first-net"),
        &brief("first-net"),
        "--above",
        "tension=3",
    ]);
    assert_eq!(slip.code, 64);
    assert!(slip.told.contains("that name is not known"), "{}", slip.told);
}
