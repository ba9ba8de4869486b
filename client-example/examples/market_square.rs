//! Writes `briefs/market-square.json`, the brief of the demo: an invented canopy over a market square.
//!
//! Run it as `cargo run -p ropewalk --example market_square > client-example/briefs/market-square.json`.

mod canopy;

fn main() {
    use std::io::Write as _;
    std::io::stdout()
        .write_all(canopy::brief().as_bytes())
        .expect("standard output takes the brief");
}
