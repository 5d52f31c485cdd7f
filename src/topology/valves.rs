//! Valves. A closed one cuts its main at its own point; an open one changes nothing.
//!
//! On a node of two mains it cuts between them. On a node of three or more it must name the main it shuts; without that
//! nothing is cut, and it is said: each choice would give another network. So it is where the named main runs through.

use super::ValvePlace;
use super::cleaning::Work;
use super::cutting::{Stop, one_place};
use super::lines::Hit;
use super::marks::finite;
use crate::assets::{NamedMain, Point, ValveKind};
use crate::finding::{Code, FeatureRef, Finding, Sentence, Severity};
use crate::units::Quantity;

/// A valve this close to a node, along its main, stands on it, m.
const ON_NODE_M: f64 = 0.02;

/// Cuts in the closed valves. Counts the cuts made.
pub(super) fn cut_in(work: &mut Work) -> u32 {
    let mut cuts = 0;
    for index in 0..work.assets.valves.len() {
        let place = match finite(work.assets.valves[index].at) {
            Some(at) => place_one(work, index, at),
            None => None,
        };
        if let Some(ValvePlace::Cut { main, node_a, .. }) = place {
            cuts += 1;
            // A zone valve is shut as a rule: nothing to say.
            if work.assets.valves[index].kind == ValveKind::Gate {
                say_closed(work, index, main, node_a);
            }
        }
        work.map.valves.push(place);
    }
    cuts
}

fn say_closed(work: &mut Work, index: usize, main: u32, node: u32) {
    let (valve, main) = (work.assets.valves[index].origin, work.feature(main));
    let message = Sentence::new()
        .feature(valve)
        .text(" is closed and cuts ")
        .feature(main);
    let at = work.map.nodes[node as usize].at;
    work.findings
        .push(Finding::new(Code::ValveClosed, message).on(valve).with(main).at(at));
}

fn place_one(work: &mut Work, index: usize, at: Point) -> Option<ValvePlace> {
    let assets = work.assets;
    let valve = &assets.valves[index];
    if valve.kind == ValveKind::OffLine {
        return Some(ValvePlace::NoEffect);
    }
    let hits = work.lines_near(at, assets.reach.valves_m);
    let closed = valve.closed.value;
    let severity = if closed { Severity::Warning } else { Severity::Note };
    let Some(&nearest) = hits.first() else {
        let message = Sentence::new().feature(valve.origin).text(" has no main within ");
        let message = message.number(assets.reach.valves_m, Quantity::Length);
        let finding = Finding::new(Code::ValveOffMain, message).on(valve.origin).at(at);
        work.findings.push(finding.severity(severity));
        return closed.then_some(ValvePlace::Unplaced);
    };
    let named = match &valve.main {
        None => None,
        Some(NamedMain::Known(mains)) => {
            let hit = hits.iter().find(|hit| names(work, mains, hit.line)).copied();
            if hit.is_none() {
                let feature = mains.first().map(|&main| work.feature(main));
                main_unknown(work, valve.origin, at, feature, None, severity);
            }
            hit
        }
        Some(NamedMain::Unknown(id)) => {
            main_unknown(work, valve.origin, at, None, Some(id), severity);
            None
        }
    };
    if !closed {
        return Some(ValvePlace::NoEffect);
    }
    let hit = named.unwrap_or(nearest);
    let (stop, off) = work.nearest_stop(hit.line, hit.s);
    if off <= ON_NODE_M.max(work.settings.touch_m) {
        return Some(on_node(work, valve.origin, at, hit, stop, named.is_some(), &hits));
    }
    // On the very spot where two mains cross it could shut either.
    let mut others = hits.iter().filter(|other| other.line != hit.line);
    let touch_m = work.settings.touch_m;
    let crossing = others
        .find(|other| other.distance_m <= touch_m && hit.distance_m <= touch_m)
        .copied();
    if let (None, Some(crossing)) = (named, crossing) {
        at_meeting(work, valve.origin, at, &[hit, crossing], 2, None);
        return Some(ValvePlace::Unplaced);
    }
    Some(cut_line(work, hit))
}

/// Whether a line belongs to one of the mains, or was kept for one that lies on it.
fn names(work: &Work, mains: &[u32], line: u32) -> bool {
    let main = work.lines.main(line);
    // Copies stand in rising order.
    let kept_for = |named: u32| {
        let copies = &work.map.same_as;
        let first = copies.partition_point(|&(copy, _)| copy < named);
        copies[first..]
            .iter()
            .take_while(|&&(copy, _)| copy == named)
            .any(|&(_, kept)| kept == main)
    };
    mains.contains(&main) || mains.iter().any(|&named| kept_for(named))
}

fn main_unknown(
    work: &mut Work,
    valve: FeatureRef,
    at: Point,
    far: Option<FeatureRef>,
    id: Option<&str>,
    severity: Severity,
) {
    let message = Sentence::new().feature(valve).text(" names ");
    let message = match (far, id) {
        (Some(main), _) => message.feature(main).text(", which is not within reach"),
        (None, Some(id)) => message.text(format!("main {id}, which is not in the map")),
        (None, None) => message.text("a main that takes no part"),
    };
    let finding = Finding::new(Code::ValveMainUnknown, message).on(valve).at(at);
    let finding = match far {
        Some(main) => finding.with(main),
        None => finding,
    };
    work.findings.push(finding.severity(severity));
}

/// Cuts a line between its nodes.
fn cut_line(work: &mut Work, hit: Hit) -> ValvePlace {
    let place = work.lines.place(hit.line, hit.s);
    let (before, after) = (work.new_node(place), work.new_node(place));
    work.cuts.arms[before as usize] = 1;
    work.cuts.arms[after as usize] = 1;
    work.insert_stop(
        hit.line,
        Stop {
            s: hit.s,
            before,
            after,
        },
    );
    ValvePlace::Cut {
        main: work.lines.main(hit.line),
        node_a: before,
        node_b: after,
    }
}

fn on_node(
    work: &mut Work,
    valve: FeatureRef,
    at: Point,
    hit: Hit,
    stop: usize,
    named: bool,
    hits: &[Hit],
) -> ValvePlace {
    let main = work.lines.main(hit.line);
    let stops = &work.cuts.stops[hit.line as usize];
    let Stop { before, after, .. } = stops[stop];
    let (first, last) = (stop == 0, stop + 1 == stops.len());
    if before != after {
        return ValvePlace::Cut {
            main,
            node_a: before,
            node_b: after,
        };
    }
    match work.cuts.arms[before as usize] {
        0 | 1 => match other_node_here(work, hit.line, before, hits) {
            // Two zones end here on one spot and were kept apart: that is what the valve does.
            Some(other) => ValvePlace::Cut {
                main,
                node_a: if first { other } else { before },
                node_b: if first { before } else { other },
            },
            None => ValvePlace::NoEffect,
        },
        2 => detach(work, hit.line, stop),
        _ if named && (first || last) => detach(work, hit.line, stop),
        arms => {
            at_meeting(work, valve, at, hits, arms, named.then_some(main));
            ValvePlace::Unplaced
        }
    }
}

/// Another node on the same spot that is not joined to this one.
fn other_node_here(work: &Work, line: u32, node: u32, hits: &[Hit]) -> Option<u32> {
    let at = work.map.nodes[node as usize].at;
    let within_m = ON_NODE_M.max(work.settings.tolerance_m);
    hits.iter().filter(|hit| hit.line != line).find_map(|hit| {
        let (stop, _) = work.nearest_stop(hit.line, hit.s);
        let other = work.cuts.stops[hit.line as usize][stop].before;
        (other != node && one_place(work.map.nodes[other as usize].at, at, within_m)).then_some(other)
    })
}

/// Takes a line off the node at one of its stops: from there to its end, or to its start when the stop is its end.
fn detach(work: &mut Work, line: u32, stop: usize) -> ValvePlace {
    let stops = &work.cuts.stops[line as usize];
    let (old, last) = (stops[stop].before, stop + 1 == stops.len());
    let first = stop == 0;
    let node = work.new_node(work.map.nodes[old as usize].at);
    work.cuts.arms[node as usize] = 1;
    work.cuts.arms[old as usize] -= 1;
    let stop = &mut work.cuts.stops[line as usize][stop];
    let main = work.lines.main(line);
    if last && !first {
        *stop = Stop {
            before: node,
            after: node,
            ..*stop
        };
        ValvePlace::Cut {
            main,
            node_a: node,
            node_b: old,
        }
    } else {
        // At its start the whole line goes to the new node; in its middle only what comes after.
        stop.after = node;
        if first {
            stop.before = node;
        }
        ValvePlace::Cut {
            main,
            node_a: old,
            node_b: node,
        }
    }
}

/// Says that a closed valve shuts nothing: it names no main, or one that runs through the node and could be shut on either side.
fn at_meeting(work: &mut Work, valve: FeatureRef, at: Point, hits: &[Hit], mains: u32, through: Option<u32>) {
    let message = Sentence::new()
        .feature(valve)
        .text(format!(" is closed and stands where {mains} mains meet; "));
    let message = match through {
        Some(main) => message
            .feature(work.feature(main))
            .text(", which it names, runs through: on which side it shuts is not known"),
        None => message.text("it was not said which one it shuts"),
    };
    let mut finding = Finding::new(Code::ValveOnNode, message).on(valve).at(at);
    for hit in hits
        .iter()
        .filter(|hit| hit.distance_m <= hits[0].distance_m + ON_NODE_M)
    {
        let main = work.feature_of_line(hit.line);
        if !finding.others.contains(&main) {
            finding.others.push(main);
        }
    }
    work.findings.push(finding);
}
