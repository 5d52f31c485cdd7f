//! Ends on the same spot. Where mains of two known pressure zones end on one spot, each zone gets a spot of its own.

use super::cleaning::{Hits, Work};
use super::lines::{End, Hit, Lines};
use super::tolerance::FARTHEST_M;
use super::web::{Web, Zone};
use crate::assets::Point;

/// A line whose nearest place is this close, along it, to the end asked about is only that end going on; one that
/// comes back after more than this is looked at.
const COMES_BACK_M: f64 = 10.0;

/// Gathers ends into spots, and finds the lines near each. Counts the ends that share their spot.
pub(super) fn gather(work: &mut Work) -> u32 {
    work.lines = Lines::new(std::mem::take(&mut work.drawn));
    work.index = work.lines.index();
    // Neighbours on the ground get neighbouring numbers: every later step then finds what it needs close together.
    let mut ends: Vec<(u64, Point, End)> = (0..work.lines.len() as u32 * 2)
        .map(|end| (work.lines.end_at(End(end)), End(end)))
        .map(|(at, end)| (cell(at), at, end))
        .collect();
    ends.sort_unstable_by(|(c, p, e), (d, q, f)| {
        c.cmp(d)
            .then(p[0].total_cmp(&q[0]))
            .then(p[1].total_cmp(&q[1]))
            .then(e.cmp(f))
    });
    let ends: Vec<(Point, End)> = ends.into_iter().map(|(_, at, end)| (at, end)).collect();
    let mut spots = Spots {
        spot_of_end: vec![0; ends.len()],
        ..Spots::default()
    };
    let mut shared = 0;
    for group in ends.chunk_by(|(p, _), (q, _)| p == q) {
        shared += if group.len() > 1 { group.len() as u32 } else { 0 };
        place(work, group, &mut spots);
    }
    work.web = Web::new(spots.at, spots.zone, spots.spot_of_end);
    look_round(work);
    shared
}

/// The number of the square that a place lies in, along a curve that visits squares near each other one after the other
/// (Morton 1966).
fn cell(at: Point) -> u64 {
    const SIDE_M: f64 = 100.0;
    const MIDDLE: f64 = (1u64 << 31) as f64;
    let spread = |v: f64| {
        // To a 32-bit number with its bits spread to every other place; a cast keeps within its bounds.
        let mut bits = u64::from((v / SIDE_M + MIDDLE) as u32);
        for (shift, mask) in [
            (16, 0x0000_FFFF_0000_FFFF),
            (8, 0x00FF_00FF_00FF_00FF),
            (4, 0x0F0F_0F0F_0F0F_0F0F),
            (2, 0x3333_3333_3333_3333),
            (1, 0x5555_5555_5555_5555),
        ] {
            bits = (bits | bits << shift) & mask;
        }
        bits
    };
    spread(at[0]) | spread(at[1]) << 1
}

#[derive(Default)]
struct Spots {
    at: Vec<Point>,
    zone: Vec<Zone>,
    spot_of_end: Vec<u32>,
}

/// Makes one spot of the ends at one place, or one a zone. Ends of unknown zone go with the zone that has most ends there
/// (of several, the one whose name sorts first).
fn place(work: &mut Work, group: &[(Point, End)], spots: &mut Spots) {
    let at = group[0].0;
    let zone_of = |work: &Work, end: End| work.zone_of_line(end.line());
    let mut zones: Vec<(Zone, usize)> = Vec::new();
    for &(_, end) in group {
        let zone = zone_of(work, end);
        match zones.iter_mut().find(|(known, _)| *known == zone) {
            Some((_, count)) => *count += 1,
            None => zones.push((zone, 1)),
        }
    }
    let raw_water = zones.iter().any(|(zone, _)| *zone == Zone::RawWater);
    let known = |zone: Zone| matches!(zone, Zone::Known(_));
    let different = zones.iter().filter(|(zone, _)| known(*zone)).count() > 1;
    let valve = different && work.open_zone_valve_at(at);
    if !raw_water && (!different || valve) {
        let zone = match zones.iter().find(|(zone, _)| known(*zone)) {
            _ if different => Zone::Several,
            Some((zone, _)) => *zone,
            None => Zone::Unknown,
        };
        spots.make(at, zone, group.iter().map(|&(_, end)| end));
        return;
    }
    zones.sort_by_key(|&(zone, count)| (std::cmp::Reverse(count), work.zone_name(zone), zone));
    let home = zones.iter().map(|(zone, _)| *zone).find(|&zone| known(zone));
    let home_of = |zone: Zone| {
        if zone == Zone::Unknown {
            home.unwrap_or(zone)
        } else {
            zone
        }
    };
    let mut made: Vec<Zone> = Vec::new();
    for &(zone, _) in &zones {
        if home_of(zone) != zone || made.contains(&zone) {
            continue;
        }
        made.push(zone);
        let members = group.iter().map(|&(_, end)| end);
        let members: Vec<End> = members.filter(|&end| home_of(zone_of(work, end)) == zone).collect();
        spots.make(at, zone, members.into_iter());
    }
    for (i, &a) in made.iter().enumerate() {
        for &b in &made[i + 1..] {
            let of = |zone: Zone| -> Vec<u32> {
                let lines = group.iter().map(|(_, end)| end.line());
                lines.filter(|&line| home_of(work.zone_of_line(line)) == zone).collect()
            };
            let (a, b) = (of(a), of(b));
            work.keep_apart(a, b, at, at);
        }
    }
}

impl Spots {
    fn make(&mut self, at: Point, zone: Zone, ends: impl Iterator<Item = End>) {
        let spot = self.at.len() as u32;
        self.at.push(at);
        self.zone.push(zone);
        for end in ends {
            self.spot_of_end[end.at()] = spot;
        }
    }
}

/// Finds the lines near each spot, once for all steps: one hit a line, the nearest first.
fn look_round(work: &mut Work) {
    let (lines, web) = (&work.lines, &work.web);
    let radius_m = FARTHEST_M.max(work.settings.look_m).max(work.settings.tolerance_m);
    let mut hits = Hits::default();
    hits.first.reserve(web.at.len() + 1);
    let mut near: Vec<Hit> = Vec::new();
    for (spot, &at) in web.at.iter().enumerate() {
        hits.first.push(hits.all.len() as u32);
        near.clear();
        for stretch in work.index.locate_within_distance(at, radius_m * radius_m) {
            let hit = lines.hit(stretch, at);
            if comes_back(lines, web, spot as u32, &hit, work.settings.touch_m) {
                near.push(hit);
            }
        }
        near.sort_unstable_by(|a, b| {
            (a.line.cmp(&b.line))
                .then(a.distance_m.total_cmp(&b.distance_m))
                .then(a.s.total_cmp(&b.s))
        });
        near.dedup_by_key(|hit| hit.line);
        near.sort_by(|a, b| (a.distance_m.total_cmp(&b.distance_m)).then(lines.rank(a.line).cmp(&lines.rank(b.line))));
        hits.all.extend_from_slice(&near);
    }
    hits.first.push(hits.all.len() as u32);
    work.hits = hits;
}

/// Whether a hit is more than the start of a line that ends on the spot anyway.
fn comes_back(lines: &Lines, web: &Web, spot: u32, hit: &Hit, touch_m: f64) -> bool {
    [false, true].into_iter().all(|last| {
        let end = End::new(hit.line, last);
        if web.spot_of_end[end.at()] != spot {
            return true;
        }
        let along = lines.to_end_m(end, hit.s);
        along > COMES_BACK_M || (hit.distance_m <= touch_m && along > 2.0 * touch_m)
    })
}
