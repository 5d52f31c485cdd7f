//! How well written values satisfy the equations, recomputed from those values alone.

use crate::network::{NodeIx, PartIx};

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
