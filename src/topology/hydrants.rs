//! Hydrants: the end of their lateral where one is drawn, else the fitting main they stand on or beside, which is cut there.
//!
//! A fitting main carries drinking water, is of the hydrant's zone where both are known, and is no transmission main,
//! lateral or service where the map tells them apart. Between two mains of different size at about the same distance, with
//! no node close by that joins them, the smaller is taken and it is said.

use super::Tap;
use super::cleaning::Work;
use super::geometry::distance_m;
use super::lines::Hit;
use super::marks::finite;
use super::web::{Place, Zone};
use crate::assets::{MainKind, Point};
use crate::finding::{Code, Finding, Sentence};
use crate::units::Quantity;

/// Two distances are about the same when they differ by no more than this share of the greater.
const ABOUT_THE_SAME: f64 = 0.25;
/// Mains that are joined by a way no longer than this many times the reach feed the hydrant alike.
const JOINED_CLOSE_BY: f64 = 4.0;

/// Taps the hydrants in. Counts those that have a main.
pub(super) fn tap_in(work: &mut Work) -> u32 {
    let mut tapped = 0;
    for index in 0..work.assets.hydrants.len() {
        let tap = finite(work.assets.hydrants[index].at).and_then(|at| tap_one(work, index, at));
        tapped += u32::from(tap.is_some());
        work.map.hydrants.push(tap);
    }
    tapped
}

fn tap_one(work: &mut Work, index: usize, at: Point) -> Option<Tap> {
    let assets = work.assets;
    let (hydrant, reach_m) = (&assets.hydrants[index], assets.reach.hydrants_m);
    let near = work.lines_near(at, reach_m.max(work.settings.tolerance_m));
    let fitting: Vec<Hit> = near
        .iter()
        .copied()
        .filter(|hit| hit.distance_m <= reach_m && fits(work, hit.line, hydrant.zone))
        .collect();
    if let Some(tap) = lateral_end(work, &near, fitting.first(), at, hydrant.zone) {
        return Some(tap);
    }
    let Some(&nearest) = fitting.first() else {
        off_main(work, index, at, near.first());
        return None;
    };
    let chosen = smaller_of_two(work, index, at, nearest, &fitting[1..]);
    Some(Tap {
        main: work.lines.main(chosen.line),
        node: work.node_at(chosen.line, chosen.s),
        distance_m: chosen.distance_m,
    })
}

/// Whether hydrants and customers of a zone may draw from a line.
pub(super) fn fits(work: &Work, line: u32, zone: Option<u32>) -> bool {
    let kind = work.assets.mains[work.lines.main(line) as usize].kind;
    matches!(kind, MainKind::Unknown | MainKind::Distribution) && same_zone(work, line, zone)
}

fn same_zone(work: &Work, line: u32, zone: Option<u32>) -> bool {
    match (work.zone_of_line(line), zone) {
        (Zone::Known(of_line), Some(zone)) => of_line == zone,
        _ => true,
    }
}

/// The free end of a line that stops at the hydrant: that is its lateral.
fn lateral_end(work: &Work, near: &[Hit], fitting: Option<&Hit>, at: Point, zone: Option<u32>) -> Option<Tap> {
    let (touch_m, tolerance_m) = (work.settings.touch_m, work.settings.tolerance_m);
    let mut best: Option<Tap> = None;
    for hit in near {
        let main = work.lines.main(hit.line);
        let kind = work.assets.mains[main as usize].kind;
        if matches!(kind, MainKind::RawWater | MainKind::Service) || !same_zone(work, hit.line, zone) {
            continue;
        }
        let lateral = kind == MainKind::HydrantLateral;
        let within_m = if lateral {
            work.assets.reach.hydrants_m
        } else {
            tolerance_m
        };
        let stops = &work.cuts.stops[hit.line as usize];
        let ends = [
            (stops[0], stops[0].after),
            (stops[stops.len() - 1], stops[stops.len() - 1].before),
        ];
        for (stop, node) in ends {
            let distance_m = distance_m(at, work.lines.place(hit.line, stop.s));
            if work.cuts.arms[node as usize] == 1
                && distance_m <= within_m.max(touch_m)
                && best.is_none_or(|known| distance_m < known.distance_m)
            {
                best = Some(Tap { main, node, distance_m });
            }
        }
    }
    // A hydrant that stands on a main is tapped there, whatever ends nearby.
    best.filter(|tap| fitting.is_none_or(|hit| hit.distance_m > touch_m || tap.distance_m <= touch_m))
}

/// The nearest main, or the smaller one where another of a different size is about as near.
fn smaller_of_two(work: &mut Work, index: usize, at: Point, nearest: Hit, rest: &[Hit]) -> Hit {
    let diameter_m = |work: &Work, line: u32| work.assets.mains[work.lines.main(line) as usize].diameter_m;
    let Some(own) = diameter_m(work, nearest.line).filter(|_| nearest.distance_m > work.settings.touch_m) else {
        return nearest;
    };
    let limit_m = JOINED_CLOSE_BY * work.assets.reach.hydrants_m;
    let rival = rest.iter().copied().find(|hit| {
        let about = hit.distance_m - nearest.distance_m <= ABOUT_THE_SAME * hit.distance_m;
        let differs = diameter_m(work, hit.line).is_some_and(|d| (d.value - own.value).abs() > 1e-6);
        let (a, b) = (Place::On(nearest.line, nearest.s), Place::On(hit.line, hit.s));
        about && differs && work.way_m(a, b, limit_m).is_none()
    });
    let Some(rival) = rival else {
        return nearest;
    };
    let smaller = if diameter_m(work, rival.line).is_some_and(|d| d.value < own.value) {
        rival
    } else {
        nearest
    };
    let larger = if smaller.line == rival.line { nearest } else { rival };
    let (hydrant, small, large) = (
        work.assets.hydrants[index].origin,
        work.feature_of_line(smaller.line),
        work.feature_of_line(larger.line),
    );
    let message = Sentence::new().feature(hydrant).text(" stands ");
    let message = message
        .number(smaller.distance_m, Quantity::Length)
        .text(" from ")
        .feature(small);
    let message = message
        .text(" and ")
        .number(larger.distance_m, Quantity::Length)
        .text(" from ")
        .feature(large);
    let message = message.text("; the smaller, ").feature(small).text(", was taken");
    work.findings.push(
        Finding::new(Code::HydrantBetweenMains, message)
            .on(hydrant)
            .with(small)
            .with(large)
            .at(at)
            .measured((larger.distance_m - smaller.distance_m).abs(), Quantity::Length),
    );
    smaller
}

fn off_main(work: &mut Work, index: usize, at: Point, unfit: Option<&Hit>) {
    let hydrant = &work.assets.hydrants[index];
    let message = Sentence::new()
        .feature(hydrant.origin)
        .text(" has no fitting main within ");
    let mut message = message.number(work.assets.reach.hydrants_m, Quantity::Length);
    let mut finding = Finding::new(Code::HydrantOffMain, Sentence::new())
        .on(hydrant.origin)
        .at(at);
    let nearest = work.index.nearest_neighbor_with_distance_2(at);
    let nearest = nearest.map(|(stretch, d_2)| (stretch.line, d_2.sqrt()));
    if let Some((line, apart_m)) = unfit.map(|hit| (hit.line, hit.distance_m)).or(nearest) {
        let what = if unfit.is_some() {
            "; not fitting is "
        } else {
            "; the nearest main, "
        };
        message = message.text(what).feature(work.feature_of_line(line));
        message = message.text(", ").number(apart_m, Quantity::Length).text(" away");
        finding = finding
            .with(work.feature_of_line(line))
            .measured(apart_m, Quantity::Length)
            .limit(work.assets.reach.hydrants_m, "reach_m of the hydrants");
    }
    finding.message = message;
    work.findings.push(finding);
}
