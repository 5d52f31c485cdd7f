//! Networks for the tests of the hydraulics, made from plain numbers.

use gradeline::network::{Basis, Friction, Network, NodeIx, Part, Source, Valued};

/// A main without minor loss.
pub fn part_of(from: u32, to: u32, length_m: f64, diameter_m: f64, friction: Friction) -> Part {
    Part {
        from: NodeIx(from),
        to: NodeIx(to),
        length_m,
        diameter_m,
        friction,
        minor_loss_k: 0.0,
    }
}

/// A network of nodes that are all served; the sources as node and head, m.
pub fn network_of(nodes: usize, sources: &[(u32, f64)], parts: Vec<Part>) -> Network {
    let source = |&(node, head_m): &(u32, f64)| Source {
        node: NodeIx(node),
        point: 0,
        head_m: Valued {
            value: head_m,
            basis: Basis::Map,
        },
        tank: false,
        greatest_m3_per_s: None,
    };
    Network {
        parts,
        sources: sources.iter().map(source).collect(),
        elevation_m: vec![None; nodes],
        served: vec![true; nodes],
        ..Network::default()
    }
}
