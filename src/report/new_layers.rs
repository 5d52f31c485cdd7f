//! New layers: parts, nodes, joins, devices, findings, and the tables of every case.

use std::collections::HashMap;
use std::f64::consts::PI;

use super::labels::Labels;
use super::mark_layers::{FRICTION, case_name, friction_entries};
use super::rows::{Entry, Rows};
use super::{Report, Words};
use crate::assets::{Assets, Drawing, NodeKind, Point, ValveKind};
use crate::finding::{Error, FeatureRef, Finding};
use crate::hydraulics::State;
use crate::layers::result_columns::{DEVICES, FINDINGS, JOINS, NODE_CASES, NODES, PART_CASES, PARTS};
use crate::layers::{Crs, Geometry, NewLayer, OutputDir, Table, output_crs, write_new};
use crate::screening::{NodeVerdict, PartVerdict, Solved};
use crate::topology::{JoinKind, MapNode, ValvePlace};
use crate::units::Unit;

/// Writes every layer there is data for.
pub(super) fn write(report: &Report<'_>, out: &mut OutputDir<'_>) -> Result<(), Error> {
    let format = report.inputs.format;
    let crs = output_crs(&report.inputs.set.layers[0], format)?;
    let mut layer = |name: &str, geometry: Geometry, table: Table| {
        write_new(
            out,
            &NewLayer {
                name,
                crs: &crs,
                geometry: &geometry,
                table: &table,
            },
            format,
        )
    };
    layer("parts", part_lines(report, &crs)?, parts(report))?;
    layer(
        "nodes",
        points(report, &crs, report.inputs.map.nodes.iter().map(|node| Some(node.at)))?,
        nodes(report),
    )?;
    let joins: Vec<_> = report
        .inputs
        .map
        .joins
        .iter()
        .filter(|join| join.kind != JoinKind::EndOnEnd)
        .collect();
    layer(
        "joins",
        points(report, &crs, joins.iter().map(|join| Some(join.at)))?,
        joins_table(report, &joins),
    )?;
    let shut = shut_valves(report);
    if !shut.is_empty() {
        let places = shut
            .iter()
            .map(|(_, node_a, _)| Some(report.inputs.map.nodes[*node_a as usize].at));
        layer("devices", points(report, &crs, places)?, devices(report, &shut))?;
    }
    let findings = &report.findings;
    let places = findings.iter().map(|finding| place_of(report, finding));
    layer(
        "findings",
        points(report, &crs, places)?,
        findings_table(report, findings),
    )?;
    if let Some(calculation) = report.inputs.calculation {
        let cases: Vec<&Solved> = calculation.cases.iter().chain([&calculation.at_rest]).collect();
        layer("node_cases", Geometry::None, node_cases(report, &cases))?;
        layer("part_cases", Geometry::None, part_cases(report, &cases))?;
    }
    Ok(())
}

fn points(report: &Report<'_>, crs: &Crs, places: impl Iterator<Item = Option<Point>>) -> Result<Geometry, Error> {
    let places: Vec<Option<Point>> = places.collect();
    let known: Vec<Point> = places.iter().map(|place| place.unwrap_or([f64::NAN; 2])).collect();
    let moved = report.inputs.plane.from_plane(crs, &known)?;
    Ok(Geometry::Points(
        places
            .iter()
            .zip(moved)
            .map(|(place, moved)| place.map(|_| moved))
            .collect(),
    ))
}

/// The drawing of each part: its stretch of the cleaned line, from node to node.
fn part_lines(report: &Report<'_>, crs: &Crs) -> Result<Geometry, Error> {
    let map = report.inputs.map;
    let mut vertices: Vec<Point> = Vec::new();
    let mut ends = Vec::with_capacity(map.parts.len());
    for part in &map.parts {
        let line = &map.lines[part.line as usize];
        vertices.push(map.nodes[part.from as usize].at);
        let mut along_m = 0.0;
        for pair in line.vertices.windows(2) {
            along_m += (pair[1][0] - pair[0][0]).hypot(pair[1][1] - pair[0][1]);
            if along_m > part.start_m + 1e-6 && along_m < part.end_m - 1e-6 {
                vertices.push(pair[1]);
            }
        }
        vertices.push(map.nodes[part.to as usize].at);
        ends.push(vertices.len());
    }
    let moved = report.inputs.plane.from_plane(crs, &vertices)?;
    let mut start = 0;
    let slice = |end: usize| {
        let line = moved[start..end].to_vec();
        start = end;
        line
    };
    Ok(Geometry::Lines(ends.into_iter().map(slice).collect()))
}

fn parts(report: &Report<'_>) -> Table {
    let map = report.inputs.map;
    let mut table = Rows::new(PARTS, report.inputs.units, map.parts.len());
    for (at, part) in map.parts.iter().enumerate() {
        let main = &report.assets().mains[part.main as usize];
        let drawn_m = (part.end_m - part.start_m) * main.length_scale;
        let blank = PartVerdict::default();
        let calculated = report
            .inputs
            .calculation
            .map(|calculation| &calculation.network.parts[at]);
        let verdict = report
            .inputs
            .calculation
            .map_or(&blank, |calculation| &calculation.screened.parts[at]);
        let (used_c, rough) = friction_entries(main.friction.value);
        table.push([
            Labels::part(at).into(),
            report.id(main.origin).into(),
            report.labels.node(part.from as usize).into(),
            report.labels.node(part.to as usize).into(),
            calculated.map_or(drawn_m, |part| part.length_m).into(),
            calculated
                .map(|part| part.diameter_m)
                .or(main.diameter_m.map(|diameter| diameter.value))
                .into(),
            used_c,
            rough,
            calculated.map_or(main.minor_loss_k, |part| part.minor_loss_k).into(),
            verdict.flow_m3_per_s.into(),
            verdict.velocity.value.into(),
        ]);
    }
    table.into_table_without_blank(&FRICTION, PARTS)
}

fn nodes(report: &Report<'_>) -> Table {
    let (assets, map) = (report.assets(), report.inputs.map);
    let calculation = report.inputs.calculation;
    let zones = node_zones(report);
    let mut table = Rows::new(NODES, report.inputs.units, map.nodes.len());
    for (at, node) in map.nodes.iter().enumerate() {
        let blank = NodeVerdict::default();
        let verdict = calculation.map_or(&blank, |calculation| &calculation.screened.nodes[at]);
        let known = || {
            node.points
                .iter()
                .find_map(|point| assets.nodes[*point as usize].elevation_m)
        };
        let elevation = calculation.map_or_else(known, |calculation| calculation.network.elevation_m[at]);
        table.push([
            report.labels.node(at).into(),
            node_kind(assets, node).into(),
            zones[at].map(|zone| assets.zones[zone as usize].as_str()).into(),
            elevation.map(|elevation| elevation.value).into(),
            elevation.map(|elevation| elevation.basis.word()).into(),
            verdict.head_m.into(),
            verdict.lowest_m.into(),
            verdict.low.flag.word().into(),
            case_name(report, &verdict.low),
            verdict.low.margin_above().into(),
            verdict.high.value.into(),
            verdict.high.flag.word().into(),
            case_name(report, &verdict.high),
        ]);
    }
    table.into_table()
}

/// What stands at a node: the first point with a known head counts, as in the calculation.
fn node_kind(assets: &Assets, node: &MapNode) -> &'static str {
    let mut points = node.points.iter().map(|point| &assets.nodes[*point as usize]);
    match points.find(|point| point.head_m.is_some()).map(|point| point.kind) {
        None => "node",
        Some(NodeKind::Tank) => "tank",
        Some(_) => "source",
    }
}

/// The zone of each node: of its own point, else of a main that ends there.
fn node_zones(report: &Report<'_>) -> Vec<Option<u32>> {
    let (assets, map) = (report.assets(), report.inputs.map);
    let own = |node: &crate::topology::MapNode| node.points.iter().find_map(|point| assets.nodes[*point as usize].zone);
    let mut zones: Vec<Option<u32>> = map.nodes.iter().map(own).collect();
    for part in &map.parts {
        for node in [part.from, part.to] {
            let zone = &mut zones[node as usize];
            *zone = zone.or(assets.mains[part.main as usize].zone);
        }
    }
    zones
}

fn joins_table(report: &Report<'_>, joins: &[&crate::topology::Join]) -> Table {
    let main_id = |main: u32| report.id(report.assets().mains[main as usize].origin);
    let mut table = Rows::new(JOINS, report.inputs.units, joins.len());
    for (at, join) in joins.iter().enumerate() {
        table.push([
            format!("join {}", at + 1).into(),
            join.kind.word().into(),
            join.distance_m.into(),
            main_id(join.main_a).into(),
            main_id(join.main_b).into(),
            if join.joined { "yes" } else { "no" }.into(),
            join.why.as_str().into(),
            Entry::Blank,
        ]);
    }
    table.into_table()
}

/// Valves that cut their mains: index into the valves and the nodes on either side.
fn shut_valves(report: &Report<'_>) -> Vec<(usize, u32, u32)> {
    let cut = |(at, place): (usize, &Option<ValvePlace>)| match place {
        Some(ValvePlace::Cut { node_a, node_b, .. }) => Some((at, *node_a, *node_b)),
        _ => None,
    };
    report.inputs.map.valves.iter().enumerate().filter_map(cut).collect()
}

fn devices(report: &Report<'_>, shut: &[(usize, u32, u32)]) -> Table {
    let first = report
        .inputs
        .calculation
        .and_then(|calculation| calculation.cases.first());
    let state = first.and_then(|solved| solved.outcome.as_ref().ok());
    let mut table = Rows::new(DEVICES, report.inputs.units, shut.len());
    for (valve, node_a, node_b) in shut {
        let valve = &report.assets().valves[*valve];
        let head = |node: u32| state.map(|state| state.head_m[node as usize]).into();
        table.push([
            report.id(valve.origin).into(),
            if valve.kind == ValveKind::Zone {
                "zone valve"
            } else {
                "gate valve"
            }
            .into(),
            report.labels.node(*node_a as usize).into(),
            report.labels.node(*node_b as usize).into(),
            "closed".into(),
            state.map(|_| 0.0).into(),
            head(*node_a),
            head(*node_b),
        ]);
    }
    table.into_table()
}

fn findings_table(report: &Report<'_>, findings: &[Finding]) -> Table {
    let called = |feature: FeatureRef| report.called(feature);
    let words = Words {
        called: &called,
        units: report.inputs.units,
    };
    let mut table = Rows::new(FINDINGS, report.inputs.units, findings.len());
    for finding in findings {
        let text = finding.code.text();
        let unit = finding
            .measured
            .map(|measured| Unit::written(measured.quantity, report.inputs.units));
        let in_unit = |value: f64| unit.map(|unit| unit.from_si(value));
        let others: Vec<String> = finding.others.iter().map(|other| report.id(*other)).collect();
        let layer = finding.feature.or(finding.others.first().copied());
        table.push([
            text.name.into(),
            text.about.word().into(),
            finding.severity.word().into(),
            layer
                .map(|feature| report.inputs.set.layers[feature.layer as usize].name.as_str())
                .into(),
            finding.feature.map(|feature| report.id(feature)).into(),
            Some(others.join(", ")).filter(|others| !others.is_empty()).into(),
            finding.measured.and_then(|measured| in_unit(measured.value)).into(),
            finding.limit.as_ref().and_then(|(limit, _)| in_unit(*limit)).into(),
            finding.limit.as_ref().map(|(_, from)| from.as_str()).into(),
            unit.map(|unit| unit.name).filter(|name| !name.is_empty()).into(),
            words.sentence(&finding.message).into(),
            text.todo.into(),
        ]);
    }
    table.into_table()
}

/// Where a finding is: its own place, else that of the feature it is about.
fn place_of(report: &Report<'_>, finding: &Finding) -> Option<Point> {
    let features = finding.feature.into_iter().chain(finding.others.iter().copied());
    finding.at.or_else(|| {
        features
            .take(3)
            .find_map(|feature| report.places.get(&feature).copied())
    })
}

fn node_cases(report: &Report<'_>, cases: &[&Solved]) -> Table {
    let nodes = report.inputs.map.nodes.len();
    let mut table = Rows::new(NODE_CASES, report.inputs.units, nodes * cases.len());
    for solved in cases {
        let state = solved.outcome.as_ref().ok();
        let fed = state.map(|state| fed_in(report, state, solved));
        for node in 0..nodes {
            let elevation = report
                .inputs
                .calculation
                .and_then(|calculation| calculation.network.elevation_m[node]);
            let head_m = state
                .map(|state| state.head_m[node])
                .filter(|head_m| head_m.is_finite());
            table.push([
                report.labels.node(node).into(),
                solved.case.name.as_str().into(),
                head_m.into(),
                head_m
                    .zip(elevation)
                    .map(|(head_m, elevation)| head_m - elevation.value)
                    .into(),
                head_m
                    .and(fed.as_ref())
                    .map(|fed| solved.demand_m3_per_s[node] - fed[node])
                    .into(),
            ]);
        }
    }
    table.into_table()
}

/// What each source feeds in, m3/s: the flow that leaves it along its parts and what is drawn on the spot.
fn fed_in(report: &Report<'_>, state: &State, solved: &Solved) -> Vec<f64> {
    let mut fed = vec![0.0; state.head_m.len()];
    let Some(calculation) = report.inputs.calculation else {
        return fed;
    };
    let mut is_source = vec![false; fed.len()];
    for source in &calculation.network.sources {
        is_source[source.node.at()] = true;
        fed[source.node.at()] = solved.demand_m3_per_s[source.node.at()];
    }
    for (part, flow) in calculation.network.parts.iter().zip(&state.flow_m3_per_s) {
        for (node, leaving) in [(part.from.at(), *flow), (part.to.at(), -*flow)] {
            if is_source[node] && leaving.is_finite() {
                fed[node] += leaving;
            }
        }
    }
    fed
}

fn part_cases(report: &Report<'_>, cases: &[&Solved]) -> Table {
    let map = report.inputs.map;
    let mut table = Rows::new(PART_CASES, report.inputs.units, map.parts.len() * cases.len());
    for solved in cases {
        let state = solved.outcome.as_ref().ok();
        for (at, part) in map.parts.iter().enumerate() {
            let flow = state.map(|state| state.flow_m3_per_s[at]);
            let diameter_m = report
                .inputs
                .calculation
                .map_or(f64::NAN, |calculation| calculation.network.parts[at].diameter_m);
            let loss = state.map(|state| state.head_m[part.from as usize] - state.head_m[part.to as usize]);
            table.push([
                Labels::part(at).into(),
                solved.case.name.as_str().into(),
                flow.into(),
                flow.map(|flow| flow.abs() / (PI / 4.0 * diameter_m * diameter_m))
                    .into(),
                loss.into(),
                "open".into(),
            ]);
        }
    }
    table.into_table()
}

/// A place on every feature that has one: a point itself, the middle vertex of a main.
pub(super) fn places(assets: &Assets) -> HashMap<FeatureRef, Point> {
    let middle = |drawing: &Drawing| match drawing {
        Drawing::Lines(lines) => lines.first().and_then(|line| line.get(line.len() / 2).copied()),
        _ => None,
    };
    let mains = assets.mains.iter().map(|main| (main.origin, middle(&main.drawing)));
    let hydrants = assets.hydrants.iter().map(|hydrant| (hydrant.origin, hydrant.at));
    let customers = assets.customers.iter().map(|customer| (customer.origin, customer.at));
    let valves = assets.valves.iter().map(|valve| (valve.origin, valve.at));
    let nodes = assets.nodes.iter().filter_map(|node| Some((node.origin?, node.at)));
    let all = mains.chain(hydrants).chain(customers).chain(valves).chain(nodes);
    all.filter_map(|(feature, place)| Some((feature, place?))).collect()
}
