//! Labels: what nodes and parts are called in the written layers. Unique, since tables refer to them.

use std::collections::HashSet;

use crate::assets::Assets;
use crate::finding::FeatureRef;
use crate::topology::PipeMap;

/// What each node is called.
pub struct Labels {
    nodes: Vec<String>,
}

impl Labels {
    /// The id of the user's point that stands at a node, where it is free; else `node` and the node's number.
    pub fn new(assets: &Assets, map: &PipeMap, id_of: &dyn Fn(FeatureRef) -> Option<String>) -> Labels {
        let mut taken = HashSet::new();
        let own = |node: usize| {
            let points = map.nodes[node].points.iter();
            points
                .filter_map(|point| assets.nodes[*point as usize].origin)
                .find_map(id_of)
        };
        let nodes = (0..map.nodes.len())
            .map(|node| {
                let automatic = || format!("node {}", node + 1);
                // A user's id that reads like one of ours would make two nodes share a name.
                let label = own(node)
                    .filter(|id| !id.starts_with("node ") && !taken.contains(id))
                    .unwrap_or_else(automatic);
                taken.insert(label.clone());
                label
            })
            .collect();
        Labels { nodes }
    }

    /// What a node is called.
    pub fn node(&self, node: usize) -> &str {
        &self.nodes[node]
    }

    /// What a part is called.
    pub fn part(part: usize) -> String {
        format!("part {}", part + 1)
    }
}
