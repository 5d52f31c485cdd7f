//! Time on a large town; run by hand: `cargo test --lib large_town -- --ignored --nocapture`.

use std::time::Instant;

use super::draw::Board;
use super::town::{Plan, build};
use crate::assets::Drawing;

/// One town many times over, side by side.
fn tiled(times: usize) -> Board {
    let one = build(Plan::new(5, 14, 11, 0.2)).board;
    let mut board = Board::new(1.0);
    for tile in 0..times * times {
        let by = [(tile % times) as f64 * 3000.0, (tile / times) as f64 * 3000.0];
        for main in &one.assets.mains {
            let mut main = main.clone();
            main.origin.row = board.assets.mains.len() as u32;
            if let Drawing::Lines(parts) = &mut main.drawing {
                parts
                    .iter_mut()
                    .flatten()
                    .for_each(|p| *p = [p[0] + by[0], p[1] + by[1]]);
            }
            board.assets.mains.push(main);
        }
    }
    board
}

#[test]
#[ignore = "takes long; prints times"]
fn a_large_town_takes_little_time() {
    let times = std::env::var("TILES").ok().and_then(|n| n.parse().ok());
    for times in times.map_or(vec![4, 13], |n: usize| vec![n]) {
        let board = tiled(times);
        let start = Instant::now();
        let seen = board.infer();
        let (mains, parts) = (board.assets.mains.len(), seen.map().parts.len());
        println!("{mains} mains, {parts} parts: {:?}", start.elapsed());
    }
}
