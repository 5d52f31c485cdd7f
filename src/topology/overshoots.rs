//! Overshoots: a free end that runs past the node or the main it meets by no more than the tolerance. It is joined at the
//! crossing and the tail is left out, so that no stub of a few decimetres hangs in the network.
//!
//! Here those that pass through a node; those that cross an unsplit main compete with the other joins in
//! `near_joins`.

use super::cleaning::Work;
use super::geometry::{Meeting, distance_m, segments_meet};
use super::lines::{End, Hit};
use super::web::Middle;
use super::{JoinKind, cleaning};
use crate::assets::Point;
use crate::finding::{Code, Finding, Sentence};
use crate::units::Quantity;

/// A tail passes through a node when the node lies this close to it: rounding of coordinates, not drawing, m.
const THROUGH_M: f64 = 0.02;

/// Trims the tails that pass through a node. Counts them.
pub(super) fn trim(work: &mut Work) -> u32 {
    let mut count = 0;
    for spot in 0..work.web.spots() {
        if let Some(end) = free_end(work, spot) {
            count += u32::from(trim_end(work, spot, end));
        }
    }
    count
}

/// The end that lies on a spot, if it lies there alone and meets nothing.
pub(super) fn free_end(work: &Work, spot: u32) -> Option<End> {
    let end = work.web.ends(spot).next()?;
    work.web.is_free(spot).then_some(end)
}

fn trim_end(work: &mut Work, spot: u32, end: End) -> bool {
    let tolerance_m = work.settings.tolerance_m;
    let at = work.web.at[spot as usize];
    // What meets the line near this end already: the nearest to the end is where the main was meant to stop.
    let met = work.web.middle_indices(end.line()).iter().copied();
    let met = met
        .map(|m| (work.lines.to_end_m(end, work.web.middles[m as usize].s), m))
        .filter(|&(tail_m, _)| tail_m <= tolerance_m)
        .max_by(|a, b| a.0.total_cmp(&b.0));
    if let Some((tail_m, middle)) = met {
        let place = work.web.middles[middle as usize].at;
        if work.marks.explains_end(at, place, explained_within_m(work), true) {
            return false;
        }
        let met = work.web.middles[middle as usize].spot;
        work.web.trim(end, middle);
        work.web.middles[middle as usize].distance_m = tail_m;
        say(work, end, met, tail_m);
        return true;
    }
    match passed_node(work, spot, end) {
        Some((hit, passed)) => {
            let tail_m = work.lines.to_end_m(end, hit.s);
            join_at(work, end, hit.s, passed, tail_m)
        }
        None => false,
    }
}

/// A node that the tail of a free end passes through, to within rounding, and the place on the line nearest to it.
fn passed_node(work: &Work, spot: u32, end: End) -> Option<(Hit, u32)> {
    let tolerance_m = work.settings.tolerance_m;
    let at = work.web.at[spot as usize];
    let near = work
        .hits
        .of(spot)
        .iter()
        .take_while(|hit| hit.distance_m <= tolerance_m);
    let ends = near.flat_map(|hit| [End::new(hit.line, false), End::new(hit.line, true)]);
    let mut best: Option<(Hit, u32)> = None;
    for other in ends {
        let there = work.web.spot_of_end[other.at()];
        let place = work.web.at[there as usize];
        if other.line() == end.line() || work.web.same(there, spot) || distance_m(place, at) > tolerance_m {
            continue;
        }
        let own = work.lines.nearest(end.line(), place);
        let tail_m = work.lines.to_end_m(end, own.s);
        let inside = work.settings.touch_m < tail_m && tail_m <= tolerance_m && tail_m > 2.0 * own.distance_m;
        let inside = inside && work.lines.to_end_m(end.other(), own.s) > tail_m;
        if inside && own.distance_m <= THROUGH_M && best.is_none_or(|(b, _)| own.distance_m < b.distance_m) {
            best = Some((own, there));
        }
    }
    best.filter(|(hit, there)| {
        let (at, place) = (at, work.web.at[*there as usize]);
        hit.distance_m <= THROUGH_M && !work.marks.explains_end(at, place, explained_within_m(work), true)
    })
}

/// How near a point feature must stand to belong to an end, m.
pub(super) fn explained_within_m(work: &Work) -> f64 {
    const AT_MOST_M: f64 = 0.3;
    AT_MOST_M.min(work.settings.tolerance_m.max(work.settings.touch_m))
}

/// Ends a line at `s`, at the node of `spot`, and leaves its tail out. False where zones keep the two apart.
pub(super) fn join_at(work: &mut Work, end: End, s: f64, spot: u32, tail_m: f64) -> bool {
    let at = work.lines.place(end.line(), s);
    let zone = work.zone_together(work.zone_of_line(end.line()), work.web.zone(spot), at);
    let Some(zone) = zone else {
        let lines = work.web.lines_at(spot);
        work.keep_apart(vec![end.line()], lines, at, work.web.at[spot as usize]);
        return false;
    };
    say(work, end, spot, tail_m);
    let index = work.web.middles.len() as u32;
    let middle = Middle {
        spot,
        line: end.line(),
        s,
        at,
        distance_m: tail_m,
        kind: JoinKind::Overshoot,
        ends_here: true,
    };
    work.web.attach(middle, zone, work.settings.touch_m);
    if work.web.middles.len() as u32 > index {
        work.web.trim(end, index);
    }
    true
}

fn say(work: &mut Work, end: End, met: u32, tail_m: f64) {
    let main = work.lines.main(end.line());
    let others = work.mains_at(met, main);
    said(work, end, &others, tail_m);
}

/// Says that a main runs past those it meets.
pub(super) fn said(work: &mut Work, end: End, others: &[u32], tail_m: f64) {
    let feature = work.feature_of_line(end.line());
    let mut message = Sentence::new()
        .feature(feature)
        .text(" runs ")
        .number(tail_m, Quantity::Length);
    message = match others.first() {
        Some(&other) => message.text(" past ").feature(work.feature(other)),
        None => message.text(" past its own middle"),
    };
    message = message.text(" and was joined to it where they meet; the tail is left out");
    let mut finding = Finding::new(Code::Overshoot, message)
        .on(feature)
        .at(work.lines.end_at(end))
        .measured(tail_m, Quantity::Length)
        .limit(work.settings.tolerance_m, "the tolerance");
    finding.others = others.iter().map(|&other| work.feature(other)).collect();
    work.findings.push(finding);
}

/// Where the tail of a line crosses another line near `hit`: the place along the tail's line, along the other, and the
/// place itself. Of several the nearest to the end.
pub(super) fn tail_crossing(work: &cleaning::Work, end: End, hit: Hit, longest_m: f64) -> Option<(f64, f64, Point)> {
    let lines = &work.lines;
    let (own, own_along) = (lines.vertices(end.line()), lines.along_m(end.line()));
    let (other, other_along) = (lines.vertices(hit.line), lines.along_m(hit.line));
    let end_s = lines.end_s(end);
    let mut best: Option<(f64, f64, Point)> = None;
    for i in 0..own.len() - 1 {
        let reaches = (own_along[i] - end_s).abs().min((own_along[i + 1] - end_s).abs()) <= longest_m;
        if !reaches {
            continue;
        }
        for j in 0..other.len() - 1 {
            if other_along[j] > hit.s + 2.0 * longest_m || other_along[j + 1] < hit.s - 2.0 * longest_m {
                continue;
            }
            let Some(Meeting::At(t, u)) =
                segments_meet(own[i], own[i + 1], other[j], other[j + 1], work.settings.touch_m)
            else {
                continue;
            };
            let s = own_along[i] + t * (own_along[i + 1] - own_along[i]);
            let r = other_along[j] + u * (other_along[j + 1] - other_along[j]);
            let tail_m = (end_s - s).abs();
            if tail_m <= longest_m && best.is_none_or(|(known, _, _)| tail_m < (end_s - known).abs()) {
                best = Some((s, r, lines.place(hit.line, r)));
            }
        }
    }
    best
}
