//! What cannot be delivered: where the demand of a case would push the pressure below zero, the case is solved again with
//! draws that follow the pressure (Wagner, Shamir & Marks 1988), and what is not delivered is stated.
//!
//! All is delivered from the limit of seriously low pressure on, nothing at zero.

use super::Subject;
use crate::hydraulics::{Solver, Tap};
use crate::network::NodeIx;

/// What each node goes without in each case, m3/s; `None` for a case in which every draw is met.
pub(super) type Undelivered = Vec<Option<Vec<f64>>>;

pub(super) fn find(subject: &Subject<'_>, solver: &Solver) -> Undelivered {
    let mut undelivered = vec![None; subject.cases.len()];
    for (at, solved, state) in subject.proved() {
        let drawing = |node: usize| solved.demand_m3_per_s[node] > 0.0;
        let below_zero = |node: usize| {
            subject
                .pressure_m(state, node)
                .is_some_and(|pressure_m| pressure_m < 0.0)
        };
        let nodes = 0..subject.map.nodes.len();
        if !nodes.clone().any(|node| drawing(node) && below_zero(node)) {
            continue;
        }
        let full_m = solved.limits.pressure_low_serious_m.value;
        let tap = |node: usize| {
            let least_m = subject.network.elevation_m[node]?.value;
            let node = NodeIx(node as u32);
            Some(Tap {
                node,
                least_m,
                full_m: least_m + full_m,
            })
        };
        let taps: Vec<Tap> = nodes.filter(|node| drawing(*node)).filter_map(tap).collect();
        let condition = subject.network.condition(&solved.case);
        undelivered[at] = solver.solve_pressure_driven(&condition, &taps).ok().map(|delivered| {
            let met = delivered.delivered_m3_per_s.iter().zip(&solved.demand_m3_per_s);
            met.map(|(met, asked)| (asked - met).max(0.0)).collect()
        });
    }
    undelivered
}
