//! The point features of the map, as evidence for or against a join.

use rstar::RTree;
use rstar::primitives::GeomWithData;

use super::geometry::distance_m;
use crate::assets::{Assets, Point, ValveKind};

/// What a point feature is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Mark {
    /// A node point, a tank or a source.
    Node,
    /// A hydrant.
    Hydrant,
    /// A valve, shut or not.
    Valve {
        /// Whether it stands between pressure zones.
        zone: bool,
        /// Whether it is shut.
        closed: bool,
    },
}

/// The point features of the map, found by place.
pub(super) struct Marks(RTree<GeomWithData<[f64; 2], Mark>>);

impl Marks {
    /// Every node point, hydrant and valve that has a place.
    pub(super) fn new(assets: &Assets) -> Self {
        let nodes = assets.nodes.iter().map(|node| (node.at, Mark::Node));
        let hydrants = assets.hydrants.iter().map(|hydrant| (hydrant.at, Mark::Hydrant));
        let valves = assets
            .valves
            .iter()
            .filter(|v| v.kind != ValveKind::OffLine)
            .map(|valve| {
                let zone = valve.kind == ValveKind::Zone;
                let closed = valve.closed.value;
                (valve.at, Mark::Valve { zone, closed })
            });
        let all = nodes.chain(hydrants).chain(valves);
        Marks(RTree::bulk_load(
            all.filter_map(|(at, mark)| finite(at).map(|at| GeomWithData::new(at, mark)))
                .collect(),
        ))
    }

    /// The marks no farther than `within_m` from a place, with their places.
    pub(super) fn near(&self, p: Point, within_m: f64) -> impl Iterator<Item = (Point, Mark)> + '_ {
        self.0
            .locate_within_distance(p, within_m * within_m)
            .map(|found| (*found.geom(), found.data))
    }

    /// Whether an open zone valve stands here.
    pub(super) fn open_zone_valve(&self, p: Point, within_m: f64) -> bool {
        self.near(p, within_m).any(|(_, mark)| {
            matches!(
                mark,
                Mark::Valve {
                    zone: true,
                    closed: false
                }
            )
        })
    }

    /// Whether a closed valve stands here.
    pub(super) fn closed_valve(&self, p: Point, within_m: f64) -> bool {
        self.near(p, within_m)
            .any(|(_, mark)| matches!(mark, Mark::Valve { closed: true, .. }))
    }

    /// Whether something that belongs at the end of a main (a hydrant, or with `nodes` a node point) stands at `end`, and
    /// nearer to it than to `elsewhere`.
    pub(super) fn explains_end(&self, end: Point, elsewhere: Point, within_m: f64, nodes: bool) -> bool {
        self.near(end, within_m).any(|(at, mark)| {
            (mark == Mark::Hydrant || nodes && mark == Mark::Node)
                && distance_m(at, end) * 2.0 < distance_m(at, elsewhere)
        })
    }

    /// Whether a point feature lies between two places, nearer to each than they are to each other, and on neither.
    pub(super) fn lies_between(&self, a: Point, b: Point, touch_m: f64) -> bool {
        let apart = distance_m(a, b);
        self.near(a, apart).any(|(at, _)| {
            let (to_a, to_b) = (distance_m(at, a), distance_m(at, b));
            to_a > touch_m && to_b > touch_m && to_a < apart && to_b < apart
        })
    }
}

/// A place whose coordinates are numbers.
pub(super) fn finite(at: Option<Point>) -> Option<Point> {
    at.filter(|p| p[0].is_finite() && p[1].is_finite())
}
