//! What is said of a run: the order of events, arrays in parts, the summary, failures by name.

use std::collections::BTreeMap;
use std::ops::ControlFlow;

use nalgebra::Vector3;
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{CaseOutcome, Cause, Culprit, LikelyCause};
use ropewalk_numerics::equilibrium::{SolveError, Termination};
use ropewalk_numerics::model::NodeId;
use ropewalk_service::decode::Work;
use ropewalk_service::encode::{Tally, case, closing, design_effect, engine_error, id_tables, reference, started};
use serde_json::json;
use v1::run_response::Event;

use crate::briefs::{changed, first_net, found, terrace, work};

/// Every event of a run of some cases.
pub(crate) fn run(work: &Work, cases: &[usize]) -> Vec<Event> {
    let plan = ropewalk_numerics::brief::Plan::new(work.brief.clone());
    let mut messages = vec![v1::RunResponse {
        event: Some(Event::Started(started(work, &plan, cases))),
    }];
    messages.extend(id_tables(work, &plan, cases).into_iter().map(|table| v1::RunResponse {
        event: Some(Event::Ids(table)),
    }));
    let mut history = Vec::new();
    let found = plan.reference_with_history(&mut history, &mut |_| ControlFlow::Continue(()));
    messages.extend(reference(work, &plan, &found, &history));
    let mut tally = Tally::new(&plan, cases, &[], &found);
    if let Ok(found) = &found {
        for index in cases {
            let outcome = plan.case(found, *index, &mut |_| ControlFlow::Continue(()));
            let (said, noted) = case(work, &plan, found, *index, &outcome);
            messages.extend(said);
            for effect in tally.add(*index, &noted) {
                messages.extend(design_effect(work, &plan, found, &effect));
            }
        }
    }
    messages.extend(closing(work, &plan, tally));
    messages
        .into_iter()
        .map(|message| message.event.expect("an event"))
        .collect()
}

/// The arrays of a run by case and name, put together from their parts.
#[track_caller]
fn arrays(events: &[Event]) -> BTreeMap<(String, String), v1::Columns> {
    let mut arrays: BTreeMap<(String, String), v1::Columns> = BTreeMap::new();
    for event in events {
        if let Event::Columns(part) = event {
            let key = (part.case.clone(), part.name.clone());
            match arrays.get_mut(&key) {
                Some(array) => {
                    assert_eq!(part.offset as usize, array.values.len(), "parts come in order");
                    array.values.extend(&part.values);
                }
                None => {
                    assert_eq!(part.offset, 0);
                    arrays.insert(key, part.clone());
                }
            }
        }
    }
    for array in arrays.values() {
        assert_eq!(array.values.len(), array.total as usize, "{} is complete", array.name);
    }
    arrays
}

fn summary(events: &[Event]) -> &v1::Summary {
    match events.last() {
        Some(Event::Summary(summary)) => summary,
        other => panic!("{other:?} comes last"),
    }
}

fn closings(events: &[Event]) -> Vec<&v1::CaseSummary> {
    let closings = events.iter().filter_map(|event| match event {
        Event::CaseSummary(closing) => Some(closing),
        _ => None,
    });
    closings.collect()
}

/// What is proven is told of every answered state; energies where they are asked for.
#[test]
fn certificates_tell_their_energies_on_request_only() {
    let asked = changed(first_net(), &[("/solving", json!({"energies": true}))]);
    for (brief, told) in [(first_net(), false), (asked, true)] {
        let events = run(&work(&brief), &[0]);
        let closings = closings(&events);
        assert_eq!(closings.len(), 2);
        for closing in closings {
            let certificate = closing.certificate.as_ref().expect("answered");
            assert!(certificate.certified && certificate.condition.is_empty());
            assert!(certificate.tension_within_n > 0.0 && certificate.tension_within_n < 1e-3);
            assert!(["carrying", "bracing"].contains(&certificate.tension_within_member.as_str()));
            assert!(certificate.position_within_m < 1e-6);
            assert_eq!(certificate.nodes_without_bound_total, 0);
            assert_eq!(certificate.gap_j.is_some(), told);
            assert_eq!(certificate.strain_energy_j.is_some_and(|energy| energy > 0.0), told);
        }
    }
}

#[test]
fn a_pushing_strut_is_the_condition_of_a_certificate() {
    let events = run(&work(&terrace()), &[]);
    let reference = closings(&events)[0];
    let certificate = reference.certificate.as_ref().expect("answered");
    assert!(certificate.condition.contains("struts"), "{}", certificate.condition);
    assert!(certificate.certified);
}

/// Worked numbers of the minimal draft: own Newton solve, stated beside it in the contract's design.
#[test]
fn the_minimal_draft_gives_its_worked_numbers() {
    let work = work(&first_net());
    let events = run(&work, &[0]);
    let arrays = arrays(&events);
    let array = |case: &str, name: &str| &arrays[&(case.to_owned(), name.to_owned())];
    let tensions = &array("full-snow", "tension_n").values;
    for (tension, worked) in tensions.iter().zip([24_820.0, 24_820.0, 14_484.0, 14_484.0]) {
        assert!((tension - worked).abs() < 0.5, "{tension} instead of {worked}");
    }
    let moved = array("full-snow", "displacement_m");
    assert_eq!(
        (moved.baseline.as_str(), moved.unit.as_str(), moved.components),
        ("reference", "m", 3)
    );
    assert!((moved.values[14] + 0.02259).abs() < 5e-6, "{}", moved.values[14]);
    assert_eq!(array("reference", "unstressed_length_m").values.len(), 4);
    let most = array("envelope", "tension_max_n");
    assert!((most.values[0] - 24_820.0).abs() < 0.5);
    assert_eq!(array("envelope", "tension_max_case").values, [0.0, 0.0, -1.0, -1.0]);
    assert_eq!(array("envelope", "tension_min_case").values, [-1.0, -1.0, 0.0, 0.0]);
    // At A the carrying rope pulls towards C and down: 45 degrees in plan.
    let plan = array("reference", "end_angle_plan_deg").values[0];
    let up = array("reference", "end_angle_up_deg").values[0];
    assert!((plan - 45.0).abs() < 1e-9, "{plan}");
    let expected = (-1.5_f64).atan2(4.5 * 2.0_f64.sqrt()).to_degrees();
    assert!((up - expected).abs() < 1e-6, "{up}");

    let closing = closings(&events)[1];
    assert_eq!(closing.outcome(), v1::CaseOutcome::Answered);
    assert!(closing.audited);
    assert_eq!(closing.largest_movement_node, "m");
    assert!((closing.load_sum_n[2] + 5000.0).abs() < 1e-9);
    assert!((closing.support_force_sum_n[2] - 5000.0).abs() < 1e-3);
    assert_eq!(closing.lowest_tension_cable, "bracing");
    let share = closing.lowest_tension_share.expect("taut ropes");
    assert!((share - 14_484.0 / 19_615.0).abs() < 1e-4, "{share}");
    let summary = summary(&events);
    assert_eq!(summary.verdict(), v1::Verdict::NotJudged);
    assert_eq!(summary.answered, Some(v1::Share { count: 2, of: 2 }));
    assert_eq!(summary.audited, Some(v1::Share { count: 2, of: 2 }));
    assert!(
        summary
            .cautions
            .iter()
            .any(|caution| caution.contains("licensed engineer"))
    );
}

#[test]
fn events_come_in_order() {
    let work = work(&terrace());
    let events = run(&work, &[0, 1, 2]);
    assert!(matches!(events[0], Event::Started(_)));
    let mut open: Option<String> = None;
    let mut closed = Vec::new();
    for event in &events {
        match event {
            Event::CaseBegin(begin) => assert!(open.replace(begin.case.clone()).is_none()),
            Event::Columns(columns) if columns.case != "envelope" => assert_eq!(open.as_ref(), Some(&columns.case)),
            Event::Columns(_) => assert!(open.is_none()),
            Event::CaseSummary(closing) => {
                assert_eq!(open.take().as_ref(), Some(&closing.case));
                closed.push(closing.case.clone());
            }
            Event::Ids(_) => assert!(open.is_none() && closed.is_empty()),
            _ => {}
        }
    }
    assert_eq!(closed, ["reference", "snowed", "iced", "summer"]);
    let begin = events.iter().find_map(|event| match event {
        Event::CaseBegin(begin) if begin.case == "iced" => Some(begin),
        _ => None,
    });
    let begin = begin.expect("the case begins");
    assert_eq!(
        (begin.in_words.as_str(), begin.sets.as_slice()),
        ("1.35 self + 1.5 ice", ["winter".to_owned()].as_slice())
    );
}

/// The post stands upright: its pull has no direction in plan, and rounding does not make one up.
#[test]
fn an_upright_pull_has_no_angle_in_plan() {
    let events = run(&work(&terrace()), &[]);
    let arrays = arrays(&events);
    let angle = |name: &str| arrays[&("reference".to_owned(), name.to_owned())].values[5];
    assert_eq!((angle("end_angle_plan_deg"), angle("end_angle_up_deg")), (0.0, -90.0));
}

/// Equal load steps of one case: it is put on in halves, the other cases are not.
#[test]
fn load_steps_of_a_case_are_its_own() {
    let events = run(&work(&terrace()), &[0, 1]);
    let arrays = arrays(&events);
    let factors = |case: &str| &arrays[&(case.to_owned(), "iteration_load_factor".to_owned())].values;
    assert!(factors("snowed").contains(&0.5) && factors("snowed").ends_with(&[1.0]));
    assert!(factors("iced").iter().all(|factor| *factor == 1.0));
}

/// Arrays and tables have the lengths of what they range over.
#[test]
fn arrays_fit_their_tables() {
    let work = work(&terrace());
    let events = run(&work, &[0]);
    let mut totals: BTreeMap<i32, u32> = BTreeMap::new();
    let mut sizes = None;
    for event in &events {
        match event {
            Event::Ids(table) => {
                assert_eq!(table.total as usize, table.ids.len());
                totals.insert(table.over, table.total);
            }
            Event::Started(started) => sizes = started.sizes,
            _ => {}
        }
    }
    let sizes = sizes.expect("sizes are told");
    let of = |over: v1::Range| totals.get(&over.into()).copied();
    assert_eq!(of(v1::Range::Node), Some(sizes.nodes));
    assert_eq!(of(v1::Range::Segment), Some(sizes.segments));
    assert_eq!(of(v1::Range::Cable), Some(sizes.cables));
    assert_eq!(of(v1::Range::Strut), Some(sizes.struts));
    assert_eq!(of(v1::Range::Support), Some(sizes.supports));
    assert_eq!(of(v1::Range::Case), Some(1));
    for ((_, name), array) in arrays(&events) {
        let length = match array.over() {
            v1::Range::RopeSegment => sizes.segments - sizes.struts,
            v1::Range::Reach => sizes.segments,
            v1::Range::Iteration => continue,
            over => of(over).unwrap_or_else(|| panic!("no table for {name}")),
        };
        assert_eq!(array.total, length * array.components, "{name}");
    }
}

#[test]
fn checks_are_told_with_demand_limit_and_source() {
    let events = run(&work(&terrace()), &[0, 1, 2]);
    let summary = summary(&events);
    let [safety, slackness, movement, pull] = &summary.checks[..] else {
        panic!("four checks");
    };
    assert_eq!(
        (safety.path.as_str(), safety.kind.as_str(), safety.unit.as_str()),
        ("checks[0]", "safety", "N")
    );
    assert_eq!((safety.judged, safety.not_judged), (4, 0));
    assert!((safety.ratio - safety.demand / safety.limit).abs() < 1e-12);
    assert!(safety.source.contains("breaking force"), "{}", safety.source);
    assert_eq!(slackness.over, ["service"]);
    assert_eq!((movement.judged, movement.unit.as_str()), (2, "m"));
    assert_eq!(pull.judged, 3);
    // The worst ratio of a case is that of the checks that read it.
    let worst = closings(&events)
        .iter()
        .filter_map(|closing| closing.worst_ratio)
        .fold(0.0, f64::max);
    let over_all = summary.checks.iter().map(|check| check.ratio).fold(0.0, f64::max);
    assert!((worst - over_all).abs() < 1e-12, "{worst} and {over_all}");
    assert_eq!(summary.judged, Some(v1::Share { count: 11, of: 11 }));
}

#[test]
fn checks_judge_what_was_run() {
    let work = work(&terrace());
    let only = work.select(&["summer".to_owned()]).expect("a case").cases;
    let events = run(&work, &only);
    let summary = summary(&events);
    assert_eq!(summary.answered, Some(v1::Share { count: 2, of: 2 }));
    assert_eq!(summary.checks[1].governing_case, "summer");
    // The winter cases were not run, so the check that reads them judges nothing.
    assert_eq!(
        (summary.checks[0].judged, summary.checks[0].verdict()),
        (0, v1::Verdict::NotJudged)
    );
}

#[test]
fn a_case_that_nothing_holds_is_told_by_names() {
    let work = work(&terrace());
    let (plan, found) = found(&work);
    let error = SolveError::NotHeld {
        nodes: vec![NodeId::new(7)],
        direction: -Vector3::z(),
        force: 5000.0,
    };
    let cause = Cause {
        likely: LikelyCause::NotHeld {
            nodes: vec!["m".to_owned()],
            force: Vector3::new(0.0, 0.0, -5000.0),
        },
        worst: Vec::new(),
        members: vec!["carrying".to_owned()],
        last_good_load_factor: 0.0,
        stopped_at: None,
        exists: false,
        taken_out: vec!["g1".to_owned()],
    };
    let (said, noted) = case(&work, &plan, &found, 0, &CaseOutcome::None { error, cause });
    let closing = closing_of_case(&said);
    assert_eq!(closing.outcome(), v1::CaseOutcome::NoEquilibrium);
    let failure = closing.failure.expect("a failure");
    assert_eq!(
        (failure.reason.as_str(), failure.group.as_str()),
        ("NOT_HELD", "NOT_HELD/m")
    );
    assert!(
        failure.message.contains("Taken out in this case: \"g1\""),
        "{}",
        failure.message
    );
    assert_eq!(
        (failure.nodes, failure.members),
        (vec!["m".to_owned()], vec!["carrying".to_owned()])
    );
    assert!(
        failure
            .message
            .starts_with("case \"snowed\" has no equilibrium: nothing holds \"m\""),
        "{}",
        failure.message
    );
    assert!(!failure.cure.is_empty());
    let columns = said
        .iter()
        .any(|message| matches!(message.event, Some(Event::Columns(_))));
    assert!(!columns, "there is no state to tell");
    let mut tally = Tally::new(&plan, &[0], &[], &Ok(found));
    tally.add(0, &noted);
    let summary = closing_of(&work, &plan, tally);
    assert_eq!(summary.verdict(), v1::Verdict::NoAnswer);
    assert_eq!(summary.findings[0].count, 1);
}

#[test]
fn a_case_that_stops_keeps_its_last_state_and_says_where() {
    let work = work(&terrace());
    let (plan, found) = found(&work);
    let CaseOutcome::State {
        mut solution, result, ..
    } = plan.case(&found, 0, &mut |_| ControlFlow::Continue(()))
    else {
        panic!("a state");
    };
    solution.termination = Termination::StepTooSmall;
    solution.load_factor = 0.62;
    let cause = Cause {
        likely: LikelyCause::Tips {
            slack_cables: vec!["bracing".to_owned()],
            load_sum: Vector3::new(0.0, 0.0, 12_400.0),
        },
        worst: vec![Culprit {
            node: "m".to_owned(),
            imbalance: 410.0,
            moved: 1.84,
        }],
        members: vec!["bracing".to_owned()],
        last_good_load_factor: 0.6,
        stopped_at: Some(0.62),
        exists: false,
        taken_out: Vec::new(),
    };
    let cause = Some(cause);
    let (said, _) = case(
        &work,
        &plan,
        &found,
        0,
        &CaseOutcome::State {
            solution,
            result,
            cause,
        },
    );
    let closing = closing_of_case(&said);
    assert_eq!(
        (closing.outcome(), closing.load_factor),
        (v1::CaseOutcome::NotConverged, 0.62)
    );
    assert_eq!(closing.worst_ratio, None);
    let failure = closing.failure.expect("a failure");
    assert_eq!(failure.reason, "STEP_TOO_SMALL");
    assert_eq!(
        (failure.nodes, failure.members),
        (vec!["m".to_owned()], vec!["bracing".to_owned()])
    );
    for words in [
        "case \"snowed\" made no more headway at 62 % of its load",
        "\"bracing\"",
        "\"m\"",
        "Last good state kept at 60.0 % of the load",
        "the load tips the net; its sum is 12.4 kN upwards",
        "gave the same stop, down to 62.0 %",
    ] {
        assert!(failure.message.contains(words), "{words}: {}", failure.message);
    }
    assert!(
        said.iter()
            .any(|message| matches!(message.event, Some(Event::Columns(_))))
    );
}

fn closing_of_case(said: &[v1::RunResponse]) -> v1::CaseSummary {
    match said.last().and_then(|message| message.event.clone()) {
        Some(Event::CaseSummary(closing)) => closing,
        other => panic!("{other:?} closes the case"),
    }
}

/// A rope with a free end hangs slack from A: nothing says where its end is.
#[test]
fn a_loose_end_is_told_by_name() {
    let json = changed(
        first_net(),
        &[
            ("/net/nodes/-", json!({"id": "p", "xyz_m": [1, 1, 1]})),
            (
                "/net/cables/-",
                json!({"id": "hanger", "section": "r10", "nodes": ["A", "p"]}),
            ),
            (
                "/prestress/rules/-",
                json!({"on": ["hanger"], "unstressed_length_m": 4}),
            ),
        ],
    );
    let work = work(&json);
    let events = run(&work, &[0]);
    let closing = closings(&events)[0];
    let failure = closing.failure.as_ref().expect("no reference state");
    assert!(failure.nodes.contains(&"p".to_owned()), "{failure:#?}");
    assert_eq!(summary(&events).verdict(), v1::Verdict::NoAnswer);
}

#[test]
fn failures_of_our_own_are_told_and_do_not_end_the_run() {
    let work = work(&first_net());
    let (plan, found) = found(&work);
    let found = Ok(found);
    let mut tally = Tally::new(&plan, &[0], &[], &found);
    let (said, noted) = engine_error(&work, &plan, 0);
    tally.add(0, &noted);
    let Some(Event::CaseSummary(closing)) = said.last().and_then(|message| message.event.clone()) else {
        panic!("the case is closed");
    };
    assert_eq!(closing.outcome(), v1::CaseOutcome::EngineError);
    assert_eq!(closing.failure.expect("a failure").reason, "ENGINE_ERROR");
    let said = ropewalk_service::encode::closing(&work, &plan, tally);
    let Some(Event::Summary(summary)) = said.last().and_then(|message| message.event.clone()) else {
        panic!("the summary comes last");
    };
    assert_eq!(summary.verdict(), v1::Verdict::NoAnswer);
    assert_eq!(summary.answered, Some(v1::Share { count: 1, of: 2 }));
    assert_eq!(summary.findings[0].count, 1);
}

#[test]
fn without_a_reference_state_nothing_is_judged() {
    let work = work(&terrace());
    let plan = ropewalk_numerics::brief::Plan::new(work.brief.clone());
    let found = plan.reference(&mut |_| ControlFlow::Break(()));
    assert!(found.is_err());
    let said = reference(&work, &plan, &found, &[]);
    let Some(Event::CaseSummary(closing)) = said.last().and_then(|message| message.event.clone()) else {
        panic!("the reference state is closed");
    };
    let failure = closing.failure.expect("a failure");
    assert_eq!(failure.reason, "CANCELLED");
    let said = closing_of(&work, &plan, Tally::new(&plan, &[0, 1, 2], &[], &found));
    assert_eq!(said.verdict(), v1::Verdict::NoAnswer);
    assert_eq!(said.answered, Some(v1::Share { count: 0, of: 4 }));
    assert_eq!(said.checks[0].not_judged, 4);
    assert_eq!(said.judged, Some(v1::Share { count: 0, of: 11 }));
}

fn closing_of(work: &Work, plan: &ropewalk_numerics::brief::Plan, tally: Tally) -> v1::Summary {
    match closing(work, plan, tally).pop().and_then(|message| message.event) {
        Some(Event::Summary(summary)) => summary,
        other => panic!("{other:?} comes last"),
    }
}

#[test]
fn the_search_for_the_reference_state_tells_its_iterations() {
    let events = run(&work(&first_net()), &[0]);
    let arrays = arrays(&events);
    for state in ["reference", "full-snow"] {
        let residuals = &arrays[&(state.to_owned(), "iteration_residual_n".to_owned())].values;
        assert!(residuals.len() > 1, "{state}: {residuals:?}");
        let last = residuals.last().expect("an iteration");
        assert!(*last <= 1e-5, "{state} ends in balance: {residuals:?}");
    }
}

/// Doubts that need no check: a rope stretched beyond what any bears, and one beyond its breaking force.
#[test]
fn states_that_can_not_be_meant_are_doubted() {
    let doubts = |changes: &[(&str, serde_json::Value)], reason: &str| {
        let events = run(&work(&changed(first_net(), changes)), &[0]);
        let found = events.into_iter().filter_map(|event| match event {
            Event::Finding(finding) if finding.reason == reason => Some(finding),
            _ => None,
        });
        found.collect::<Vec<v1::Finding>>()
    };
    let section = "/net/sections/0/";
    let soft = doubts(&[(&format!("{section}axial_stiffness_n"), json!(65_000))], "UNIT_SLIP");
    assert_eq!(
        soft.iter().map(|f| f.case.as_str()).collect::<Vec<_>>(),
        ["reference", "full-snow"]
    );
    // 19.6 kN over 65 kN.
    assert!(
        soft[0].message.contains("stretched by 30.2 % with 19.6 kN"),
        "{}",
        soft[0].message
    );
    let weak = doubts(
        &[(&format!("{section}breaking_force_n"), json!(22_000))],
        "OVER_BREAKING",
    );
    assert_eq!(weak.iter().map(|f| f.case.as_str()).collect::<Vec<_>>(), ["full-snow"]);
    assert!(
        weak[0].message.contains("\"carrying\" would break: 24.8 kN"),
        "{}",
        weak[0].message
    );
}
