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

#[cfg(test)]
mod tests {
    use std::path::PathBuf;

    use super::*;
    use crate::layers::{ReadOptions, Shape};

    const TOWN: &str = "\u{feff}{ \"type\": \"FeatureCollection\", \"extra\": [1, 2],\n\"features\": [\n\
        {\"type\":\"Feature\",\"id\":7,\"properties\":{\"facility_identifier\":9007199254740993,\"vel_mps\":\"old\" , \"x\": 1.10 },\
        \"geometry\":{\"type\":\"LineString\",\"coordinates\":[[15.5,48.2,301.5],[15.51,48.21,302]]}},\n\
        {\"type\":\"Feature\",\"properties\":{},\"geometry\":null},\n\
        {\"type\":\"Feature\",\"properties\":null,\"geometry\":{\"type\":\"MultiLineString\",\"coordinates\":[[[15,48,1],[15.1,48,1]],[[15.2,48,1],[15.3,48,1]]]}},\n\
        {\"type\":\"Feature\",\"geometry\":{\"type\":\"Point\",\"coordinates\":[15,48]}}\n], \"tail\": {}}\n";

    fn table() -> Table {
        let field = |name: &str, holds| Field {
            name: name.into(),
            holds,
        };
        let text = |text: &str| Cell::Text(text.into());
        Table {
            fields: vec![
                field("vel_mps", Holds::Real(4)),
                field("vel_flag", Holds::Text),
                field("parts", Holds::Whole),
            ],
            columns: vec![
                vec![Cell::Real(1.23456), Cell::Null, Cell::Real(f64::NAN), Cell::Real(2.0)],
                vec![text("ok"), text("not \"judged\""), Cell::Null, text("hügh")],
                vec![Cell::Whole(3), Cell::Null, Cell::Whole(1), Cell::Whole(0)],
            ],
        }
    }

    fn all_columns() -> ReadOptions {
        let names = [
            "facility_identifier",
            "facility_i",
            "vel_mps",
            "x",
            "vel_mps2",
            "vel_flag",
            "parts",
        ];
        ReadOptions {
            columns: names.map(String::from).to_vec(),
            encoding: None,
        }
    }

    fn read(path: &Path) -> Layer {
        Layer::read(path, 0, &all_columns()).unwrap().value
    }

    /// Writes a marked copy into a folder of its own and reads it again.
    fn mark(place: &Path, source: &Layer, format: Format) -> (PathBuf, Layer, Vec<Finding>) {
        let target = place.join(format.name());
        let mut out = OutputDir::open(&target, std::slice::from_ref(&source.source.path)).unwrap();
        let findings = write_marked(&mut out, "mains", source, &table(), format)
            .unwrap()
            .findings;
        out.finish().unwrap();
        let path = target.join(match format {
            Format::GeoJson => "mains.geojson",
            Format::Shapefile => "mains.shp",
        });
        let layer = read(&path);
        (path, layer, findings)
    }

    #[test]
    fn a_marked_copy_keeps_every_byte_of_the_users() {
        let place = tempfile::tempdir().unwrap();
        let path = place.path().join("town.geojson");
        std::fs::write(&path, TOWN).unwrap();
        let (copy, layer, findings) = mark(place.path(), &read(&path), Format::GeoJson);
        assert_eq!(findings.len(), 1);
        assert_eq!(findings[0].code, Code::ColumnRenamed);
        let text = std::fs::read_to_string(copy).unwrap();
        let ours = [
            ",\"vel_mps2\":1.2346,\"vel_flag\":\"ok\",\"parts\":3",
            "\"vel_mps2\":null,\"vel_flag\":\"not \\\"judged\\\"\",\"parts\":null",
            "\"vel_mps2\":null,\"vel_flag\":null,\"parts\":1",
            "\"vel_mps2\":2.0,\"vel_flag\":\"hügh\",\"parts\":0",
        ];
        let mut without = text;
        for members in ours {
            assert_eq!(without.matches(members).count(), 1, "{members}");
            without = without.replacen(members, "", 1);
        }
        // What is left is the user's text, but for the two features that had no properties to add to.
        let expected = TOWN.replace("\"properties\":null", "\"properties\":{}").replace(
            "{\"type\":\"Feature\",\"geometry\"",
            "{\"type\":\"Feature\",\"properties\":{},\"geometry\"",
        );
        assert_eq!(without, expected);
        assert_eq!(layer.rows(), 4);
    }

    #[test]
    fn geojson_as_a_shapefile_and_back_has_equal_values() {
        let place = tempfile::tempdir().unwrap();
        let path = place.path().join("town.geojson");
        std::fs::write(&path, TOWN).unwrap();
        let source = read(&path);
        let (shp, layer, findings) = mark(place.path(), &source, Format::Shapefile);
        let said: Vec<String> = findings
            .iter()
            .map(|f| format!("{:?} {:?}", f.code, f.message))
            .collect();
        assert!(
            said.iter().any(|s| s.contains("facility_identifier as facility_i")),
            "{said:?}"
        );
        assert!(
            said.iter().any(|s| s.contains("1 rows of another geometry")),
            "{said:?}"
        );
        assert_eq!(
            layer.column_names,
            ["facility_i", "vel_mps", "x", "vel_mps2", "vel_flag", "parts"]
        );
        for row in 0..3 {
            assert_eq!(layer.shape(row), source.shape(row));
        }
        assert_eq!(layer.shape(3), Shape::Missing);
        assert!(layer.crs.same_system(&source.crs) || layer.crs.is_lon_lat);
        let cells = |name: &str| layer.column(name).unwrap().cells.clone();
        assert_eq!(cells("facility_i")[0], Cell::Whole(9_007_199_254_740_993));
        assert_eq!(cells("vel_mps")[0], Cell::Text("old".into()));
        assert_eq!(cells("x")[..2], [Cell::Real(1.1), Cell::Null]);
        assert_eq!(
            cells("vel_mps2"),
            [Cell::Real(1.2346), Cell::Null, Cell::Null, Cell::Real(2.0)]
        );
        assert_eq!(cells("vel_flag")[3], Cell::Text("hügh".into()));

        // And on from there: the same format byte for byte, the other with the same coordinates and heights.
        let next = tempfile::tempdir().unwrap();
        let (again, twice, _) = mark(next.path(), &layer, Format::Shapefile);
        for ending in ["shp", "shx", "prj", "cpg"] {
            let bytes = |path: &Path| std::fs::read(path.with_extension(ending)).unwrap();
            assert_eq!(bytes(&shp), bytes(&again), "{ending}");
        }
        assert_eq!(twice.column_names[6..], ["vel_mps3", "vel_flag2", "parts2"]);
        assert_eq!(twice.column("vel_flag").unwrap().cells, cells("vel_flag"));
        let (back, _, _) = mark(next.path(), &layer, Format::GeoJson);
        let text = std::fs::read_to_string(back).unwrap();
        assert!(text.contains("[[15.5,48.2,301.5],[15.51,48.21,302]]"), "{text}");
        assert!(text.contains("\"facility_i\":9007199254740993,"), "{text}");
        assert!(!text.contains("\"crs\""), "{text}");
    }

    #[test]
    fn a_shapefile_that_lacks_its_side_files_is_marked_whole() {
        let place = tempfile::tempdir().unwrap();
        let path = place.path().join("town.geojson");
        std::fs::write(&path, TOWN).unwrap();
        let (shp, _, _) = mark(place.path(), &read(&path), Format::Shapefile);
        let index = std::fs::read(shp.with_extension("shx")).unwrap();
        for ending in ["shx", "dbf"] {
            std::fs::remove_file(shp.with_extension(ending)).unwrap();
        }
        let next = tempfile::tempdir().unwrap();
        let (copy, layer, _) = mark(next.path(), &read(&shp), Format::Shapefile);
        assert_eq!(std::fs::read(copy.with_extension("shx")).unwrap(), index);
        assert_eq!(layer.column_names, ["vel_mps", "vel_flag", "parts"]);
    }

    #[test]
    fn a_source_that_changed_since_it_was_read_is_refused() {
        let place = tempfile::tempdir().unwrap();
        let path = place.path().join("town.geojson");
        std::fs::write(&path, TOWN).unwrap();
        let source = read(&path);
        std::fs::write(&path, TOWN.replace("1.10", "1.20")).unwrap();
        for format in [Format::GeoJson, Format::Shapefile] {
            let mut out = OutputDir::open(&place.path().join("results"), &[]).unwrap();
            let error = write_marked(&mut out, "mains", &source, &table(), format).unwrap_err();
            assert!(error.to_string().contains("has changed since"), "{error}");
        }
        assert!(!place.path().join("results").exists());
    }

    #[test]
    fn layers_of_our_own_read_back() {
        let place = tempfile::tempdir().unwrap();
        let crs = Crs::parse("EPSG:2264").unwrap();
        let line = vec![[1_450_000.0, 540_000.0], [1_450_010.123_45, 540_000.0]];
        let geometries = [
            (
                "parts",
                Geometry::Lines(vec![line.clone(), vec![], vec![[f64::NAN, 0.0]], line.clone()]),
            ),
            (
                "nodes",
                Geometry::Points(vec![Some(line[0]), None, Some(line[1]), Some([f64::INFINITY, 1.0])]),
            ),
        ];
        for format in [Format::GeoJson, Format::Shapefile] {
            let target = place.path().join(format.name());
            let mut out = OutputDir::open(&target, &[]).unwrap();
            for (name, geometry) in &geometries {
                let layer = NewLayer {
                    name,
                    crs: &crs,
                    geometry,
                    table: &table(),
                };
                write_new(&mut out, &layer, format).unwrap();
            }
            let bare = NewLayer {
                name: "cases",
                crs: &crs,
                geometry: &Geometry::None,
                table: &table(),
            };
            write_new(&mut out, &bare, format).unwrap();
            out.finish().unwrap();
            let ending = if format == Format::GeoJson { "geojson" } else { "shp" };
            let parts = read(&target.join("parts").with_extension(ending));
            assert_eq!(parts.crs.epsg, Some(2264));
            let Shape::Lines { vertices, .. } = parts.shape(3) else {
                panic!("a line")
            };
            assert_eq!(vertices, line);
            assert_eq!((parts.shape(1), parts.shape(2)), (Shape::Missing, Shape::Missing));
            let nodes = read(&target.join("nodes").with_extension(ending));
            assert_eq!(
                (nodes.shape(2), nodes.shape(1)),
                (Shape::Point(line[1]), Shape::Missing)
            );
            assert_eq!(nodes.shape(3), Shape::Missing);
            assert_eq!(nodes.column("parts").unwrap().cells[0], Cell::Whole(3));
            assert_eq!(target.join("cases.dbf").exists(), format == Format::Shapefile);
        }
    }

    #[test]
    fn geojson_of_a_shapefile_is_in_longitude_and_latitude_or_says_what_it_is_in() {
        let place = tempfile::tempdir().unwrap();
        let path = place.path().join("town.geojson");
        std::fs::write(&path, TOWN).unwrap();
        let mut source = read(&path);
        source.source.format = Format::Shapefile;
        for (crs, expected) in [("EPSG:2264", Some(4326)), ("EPSG:2204", Some(2204))] {
            source.crs = Crs::parse(crs).unwrap();
            assert_eq!(output_crs(&source, Format::GeoJson).unwrap().epsg, expected);
            assert_eq!(output_crs(&source, Format::Shapefile).unwrap(), source.crs);
        }
        source.crs = Crs::plain_metres("town.shp");
        let error = output_crs(&source, Format::GeoJson).unwrap_err();
        assert!(error.to_string().contains("Write shapefiles instead"), "{error}");
    }
}
