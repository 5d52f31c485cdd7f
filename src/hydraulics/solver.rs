//! The solver's face: what is asked, what comes back.

use super::{Residuals, Settings};
use crate::network::{Condition, Network, NodeIx, PartIx};

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
