//! Plane geometry for drawing the town, m.

/// A place: x to the east, y to the north, m.
pub type Point = [f64; 2];

pub fn add(a: Point, b: Point) -> Point {
    [a[0] + b[0], a[1] + b[1]]
}

pub fn sub(a: Point, b: Point) -> Point {
    [a[0] - b[0], a[1] - b[1]]
}

pub fn scale(a: Point, by: f64) -> Point {
    [a[0] * by, a[1] * by]
}

pub fn dot(a: Point, b: Point) -> f64 {
    a[0] * b[0] + a[1] * b[1]
}

pub fn cross(a: Point, b: Point) -> f64 {
    a[0] * b[1] - a[1] * b[0]
}

pub fn norm(a: Point) -> f64 {
    dot(a, a).sqrt()
}

pub fn distance(a: Point, b: Point) -> f64 {
    norm(sub(a, b))
}

/// The direction from `a` to `b`, of length 1.
pub fn direction(a: Point, b: Point) -> Point {
    scale(sub(b, a), 1.0 / distance(a, b))
}

/// A direction turned left by a right angle.
pub fn left(a: Point) -> Point {
    [-a[1], a[0]]
}

pub fn length(line: &[Point]) -> f64 {
    line.windows(2).map(|pair| distance(pair[0], pair[1])).sum()
}

/// The nearest place on a line.
#[derive(Clone, Copy)]
pub struct Nearest {
    /// Distance to it, m.
    pub distance: f64,
    /// Where it lies along the line, m from its start.
    pub along: f64,
}

pub fn nearest_on(line: &[Point], place: Point) -> Nearest {
    let mut best = Nearest {
        distance: f64::INFINITY,
        along: 0.0,
    };
    let mut start = 0.0;
    for pair in line.windows(2) {
        let run = sub(pair[1], pair[0]);
        let share = (dot(sub(place, pair[0]), run) / dot(run, run)).clamp(0.0, 1.0);
        let at = add(pair[0], scale(run, share));
        let far = distance(at, place);
        if far < best.distance {
            best = Nearest {
                distance: far,
                along: start + share * norm(run),
            };
        }
        start += norm(run);
    }
    best
}

/// The place `along` metres from the start of a line, and the line's direction there.
pub fn place_along(line: &[Point], along: f64) -> (Point, Point) {
    let mut left_over = along;
    for pair in line.windows(2) {
        let run = distance(pair[0], pair[1]);
        let ahead = direction(pair[0], pair[1]);
        if left_over <= run {
            return (add(pair[0], scale(ahead, left_over)), ahead);
        }
        left_over -= run;
    }
    let last = line.len() - 1;
    (line[last], direction(line[last - 1], line[last]))
}

/// The piece of a line between two distances from its start.
pub fn piece(line: &[Point], from: f64, to: f64) -> Vec<Point> {
    let mut kept = vec![place_along(line, from).0];
    let mut start = 0.0;
    for pair in line.windows(2) {
        start += distance(pair[0], pair[1]);
        if start > from + 1e-6 && start < to - 1e-6 {
            kept.push(pair[1]);
        }
    }
    kept.push(place_along(line, to).0);
    kept
}

/// Where two segments cross: the shares of the first and of the second, if they do.
pub fn crossing(a: [Point; 2], b: [Point; 2]) -> Option<(f64, f64)> {
    let (run_a, run_b) = (sub(a[1], a[0]), sub(b[1], b[0]));
    let turn = cross(run_a, run_b);
    if turn.abs() < 1e-9 {
        return None;
    }
    let gap = sub(b[0], a[0]);
    let (share_a, share_b) = (cross(gap, run_b) / turn, cross(gap, run_a) / turn);
    ((0.0..=1.0).contains(&share_a) && (0.0..=1.0).contains(&share_b)).then_some((share_a, share_b))
}

/// The same line with fewer vertices, none farther than `slack` from it (Douglas and Peucker 1973).
pub fn simplify(line: &[Point], slack: f64) -> Vec<Point> {
    if line.len() < 3 {
        return line.to_vec();
    }
    let chord = [line[0], line[line.len() - 1]];
    let (mut far, mut at) = (0.0, 0);
    for (index, place) in line.iter().enumerate().take(line.len() - 1).skip(1) {
        let off = if distance(chord[0], chord[1]) < 1e-9 {
            distance(chord[0], *place)
        } else {
            nearest_on(&chord, *place).distance
        };
        if off > far {
            (far, at) = (off, index);
        }
    }
    if far <= slack {
        return chord.to_vec();
    }
    let mut kept = simplify(&line[..=at], slack);
    kept.pop();
    kept.extend(simplify(&line[at..], slack));
    kept
}
