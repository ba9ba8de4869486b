//! Clients that read slowly, or not at all.

use std::time::Duration;

use crate::admission::{begun, endless, runs_again};
use crate::briefs;
use crate::client::case_summaries;
use crate::engine::{Engine, until};
use crate::http2::SilentClient;

#[tokio::test]
async fn a_slow_reader_costs_little_memory_and_no_processor() {
    let engine = Engine::start(&["--threads", "1", "--running", "2"]);
    runs_again(&engine).await;
    let before = engine.resident_bytes();
    let mut slow = begun(&engine, endless()).await;
    // Results fill the windows; then the engine has nothing to do until the client reads on.
    let (mut ticks, mut quiet) = (engine.processor_ticks(), 0);
    until("an engine that rests", || {
        std::thread::sleep(Duration::from_millis(20));
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
    let mut events = Vec::new();
    while case_summaries(&events).len() < 40 {
        events.push(slow.message().await.expect("goes on").expect("goes on"));
    }
    let names: Vec<&str> = case_summaries(&events)
        .iter()
        .map(|summary| summary.case.as_str())
        .collect();
    let expected: Vec<String> = (0..39).map(|number| format!("case-{number}")).collect();
    assert_eq!(names[0], "reference");
    assert_eq!(names[1..], expected[..]);
}

#[tokio::test]
async fn a_client_that_shows_no_sign_of_life_is_let_go() {
    let keepalive = ["--keepalive-seconds", "1", "--keepalive-timeout-seconds", "1"];
    let engine = Engine::start(&[&keepalive[..], &["--running", "1", "--waiting", "0"]].concat());
    // Endless for a client that does not read: its results do not fit the window.
    let request = briefs::run(briefs::saddle(20, 100));
    let address = engine.address;
    // As of a process that is stopped: its system still takes bytes, but nothing answers the signs of life.
    let silent = tokio::task::spawn_blocking(move || {
        let mut client = SilentClient::call(address, "/ropewalk.v1.BriefService/Run", &request);
        client.wait_for_data();
        client
    });
    let silent = silent.await.expect("no panic");
    let refused = engine.briefs().await.run(briefs::run(briefs::first_net())).await;
    assert!(refused.is_err(), "the one place is taken");
    runs_again(&engine).await;
    tokio::task::spawn_blocking(|| silent.wait_for_close(Duration::from_secs(10)))
        .await
        .expect("closed");
}
