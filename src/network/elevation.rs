//! Elevations: known at some nodes, interpolated along the mains at the others.
//!
//! The interpolated elevations are those that make every unknown node the mean of its neighbours, weighted by one over
//! the length between them. Along a chain of mains between two known nodes that is the straight line; beyond the last
//! known node it is level. A piece of the network without any known elevation stays unknown.

use super::{Basis, Valued};
use crate::assets::Assets;
use crate::finding::{Code, Finding, Sentence};
use crate::topology::{PipeMap, ValvePlace};
use crate::units::Quantity;

/// Two nodes on one spot on either side of a shut valve share their ground: joined by this length, m.
const ACROSS_VALVE_M: f64 = 0.01;
/// Relative change of the largest residual at which the interpolation stops.
const SETTLED: f64 = 1e-10;
/// A known elevation this far from all its neighbours is doubted, m.
const DOUBT_STEP_M: f64 = 30.0;
/// ... if the ground would have to be this steep (rise over run) on the way.
const DOUBT_SLOPE: f64 = 0.5;
/// Nodes looked at around one for its known neighbours.
const LOOKED_AT_MOST: usize = 24;

/// The elevation of each node: read, interpolated, or unknown.
pub(super) fn node_elevations(assets: &Assets, map: &PipeMap) -> Vec<Option<Valued<f64>>> {
    let known = known_elevations(assets, map);
    let ground = Ground::new(map);
    let fixed: Vec<bool> = known.iter().map(Option::is_some).collect();
    let mut reached = fixed.clone();
    let mut guess_m: Vec<f64> = known
        .iter()
        .map(|elevation| elevation.map_or(0.0, |elevation| elevation.value))
        .collect();
    ground.spread(&mut reached, &mut guess_m);
    ground.settle(&fixed, &reached, &mut guess_m);
    let of_node = known.into_iter().zip(reached).zip(guess_m);
    of_node
        .map(|((known, reached), value)| {
            known.or_else(|| {
                reached.then_some(Valued {
                    value,
                    basis: Basis::Interpolated,
                })
            })
        })
        .collect()
}

/// The elevation read at each node: of its first point that has one.
fn known_elevations(assets: &Assets, map: &PipeMap) -> Vec<Option<Valued<f64>>> {
    let of = |node: &crate::topology::MapNode| node.points.iter().find_map(|at| assets.nodes[*at as usize].elevation_m);
    map.nodes.iter().map(of).collect()
}

/// Neighbours of each node with the weight of the way to them.
struct Ground {
    start: Vec<u32>,
    neighbour: Vec<(u32, f64)>,
}

impl Ground {
    fn new(map: &PipeMap) -> Ground {
        let along = map.parts.iter().map(|part| {
            (
                part.from,
                part.to,
                1.0 / (part.end_m - part.start_m).max(ACROSS_VALVE_M),
            )
        });
        let across = map.valves.iter().filter_map(|place| match place {
            Some(ValvePlace::Cut { node_a, node_b, .. }) => Some((*node_a, *node_b, 1.0 / ACROSS_VALVE_M)),
            _ => None,
        });
        let ways: Vec<(u32, u32, f64)> = along.chain(across).collect();
        let mut start = vec![0u32; map.nodes.len() + 1];
        for (a, b, _) in &ways {
            start[*a as usize + 1] += 1;
            start[*b as usize + 1] += 1;
        }
        for node in 0..map.nodes.len() {
            start[node + 1] += start[node];
        }
        let mut next = start.clone();
        let mut neighbour = vec![(0, 0.0); 2 * ways.len()];
        for (a, b, weight) in ways {
            for (from, to) in [(a, b), (b, a)] {
                neighbour[next[from as usize] as usize] = (to, weight);
                next[from as usize] += 1;
            }
        }
        Ground { start, neighbour }
    }

    fn around(&self, node: usize) -> &[(u32, f64)] {
        &self.neighbour[self.start[node] as usize..self.start[node + 1] as usize]
    }

    /// Carries the nearest known elevation (by hops) to every node that can be reached: where the settling starts from.
    fn spread(&self, reached: &mut [bool], elevation_m: &mut [f64]) {
        let mut queue: std::collections::VecDeque<u32> = (0..reached.len() as u32)
            .filter(|node| reached[*node as usize])
            .collect();
        while let Some(node) = queue.pop_front() {
            for &(to, _) in self.around(node as usize) {
                if !reached[to as usize] {
                    reached[to as usize] = true;
                    elevation_m[to as usize] = elevation_m[node as usize];
                    queue.push_back(to);
                }
            }
        }
    }

    /// The known elevations next to a node, m, and the way to each along the mains, m. Looks a few nodes far.
    fn next_known(&self, node: usize, known: &[Option<Valued<f64>>]) -> Vec<(f64, f64)> {
        let mut found = Vec::new();
        let mut seen = vec![node];
        let mut open = vec![(node, 0.0)];
        while let Some((at, way_m)) = open.pop() {
            for &(to, weight) in self.around(at) {
                let (to, way_m) = (to as usize, way_m + 1.0 / weight);
                if seen.contains(&to) || seen.len() > LOOKED_AT_MOST {
                    continue;
                }
                seen.push(to);
                match known[to] {
                    Some(there) => found.push((there.value, way_m)),
                    None => open.push((to, way_m)),
                }
            }
        }
        found
    }

    /// Conjugate gradients with the diagonal as preconditioner (Hestenes & Stiefel 1952) on the weighted means.
    fn settle(&self, fixed: &[bool], reached: &[bool], elevation_m: &mut [f64]) {
        let free: Vec<usize> = (0..fixed.len())
            .filter(|node| reached[*node] && !fixed[*node])
            .collect();
        let weight: Vec<f64> = free
            .iter()
            .map(|node| self.around(*node).iter().map(|(_, weight)| weight).sum())
            .collect();
        let n = fixed.len();
        let (mut residual, mut direction) = (vec![0.0; n], vec![0.0; n]);
        let mut energy = 0.0;
        for (&node, weight) in free.iter().zip(&weight) {
            let pull: f64 = self
                .around(node)
                .iter()
                .map(|(to, w)| w * (elevation_m[*to as usize] - elevation_m[node]))
                .sum();
            residual[node] = pull;
            direction[node] = pull / weight;
            energy += pull * pull / weight;
        }
        let first = energy;
        for _ in 0..free.len() + 1 {
            if energy <= first * SETTLED * SETTLED {
                break;
            }
            let image = |node: usize| -> f64 {
                self.around(node)
                    .iter()
                    .map(|(to, w)| w * (direction[node] - direction[*to as usize]))
                    .sum()
            };
            let images: Vec<f64> = free.iter().map(|node| image(*node)).collect();
            let curvature: f64 = free
                .iter()
                .zip(&images)
                .map(|(node, image)| direction[*node] * image)
                .sum();
            let step = energy / curvature;
            let mut next = 0.0;
            for ((&node, image), weight) in free.iter().zip(&images).zip(&weight) {
                elevation_m[node] += step * direction[node];
                residual[node] -= step * image;
                next += residual[node] * residual[node] / weight;
            }
            for (&node, weight) in free.iter().zip(&weight) {
                direction[node] = residual[node] / weight + next / energy * direction[node];
            }
            energy = next;
        }
    }
}

/// Known elevations far from all of their known neighbours: a cliff that the ground is unlikely to have. Neighbours are the
/// next known ones along the mains, across nodes without an elevation.
pub(super) fn doubtful_elevations(assets: &Assets, map: &PipeMap) -> Vec<Finding> {
    let known = known_elevations(assets, map);
    let ground = Ground::new(map);
    let mut findings = Vec::new();
    for (node, own) in known.iter().enumerate() {
        let Some(own) = own else { continue };
        let near = ground.next_known(node, &known);
        let cliff = |(there, run_m): &(f64, f64)| {
            let rise_m = (own.value - there).abs();
            rise_m > DOUBT_STEP_M && rise_m > DOUBT_SLOPE * run_m
        };
        let heights = near.iter().map(|near| near.0);
        let spread_m =
            heights.clone().fold(f64::NEG_INFINITY, f64::max) - heights.clone().fold(f64::INFINITY, f64::min);
        // Two neighbours that agree outvote one that does not.
        if near.len() >= 2 && near.iter().all(cliff) && spread_m < DOUBT_STEP_M / 2.0 {
            let mean_m = heights.sum::<f64>() / near.len() as f64;
            findings.extend(doubtful(assets, &map.nodes[node], own.value, mean_m));
        }
    }
    findings
}

fn doubtful(assets: &Assets, node: &crate::topology::MapNode, own_m: f64, around_m: f64) -> Option<Finding> {
    let origin = node.points.iter().find_map(|at| assets.nodes[*at as usize].origin)?;
    let message = Sentence::new()
        .feature(origin)
        .text(" has the elevation ")
        .number(own_m, Quantity::Length)
        .text(" where its neighbours have about ")
        .number(around_m, Quantity::Length);
    Some(
        Finding::new(Code::ElevationDoubtful, message)
            .on(origin)
            .at(node.at)
            .measured(own_m, Quantity::Length),
    )
}
