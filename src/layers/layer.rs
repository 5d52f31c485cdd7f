//! What is read: a set of layers with packed coordinates and the columns in use.

use std::path::{Path, PathBuf};

use super::crs::Crs;
use crate::finding::{Checked, Error};

/// File formats that are read and written.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Format {
    /// GeoJSON (RFC 7946), with the older `crs` member understood.
    GeoJson,
    /// Shapefile, with its `.dbf`, `.shx`, `.prj` and `.cpg`.
    Shapefile,
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
    /// SHA-256 of every file it was read from, in hexadecimal; checked again at replay.
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
}

impl Layer {
    /// Reads a layer. Its index in the set is needed for the findings' references.
    ///
    /// # Errors
    /// A file that cannot be opened or is damaged, with the place and what to do.
    pub fn read(_path: &Path, _layer: u16, _options: &ReadOptions) -> Result<Checked<Layer>, Error> {
        unimplemented!()
    }

    /// Number of rows.
    pub fn rows(&self) -> u32 {
        unimplemented!()
    }

    /// How a row is drawn, in the layer's own coordinates.
    pub fn shape(&self, _row: u32) -> Shape<'_> {
        unimplemented!()
    }

    /// A column that was asked for, by the name it was asked for.
    pub fn column(&self, _name: &str) -> Option<&Column> {
        unimplemented!()
    }

    /// Bounds of all finite coordinates, `[min x, min y, max x, max y]`; `None` if there are none.
    pub fn bounds(&self) -> Option<[f64; 4]> {
        unimplemented!()
    }
}

/// The layers of one run, by the index that `FeatureRef` holds.
#[derive(Clone, Debug, Default)]
pub struct LayerSet {
    /// The layers.
    pub layers: Vec<Layer>,
}
