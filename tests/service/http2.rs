//! HTTP/2 by hand, for clients that no library would let be built: silent ones, broken ones.

use std::io::{Read as _, Write as _};
use std::net::{SocketAddr, TcpStream};
use std::time::Duration;

use prost::Message;

/// A connection on which only what a test writes is written; in particular no answer to PING.
pub(crate) struct SilentClient(TcpStream);

impl SilentClient {
    /// Begins a connection and one call, with `message` as its request.
    pub(crate) fn call(address: SocketAddr, path: &str, message: &impl Message) -> Self {
        let mut stream = TcpStream::connect(address).expect("the engine listens");
        stream.write_all(b"PRI * HTTP/2.0\r\n\r\nSM\r\n\r\n").expect("sent");
        // SETTINGS, empty.
        stream.write_all(&frame(4, 0, 0, &[])).expect("sent");
        let authority = address.to_string();
        let headers = [
            (":method", "POST"),
            (":scheme", "http"),
            (":path", path),
            (":authority", &authority),
            ("content-type", "application/grpc"),
            ("te", "trailers"),
        ];
        let mut block = Vec::new();
        for (name, value) in headers {
            // Literal header field without indexing, new name, no Huffman code (RFC 7541, section 6.2.2).
            block.push(0);
            for text in [name, value] {
                block.push(u8::try_from(text.len()).expect("short"));
                block.extend(text.bytes());
            }
        }
        // HEADERS with END_HEADERS.
        stream.write_all(&frame(1, 0x4, 1, &block)).expect("sent");
        let body = crate::web::frame(&message.encode_to_vec());
        // Settings are never acknowledged, so the first windows of the protocol hold (RFC 9113, section 6.9.2).
        assert!(body.len() < 65_535, "{} bytes do not fit the window", body.len());
        // DATA up to the frame size that every peer takes; END_STREAM on the last.
        let parts: Vec<&[u8]> = body.chunks(16_384).collect();
        for (number, part) in parts.iter().enumerate() {
            let last = u8::from(number + 1 == parts.len());
            stream.write_all(&frame(0, last, 1, part)).expect("sent");
        }
        Self(stream)
    }

    /// Waits until the engine sends something that a run sends: the DATA of its first messages.
    pub(crate) fn wait_for_data(&mut self) {
        loop {
            let mut head = [0; 9];
            self.0.read_exact(&mut head).expect("a frame");
            let length = usize::from(head[0]) << 16 | usize::from(head[1]) << 8 | usize::from(head[2]);
            let mut payload = vec![0; length];
            self.0.read_exact(&mut payload).expect("its payload");
            if head[3] == 0 && length > 0 {
                return;
            }
        }
    }

    /// Reads until the engine has closed the connection.
    pub(crate) fn wait_for_close(mut self, at_most: Duration) {
        self.0.set_read_timeout(Some(at_most)).expect("a timeout");
        let mut buffer = [0; 65_536];
        loop {
            match self.0.read(&mut buffer) {
                Ok(0) => return,
                Ok(_) => {}
                Err(error) if error.kind() == std::io::ErrorKind::ConnectionReset => return,
                Err(error) => panic!("not closed: {error}"),
            }
        }
    }
}

/// A frame (RFC 9113, section 4.1).
pub(crate) fn frame(kind: u8, flags: u8, stream: u32, payload: &[u8]) -> Vec<u8> {
    let length = u32::try_from(payload.len()).expect("short");
    let mut bytes = length.to_be_bytes()[1..].to_vec();
    bytes.extend([kind, flags]);
    bytes.extend(stream.to_be_bytes());
    bytes.extend(payload);
    bytes
}
