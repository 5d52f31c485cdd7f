//! The solver's face: what is asked, what comes back.

use crate::network::{Condition, Network, NodeIx, PartIx};

/// Every constant and tolerance of the hydraulics.
#[derive(Clone, Debug, PartialEq)]
pub struct Settings {
    /// Hazen-Williams velocity form V = k C R^0.63 S^0.54 in SI: k. The published US 1.318 converted exactly is 0.84918.
    pub hazen_williams_k: f64,
    /// Exponent of flow in h = K L Q^n / (C^n D^m).
    pub flow_exponent: f64,
    /// Exponent of diameter, m.
    pub diameter_exponent: f64,
    /// Kinematic viscosity of water, m2/s.
    pub viscosity_m2_per_s: f64,
    /// Largest continuity residual accepted, m3/s.
    pub continuity_m3_per_s: f64,
    /// Largest head-loss residual accepted, m.
    pub head_m: f64,
    /// Newton steps after which it is said that the solution does not settle.
    pub most_steps: u32,
}

/// How well written values satisfy the equations, recomputed from them.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Residuals {
    /// Largest sum of flows at a node, m3/s, and the node.
    pub continuity_m3_per_s: f64,
    /// The node where it is.
    pub continuity_at: Option<NodeIx>,
    /// Largest difference between head difference and head loss of a part, m.
    pub head_m: f64,
    /// The part where it is.
    pub head_at: Option<PartIx>,
    /// Largest relative head-loss residual (of the larger of head difference and 1e-8 m).
    pub head_relative: f64,
}

/// A solution.
#[derive(Clone, Debug, PartialEq)]
pub struct State {
    /// Head at each node, m; NaN where the node is not served.
    pub head_m: Vec<f64>,
    /// Flow in each part, m3/s, positive in the drawn direction; NaN where the part is not served.
    pub flow_m3_per_s: Vec<f64>,
    /// Its residuals.
    pub residuals: Residuals,
    /// Newton steps taken.
    pub steps: u32,
}

/// The hydraulics did not settle.
#[derive(Clone, Debug, PartialEq)]
pub struct NotSettled {
    /// The residuals when it stopped.
    pub residuals: Residuals,
    /// The three parts with the largest head-loss residuals, m, the worst first.
    pub worst: Vec<(PartIx, f64)>,
    /// Newton steps taken.
    pub steps: u32,
}

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

/// Solves conditions of one network. The symbolic work is done once.
pub struct Solver {
    _private: (),
}

impl Solver {
    /// Prepares a network.
    pub fn new(_network: &Network, _settings: Settings) -> Solver {
        unimplemented!()
    }

    /// Solves a condition, from another state of the same network if one is at hand.
    ///
    /// # Errors
    /// The worst three parts when the residuals do not reach their tolerances.
    pub fn solve(&self, _condition: &Condition, _start: Option<&State>) -> Result<State, NotSettled> {
        unimplemented!()
    }

    /// The greatest extra flow at `node` that keeps `own` there and every one of `kept` at or above its head: the exact
    /// flow at which the first of them is met as the flow rises from zero. `base` is the solution of `condition`.
    ///
    /// # Errors
    /// As [`Solver::solve`].
    pub fn flow_at_held_head(
        &self,
        _condition: &Condition,
        _base: &State,
        _own: Kept,
        _kept: &[Kept],
    ) -> Result<Held, NotSettled> {
        unimplemented!()
    }
}
