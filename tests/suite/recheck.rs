//! The written results checked from the files alone: the sample town is run in both its forms, its layers are read back, and
//! flows, heads, pressures, flags and counts are worked out again from what stands in them.

use std::collections::{BTreeMap, BTreeSet, HashMap};
use std::f64::consts::PI;
use std::path::{Path, PathBuf};
use std::sync::LazyLock;

use gradeline::layers::result_columns::{
    CUSTOMERS, FINDINGS, HYDRANTS, MAINS, NODE_CASES, NODES, PART_CASES, PARTS, ResultColumn,
};
use gradeline::layers::{Cell, Layer, ReadOptions};
use gradeline::study::{RunOptions, Study, run_and_write};
use gradeline::units::{Quantity, Unit, UnitSystem};
use gradeline::watch::Unwatched;
use shapefile::dbase;

/// Largest sum of flows at a node, m3/s. Flows are written to 1e-10 of a litre a second or of a gallon a minute.
const CONTINUITY_M3_PER_S: f64 = 1e-9;
/// Largest difference between a written head loss and the law, m.
const HEAD_LOSS_M: f64 = 1e-7;
/// The case without draw: it is written, but no flag but that of high pressure rests on it.
const AT_REST: &str = "no draw";
/// A part shorter than this has no gradient that is judged, m.
const LEAST_LENGTH_M: f64 = 1.0;

/// What was written for one form of the town.
struct Written {
    folder: tempfile::TempDir,
    source: PathBuf,
    ending: &'static str,
    units: UnitSystem,
    summary: serde_json::Value,
    files: Vec<String>,
}

static BOTH: LazyLock<[Written; 2]> = LazyLock::new(|| {
    [
        written("quenlow", "geojson", UnitSystem::Si),
        written("quenlow-us", "shp", UnitSystem::Us),
    ]
});

fn written(form: &str, ending: &'static str, units: UnitSystem) -> Written {
    let source = Path::new(env!("CARGO_MANIFEST_DIR")).join("sample-data").join(form);
    let study = Study::read(&source.join("study.toml")).expect("the study is understood");
    let folder = tempfile::tempdir().expect("a folder");
    let options = RunOptions {
        out: Some(folder.path().join("results")),
        ..RunOptions::default()
    };
    let (_, out) = run_and_write(&study, &options, &Unwatched).expect("the study runs");
    let text = std::fs::read_to_string(folder.path().join("results/summary.json")).expect("it is written");
    Written {
        folder,
        source,
        ending,
        units,
        summary: serde_json::from_str(&text).expect("it is JSON"),
        files: out.files,
    }
}

/// A layer or table that was read back.
struct Table {
    columns: HashMap<String, Vec<Cell>>,
    rows: usize,
    ours: &'static [ResultColumn],
    units: UnitSystem,
}

impl Written {
    fn path(&self, name: &str) -> PathBuf {
        self.folder
            .path()
            .join("results")
            .join(format!("{name}.{}", self.ending))
    }

    fn table(&self, name: &str, ours: &'static [ResultColumn]) -> Table {
        let names: Vec<String> = ours.iter().map(|column| column.name(self.units)).collect();
        let table = self.path(name).with_extension("dbf");
        let columns = match self.path(name) {
            // A table without geometry is a `.dbf` alone.
            path if !path.is_file() => dbf(&table),
            path => read(&path, &names)
                .columns
                .into_iter()
                .map(|column| (column.name, column.cells))
                .collect(),
        };
        let rows = columns.values().next().map_or(0, Vec::len);
        Table {
            columns,
            rows,
            ours,
            units: self.units,
        }
    }

    /// A member of `summary.json`, by the way to it.
    fn said(&self, way: &str) -> &serde_json::Value {
        self.summary
            .pointer(way)
            .unwrap_or_else(|| panic!("summary.json has no {way}"))
    }

    fn count(&self, way: &str) -> usize {
        self.said(way).as_u64().expect("a count") as usize
    }

    /// A limit of the first case; the sample town has the same ones in each.
    fn limit(&self, name: &str) -> f64 {
        let way = format!("/cases/0/limits/{name}/value");
        self.said(&way).as_f64().expect("a number")
    }
}

fn read(path: &Path, columns: &[String]) -> Layer {
    let options = ReadOptions {
        columns: columns.to_vec(),
        encoding: None,
    };
    Layer::read(path, 0, &options)
        .expect("what was written can be read")
        .value
}

/// A table of its own, by the reader of a library.
fn dbf(path: &Path) -> HashMap<String, Vec<Cell>> {
    let mut columns: HashMap<String, Vec<Cell>> = HashMap::new();
    for record in dbase::read(path).expect("the table can be read") {
        for (name, value) in record {
            let cell = match value {
                dbase::FieldValue::Character(Some(text)) => Cell::Text(text.trim().into()),
                dbase::FieldValue::Numeric(Some(number)) => Cell::Real(number),
                _ => Cell::Null,
            };
            columns.entry(name).or_default().push(cell);
        }
    }
    columns
}

impl Table {
    fn column(&self, stem: &str) -> (&ResultColumn, &[Cell]) {
        let ours = self
            .ours
            .iter()
            .find(|column| column.stem == stem)
            .expect("a column of ours");
        let name = ours.name(self.units);
        let cells = self.columns.get(&name).unwrap_or_else(|| panic!("no column {name}"));
        (ours, cells)
    }

    fn text(&self, stem: &str, row: usize) -> &str {
        match &self.column(stem).1[row] {
            Cell::Text(text) => text,
            _ => "",
        }
    }

    /// A number in SI.
    fn number(&self, stem: &str, row: usize) -> Option<f64> {
        let (ours, cells) = self.column(stem);
        let unit = Unit::written(ours.quantity, self.units);
        match cells[row] {
            Cell::Real(value) => Some(unit.to_si(value)),
            Cell::Whole(value) => Some(unit.to_si(value as f64)),
            _ => None,
        }
    }

    /// How many rows have a word in a column.
    fn with(&self, stem: &str, word: &str) -> usize {
        (0..self.rows).filter(|row| self.text(stem, *row) == word).count()
    }

    fn row_of(&self, stem: &str) -> HashMap<String, usize> {
        let of: HashMap<String, usize> = (0..self.rows)
            .map(|row| (self.text(stem, row).to_string(), row))
            .collect();
        assert_eq!(of.len(), self.rows, "names of {stem} are unique");
        of
    }
}

/// Half of the last digit of a number written with this many decimals in the unit of a quantity, in SI, and room for
/// rounding in the comparison.
fn half_digit(decimals: i32, quantity: Quantity, units: UnitSystem) -> f64 {
    0.51 * Unit::written(quantity, units).to_si(10_f64.powi(-decimals))
}

fn close(a: f64, b: f64, tolerance: f64, what: &str) {
    assert!(
        (a - b).abs() <= tolerance,
        "{what}: {a} is not {b} to within {tolerance}"
    );
}

/// Head lost along a part, m: the velocity form V = 1.318 C R^0.63 S^0.54 in feet and seconds (Williams & Hazen 1905),
/// solved for S, with a minor loss K V^2/2g.
fn head_loss_m(length_m: f64, diameter_m: f64, c: f64, minor_k: f64, flow_m3_per_s: f64) -> f64 {
    use gradeline::units::{GRAVITY_M_PER_S2, M_PER_FOOT};
    let velocity = flow_m3_per_s.abs() / (PI / 4.0 * diameter_m * diameter_m);
    let radius_ft = diameter_m / 4.0 / M_PER_FOOT;
    let slope = (velocity / M_PER_FOOT / (1.318 * c * radius_ft.powf(0.63))).powf(1.0 / 0.54);
    let lost_m = slope * length_m + minor_k * velocity * velocity / (2.0 * GRAVITY_M_PER_S2);
    lost_m.copysign(flow_m3_per_s)
}

#[test]
fn flows_balance_at_every_node_and_heads_close_along_every_part() {
    for town in BOTH.iter() {
        let (parts, part_cases) = (town.table("parts", PARTS), town.table("part_cases", PART_CASES));
        let (nodes, node_cases) = (town.table("nodes", NODES), town.table("node_cases", NODE_CASES));
        let (part_row, node_row) = (parts.row_of("part"), nodes.row_of("node"));
        let mut head_m: HashMap<(&str, &str), f64> = HashMap::new();
        let mut leaving: HashMap<(&str, &str), f64> = HashMap::new();
        for row in 0..node_cases.rows {
            let place = (node_cases.text("in_case", row), node_cases.text("node", row));
            let elevation_m = nodes.number("elev", node_row[place.1]);
            let Some(head) = node_cases.number("head", row) else {
                assert_eq!(
                    (node_cases.number("pres", row), node_cases.number("out", row)),
                    (None, None)
                );
                continue;
            };
            head_m.insert(place, head);
            leaving.insert(place, node_cases.number("out", row).expect("an outflow"));
            if let Some(elevation_m) = elevation_m {
                let pressure_m = node_cases.number("pres", row).expect("a pressure");
                let tolerance = half_digit(4, Quantity::Length, town.units);
                close(
                    pressure_m,
                    head - elevation_m,
                    tolerance,
                    &format!("pressure at {place:?}"),
                );
            }
        }
        let mut checked = 0;
        for row in 0..part_cases.rows {
            let (case, at) = (part_cases.text("in_case", row), part_row[part_cases.text("part", row)]);
            let [from, to] = ["node_a", "node_b"].map(|stem| (case, parts.text(stem, at)));
            let Some(flow) = part_cases.number("flow", row) else {
                assert!(
                    !head_m.contains_key(&from) && !head_m.contains_key(&to),
                    "no flow, but a head: {from:?}"
                );
                continue;
            };
            *leaving.get_mut(&from).expect("a node with an outflow") += flow;
            *leaving.get_mut(&to).expect("a node with an outflow") -= flow;
            let value = |stem| parts.number(stem, at).expect("a value");
            let law_m = head_loss_m(value("length"), value("used"), value("used_c"), value("minor_k"), flow);
            let what = format!("head loss of {} in {case}", parts.text("part", at));
            close(head_m[&from] - head_m[&to], law_m, HEAD_LOSS_M, &what);
            close(
                part_cases.number("loss", row).expect("a loss"),
                law_m,
                HEAD_LOSS_M,
                &what,
            );
            let velocity = flow.abs() / (PI / 4.0 * value("used").powi(2));
            close(
                part_cases.number("vel", row).expect("a velocity"),
                velocity,
                1e-9,
                &what,
            );
            checked += 1;
        }
        assert!(checked > 4 * 700, "{checked} parts and cases were checked");
        for (place, sum) in leaving {
            close(sum, 0.0, CONTINUITY_M3_PER_S, &format!("flows at {place:?}"));
        }
    }
}

#[test]
fn what_is_drawn_goes_by_the_factors_of_the_study() {
    for town in BOTH.iter() {
        let (nodes, node_cases) = (town.table("nodes", NODES), town.table("node_cases", NODE_CASES));
        let kind = nodes.row_of("node");
        let mut drawn: HashMap<&str, HashMap<&str, f64>> = HashMap::new();
        for row in 0..node_cases.rows {
            let node = node_cases.text("node", row);
            if let Some(out) = node_cases
                .number("out", row)
                .filter(|_| nodes.text("kind", kind[node]) == "node")
            {
                drawn
                    .entry(node_cases.text("in_case", row))
                    .or_default()
                    .insert(node, out);
            }
        }
        let average = &drawn["average day"];
        assert!(average.values().sum::<f64>() > 0.01);
        for (case, times) in [("peak hour", 2.4), ("maximum day", 1.6), (AT_REST, 0.0)] {
            for (node, out) in &drawn[case] {
                let what = format!("{node} in {case}");
                close(*out, times * average[node], 1e-12, &what);
            }
        }
    }
}

/// The worst of the parts of a main, in any case of the study.
#[derive(Default)]
struct Worst {
    velocity: f64,
    gradient: f64,
    /// Flow of each part in each case, with its velocity.
    flows: Vec<(String, f64, f64)>,
    judged_gradient: bool,
}

fn worst_by_main(town: &Written) -> HashMap<String, Worst> {
    let (parts, part_cases) = (town.table("parts", PARTS), town.table("part_cases", PART_CASES));
    let part_row = parts.row_of("part");
    let mut worst: HashMap<String, Worst> = HashMap::new();
    for row in (0..part_cases.rows).filter(|row| part_cases.text("in_case", *row) != AT_REST) {
        let at = part_row[part_cases.text("part", row)];
        let found = worst.entry(parts.text("main", at).to_string()).or_default();
        let Some(flow) = part_cases.number("flow", row) else {
            continue;
        };
        let velocity = part_cases.number("vel", row).expect("beside a flow");
        found.velocity = found.velocity.max(velocity);
        found
            .flows
            .push((part_cases.text("in_case", row).to_string(), flow, velocity));
        let length_m = parts.number("length", at).expect("a length");
        if length_m >= LEAST_LENGTH_M {
            found.judged_gradient = true;
            let gradient = part_cases.number("loss", row).expect("beside a flow").abs() / length_m;
            found.gradient = found.gradient.max(gradient);
        }
    }
    worst
}

#[test]
fn each_main_shows_its_worst_part_and_the_flag_that_follows() {
    for town in BOTH.iter() {
        let (mains, worst) = (town.table("mains", MAINS), worst_by_main(town));
        let id = if town.units == UnitSystem::Si {
            "main_id"
        } else {
            "MAINID"
        };
        let ids = cells_of(&read(&town.path("mains"), &[id.to_string()]), id);
        let ids: Vec<String> = ids.iter().map(plain).collect();
        let mut checked = 0;
        for (row, own) in ids.iter().enumerate() {
            let served = mains.text("served", row);
            // Parts name their main by its id: one that several carry, or none, cannot be followed.
            let is_known = !own.is_empty() && ids.iter().filter(|other| *other == own).count() == 1;
            if served != "yes" {
                let flags = (mains.text("vel_flag", row), mains.text("grad_flag", row));
                assert!(
                    served == "duplicate" || flags == ("untested", "untested"),
                    "{own}: {flags:?}"
                );
            }
            if served != "yes" || !is_known {
                continue;
            }
            let worst = &worst[own];
            let velocity = mains.number("vel", row).expect("a velocity");
            let tolerance = half_digit(4, Quantity::Velocity, town.units);
            close(velocity, worst.velocity, tolerance, &format!("velocity of main {own}"));
            let flow = mains.number("flow", row).expect("a flow");
            let case = mains.text("vel_case", row);
            let fits = |(of, its_flow, its_velocity): &(String, f64, f64)| {
                of == case
                    && (its_flow - flow).abs() <= half_digit(4, Quantity::Flow, town.units)
                    && worst.velocity - its_velocity <= 1e-9
            };
            assert!(
                worst.flows.iter().any(fits),
                "main {own}: {flow} m3/s in {case} is not the fastest"
            );
            let too_fast = worst.velocity > town.limit("velocity_high_m_per_s");
            assert_eq!(
                mains.text("vel_flag", row),
                if too_fast { "high" } else { "ok" },
                "main {own}"
            );
            if worst.judged_gradient {
                let tolerance = half_digit(4, Quantity::Gradient, town.units);
                let gradient = mains.number("grad", row).expect("a gradient");
                close(gradient, worst.gradient, tolerance, &format!("gradient of main {own}"));
                let large = mains.number("used", row).expect("a bore") >= 0.4 - 1e-9;
                let limit = town.limit(if large { "gradient_high_large" } else { "gradient_high" });
                let flag = if worst.gradient > limit { "high" } else { "ok" };
                assert_eq!(mains.text("grad_flag", row), flag, "main {own}");
            } else {
                assert_eq!(mains.text("grad_flag", row), "not judged", "main {own}");
            }
            checked += 1;
        }
        assert!(checked > 500, "{checked} mains were checked");
    }
}

#[test]
fn each_node_shows_its_lowest_pressure_and_the_flag_that_follows() {
    for town in BOTH.iter() {
        let (nodes, node_cases) = (town.table("nodes", NODES), town.table("node_cases", NODE_CASES));
        let mut lowest: HashMap<&str, f64> = HashMap::new();
        let mut at_rest: HashMap<&str, f64> = HashMap::new();
        for row in 0..node_cases.rows {
            let (node, pressure) = (node_cases.text("node", row), node_cases.number("pres", row));
            let Some(pressure) = pressure else { continue };
            if node_cases.text("in_case", row) == AT_REST {
                at_rest.insert(node, pressure);
            } else {
                let known = lowest.entry(node).or_insert(pressure);
                *known = known.min(pressure);
            }
        }
        let (low, high) = (town.limit("pressure_low_m"), town.limit("pressure_high_m"));
        let mut judged = 0;
        for row in 0..nodes.rows {
            let node = nodes.text("node", row);
            let (Some(lowest), Some(at_rest)) = (lowest.get(node), at_rest.get(node)) else {
                assert_eq!(
                    (nodes.text("low_flag", row), nodes.text("high_flag", row)),
                    ("untested", "untested")
                );
                continue;
            };
            let tolerance = half_digit(6, Quantity::Pressure, town.units);
            close(nodes.number("pres", row).expect("a pressure"), *lowest, tolerance, node);
            if nodes.text("low_flag", row) != "not judged" {
                judged += 1;
                assert_eq!(
                    nodes.text("low_flag", row),
                    if *lowest < low { "low" } else { "ok" },
                    "{node}"
                );
                let tolerance = half_digit(4, Quantity::Pressure, town.units);
                close(
                    nodes.number("margin", row).expect("a margin"),
                    lowest - low,
                    tolerance,
                    node,
                );
            }
            let tolerance = half_digit(4, Quantity::Pressure, town.units);
            close(
                nodes.number("pmax", row).expect("a pressure"),
                *at_rest,
                tolerance,
                node,
            );
            assert_eq!(
                nodes.text("high_flag", row),
                if *at_rest > high { "high" } else { "ok" },
                "{node}"
            );
        }
        assert!(judged > 400, "{judged} nodes were judged");
    }
}

#[test]
fn user_rows_and_columns_are_all_kept() {
    for town in BOTH.iter() {
        for name in ["mains", "hydrants", "customers"] {
            let file = town.source.join(format!("{name}.{}", town.ending));
            let names = read(&file, &[]).column_names;
            let (before, after) = (read(&file, &names), read(&town.path(name), &names));
            assert_eq!(before.rows(), after.rows(), "{name}");
            assert_eq!(after.column_names[..names.len()], names[..], "{name}");
            assert!(after.column_names.len() > names.len(), "{name}");
            for column in &names {
                assert_eq!(cells_of(&before, column), cells_of(&after, column), "{name}: {column}");
            }
            for row in 0..before.rows() {
                assert_eq!(before.shape(row), after.shape(row), "{name}: row {row}");
            }
        }
    }
}

fn cells_of(layer: &Layer, name: &str) -> Vec<Cell> {
    layer.column(name).expect("a column").cells.clone()
}

/// An id as it is shown.
fn plain(cell: &Cell) -> String {
    match cell {
        Cell::Text(text) => text.to_string(),
        Cell::Whole(number) => number.to_string(),
        Cell::Real(number) => number.to_string(),
        _ => String::new(),
    }
}

#[test]
fn the_summary_counts_what_the_layers_hold() {
    for town in BOTH.iter() {
        let findings = town.table("findings", FINDINGS);
        for about in ["map", "water"] {
            let mut by_code: BTreeMap<&str, usize> = BTreeMap::new();
            let mut by_severity: BTreeMap<&str, usize> = BTreeMap::new();
            for row in (0..findings.rows).filter(|row| findings.text("about", *row) == about) {
                *by_code.entry(findings.text("code", row)).or_default() += 1;
                *by_severity.entry(findings.text("severity", row)).or_default() += 1;
            }
            let said = town.said(&format!("/findings/{about}/by_code"));
            let said: BTreeMap<&str, usize> = said
                .as_object()
                .expect("counts by code")
                .iter()
                .map(|(code, count)| (code.as_str(), count.as_u64().expect("a count") as usize))
                .collect();
            assert_eq!(said, by_code);
            for severity in ["serious", "warning", "note"] {
                let written = by_severity.get(severity).copied().unwrap_or(0);
                assert_eq!(
                    town.count(&format!("/findings/{about}/{severity}")),
                    written,
                    "{about} {severity}"
                );
            }
        }
        let hydrants = town.table("hydrants", HYDRANTS);
        assert_eq!(town.count("/fire/hydrants"), hydrants.rows);
        for (key, flag) in [
            ("ok", "ok"),
            ("short", "short"),
            ("unserved", "unserved"),
            ("untested", "untested"),
        ] {
            assert_eq!(
                town.count(&format!("/fire/{key}")),
                hydrants.with("fire_flag", flag),
                "{flag}"
            );
        }
        assert!(hydrants.with("fire_flag", "short") > 0);
        let (nodes, customers) = (town.table("nodes", NODES), town.table("customers", CUSTOMERS));
        let low = nodes.with("low_flag", "low");
        assert!(low > 0);
        assert_eq!(town.count("/verdicts/nodes_low"), low);
        assert_eq!(town.count("/verdicts/nodes_judged"), low + nodes.with("low_flag", "ok"));
        assert_eq!(town.count("/verdicts/nodes_high"), nodes.with("high_flag", "high"));
        assert_eq!(town.count("/verdicts/customers"), customers.rows);
        assert_eq!(town.count("/verdicts/customers_low"), customers.with("low_flag", "low"));
        assert_eq!(town.count("/topology/parts"), town.table("parts", PARTS).rows);
        assert_eq!(town.count("/topology/nodes"), nodes.rows);
    }
}

#[test]
fn the_summary_names_exactly_the_files_in_the_folder() {
    for town in BOTH.iter() {
        let listed = std::fs::read_dir(town.folder.path().join("results")).expect("the folder can be read");
        let listed: BTreeSet<String> = listed
            .map(|entry| entry.expect("an entry").file_name().to_string_lossy().into_owned())
            .collect();
        let said = town.said("/files").as_array().expect("a list");
        let said: Vec<&str> = said.iter().map(|file| file.as_str().expect("a name")).collect();
        assert_eq!(said.len(), listed.len());
        assert_eq!(said.iter().map(ToString::to_string).collect::<BTreeSet<_>>(), listed);
        assert_eq!(town.files, said);
        let beside = std::fs::read_dir(town.folder.path())
            .expect("the folder can be read")
            .count();
        assert_eq!(beside, 1, "nothing is left beside the results");
    }
}

/// The written GeoJSON is read by a library that shares nothing with our reader: every layer parses, has as many features
/// as our reader finds rows, and every geometry is one it knows.
#[test]
fn another_reader_of_geojson_takes_every_layer() {
    let [town, _] = &*BOTH;
    let layers = town.files.iter().filter_map(|name| name.strip_suffix(".geojson"));
    let mut read_layers = 0;
    for name in layers {
        let path = town.path(name);
        let text = std::fs::read_to_string(&path).expect("a written file");
        let Ok(geojson::GeoJson::FeatureCollection(all)) = text.parse() else {
            panic!("{name} is no feature collection to another reader");
        };
        assert_eq!(all.features.len(), read(&path, &[]).rows() as usize, "{name}");
        read_layers += 1;
    }
    assert_eq!(read_layers, 10, "every layer and table of the sample town");
}
