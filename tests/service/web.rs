//! As a browser calls: gRPC-Web over HTTP/1.1, from another origin.

use std::io::{Read as _, Write as _};
use std::net::{SocketAddr, TcpStream};

use prost::Message as _;
use ropewalk_api::ropewalk::v1;

use crate::briefs;
use crate::engine::Engine;

/// A message as gRPC frames it: no compression, its length, itself.
pub(crate) fn frame(message: &[u8]) -> Vec<u8> {
    let mut bytes = vec![0];
    bytes.extend(u32::try_from(message.len()).expect("short").to_be_bytes());
    bytes.extend(message);
    bytes
}

/// Sends one request and reads the whole answer: its head, and its body put together from chunks.
pub(crate) fn request(address: SocketAddr, head: &str, body: &[u8]) -> (String, Vec<u8>) {
    let mut stream = TcpStream::connect(address).expect("the engine listens");
    let head = format!(
        "{head}\r\nhost: {address}\r\nconnection: close\r\ncontent-length: {}\r\n\r\n",
        body.len()
    );
    stream.write_all(head.as_bytes()).expect("sent");
    // An engine that refuses early may close before all is sent.
    let _ = stream.write_all(body);
    let mut answer = Vec::new();
    stream.read_to_end(&mut answer).expect("an answer");
    let end = answer.windows(4).position(|four| four == b"\r\n\r\n").expect("a head") + 4;
    let head = String::from_utf8(answer[..end].to_vec()).expect("text").to_lowercase();
    let body = if head.contains("transfer-encoding: chunked") {
        unchunk(&answer[end..])
    } else {
        answer[end..].to_vec()
    };
    (head, body)
}

fn unchunk(mut rest: &[u8]) -> Vec<u8> {
    let mut body = Vec::new();
    loop {
        let line = rest.windows(2).position(|two| two == b"\r\n").expect("a line");
        let size = std::str::from_utf8(&rest[..line]).expect("text");
        let size = usize::from_str_radix(size, 16).expect("a size");
        if size == 0 {
            return body;
        }
        body.extend(&rest[line + 2..line + 2 + size]);
        rest = &rest[line + 2 + size + 2..];
    }
}

/// The head of a call by gRPC-Web.
pub(crate) fn post(path: &str) -> String {
    format!(
        "POST {path} HTTP/1.1\r\ncontent-type: application/grpc-web+proto\r\nx-grpc-web: 1\r\n\
         origin: https://office.example"
    )
}

/// The messages of a body, and the trailers as text.
pub(crate) fn parts(mut body: &[u8]) -> (Vec<Vec<u8>>, String) {
    let (mut messages, mut trailers) = (Vec::new(), String::new());
    while let [flag, a, b, c, d, rest @ ..] = body {
        let (inside, left) = rest.split_at(u32::from_be_bytes([*a, *b, *c, *d]) as usize);
        if *flag == 0x80 {
            trailers = String::from_utf8(inside.to_vec()).expect("text");
        } else {
            messages.push(inside.to_vec());
        }
        body = left;
    }
    (messages, trailers)
}

#[test]
fn a_browser_may_ask_and_read_how_a_call_ended() {
    let engine = Engine::start(&[]);
    let preflight = "OPTIONS /ropewalk.v1.BriefService/Run HTTP/1.1\r\norigin: https://office.example\r\n\
                     access-control-request-method: POST\r\n\
                     access-control-request-headers: content-type,x-grpc-web,grpc-timeout";
    let (head, _) = request(engine.address, preflight, b"");
    assert!(head.starts_with("http/1.1 200"), "{head}");
    assert!(head.contains("access-control-allow-origin: *"), "{head}");
    assert!(
        head.contains("access-control-allow-headers: content-type,x-grpc-web,grpc-timeout"),
        "{head}"
    );

    let body = frame(&v1::GetInfoRequest {}.encode_to_vec());
    let (head, body) = request(engine.address, &post("/ropewalk.v1.ServerService/GetInfo"), &body);
    let exposed = head
        .lines()
        .find(|line| line.starts_with("access-control-expose-headers"))
        .expect("told");
    for name in ["grpc-status", "grpc-message", "grpc-status-details-bin"] {
        assert!(exposed.contains(name), "{exposed}");
    }
    let (messages, trailers) = parts(&body);
    let info = v1::GetInfoResponse::decode(&messages[0][..]).expect("a message");
    assert_eq!(info.engine.expect("told").contract, "ropewalk.v1");
    assert!(trailers.contains("grpc-status:0"), "{trailers}");
}

#[test]
fn a_run_streams_to_a_browser() {
    let engine = Engine::start(&[]);
    let body = frame(&briefs::run(briefs::first_net()).encode_to_vec());
    let (_, body) = request(engine.address, &post("/ropewalk.v1.BriefService/Run"), &body);
    let (messages, trailers) = parts(&body);
    assert!(trailers.contains("grpc-status:0"), "{trailers}");
    let last = v1::RunResponse::decode(&messages.last().expect("messages")[..]).expect("a message");
    assert!(matches!(last.event, Some(v1::run_response::Event::Summary(_))));
}

#[test]
fn strictness_holds_for_browsers_too() {
    let engine = Engine::start(&[]);
    // The length says more than there is.
    let mut body = frame(&[0x0a, 0x00]);
    body[4] = 200;
    let (head, body) = request(engine.address, &post("/ropewalk.v1.BriefService/Run"), &body);
    let told = format!("{head}{}", parts(&body).1);
    assert!(
        told.contains("grpc-status: 3") || told.contains("grpc-status:3"),
        "{told}"
    );
    assert!(told.contains("grpc-status-details-bin"), "{told}");
}

#[test]
fn only_named_origins_may_call_where_some_are_named() {
    let engine = Engine::start(&["--web-origins", "https://one.example,https://two.example"]);
    let ask = |origin: &str| {
        let preflight = format!(
            "OPTIONS /ropewalk.v1.BriefService/Run HTTP/1.1\r\norigin: {origin}\r\n\
             access-control-request-method: POST"
        );
        request(engine.address, &preflight, b"").0
    };
    assert!(ask("https://two.example").contains("access-control-allow-origin: https://two.example"));
    assert!(!ask("https://three.example").contains("access-control-allow-origin"));
}
