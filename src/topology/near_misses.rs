//! Near misses: a free end, after all joins, with another main just outside the tolerance.
//!
//! What a free end is near to by nature is left out: the main its lateral comes from, the corner it stands at, anything
//! reached by a short way along the network. Where something explains the end (a hydrant or a node point stands on it, it
//! runs beside the other main, it is a lateral, it passes by without heading there) the finding is only a note.

use std::collections::HashSet;

use super::cleaning::Work;
use super::geometry::{distance_m, dot, from_to};
use super::lines::{End, Hit};
use super::near_joins::{heads_for_place, runs_beside_within};
use super::overshoots::{explained_within_m, free_end, tail_crossing};
use super::web::{Place, Zone};
use super::{Join, JoinKind};
use crate::assets::{MainKind, Point};
use crate::finding::{Code, Finding, Sentence, Severity};
use crate::units::Quantity;

/// A main reached by a way no longer than this is a neighbour, m; or than ten times the distance.
const NEIGHBOUR_M: f64 = 30.0;
/// A main no longer than this that ends free is a lateral, or a stub left for later, m.
const STUB_M: f64 = 8.0;

/// A place on one line and another line that a warning says it may belong to: what may explain an island.
#[derive(Clone, Copy, Debug)]
pub(super) struct Missed {
    pub line: u32,
    pub s: f64,
    pub other: u32,
}

/// A near miss.
#[derive(Clone, Debug)]
struct Miss {
    end: End,
    other: u32,
    /// The node of the other main, where the end is near one.
    node: Option<u32>,
    at: Point,
    to: Point,
    distance_m: f64,
    against: Vec<&'static str>,
}

/// Finds the near misses. Counts them.
pub(super) fn find(work: &mut Work) -> u32 {
    let mut misses: Vec<Miss> = Vec::new();
    for spot in 0..work.web.spots() {
        if let Some(end) = free_end(work, spot)
            && let Some(miss) = nearest_other(work, spot, end)
        {
            misses.push(miss);
        }
    }
    misses.sort_by(|a, b| {
        (a.against.len().cmp(&b.against.len()))
            .then(a.distance_m.total_cmp(&b.distance_m))
            .then(a.at[0].total_cmp(&b.at[0]))
            .then(a.at[1].total_cmp(&b.at[1]))
    });
    let mut said: HashSet<(u32, u32)> = HashSet::new();
    let mut places: HashSet<[u64; 4]> = HashSet::new();
    let bits = |a: Point, b: Point| [a[0], a[1], b[0], b[1]].map(f64::to_bits);
    let mut count = 0;
    for miss in misses {
        // Two free ends that face each other miss one another: once is enough.
        if places.contains(&bits(miss.to, miss.at)) {
            continue;
        }
        let main = work.lines.main(miss.end.line());
        let others = miss.node.map_or(Vec::new(), |node| work.mains_at(node, main));
        let pairs = others.into_iter().chain([work.lines.main(miss.other)]);
        let pairs = pairs.map(|other| (main.min(other), main.max(other)));
        if pairs.clone().all(|pair| !said.contains(&pair)) {
            places.insert(bits(miss.at, miss.to));
            said.extend(pairs);
            say(work, miss);
            count += 1;
        }
    }
    count
}

/// The nearest main that a free end may be meant to meet. Of several at one place it is the one that least speaks against.
fn nearest_other(work: &Work, spot: u32, end: End) -> Option<Miss> {
    let look_m = work.settings.look_m;
    let mut nearest: Option<Miss> = None;
    for &hit in work.hits.of(spot).iter().take_while(|hit| hit.distance_m <= look_m) {
        if nearest
            .as_ref()
            .is_some_and(|known| hit.distance_m > known.distance_m + work.settings.touch_m)
        {
            break;
        }
        if let Some(found) = miss(work, spot, end, hit) {
            let order = |miss: &Miss| (miss.against.len(), work.lines.rank(miss.other));
            if nearest.as_ref().is_none_or(|known| order(&found) < order(known)) {
                nearest = Some(found);
            }
        }
    }
    nearest
}

fn miss(work: &Work, spot: u32, end: End, hit: Hit) -> Option<Miss> {
    // The gap between parts of one main is said as that.
    if hit.line != end.line() && work.lines.main(hit.line) == work.lines.main(end.line()) {
        return None;
    }
    let at = work.web.at[spot as usize];
    let node = end_near(work, hit, at);
    let to = match node {
        Some(node) => work.web.at[node as usize],
        None => work.lines.place(hit.line, hit.s),
    };
    let apart = distance_m(at, to);
    let target = node.map_or(Place::On(hit.line, hit.s), Place::Spot);
    let limit_m = NEIGHBOUR_M.max(10.0 * apart);
    let raw_water = |line: u32| work.zone_of_line(line) == Zone::RawWater;
    if apart <= work.settings.touch_m
        || raw_water(hit.line) != raw_water(end.line())
        || work.way_m(Place::Spot(spot), target, limit_m).is_some()
        || tail_crossing(work, end, hit, work.settings.look_m).is_some()
    {
        return None;
    }
    Some(Miss {
        end,
        other: hit.line,
        node,
        at,
        to,
        distance_m: apart,
        against: against(work, end, hit, node, at, to),
    })
}

/// The end of the line that was hit, if that is what is near.
fn end_near(work: &Work, hit: Hit, at: Point) -> Option<u32> {
    let look_m = work.settings.look_m;
    [End::new(hit.line, false), End::new(hit.line, true)]
        .into_iter()
        .filter(|&end| work.web.trimmed[end.at()].is_none())
        .filter(|&end| work.lines.to_end_m(end, hit.s) <= work.settings.tolerance_m.max(0.5 * hit.distance_m))
        .map(|end| work.web.spot_of_end[end.at()])
        .filter(|&spot| distance_m(work.web.at[spot as usize], at) <= look_m)
        .min_by(|&a, &b| {
            let apart = |spot: u32| distance_m(work.web.at[spot as usize], at);
            apart(a).total_cmp(&apart(b))
        })
}

/// What speaks against the end and the other main belonging together.
fn against(work: &Work, end: End, hit: Hit, node: Option<u32>, at: Point, to: Point) -> Vec<&'static str> {
    let mut words = Vec::new();
    let within_m = explained_within_m(work);
    if work.marks.explains_end(at, to, within_m, false) {
        words.push("a hydrant stands at the end");
    } else if work.marks.explains_end(at, to, within_m, true) {
        words.push("a node point stands at the end");
    }
    let others = node.map_or(vec![hit.line], |node| work.web.lines_at(node));
    let within_m = work.settings.tolerance_m.max(1.3 * distance_m(at, to));
    if others
        .iter()
        .any(|&other| runs_beside_within(work, end, other, within_m))
    {
        words.push("it runs beside the other");
    }
    let (own_zone, other_zone) = (work.zone_of_line(end.line()), work.zone_of_line(hit.line));
    if own_zone.with(other_zone).is_none() {
        words.push("different zones");
    }
    let lateral = work.assets.mains[work.lines.main(end.line()) as usize].kind;
    let lateral = matches!(lateral, MainKind::HydrantLateral | MainKind::Service);
    let other_end = work.web.spot_of_end[end.other().at()];
    let tied_in = !work.web.is_free(other_end);
    if tied_in && (lateral || work.lines.length_m(end.line()) <= STUB_M) {
        words.push("it is a lateral or a stub");
    }
    let towards = from_to(at, to);
    let turn = dot(work.lines.heading(end), towards) / distance_m(at, to);
    // A node is what an end belongs to; past the middle of a main an end may go by.
    let least = if node.is_some_and(|node| work.web.arms(node) > 1) {
        -0.5
    } else {
        0.5
    };
    if turn < least && !heads_for_place(work, end, to) {
        words.push("it does not head there");
    }
    words
}

fn say(work: &mut Work, miss: Miss) {
    let (main_a, main_b) = (work.lines.main(miss.end.line()), work.lines.main(miss.other));
    let mut others = vec![main_b];
    if let Some(node) = miss.node {
        let more = work.mains_at(node, main_a);
        others.extend(more.into_iter().filter(|&main| main != main_b));
    }
    let why = if miss.against.is_empty() {
        "nothing explains why it ends there".to_string()
    } else {
        format!("against: {}", miss.against.join(", "))
    };
    let message = Sentence::new().feature(work.feature(main_a)).text(" ends ");
    let message = message.number(miss.distance_m, Quantity::Length).text(" from ");
    let message = message
        .feature(work.feature(main_b))
        .text(format!(" and was not joined to it ({why})"));
    let mut finding = Finding::new(Code::NearMiss, message)
        .on(work.feature(main_a))
        .at(miss.at)
        .measured(miss.distance_m, Quantity::Length)
        .limit(work.settings.tolerance_m, "the tolerance");
    finding.others = others.iter().map(|&other| work.feature(other)).collect();
    if miss.against.is_empty() {
        work.missed.push(Missed {
            line: miss.end.line(),
            s: work.lines.end_s(miss.end),
            other: miss.other,
        });
    } else {
        finding = finding.severity(Severity::Note);
    }
    work.findings.push(finding);
    work.map.joins.push(Join {
        kind: JoinKind::NearMiss,
        main_a,
        main_b,
        at: miss.at,
        to: miss.to,
        distance_m: miss.distance_m,
        joined: false,
        why,
    });
}
