//! What hangs together so far: spots where ends lie, places where something meets the middle of a line, and which spots
//! are one node. It grows as the cleaning steps join; nothing is ever taken apart again.

use petgraph::unionfind::UnionFind;

use super::JoinKind;
use super::geometry::distance_m;
use super::lines::{End, Lines};
use crate::assets::Point;

/// Something that meets a line between its ends.
#[derive(Clone, Copy, Debug)]
pub(super) struct Middle {
    /// The spot that meets it.
    pub spot: u32,
    /// The line that is met.
    pub line: u32,
    /// Where, m along it.
    pub s: f64,
    /// The place on the line.
    pub at: Point,
    /// How far the spot lies from it, m; for an overshoot the length of the tail.
    pub distance_m: f64,
    /// How it was found.
    pub kind: JoinKind,
    /// Whether the line ends here, its tail being left out: it then has one arm, not two.
    pub ends_here: bool,
}

/// A place on the network: a spot, or somewhere along a line.
#[derive(Clone, Copy, Debug)]
pub(super) enum Place {
    /// A spot.
    Spot(u32),
    /// A line and metres along it.
    On(u32, f64),
}

/// What a node's pressure zone is, from the mains that meet there.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub(super) enum Zone {
    /// No main there has a known zone.
    Unknown,
    /// The zone, as an index into `Assets::zones`.
    Known(u32),
    /// An open zone valve joins several.
    Several,
    /// Raw water: never joined with the rest.
    RawWater,
}

impl Zone {
    /// What the two make together; `None` if they are not to be joined.
    pub(super) fn with(self, other: Zone) -> Option<Zone> {
        match (self, other) {
            (a, b) if a == b => Some(a),
            (Zone::RawWater, _) | (_, Zone::RawWater) => None,
            (Zone::Unknown, known) | (known, Zone::Unknown) => Some(known),
            (Zone::Several, _) | (_, Zone::Several) => Some(Zone::Several),
            (Zone::Known(_), Zone::Known(_)) => None,
        }
    }
}

/// Spots, and which of them are one node.
#[derive(Debug)]
pub(super) struct Web {
    /// Where each spot lies.
    pub at: Vec<Point>,
    /// The spot of each end.
    pub spot_of_end: Vec<u32>,
    /// Where a line now ends before its drawn end, m along it: its tail is left out.
    pub trimmed: Vec<Option<f64>>,
    /// Everything that meets a line between its ends.
    pub middles: Vec<Middle>,
    ends_first: Vec<u32>,
    ends: Vec<End>,
    middles_of_spot: Vec<Vec<u32>>,
    middles_of_line: Vec<Vec<u32>>,
    classes: UnionFind<u32>,
    /// The spots of one class form a ring.
    next: Vec<u32>,
    zone: Vec<Zone>,
}

impl Web {
    /// Spots with their places and zones, and the spot of each end.
    pub(super) fn new(at: Vec<Point>, zone: Vec<Zone>, spot_of_end: Vec<u32>) -> Self {
        let spots = at.len();
        let mut ends_first = vec![0u32; spots + 1];
        for &spot in &spot_of_end {
            ends_first[spot as usize + 1] += 1;
        }
        for i in 0..spots {
            ends_first[i + 1] += ends_first[i];
        }
        let mut fill = ends_first.clone();
        let mut ends = vec![End(0); spot_of_end.len()];
        for (end, &spot) in spot_of_end.iter().enumerate() {
            ends[fill[spot as usize] as usize] = End(end as u32);
            fill[spot as usize] += 1;
        }
        Web {
            trimmed: vec![None; spot_of_end.len()],
            middles: Vec::new(),
            middles_of_spot: vec![Vec::new(); spots],
            middles_of_line: vec![Vec::new(); spot_of_end.len() / 2],
            classes: UnionFind::new(spots),
            next: (0..spots as u32).collect(),
            at,
            zone,
            spot_of_end,
            ends_first,
            ends,
        }
    }

    pub(super) fn spots(&self) -> u32 {
        self.at.len() as u32
    }

    /// A spot where no end lies.
    pub(super) fn new_spot(&mut self, at: Point) -> u32 {
        let spot = self.classes.new_set();
        self.at.push(at);
        self.zone.push(Zone::Unknown);
        self.next.push(spot);
        self.middles_of_spot.push(Vec::new());
        self.ends_first.push(self.ends.len() as u32);
        spot
    }

    /// The class of a spot: spots of one class are one node.
    pub(super) fn class(&self, spot: u32) -> u32 {
        self.classes.find(spot)
    }

    pub(super) fn same(&self, a: u32, b: u32) -> bool {
        self.class(a) == self.class(b)
    }

    /// The zone of a spot's class.
    pub(super) fn zone(&self, spot: u32) -> Zone {
        self.zone[self.class(spot) as usize]
    }

    /// The spots of a spot's class.
    pub(super) fn members(&self, spot: u32) -> impl Iterator<Item = u32> + '_ {
        let mut at = Some(spot);
        std::iter::from_fn(move || {
            let now = at?;
            at = Some(self.next[now as usize]).filter(|&next| next != spot);
            Some(now)
        })
    }

    /// The ends that lie on a spot, without those whose tail was left out.
    pub(super) fn ends(&self, spot: u32) -> impl Iterator<Item = End> + '_ {
        let range = self.ends_first[spot as usize] as usize..self.ends_first[spot as usize + 1] as usize;
        self.ends[range]
            .iter()
            .copied()
            .filter(|end| self.trimmed[end.at()].is_none())
    }

    /// What a spot meets between the ends of lines.
    pub(super) fn middles_of_spot(&self, spot: u32) -> impl Iterator<Item = &Middle> + '_ {
        self.middles_of_spot[spot as usize]
            .iter()
            .map(|&m| &self.middles[m as usize])
    }

    /// What meets a line between its ends, in no order.
    pub(super) fn middles_of_line(&self, line: u32) -> impl Iterator<Item = &Middle> + '_ {
        self.middles_of_line[line as usize]
            .iter()
            .map(|&m| &self.middles[m as usize])
    }

    /// How many ways lead away from the node of a spot.
    pub(super) fn arms(&self, spot: u32) -> usize {
        self.members(spot)
            .map(|spot| {
                let middles: usize = self
                    .middles_of_spot(spot)
                    .map(|m| if m.ends_here { 1 } else { 2 })
                    .sum();
                self.ends(spot).count() + middles
            })
            .sum()
    }

    /// Whether a single end lies at the node of a spot and meets nothing.
    pub(super) fn is_free(&self, spot: u32) -> bool {
        self.arms(spot) == 1
    }

    /// The lines that end at, or pass through, the node of a spot, each once.
    pub(super) fn lines_at(&self, spot: u32) -> Vec<u32> {
        let mut lines = Vec::new();
        for spot in self.members(spot) {
            lines.extend(self.ends(spot).map(End::line));
            lines.extend(self.middles_of_spot(spot).map(|m| m.line));
        }
        lines.sort_unstable();
        lines.dedup();
        lines
    }

    /// Makes two spots one node. `zone` is that of the whole.
    pub(super) fn unite(&mut self, a: u32, b: u32, zone: Zone) {
        if self.classes.union(a, b) {
            self.next.swap(a as usize, b as usize);
        }
        let class = self.class(a);
        self.zone[class as usize] = zone;
    }

    /// Lets a spot meet a line between its ends. Something that already meets the line there, to within `touch_m`, is
    /// the same node. `zone` is that of the whole.
    pub(super) fn attach(&mut self, middle: Middle, zone: Zone, touch_m: f64) {
        let there = self
            .middles_of_line(middle.line)
            .find(|other| (other.s - middle.s).abs() <= touch_m)
            .map(|other| other.spot);
        if let Some(spot) = there {
            let zone = self.zone(spot).with(zone).unwrap_or(Zone::Several);
            self.unite(middle.spot, spot, zone);
            return;
        }
        let index = self.middles.len() as u32;
        self.middles_of_spot[middle.spot as usize].push(index);
        self.middles_of_line[middle.line as usize].push(index);
        self.middles.push(middle);
        let class = self.class(middle.spot);
        self.zone[class as usize] = zone;
    }

    /// Lets a line end at something that meets it, and leaves out the tail beyond.
    pub(super) fn trim(&mut self, end: End, middle: u32) {
        let middle = &mut self.middles[middle as usize];
        middle.kind = JoinKind::Overshoot;
        middle.ends_here = true;
        self.trimmed[end.at()] = Some(middle.s);
    }

    /// Indices into [`Web::middles`] of what meets a line between its ends, in no order.
    pub(super) fn middle_indices(&self, line: u32) -> &[u32] {
        &self.middles_of_line[line as usize]
    }

    /// Every place on a line where something meets it, its ends among them: m along it, and the spot.
    pub(super) fn stops<'a>(&'a self, lines: &'a Lines, line: u32) -> impl Iterator<Item = (f64, u32)> + 'a {
        [End::new(line, false), End::new(line, true)]
            .into_iter()
            .filter(|end| self.trimmed[end.at()].is_none())
            .map(move |end| (lines.end_s(end), self.spot_of_end[end.at()]))
            .chain(self.middles_of_line(line).map(|m| (m.s, m.spot)))
    }

    /// The length of the shortest way along the network between two places, m, if it is no longer than `limit_m`.
    pub(super) fn way_m(&self, lines: &Lines, from: Place, to: Place, limit_m: f64) -> Option<f64> {
        let mut best = limit_m;
        let mut found = false;
        let mut reached: Vec<(f64, u32, bool)> = Vec::new();
        match (from, to) {
            (Place::Spot(a), Place::Spot(b)) if self.same(a, b) => return Some(0.0),
            (Place::On(a, s), Place::On(b, r)) if a == b && (s - r).abs() <= best => {
                best = (s - r).abs();
                found = true;
            }
            _ => {}
        }
        match from {
            Place::Spot(spot) => reached.push((0.0, self.class(spot), false)),
            Place::On(line, s) => {
                for (r, spot) in self.stops(lines, line) {
                    reach(&mut reached, (s - r).abs(), self.class(spot), best);
                }
            }
        }
        while let Some(i) = nearest_open(&reached) {
            reached[i].2 = true;
            let (so_far, class, _) = reached[i];
            if so_far > best {
                break;
            }
            if matches!(to, Place::Spot(b) if self.class(b) == class) {
                return Some(so_far);
            }
            for spot in self.members(class) {
                let ends = self.ends(spot).map(|end| (end.line(), lines.end_s(end)));
                for (line, s) in ends.chain(self.middles_of_spot(spot).map(|m| (m.line, m.s))) {
                    if let Place::On(wanted, r) = to
                        && wanted == line
                        && so_far + (s - r).abs() <= best
                    {
                        best = so_far + (s - r).abs();
                        found = true;
                    }
                    for (r, next) in self.stops(lines, line) {
                        reach(&mut reached, so_far + (s - r).abs(), self.class(next), best);
                    }
                }
            }
        }
        found.then_some(best)
    }

    /// Whether making one node of the two would keep it no wider than `tolerance_m`.
    pub(super) fn stays_narrow(&self, a: u32, b: u32, tolerance_m: f64) -> bool {
        self.members(a).all(|p| {
            self.members(b)
                .all(|q| distance_m(self.at[p as usize], self.at[q as usize]) <= tolerance_m)
        })
    }
}

fn reach(reached: &mut Vec<(f64, u32, bool)>, way_m: f64, class: u32, limit_m: f64) {
    if way_m > limit_m {
        return;
    }
    match reached.iter_mut().find(|(_, known, _)| *known == class) {
        Some(known) if way_m < known.0 => known.0 = way_m,
        Some(_) => {}
        None => reached.push((way_m, class, false)),
    }
}

fn nearest_open(reached: &[(f64, u32, bool)]) -> Option<usize> {
    (0..reached.len())
        .filter(|&i| !reached[i].2)
        .min_by(|&i, &j| reached[i].0.total_cmp(&reached[j].0))
}
