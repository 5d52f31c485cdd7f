//! The study file, and the whole job it asks for: read, calculate, write.

mod docs;
mod file;
mod keys;
mod run;
mod section;
mod settings;
mod tables;
mod values;

pub use docs::study_file_page;
pub use run::{Outcome, RunOptions, Worked, run, run_and_write};

use std::path::{Path, PathBuf};

use crate::assets::{AssetSettings, Role};
use crate::finding::Error;
use crate::hydraulics;
use crate::screening::{Fire, Limits};
use crate::topology::JoinSettings;
use crate::units::UnitSystem;

/// A layer that the study names.
#[derive(Clone, Debug, PartialEq)]
pub struct LayerFile {
    /// The file, found from the study file's folder.
    pub path: PathBuf,
    /// What its features are.
    pub role: Role,
    /// Encoding of a `.dbf` that names none.
    pub encoding: Option<String>,
}

/// A demand condition as the study file gives it, before classes and tanks are known.
#[derive(Clone, Debug, PartialEq)]
pub struct CaseSettings {
    /// Its name.
    pub name: String,
    /// What every average-day demand is multiplied by.
    pub demand_times: f64,
    /// Factors for classes of customers, by name.
    pub demand_times_by: Vec<(String, f64)>,
    /// Heads of tanks, m, by the node's id.
    pub tank_heads_m: Vec<(String, f64)>,
    /// What its results are held against.
    pub limits: Limits,
}

/// A setting and whether the study gave it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Used {
    /// The table it stands in, as it is written: `[joining]`; empty for the top of the file.
    pub table: String,
    /// The key.
    pub key: String,
    /// Its value, as it is written in the study; of a default, in words.
    pub value: String,
    /// Whether the study gives it; else it is a default.
    pub given: bool,
}

/// A study file that was read and understood.
#[derive(Clone, Debug)]
pub struct Study {
    /// The study file.
    pub path: PathBuf,
    /// What it is called.
    pub title: String,
    /// Units of everything written.
    pub results_in: UnitSystem,
    /// The layers, by their index in the `LayerSet`.
    pub layers: Vec<LayerFile>,
    /// What the columns mean.
    pub assets: AssetSettings,
    /// How mains are joined.
    pub joining: JoinSettings,
    /// Constants and tolerances of the hydraulics.
    pub hydraulics: hydraulics::Settings,
    /// The demand conditions; at least one.
    pub cases: Vec<CaseSettings>,
    /// Fire flow, if asked for.
    pub fire: Option<Fire>,
    /// What results are held against.
    pub limits: Limits,
    /// Every setting, given or default, in the order of reading.
    pub used: Vec<Used>,
}

impl Study {
    /// Reads a study file.
    ///
    /// # Errors
    /// A file that cannot be read; anything in it that is not understood, not calculated yet or contradicts itself, with the line,
    /// the key and what to do.
    pub fn read(path: &Path) -> Result<Study, Error> {
        let bytes = std::fs::read(path).map_err(|cause| Error::file(path, "read", cause))?;
        let text = String::from_utf8(bytes).map_err(|_| {
            Error::study(
                path,
                "the study file is not UTF-8 text",
                "Save it as UTF-8; it is the `.toml` file that is asked for here.",
            )
        })?;
        Study::parse(path, &text)
    }

    /// Understands the text of a study file that lies (or would lie) at `path`.
    ///
    /// # Errors
    /// As [`Study::read`].
    pub fn parse(path: &Path, text: &str) -> Result<Study, Error> {
        settings::parse(path, text.trim_start_matches('\u{feff}'))
    }

    /// Where results are written when nothing else is said: `gradeline-results` beside the study file.
    pub fn default_out(&self) -> PathBuf {
        self.folder().join("gradeline-results")
    }

    fn folder(&self) -> &Path {
        self.path.parent().unwrap_or(Path::new(""))
    }
}
