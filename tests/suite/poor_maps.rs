//! Maps with little or nothing to go by, and runs of the map alone: what is missing is said, what was not tested reads so,
//! and nothing is half written.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use assert_cmd::cargo::cargo_bin_cmd;
use gradeline::layers::{Cell, Layer, ReadOptions};
use gradeline::study::{RunOptions, Study, run_and_write};
use gradeline::watch::Unwatched;
use serde_json::{Value, json};

/// A folder with layers and a study of its own.
struct Town {
    folder: tempfile::TempDir,
    study: String,
}

fn line(points: &[[f64; 2]]) -> Value {
    json!({ "type": "LineString", "coordinates": points.iter().map(|at| in_utm(*at)).collect::<Vec<_>>() })
}

fn point(at: [f64; 2]) -> Value {
    json!({ "type": "Point", "coordinates": in_utm(at) })
}

fn in_utm(at: [f64; 2]) -> [f64; 2] {
    [500_000.0 + at[0], 4_000_000.0 + at[1]]
}

/// Two mains in a row and a third that stands alone.
fn mains(status: &str) -> Vec<(Value, Value)> {
    let main = |id: &str| json!({ "id": id, "diam_mm": 150, "c": 100, "status": status });
    vec![
        (main("A"), line(&[[0.0, 0.0], [100.0, 0.0]])),
        (main("B"), line(&[[100.0, 0.0], [200.0, 0.0]])),
        (main("C"), line(&[[0.0, 500.0], [100.0, 500.0]])),
    ]
}

fn nodes(head_m: Option<f64>) -> Vec<(Value, Value)> {
    let end = json!({ "id": "end", "elev_m": 10, "head_m": null, "dem_lps": 2 });
    vec![
        (
            json!({ "id": "start", "elev_m": 10, "head_m": head_m, "dem_lps": 0 }),
            point([0.0, 0.0]),
        ),
        (end, point([200.0, 0.0])),
    ]
}

fn valve(id: &str, main: &str, at: [f64; 2]) -> (Value, Value) {
    (json!({ "id": id, "status": "closed", "main": main }), point(at))
}

impl Town {
    fn new() -> Town {
        Town {
            folder: tempfile::tempdir().expect("a folder"),
            study: String::new(),
        }
    }

    /// A town with mains, a source, a draw, a hydrant and a customer.
    fn whole() -> Town {
        Town::new()
            .mains(&mains("active"))
            .nodes(&nodes(Some(60.0)))
            .hydrants(&[(json!({ "id": "H", "need_lps": 10 }), point([200.0, 0.0]))])
            .customers(&[(json!({ "id": "K", "dem_lps": 1 }), point([190.0, 5.0]))])
    }

    fn layer(mut self, name: &str, features: &[(Value, Value)], keys: &str) -> Town {
        let features: Vec<Value> = features
            .iter()
            .map(|(properties, geometry)| json!({ "type": "Feature", "properties": properties, "geometry": geometry }))
            .collect();
        let layer = json!({
            "type": "FeatureCollection",
            "crs": { "type": "name", "properties": { "name": "EPSG:32617" } },
            "features": features,
        });
        std::fs::write(self.folder.path().join(format!("{name}.geojson")), layer.to_string())
            .expect("it can be written");
        if !self.study.contains(&format!("[{name}]")) {
            self.study += &format!("[{name}]\nfrom = \"{name}.geojson\"\nid = \"id\"\n{keys}\n");
        }
        self
    }

    fn mains(self, features: &[(Value, Value)]) -> Town {
        self.layer(
            "mains",
            features,
            "diameter = \"diam_mm\"\nc_factor = \"c\"\nstatus = \"status\"",
        )
    }

    fn nodes(self, features: &[(Value, Value)]) -> Town {
        self.layer(
            "nodes",
            features,
            "elevation = \"elev_m\"\nhead = \"head_m\"\ndemand = \"dem_lps\"",
        )
    }

    fn hydrants(self, features: &[(Value, Value)]) -> Town {
        self.layer("hydrants", features, "needed_flow = \"need_lps\"")
    }

    fn customers(self, features: &[(Value, Value)]) -> Town {
        self.layer("customers", features, "demand = \"dem_lps\"")
    }

    fn valves(self, features: &[(Value, Value)]) -> Town {
        self.layer("valves", features, "status = \"status\"\nmain = \"main\"")
    }

    fn study_file(&self) -> PathBuf {
        let path = self.folder.path().join("study.toml");
        let text = format!(
            "{}[[case]]\nname = \"average day\"\ndemand_times = 1.0\n[fire]\ncase = \"average day\"\n",
            self.study
        );
        std::fs::write(&path, text).expect("it can be written");
        path
    }

    fn results(&self) -> PathBuf {
        self.folder.path().join("results")
    }

    /// Runs the command: exit code, stdout, stderr.
    fn command(&self, command: &str) -> (i32, String, String) {
        let study = self.study_file();
        let words = [Path::new(command), &study, Path::new("--out"), &self.results()];
        let ran = cargo_bin_cmd!("gradeline").args(words).output().expect("it runs");
        let text = |bytes: Vec<u8>| String::from_utf8(bytes).expect("UTF-8");
        (
            ran.status.code().expect("no signal"),
            text(ran.stdout),
            text(ran.stderr),
        )
    }

    /// Runs the map alone and gives the names of the files.
    fn map_only(&self) -> Vec<String> {
        let study = Study::read(&self.study_file()).expect("it is understood");
        let options = RunOptions {
            map_only: true,
            out: Some(self.results()),
            format: None,
        };
        run_and_write(&study, &options, &Unwatched).expect("it runs").1.files
    }

    /// A column of a written layer, by id (or by the first column named).
    fn column(&self, layer: &str, id: &str, name: &str) -> BTreeMap<String, Cell> {
        let options = ReadOptions {
            columns: vec![id.into(), name.into()],
            encoding: None,
        };
        let path = self.results().join(format!("{layer}.geojson"));
        let layer = Layer::read(&path, 0, &options).expect("it can be read").value;
        if layer.rows() == 0 {
            return BTreeMap::new();
        }
        let cells = |name: &str| layer.column(name).expect("a column").cells.clone();
        let ids = cells(id).into_iter().map(|id| match id {
            Cell::Text(text) => text.to_string(),
            other => format!("{other:?}"),
        });
        ids.zip(cells(name)).collect()
    }

    fn words(&self, layer: &str, id: &str, name: &str) -> Vec<(String, String)> {
        let cells = self.column(layer, id, name).into_iter();
        cells
            .map(|(id, cell)| match cell {
                Cell::Text(text) => (id, text.to_string()),
                Cell::Null => (id, String::new()),
                other => (id, format!("{other:?}")),
            })
            .collect()
    }
}

fn owned(pairs: &[(&str, &str)]) -> Vec<(String, String)> {
    pairs.iter().map(|(a, b)| (a.to_string(), b.to_string())).collect()
}

#[test]
fn the_map_alone_says_what_has_no_source_and_that_nothing_was_tested() {
    let town = Town::whole();
    let files = town.map_only();
    let served = owned(&[("A", "yes"), ("B", "yes"), ("C", "unserved")]);
    assert_eq!(town.words("mains", "id", "served"), served);
    for flag in ["vel_flag", "grad_flag"] {
        let untested = owned(&[("A", "untested"), ("B", "untested"), ("C", "untested")]);
        assert_eq!(town.words("mains", "id", flag), untested, "{flag}");
    }
    for flag in ["low_flag", "high_flag"] {
        let flags = town.words("nodes", "node", flag);
        assert_eq!(flags.len(), 5);
        assert!(flags.iter().all(|(_, word)| word == "untested"), "{flags:?}");
    }
    for not_asked in ["hydrants", "customers", "devices", "node_cases", "part_cases"] {
        assert!(!files.iter().any(|file| file.starts_with(not_asked)), "{files:?}");
    }
    let kinds = town.words("nodes", "node", "kind");
    assert_eq!(kinds.iter().filter(|(_, kind)| kind == "source").count(), 1);
    assert!(
        kinds.contains(&("start".to_string(), "source".to_string())),
        "{kinds:?}"
    );
    // Without any source in the map, that a main has none says nothing.
    let town = Town::new().mains(&mains("active"));
    town.map_only();
    assert_eq!(
        town.words("mains", "id", "served"),
        owned(&[("A", ""), ("B", ""), ("C", "")])
    );
}

#[test]
fn the_map_alone_shows_a_closed_valve_that_cuts() {
    let town = Town::whole().valves(&[valve("V", "B", [150.0, 0.0])]);
    let files = town.map_only();
    assert!(files.contains(&"devices.geojson".to_string()), "{files:?}");
    assert_eq!(town.words("devices", "device", "kind"), owned(&[("V", "gate valve")]));
    assert_eq!(town.words("devices", "device", "state"), owned(&[("V", "closed")]));
    for unknown in ["flow_lps", "head_a_m", "head_b_m"] {
        assert_eq!(town.column("devices", "device", unknown)["V"], Cell::Null, "{unknown}");
    }
    let [a, b] = ["node_a", "node_b"].map(|end| town.words("devices", "device", end));
    assert_ne!(a, b, "a node on either side");
    assert_eq!(town.column("mains", "id", "parts")["B"], Cell::Whole(2));
}

/// Runs the command both ways and checks what every poor map must keep.
fn poor(town: &Town, first_line: &str, must_say: &[&str]) {
    for command in ["map", "check"] {
        let (code, out, err) = town.command(command);
        assert_eq!((code, err.as_str()), (0, ""), "{out}");
        assert!(
            !out.contains("-0 ") && !out.contains("-0.0") && !out.contains("NaN"),
            "{out}"
        );
        let summary = std::fs::read_to_string(town.results().join("summary.json")).expect("it is written");
        assert!(!summary.contains("-0.0") && !summary.contains("NaN"), "{summary}");
        let summary: Value = serde_json::from_str(&summary).expect("it is JSON");
        for file in summary["files"].as_array().expect("a list") {
            assert!(town.results().join(file.as_str().expect("a name")).is_file(), "{file}");
        }
        if command == "check" {
            assert_eq!(out.lines().next(), Some(first_line));
            for words in must_say {
                assert!(out.contains(words), "`{words}` is not said in:\n{out}");
            }
        }
    }
    // The source, a node nobody draws at or one without a source: nothing may read as if it had been found in order.
    for (layer, id, flag) in [
        ("mains", "id", "vel_flag"),
        ("mains", "id", "grad_flag"),
        ("nodes", "node", "low_flag"),
        ("nodes", "node", "high_flag"),
        ("hydrants", "id", "fire_flag"),
        ("customers", "id", "low_flag"),
    ] {
        if town.results().join(format!("{layer}.geojson")).is_file() {
            let flags = town.words(layer, id, flag);
            assert!(
                flags.iter().all(|(_, word)| word != "ok" && word != "high"),
                "{layer} {flag}: {flags:?}"
            );
        }
    }
}

#[test]
fn a_map_whose_mains_are_all_left_out_is_told_so() {
    let town = Town::whole().mains(&mains("abandoned"));
    poor(
        &town,
        "study: no main is left to calculate with; nothing was tested.",
        &[
            "3 mains left out by rules of the study",
            "no-source",
            "Nothing was solved",
        ],
    );
    let left_out = owned(&[("A", "left out"), ("B", "left out"), ("C", "left out")]);
    assert_eq!(town.words("mains", "id", "served"), left_out);
}

#[test]
fn a_map_whose_mains_have_no_geometry_is_told_so() {
    let undrawn: Vec<(Value, Value)> = mains("active")
        .into_iter()
        .map(|(main, _)| (main, Value::Null))
        .collect();
    let town = Town::whole().mains(&undrawn);
    poor(
        &town,
        "study: no main is left to calculate with; nothing was tested.",
        &["geometry-missing", "no-source"],
    );
    let undrawn = owned(&[("A", "not drawn"), ("B", "not drawn"), ("C", "not drawn")]);
    assert_eq!(town.words("mains", "id", "served"), undrawn);
}

#[test]
fn where_every_main_is_shut_off_nothing_is_ok() {
    let shut = [
        valve("V1", "A", [50.0, 0.0]),
        valve("V2", "B", [150.0, 0.0]),
        valve("V3", "C", [50.0, 500.0]),
    ];
    let town = Town::whole().valves(&shut);
    poor(
        &town,
        "study: 0 % of 0.3 km of mains was tested; untested: 83.3 % no source, 16.7 % no demand.",
        &["valve-closed", "no-demand"],
    );
    assert_eq!(town.words("hydrants", "id", "fire_flag"), owned(&[("H", "unserved")]));
    assert_eq!(town.words("customers", "id", "low_flag"), owned(&[("K", "untested")]));
}

#[test]
fn a_map_without_a_source_is_told_so() {
    let first = "study: 0 % of 0.3 km of mains was tested; untested: 100 % no source.";
    poor(
        &Town::whole().nodes(&nodes(None)),
        first,
        &["no-source", "Nothing was solved"],
    );
    poor(
        &Town::new().mains(&mains("active")),
        first,
        &["no-source", "Nothing was solved"],
    );
}

#[test]
fn a_layer_without_rows_is_no_trouble_unless_it_is_the_mains() {
    let first = "study: 66.7 % of 0.3 km of mains was tested; untested: 33.3 % no source.";
    for (town, emptied) in [
        (Town::whole().hydrants(&[]), "hydrants"),
        (Town::whole().customers(&[]), "customers"),
        (Town::whole().valves(&[]), "valves"),
    ] {
        for command in ["map", "check"] {
            let (code, out, err) = town.command(command);
            assert_eq!((code, err.as_str()), (0, ""), "{emptied}: {out}");
            assert!(out.contains(&format!("0 {emptied} from {emptied}.geojson")), "{out}");
            assert!(command == "map" || out.starts_with(first), "{emptied}: {out}");
        }
        let is_marked = emptied != "valves";
        assert_eq!(
            town.results().join(format!("{emptied}.geojson")).is_file(),
            is_marked,
            "{emptied}"
        );
    }
    poor(
        &Town::whole().nodes(&[]).hydrants(&[]).customers(&[]).valves(&[]),
        "study: 0 % of 0.3 km of mains was tested; untested: 100 % no source.",
        &["0 nodes from nodes.geojson"],
    );
}

#[test]
fn mains_without_rows_stop_the_run_with_a_sentence() {
    let town = Town::whole().mains(&[]);
    for command in ["map", "check"] {
        let (code, out, err) = town.command(command);
        assert_eq!((code, out.as_str()), (2, ""));
        let file = town.folder.path().join("mains.geojson");
        let sentence = "the layer of mains has no rows. Export it again, with its features.";
        assert_eq!(err, format!("error: {}: {sentence}\n", file.display()));
        assert!(!town.results().exists());
    }
}

#[test]
fn a_run_that_fails_leaves_the_results_of_the_last_one() {
    let town = Town::whole();
    assert_eq!(town.command("check").0, 0);
    let names = |town: &Town| {
        let entries = std::fs::read_dir(town.results()).expect("it can be read");
        let files = entries.map(|entry| entry.expect("an entry").path());
        let mut files: Vec<(PathBuf, Vec<u8>)> = files
            .map(|path| (path.clone(), std::fs::read(path).expect("it can be read")))
            .collect();
        files.sort();
        files
    };
    let before = names(&town);
    let town = town.mains(&[]);
    assert_eq!(town.command("check").0, 2);
    assert!(names(&town) == before, "the results of the run before are as they were");
}
