//! Writing: shapes and their index, the table, and the files beside them.

use std::io;

use super::dbf::Dbf;
use super::encoding::TextEncoding;
use super::print::OutColumn;
use super::read::Files;
use crate::finding::{Code, Error, Finding};
use crate::layers::layer::{Layer, Replay};
use crate::layers::names::cut_names;
use crate::layers::output::OutputDir;
use crate::layers::packed::{Kind, Packed};
use crate::layers::write::{Geometry, NewLayer, Ours};
use crate::layers::{crs::Crs, geojson};

/// Bytes of the header of shapes and of their index.
const HEADER: usize = 100;
/// What stands for a measure that is not known.
const NO_MEASURE: f64 = -1e39;

/// The user's shapefile again, every byte of it, with our fields at the end of each record.
pub(in crate::layers) fn write_marked(
    out: &mut OutputDir,
    name: &str,
    source: &Layer,
    ours: Ours,
) -> Result<(), Error> {
    let files = Files::unchanged(source)?;
    let index = match &files.shx {
        Some(shx) => shx.clone(),
        None => index_of(&files.shp),
    };
    out.write(&format!("{name}.shp"), |file| file.write_all(&files.shp))?;
    out.write(&format!("{name}.shx"), |file| file.write_all(&index))?;
    if let Some(bytes) = &files.prj {
        out.write(&format!("{name}.prj"), |file| file.write_all(bytes))?;
    }
    if let Some(bytes) = files.cpg.as_ref().filter(|_| files.dbf.is_some()) {
        out.write(&format!("{name}.cpg"), |file| file.write_all(bytes))?;
    }
    let Some(dbf) = &files.dbf else {
        out.write(&format!("{name}.cpg"), |file| file.write_all(b"UTF-8"))?;
        return write_table(out, name, &our_columns(ours, utf8()), source.rows() as usize);
    };
    let dbf = Dbf::new(dbf).map_err(|what| Error::input(files.path("dbf"), what, "Copy it again."))?;
    let Replay::Shapefile { records, encoding } = &source.replay else {
        unreachable!("a shapefile has a shapefile's replay");
    };
    let encoding = files.encoding(dbf.language, encoding.as_deref());
    append_to_table(out, name, &dbf, records.as_deref(), &our_columns(ours, encoding))
}

/// A GeoJSON layer as a shapefile in its own reference system.
pub(in crate::layers) fn write_converted(
    out: &mut OutputDir,
    name: &str,
    source: &Layer,
    ours: Ours,
) -> Result<Vec<Finding>, Error> {
    let whole = geojson::read_again(source, true)?;
    let names = cut_names(&whole.column_names, ours.names);
    let mut columns: Vec<OutColumn> = names
        .iter()
        .zip(&whole.columns)
        .map(|(name, column)| OutColumn::found(name, &column.cells, utf8()))
        .collect();
    columns.extend(our_columns(ours, utf8()));
    let kind = ShapeKind::of(&whole.packed);
    let mut losses = Vec::new();
    let undrawn = (0..whole.packed.rows())
        .filter(|row| !kind.holds(&whole.packed, *row))
        .count();
    if undrawn > 0 {
        losses.push(format!(
            "{undrawn} rows of another geometry than most are written undrawn"
        ));
    }
    let renamed: Vec<String> = whole
        .column_names
        .iter()
        .zip(&names)
        .filter(|(own, name)| own != name)
        .map(|(own, name)| format!("{own} as {name}"))
        .collect();
    if !renamed.is_empty() {
        losses.push(format!(
            "names of columns are cut to ten letters: {}",
            renamed.join(", ")
        ));
    }
    let cut: usize = columns.iter().map(|column| column.cut_texts).sum();
    if cut > 0 {
        losses.push(format!("{cut} texts are cut to 254 bytes"));
    }
    let drawn = |row: usize| {
        kind.holds(&whole.packed, row)
            .then(|| Drawn::of(&whole.packed, row))
            .flatten()
    };
    write_shapes(out, name, kind, whole.packed.rows(), drawn)?;
    write_table(out, name, &columns, whole.packed.rows())?;
    write_beside(out, name, &source.crs)?;
    let finding = |loss: String| Finding::new(Code::FormatHoldsLess, format!("layer {}: {loss}", source.name).into());
    Ok(losses.into_iter().map(finding).collect())
}

/// A layer of our own. A table without drawing is a `.dbf` alone.
pub(in crate::layers) fn write_new(out: &mut OutputDir, layer: &NewLayer) -> Result<(), Error> {
    let names: Vec<String> = layer.table.fields.iter().map(|field| field.name.clone()).collect();
    let columns = our_columns(
        Ours {
            names: &names,
            table: layer.table,
        },
        utf8(),
    );
    let rows = layer.table.rows();
    write_table(out, layer.name, &columns, rows)?;
    match layer.geometry {
        Geometry::None => return out.write(&format!("{}.cpg", layer.name), |file| file.write_all(b"UTF-8")),
        Geometry::Points(points) => {
            let kind = ShapeKind {
                base: POINT,
                heights: false,
            };
            write_shapes(out, layer.name, kind, rows, |row| Drawn::plain(points[row].as_slice()))?;
        }
        Geometry::Lines(lines) => {
            let kind = ShapeKind {
                base: POLYLINE,
                heights: false,
            };
            write_shapes(out, layer.name, kind, rows, |row| Drawn::plain(&lines[row]))?;
        }
    }
    write_beside(out, layer.name, layer.crs)
}

fn utf8() -> TextEncoding {
    TextEncoding::of(Some("UTF-8"), 0, None)
}

fn our_columns<'a>(ours: Ours<'a>, encoding: TextEncoding) -> Vec<OutColumn<'a>> {
    let fields = ours.table.fields.iter().zip(&ours.table.columns).zip(ours.names);
    fields
        .map(|((field, cells), name)| OutColumn::ours(name, field.holds, cells, encoding))
        .collect()
}

fn write_beside(out: &mut OutputDir, name: &str, crs: &Crs) -> Result<(), Error> {
    if let Some(text) = crs.prj_text() {
        out.write(&format!("{name}.prj"), |file| file.write_all(text.as_bytes()))?;
    }
    out.write(&format!("{name}.cpg"), |file| file.write_all(b"UTF-8"))
}

// ---- the table ---------------------------------------------------------------------------------------------------

/// Writes a table of its own.
fn write_table(out: &mut OutputDir, name: &str, columns: &[OutColumn], rows: usize) -> Result<(), Error> {
    // Version 3 without memo, a date that says nothing, no language.
    let mut start = [0; 32];
    start[..4].copy_from_slice(&[3, 80, 1, 1]);
    let record_length = 1 + columns.iter().map(OutColumn::width).sum::<usize>();
    let header = table_header(&start, &[], columns, &[0x0d], rows, record_length);
    write_records(out, name, header, rows, |row, record| {
        record.push(b' ');
        append(columns, row, record)
    })
}

/// Writes the user's table with our columns after theirs.
fn append_to_table(
    out: &mut OutputDir,
    name: &str,
    dbf: &Dbf,
    rows: Option<&[u32]>,
    columns: &[OutColumn],
) -> Result<(), Error> {
    let mut start = [0; 32];
    start.copy_from_slice(dbf.header());
    // No index file is written, so none is promised.
    start[28] = 0;
    let our_width: usize = columns.iter().map(OutColumn::width).sum();
    let record_length = dbf.record_length() + our_width;
    let header = table_header(
        &start,
        dbf.descriptors(),
        columns,
        dbf.after_descriptors(),
        dbf.records,
        record_length,
    );
    let mut next_row = 0;
    write_records(out, name, header, dbf.records, move |record, bytes| {
        bytes.extend_from_slice(dbf.record(record));
        // A record that is marked as deleted is no row of ours.
        if rows.is_some_and(|rows| rows.get(next_row) != Some(&(record as u32))) {
            bytes.resize(bytes.len() + our_width, b' ');
            return Ok(());
        }
        next_row += 1;
        append(columns, next_row - 1, bytes)
    })
}

fn append(columns: &[OutColumn], row: usize, record: &mut Vec<u8>) -> io::Result<()> {
    for column in columns {
        column
            .append(row, record)
            .map_err(|text| io::Error::other(format!("row {}: `{text}` is wider than its column", row + 1)))?;
    }
    Ok(())
}

/// The header of a table, or why it cannot have one.
fn table_header(
    start: &[u8; 32],
    theirs: &[u8],
    ours: &[OutColumn],
    after: &[u8],
    rows: usize,
    record_length: usize,
) -> Result<Vec<u8>, String> {
    let mut bytes = start.to_vec();
    bytes.extend_from_slice(theirs);
    ours.iter()
        .for_each(|column| bytes.extend_from_slice(&column.descriptor()));
    bytes.extend_from_slice(after);
    let too_wide = |_| "a shapefile's table cannot hold so many columns".to_string();
    let header_length = u16::try_from(bytes.len()).map_err(too_wide)?;
    let record_length = u16::try_from(record_length).map_err(too_wide)?;
    let rows = u32::try_from(rows).map_err(|_| "a shapefile's table cannot hold so many rows".to_string())?;
    bytes[4..8].copy_from_slice(&rows.to_le_bytes());
    bytes[8..10].copy_from_slice(&header_length.to_le_bytes());
    bytes[10..12].copy_from_slice(&record_length.to_le_bytes());
    Ok(bytes)
}

fn write_records(
    out: &mut OutputDir,
    name: &str,
    header: Result<Vec<u8>, String>,
    records: usize,
    mut fill: impl FnMut(usize, &mut Vec<u8>) -> io::Result<()>,
) -> Result<(), Error> {
    let file_name = format!("{name}.dbf");
    let header = header.map_err(|what| {
        Error::input(
            &out.target().join(&file_name),
            what,
            "Write GeoJSON instead, or remove columns of the source.",
        )
    })?;
    out.write(&file_name, |file| {
        file.write_all(&header)?;
        let mut bytes = Vec::new();
        for record in 0..records {
            bytes.clear();
            fill(record, &mut bytes)?;
            file.write_all(&bytes)?;
        }
        file.write_all(&[0x1a])
    })
}

// ---- shapes ------------------------------------------------------------------------------------------------------

const POINT: u32 = 1;
const POLYLINE: u32 = 3;
const MULTIPOINT: u32 = 8;
/// What is added to a kind whose vertices have heights.
const WITH_HEIGHTS: u32 = 10;

/// The one kind of shape that a file holds.
#[derive(Clone, Copy, Debug, PartialEq)]
struct ShapeKind {
    base: u32,
    heights: bool,
}

impl ShapeKind {
    /// The kind that most rows of a layer have.
    fn of(packed: &Packed) -> ShapeKind {
        let (mut lines, mut points, mut several) = (0, 0, false);
        for row in 0..packed.rows() {
            match packed.kind(row) {
                Kind::Lines => lines += 1,
                Kind::Points => {
                    points += 1;
                    several |= packed.vertices(row).len() > 1;
                }
                Kind::Missing | Kind::Other(_) => {}
            }
        }
        let base = match (points > lines, several) {
            (false, _) => POLYLINE,
            (true, false) => POINT,
            (true, true) => MULTIPOINT,
        };
        ShapeKind {
            base,
            heights: packed.has_heights(),
        }
    }

    /// Whether a row is drawn as the file can hold, or not drawn at all.
    fn holds(self, packed: &Packed, row: usize) -> bool {
        match packed.kind(row) {
            Kind::Missing => true,
            Kind::Lines => self.base == POLYLINE,
            Kind::Points => self.base != POLYLINE,
            Kind::Other(_) => false,
        }
    }

    fn code(self) -> u32 {
        self.base + if self.heights { WITH_HEIGHTS } else { 0 }
    }
}

/// The drawing of one row.
struct Drawn<'a> {
    vertices: &'a [[f64; 2]],
    starts: &'a [u32],
    heights: Option<&'a [f64]>,
}

impl<'a> Drawn<'a> {
    /// A row of ours; `None` if it is not drawn or lies nowhere.
    fn plain(vertices: &'a [[f64; 2]]) -> Option<Self> {
        let finite = vertices.iter().all(|xy| xy[0].is_finite() && xy[1].is_finite());
        (finite && !vertices.is_empty()).then_some(Drawn {
            vertices,
            starts: &[0],
            heights: None,
        })
    }

    /// A row of a layer; `None` if it is not drawn or lies nowhere.
    fn of(packed: &'a Packed, row: usize) -> Option<Self> {
        let vertices = packed.vertices(row);
        (packed.is_finite(row) && !vertices.is_empty()).then(|| Drawn {
            vertices,
            starts: packed.starts(row),
            heights: packed.heights(row),
        })
    }

    fn bounds(&self) -> [f64; 4] {
        let mut b = [f64::INFINITY, f64::INFINITY, f64::NEG_INFINITY, f64::NEG_INFINITY];
        for &[x, y] in self.vertices {
            b = [b[0].min(x), b[1].min(y), b[2].max(x), b[3].max(y)];
        }
        b
    }

    /// The heights, those that are missing as zero.
    fn known_heights(&self) -> Vec<f64> {
        match self.heights {
            Some(heights) => heights.iter().map(|z| if z.is_finite() { *z } else { 0.0 }).collect(),
            None => vec![0.0; self.vertices.len()],
        }
    }

    /// Appends the content of its record.
    fn append(&self, kind: ShapeKind, bytes: &mut Vec<u8>) {
        let heights = if kind.heights { self.known_heights() } else { Vec::new() };
        push_u32(bytes, kind.code());
        if kind.base == POINT {
            push_f64(bytes, &self.vertices[0]);
            if kind.heights {
                push_f64(bytes, &[heights[0], NO_MEASURE]);
            }
            return;
        }
        push_f64(bytes, &self.bounds());
        if kind.base == POLYLINE {
            push_u32(bytes, self.starts.len() as u32);
        }
        push_u32(bytes, self.vertices.len() as u32);
        if kind.base == POLYLINE {
            self.starts.iter().for_each(|start| push_u32(bytes, *start));
        }
        self.vertices.iter().for_each(|xy| push_f64(bytes, xy));
        if kind.heights {
            push_f64(bytes, &range_of(&heights));
            push_f64(bytes, &heights);
        }
    }
}

fn range_of(values: &[f64]) -> [f64; 2] {
    values
        .iter()
        .fold([f64::INFINITY, f64::NEG_INFINITY], |[low, high], value| {
            [low.min(*value), high.max(*value)]
        })
}

fn push_u32(bytes: &mut Vec<u8>, value: u32) {
    bytes.extend_from_slice(&value.to_le_bytes());
}

fn push_f64(bytes: &mut Vec<u8>, values: &[f64]) {
    values
        .iter()
        .for_each(|value| bytes.extend_from_slice(&value.to_le_bytes()));
}

/// Writes shapes and their index.
fn write_shapes<'a>(
    out: &mut OutputDir,
    name: &str,
    kind: ShapeKind,
    rows: usize,
    drawn: impl Fn(usize) -> Option<Drawn<'a>>,
) -> Result<(), Error> {
    let mut shp = vec![0; HEADER];
    let mut shx = vec![0; HEADER];
    let mut bounds = [f64::INFINITY, f64::INFINITY, f64::NEG_INFINITY, f64::NEG_INFINITY];
    let mut heights = [f64::INFINITY, f64::NEG_INFINITY];
    for row in 0..rows {
        let start = shp.len();
        shp.extend_from_slice(&(row as u32 + 1).to_be_bytes());
        shp.extend_from_slice(&[0; 4]);
        match drawn(row) {
            Some(drawn) => {
                let b = drawn.bounds();
                bounds = [
                    bounds[0].min(b[0]),
                    bounds[1].min(b[1]),
                    bounds[2].max(b[2]),
                    bounds[3].max(b[3]),
                ];
                if kind.heights {
                    let [low, high] = range_of(&drawn.known_heights());
                    heights = [heights[0].min(low), heights[1].max(high)];
                }
                drawn.append(kind, &mut shp);
            }
            None => push_u32(&mut shp, 0),
        }
        let words = (shp.len() - start - 8) as u32 / 2;
        shp[start + 4..start + 8].copy_from_slice(&words.to_be_bytes());
        shx.extend_from_slice(&(start as u32 / 2).to_be_bytes());
        shx.extend_from_slice(&words.to_be_bytes());
    }
    if shp.len() > i32::MAX as usize {
        let path = out.target().join(format!("{name}.shp"));
        return Err(Error::input(
            &path,
            "a shapefile cannot hold so many shapes",
            "Write GeoJSON instead.",
        ));
    }
    for bytes in [&mut shp, &mut shx] {
        fill_header(bytes, kind.code(), bounds, heights);
    }
    out.write(&format!("{name}.shp"), |file| file.write_all(&shp))?;
    out.write(&format!("{name}.shx"), |file| file.write_all(&shx))
}

fn fill_header(bytes: &mut [u8], code: u32, bounds: [f64; 4], heights: [f64; 2]) {
    let words = (bytes.len() / 2) as u32;
    bytes[..4].copy_from_slice(&9994_u32.to_be_bytes());
    bytes[24..28].copy_from_slice(&words.to_be_bytes());
    bytes[28..32].copy_from_slice(&1000_u32.to_le_bytes());
    bytes[32..36].copy_from_slice(&code.to_le_bytes());
    for (place, value) in bounds.iter().chain(&heights).enumerate() {
        // Without a shape there are no bounds.
        let value = if value.is_finite() { *value } else { 0.0 };
        bytes[36 + 8 * place..44 + 8 * place].copy_from_slice(&value.to_le_bytes());
    }
}

/// The index of shapes that stand one after another.
fn index_of(shp: &[u8]) -> Vec<u8> {
    let mut shx = shp[..HEADER].to_vec();
    let stated = u32::from_be_bytes([shp[24], shp[25], shp[26], shp[27]]) as usize;
    let end = shp.len().min(stated.saturating_mul(2));
    let mut start = HEADER;
    while start + 8 <= end {
        let words = u32::from_be_bytes([shp[start + 4], shp[start + 5], shp[start + 6], shp[start + 7]]);
        shx.extend_from_slice(&(start as u32 / 2).to_be_bytes());
        shx.extend_from_slice(&words.to_be_bytes());
        start = start
            .saturating_add(8)
            .saturating_add((words as usize).saturating_mul(2));
    }
    let words = (shx.len() / 2) as u32;
    shx[24..28].copy_from_slice(&words.to_be_bytes());
    shx
}
