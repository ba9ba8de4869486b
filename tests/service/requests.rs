//! Requests that the contract does not have: each is told what is wrong, and where.

use std::io::{Read as _, Write as _};
use std::net::TcpStream;
use std::time::Instant;

use bytes::{Buf as _, BufMut as _, Bytes};
use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use tonic::codec::{Codec, DecodeBuf, Decoder, EncodeBuf, Encoder};
use tonic::codegen::http::uri::PathAndQuery;
use tonic::{Code, Request, Status};
use tonic_types::StatusExt as _;

use crate::admission::begun;
use crate::client::{code_and_reason, collect};
use crate::engine::{Engine, PATIENCE};
use crate::{briefs, web};

/// Sends and takes bytes as they are.
#[derive(Clone, Copy, Default)]
struct Raw;

impl Codec for Raw {
    type Encode = Bytes;
    type Decode = Bytes;
    type Encoder = Self;
    type Decoder = Self;

    fn encoder(&mut self) -> Self {
        Self
    }

    fn decoder(&mut self) -> Self {
        Self
    }
}

impl Encoder for Raw {
    type Item = Bytes;
    type Error = Status;

    fn encode(&mut self, item: Bytes, buffer: &mut EncodeBuf<'_>) -> Result<(), Status> {
        buffer.put(item);
        Ok(())
    }
}

impl Decoder for Raw {
    type Item = Bytes;
    type Error = Status;

    fn decode(&mut self, buffer: &mut DecodeBuf<'_>) -> Result<Option<Bytes>, Status> {
        Ok(Some(buffer.copy_to_bytes(buffer.remaining())))
    }
}

/// The status with which `path` answers `message`.
async fn refusal(engine: &Engine, path: &'static str, message: impl Into<Bytes>) -> Status {
    let mut client = tonic::client::Grpc::new(engine.channel().await);
    client.ready().await.expect("connected");
    let request = Request::new(message.into());
    let answer = client
        .server_streaming(request, PathAndQuery::from_static(path), Raw)
        .await;
    match answer {
        Err(status) => status,
        Ok(answer) => {
            let mut stream = answer.into_inner();
            loop {
                match stream.message().await {
                    Ok(Some(_)) => {}
                    Ok(None) => panic!("answered"),
                    Err(status) => return status,
                }
            }
        }
    }
}

const RUN: &str = "/ropewalk.v1.BriefService/Run";

#[tokio::test]
async fn what_is_not_the_contract_is_told() {
    let engine = Engine::start(&[]);
    let malformed = (Code::InvalidArgument, "MALFORMED_MESSAGE".to_owned());

    // Random bytes, text that is not UTF-8, a number where the brief belongs, deep nesting.
    let only = |text: &[u8]| [&[0x12, u8::try_from(text.len()).expect("short")], text].concat();
    for bytes in [
        b"rope rope rope".to_vec(),
        only(&[0xc3, 0x28]),
        vec![0x08, 0x01],
        vec![0x1b; 10_000],
    ] {
        let status = refusal(&engine, RUN, bytes.clone()).await;
        assert_eq!(code_and_reason(&status), malformed, "{bytes:02x?}: {status:?}");
    }
    let status = refusal(&engine, RUN, only(&[0xc3, 0x28])).await;
    assert!(status.message().contains("UTF-8 at \"only\""), "{}", status.message());

    let status = refusal(&engine, "/ropewalk.v1.BriefService/Bend", Vec::new()).await;
    assert_eq!(status.code(), Code::Unimplemented);
    // The next call is answered as if nothing had been.
    assert!(engine.briefs().await.check(v1::CheckRequest::default()).await.is_ok());
}

#[tokio::test]
async fn unknown_fields_are_named_with_their_place() {
    let engine = Engine::start(&[]);
    let mut request = briefs::run(briefs::first_net()).encode_to_vec();
    // A brief merges with what was there: this one has a net with a cable "ridge" and in it field 999.
    let field =
        |number: u8, inside: &[u8]| [&[number << 3 | 2, u8::try_from(inside.len()).expect("short")], inside].concat();
    let cable = [field(1, b"ridge"), vec![0xb8, 0x3e, 0x01]].concat();
    request.extend(field(1, &field(5, &field(4, &cable))));
    let status = refusal(&engine, RUN, request).await;
    assert_eq!(
        code_and_reason(&status),
        (Code::InvalidArgument, "UNKNOWN_FIELDS".to_owned())
    );
    let details = status.get_error_details();
    let violations = &details.bad_request().expect("places").field_violations;
    assert_eq!(violations[0].field, "net.cables[ridge].999");
    assert!(
        status.message().contains("net.cables[ridge].999"),
        "{}",
        status.message()
    );
}

#[tokio::test]
async fn a_request_over_the_limit_is_refused_without_being_read() {
    let engine = Engine::start(&["--request-limit-mib", "1"]);
    let before = engine.resident_bytes();
    let status = refusal(&engine, RUN, vec![0_u8; 64 << 20]).await;
    assert_eq!(
        code_and_reason(&status),
        (Code::InvalidArgument, "MESSAGE_TOO_LARGE".to_owned())
    );
    assert_eq!(
        status.get_error_details().error_info().expect("one").metadata["limit_bytes"],
        "1048576"
    );
    let grown = engine.resident_bytes().saturating_sub(before);
    assert!(grown < 16 << 20, "{grown} bytes for a request that is not read");
}

#[tokio::test]
async fn a_request_of_several_mib_is_taken() {
    let engine = Engine::start(&[]);
    let mut brief = briefs::first_net();
    brief.note = "n".repeat(20 << 20);
    let reports = engine
        .briefs()
        .await
        .check(v1::CheckRequest { brief: Some(brief) })
        .await;
    let (reports, end) = collect(reports.expect("taken").into_inner()).await;
    end.expect("a report");
    assert!(reports.last().expect("a report").totals.is_some());
}

#[tokio::test]
async fn compressed_requests_and_unreadable_timeouts_are_refused() {
    let engine = Engine::start(&[]);
    for (header, value, code, reason) in [
        ("grpc-encoding", "gzip", Code::Unimplemented, "COMPRESSION_NOT_SERVED"),
        ("grpc-timeout", "soon", Code::InvalidArgument, "MALFORMED_TIMEOUT"),
    ] {
        let mut request = Request::new(v1::CheckRequest::default());
        request.metadata_mut().insert(header, value.parse().expect("a value"));
        let status = engine.briefs().await.check(request).await.expect_err("refused");
        assert_eq!(code_and_reason(&status), (code, reason.to_owned()));
    }
}

#[tokio::test]
async fn errors_of_a_brief_are_listed_with_their_places() {
    let engine = Engine::start(&[]);
    let mut brief = briefs::first_net();
    brief.cases[0].factors.insert("snwo".to_owned(), 1.0);
    let status = match engine.briefs().await.run(briefs::run(brief.clone())).await {
        Ok(stream) => collect(stream.into_inner()).await.1.expect_err("refused"),
        Err(status) => status,
    };
    assert_eq!(
        code_and_reason(&status),
        (Code::InvalidArgument, "BRIEF_HAS_ERRORS".to_owned())
    );
    let details = status.get_error_details();
    assert_eq!(details.error_info().expect("one").metadata["errors"], "1");
    let violations = &details.bad_request().expect("places").field_violations;
    assert!(violations[0].field.starts_with("cases[full-snow]"), "{violations:?}");

    // `Check` tells the same, and ends well.
    let reports = engine
        .briefs()
        .await
        .check(v1::CheckRequest { brief: Some(brief) })
        .await
        .expect("a report");
    let (reports, end) = collect(reports.into_inner()).await;
    end.expect("ends well");
    assert_eq!(reports[0].findings[0].reason, violations[0].reason);
    assert!(reports.last().expect("a report").totals.is_some());
}

#[test]
fn a_request_that_does_not_arrive_is_given_up() {
    let engine = Engine::start(&["--receive-seconds", "1"]);
    let mut stream = TcpStream::connect(engine.address).expect("the engine listens");
    let head = web::post(RUN);
    let head = format!(
        "{head}\r\nhost: {}\r\nconnection: close\r\ncontent-length: 1000\r\n\r\n",
        engine.address
    );
    stream.write_all(head.as_bytes()).expect("sent");
    // The prefix, and a hundred of the bytes that it says.
    stream.write_all(&web::frame(&[0; 900])[..105]).expect("sent");
    let mut told = Vec::new();
    stream.read_to_end(&mut told).expect("an answer");
    let told = String::from_utf8_lossy(&told).into_owned();
    assert!(told.contains("grpc-status: 4"), "{told}");
    assert!(told.contains("did%20not%20arrive%20within%201%20s"), "{told}");
}

#[tokio::test]
async fn large_requests_share_a_bounded_memory() {
    let engine = Engine::start(&["--request-limit-mib", "1", "--requests-held", "1"]);
    // Half a MiB and more, all of it cases; the client reads no further than the beginning.
    let large = || briefs::run(briefs::saddle(4, 18_000));
    let first = begun(&engine, large()).await;
    let status = engine.briefs().await.run(large()).await.expect_err("no memory left");
    assert_eq!(
        code_and_reason(&status),
        (Code::ResourceExhausted, "SERVER_FULL".to_owned())
    );
    assert!(status.get_error_details().retry_info().is_some());
    // A small one passes, and after the first one has left, a large one does.
    let stream = engine
        .briefs()
        .await
        .run(briefs::run(briefs::first_net()))
        .await
        .expect("small");
    collect(stream.into_inner()).await.1.expect("ends well");
    drop(first);
    let end = Instant::now() + PATIENCE;
    while let Err(status) = engine.briefs().await.run(large()).await {
        assert_eq!(code_and_reason(&status).1, "SERVER_FULL");
        assert!(Instant::now() < end, "memory never given back");
    }
}
