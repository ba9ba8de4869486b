//! The end of an engine.

use std::time::{Duration, Instant};

use ropewalk_api::ropewalk::v1;
use tonic::Code;
use tonic_health::pb::HealthCheckRequest;
use tonic_health::pb::health_check_response::ServingStatus;
use tonic_health::pb::health_client::HealthClient;

use crate::admission::{begun, endless};
use crate::briefs;
use crate::client::{code_and_reason, collect};
use crate::engine::{Engine, PATIENCE};

#[tokio::test]
async fn an_idle_engine_ends_at_once_and_well() {
    for signal in ["TERM", "INT"] {
        let mut engine = Engine::start(&[]);
        // An idle connection does not hold it up.
        let _connection = engine.channel().await;
        let asked = Instant::now();
        engine.signal(signal);
        assert_eq!(engine.wait(PATIENCE).code(), Some(0));
        assert!(asked.elapsed() < Duration::from_secs(5), "{:?}", asked.elapsed());
    }
}

#[tokio::test]
async fn running_calls_get_their_time_and_new_ones_are_refused() {
    let mut engine = Engine::start(&["--drain-seconds", "2"]);
    let running = begun(&engine, endless()).await;
    let mut health = HealthClient::new(engine.channel().await);
    let mut watch = health
        .watch(HealthCheckRequest::default())
        .await
        .expect("known")
        .into_inner();
    let first = watch.message().await.expect("told").expect("told");
    assert_eq!(first.status(), ServingStatus::Serving);
    let mut client = engine.briefs().await;

    engine.signal("TERM");
    let told = watch.message().await.expect("told").expect("told");
    assert_eq!(told.status(), ServingStatus::NotServing);
    // Refused on an open connection and on a new one.
    let refused = client.check(v1::CheckRequest::default()).await.expect_err("going down");
    assert_eq!(
        code_and_reason(&refused),
        (Code::Unavailable, "SHUTTING_DOWN".to_owned())
    );
    let refused = engine
        .briefs()
        .await
        .run(briefs::run(briefs::first_net()))
        .await
        .expect_err("going down");
    assert_eq!(
        code_and_reason(&refused),
        (Code::Unavailable, "SHUTTING_DOWN".to_owned())
    );

    let status = collect(running).await.1.expect_err("ended");
    assert_eq!(
        code_and_reason(&status),
        (Code::Unavailable, "SHUTTING_DOWN".to_owned())
    );
    assert_eq!(engine.wait(PATIENCE).code(), Some(0));
}

#[tokio::test]
async fn a_call_that_ends_within_its_time_ends_well() {
    let mut engine = Engine::start(&["--drain-seconds", "30"]);
    let running = begun(&engine, briefs::run(briefs::saddle(20, 40))).await;
    engine.signal("TERM");
    collect(running).await.1.expect("ends well");
    assert_eq!(engine.wait(PATIENCE).code(), Some(0));
}

#[tokio::test]
async fn a_second_signal_ends_at_once() {
    let mut engine = Engine::start(&["--drain-seconds", "1000"]);
    let running = begun(&engine, endless()).await;
    let mut health = HealthClient::new(engine.channel().await);
    let mut watch = health
        .watch(HealthCheckRequest::default())
        .await
        .expect("known")
        .into_inner();
    engine.signal("TERM");
    // The first one has arrived when health says so.
    while watch.message().await.expect("told").expect("told").status() != ServingStatus::NotServing {}
    engine.signal("TERM");
    assert_eq!(engine.wait(PATIENCE).code(), Some(1));
    drop(running);
}
