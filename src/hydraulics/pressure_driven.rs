//! Pressure-driven demand: what is delivered where the full demand cannot be.
//!
//! Each tap is a part to the open, whose law is the square root of head between two heads (Wagner, Shamir & Marks 1988);
//! the whole stays one convex minimisation. The two ends of the law are kinks, which Newton's method crosses badly while
//! the law beyond them is steep. It is made steep by stages, each started from the one before.

use super::equations::{Edges, NONE};
use super::headloss::HeadLoss;
use super::newton::Stopped;
use super::solver::Solver;
use super::{NotSettled, State};
use crate::network::{Condition, NodeIx};

/// Slope of a tap's law beyond its two ends at the last stage, m/(m3/s): 100 m of head more moves the flow by 1e-11 m3/s, a
/// hundredth of the continuity tolerance.
const STEEPEST: f64 = 1e13;
/// How much steeper than at full flow the first stage is beyond the ends, and each stage than the one before.
const FIRST_TIMES: f64 = 10.0;
const STAGE_TIMES: f64 = 100.0;

/// A node whose draw depends on its head.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Tap {
    /// The node.
    pub node: NodeIx,
    /// Head up to which nothing is delivered, m.
    pub least_m: f64,
    /// Head from which the whole demand is delivered, m; above `least_m`.
    pub full_m: f64,
}

/// A solution, and what is delivered in it.
#[derive(Clone, Debug, PartialEq)]
pub struct Delivered {
    /// Heads and flows; the residuals are those with the delivered flows.
    pub state: State,
    /// What each node gets, m3/s.
    pub delivered_m3_per_s: Vec<f64>,
}

impl Solver {
    /// Solves a condition in which the demands at `taps` are delivered only as far as their heads allow: nothing up to the
    /// least head, all from the full head on, and between them q = demand sqrt((H - least) / (full - least)) (Wagner,
    /// Shamir & Marks 1988, J. Water Resour. Plann. Manage. 114(3):276-294). Demands elsewhere are drawn in full.
    ///
    /// Taps that are not served, stand on a source, or demand nothing are left as they are, and so is one whose two heads
    /// leave no room between them.
    ///
    /// # Errors
    /// As [`Solver::solve`].
    pub fn solve_pressure_driven(&self, condition: &Condition, taps: &[Tap]) -> Result<Delivered, NotSettled> {
        let open: Vec<Open> = taps.iter().filter_map(|tap| self.open(condition, tap)).collect();
        let mut rigid = condition.clone();
        for tap in &open {
            rigid.demand_m3_per_s[tap.node.at()] = 0.0;
        }
        let mut known_head_m = condition.source_head_m.clone();
        known_head_m.push(0.0);
        let mut times = FIRST_TIMES;
        let mut edges = self.with_taps(&open, times);
        let mut newton = self.newton(&edges, &rigid, &known_head_m);
        newton.start_cold();
        let first = self.equations.part.len();
        for (at, tap) in open.iter().enumerate() {
            newton.start_edge(first + at, tap.wanted);
        }
        let mut settled = newton.settle(&self.settings, None);
        while settled.is_ok() && open.iter().any(|tap| tap.stop_slope(times) < STEEPEST) {
            times *= STAGE_TIMES;
            let steps = settled.as_ref().map_or(0, |&steps| steps);
            let before = newton.into_values();
            edges = self.with_taps(&open, times);
            newton = self.newton(&edges, &rigid, &known_head_m);
            newton.start_at(before);
            settled = match newton.settle(&self.settings, None) {
                Ok(more) => Ok(steps + more),
                Err(stopped) => Err(Stopped {
                    steps: steps + stopped.steps,
                }),
            };
        }
        let mut delivered = rigid.demand_m3_per_s;
        for (tap, flow) in open.iter().zip(&newton.flow[first..]) {
            delivered[tap.node.at()] = flow.clamp(0.0, tap.wanted);
        }
        let state = self.answer(&newton, settled, delivered.clone())?;
        Ok(Delivered {
            state,
            delivered_m3_per_s: delivered,
        })
    }

    fn open(&self, condition: &Condition, tap: &Tap) -> Option<Open> {
        let number = self.number(tap.node)?;
        let wanted = condition.demand_m3_per_s[tap.node.at()];
        let inside = number < self.equations.free && wanted > 0.0 && tap.full_m > tap.least_m;
        inside.then_some(Open {
            node: tap.node,
            number: number as u32,
            least_m: tap.least_m,
            rise_m: tap.full_m - tap.least_m,
            wanted,
        })
    }

    /// The network's edges and one to the open for each tap.
    fn with_taps(&self, open: &[Open], times: f64) -> Edges {
        let mut edges = self.equations.edges.clone();
        let outside = self.equations.node.len() as u32;
        for tap in open {
            edges.ends.push([tap.number, outside]);
            edges.slot.push(NONE);
            edges.start_slope.push(tap.rise_m / tap.wanted);
            edges.law.push(HeadLoss::outflow(
                tap.least_m,
                tap.rise_m,
                tap.wanted,
                tap.stop_slope(times),
            ));
        }
        edges
    }
}

/// A tap that takes part.
struct Open {
    node: NodeIx,
    number: u32,
    least_m: f64,
    rise_m: f64,
    /// m3/s.
    wanted: f64,
}

impl Open {
    /// Slope of the law beyond its ends at a stage.
    fn stop_slope(&self, times: f64) -> f64 {
        let at_full = 2.0 * self.rise_m / self.wanted;
        (times * at_full).min(STEEPEST.max(FIRST_TIMES * at_full))
    }
}
