//! Facts: counts that the terminal summary and `summary.json` both tell.

use std::collections::BTreeMap;

use super::Report;
use crate::assets::Role;
use crate::finding::{About, Code, Finding, Severity};
use crate::screening::{Flag, HydrantVerdict, Limit, NodeVerdict, Solved};
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
        report.findings.iter().filter(fits).count()
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
    let nodes = screened.nodes.iter().flat_map(|node| [&node.low, &node.high]);
    let parts = screened.parts.iter().flat_map(|part| [&part.velocity, &part.gradient]);
    let judged = nodes
        .chain(parts)
        .chain(&screened.customers)
        .filter(|verdict| verdict.is_judged());
    let fire_judged = |verdict: &&HydrantVerdict| matches!(verdict.flag, Flag::Ok | Flag::Short);
    let hydrants = screened
        .fire
        .verdicts()
        .into_iter()
        .flatten()
        .filter(fire_judged)
        .count();
    let is_default = |limit: &Limit| limit.is_default;
    let fire_on_default = calculation
        .fire
        .as_ref()
        .is_some_and(|fire| is_default(&fire.residual_m) || fire.keep_elsewhere_m.as_ref().is_some_and(is_default));
    let on_default = judged.clone().filter(|verdict| verdict.on_default).count();
    (
        judged.count() + hydrants,
        on_default + if fire_on_default { hydrants } else { 0 },
    )
}
