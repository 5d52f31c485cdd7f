//! Coverage: how much of the map was tested, and why the rest was not. Untested is not ok.

use super::Subject;
use crate::finding::{Code, Finding, Sentence};
use crate::network::Part;
use crate::units::Quantity;

/// Why a place could not be tested.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Untested {
    /// It hangs together with no source.
    NoSource,
    /// Nobody draws on anything it hangs together with.
    NoDemand,
    /// No elevation is known on anything it hangs together with.
    NoElevation,
    /// No case has a solution.
    NotProved,
}

impl Untested {
    /// The words that are written.
    pub fn word(self) -> &'static str {
        match self {
            Untested::NoSource => "no source",
            Untested::NoDemand => "no demand",
            Untested::NoElevation => "no elevation",
            Untested::NotProved => "no proved solution",
        }
    }

    /// Every reason, in the order in which the first that holds is named.
    pub const ALL: [Untested; 4] = [
        Untested::NoSource,
        Untested::NotProved,
        Untested::NoElevation,
        Untested::NoDemand,
    ];
}

/// How much of the map was tested.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Coverage {
    /// Why each node is untested; `None` where it was tested.
    pub reason: Vec<Option<Untested>>,
    /// Length of all parts, m.
    pub length_m: f64,
    /// Length of the untested ones by reason, m.
    pub untested_m: Vec<(Untested, f64)>,
}

impl Coverage {
    /// Whether either end of a part is untested.
    pub fn is_untested(&self, part: &Part) -> bool {
        self.reason[part.from.at()].is_some() || self.reason[part.to.at()].is_some()
    }

    /// Share of the length that is untested, 0 to 1; 1 where there is no length at all.
    pub fn untested_share(&self) -> f64 {
        if self.length_m > 0.0 {
            self.untested_m.iter().map(|(_, m)| m).sum::<f64>() / self.length_m
        } else {
            1.0
        }
    }
}

/// Finds out what was tested. A part is untested when either of its ends is.
pub(super) fn coverage(subject: &Subject<'_>) -> Coverage {
    let network = subject.network;
    let mut drawn = vec![false; subject.map.piece_length_m.len()];
    for draw in &network.draws {
        drawn[subject.map.piece_of_node[draw.node.at()] as usize] = true;
    }
    let proved = subject.proved().next().is_some();
    let reason_of = |node: usize| match () {
        () if !network.served[node] => Some(Untested::NoSource),
        () if !proved => Some(Untested::NotProved),
        () if network.elevation_m[node].is_none() => Some(Untested::NoElevation),
        () if !drawn[subject.map.piece_of_node[node] as usize] => Some(Untested::NoDemand),
        () => None,
    };
    let reason: Vec<Option<Untested>> = (0..network.served.len()).map(reason_of).collect();
    let mut untested_m: Vec<(Untested, f64)> = Untested::ALL.iter().map(|reason| (*reason, 0.0)).collect();
    for part in &network.parts {
        if let Some(why) = reason[part.from.at()].or(reason[part.to.at()]) {
            untested_m
                .iter_mut()
                .filter(|(of, _)| *of == why)
                .for_each(|(_, m)| *m += part.length_m);
        }
    }
    untested_m.retain(|(_, m)| *m > 0.0);
    Coverage {
        reason,
        // Not `sum`: that of nothing is minus zero, and would be printed so.
        length_m: network.parts.iter().fold(0.0, |all, part| all + part.length_m),
        untested_m,
    }
}

/// One finding a connected piece that is served but has no elevation or no demand to go by. (That a piece has no source
/// is said by the topology, and that there is nothing at all to go by when the network is assembled.)
pub(super) fn untested_pieces(subject: &Subject<'_>, coverage: &Coverage) -> Vec<Finding> {
    let mut why: Vec<Option<(Untested, usize)>> = vec![None; subject.map.piece_length_m.len()];
    for (at, part) in subject.map.parts.iter().enumerate() {
        let piece = subject.map.piece_of_node[part.from as usize] as usize;
        why[piece] = why[piece].or(coverage.reason[part.from as usize].map(|reason| (reason, at)));
    }
    let nobody_draws = subject
        .network
        .draws
        .iter()
        .all(|draw| !subject.network.served[draw.node.at()]);
    let said = why
        .iter()
        .zip(&subject.map.piece_length_m)
        .filter_map(|(why, length_m)| {
            let (code, words) = match why.as_ref()?.0 {
                Untested::NoElevation => (Code::ElevationUnknown, " has no known elevation"),
                Untested::NoDemand if !nobody_draws => (Code::NoDemand, " has a source, but nobody draws on it"),
                _ => return None,
            };
            let main = subject.assets.mains[subject.map.parts[why.as_ref()?.1].main as usize].origin;
            let message = Sentence::from("a piece of ").number(*length_m, Quantity::Length);
            let message = message.text(" around ").feature(main).text(words);
            Some(Finding::new(code, message).on(main))
        });
    said.collect()
}

/// One finding a case that did not settle, with the worst three parts.
pub(super) fn not_proved(subject: &Subject<'_>) -> Vec<Finding> {
    let cases = subject.cases.iter().chain(std::iter::once(subject.at_rest));
    cases
        .filter_map(|solved| {
            let trouble = solved.outcome.as_ref().err()?;
            let mut message = Sentence::new().text(format!(
                "the case `{}` did not settle in {} steps; the parts with the largest error in head are",
                solved.case.name, trouble.steps
            ));
            let mut origins = Vec::new();
            for (at, (part, error_m)) in trouble.worst.iter().enumerate() {
                let origin = subject.assets.mains[subject.map.parts[part.at()].main as usize].origin;
                message = message
                    .text(if at == 0 { " " } else { ", " })
                    .feature(origin)
                    .text(" (");
                message = message.number(*error_m, Quantity::Length).text(")");
                origins.push(origin);
            }
            let mut finding = Finding::new(Code::CaseNotProved, message);
            finding.feature = origins.first().copied();
            finding.others = origins.into_iter().skip(1).collect();
            Some(finding)
        })
        .collect()
}
