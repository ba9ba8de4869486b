//! Health, reflection, information, settings, log.

use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::server_service_client::ServerServiceClient;
use tonic::Request;
use tonic_health::pb::HealthCheckRequest;
use tonic_health::pb::health_check_response::ServingStatus;
use tonic_health::pb::health_client::HealthClient;

use crate::briefs;
use crate::client::collect;
use crate::engine::{Engine, command, until};

#[tokio::test]
async fn health_is_told_for_all_and_for_each_service() {
    let engine = Engine::start(&[]);
    let mut health = HealthClient::new(engine.channel().await);
    for service in ["", "ropewalk.v1.BriefService", "ropewalk.v1.ServerService"] {
        let asked = HealthCheckRequest {
            service: service.to_owned(),
        };
        let told = health.check(asked).await.expect("known").into_inner();
        assert_eq!(told.status(), ServingStatus::Serving, "{service:?}");
    }
}

#[tokio::test]
async fn reflection_is_there_in_both_versions() {
    let engine = Engine::start(&[]);
    let names = {
        use tonic_reflection::pb::v1::server_reflection_client::ServerReflectionClient;
        use tonic_reflection::pb::v1::{
            ServerReflectionRequest, server_reflection_request::MessageRequest,
            server_reflection_response::MessageResponse,
        };
        let asked = ServerReflectionRequest {
            host: String::new(),
            message_request: Some(MessageRequest::ListServices(String::new())),
        };
        let mut client = ServerReflectionClient::new(engine.channel().await);
        let mut answers = client
            .server_reflection_info(tokio_stream::once(asked))
            .await
            .expect("there")
            .into_inner();
        match answers
            .message()
            .await
            .expect("an answer")
            .expect("an answer")
            .message_response
        {
            Some(MessageResponse::ListServicesResponse(list)) => {
                list.service.into_iter().map(|s| s.name).collect::<Vec<_>>()
            }
            other => panic!("{other:?}"),
        }
    };
    for name in [
        "ropewalk.v1.BriefService",
        "ropewalk.v1.ServerService",
        "grpc.health.v1.Health",
    ] {
        assert!(names.iter().any(|known| known == name), "{names:?}");
    }
    use tonic_reflection::pb::v1alpha::server_reflection_client::ServerReflectionClient;
    use tonic_reflection::pb::v1alpha::{
        ServerReflectionRequest, server_reflection_request::MessageRequest, server_reflection_response::MessageResponse,
    };
    let asked = ServerReflectionRequest {
        host: String::new(),
        message_request: Some(MessageRequest::FileContainingSymbol("ropewalk.v1.Brief".to_owned())),
    };
    let mut client = ServerReflectionClient::new(engine.channel().await);
    let mut answers = client
        .server_reflection_info(tokio_stream::once(asked))
        .await
        .expect("there")
        .into_inner();
    let answer = answers
        .message()
        .await
        .expect("an answer")
        .expect("an answer")
        .message_response;
    assert!(
        matches!(answer, Some(MessageResponse::FileDescriptorResponse(_))),
        "{answer:?}"
    );
}

#[tokio::test]
async fn the_server_tells_its_limits() {
    let engine = Engine::start(&[
        "--running",
        "3",
        "--waiting",
        "5",
        "--request-limit-mib",
        "2",
        "--max-cases",
        "7",
    ]);
    let mut server = ServerServiceClient::new(engine.channel().await);
    let info = server
        .get_info(v1::GetInfoRequest {})
        .await
        .expect("always")
        .into_inner();
    let limits = info.limits.expect("told");
    assert_eq!(
        (limits.running, limits.waiting, limits.cases, limits.request_bytes),
        (3, 5, 7, 2 << 20)
    );
    let build = info.engine.expect("told");
    assert!(
        build.instruction_set.starts_with(std::env::consts::ARCH),
        "{}",
        build.instruction_set
    );
    assert!(info.not_served.iter().any(|part| part == "workshop"));
    assert!(!info.cautions.is_empty());
}

#[test]
fn settings_that_cannot_be_stop_the_engine_before_it_binds() {
    for (arguments, words) in [
        (&["--threads", "0"][..], "--threads 0: must be 1 to 1024"),
        (&["--log", "a=b=c"], "--log"),
        (&["--fault", "panic-in-case=x"], "ROPEWALK_FAULTS=1"),
        (&["--listen", "nowhere"], "--listen"),
    ] {
        let mut command = command(&[]);
        // The last one counts.
        command.args(arguments).arg("--announce");
        if arguments[0] == "--listen" {
            let binary = command.get_program().to_owned();
            command = std::process::Command::new(binary);
            command.args(arguments);
        }
        let output = command.output().expect("it can be started");
        let told = String::from_utf8_lossy(&output.stderr).into_owned();
        assert!(!output.status.success(), "{arguments:?}");
        assert!(told.contains(words), "{told}");
        assert!(output.stdout.is_empty(), "nothing is announced");
    }
}

#[test]
fn an_address_in_use_is_told() {
    let engine = Engine::start(&[]);
    let binary = command(&[]).get_program().to_owned();
    let output = std::process::Command::new(binary)
        .args(["--listen", &engine.address.to_string()])
        .output()
        .expect("it can be started");
    assert!(!output.status.success());
    let told = String::from_utf8_lossy(&output.stderr).into_owned();
    assert!(told.contains(&format!("cannot listen on {}", engine.address)), "{told}");
}

#[tokio::test]
async fn the_log_names_the_call_and_nothing_of_the_brief() {
    let engine = Engine::start(&["--log-format", "json", "--log", "debug"]);
    let mut request = Request::new(briefs::run(briefs::first_net()));
    let metadata = request.metadata_mut();
    metadata.insert("x-request-id", "office-7".parse().expect("a value"));
    // Example of W3C Trace Context, section 3.2.2.
    let parent = "00-4bf92f3577b34da6a3ce929d0e0e4736-00f067aa0ba902b7-01";
    metadata.insert("traceparent", parent.parse().expect("a value"));
    let answer = engine.briefs().await.run(request).await.expect("a run");
    assert_eq!(answer.metadata().get("x-request-id").expect("echoed"), "office-7");
    collect(answer.into_inner()).await.1.expect("ends well");

    let ended = |log: &str| {
        let lines = log
            .lines()
            .filter_map(|line| serde_json::from_str::<serde_json::Value>(line).ok());
        lines
            .rev()
            .find(|line| line["message"] == "ended" && line["span"]["request_id"] == "office-7")
    };
    until("the end of the call in the log", || ended(&engine.log()).is_some());
    let line = ended(&engine.log()).expect("seen");
    assert_eq!(line["span"]["trace_id"], "4bf92f3577b34da6a3ce929d0e0e4736");
    assert_eq!(line["span"]["method"], "/ropewalk.v1.BriefService/Run");
    assert_eq!(line["reason"], "OK");
    let log = engine.log();
    assert!(log.contains("\"digest\""), "{log}");
    for secret in ["carrying", "full-snow", "r10", "first-net"] {
        assert!(!log.contains(secret), "{secret} in {log}");
    }
}
