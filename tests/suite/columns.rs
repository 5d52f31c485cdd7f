//! Reading of columns: what the map says becomes SI values with a basis, and what is wrong with it becomes findings.

use std::fs;

use gradeline::assets::{self, Basis, Friction, MainKind, NamedMain, NodeKind, Reading, UnitFrom, ValveKind};
use gradeline::finding::{Checked, Code, Error, Finding, Severity};
use gradeline::layers::{Layer, LayerSet, LocalPlane, ReadOptions};
use gradeline::study::Study;
use serde_json::{Value, json};

/// A layer of lines, 100 m each, side by side in a projected system in metres.
fn mains(rows: &[Value]) -> Value {
    let features = rows.iter().enumerate().map(|(row, properties)| {
        let x = 20.0 * row as f64;
        json!({"type": "Feature", "properties": properties,
            "geometry": {"type": "LineString", "coordinates": [[500_000.0 + x, 5_000_000.0], [500_000.0 + x, 5_000_100.0]]}})
    });
    collection(features.collect())
}

/// A layer of points on the starts of those lines.
fn points(rows: &[Value]) -> Value {
    let features = rows.iter().enumerate().map(|(row, properties)| {
        let x = 20.0 * row as f64;
        json!({"type": "Feature", "properties": properties,
            "geometry": {"type": "Point", "coordinates": [500_000.0 + x, 5_000_000.0]}})
    });
    collection(features.collect())
}

fn collection(features: Vec<Value>) -> Value {
    json!({"type": "FeatureCollection", "crs": {"type": "name", "properties": {"name": "urn:ogc:def:crs:EPSG::32633"}},
        "features": features})
}

/// Reads the layers that a study names, each given by its file name.
fn read(study: &str, layers: &[(&str, Value)]) -> Result<Checked<Reading>, Error> {
    let folder = tempfile::tempdir().unwrap();
    for (name, layer) in layers {
        fs::write(folder.path().join(name), layer.to_string()).unwrap();
    }
    let path = folder.path().join("study.toml");
    fs::write(&path, study).unwrap();
    let study = Study::read(&path)?;
    let wanted = assets::wanted_columns(&study.assets);
    let mut set = LayerSet::default();
    for (index, file) in study.layers.iter().enumerate() {
        let columns = wanted[index].1.clone();
        let options = ReadOptions {
            columns,
            encoding: None,
        };
        set.layers.push(Layer::read(&file.path, index as u16, &options)?.value);
    }
    let plane = LocalPlane::for_layer(&set.layers[0])?;
    assets::read(&set, &study.assets, &plane, &study.path)
}

/// Reads mains alone, with more keys of `[mains]`.
fn read_mains(keys: &str, rows: &[Value]) -> Checked<Reading> {
    read(
        &format!("[mains]\nfrom = \"m.geojson\"\nid = \"id\"\n{keys}"),
        &[("m.geojson", mains(rows))],
    )
    .unwrap()
}

fn error(study: &str, layers: &[(&str, Value)]) -> String {
    read(study, layers).unwrap_err().to_string()
}

/// The ids of the features that findings of a code name.
fn named(read: &Checked<Reading>, code: Code) -> Vec<Vec<String>> {
    let ids = |finding: &Finding| {
        let features = finding.feature.iter().chain(&finding.others);
        features.map(|feature| read.value.names.of(*feature)).collect()
    };
    read.findings
        .iter()
        .filter(|finding| finding.code == code)
        .map(ids)
        .collect()
}

#[test]
fn diameters_are_read_in_the_unit_of_the_study_the_name_or_the_values() {
    let rows: Vec<Value> = [100, 150, 200]
        .iter()
        .enumerate()
        .map(|(row, d)| json!({"id": row, "d": d, "d_mm": d}))
        .collect();
    for (keys, from) in [
        ("diameter = { column = \"d\", unit = \"mm\" }", UnitFrom::Study),
        ("diameter = \"d_mm\"", UnitFrom::Name),
        ("diameter = \"d\"", UnitFrom::Values),
    ] {
        let read = read_mains(keys, &rows);
        assert!(read.findings.is_empty(), "{:?}", read.findings);
        let bores: Vec<f64> = read
            .value
            .assets
            .mains
            .iter()
            .map(|main| main.diameter_m.unwrap().value)
            .collect();
        assert_eq!(bores, [0.1, 0.15, 0.2]);
        assert_eq!((read.value.units[0].from, read.value.units[0].unit.name), (from, "mm"));
    }
    let inches: Vec<Value> = ["6\"", "8 in", "DN150"]
        .iter()
        .map(|d| json!({"id": d, "d": d}))
        .collect();
    let read = read_mains("diameter = \"d\"", &inches);
    let bores: Vec<f64> = read
        .value
        .assets
        .mains
        .iter()
        .map(|main| main.diameter_m.unwrap().value)
        .collect();
    assert!(
        (bores[0] - 0.1524).abs() < 1e-12 && (bores[1] - 0.2032).abs() < 1e-12 && bores[2] == 0.15,
        "{bores:?}"
    );
}

#[test]
fn a_unit_that_cannot_be_told_stops_the_run() {
    let said = error(
        "[mains]\nfrom = \"m.geojson\"\ndiameter = \"d\"",
        &[("m.geojson", mains(&[json!({"d": 152.4}), json!({"d": 203.2})]))],
    );
    assert!(
        said.contains("the unit of column `d` (diameter) is not stated"),
        "{said}"
    );
    assert!(said.contains("diameter = { column = \"d\", unit = \"mm\" }"), "{said}");
}

#[test]
fn fillers_and_impossible_diameters_are_found_row_by_row() {
    let diameters = [
        json!(150),
        json!(0),
        json!(999),
        json!(null),
        json!("unknown"),
        json!(-150),
        json!(6),
        json!("big"),
        json!(200),
    ];
    let mut rows: Vec<Value> = diameters
        .iter()
        .enumerate()
        .map(|(row, d)| json!({"id": format!("M{row}"), "d": d}))
        .collect();
    rows.extend((9..60).map(|row| json!({"id": format!("M{row}"), "d": 100})));
    let read = read_mains("diameter = { column = \"d\", unit = \"mm\" }", &rows);
    let missing = ["main M1", "main M2", "main M3", "main M4", "main M7"].map(|name| vec![name.to_string()]);
    assert_eq!(named(&read, Code::DiameterMissing), missing);
    let impossible = ["main M5", "main M6"].map(|name| vec![name.to_string()]);
    assert_eq!(named(&read, Code::DiameterImpossible), impossible);
    assert_eq!(named(&read, Code::ValueUnreadable), [vec!["main M7".to_string()]]);
    assert!(named(&read, Code::DiameterUnitWrong).is_empty());
    let known = read
        .value
        .assets
        .mains
        .iter()
        .filter(|main| main.diameter_m.is_some())
        .count();
    assert_eq!(known, 53);
    let fillers: Vec<(&str, u32)> = read
        .value
        .fillers
        .iter()
        .map(|filler| (filler.filler.as_str(), filler.count))
        .collect();
    assert_eq!(fillers, [("0", 1), ("999", 1), ("(empty)", 1), ("unknown", 1)]);
}

#[test]
fn a_column_in_another_unit_than_stated_is_one_serious_fault() {
    let rows: Vec<Value> = (0..40)
        .map(|row| json!({"id": row, "d": ([4, 6, 8, 12][row % 4])}))
        .collect();
    let read = read_mains("diameter = { column = \"d\", unit = \"mm\" }", &rows);
    assert_eq!(named(&read, Code::DiameterUnitWrong).len(), 1);
    assert_eq!(read.findings.len(), 1, "{:?}", read.findings);
}

#[test]
fn a_row_in_inches_among_millimetres_is_found() {
    let mut rows: Vec<Value> = (0..40)
        .map(|row| json!({"id": row, "d": ([100, 150, 200][row % 3])}))
        .collect();
    rows.push(json!({"id": "odd", "d": 24}));
    let read = read_mains("diameter = { column = \"d\", unit = \"mm\" }", &rows);
    assert_eq!(named(&read, Code::DiameterImpossible), [["main odd"]]);
}

#[test]
fn nominal_and_outside_sizes_have_an_assumed_bore() {
    let rows = [
        json!({"id": 1, "d": 150, "mat": "DI"}),
        json!({"id": 2, "d": 110, "mat": "HDPE"}),
        json!({"id": 3, "d": 160, "mat": "AC"}),
    ];
    let keys = "material = \"mat\"\ndiameter = { column = \"d\", unit = \"mm\" }";
    let bores = |is: &str| {
        let read = read_mains(&format!("{keys}\ndiameter_is = \"{is}\""), &rows);
        let bores = read.value.assets.mains.iter();
        bores
            .map(|main| {
                main.diameter_m
                    .map(|bore| ((bore.value * 1e6).round() / 1e3, bore.basis))
            })
            .collect::<Vec<_>>()
    };
    assert_eq!(bores("inside")[1], Some((110.0, Basis::Map)));
    assert_eq!(
        bores("nominal"),
        [150.0, 90.0, 160.0].map(|bore| Some((bore, Basis::Assumed)))
    );
    assert_eq!(bores("outside"), [None, Some((90.0, Basis::Assumed)), None]);
}

#[test]
fn friction_comes_from_the_column_then_the_material_then_the_study() {
    let rows = [
        json!({"id": "a", "c": 120, "mat": "CI", "laid": 1950}),
        json!({"id": "b", "c": null, "mat": "CI", "laid": 1980}),
        json!({"id": "c", "c": 1300, "mat": "PVC", "laid": 2050}),
        json!({"id": "d", "c": 0, "mat": "granite", "laid": 0}),
    ];
    let study = "[mains]\nfrom = \"m.geojson\"\nid = \"id\"\nc_factor = \"c\"\nmaterial = \"mat\"\nyear = \"laid\"\n\
                 [friction]\nage_in_year = 2020\ndefault_c = 105";
    let read = read(study, &[("m.geojson", mains(&rows))]).unwrap();
    let friction: Vec<(Friction, Basis)> = read
        .value
        .assets
        .mains
        .iter()
        .map(|main| (main.friction.value, main.friction.basis))
        .collect();
    assert_eq!(
        friction,
        [
            (Friction::CFactor(120.0), Basis::Map),
            (Friction::CFactor(74.0), Basis::Assumed),
            (Friction::CFactor(150.0), Basis::Assumed),
            (Friction::CFactor(105.0), Basis::Study),
        ]
    );
    assert_eq!(named(&read, Code::FrictionValueImpossible), [["main c"], ["main d"]]);
    assert_eq!(named(&read, Code::MaterialUnknown), [["main d"]]);
    assert_eq!(named(&read, Code::YearImpossible), [["main c"]]);
    assert_eq!(read.value.assets.mains[0].year, Some(1950));
}

#[test]
fn roughness_is_read_for_darcy_weisbach() {
    let rows = [
        json!({"k_mm": 0.1, "mat": "DI"}),
        json!({"k_mm": null, "mat": "PVC"}),
        json!({"k_mm": 99, "mat": "AC"}),
    ];
    let study =
        "[mains]\nfrom = \"m.geojson\"\nroughness = \"k_mm\"\nmaterial = \"mat\"\n[friction]\nlaw = \"darcy-weisbach\"";
    let read = read(study, &[("m.geojson", mains(&rows))]).unwrap();
    let friction: Vec<Friction> = read.value.assets.mains.iter().map(|main| main.friction.value).collect();
    let wanted = [1e-4, 1e-5, 3e-5];
    for (friction, wanted) in friction.iter().zip(wanted) {
        let Friction::RoughnessM(value) = friction else {
            panic!("{friction:?}")
        };
        assert!((value - wanted).abs() < 1e-12);
    }
    assert_eq!(named(&read, Code::FrictionValueImpossible).len(), 1);
}

#[test]
fn rows_are_left_out_by_stated_rules_counted_and_listed() {
    let rows = [
        json!({"id": "a", "status": "Active", "kind": "Distribution", "owner": "town"}),
        json!({"id": "b", "status": "ABANDONED", "kind": "Distribution", "owner": "town"}),
        json!({"id": "c", "status": "proposed", "kind": "Distribution", "owner": "town"}),
        json!({"id": "d", "status": null, "kind": "Raw Water", "owner": "town"}),
        json!({"id": "e", "status": "active", "kind": "transmission main", "owner": "Rail "}),
        json!({"id": "f", "status": "odd", "kind": "hydrant lateral", "owner": null}),
    ];
    let read = read_mains(
        "status = \"status\"\nkind = \"kind\"\nleave_out = { owner = [\"rail\"] }",
        &rows,
    );
    let kept: Vec<String> = read
        .value
        .assets
        .mains
        .iter()
        .map(|main| read.value.names.of(main.origin))
        .collect();
    assert_eq!(kept, ["main a", "main f"]);
    assert_eq!(read.value.assets.left_out.len(), 4);
    assert_eq!(read.value.assets.mains[1].kind, MainKind::HydrantLateral);
    assert_eq!(
        named(&read, Code::MainsLeftOut),
        [["main e"], ["main b"], ["main c"], ["main d"]]
    );
    let rules: Vec<&str> = read.value.left_out.iter().map(|out| out.rule.as_str()).collect();
    assert_eq!(
        rules,
        [
            "`owner` is Rail",
            "`status` is ABANDONED",
            "`status` is proposed",
            "`kind` is Raw Water"
        ]
    );
    assert_eq!(named(&read, Code::ValueUnreadable), [["main f"]]);
}

#[test]
fn a_status_that_is_not_understood_is_a_warning_for_mains() {
    let rows = [
        json!({"id": "a", "status": "AB - Abandoned"}),
        json!({"id": "b", "status": "to be abandoned"}),
        json!({"id": "c", "status": "To be abandoned"}),
        json!({"id": "d", "status": "S3"}),
        json!({"id": "e", "status": "Active since 1990"}),
    ];
    let read = read_mains("status = \"status\"", &rows);
    assert_eq!(named(&read, Code::MainsLeftOut), [["main a"]]);
    assert_eq!(
        named(&read, Code::ValueUnreadable),
        [vec!["main b".to_string(), "main c".into()], vec!["main d".into()]]
    );
    let mut unread = read.findings.iter().filter(|found| found.code == Code::ValueUnreadable);
    assert!(unread.all(|found| found.severity == Severity::Warning));
}

#[test]
fn what_is_left_out_is_said_for_every_layer() {
    let study = "[mains]\nfrom = \"m.geojson\"\n\
        [nodes]\nfrom = \"n.geojson\"\nid = \"id\"\nstatus = \"s\"\n\
        [hydrants]\nfrom = \"h.geojson\"\nid = \"id\"\nstatus = \"s\"\n\
        [customers]\nfrom = \"c.geojson\"\nid = \"id\"\nleave_out = { s = \"x\" }\n\
        [valves]\nfrom = \"v.geojson\"\nid = \"id\"\nstatus = \"s\"";
    let layer = |word: &str| points(&[json!({"id": 1, "s": word}), json!({"id": 2, "s": "open"})]);
    let layers = [
        ("m.geojson", mains(&[json!({}), json!({})])),
        ("n.geojson", layer("removed")),
        ("h.geojson", layer("Removed 2004")),
        ("c.geojson", layer("x")),
        ("v.geojson", layer("abandoned")),
    ];
    let read = read(study, &layers).unwrap();
    assert_eq!(
        named(&read, Code::PointsLeftOut),
        [["node 1"], ["hydrant 1"], ["customer 1"], ["valve 1"]]
    );
}

#[test]
fn devices_among_nodes_and_mains_are_refused_by_id() {
    let study = "[mains]\nfrom = \"m.geojson\"\nid = \"id\"\nkind = \"kind\"\n[nodes]\nfrom = \"n.geojson\"\nid = \"id\"\nkind = \"kind\"";
    let layers = |main: &str, node: &str| {
        [
            ("m.geojson", mains(&[json!({"id": "M1", "kind": main})])),
            ("n.geojson", points(&[json!({"id": "N1", "kind": node})])),
        ]
    };
    for (main, node, wanted) in [
        (
            "distribution",
            "Booster pump",
            "node N1 is a pump (`kind` is Booster pump)",
        ),
        (
            "distribution",
            "Pressure reducing valve",
            "node N1 is a pressure reducing valve",
        ),
        ("PUMP", "tee", "main M1 is a pump"),
    ] {
        let said = error(study, &layers(main, node));
        assert!(said.contains(wanted) && said.contains("leave_out"), "{said}");
    }
    assert!(read(study, &layers("pumping main", "reducing tee")).is_ok());
}

#[test]
fn demands_that_are_missing_are_counted_and_said() {
    let study = |demand: &str| {
        format!(
            "[mains]\nfrom = \"m.geojson\"\n[nodes]\nfrom = \"n.geojson\"\ndemand = \"q_lps\"\n[customers]\nfrom = \"c.geojson\"\n{demand}"
        )
    };
    let layers = |missing: usize| {
        let rows: Vec<Value> = (0..20)
            .map(|row| json!({"q_lps": if row < missing { json!(null) } else { json!(0.1) }}))
            .collect();
        [
            ("m.geojson", mains(&[json!({}), json!({})])),
            ("n.geojson", points(&[json!({"q_lps": null}), json!({"q_lps": 0})])),
            ("c.geojson", points(&rows)),
        ]
    };
    let found = |demand: &str, missing: usize| -> Vec<(usize, Severity)> {
        let read = read(&study(demand), &layers(missing)).unwrap();
        let found = read.findings.iter().filter(|found| found.code == Code::DemandMissing);
        found.map(|found| (1 + found.others.len(), found.severity)).collect()
    };
    let given = "demand = \"q_lps\"";
    assert_eq!(found(given, 0), [(1, Severity::Note)]);
    assert_eq!(found(given, 2), [(1, Severity::Note), (2, Severity::Note)]);
    assert_eq!(found(given, 3), [(1, Severity::Note), (3, Severity::Warning)]);
    assert_eq!(found("", 0), [(1, Severity::Note), (20, Severity::Warning)]);
}

#[test]
fn stored_lengths_that_no_main_has_do_not_count() {
    let rows = [
        json!({"id": "a", "len_m": 1e-300}),
        json!({"id": "b", "len_m": 0.0009}),
        json!({"id": "c", "len_m": 100}),
        json!({"id": "d", "len_m": -100}),
        json!({"id": "e", "len_m": "1e999"}),
    ];
    let read = read_mains("length = \"len_m\"\nlength_from = \"stored\"", &rows);
    assert_eq!(named(&read, Code::LengthDisagrees), [["main a"], ["main b"]]);
    assert_eq!(named(&read, Code::ValueUnreadable), [["main d"], ["main e"]]);
    let stored = read.value.assets.mains.iter().map(|main| main.stored_length_m);
    assert_eq!(stored.collect::<Vec<_>>(), [None, None, Some(100.0), None, None]);
}

#[test]
fn a_zone_valve_without_a_status_is_shut_and_said() {
    let study = |status: &str| {
        format!("[mains]\nfrom = \"m.geojson\"\n[valves]\nfrom = \"v.geojson\"\nid = \"id\"\nkind = \"kind\"\n{status}")
    };
    let rows = [
        json!({"id": "Z1", "kind": "zone valve", "status": null}),
        json!({"id": "Z2", "kind": "zone valve", "status": "odd"}),
        json!({"id": "Z3", "kind": "zone valve", "status": "open"}),
        json!({"id": "G1", "kind": "gate", "status": null}),
        json!({"id": "A1", "kind": "air valve", "status": null}),
    ];
    let layers = [
        ("m.geojson", mains(&[json!({}), json!({})])),
        ("v.geojson", points(&rows)),
    ];
    let with_column = read(&study("status = \"status\""), &layers).unwrap();
    let without = read(&study(""), &layers).unwrap();
    let shut = |read: &Checked<Reading>| -> Vec<bool> {
        let valves = read.value.assets.valves.iter();
        valves.map(|valve| valve.closed.value).collect()
    };
    let told = |read: &Checked<Reading>, severity: Severity| -> usize {
        let of = |found: &&Finding| found.code == Code::ValveStatusUnknown && found.severity == severity;
        read.findings.iter().filter(of).count()
    };
    assert_eq!(shut(&with_column), [true, true, false, false, false]);
    assert_eq!(with_column.value.assets.valves[0].closed.basis, Basis::Assumed);
    assert_eq!(
        named(&with_column, Code::ValveStatusUnknown),
        [["valve Z1"], ["valve Z2"], ["valve G1"]]
    );
    assert_eq!(
        (
            told(&with_column, Severity::Warning),
            told(&with_column, Severity::Note)
        ),
        (2, 1)
    );
    assert_eq!(shut(&without), [true, true, true, false, false]);
    assert_eq!(
        (told(&without, Severity::Warning), told(&without, Severity::Note)),
        (3, 1)
    );
}

#[test]
fn ids_that_repeat_or_are_missing_are_found() {
    let rows = [
        json!({"id": "x"}),
        json!({"id": " x "}),
        json!({"id": null}),
        json!({"id": 7}),
        json!({"id": "7"}),
        json!({"id": "y"}),
    ];
    let read = read_mains("", &rows);
    assert_eq!(
        named(&read, Code::IdRepeated),
        [["main x", "main x"], ["main 7", "main 7"]]
    );
    assert_eq!(named(&read, Code::IdMissing), [["main at row 3"]]);
}

#[test]
fn stored_lengths_that_disagree_are_found_and_obeyed_when_asked() {
    let rows = [
        json!({"id": "a", "len_m": 100.4}),
        json!({"id": "b", "len_m": 140}),
        json!({"id": "c", "len_m": 0}),
        json!({"id": "d", "len_m": null}),
    ];
    let read = read_mains("length = \"len_m\"\nlength_from = \"stored\"", &rows);
    assert_eq!(named(&read, Code::LengthDisagrees), [["main b"], ["main c"]]);
    let stored: Vec<Option<f64>> = read
        .value
        .assets
        .mains
        .iter()
        .map(|main| main.stored_length_m)
        .collect();
    assert_eq!(stored, [Some(100.4), Some(140.0), None, None]);
    let drawn = read_mains("length = \"len_m\"", &rows);
    assert!(
        drawn
            .value
            .assets
            .mains
            .iter()
            .all(|main| main.stored_length_m.is_none())
    );
    // A column in feet is told by the drawing; one whose stated unit is wrong is one fault.
    let feet: Vec<Value> = (0..30).map(|row| json!({"id": row, "len": 328.1})).collect();
    assert_eq!(read_mains("length = \"len\"", &feet).value.units[0].unit.name, "ft");
    let wrong = read_mains("length = { column = \"len\", unit = \"m\" }", &feet);
    assert_eq!(named(&wrong, Code::LengthDisagrees).len(), 1);
}

#[test]
fn nodes_hydrants_and_customers_are_read() {
    let study = "[mains]\nfrom = \"m.geojson\"\n\
        [nodes]\nfrom = \"n.geojson\"\nid = \"id\"\nkind = \"kind\"\nelevation = \"z_ft\"\nhead = \"head_ft\"\ndemand = \"q_gpm\"\nzone = \"zone\"\n\
        [hydrants]\nfrom = \"h.geojson\"\nid = \"id\"\nneeded_flow = \"need_lps\"\nstatus = \"status\"\n\
        [customers]\nfrom = \"c.geojson\"\nid = \"id\"\ndemand = \"q_lps\"\nclass = \"class\"\nlift_m = 6";
    let nodes = points(&[
        json!({"id": "T", "kind": "storage tank", "z_ft": 100, "head_ft": 200, "q_gpm": 0, "zone": "High"}),
        json!({"id": "N", "kind": "node", "z_ft": -9999, "head_ft": 0, "q_gpm": 60, "zone": "high "}),
        json!({"id": "O", "kind": "node", "z_ft": 110, "head_ft": null, "q_gpm": -5, "zone": null}),
    ]);
    let hydrants = points(&[
        json!({"id": "H1", "need_lps": 63, "status": "in service"}),
        json!({"id": "H2", "need_lps": 0, "status": "removed"}),
        json!({"id": "H3", "need_lps": 9999, "status": null}),
    ]);
    let mut customers = points(&[
        json!({"id": "C1", "q_lps": "0,05", "class": "Home"}),
        json!({"id": "C2", "q_lps": 0.05, "class": "home"}),
        json!({"id": "C3", "q_lps": null, "class": "works"}),
        json!({"id": "C4", "q_lps": null, "class": null}),
    ]);
    customers["features"][3]["geometry"] =
        json!({"type": "LineString", "coordinates": [[500_000.0, 5_000_000.0], [500_001.0, 5_000_000.0]]});
    let layers = [
        ("m.geojson", mains(&[json!({}), json!({})])),
        ("n.geojson", nodes),
        ("h.geojson", hydrants),
        ("c.geojson", customers),
    ];
    let read = read(study, &layers).unwrap();
    let assets = &read.value.assets;
    let [tank, node, other] = &assets.nodes[..] else {
        panic!()
    };
    assert_eq!((tank.kind, node.kind), (NodeKind::Tank, NodeKind::Node));
    assert!(
        (tank.elevation_m.unwrap().value - 30.48).abs() < 1e-12 && (tank.head_m.unwrap().value - 60.96).abs() < 1e-12
    );
    assert!(node.elevation_m.is_none() && node.head_m.is_none());
    assert!((node.demand_m3_per_s - 0.003_785_411_784).abs() < 1e-15);
    assert_eq!(
        (tank.zone, node.zone, other.zone, &assets.zones),
        (Some(0), Some(0), None, &vec!["High".to_string()])
    );
    assert_eq!(other.demand_m3_per_s, 0.0);
    assert_eq!(named(&read, Code::DemandNegative), [["node O"]]);
    assert_eq!(named(&read, Code::ElevationMissing), [["node N"]]);
    assert_eq!(assets.hydrants.len(), 2);
    assert_eq!(assets.hydrants[0].needed_m3_per_s.unwrap().value, 0.063);
    assert!(assets.hydrants[1].needed_m3_per_s.is_none());
    assert_eq!(assets.customers.len(), 4);
    assert_eq!(assets.customers[0].demand_m3_per_s, 5e-5);
    assert_eq!(
        (
            assets.customers[0].class,
            assets.customers[1].class,
            assets.customers[2].class
        ),
        (Some(0), Some(0), Some(1))
    );
    assert_eq!(assets.customers[0].lift_m, 6.0);
    assert!(assets.customers[3].at.is_none());
    assert_eq!(named(&read, Code::GeometryOtherType), [["customer C4"]]);
}

#[test]
fn valves_are_read_and_name_their_mains() {
    let study = "[mains]\nfrom = \"m.geojson\"\nid = \"id\"\n\
        [valves]\nfrom = \"v.geojson\"\nid = \"id\"\nkind = \"kind\"\nstatus = \"status\"\nmain = \"on\"";
    let rows = [
        json!({"id": "V1", "kind": "gate", "status": "CLOSED", "on": "M1"}),
        json!({"id": "V2", "kind": "zone valve", "status": "normally open", "on": "M9"}),
        json!({"id": "V3", "kind": "air valve", "status": null, "on": null}),
        json!({"id": "V4", "kind": null, "status": "half", "on": null}),
    ];
    let layers = |rows: &[Value]| {
        [
            (
                "m.geojson",
                mains(&[json!({"id": "M0"}), json!({"id": "M1"}), json!({"id": "M1"})]),
            ),
            ("v.geojson", points(rows)),
        ]
    };
    let read_valves = read(study, &layers(&rows)).unwrap();
    let valves = &read_valves.value.assets.valves;
    assert_eq!(valves[0].main, Some(NamedMain::Known(vec![1, 2])));
    assert_eq!(valves[1].main, Some(NamedMain::Unknown("M9".into())));
    let shut: Vec<(bool, Basis)> = valves
        .iter()
        .map(|valve| (valve.closed.value, valve.closed.basis))
        .collect();
    assert_eq!(
        shut,
        [
            (true, Basis::Map),
            (false, Basis::Map),
            (false, Basis::Assumed),
            (false, Basis::Assumed)
        ]
    );
    assert_eq!((valves[1].kind, valves[2].kind), (ValveKind::Zone, ValveKind::OffLine));
    assert_eq!(named(&read_valves, Code::ValveStatusUnknown), [["valve V4"]]);

    let said = error(
        study,
        &layers(&[json!({"id": "V7", "kind": "PRV", "status": "open", "on": null})]),
    );
    assert!(said.contains("valve V7 is a pressure reducing valve"), "{said}");
    assert!(said.contains("leave_out = { kind = [\"PRV\"] }"), "{said}");
}

#[test]
fn sources_of_the_study_stand_at_a_node_a_main_or_a_point() {
    let study = |at: &str| {
        format!(
            "[mains]\nfrom = \"m.geojson\"\nid = \"id\"\n[nodes]\nfrom = \"n.geojson\"\nid = \"id\"\nhead = \"head_m\"\n[[source]]\nat = {at}\nhead_m = 120\n"
        )
    };
    let layers = || {
        let nodes = points(&[json!({"id": "N0", "head_m": 90}), json!({"id": "N1", "head_m": null})]);
        [
            ("m.geojson", mains(&[json!({"id": "M0"}), json!({"id": "M1"})])),
            ("n.geojson", nodes),
        ]
    };
    for at in ["\"N0\"", "\"M1\"", "[500000.0, 5000050.0]"] {
        let read = read(&study(at), &layers()).unwrap();
        let source = read.value.assets.nodes.last().unwrap();
        assert_eq!(
            (source.origin, source.kind, source.head_m.unwrap().value),
            (None, NodeKind::Source, 120.0)
        );
        assert_eq!(source.head_m.unwrap().basis, Basis::Study);
        // The study overrides the map's own head at that node.
        assert_eq!(read.value.assets.nodes[0].head_m.is_none(), at == "\"N0\"");
    }
    assert!(error(&study("\"N00\""), &layers()).contains("The nearest id is `N0`"));
    assert!(error(&study("[5.0, 5.0]"), &layers()).contains("lies nowhere near the mains"));
}

#[test]
fn a_column_that_is_not_there_is_named_with_the_nearest() {
    let said = error(
        "[mains]\nfrom = \"m.geojson\"\nid = \"main_id\"",
        &[("m.geojson", mains(&[json!({"mainid": 1})]))],
    );
    assert!(
        said.contains("there is no column `main_id`, which the study names as `id`. The nearest is `mainid`"),
        "{said}"
    );
}

#[test]
fn a_layer_that_lies_elsewhere_stops_the_run() {
    let study = "[mains]\nfrom = \"m.geojson\"\n[hydrants]\nfrom = \"h.geojson\"";
    let hydrants = json!({"type": "FeatureCollection", "features": [
        {"type": "Feature", "properties": {}, "geometry": {"type": "Point", "coordinates": [12.0, 3.0]}}]});
    let said = error(study, &[("m.geojson", mains(&[json!({})])), ("h.geojson", hydrants)]);
    assert!(
        said.contains("the layer lies") && said.contains("km from the mains"),
        "{said}"
    );
}

#[test]
fn heads_of_an_earlier_calculation_are_no_known_heads() {
    let study = "[mains]\nfrom = \"m.geojson\"\n[nodes]\nfrom = \"n.geojson\"\nkind = \"kind\"\nhead = \"head_m\"";
    let nodes = |head: fn(usize) -> Value| {
        let rows: Vec<Value> = (0..30)
            .map(|row| json!({"kind": "node", "head_m": head(row)}))
            .collect();
        [("m.geojson", mains(&[json!({})])), ("n.geojson", points(&rows))]
    };
    let said = error(study, &nodes(|_| json!(90)));
    assert!(said.contains("30 plain nodes have a head in `head_m`"), "{said}");
    assert!(read(study, &nodes(|row| if row < 3 { json!(90) } else { json!(null) })).is_ok());
}

#[test]
fn a_tank_without_a_head_is_said_unless_a_case_gives_it() {
    let study = "[mains]\nfrom = \"m.geojson\"\n[nodes]\nfrom = \"n.geojson\"\nid = \"id\"\nkind = \"kind\"\nhead = \"head_m\"\n";
    let nodes = points(&[
        json!({"id": "T1", "kind": "tank", "head_m": null}),
        json!({"id": "S", "kind": "source", "head_m": 90}),
    ]);
    let layers = [("m.geojson", mains(&[json!({}), json!({})])), ("n.geojson", nodes)];
    assert_eq!(
        named(&read(study, &layers).unwrap(), Code::ValueUnreadable),
        [["node T1"]]
    );
    let case = "[[case]]\nname = \"a\"\ntank_levels_m = { T1 = 80 }";
    let read = read(&format!("{study}{case}"), &layers).unwrap();
    assert!(named(&read, Code::ValueUnreadable).is_empty());
}

#[test]
fn a_layer_without_a_diameter_column_is_one_serious_finding() {
    let read = read_mains("", &[json!({"id": 1}), json!({"id": 2})]);
    assert_eq!(read.findings.len(), 1);
    assert_eq!(
        (read.findings[0].code, read.findings[0].severity),
        (Code::DiameterMissing, Severity::Serious)
    );
}

#[test]
fn a_rule_that_leaves_nothing_out_is_said_with_the_values_there_are() {
    let rows = [json!({"id": "a", "life": "ACT"}), json!({"id": "b", "life": "aband."})];
    let read = read_mains("leave_out = { life = [\"ABANDONED\"] }", &rows);
    let said = read
        .findings
        .iter()
        .find(|finding| finding.code == Code::LeaveOutIdle)
        .expect("said");
    let words = format!("{:?}", said.message);
    assert!(words.contains("ABANDONED") && words.contains("ACT, aband."), "{words}");
    let read = read_mains("leave_out = { life = [\"ACT\"] }", &rows);
    assert!(read.findings.iter().all(|finding| finding.code != Code::LeaveOutIdle));
}

#[test]
fn a_main_is_found_by_an_id_in_another_case_if_none_fits_as_spelt() {
    let study = "[mains]\nfrom = \"m.geojson\"\nid = \"id\"\ndiameter = { column = \"d\", unit = \"mm\" }\n\
        [valves]\nfrom = \"v.geojson\"\nid = \"id\"\nstatus = \"s\"\nmain = \"on\"";
    let layers = [
        (
            "m.geojson",
            mains(&[json!({"id": "WM-1", "d": 100}), json!({"id": "wm-2", "d": 100})]),
        ),
        (
            "v.geojson",
            points(&[
                json!({"id": 1, "s": "C", "on": "wm-1"}),
                json!({"id": 2, "s": "O", "on": "wm-2"}),
            ]),
        ),
    ];
    let read = read(study, &layers).expect("a good study");
    let valves = &read.value.assets.valves;
    assert_eq!(valves[0].main, Some(NamedMain::Known(vec![0])));
    assert_eq!(valves[1].main, Some(NamedMain::Known(vec![1])));
    assert_eq!([valves[0].closed.value, valves[1].closed.value], [true, false]);
}

/// Inch sizes written in millimetres fit no list of sizes in either unit; read in inches they are bores of metres.
#[test]
fn a_unit_that_makes_most_bores_impossible_stops_a_check() {
    let rows: Vec<Value> = (0..20)
        .map(|row| json!({"id": row, "d": ([101.6, 152.4, 203.2][row % 3])}))
        .collect();
    let read = read_mains("diameter = { column = \"d\", unit = \"in\" }", &rows);
    assert_eq!(named(&read, Code::DiameterUnitWrong).len(), 1);
    let read = read_mains("diameter = { column = \"d\", unit = \"mm\" }", &rows);
    assert!(named(&read, Code::DiameterUnitWrong).is_empty());
    let read = read_mains("diameter = { column = \"d\", unit = \"in\" }", &rows[..3]);
    assert!(
        named(&read, Code::DiameterUnitWrong).is_empty(),
        "three odd rows are found one by one"
    );
}
