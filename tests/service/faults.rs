//! Broken promises of the engine's own code stay where they are.

use ropewalk_api::ropewalk::v1;
use tonic::Code;
use v1::run_response::Event;

use crate::briefs;
use crate::client::{case_summaries, code_and_reason, collect};
use crate::engine::Engine;

#[tokio::test]
async fn a_panic_in_one_case_leaves_the_others_alone() {
    let mut engine = Engine::start_faulty(&["--fault", "panic-in-case=case-1"]);
    for _ in 0..2 {
        let stream = engine
            .briefs()
            .await
            .run(briefs::run(briefs::saddle(4, 4)))
            .await
            .expect("a run");
        let (events, end) = collect(stream.into_inner()).await;
        end.expect("ends well");
        let outcomes: Vec<_> = case_summaries(&events)
            .iter()
            .map(|summary| summary.outcome())
            .collect();
        let good = v1::CaseOutcome::Answered;
        assert_eq!(outcomes, [good, good, v1::CaseOutcome::EngineError, good, good]);
        match &events.last().expect("events").event {
            Some(Event::Summary(summary)) => {
                assert_eq!(summary.verdict(), v1::Verdict::NoAnswer);
                let answered = summary.answered.as_ref().expect("told");
                assert_eq!((answered.count, answered.of), (4, 5));
            }
            other => panic!("{other:?}"),
        }
    }
    assert!(engine.is_running());
}

#[tokio::test]
async fn a_panic_before_the_cases_is_an_internal_error() {
    for fault in ["panic-in-reading", "panic-in-reference"] {
        let mut engine = Engine::start_faulty(&["--fault", fault, "--running", "1", "--waiting", "0"]);
        for _ in 0..2 {
            let stream = engine
                .briefs()
                .await
                .run(briefs::run(briefs::first_net()))
                .await
                .expect("a stream");
            let status = collect(stream.into_inner()).await.1.expect_err("broken");
            assert_eq!(
                code_and_reason(&status),
                (Code::Internal, "INTERNAL".to_owned()),
                "{fault}"
            );
        }
        assert!(engine.is_running());
    }
}
