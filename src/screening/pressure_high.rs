//! Pressure high: above the limit when nobody draws, where the head stands highest.
//!
//! Judged at every node, since it is the mains and fittings that it strains. Places that are high and hang together make
//! one finding, at the highest of them.

use super::areas::areas;
use super::pressure_low::feature_at;
use super::{Coverage, Flag, NodeVerdict, Subject, Verdict};
use crate::finding::{Code, Finding, Sentence, Severity};
use crate::units::Quantity;

pub(super) fn check(subject: &Subject<'_>, coverage: &Coverage, nodes: &mut [NodeVerdict]) -> Vec<Finding> {
    let Ok(state) = &subject.at_rest.outcome else {
        return Vec::new();
    };
    for (node, verdict) in nodes.iter_mut().enumerate() {
        if let Some(pressure_m) = subject.pressure_m(state, node) {
            let limit = &subject.at_rest.limits.pressure_high_m;
            verdict.high = Verdict::at_most(pressure_m, limit, subject.cases.len());
        }
        verdict.high.settle(coverage.reason[node].is_some(), true);
    }
    let marked: Vec<bool> = nodes.iter().map(|verdict| verdict.high.flag == Flag::High).collect();
    areas(subject.map, &marked)
        .iter()
        .filter_map(|area| area_finding(subject, area, nodes))
        .collect()
}

fn area_finding(subject: &Subject<'_>, area: &[usize], nodes: &[NodeVerdict]) -> Option<Finding> {
    let pressures = area.iter().filter_map(|node| Some((*node, nodes[*node].high.value?)));
    let (node, pressure_m) = pressures.max_by(|a, b| a.1.total_cmp(&b.1))?;
    let limits = &subject.at_rest.limits;
    let serious = pressure_m > limits.pressure_high_serious_m.value;
    let limit = if serious {
        &limits.pressure_high_serious_m
    } else {
        &limits.pressure_high_m
    };
    let feature = feature_at(subject, node).or_else(|| main_at(subject, node));
    let mut message = Sentence::new()
        .text("pressure stands at ")
        .number(pressure_m, Quantity::Pressure);
    message = feature.map_or(message.clone(), |feature| message.text(" at ").feature(feature));
    message = message.text(" when nobody draws");
    if area.len() > 1 {
        message = message.text(format!(
            "; {} places that hang together are above the limit",
            area.len()
        ));
    }
    let mut finding = Finding::new(Code::PressureHigh, message)
        .at(subject.map.nodes[node].at)
        .measured(pressure_m, Quantity::Pressure)
        .limit(limit.value, limit.from.clone());
    finding.feature = feature;
    Some(if serious {
        finding.severity(Severity::Serious)
    } else {
        finding
    })
}

/// A main that ends at a node.
fn main_at(subject: &Subject<'_>, node: usize) -> Option<crate::finding::FeatureRef> {
    let touches = |part: &&crate::topology::MapPart| part.from as usize == node || part.to as usize == node;
    subject
        .map
        .parts
        .iter()
        .find(touches)
        .map(|part| subject.assets.mains[part.main as usize].origin)
}
