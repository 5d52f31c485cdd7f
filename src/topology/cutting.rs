//! Cutting: from classes of spots to numbered nodes, from lines to parts between them.

use super::cleaning::Work;
use super::geometry::{distance_2, distance_m};
use super::lines::Hit;
use super::{MapNode, MapPart};
use crate::assets::Point;

/// A place where a line is cut. The two nodes differ where a closed valve stands.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Stop {
    /// m along the line.
    pub s: f64,
    /// The node on the side of the line's start.
    pub before: u32,
    /// The node on the side of the line's end.
    pub after: u32,
}

/// The cuts of every line, rising along it.
#[derive(Debug, Default)]
pub(super) struct Cuts {
    /// By line.
    pub stops: Vec<Vec<Stop>>,
    /// Ways that lead away from each node.
    pub arms: Vec<u32>,
}

/// Numbers the nodes along the lines and sets down every line's stops. Counts the nodes.
pub(super) fn number_nodes(work: &mut Work) -> u32 {
    unite_what_coincides(work);
    let mut node_of_class: Vec<u32> = vec![u32::MAX; work.web.spots() as usize];
    let mut stops: Vec<Vec<Stop>> = Vec::with_capacity(work.lines.len());
    let mut on_line: Vec<(f64, u32)> = Vec::new();
    for line in 0..work.lines.len() as u32 {
        on_line.clear();
        on_line.extend(work.web.stops(&work.lines, line));
        on_line.sort_by(|a, b| a.0.total_cmp(&b.0));
        let mut of_line: Vec<Stop> = Vec::with_capacity(on_line.len());
        for &(s, spot) in &on_line {
            let class = work.web.class(spot) as usize;
            if node_of_class[class] == u32::MAX {
                node_of_class[class] = work.map.nodes.len() as u32;
                work.map.nodes.push(MapNode {
                    at: place_of(work, spot),
                    points: Vec::new(),
                });
            }
            let node = node_of_class[class];
            let coincides = of_line
                .last()
                .is_some_and(|last| s - last.s <= work.settings.touch_m && last.after == node);
            if !coincides {
                of_line.push(Stop {
                    s,
                    before: node,
                    after: node,
                });
            }
        }
        stops.push(of_line);
    }
    work.cuts.arms = vec![0; work.map.nodes.len()];
    for of_line in &stops {
        for (i, stop) in of_line.iter().enumerate() {
            work.cuts.arms[stop.before as usize] += u32::from(i > 0);
            work.cuts.arms[stop.after as usize] += u32::from(i + 1 < of_line.len());
        }
    }
    work.cuts.stops = stops;
    work.map.nodes.len() as u32
}

/// Two things that meet a line on one spot are one node there, even when they were joined to it one by one.
fn unite_what_coincides(work: &mut Work) {
    let mut on_line: Vec<(f64, u32)> = Vec::new();
    for line in 0..work.lines.len() as u32 {
        if work.web.middle_indices(line).is_empty() {
            continue;
        }
        on_line.clear();
        on_line.extend(work.web.stops(&work.lines, line));
        on_line.sort_by(|a, b| a.0.total_cmp(&b.0));
        for pair in on_line.windows(2) {
            let ((s, a), (r, b)) = (pair[0], pair[1]);
            if r - s <= work.settings.touch_m && !work.web.same(a, b) {
                let zone = work.web.zone(a).with(work.web.zone(b)).unwrap_or(work.web.zone(a));
                work.web.unite(a, b, zone);
            }
        }
    }
}

/// Where a node lies: where most ways meet, on a point feature before an empty place.
fn place_of(work: &Work, spot: u32) -> Point {
    let mut places: Vec<(usize, Point)> = Vec::new();
    let mut add = |weight: usize, at: Point| match places.iter_mut().find(|(_, known)| *known == at) {
        Some((known, _)) => *known += weight,
        None => places.push((weight, at)),
    };
    for member in work.web.members(spot) {
        let ends = work.web.ends(member).count();
        if ends > 0 {
            add(ends, work.web.at[member as usize]);
        }
        for middle in work.web.middles_of_spot(member) {
            let weight = if middle.ends_here { 1 } else { 2 };
            let touches = middle.distance_m <= work.settings.touch_m && ends > 0;
            add(
                weight,
                if touches {
                    work.web.at[member as usize]
                } else {
                    middle.at
                },
            );
        }
    }
    if places.len() == 1 {
        return places[0].1;
    }
    let marked = |at: Point| work.marks.near(at, work.settings.touch_m).next().is_some();
    places
        .into_iter()
        .map(|(weight, at)| (weight, marked(at), at))
        .max_by(|a, b| {
            (a.0, a.1)
                .cmp(&(b.0, b.1))
                .then(b.2[0].total_cmp(&a.2[0]))
                .then(b.2[1].total_cmp(&a.2[1]))
        })
        .map_or(work.web.at[spot as usize], |best| best.2)
}

impl Work<'_> {
    /// The lines within reach of a place, each once with its nearest place, the nearest first.
    pub(super) fn lines_near(&self, p: Point, within_m: f64) -> Vec<Hit> {
        let mut hits: Vec<Hit> = self
            .index
            .locate_within_distance(p, within_m * within_m)
            .map(|stretch| self.lines.hit(stretch, p))
            .collect();
        hits.sort_by(|a, b| {
            (a.line.cmp(&b.line))
                .then(a.distance_m.total_cmp(&b.distance_m))
                .then(a.s.total_cmp(&b.s))
        });
        hits.dedup_by_key(|hit| hit.line);
        // A tail that was left out belongs to the stop before it.
        hits.retain_mut(|hit| match &self.cuts.stops[hit.line as usize][..] {
            [first, .., last] => {
                let s = hit.s.clamp(first.s, last.s);
                if s != hit.s {
                    hit.s = s;
                    hit.distance_m = distance_m(p, self.lines.place(hit.line, s));
                }
                true
            }
            _ => false,
        });
        hits.sort_by(|a, b| {
            (a.distance_m.total_cmp(&b.distance_m)).then(self.lines.rank(a.line).cmp(&self.lines.rank(b.line)))
        });
        hits
    }

    /// The stop of a line nearest, along it, to a place on it: its index, and how far, m.
    pub(super) fn nearest_stop(&self, line: u32, s: f64) -> (usize, f64) {
        let stops = &self.cuts.stops[line as usize];
        let after = stops.partition_point(|stop| stop.s < s);
        let candidates = [after.checked_sub(1), (after < stops.len()).then_some(after)];
        candidates
            .into_iter()
            .flatten()
            .map(|i| (i, (stops[i].s - s).abs()))
            .min_by(|a, b| a.1.total_cmp(&b.1))
            .expect("a line that is near has stops")
    }

    /// The node at a place on a line; the line is cut there unless a node is within the slack. At a closed valve it is
    /// the node on the side where `p` lies.
    pub(super) fn node_at(&mut self, line: u32, s: f64) -> u32 {
        let (near, off) = self.nearest_stop(line, s);
        if off <= self.settings.touch_m {
            let stop = self.cuts.stops[line as usize][near];
            return if s <= stop.s { stop.before } else { stop.after };
        }
        let node = self.new_node(self.lines.place(line, s));
        self.cuts.arms[node as usize] = 2;
        self.insert_stop(
            line,
            Stop {
                s,
                before: node,
                after: node,
            },
        );
        node
    }

    /// A node that nothing meets yet.
    pub(super) fn new_node(&mut self, at: Point) -> u32 {
        self.map.nodes.push(MapNode { at, points: Vec::new() });
        self.cuts.arms.push(0);
        self.map.nodes.len() as u32 - 1
    }

    pub(super) fn insert_stop(&mut self, line: u32, stop: Stop) {
        let stops = &mut self.cuts.stops[line as usize];
        let place = stops.partition_point(|other| other.s < stop.s);
        stops.insert(place, stop);
    }
}

/// Cuts the lines into parts between their stops. A part that would end where it starts is cut at its middle, or left out
/// when it is shorter than the tolerance. Counts the parts.
pub(super) fn cut(work: &mut Work) -> u32 {
    let mut parts = Vec::with_capacity(work.lines.len());
    for line in 0..work.lines.len() as u32 {
        let mut loops = Vec::new();
        for pair in work.cuts.stops[line as usize].windows(2) {
            if pair[0].after == pair[1].before && pair[1].s - pair[0].s > work.settings.tolerance_m {
                loops.push((pair[0].s + pair[1].s) / 2.0);
            }
        }
        for s in loops {
            work.node_at(line, s);
        }
        for pair in work.cuts.stops[line as usize].windows(2) {
            if pair[0].after != pair[1].before && pair[1].s > pair[0].s {
                parts.push(MapPart {
                    main: work.lines.main(line),
                    line,
                    from: pair[0].after,
                    to: pair[1].before,
                    start_m: pair[0].s,
                    end_m: pair[1].s,
                });
            }
        }
    }
    work.map.parts = parts;
    work.map.parts.len() as u32
}

/// Whether two places are one, to within `within_m`.
pub(super) fn one_place(a: Point, b: Point, within_m: f64) -> bool {
    distance_2(a, b) <= within_m * within_m
}
