//! Velocity high: water runs faster than the limit in some case. One finding a main, at its fastest part.

use std::f64::consts::PI;

use super::{Coverage, Flag, PartVerdict, Subject, Verdict};
use crate::finding::{Code, Finding, Sentence};
use crate::units::Quantity;

pub(super) fn check(subject: &Subject<'_>, coverage: &Coverage, parts: &mut [PartVerdict]) -> Vec<Finding> {
    for (at, part) in subject.network.parts.iter().enumerate() {
        let area_m2 = PI / 4.0 * part.diameter_m * part.diameter_m;
        let found = &mut parts[at];
        for (case, solved, state) in subject.proved() {
            let flow = state.flow_m3_per_s[at];
            if flow.is_finite() {
                let limit = &solved.limits.velocity_high_m_per_s;
                found
                    .velocity
                    .worsen_above(Verdict::at_most(flow.abs() / area_m2, limit, case));
                if found.velocity.case == Some(case) {
                    found.flow_m3_per_s = Some(flow);
                }
            }
        }
        found.velocity.settle(coverage.is_untested(part), true);
    }
    worst_part_of_each_main(subject, parts, |part| &part.velocity)
        .into_iter()
        .map(|(at, velocity, case)| finding(subject, at, velocity, case))
        .collect()
}

fn finding(subject: &Subject<'_>, part: usize, velocity: f64, case: usize) -> Finding {
    let (origin, middle) = main_and_middle(subject, part);
    let limit = &subject.cases[case].limits.velocity_high_m_per_s;
    let message = Sentence::new()
        .feature(origin)
        .text(" runs at ")
        .number(velocity, Quantity::Velocity)
        .text(format!(" in the case `{}`", subject.cases[case].case.name));
    Finding::new(Code::VelocityHigh, message)
        .on(origin)
        .at(middle)
        .measured(velocity, Quantity::Velocity)
        .limit(limit.value, limit.from.clone())
}

/// The part of each main that is flagged and worst, with its value and case.
pub(super) fn worst_part_of_each_main(
    subject: &Subject<'_>,
    parts: &[PartVerdict],
    verdict: impl Fn(&PartVerdict) -> &Verdict,
) -> Vec<(usize, f64, usize)> {
    let mut worst: Vec<Option<(usize, f64, usize)>> = vec![None; subject.assets.mains.len()];
    for (at, part) in parts.iter().enumerate() {
        let (Flag::High, Some(value), Some(case)) = (verdict(part).flag, verdict(part).value, verdict(part).case)
        else {
            continue;
        };
        let slot = &mut worst[subject.map.parts[at].main as usize];
        if slot.is_none_or(|(_, old, _)| value > old) {
            *slot = Some((at, value, case));
        }
    }
    worst.into_iter().flatten().collect()
}

/// The user's main that a part belongs to, and a place half way between the part's ends.
pub(super) fn main_and_middle(subject: &Subject<'_>, part: usize) -> (crate::finding::FeatureRef, [f64; 2]) {
    let part = &subject.map.parts[part];
    let (a, b) = (
        subject.map.nodes[part.from as usize].at,
        subject.map.nodes[part.to as usize].at,
    );
    (
        subject.assets.mains[part.main as usize].origin,
        [(a[0] + b[0]) / 2.0, (a[1] + b[1]) / 2.0],
    )
}
