//! Pressure low: below the limit where customers draw or hydrants stand, in any case of the study.
//!
//! A node is judged at its own elevation; a customer at its own elevation plus its highest tap, where these are known.
//! Places that are low and hang together make one finding, at the lowest of them.

use super::areas::areas;
use super::coverage::{Coverage, Untested};
use super::{Flag, NodeVerdict, Solved, Subject, Verdict};
use crate::finding::{Code, FeatureRef, Finding, Sentence, Severity};
use crate::units::Quantity;

/// How many customers or hydrants of an area are named in its finding.
const NAMED_AT_MOST: usize = 50;

/// The lowest pressure met at a node, and whose it is.
#[derive(Clone, Copy)]
struct Lowest {
    pressure_m: f64,
    case: usize,
    at: FeatureOrNode,
}

#[derive(Clone, Copy)]
enum FeatureOrNode {
    Feature(FeatureRef),
    Node,
}

pub(super) fn check(
    subject: &Subject<'_>,
    coverage: &Coverage,
    nodes: &mut [NodeVerdict],
    customers: &mut Vec<Verdict>,
) -> Vec<Finding> {
    let judged = judged_nodes(subject);
    for (node, verdict) in nodes.iter_mut().enumerate() {
        judge_node(subject, node, coverage.reason[node], judged[node], verdict);
    }
    *customers = judge_customers(subject, coverage);
    findings(subject, nodes, customers)
}

/// Where customers draw or hydrants stand.
fn judged_nodes(subject: &Subject<'_>) -> Vec<bool> {
    let mut judged = vec![false; subject.map.nodes.len()];
    let draws = subject.network.draws.iter().map(|draw| draw.node.at());
    let hydrants = subject.map.hydrants.iter().flatten().map(|tap| tap.node as usize);
    draws.chain(hydrants).for_each(|node| judged[node] = true);
    judged
}

fn judge_node(subject: &Subject<'_>, node: usize, why: Option<Untested>, judged: bool, verdict: &mut NodeVerdict) {
    for (case, solved, state) in subject.proved() {
        let head_m = Some(state.head_m[node]).filter(|head_m| head_m.is_finite());
        let pressure_m = subject.pressure_m(state, node);
        // Without an elevation there is no pressure; the lowest head is still worth showing.
        let lower = match (pressure_m, verdict.low.value) {
            (Some(new), Some(old)) => new < old,
            (Some(_), None) => true,
            (None, _) => head_m.is_some_and(|new| verdict.head_m.is_none_or(|old| new < old)),
        };
        if lower {
            verdict.head_m = head_m;
            verdict.low = Verdict {
                value: pressure_m,
                case: Some(case),
                ..held(pressure_m, solved)
            };
        }
    }
    settle_flag(&mut verdict.low, why, judged);
}

fn judge_customers(subject: &Subject<'_>, coverage: &Coverage) -> Vec<Verdict> {
    let of_customer = subject.assets.customers.iter().zip(&subject.map.customers);
    of_customer
        .map(|(customer, tap)| {
            let Some(node) = tap.map(|tap| tap.node as usize) else {
                return Verdict::default();
            };
            let mut worst = Verdict::default();
            for (case, solved, state) in subject.proved() {
                let ground_m = customer
                    .elevation_m
                    .or(subject.network.elevation_m[node].map(|node| node.value));
                let pressure_m = ground_m.map(|ground_m| state.head_m[node] - ground_m - customer.lift_m);
                let pressure_m = pressure_m.filter(|pressure_m| pressure_m.is_finite());
                if pressure_m.is_some() && worst.value.is_none_or(|old| pressure_m < Some(old)) {
                    worst = Verdict {
                        case: Some(case),
                        ..held(pressure_m, solved)
                    };
                }
            }
            // A customer's own elevation is enough where its main has none.
            let why = coverage.reason[node].filter(|why| *why != Untested::NoElevation || worst.value.is_none());
            settle_flag(&mut worst, why, true);
            worst
        })
        .collect()
}

fn held(pressure_m: Option<f64>, solved: &Solved) -> Verdict {
    let limit = solved.limits.pressure_low_m.value;
    let flag = if pressure_m.is_some_and(|pressure_m| pressure_m < limit) {
        Flag::Low
    } else {
        Flag::Ok
    };
    Verdict {
        flag,
        value: pressure_m,
        limit: Some(limit),
        case: None,
    }
}

fn settle_flag(verdict: &mut Verdict, why: Option<Untested>, judged: bool) {
    if why.is_some() || verdict.value.is_none() {
        verdict.flag = Flag::Untested;
    } else if !judged {
        verdict.flag = Flag::NotJudged;
    }
    if !matches!(verdict.flag, Flag::Ok | Flag::Low) {
        verdict.limit = None;
    }
}

fn findings(subject: &Subject<'_>, nodes: &[NodeVerdict], customers: &[Verdict]) -> Vec<Finding> {
    let mut lowest: Vec<Option<Lowest>> = vec![None; nodes.len()];
    let mut lower = |node: usize, verdict: &Verdict, at: FeatureOrNode| {
        let (Flag::Low, Some(pressure_m), Some(case)) = (verdict.flag, verdict.value, verdict.case) else {
            return;
        };
        if lowest[node].is_none_or(|old| pressure_m < old.pressure_m) {
            lowest[node] = Some(Lowest { pressure_m, case, at });
        }
    };
    for (index, customer) in subject.assets.customers.iter().enumerate() {
        if let Some(tap) = subject.map.customers[index] {
            lower(
                tap.node as usize,
                &customers[index],
                FeatureOrNode::Feature(customer.origin),
            );
        }
    }
    for (node, verdict) in nodes.iter().enumerate() {
        lower(node, &verdict.low, FeatureOrNode::Node);
    }
    // Nodes nobody draws at link an area when they are below the limit too.
    let below = |(node, verdict): (usize, &NodeVerdict)| {
        lowest[node].is_some()
            || verdict.low.flag == Flag::NotJudged
                && verdict.low.case.is_some_and(|case| {
                    verdict
                        .low
                        .value
                        .is_some_and(|value| value < subject.cases[case].limits.pressure_low_m.value)
                })
    };
    let marked: Vec<bool> = nodes.iter().enumerate().map(below).collect();
    let found = areas(subject.map, &marked);
    found
        .iter()
        .filter_map(|area| area_finding(subject, area, &lowest))
        .collect()
}

fn area_finding(subject: &Subject<'_>, area: &[usize], lowest: &[Option<Lowest>]) -> Option<Finding> {
    let low_nodes = area.iter().filter_map(|node| Some((*node, lowest[*node]?)));
    let (worst_node, worst) = low_nodes
        .clone()
        .min_by(|a, b| a.1.pressure_m.total_cmp(&b.1.pressure_m))?;
    let limits = &subject.cases[worst.case].limits;
    let named = who_is_there(subject, area);
    let feature = match worst.at {
        FeatureOrNode::Feature(feature) => Some(feature),
        FeatureOrNode::Node => feature_at(subject, worst_node).or(named.first().copied()),
    };
    let mut message = Sentence::new()
        .text("pressure falls to ")
        .number(worst.pressure_m, Quantity::Pressure);
    message = feature.map_or(message.clone(), |feature| message.text(" at ").feature(feature));
    message = message.text(format!(" in the case `{}`", subject.cases[worst.case].case.name));
    let places = low_nodes.count();
    if places > 1 {
        message = message.text(format!("; {places} places that hang together are below the limit"));
    }
    let impossible = worst.pressure_m < 0.0;
    let serious = impossible || worst.pressure_m < limits.pressure_low_serious_m.value;
    let code = if impossible {
        Code::CannotBeSupplied
    } else {
        Code::PressureLow
    };
    let limit = if serious && !impossible {
        &limits.pressure_low_serious_m
    } else {
        &limits.pressure_low_m
    };
    let mut finding = Finding::new(code, message)
        .at(subject.map.nodes[worst_node].at)
        .measured(worst.pressure_m, Quantity::Pressure)
        .limit(if impossible { 0.0 } else { limit.value }, limit.from.clone())
        .severity(if serious { Severity::Serious } else { Severity::Warning });
    finding.feature = feature;
    finding.others = named
        .into_iter()
        .filter(|other| Some(*other) != feature)
        .take(NAMED_AT_MOST)
        .collect();
    Some(finding)
}

/// The user's point at a node, if one stands there.
pub(super) fn feature_at(subject: &Subject<'_>, node: usize) -> Option<FeatureRef> {
    subject.map.nodes[node]
        .points
        .iter()
        .find_map(|point| subject.assets.nodes[*point as usize].origin)
}

/// Customers, hydrants and points of an area, in that order.
fn who_is_there(subject: &Subject<'_>, area: &[usize]) -> Vec<FeatureRef> {
    let inside: std::collections::HashSet<usize> = area.iter().copied().collect();
    let taps = |taps: &[Option<crate::topology::Tap>]| -> Vec<usize> {
        let within = |(at, tap): (usize, &Option<crate::topology::Tap>)| {
            tap.filter(|tap| inside.contains(&(tap.node as usize))).map(|_| at)
        };
        taps.iter().enumerate().filter_map(within).collect()
    };
    let customers = taps(&subject.map.customers)
        .into_iter()
        .map(|at| subject.assets.customers[at].origin);
    let hydrants = taps(&subject.map.hydrants)
        .into_iter()
        .map(|at| subject.assets.hydrants[at].origin);
    let points = area.iter().filter_map(|node| feature_at(subject, *node));
    customers.chain(hydrants).chain(points).collect()
}
