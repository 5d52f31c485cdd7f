//! Reading: the shapes, the table beside them, and what says how to understand both.

use std::path::{Path, PathBuf};

use super::dbf::{Dbf, Raw};
use super::encoding::TextEncoding;
use super::shapes;
use crate::finding::{Checked, Code, Error, FeatureRef, Finding, Sentence, Severity};
use crate::layers::crs::Crs;
use crate::layers::files;
use crate::layers::layer::{Cell, Column, Columns, Format, Layer, Replay, Source, Wanted, name_of};
use crate::layers::packed::Packed;
use crate::layers::where_on_earth::{Guess, guess, spans_few_degrees};
use crate::layers::write::changed;

/// The bytes of every file of a shapefile.
pub(in crate::layers) struct Files {
    pub shp: Vec<u8>,
    pub shx: Option<Vec<u8>>,
    pub dbf: Option<Vec<u8>>,
    pub prj: Option<Vec<u8>>,
    pub cpg: Option<Vec<u8>>,
    /// Where each of them lies, by its ending.
    pub paths: Vec<(&'static str, PathBuf)>,
    /// Checksums of all of them.
    pub sha256: String,
}

impl Files {
    /// Reads the `.shp` and what lies beside it.
    pub fn read(path: &Path) -> Result<Files, Error> {
        let shp = files::read(path)?;
        let mut paths = vec![("shp", path.to_path_buf())];
        let mut sha256 = format!("shp:{}", files::sha256(&shp));
        let mut beside = |ending: &'static str| -> Result<Option<Vec<u8>>, Error> {
            let Some(other) = files::sibling(path, ending) else {
                return Ok(None);
            };
            let bytes = files::read(&other)?;
            sha256.push_str(&format!(" {ending}:{}", files::sha256(&bytes)));
            paths.push((ending, other));
            Ok(Some(bytes))
        };
        let (shx, dbf, prj, cpg) = (beside("shx")?, beside("dbf")?, beside("prj")?, beside("cpg")?);
        Ok(Files {
            shp,
            shx,
            dbf,
            prj,
            cpg,
            paths,
            sha256,
        })
    }

    /// Reads the files of a layer again, which must be as they were.
    pub fn unchanged(source: &Layer) -> Result<Files, Error> {
        let files = Files::read(&source.source.path)?;
        if files.sha256 != source.source.sha256 {
            return Err(changed(&source.source.path));
        }
        Ok(files)
    }

    /// Where one of them lies; the `.shp` if there is none.
    pub fn path(&self, ending: &str) -> &Path {
        let found = self.paths.iter().find(|(known, _)| *known == ending);
        &found.unwrap_or(&self.paths[0]).1
    }

    /// How the text of the table is decoded.
    pub fn encoding(&self, language: u8, asked: Option<&str>) -> TextEncoding {
        let cpg = self.cpg.as_deref().map(String::from_utf8_lossy);
        TextEncoding::of(cpg.as_deref(), language, asked)
    }
}

/// Reads a layer.
pub(in crate::layers) fn read(path: &Path, layer: u16, wanted: &Wanted) -> Result<Checked<Layer>, Error> {
    read_files(path, layer, &Files::read(path)?, wanted)
}

/// Reads a layer again with all its columns, to be written in another format.
pub(in crate::layers) fn read_again(source: &Layer, heights: bool) -> Result<Layer, Error> {
    let path = &source.source.path;
    let files = Files::unchanged(source)?;
    let Replay::Shapefile { encoding, .. } = &source.replay else {
        unreachable!("a shapefile has a shapefile's replay");
    };
    let wanted = Wanted {
        columns: Columns::All,
        heights,
        encoding: encoding.clone(),
    };
    Ok(read_files(path, 0, &files, &wanted)?.value)
}

/// Reads a layer from the bytes of its files.
pub(in crate::layers) fn read_files(
    path: &Path,
    layer: u16,
    files: &Files,
    wanted: &Wanted,
) -> Result<Checked<Layer>, Error> {
    const AGAIN: &str = "Copy or export the shapefile again, with all its files.";
    let mut findings = Vec::new();
    let mut packed = shapes::read(&files.shp, files.shx.as_deref(), wanted.heights)
        .map_err(|what| Error::input(path, what, AGAIN))?;
    let mut table = Table::default();
    if let Some(bytes) = &files.dbf {
        let dbf = Dbf::new(bytes).map_err(|what| Error::input(files.path("dbf"), what, AGAIN))?;
        if dbf.records != packed.rows() {
            let what = format!(
                "it has {} shapes, but its attribute table has {} rows",
                packed.rows(),
                dbf.records
            );
            return Err(Error::input(path, what, AGAIN));
        }
        table = Table::read(&dbf, files, wanted);
        if let Some(records) = &table.records {
            packed = packed.only(records);
        }
        findings.extend(table.doubts(&name_of(path), layer));
    } else if let Some(what) = more_than_the_header_says(&files.shp) {
        return Err(Error::input(path, what, AGAIN));
    }
    let crs = system(path, files, &packed, &mut findings)?;
    Ok(Checked {
        value: Layer {
            name: name_of(path),
            source: Source {
                path: path.to_path_buf(),
                format: Format::Shapefile,
                sha256: files.sha256.clone(),
            },
            crs,
            column_names: table.names,
            columns: table.columns,
            packed,
            replay: Replay::Shapefile {
                records: table.records,
                encoding: wanted.encoding.clone(),
            },
        },
        findings,
    })
}

/// Without a table to count against, a file longer than its header says may hide rows.
fn more_than_the_header_says(shp: &[u8]) -> Option<String> {
    let words = i32::from_be_bytes([shp[24], shp[25], shp[26], shp[27]]);
    let stated = 2 * usize::try_from(words).ok()?;
    (stated < shp.len()).then(|| format!("its header says {stated} bytes, but the file has {}", shp.len()))
}

/// What the table gives.
#[derive(Default)]
struct Table {
    names: Vec<String>,
    columns: Vec<Column>,
    /// Records that are rows, where some are marked as deleted.
    records: Option<Vec<u32>>,
    /// First row of each column with doubtful text, and how many rows.
    doubtful: Vec<(String, u32, u32)>,
}

impl Table {
    fn read(dbf: &Dbf, files: &Files, wanted: &Wanted) -> Table {
        let encoding = files.encoding(dbf.language, wanted.encoding.as_deref());
        let names: Vec<String> = dbf
            .fields
            .iter()
            .map(|field| encoding.decode(&field.name).text)
            .collect();
        let rows: Vec<u32> = (0..dbf.records as u32)
            .filter(|&r| !dbf.is_deleted(r as usize))
            .collect();
        let chosen = wanted.columns.chosen(&names);
        let mut table = Table::default();
        for (place, field) in dbf.fields.iter().enumerate().filter(|(place, _)| chosen[*place]) {
            let mut doubtful: Option<(u32, u32)> = None;
            let mut cells = Vec::with_capacity(rows.len());
            for (row, &record) in rows.iter().enumerate() {
                cells.push(match field.value(dbf.record(record as usize)) {
                    Raw::Cell(cell) => cell,
                    Raw::Text(bytes) => {
                        let decoded = encoding.decode(bytes);
                        if decoded.doubtful {
                            doubtful.get_or_insert((row as u32, 0)).1 += 1;
                        }
                        Cell::Text(decoded.text.into())
                    }
                });
            }
            if let Some((first, count)) = doubtful {
                table.doubtful.push((names[place].clone(), first, count));
            }
            table.columns.push(Column {
                name: names[place].clone(),
                cells,
            });
        }
        table.names = names;
        table.records = (rows.len() < dbf.records).then_some(rows);
        table
    }

    fn doubts(&self, name: &str, layer: u16) -> Vec<Finding> {
        let finding = |(column, row, count): &(String, u32, u32)| {
            let feature = FeatureRef { layer, row: *row };
            let message = Sentence::new()
                .text(format!("layer {name}, column {column}: letters of "))
                .feature(feature)
                .text(match count {
                    1 => " may be misread".to_string(),
                    more => format!(" and {} more may be misread", more - 1),
                });
            Finding::new(Code::EncodingDoubtful, message).on(feature)
        };
        self.doubtful.iter().map(finding).collect()
    }
}

/// The layer's system, from its `.prj` or from what its coordinates look like.
fn system(path: &Path, files: &Files, packed: &Packed, findings: &mut Vec<Finding>) -> Result<Crs, Error> {
    if let Some(bytes) = &files.prj {
        let text = String::from_utf8_lossy(bytes);
        if !text.trim_start_matches('\u{feff}').trim().is_empty() {
            return Crs::of_prj(&text).map_err(|what| {
                Error::input(
                    files.path("prj"),
                    what,
                    "Export the layer again in a projected system, or remove the .prj to have plain metres assumed.",
                )
            });
        }
    }
    let is_degrees = guess(packed) == Guess::Degrees && spans_few_degrees(packed);
    let crs = if is_degrees {
        Crs::lon_lat()
    } else {
        Crs::plain_metres()
    };
    let message = format!("layer {}: there is no .prj; taken as {}", name_of(path), crs.name);
    let severity = if is_degrees {
        Severity::Warning
    } else {
        Severity::Serious
    };
    findings.push(Finding::new(Code::CrsAssumed, message.into()).severity(severity));
    Ok(crs)
}
