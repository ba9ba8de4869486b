//! Runs that go well.

use ropewalk_api::ropewalk::v1;
use tonic::Code;
use v1::run_response::Event;

use crate::briefs;
use crate::client::{case_summaries, code_and_reason, collect, columns, lasting_bytes};
use crate::engine::Engine;

#[tokio::test]
async fn the_smallest_brief_is_answered_as_the_contract_works_it_out() {
    let engine = Engine::start(&[]);
    let stream = engine
        .briefs()
        .await
        .run(briefs::run(briefs::first_net()))
        .await
        .expect("a run");
    let (events, end) = collect(stream.into_inner()).await;
    end.expect("ends well");
    assert!(matches!(events[0].event, Some(Event::Started(_))), "{:?}", events[0]);
    let [.., timing, summary] = &events[..] else {
        panic!("{} events", events.len())
    };
    assert!(matches!(timing.event, Some(Event::Timing(_))), "{timing:?}");
    assert!(matches!(summary.event, Some(Event::Summary(_))), "{summary:?}");
    let summaries = case_summaries(&events);
    let names: Vec<&str> = summaries.iter().map(|summary| summary.case.as_str()).collect();
    assert_eq!(names, ["reference", "full-snow"]);
    assert!(
        summaries
            .iter()
            .all(|summary| summary.outcome() == v1::CaseOutcome::Answered && summary.audited)
    );

    // Worked numbers of the contract's first brief: 19.615 kN in all four segments; under snow the crossing sinks
    // 22.59 mm, carrying rope 24.820 kN, bracing rope 14.484 kN. They follow from statics by hand: by symmetry both
    // halves of a rope are equal, 2·N·(rise)/(length) = force.
    let reference = &columns(&events, "reference")["tension_n"];
    assert!(
        reference.iter().all(|tension| (tension - 19_615.0).abs() < 1.0),
        "{reference:?}"
    );
    let snow = columns(&events, "full-snow");
    let expected = [24_820.0, 24_820.0, 14_484.0, 14_484.0];
    for (tension, expected) in snow["tension_n"].iter().zip(expected) {
        assert!((tension - expected).abs() < 1.0, "{:?}", snow["tension_n"]);
    }
    let sunk = snow["displacement_m"][4 * 3 + 2];
    assert!((sunk + 0.022_59).abs() < 1e-5, "{sunk}");
}

#[tokio::test]
async fn equal_requests_give_equal_bytes_on_one_thread_and_on_two() {
    let mut answers = Vec::new();
    for threads in ["1", "2", "2"] {
        let engine = Engine::start(&["--threads", threads]);
        let stream = engine
            .briefs()
            .await
            .run(briefs::run(briefs::saddle(8, 12)))
            .await
            .expect("a run");
        let (events, end) = collect(stream.into_inner()).await;
        end.expect("ends well");
        assert_eq!(case_summaries(&events).len(), 13);
        answers.push(lasting_bytes(&events));
    }
    assert!(answers[0] == answers[1] && answers[1] == answers[2], "answers differ");
}

#[tokio::test]
async fn cases_come_in_brief_order_and_each_in_one_piece() {
    let engine = Engine::start(&["--threads", "2"]);
    let stream = engine
        .briefs()
        .await
        .run(briefs::run(briefs::saddle(6, 20)))
        .await
        .expect("a run");
    let (events, end) = collect(stream.into_inner()).await;
    end.expect("ends well");
    let mut open: Option<String> = None;
    let mut closed = Vec::new();
    for event in &events {
        match (&event.event, &open) {
            (Some(Event::CaseBegin(begin)), None) => open = Some(begin.case.clone()),
            (Some(Event::Columns(part)), Some(case)) => assert_eq!(&part.case, case),
            (Some(Event::Columns(part)), None) => assert_eq!(part.case, "envelope"),
            (Some(Event::CaseSummary(summary)), Some(case)) => {
                assert_eq!(&summary.case, case);
                closed.push(case.clone());
                open = None;
            }
            (Some(Event::CaseBegin(_) | Event::Progress(_) | Event::Summary(_)), Some(case)) => {
                panic!("within {case}: {event:?}")
            }
            _ => {}
        }
    }
    let expected: Vec<String> = (0..20).map(|number| format!("case-{number}")).collect();
    assert_eq!(closed[0], "reference");
    assert_eq!(closed[1..], expected[..]);
}

#[tokio::test]
async fn only_what_is_asked_for_is_run() {
    let engine = Engine::start(&[]);
    let mut request = briefs::run(briefs::saddle(4, 5));
    request.only = vec!["case-3".to_owned(), "case-1".to_owned()];
    let stream = engine.briefs().await.run(request.clone()).await.expect("a run");
    let (events, end) = collect(stream.into_inner()).await;
    end.expect("ends well");
    let names: Vec<&str> = case_summaries(&events)
        .iter()
        .map(|summary| summary.case.as_str())
        .collect();
    assert_eq!(names, ["reference", "case-1", "case-3"]);

    request.only = vec!["case-9".to_owned()];
    let stream = engine.briefs().await.run(request).await.expect("a stream");
    let status = collect(stream.into_inner()).await.1.expect_err("no such case");
    assert_eq!(
        code_and_reason(&status),
        (Code::InvalidArgument, "BRIEF_HAS_ERRORS".to_owned())
    );
}

#[tokio::test]
async fn a_long_run_tells_its_progress() {
    let engine = Engine::start(&["--threads", "1"]);
    let stream = engine
        .briefs()
        .await
        .run(briefs::run(briefs::saddle(30, 60)))
        .await
        .expect("a run");
    let (events, end) = collect(stream.into_inner()).await;
    end.expect("ends well");
    let seconds = events.iter().find_map(|event| match &event.event {
        Some(Event::Timing(timing)) => Some(timing.total_s),
        _ => None,
    });
    let reports = events
        .iter()
        .filter(|event| matches!(event.event, Some(Event::Progress(_))))
        .count();
    let at_most = 1.0 + 5.0 * seconds.expect("told");
    let reports = reports as f64;
    assert!(
        1.0 <= reports && reports <= at_most,
        "{reports} reports in {seconds:?} s"
    );
}

#[tokio::test]
async fn a_frozen_brief_runs_to_the_same_reference_state() {
    let engine = Engine::start(&[]);
    let request = v1::FreezeRequest {
        brief: Some(briefs::first_net()),
    };
    let stream = engine.briefs().await.freeze(request).await.expect("a freeze");
    let (parts, end) = collect(stream.into_inner()).await;
    end.expect("ends well");
    let mut encoded = Vec::new();
    for part in &parts {
        if let Some(v1::freeze_response::Part::Brief(part)) = &part.part {
            prost::Message::encode(part, &mut encoded).expect("a vector grows");
        }
    }
    let frozen: v1::Brief = prost::Message::decode(&encoded[..]).expect("parts join");
    assert!(matches!(
        parts.last().expect("parts").part,
        Some(v1::freeze_response::Part::Summary(_))
    ));

    let stream = engine.briefs().await.run(briefs::run(frozen)).await.expect("a run");
    let (events, end) = collect(stream.into_inner()).await;
    end.expect("ends well");
    let tensions = &columns(&events, "reference")["tension_n"];
    assert!(
        tensions.iter().all(|tension| (tension - 19_615.0).abs() < 1.0),
        "{tensions:?}"
    );
}
