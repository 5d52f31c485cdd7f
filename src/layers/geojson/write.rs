//! Writing: the user's features with our members put in, converted features, and layers of our own.

use std::io::{self, Write};

use super::{Place, Splice};
use crate::finding::{Code, Error, Finding};
use crate::layers::crs::{Crs, convert};
use crate::layers::layer::{Cell, Columns, Layer, Replay, Wanted};
use crate::layers::names::numbered_apart;
use crate::layers::output::OutputDir;
use crate::layers::packed::{Kind, Packed};
use crate::layers::result_columns::Holds;
use crate::layers::write::{Geometry, NewLayer, Ours, changed, output_crs};
use crate::layers::{Format, files, shapefile};

/// Decimals of degrees that are computed, not copied: 0.01 mm on the ground.
const DEGREE_DECIMALS: usize = 10;
/// Decimals of computed coordinates in metres or feet: 0.01 mm or less.
const LENGTH_DECIMALS: usize = 5;

/// The user's file again, byte for byte, with our members at the end of each feature's properties.
pub(in crate::layers) fn write_marked(
    out: &mut OutputDir,
    name: &str,
    source: &Layer,
    ours: Ours,
) -> Result<(), Error> {
    let path = &source.source.path;
    let bytes = files::read(path)?;
    let Replay::GeoJson(splices) = &source.replay else {
        unreachable!("a GeoJSON source has GeoJSON splices");
    };
    if files::sha256(&bytes) != source.source.sha256 {
        return Err(changed(path));
    }
    let members = Members::new(ours);
    out.write(&format!("{name}.geojson"), |file| {
        let mut from = 0;
        let mut text = Vec::new();
        for (row, splice) in splices.iter().enumerate() {
            file.write_all(&bytes[from..splice.at])?;
            text.clear();
            from = members.splice(splice, row, &mut text);
            file.write_all(&text)?;
        }
        file.write_all(&bytes[from..])
    })
}

/// A shapefile as GeoJSON, with our members after the user's.
pub(in crate::layers) fn write_converted(
    out: &mut OutputDir,
    name: &str,
    source: &Layer,
    ours: Ours,
) -> Result<Vec<Finding>, Error> {
    let crs = output_crs(source, Format::GeoJson)?;
    let mut findings = Vec::new();
    let mut whole = shapefile::read_again(source, true)?;
    let moved = !source.crs.same_system(&crs);
    convert(&source.crs, &crs, whole.packed.all_vertices_mut())?;
    let names = numbered_apart(&whole.column_names);
    if names != whole.column_names {
        let message = format!("layer {}: columns of one name are written with a number", source.name);
        findings.push(Finding::new(Code::FormatHoldsLess, message.into()));
    }
    let others = (0..whole.packed.rows())
        .filter(|row| matches!(whole.packed.kind(*row), Kind::Other(_)))
        .count();
    if others > 0 {
        let message = format!(
            "layer {}: {others} rows are neither points nor lines and are written undrawn",
            source.name
        );
        findings.push(Finding::new(Code::FormatHoldsLess, message.into()));
    }
    let theirs: Vec<Member> = names
        .iter()
        .zip(&whole.columns)
        .map(|(name, column)| Member::new(name, None, &column.cells))
        .collect();
    let members = Members::new(ours);
    let digits = if moved { Some(decimals(&crs)) } else { None };
    out.write(&format!("{name}.geojson"), |file| {
        write_collection(file, name, &crs, whole.packed.rows(), |row, text| {
            text.extend_from_slice(b"{\"type\":\"Feature\",\"properties\":{");
            let mut first = true;
            for member in theirs.iter().chain(&members.0) {
                member.print(row, std::mem::take(&mut first), text);
            }
            text.extend_from_slice(b"},\"geometry\":");
            print_packed(&whole.packed, row, digits, text);
            text.push(b'}');
        })
    })?;
    Ok(findings)
}

/// A layer of our own.
pub(in crate::layers) fn write_new(out: &mut OutputDir, layer: &NewLayer) -> Result<(), Error> {
    let names: Vec<String> = layer.table.fields.iter().map(|field| field.name.clone()).collect();
    let members = Members::new(Ours {
        names: &names,
        table: layer.table,
    });
    let digits = decimals(layer.crs);
    out.write(&format!("{}.geojson", layer.name), |file| {
        write_collection(file, layer.name, layer.crs, layer.table.rows(), |row, text| {
            text.extend_from_slice(b"{\"type\":\"Feature\",\"properties\":{");
            for (place, member) in members.0.iter().enumerate() {
                member.print(row, place == 0, text);
            }
            text.extend_from_slice(b"},\"geometry\":");
            match layer.geometry {
                Geometry::None => text.extend_from_slice(b"null"),
                Geometry::Points(points) => print_geometry("Point", points[row].as_slice(), digits, text),
                Geometry::Lines(lines) => print_geometry("LineString", &lines[row], digits, text),
            }
            text.push(b'}');
        })
    })
}

fn decimals(crs: &Crs) -> usize {
    if crs.is_lon_lat {
        DEGREE_DECIMALS
    } else {
        LENGTH_DECIMALS
    }
}

/// The document around the features, one feature a line.
fn write_collection(
    file: &mut dyn Write,
    name: &str,
    crs: &Crs,
    rows: usize,
    print_row: impl Fn(usize, &mut Vec<u8>),
) -> io::Result<()> {
    let mut text = b"{\n\"type\":\"FeatureCollection\",\n\"name\":".to_vec();
    print_text(name, &mut text);
    // Plain WGS 84 needs no member, and RFC 7946 wants none.
    if let Some(code) = crs.epsg.filter(|_| *crs != Crs::lon_lat()) {
        let member =
            format!(",\n\"crs\":{{\"type\":\"name\",\"properties\":{{\"name\":\"urn:ogc:def:crs:EPSG::{code}\"}}}}");
        text.extend_from_slice(member.as_bytes());
    }
    text.extend_from_slice(b",\n\"features\":[\n");
    for row in 0..rows {
        print_row(row, &mut text);
        text.extend_from_slice(if row + 1 < rows { b",\n" } else { b"\n" });
        file.write_all(&text)?;
        text.clear();
    }
    text.extend_from_slice(b"]\n}\n");
    file.write_all(&text)
}

/// One column as a member of properties.
struct Member<'a> {
    /// The name as JSON, with the colon after it.
    name: Vec<u8>,
    /// Decimals of our own numbers; the user's are printed as they are.
    decimals: Option<usize>,
    cells: &'a [Cell],
}

impl<'a> Member<'a> {
    fn new(name: &str, decimals: Option<usize>, cells: &'a [Cell]) -> Self {
        let mut json = Vec::new();
        print_text(name, &mut json);
        json.push(b':');
        Member {
            name: json,
            decimals,
            cells,
        }
    }

    fn print(&self, row: usize, first: bool, text: &mut Vec<u8>) {
        if !first {
            text.push(b',');
        }
        text.extend_from_slice(&self.name);
        match &self.cells[row] {
            Cell::Null => text.extend_from_slice(b"null"),
            Cell::Bool(value) => text.extend_from_slice(if *value { b"true" } else { b"false" }),
            Cell::Whole(value) => print(text, format_args!("{value}")),
            Cell::Real(value) => {
                let start = text.len();
                print_number(*value, self.decimals, text);
                // A column of numbers stays one where all of them happen to be whole: readers go by the point.
                if text[start..].iter().all(|byte| byte.is_ascii_digit() || *byte == b'-') {
                    text.extend_from_slice(b".0");
                }
            }
            Cell::Text(value) => print_text(value, text),
        }
    }
}

/// Our columns as members.
struct Members<'a>(Vec<Member<'a>>);

impl<'a> Members<'a> {
    fn new(ours: Ours<'a>) -> Self {
        let fields = ours.table.fields.iter().zip(&ours.table.columns).zip(ours.names);
        Members(
            fields
                .map(|((field, cells), name)| {
                    let decimals = match field.holds {
                        Holds::Real(decimals) => Some(decimals.into()),
                        Holds::Text | Holds::Whole => None,
                    };
                    Member::new(name, decimals, cells)
                })
                .collect(),
        )
    }

    /// Prints our members as they fit one place, and says where the user's text goes on.
    fn splice(&self, splice: &Splice, row: usize, text: &mut Vec<u8>) -> usize {
        if self.0.is_empty() {
            return splice.at;
        }
        let (before, first, after): (&[u8], bool, &[u8]) = match splice.place {
            Place::AfterMember => (b"", false, b""),
            Place::InEmpty => (b"", true, b""),
            Place::OverNull => (b"{", true, b"}"),
            Place::AfterType => (b",\"properties\":{", true, b"}"),
        };
        text.extend_from_slice(before);
        for (place, member) in self.0.iter().enumerate() {
            member.print(row, first && place == 0, text);
        }
        text.extend_from_slice(after);
        match splice.place {
            Place::OverNull => splice.at + "null".len(),
            _ => splice.at,
        }
    }
}

fn print_packed(packed: &Packed, row: usize, digits: Option<usize>, text: &mut Vec<u8>) {
    let vertices = packed.vertices(row);
    let heights = packed
        .heights(row)
        .filter(|heights| heights.iter().any(|height| height.is_finite()));
    let all = |range: std::ops::Range<usize>, text: &mut Vec<u8>| {
        text.push(b'[');
        for place in range.clone() {
            if place > range.start {
                text.push(b',');
            }
            print_position(vertices[place], heights.map(|heights| heights[place]), digits, text);
        }
        text.push(b']');
    };
    let parts = packed.starts(row);
    let (kind, count) = match packed.kind(row) {
        // A geometry that lies nowhere has no coordinates that JSON could hold.
        _ if !packed.is_finite(row) => return text.extend_from_slice(b"null"),
        Kind::Points => ("Point", vertices.len()),
        Kind::Lines => ("LineString", parts.len()),
        Kind::Missing | Kind::Other(_) => return text.extend_from_slice(b"null"),
    };
    let multi = if count > 1 { "Multi" } else { "" };
    print(text, format_args!("{{\"type\":\"{multi}{kind}\",\"coordinates\":"));
    match packed.kind(row) {
        Kind::Points if count == 1 => {
            print_position(vertices[0], heights.map(|heights| heights[0]), digits, text);
        }
        Kind::Lines if count > 1 => {
            text.push(b'[');
            for (part, &start) in parts.iter().enumerate() {
                if part > 0 {
                    text.push(b',');
                }
                let end = parts.get(part + 1).map_or(vertices.len(), |next| *next as usize);
                all(start as usize..end, text);
            }
            text.push(b']');
        }
        _ => all(0..vertices.len(), text),
    }
    text.push(b'}');
}

fn print_geometry(kind: &str, vertices: &[[f64; 2]], digits: usize, text: &mut Vec<u8>) {
    let finite = vertices.iter().all(|xy| xy[0].is_finite() && xy[1].is_finite());
    if vertices.is_empty() || !finite {
        return text.extend_from_slice(b"null");
    }
    print(text, format_args!("{{\"type\":\"{kind}\",\"coordinates\":"));
    if kind == "Point" {
        print_position(vertices[0], None, Some(digits), text);
    } else {
        text.push(b'[');
        for (place, xy) in vertices.iter().enumerate() {
            if place > 0 {
                text.push(b',');
            }
            print_position(*xy, None, Some(digits), text);
        }
        text.push(b']');
    }
    text.push(b'}');
}

fn print_position(xy: [f64; 2], height: Option<f64>, digits: Option<usize>, text: &mut Vec<u8>) {
    text.push(b'[');
    print_number(xy[0], digits, text);
    text.push(b',');
    print_number(xy[1], digits, text);
    if let Some(height) = height {
        text.push(b',');
        print_number(if height.is_finite() { height } else { 0.0 }, None, text);
    }
    text.push(b']');
}

/// A number rounded to so many decimals without the zeros at its end; without a number of decimals, its shortest text
/// that reads back the same. What is not finite is null.
fn print_number(value: f64, decimals: Option<usize>, text: &mut Vec<u8>) {
    /// From here on whole numbers are no longer exact and a plain text would be long.
    const LARGE: f64 = 1e15;
    if !value.is_finite() {
        return text.extend_from_slice(b"null");
    }
    match decimals {
        Some(decimals) if value.abs() < LARGE => {
            let start = text.len();
            print(text, format_args!("{value:.decimals$}"));
            if decimals > 0 {
                let zeros = text.iter().rev().take_while(|byte| **byte == b'0').count();
                text.truncate(text.len() - zeros);
                if text.last() == Some(&b'.') {
                    text.pop();
                }
            }
            if text[start..] == *b"-0" {
                text.remove(start);
            }
        }
        None if value.abs() < LARGE && value.abs() > 1e-6 || value == 0.0 => print(text, format_args!("{value}")),
        _ => print(text, format_args!("{value:e}")),
    }
}

fn print_text(value: &str, text: &mut Vec<u8>) {
    serde_json::to_writer(text, value).expect("text always prints into memory");
}

fn print(text: &mut Vec<u8>, what: std::fmt::Arguments) {
    text.write_fmt(what).expect("memory takes everything");
}

/// Reads a layer again with all its columns, to be written in another format.
pub(in crate::layers) fn read_again(source: &Layer, heights: bool) -> Result<Layer, Error> {
    let path = &source.source.path;
    let bytes = files::read(path)?;
    if files::sha256(&bytes) != source.source.sha256 {
        return Err(changed(path));
    }
    let wanted = Wanted {
        columns: Columns::All,
        heights,
        encoding: None,
    };
    Ok(super::read::read_bytes(path, &bytes, &wanted)?.value)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_short_and_true() {
        for (value, decimals, expected) in [
            (0.3, Some(10), "0.3"),
            (12.0, Some(3), "12"),
            (120.0, Some(0), "120"),
            (-0.0004, Some(3), "0"),
            (1234.56789, Some(2), "1234.57"),
            (f64::NAN, Some(2), "null"),
            (f64::INFINITY, None, "null"),
            (1e300, Some(2), "1e300"),
            (0.1, None, "0.1"),
            (1e-9, None, "1e-9"),
            (0.0, None, "0"),
        ] {
            let mut text = Vec::new();
            print_number(value, decimals, &mut text);
            assert_eq!(String::from_utf8(text).unwrap(), expected);
        }
    }
}
