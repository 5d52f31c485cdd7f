//! The cleaned lines with what is measured on them: lengths along, places, directions, and the index that finds them.

use rstar::{AABB, PointDistance, RTree, RTreeObject};

use super::CleanLine;
use super::geometry::{between, distance_m, from_to, nearest_on_segment, unit};
use crate::assets::Point;

/// One end of one line: twice the line's index, plus one for its last vertex.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub(super) struct End(pub u32);

impl End {
    /// The end of `line` at its first vertex, or at its last.
    pub(super) fn new(line: u32, last: bool) -> Self {
        End(line * 2 + u32::from(last))
    }

    /// Its line.
    pub(super) fn line(self) -> u32 {
        self.0 / 2
    }

    /// Whether it is at the last vertex.
    pub(super) fn is_last(self) -> bool {
        self.0 % 2 == 1
    }

    /// The other end of its line.
    pub(super) fn other(self) -> Self {
        End(self.0 ^ 1)
    }

    /// As an array index.
    pub(super) fn at(self) -> usize {
        self.0 as usize
    }
}

/// A line near a place: where on it the nearest point lies, and how far off.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Hit {
    /// The line.
    pub line: u32,
    /// Where, m along it.
    pub s: f64,
    /// How far off, m.
    pub distance_m: f64,
}

/// A segment of a line, as the index holds it.
#[derive(Clone, Copy, Debug)]
pub(super) struct Stretch {
    pub a: Point,
    pub b: Point,
    pub line: u32,
    pub index: u32,
}

impl RTreeObject for Stretch {
    type Envelope = AABB<[f64; 2]>;

    fn envelope(&self) -> Self::Envelope {
        AABB::from_corners(self.a, self.b)
    }
}

impl PointDistance for Stretch {
    fn distance_2(&self, point: &[f64; 2]) -> f64 {
        nearest_on_segment(self.a, self.b, *point).1
    }
}

/// The cleaned lines, measured.
#[derive(Debug, Default)]
pub(super) struct Lines {
    /// In the order of the mains.
    pub list: Vec<CleanLine>,
    /// Where each line's vertices start in `along_m`.
    first: Vec<u32>,
    /// Distance along its line of every vertex, m.
    along_m: Vec<f64>,
    /// A number for each line that depends on its geometry and not on its row: what breaks ties.
    rank: Vec<u32>,
}

impl Lines {
    /// Measures lines that will not change any more.
    pub(super) fn new(list: Vec<CleanLine>) -> Self {
        let mut lines = Lines {
            first: Vec::with_capacity(list.len() + 1),
            ..Lines::default()
        };
        for line in &list {
            lines.first.push(lines.along_m.len() as u32);
            let mut along = 0.0;
            lines.along_m.push(0.0);
            for pair in line.vertices.windows(2) {
                along += distance_m(pair[0], pair[1]);
                lines.along_m.push(along);
            }
        }
        lines.first.push(lines.along_m.len() as u32);
        lines.rank = ranks(&list);
        lines.list = list;
        lines
    }

    pub(super) fn len(&self) -> usize {
        self.list.len()
    }

    pub(super) fn vertices(&self, line: u32) -> &[Point] {
        &self.list[line as usize].vertices
    }

    /// Distance along the line of each of its vertices, m.
    pub(super) fn along_m(&self, line: u32) -> &[f64] {
        &self.along_m[self.first[line as usize] as usize..self.first[line as usize + 1] as usize]
    }

    pub(super) fn length_m(&self, line: u32) -> f64 {
        self.list[line as usize].length_m
    }

    pub(super) fn main(&self, line: u32) -> u32 {
        self.list[line as usize].main
    }

    /// What breaks ties between lines, whatever rows they stand in.
    pub(super) fn rank(&self, line: u32) -> u32 {
        self.rank[line as usize]
    }

    pub(super) fn end_at(&self, end: End) -> Point {
        let vertices = self.vertices(end.line());
        if end.is_last() {
            vertices[vertices.len() - 1]
        } else {
            vertices[0]
        }
    }

    /// Where an end is along its line, m.
    pub(super) fn end_s(&self, end: End) -> f64 {
        if end.is_last() { self.length_m(end.line()) } else { 0.0 }
    }

    /// How far an end is from a place on its own line, m along it.
    pub(super) fn to_end_m(&self, end: End, s: f64) -> f64 {
        (self.end_s(end) - s).abs()
    }

    /// The place `s` metres along a line.
    pub(super) fn place(&self, line: u32, s: f64) -> Point {
        let (vertices, along) = (self.vertices(line), self.along_m(line));
        let after = along.partition_point(|&a| a <= s).clamp(1, vertices.len() - 1);
        let length = along[after] - along[after - 1];
        let t = ((s - along[after - 1]) / length).clamp(0.0, 1.0);
        if t == 1.0 {
            vertices[after]
        } else {
            between(vertices[after - 1], vertices[after], t)
        }
    }

    /// The direction a line runs in at `s`, looking a little to both sides.
    pub(super) fn direction(&self, line: u32, s: f64) -> Point {
        const LOOK_M: f64 = 1.0;
        let length = self.length_m(line);
        let look = LOOK_M.min(length / 2.0);
        unit(from_to(
            self.place(line, (s - look).max(0.0)),
            self.place(line, (s + look).min(length)),
        ))
    }

    /// The direction a line is heading in as it comes to its end. One short last segment does not decide it.
    pub(super) fn heading(&self, end: End) -> Point {
        const LOOK_M: f64 = 2.0;
        let length = self.length_m(end.line());
        let back = LOOK_M.min(length);
        let from = if end.is_last() { length - back } else { back };
        unit(from_to(self.place(end.line(), from), self.end_at(end)))
    }

    /// The place on a line nearest to `p`.
    pub(super) fn nearest(&self, line: u32, p: Point) -> Hit {
        self.nearest_in(line, p, f64::NEG_INFINITY, f64::INFINITY)
            .expect("a line has a segment")
    }

    /// The place on a line nearest to `p`, among the segments that reach between `from` and `to` along it.
    pub(super) fn nearest_in(&self, line: u32, p: Point, from: f64, to: f64) -> Option<Hit> {
        let (vertices, along) = (self.vertices(line), self.along_m(line));
        let mut best: Option<(f64, f64)> = None;
        for i in 0..vertices.len() - 1 {
            if along[i + 1] < from || along[i] > to {
                continue;
            }
            let (t, d_2) = nearest_on_segment(vertices[i], vertices[i + 1], p);
            if best.is_none_or(|(_, d)| d_2 < d) {
                best = Some((along[i] + t * (along[i + 1] - along[i]), d_2));
            }
        }
        best.map(|(s, d_2)| Hit {
            line,
            s,
            distance_m: d_2.sqrt(),
        })
    }

    /// The hit of a place on a stretch.
    pub(super) fn hit(&self, stretch: &Stretch, p: Point) -> Hit {
        let (t, d_2) = nearest_on_segment(stretch.a, stretch.b, p);
        let along = self.along_m(stretch.line);
        let i = stretch.index as usize;
        Hit {
            line: stretch.line,
            s: along[i] + t * (along[i + 1] - along[i]),
            distance_m: d_2.sqrt(),
        }
    }

    /// An index over all segments.
    pub(super) fn index(&self) -> RTree<Stretch> {
        let mut all = Vec::with_capacity(self.along_m.len() - self.list.len().min(self.along_m.len()));
        for (line, clean) in self.list.iter().enumerate() {
            all.extend(clean.vertices.windows(2).enumerate().map(|(index, pair)| Stretch {
                a: pair[0],
                b: pair[1],
                line: line as u32,
                index: index as u32,
            }));
        }
        RTree::bulk_load(all)
    }
}

/// The geometry of a line read from the end that sorts first, for comparing lines whatever way they are drawn.
fn key(line: &CleanLine) -> (Point, Point, f64) {
    let (a, b) = (line.vertices[0], line.vertices[line.vertices.len() - 1]);
    let (a, b) = if (a[0], a[1]) <= (b[0], b[1]) { (a, b) } else { (b, a) };
    (a, b, line.length_m)
}

fn ranks(list: &[CleanLine]) -> Vec<u32> {
    let mut order: Vec<u32> = (0..list.len() as u32).collect();
    let keys: Vec<[f64; 5]> = list
        .iter()
        .map(|line| {
            let (a, b, length) = key(line);
            [a[0], a[1], b[0], b[1], length]
        })
        .collect();
    order.sort_by(|&i, &j| {
        let (a, b) = (&keys[i as usize], &keys[j as usize]);
        a.iter()
            .zip(b)
            .map(|(x, y)| x.total_cmp(y))
            .find(|o| o.is_ne())
            .unwrap_or(i.cmp(&j))
    });
    let mut rank = vec![0; list.len()];
    for (place, &line) in order.iter().enumerate() {
        rank[line as usize] = place as u32;
    }
    rank
}
