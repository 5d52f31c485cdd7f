//! Writing layers: a user's layer with our columns added, or a layer of our own.

use std::path::Path;

use super::crs::Crs;
use super::layer::{Cell, Format, Layer};
use super::names::settle_names;
use super::output::OutputDir;
use super::result_columns::Holds;
use super::{geojson, shapefile};
use crate::finding::{Checked, Code, Error, Finding};

/// One column of ours.
#[derive(Clone, Debug, PartialEq)]
pub struct Field {
    /// Its name: at most ten characters.
    pub name: String,
    /// What it holds.
    pub holds: Holds,
}

/// Our columns of one layer.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Table {
    /// What the columns are.
    pub fields: Vec<Field>,
    /// The cells, one list a field, one cell a row. A number that is not finite is written as null.
    pub columns: Vec<Vec<Cell>>,
}

impl Table {
    /// Number of rows.
    pub fn rows(&self) -> usize {
        self.columns.first().map_or(0, Vec::len)
    }
}

/// The drawing of a layer of our own, in the coordinates of its system. One entry a row.
#[derive(Clone, Debug, PartialEq)]
pub enum Geometry {
    /// A table without drawing.
    None,
    /// Points; `None` where a row has no place.
    Points(Vec<Option<[f64; 2]>>),
    /// Lines; an empty one where a row has no drawing.
    Lines(Vec<Vec<[f64; 2]>>),
}

/// A layer of our own.
#[derive(Clone, Copy, Debug)]
pub struct NewLayer<'a> {
    /// Its name: the file's, without the ending.
    pub name: &'a str,
    /// The system its coordinates are in, see [`output_crs`].
    pub crs: &'a Crs,
    /// Its drawing.
    pub geometry: &'a Geometry,
    /// Its columns.
    pub table: &'a Table,
}

/// The system that layers made from a source layer are written in.
///
/// A shapefile keeps the source's. GeoJSON of a GeoJSON source keeps it too; of a shapefile it is longitude and latitude
/// (RFC 7946), or the source's own, named by its EPSG code, where it cannot be brought to WGS 84.
///
/// # Errors
/// A system that GeoJSON can neither hold nor name.
pub fn output_crs(source: &Layer, format: Format) -> Result<Crs, Error> {
    if format == Format::Shapefile || source.source.format == Format::GeoJson {
        return Ok(source.crs.clone());
    }
    if source.crs.reaches_lon_lat() {
        return Ok(Crs::lon_lat());
    }
    if source.crs.epsg.is_some() {
        return Ok(source.crs.clone());
    }
    Err(Error::input(
        &source.source.path,
        format!("GeoJSON cannot hold its reference system ({})", source.crs.name),
        "Write shapefiles instead, or export the layer in a system that is tied to WGS 84.",
    ))
}

/// The names that our columns get in a user's layer, with a finding where one is not the name wanted.
pub fn names_beside(source: &Layer, wanted: &[&str]) -> Checked<Vec<String>> {
    let names = settle_names(&source.column_names, wanted);
    let renamed: Vec<String> = wanted
        .iter()
        .zip(&names)
        .filter(|(wanted, name)| **wanted != name.as_str())
        .map(|(wanted, name)| format!("{wanted} as {name}"))
        .collect();
    let mut findings = Vec::new();
    if !renamed.is_empty() {
        let message = format!(
            "layer {} has columns of these names already, so ours are written with a number: {}",
            source.name,
            renamed.join(", ")
        );
        findings.push(Finding::new(Code::ColumnRenamed, message.into()));
    }
    Checked { value: names, findings }
}

/// Writes a user's layer again with our columns added, under another name.
///
/// In the source's own format every byte of the user's stays: features of GeoJSON get our members at the end of their
/// properties; shapes are copied and records of the table get our fields at their end. In the other format the values
/// are equal, and a finding says what the format cannot hold. Names of columns that are taken get a number
/// ([`settle_names`]).
///
/// # Errors
/// A source that has changed since it was read; a value that does not fit; what the system says.
///
/// # Panics
/// If the table does not have one cell for each row of the layer in each column.
pub fn write_marked(
    out: &mut OutputDir,
    name: &str,
    source: &Layer,
    table: &Table,
    format: Format,
) -> Result<Checked<()>, Error> {
    assert!(
        table
            .columns
            .iter()
            .all(|column| column.len() == source.rows() as usize),
        "one cell a row"
    );
    let wanted: Vec<&str> = table.fields.iter().map(|field| field.name.as_str()).collect();
    let names = names_beside(source, &wanted);
    let mut findings = names.findings;
    let ours = Ours {
        names: &names.value,
        table,
    };
    match (source.source.format, format) {
        (Format::GeoJson, Format::GeoJson) => geojson::write_marked(out, name, source, ours)?,
        (Format::Shapefile, Format::Shapefile) => shapefile::write_marked(out, name, source, ours)?,
        (Format::Shapefile, Format::GeoJson) => findings.extend(geojson::write_converted(out, name, source, ours)?),
        (Format::GeoJson, Format::Shapefile) => findings.extend(shapefile::write_converted(out, name, source, ours)?),
    }
    Ok(Checked { value: (), findings })
}

/// Writes a layer of our own.
///
/// # Errors
/// A value that does not fit; what the system says.
///
/// # Panics
/// If table and geometry do not have the same number of rows.
pub fn write_new(out: &mut OutputDir, layer: &NewLayer, format: Format) -> Result<(), Error> {
    let drawn = match layer.geometry {
        Geometry::None => layer.table.rows(),
        Geometry::Points(points) => points.len(),
        Geometry::Lines(lines) => lines.len(),
    };
    assert!(
        layer.table.columns.iter().all(|column| column.len() == drawn),
        "one cell a row"
    );
    match format {
        Format::GeoJson => geojson::write_new(out, layer),
        Format::Shapefile => shapefile::write_new(out, layer),
    }
}

/// Our columns with the names they got.
#[derive(Clone, Copy)]
pub(super) struct Ours<'a> {
    pub names: &'a [String],
    pub table: &'a Table,
}

/// The error of a source that is no longer what was read.
pub(super) fn changed(path: &Path) -> Error {
    Error::input(
        path,
        "the file has changed since it was read",
        "Run again on the file as it is now.",
    )
}
