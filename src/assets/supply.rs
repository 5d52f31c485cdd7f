//! Sources that the study adds, at a node's or a main's id or at a point.

use std::path::Path;

use super::desk::Desk;
use super::settings::{AssetSettings, SourceAt, StudySource};
use super::{Basis, Drawing, Main, NodeKind, NodePoint, Point, Role, Valued};
use crate::finding::{Error, nearest};

/// Ends nearer to one another than this are one end, when the free end of a main is looked for, m.
const SAME_END_M: f64 = 0.01;

impl Desk<'_> {
    /// Adds the study's sources to the nodes. A source at a node that has a known head of its own overrides it.
    pub fn add_sources(
        &self,
        settings: &AssetSettings,
        study: &Path,
        mains: &[Main],
        nodes: &mut Vec<NodePoint>,
    ) -> Result<(), Error> {
        let own = nodes.len();
        for source in &settings.sources {
            let (at, kind) = match &source.at {
                SourceAt::Point(at) => (self.place_of_point(settings, study, *at)?, NodeKind::Source),
                SourceAt::Id(id) => self.place_of_id(study, id, mains, &mut nodes[..own])?,
            };
            nodes.push(node_of(source, at, kind));
        }
        Ok(())
    }

    fn place_of_point(&self, settings: &AssetSettings, study: &Path, at: Point) -> Result<Point, Error> {
        let layer = self.layer(settings.mains[0].common.layer);
        let place = self.plane.to_plane(&layer.crs, &[at])?[0];
        let beyond = layer.bounds().is_some_and(|bounds| is_far_outside(bounds, at));
        if beyond || place.iter().any(|axis| !axis.is_finite()) {
            return Err(Error::study(
                study,
                format!("the source at [{}, {}] lies nowhere near the mains", at[0], at[1]),
                format!(
                    "Give the point in the coordinates of the first mains layer ({}), x first.",
                    layer.crs.name
                ),
            ));
        }
        Ok(place)
    }

    fn place_of_id(
        &self,
        study: &Path,
        id: &str,
        mains: &[Main],
        nodes: &mut [NodePoint],
    ) -> Result<(Point, NodeKind), Error> {
        let named: Vec<usize> = (0..nodes.len())
            .filter(|at| {
                nodes[*at]
                    .origin
                    .is_some_and(|origin| self.names.id(origin) == Some(id))
            })
            .collect();
        let named_mains: Vec<usize> = (0..mains.len())
            .filter(|at| self.names.id(mains[*at].origin) == Some(id))
            .collect();
        match (named.as_slice(), named_mains.as_slice()) {
            ([], []) => Err(self.no_such_id(study, id, mains, nodes)),
            ([one], _) => place_of_node(study, id, &mut nodes[*one]),
            ([], [one]) => match free_end(mains, *one) {
                Some(at) => Ok((at, NodeKind::Source)),
                None => Err(not_drawn(study, id, Role::Main)),
            },
            ([], several) => repeated(study, id, several.len(), Role::Main),
            (several, _) => repeated(study, id, several.len(), Role::Node),
        }
    }

    fn no_such_id(&self, study: &Path, id: &str, mains: &[Main], nodes: &[NodePoint]) -> Error {
        let origins = nodes.iter().filter_map(|node| node.origin);
        let origins = origins.chain(mains.iter().map(|main| main.origin));
        let ids = origins.filter_map(|origin| self.names.id(origin));
        let todo = match nearest(id, ids) {
            Some(nearest) => format!("The nearest id is `{nearest}`."),
            None => "Give a node's or a main's id as the map spells it, or a point `[x, y]`.".to_string(),
        };
        let what = format!("`at = \"{id}\"` of a source is no id of a node or a main");
        Error::study(study, what, todo)
    }
}

/// The place of a node that a source is to stand on. Its own head, if it has one, counts no longer.
fn place_of_node(study: &Path, id: &str, node: &mut NodePoint) -> Result<(Point, NodeKind), Error> {
    let at = node.at.ok_or_else(|| not_drawn(study, id, Role::Node))?;
    node.head_m = None;
    let kind = match node.kind {
        NodeKind::Tank => NodeKind::Tank,
        _ => NodeKind::Source,
    };
    Ok((at, kind))
}

fn not_drawn(study: &Path, id: &str, role: Role) -> Error {
    let what = format!("the {} {id}, where a source is to stand, is not drawn", role.word());
    Error::study(study, what, "Give the point `[x, y]` instead.")
}

fn repeated<T>(study: &Path, id: &str, count: usize, role: Role) -> Result<T, Error> {
    let what = format!("`at = \"{id}\"` of a source is carried by {count} {}s", role.word());
    Err(Error::study(study, what, "Give the point `[x, y]` instead."))
}

fn node_of(source: &StudySource, at: Point, kind: NodeKind) -> NodePoint {
    NodePoint {
        origin: None,
        at: Some(at),
        kind,
        elevation_m: source.elevation_m.map(|value| Valued {
            value,
            basis: Basis::Study,
        }),
        head_m: Some(Valued {
            value: source.head_m,
            basis: Basis::Study,
        }),
        demand_m3_per_s: 0.0,
        greatest_m3_per_s: source.greatest_m3_per_s,
        zone: None,
    }
}

/// Whether a point lies farther outside bounds than they are wide and high together.
pub(super) fn is_far_outside(bounds: [f64; 4], at: Point) -> bool {
    let [min_x, min_y, max_x, max_y] = bounds;
    let slack = (max_x - min_x) + (max_y - min_y);
    let outside = |value: f64, min: f64, max: f64| value < min - slack || value > max + slack;
    outside(at[0], min_x, max_x) || outside(at[1], min_y, max_y)
}

/// The end of a main that meets no other main; its start when neither or both do.
fn free_end(mains: &[Main], index: usize) -> Option<Point> {
    let (start, end) = ends(&mains[index])?;
    let meets = |at: Point| {
        let others = mains
            .iter()
            .enumerate()
            .filter(|(other, _)| *other != index)
            .filter_map(|(_, main)| ends(main));
        others
            .flat_map(|(a, b)| [a, b])
            .any(|other| (other[0] - at[0]).hypot(other[1] - at[1]) <= SAME_END_M)
    };
    Some(if meets(start) && !meets(end) { end } else { start })
}

fn ends(main: &Main) -> Option<(Point, Point)> {
    let Drawing::Lines(parts) = &main.drawing else {
        return None;
    };
    Some((*parts.first()?.first()?, *parts.last()?.last()?))
}
