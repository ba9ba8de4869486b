use super::*;
use crate::run::{motion_sample, sample};
use ropewalk_api::ropewalk::v1;

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
    assert_eq!(row[7], "24.8");
    assert!(
        row[4].parse::<f64>().unwrap() > 0.0 && row[6].parse::<f64>().unwrap() < 0.0,
        "{row:?}"
    );
    assert_eq!(
        row[8..],
        ["45", "-13", "20.0", "124"],
        "limit and ratio of the check on A"
    );
    assert_eq!(sheet.rows[0].mark, Mark::Bad);
    assert_eq!(
        sheet.rows[1].cells[10],
        Cell::Empty,
        "the reference state is not judged"
    );
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

#[test]
fn anchors_by_set_say_what_is_factored_and_join_what_one_case_governs() {
    let mut run = sample::run();
    run.states[1].sets = vec!["ultimate".to_owned()];
    run.brief.cases[0].factors.insert("snow".to_owned(), 1.5);
    let sheet = anchor_sets(&run);
    let of_a: Vec<Vec<String>> = sheet
        .rows
        .iter()
        .filter(|row| row.group == "A")
        .map(|row| row.cells[1..5].iter().map(Cell::shown).collect())
        .collect();
    // A is a high point: the carrying rope pulls it down and inwards, most under snow.
    assert_eq!(
        of_a,
        [
            [
                "reference",
                "reference",
                "largest pull, level, pressed down",
                "reference"
            ],
            ["ultimate", "factored", "largest pull, level, pressed down", "full-snow"],
        ]
    );
}

#[test]
fn a_load_path_is_sheeted_with_the_largest_departure_first() {
    let mut run = sample::run();
    assert!(doubling(&run).is_none());
    sample::give_path(&mut run, &[0.0, 0.5, 1.0, 1.5]);
    let sheet = doubling(&run).unwrap();
    let shown: Vec<Vec<String>> = sheet
        .rows
        .iter()
        .map(|row| row.cells.iter().map(Cell::shown).collect())
        .collect();
    let names: Vec<&str> = shown.iter().map(|row| row[1].as_str()).collect();
    assert_eq!(names, ["largest movement", "bracing", "carrying"]);
    // Bracing falls from 20 kN to nothing at half the load: 10 kN off the line at that place, of 20.
    assert_eq!(shown[1][3..8], ["20.0", "0", "1.50", "0", "0"]);
    assert_eq!((shown[1][10].as_str(), shown[1][11].as_str()), ("50", "0.500"));
    // Carrying 20, 23, 26, 29 kN: the straight line, and 29 of 1.5 times 26.
    assert_eq!(shown[2][3..8], ["20.0", "26.0", "1.50", "29.0", "39.0"]);
    assert_eq!(
        (shown[2][9].as_str(), shown[2][10].as_str(), shown[2][12].as_str()),
        ("0.744", "0", "on the effect")
    );
}

fn loss(removed: &str, unanswered: u32, share: f64) -> v1::LossRow {
    v1::LossRow {
        removed: vec![removed.to_owned()],
        factor: 1.5,
        cases: 2,
        unanswered_total: unanswered,
        worst: vec![v1::LossCell {
            member: "bracing".to_owned(),
            force_n: share * 82e3,
            share_of_breaking: Some(share),
            case: "loss-001".to_owned(),
        }],
        ..Default::default()
    }
}

#[test]
fn losses_without_an_answer_come_first_then_the_hardest_worked() {
    let mut run = sample::run();
    assert!(losses(&run).is_none() && loss_cells(&run).is_none());
    run.losses = vec![loss("a", 0, 0.4), loss("b", 1, 0.2), loss("c", 0, 1.1)];
    run.losses[2].loose_nodes = 3;
    let sheet = losses(&run).unwrap();
    let rows: Vec<(String, Mark)> = sheet.rows.iter().map(|row| (row.cells[0].shown(), row.mark)).collect();
    let expected = [("b", Mark::Gone), ("c", Mark::Bad), ("a", Mark::Plain)];
    assert_eq!(rows, expected.map(|(name, mark)| (name.to_owned(), mark)));
    assert_eq!(sheet.rows[1].cells[11].shown(), "yes, 3 nodes");
    assert_eq!(survivors(&run), ["bracing"]);
    // Two losses under different cases without an answer tell no movement.
    run.losses[1].unanswered_total = 2;
    assert_eq!(losses(&run).unwrap().rows[0].cells[8], Cell::Empty);
}

#[test]
fn an_action_that_leaves_panels_out_stands_out_and_rounding_is_no_force() {
    let mut run = sample::run();
    assert!(loads(&run).is_none());
    run.loads = vec![v1::LoadPicture {
        action: "lift".to_owned(),
        force_n: vec![1e-9, 0.0, 33.2e3],
        point_m: vec![1.0, 2.0, 3.0],
        loaded_panels: 14,
        loaded_area_on_plan_m2: 98.0,
        without_value: vec!["p1".to_owned()],
        without_value_total: 2,
        without_value_area_m2: 11.0,
        ..Default::default()
    }];
    let sheet = loads(&run).unwrap();
    let row = shown(&sheet, 0);
    assert_eq!(row[1..7], ["0", "0", "33.2", "1.00", "2.00", "3.00"]);
    // 33.2 kN over 98 m2.
    assert_eq!((row[11].as_str(), row[13].as_str()), ("0.339", "p1 and 1 more"));
    assert_eq!(sheet.rows[0].mark, Mark::Open);
}

#[test]
fn the_shape_report_tells_what_is_off_and_what_fights() {
    let mut run = sample::run();
    assert!(shape(&run).is_none());
    let wish = |on: &str, quantity: v1::TargetQuantity, wanted: f64, found: f64, miss: f64, met: bool| v1::WishResult {
        on: on.to_owned(),
        quantity: quantity.into(),
        wanted,
        found,
        miss,
        met,
        ..Default::default()
    };
    run.shape_report = Some(v1::ShapeReport {
        wishes: vec![
            wish("eNE", v1::TargetQuantity::Sag, 0.9, 0.61, -0.322, false),
            wish("eNE", v1::TargetQuantity::MeanTension, 35e3, 35.04e3, 0.001_14, false),
        ],
        fights: vec![v1::WishFight {
            first: 0,
            second: 1,
            first_alone: 0.9,
            second_alone: 35e3,
            first_left_out: 0.61,
            second_left_out: 24e3,
        }],
        ..Default::default()
    });
    let sheet = shape(&run).unwrap();
    assert_eq!(
        shown(&sheet, 0)[..7],
        ["eNE", "sag", "0.900", "0.610", "m", "-32.2", "no"]
    );
    assert_eq!(
        shown(&sheet, 1)[..7],
        ["eNE", "mean tension", "35.0", "35.0", "kN", "0.114", "within 0.2 %"]
    );
    assert_eq!(shown(&sheet, 2)[0], "sag of eNE against mean tension of eNE");
    assert!(
        shown(&sheet, 2)[7].ends_with("left out themselves to 0.610 m and 24.0 kN"),
        "{:?}",
        shown(&sheet, 2)
    );
}

#[test]
fn factors_on_effects_stand_beside_those_on_actions() {
    let mut run = sample::run();
    assert!(effects(&run).is_none() && over_linearity(&run).is_none());
    let member = |member: &str, on_action_n: f64, index: f64| v1::OverLinearity {
        member: member.to_owned(),
        on_action_n,
        on_effect_n: on_action_n / index,
        index,
    };
    run.effects = vec![crate::run::Effect {
        effect: v1::DesignEffect {
            id: "ultimate-003-on-effect".to_owned(),
            rule: v1::EffectRule::OnEffect.into(),
            answered: false,
            members: vec![member("carrying", 30e3, 0.8), member("bracing", 20e3, 1.6)],
            ..Default::default()
        },
        columns: std::collections::BTreeMap::new(),
    }];
    assert_eq!(effects(&run).unwrap().rows[0].mark, Mark::Gone);
    let sheet = over_linearity(&run).unwrap();
    assert_eq!(shown(&sheet, 0)[3..], ["20.0", "12.5", "1.60", "on the action"]);
    assert_eq!(shown(&sheet, 1)[3..], ["30.0", "37.5", "0.800", "on the effect"]);
}

#[test]
fn natural_frequencies_stand_with_period_and_part() {
    let mut run = sample::run();
    assert!(modes(&run).is_none());
    sample::give_modes(&mut run, &["m".to_owned()]);
    let sheet = modes(&run).unwrap();
    assert_eq!(sheet.rows.len(), 4);
    let shown = |row: usize| -> Vec<String> { sheet.rows[row].cells.iter().map(Cell::shown).collect() };
    assert_eq!(shown(0)[1], "3 modes, a count misses none");
    assert_eq!(shown(1)[1..8], ["1", "2.50", "0.400", "0", "25", "100", "m"]);
    assert_eq!(shown(3)[1..4], ["3 without stiffness", "–", "–"]);
    assert_eq!((sheet.rows[1].mark, sheet.rows[3].mark), (Mark::Plain, Mark::Bad));
}

#[test]
fn a_motion_tells_what_was_largest_in_lines_and_in_a_row() {
    let run = motion_sample::run_named("gust");
    assert!(motions(&sample::run()).is_none());
    let sheet = motions(&run).unwrap();
    assert_eq!(
        shown(&sheet, 0),
        [
            "gust",
            "followed to its end, 0.400 s",
            "2003",
            "0.0500",
            "28.1",
            "main",
            "0.0140",
            "160",
            "n10",
            "0",
            "27.3",
            "n0",
            "0.0146",
            "1.41",
            "main",
            "1.98",
            "n30",
            "12",
            "12",
            &crate::number::three(run.motions[0].end.as_ref().unwrap().largest_kinetic_j),
            &crate::number::three(2.0 / run.motions[0].end.as_ref().unwrap().largest_kinetic_j),
        ]
    );
    let lines = motion_lines(&run, &run.motions[0]);
    let line = |name: &str| lines.iter().find(|(known, _)| *known == name).unwrap().1.as_str();
    assert_eq!(line("largest tension"), "28.1 kN in main, 0.0140 s");
    assert_eq!(line("largest movement"), "160 mm at n10, 0 s");
    assert_eq!(line("largest pull on a support"), "27.3 kN at n0, 0.0146 s");
    assert!(
        line("against the static answer")
            .starts_with("tension of main 1.41 times the static answer (0.0140 s); movement of n30 1.98"),
        "{}",
        line("against the static answer")
    );
    assert_eq!(line("slack"), "segments went slack 12 times and snatched 12 times");
    // 0.4 s in 2000 steps.
    assert_eq!(
        line("steps"),
        "2003 steps; planned 0.200 ms, smallest 0.0500 ms; 5210 iterations"
    );
    assert!(line("error of the energy ledger").starts_with("at most 0.0200 J, "));
}

#[test]
fn waves_stand_beside_the_step_that_follows_them() {
    let mut run = motion_sample::run_named("gust");
    let waves = |run: &Run, told: Told| {
        let sheets = motion_sheets(run, &run.motions[0], told);
        sheets.into_iter().find(|sheet| sheet.file.ends_with("-waves"))
    };
    let sheet = waves(&run, Told::Telling).unwrap();
    // c = sqrt(20 kN / 0.45 kg/m) = 210.8 m/s; 0.99 m over it 4.70 ms, over 3900 m/s 0.254 ms.
    let row = shown(&sheet, 0);
    assert_eq!(
        row,
        [
            "main",
            "211",
            "211",
            "4.70",
            "3900",
            "0.254",
            "0.200",
            "transverse and axial"
        ]
    );
    // A rope that no frame shows is listed only where its transverse waves are smeared.
    let mut other = run.motions[0].waves[0].clone();
    other.cable = "other".to_owned();
    run.motions[0].waves.push(other);
    assert_eq!(waves(&run, Told::Telling).unwrap().rows.len(), 1);
    assert_eq!(waves(&run, Told::All).unwrap().rows.len(), 2);
    run.motions[0].waves[1].transverse_step_s = Some(1e-4);
    run.motions[0].waves[1].axial_step_s = 1e-5;
    let sheet = waves(&run, Told::Telling).unwrap();
    assert_eq!(
        (shown(&sheet, 1)[7].as_str(), sheet.rows[1].mark),
        ("neither", Mark::Open)
    );
}

#[test]
fn events_are_in_order_and_peaks_beside_the_nearest_natural_frequency() {
    let run = motion_sample::run_named("gust");
    let text = motion_text(&run, &run.motions[0]);
    assert!(
        text.contains("left out here: 5; all in motion-gust-events.csv"),
        "{text}"
    );
    let sheets = motion_sheets(&run, &run.motions[0], Told::All);
    assert_eq!(shown(&sheets[0], 0), ["0", "began to break", "tie", "n10", "low"]);
    assert_eq!(sheets[0].rows.len(), 25);
    let peaks = sheets.last().unwrap();
    let first = shown(peaks, 0);
    let frequency: f64 = first[1].parse().unwrap();
    let mode: f64 = first[4].parse().unwrap();
    let natural: f64 = first[5].parse().unwrap();
    // Natural frequencies of the string are multiples of 210.8 / 2 / 39.6 = 2.662 Hz.
    assert!((natural - 2.662 * mode).abs() < 0.01 * natural, "{first:?}");
    assert!((frequency - natural).abs() <= 2.662 / 2.0, "{first:?}");
    assert_eq!(first[3], "mm");
}

#[test]
fn a_motion_without_an_answer_says_why_and_what_to_try() {
    let mut run = motion_sample::run_named("gust");
    let motion = &mut run.motions[0];
    let end = motion.end.as_mut().unwrap();
    end.set_outcome(v1::MotionOutcome::Stopped);
    end.time_s = 0.25;
    end.failure = Some(v1::Failure {
        message: "steps became too small".to_owned(),
        cure: "give the node a mass".to_owned(),
        ..Default::default()
    });
    let text = motion_text(&run, &run.motions[0]);
    assert!(text.contains("stopped at 0.250 s: steps became too small"), "{text}");
    assert!(text.contains("give the node a mass"), "{text}");
    assert_eq!(motions(&run).unwrap().rows[0].mark, Mark::Gone);
    run.summary.set_verdict(v1::Verdict::NoAnswer);
    assert_eq!(why(&run), "motion \"gust\": stopped at 0.250 s: steps became too small");
    // One that could not begin has no numbers to tell.
    let motion = &mut run.motions[0];
    motion.begin = None;
    motion.end.as_mut().unwrap().set_outcome(v1::MotionOutcome::NotBegun);
    let lines = motion_lines(&run, &run.motions[0]);
    let names: Vec<&str> = lines.iter().map(|(name, _)| *name).collect();
    assert_eq!(names, ["how it ended", "try"]);
}
