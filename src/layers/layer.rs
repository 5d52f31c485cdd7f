//! What is read: a set of layers with packed coordinates and the columns in use.

use std::path::{Path, PathBuf};

use super::crs::Crs;
use super::packed::Packed;
use super::{geojson, shapefile};
use crate::finding::{Checked, Error};

/// File formats that are read and written.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Format {
    /// GeoJSON (RFC 7946), with the older `crs` member understood.
    GeoJson,
    /// Shapefile, with its `.dbf`, `.shx`, `.prj` and `.cpg`.
    Shapefile,
}

impl Format {
    /// The name it is asked for by.
    pub fn name(self) -> &'static str {
        match self {
            Format::GeoJson => "geojson",
            Format::Shapefile => "shapefile",
        }
    }

    /// The format that a file's ending stands for, whatever its case; `None` if it is not one we read.
    pub fn of_path(path: &Path) -> Option<Format> {
        let ending = path.extension()?.to_str()?.to_ascii_lowercase();
        match ending.as_str() {
            "geojson" | "json" => Some(Format::GeoJson),
            "shp" => Some(Format::Shapefile),
            _ => None,
        }
    }
}

/// One attribute value.
#[derive(Clone, Debug, PartialEq)]
pub enum Cell {
    /// Null, blank, or a field filled with `*`.
    Null,
    /// True or false.
    Bool(bool),
    /// A whole number, exact.
    Whole(i64),
    /// A number.
    Real(f64),
    /// Text, or anything else as text.
    Text(Box<str>),
}

/// One column in use.
#[derive(Clone, Debug, PartialEq)]
pub struct Column {
    /// Its name, as the file spells it.
    pub name: String,
    /// One cell a row.
    pub cells: Vec<Cell>,
}

/// Where a layer came from.
#[derive(Clone, Debug, PartialEq)]
pub struct Source {
    /// The file (the `.shp` of a shapefile).
    pub path: PathBuf,
    /// Its format.
    pub format: Format,
    /// SHA-256 of every file it was read from, in hexadecimal; checked again at replay. Of a shapefile's files each has
    /// its ending before it: `shp:… dbf:… prj:…`.
    pub sha256: String,
}

/// How a row is drawn.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Shape<'a> {
    /// Null or empty.
    Missing,
    /// A coordinate is not finite.
    NotFinite,
    /// Another geometry than points or lines, named as the file names it.
    Other(&'static str),
    /// A point (the first, if several).
    Point([f64; 2]),
    /// Lines: the vertices of all parts, and where each part starts (indices into the vertices).
    Lines {
        /// Vertices of all parts.
        vertices: &'a [[f64; 2]],
        /// Start of each part in `vertices`, relative to its first.
        starts: &'a [u32],
    },
}

/// What to read of a layer besides its geometry.
#[derive(Clone, Debug, Default)]
pub struct ReadOptions {
    /// Names of the columns wanted. A name is matched exactly, else without regard to case when only one fits.
    pub columns: Vec<String>,
    /// Encoding of a `.dbf` that names none.
    pub encoding: Option<String>,
}

/// How much of a layer to read: what the calculation asks for, or everything, to write it in another format.
#[derive(Clone, Debug)]
pub(super) struct Wanted {
    pub columns: Columns,
    pub heights: bool,
    pub encoding: Option<String>,
}

/// Which columns to keep.
#[derive(Clone, Debug)]
pub(super) enum Columns {
    All,
    Named(Vec<String>),
}

impl Columns {
    /// Whether a column of this name might be wanted, before all names are known.
    pub fn may_want(&self, name: &str) -> bool {
        match self {
            Columns::All => true,
            Columns::Named(wanted) => {
                let lower = name.to_lowercase();
                wanted.iter().any(|want| want.to_lowercase() == lower)
            }
        }
    }

    /// Which of a file's columns are wanted, now that all names are known.
    pub fn chosen(&self, names: &[String]) -> Vec<bool> {
        match self {
            Columns::All => vec![true; names.len()],
            Columns::Named(wanted) => {
                let mut chosen = vec![false; names.len()];
                for want in wanted {
                    if let Some(place) = resolve(want, names) {
                        chosen[place] = true;
                    }
                }
                chosen
            }
        }
    }
}

/// Which of a file's columns a name means: the one of exactly that name (the first, if a table has several), else the
/// only one that differs in case alone.
pub(super) fn resolve(want: &str, names: &[String]) -> Option<usize> {
    if let Some(place) = names.iter().position(|name| name == want) {
        return Some(place);
    }
    let lower = want.to_lowercase();
    let mut fitting = names
        .iter()
        .enumerate()
        .filter(|(_, name)| name.to_lowercase() == lower);
    let first = fitting.next()?;
    fitting.next().is_none().then_some(first.0)
}

/// What a writer needs to replay the source file, beside the file itself.
#[derive(Clone, Debug)]
pub(super) enum Replay {
    /// Where our members go into each feature.
    GeoJson(Vec<geojson::Splice>),
    /// The record of each row, where rows are not simply all records (some are marked as deleted).
    Shapefile {
        records: Option<Vec<u32>>,
        encoding: Option<String>,
    },
}

/// A layer that was read.
#[derive(Clone, Debug)]
pub struct Layer {
    /// Its name: the file's, without the ending.
    pub name: String,
    /// Where it came from.
    pub source: Source,
    /// Its reference system.
    pub crs: Crs,
    /// Names of all columns of the file, in its order.
    pub column_names: Vec<String>,
    /// The columns asked for that exist.
    pub columns: Vec<Column>,
    pub(super) packed: Packed,
    pub(super) replay: Replay,
}

impl Layer {
    /// Reads a layer. Its index in the set is needed for the findings' references.
    ///
    /// # Errors
    /// A file that cannot be opened or is damaged, with the place and what to do.
    pub fn read(path: &Path, layer: u16, options: &ReadOptions) -> Result<Checked<Layer>, Error> {
        let wanted = Wanted {
            columns: Columns::Named(options.columns.clone()),
            heights: false,
            encoding: options.encoding.clone(),
        };
        match Format::of_path(path) {
            Some(Format::GeoJson) => geojson::read(path, &wanted),
            Some(Format::Shapefile) => shapefile::read(path, layer, &wanted),
            None => Err(refuse(path)),
        }
    }

    /// Number of rows.
    pub fn rows(&self) -> u32 {
        self.packed.rows() as u32
    }

    /// How a row is drawn, in the layer's own coordinates.
    ///
    /// # Panics
    /// If there is no such row.
    pub fn shape(&self, row: u32) -> Shape<'_> {
        self.packed.shape(row as usize)
    }

    /// A column that was asked for, by the name it was asked for.
    pub fn column(&self, name: &str) -> Option<&Column> {
        let spelt = &self.column_names[resolve(name, &self.column_names)?];
        self.columns.iter().find(|column| column.name == *spelt)
    }

    /// Bounds of all finite coordinates, `[min x, min y, max x, max y]`; `None` if there are none.
    pub fn bounds(&self) -> Option<[f64; 4]> {
        self.packed.bounds()
    }

    /// The middle of the map: the median of the finite coordinates on each axis, so that one stray feature does not
    /// move it. `None` if there are none.
    pub fn middle(&self) -> Option<[f64; 2]> {
        self.packed.middle()
    }
}

/// The name of a layer: its file's, without the ending.
pub(super) fn name_of(path: &Path) -> String {
    path.file_stem()
        .map_or_else(String::new, |stem| stem.to_string_lossy().into_owned())
}

/// The file's own name, for messages.
pub(super) fn file_name(path: &Path) -> String {
    path.file_name()
        .map_or_else(String::new, |name| name.to_string_lossy().into_owned())
}

/// Why a path is not read.
fn refuse(path: &Path) -> Error {
    const READ: &str = "Give it as GeoJSON (.geojson, .json) or as a shapefile (.shp)";
    let shown = path.to_string_lossy();
    let file = shown.split_once('#').map_or(&*shown, |(file, _)| file);
    let ending = Path::new(file)
        .extension()
        .map(|ending| ending.to_string_lossy().to_ascii_lowercase());
    match ending.as_deref() {
        Some("dbf" | "shx" | "prj" | "cpg") => Error::input(
            path,
            "this is one of the side files of a shapefile",
            "Name the .shp file; the others are found beside it.",
        ),
        Some(ending) => Error::input(
            path,
            format!("files of the kind .{ending} are not read"),
            format!("{READ}."),
        ),
        None => Error::input(
            path,
            "its name has no ending, so its format is not known",
            format!("{READ}."),
        ),
    }
}

/// The layers of one run, by the index that `FeatureRef` holds.
#[derive(Clone, Debug, Default)]
pub struct LayerSet {
    /// The layers.
    pub layers: Vec<Layer>,
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_name_is_matched_exactly_or_by_the_only_one_that_differs_in_case() {
        let names = ["ID", "id", "Diam", "x", "x"].map(String::from);
        assert_eq!(resolve("id", &names), Some(1));
        assert_eq!(resolve("Id", &names), None);
        assert_eq!(resolve("DIAM", &names), Some(2));
        assert_eq!(resolve("x", &names), Some(3));
        assert_eq!(resolve("y", &names), None);
    }

    #[test]
    fn other_formats_are_refused_in_a_sentence() {
        for (path, says) in [
            ("town.gpkg#mains", ".gpkg"),
            ("town.gpkg", ".gpkg"),
            ("mains.zip", ".zip"),
            ("mains.dbf", "side files"),
            ("mains", "no ending"),
        ] {
            let error = Layer::read(Path::new(path), 0, &ReadOptions::default()).unwrap_err();
            assert!(error.to_string().contains(says), "{path}: {error}");
            assert!(error.to_string().contains(".shp"), "{path}: {error}");
        }
    }
}
