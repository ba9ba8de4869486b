use super::*;
use crate::run::sample;

fn shown(sheet: &Sheet, row: usize) -> Vec<String> {
    sheet.rows[row].cells.iter().map(Cell::shown).collect()
}

#[test]
fn the_rope_ledger_has_shares_and_governing_cases() {
    let sheet = ropes(&sample::run());
    // 24.820 / 82 = 30 %, 14.484 / 19.615 = 74 %, 2 * 6.518677 m = 13.04 m.
    let carrying = [
        "carrying",
        "–",
        "r10",
        "19.6",
        "19.6",
        "19.6",
        "24.8",
        "24",
        "30",
        "100",
        "reference",
        "full-snow",
        "13.0",
    ];
    assert_eq!(shown(&sheet, 0)[..13], carrying);
    let bracing = [
        "bracing",
        "–",
        "r10",
        "19.6",
        "19.6",
        "14.5",
        "19.6",
        "24",
        "24",
        "74",
        "full-snow",
        "reference",
        "13.0",
    ];
    assert_eq!(shown(&sheet, 1)[..13], bracing);
}

#[test]
fn the_anchor_sheet_shows_the_pull_not_the_support_force() {
    let sheet = anchors(&sample::run());
    // A lies above the net's middle: the net pulls it down and inwards.
    let row = shown(&sheet, 0);
    assert_eq!(row[0..2], ["A", "full-snow"]);
    assert_eq!(row[6], "24.8");
    assert!(
        row[3].parse::<f64>().unwrap() > 0.0 && row[5].parse::<f64>().unwrap() < 0.0,
        "{row:?}"
    );
    assert_eq!(
        row[7..],
        ["45", "-13", "20.0", "124"],
        "limit and ratio of the check on A"
    );
    assert_eq!(sheet.rows[0].mark, Mark::Bad);
    assert_eq!(sheet.rows[1].cells[9], Cell::Empty, "the reference state is not judged");
    let peaks = anchor_peaks(&sample::run());
    assert_eq!(shown(&peaks, 0)[0..3], ["A", "24.8", "down, +x +y"]);
    assert_eq!(peaks.rows.len(), 4);
}

#[test]
fn cases_without_answer_come_first_and_by_cause() {
    let run = sample::run();
    let sheet = cases(&run);
    let order: Vec<String> = sheet.rows.iter().map(|row| row.cells[0].shown()).collect();
    assert_eq!(order, ["lamp", "full-snow", "reference"]);
    let lamp = shown(&sheet, 0);
    assert_eq!(
        (lamp[3].as_str(), lamp[7].as_str(), lamp[11].as_str()),
        ("no equilibrium", "–", "–")
    );
    assert_eq!(causes(&run)[0].culprit, "carrying");
    assert_eq!(causes(&run)[0].cases, ["lamp"]);
    assert_eq!(why(&run), "1 of 3 states without an answer: \"lamp\"");
}

#[test]
fn the_audit_line_names_the_worst_state() {
    let line = audit_line(&sample::run());
    assert!(
        line.starts_with("Audit: 2 of 2 answered states pass; largest imbalance 3.0e-9 N of 1.0e-5 N allowed at \"m\""),
        "{line}"
    );
    assert!(line.contains("loads 5.00 kN"), "{line}");
}

#[test]
fn the_proof_line_tells_the_widest_bound_and_its_condition() {
    let mut run = sample::run();
    assert_eq!(
        proof_line(&run),
        "Proof: in 2 of 2 answered states no axial force is wrong by more than 3.0e-10 kN (\"full-snow\")."
    );
    for state in &mut run.states {
        if let Some(certificate) = &mut state.summary.certificate {
            certificate.condition = "with the struts as found".to_owned();
        }
    }
    assert!(proof_line(&run).ends_with("(\"full-snow\"); in some with the struts as found."));
    run.states.iter_mut().for_each(|state| state.summary.certificate = None);
    assert_eq!(proof_line(&run), "Proof: of no state are the forces proven.");
}

#[test]
fn a_long_sheet_is_cut_on_the_terminal_only() {
    let mut sheet = ropes(&sample::run());
    let row = sheet.rows[0].clone();
    sheet.rows = (0..9)
        .map(|_| Row {
            group: "carrying".to_owned(),
            ..row.clone()
        })
        .collect();
    let text = terminal(&sheet);
    assert_eq!(text.matches("\n  carrying").count(), 5, "{text}");
    assert!(
        text.contains("left out here: 4 of carrying; all in cables.csv"),
        "{text}"
    );
    assert_eq!(sheet.csv().lines().count(), 10);
    assert_eq!(html(&sheet).matches("<tr").count(), 10);
}

#[test]
fn paragraphs_are_wrapped_at_words() {
    assert_eq!(wrap("one two three four", 9, "  "), "one two\n  three\n  four");
}
