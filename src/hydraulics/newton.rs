//! Newton's method on the flows of a network.
//!
//! The steady state is the flow of least content, the sum over the parts of the integral of head loss over flow less the
//! work of the known heads, among all flows that close continuity (Collins et al. 1978; Todini & Pilati 1988). Every law
//! rises with flow, so the content is convex, and Newton's method with a line search on it converges from any start.
//! Unknowns are *increments* of flow and head, so that what is solved for shrinks with the error: continuity then closes
//! to rounding of the flows. Heads are carried in two numbers, the second with what the first rounds off, because the flow
//! in a short wide main hangs on a head difference far below the rounding of a head.

use super::equations::{Edges, Equations, NONE};
use super::linear::{Factor, Factoring};
use super::settings::Settings;

/// Steps after which the line search insists on going down, and no longer lets a full step pass that goes a little far.
const PATIENT_STEPS: u32 = 20;
/// Steps allowed after the tolerances are met, to let the residuals fall as far as they will.
const POLISHING_STEPS: u32 = 6;
/// Relative head-loss residual at which there is nothing more to gain.
const POLISHED_HEAD: f64 = 1e-12;
/// Continuity residual over the largest flow at which there is nothing more to gain: a few roundings.
const POLISHED_CONTINUITY: f64 = 1e-15;
/// How far a flow may be off by rounding, relative to it.
const ROUNDINGS: f64 = 2.0 * f64::EPSILON;

/// A wish to hold something while a flow is drawn at one node; see `held.rs`.
pub(super) trait Aim {
    /// The node the flow is drawn at.
    fn drawn_at(&self) -> usize;

    /// The change of the drawn flow, given the step without it (`to_rest`) and the fall of head per flow drawn (`fall`).
    fn change(&mut self, newton: &Newton, to_rest: &[f64], fall: &[f64]) -> f64;

    /// Whether the drawn flow has come to rest.
    fn is_met(&self, drawn_m3_per_s: f64) -> bool;
}

/// The numbers of one solve.
pub(super) struct Newton<'a> {
    edges: &'a Edges,
    free: usize,
    factor: Box<dyn Factor + 'a>,
    /// Outflow at each node without known head, m3/s.
    pub demand: Vec<f64>,
    /// Flow drawn besides, at the node an [`Aim`] names, m3/s.
    pub drawn: f64,
    /// Head at each node, m, and what it rounds off.
    pub head: Vec<f64>,
    pub head_low: Vec<f64>,
    /// Flow in each edge, m3/s; head loss and slope of its law there.
    pub flow: Vec<f64>,
    loss: Vec<f64>,
    slope: Vec<f64>,
    /// The head difference along each edge, m, and the part of it that its loss does not explain.
    drop: Vec<f64>,
    rest: Vec<f64>,
    /// Step of flow, and the numbers at a trial flow.
    step: Vec<f64>,
    trial: [Vec<f64>; 3],
    conductance: Vec<f64>,
    excess: Vec<f64>,
    /// Right-hand side, then step of head; known heads have entries that stay out of it.
    rise: Vec<f64>,
    fall: Vec<f64>,
    /// Largest residuals: of head, m; of head over head loss; of continuity, m3/s.
    worst_head: f64,
    worst_relative: f64,
    worst_continuity: f64,
    largest_flow: f64,
    largest_drop: f64,
}

/// Heads and flows to start another solve from.
pub(super) struct Values {
    flow: Vec<f64>,
    head: Vec<f64>,
    head_low: Vec<f64>,
}

/// The method stopped after so many steps without having settled.
pub(super) struct Stopped {
    pub steps: u32,
}

impl<'a> Newton<'a> {
    /// Room for a solve of `edges` among the nodes of `equations`, the ends beyond them having known heads too.
    pub fn new(equations: &'a Equations, edges: &'a Edges, factoring: Factoring, known_head_m: &[f64]) -> Self {
        let free = equations.free;
        let nodes = free + known_head_m.len();
        let usual = known_head_m.iter().sum::<f64>() / known_head_m.len().max(1) as f64;
        let mut head = vec![usual; nodes];
        head[free..].copy_from_slice(known_head_m);
        let on_edges = || vec![0.0; edges.ends.len()];
        Self {
            edges,
            free,
            factor: equations.analysis.factor(factoring),
            demand: vec![0.0; free],
            drawn: 0.0,
            head,
            head_low: vec![0.0; nodes],
            flow: on_edges(),
            loss: on_edges(),
            slope: on_edges(),
            drop: on_edges(),
            rest: on_edges(),
            step: on_edges(),
            trial: [on_edges(), on_edges(), on_edges()],
            conductance: vec![0.0; equations.pairs],
            excess: vec![0.0; free],
            rise: vec![0.0; nodes],
            fall: vec![0.0; nodes],
            worst_head: f64::INFINITY,
            worst_relative: f64::INFINITY,
            worst_continuity: f64::INFINITY,
            largest_flow: 0.0,
            largest_drop: 0.0,
        }
    }

    /// Starts from no flow and straight laws of the slope that a usual velocity has.
    pub fn start_cold(&mut self) {
        self.flow.fill(0.0);
        self.loss.fill(0.0);
        self.slope.copy_from_slice(&self.edges.start_slope);
    }

    /// Starts from the flows that stand in `flow`.
    pub fn start_warm(&mut self) {
        for (at, law) in self.edges.law.iter().enumerate() {
            let loss = law.at(self.flow[at]);
            self.loss[at] = loss.head_m;
            self.slope[at] = loss.slope;
        }
    }

    /// Puts a flow into an edge.
    pub fn start_edge(&mut self, edge: usize, flow_m3_per_s: f64) {
        let loss = self.edges.law[edge].at(flow_m3_per_s);
        self.flow[edge] = flow_m3_per_s;
        self.loss[edge] = loss.head_m;
        self.slope[edge] = loss.slope;
    }

    /// Starts from the heads and flows of another solve of the same nodes and edges.
    pub fn start_at(&mut self, values: Values) {
        self.flow = values.flow;
        self.head = values.head;
        self.head_low = values.head_low;
        self.start_warm();
    }

    /// The heads and flows alone.
    pub fn into_values(self) -> Values {
        Values {
            flow: self.flow,
            head: self.head,
            head_low: self.head_low,
        }
    }

    /// Goes on until the residuals meet their tolerances and fall no further. Returns the steps taken.
    pub fn settle(&mut self, settings: &Settings, mut aim: Option<&mut dyn Aim>) -> Result<u32, Stopped> {
        self.measure_heads();
        let mut polished = 0;
        let mut before = (f64::INFINITY, f64::INFINITY);
        for steps in 0..=settings.most_steps {
            self.assemble(aim.as_deref().map(|aim| aim.drawn_at()));
            // A head of a million kilometres, which a wrong diameter can ask for, is rounded by more than the tolerance:
            // there is nothing to gain by going on, and the residuals of the answer will tell.
            let head_m = settings.head_m.max(2.0 * f64::EPSILON * self.largest_drop);
            let met = self.worst_head <= head_m && self.worst_continuity <= settings.continuity_m3_per_s;
            if met && steps > 0 {
                let done = self.worst_relative <= POLISHED_HEAD
                    && self.worst_continuity <= POLISHED_CONTINUITY * self.largest_flow;
                let falls = self.worst_relative < 0.5 * before.0 || self.worst_continuity < 0.5 * before.1;
                // One hydrant of many wants its flow, not the last digit of every head.
                let enough = aim.as_deref().is_some_and(|aim| aim.is_met(self.drawn));
                if done || enough || !falls || polished == POLISHING_STEPS {
                    return Ok(steps);
                }
                polished += 1;
                before = (self.worst_relative, self.worst_continuity);
            }
            if steps == settings.most_steps {
                break;
            }
            self.factor.refactor(&self.conductance, &self.excess);
            self.factor.solve(&mut self.rise[..self.free]);
            let change = aim.as_deref_mut().map_or(0.0, |aim| self.aim_at(aim));
            let descent = self.direct();
            // The first step of a plain solve closes continuity; only from then on does the content say how far to go.
            let opening = steps == 0 && aim.is_none();
            let polishing = steps > 0 && met;
            let share = if opening || polishing {
                self.try_share(1.0);
                1.0
            } else {
                self.search(descent, steps >= PATIENT_STEPS)
            };
            self.accept();
            self.drawn += share * change;
            if !self.worst_head.is_finite() {
                return Err(Stopped { steps: steps + 1 });
            }
        }
        Err(Stopped {
            steps: settings.most_steps,
        })
    }

    /// The head at a node less a level, m, with all the digits there are.
    pub fn above(&self, node: usize, level_m: f64) -> f64 {
        (self.head[node] - level_m) + self.head_low[node]
    }

    /// The flow in an edge after the step of head in `rise`, m3/s.
    pub fn flow_after(&self, edge: usize, rise: &[f64]) -> f64 {
        let [a, b] = self.edges.ends[edge];
        self.flow[edge] + (self.rest[edge] + rise[a as usize] - rise[b as usize]) / self.slope[edge]
    }

    /// How much more an edge carries where heads fall as in `fall`.
    pub fn flow_per_fall(&self, edge: usize, fall: &[f64]) -> f64 {
        let [a, b] = self.edges.ends[edge];
        (fall[b as usize] - fall[a as usize]) / self.slope[edge]
    }

    /// Head difference along each edge, and what of it its loss does not explain.
    fn measure_heads(&mut self) {
        for (at, &[a, b]) in self.edges.ends.iter().enumerate() {
            let (a, b) = (a as usize, b as usize);
            let drop = (self.head[a] - self.head[b]) + (self.head_low[a] - self.head_low[b]);
            self.drop[at] = drop;
            self.rest[at] = drop - self.loss[at];
        }
    }

    /// The matrix and the right-hand side of the step, and the continuity residual on the way.
    fn assemble(&mut self, drawn_at: Option<usize>) {
        self.conductance.fill(0.0);
        self.excess.fill(0.0);
        self.rise.fill(0.0);
        self.fall.fill(0.0);
        let free = self.free;
        let outflow = &mut self.fall;
        for (at, &[a, b]) in self.edges.ends.iter().enumerate() {
            let g = 1.0 / self.slope[at];
            let (a, b) = (a as usize, b as usize);
            let slot = self.edges.slot[at];
            if slot != NONE {
                self.conductance[slot as usize] += g;
            } else if a < free {
                self.excess[a] += g;
            } else if b < free {
                self.excess[b] += g;
            }
            let pull = g * self.rest[at];
            outflow[a] += self.flow[at];
            outflow[b] -= self.flow[at];
            self.rise[a] -= pull;
            self.rise[b] += pull;
        }
        if let Some(node) = drawn_at {
            outflow[node] += self.drawn;
        }
        self.worst_continuity = 0.0;
        let nodes = outflow.iter().zip(&self.demand).zip(&mut self.rise);
        for ((outflow, demand), rise) in nodes {
            let missing = outflow + demand;
            *rise -= missing;
            self.worst_continuity = largest(self.worst_continuity, missing.abs());
        }
        self.rise[free..].fill(0.0);
    }

    /// Adds to the step of head what drawing more or less at the aim's node does. Returns the change of the drawn flow.
    fn aim_at(&mut self, aim: &mut dyn Aim) -> f64 {
        let mut fall = std::mem::take(&mut self.fall);
        fall.fill(0.0);
        fall[aim.drawn_at()] = 1.0;
        self.factor.solve(&mut fall[..self.free]);
        let change = aim.change(self, &self.rise, &fall);
        for (rise, fall) in self.rise.iter_mut().zip(&fall) {
            *rise -= change * fall;
        }
        self.fall = fall;
        change
    }

    /// Moves the heads, and makes the step of flow from theirs. Returns the slope of the content along it, below zero.
    fn direct(&mut self) -> f64 {
        for node in 0..self.free {
            let (sum, low) = sum_with_rest(self.head[node], self.rise[node] + self.head_low[node]);
            self.head[node] = sum;
            self.head_low[node] = low;
        }
        let mut descent = 0.0;
        for (at, &[a, b]) in self.edges.ends.iter().enumerate() {
            let (a, b) = (a as usize, b as usize);
            let step = (self.rest[at] + (self.rise[a] - self.rise[b])) / self.slope[at];
            self.step[at] = step;
            self.drop[at] = (self.head[a] - self.head[b]) + (self.head_low[a] - self.head_low[b]);
            descent -= self.slope[at] * step * step;
        }
        descent
    }

    /// Puts the numbers at a share of the step into the trial. Returns the slope of the content there.
    fn try_share(&mut self, share: f64) -> f64 {
        let [flows, losses, slopes] = &mut self.trial;
        let (mut slope_there, mut worst, mut worst_relative) = (0.0, 0.0, 0.0);
        let (mut largest_flow, mut largest_drop) = (0.0_f64, 0.0_f64);
        for (at, law) in self.edges.law.iter().enumerate() {
            let flow = self.flow[at] + share * self.step[at];
            let loss = law.at(flow);
            let rest = self.drop[at] - loss.head_m;
            slope_there -= rest * self.step[at];
            // What the rounding of the flow explains is nothing to go on for: it matters where a law is very steep.
            let open = rest.abs() - ROUNDINGS * flow.abs() * loss.slope;
            worst = largest(worst, open);
            worst_relative = largest(worst_relative, open / loss.head_m.abs().max(super::STRAIGHT_BELOW_M));
            largest_flow = largest_flow.max(flow.abs());
            largest_drop = largest_drop.max(self.drop[at].abs());
            self.rest[at] = rest;
            flows[at] = flow;
            losses[at] = loss.head_m;
            slopes[at] = loss.slope;
        }
        self.worst_head = worst;
        self.worst_relative = worst_relative;
        self.largest_flow = largest_flow;
        self.largest_drop = largest_drop;
        slope_there
    }

    /// Finds a share of the step at which the content has nearly stopped falling. Leaves its numbers in the trial.
    ///
    /// Where the slope at the full step is still below zero, the content falls all the way. Otherwise its zero is
    /// bracketed; a slope a fifth as steep as at the start, either way, is good enough.
    fn search(&mut self, descent: f64, insist: bool) -> f64 {
        let full = self.try_share(1.0);
        let enough = -0.2 * descent;
        if full <= 0.0 || (!insist && full <= enough) {
            return 1.0;
        }
        let (mut low, mut low_slope, mut high, mut high_slope) = (0.0, descent, 1.0, full);
        for _ in 0..60 {
            // The secant's guess, kept off the ends so that a steep rise cannot stall it.
            let guess = (low * high_slope - high * low_slope) / (high_slope - low_slope);
            let width = high - low;
            let share = guess.clamp(low + 0.1 * width, high - 0.1 * width);
            let slope = self.try_share(share);
            if slope.abs() <= enough && (slope <= 0.0 || !insist) {
                return share;
            }
            if slope < 0.0 {
                (low, low_slope) = (share, slope);
            } else {
                (high, high_slope) = (share, slope);
            }
        }
        self.try_share(low);
        low
    }

    fn accept(&mut self) {
        std::mem::swap(&mut self.flow, &mut self.trial[0]);
        std::mem::swap(&mut self.loss, &mut self.trial[1]);
        std::mem::swap(&mut self.slope, &mut self.trial[2]);
    }
}

/// The larger of two numbers, and not-a-number if either is: a comparison alone would lose it.
pub(super) fn largest(a: f64, b: f64) -> f64 {
    if a >= b || a.is_nan() { a } else { b }
}

/// A sum, and what of it was rounded off (Knuth's two-sum).
fn sum_with_rest(a: f64, b: f64) -> (f64, f64) {
    let sum = a + b;
    let of_b = sum - a;
    (sum, (a - (sum - of_b)) + (b - of_b))
}
