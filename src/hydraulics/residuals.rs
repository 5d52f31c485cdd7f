//! How well written values satisfy the equations, recomputed from those values alone.

use super::headloss::{HeadLoss, STRAIGHT_BELOW_M};
use super::newton::largest;
use super::settings::Settings;
use crate::network::{Condition, Network, NodeIx, PartIx};

/// Flow through a node below which its continuity residual is not set against it, m3/s.
const FAINT_FLOW_M3_PER_S: f64 = 1e-9;

/// How well written values satisfy the equations, recomputed from them.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Residuals {
    /// Largest sum of flows at a node without a known head, m3/s.
    pub continuity_m3_per_s: f64,
    /// The node where it is.
    pub continuity_at: Option<NodeIx>,
    /// Largest sum of flows at a node, relative to the larger of the flow through that node and 1e-9 m3/s.
    pub continuity_relative: f64,
    /// Largest difference between head difference and head loss of a part, m.
    pub head_m: f64,
    /// The part where it is.
    pub head_at: Option<PartIx>,
    /// Largest head-loss residual relative to the larger of the part's head loss and 1e-8 m.
    pub head_relative: f64,
}

impl Residuals {
    /// Whether both residuals meet the tolerances. One that is not a number does not.
    pub fn within(&self, settings: &Settings) -> bool {
        self.head_m <= settings.head_m && self.continuity_m3_per_s <= settings.continuity_m3_per_s
    }
}

/// The residuals of heads and flows in a condition: nothing is taken from the solver but the laws.
///
/// Served nodes without a known head must close continuity; parts with two served ends must lose what separates their
/// heads. The heads of sources are held against the condition as if a part without loss led to each.
pub fn residuals(
    network: &Network,
    settings: &Settings,
    condition: &Condition,
    head_m: &[f64],
    flow_m3_per_s: &[f64],
) -> Residuals {
    let mut known = vec![false; network.served.len()];
    let mut balance = Balance::new(condition.demand_m3_per_s.clone());
    for (source, &stated) in network.sources.iter().zip(&condition.source_head_m) {
        known[source.node.at()] = true;
        balance.head_m = largest(balance.head_m, (head_m[source.node.at()] - stated).abs());
    }
    for (at, part) in network.parts.iter().enumerate() {
        if network.served[part.from.at()] && network.served[part.to.at()] {
            let law = HeadLoss::new(part, settings);
            let ends = [part.from, part.to];
            balance.part(PartIx(at as u32), ends, &law, head_m, flow_m3_per_s[at]);
        }
    }
    let free = (0..network.served.len()).filter(|&node| network.served[node] && !known[node]);
    balance.finish(free.map(|node| NodeIx(node as u32)))
}

/// Whether a residual is larger than another; not-a-number is worse than any number.
fn is_worse(one: f64, other: f64) -> bool {
    one > other || (one.is_nan() && !other.is_nan())
}

/// Sums up residuals part by part.
pub(super) struct Balance {
    out: Vec<f64>,
    through: Vec<f64>,
    head_m: f64,
    head_at: Option<PartIx>,
    head_relative: f64,
    /// The three largest head-loss residuals, m, the worst first.
    pub worst: Vec<(PartIx, f64)>,
}

impl Balance {
    /// Nothing flows yet but the demands.
    pub fn new(demand_m3_per_s: Vec<f64>) -> Self {
        Self {
            through: demand_m3_per_s.iter().map(|demand| demand.abs()).collect(),
            out: demand_m3_per_s,
            head_m: 0.0,
            head_at: None,
            head_relative: 0.0,
            worst: Vec::new(),
        }
    }

    /// Takes a part in.
    pub fn part(&mut self, part: PartIx, ends: [NodeIx; 2], law: &HeadLoss, head_m: &[f64], flow: f64) {
        let [from, to] = ends.map(NodeIx::at);
        let loss = law.head_m(flow);
        let missing = ((head_m[from] - head_m[to]) - loss).abs();
        if is_worse(missing, self.head_m) {
            self.head_m = missing;
            self.head_at = Some(part);
        }
        self.head_relative = largest(self.head_relative, missing / loss.abs().max(STRAIGHT_BELOW_M));
        self.out[from] += flow;
        self.out[to] -= flow;
        self.through[from] += flow.abs();
        self.through[to] += flow.abs();
        self.rank(part, missing);
    }

    fn rank(&mut self, part: PartIx, missing: f64) {
        let place = self.worst.iter().position(|&(_, other)| is_worse(missing, other));
        let place = place.unwrap_or(self.worst.len());
        if place < 3 {
            self.worst.insert(place, (part, missing));
            self.worst.truncate(3);
        }
    }

    /// The residuals, with continuity at the nodes without a known head.
    pub fn finish(&self, free: impl Iterator<Item = NodeIx>) -> Residuals {
        let mut found = Residuals {
            continuity_m3_per_s: 0.0,
            continuity_at: None,
            continuity_relative: 0.0,
            head_m: self.head_m,
            head_at: self.head_at,
            head_relative: self.head_relative,
        };
        for node in free {
            let missing = self.out[node.at()].abs();
            if is_worse(missing, found.continuity_m3_per_s) {
                found.continuity_m3_per_s = missing;
                found.continuity_at = Some(node);
            }
            // What flows in flows out: half the sum of all flows at the node.
            let through = (self.through[node.at()] / 2.0).max(FAINT_FLOW_M3_PER_S);
            found.continuity_relative = largest(found.continuity_relative, missing / through);
        }
        found
    }
}
