//! The user's own layers with our columns appended: mains, hydrants and customers, every row and column kept.

use std::ops::Range;

use super::rows::{Entry, Rows};
use super::{Report, plural};
use crate::assets::{Basis, Role};
use crate::finding::{Error, FeatureRef, Finding};
use crate::layers::result_columns::{CUSTOMERS, HYDRANTS, MAINS};
use crate::layers::{OutputDir, Table, write_marked};
use crate::network::{Friction, NodeIx};
use crate::screening::{Flag, HydrantVerdict, LimitBy, PartVerdict, Verdict};

/// Stems of the columns that belong to one law of friction or the other.
pub(super) const FRICTION: [&str; 2] = ["used_c", "rough"];

/// Writes every layer that results go back onto. Renamed columns come back as findings.
pub(super) fn write(report: &Report<'_>, out: &mut OutputDir<'_>) -> Result<Vec<Finding>, Error> {
    let mut findings = Vec::new();
    for (index, (role, layer)) in report.layers().enumerate() {
        let (index, rows) = (index as u16, layer.rows());
        let table = match (role, report.inputs.calculation) {
            (Role::Main, _) => mains(report, index, rows),
            (Role::Hydrant, Some(_)) => hydrants(report, index, rows),
            (Role::Customer, Some(_)) => customers(report, index, rows),
            _ => continue,
        };
        let written = write_marked(out, &name(report, index), layer, &table, report.inputs.format)?;
        findings.extend(written.findings);
    }
    Ok(findings)
}

/// `mains`, or `mains_2` for the second of several layers of one role.
fn name(report: &Report<'_>, index: u16) -> String {
    let role = report.inputs.reading.names.role(index).unwrap_or(Role::Main);
    let before = report
        .layers()
        .take(index as usize)
        .filter(|(other, _)| *other == role)
        .count();
    if before == 0 {
        plural(role).to_string()
    } else {
        format!("{}_{}", plural(role), before + 1)
    }
}

/// For each row of a layer the index of the asset that it became, if it became one.
fn by_row(rows: u32, layer: u16, origins: impl Iterator<Item = FeatureRef>) -> Vec<Option<usize>> {
    let mut asset = vec![None; rows as usize];
    for (at, origin) in origins.enumerate().filter(|(_, origin)| origin.layer == layer) {
        asset[origin.row as usize] = Some(at);
    }
    asset
}

fn mains(report: &Report<'_>, layer: u16, rows: u32) -> Table {
    let (assets, map) = (report.assets(), report.inputs.map);
    let mut parts_of: Vec<Range<usize>> = vec![0..0; assets.mains.len()];
    for (at, part) in map.parts.iter().enumerate() {
        let range = &mut parts_of[part.main as usize];
        *range = if range.start == range.end {
            at..at + 1
        } else {
            range.start..at + 1
        };
    }
    // A duplicate shows what was calculated for the main it lies on.
    let mut stands_for: Vec<usize> = (0..assets.mains.len()).collect();
    map.same_as
        .iter()
        .for_each(|(dropped, kept)| stands_for[*dropped as usize] = *kept as usize);
    let mut table = Rows::new(MAINS, report.inputs.units, rows as usize);
    for main in by_row(rows, layer, assets.mains.iter().map(|main| main.origin)) {
        match main {
            Some(main) => {
                let calculated = stands_for[main];
                push_main(
                    report,
                    &mut table,
                    calculated,
                    parts_of[calculated].clone(),
                    main != calculated,
                );
            }
            None => push_main_without_parts(&mut table, "left out"),
        }
    }
    table.into_table_without_blank(&FRICTION, MAINS)
}

fn push_main_without_parts(table: &mut Rows, served: &str) {
    use Entry::Blank as B;
    let untested = || Entry::from("untested");
    table.push([
        B,
        B,
        untested(),
        B,
        B,
        untested(),
        B,
        B,
        B,
        B,
        B,
        B,
        Entry::Whole(0),
        served.into(),
    ]);
}

fn push_main(report: &Report<'_>, table: &mut Rows, main: usize, parts: Range<usize>, duplicate: bool) {
    if parts.is_empty() {
        return push_main_without_parts(table, "not drawn");
    }
    let asset = &report.assets().mains[main];
    let [flow, vel, vel_flag, vel_case, grad, grad_flag, grad_case] = results(report, parts.clone());
    let calculated = report
        .inputs
        .calculation
        .map(|calculation| calculation.network.main_diameter_m[main]);
    let diameter = calculated.or(asset.diameter_m);
    let (used_c, rough) = friction_entries(asset.friction.value);
    table.push([
        flow,
        vel,
        vel_flag,
        vel_case,
        grad,
        grad_flag,
        grad_case,
        diameter.map(|diameter| diameter.value).into(),
        // A copy shows what was calculated for the main it lies on.
        diameter
            .map(|diameter| if duplicate { Basis::Joined } else { diameter.basis }.word())
            .into(),
        used_c,
        rough,
        asset.friction.basis.word().into(),
        Entry::Whole(parts.len() as i64),
        if duplicate {
            "duplicate".into()
        } else {
            served(report, parts)
        },
    ]);
}

/// Flow, velocity and gradient of a main: of its worst part.
fn results(report: &Report<'_>, parts: Range<usize>) -> [Entry; 7] {
    use Entry::Blank as B;
    let Some(calculation) = report.inputs.calculation else {
        return [B, B, "untested".into(), B, B, "untested".into(), B];
    };
    let verdicts = &calculation.screened.parts;
    let fastest = worst_part(verdicts, parts.clone(), |part| &part.velocity);
    let velocity = &verdicts[fastest].velocity;
    let gradient = &verdicts[worst_part(verdicts, parts, |part| &part.gradient)].gradient;
    [
        verdicts[fastest].flow_m3_per_s.into(),
        velocity.value.into(),
        velocity.flag.word().into(),
        case_name(report, velocity),
        gradient.value.into(),
        gradient.flag.word().into(),
        case_name(report, gradient),
    ]
}

/// A part that breaks its limit comes before one that is judged, and that before a stub that is not.
fn worst_part(verdicts: &[PartVerdict], parts: Range<usize>, of: fn(&PartVerdict) -> &Verdict) -> usize {
    let rank = |part: &usize| {
        let verdict = of(&verdicts[*part]);
        let share = verdict.value.zip(verdict.limit).map(|(value, limit)| value / limit);
        let size = share.or(verdict.value).unwrap_or(f64::NEG_INFINITY);
        (verdict.flag == Flag::High, verdict.is_judged(), size)
    };
    let by = |a: &usize, b: &usize| {
        let (a, b) = (rank(a), rank(b));
        (a.0, a.1).cmp(&(b.0, b.1)).then(a.2.total_cmp(&b.2))
    };
    parts.max_by(by).expect("a main with parts")
}

/// Whether a main hangs together with a source; blank where only the map was asked for and it has none.
fn served(report: &Report<'_>, mut parts: Range<usize>) -> Entry {
    let map = report.inputs.map;
    if report.inputs.calculation.is_none() && !report.fed.contains(&true) {
        return Entry::Blank;
    }
    let is_fed = parts.any(|part| report.fed[map.piece_of_node[map.parts[part].from as usize] as usize]);
    if is_fed { "yes" } else { "unserved" }.into()
}

/// A C-factor and a roughness height: one of the two is blank.
pub(super) fn friction_entries(friction: Friction) -> (Entry, Entry) {
    match friction {
        Friction::CFactor(c) => (c.into(), Entry::Blank),
        Friction::RoughnessM(height_m) => (Entry::Blank, height_m.into()),
    }
}

/// The name of the case that a verdict is of.
pub(super) fn case_name(report: &Report<'_>, verdict: &Verdict) -> Entry {
    let Some((calculation, case)) = report.inputs.calculation.zip(verdict.case) else {
        return Entry::Blank;
    };
    calculation
        .cases
        .get(case)
        .unwrap_or(&calculation.at_rest)
        .case
        .name
        .as_str()
        .into()
}

fn hydrants(report: &Report<'_>, layer: u16, rows: u32) -> Table {
    let (assets, map) = (report.assets(), report.inputs.map);
    let verdicts = report
        .inputs
        .calculation
        .and_then(|calculation| calculation.screened.fire.verdicts());
    let mut table = Rows::new(HYDRANTS, report.inputs.units, rows as usize);
    for hydrant in by_row(rows, layer, assets.hydrants.iter().map(|hydrant| hydrant.origin)) {
        let Some(hydrant) = hydrant else {
            table.push_blank();
            continue;
        };
        let node = map.hydrants[hydrant]
            .map(|tap| report.labels.node(tap.node as usize))
            .into();
        let Some(verdict) = verdicts.map(|verdicts| &verdicts[hydrant]) else {
            use Entry::Blank as B;
            table.push([node, B, B, B, B, B, B, "untested".into(), B, B, B]);
            continue;
        };
        let limit_at = match verdict.limit_by {
            Some(LimitBy::Elsewhere(at)) => Some(limit_at(report, verdict, at)),
            Some(LimitBy::OwnPressure | LimitBy::AlreadyLow) => {
                map.hydrants[hydrant].map(|tap| report.labels.node(tap.node as usize).to_string())
            }
            _ => None,
        };
        table.push([
            node,
            verdict.static_m.into(),
            verdict.needed_m3_per_s.into(),
            verdict.available_m3_per_s.into(),
            verdict.safe_m3_per_s.into(),
            verdict.short_m3_per_s().into(),
            verdict.at_need_m.into(),
            verdict.flag.word().into(),
            verdict.limit_by.map(LimitBy::word).into(),
            limit_at.into(),
            verdict.judged_at.map(|at| at.word()).into(),
        ]);
    }
    table.into_table()
}

/// The customer at whose level a limit elsewhere is met, else the node.
fn limit_at(report: &Report<'_>, verdict: &HydrantVerdict, node: NodeIx) -> String {
    let customer = |feature: &FeatureRef| report.inputs.reading.names.role(feature.layer) == Some(Role::Customer);
    match verdict.limit_at.filter(customer) {
        Some(customer) => report.called(customer),
        None => report.labels.node(node.at()).to_string(),
    }
}

fn customers(report: &Report<'_>, layer: u16, rows: u32) -> Table {
    let (assets, map) = (report.assets(), report.inputs.map);
    let verdicts = report
        .inputs
        .calculation
        .map(|calculation| &calculation.screened.customers);
    let mut table = Rows::new(CUSTOMERS, report.inputs.units, rows as usize);
    for customer in by_row(rows, layer, assets.customers.iter().map(|customer| customer.origin)) {
        let Some(customer) = customer else {
            table.push_blank();
            continue;
        };
        let tap = map.customers[customer];
        let blank = Verdict::default();
        let verdict = verdicts.map_or(&blank, |verdicts| &verdicts[customer]);
        table.push([
            tap.map(|tap| report.id(assets.mains[tap.main as usize].origin)).into(),
            tap.map(|tap| report.labels.node(tap.node as usize)).into(),
            verdict.value.into(),
            verdict.flag.word().into(),
            case_name(report, verdict),
            verdict.margin_above().into(),
        ]);
    }
    table.into_table()
}
