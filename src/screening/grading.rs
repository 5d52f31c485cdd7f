//! Grading: the one place where a finding's final severity is set, after the hydraulics, by what the fault does to the
//! answer.
//!
//! - A near miss between a main with a source and one without is serious: everything behind it goes untested if it is real.
//! - An assumed bore decides the answer where it makes the water lose a metre of head or more: serious. Where the main
//!   carries next to nothing in every case it is a note.
//!
//! All else keeps the severity that its check gave it.

use super::{Screened, Subject};
use crate::finding::{Code, FeatureRef, Finding, Severity};

/// Head loss along a main with an assumed bore that makes the assumption serious, m.
const SERIOUS_LOSS_M: f64 = 1.0;
/// Velocity below which a main carries next to nothing, m/s.
const NEXT_TO_NOTHING_M_PER_S: f64 = 0.01;

/// Sets final severities and puts the most serious first.
pub fn grade(subject: &Subject<'_>, screened: &Screened, findings: &mut [Finding]) {
    let mains: std::collections::HashMap<FeatureRef, usize> = subject
        .assets
        .mains
        .iter()
        .enumerate()
        .map(|(at, main)| (main.origin, at))
        .collect();
    let use_of = MainUse::of(subject, screened);
    for finding in findings.iter_mut() {
        let main = finding.feature.and_then(|feature| mains.get(&feature).copied());
        match (finding.code, main) {
            (Code::DiameterMissing | Code::DiameterImpossible, Some(main)) => {
                finding.severity = use_of.severity_of_assumption(main);
            }
            (Code::NearMiss, Some(main)) => {
                let other = finding.others.iter().find_map(|other| mains.get(other).copied());
                if other.is_some_and(|other| use_of.served[main] != use_of.served[other]) {
                    finding.severity = Severity::Serious;
                }
            }
            _ => {}
        }
    }
    sort(findings);
}

/// Puts the most serious first, then by code, layer and row: the order does not depend on how findings were found.
pub fn sort(findings: &mut [Finding]) {
    findings.sort_by(|a, b| {
        let key = |finding: &Finding| (std::cmp::Reverse(finding.severity), finding.code, finding.feature);
        key(a).cmp(&key(b)).then_with(|| a.others.cmp(&b.others))
    });
}

/// What each main does in the case where it works hardest.
struct MainUse {
    served: Vec<bool>,
    velocity_m_per_s: Vec<f64>,
    loss_m: Vec<f64>,
}

impl MainUse {
    fn of(subject: &Subject<'_>, screened: &Screened) -> MainUse {
        let mains = subject.assets.mains.len();
        let mut found = MainUse {
            served: vec![false; mains],
            velocity_m_per_s: vec![0.0; mains],
            loss_m: vec![0.0; mains],
        };
        for (at, verdict) in screened.parts.iter().enumerate() {
            let main = subject.map.parts[at].main as usize;
            let part = &subject.network.parts[at];
            found.served[main] |= subject.network.served[part.from.at()];
            found.velocity_m_per_s[main] = found.velocity_m_per_s[main].max(verdict.velocity.value.unwrap_or(0.0));
            found.loss_m[main] += verdict.gradient.value.unwrap_or(0.0) * part.length_m;
        }
        found
    }

    fn severity_of_assumption(&self, main: usize) -> Severity {
        match main {
            main if self.served[main] && self.loss_m[main] > SERIOUS_LOSS_M => Severity::Serious,
            main if self.served[main] && self.velocity_m_per_s[main] < NEXT_TO_NOTHING_M_PER_S => Severity::Note,
            _ => Severity::Warning,
        }
    }
}
