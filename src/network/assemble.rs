//! From the pipe map to the network: every part gets a length, a bore and a friction, every node an elevation.

use std::collections::HashMap;

use super::elevation::{doubtful_elevations, node_elevations};
use super::invariants::assert_sound;
use super::{Basis, Draw, Network, NodeIx, Part, Source, Valued};
use crate::assets::{Assets, Main, MainKind, NodeKind};
use crate::finding::{Checked, Code, Finding, Sentence};
use crate::topology::PipeMap;
use crate::units::Quantity;

/// Every assumption of this room.
#[derive(Clone, Debug, PartialEq)]
pub struct AssemblySettings {
    /// The bore of a main without one when no main of the map has one, m. 150 mm: the least size that hydrants are fed
    /// by in many rules (for example WAC 246-290-230, 6 in).
    pub last_resort_diameter_m: f64,
}

impl Default for AssemblySettings {
    fn default() -> Self {
        AssemblySettings {
            last_resort_diameter_m: 0.15,
        }
    }
}

/// Builds the network that is solved. Its nodes and parts are those of the map, one for one.
pub fn assemble(assets: &Assets, map: &PipeMap, settings: &AssemblySettings) -> Checked<Network> {
    let mut findings = Vec::new();
    let main_diameter_m = diameters(assets, map, settings);
    let sources = sources(assets, map, &mut findings);
    let network = Network {
        elevation_m: node_elevations(assets, map),
        parts: parts(assets, map, &main_diameter_m),
        served: served(map, &sources),
        sources,
        draws: draws(assets, map),
        main_diameter_m,
    };
    findings.extend(doubtful_elevations(assets, map));
    findings.extend(nothing_to_go_by(&network));
    assert_sound(&network);
    Checked {
        value: network,
        findings,
    }
}

/// The bore of each main: its own; else the smallest of the mains it meets, so that the assumption errs on the side of
/// low pressure; else the commonest of the map. Services and hydrant laterals say nothing about the main they leave.
fn diameters(assets: &Assets, map: &PipeMap, settings: &AssemblySettings) -> Vec<Valued<f64>> {
    let mut smallest_at = vec![f64::INFINITY; map.nodes.len()];
    let branch = |main: &Main| matches!(main.kind, MainKind::Service | MainKind::HydrantLateral);
    for part in &map.parts {
        let main = &assets.mains[part.main as usize];
        if let Some(known) = main.diameter_m.filter(|_| !branch(main)) {
            for node in [part.from, part.to] {
                let smallest = &mut smallest_at[node as usize];
                *smallest = smallest.min(known.value);
            }
        }
    }
    let mut neighbour = vec![f64::INFINITY; assets.mains.len()];
    for part in &map.parts {
        let met = smallest_at[part.from as usize].min(smallest_at[part.to as usize]);
        let smallest = &mut neighbour[part.main as usize];
        *smallest = smallest.min(met);
    }
    let common = commonest_diameter(assets).unwrap_or(settings.last_resort_diameter_m);
    let of_main = assets.mains.iter().zip(neighbour);
    of_main
        .map(|(main, met)| {
            main.diameter_m.unwrap_or(Valued {
                value: if met.is_finite() { met } else { common },
                basis: Basis::Assumed,
            })
        })
        .collect()
}

fn commonest_diameter(assets: &Assets) -> Option<f64> {
    let mut counts: HashMap<u64, u32> = HashMap::new();
    for known in assets.mains.iter().filter_map(|main| main.diameter_m) {
        *counts.entry(known.value.to_bits()).or_default() += 1;
    }
    // Of equally common ones the smaller (bits of positive numbers sort like the numbers).
    counts
        .into_iter()
        .max_by_key(|(bits, count)| (*count, std::cmp::Reverse(*bits)))
        .map(|(bits, _)| f64::from_bits(bits))
}

fn parts(assets: &Assets, map: &PipeMap, diameter_m: &[Valued<f64>]) -> Vec<Part> {
    let mut drawn_m = vec![0.0; assets.mains.len()];
    for part in &map.parts {
        drawn_m[part.main as usize] += part.end_m - part.start_m;
    }
    map.parts
        .iter()
        .map(|part| {
            let at = part.main as usize;
            let main = &assets.mains[at];
            let drawn = part.end_m - part.start_m;
            let share = drawn / drawn_m[at];
            Part {
                from: NodeIx(part.from),
                to: NodeIx(part.to),
                length_m: main
                    .stored_length_m
                    .map_or(drawn * main.length_scale, |stored| stored * share),
                diameter_m: diameter_m[at].value,
                friction: main.friction.value,
                minor_loss_k: main.minor_loss_k * share,
            }
        })
        .collect()
}

/// The nodes with a known head. Of several points on one node the first counts; another head beside it is said.
fn sources(assets: &Assets, map: &PipeMap, findings: &mut Vec<Finding>) -> Vec<Source> {
    let mut sources: Vec<Source> = Vec::new();
    let mut at_node: HashMap<u32, usize> = HashMap::new();
    for (index, point) in assets.nodes.iter().enumerate() {
        let (Some(head_m), Some(node)) = (point.head_m, map.node_of_point[index]) else {
            continue;
        };
        if let Some(&first) = at_node.get(&node) {
            findings.extend(second_head(assets, &sources[first], index as u32));
            continue;
        }
        at_node.insert(node, sources.len());
        sources.push(Source {
            node: NodeIx(node),
            point: index as u32,
            head_m,
            tank: point.kind == NodeKind::Tank,
            greatest_m3_per_s: point.greatest_m3_per_s,
        });
    }
    sources
}

fn second_head(assets: &Assets, first: &Source, second: u32) -> Option<Finding> {
    let (kept, other) = (&assets.nodes[first.point as usize], &assets.nodes[second as usize]);
    let head_m = other.head_m.filter(|head| head.value != first.head_m.value)?;
    let mut message = Sentence::new();
    message = other
        .origin
        .map_or(message.clone().text("a source of the study"), |origin| {
            message.feature(origin)
        });
    message = message
        .text(" gives the head ")
        .number(head_m.value, Quantity::Length)
        .text(" where ");
    message = kept
        .origin
        .map_or(message.clone().text("a source of the study"), |origin| {
            message.feature(origin)
        });
    message = message
        .text(" gives ")
        .number(first.head_m.value, Quantity::Length)
        .text("; the latter counts");
    let mut finding = Finding::new(Code::HeadsDisagree, message);
    finding.feature = other.origin;
    finding.others.extend(kept.origin);
    finding.at = other.at;
    Some(finding)
}

fn draws(assets: &Assets, map: &PipeMap) -> Vec<Draw> {
    let at_points = assets.nodes.iter().zip(&map.node_of_point).filter_map(|(point, node)| {
        let demand_m3_per_s = point.demand_m3_per_s;
        node.filter(|_| demand_m3_per_s > 0.0).map(|node| Draw {
            node: NodeIx(node),
            class: None,
            demand_m3_per_s,
        })
    });
    let of_customers = assets
        .customers
        .iter()
        .zip(&map.customers)
        .filter_map(|(customer, tap)| {
            let tap = tap.filter(|_| customer.demand_m3_per_s > 0.0)?;
            Some(Draw {
                node: NodeIx(tap.node),
                class: customer.class,
                demand_m3_per_s: customer.demand_m3_per_s,
            })
        });
    at_points.chain(of_customers).collect()
}

/// Which nodes hang together with a source.
fn served(map: &PipeMap, sources: &[Source]) -> Vec<bool> {
    let mut fed = vec![false; map.piece_length_m.len()];
    for source in sources {
        fed[map.piece_of_node[source.node.at()] as usize] = true;
    }
    map.piece_of_node.iter().map(|piece| fed[*piece as usize]).collect()
}

fn nothing_to_go_by(network: &Network) -> Vec<Finding> {
    let mut findings = Vec::new();
    if network.sources.is_empty() {
        findings.push(Finding::new(
            Code::NoSource,
            "no main hangs together with a node of known head".into(),
        ));
    } else if !network.draws.iter().any(|draw| network.served[draw.node.at()]) {
        findings.push(Finding::new(
            Code::NoDemand,
            "no demand was read for any part of the network with a source".into(),
        ));
    }
    findings
}
