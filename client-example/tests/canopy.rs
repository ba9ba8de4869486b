//! The brief of the demo is what its generator writes.

#[path = "../examples/canopy/mod.rs"]
mod canopy;

#[test]
fn the_committed_brief_is_the_generated_one() {
    let committed = std::fs::read_to_string(format!("{}/briefs/market-square.json", env!("CARGO_MANIFEST_DIR")));
    assert!(
        committed.expect("the brief is there") == canopy::brief(),
        "run `cargo run -p ropewalk --example market_square > client-example/briefs/market-square.json`"
    );
}
