//! The tolerance table: what other tolerances would do to this map, and which one it asks for.
//!
//! Candidates are found once, to 5 m: for every free end the nearest line that is not linked to it by a short way already.
//! Each tolerance is then one sweep over them. On drawn maps true gaps are small and real distances between mains are
//! not; the tolerance asked for lies in the empty stretch between the two.

use petgraph::unionfind::UnionFind;

use super::cleaning::Work;
use super::lines::End;
use super::overshoots::free_end;
use super::web::{Place, Web};
use super::{JoinSettings, ToleranceRow, ToleranceTable};
use crate::finding::Sentence;
use crate::units::Quantity;

/// The tolerances compared besides the one in use, m.
const COMPARED_M: [f64; 9] = [0.0, 0.001, 0.01, 0.1, 0.25, 0.5, 1.0, 2.0, 5.0];
/// The greatest of them.
pub(super) const FARTHEST_M: f64 = 5.0;
/// What rounding of coordinates alone can do, m: no distance at all.
const ROUNDING_M: f64 = 1e-6;
/// Two places linked by a way no longer than this are no candidates, m.
const SHORT_WAY_M: f64 = 10.0;
/// Tolerances that read well, m.
const ROUND_M: [f64; 15] = [
    0.002, 0.005, 0.01, 0.02, 0.05, 0.1, 0.15, 0.2, 0.25, 0.3, 0.4, 0.5, 0.75, 1.0, 1.5,
];
/// No true gap is wider than this, m.
const WIDEST_GAP_M: f64 = 1.0;

/// A free end and the line it would be joined to.
#[derive(Clone, Copy, Debug)]
struct Candidate {
    distance_m: f64,
    a: u32,
    b: u32,
}

/// Makes the table. Counts the candidates.
pub(super) fn compare(work: &mut Work) -> u32 {
    let candidates = candidates(work);
    let exact = exact_contacts(work);
    let mut touching = exact.clone();
    for middle in &work.web.middles {
        let end = work.web.ends(middle.spot).map(End::line).next();
        // Where no end lies the spot was made for two middles.
        let other = end.or_else(|| work.web.middles_of_spot(middle.spot).map(|m| m.line).next());
        if let Some(other) = other {
            touching.union(other, middle.line);
        }
    }
    unite_classes(&work.web, &mut touching);
    let total_m: f64 = work.lines.list.iter().map(|line| line.length_m).sum();
    let mut compared_m = COMPARED_M.to_vec();
    compared_m.push(work.settings.tolerance_m);
    compared_m.sort_by(f64::total_cmp);
    compared_m.dedup();
    let mut rows = Vec::with_capacity(compared_m.len());
    let mut next = 0;
    let mut joined = touching;
    for tolerance_m in compared_m {
        let mut row_of = if tolerance_m == 0.0 {
            exact.clone()
        } else {
            joined.clone()
        };
        while tolerance_m > 0.0 && next < candidates.len() && candidates[next].distance_m <= tolerance_m {
            joined.union(candidates[next].a, candidates[next].b);
            row_of.union(candidates[next].a, candidates[next].b);
            next += 1;
        }
        rows.push(row(work, tolerance_m, next as u32, row_of, total_m));
    }
    let (suggested_m, reason) = suggest(&candidates, work.settings);
    work.map.tolerance = Some(ToleranceTable {
        rows,
        suggested_m,
        reason,
    });
    candidates.len() as u32
}

/// For each free end the nearest line that it is not linked to, nearest first, each pair once.
fn candidates(work: &Work) -> Vec<Candidate> {
    let mut all: Vec<Candidate> = Vec::new();
    for spot in 0..work.web.spots() {
        let Some(end) = free_end(work, spot) else {
            continue;
        };
        let near = work.hits.of(spot).iter().take_while(|hit| hit.distance_m <= FARTHEST_M);
        let found = near.filter(|hit| hit.distance_m > work.settings.touch_m).find(|hit| {
            let (from, to) = (Place::Spot(spot), Place::On(hit.line, hit.s));
            work.way_m(from, to, SHORT_WAY_M.max(hit.distance_m * 4.0)).is_none()
        });
        if let Some(hit) = found {
            all.push(Candidate {
                distance_m: hit.distance_m,
                a: end.line().min(hit.line),
                b: end.line().max(hit.line),
            });
        }
    }
    all.sort_by(|x, y| (x.a, x.b).cmp(&(y.a, y.b)).then(x.distance_m.total_cmp(&y.distance_m)));
    all.dedup_by(|y, x| (x.a, x.b) == (y.a, y.b) && (x.distance_m - y.distance_m).abs() < ROUNDING_M);
    all.sort_by(|x, y| x.distance_m.total_cmp(&y.distance_m));
    all
}

/// Lines that hang together by what lies on exactly the same spot.
fn exact_contacts(work: &Work) -> UnionFind<u32> {
    let mut lines: UnionFind<u32> = UnionFind::new(work.lines.len());
    for spot in 0..work.web.spots() {
        let mut ends = work.web.ends(spot).map(End::line);
        if let Some(first) = ends.next() {
            ends.for_each(|line| {
                lines.union(first, line);
            });
            for middle in work.web.middles_of_spot(spot).filter(|m| m.distance_m <= ROUNDING_M) {
                lines.union(first, middle.line);
            }
        }
    }
    lines
}

fn unite_classes(web: &Web, lines: &mut UnionFind<u32>) {
    for spot in 0..web.spots() {
        let class = web.class(spot);
        let first = |spot: u32| web.ends(spot).map(End::line).next();
        if let (Some(a), Some(b)) = (first(spot), first(class)) {
            lines.union(a, b);
        }
    }
}

fn row(work: &Work, tolerance_m: f64, joins: u32, joined: UnionFind<u32>, total_m: f64) -> ToleranceRow {
    let label = joined.into_labeling();
    let mut length_m = vec![0.0; label.len()];
    for (line, &label) in label.iter().enumerate() {
        length_m[label as usize] += work.lines.length_m(line as u32);
    }
    let lengths = work.lines.list.iter().map(|line| line.length_m);
    ToleranceRow {
        tolerance_m,
        joins,
        islands: label
            .iter()
            .enumerate()
            .filter(|&(line, &label)| line as u32 == label)
            .count() as u32,
        largest_share: length_m.iter().copied().fold(0.0, f64::max) / total_m.max(f64::MIN_POSITIVE),
        swallowed: lengths.filter(|&length_m| length_m <= tolerance_m).count() as u32,
    }
}

/// The tolerance in the widest empty stretch above the smallest distances, and why.
fn suggest(candidates: &[Candidate], settings: &JoinSettings) -> (f64, Sentence) {
    let length = |sentence: Sentence, m: f64| sentence.number(m, Quantity::Length);
    let default_m = JoinSettings::default().tolerance_m;
    let distances: Vec<f64> = candidates
        .iter()
        .map(|candidate| candidate.distance_m)
        .filter(|&d| d > settings.touch_m)
        .collect();
    let Some(&nearest_m) = distances.first() else {
        let reason = length(Sentence::from("No free end lies within "), FARTHEST_M);
        let reason = reason.text(" of another main without touching it: every tolerance gives the same network.");
        return (default_m, reason);
    };
    if nearest_m > default_m {
        let suggested_m = round_between(settings.touch_m, nearest_m.min(default_m));
        let reason = length(
            Sentence::from("The nearest free end that touches nothing lies "),
            nearest_m,
        );
        let reason = reason.text(" from another main: below that every tolerance gives the same network.");
        return (suggested_m, reason);
    }
    // An empty stretch counts by its width as a share of where it begins; a decimetre more keeps the smallest apart.
    let (mut low, mut high) = (nearest_m, FARTHEST_M);
    let mut widest = 0.0;
    for (i, &from) in distances.iter().enumerate().filter(|(_, from)| **from <= WIDEST_GAP_M) {
        let to = distances.get(i + 1).copied().unwrap_or(FARTHEST_M);
        let width = (to - from) / (from + 0.1);
        if width > widest {
            (widest, low, high) = (width, from, to);
        }
    }
    let suggested_m = round_between(low, high);
    let count = distances.iter().filter(|&&d| d <= low).count();
    let lie = if count == 1 {
        "1 free end lies "
    } else {
        &format!("{count} free ends lie ")
    };
    let reason = length(Sentence::from(lie), nearest_m).text(" to ");
    let reason = length(reason, low).text(" from another main, and none between ");
    let reason = length(length(reason, low).text(" and "), high).text(": ");
    (
        suggested_m,
        length(reason, suggested_m).text(" lies in that empty stretch."),
    )
}

/// A length that reads well between two, near the middle of their ratio.
fn round_between(low_m: f64, high_m: f64) -> f64 {
    let middle = (low_m * high_m).sqrt();
    let off = |m: f64| (m / middle).ln().abs();
    ROUND_M
        .into_iter()
        .filter(|&m| m > low_m && m < high_m)
        .min_by(|&a, &b| off(a).total_cmp(&off(b)))
        .unwrap_or(middle)
}
