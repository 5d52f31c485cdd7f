//! Grading: the one place where a finding's final severity is set, after the hydraulics, by what the fault does to the
//! answer.
//!
//! - A near miss between a main with a source and one without is serious: everything behind it goes untested if it is real.
//! - An assumed bore decides the answer where it makes the water lose a metre of head or more: serious. Where the main
//!   carries next to nothing in every case it is a note. The bore that was assumed is said.
//! - A pressure out of bounds beside an elevation that is doubted is more likely a fault of the map: one step lower, and said.
//! - A connection left apart, or a closed valve, that likely explains a hydrant's shortfall is one step more serious.
//!
//! All else keeps the severity that its check gave it.

use std::collections::{HashMap, HashSet};

use super::{Flag, Screened, Subject};
use crate::assets::Point;
use crate::finding::{Code, FeatureRef, Finding, Severity};
use crate::units::Quantity;

/// Head loss along a main with an assumed bore that makes the assumption serious, m.
const SERIOUS_LOSS_M: f64 = 1.0;
/// A pressure this near to a doubted elevation may owe itself to it, m.
const BESIDE_M: f64 = 150.0;
/// Velocity below which a main carries next to nothing, m/s.
const NEXT_TO_NOTHING_M_PER_S: f64 = 0.01;

/// Sets final severities and puts the most serious first.
pub fn grade(subject: &Subject<'_>, screened: &Screened, findings: &mut [Finding]) {
    let mains: HashMap<FeatureRef, usize> = subject
        .assets
        .mains
        .iter()
        .enumerate()
        .map(|(at, main)| (main.origin, at))
        .collect();
    let use_of = MainUse::of(subject, screened);
    let doubted: Vec<(FeatureRef, Point)> = findings
        .iter()
        .filter(|finding| finding.code == Code::ElevationDoubtful)
        .filter_map(|finding| Some((finding.feature?, finding.at?)))
        .collect();
    for finding in findings.iter_mut() {
        let named = finding.feature.iter().chain(&finding.others);
        let named: Vec<usize> = named.filter_map(|feature| mains.get(feature).copied()).collect();
        match finding.code {
            Code::DiameterMissing | Code::DiameterImpossible => grade_assumption(subject, &use_of, &named, finding),
            Code::NearMiss => {
                if let [main, other, ..] = named[..]
                    && use_of.served[main] != use_of.served[other]
                {
                    finding.severity = Severity::Serious;
                }
            }
            Code::PressureHigh | Code::PressureLow | Code::CannotBeSupplied => doubt(&doubted, finding),
            _ => {}
        }
    }
    raise_suspects(screened, findings);
    sort(findings);
}

/// Raises what likely explains a hydrant's shortfall by one step.
fn raise_suspects(screened: &Screened, findings: &mut [Finding]) {
    let hydrants = screened.fire.verdicts().into_iter().flatten();
    let short = hydrants.filter(|hydrant| hydrant.flag == Flag::Short);
    let suspects: HashSet<[FeatureRef; 2]> = short.filter_map(|hydrant| Some(hydrant.suspect?.0)).collect();
    let apart = |code: Code| matches!(code, Code::NearMiss | Code::ValveClosed | Code::CrossingNotJoined);
    for finding in findings.iter_mut().filter(|finding| apart(finding.code)) {
        let takes_part = |feature: &FeatureRef| finding.feature == Some(*feature) || finding.others.contains(feature);
        if suspects.iter().any(|suspect| suspect.iter().all(takes_part)) {
            finding.severity = match finding.severity {
                Severity::Note => Severity::Warning,
                _ => Severity::Serious,
            };
        }
    }
}

/// Grades an assumed bore by the main that it matters most for, and says the bore where the finding is about one main.
fn grade_assumption(subject: &Subject<'_>, use_of: &MainUse, named: &[usize], finding: &mut Finding) {
    let Some(severity) = named.iter().map(|main| use_of.severity_of_assumption(*main)).max() else {
        return;
    };
    finding.severity = severity;
    if let [main] = named {
        let bore_m = subject.network.main_diameter_m[*main].value;
        let message = std::mem::take(&mut finding.message);
        finding.message = message.text("; calculated with ").number(bore_m, Quantity::Diameter);
    }
}

/// Lowers a pressure finding beside a doubted elevation, and names it.
fn doubt(doubted: &[(FeatureRef, Point)], finding: &mut Finding) {
    let Some(at) = finding.at else { return };
    let near = |(_, place): &&(FeatureRef, Point)| (place[0] - at[0]).hypot(place[1] - at[1]) <= BESIDE_M;
    let Some((feature, _)) = doubted.iter().find(near) else {
        return;
    };
    finding.severity = match finding.severity {
        Severity::Serious => Severity::Warning,
        _ => Severity::Note,
    };
    let message = std::mem::take(&mut finding.message);
    finding.message = message
        .text("; the elevation of ")
        .feature(*feature)
        .text(" beside it is doubtful: look there first");
    finding.others.push(*feature);
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
