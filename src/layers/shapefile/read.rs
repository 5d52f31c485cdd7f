//! Reading: the shapes, the table beside them, and what says how to understand both.

use std::path::{Path, PathBuf};

use super::dbf::{Dbf, Raw};
use super::encoding::TextEncoding;
use super::shapes;
use crate::finding::{Checked, Code, Error, FeatureRef, Finding, Sentence, Severity};
use crate::layers::crs::Crs;
use crate::layers::files;
use crate::layers::layer::{Cell, Column, Columns, Format, Layer, Replay, Source, Wanted, file_name, name_of};
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
        Crs::plain_metres(&file_name(path))
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

#[cfg(test)]
mod tests {
    use super::super::dbf::tests::table;
    use super::*;
    use crate::layers::layer::Shape;

    /// Shapes as bytes: each the content of its record.
    fn shapes(code: u32, contents: &[Vec<u8>]) -> Vec<u8> {
        let mut bytes = vec![0; 100];
        for (place, content) in contents.iter().enumerate() {
            bytes.extend_from_slice(&(place as u32 + 1).to_be_bytes());
            bytes.extend_from_slice(&(content.len() as u32 / 2).to_be_bytes());
            bytes.extend_from_slice(content);
        }
        let words = bytes.len() as u32 / 2;
        bytes[..4].copy_from_slice(&9994_u32.to_be_bytes());
        bytes[24..28].copy_from_slice(&words.to_be_bytes());
        bytes[28..32].copy_from_slice(&1000_u32.to_le_bytes());
        bytes[32..36].copy_from_slice(&code.to_le_bytes());
        bytes
    }

    fn line(parts: &[u32], xy: &[f64]) -> Vec<u8> {
        let mut bytes = 3_u32.to_le_bytes().to_vec();
        bytes.extend_from_slice(&[0; 32]);
        bytes.extend_from_slice(&(parts.len() as u32).to_le_bytes());
        bytes.extend_from_slice(&(xy.len() as u32 / 2).to_le_bytes());
        parts
            .iter()
            .for_each(|part| bytes.extend_from_slice(&part.to_le_bytes()));
        xy.iter()
            .for_each(|value| bytes.extend_from_slice(&value.to_le_bytes()));
        bytes
    }

    fn town() -> Files {
        let lines = [
            line(&[0], &[1.0, 2.0, 3.0, 4.0]),
            0_u32.to_le_bytes().to_vec(),
            line(&[0, 2], &[0.0, 0.0, 900.0, 900.0, 5.0, 5.0]),
            line(&[0], &[7.0, 7.0]),
            line(&[0], &[f64::NAN, 7.0, 1.0, f64::INFINITY]),
        ];
        let records: [&[u8]; 5] = [b" 1M\xfcller", b" 2abc   ", b" 3      ", b" 4x     ", b"*5gone  "];
        Files {
            shp: shapes(3, &lines),
            shx: None,
            dbf: Some(table(&[("ID", b'N', 1, 0), ("ID", b'C', 6, 0)], &records)),
            prj: None,
            cpg: None,
            paths: vec![("shp", PathBuf::from("town.shp"))],
            sha256: String::new(),
        }
    }

    fn read(files: &Files) -> Result<Checked<Layer>, Error> {
        let wanted = Wanted {
            columns: Columns::All,
            heights: false,
            encoding: None,
        };
        read_files(Path::new("town.shp"), 0, files, &wanted)
    }

    #[test]
    fn rows_columns_and_doubts_are_read() {
        let read = read(&town()).unwrap();
        let layer = read.value;
        assert_eq!(layer.rows(), 4, "the deleted record is no row");
        assert_eq!(layer.column_names, ["ID", "ID"]);
        assert_eq!(layer.columns[1].cells[0], Cell::Text("Müller".into()));
        assert_eq!(layer.columns[1].cells[2], Cell::Null);
        assert_eq!(layer.shape(1), Shape::Missing);
        let Shape::Lines { vertices, starts } = layer.shape(2) else {
            panic!("lines")
        };
        assert_eq!((vertices.len(), starts), (3, &[0, 2][..]));
        let Shape::Lines { vertices, .. } = layer.shape(3) else {
            panic!("a line of one vertex is kept")
        };
        assert_eq!(vertices, [[7.0, 7.0]]);
        let codes: Vec<Code> = read.findings.iter().map(|finding| finding.code).collect();
        assert_eq!(codes, [Code::EncodingDoubtful, Code::CrsAssumed]);
        assert!(!layer.crs.is_lon_lat);
    }

    #[test]
    fn not_finite_coordinates_make_their_row_not_finite() {
        let mut files = town();
        files.dbf = None;
        let layer = read(&files).unwrap().value;
        assert_eq!((layer.rows(), layer.shape(4)), (5, Shape::NotFinite));
        assert!(layer.column_names.is_empty());
    }

    #[test]
    fn small_coordinates_without_a_prj_are_degrees() {
        let mut files = town();
        files.dbf = None;
        files.shp = shapes(3, &[line(&[0], &[15.1, 48.2, 15.11, 48.21])]);
        let read = read(&files).unwrap();
        assert!(read.value.crs.is_lon_lat);
        assert_eq!(read.findings[0].code, Code::CrsAssumed);
    }

    #[test]
    fn files_cut_or_at_odds_are_errors() {
        let whole = town();
        for end in 0..whole.shp.len() {
            let mut files = town();
            files.shp.truncate(end);
            assert!(read(&files).is_err(), "shp cut at {end}");
        }
        let table = whole.dbf.clone().unwrap();
        for end in 0..table.len() - 1 {
            let mut files = town();
            files.dbf = Some(table[..end].to_vec());
            assert!(read(&files).is_err(), "dbf cut at {end}");
        }
        let mut files = town();
        files.dbf.as_mut().unwrap()[4] = 4;
        assert!(
            read(&files)
                .unwrap_err()
                .to_string()
                .contains("5 shapes, but its attribute table has 4 rows")
        );
        let mut files = town();
        files.prj = Some(b"PROJCS[\"cut".to_vec());
        assert!(read(&files).unwrap_err().to_string().contains("cut short"));
        let mut files = town();
        files.dbf = None;
        files.shp.extend_from_slice(&[0; 12]);
        assert!(read(&files).unwrap_err().to_string().contains("header says"));
    }

    #[test]
    fn damaged_bytes_never_panic() {
        let whole = town();
        for place in 0..whole.shp.len() {
            for value in [0, 1, 0x7f, 0xff] {
                let mut files = town();
                files.shp[place] = value;
                let _ = read(&files);
            }
        }
        let length = whole.dbf.as_ref().unwrap().len();
        for place in 0..length {
            for value in [0, 1, 0x2a, 0x7f, 0xff] {
                let mut files = town();
                files.dbf.as_mut().unwrap()[place] = value;
                let _ = read(&files);
            }
        }
    }
}
