//! Mains that lie on one another: identical, drawn the other way round, or nearly identical.
//!
//! Two lines are nearly identical when every vertex of each lies within the tolerance, and within a quarter of the shorter
//! one's length, of the other, and their ends pair up alike. That alone would also take two mains laid side by side in
//! one street: so where two paired ends lie apart, one of them must be loose, with no other main ending on it. A copy
//! that slipped is loose; a real main goes on.
//!
//! One of the two is calculated. When they agree in diameter, year and zone (an unknown one contradicts nothing) it is the
//! one that is tied in better, else the earlier row. When they differ it is the smaller, of two of one size the one whose
//! zone is that of the mains around its ends, and the finding is serious.

use std::collections::{HashMap, HashSet};

use petgraph::unionfind::UnionFind;
use rstar::RTree;
use rstar::primitives::{GeomWithData, Line};

use super::CleanLine;
use super::cleaning::Work;
use super::geometry::{between, distance_m, nearest_on_segment};
use crate::assets::{Main, Point};
use crate::finding::{Code, Finding, Sentence};
use crate::units::Quantity;

/// How far apart a shorter main and its copy may lie, as a share of its length.
const SHARE_OF_LENGTH: f64 = 0.25;

/// Leaves out all but one of every set of lines that lie on one another. Counts the lines left out.
pub(super) fn leave_out(work: &mut Work) -> u32 {
    let ends = Ends::new(&work.drawn);
    let pairs = pairs(work, &ends);
    if pairs.is_empty() {
        return 0;
    }
    let mut sets: UnionFind<u32> = UnionFind::new(work.drawn.len());
    for &(a, b) in &pairs {
        sets.union(a, b);
    }
    let mut members: HashMap<u32, Vec<u32>> = HashMap::new();
    for line in pairs.iter().flat_map(|&(a, b)| [a, b]) {
        let set = members.entry(sets.find(line)).or_default();
        if !set.contains(&line) {
            set.push(line);
        }
    }
    let mut members: Vec<Vec<u32>> = members.into_values().collect();
    members.iter_mut().for_each(|set| set.sort_unstable());
    members.sort_unstable();
    let mut left_out = vec![false; work.drawn.len()];
    let around = ZonesAround::of(work, members.iter().flatten().copied());
    for set in &members {
        let kept = kept(work, &ends, &around, set);
        for &line in set.iter().filter(|&&line| line != kept) {
            left_out[line as usize] = true;
            say(work, line, kept);
        }
    }
    let mut index = 0;
    work.drawn.retain(|_| {
        index += 1;
        !left_out[index - 1]
    });
    left_out.iter().filter(|out| **out).count() as u32
}

/// How many mains of its own zone lie at the ends of each line that has a copy.
struct ZonesAround(HashMap<u32, usize>);

impl ZonesAround {
    fn of(work: &Work, lines: impl Iterator<Item = u32>) -> Self {
        let zone = |line: u32| work.assets.mains[work.drawn[line as usize].main as usize].zone;
        let zoned: Vec<u32> = lines.filter(|&line| zone(line).is_some()).collect();
        if zoned.is_empty() {
            return ZonesAround(HashMap::new());
        }
        let segments = work.drawn.iter().enumerate().flat_map(|(line, drawn)| {
            let pairs = drawn.vertices.windows(2);
            pairs.map(move |pair| GeomWithData::new(Line::new(pair[0], pair[1]), line as u32))
        });
        let tree = RTree::bulk_load(segments.collect());
        let reach_m = work.settings.tolerance_m.max(work.settings.touch_m);
        let alike = |line: u32| {
            let near = [first(&work.drawn[line as usize]), last(&work.drawn[line as usize])]
                .into_iter()
                .flat_map(|end| tree.locate_within_distance(end, reach_m * reach_m))
                .map(|found| found.data);
            let of_zone: HashSet<u32> = near.filter(|&other| zone(other) == zone(line)).collect();
            of_zone.len()
        };
        ZonesAround(zoned.into_iter().map(|line| (line, alike(line))).collect())
    }

    fn alike(&self, line: u32) -> usize {
        self.0.get(&line).copied().unwrap_or(0)
    }
}

/// How many lines end at each place.
struct Ends(HashMap<[u64; 2], u32>);

impl Ends {
    fn new(drawn: &[CleanLine]) -> Self {
        let mut ends = HashMap::with_capacity(drawn.len() * 2);
        for line in drawn {
            for end in [first(line), last(line)] {
                *ends.entry(bits(end)).or_insert(0) += 1;
            }
        }
        Ends(ends)
    }

    /// Whether no other line ends at this end of a line.
    fn loose(&self, end: Point) -> bool {
        self.0.get(&bits(end)).is_none_or(|&count| count <= 1)
    }

    /// How well the two ends of a line are tied in.
    fn tied_in(&self, line: &CleanLine) -> usize {
        [first(line), last(line)]
            .into_iter()
            .filter(|&end| !self.loose(end))
            .count()
    }
}

fn bits(p: Point) -> [u64; 2] {
    [p[0].to_bits(), p[1].to_bits()]
}

fn first(line: &CleanLine) -> Point {
    line.vertices[0]
}

fn last(line: &CleanLine) -> Point {
    line.vertices[line.vertices.len() - 1]
}

/// Pairs of lines that lie on one another. Copies have the middles between their ends near each other.
fn pairs(work: &Work, ends: &Ends) -> Vec<(u32, u32)> {
    let reach_m = work.settings.tolerance_m.max(work.settings.touch_m);
    let middle = |line: &CleanLine| between(first(line), last(line), 0.5);
    let points = work.drawn.iter().enumerate();
    let tree = RTree::bulk_load(
        points
            .map(|(index, line)| GeomWithData::new(middle(line), index as u32))
            .collect::<Vec<_>>(),
    );
    let mut pairs = Vec::new();
    for (a, line) in work.drawn.iter().enumerate() {
        for found in tree.locate_within_distance(middle(line), reach_m * reach_m) {
            if found.data > a as u32 && alike(work, ends, line, &work.drawn[found.data as usize]) {
                pairs.push((a as u32, found.data));
            }
        }
    }
    pairs
}

fn alike(work: &Work, ends: &Ends, a: &CleanLine, b: &CleanLine) -> bool {
    let touch_m = work.settings.touch_m;
    let shorter_m = a.length_m.min(b.length_m);
    let within_m = work.settings.tolerance_m.min(SHARE_OF_LENGTH * shorter_m).max(touch_m);
    let straight = [(first(a), first(b)), (last(a), last(b))];
    let reversed = [(first(a), last(b)), (last(a), first(b))];
    let paired = |pairs: [(Point, Point); 2]| {
        pairs.iter().all(|&(p, q)| {
            let apart = distance_m(p, q);
            apart <= touch_m || (apart <= within_m && (ends.loose(p) || ends.loose(q)))
        })
    };
    (paired(straight) || paired(reversed)) && lies_on(a, b, within_m) && lies_on(b, a, within_m)
}

/// Whether every vertex of a line lies near another.
fn lies_on(line: &CleanLine, other: &CleanLine, within_m: f64) -> bool {
    line.vertices.iter().all(|&p| {
        let mut segments = other.vertices.windows(2);
        segments.any(|pair| nearest_on_segment(pair[0], pair[1], p).1 <= within_m * within_m)
    })
}

/// Which of a set is calculated.
fn kept(work: &Work, ends: &Ends, around: &ZonesAround, set: &[u32]) -> u32 {
    let main = |line: u32| &work.assets.mains[work.drawn[line as usize].main as usize];
    let zone = |line: u32| main(line).zone.and_then(|zone| work.assets.zones.get(zone as usize));
    let by = |&a: &u32, &b: &u32| {
        let diameter = |line: u32| main(line).diameter_m.map_or(f64::INFINITY, |d| d.value);
        let tied_in = |line: u32| ends.tied_in(&work.drawn[line as usize]);
        (diameter(a).total_cmp(&diameter(b)))
            .then(tied_in(b).cmp(&tied_in(a)))
            .then(around.alike(b).cmp(&around.alike(a)))
            .then(main(b).year.cmp(&main(a).year))
            .then(zone(b).cmp(&zone(a)))
            .then(a.cmp(&b))
    };
    set.iter().copied().min_by(by).expect("a set has members")
}

/// What two mains on one another differ in.
fn differ_in(a: &Main, b: &Main) -> Vec<&'static str> {
    let mut what = Vec::new();
    let differ = |a: Option<f64>, b: Option<f64>| matches!((a, b), (Some(a), Some(b)) if (a - b).abs() > 1e-9);
    if differ(a.diameter_m.map(|d| d.value), b.diameter_m.map(|d| d.value)) {
        what.push("diameter");
    }
    if matches!((a.year, b.year), (Some(a), Some(b)) if a != b) {
        what.push("year");
    }
    if matches!((a.zone, b.zone), (Some(a), Some(b)) if a != b) {
        what.push("zone");
    }
    what
}

fn say(work: &mut Work, left_out: u32, kept: u32) {
    let line = &work.drawn[left_out as usize];
    let at = between(line.vertices[0], line.vertices[1], 0.5);
    let (dropped, kept) = (line.main, work.drawn[kept as usize].main);
    if dropped == kept {
        return;
    }
    let (a, b) = (&work.assets.mains[dropped as usize], &work.assets.mains[kept as usize]);
    let what = differ_in(a, b);
    let message = Sentence::new().feature(a.origin).text(" lies on ").feature(b.origin);
    let finding = if what.is_empty() {
        let message = message.text(" and agrees with it; it was left out");
        Finding::new(Code::DuplicateMain, message)
    } else {
        let message = message.text(format!(" but differs in {}; ", what.join(" and ")));
        let message = message.feature(b.origin).text(" was calculated");
        let finding = Finding::new(Code::DuplicateDiffers, message);
        match a.diameter_m {
            Some(diameter) if what[0] == "diameter" => finding.measured(diameter.value, Quantity::Diameter),
            _ => finding,
        }
    };
    let (on, with) = (a.origin, b.origin);
    work.findings.push(finding.on(on).with(with).at(at));
    if !work.map.same_as.contains(&(dropped, kept)) {
        work.map.same_as.push((dropped, kept));
    }
}
