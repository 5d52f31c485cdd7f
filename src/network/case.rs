//! Cases: demand conditions of a network, and the [`Condition`] each puts it in.

use super::{Condition, Network, Source};

/// A demand condition that the study asks for.
#[derive(Clone, Debug, PartialEq)]
pub struct Case {
    /// Its name, for example `peak hour`.
    pub name: String,
    /// What every average-day demand is multiplied by.
    pub demand_times: f64,
    /// What the demand of a customer class (its index and the factor) is multiplied by instead.
    pub demand_times_by: Vec<(u32, f64)>,
    /// Heads that replace those of sources in this case: index into `Assets::nodes` and head, m.
    pub heads_m: Vec<(u32, f64)>,
}

impl Case {
    /// Nobody draws, and every source and tank stands at the highest head that any of the cases gives it.
    pub fn at_rest<'a>(network: &Network, cases: impl Iterator<Item = &'a Case> + Clone) -> Case {
        let highest = |source: &Source| {
            let in_cases = cases
                .clone()
                .flat_map(|case| &case.heads_m)
                .filter(|(point, _)| *point == source.point);
            (
                source.point,
                in_cases.map(|(_, head_m)| *head_m).fold(source.head_m.value, f64::max),
            )
        };
        Case {
            name: "no draw".into(),
            demand_times: 0.0,
            demand_times_by: Vec::new(),
            heads_m: network.sources.iter().map(highest).collect(),
        }
    }

    /// The factor for a draw of a class, or of none.
    pub fn factor(&self, class: Option<u32>) -> f64 {
        let own = class.and_then(|class| self.demand_times_by.iter().find(|(of, _)| *of == class));
        own.map_or(self.demand_times, |(_, times)| *times)
    }
}

impl Network {
    /// The network as it is in a case.
    pub fn condition(&self, case: &Case) -> Condition {
        let mut demand_m3_per_s = vec![0.0; self.elevation_m.len()];
        for draw in &self.draws {
            demand_m3_per_s[draw.node.at()] += draw.demand_m3_per_s * case.factor(draw.class);
        }
        let source_head_m = self
            .sources
            .iter()
            .map(|source| {
                let own = case.heads_m.iter().find(|(point, _)| *point == source.point);
                own.map_or(source.head_m.value, |(_, head_m)| *head_m)
            })
            .collect();
        Condition {
            demand_m3_per_s,
            source_head_m,
        }
    }
}
