//! Where pressure is to be kept while a hydrant flows: at every node that customers draw at.
//!
//! A node is kept at the highest ground there: its own and that of the customers who draw from it. How high the taps are
//! does not count: in a fire the limit is meant at the ground. Places already below it with no hydrant open would stop
//! every hydrant; they are left out, counted and listed.

use std::collections::{HashMap, HashSet};

use super::pressure_low::feature_at;
use super::{Fire, Subject};
use crate::finding::{Code, FeatureRef, Finding};
use crate::hydraulics::{Kept, State};
use crate::network::NodeIx;
use crate::units::Quantity;

/// How many features a finding about already low places names.
const NAMED_AT_MOST: usize = 50;

/// The places, and whose ground counts at each.
#[derive(Default)]
pub(super) struct KeptPlaces {
    /// Nodes with the least head each may fall to.
    pub kept: Vec<Kept>,
    /// Nodes below theirs with no hydrant open.
    already_low: Vec<usize>,
    /// The customer whose ground is above the node's own.
    highest: HashMap<usize, FeatureRef>,
}

impl KeptPlaces {
    /// The places of a fire case, if the study asks for any to be kept.
    pub fn new(subject: &Subject<'_>, fire: &Fire, base: &State) -> KeptPlaces {
        let mut places = KeptPlaces::default();
        let Some(limit) = &fire.keep_elsewhere_m else {
            return places;
        };
        for (node, ground_m) in places.grounds(subject) {
            let head_m = ground_m + limit.value;
            if base.head_m[node] < head_m {
                places.already_low.push(node);
            } else {
                let node = NodeIx(node as u32);
                places.kept.push(Kept { node, head_m });
            }
        }
        places
    }

    /// The ground that counts at each served node that is drawn at, m, by node.
    fn grounds(&mut self, subject: &Subject<'_>) -> Vec<(usize, f64)> {
        let mut ground_m: Vec<Option<f64>> = vec![None; subject.map.nodes.len()];
        for draw in subject
            .network
            .draws
            .iter()
            .filter(|draw| subject.network.served[draw.node.at()])
        {
            let node = draw.node.at();
            ground_m[node] = subject.network.elevation_m[node].map(|elevation| elevation.value);
        }
        let customers = subject.assets.customers.iter().zip(&subject.map.customers);
        for (customer, tap) in customers.filter(|(customer, _)| customer.demand_m3_per_s > 0.0) {
            let Some(node) = tap
                .map(|tap| tap.node as usize)
                .filter(|node| subject.network.served[*node])
            else {
                continue;
            };
            // `None` is below every elevation.
            if customer.elevation_m > ground_m[node] {
                ground_m[node] = customer.elevation_m;
                self.highest.insert(node, customer.origin);
            }
        }
        ground_m
            .into_iter()
            .enumerate()
            .filter_map(|(node, ground_m)| Some((node, ground_m?)))
            .collect()
    }

    /// Whose ground counts at a node: the customer's, else the user's point that stands there.
    pub fn whose(&self, subject: &Subject<'_>, node: NodeIx) -> Option<FeatureRef> {
        self.highest
            .get(&node.at())
            .copied()
            .or_else(|| feature_at(subject, node.at()))
    }

    /// The finding about places already low.
    pub fn already_low(&self, subject: &Subject<'_>, fire: &Fire, base: &State) -> Option<Finding> {
        let limit = fire
            .keep_elsewhere_m
            .as_ref()
            .filter(|_| !self.already_low.is_empty())?;
        let message = format!(
            "{} places that customers draw at are below the limit with no hydrant open and were left out of `safe`",
            self.already_low.len()
        );
        let mut finding = Finding::new(Code::AlreadyLow, message.into()).limit(limit.value, limit.from.clone());
        let pressures = self
            .already_low
            .iter()
            .filter_map(|node| Some((*node, subject.pressure_m(base, *node)?)));
        if let Some((node, lowest_m)) = pressures.min_by(|a, b| a.1.total_cmp(&b.1)) {
            finding = finding
                .at(subject.map.nodes[node].at)
                .measured(lowest_m, Quantity::Pressure);
        }
        let low: HashSet<usize> = self.already_low.iter().copied().collect();
        let customers = subject.assets.customers.iter().zip(&subject.map.customers);
        let named = customers
            .filter_map(|(customer, tap)| low.contains(&(tap.as_ref()?.node as usize)).then_some(customer.origin));
        let points = self.already_low.iter().filter_map(|node| feature_at(subject, *node));
        finding.others = named.chain(points).take(NAMED_AT_MOST).collect();
        Some(finding)
    }
}
