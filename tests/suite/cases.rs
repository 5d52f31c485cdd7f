//! Map cases: folders of small layers that can be opened in a GIS, each with what should come of it.
//!
//! A folder under `tests/cases/` holds the layers, `study.toml`, `note.md` (what the case is about) and `expected.toml`:
//!
//! - `connected`: every pair of mains that shares a node, by id; `apart`: pairs that must not (for the reader's sake)
//! - `pieces`: how many pieces the network falls into
//! - `findings`: every finding at warning or above; `notes`: notes that must be among the rest. `features` are ids (or
//!   `row 2`, counted from 1): the first feature of the finding must be one of them, and all of them must take part
//! - `parts_of`: into how many parts a main is cut; `on_main`: the main that a hydrant or customer draws from

use std::collections::{BTreeMap, BTreeSet};
use std::path::{Path, PathBuf};

use gradeline::finding::{FeatureRef, Finding, Severity};
use gradeline::study::{Outcome, RunOptions, Study, Worked, run};
use gradeline::topology::PipeMap;
use gradeline::watch::Unwatched;
use serde::Deserialize;

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Expected {
    connected: Option<Vec<[String; 2]>>,
    #[serde(default)]
    apart: Vec<[String; 2]>,
    pieces: usize,
    findings: Vec<ExpectedFinding>,
    #[serde(default)]
    notes: Vec<ExpectedFinding>,
    #[serde(default)]
    parts_of: BTreeMap<String, usize>,
    #[serde(default)]
    on_main: BTreeMap<String, String>,
}

#[derive(Deserialize, Debug)]
#[serde(deny_unknown_fields)]
struct ExpectedFinding {
    code: String,
    features: Vec<String>,
}

/// What came of a case, by the user's ids.
struct Came<'a> {
    outcome: &'a Outcome,
    map: &'a PipeMap,
}

/// The folders of all cases, in the order of their names.
pub fn folders() -> Vec<PathBuf> {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/cases");
    let entries = std::fs::read_dir(root).expect("the folder of cases can be read");
    let mut folders: Vec<PathBuf> = entries.map(|entry| entry.expect("an entry").path()).collect();
    folders.sort();
    folders
}

#[test]
fn every_case_comes_out_as_expected() {
    let mut wrong = Vec::new();
    let folders = folders();
    assert!(folders.len() >= 25, "there are {} cases", folders.len());
    for folder in &folders {
        let name = folder.file_name().expect("a name").to_string_lossy().into_owned();
        wrong.extend(check(folder).into_iter().map(|what| format!("{name}: {what}")));
    }
    assert!(wrong.is_empty(), "{} are wrong:\n{}", wrong.len(), wrong.join("\n"));
}

/// What is wrong with a case.
fn check(folder: &Path) -> Vec<String> {
    let text = std::fs::read_to_string(folder.join("expected.toml")).expect("expected.toml can be read");
    let expected: Expected = toml::from_str(&text).unwrap_or_else(|error| panic!("{}: {error}", folder.display()));
    let study = match Study::read(&folder.join("study.toml")) {
        Ok(study) => study,
        Err(error) => return vec![format!("the study is refused: {error}")],
    };
    let options = RunOptions {
        map_only: true,
        ..RunOptions::default()
    };
    let outcome = match run(&study, &options, &Unwatched) {
        Ok(outcome) => outcome,
        Err(error) => return vec![format!("the run stopped: {error}")],
    };
    let Worked::Map(map) = &outcome.worked else {
        return vec!["more than the map was worked out".to_string()];
    };
    let came = Came { outcome: &outcome, map };
    let mut wrong = came.wrong_connections(&expected);
    wrong.extend(came.wrong_counts(&expected));
    wrong.extend(came.wrong_findings(&expected));
    wrong
}

impl Came<'_> {
    fn name(&self, feature: FeatureRef) -> String {
        let id = self.outcome.reading.names.id(feature);
        id.map_or_else(|| format!("row {}", feature.row + 1), str::to_string)
    }

    fn main(&self, index: u32) -> String {
        self.name(self.outcome.reading.assets.mains[index as usize].origin)
    }

    /// Pairs of mains that share a node, in the order of their ids.
    fn connected(&self) -> BTreeSet<[String; 2]> {
        let mut at_node: Vec<BTreeSet<u32>> = vec![BTreeSet::new(); self.map.nodes.len()];
        for part in &self.map.parts {
            at_node[part.from as usize].insert(part.main);
            at_node[part.to as usize].insert(part.main);
        }
        let mut pairs = BTreeSet::new();
        for mains in &at_node {
            for a in mains {
                for b in mains.range(a + 1..) {
                    let mut pair = [self.main(*a), self.main(*b)];
                    pair.sort();
                    pairs.insert(pair);
                }
            }
        }
        pairs
    }

    fn wrong_connections(&self, expected: &Expected) -> Vec<String> {
        let mut wrong = Vec::new();
        let connected = self.connected();
        for pair in expected.apart.iter().filter(|pair| connected.contains(*pair)) {
            wrong.push(format!("{} and {} are connected", pair[0], pair[1]));
        }
        let Some(wanted) = &expected.connected else {
            return wrong;
        };
        let wanted: BTreeSet<[String; 2]> = wanted.iter().cloned().collect();
        for pair in wanted.difference(&connected) {
            wrong.push(format!("{} and {} are not connected", pair[0], pair[1]));
        }
        for pair in connected.difference(&wanted) {
            wrong.push(format!("{} and {} are connected", pair[0], pair[1]));
        }
        wrong
    }

    fn wrong_counts(&self, expected: &Expected) -> Vec<String> {
        let mut wrong = Vec::new();
        if self.map.piece_length_m.len() != expected.pieces {
            wrong.push(format!(
                "{} pieces, not {}",
                self.map.piece_length_m.len(),
                expected.pieces
            ));
        }
        for (main, count) in &expected.parts_of {
            let parts = self
                .map
                .parts
                .iter()
                .filter(|part| self.main(part.main) == *main)
                .count();
            if parts != *count {
                wrong.push(format!("{main} has {parts} parts, not {count}"));
            }
        }
        let drawn_from = self.drawn_from();
        for (point, main) in &expected.on_main {
            let from = drawn_from.get(point).map_or("none", String::as_str);
            if from != main {
                wrong.push(format!("{point} draws from {from}, not from {main}"));
            }
        }
        wrong
    }

    /// The main that each hydrant and customer draws from.
    fn drawn_from(&self) -> BTreeMap<String, String> {
        let assets = &self.outcome.reading.assets;
        let hydrants = assets
            .hydrants
            .iter()
            .map(|hydrant| hydrant.origin)
            .zip(&self.map.hydrants);
        let customers = assets
            .customers
            .iter()
            .map(|customer| customer.origin)
            .zip(&self.map.customers);
        let taps = hydrants
            .chain(customers)
            .filter_map(|(origin, tap)| Some((origin, (*tap)?)));
        taps.map(|(origin, tap)| (self.name(origin), self.main(tap.main)))
            .collect()
    }

    fn wrong_findings(&self, expected: &Expected) -> Vec<String> {
        let (loud, quiet): (Vec<&Finding>, Vec<&Finding>) = self
            .outcome
            .findings
            .iter()
            .partition(|finding| finding.severity >= Severity::Warning);
        let mut wrong = Vec::new();
        let mut left = loud;
        for wanted in &expected.findings {
            match left.iter().position(|finding| self.is(finding, wanted)) {
                Some(at) => drop(left.remove(at)),
                None => wrong.push(format!("there is no finding {wanted:?}")),
            }
        }
        wrong.extend(
            left.iter()
                .map(|finding| format!("there is also {}", self.told(finding))),
        );
        for wanted in &expected.notes {
            if !quiet.iter().any(|finding| self.is(finding, wanted)) {
                wrong.push(format!("there is no note {wanted:?}"));
            }
        }
        wrong
    }

    fn is(&self, finding: &Finding, wanted: &ExpectedFinding) -> bool {
        let first = finding.feature.map(|feature| self.name(feature));
        let all: BTreeSet<String> = finding
            .feature
            .iter()
            .chain(&finding.others)
            .map(|it| self.name(*it))
            .collect();
        finding.code.text().name == wanted.code
            && first.is_some_and(|first| wanted.features.contains(&first))
            && wanted.features.iter().all(|feature| all.contains(feature))
    }

    fn told(&self, finding: &Finding) -> String {
        let all: Vec<String> = finding
            .feature
            .iter()
            .chain(&finding.others)
            .map(|it| self.name(*it))
            .collect();
        format!(
            "{} ({}) on {}",
            finding.code.text().name,
            finding.severity.word(),
            all.join(", ")
        )
    }
}
