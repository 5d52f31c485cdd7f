//! The solver's face: a network prepared once, a condition asked, a state answered.

use super::equations::{Edges, Equations, NONE};
use super::newton::{Newton, Stopped};
use super::residuals::Balance;
use super::{NotSettled, Residuals, Settings, State};
use crate::network::{Condition, Network, NodeIx};

/// Solves conditions of one network. The symbolic work is done once; a solver is shared by reference between threads, and
/// each solve has its own numbers.
pub struct Solver {
    pub(super) settings: Settings,
    pub(super) equations: Equations,
    /// The sources' greatest flows, m3/s, and the edges at each, where one is stated.
    pub(super) greatest: Vec<SourceLimit>,
}

/// A source with a stated greatest flow.
pub(super) struct SourceLimit {
    /// Which of the network's sources.
    pub source: u32,
    /// Its number among the equations' nodes.
    pub node: usize,
    /// m3/s.
    pub greatest: f64,
    /// The edges at it, and the sign of the flow that leaves it.
    pub edges: Vec<(usize, f64)>,
}

impl Solver {
    /// Prepares a network.
    pub fn new(network: &Network, settings: Settings) -> Solver {
        let equations = Equations::new(network, &settings);
        let greatest = source_limits(network, &equations);
        Solver {
            settings,
            equations,
            greatest,
        }
    }

    /// Solves a condition, from another state of the same network if one is at hand.
    ///
    /// Only served nodes, and parts with both ends served, take part; the others come back as NaN. Every served node must
    /// hang together with a source.
    ///
    /// # Errors
    /// The worst three parts when the residuals do not reach their tolerances.
    pub fn solve(&self, condition: &Condition, start: Option<&State>) -> Result<State, NotSettled> {
        let mut newton = self.newton(&self.equations.edges, condition, &condition.source_head_m);
        match start {
            Some(state) => self.start_from(&mut newton, state),
            None => newton.start_cold(),
        }
        let settled = newton.settle(&self.settings, None);
        self.answer(&newton, settled, condition.demand_m3_per_s.clone())
    }

    /// Room for a solve of a condition, its demands filled in.
    pub(super) fn newton<'a>(&'a self, edges: &'a Edges, condition: &Condition, known_head_m: &[f64]) -> Newton<'a> {
        let mut newton = Newton::new(&self.equations, edges, self.settings.factoring, known_head_m);
        for (demand, node) in newton.demand.iter_mut().zip(&self.equations.node) {
            *demand = condition.demand_m3_per_s[node.at()];
        }
        newton
    }

    /// Starts from a state's flows and heads; what it does not know starts from nothing.
    pub(super) fn start_from(&self, newton: &mut Newton, state: &State) {
        for (flow, part) in newton.flow.iter_mut().zip(&self.equations.part) {
            *flow = finite_or(state.flow_m3_per_s[part.at()], 0.0);
        }
        let free = self.equations.node[..self.equations.free].iter();
        for (head, node) in newton.head.iter_mut().zip(free) {
            *head = finite_or(state.head_m[node.at()], *head);
        }
        newton.start_warm();
    }

    /// Puts an answer under the network's own numbers and proves it: `demand` is what each node draws, m3/s.
    pub(super) fn answer(
        &self,
        newton: &Newton,
        settled: Result<u32, Stopped>,
        demand: Vec<f64>,
    ) -> Result<State, NotSettled> {
        let equations = &self.equations;
        let mut head_m = vec![f64::NAN; equations.number.len()];
        for (node, &head) in equations.node.iter().zip(&newton.head) {
            head_m[node.at()] = head;
        }
        let mut flow_m3_per_s = vec![f64::NAN; equations.parts];
        for (part, &flow) in equations.part.iter().zip(&newton.flow) {
            flow_m3_per_s[part.at()] = flow;
        }
        for ring in &equations.rings {
            flow_m3_per_s[ring.at()] = 0.0;
        }
        let (residuals, worst) = self.prove(&head_m, &flow_m3_per_s, demand);
        let (steps, settled) = match settled {
            Ok(steps) => (steps, true),
            Err(stopped) => (stopped.steps, false),
        };
        if settled && residuals.within(&self.settings) {
            Ok(State {
                head_m,
                flow_m3_per_s,
                residuals,
                steps,
            })
        } else {
            Err(NotSettled {
                residuals,
                worst,
                steps,
            })
        }
    }

    /// Residuals recomputed from the values that are returned.
    fn prove(&self, head_m: &[f64], flow: &[f64], demand: Vec<f64>) -> (Residuals, Vec<(crate::network::PartIx, f64)>) {
        let equations = &self.equations;
        let mut balance = Balance::new(demand);
        let laws = equations.edges.ends.iter().zip(&equations.edges.law);
        for (part, (&[a, b], law)) in equations.part.iter().zip(laws) {
            let ends = [equations.node[a as usize], equations.node[b as usize]];
            balance.part(*part, ends, law, head_m, flow[part.at()]);
        }
        let residuals = balance.finish(equations.node[..equations.free].iter().copied());
        (residuals, balance.worst)
    }

    /// The number of a node, if it takes part.
    pub(super) fn number(&self, node: NodeIx) -> Option<usize> {
        let number = self.equations.number[node.at()];
        (number != NONE).then_some(number as usize)
    }
}

fn finite_or(value: f64, other: f64) -> f64 {
    if value.is_finite() { value } else { other }
}

fn source_limits(network: &Network, equations: &Equations) -> Vec<SourceLimit> {
    let mut found = Vec::new();
    for (source, stated) in network.sources.iter().enumerate() {
        let Some(greatest) = stated.greatest_m3_per_s else {
            continue;
        };
        let node = equations.free + source;
        let mut edges = Vec::new();
        for (edge, &[a, b]) in equations.edges.ends.iter().enumerate() {
            if a as usize == node {
                edges.push((edge, 1.0));
            } else if b as usize == node {
                edges.push((edge, -1.0));
            }
        }
        found.push(SourceLimit {
            source: source as u32,
            node,
            greatest,
            edges,
        });
    }
    found
}
