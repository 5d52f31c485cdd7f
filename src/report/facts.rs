//! Facts: counts that the terminal summary and `summary.json` both tell.

use std::collections::BTreeMap;

use super::Report;
use crate::assets::Role;
use crate::finding::{About, Code, Finding, Severity};
use crate::screening::{Flag, HydrantVerdict, NodeVerdict, Solved};
use crate::topology::JoinKind;

/// The cautions that stand wherever results are read.
pub(super) const CAUTIONS: &[&str] = &[
    "These results screen a map. They do not replace field flow tests or the judgement of a licensed engineer.",
    "Local codes and the authority having jurisdiction govern limits; limits marked `default` are not a code requirement.",
    "Values marked `assumed` or `interpolated` must be confirmed before anything is built on them.",
];

/// Findings of one code.
pub(super) struct OfCode<'a> {
    pub code: Code,
    pub worst: Severity,
    pub count: usize,
    /// The most serious of them.
    pub first: &'a Finding,
}

/// Findings by code, the most serious first (they come sorted), of the map or of the water.
pub(super) fn by_code<'a>(report: &'a Report<'_>, about: About) -> Vec<OfCode<'a>> {
    let mut found: Vec<OfCode<'a>> = Vec::new();
    for finding in report
        .inputs
        .findings
        .iter()
        .filter(|finding| finding.code.text().about == about)
    {
        match found.iter_mut().find(|of| of.code == finding.code) {
            Some(of) => of.count += 1,
            None => found.push(OfCode {
                code: finding.code,
                worst: finding.severity,
                count: 1,
                first: finding,
            }),
        }
    }
    found
}

/// How many findings there are of each severity: serious, warnings, notes.
pub(super) fn by_severity(report: &Report<'_>, about: About) -> [usize; 3] {
    let of = |severity: Severity| {
        let fits = |finding: &&Finding| finding.severity == severity && finding.code.text().about == about;
        report.inputs.findings.iter().filter(fits).count()
    };
    [of(Severity::Serious), of(Severity::Warning), of(Severity::Note)]
}

/// How many rows were read for a role.
pub(super) fn rows_read(report: &Report<'_>, role: Role) -> usize {
    report
        .layers()
        .filter(|(of, _)| *of == role)
        .map(|(_, layer)| layer.rows() as usize)
        .sum()
}

/// Joins by kind, made and left apart.
pub(super) fn joins(report: &Report<'_>) -> BTreeMap<JoinKind, (usize, usize)> {
    let mut found = BTreeMap::new();
    for join in &report.inputs.map.joins {
        let (made, apart) = found.entry(join.kind).or_insert((0, 0));
        *(if join.joined { made } else { apart }) += 1;
    }
    found
}

/// How many nodes have each flag for low pressure: judged, low.
pub(super) fn low_nodes(nodes: &[NodeVerdict]) -> (usize, usize) {
    let judged = nodes
        .iter()
        .filter(|node| matches!(node.low.flag, Flag::Ok | Flag::Low));
    (
        judged.clone().count(),
        judged.filter(|node| node.low.flag == Flag::Low).count(),
    )
}

/// How many hydrants have a flag.
pub(super) fn hydrants_with(verdicts: &[HydrantVerdict], flag: Flag) -> usize {
    verdicts.iter().filter(|verdict| verdict.flag == flag).count()
}

/// Every case that was solved or tried, the network at rest last.
pub(super) fn all_cases<'a>(report: &'a Report<'_>) -> Vec<&'a Solved> {
    let calculation = report.inputs.calculation;
    calculation
        .iter()
        .flat_map(|calculation| calculation.cases.iter().chain([&calculation.at_rest]))
        .collect()
}

/// How many verdicts were made, and how many of them by a limit that is a default of ours.
pub(super) fn verdicts_on_defaults(report: &Report<'_>) -> (usize, usize) {
    let Some(calculation) = report.inputs.calculation else {
        return (0, 0);
    };
    let screened = &calculation.screened;
    let (mut made, mut on_default) = (0, 0);
    let mut count = |case: Option<usize>, of: fn(&crate::screening::Limits) -> bool| {
        let Some(case) = case else { return };
        made += 1;
        on_default += usize::from(of(&calculation.cases.get(case).unwrap_or(&calculation.at_rest).limits));
    };
    let judged = |flag: Flag| matches!(flag, Flag::Ok | Flag::Low | Flag::High);
    for node in &screened.nodes {
        count(node.low.case.filter(|_| judged(node.low.flag)), |limits| {
            limits.pressure_low_m.is_default
        });
        count(node.high.case.filter(|_| judged(node.high.flag)), |limits| {
            limits.pressure_high_m.is_default
        });
    }
    for part in &screened.parts {
        count(part.velocity.case.filter(|_| judged(part.velocity.flag)), |limits| {
            limits.velocity_high_m_per_s.is_default
        });
        count(part.gradient.case.filter(|_| judged(part.gradient.flag)), |limits| {
            limits.gradient_high.is_default
        });
    }
    for customer in &screened.customers {
        count(customer.case.filter(|_| judged(customer.flag)), |limits| {
            limits.pressure_low_m.is_default
        });
    }
    (made, on_default)
}
