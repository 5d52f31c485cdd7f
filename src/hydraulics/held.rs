//! Flow at a held head: what a hydrant can give, without guessing flows in steps.
//!
//! A flow Q drawn at the hydrant is one more unknown, and the head at the limiting node one more equation. Both ride on the
//! factor of each Newton step: the step with Q as it is, and the fall of every head per unit of Q, are two solves; Q then
//! changes by the smallest of gap over fall among the nodes that are kept, which is the first limit met as the flow rises,
//! as far as the straightened equations tell. Heads fall everywhere as Q rises, so where no step is left to make, every
//! kept node is at or above its limit and one is on it: the flow is exact and the first.

use super::newton::{Aim, Newton};
use super::solver::{Solver, SourceLimit};
use super::{NotSettled, State};
use crate::network::{Condition, NodeIx};

/// A node whose head falls less than this share of the hydrant's own is out of the hydrant's reach: no flow that the
/// hydrant could give would lower it by a measurable amount, and the rounding of its gap would decide instead.
const OUT_OF_REACH: f64 = 1e-10;

/// Last change of the flow, relative to it, at which it is at rest: the next would be about its square.
const AT_REST: f64 = 1e-8;

/// A place whose head must not fall below a limit while a hydrant is open.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Kept {
    /// The node.
    pub node: NodeIx,
    /// The least head, m.
    pub head_m: f64,
}

/// What stops a hydrant's flow.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Limit {
    /// A node reaches its least head: the hydrant's own or one elsewhere.
    Head(NodeIx),
    /// A source reaches its greatest flow (index into `Network::sources`).
    Source(u32),
    /// The node is below its least head with the hydrant shut.
    AlreadyLow(NodeIx),
    /// Nothing that the network knows of: the hydrant stands on a source.
    Nothing,
}

/// The flow at which the first limit is met as it rises from zero.
#[derive(Clone, Debug, PartialEq)]
pub struct Held {
    /// The flow, m3/s; infinite for [`Limit::Nothing`].
    pub flow_m3_per_s: f64,
    /// What stops it.
    pub limit: Limit,
    /// The network while that flow is drawn; `None` where there is none to show.
    pub state: Option<State>,
}

impl Solver {
    /// The greatest extra flow at `node` that keeps `own` there and every one of `kept` at or above its head: the exact
    /// flow at which the first of them is met as the flow rises from zero. `base` is the solution of `condition`.
    ///
    /// A source's stated greatest flow is a limit too. Where `own` is below its head in `base`, the answer is no flow and
    /// [`Limit::AlreadyLow`]; nodes of `kept` that are below theirs in `base`, are not served, or are sources, are left
    /// out of account here: the caller lists them. The hydrant's node must be served.
    ///
    /// # Errors
    /// As [`Solver::solve`].
    pub fn flow_at_held_head(
        &self,
        condition: &Condition,
        base: &State,
        own: Kept,
        kept: &[Kept],
    ) -> Result<Held, NotSettled> {
        let at = match self.to_hold(condition, base, own) {
            Ok(at) => at,
            Err(held) => return Ok(*held),
        };
        let mut aim = self.limits(condition, base, at, own, kept);
        let mut newton = self.newton(&self.equations.edges, condition, &condition.source_head_m);
        self.start_from(&mut newton, base);
        let settled = newton.settle(&self.settings, Some(&mut aim));
        if settled.is_ok() && aim.is_met(newton.drawn) {
            let flow = newton.drawn;
            let state = self.answer(&newton, settled, drawing(condition, own.node, flow))?;
            return Ok(Held {
                flow_m3_per_s: flow,
                limit: aim.limit(self),
                state: Some(state),
            });
        }
        self.flow_by_bracketing(condition, base, own, kept)
    }

    /// The same flow, found by solving at trial flows until the last digits agree. Costs many solves; it is what
    /// [`Solver::flow_at_held_head`] falls back on should its own iteration not settle, and what it is tested against.
    ///
    /// # Errors
    /// As [`Solver::solve`].
    pub fn flow_by_bracketing(
        &self,
        condition: &Condition,
        base: &State,
        own: Kept,
        kept: &[Kept],
    ) -> Result<Held, NotSettled> {
        let at = match self.to_hold(condition, base, own) {
            Ok(at) => at,
            Err(held) => return Ok(*held),
        };
        let limits = self.limits(condition, base, at, own, kept);
        let solve = |flow: f64, start: &State| {
            let mut condition = condition.clone();
            condition.demand_m3_per_s[own.node.at()] += flow;
            self.solve(&condition, Some(start))
        };
        let mut low = (0.0, limits.least_gap(self, base), base.clone());
        if low.1.0 <= 0.0 {
            return Ok(no_flow(low.1.1, Some(base.clone())));
        }
        // A flow that breaks a limit, by doubling from a litre a second; a thousand doublings pass any flow there is.
        let mut flow = 1e-3;
        let mut high = loop {
            let state = solve(flow, &low.2)?;
            let gap = limits.least_gap(self, &state);
            if gap.0 <= 0.0 {
                break (flow, gap, state);
            }
            low = (flow, gap, state);
            flow *= 2.0;
        };
        for step in 0..200 {
            let (a, b) = (low.0, high.0);
            if b - a <= 1e-14 * b {
                break;
            }
            // The secant's guess, and every third time the middle so that neither end can stall.
            let secant = a + (b - a) * low.1.0 / (low.1.0 - high.1.0);
            let width = b - a;
            let middle = if step % 3 == 2 { a + width / 2.0 } else { secant };
            let flow = middle.clamp(a + 1e-3 * width, b - 1e-3 * width);
            let state = solve(flow, &low.2)?;
            let gap = limits.least_gap(self, &state);
            if gap.0 > 0.0 {
                low = (flow, gap, state);
            } else {
                high = (flow, gap, state);
            }
        }
        Ok(Held {
            flow_m3_per_s: high.0,
            limit: high.1.1,
            state: Some(high.2),
        })
    }

    /// The number of the node to hold; or the answer that needs no solve: of a hydrant that takes no part, is too low
    /// already, or stands on a source.
    fn to_hold(&self, condition: &Condition, base: &State, own: Kept) -> Result<usize, Box<Held>> {
        let Some(at) = self.number(own.node) else {
            return Err(Box::new(no_flow(Limit::AlreadyLow(own.node), None)));
        };
        let here = base.head_m[own.node.at()];
        if here < own.head_m || here.is_nan() {
            return Err(Box::new(no_flow(Limit::AlreadyLow(own.node), Some(base.clone()))));
        }
        if at < self.equations.free {
            return Ok(at);
        }
        let limit = self.greatest.iter().find(|limit| limit.node == at);
        Err(Box::new(match limit {
            Some(limit) => Held {
                flow_m3_per_s: (limit.greatest - self.given_by(limit, condition, base)).max(0.0),
                limit: Limit::Source(limit.source),
                state: Some(base.clone()),
            },
            None => Held {
                flow_m3_per_s: f64::INFINITY,
                limit: Limit::Nothing,
                state: None,
            },
        }))
    }

    /// The flow a source gives in a state, m3/s, its own draw included.
    fn given_by(&self, limit: &SourceLimit, condition: &Condition, state: &State) -> f64 {
        let draw = condition.demand_m3_per_s[self.equations.node[limit.node].at()];
        let flows = limit.edges.iter().map(|&(edge, sign)| {
            let part = self.equations.part[edge];
            sign * state.flow_m3_per_s[part.at()]
        });
        draw + flows.sum::<f64>()
    }

    /// Everything that may stop the flow.
    fn limits<'a>(&'a self, condition: &Condition, base: &State, at: usize, own: Kept, kept: &[Kept]) -> Limits<'a> {
        let mut nodes = vec![(at, own.head_m)];
        for one in kept {
            let above = base.head_m[one.node.at()] >= one.head_m;
            match self.number(one.node) {
                Some(number) if above && number < self.equations.free => nodes.push((number, one.head_m)),
                _ => {}
            }
        }
        let draw = |limit: &SourceLimit| condition.demand_m3_per_s[self.equations.node[limit.node].at()];
        Limits {
            at,
            nodes,
            sources: self.greatest.iter().map(|limit| (limit, draw(limit))).collect(),
            binding: Binding::Node(at),
            last_change: f64::INFINITY,
        }
    }
}

fn no_flow(limit: Limit, state: Option<State>) -> Held {
    Held {
        flow_m3_per_s: 0.0,
        limit,
        state,
    }
}

fn drawing(condition: &Condition, node: NodeIx, flow: f64) -> Vec<f64> {
    let mut demand = condition.demand_m3_per_s.clone();
    demand[node.at()] += flow;
    demand
}

/// The limits that are kept while a flow is drawn.
struct Limits<'a> {
    /// The hydrant's node.
    at: usize,
    /// Nodes and their least heads, m; the hydrant's own first.
    nodes: Vec<(usize, f64)>,
    /// Sources and what is drawn at them, m3/s.
    sources: Vec<(&'a SourceLimit, f64)>,
    /// What allowed the least flow at the last step.
    binding: Binding,
    last_change: f64,
}

#[derive(Clone, Copy, PartialEq)]
enum Binding {
    Node(usize),
    Source(usize),
}

impl Aim for Limits<'_> {
    fn drawn_at(&self) -> usize {
        self.at
    }

    fn change(&mut self, newton: &Newton, to_rest: &[f64], fall: &[f64]) -> f64 {
        let mut least = f64::INFINITY;
        for &(node, level) in &self.nodes {
            if fall[node] > OUT_OF_REACH * fall[self.at] {
                let change = (newton.above(node, level) + to_rest[node]) / fall[node];
                if change < least {
                    (least, self.binding) = (change, Binding::Node(node));
                }
            }
        }
        for (place, &(limit, draw)) in self.sources.iter().enumerate() {
            let (mut given, mut rises) = (draw, 0.0);
            for &(edge, sign) in &limit.edges {
                given += sign * newton.flow_after(edge, to_rest);
                rises += sign * newton.flow_per_fall(edge, fall);
            }
            if rises > OUT_OF_REACH {
                let change = (limit.greatest - given) / rises;
                if change < least {
                    (least, self.binding) = (change, Binding::Source(place));
                }
            }
        }
        self.last_change = least.max(-newton.drawn);
        self.last_change
    }

    fn is_met(&self, drawn_m3_per_s: f64) -> bool {
        self.last_change.abs() <= AT_REST * drawn_m3_per_s.abs() + 1e-12
    }
}

impl Limits<'_> {
    fn limit(&self, solver: &Solver) -> Limit {
        match self.binding {
            Binding::Node(node) => Limit::Head(solver.equations.node[node]),
            Binding::Source(place) => Limit::Source(self.sources[place].0.source),
        }
    }

    /// How far a state is from its nearest limit, relative to nothing but sign: below zero if one is broken.
    fn least_gap(&self, solver: &Solver, state: &State) -> (f64, Limit) {
        let mut least = (f64::INFINITY, Limit::Nothing);
        for &(number, level) in &self.nodes {
            let node = solver.equations.node[number];
            let gap = state.head_m[node.at()] - level;
            if gap < least.0 {
                least = (gap, Limit::Head(node));
            }
        }
        for (limit, draw) in &self.sources {
            let flows = limit.edges.iter().map(|&(edge, sign)| {
                let part = solver.equations.part[edge];
                sign * state.flow_m3_per_s[part.at()]
            });
            let gap = limit.greatest - draw - flows.sum::<f64>();
            if gap < least.0 {
                least = (gap, Limit::Source(limit.source));
            }
        }
        least
    }
}
