//! What must hold of a network. A failure here is a bug of ours, never a fault of the map.

use super::Network;

/// Asserts that indices, lengths and bores are what the solver relies on.
pub(super) fn assert_sound(network: &Network) {
    let nodes = network.elevation_m.len();
    assert_eq!(network.served.len(), nodes, "one served flag a node");
    for part in &network.parts {
        assert!(
            part.from.at() < nodes && part.to.at() < nodes,
            "a part ends at nodes of the network"
        );
        assert_ne!(part.from, part.to, "a part has two ends");
        assert!(
            part.length_m.is_finite() && part.length_m > 0.0,
            "a part has a length: {}",
            part.length_m
        );
        assert!(
            part.diameter_m.is_finite() && part.diameter_m > 0.0,
            "a part has a bore: {}",
            part.diameter_m
        );
    }
    for draw in &network.draws {
        assert!(
            draw.demand_m3_per_s.is_finite() && draw.demand_m3_per_s >= 0.0,
            "a draw is not below zero"
        );
    }
    for source in &network.sources {
        assert!(source.head_m.value.is_finite(), "a known head is a number");
        assert!(network.served[source.node.at()], "a source serves itself");
    }
}
