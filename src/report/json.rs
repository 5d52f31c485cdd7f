//! `summary.json`: the facts of a run for machines. Its shape is documented in `docs/summary-json.md` and only grows.

use serde_json::{Map, Value, json};

use super::facts::{self, CAUTIONS};
use super::{Report, Words, plural};
use crate::assets::{Fillers, UnitUsed};
use crate::finding::{About, FeatureRef};
use crate::screening::{FireRun, Flag, Limit};
use crate::units::UnitSystem;

/// The number of the shape; it rises when a member changes its meaning.
const SCHEMA: u32 = 1;

pub(super) fn summary(report: &Report<'_>) -> Value {
    let mut all = Map::new();
    all.insert("schema".into(), json!(SCHEMA));
    all.insert(
        "program".into(),
        json!({ "name": "gradeline", "version": env!("CARGO_PKG_VERSION") }),
    );
    all.insert("title".into(), json!(report.inputs.title));
    let units = if report.inputs.units == UnitSystem::Us {
        "us"
    } else {
        "si"
    };
    all.insert("units".into(), json!(units));
    all.insert("inputs".into(), inputs(report));
    all.insert("settings".into(), settings(report));
    all.insert("columns".into(), columns(report));
    all.insert("topology".into(), topology(report));
    all.insert("findings".into(), findings(report));
    if report.inputs.calculation.is_some() {
        all.insert("laws".into(), laws(report));
        all.insert("coverage".into(), coverage(report));
        all.insert("cases".into(), cases(report));
        all.insert("verdicts".into(), verdicts(report));
        all.insert("fire".into(), fire(report));
    }
    all.insert("cautions".into(), json!(CAUTIONS));
    Value::Object(all)
}

fn inputs(report: &Report<'_>) -> Value {
    report
        .layers()
        .map(|(role, layer)| {
            json!({
                "role": plural(role),
                "layer": layer.name,
                "file": layer.source.path.file_name().map(|name| name.to_string_lossy()),
                "sha256": layer.source.sha256,
                "crs": layer.crs.name,
                "rows": layer.rows(),
            })
        })
        .collect()
}

fn settings(report: &Report<'_>) -> Value {
    let one = |setting: &super::UsedSetting| json!({ "key": setting.key, "value": setting.value, "from": if setting.is_default { "default" } else { "study" } });
    report.inputs.settings.iter().map(one).collect()
}

/// The unit that each column was read in and how that is known, and fillers that stand for "not known".
fn columns(report: &Report<'_>) -> Value {
    let layer = |index: u16| &report.inputs.set.layers[index as usize].name;
    let unit = |used: &UnitUsed| {
        json!({
            "layer": layer(used.layer),
            "key": used.key,
            "column": used.column,
            "unit": used.unit.name,
            "from": used.from.words(),
        })
    };
    let filler = |found: &Fillers| json!({ "layer": layer(found.layer), "key": found.key, "filler": found.filler, "rows": found.count });
    json!({
        "units": report.inputs.reading.units.iter().map(unit).collect::<Vec<_>>(),
        "fillers": report.inputs.reading.fillers.iter().map(filler).collect::<Vec<_>>(),
    })
}

fn topology(report: &Report<'_>) -> Value {
    let map = report.inputs.map;
    let called = |feature: FeatureRef| report.called(feature);
    let words = Words {
        called: &called,
        units: UnitSystem::Si,
    };
    let joins: Vec<Value> = facts::joins(report)
        .into_iter()
        .map(|(kind, (made, apart))| json!({ "kind": kind.word(), "joined": made, "left_apart": apart }))
        .collect();
    let table: Option<Vec<Value>> = map.tolerance.as_ref().map(|table| {
        let row = |row: &crate::topology::ToleranceRow| {
            json!({
                "tolerance_m": row.tolerance_m,
                "joins": row.joins,
                "pieces": row.islands,
                "largest_share": row.largest_share,
                "mains_swallowed": row.swallowed,
            })
        };
        table.rows.iter().map(row).collect()
    });
    let steps: Vec<Value> = map
        .steps
        .iter()
        .map(|step| json!({ "step": step.step, "count": step.count }))
        .collect();
    json!({
        "tolerance_m": report.inputs.tolerance_m,
        "mains": report.assets().mains.len(),
        "mains_left_out": report.assets().left_out.len(),
        "parts": map.parts.len(),
        "nodes": map.nodes.len(),
        "pieces": map.piece_length_m.len(),
        "steps": steps,
        "joins": joins,
        "tolerance_table": table,
        "tolerance_suggested_m": map.tolerance.as_ref().map(|table| table.suggested_m),
        "tolerance_reason": map.tolerance.as_ref().map(|table| words.sentence(&table.reason)),
    })
}

fn findings(report: &Report<'_>) -> Value {
    let of = |about: About| {
        let [serious, warning, note] = facts::by_severity(report, about);
        let codes: Map<String, Value> = facts::by_code(report, about)
            .iter()
            .map(|of| (of.code.text().name.to_string(), json!(of.count)))
            .collect();
        json!({ "serious": serious, "warning": warning, "note": note, "by_code": codes })
    };
    json!({ "map": of(About::Map), "water": of(About::Water) })
}

/// Constants of the laws, and the residuals that are accepted.
fn laws(report: &Report<'_>) -> Value {
    let Some(calculation) = report.inputs.calculation else {
        return Value::Null;
    };
    let used = &calculation.solved_with;
    json!({
        "hazen_williams": {
            "constant": used.hazen_williams.constant,
            "flow_exponent": used.hazen_williams.flow_exponent,
            "diameter_exponent": used.hazen_williams.diameter_exponent,
        },
        "viscosity_m2_per_s": used.viscosity_m2_per_s,
        "gravity_m_per_s2": used.gravity_m_per_s2,
        "accepted": { "continuity_m3_per_s": used.continuity_m3_per_s, "head_m": used.head_m },
    })
}

fn coverage(report: &Report<'_>) -> Value {
    let Some(calculation) = report.inputs.calculation else {
        return Value::Null;
    };
    let coverage = &calculation.screened.coverage;
    let untested: Map<String, Value> = coverage
        .untested_m
        .iter()
        .map(|(why, m)| (why.word().to_string(), json!(m)))
        .collect();
    json!({
        "length_m": coverage.length_m,
        "tested_share": 1.0 - coverage.untested_share(),
        "untested_m": untested,
    })
}

fn limit(limit: &Limit) -> Value {
    json!({ "value": limit.value, "from": limit.from })
}

fn cases(report: &Report<'_>) -> Value {
    let all = facts::all_cases(report).into_iter();
    all.map(|solved| {
        let (proved, residuals, steps) = match &solved.outcome {
            Ok(state) => (true, state.residuals, state.steps),
            Err(trouble) => (false, trouble.residuals, trouble.steps),
        };
        json!({
            "name": solved.case.name,
            "proved": proved,
            "steps": steps,
            // Not `sum`: that of nothing is minus zero.
            "demand_m3_per_s": solved.demand_m3_per_s.iter().fold(0.0, |all, one| all + one),
            "residuals": {
                "continuity_m3_per_s": residuals.continuity_m3_per_s,
                "head_m": residuals.head_m,
                "head_relative": residuals.head_relative,
            },
            "limits": {
                "pressure_low_m": limit(&solved.limits.pressure_low_m),
                "pressure_low_serious_m": limit(&solved.limits.pressure_low_serious_m),
                "pressure_high_m": limit(&solved.limits.pressure_high_m),
                "pressure_high_serious_m": limit(&solved.limits.pressure_high_serious_m),
                "velocity_high_m_per_s": limit(&solved.limits.velocity_high_m_per_s),
                "gradient_high": limit(&solved.limits.gradient_high),
                "gradient_high_large": limit(&solved.limits.gradient_high_large),
            },
        })
    })
    .collect()
}

fn verdicts(report: &Report<'_>) -> Value {
    let Some(calculation) = report.inputs.calculation else {
        return Value::Null;
    };
    let screened = &calculation.screened;
    let (judged, low) = facts::low_nodes(&screened.nodes);
    let (made, on_default) = facts::verdicts_on_defaults(report);
    json!({
        "nodes_judged": judged,
        "nodes_low": low,
        "nodes_high": screened.nodes.iter().filter(|node| node.high.flag == Flag::High).count(),
        "customers": screened.customers.len(),
        "customers_low": screened.customers.iter().filter(|verdict| verdict.flag == Flag::Low).count(),
        "parts_fast": screened.parts.iter().filter(|part| part.velocity.flag == Flag::High).count(),
        "parts_steep": screened.parts.iter().filter(|part| part.gradient.flag == Flag::High).count(),
        "verdicts": made,
        "verdicts_on_default_limits": on_default,
    })
}

fn fire(report: &Report<'_>) -> Value {
    let Some(calculation) = report.inputs.calculation else {
        return Value::Null;
    };
    match &calculation.screened.fire {
        FireRun::NotRun(why) => json!({ "run": false, "why": why }),
        FireRun::Run(verdicts) => {
            let with = |flag: Flag| facts::hydrants_with(verdicts, flag);
            let asked = calculation.fire.as_ref();
            json!({
                "run": true,
                "case": asked.map(|fire| calculation.cases[fire.case].case.name.as_str()),
                "residual_m": asked.map(|fire| limit(&fire.residual_m)),
                "keep_elsewhere_m": asked.and_then(|fire| fire.keep_elsewhere_m.as_ref()).map(limit),
                "hydrants": verdicts.len(),
                "ok": with(Flag::Ok),
                "short": with(Flag::Short),
                "unserved": with(Flag::Unserved),
                "untested": with(Flag::Untested),
                "not_judged": with(Flag::NotJudged),
            })
        }
    }
}
