//! Gradient high: head is lost faster along a main than the limit for its size, in some case. One finding a main.

use super::velocity_high::{main_and_middle, worst_part_of_each_main};
use super::{Flag, PartVerdict, Subject, Verdict};
use crate::finding::{Code, Finding, Sentence};
use crate::units::Quantity;

/// A part shorter than this has no gradient worth the name: a tap or a valve cluster, m.
const LEAST_LENGTH_M: f64 = 1.0;

pub(super) fn check(subject: &Subject<'_>, parts: &mut [PartVerdict]) -> Vec<Finding> {
    for (at, part) in subject.network.parts.iter().enumerate() {
        for (case, solved, state) in subject.proved() {
            let gradient = (state.head_m[part.from.at()] - state.head_m[part.to.at()]).abs() / part.length_m;
            let found = &mut parts[at].gradient;
            if gradient.is_finite() && found.value.is_none_or(|old| gradient > old) {
                let limit = solved.limits.gradient_for(part.diameter_m).value;
                let flag = match part.length_m {
                    length_m if length_m < LEAST_LENGTH_M => Flag::NotJudged,
                    _ if gradient > limit => Flag::High,
                    _ => Flag::Ok,
                };
                *found = Verdict {
                    flag,
                    value: Some(gradient),
                    limit: Some(limit),
                    case: Some(case),
                };
            }
        }
    }
    worst_part_of_each_main(subject, parts, |part| &part.gradient)
        .into_iter()
        .map(|(at, gradient, case)| finding(subject, at, gradient, case))
        .collect()
}

fn finding(subject: &Subject<'_>, part: usize, gradient: f64, case: usize) -> Finding {
    let (origin, middle) = main_and_middle(subject, part);
    let limit = subject.cases[case]
        .limits
        .gradient_for(subject.network.parts[part].diameter_m);
    let message = Sentence::new()
        .feature(origin)
        .text(" loses ")
        .number(gradient, Quantity::Gradient)
        .text(format!(" in the case `{}`", subject.cases[case].case.name));
    Finding::new(Code::GradientHigh, message)
        .on(origin)
        .at(middle)
        .measured(gradient, Quantity::Gradient)
        .limit(limit.value, limit.from.clone())
}
