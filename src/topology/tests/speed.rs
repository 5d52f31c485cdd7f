//! Time on a large town; run by hand: `cargo test --lib large_town -- --ignored --nocapture`.

use std::time::Instant;

use super::town::build;

#[test]
#[ignore = "takes long; prints times"]
fn a_large_town_takes_little_time() {
    for size in [100, 210] {
        let town = build(5, size, 0, 0.2);
        let mains = town.board.assets.mains.len();
        let start = Instant::now();
        let seen = town.board.infer();
        println!("{mains} mains, {} parts: {:?}", seen.map().parts.len(), start.elapsed());
    }
}
