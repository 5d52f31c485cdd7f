//! The whole job: read the layers, calculate, write.

use std::path::PathBuf;

use super::{CaseSettings, Study};
use crate::assets::{self, Assets, Basis, NodeKind, Reading, Role, Valued};
use crate::calculation::{self, Calculation};
use crate::finding::{Code, Error, Finding, Piece, nearest};
use crate::layers::{Format, Layer, LayerSet, LocalPlane, ReadOptions};
use crate::network::{AssemblySettings, Case};
use crate::report::{self, Report, UsedSetting, Written};
use crate::screening::{self, Limits};
use crate::topology::PipeMap;
use crate::watch::{Watch, step};

/// What is asked of a run besides the study.
#[derive(Clone, Debug, Default)]
pub struct RunOptions {
    /// Topology and findings alone.
    pub map_only: bool,
    /// The folder that results are written to; `None` for [`Study::default_out`].
    pub out: Option<PathBuf>,
    /// The format of the layers written; `None` for that of the first mains layer.
    pub format: Option<Format>,
}

/// What a run worked out.
#[derive(Clone, Debug)]
pub enum Worked {
    /// Topology alone.
    Map(Box<PipeMap>),
    /// The whole job.
    Full(Box<Calculation>),
}

/// Everything that comes of a run.
#[derive(Clone, Debug)]
pub struct Outcome {
    /// The layers that were read.
    pub set: LayerSet,
    /// The plane that was worked in.
    pub plane: LocalPlane,
    /// What the columns say, the user's names, and what was taken for what.
    pub reading: Reading,
    /// What was worked out.
    pub worked: Worked,
    /// Every finding, graded, the most serious first.
    pub findings: Vec<Finding>,
}

/// Runs a study.
///
/// # Errors
/// What stops the run, in a sentence; nothing is written then.
pub fn run(study: &Study, options: &RunOptions, watch: &dyn Watch) -> Result<Outcome, Error> {
    let mut findings = Vec::new();
    let set = read_layers(study, &mut findings, watch)?;
    let plane = LocalPlane::for_layer(first_mains(study, &set)?)?;
    step(watch, "reading columns", 0, 0)?;
    let mut reading = assets::read(&set, &study.assets, &plane, &study.path)?.into_value(&mut findings);
    if !options.map_only {
        stop_for_a_wrong_unit(study, &findings)?;
    }
    let worked = if options.map_only {
        let (map, found) = calculation::map_only(&reading.assets, &study.joining, watch)?;
        findings.extend(found);
        Worked::Map(Box::new(map))
    } else {
        let settings = calculation_settings(study, &mut reading)?;
        let calculation = calculation::calculate(&reading.assets, &settings, findings, watch)?;
        findings = calculation.findings.clone();
        Worked::Full(Box::new(calculation))
    };
    screening::sort(&mut findings);
    Ok(Outcome {
        set,
        plane,
        reading,
        worked,
        findings,
    })
}

impl Outcome {
    /// Whether every case, the network at rest and every fire flow settled.
    pub fn is_proved(&self) -> bool {
        match &self.worked {
            Worked::Map(_) => true,
            Worked::Full(calculation) => calculation.is_proved(),
        }
    }

    /// The report of the run: its texts, and the layers that can be written.
    pub fn report<'a>(&'a self, study: &'a Study, options: &RunOptions) -> Report<'a> {
        let settings = study.used.iter().map(|used| UsedSetting {
            key: [used.table.as_str(), used.key.as_str()].join(" ").trim().to_string(),
            value: used.value.clone(),
            is_default: !used.given,
        });
        let (map, calculation) = match &self.worked {
            Worked::Map(map) => (map.as_ref(), None),
            Worked::Full(calculation) => (&calculation.map, Some(calculation.as_ref())),
        };
        Report::new(report::Inputs {
            title: &study.title,
            settings: settings.collect(),
            set: &self.set,
            plane: &self.plane,
            reading: &self.reading,
            units: study.results_in,
            format: options.format.unwrap_or(self.set.layers[0].source.format),
            tolerance_m: study.joining.tolerance_m,
            map,
            calculation,
            findings: &self.findings,
        })
    }
}

/// Runs a study and writes its results, all or nothing.
///
/// # Errors
/// What stops the run, in a sentence; nothing is written then.
pub fn run_and_write(study: &Study, options: &RunOptions, watch: &dyn Watch) -> Result<(Outcome, Written), Error> {
    let mut outcome = run(study, options, watch)?;
    step(watch, "writing", 0, 0)?;
    let folder = options.out.clone().unwrap_or_else(|| study.default_out());
    let written = outcome.report(study, options).write(&folder)?;
    outcome.findings.extend(written.noticed.iter().cloned());
    screening::sort(&mut outcome.findings);
    Ok((outcome, written))
}

/// A unit that the diameters contradict makes every answer wrong, and an assumption in its place would hide that: the whole
/// layer would be assumed.
fn stop_for_a_wrong_unit(study: &Study, findings: &[Finding]) -> Result<(), Error> {
    let Some(found) = findings.iter().find(|finding| finding.code == Code::DiameterUnitWrong) else {
        return Ok(());
    };
    let words = found.message.pieces().iter().filter_map(|piece| match piece {
        Piece::Text(words) => Some(words.as_str()),
        _ => None,
    });
    Err(Error::study(
        &study.path,
        words.collect::<String>(),
        found.code.text().todo,
    ))
}

fn read_layers(study: &Study, findings: &mut Vec<Finding>, watch: &dyn Watch) -> Result<LayerSet, Error> {
    let wanted = assets::wanted_columns(&study.assets);
    let mut set = LayerSet::default();
    for (index, file) in study.layers.iter().enumerate() {
        step(watch, "reading layers", index as u64, study.layers.len() as u64)?;
        let layer = u16::try_from(index).expect("the study counts its layers");
        let columns = wanted
            .iter()
            .find(|(of, _)| *of == layer)
            .map_or_else(Vec::new, |(_, columns)| columns.clone());
        let options = ReadOptions {
            columns,
            encoding: file.encoding.clone(),
        };
        set.layers
            .push(Layer::read(&file.path, layer, &options)?.into_value(findings));
    }
    Ok(set)
}

/// The mains layer that the plane is made for: the first with any row.
fn first_mains<'a>(study: &Study, set: &'a LayerSet) -> Result<&'a Layer, Error> {
    let mut mains = set
        .layers
        .iter()
        .zip(&study.layers)
        .filter(|(_, file)| file.role == Role::Main)
        .map(|(layer, _)| layer);
    let first = mains.clone().next().expect("a study has a mains layer");
    mains.find(|layer| layer.rows() > 0).ok_or_else(|| {
        Error::input(
            &first.source.path,
            "the layer of mains has no rows",
            "Export it again, with its features.",
        )
    })
}

fn calculation_settings(study: &Study, reading: &mut Reading) -> Result<calculation::Settings, Error> {
    let mut cases = Vec::with_capacity(study.cases.len());
    for case in &study.cases {
        cases.push((network_case(study, case, reading)?, case.limits.clone()));
    }
    let limits: Limits = study.limits.clone();
    Ok(calculation::Settings {
        joining: study.joining.clone(),
        assembly: AssemblySettings::default(),
        hydraulics: study.hydraulics.clone(),
        cases,
        fire: study.fire.clone(),
        limits,
    })
}

/// A case with its classes and tanks looked up. A tank without a head of its own gets that of the first case that names it.
fn network_case(study: &Study, case: &CaseSettings, reading: &mut Reading) -> Result<Case, Error> {
    let mut demand_times_by = Vec::new();
    for (name, times) in &case.demand_times_by {
        demand_times_by.push((class_of(study, case, &reading.assets, name)?, *times));
    }
    let mut heads_m = Vec::new();
    for (id, head_m) in &case.tank_heads_m {
        let node = tank_of(study, case, reading, id)?;
        let point = &mut reading.assets.nodes[node as usize];
        point.kind = NodeKind::Tank;
        point.head_m.get_or_insert(Valued {
            value: *head_m,
            basis: Basis::Study,
        });
        heads_m.push((node, *head_m));
    }
    Ok(Case {
        name: case.name.clone(),
        demand_times: case.demand_times,
        demand_times_by,
        heads_m,
    })
}

fn class_of(study: &Study, case: &CaseSettings, assets: &Assets, name: &str) -> Result<u32, Error> {
    let found = assets
        .classes
        .iter()
        .position(|class| class.to_lowercase() == name.trim().to_lowercase());
    found.map(|at| at as u32).ok_or_else(|| {
        let what = format!(
            "`demand_times_by` of the case `{}` names the class `{name}`, which no customer has",
            case.name
        );
        let todo = match nearest(name, assets.classes.iter().map(String::as_str)) {
            Some(nearest) => format!("The nearest is `{nearest}`."),
            None if assets.classes.is_empty() => "Name the column of the class: `class` in `[customers]`.".to_string(),
            None => format!("Classes of the map: {}.", assets.classes.join(", ")),
        };
        Error::study(&study.path, what, todo)
    })
}

fn tank_of(study: &Study, case: &CaseSettings, reading: &Reading, id: &str) -> Result<u32, Error> {
    let nodes = reading.assets.nodes.iter().enumerate();
    let ids = nodes.filter_map(|(at, node)| Some((at, reading.names.id(node.origin?)?)));
    let named: Vec<usize> = ids
        .clone()
        .filter(|(_, of)| *of == id.trim())
        .map(|(at, _)| at)
        .collect();
    let wrong = |what: &str, todo: String| {
        let what = format!("`tank_levels` of the case `{}` names `{id}`, {what}", case.name);
        Err(Error::study(&study.path, what, todo))
    };
    match named.as_slice() {
        [one] => Ok(*one as u32),
        [] => match nearest(id, ids.map(|(_, of)| of)) {
            Some(nearest) => wrong("which is no node's id", format!("The nearest is `{nearest}`.")),
            None => wrong(
                "which is no node's id",
                "Give the id as the nodes layer spells it.".to_string(),
            ),
        },
        _ => wrong(
            "which several nodes carry",
            "Give each node an id of its own.".to_string(),
        ),
    }
}
