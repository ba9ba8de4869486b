//! Bytes that nobody meant well.

use std::io::{Read as _, Write as _};
use std::net::{Shutdown, TcpStream};
use std::time::Duration;

use crate::admission::runs_again;
use crate::engine::Engine;
use crate::http2::frame;

/// Random numbers from a seed: xorshift64 (Marsaglia 2003, "Xorshift RNGs").
struct Random(u64);

impl Random {
    fn next(&mut self) -> u64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        self.0
    }

    fn below(&mut self, limit: u64) -> usize {
        usize::try_from(self.next() % limit).expect("small")
    }

    fn bytes(&mut self, length: usize) -> Vec<u8> {
        (0..length).map(|_| self.next().to_le_bytes()[0]).collect()
    }
}

#[tokio::test]
async fn junk_does_not_hurt() {
    let mut engine = Engine::start(&["--threads", "1"]);
    runs_again(&engine).await;
    let before = engine.resident_bytes();
    let mut random = Random(0x2545_f491_4f6c_dd1d);
    for number in 0..500 {
        let mut junk = match number % 4 {
            0 => Vec::new(),
            1 => b"POST /ropewalk.v1.BriefService/Run HTTP/1.1\r\nhost: a\r\ncontent-length: 9999\r\n\r\n".to_vec(),
            2 => b"GET / HTTP/1.1\r\nhost: a\r\n\r\n".to_vec(),
            _ => {
                let mut bytes = b"PRI * HTTP/2.0\r\n\r\nSM\r\n\r\n".to_vec();
                bytes.extend(frame(4, 0, 0, &[]));
                for _ in 0..random.below(8) {
                    let length = random.below(64);
                    let payload = random.bytes(length);
                    let [kind, flags, stream, ..] = random.next().to_le_bytes();
                    bytes.extend(frame(kind % 11, flags, u32::from(stream), &payload));
                }
                bytes
            }
        };
        let length = random.below(512);
        junk.extend(random.bytes(length));
        let mut stream = TcpStream::connect(engine.address).expect("the engine listens");
        // The engine may have seen enough before all is sent.
        let _ = stream.write_all(&junk);
        let _ = stream.shutdown(Shutdown::Write);
        stream
            .set_read_timeout(Some(Duration::from_millis(500)))
            .expect("a timeout");
        let _ = stream.read(&mut [0; 64]);
    }
    assert!(engine.is_running());
    runs_again(&engine).await;
    let grown = engine.resident_bytes().saturating_sub(before);
    assert!(grown < 32 << 20, "{grown} bytes after junk");
    assert!(!engine.log().contains("panic"));
}
