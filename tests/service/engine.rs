//! An engine process of a test's own, on a free port.

use std::io::{BufRead as _, BufReader, Read as _};
use std::net::SocketAddr;
use std::process::{Child, Command, ExitStatus, Stdio};
use std::sync::{Arc, Mutex};
use std::thread::JoinHandle;
use std::time::{Duration, Instant};

use ropewalk_api::ropewalk::v1::brief_service_client::BriefServiceClient;
use tonic::transport::{Channel, Endpoint};

/// How long anything that has to happen may take on a busy machine.
pub(crate) const PATIENCE: Duration = Duration::from_secs(30);

/// A running engine; killed when dropped.
pub(crate) struct Engine {
    process: Child,
    pub(crate) address: SocketAddr,
    log: Arc<Mutex<String>>,
    reader: Option<JoinHandle<()>>,
}

/// The program with these arguments, on a free port, with an environment of its own.
pub(crate) fn command(arguments: &[&str]) -> Command {
    let binary = std::env::var_os("ROPEWALK_ENGINE_BIN").expect(
        "ROPEWALK_ENGINE_BIN must hold the path of the built ropewalk-engine: \
         cargo build --release -p ropewalk-service, then target/release/ropewalk-engine",
    );
    let mut command = Command::new(binary);
    for (name, _) in std::env::vars().filter(|(name, _)| name.starts_with("ROPEWALK_")) {
        command.env_remove(name);
    }
    command.args(["--listen", "127.0.0.1:0"]).args(arguments);
    command
}

impl Engine {
    pub(crate) fn start(arguments: &[&str]) -> Self {
        Self::from(command(arguments))
    }

    /// An engine that may be told to fail on purpose.
    pub(crate) fn start_faulty(arguments: &[&str]) -> Self {
        let mut command = command(arguments);
        command.env("ROPEWALK_FAULTS", "1");
        Self::from(command)
    }

    fn from(mut command: Command) -> Self {
        let mut process = command
            .arg("--announce")
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .expect("ROPEWALK_ENGINE_BIN can be started");
        let mut errors = process.stderr.take().expect("piped");
        let log = Arc::new(Mutex::new(String::new()));
        let reader = std::thread::spawn({
            let log = Arc::clone(&log);
            move || {
                let mut buffer = [0; 4096];
                while let Ok(length @ 1..) = errors.read(&mut buffer) {
                    log.lock()
                        .expect("no panic")
                        .push_str(&String::from_utf8_lossy(&buffer[..length]));
                }
            }
        });
        let mut line = String::new();
        let mut output = BufReader::new(process.stdout.take().expect("piped"));
        output.read_line(&mut line).expect("an announcement");
        let announced: serde_json::Value = serde_json::from_str(&line)
            .unwrap_or_else(|_| panic!("not announced: {line:?}; log:\n{}", log.lock().expect("no panic")));
        let address = announced["listen"]
            .as_str()
            .expect("an address")
            .parse()
            .expect("an address");
        Self {
            process,
            address,
            log,
            reader: Some(reader),
        }
    }

    /// A connection of its own.
    pub(crate) async fn channel(&self) -> Channel {
        let endpoint = Endpoint::from_shared(format!("http://{}", self.address))
            .expect("an address")
            .initial_stream_window_size(1 << 20)
            .initial_connection_window_size(4 << 20)
            .tcp_nodelay(true);
        endpoint.connect().await.expect("the engine listens")
    }

    pub(crate) async fn briefs(&self) -> BriefServiceClient<Channel> {
        BriefServiceClient::new(self.channel().await)
    }

    pub(crate) fn signal(&self, name: &str) {
        let sent = Command::new("kill")
            .args([&format!("-{name}"), &self.process.id().to_string()])
            .status();
        assert!(sent.expect("kill is there").success());
    }

    /// Waits for the end of the process.
    pub(crate) fn wait(&mut self, at_most: Duration) -> ExitStatus {
        let until = Instant::now() + at_most;
        loop {
            if let Some(status) = self.process.try_wait().expect("our child") {
                return status;
            }
            assert!(
                Instant::now() < until,
                "still there after {at_most:?}; log:\n{}",
                self.log()
            );
            std::thread::sleep(Duration::from_millis(5));
        }
    }

    pub(crate) fn is_running(&mut self) -> bool {
        self.process.try_wait().expect("our child").is_none()
    }

    /// What it has logged so far; all of it once it has ended.
    pub(crate) fn log(&self) -> String {
        self.log.lock().expect("no panic").clone()
    }

    /// Memory in use (bytes).
    pub(crate) fn resident_bytes(&self) -> u64 {
        let pages: u64 = self
            .proc("statm")
            .split(' ')
            .nth(1)
            .expect("a field")
            .parse()
            .expect("a number");
        // Pages of the architectures that the tests run on.
        pages * 4096
    }

    /// Processor time used so far (ticks of 10 ms).
    pub(crate) fn processor_ticks(&self) -> u64 {
        let stat = self.proc("stat");
        // The name of the program, in parentheses, may hold spaces. After it, user and system time are fields 12, 13.
        let (_, rest) = stat.rsplit_once(')').expect("a name");
        let fields = rest.split_whitespace().skip(11).take(2);
        fields.map(|ticks| ticks.parse::<u64>().expect("a number")).sum()
    }

    fn proc(&self, file: &str) -> String {
        std::fs::read_to_string(format!("/proc/{}/{file}", self.process.id())).expect("a running process")
    }
}

impl Drop for Engine {
    fn drop(&mut self) {
        // It may have ended already.
        let _ = self.process.kill();
        let _ = self.process.wait();
        if let Some(reader) = self.reader.take() {
            let _ = reader.join();
        }
        if std::thread::panicking() {
            eprintln!("log of the engine:\n{}", self.log());
        }
    }
}

/// Waits until `holds`, looking every few milliseconds, and fails with `what` if it never does.
#[track_caller]
pub(crate) fn until(what: &str, mut holds: impl FnMut() -> bool) {
    let end = Instant::now() + PATIENCE;
    while !holds() {
        assert!(Instant::now() < end, "never came: {what}");
        std::thread::sleep(Duration::from_millis(5));
    }
}
