//! The ground: a river in the south, a valley that rises gently from it, a hill in the north-west, a knoll in the west.

use super::plane::{Point, distance};

/// The middle of the hill.
pub const HILL: Point = [-520.0, 560.0];
/// The knoll that the service tank stands on.
pub const KNOLL: Point = [-1690.0, 60.0];

fn bump(place: Point, middle: Point, height: f64, width: f64) -> f64 {
    let off = distance(place, middle) / width;
    height * (-off * off).exp()
}

/// The river's bank at `x`: the town lies to the north of it.
pub fn river_y(x: f64) -> f64 {
    -860.0 + 110.0 * (x / 620.0).sin() + 45.0 * (x / 260.0 + 1.0).sin()
}

/// Ground level, m above the sea.
pub fn elevation(place: Point) -> f64 {
    let above_river = (place[1] - river_y(place[0])).max(0.0);
    let valley = 5.0 + 12.0 * (1.0 - (-above_river / 1100.0).exp());
    let ripple = 1.1 * (place[0] / 310.0).sin() * (place[1] / 270.0 + 0.7).cos();
    valley + ripple + bump(place, HILL, 41.0, 520.0) + bump(place, KNOLL, 44.0, 260.0)
}

/// Whether the town reaches here: an uneven outline, and nothing in the river.
pub fn in_town(place: Point) -> bool {
    if place[1] < river_y(place[0]) + 45.0 {
        return false;
    }
    let turn = place[1].atan2(place[0]);
    let outline = 1.0 + 0.10 * (3.0 * turn + 0.8).sin() + 0.07 * (5.0 * turn - 1.1).sin() + 0.04 * (9.0 * turn).cos();
    let (x, y) = (place[0] / 1480.0, (place[1] - 60.0) / 1090.0);
    (x * x + y * y).sqrt() < outline
}
