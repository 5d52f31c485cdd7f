//! Joins within the tolerance: ends near ends, free ends near the middle of a main, and free ends that run past one.
//!
//! All of them compete in one list, since one end can be near several things. A join costs its distance, weighed by what
//! speaks for it: an end comes before a middle, and what the line is heading for comes before what it passes. The
//! cheapest is made first, and each is made only when what it would tie together stays a node:
//!
//! - no wider than the tolerance;
//! - no two of its spots linked by a short way already (valve clusters, hydrant laterals, a main folding back);
//! - no two of its spots on parallel mains that run on side by side;
//! - one pressure zone.

use super::JoinKind;
use super::cleaning::Work;
use super::geometry::{cross, distance_m, dot, from_to};
use super::lines::{End, Hit};
use super::overshoots::{explained_within_m, free_end, join_at, said, tail_crossing};
use super::web::{Middle, Place};
use crate::assets::Point;
use crate::finding::{Code, Finding, Sentence};
use crate::units::Quantity;

/// Two places linked by a way no longer than this are not joined again, m: it would make a loop that no one lays.
const SHORT_WAY_M: f64 = 10.0;
/// The same where a line is heading straight for the other place, m: there a real link may close a small loop.
const SHORT_WAY_AHEAD_M: f64 = 3.0;
/// Ends that are not free are joined to the middle of a main only this near, m: true drafting gaps are no wider, parallel
/// mains are.
const CLOSE_M: f64 = 0.1;
/// Two tees on a main nearer to each other than this share of the tolerance are one fitting.
const ONE_FITTING: f64 = 0.5;
/// How far back along a line to look whether it runs beside another, m.
const BESIDE_M: f64 = 5.0;

/// Two ways that leave a spot in directions whose cosine is below this make a run through it (150 degrees).
const THROUGH_COS: f64 = -0.866;
/// Two runs whose directions differ by less than 30 degrees are parallel.
const PARALLEL_COS: f64 = 0.866;
/// An end is heading for a place within 60 degrees of its direction.
const AHEAD_COS: f64 = 0.5;

/// A join that could be made.
#[derive(Clone, Copy, Debug)]
struct Candidate {
    cost: f64,
    spot: u32,
    to: Target,
    distance_m: f64,
}

#[derive(Clone, Copy, Debug)]
enum Target {
    /// Another spot.
    Spot(u32),
    /// A line, between its ends.
    Middle(Hit),
    /// A line that the tail of the free end crosses: where along the end's own line, and along the other.
    Crossed(End, f64, Hit),
}

/// Joins within the tolerance. Counts the joins made.
pub(super) fn join(work: &mut Work) -> u32 {
    if work.settings.tolerance_m <= work.settings.touch_m {
        return 0;
    }
    let mut candidates = Vec::new();
    for spot in 0..work.web.spots() {
        gather(work, spot, &mut candidates);
    }
    let place = |spot: u32| work.web.at[spot as usize];
    let order = |c: &Candidate| match c.to {
        Target::Spot(other) => place(other),
        Target::Middle(hit) | Target::Crossed(_, _, hit) => work.lines.place(hit.line, hit.s),
    };
    candidates.sort_by(|a, b| {
        let (p, q, u, v) = (place(a.spot), place(b.spot), order(a), order(b));
        (a.cost.total_cmp(&b.cost))
            .then(a.distance_m.total_cmp(&b.distance_m))
            .then(p[0].total_cmp(&q[0]))
            .then(p[1].total_cmp(&q[1]))
            .then(u[0].total_cmp(&v[0]))
            .then(u[1].total_cmp(&v[1]))
            .then_with(|| ends_there(work, b).cmp(&ends_there(work, a)))
            .then_with(|| zone_there(work, a).cmp(zone_there(work, b)))
    });
    candidates.iter().filter(|candidate| make(work, candidate)).count() as u32
}

/// How many ends lie on the spot that would be joined. Where two zones end on one spot, the one with more ends comes first,
/// as it does for ends that lie there exactly.
fn ends_there(work: &Work, candidate: &Candidate) -> usize {
    match candidate.to {
        Target::Spot(other) => work.web.ends(other).count().max(work.web.ends(candidate.spot).count()),
        _ => 0,
    }
}

/// The name of the zone that a spot would be joined to.
fn zone_there<'a>(work: &'a Work, candidate: &Candidate) -> &'a str {
    match candidate.to {
        Target::Spot(other) => {
            let zones = [work.web.zone(other), work.web.zone(candidate.spot)];
            zones.map(|zone| work.zone_name(zone)).into_iter().max().unwrap_or("")
        }
        _ => "",
    }
}

/// The joins that a spot could make.
fn gather(work: &Work, spot: u32, candidates: &mut Vec<Candidate>) {
    let tolerance_m = work.settings.tolerance_m;
    let near = work.hits.of(spot);
    let near = &near[..near.partition_point(|hit| hit.distance_m <= tolerance_m)];
    if near.is_empty() || work.web.ends(spot).next().is_none() {
        return;
    }
    let free = free_end(work, spot);
    let mut heading_for_an_end = false;
    let mut crossed = Vec::new();
    for &hit in near {
        let by_an_end = gather_ends(work, spot, hit, candidates, &mut heading_for_an_end);
        let meets = work
            .web
            .stops(&work.lines, hit.line)
            .any(|(_, other)| work.web.same(other, spot));
        if by_an_end || meets || hit.distance_m <= work.settings.touch_m || node_beside(work, spot, hit).is_some() {
            continue;
        }
        if let Some(end) = free {
            // The line may be crossed by the tail a little farther from the end than it is near.
            match tail_crossing(work, end, hit, 1.5 * tolerance_m) {
                Some((s, r, _)) => crossed.push((end, s, Hit { s: r, ..hit })),
                None => candidates.push(middle(work, spot, Some(end), hit)),
            }
        } else if hit.distance_m <= CLOSE_M.min(tolerance_m) {
            candidates.push(middle(work, spot, None, hit));
        }
    }
    for (end, s, hit) in crossed {
        let tail_m = work.lines.to_end_m(end, s);
        // An end that is heading for another end within reach was drawn across the main between on purpose.
        let behind = if heading_for_an_end { tolerance_m } else { 0.0 };
        candidates.push(Candidate {
            cost: 2.0 * tail_m + behind,
            spot,
            to: Target::Crossed(end, s, hit),
            distance_m: tail_m,
        });
    }
}

/// The joins of a spot with the ends of a line near it. Tells whether an end is within reach at all, and notes whether the
/// spot is heading for one.
fn gather_ends(
    work: &Work,
    spot: u32,
    hit: Hit,
    candidates: &mut Vec<Candidate>,
    heading_for_an_end: &mut bool,
) -> bool {
    let at = work.web.at[spot as usize];
    let mut by_an_end = false;
    for last in [false, true] {
        let end = End::new(hit.line, last);
        let other = work.web.spot_of_end[end.at()];
        let apart = distance_m(work.lines.end_at(end), at);
        if other == spot || apart > work.settings.tolerance_m || work.web.trimmed[end.at()].is_some() {
            continue;
        }
        by_an_end = true;
        if work.web.same(spot, other) {
            continue;
        }
        let heads = heads_for(work, spot, other);
        *heading_for_an_end |= heads;
        let weight = if heads || heads_for(work, other, spot) {
            1.0
        } else {
            1.5
        };
        candidates.push(Candidate {
            cost: apart * weight,
            spot,
            to: Target::Spot(other),
            distance_m: apart,
        });
    }
    by_an_end
}

/// A node of the line that was hit which the spot belongs to rather than to the bare line: one it is heading for, or one so
/// near along the line that the two would be one fitting.
fn node_beside(work: &Work, spot: u32, hit: Hit) -> Option<u32> {
    let at = work.web.at[spot as usize];
    let (tolerance_m, one_fitting_m) = (work.settings.tolerance_m, ONE_FITTING * work.settings.tolerance_m);
    let nodes = work
        .web
        .stops(&work.lines, hit.line)
        .filter(|&(_, node)| !work.web.same(node, spot));
    nodes
        .filter(|&(_, node)| distance_m(work.web.at[node as usize], at) <= tolerance_m)
        .filter(|&(r, node)| (r - hit.s).abs() <= one_fitting_m || heads_for(work, spot, node))
        .map(|(r, node)| ((r - hit.s).abs(), node))
        .min_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(_, node)| node)
}

fn middle(work: &Work, spot: u32, end: Option<End>, hit: Hit) -> Candidate {
    let at = work.web.at[spot as usize];
    let towards = from_to(at, work.lines.place(hit.line, hit.s));
    let ahead = end.is_some_and(|end| dot(work.lines.heading(end), towards) >= AHEAD_COS * hit.distance_m);
    Candidate {
        cost: hit.distance_m * if ahead { 1.2 } else { 2.0 },
        spot,
        to: Target::Middle(hit),
        distance_m: hit.distance_m,
    }
}

/// Whether the one end that lies on a spot is heading straight for another spot.
fn heads_for(work: &Work, spot: u32, other: u32) -> bool {
    let mut ends = work.web.ends(spot);
    let (Some(end), None) = (ends.next(), ends.next()) else {
        return false;
    };
    heads_for_place(work, end, work.web.at[other as usize])
}

/// Whether an end is heading straight for a place.
pub(super) fn heads_for_place(work: &Work, end: End, place: Point) -> bool {
    let heading = work.lines.heading(end);
    let towards = from_to(work.lines.end_at(end), place);
    let ahead = dot(heading, towards);
    ahead > 0.0 && cross(heading, towards).abs() <= 0.25 * ahead + 0.05
}

/// Makes a join, if it may be made.
fn make(work: &mut Work, candidate: &Candidate) -> bool {
    let Candidate { spot, distance_m, .. } = *candidate;
    match candidate.to {
        Target::Spot(other) => join_spots(work, spot, other, distance_m),
        Target::Middle(hit) => join_middle(work, spot, hit),
        Target::Crossed(end, s, hit) => join_crossed(work, spot, end, s, hit),
    }
}

fn join_spots(work: &mut Work, a: u32, b: u32, apart_m: f64) -> bool {
    let tolerance_m = work.settings.tolerance_m;
    if work.web.same(a, b) || work.web.ends(a).next().is_none() || work.web.ends(b).next().is_none() {
        return false;
    }
    let at = work.web.at[a as usize];
    if !work.web.stays_narrow(a, b, tolerance_m) || !stay_one_node(work, a, b) {
        return false;
    }
    let Some(zone) = work.zone_together(work.web.zone(a), work.web.zone(b), at) else {
        let (lines_a, lines_b) = (work.web.lines_at(a), work.web.lines_at(b));
        work.keep_apart(lines_a, lines_b, at, work.web.at[b as usize]);
        return false;
    };
    for (end_spot, node) in [(a, b), (b, a)] {
        if let Some((end, s)) = passes(work, end_spot, node) {
            let tail_m = work.lines.to_end_m(end, s);
            return join_at(work, end, s, node, tail_m);
        }
    }
    // The free one is what the finding is about; of two free ones the one that is heading for the other.
    let ahead = (heads_for(work, a, b), heads_for(work, b, a));
    let (free_a, free_b) = (work.web.is_free(a), work.web.is_free(b));
    let swap = match (free_a, free_b) {
        (true, false) => false,
        (false, true) => true,
        _ if ahead.0 != ahead.1 => ahead.1,
        _ => first_rank(work, b) < first_rank(work, a),
    };
    let (one, other) = if swap { (b, a) } else { (a, b) };
    say(work, one, None, other, apart_m);
    work.web.unite(a, b, zone);
    true
}

fn first_rank(work: &Work, spot: u32) -> u32 {
    let lines = work.web.ends(spot).map(End::line);
    lines.map(|line| work.lines.rank(line)).min().unwrap_or(u32::MAX)
}

/// Whether no two spots of the two nodes are better kept apart.
fn stay_one_node(work: &Work, a: u32, b: u32) -> bool {
    work.web.members(a).all(|p| {
        work.web.members(b).all(|q| {
            let ahead = heads_for(work, p, q) || heads_for(work, q, p);
            let apart = distance_m(work.web.at[p as usize], work.web.at[q as usize]);
            let limit_m = short_way_m(ahead, apart);
            !run_side_by_side(work, p, q)
                && !ends_beside(work, p, q)
                && !ends_beside(work, q, p)
                && work.way_m(Place::Spot(p), Place::Spot(q), limit_m).is_none()
        })
    })
}

fn short_way_m(ahead: bool, apart_m: f64) -> f64 {
    if ahead {
        SHORT_WAY_AHEAD_M.max(4.0 * apart_m)
    } else {
        SHORT_WAY_M
    }
}

/// The directions in which mains run through a spot.
fn runs(work: &Work, spot: u32) -> Vec<Point> {
    let out: Vec<Point> = work.web.ends(spot).map(|end| work.lines.heading(end)).collect();
    let mut runs: Vec<Point> = work
        .web
        .middles_of_spot(spot)
        .filter(|m| !m.ends_here)
        .map(|m| work.lines.direction(m.line, m.s))
        .collect();
    for (i, &u) in out.iter().enumerate() {
        runs.extend(out[i + 1..].iter().filter(|&&v| dot(u, v) < THROUGH_COS).map(|_| u));
    }
    runs
}

/// Whether parallel mains run through both spots: twin mains in one street, however near.
fn run_side_by_side(work: &Work, a: u32, b: u32) -> bool {
    let (runs_a, runs_b) = (runs(work, a), runs(work, b));
    let across = from_to(work.web.at[a as usize], work.web.at[b as usize]);
    let apart = dot(across, across).sqrt();
    runs_a.iter().any(|&u| {
        let parallel = runs_b.iter().any(|&v| dot(u, v).abs() > PARALLEL_COS);
        parallel && apart > work.settings.touch_m && dot(u, across).abs() < PARALLEL_COS * apart
    })
}

/// Whether the single end at a spot belongs to a main that comes along beside one that runs through the other.
fn ends_beside(work: &Work, spot: u32, other: u32) -> bool {
    let mut ends = work.web.ends(spot);
    let (Some(end), None) = (ends.next(), ends.next()) else {
        return false;
    };
    let lines = work.web.ends(other).map(End::line);
    let lines: Vec<u32> = lines.chain(work.web.middles_of_spot(other).map(|m| m.line)).collect();
    lines
        .into_iter()
        .any(|line| line != end.line() && runs_beside(work, end, line))
}

/// Whether a line, a few metres before its end, is still within the tolerance of another.
pub(super) fn runs_beside(work: &Work, end: End, line: u32) -> bool {
    runs_beside_within(work, end, line, work.settings.tolerance_m)
}

/// Whether a line, a few metres before its end, is still within `within_m` of another.
pub(super) fn runs_beside_within(work: &Work, end: End, line: u32, within_m: f64) -> bool {
    let length_m = work.lines.length_m(end.line());
    if length_m < 2.0 * within_m {
        return false;
    }
    let back = BESIDE_M.max(2.0 * within_m).min(length_m);
    let place = work.lines.place(end.line(), (work.lines.end_s(end) - back).abs());
    work.lines.nearest(line, place).distance_m <= within_m
}

/// Whether the free end at a spot runs past a node: the node lies beside its tail, not beyond its end.
fn passes(work: &Work, spot: u32, node: u32) -> Option<(End, f64)> {
    let end = free_end(work, spot)?;
    let place = work.web.at[node as usize];
    let own = work.lines.nearest(end.line(), place);
    let tail_m = work.lines.to_end_m(end, own.s);
    let from_start_m = work.lines.to_end_m(end.other(), own.s);
    let passed = own.distance_m <= 0.3 * tail_m && tail_m > work.settings.touch_m && from_start_m > tail_m;
    let explained = || {
        let at = work.web.at[spot as usize];
        work.marks.explains_end(at, place, explained_within_m(work), false)
    };
    (passed && !explained()).then_some((end, own.s))
}

fn join_middle(work: &mut Work, spot: u32, hit: Hit) -> bool {
    let at = work.web.at[spot as usize];
    let place = work.lines.place(hit.line, hit.s);
    let end = free_end(work, spot);
    if end.is_none() && (hit.distance_m > CLOSE_M || work.web.ends(spot).next().is_none()) {
        return false;
    }
    let settled = work
        .web
        .stops(&work.lines, hit.line)
        .any(|(_, other)| work.web.same(other, spot));
    if settled || !may_meet(work, spot, end, hit) {
        return false;
    }
    let Some(zone) = work.zone_together(work.web.zone(spot), work.zone_of_line(hit.line), place) else {
        let lines = work.web.lines_at(spot);
        work.keep_apart(lines, vec![hit.line], at, place);
        return false;
    };
    let main = work.lines.main(hit.line);
    say(work, spot, Some(main), spot, hit.distance_m);
    let middle = Middle {
        spot,
        line: hit.line,
        s: hit.s,
        at: place,
        distance_m: hit.distance_m,
        kind: JoinKind::EndNearMiddle,
        ends_here: false,
    };
    work.web.attach(middle, zone, work.settings.touch_m);
    true
}

/// Whether a spot may be joined to the middle of a line.
fn may_meet(work: &Work, spot: u32, end: Option<End>, hit: Hit) -> bool {
    let (at, place) = (work.web.at[spot as usize], work.lines.place(hit.line, hit.s));
    let (from, to) = (Place::Spot(spot), Place::On(hit.line, hit.s));
    if let Some(end) = end {
        let ahead = heads_for_place(work, end, place);
        return !runs_beside(work, end, hit.line)
            && !work.marks.explains_end(at, place, explained_within_m(work), false)
            && work.way_m(from, to, short_way_m(ahead, hit.distance_m)).is_none();
    }
    let direction = work.lines.direction(hit.line, hit.s);
    let beside = runs(work, spot).iter().any(|&u| dot(u, direction).abs() > PARALLEL_COS);
    !beside && work.way_m(from, to, SHORT_WAY_M).is_none()
}

fn join_crossed(work: &mut Work, spot: u32, end: End, s: f64, hit: Hit) -> bool {
    if free_end(work, spot) != Some(end) {
        return false;
    }
    let (at, place) = (work.web.at[spot as usize], work.lines.place(hit.line, hit.s));
    let tail_m = work.lines.to_end_m(end, s);
    let short = work
        .way_m(Place::Spot(spot), Place::On(hit.line, hit.s), SHORT_WAY_M)
        .is_some();
    let explained = work.marks.explains_end(at, place, explained_within_m(work), false);
    if short || explained || runs_beside(work, end, hit.line) {
        return false;
    }
    // A node of the crossed line within the tolerance is where the two meet.
    let near = work
        .web
        .stops(&work.lines, hit.line)
        .filter(|(r, _)| (r - hit.s).abs() <= tail_m);
    let near = near.min_by(|(r, _), (q, _)| (r - hit.s).abs().total_cmp(&(q - hit.s).abs()));
    if let Some((r, node)) = near
        && (r - hit.s).abs() <= CLOSE_M.max(ONE_FITTING * work.settings.tolerance_m)
    {
        return join_at(work, end, s, node, tail_m);
    }
    let Some(zone) = work.zone_together(work.zone_of_line(end.line()), work.zone_of_line(hit.line), place) else {
        work.keep_apart(vec![end.line()], vec![hit.line], place, place);
        return false;
    };
    let main = work.lines.main(hit.line);
    said(work, end, &[main], tail_m);
    let (touch_m, crossing) = (work.settings.touch_m, work.web.new_spot(place));
    let own = Middle {
        spot: crossing,
        line: end.line(),
        s,
        at: place,
        distance_m: tail_m,
        kind: JoinKind::Overshoot,
        ends_here: true,
    };
    let index = work.web.middles.len() as u32;
    work.web.attach(own, zone, touch_m);
    if work.web.middles.len() as u32 > index {
        work.web.trim(end, index);
    }
    let other = Middle {
        line: hit.line,
        s: hit.s,
        ends_here: false,
        kind: JoinKind::EndOnMiddle,
        distance_m: 0.0,
        ..own
    };
    work.web.attach(other, zone, touch_m);
    true
}

/// Says that ends which did not quite meet were joined: `spot` to the middle of `middle`, or to the node of `other`.
fn say(work: &mut Work, spot: u32, middle: Option<u32>, other: u32, apart_m: f64) {
    let ends = work.web.ends(spot).map(End::line);
    let Some(line) = ends.min_by_key(|&line| work.lines.rank(line)) else {
        return;
    };
    let main = work.lines.main(line);
    let feature = work.feature(main);
    let (code, met) = match middle {
        Some(met) => (Code::EndJoinedToMiddle, vec![met]),
        None => (Code::EndJoined, work.mains_at(other, main)),
    };
    let mut others: Vec<u32> = met.clone();
    others.extend(
        work.mains_at(spot, main)
            .into_iter()
            .filter(|other| !met.contains(other)),
    );
    let message = Sentence::new()
        .feature(feature)
        .text(" ends ")
        .number(apart_m, Quantity::Length)
        .text(" from ");
    let message = match met.first() {
        Some(&met) if met != main => message.feature(work.feature(met)),
        _ => message.text("itself"),
    };
    let mut finding = Finding::new(code, message.text(" and was joined to it"))
        .on(feature)
        .at(work.web.at[spot as usize])
        .measured(apart_m, Quantity::Length)
        .limit(work.settings.tolerance_m, "the tolerance");
    finding.others = others.iter().map(|&other| work.feature(other)).collect();
    work.findings.push(finding);
}
