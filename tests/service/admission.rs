//! A full server, deadlines, clients that leave.

use std::time::{Duration, Instant};

use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::server_service_client::ServerServiceClient;
use tonic::{Code, Request, Streaming};
use tonic_types::StatusExt as _;

use crate::briefs;
use crate::client::{code_and_reason, collect};
use crate::engine::{Engine, PATIENCE};
use crate::web;

/// Work that does not end by itself while a test lasts: minutes on any machine.
pub(crate) fn endless() -> v1::RunRequest {
    briefs::run(briefs::saddle(30, 10_000))
}

/// A run that has begun: its first event is here.
pub(crate) async fn begun(
    engine: &Engine,
    request: impl tonic::IntoRequest<v1::RunRequest>,
) -> Streaming<v1::RunResponse> {
    let mut stream = engine.briefs().await.run(request).await.expect("let in").into_inner();
    stream.message().await.expect("begun").expect("begun");
    stream
}

/// Runs a small brief, as often as it takes to be let in.
pub(crate) async fn runs_again(engine: &Engine) {
    let end = Instant::now() + PATIENCE;
    loop {
        match engine.briefs().await.run(briefs::run(briefs::first_net())).await {
            Ok(stream) => {
                collect(stream.into_inner()).await.1.expect("ends well");
                return;
            }
            Err(status) => {
                assert_eq!(code_and_reason(&status).1, "SERVER_FULL");
                assert!(Instant::now() < end, "never let in again");
                tokio::time::sleep(Duration::from_millis(5)).await;
            }
        }
    }
}

#[tokio::test]
async fn a_full_server_refuses_at_once_and_says_when_to_come_back() {
    let engine = Engine::start(&["--running", "1", "--waiting", "1"]);
    let first = begun(&engine, endless()).await;
    // Of three more one waits, whichever comes first, and two are refused.
    let mut more = tokio::task::JoinSet::new();
    for _ in 0..3 {
        let mut client = engine.briefs().await;
        more.spawn(async move {
            let asked = Instant::now();
            let answer = client.run(briefs::run(briefs::first_net())).await;
            (answer, asked.elapsed())
        });
    }
    for _ in 0..2 {
        let (answer, took) = more.join_next().await.expect("three").expect("no panic");
        let status = answer.expect_err("full");
        assert_eq!(
            code_and_reason(&status),
            (Code::ResourceExhausted, "SERVER_FULL".to_owned())
        );
        let details = status.get_error_details();
        let come_back = details.retry_info().expect("a time").retry_delay.expect("a time");
        assert!(Duration::from_millis(100) <= come_back && come_back <= Duration::from_secs(60));
        assert!(took < Duration::from_secs(1), "{took:?}");
    }

    // Information is there all the same.
    let mut server = ServerServiceClient::new(engine.channel().await);
    server.get_info(v1::GetInfoRequest {}).await.expect("always answered");

    // When the first one leaves, the one that waits is served.
    drop(first);
    let (answer, _) = more.join_next().await.expect("three").expect("no panic");
    collect(answer.expect("let in").into_inner())
        .await
        .1
        .expect("ends well");
}

#[tokio::test]
async fn a_deadline_ends_a_stream_and_its_work() {
    let engine = Engine::start(&["--running", "1", "--waiting", "0"]);
    // The client library would cut the stream off by itself: the header is set by hand.
    let mut request = Request::new(endless());
    request
        .metadata_mut()
        .insert("grpc-timeout", "300m".parse().expect("a value"));
    let asked = Instant::now();
    let stream = engine.briefs().await.run(request).await.expect("let in");
    let status = collect(stream.into_inner()).await.1.expect_err("cut off");
    assert_eq!(
        code_and_reason(&status),
        (Code::DeadlineExceeded, "DEADLINE_EXCEEDED".to_owned())
    );
    let took = asked.elapsed();
    assert!(
        Duration::from_millis(300) <= took && took < Duration::from_secs(5),
        "{took:?}"
    );
    runs_again(&engine).await;
}

#[tokio::test]
async fn the_longest_time_of_the_server_holds_without_a_deadline() {
    let engine = Engine::start(&["--max-call-seconds", "1"]);
    let stream = engine.briefs().await.run(endless()).await.expect("let in");
    let status = collect(stream.into_inner()).await.1.expect_err("cut off");
    assert_eq!(status.code(), Code::DeadlineExceeded);
}

#[tokio::test]
async fn waiting_ends_at_the_deadline() {
    let engine = Engine::start(&["--running", "1", "--waiting", "1"]);
    let _first = begun(&engine, endless()).await;
    // A client library would give up by itself: the answer of the engine is read from the bytes.
    let body = web::frame(&briefs::run(briefs::first_net()).encode_to_vec());
    let head = format!("{}\r\ngrpc-timeout: 100m", web::post("/ropewalk.v1.BriefService/Run"));
    let address = engine.address;
    let asked = Instant::now();
    let answer = tokio::task::spawn_blocking(move || web::request(address, &head, &body));
    let (head, body) = answer.await.expect("an answer");
    let told = format!("{head}{}", web::parts(&body).1).replace(": ", ":");
    assert!(told.contains("grpc-status:4"), "{told}");
    assert!(asked.elapsed() >= Duration::from_millis(100), "{:?}", asked.elapsed());
}

#[tokio::test]
async fn a_client_that_leaves_stops_the_work() {
    let engine = Engine::start(&["--running", "1", "--waiting", "0"]);
    // One case that takes long: the work has to stop inside of it.
    let stream = begun(&engine, briefs::run(briefs::saddle(120, 1))).await;
    drop(stream);
    let left = Instant::now();
    runs_again(&engine).await;
    let took = left.elapsed();
    assert!(took < Duration::from_secs(3), "{took:?} until the next call was served");
}

#[tokio::test]
async fn a_storm_of_clients_that_leave_takes_no_place_away() {
    let engine = Engine::start(&["--running", "2", "--waiting", "200"]);
    let channel = engine.briefs().await;
    let mut storm = tokio::task::JoinSet::new();
    for number in 0..200_u64 {
        let mut channel = channel.clone();
        storm.spawn(async move {
            // Leaves after 0 to 40 ms: while it waits, reads, searches or solves.
            let patience = Duration::from_micros(number * 7919 % 40_000);
            let run = async {
                let stream = channel.run(briefs::run(briefs::saddle(10, 200))).await;
                collect(stream.expect("let in").into_inner()).await
            };
            // It is the leaving that counts.
            let _ = tokio::time::timeout(patience, run).await;
        });
    }
    while let Some(joined) = storm.join_next().await {
        joined.expect("no panic");
    }
    // Both places are free: two runs that do not end by themselves are let in side by side.
    let both = tokio::join!(begun(&engine, endless()), begun(&engine, endless()));
    drop(both);
    runs_again(&engine).await;
}
