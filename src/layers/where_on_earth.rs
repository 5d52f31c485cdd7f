//! What a layer's coordinates look like, for files that do not say which reference system they are in.

use super::packed::Packed;

/// What coordinates look like.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Guess {
    /// There are none that are finite.
    Unknown,
    /// Longitude and latitude in degrees.
    Degrees,
    /// Degrees, but latitude first.
    Swapped,
    /// Lengths in a plane.
    Plane,
}

/// Says what most vertices look like; a few stray ones do not count.
pub(super) fn guess(packed: &Packed) -> Guess {
    let (mut finite, mut degrees, mut swapped) = (0_usize, 0_usize, 0_usize);
    for &[x, y] in packed.all_vertices() {
        if x.is_finite() && y.is_finite() {
            finite += 1;
            degrees += usize::from(x.abs() <= 360.0 && y.abs() <= 90.0);
            swapped += usize::from(x.abs() <= 90.0 && y.abs() > 90.0 && y.abs() <= 180.0);
        }
    }
    if finite == 0 {
        Guess::Unknown
    } else if 2 * degrees >= finite {
        Guess::Degrees
    } else if 2 * swapped >= finite {
        Guess::Swapped
    } else {
        Guess::Plane
    }
}

/// Whether the map would be small if its coordinates were degrees: a town in metres can lie within 180 by 90, but hardly
/// within five.
pub(super) fn spans_few_degrees(packed: &Packed) -> bool {
    packed
        .bounds()
        .is_some_and(|[min_x, min_y, max_x, max_y]| max_x - min_x < 5.0 && max_y - min_y < 5.0)
}
