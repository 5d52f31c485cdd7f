//! Gradient high: head is lost faster along a main than the limit for its size, in some case. One finding a main.

use super::velocity_high::{main_and_middle, worst_part_of_each_main};
use super::{Coverage, Flag, PartVerdict, Subject, Verdict};
use crate::finding::{Code, Finding, Sentence};
use crate::units::Quantity;

/// A part shorter than this has no gradient worth the name: a tap or a valve cluster, m.
const LEAST_LENGTH_M: f64 = 1.0;

pub(super) fn check(subject: &Subject<'_>, coverage: &Coverage, parts: &mut [PartVerdict]) -> Vec<Finding> {
    for (at, part) in subject.network.parts.iter().enumerate() {
        let found = &mut parts[at].gradient;
        for (case, solved, state) in subject.proved() {
            let gradient = (state.head_m[part.from.at()] - state.head_m[part.to.at()]).abs() / part.length_m;
            if gradient.is_finite() {
                let limit = solved.limits.gradient_for(part.diameter_m);
                found.worsen_above(Verdict::at_most(gradient, limit, case));
            }
        }
        if part.length_m < LEAST_LENGTH_M && found.is_judged() {
            (found.flag, found.limit) = (Flag::NotJudged, None);
        }
        found.settle(coverage.is_untested(part), true);
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
