//! Pressure low: below the limit where customers draw or hydrants stand, in any case of the study.
//!
//! A node is judged at its own elevation; a customer at its own elevation plus its highest tap, where these are known.
//! Places that are low and hang together make one finding, at the lowest of them.

use super::areas::areas;
use super::coverage::{Coverage, Untested};
use super::undelivered::Undelivered;
use super::{Flag, NodeVerdict, Subject, Verdict};
use crate::finding::{Code, FeatureRef, Finding, Sentence, Severity};
use crate::units::Quantity;

/// How many customers or hydrants of an area are named in its finding.
const NAMED_AT_MOST: usize = 50;
/// Less than this missing is not worth a word, m3/s.
const NEXT_TO_NOTHING_M3_PER_S: f64 = 1e-6;

/// The pressure at a node that lies worst against its limit, and whose it is.
#[derive(Clone, Copy)]
struct Lowest {
    pressure_m: f64,
    margin_m: f64,
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
    undelivered: &Undelivered,
    nodes: &mut [NodeVerdict],
    customers: &mut Vec<Verdict>,
) -> Vec<Finding> {
    let judged = judged_nodes(subject);
    for (node, verdict) in nodes.iter_mut().enumerate() {
        judge_node(subject, node, verdict);
        // Below zero is trouble for every main, drawn at or not.
        let judged = judged[node] || verdict.lowest_m.is_some_and(|lowest_m| lowest_m < 0.0);
        verdict.low.settle(coverage.reason[node].is_some(), judged);
    }
    *customers = judge_customers(subject, coverage);
    findings(subject, undelivered, nodes, customers)
}

/// Where customers draw or hydrants stand.
fn judged_nodes(subject: &Subject<'_>) -> Vec<bool> {
    let mut judged = vec![false; subject.map.nodes.len()];
    let draws = subject.network.draws.iter().map(|draw| draw.node.at());
    let hydrants = subject.map.hydrants.iter().flatten().map(|tap| tap.node as usize);
    draws.chain(hydrants).for_each(|node| judged[node] = true);
    judged
}

fn judge_node(subject: &Subject<'_>, node: usize, verdict: &mut NodeVerdict) {
    for (case, solved, state) in subject.proved() {
        let head_m = Some(state.head_m[node]).filter(|head_m| head_m.is_finite());
        let pressure_m = subject.pressure_m(state, node);
        if let Some(pressure_m) = pressure_m {
            let limit = &solved.limits.pressure_low_m;
            verdict.low.worsen_below(Verdict::at_least(pressure_m, limit, case));
        }
        // One elevation a node: the lowest head is the lowest pressure, and worth showing even without an elevation.
        if head_m.is_some_and(|new| verdict.head_m.is_none_or(|old| new < old)) {
            (verdict.head_m, verdict.lowest_m) = (head_m, pressure_m);
        }
    }
}

fn judge_customers(subject: &Subject<'_>, coverage: &Coverage) -> Vec<Verdict> {
    let of_customer = subject.assets.customers.iter().zip(&subject.map.customers);
    of_customer
        .map(|(customer, tap)| {
            let mut worst = Verdict::default();
            let Some(node) = tap.map(|tap| tap.node as usize) else {
                return worst;
            };
            let ground_m = customer
                .elevation_m
                .or(subject.network.elevation_m[node].map(|node| node.value));
            for (case, solved, state) in subject.proved() {
                let pressure_m = ground_m.map(|ground_m| state.head_m[node] - ground_m - customer.lift_m);
                if let Some(pressure_m) = pressure_m.filter(|pressure_m| pressure_m.is_finite()) {
                    worst.worsen_below(Verdict::at_least(pressure_m, &solved.limits.pressure_low_m, case));
                }
            }
            // A customer's own elevation is enough where its main has none.
            let why =
                coverage.reason[node].filter(|why| *why != Untested::NoElevation || customer.elevation_m.is_none());
            worst.settle(why.is_some(), true);
            worst
        })
        .collect()
}

fn findings(
    subject: &Subject<'_>,
    undelivered: &Undelivered,
    nodes: &[NodeVerdict],
    customers: &[Verdict],
) -> Vec<Finding> {
    let mut lowest: Vec<Option<Lowest>> = vec![None; nodes.len()];
    let mut lower = |node: usize, verdict: &Verdict, at: FeatureOrNode| {
        let (Flag::Low, Some(pressure_m), Some(case)) = (verdict.flag, verdict.value, verdict.case) else {
            return;
        };
        let margin_m = verdict.margin_above().unwrap_or(0.0);
        if lowest[node].is_none_or(|old| margin_m < old.margin_m) {
            lowest[node] = Some(Lowest {
                pressure_m,
                margin_m,
                case,
                at,
            });
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
    let links = |(node, verdict): (usize, &NodeVerdict)| {
        let limit_m = verdict
            .low
            .case
            .map(|case| subject.cases[case].limits.pressure_low_m.value);
        lowest[node].is_some() || verdict.low.flag == Flag::NotJudged && verdict.low.value < limit_m
    };
    let marked: Vec<bool> = nodes.iter().enumerate().map(links).collect();
    let found = areas(subject.map, &marked);
    found
        .iter()
        .filter_map(|area| area_finding(subject, undelivered, area, &lowest))
        .collect()
}

fn area_finding(
    subject: &Subject<'_>,
    undelivered: &Undelivered,
    area: &[usize],
    lowest: &[Option<Lowest>],
) -> Option<Finding> {
    let low_nodes = area.iter().filter_map(|node| Some((*node, lowest[*node]?)));
    let (worst_node, worst) = low_nodes.clone().min_by(|a, b| a.1.margin_m.total_cmp(&b.1.margin_m))?;
    let named = who_is_there(subject, area);
    let feature = match worst.at {
        FeatureOrNode::Feature(feature) => Some(feature),
        FeatureOrNode::Node => feature_at(subject, worst_node).or(named.first().copied()),
    };
    let mut message = Sentence::from("pressure falls to ").number(worst.pressure_m, Quantity::Pressure);
    message = feature.map_or(message.clone(), |feature| message.text(" at ").feature(feature));
    message = message.text(format!(" in the case `{}`", subject.cases[worst.case].case.name));
    let places = low_nodes.count();
    if places > 1 {
        message = message.text(format!("; {places} places that hang together are below the limit"));
    }
    let missing = undelivered[worst.case].as_ref();
    let missing_m3_per_s: f64 = missing.map_or(0.0, |missing| area.iter().map(|node| missing[*node]).sum());
    if missing_m3_per_s > NEXT_TO_NOTHING_M3_PER_S {
        message = message.text("; with draws that follow the pressure, ");
        message = message
            .number(missing_m3_per_s, Quantity::Flow)
            .text(" is not delivered there");
    }
    let mut finding = graded(subject, &worst, message).at(subject.map.nodes[worst_node].at);
    finding.feature = feature;
    finding.others = named
        .into_iter()
        .filter(|other| Some(*other) != feature)
        .take(NAMED_AT_MOST)
        .collect();
    Some(finding)
}

/// The finding with its code, limit and severity: cannot be supplied, seriously low, or low.
fn graded(subject: &Subject<'_>, worst: &Lowest, message: Sentence) -> Finding {
    let limits = &subject.cases[worst.case].limits;
    let serious = worst.pressure_m < limits.pressure_low_serious_m.value;
    let limit = if serious {
        &limits.pressure_low_serious_m
    } else {
        &limits.pressure_low_m
    };
    let finding = match worst.pressure_m < 0.0 {
        true => Finding::new(Code::CannotBeSupplied, message).limit(0.0, "pressure of the open air"),
        false => Finding::new(Code::PressureLow, message).limit(limit.value, limit.from.clone()),
    };
    let severity = if serious { Severity::Serious } else { Severity::Warning };
    finding
        .measured(worst.pressure_m, Quantity::Pressure)
        .severity(severity)
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
