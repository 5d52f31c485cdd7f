//! Bare crossings: two lines that cross, or share a vertex, between their ends. They are never joined, since mains cross at
//! different depths as a rule; what speaks for and against a connection is said. Mains that lie on one another over a
//! length are found in passing.

use super::cleaning::Work;
use super::geometry::{Meeting, distance_m, segments_meet};
use super::lines::{End, Stretch};
use super::near_misses::Missed;
use super::overshoots::{explained_within_m, free_end};
use super::web::{Place, Zone};
use super::{Join, JoinKind};
use crate::assets::{MainKind, Point};
use crate::finding::{Code, Finding, Sentence, Severity};
use crate::units::Quantity;

/// Two lines that meet at a node no farther than this from where they cross, along both, are not a bare crossing, m: the
/// crossing comes of drawing the node roughly.
const AT_A_NODE_M: f64 = 2.0;
/// Mains that lie on one another for less than this do so by chance, m.
const SHORTEST_OVERLAP_M: f64 = 1.0;

/// Where two lines meet between their ends.
#[derive(Clone, Copy, Debug)]
struct Crossing {
    a: u32,
    b: u32,
    s: f64,
    r: f64,
    at: Point,
    /// How long they lie on one another, m; 0 for a crossing.
    overlap_m: f64,
}

/// Finds the bare crossings. Counts them.
pub(super) fn find(work: &mut Work) -> u32 {
    let mut all = meetings(work);
    all.sort_by(|x, y| (x.a, x.b).cmp(&(y.a, y.b)).then(x.s.total_cmp(&y.s)));
    let mut count = 0;
    for pair in all.chunk_by(|x, y| (x.a, x.b) == (y.a, y.b)) {
        let overlap_m: f64 = pair.iter().map(|x| x.overlap_m).sum();
        if overlap_m > SHORTEST_OVERLAP_M.max(work.settings.tolerance_m) {
            say_overlap(work, pair[0], overlap_m);
            continue;
        }
        let mut last: Option<Crossing> = None;
        for &crossing in pair.iter().filter(|x| x.overlap_m == 0.0) {
            let same = last.is_some_and(|last| distance_m(last.at, crossing.at) <= work.settings.touch_m * 2.0);
            last = Some(crossing);
            if !same && !meet_nearby(work, crossing) {
                say(work, crossing);
                count += 1;
            }
        }
    }
    count
}

fn meetings(work: &Work) -> Vec<Crossing> {
    let touch_m = work.settings.touch_m;
    let mut all = Vec::new();
    for (p, q) in work.index.intersection_candidates_with_other_tree(&work.index) {
        // Each pair comes both ways round. Lines of one main are no crossing.
        if p.line >= q.line || work.lines.main(p.line) == work.lines.main(q.line) {
            continue;
        }
        let Some(meeting) = segments_meet(p.a, p.b, q.a, q.b, touch_m) else {
            continue;
        };
        let along = |stretch: &Stretch, t: f64| {
            let along = work.lines.along_m(stretch.line);
            let i = stretch.index as usize;
            along[i] + t * (along[i + 1] - along[i])
        };
        let (s, r, overlap_m) = match meeting {
            Meeting::At(t, u) => (along(p, t), along(q, u), 0.0),
            Meeting::Along(t, u) => (along(p, t), 0.0, (u - t) * distance_m(p.a, p.b)),
        };
        let inside = |line: u32, s: f64| (2.0 * touch_m..=work.lines.length_m(line) - 2.0 * touch_m).contains(&s);
        if overlap_m > 0.0 || inside(p.line, s) && inside(q.line, r) {
            // The one whose geometry ranks first comes first, whatever rows they stand in.
            let at = work.lines.place(p.line, s);
            let (a, b, s, r) = if work.lines.rank(p.line) < work.lines.rank(q.line) {
                (p.line, q.line, s, r)
            } else {
                (q.line, p.line, r, s)
            };
            all.push(Crossing {
                a,
                b,
                s,
                r,
                at,
                overlap_m,
            });
        }
    }
    all
}

/// Whether the two lines meet at a node close to where they cross, or one of them ends there with its tail left out.
fn meet_nearby(work: &Work, crossing: Crossing) -> bool {
    let within_m = AT_A_NODE_M.max(2.0 * work.settings.tolerance_m);
    let (a, b) = (Place::On(crossing.a, crossing.s), Place::On(crossing.b, crossing.r));
    work.way_m(a, b, within_m).is_some()
}

/// The free end of a line within `look_m` of a place on it, and the length of the tail to it.
fn tail(work: &Work, line: u32, s: f64) -> Option<(End, f64)> {
    [End::new(line, false), End::new(line, true)]
        .into_iter()
        .filter(|end| {
            work.web.trimmed[end.at()].is_none() && free_end(work, work.web.spot_of_end[end.at()]) == Some(*end)
        })
        .map(|end| (end, work.lines.to_end_m(end, s)))
        .filter(|(_, tail_m)| *tail_m <= work.settings.look_m)
        .min_by(|a, b| a.1.total_cmp(&b.1))
}

fn say(work: &mut Work, crossing: Crossing) {
    let (tail_a, tail_b) = (tail(work, crossing.a, crossing.s), tail(work, crossing.b, crossing.r));
    let b_first = match (tail_a, tail_b) {
        (Some((_, a)), Some((_, b))) => b < a,
        (None, Some(_)) => true,
        _ => false,
    };
    let (one, other, tail) = if b_first {
        (crossing.b, crossing.a, tail_b)
    } else {
        (crossing.a, crossing.b, tail_a)
    };
    let (main_a, main_b) = (work.lines.main(one), work.lines.main(other));
    let Evidence { why, innocent } = weigh(work, crossing, tail.map(|(end, _)| end));
    let mut message = Sentence::new().feature(work.feature(main_a));
    message = match tail {
        Some((_, tail_m)) => message.text(" runs ").number(tail_m, Quantity::Length).text(" past "),
        None => message.text(" crosses "),
    };
    message = message
        .feature(work.feature(main_b))
        .text(format!(" without a node; they were not joined ({why})"));
    let mut finding = Finding::new(Code::CrossingNotJoined, message)
        .on(work.feature(main_a))
        .with(work.feature(main_b))
        .at(crossing.at);
    if let Some((_, tail_m)) = tail {
        finding = finding
            .measured(tail_m, Quantity::Length)
            .limit(work.settings.tolerance_m, "the tolerance");
    }
    if innocent {
        finding = finding.severity(Severity::Note);
    } else {
        let s = if b_first { crossing.r } else { crossing.s };
        work.missed.push(Missed { line: one, s, other });
    }
    work.findings.push(finding);
    work.map.joins.push(Join {
        kind: JoinKind::Crossing,
        main_a,
        main_b,
        at: crossing.at,
        to: crossing.at,
        distance_m: 0.0,
        joined: false,
        why,
    });
}

struct Evidence {
    why: String,
    /// Whether what is known explains the crossing: mains of different purpose or zone, or a lateral on its way to its
    /// hydrant.
    innocent: bool,
}

fn weigh(work: &Work, crossing: Crossing, tail: Option<End>) -> Evidence {
    let main = |line: u32| &work.assets.mains[work.lines.main(line) as usize];
    let (a, b) = (main(crossing.a), main(crossing.b));
    let (mut pro, mut con) = (Vec::new(), Vec::new());
    let mut innocent = false;
    match (work.zone_of_line(crossing.a), work.zone_of_line(crossing.b)) {
        (Zone::Known(p), Zone::Known(q)) if p == q => pro.push("same zone"),
        (p, q) if p != q && p != Zone::Unknown && q != Zone::Unknown => {
            con.push("different zones");
            innocent = true;
        }
        _ => {}
    }
    match (a.diameter_m, b.diameter_m) {
        (Some(p), Some(q)) if (p.value - q.value).abs() < 1e-6 => pro.push("same diameter"),
        (Some(_), Some(_)) => con.push("different diameters"),
        _ => {}
    }
    if a.kind != b.kind && a.kind != MainKind::Unknown && b.kind != MainKind::Unknown {
        con.push("mains of different purpose");
        innocent = true;
    }
    let vertex = |line: u32, s: f64| {
        let along = work.lines.along_m(line);
        along.iter().any(|v| (v - s).abs() <= 2.0 * work.settings.touch_m)
    };
    match (vertex(crossing.a, crossing.s), vertex(crossing.b, crossing.r)) {
        (true, true) => pro.push("both have a vertex at the crossing"),
        (true, false) | (false, true) => pro.push("one has a vertex at the crossing"),
        (false, false) => con.push("no vertex at the crossing"),
    }
    if let Some(end) = tail {
        let at = work.lines.end_at(end);
        if work
            .marks
            .explains_end(at, crossing.at, explained_within_m(work), false)
        {
            con.push("a hydrant stands at the end");
            innocent = true;
        }
    }
    let list = |words: &[&str]| {
        if words.is_empty() {
            "nothing".to_string()
        } else {
            words.join(", ")
        }
    };
    Evidence {
        why: format!("for: {}; against: {}", list(&pro), list(&con)),
        innocent,
    }
}

fn say_overlap(work: &mut Work, crossing: Crossing, overlap_m: f64) {
    let (a, b) = (work.feature_of_line(crossing.a), work.feature_of_line(crossing.b));
    let message = Sentence::new()
        .feature(a)
        .text(" and ")
        .feature(b)
        .text(" lie on one another for ");
    let message = message
        .number(overlap_m, Quantity::Length)
        .text("; both were calculated");
    work.findings.push(
        Finding::new(Code::MainsOverlap, message)
            .on(a)
            .with(b)
            .at(crossing.at)
            .measured(overlap_m, Quantity::Length),
    );
}
