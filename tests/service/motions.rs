//! Motions over the network: their order, their ends, clients that leave or read slowly.

use ropewalk_api::ropewalk::v1;
use tonic::{Code, Request, Streaming};
use v1::motion_part::Part;
use v1::run_response::Event;

use crate::admission::{begun, runs_again};
use crate::briefs::{self, case, first_net, frames, motion, moving, saddle, sag};
use crate::client::{case_summaries, code_and_reason, collect, lasting_bytes};
use crate::engine::{Engine, PATIENCE, until};

/// A motion with everything that can be told of one, and one in which a rope breaks.
fn two_motions() -> v1::Brief {
    let gust = v1::Motion {
        from: "case-0".to_owned(),
        frames: Some(frames(10, &["n1-1", "n2-2"], &["a1", "b2"])),
        watched: vec![sag("sag", "n2-2"), sag("other", "n1-1")],
        spectra: Some(v1::Spectra::default()),
        ..motion("gust", 0.5, 1e-3)
    };
    let drop = v1::Motion {
        breaks: vec![v1::RopeBreak {
            what: Some(v1::rope_break::What::Member("a2".to_owned())),
            when: Some(v1::rope_break::When::AtS(0.05)),
            ..v1::RopeBreak::default()
        }],
        frames: Some(frames(7, &[], &[])),
        driven: Vec::new(),
        ..motion("drop", 0.2, 1e-3)
    };
    moving(saddle(4, 2), vec![gust, drop])
}

/// A motion of 1e8 steps that shows its first and its last moment only: hours on any machine.
fn endless() -> v1::RunRequest {
    let endless = v1::Motion {
        frames: Some(frames(100_000_000, &[], &[])),
        ..motion("endless", 1e4, 1e-4)
    };
    briefs::run(moving(first_net(), vec![endless]))
}

async fn followed(engine: &Engine, request: v1::RunRequest) -> Vec<v1::RunResponse> {
    let stream = engine.briefs().await.run(request).await.expect("a run");
    let (events, end) = collect(stream.into_inner()).await;
    end.expect("ends well");
    events
}

/// A run in which time runs: the beginning of its motion is here.
async fn in_motion(engine: &Engine, request: impl tonic::IntoRequest<v1::RunRequest>) -> Streaming<v1::RunResponse> {
    let mut stream = begun(engine, request).await;
    loop {
        let event = stream.message().await.expect("goes on").expect("goes on").event;
        if let Some(Event::Motion(part)) = event
            && matches!(part.part, Some(Part::Begin(_)))
        {
            return stream;
        }
    }
}

fn parts<'e>(events: &'e [v1::RunResponse], motion: &str) -> Vec<&'e Part> {
    let parts = events.iter().filter_map(|event| match &event.event {
        Some(Event::Motion(part)) if part.motion == motion => part.part.as_ref(),
        _ => None,
    });
    parts.collect()
}

#[track_caller]
fn begin<'e>(events: &'e [v1::RunResponse], motion: &str) -> &'e v1::MotionBegin {
    match parts(events, motion).first() {
        Some(Part::Begin(begin)) => begin,
        other => panic!("{other:?}"),
    }
}

#[track_caller]
fn end<'e>(events: &'e [v1::RunResponse], motion: &str) -> &'e v1::MotionEnd {
    match parts(events, motion).last() {
        Some(Part::End(end)) => end,
        other => panic!("{other:?}"),
    }
}

#[track_caller]
fn summary(events: &[v1::RunResponse]) -> &v1::Summary {
    match events.last().map(|event| &event.event) {
        Some(Some(Event::Summary(summary))) => summary,
        other => panic!("{other:?}"),
    }
}

/// Frames of a motion, those in several messages put together.
fn whole_frames(events: &[v1::RunResponse], motion: &str) -> Vec<v1::MotionFrame> {
    let mut frames: Vec<v1::MotionFrame> = Vec::new();
    for part in parts(events, motion) {
        let Part::Frame(part) = part else { continue };
        if !part.continues {
            frames.push(part.clone());
            continue;
        }
        assert!(part.energy.is_none() && part.watched.is_empty(), "{part:?}");
        let frame = frames.last_mut().expect("one to go on with");
        assert_eq!((frame.step, frame.time_s), (part.step, part.time_s));
        frame.positions_m.extend(&part.positions_m);
        frame.velocities_m_per_s.extend(&part.velocities_m_per_s);
        for more in &part.ropes {
            match frame.ropes.last_mut().filter(|known| known.rope == more.rope) {
                Some(known) => {
                    assert_eq!(known.positions_m.len(), 3 * more.from as usize, "no gap");
                    known.positions_m.extend(&more.positions_m);
                    known.velocities_m_per_s.extend(&more.velocities_m_per_s);
                    known.stretch.extend(&more.stretch);
                    known.tension_n.extend(&more.tension_n);
                }
                None => {
                    assert_eq!(more.from, 0);
                    frame.ropes.push(more.clone());
                }
            }
        }
    }
    frames
}

#[tokio::test]
async fn motions_come_after_cases_in_brief_order_and_each_in_one_piece() {
    let engine = Engine::start(&["--threads", "2"]);
    let events = followed(&engine, briefs::run(two_motions())).await;
    // Parts of a motion in the order of the contract; what may come any time is left out.
    let place = |part: &Part| match part {
        Part::Begin(_) => 0,
        Part::Shown(_) => 1,
        Part::Waves(_) => 2,
        Part::Frame(_) => 3,
        Part::Events(_) => 4,
        Part::Spectrum(_) => 5,
        Part::End(_) => 8,
    };
    let (mut told, mut cases_open) = (Vec::<(String, Vec<i32>)>::new(), 3);
    for event in &events {
        let (motion, place) = match event.event.as_ref().expect("an event") {
            Event::CaseSummary(_) => {
                cases_open -= 1;
                assert!(told.is_empty(), "a case after a motion");
                continue;
            }
            Event::Motion(part) => (part.motion.clone(), place(part.part.as_ref().expect("a part"))),
            Event::Columns(columns) => match columns.case.strip_prefix("motion/") {
                Some(motion) => (motion.to_owned(), 6),
                None => continue,
            },
            Event::Finding(finding) if ["gust", "drop"].contains(&finding.case.as_str()) => (finding.case.clone(), 7),
            _ => continue,
        };
        assert_eq!(cases_open, 0, "{motion} before all cases are told");
        match told.last_mut().filter(|(known, _)| *known == motion) {
            Some((_, places)) => places.push(place),
            None => told.push((motion, vec![place])),
        }
    }
    let names: Vec<&str> = told.iter().map(|(name, _)| name.as_str()).collect();
    assert_eq!(names, ["gust", "drop"], "each in one piece");
    for (name, places) in &told {
        assert!(places.is_sorted(), "{name}: {places:?}");
        assert_eq!((places[0], places[places.len() - 1]), (0, 8), "{name}");
    }
    let has = |motion: usize, place: i32| told[motion].1.contains(&place);
    assert!(
        (1..=6).filter(|place| *place != 4).all(|place| has(0, place)),
        "{told:?}"
    );
    assert!(has(1, 4) && !has(1, 5), "a break, no spectra: {told:?}");

    let is_last = |event: &&v1::RunResponse| matches!(event.event, Some(Event::Timing(_) | Event::Summary(_)));
    assert_eq!(events.iter().filter(is_last).count(), 2);
    assert!(events[events.len() - 2..].iter().all(|event| is_last(&event)));
    assert_eq!(summary(&events).motions, Some(v1::Share { count: 2, of: 2 }));

    for (name, every) in [("gust", 10), ("drop", 7)] {
        let (begin, end, frames) = (begin(&events, name), end(&events, name), whole_frames(&events, name));
        assert_eq!(end.outcome(), v1::MotionOutcome::Finished);
        assert_eq!(frames.len() as u64, begin.frames, "{name}");
        let steps: Vec<u64> = frames.iter().map(|frame| frame.step).collect();
        let mut expected: Vec<u64> = (0..begin.steps).step_by(every).collect();
        expected.push(begin.steps);
        assert_eq!(steps, expected, "{name}");
    }
    for frame in whole_frames(&events, "gust") {
        assert_eq!((frame.watched.len(), frame.positions_m.len()), (2, 6));
        let points: Vec<usize> = frame.ropes.iter().map(|rope| rope.positions_m.len()).collect();
        assert_eq!(points, [18, 18]);
    }
}

#[tokio::test]
async fn a_motion_can_be_run_alone() {
    let engine = Engine::start(&[]);
    let all = followed(&engine, briefs::run(two_motions())).await;
    let mut request = briefs::run(two_motions());
    request.only = vec!["gust".to_owned()];
    let events = followed(&engine, request).await;
    let cases: Vec<&str> = case_summaries(&events)
        .iter()
        .map(|summary| summary.case.as_str())
        .collect();
    assert_eq!(cases, ["reference"]);
    assert!(parts(&events, "drop").is_empty());
    assert_eq!(summary(&events).motions, Some(v1::Share { count: 1, of: 1 }));
    // What is told of it is what the whole run tells.
    assert_eq!(parts(&events, "gust"), parts(&all, "gust"));
}

#[tokio::test]
async fn equal_requests_move_alike_on_one_thread_and_on_two() {
    let mut answers = Vec::new();
    for threads in ["1", "2", "2"] {
        let engine = Engine::start(&["--threads", threads]);
        let events = followed(&engine, briefs::run(two_motions())).await;
        assert_eq!(summary(&events).motions, Some(v1::Share { count: 2, of: 2 }));
        answers.push(lasting_bytes(&events));
    }
    assert!(answers[0] == answers[1] && answers[1] == answers[2], "answers differ");
}

#[tokio::test]
async fn a_client_that_leaves_a_motion_frees_its_place() {
    let engine = Engine::start(&["--threads", "1", "--running", "1", "--waiting", "0"]);
    let stream = in_motion(&engine, endless()).await;
    drop(stream);
    runs_again(&engine).await;
}

#[tokio::test]
async fn a_deadline_ends_a_motion_without_a_summary() {
    let engine = Engine::start(&["--threads", "1", "--running", "1", "--waiting", "0"]);
    // The client library would cut the stream off by itself: the header is set by hand.
    let mut request = Request::new(endless());
    request
        .metadata_mut()
        .insert("grpc-timeout", "1S".parse().expect("a value"));
    let (events, end) = collect(in_motion(&engine, request).await).await;
    assert_eq!(
        code_and_reason(&end.expect_err("cut off")),
        (Code::DeadlineExceeded, "DEADLINE_EXCEEDED".to_owned())
    );
    assert!(
        !events
            .iter()
            .any(|event| matches!(event.event, Some(Event::Summary(_))))
    );
    assert!(
        !parts(&events, "endless")
            .iter()
            .any(|part| matches!(part, Part::End(_)))
    );
    runs_again(&engine).await;
}

#[tokio::test]
async fn an_engine_that_ends_gives_motions_their_time() {
    let mut engine = Engine::start(&["--drain-seconds", "1"]);
    let running = in_motion(&engine, endless()).await;
    engine.signal("TERM");
    let status = collect(running).await.1.expect_err("ended");
    assert_eq!(
        code_and_reason(&status),
        (Code::Unavailable, "SHUTTING_DOWN".to_owned())
    );
    assert_eq!(engine.wait(PATIENCE).code(), Some(0));

    let mut engine = Engine::start(&["--drain-seconds", "60"]);
    let short = briefs::run(moving(first_net(), vec![motion("short", 2.0, 1e-4)]));
    let running = in_motion(&engine, short).await;
    engine.signal("TERM");
    let (events, end) = collect(running).await;
    end.expect("ends well");
    assert_eq!(summary(&events).motions, Some(v1::Share { count: 1, of: 1 }));
    assert_eq!(engine.wait(PATIENCE).code(), Some(0));
}

#[tokio::test]
async fn a_motion_leaves_its_thread_to_others_between_two_frames() {
    let engine = Engine::start(&["--threads", "1", "--running", "2"]);
    let long = in_motion(&engine, endless()).await;
    runs_again(&engine).await;
    drop(long);
}

#[tokio::test]
async fn a_slow_reader_of_frames_costs_little_memory_and_no_processor() {
    let engine = Engine::start(&["--threads", "1", "--running", "2"]);
    runs_again(&engine).await;
    let before = engine.resident_bytes();
    let ropes: Vec<String> = (1..=10).flat_map(|i| [format!("a{i}"), format!("b{i}")]).collect();
    let ropes: Vec<&str> = ropes.iter().map(String::as_str).collect();
    let many = v1::Motion {
        frames: Some(frames(1, &[], &ropes)),
        ..motion("many", 20.0, 1e-4)
    };
    let mut slow = in_motion(&engine, briefs::run(moving(saddle(10, 1), vec![many]))).await;
    // Frames fill the windows; then the engine has nothing to do until the client reads on.
    let (mut ticks, mut quiet) = (engine.processor_ticks(), 0);
    until("an engine that rests", || {
        std::thread::sleep(std::time::Duration::from_millis(20));
        let now = engine.processor_ticks();
        quiet = if now == ticks { quiet + 1 } else { 0 };
        ticks = now;
        quiet == 10
    });
    let grown = engine.resident_bytes().saturating_sub(before);
    assert!(grown < 40 << 20, "{grown} bytes for a client that does not read");
    // Meanwhile the one thread is free for others.
    runs_again(&engine).await;
    // And nothing but progress is lost to the slow one.
    let mut next = 0;
    while next < 2000 {
        let event = slow.message().await.expect("goes on").expect("goes on").event;
        if let Some(Event::Motion(v1::MotionPart {
            part: Some(Part::Frame(frame)),
            ..
        })) = event
        {
            assert_eq!(frame.step, next);
            next += 1;
        }
    }
}

#[tokio::test]
async fn a_panic_in_one_motion_leaves_the_other_alone() {
    let mut engine = Engine::start_faulty(&["--fault", "panic-in-motion=gust"]);
    for _ in 0..2 {
        let events = followed(&engine, briefs::run(two_motions())).await;
        let [Part::End(broken)] = parts(&events, "gust")[..] else {
            panic!("{:?}", parts(&events, "gust"))
        };
        assert_eq!(broken.outcome(), v1::MotionOutcome::EngineError);
        let failure = broken.failure.as_ref().expect("told");
        assert_eq!(failure.reason, "ENGINE_ERROR");
        let findings: Vec<&v1::Finding> = of_motion(&events, "gust");
        assert_eq!(findings.len(), 1, "{findings:?}");
        assert_eq!(
            (findings[0].severity(), findings[0].reason.as_str()),
            (v1::FindingSeverity::Error, "MOTION_NOT_FINISHED")
        );
        assert_eq!(end(&events, "drop").outcome(), v1::MotionOutcome::Finished);
        let summary = summary(&events);
        assert_eq!(summary.verdict(), v1::Verdict::NoAnswer);
        assert_eq!(summary.motions, Some(v1::Share { count: 1, of: 2 }));
        let answered = summary.answered.as_ref().expect("told");
        assert_eq!((answered.count, answered.of), (3, 3), "the cases have their answers");
    }
    assert!(engine.is_running());
}

fn of_motion<'e>(events: &'e [v1::RunResponse], motion: &str) -> Vec<&'e v1::Finding> {
    let findings = events.iter().filter_map(|event| match &event.event {
        Some(Event::Finding(finding)) if finding.case == motion => Some(finding),
        _ => None,
    });
    findings.collect()
}

#[tokio::test]
async fn a_motion_that_cannot_begin_says_why() {
    let from_snow = v1::Motion {
        from: "full-snow".to_owned(),
        ..motion("thrown", 0.1, 1e-3)
    };
    let mut brief = moving(first_net(), vec![from_snow, motion("calm", 0.1, 1e-3)]);
    // So few iterations that the case has no answer.
    brief.solving = Some(v1::Solving {
        max_iterations: Some(1),
        ..v1::Solving::default()
    });
    let engine = Engine::start(&[]);
    let events = followed(&engine, briefs::run(brief)).await;
    assert_ne!(case_summaries(&events)[1].outcome(), v1::CaseOutcome::Answered);
    let [Part::End(end_of)] = parts(&events, "thrown")[..] else {
        panic!("{:?}", parts(&events, "thrown"))
    };
    assert_eq!(end_of.outcome(), v1::MotionOutcome::NotBegun);
    let failure = end_of.failure.as_ref().expect("told");
    assert_eq!(
        (failure.reason.as_str(), failure.nodes[0].as_str()),
        ("NOT_BEGUN", "m"),
        "{failure:?}"
    );
    assert!(
        failure.message.contains("\"thrown\"") && failure.message.contains("\"full-snow\""),
        "{failure:?}"
    );
    assert!(!failure.cure.is_empty());
    let findings = of_motion(&events, "thrown");
    assert_eq!((findings.len(), findings[0].id.as_str()), (1, "m"), "{findings:?}");

    // The other one starts from the reference state, which has an answer; what acts at its end has none.
    assert_eq!(end(&events, "calm").outcome(), v1::MotionOutcome::Finished);
    let begin = begin(&events, "calm");
    assert_eq!(begin.compared_with, "");
    assert!(begin.not_compared.contains("no answer"), "{begin:?}");
    let summary = summary(&events);
    assert_eq!(summary.motions, Some(v1::Share { count: 1, of: 2 }));
    assert_eq!(summary.verdict(), v1::Verdict::NoAnswer);
}

#[tokio::test]
async fn what_was_told_before_a_motion_stops_holds() {
    // Very much snow falls after a while of rest, and no step is small enough to keep that error.
    let fall = v1::HistoryStep {
        at_s: Some(5.5),
        after: 1e4,
        ..v1::HistoryStep::default()
    };
    let mut stops = motion("stops", 10.0, 1.0);
    stops.driven[0].history = Some(v1::driven_load::History::Step(fall));
    stops.frames = Some(frames(1, &["m"], &["carrying"]));
    stops.watched = vec![sag("sag", "m")];
    stops.scheme = Some(v1::motion::Scheme::GeneralisedAlpha(v1::GeneralisedAlpha {
        error_m: Some(1e-12),
        ..v1::GeneralisedAlpha::default()
    }));
    let engine = Engine::start(&[]);
    let events = followed(&engine, briefs::run(moving(first_net(), vec![stops]))).await;
    let end = end(&events, "stops");
    assert_eq!(end.outcome(), v1::MotionOutcome::Stopped);
    assert!((5.5..6.0).contains(&end.time_s), "{end:?}");
    let failure = end.failure.as_ref().expect("told");
    assert_eq!(
        (failure.reason.as_str(), &failure.nodes[..]),
        ("STEP_TOO_SMALL", &["m".to_owned()][..])
    );
    assert!(failure.cure.contains("error_m"), "{failure:?}");
    let findings = of_motion(&events, "stops");
    let errors: Vec<_> = findings
        .iter()
        .filter(|f| f.severity() == v1::FindingSeverity::Error)
        .collect();
    assert_eq!(
        (errors.len(), errors[0].value.as_str()),
        (1, "STEP_TOO_SMALL"),
        "{findings:?}"
    );
    // Frames up to there were told: the net at rest.
    let frames = whole_frames(&events, "stops");
    assert_eq!(
        frames.iter().map(|frame| frame.step).collect::<Vec<_>>(),
        [0, 1, 2, 3, 4, 5]
    );
    assert!(frames.iter().all(|frame| frame.watched[0].abs() < 1e-9), "{frames:?}");
    // Extremes up to there as well: only the crossing has moved, after it was loaded.
    let arrays = crate::client::columns(&events, "motion/stops");
    let (moved, when) = (&arrays["movement_max_m"], &arrays["movement_max_time_s"]);
    assert!(
        moved[..4].iter().all(|moved| *moved == 0.0) && moved[4] > 0.0,
        "{moved:?}"
    );
    assert!(5.5 < when[4] && when[4] <= end.time_s, "{when:?}");
    assert_eq!(summary(&events).motions, Some(v1::Share { count: 0, of: 1 }));
    assert_eq!(summary(&events).verdict(), v1::Verdict::NoAnswer);
}

#[tokio::test]
async fn large_frames_come_in_messages_that_fit() {
    let brief = saddle(70, 0);
    let net = match &brief.net_source {
        Some(v1::brief::NetSource::Net(net)) => net.clone(),
        _ => panic!("a net"),
    };
    let mut nodes: Vec<&str> = net
        .cables
        .iter()
        .flat_map(|cable| &cable.nodes)
        .map(String::as_str)
        .collect();
    nodes.sort_unstable();
    nodes.dedup();
    let ropes: Vec<&str> = net.cables.iter().map(|cable| cable.id.as_str()).collect();
    let large = v1::Motion {
        frames: Some(frames(1, &nodes, &ropes)),
        ..motion("large", 2e-3, 1e-3)
    };
    let engine = Engine::start(&[]);
    let events = followed(&engine, briefs::run(moving(brief, vec![large]))).await;
    let largest = events.iter().map(prost::Message::encoded_len).max();
    assert!(largest < Some(1 << 20), "{largest:?} bytes in a message");
    let shown: Vec<&v1::MotionShown> = parts(&events, "large")
        .into_iter()
        .filter_map(|part| match part {
            Part::Shown(shown) => Some(shown),
            _ => None,
        })
        .collect();
    let told: usize = shown.iter().map(|shown| shown.nodes.len()).sum();
    assert_eq!(told, nodes.len());
    assert_eq!(shown.iter().flat_map(|shown| &shown.ropes).count(), ropes.len());
    let frames = whole_frames(&events, "large");
    assert_eq!(frames.len(), 3);
    let messages = parts(&events, "large")
        .iter()
        .filter(|part| matches!(part, Part::Frame(_)))
        .count();
    assert!(messages > 3, "frames in one message each: {messages}");
    for frame in &frames {
        assert_eq!(frame.positions_m.len(), 3 * nodes.len());
        assert_eq!(frame.velocities_m_per_s.len(), 3 * nodes.len());
        let numbers: Vec<u32> = frame.ropes.iter().map(|rope| rope.rope).collect();
        assert!(numbers.iter().copied().eq(0..140), "{numbers:?}");
        for rope in &frame.ropes {
            assert_eq!(
                (rope.positions_m.len(), rope.velocities_m_per_s.len()),
                (3 * 72, 3 * 72)
            );
            assert_eq!((rope.stretch.len(), rope.tension_n.len()), (71, 71));
        }
    }
}

#[tokio::test]
async fn progress_tells_the_state_first_and_then_the_time_that_is_left() {
    let long = v1::Motion {
        from: "case-0".to_owned(),
        ..motion("long", 4.0, 1e-3)
    };
    let mut request = briefs::run(moving(saddle(20, 1), vec![long]));
    request.only = vec!["long".to_owned()];
    let engine = Engine::start(&["--threads", "1"]);
    let events = followed(&engine, request).await;
    let progress: Vec<&v1::Progress> = (events.iter())
        .filter_map(|event| match &event.event {
            Some(Event::Progress(progress)) if !progress.motion.is_empty() => Some(progress),
            _ => None,
        })
        .collect();
    assert!(progress.iter().all(|report| report.motion == "long"));
    let (before, running): (Vec<&v1::Progress>, Vec<&v1::Progress>) =
        progress.iter().partition(|report| report.duration_s == 0.0);
    assert!(
        before
            .iter()
            .all(|report| !report.case.is_empty() && report.left_s.is_none())
    );
    assert!(
        running
            .iter()
            .all(|report| report.case.is_empty() && report.duration_s == 4.0)
    );
    assert!(running.is_sorted_by(|a, b| a.simulated_s <= b.simulated_s));
    let left: Vec<f64> = running.iter().filter_map(|report| report.left_s).collect();
    assert!(left.len() >= 2, "a motion that is too short for this test: {running:?}");
    assert!(
        left[left.len() - 1] < left[0] && left.iter().all(|left| *left >= 0.0),
        "{left:?}"
    );
}

#[tokio::test]
async fn a_check_counts_motions_and_their_steps() {
    let mut brief = two_motions();
    brief.cases.push(case("more", "snow", 0.1));
    let engine = Engine::start(&[]);
    let request = v1::CheckRequest { brief: Some(brief) };
    let stream = engine.briefs().await.check(request).await.expect("a check");
    let (messages, end) = collect(stream.into_inner()).await;
    end.expect("ends well");
    let totals = messages.last().and_then(|last| last.totals.as_ref()).expect("totals");
    assert_eq!((totals.cases, totals.motions, totals.motion_steps), (3, 2, 700.0));
}
