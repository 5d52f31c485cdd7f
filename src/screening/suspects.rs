//! Suspects: connections of the map that are doubtful and would change an answer if they were otherwise.
//!
//! A near miss, a bare crossing or a closed valve keeps two places apart. (Two zones have different heads for a reason, so
//! their contacts are no suspects.) Where the head on the one
//! side is much higher than on the other, and the low side is about as low as a place in trouble, the trouble is likely to
//! be the map's and not the water's: opening that spot would feed the place from the high side.

use super::Subject;
use crate::assets::{Point, ValveKind};
use crate::finding::{FeatureRef, Sentence};
use crate::hydraulics::State;
use crate::topology::{JoinKind, MapPart, ValvePlace};
use crate::units::Quantity;

/// A smaller difference of head across a doubtful spot explains nothing, m.
const LEAST_STEP_M: f64 = 3.0;
/// The low side may lie this share of the step above or below the place in trouble.
const NEAR_SHARE: f64 = 0.3;

/// A spot where the map keeps two places apart.
pub(super) struct Suspect {
    /// The feature to look at, and the other that takes part.
    pub features: [FeatureRef; 2],
    nodes: [usize; 2],
    is_valve: bool,
}

/// Every such spot of the map.
pub(super) fn suspects(subject: &Subject<'_>) -> Vec<Suspect> {
    let (assets, map) = (subject.assets, subject.map);
    let mut parts_of: Vec<Vec<&MapPart>> = vec![Vec::new(); assets.mains.len()];
    map.parts
        .iter()
        .for_each(|part| parts_of[part.main as usize].push(part));
    let nearest = |main: u32, place: Point| {
        let ends = parts_of[main as usize].iter().flat_map(|part| [part.from, part.to]);
        let far = |node: &u32| {
            let at = map.nodes[*node as usize].at;
            (at[0] - place[0]).hypot(at[1] - place[1])
        };
        ends.min_by(|a, b| far(a).total_cmp(&far(b))).map(|node| node as usize)
    };
    let apart = |kind: JoinKind| matches!(kind, JoinKind::NearMiss | JoinKind::Crossing);
    let joins = map
        .joins
        .iter()
        .filter(|join| !join.joined && apart(join.kind))
        .filter_map(|join| {
            let origin = |main: u32| assets.mains[main as usize].origin;
            Some(Suspect {
                features: [origin(join.main_a), origin(join.main_b)],
                nodes: [nearest(join.main_a, join.at)?, nearest(join.main_b, join.to)?],
                is_valve: false,
            })
        });
    let shut = assets
        .valves
        .iter()
        .zip(&map.valves)
        .filter(|(valve, _)| valve.kind == ValveKind::Gate);
    let valves = shut.filter_map(|(valve, place)| match place {
        Some(ValvePlace::Cut { main, node_a, node_b }) => Some(Suspect {
            features: [valve.origin, assets.mains[*main as usize].origin],
            nodes: [*node_a as usize, *node_b as usize],
            is_valve: true,
        }),
        _ => None,
    });
    joins.chain(valves).collect()
}

/// The spot that most likely explains a low head at a node, and the step of head across it, m.
pub(super) fn behind<'s>(suspects: &'s [Suspect], state: &State, node: usize) -> Option<(&'s Suspect, f64)> {
    let here_m = state.head_m[node];
    let steps = suspects.iter().filter_map(|suspect| {
        let [a, b] = suspect.nodes.map(|node| state.head_m[node]);
        let step_m = (a - b).abs();
        let fits = step_m >= LEAST_STEP_M && (a.min(b) - here_m).abs() <= NEAR_SHARE * step_m;
        fits.then_some((suspect, step_m))
    });
    steps.max_by(|a, b| a.1.total_cmp(&b.1))
}

impl Suspect {
    /// Adds to a sentence what to look at.
    pub fn named(&self, sentence: Sentence, step_m: f64) -> Sentence {
        let [first, other] = self.features;
        let sentence = match self.is_valve {
            true => sentence
                .text("; ")
                .feature(first)
                .text(", closed on ")
                .feature(other)
                .text(", holds back "),
            false => sentence
                .text("; ")
                .feature(first)
                .text(" and ")
                .feature(other)
                .text(", left apart, hold back "),
        };
        sentence
            .number(step_m, Quantity::Length)
            .text(" of head near by: look there first")
    }
}
