//! Node points: elevations, demands, sources and tanks stand on a node where one is near, else on the main they lie on,
//! which is cut there. A point with a demand or a known head that is on no main is said.

use super::cleaning::Work;
use super::geometry::distance_m;
use super::lines::Hit;
use super::marks::finite;
use super::web::Zone;
use crate::assets::{NodeKind, NodePoint, Point};
use crate::finding::{Code, FeatureRef, Finding, Sentence};
use crate::units::Quantity;

/// A node this close is taken before the main that the point lies on, m: it would be cut into a needless stub.
const CLOSE_M: f64 = 0.1;

/// Where a node point could stand.
#[derive(Clone, Copy)]
struct Standing {
    /// Another zone, how well it fits, and the distance in m: the least is taken.
    order: (bool, u8, f64),
    hit: Hit,
    /// A node, or else the middle of the line.
    node: Option<u32>,
}

/// Whether a node point feeds the network.
pub(super) fn feeds(point: &NodePoint) -> bool {
    point.head_m.is_some() || point.kind != NodeKind::Node
}

/// Places the node points. Counts those that stand on the network.
pub(super) fn place(work: &mut Work) -> u32 {
    let mut placed = 0;
    for index in 0..work.assets.nodes.len() {
        let node = finite(work.assets.nodes[index].at).and_then(|at| place_one(work, index, at));
        if let Some(node) = node {
            placed += 1;
            let points = &mut work.map.nodes[node as usize].points;
            if feeds(&work.assets.nodes[index]) {
                let heads = points.partition_point(|&p| feeds(&work.assets.nodes[p as usize]));
                points.insert(heads, index as u32);
            } else {
                points.push(index as u32);
            }
        }
        work.map.node_of_point.push(node);
    }
    placed
}

fn place_one(work: &mut Work, index: usize, at: Point) -> Option<u32> {
    let assets = work.assets;
    let point = &assets.nodes[index];
    let (touch_m, tolerance_m) = (
        work.settings.touch_m,
        work.settings.tolerance_m.max(work.settings.touch_m),
    );
    let hits = work.lines_near(at, tolerance_m);
    let other_zone = |hit: &Hit| match (point.zone.map(Zone::Known), work.zone_of_line(hit.line)) {
        (Some(zone), of_line @ Zone::Known(_)) => zone != of_line,
        (_, Zone::RawWater) => true,
        _ => false,
    };
    // A node before the middle of a main, what it touches before what is near, its own zone before another.
    let mut best: Option<Standing> = None;
    for &hit in &hits {
        let stops = &work.cuts.stops[hit.line as usize];
        let (from, to) = (hit.s - 2.0 * tolerance_m, hit.s + 2.0 * tolerance_m);
        let nodes = stops.iter().filter(|stop| (from..=to).contains(&stop.s)).map(|stop| {
            let apart_m = distance_m(at, work.lines.place(hit.line, stop.s));
            let class = match apart_m {
                _ if apart_m <= touch_m => 0,
                _ if apart_m <= CLOSE_M => 1,
                _ => 3,
            };
            let node = if hit.s <= stop.s { stop.before } else { stop.after };
            (apart_m, class, Some(node))
        });
        let class = if hit.distance_m <= touch_m { 2 } else { 4 };
        let middle = std::iter::once((hit.distance_m, class, None));
        for (apart_m, class, node) in nodes.chain(middle) {
            let order = (other_zone(&hit), class, apart_m);
            if apart_m <= tolerance_m && best.is_none_or(|known| order < known.order) {
                best = Some(Standing { order, hit, node });
            }
        }
    }
    match best {
        Some(Standing { node: Some(node), .. }) => Some(node),
        Some(Standing { hit, .. }) => Some(work.node_at(hit.line, hit.s)),
        None => {
            if feeds(point) || point.demand_m3_per_s > 0.0 {
                say(work, point.origin, feeds(point), at);
            }
            None
        }
    }
}

fn say(work: &mut Work, origin: Option<FeatureRef>, feeds: bool, at: Point) {
    let message = match origin {
        Some(feature) => Sentence::new().feature(feature),
        None => Sentence::new().text("a source of the study"),
    };
    let what = if feeds { "a known head" } else { "a demand" };
    let message = message.text(format!(" has {what} but lies on no main"));
    let nearest = work.index.nearest_neighbor_with_distance_2(at);
    let (message, apart_m) = match nearest {
        Some((stretch, d_2)) => {
            let message = message
                .text("; the nearest, ")
                .feature(work.feature_of_line(stretch.line));
            let message = message.text(", is ").number(d_2.sqrt(), Quantity::Length).text(" away");
            (message, Some((d_2.sqrt(), stretch.line)))
        }
        None => (message, None),
    };
    let mut finding = Finding::new(Code::NodeOffMain, message).at(at);
    finding.feature = origin;
    if let Some((apart_m, line)) = apart_m {
        finding = finding
            .with(work.feature_of_line(line))
            .measured(apart_m, Quantity::Length)
            .limit(work.settings.tolerance_m, "the tolerance");
    }
    work.findings.push(finding);
}
