//! The list of joins made: for every node each pair of mains that meet there, with how and at what distance.

use super::geometry::distance_m;
use super::lines::Lines;
use super::marks::Marks;
use super::web::Web;
use super::{Join, JoinKind};
use crate::assets::Point;

/// Something that comes to a node.
struct Arm {
    main: u32,
    rank: u32,
    spot: u32,
    at: Point,
    /// How it meets its spot, and at what distance; `None` for an end that lies on it.
    middle: Option<(JoinKind, f64)>,
}

/// Nodes with more arms than this list only the pairs with the first of them.
const MOST_ARMS: usize = 16;

/// Every pair of different mains that were joined.
pub(super) fn list(web: &Web, lines: &Lines, marks: &Marks, touch_m: f64) -> Vec<Join> {
    let mut joins = Vec::new();
    let mut arms = Vec::new();
    for spot in 0..web.spots() {
        if web.members(spot).any(|other| other < spot) {
            continue;
        }
        arms.clear();
        for member in web.members(spot) {
            arms.extend(web.ends(member).map(|end| Arm {
                main: lines.main(end.line()),
                rank: lines.rank(end.line()),
                spot: member,
                at: web.at[member as usize],
                middle: None,
            }));
            arms.extend(web.middles_of_spot(member).map(|m| Arm {
                main: lines.main(m.line),
                rank: lines.rank(m.line),
                spot: member,
                at: m.at,
                middle: Some((m.kind, m.distance_m)),
            }));
        }
        arms.sort_by_key(|arm| (arm.middle.is_some(), arm.rank));
        let firsts = if arms.len() > MOST_ARMS { 1 } else { arms.len() };
        for i in 0..firsts {
            for j in i + 1..arms.len() {
                if arms[i].main != arms[j].main {
                    joins.push(pair(&arms[i], &arms[j], marks, touch_m));
                }
            }
        }
    }
    joins
}

fn pair(a: &Arm, b: &Arm, marks: &Marks, touch_m: f64) -> Join {
    let apart_m = distance_m(a.at, b.at);
    let overshoot = [a, b].into_iter().find_map(|arm| match arm.middle {
        Some((JoinKind::Overshoot, tail_m)) => Some(tail_m),
        _ => None,
    });
    let (kind, distance_m, why) = match (overshoot, a.middle.is_some() || b.middle.is_some()) {
        (Some(tail_m), _) => (JoinKind::Overshoot, tail_m, "it runs past by less than the tolerance"),
        (None, true) if apart_m <= touch_m => (JoinKind::EndOnMiddle, apart_m, ""),
        (None, true) => (JoinKind::EndNearMiddle, apart_m, "within the tolerance of the main"),
        (None, false) if a.spot == b.spot || apart_m <= touch_m => (JoinKind::EndOnEnd, apart_m, ""),
        (None, false) if marks.lies_between(a.at, b.at, touch_m) => (
            JoinKind::EndOnPoint,
            apart_m,
            "a point feature lies between the two ends",
        ),
        (None, false) => (JoinKind::EndNearEnd, apart_m, "within the tolerance of each other"),
    };
    Join {
        kind,
        main_a: a.main,
        main_b: b.main,
        at: a.at,
        to: b.at,
        distance_m,
        joined: true,
        why: why.to_string(),
    }
}
