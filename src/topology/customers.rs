//! Customers: each goes to the nearest fitting main, and draws at the nearer end, along it, of the part it meets. Nothing is
//! cut for a customer.

use super::Tap;
use super::cleaning::Work;
use super::hydrants::fits;
use super::lines::Hit;
use super::marks::finite;
use crate::assets::Point;
use crate::finding::{Code, Finding, Sentence};
use crate::units::Quantity;

/// Distances that differ by less than this are equal, m2: then the geometry of the main decides.
const EQUAL_M2: f64 = 1e-9;

/// Assigns the customers. Counts those that have a main.
pub(super) fn assign(work: &mut Work) -> u32 {
    let mut assigned = 0;
    for index in 0..work.assets.customers.len() {
        let tap = finite(work.assets.customers[index].at).and_then(|at| assign_one(work, index, at));
        assigned += u32::from(tap.is_some());
        work.map.customers.push(tap);
    }
    assigned
}

fn assign_one(work: &mut Work, index: usize, at: Point) -> Option<Tap> {
    let customer = &work.assets.customers[index];
    let (reach_m, zone) = (work.assets.reach.customers_m, customer.zone);
    let Some(hit) = nearest_fitting(work, at, reach_m, zone) else {
        off_main(work, index, at);
        return None;
    };
    Some(Tap {
        main: work.lines.main(hit.line),
        node: nearer_end(work, hit),
        distance_m: hit.distance_m,
    })
}

fn nearest_fitting(work: &Work, at: Point, reach_m: f64, zone: Option<u32>) -> Option<Hit> {
    let mut best: Option<(f64, Hit)> = None;
    for (stretch, d_2) in work.index.nearest_neighbor_iter_with_distance_2(at) {
        let farthest = best.map_or(reach_m * reach_m, |(d_2, _)| d_2 + EQUAL_M2);
        if d_2 > farthest {
            break;
        }
        let drawn_on = work.cuts.stops[stretch.line as usize].len() > 1;
        if !drawn_on || !fits(work, stretch.line, zone) {
            continue;
        }
        let better = best.is_none_or(|(_, known)| work.lines.rank(stretch.line) < work.lines.rank(known.line));
        if better {
            best = Some((best.map_or(d_2, |(d_2, _)| d_2), work.lines.hit(stretch, at)));
        }
    }
    best.map(|(_, hit)| hit)
}

/// The node at the nearer end, along the main, of the part that a place on a line belongs to.
fn nearer_end(work: &Work, hit: Hit) -> u32 {
    let stops = &work.cuts.stops[hit.line as usize];
    let after = stops.partition_point(|stop| stop.s <= hit.s).clamp(1, stops.len() - 1);
    let (start, end) = (stops[after - 1], stops[after]);
    let (to_start, to_end) = ((hit.s - start.s).max(0.0), (end.s - hit.s).max(0.0));
    let (a, b) = (start.after, end.before);
    let place = |node: u32| work.map.nodes[node as usize].at;
    // In the very middle the place decides, so that the direction a main is drawn in does not.
    let first = match to_start.total_cmp(&to_end) {
        _ if (to_start - to_end).abs() < 1e-6 => (place(a)[0], place(a)[1]) <= (place(b)[0], place(b)[1]),
        order => order.is_lt(),
    };
    if first { a } else { b }
}

fn off_main(work: &mut Work, index: usize, at: Point) {
    let customer = &work.assets.customers[index];
    let reach_m = work.assets.reach.customers_m;
    let message = Sentence::new()
        .feature(customer.origin)
        .text(" has no fitting main within ");
    let message = message.number(reach_m, Quantity::Length);
    let mut finding = Finding::new(Code::CustomerOffMain, message).on(customer.origin).at(at);
    if let Some((stretch, d_2)) = work.index.nearest_neighbor_with_distance_2(at) {
        finding = finding
            .with(work.feature_of_line(stretch.line))
            .measured(d_2.sqrt(), Quantity::Length)
            .limit(reach_m, "reach_m of the customers");
    }
    work.findings.push(finding);
}
