//! Plane geometry on points and polylines, in metres. Small, exact where it can be, and free of any rule of mapping.

use crate::assets::Point;

/// Distance between two places, m.
pub(super) fn distance_m(a: Point, b: Point) -> f64 {
    (a[0] - b[0]).hypot(a[1] - b[1])
}

/// Square of the distance between two places, m2.
pub(super) fn distance_2(a: Point, b: Point) -> f64 {
    let (dx, dy) = (a[0] - b[0], a[1] - b[1]);
    dx * dx + dy * dy
}

/// `b` as seen from `a`.
pub(super) fn from_to(a: Point, b: Point) -> Point {
    [b[0] - a[0], b[1] - a[1]]
}

/// Dot product.
pub(super) fn dot(u: Point, v: Point) -> f64 {
    u[0] * v[0] + u[1] * v[1]
}

/// Cross product.
pub(super) fn cross(u: Point, v: Point) -> f64 {
    u[0] * v[1] - u[1] * v[0]
}

/// The place a share `t` of the way from `a` to `b`.
pub(super) fn between(a: Point, b: Point, t: f64) -> Point {
    [a[0] + (b[0] - a[0]) * t, a[1] + (b[1] - a[1]) * t]
}

/// The vector of length 1 in the direction of `v`; zero for a vector without direction.
pub(super) fn unit(v: Point) -> Point {
    let length = v[0].hypot(v[1]);
    if length > 0.0 {
        [v[0] / length, v[1] / length]
    } else {
        [0.0, 0.0]
    }
}

/// The place on the segment `a`-`b` nearest to `p`, as a share of the way, and the square of its distance, m2.
pub(super) fn nearest_on_segment(a: Point, b: Point, p: Point) -> (f64, f64) {
    let along = from_to(a, b);
    let length_2 = dot(along, along);
    let t = if length_2 > 0.0 {
        (dot(from_to(a, p), along) / length_2).clamp(0.0, 1.0)
    } else {
        0.0
    };
    // A vertex is returned as itself, so that a place on a vertex has distance exactly zero.
    let place = if t == 1.0 { b } else { between(a, b, t) };
    (t, distance_2(place, p))
}

/// How two segments meet.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Meeting {
    /// In one place, given as shares of the way along the first and the second.
    At(f64, f64),
    /// They lie on one another over a length: shares of the way along the first where that begins and ends.
    Along(f64, f64),
}

/// Where two segments meet, if they do. Within `slack_m` counts as meeting, so that a vertex on a segment is found
/// whichever way rounding went.
pub(super) fn segments_meet(a: Point, b: Point, c: Point, d: Point, slack_m: f64) -> Option<Meeting> {
    let (u, v, w) = (from_to(a, b), from_to(c, d), from_to(a, c));
    let (length_u, length_v) = (dot(u, u).sqrt(), dot(v, v).sqrt());
    if length_u == 0.0 || length_v == 0.0 {
        return None;
    }
    let turn = cross(u, v);
    // Lines whose direction differs by less than the slack over the shorter one are taken as parallel.
    if turn.abs() <= slack_m * length_u.max(length_v) {
        return along_each_other(a, u, length_u, c, d, slack_m);
    }
    let (t, s) = (cross(w, v) / turn, cross(w, u) / turn);
    let (slack_t, slack_s) = (slack_m / length_u, slack_m / length_v);
    let inside = |share: f64, slack: f64| (-slack..=1.0 + slack).contains(&share);
    (inside(t, slack_t) && inside(s, slack_s)).then(|| Meeting::At(t.clamp(0.0, 1.0), s.clamp(0.0, 1.0)))
}

fn along_each_other(a: Point, u: Point, length_u: f64, c: Point, d: Point, slack_m: f64) -> Option<Meeting> {
    let off = |p: Point| (cross(u, from_to(a, p)) / length_u).abs();
    if off(c) > slack_m || off(d) > slack_m {
        return None;
    }
    let share = |p: Point| dot(u, from_to(a, p)) / (length_u * length_u);
    let (mut first, mut last) = (share(c), share(d));
    if first > last {
        std::mem::swap(&mut first, &mut last);
    }
    let (first, last) = (first.max(0.0), last.min(1.0));
    (last * length_u - first * length_u > slack_m).then_some(Meeting::Along(first, last))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_nearest_place_on_a_segment_is_a_vertex_beyond_its_ends() {
        assert_eq!(nearest_on_segment([0.0, 0.0], [10.0, 0.0], [-3.0, 4.0]), (0.0, 25.0));
        assert_eq!(nearest_on_segment([0.0, 0.0], [10.0, 0.0], [13.0, 4.0]), (1.0, 25.0));
        assert_eq!(nearest_on_segment([0.0, 0.0], [10.0, 0.0], [5.0, 2.0]), (0.5, 4.0));
        assert_eq!(nearest_on_segment([1.0, 1.0], [1.0, 1.0], [4.0, 5.0]), (0.0, 25.0));
    }

    #[test]
    fn segments_meet_where_they_cross_touch_or_lie_on_one_another() {
        let meet = |a, b, c, d| segments_meet(a, b, c, d, 0.001);
        assert_eq!(
            meet([0.0, 0.0], [10.0, 0.0], [5.0, -5.0], [5.0, 5.0]),
            Some(Meeting::At(0.5, 0.5))
        );
        assert_eq!(meet([0.0, 0.0], [10.0, 0.0], [5.0, 1.0], [5.0, 5.0]), None);
        assert!(matches!(
            meet([0.0, 0.0], [10.0, 0.0], [5.0, 0.0005], [5.0, 5.0]),
            Some(Meeting::At(..))
        ));
        assert_eq!(
            meet([0.0, 0.0], [10.0, 0.0], [5.0, 0.0], [20.0, 0.0]),
            Some(Meeting::Along(0.5, 1.0))
        );
        assert_eq!(meet([0.0, 0.0], [10.0, 0.0], [0.0, 0.5], [10.0, 0.5]), None);
        assert_eq!(meet([0.0, 0.0], [10.0, 0.0], [10.0, 0.0], [20.0, 0.0]), None);
    }
}
