//! Report: results put back onto the user's own features, as layers, a summary to paste into a memo, and
//! `summary.json` for machines. Written all or nothing.

mod facts;
mod json;
mod labels;
mod mark_layers;
mod new_layers;
mod rows;
mod summary;
mod words;

use std::collections::HashMap;
use std::path::{Path, PathBuf};

use crate::assets::{Assets, Point, Reading, Role};
use crate::calculation::Calculation;
use crate::finding::{Error, FeatureRef, Finding};
use crate::layers::{Disk, Format, Layer, LayerSet, LocalPlane, OutputDir, SUMMARY, Store};
use crate::topology::PipeMap;
use crate::units::UnitSystem;
use labels::Labels;
pub use words::Words;

/// The name of the layer that is written for a role, and what its features are called together.
fn plural(role: Role) -> &'static str {
    match role {
        Role::Main => "mains",
        Role::Node => "nodes",
        Role::Hydrant => "hydrants",
        Role::Customer => "customers",
        Role::Valve => "valves",
    }
}

/// A setting as it was used, for the record.
#[derive(Clone, Debug, PartialEq)]
pub struct UsedSetting {
    /// Its key in the study, for example `joining.tolerance_m`.
    pub key: String,
    /// Its value, as it would be written in the study.
    pub value: String,
    /// Whether it is the default and not the study's.
    pub is_default: bool,
}

/// Everything the report is made from.
pub struct Inputs<'a> {
    /// The study's title.
    pub title: &'a str,
    /// Every setting used.
    pub settings: Vec<UsedSetting>,
    /// The layers that were read.
    pub set: &'a LayerSet,
    /// The plane that places are in.
    pub plane: &'a LocalPlane,
    /// What the map says, what its features are called, and what was taken for what.
    pub reading: &'a Reading,
    /// The units results are written in.
    pub units: UnitSystem,
    /// The format results are written in.
    pub format: Format,
    /// The tolerance that mains were joined with, m.
    pub tolerance_m: f64,
    /// Which mains connect.
    pub map: &'a PipeMap,
    /// The hydraulics; `None` for topology alone.
    pub calculation: Option<&'a Calculation>,
    /// Every finding of every stage, graded.
    pub findings: &'a [Finding],
}

/// A report, ready to be written.
pub struct Report<'a> {
    inputs: Inputs<'a>,
    labels: Labels,
    /// A place on every feature that has one.
    places: HashMap<FeatureRef, Point>,
    /// Whether each connected piece has a source.
    fed: Vec<bool>,
    /// Every finding, those of writing too once it is done; the most serious first.
    findings: Vec<Finding>,
}

impl<'a> Report<'a> {
    /// Prepares the report.
    pub fn new(inputs: Inputs<'a>) -> Report<'a> {
        let id_of = |feature: FeatureRef| inputs.reading.names.id(feature).map(str::to_string);
        let labels = Labels::new(&inputs.reading.assets, inputs.map, &id_of);
        Report {
            labels,
            places: new_layers::places(&inputs.reading.assets),
            fed: fed_pieces(&inputs),
            findings: inputs.findings.to_vec(),
            inputs,
        }
    }

    /// The summary that a planning engineer would paste into a memo. `files` are those written, if any were.
    pub fn summary_text(&self, written: Option<&Written>) -> String {
        summary::text(self, written)
    }

    /// The same facts for machines.
    pub fn summary_json(&self) -> serde_json::Value {
        json::summary(self)
    }

    /// Writes every layer there is data for and `summary.json` into `folder`, all or nothing. What is noticed on the way
    /// (a column that had to be renamed) joins the report's findings.
    ///
    /// # Errors
    /// A file that cannot be written, an input that changed since it was read, or a folder that holds something else.
    pub fn write(&mut self, folder: &Path) -> Result<Written, Error> {
        self.write_to(folder, &Disk)
    }

    /// As [`Report::write`], on another store than the plain disk.
    ///
    /// # Errors
    /// As [`Report::write`].
    pub fn write_to(&mut self, folder: &Path, store: &dyn Store) -> Result<Written, Error> {
        let inputs: Vec<PathBuf> = self
            .inputs
            .set
            .layers
            .iter()
            .map(|layer| layer.source.path.clone())
            .collect();
        let mut out = OutputDir::open_in(folder, &inputs, store)?;
        let noticed = mark_layers::write(self, &mut out)?;
        self.findings.extend(noticed.iter().cloned());
        crate::screening::sort(&mut self.findings);
        new_layers::write(self, &mut out)?;
        let mut json = self.summary_json();
        json["files"] = out.files().iter().map(String::as_str).chain([SUMMARY]).collect();
        let text = serde_json::to_string_pretty(&json).expect("a JSON value can be printed");
        out.write(SUMMARY, |file| writeln!(file, "{text}"))?;
        let files = out.files().to_vec();
        out.finish()?;
        Ok(Written {
            folder: folder.to_path_buf(),
            files,
            noticed,
        })
    }

    /// What the map says.
    fn assets(&self) -> &'a Assets {
        &self.inputs.reading.assets
    }

    /// The layers that were read, each with what it holds.
    fn layers(&self) -> impl Iterator<Item = (Role, &'a Layer)> {
        let (set, names) = (self.inputs.set, &self.inputs.reading.names);
        // A layer without names was read for its geometry alone: there is none, since the study gives each a role.
        set.layers
            .iter()
            .enumerate()
            .filter_map(|(at, layer)| Some((names.role(at as u16)?, layer)))
    }

    /// Puts a feature into words, for example `main 1047`.
    fn called(&self, feature: FeatureRef) -> String {
        self.inputs.reading.names.of(feature)
    }

    /// The user's id of a feature, or its row.
    fn id(&self, feature: FeatureRef) -> String {
        self.inputs
            .reading
            .names
            .id(feature)
            .map_or_else(|| format!("row {}", feature.row + 1), str::to_string)
    }
}

/// What was written.
#[derive(Clone, Debug)]
pub struct Written {
    /// The folder.
    pub folder: PathBuf,
    /// The files in it, by name, in the order they were written.
    pub files: Vec<String>,
    /// What was noticed while writing.
    pub noticed: Vec<Finding>,
}

/// Whether each connected piece has a node of known head.
fn fed_pieces(inputs: &Inputs<'_>) -> Vec<bool> {
    let mut fed = vec![false; inputs.map.piece_length_m.len()];
    let points = inputs.reading.assets.nodes.iter().zip(&inputs.map.node_of_point);
    for (_, node) in points.filter(|(point, _)| point.head_m.is_some()) {
        node.iter()
            .for_each(|node| fed[inputs.map.piece_of_node[*node as usize] as usize] = true);
    }
    fed
}
