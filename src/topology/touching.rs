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
    if let Some(over) = runs_over(work, spot, hit) {
        return meet_where_they_part(work, hit.line, over);
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

/// Where a main that runs on along another came upon it.
struct Over {
    /// The main's line and metres along it.
    line: u32,
    s: f64,
    /// Metres along the other.
    other_s: f64,
}

/// Whether a single end lies on another line only because its main runs past the vertex where it meets that line, and on
/// along it: an overshoot along a straight street, not a tee.
fn runs_over(work: &Work, spot: u32, hit: Hit) -> Option<Over> {
    let mut ends = work.web.ends(spot);
    let (Some(end), None) = (ends.next(), ends.next()) else {
        return None;
    };
    if end.line() == hit.line {
        return None;
    }
    let (touch_m, longest_tail_m) = (work.settings.touch_m, work.settings.tolerance_m);
    let (vertices, along) = (work.lines.vertices(hit.line), work.lines.along_m(hit.line));
    let near = |s: f64| (s - hit.s).abs() <= longest_tail_m + touch_m;
    let first = along.partition_point(|&s| s < hit.s - longest_tail_m - touch_m);
    let passed = (first..vertices.len()).take_while(|&i| near(along[i])).filter_map(|i| {
        let own = work.lines.nearest(end.line(), vertices[i]);
        let tail_m = work.lines.to_end_m(end, own.s);
        let over = own.distance_m <= touch_m
            && (touch_m..=longest_tail_m).contains(&tail_m)
            && work.lines.to_end_m(end.other(), own.s) > touch_m;
        over.then_some((tail_m, own.s, along[i]))
    });
    let farthest = passed.max_by(|a, b| a.0.total_cmp(&b.0));
    farthest.map(|(_, s, other_s)| Over {
        line: end.line(),
        s,
        other_s,
    })
}

/// Joins two lines at the place where one came upon the other; the tail is trimmed as that of any overshoot.
fn meet_where_they_part(work: &mut Work, other: u32, over: Over) -> bool {
    let place = work.lines.place(other, over.other_s);
    let end = [false, true].map(|last| End::new(other, last));
    let at_end = end
        .into_iter()
        .find(|&end| work.lines.to_end_m(end, over.other_s) <= work.settings.touch_m);
    // The other line's own end touches this one there, and is joined when its turn comes.
    if at_end.is_some() {
        return false;
    }
    let zones = (work.zone_of_line(over.line), work.zone_of_line(other));
    let Some(zone) = work.zone_together(zones.0, zones.1, place) else {
        work.keep_apart(vec![over.line], vec![other], place, place);
        return false;
    };
    let spot = work.web.new_spot(place);
    for (line, s) in [(over.line, over.s), (other, over.other_s)] {
        let middle = Middle {
            spot,
            line,
            s,
            at: place,
            distance_m: 0.0,
            kind: JoinKind::EndOnMiddle,
            ends_here: false,
        };
        work.web.attach(middle, zone, work.settings.touch_m);
    }
    true
}
