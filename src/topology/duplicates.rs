//! Mains that lie on one another: identical, drawn the other way round, or nearly identical.
//!
//! Two lines are nearly identical when every vertex of each lies within the tolerance, and within a twentieth of the
//! shorter one's length, of the other, and their ends pair up alike. That alone would also take two mains laid side by side in
//! one street: so where two paired ends lie apart, one of them must be loose, with no other main ending on it. A copy
//! that slipped is loose; a real main goes on.
//!
//! One of the two is calculated. When they agree in diameter, year and zone (an unknown one contradicts nothing) it is the
//! one that is tied in better, else the earlier row. When they differ it is the smaller, of two of one size the one whose
//! zone is that of the mains around its ends, and the finding is serious.

use std::cell::OnceCell;
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

/// How far apart a shorter main and its copy may lie, as a share of its length: laterals and services lie side by side.
const SHARE_OF_LENGTH: f64 = 0.05;

/// Leaves out all but one of every set of lines that lie on one another. Counts the lines left out.
pub(super) fn leave_out(work: &mut Work) -> u32 {
    let drawn = std::mem::take(&mut work.drawn);
    let ends = Ends {
        drawn: &drawn,
        counts: OnceCell::new(),
    };
    let left_out = find(work, &ends);
    let mut index = 0;
    work.drawn = drawn;
    work.drawn.retain(|_| {
        index += 1;
        !left_out.get(index - 1).is_some_and(|out| *out)
    });
    left_out.iter().filter(|out| **out).count() as u32
}

/// Which lines are left out; empty when none is. Says so.
fn find(work: &mut Work, ends: &Ends) -> Vec<bool> {
    let drawn = ends.drawn;
    let pairs = pairs(work, ends);
    if pairs.is_empty() {
        return Vec::new();
    }
    let mut sets: UnionFind<u32> = UnionFind::new(drawn.len());
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
    let mut left_out = vec![false; drawn.len()];
    let around = Around::of(work, drawn, &members);
    for set in &members {
        let kept = kept(work, ends, &around, set);
        for &line in set.iter().filter(|&&line| line != kept) {
            left_out[line as usize] = true;
            say(work, &drawn[line as usize], &drawn[kept as usize]);
        }
    }
    // A main of several lines may lie on another with each of them.
    work.map.same_as.sort_unstable();
    work.map.same_as.dedup();
    left_out
}

/// How the lines that have copies sit among the others.
#[derive(Clone, Copy, Default)]
struct Sits {
    /// How many of its two ends touch another line that is no copy of it.
    tied_in: usize,
    /// How many mains of its own zone lie at its ends.
    own_zone: usize,
}

/// How each line that has a copy sits among the others.
struct Around(HashMap<u32, Sits>);

impl Around {
    fn of(work: &Work, drawn: &[CleanLine], sets: &[Vec<u32>]) -> Self {
        let zone = |line: u32| work.assets.mains[drawn[line as usize].main as usize].zone;
        let segments = drawn.iter().enumerate().flat_map(|(line, drawn)| {
            let pairs = drawn.vertices.windows(2);
            pairs.map(move |pair| GeomWithData::new(Line::new(pair[0], pair[1]), line as u32))
        });
        let tree = RTree::bulk_load(segments.collect());
        let touch_m = work.settings.touch_m;
        let reach_m = work.settings.tolerance_m.max(touch_m);
        let mut around = HashMap::new();
        for set in sets {
            for &line in set {
                let ends = [first(&drawn[line as usize]), last(&drawn[line as usize])];
                let near = |end: Point, within_m: f64| {
                    let found = tree.locate_within_distance(end, within_m * within_m);
                    found.map(|found| found.data)
                };
                let tied_in = |end: &Point| near(*end, touch_m).any(|other| !set.contains(&other));
                let of_zone: HashSet<u32> = ends
                    .into_iter()
                    .flat_map(|end| near(end, reach_m))
                    .filter(|&other| zone(line).is_some() && zone(other) == zone(line))
                    .collect();
                let sits = Sits {
                    tied_in: ends.iter().filter(|end| tied_in(end)).count(),
                    own_zone: of_zone.len(),
                };
                around.insert(line, sits);
            }
        }
        Around(around)
    }

    fn sits(&self, line: u32) -> Sits {
        self.0.get(&line).copied().unwrap_or_default()
    }
}

/// How many lines end at each place.
struct Ends<'a> {
    drawn: &'a [CleanLine],
    /// Counted when first asked for: most maps have few copies to ask about.
    counts: OnceCell<HashMap<[u64; 2], u32>>,
}

impl Ends<'_> {
    /// Whether no other line ends at this end of a line.
    fn loose(&self, end: Point) -> bool {
        let counts = self.counts.get_or_init(|| {
            let mut counts = HashMap::with_capacity(self.drawn.len() * 2);
            for end in self.drawn.iter().flat_map(|line| [first(line), last(line)]) {
                *counts.entry(bits(end)).or_insert(0) += 1;
            }
            counts
        });
        counts.get(&bits(end)).is_none_or(|&count| count <= 1)
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
    let drawn = ends.drawn;
    let reach_m = work.settings.tolerance_m.max(work.settings.touch_m);
    let middle = |line: &CleanLine| between(first(line), last(line), 0.5);
    let points = drawn.iter().enumerate();
    let tree = RTree::bulk_load(
        points
            .map(|(index, line)| GeomWithData::new(middle(line), index as u32))
            .collect::<Vec<_>>(),
    );
    let mut pairs = Vec::new();
    for (a, line) in drawn.iter().enumerate() {
        for found in tree.locate_within_distance(middle(line), reach_m * reach_m) {
            if found.data > a as u32 && alike(work, ends, line, &drawn[found.data as usize]) {
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
fn kept(work: &Work, ends: &Ends, around: &Around, set: &[u32]) -> u32 {
    let main = |line: u32| &work.assets.mains[ends.drawn[line as usize].main as usize];
    let zone = |line: u32| main(line).zone.and_then(|zone| work.assets.zones.get(zone as usize));
    let by = |&a: &u32, &b: &u32| {
        let diameter = |line: u32| main(line).diameter_m.map_or(f64::INFINITY, |d| d.value);
        let place = |line: u32| {
            let (a, b) = (first(&ends.drawn[line as usize]), last(&ends.drawn[line as usize]));
            if (a[0], a[1]) <= (b[0], b[1]) { a } else { b }
        };
        let (p, q) = (place(a), place(b));
        let (sits_a, sits_b) = (around.sits(a), around.sits(b));
        (diameter(a).total_cmp(&diameter(b)))
            .then(sits_b.tied_in.cmp(&sits_a.tied_in))
            .then(sits_b.own_zone.cmp(&sits_a.own_zone))
            .then(main(b).year.cmp(&main(a).year))
            .then(zone(b).cmp(&zone(a)))
            .then(p[0].total_cmp(&q[0]))
            .then(p[1].total_cmp(&q[1]))
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

fn say(work: &mut Work, line: &CleanLine, kept: &CleanLine) {
    let at = between(line.vertices[0], line.vertices[1], 0.5);
    let (dropped, kept) = (line.main, kept.main);
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
    work.map.same_as.push((dropped, kept));
}
