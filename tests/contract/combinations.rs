//! Rules that make cases: what they make, what they are called, what can be wrong with them, and what a run tells.

use std::collections::BTreeSet;

use ropewalk_api::ropewalk::v1;
use ropewalk_service::decode::{Reading, read, reasons};
use serde_json::{Value, json};
use v1::FindingSeverity::{Doubt, Error, Note};
use v1::run_response::Event;

use crate::briefs::{LIMITS, changed, errors, first_net, message, quince_yard, reading, work};
use crate::results::run;

/// Two crossing ropes and a guard rope, with snow, wind either way, and a pull in an anchor that no rule combines.
fn yard() -> Value {
    let base = first_net();
    changed(
        base,
        &[
            ("/net/sections/0/mass_kg_per_m", json!(0.5)),
            ("/prestress/under", json!(["self"])),
            (
                "/actions",
                json!([
                    {"id": "self", "class": "permanent", "loads": [{"own_weight": {}}]},
                    {"id": "snow", "class": "snow", "loads": [{"nodes": {"on": ["m"], "force_n": [0, 0, -5000]}}]},
                    {"id": "press", "class": "wind", "loads": [{"nodes": {"on": ["m"], "force_n": [0, 0, -2000]}}]},
                    {"id": "lift", "class": "wind", "loads": [{"nodes": {"on": ["m"], "force_n": [0, 0, 3000]}}]},
                    {"id": "strong", "class": "pull", "loads": [{"prestress": {"share": 0.1}}]}
                ]),
            ),
            (
                "/factors",
                json!({
                    "source": "EN 1990:2002, recommended values, from memory: verify",
                    "classes": [
                        {"id": "permanent", "permanent": {"adverse": 1.35, "favourable": 1.0}},
                        {"id": "snow", "variable": {"gamma": 1.5, "psi0": 0.5, "psi1": 0.2, "psi2": 0}},
                        {"id": "wind", "variable": {"gamma": 1.5, "psi0": 0.6, "psi1": 0.2, "psi2": 0}}
                    ]
                }),
            ),
            (
                "/combinations",
                json!([
                    {"set": "ultimate", "fundamental": {}},
                    {"set": "service", "characteristic": {}},
                    {"set": "loss", "accidental": {"remove_each": ["bracing"], "effect_factor": 1.5}}
                ]),
            ),
            (
                "/cases",
                json!([{"id": "pulled", "sets": ["service"], "factors": {"self": 1, "strong": 1}}]),
            ),
            (
                "/checks",
                json!([
                    {"safety": {"factor": 2.2}, "over": ["ultimate"]},
                    {"safety": {"factor": 1.5}, "over": ["loss"]},
                    {"slackness": {"min_share_of_reference": 0.1}, "over": ["service"]}
                ]),
            ),
        ],
    )
}

#[track_caller]
fn told<'r>(reading: &'r Reading, severity: v1::FindingSeverity, reason: &str, path: &str) -> &'r v1::Finding {
    let mut found = reading.findings.iter().filter(|finding| finding.path == path);
    let found = found.find(|finding| finding.reason == reason);
    let found = found.unwrap_or_else(|| panic!("no {reason} at {path} in {:#?}", reading.findings));
    assert_eq!(found.severity(), severity, "{found:#?}");
    assert!(!found.message.is_empty() && !found.cure.is_empty(), "{found:#?}");
    found
}

/// A change, and the one kind of error that it makes.
#[track_caller]
fn check(changes: &[(&str, Value)], reason: &str, path: &str) -> v1::Finding {
    let reading = reading(&changed(yard(), changes));
    let found = told(&reading, Error, reason, path).clone();
    assert!(reading.work.is_none());
    let others: Vec<_> = errors(&reading).filter(|error| error.reason != reason).collect();
    assert!(others.is_empty(), "{changes:?} also gives {others:#?}");
    found
}

fn of_set<'r>(reading: &'r Reading, set: &str) -> Vec<&'r v1::CaseInWords> {
    let cases = reading.cases.iter();
    cases
        .filter(|case| case.sets.iter().any(|other| other == set))
        .collect()
}

/// Snow, wind and temperature with two alternatives each: 1 + 6 · 3 · 3 = 55, and twice that with permanent actions adverse
/// and favourable. One of the ultimate ones is written by hand too.
#[test]
fn the_realistic_draft_has_110_ultimate_and_55_service_cases() {
    let reading = reading(&quince_yard());
    assert_eq!(of_set(&reading, "ultimate").len(), 110);
    assert_eq!(of_set(&reading, "service").len(), 55 + 1);
    // 1 + 6 leading at psi1, nothing beside them since psi2 is 0: each with one of four guys lost.
    assert_eq!(of_set(&reading, "loss").len(), 7 * 4);
    let words: BTreeSet<&str> = reading.cases.iter().map(|case| case.in_words.as_str()).collect();
    assert_eq!(words.len(), reading.cases.len(), "no case is made twice");
    // Two by hand of which one is ultimate, one service case is an ultimate one too, and one intact one a service case.
    assert_eq!(reading.cases.len(), 2 + 109 + 54 + 6 + 28);
    let storm = &reading.cases[1];
    assert_eq!(
        (storm.case.as_str(), &storm.sets[..]),
        ("storm-snow", &["ultimate".to_owned()][..])
    );
    assert_eq!(storm.in_words, "1.35 self + 1.5 snow-west + 0.9 wind-press");
    assert!(words.contains("1 self + 1.5 snow-west + 0.9 wind-lift + 0.9 cold"));
    assert!(words.contains("1 self + 0.5 hot without gE2"));
    for action in ["weak", "strong", "wall-creeps"] {
        let path = format!("actions[{action}].class");
        let severity = told(&reading, Note, reasons::ACTION_NOT_COMBINED, &path).severity();
        assert_eq!(severity, Note);
    }
}

#[test]
fn made_cases_follow_those_by_hand_and_have_ids_by_rule() {
    let reading = reading(&yard());
    let ids: Vec<&str> = reading.cases.iter().map(|case| case.case.as_str()).collect();
    // Classes of one and of two: 1 + 1 · 3 + 2 · 2 = 8 combinations.
    assert_eq!(ids[..4], ["pulled", "ultimate-001", "ultimate-002", "ultimate-003"]);
    assert_eq!(of_set(&reading, "ultimate").len(), 16);
    assert_eq!(of_set(&reading, "service").len(), 8 + 1);
    assert_eq!(of_set(&reading, "loss").len(), 4);
    let words = |id: &str| {
        let found = reading.cases.iter().find(|case| case.case == id);
        found.unwrap_or_else(|| panic!("no {id} in {ids:?}")).in_words.as_str()
    };
    assert_eq!(words("ultimate-001"), "1.35 self");
    assert_eq!(words("ultimate-002"), "1.35 self + 1.5 snow");
    assert_eq!(words("ultimate-003"), "1.35 self + 1.5 snow + 0.9 press");
    assert_eq!(words("ultimate-009"), "1 self");
    // The first service case is the ninth ultimate one: it has both sets, and its number stays free.
    let ninth = reading
        .cases
        .iter()
        .find(|case| case.case == "ultimate-009")
        .expect("it");
    assert_eq!(ninth.sets, ["ultimate", "service"]);
    assert!(!ids.contains(&"service-001") && ids.contains(&"service-002"));
    assert_eq!(words("loss-002"), "1 self + 0.2 snow");
    assert_eq!(words("loss-002-without-bracing"), "1 self + 0.2 snow without bracing");
    let note = told(&reading, Note, reasons::CASES_MADE, "combinations[1]");
    assert!(
        note.message
            .contains("asks for 8 cases, of which there were 1 before: \"ultimate-009\""),
        "{note:?}"
    );
}

#[test]
fn prestress_the_pair_and_exchange_make_cases_of_their_own() {
    let brief = changed(
        yard(),
        &[
            ("/factors/prestress", json!({"high": 1.2, "low": 0.9})),
            (
                "/combinations/0",
                json!({"set": "ultimate", "fundamental": {"pair": {}, "remove_each": ["bracing"]}}),
            ),
        ],
    );
    let reading = reading(&brief);
    let words: Vec<&str> = of_set(&reading, "ultimate")
        .iter()
        .map(|case| case.in_words.as_str())
        .collect();
    for wanted in [
        "1.35 self, prestress times 1.2",
        "1.35 self + 0.75 snow + 0.9 press, prestress times 0.9",
        "1.1475 self + 1.5 snow + 0.9 press, prestress times 1.2",
        "1 self + 0.75 snow + 1.5 lift, prestress times 0.9 without bracing",
    ] {
        assert!(words.contains(&wanted), "{wanted} is not among {words:#?}");
    }
    // 6 selections and 8 combinations, but for permanent actions alone, favourable: once in both.
    assert_eq!(words.len(), 2 * 2 * (2 * (6 + 8) - 1));
    let resolved = reading
        .resolved
        .iter()
        .find(|value| value.path == "combinations[0].fundamental.pair.xi");
    assert!(resolved.expect("a default").value.starts_with("0.85"));
}

#[test]
fn accidental_actions_act_in_accidental_combinations_alone() {
    let brief = changed(
        yard(),
        &[
            (
                "/actions/-",
                json!({"id": "crash", "class": "crash", "loads": [{"nodes": {"on": ["m"], "force_n": [900, 0, 0]}}]}),
            ),
            ("/factors/classes/-", json!({"id": "crash", "accidental": {}})),
        ],
    );
    let reading = reading(&brief);
    let words: Vec<&str> = reading.cases.iter().map(|case| case.in_words.as_str()).collect();
    let crash: Vec<&&str> = words.iter().filter(|words| words.contains("crash")).collect();
    assert_eq!(
        crash,
        [
            &"1 self + 1 crash",
            &"1 self + 0.2 snow + 1 crash",
            &"1 self + 0.2 press + 1 crash",
            &"1 self + 0.2 lift + 1 crash"
        ]
    );
    assert_eq!(of_set(&reading, "loss").len(), 4 + 4);
}

#[test]
fn factors_that_are_none() {
    for (pointer, value, reason, path) in [
        (
            "/factors/classes/1/variable/gamma",
            json!(-1.5),
            "NEGATIVE",
            "factors.classes[snow].variable.gamma",
        ),
        (
            "/factors/classes/1/variable/psi0",
            json!(1.2),
            "OUT_OF_RANGE",
            "factors.classes[snow].variable.psi0",
        ),
        (
            "/factors/classes/1/variable/psi2",
            json!(-0.1),
            "OUT_OF_RANGE",
            "factors.classes[snow].variable.psi2",
        ),
        (
            "/factors/classes/0/permanent/adverse",
            json!("NaN"),
            "NOT_FINITE",
            "factors.classes[permanent].permanent.adverse",
        ),
        (
            "/factors/classes/1/id",
            json!("wind"),
            "DUPLICATE_ID",
            "factors.classes[2].id",
        ),
        ("/factors/classes/1/id", json!(""), "BAD_ID", "factors.classes[1].id"),
        (
            "/factors/classes/1",
            json!({"id": "snow"}),
            "MISSING",
            "factors.classes[snow]",
        ),
        (
            "/factors/prestress",
            json!({"low": 0}),
            "NOT_POSITIVE",
            "factors.prestress.low",
        ),
        ("/factors", Value::Null, "MISSING", "factors"),
        (
            "/combinations/0",
            json!({"set": "ultimate"}),
            "MISSING",
            "combinations[0]",
        ),
        ("/combinations/0/set", json!("a/b"), "BAD_ID", "combinations[0].set"),
        (
            "/combinations/1/set",
            json!("envelope"),
            "RESERVED_ID",
            "combinations[1].set",
        ),
        (
            "/combinations/0/fundamental/pair",
            json!({"xi": 1.1}),
            "OUT_OF_RANGE",
            "combinations[0].fundamental.pair.xi",
        ),
        (
            "/combinations/2/accidental/effect_factor",
            json!(0.5),
            "OUT_OF_RANGE",
            "combinations[2].accidental.effect_factor",
        ),
        (
            "/combinations/2/accidental/remove_each/0",
            json!("m"),
            "WRONG_KIND",
            "combinations[2].accidental.remove_each[0]",
        ),
        (
            "/combinations/2/accidental/remove_each/0",
            json!("brcing"),
            "UNKNOWN_ID",
            "combinations[2].accidental.remove_each[0]",
        ),
        (
            "/combinations/2/accidental/remove_each",
            json!([]),
            "COVERS_NOTHING",
            "combinations[2].accidental.effect_factor",
        ),
        ("/cases/0/remove", json!(["m"]), "WRONG_KIND", "cases[pulled].remove[0]"),
        (
            "/cases/0/remove",
            json!(["carrying", "bracing"]),
            "REMOVES_ALL",
            "cases[pulled].remove",
        ),
        (
            "/cases/0/path",
            json!({"to_factor": 0}),
            "NOT_POSITIVE",
            "cases[pulled].path.to_factor",
        ),
        (
            "/cases/0/path",
            json!({"steps": 0}),
            "OUT_OF_RANGE",
            "cases[pulled].path.steps",
        ),
    ] {
        let reading = reading(&changed(yard(), &[(pointer, value)]));
        told(&reading, Error, reason, path);
        assert!(reading.work.is_none());
    }
}

#[test]
fn names_that_stand_for_two_things() {
    check(
        &[("/cases/0/id", json!("service-004"))],
        "DUPLICATE_ID",
        "combinations[1].set",
    );
    check(
        &[("/cases/0/sets/-", json!("ultimate-003"))],
        "DUPLICATE_ID",
        "combinations[0].set",
    );
    check(
        &[("/combinations/1/set", json!("pulled"))],
        "DUPLICATE_ID",
        "combinations[1].set",
    );
    let long = "s".repeat(128);
    check(
        &[("/combinations/0/set", json!(long)), ("/checks/0/over/0", json!(long))],
        "BAD_ID",
        "combinations[0].set",
    );
    let unknown = check(
        &[("/checks/0/over/0", json!("ultimat-003"))],
        "UNKNOWN_ID",
        "checks[0].over[0]",
    );
    assert!(
        unknown.message.contains("Did you mean \"ultimate-003\"?"),
        "{unknown:?}"
    );
}

#[test]
fn rules_that_combine_nothing() {
    let classes = json!([{"id": "dead", "permanent": {"adverse": 1.35, "favourable": 1.0}}]);
    let reading = reading(&changed(yard(), &[("/factors/classes", classes)]));
    told(&reading, Error, "COMBINATION_WITHOUT_ACTIONS", "combinations[0]");
    told(&reading, Note, "CLASS_WITHOUT_ACTIONS", "factors.classes[dead]");
    let error = check(
        &[("/combinations/2/accidental", json!({}))],
        "COMBINATION_WITHOUT_ACTIONS",
        "combinations[2]",
    );
    assert!(error.cure.contains("remove_each"));
}

#[test]
fn odd_factors_are_told_and_can_be_accepted() {
    let actions = |index: usize, class: &str| (format!("/actions/{index}/class"), json!(class));
    let (pointer, value) = actions(1, "snwo");
    for (changes, severity, reason, path) in [
        (
            vec![(pointer.as_str(), value)],
            Doubt,
            "ACTION_NOT_COMBINED",
            "actions[snow].class",
        ),
        (
            vec![("/actions/1/class", json!(""))],
            Doubt,
            "ACTION_NOT_COMBINED",
            "actions[snow].class",
        ),
        (
            vec![("/factors/source", json!(" "))],
            Doubt,
            "NO_SOURCE",
            "factors.source",
        ),
        (
            vec![("/factors/classes/0/permanent/favourable", json!(1.5))],
            Doubt,
            "FACTORS_OUT_OF_ORDER",
            "factors.classes[permanent].permanent",
        ),
        (
            vec![("/factors/classes/1/variable/psi1", json!(0.9))],
            Doubt,
            "FACTORS_OUT_OF_ORDER",
            "factors.classes[snow].variable",
        ),
        (
            vec![("/factors/prestress", json!({"low": 1.1}))],
            Doubt,
            "FACTORS_OUT_OF_ORDER",
            "factors.prestress",
        ),
        (
            vec![("/actions/0/class", json!("wind"))],
            Doubt,
            "CASE_WITHOUT_DEAD_LOAD",
            "combinations[0]",
        ),
        (
            vec![
                ("/combinations", json!([{"set": "ultimate", "fundamental": {}}])),
                (
                    "/factors/classes/0/permanent",
                    json!({"adverse": 1.35, "favourable": 1.35}),
                ),
                ("/cases", json!([])),
                ("/checks", json!([])),
            ],
            Doubt,
            "NO_FAVOURABLE_CASE",
            "actions[self]",
        ),
        (
            vec![
                ("/combinations", json!([{"set": "ultimate", "fundamental": {}}])),
                (
                    "/factors/classes/0/permanent",
                    json!({"adverse": 0.9, "favourable": 0.9}),
                ),
                ("/cases", json!([])),
                ("/checks", json!([])),
            ],
            Doubt,
            "PERMANENT_BELOW_ONE",
            "actions[self]",
        ),
    ] {
        let changes: Vec<(&str, Value)> = changes;
        let base = changed(yard(), &changes);
        let before = reading(&base);
        let id = told(&before, severity, reason, path).id.clone();
        assert!(before.work.is_some(), "{:#?}", errors(&before).collect::<Vec<_>>());
        let accepted = json!([{"reason": reason, "on": id, "note": "known"}]);
        let after = reading(&changed(base, &[("/accepted", accepted)]));
        assert_eq!(told(&after, severity, reason, path).accepted_note, "known");
    }
}

/// Twelve directions of wind in two classes add up; as alternatives they do not.
#[test]
fn too_many_cases_name_the_classes_that_multiply() {
    let mut base = yard();
    for class in ["wind-w", "wind-s"] {
        for direction in 0..12 {
            base = changed(
                base,
                &[(
                    "/actions/-",
                    json!({"id": format!("{class}{direction}"), "class": class,
                           "loads": [{"nodes": {"on": ["m"], "force_n": [100, 0, 0]}}]}),
                )],
            );
        }
        base = changed(
            base,
            &[(
                "/factors/classes/-",
                json!({"id": class, "variable": {"gamma": 1.5, "psi0": 0.6, "psi1": 0.2, "psi2": 0}}),
            )],
        );
    }
    let reading = read(message(&base), &LIMITS);
    let found = told(&reading, Error, "TOO_MANY", "combinations[0]");
    // Leading: snow 1 · 3 · 13 · 13, press and lift 2 · 2 · 13 · 13, one of 24 winds 24 · 2 · 3 · 13; and none.
    let made = 2 * (1 + 3 * 169 + 4 * 169 + 24 * 6 * 13);
    assert_eq!(found.value, made.to_string());
    assert!(
        found
            .message
            .contains("classes \"wind-w\" and \"wind-s\" are not alternatives, so they add up"),
        "{found:?}"
    );
    let merged = 2 * (1 + 3 * 25 + 4 * 25 + 24 * 6);
    assert!(
        found
            .cure
            .contains(&format!("put both into class \"wind\" (then {merged} cases)")),
        "{found:?}"
    );
    // Nothing is made of them.
    assert_eq!(reading.cases.len(), 1);
}

#[test]
fn a_run_of_a_set_takes_what_its_effects_need() {
    let work = work(&yard());
    let selected = work.select(&["loss".to_owned()]).expect("a set").cases;
    let names: Vec<&str> = selected
        .iter()
        .map(|case| work.brief.cases[*case].name.as_str())
        .collect();
    assert_eq!(
        names,
        [
            // 1 self: the intact state of the first loss.
            "ultimate-009",
            "loss-001-without-bracing",
            "loss-002",
            "loss-002-without-bracing",
            "loss-003",
            "loss-003-without-bracing",
            "loss-004",
            "loss-004-without-bracing"
        ]
    );
    let one = work
        .select(&["loss-003-without-bracing-effect".to_owned()])
        .expect("an effect");
    assert_eq!(one.cases.len(), 2);
    assert_eq!(
        work.select(&["ultimate-003".to_owned()]).expect("a case").cases.len(),
        1
    );
    let unknown = work.select(&["losss".to_owned()]).expect_err("no such set");
    assert!(unknown.message.contains("Did you mean \"loss\"?"), "{unknown:?}");
}

fn effects(events: &[Event]) -> Vec<&v1::DesignEffect> {
    let effects = events.iter().filter_map(|event| match event {
        Event::DesignEffect(effect) => Some(effect),
        _ => None,
    });
    effects.collect()
}

fn column<'e>(events: &'e [Event], case: &str, name: &str) -> &'e [f64] {
    let mut columns = events.iter().filter_map(|event| match event {
        Event::Columns(columns) if columns.case == case && columns.name == name => Some(&columns.values[..]),
        _ => None,
    });
    columns.next().unwrap_or_else(|| panic!("no {name} of {case}"))
}

#[test]
fn a_loss_is_told_as_effects_and_as_a_table() {
    let work = work(&yard());
    let all: Vec<usize> = (0..work.brief.cases.len()).collect();
    let events = run(&work, &all);
    let effects = effects(&events);
    assert_eq!(effects.len(), 4);
    let effect = effects
        .iter()
        .find(|effect| effect.id == "loss-002-without-bracing-effect")
        .expect("it");
    assert!(effect.answered && effect.factor == 1.5 && effect.sets == ["loss"]);
    assert_eq!(effect.rule(), v1::EffectRule::Loss);
    assert_eq!(
        effect.in_words,
        "(1 self + 0.2 snow) and 1.5 times what changes to (1 self + 0.2 snow without bracing)"
    );
    let of = |case: &str| column(&events, case, "tension_n")[0];
    let expected = of("loss-002") + 1.5 * (of("loss-002-without-bracing") - of("loss-002"));
    assert!((of(&effect.id) - expected.max(0.0)).abs() < 1e-9 * expected.abs());
    assert_eq!(column(&events, &effect.id, "tension_n")[2..], [0.0, 0.0]);
    let tables = events.iter().filter_map(|event| match event {
        Event::LossTable(table) => Some(table),
        _ => None,
    });
    let rows: Vec<&v1::LossRow> = tables.flat_map(|table| &table.rows).collect();
    let [row] = rows[..] else { panic!("{rows:?}") };
    assert_eq!(
        (&row.removed[..], row.cases, row.factor),
        (&["bracing".to_owned()][..], 4, 1.5)
    );
    assert_eq!((row.unanswered_total, row.worst.len()), (0, 1));
    let cell = &row.worst[0];
    assert_eq!(cell.member, "carrying");
    assert!((cell.share_of_breaking.expect("known") - cell.force_n / 82e3).abs() < 1e-12);
    assert!(row.largest_movement_m > 0.0 && row.largest_movement_node == "m");
    let Some(Event::Summary(summary)) = events.last() else {
        panic!("no summary")
    };
    // The check over the loss reads states and effects; the bracing is not there to be judged.
    let check = &summary.checks[1];
    assert_eq!((check.judged, check.not_judged_ids.len()), (1, 1));
    let cautions = summary.cautions.join("\n");
    assert!(
        cautions.contains("EN 1990:2002, recommended values") && cautions.contains("never states"),
        "{cautions}"
    );
}

#[test]
fn a_loss_that_leaves_a_mechanism_is_named() {
    let changes = [
        (
            "/cases/0",
            json!({"id": "pulled", "factors": {"self": 1, "snow": 1}, "remove": ["carrying"], "sets": ["service"]}),
        ),
        ("/net/nodes/0/support", json!({})),
        ("/combinations/2/accidental/remove_each", json!(["carrying", "bracing"])),
        ("/net/cables/1/nodes", json!(["B", "n", "D"])),
        ("/net/nodes/-", json!({"id": "n", "xyz_m": [4.5, 4.5, 0]})),
    ];
    let work = work(&changed(yard(), &changes));
    let events = run(&work, &[0]);
    let failure = events.iter().find_map(|event| match event {
        Event::CaseSummary(summary) if summary.case == "pulled" => summary.failure.as_ref(),
        _ => None,
    });
    let failure = failure.expect("no equilibrium");
    assert_eq!(
        (failure.reason.as_str(), &failure.nodes[..1]),
        ("NOT_HELD", &["m".to_owned()][..])
    );
    assert!(failure.message.ends_with("Taken out: \"carrying\"."), "{failure:?}");

    // The rule's own losses: those without an answer are counted, their effects say so, and nothing else ends.
    let all: Vec<usize> = (0..work.brief.cases.len()).collect();
    let events = run(&work, &all);
    let unanswered = effects(&events).into_iter().filter(|effect| !effect.answered);
    let unanswered: Vec<&str> = unanswered.map(|effect| effect.id.as_str()).collect();
    assert!(
        !unanswered.is_empty() && unanswered.iter().all(|id| id.ends_with("-without-carrying-effect")),
        "{unanswered:?}"
    );
    let rows = events.iter().find_map(|event| match event {
        Event::LossTable(table) => Some(&table.rows),
        _ => None,
    });
    let row = rows
        .and_then(|rows| rows.iter().find(|row| row.removed == ["carrying"]))
        .expect("a row");
    assert!(
        row.unanswered_total as usize >= unanswered.len() && row.unanswered[0] == "pulled",
        "{row:?}"
    );
    let Some(Event::Summary(summary)) = events.last() else {
        panic!("no summary")
    };
    assert_eq!(summary.verdict(), v1::Verdict::NoAnswer);
    assert_eq!(summary.checks[1].verdict(), v1::Verdict::NoAnswer);
    // The ultimate cases are judged all the same: 2.2 times the tension under 1.35 self + 1.5 snow + 0.9 press is too much.
    let ultimate = &summary.checks[0];
    assert_eq!(
        (ultimate.judged, ultimate.verdict()),
        (2, v1::Verdict::Exceeds),
        "{ultimate:?}"
    );
}

#[test]
fn factors_on_effects_stand_beside_factors_on_actions() {
    let brief = changed(
        yard(),
        &[
            (
                "/combinations",
                json!([{"set": "ultimate", "fundamental": {"on_effect": {"set": "beside"}}}]),
            ),
            ("/checks", json!([{"safety": {"factor": 2.2}, "over": ["beside"]}])),
        ],
    );
    let work = work(&brief);
    let names: Vec<&str> = work.brief.effects.iter().map(|effect| effect.name.as_str()).collect();
    // Permanent actions alone where their factor is not 1, then each action alone, adverse and favourable.
    assert_eq!(
        names,
        [
            "ultimate-001-on-effect",
            "ultimate-002-on-effect",
            "ultimate-002-on-parts",
            "ultimate-005-on-effect",
            "ultimate-005-on-parts",
            "ultimate-007-on-effect",
            "ultimate-007-on-parts",
            "ultimate-010-on-effect",
            "ultimate-010-on-parts",
            "ultimate-013-on-effect",
            "ultimate-013-on-parts",
            "ultimate-015-on-effect",
            "ultimate-015-on-parts"
        ]
    );
    let all: Vec<usize> = (0..work.brief.cases.len()).collect();
    let events = run(&work, &all);
    let effects = effects(&events);
    assert_eq!(effects.len(), names.len());
    let parts = effects
        .iter()
        .find(|effect| effect.id == "ultimate-002-on-parts")
        .expect("it");
    assert_eq!(
        parts.in_words,
        "1.35 of (1 self) and 1.5 of what changes to (1 self + 1 snow)"
    );
    let of = |case: &str| column(&events, case, "tension_n")[0];
    let [permanent, whole] = [&parts.terms[0].case, &parts.terms[1].case].map(|case| of(case));
    let expected = 1.35 * permanent + 1.5 * (whole - permanent);
    assert!((of(&parts.id) - expected).abs() < 1e-9 * expected);
    let index = column(&events, &parts.id, "over_linearity")[0];
    assert!((index - of("ultimate-002") / expected).abs() < 1e-12);
    let worst = &parts.members[0];
    assert!((worst.index - worst.on_action_n / worst.on_effect_n).abs() < 1e-12);
    // The envelope tells which way governs.
    let [on_action, on_effect] =
        ["tension_max_on_action_n", "tension_max_on_effect_n"].map(|name| column(&events, "envelope", name)[0]);
    assert!(on_effect > on_action && on_action > 0.0);
    let Some(Event::Summary(summary)) = events.last() else {
        panic!("no summary")
    };
    assert!(
        summary.checks[0].governing_case.ends_with("-on-effect"),
        "{:?}",
        summary.checks[0]
    );
}

#[test]
fn a_frozen_brief_keeps_its_factors_and_rules() {
    let work = work(&yard());
    let plan = ropewalk_numerics::brief::Plan::new(work.brief.clone());
    let found = plan.reference(&mut |_| std::ops::ControlFlow::Continue(()));
    let parts = ropewalk_service::encode::freeze(&work, &plan, &found).expect("a frozen brief");
    let bytes: Vec<u8> = (parts.iter())
        .filter_map(|response| match &response.part {
            Some(v1::freeze_response::Part::Brief(brief)) => Some(prost::Message::encode_to_vec(brief)),
            _ => None,
        })
        .flatten()
        .collect();
    let frozen: v1::Brief = prost::Message::decode(bytes.as_slice()).expect("parts merge");
    assert_eq!(
        (&frozen.factors, &frozen.combinations),
        (&work.message.factors, &work.message.combinations)
    );
}

#[test]
fn very_many_rules_and_classes_are_refused_before_anything_is_made() {
    let rules: Vec<Value> = (0..1001)
        .map(|_| json!({"set": "ultimate", "fundamental": {}}))
        .collect();
    check(&[("/combinations", json!(rules))], "TOO_MANY", "combinations");
    let class = |number: usize| json!({"id": format!("c{number}"), "accidental": {}});
    let classes: Vec<Value> = (0..1001).map(class).collect();
    check(&[("/factors/classes", json!(classes))], "TOO_MANY", "factors.classes");
}
