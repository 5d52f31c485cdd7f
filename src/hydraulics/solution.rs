//! What comes back from a solve: a state with its residuals, or why there is none.

use super::Residuals;
use crate::network::PartIx;

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
