//! Old messages still read: bytes of an earlier day, decoded by the contract of today.

use std::fs;
use std::path::PathBuf;

use prost::Message as _;
use ropewalk_api::ropewalk::v1;
use ropewalk_service::decode::digest;

use crate::briefs::{message, terrace};

/// The terrace brief, encoded when the contract was first written. Renewed with `RENEW_GOLDEN=1`, which must not be needed:
/// a change of these bytes breaks stored briefs and their digests.
fn file() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/golden/terrace.brief.binpb")
}

#[test]
fn the_first_encoding_of_a_brief_still_reads() {
    if std::env::var_os("RENEW_GOLDEN").is_some() {
        fs::write(file(), message(&terrace()).encode_to_vec()).expect("the file can be written");
    }
    let bytes = fs::read(file()).expect("the golden file is there");
    let old = v1::Brief::decode(bytes.as_slice()).expect("old bytes still read");
    assert_eq!(old, message(&terrace()));
    assert_eq!(old.encode_to_vec(), bytes, "the encoding has not changed");
    assert_eq!(
        digest(&old),
        "7efb575338f6e3138d0c1429cd15eef278a6456f09884d63cfa0813f8d024e28"
    );
}
