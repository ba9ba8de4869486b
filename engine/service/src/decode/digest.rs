//! The digest of a brief: one for its JSON and its binary form.

use std::fmt::Write as _;

use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use sha2::{Digest as _, Sha256};

/// SHA-256, in lower-case hexadecimal, of the message encoded in tag order with sorted maps.
#[must_use]
pub fn digest(brief: &v1::Brief) -> String {
    let hash = Sha256::digest(brief.encode_to_vec());
    let mut text = String::with_capacity(64);
    for byte in hash {
        write!(text, "{byte:02x}").expect("a string takes every text");
    }
    text
}
