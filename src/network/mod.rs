//! Network: plain SI arrays by typed index. It never changes; what varies between cases and fires is a [`Condition`].
//!
//! Its nodes and parts are those of the `PipeMap`, one for one and in the same order.

mod assemble;
mod case;
mod elevation;
mod invariants;

pub use crate::assets::{Basis, Friction, Valued};
pub use assemble::{AssemblySettings, assemble};
pub use case::Case;

/// Index of a node.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct NodeIx(pub u32);

/// Index of a part.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct PartIx(pub u32);

impl NodeIx {
    /// As an array index.
    pub fn at(self) -> usize {
        self.0 as usize
    }
}

impl PartIx {
    /// As an array index.
    pub fn at(self) -> usize {
        self.0 as usize
    }
}

/// A piece of main as it is calculated.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Part {
    /// Node at its start, in the drawn direction.
    pub from: NodeIx,
    /// Node at its end.
    pub to: NodeIx,
    /// Length, m, above zero.
    pub length_m: f64,
    /// Inside diameter, m, above zero.
    pub diameter_m: f64,
    /// C-factor or roughness height.
    pub friction: Friction,
    /// Minor loss coefficient K, on the velocity head of the part.
    pub minor_loss_k: f64,
}

/// A node whose head is known.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Source {
    /// The node.
    pub node: NodeIx,
    /// Index into `Assets::nodes` of the point that gives the head.
    pub point: u32,
    /// Its head, m, and where that came from.
    pub head_m: Valued<f64>,
    /// Whether it is a tank.
    pub tank: bool,
    /// The greatest flow it can give, m3/s, if stated.
    pub greatest_m3_per_s: Option<f64>,
}

/// A draw at a node at the average day.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Draw {
    /// The node.
    pub node: NodeIx,
    /// Index into the customer classes; `None` for a demand of a node or of a customer without class.
    pub class: Option<u32>,
    /// m3/s, not below zero.
    pub demand_m3_per_s: f64,
}

/// The network that is solved.
#[derive(Clone, Debug, Default)]
pub struct Network {
    /// Elevation of each node, m; `None` where nothing is known to go by.
    pub elevation_m: Vec<Option<Valued<f64>>>,
    /// Parts.
    pub parts: Vec<Part>,
    /// Nodes with a known head, at most one entry a node.
    pub sources: Vec<Source>,
    /// Draws at the average day.
    pub draws: Vec<Draw>,
    /// Whether each node hangs together with a source. The others are left out of the solve.
    pub served: Vec<bool>,
    /// The bore each main is calculated with, m, by index into `Assets::mains`.
    pub main_diameter_m: Vec<Valued<f64>>,
}

/// What varies between cases, fires and a hookup's before and after.
#[derive(Clone, Debug, PartialEq)]
pub struct Condition {
    /// Outflow at each node, m3/s.
    pub demand_m3_per_s: Vec<f64>,
    /// Head of each of the network's sources, m, in their order.
    pub source_head_m: Vec<f64>,
}
