//! The equations of a network: its served nodes and parts under numbers of their own, in an order that is fast to solve.

use std::f64::consts::PI;

use super::headloss::HeadLoss;
use super::linear::{Analysis, elimination_order};
use super::settings::Settings;
use crate::network::{Network, NodeIx, Part, PartIx};

/// No number.
pub(super) const NONE: u32 = u32::MAX;
/// Velocity whose mean slope a cold start is made with, m/s: common practice for the flow of mains by day.
const USUAL_VELOCITY_M_PER_S: f64 = 0.5;

/// The parts that take part, in an order in which neighbours are near.
#[derive(Clone, Default)]
pub(super) struct Edges {
    /// Numbers of the nodes at the start and the end.
    pub ends: Vec<[u32; 2]>,
    /// The law of each.
    pub law: Vec<HeadLoss>,
    /// Which conductance of the matrix it adds to; [`NONE`] where an end has a known head.
    pub slot: Vec<u32>,
    /// Slope for a cold start, m/(m3/s).
    pub start_slope: Vec<f64>,
}

/// What does not change from one condition to another.
pub(super) struct Equations {
    /// How many nodes have no known head. They come first, in the order they are eliminated in; then the sources.
    pub free: usize,
    /// The network's node under each number.
    pub node: Vec<NodeIx>,
    /// The number of each of the network's nodes; [`NONE`] where it is not served.
    pub number: Vec<u32>,
    /// The parts that are solved for: both ends served, and not the same node.
    pub edges: Edges,
    /// The network's part of each edge.
    pub part: Vec<PartIx>,
    /// Served parts whose two ends are one node: no water flows in them.
    pub rings: Vec<PartIx>,
    /// How many of the network's parts there are.
    pub parts: usize,
    /// How many different pairs of nodes without known heads have parts between them.
    pub pairs: usize,
    /// The pattern of the matrix and of its factor.
    pub analysis: Analysis,
}

impl Equations {
    /// Numbers a network and analyses its pattern.
    pub fn new(network: &Network, settings: &Settings) -> Self {
        let (mut node, mut number) = number_nodes(network);
        let free = node.len() - network.sources.len();
        order_nodes(network, free, &mut node, &mut number);

        let mut part = Vec::new();
        let mut rings = Vec::new();
        for (at, one) in network.parts.iter().enumerate() {
            let [a, b] = numbered(&number, one);
            match (a, b) {
                (NONE, _) | (_, NONE) => {}
                _ if a == b => rings.push(PartIx(at as u32)),
                _ => part.push(PartIx(at as u32)),
            }
        }
        part.sort_by_key(|part| {
            let [a, b] = numbered(&number, &network.parts[part.at()]);
            [a.min(b), a.max(b)]
        });
        let ends: Vec<[u32; 2]> = part
            .iter()
            .map(|part| numbered(&number, &network.parts[part.at()]))
            .collect();
        let pairs = pairs_between(&ends, free as u32);
        let mut edges = Edges {
            slot: slots(&ends, &pairs, free as u32),
            ends,
            ..Default::default()
        };
        for part in &part {
            let part = &network.parts[part.at()];
            let law = HeadLoss::new(part, settings);
            let usual = PI / 4.0 * part.diameter_m * part.diameter_m * USUAL_VELOCITY_M_PER_S;
            edges.start_slope.push(law.head_m(usual) / usual);
            edges.law.push(law);
        }
        Self {
            free,
            node,
            number,
            edges,
            part,
            rings,
            parts: network.parts.len(),
            pairs: pairs.len(),
            analysis: Analysis::new(free, &pairs),
        }
    }
}

fn numbered(number: &[u32], part: &Part) -> [u32; 2] {
    [number[part.from.at()], number[part.to.at()]]
}

/// The served nodes without a known head, as they come; then the sources, in their order.
fn number_nodes(network: &Network) -> (Vec<NodeIx>, Vec<u32>) {
    let mut is_source = vec![false; network.served.len()];
    for source in &network.sources {
        is_source[source.node.at()] = true;
    }
    let free = (0..network.served.len()).filter(|&node| network.served[node] && !is_source[node]);
    let mut node: Vec<NodeIx> = free.map(|node| NodeIx(node as u32)).collect();
    node.extend(network.sources.iter().map(|source| source.node));
    let mut number = vec![NONE; network.served.len()];
    for (at, node) in node.iter().enumerate() {
        number[node.at()] = at as u32;
    }
    (node, number)
}

/// Renumbers the nodes without known heads by the order they are eliminated in.
fn order_nodes(network: &Network, free: usize, node: &mut [NodeIx], number: &mut [u32]) {
    let ends: Vec<[u32; 2]> = network.parts.iter().map(|part| numbered(number, part)).collect();
    let order = elimination_order(free, &pairs_between(&ends, free as u32));
    let given = node.to_vec();
    for (at, &before) in order.iter().enumerate() {
        node[at] = given[before as usize];
        number[node[at].at()] = at as u32;
    }
}

/// The different pairs of nodes without known heads: smaller number first, sorted.
fn pairs_between(ends: &[[u32; 2]], free: u32) -> Vec<[u32; 2]> {
    let inside = ends.iter().filter(|[a, b]| a != b && *a < free && *b < free);
    let mut pairs: Vec<[u32; 2]> = inside.map(|&[a, b]| [a.min(b), a.max(b)]).collect();
    pairs.sort_unstable();
    pairs.dedup();
    pairs
}

fn slots(ends: &[[u32; 2]], pairs: &[[u32; 2]], free: u32) -> Vec<u32> {
    let slot = |&[a, b]: &[u32; 2]| {
        if a >= free || b >= free {
            return NONE;
        }
        let found = pairs.binary_search(&[a.min(b), a.max(b)]);
        found.expect("the pairs were made from the same ends") as u32
    };
    ends.iter().map(slot).collect()
}
