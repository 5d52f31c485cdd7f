//! Ends that touch: an end within the slack of another end, or of a line between its ends. A tee on a main that was not
//! split, a cross fitting on one, and a main whose end comes back to its own middle are all of this kind.

use super::JoinKind;
use super::cleaning::Work;
use super::geometry::distance_m;
use super::lines::{End, Hit};
use super::web::Middle;

/// Joins what touches. Counts the joins made.
pub(super) fn join(work: &mut Work) -> u32 {
    let mut joins = 0;
    for spot in 0..work.web.spots() {
        let touching = work.hits.of(spot);
        let count = touching.partition_point(|hit| hit.distance_m <= work.settings.touch_m);
        for i in 0..count {
            let hit = work.hits.of(spot)[i];
            joins += u32::from(touch(work, spot, hit));
        }
    }
    joins
}

fn touch(work: &mut Work, spot: u32, hit: Hit) -> bool {
    let touch_m = work.settings.touch_m;
    let at = work.web.at[spot as usize];
    for last in [false, true] {
        let end = End::new(hit.line, last);
        // A line that comes back to its own end has that end on the spot, and is met elsewhere.
        let at_end = work.lines.to_end_m(end, hit.s) <= 2.0 * touch_m;
        if at_end && distance_m(work.lines.end_at(end), at) <= touch_m {
            let there = work.web.spot_of_end[end.at()];
            return !work.web.same(spot, there) && unite(work, spot, there);
        }
    }
    if runs_over_neighbour(work, spot, hit) {
        return false;
    }
    let (zone, line_zone) = (work.web.zone(spot), work.zone_of_line(hit.line));
    let place = work.lines.place(hit.line, hit.s);
    let Some(zone) = work.zone_together(zone, line_zone, at) else {
        let lines = work.web.lines_at(spot);
        work.keep_apart(lines, vec![hit.line], at, place);
        return false;
    };
    let middle = Middle {
        spot,
        line: hit.line,
        s: hit.s,
        at: place,
        distance_m: hit.distance_m,
        kind: JoinKind::EndOnMiddle,
        ends_here: false,
    };
    work.web.attach(middle, zone, touch_m);
    true
}

fn unite(work: &mut Work, a: u32, b: u32) -> bool {
    let at = work.web.at[a as usize];
    match work.zone_together(work.web.zone(a), work.web.zone(b), at) {
        Some(zone) => work.web.unite(a, b, zone),
        None => {
            let (lines_a, lines_b) = (work.web.lines_at(a), work.web.lines_at(b));
            work.keep_apart(lines_a, lines_b, at, work.web.at[b as usize]);
            return false;
        }
    }
    true
}

/// Whether a single end lies on its neighbour's line only because it runs past the spot where that neighbour starts:
/// an overshoot along a straight street, not a tee.
fn runs_over_neighbour(work: &Work, spot: u32, hit: Hit) -> bool {
    let mut ends = work.web.ends(spot);
    let (Some(end), None) = (ends.next(), ends.next()) else {
        return false;
    };
    let longest_tail_m = work.settings.tolerance_m;
    [false, true].into_iter().any(|last| {
        let start = End::new(hit.line, last);
        if end.line() == hit.line || work.lines.to_end_m(start, hit.s) > longest_tail_m {
            return false;
        }
        let own = work.lines.nearest(end.line(), work.lines.end_at(start));
        let tail_m = work.lines.to_end_m(end, own.s);
        own.distance_m <= work.settings.touch_m
            && (work.settings.touch_m..=longest_tail_m).contains(&tail_m)
            && work.lines.to_end_m(end.other(), own.s) > work.settings.touch_m
    })
}
