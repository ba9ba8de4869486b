//! What is left when a run stops in its middle: the engine dies, or the user has enough.

use std::io::{BufRead as _, BufReader, Read, Write};
use std::net::{Shutdown, TcpListener, TcpStream};
use std::path::PathBuf;
use std::process::{Child, Command, Stdio};
use std::sync::{Arc, Mutex, mpsc};
use std::thread;

use crate::support::{Folder, brief, command, csv, finish, json, ropewalk};

/// Bytes of the demo's answer (about 1.1 MB) after which it is cut: several states are closed, several are not.
const CUT: usize = 400_000;

/// An engine as its own process.
struct Engine {
    child: Arc<Mutex<Child>>,
    address: String,
}

impl Engine {
    fn start() -> Self {
        let program = std::env::var_os("ROPEWALK_ENGINE_BIN").map_or_else(
            || PathBuf::from(env!("CARGO_BIN_EXE_ropewalk")).with_file_name("ropewalk-engine"),
            PathBuf::from,
        );
        let mut child = Command::new(&program)
            .args(["--listen", "127.0.0.1:0", "--announce", "--log", "error"])
            .stdout(Stdio::piped())
            .spawn()
            .unwrap_or_else(|error| {
                panic!(
                    "{}: {error}; build it with `cargo build --release --bins`",
                    program.display()
                )
            });
        let mut line = String::new();
        BufReader::new(child.stdout.take().expect("piped"))
            .read_line(&mut line)
            .expect("the engine announces itself");
        let told: serde_json::Value = serde_json::from_str(&line).expect("one line of JSON");
        let address = told["listen"].as_str().expect("the bound address").to_owned();
        Self {
            child: Arc::new(Mutex::new(child)),
            address,
        }
    }
}

impl Drop for Engine {
    fn drop(&mut self) {
        let mut child = self.child.lock().expect("nobody panicked with it");
        // It may be dead already, and that is the point of a test.
        let _ = child.kill();
        let _ = child.wait();
    }
}

/// Stands between a client and an engine; after so many bytes of the answer it calls `at_cut` and hands on no more.
/// Returns where to call.
fn between(engine: &Engine, at_cut: impl FnOnce(&TcpStream) + Send + 'static) -> String {
    let listener = TcpListener::bind("127.0.0.1:0").expect("a free port");
    let here = listener.local_addr().expect("it is bound");
    let there = engine.address.clone();
    thread::spawn(move || {
        let (client, _) = listener.accept().expect("the client calls");
        let server = TcpStream::connect(there).expect("the engine listens");
        let (mut asks, mut asked) = (
            client.try_clone().expect("a second handle"),
            server.try_clone().expect("a second handle"),
        );
        thread::spawn(move || std::io::copy(&mut asks, &mut asked));
        let (mut from, mut to) = (server, client);
        let mut left = CUT;
        let mut buffer = [0; 8192];
        while left > 0 {
            let wanted = left.min(buffer.len());
            let got = from.read(&mut buffer[..wanted]).expect("the engine answers");
            assert!(got > 0, "the answer is shorter than the cut");
            to.write_all(&buffer[..got]).expect("the client listens");
            left -= got;
        }
        at_cut(&to);
        // Whoever still listens meets silence, not an end.
        let _ = from.read_to_end(&mut Vec::new());
    });
    format!("http://{here}")
}

#[test]
fn an_engine_that_dies_leaves_what_it_answered_and_no_verdict() {
    let folder = Folder::new("dies");
    let engine = Engine::start();
    let child = Arc::clone(&engine.child);
    let url = between(&engine, move |client| {
        let mut child = child.lock().unwrap();
        child.kill().expect("it still runs");
        child.wait().unwrap();
        client.shutdown(Shutdown::Both).expect("the client is there");
    });
    let out = folder.path("out");
    let ended = ropewalk(&["--engine", &url, "demo", "--out", out.to_str().unwrap()]);
    assert_eq!(ended.code, 69, "{}\n{}", ended.out, ended.told);
    for wanted in [
        "the connection to the engine broke",
        "The run broke off after",
        "of 12 states",
        "there is no verdict",
    ] {
        assert!(ended.told.contains(wanted), "{wanted:?} is missing in\n{}", ended.told);
    }
    assert!(
        ended.out.contains("NO ANSWER: the run broke off after"),
        "{}",
        ended.out
    );
    assert!(ended.out.contains("This run is not complete"), "{}", ended.out);

    let results = json(&out.join("results.json"));
    assert_eq!(results["summary"]["verdict"], "VERDICT_NO_ANSWER");
    assert!(results["broken_off"].as_str().unwrap().contains("connection"));
    let states = results["states"].as_array().unwrap();
    assert!((2..12).contains(&states.len()), "{} states", states.len());
    // What is written of a closed state is what a whole run writes.
    let whole = folder.path("whole");
    ropewalk(&["demo", "--out", whole.to_str().unwrap()]);
    let rows = |from: &PathBuf| -> Vec<Vec<String>> {
        let mut rows = csv(&from.join("nodes.csv"));
        rows.retain(|row| row[0] == "full-snow");
        rows
    };
    assert!(rows(&out).len() > 200);
    assert_eq!(rows(&out), rows(&whole));
    let page = std::fs::read_to_string(out.join("report.html")).unwrap();
    assert!(page.contains("the run broke off after") && page.contains("verdict gone"));
}

#[test]
fn an_interrupted_run_ends_with_130_and_writes_nothing() {
    let folder = Folder::new("interrupted");
    let engine = Engine::start();
    let (cut, is_cut) = mpsc::channel();
    let url = between(&engine, move |_| cut.send(()).unwrap());
    let out = folder.path("out");
    let client = command(&["--engine", &url, "demo", "--out", out.to_str().unwrap()])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    is_cut.recv().unwrap();
    let sent = Command::new("kill").args(["-INT", &client.id().to_string()]).status();
    assert!(sent.unwrap().success());
    let ended = finish(client.wait_with_output().unwrap());
    assert_eq!(ended.code, 130, "{}", ended.told);
    assert!(ended.told.contains("interrupted"), "{}", ended.told);
    assert!(!out.exists());
}

#[test]
fn an_engine_that_is_not_there_is_told_with_what_to_do() {
    // A port that was free a moment ago.
    let port = TcpListener::bind("127.0.0.1:0").unwrap().local_addr().unwrap().port();
    let away = ropewalk(&[
        "--engine",
        &format!("http://127.0.0.1:{port}"),
        "check",
        &brief("first-net"),
    ]);
    assert_eq!(away.code, 69);
    for wanted in [
        "no engine answers at",
        "ropewalk-engine --listen",
        "ROPEWALK_ENGINE",
        "leave both out",
    ] {
        assert!(away.told.contains(wanted), "{wanted:?} is missing in\n{}", away.told);
    }
}
