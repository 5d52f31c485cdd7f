//! Reading: the document's members in any order, features one after another.

use std::fmt;
use std::path::Path;

use serde::de::{DeserializeSeed, Deserializer, Error as _, IgnoredAny, MapAccess, SeqAccess, Visitor};
use serde_json::Value;
use serde_json::value::RawValue;

use super::coordinates::{Geometry, Text};
use super::properties::{Members, Table};
use super::{Place, Splice};
use crate::finding::{Checked, Code, Error, Finding, Severity};
use crate::layers::crs::Crs;
use crate::layers::files;
use crate::layers::layer::{Format, Layer, Replay, Source, Wanted, file_name, name_of};
use crate::layers::packed::{Kind, Packed};
use crate::layers::where_on_earth::{Guess, guess};

/// Reads a layer.
pub(in crate::layers) fn read(path: &Path, wanted: &Wanted) -> Result<Checked<Layer>, Error> {
    let bytes = files::read(path)?;
    let (sha256, read) = rayon::join(|| files::sha256(&bytes), || read_bytes(path, &bytes, wanted));
    let mut read = read?;
    read.value.source.sha256 = sha256;
    Ok(read)
}

/// Reads a layer from the bytes of its file.
pub(super) fn read_bytes(path: &Path, bytes: &[u8], wanted: &Wanted) -> Result<Checked<Layer>, Error> {
    let text = text_of(path, bytes)?;
    let mut reader = Reader {
        base: bytes.as_ptr() as usize,
        packed: Packed::new(wanted.heights),
        table: Table::new(&wanted.columns),
        splices: Vec::new(),
    };
    let mut input = serde_json::Deserializer::from_str(text);
    let outcome = Document(&mut reader).deserialize(&mut input).and_then(|crs| {
        input.end()?;
        Ok(crs)
    });
    let stated = outcome.map_err(|error| explain(path, text, &error))?;
    let mut findings = Vec::new();
    let crs = system(path, stated, &reader.packed, &mut findings)?;
    let (column_names, columns) = reader.table.finish(reader.packed.rows());
    Ok(Checked {
        value: Layer {
            name: name_of(path),
            source: Source {
                path: path.to_path_buf(),
                format: Format::GeoJson,
                sha256: String::new(),
            },
            crs,
            column_names,
            columns,
            packed: reader.packed,
            replay: Replay::GeoJson(reader.splices),
        },
        findings,
    })
}

/// The text of a file: UTF-8, with or without a byte order mark.
fn text_of<'a>(path: &Path, bytes: &'a [u8]) -> Result<&'a str, Error> {
    if bytes.starts_with(&[0xff, 0xfe]) || bytes.starts_with(&[0xfe, 0xff]) {
        return Err(Error::input(path, "it is in UTF-16", "Save it as UTF-8."));
    }
    let plain = bytes.strip_prefix(b"\xef\xbb\xbf").unwrap_or(bytes);
    let text = std::str::from_utf8(plain).map_err(|error| {
        let line = 1 + plain[..error.valid_up_to()]
            .iter()
            .filter(|byte| **byte == b'\n')
            .count();
        Error::input(
            path,
            format!("line {line} is not UTF-8"),
            "Save it as UTF-8, the only encoding that GeoJSON allows.",
        )
    })?;
    if text.trim().is_empty() {
        return Err(Error::input(
            path,
            "it is empty",
            "Export the layer again; a layer without features is still `{\"type\":\"FeatureCollection\",\"features\":[]}`.",
        ));
    }
    Ok(text)
}

/// What stopped the reading, in a sentence.
fn explain(path: &Path, text: &str, error: &serde_json::Error) -> Error {
    let line = text.split('\n').nth(error.line().saturating_sub(1)).unwrap_or("");
    let from_error = line.get(error.column().saturating_sub(1)..).unwrap_or("");
    // A number that is cut is told as a number that is wrong, at the very end.
    let cut_number = error.to_string().starts_with("invalid number")
        && from_error.len() <= 1
        && text.trim_end().ends_with(line.trim_end());
    if error.is_eof() || cut_number {
        return Error::input(
            path,
            format!(
                "it is cut short: it ends in line {} before the document does",
                error.line()
            ),
            "Copy or export it again.",
        );
    }
    let word = from_error.trim_start_matches('-');
    if error.is_syntax() && (word.starts_with("NaN") || word.starts_with("Inf")) {
        return Error::input(
            path,
            format!(
                "line {}, column {}: not-a-number and infinity do not exist in JSON",
                error.line(),
                error.column()
            ),
            "Write null instead, and look for a failed calculation or projection in the tool that made the file.",
        );
    }
    let todo = if error.to_string().contains("trailing characters") {
        "Put all features into one `FeatureCollection`."
    } else {
        "Repair it there, or export it again."
    };
    Error::input(path, format!("it cannot be read as GeoJSON: {error}"), todo)
}

/// What the document says about its reference system.
enum Stated {
    Nothing,
    Null,
    Member(Value),
}

/// The layer's system, from what the document states and what its coordinates look like.
fn system(path: &Path, stated: Stated, packed: &Packed, findings: &mut Vec<Finding>) -> Result<Crs, Error> {
    let member = match stated {
        Stated::Member(member) => member,
        Stated::Null | Stated::Nothing => return assumed(path, matches!(stated, Stated::Null), packed, findings),
    };
    let properties = member.get("properties");
    let name = properties
        .and_then(|p| p.get("name").or_else(|| p.get("code")))
        .or(Some(&member));
    let name = match name {
        Some(Value::String(name)) => name.clone(),
        Some(Value::Number(code)) => format!("EPSG:{code}"),
        _ => {
            return Err(Error::input(
                path,
                "its `crs` member names no reference system",
                "Write it as {\"type\":\"name\",\"properties\":{\"name\":\"urn:ogc:def:crs:EPSG::2264\"}} with the right code.",
            ));
        }
    };
    Crs::of_code(&name).map_err(|what| {
        Error::input(
            path,
            what,
            "Export the layer in longitude and latitude, or in a system with an EPSG code.",
        )
    })
}

/// The system of a document that states none: longitude and latitude, unless its coordinates cannot be that.
fn assumed(path: &Path, said_null: bool, packed: &Packed, findings: &mut Vec<Finding>) -> Result<Crs, Error> {
    let guess = guess(packed);
    if guess == Guess::Swapped {
        return Err(Error::input(
            path,
            "its coordinates look like latitude before longitude",
            "GeoJSON has longitude first: export it again with the axes in that order.",
        ));
    }
    let crs = if guess == Guess::Plane {
        Crs::plain_metres(&file_name(path))
    } else {
        Crs::lon_lat()
    };
    if guess == Guess::Plane || said_null {
        let message = format!("layer {}: no `crs` is stated; taken as {}", name_of(path), crs.name);
        let severity = if guess == Guess::Plane {
            Severity::Serious
        } else {
            Severity::Warning
        };
        findings.push(Finding::new(Code::CrsAssumed, message.into()).severity(severity));
    }
    Ok(crs)
}

struct Reader<'a> {
    /// Address of the file's first byte, to tell offsets.
    base: usize,
    packed: Packed,
    table: Table<'a>,
    splices: Vec<Splice>,
}

impl Reader<'_> {
    /// Closes a row, once its members are known.
    fn row(&mut self, kind: Kind, kind_of_feature: &RawValue, properties: Option<&RawValue>) -> Result<(), String> {
        let number = self.packed.rows() + 1;
        if kind_of_feature.get() != "\"Feature\"" {
            return Err(format!(
                "feature {number}: its type is {}, not \"Feature\"",
                kind_of_feature.get()
            ));
        }
        let offset_after = |raw: &RawValue| raw.get().as_ptr() as usize - self.base + raw.get().len();
        let splice = match properties.map(RawValue::get) {
            None => Splice {
                at: offset_after(kind_of_feature),
                place: Place::AfterType,
            },
            Some("null") => Splice {
                at: offset_after(properties.expect("just seen")) - "null".len(),
                place: Place::OverNull,
            },
            Some(json) if json.starts_with('{') => {
                Members {
                    table: &mut self.table,
                    row: number - 1,
                }
                .deserialize(&mut serde_json::Deserializer::from_str(json))
                .map_err(|error| format!("feature {number}: its properties cannot be read: {error}"))?;
                let inside = json[..json.len() - 1].trim_end_matches([' ', '\t', '\n', '\r']);
                Splice {
                    at: json.as_ptr() as usize - self.base + inside.len(),
                    place: if inside.len() == 1 {
                        Place::InEmpty
                    } else {
                        Place::AfterMember
                    },
                }
            }
            Some(_) => {
                return Err(format!(
                    "feature {number}: its properties are neither an object nor null"
                ));
            }
        };
        self.splices.push(splice);
        self.packed.close(kind);
        Ok(())
    }
}

/// The whole document.
struct Document<'r, 'a>(&'r mut Reader<'a>);

impl<'de> DeserializeSeed<'de> for Document<'_, '_> {
    type Value = Stated;

    fn deserialize<D: Deserializer<'de>>(self, input: D) -> Result<Stated, D::Error> {
        input.deserialize_map(self)
    }
}

impl<'de> Visitor<'de> for Document<'_, '_> {
    type Value = Stated;

    fn expecting(&self, out: &mut fmt::Formatter) -> fmt::Result {
        out.write_str("a FeatureCollection")
    }

    fn visit_map<A: MapAccess<'de>>(self, mut members: A) -> Result<Stated, A::Error> {
        let mut stated = Stated::Nothing;
        let mut kind: Option<&RawValue> = None;
        let (mut geometry, mut properties, mut has_features) = (None, None, false);
        while let Some(name) = members.next_key_seed(Text)? {
            match &*name {
                "type" => kind = Some(members.next_value()?),
                "crs" => {
                    let member: Value = members.next_value()?;
                    stated = if member.is_null() {
                        Stated::Null
                    } else {
                        Stated::Member(member)
                    };
                }
                "features" if has_features => return Err(A::Error::custom("there are two `features` members")),
                "features" => {
                    has_features = true;
                    members.next_value_seed(Features(&mut *self.0))?;
                }
                "geometry" => geometry = Some(members.next_value::<&RawValue>()?),
                "properties" => properties = Some(members.next_value::<&RawValue>()?),
                _ => {
                    members.next_value::<IgnoredAny>()?;
                }
            }
        }
        match kind.map(RawValue::get) {
            Some("\"FeatureCollection\"") if has_features => {}
            Some("\"FeatureCollection\"") => return Err(A::Error::custom("a FeatureCollection without `features`")),
            Some("\"Feature\"") if !has_features => {
                let drawn = match geometry {
                    Some(json) => Geometry {
                        packed: &mut self.0.packed,
                        feature: 1,
                    }
                    .deserialize(&mut serde_json::Deserializer::from_str(json.get()))
                    .map_err(A::Error::custom)?,
                    None => Kind::Missing,
                };
                self.0
                    .row(drawn, kind.expect("just seen"), properties)
                    .map_err(A::Error::custom)?;
            }
            Some(other) => {
                return Err(A::Error::custom(format!(
                    "its type is {other}, but only a FeatureCollection or a Feature can carry attributes"
                )));
            }
            None => return Err(A::Error::custom("it has no `type`")),
        }
        Ok(stated)
    }
}

/// The array of features.
struct Features<'r, 'a>(&'r mut Reader<'a>);

impl<'de> DeserializeSeed<'de> for Features<'_, '_> {
    type Value = ();

    fn deserialize<D: Deserializer<'de>>(self, input: D) -> Result<(), D::Error> {
        input.deserialize_seq(self)
    }
}

impl<'de> Visitor<'de> for Features<'_, '_> {
    type Value = ();

    fn expecting(&self, out: &mut fmt::Formatter) -> fmt::Result {
        out.write_str("an array of features")
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut elements: A) -> Result<(), A::Error> {
        while elements.next_element_seed(Feature(&mut *self.0))?.is_some() {}
        Ok(())
    }
}

/// One feature.
struct Feature<'r, 'a>(&'r mut Reader<'a>);

impl<'de> DeserializeSeed<'de> for Feature<'_, '_> {
    type Value = ();

    fn deserialize<D: Deserializer<'de>>(self, input: D) -> Result<(), D::Error> {
        input.deserialize_map(self)
    }
}

impl<'de> Visitor<'de> for Feature<'_, '_> {
    type Value = ();

    fn expecting(&self, out: &mut fmt::Formatter) -> fmt::Result {
        write!(out, "a feature as number {}", self.0.packed.rows() + 1)
    }

    fn visit_map<A: MapAccess<'de>>(self, mut members: A) -> Result<(), A::Error> {
        let mut kind: Option<&RawValue> = None;
        let mut properties: Option<&RawValue> = None;
        let mut drawn = Kind::Missing;
        let number = self.0.packed.rows() + 1;
        while let Some(name) = members.next_key_seed(Text)? {
            match &*name {
                "type" => kind = Some(members.next_value()?),
                "properties" => properties = Some(members.next_value()?),
                "geometry" => {
                    self.0.packed.clear_open();
                    drawn = members.next_value_seed(Geometry {
                        packed: &mut self.0.packed,
                        feature: number,
                    })?;
                }
                _ => {
                    members.next_value::<IgnoredAny>()?;
                }
            }
        }
        let kind = kind.ok_or_else(|| A::Error::custom(format!("feature {number}: it has no type")))?;
        self.0.row(drawn, kind, properties).map_err(A::Error::custom)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::layers::layer::{Cell, Columns, Shape};

    fn all(text: &str) -> Result<Checked<Layer>, Error> {
        let wanted = Wanted {
            columns: Columns::All,
            heights: true,
            encoding: None,
        };
        read_bytes(Path::new("town.geojson"), text.as_bytes(), &wanted)
    }

    const TOWN: &str = r#" {"bbox":[1,2,3,4],"name":"mains [2024]","features":[
 {"geometry":{"coordinates":[[1,2],[3.5,4,9]],"type":"LineString"},"type":"Feature","properties":{"id":1,"ID":"x"} },
 {"type":"Feature","properties":{ },"geometry":null},
 {"type":"Feature","id":7,"properties": null ,"geometry":{"type":"MultiLineString","coordinates":[[[0,0],[1,1]],[],[[2,2]]]}},
 {"type":"Feature","geometry":{"type":"Point","coordinates":[5,6]}},
 {"type":"Feature","properties":{"new":[1, {"a":null}],"id":null},"geometry":{"type":"MultiPoint","coordinates":[[7,8],[9,9]]}},
 {"type":"Feature","properties":{"id":2.50},"geometry":{"type":"Polygon","coordinates":[[[0,0],[1,0],[1,1],[0,0]]]}},
 {"type":"Feature","properties":{},"geometry":{"type":"GeometryCollection","geometries":[{"type":"Point","coordinates":[1,1]}]}},
 {"type":"Feature","properties":{},"geometry":{"type":"LineString","coordinates":[[1,null],["2",3]]}},
 {"type":"Feature","properties":{},"geometry":{"type":"Point","coordinates":[]}},
 {"type":"Feature","properties":{},"geometry":{"type":"LineString","coordinates":[[4,4]]}}
 ],"type":"FeatureCollection","crs":{"type":"name","properties":{"name":"urn:ogc:def:crs:EPSG::2264"}}}"#;

    #[test]
    fn every_kind_of_feature_is_read_in_any_order_of_members() {
        let layer = all(TOWN).unwrap().value;
        assert_eq!(layer.crs.epsg, Some(2264));
        assert_eq!(layer.rows(), 10);
        assert_eq!(layer.column_names, ["id", "ID", "new"]);
        let lines = |vertices: &'static [[f64; 2]], starts: &'static [u32]| Shape::Lines { vertices, starts };
        let expected = [
            lines(&[[1.0, 2.0], [3.5, 4.0]], &[0]),
            Shape::Missing,
            lines(&[[0.0, 0.0], [1.0, 1.0], [2.0, 2.0]], &[0, 2]),
            Shape::Point([5.0, 6.0]),
            Shape::Point([7.0, 8.0]),
            Shape::Other("Polygon"),
            Shape::Other("GeometryCollection"),
            Shape::NotFinite,
            Shape::Missing,
            lines(&[[4.0, 4.0]], &[0]),
        ];
        for (row, shape) in expected.into_iter().enumerate() {
            assert_eq!(layer.shape(row as u32), shape, "row {row}");
        }
        assert_eq!(layer.bounds(), Some([0.0, 0.0, 9.0, 9.0]));
        assert_eq!(layer.column("id").unwrap().cells[0], Cell::Whole(1));
        assert_eq!(
            layer.column("id").unwrap().cells[4..7],
            [Cell::Null, Cell::Real(2.5), Cell::Null]
        );
        assert_eq!(
            layer.column("new").unwrap().cells[4],
            Cell::Text(r#"[1, {"a":null}]"#.into())
        );
        assert_eq!(layer.column("Id"), None);
    }

    #[test]
    fn only_columns_asked_for_are_kept() {
        let read = |names: &[&str]| {
            let wanted = Wanted {
                columns: Columns::Named(names.iter().map(|name| name.to_string()).collect()),
                heights: false,
                encoding: None,
            };
            read_bytes(Path::new("town.geojson"), TOWN.as_bytes(), &wanted)
                .unwrap()
                .value
        };
        let layer = read(&["NEW", "nothing"]);
        assert_eq!(layer.columns.len(), 1);
        assert_eq!(layer.column("NEW").unwrap().name, "new");
        assert_eq!(read(&["Id"]).columns.len(), 0);
    }

    #[test]
    fn the_place_of_our_members_is_known() {
        let layer = all(&format!("\u{feff}{TOWN}")).unwrap().value;
        let Replay::GeoJson(splices) = &layer.replay else {
            panic!("a GeoJSON layer")
        };
        let text = format!("\u{feff}{TOWN}");
        let before: Vec<(&str, Place)> = splices.iter().map(|s| (&text[s.at - 3..s.at], s.place)).collect();
        assert_eq!(before[0], ("\"x\"", Place::AfterMember));
        assert_eq!(before[1], ("\":{", Place::InEmpty));
        assert_eq!(before[2].1, Place::OverNull);
        assert!(text[splices[2].at..].starts_with("null ,"));
        assert_eq!(before[3], ("re\"", Place::AfterType));
    }

    #[test]
    fn a_file_cut_anywhere_is_an_error() {
        for end in 0..TOWN.len() {
            let error = all(&TOWN[..end]).unwrap_err().to_string();
            assert!(error.contains("cut short") || error.contains("empty"), "{end}: {error}");
        }
    }

    #[test]
    fn damage_is_said_in_a_sentence() {
        let feature = |geometry: &str, properties: &str| {
            format!(
                r#"{{"type":"FeatureCollection","features":[{{"type":"Feature","geometry":{geometry},"properties":{properties}}}]}}"#
            )
        };
        let line = |coordinates: &str| format!(r#"{{"type":"LineString","coordinates":{coordinates}}}"#);
        for (text, says) in [
            ("  ".into(), "empty"),
            ("[]".into(), "a FeatureCollection"),
            (r#"{"features":[]}"#.into(), "no `type`"),
            (r#"{"type":"FeatureCollection"}"#.into(), "without `features`"),
            (
                r#"{"type":"FeatureCollection","features":{}}"#.into(),
                "array of features",
            ),
            (
                r#"{"type":"FeatureCollection","features":[null]}"#.into(),
                "a feature as number 1",
            ),
            (
                r#"{"type":"FeatureCollection","features":[{}]}"#.into(),
                "feature 1: it has no type",
            ),
            (
                r#"{"type":"FeatureCollection","features":[],"features":[]}"#.into(),
                "two `features`",
            ),
            (r#"{"type":"Point","coordinates":[1,2]}"#.into(), "carry attributes"),
            (
                "{\"type\":\"FeatureCollection\",\"features\":[]}\n{}".into(),
                "into one",
            ),
            (r#"{"type":"FeatureCollection","features":[}"#.into(), "cannot be read"),
            (feature("null", "[1]"), "neither an object nor null"),
            (feature("5", "{}"), "a geometry or null in feature 1"),
            (feature("{\"type\":\"Circle\"}", "{}"), "`Circle`"),
            (feature("{}", "{}"), "no type"),
            (feature(&line("[1,2]"), "{}"), "nested 0 deep instead of 1"),
            (feature(&line("[[[1,2]]]"), "{}"), "nested 2 deep instead of 1"),
            (feature(&line("[[1,2],3]"), "{}"), "mixed"),
            (feature(&line("[[1,2],[[3,4]]]"), "{}"), "mixed"),
            (feature(&line("[[1,NaN]]"), "{}"), "not-a-number"),
            (feature(&line("[[1,-Infinity]]"), "{}"), "not-a-number"),
            (feature(&line(&"[".repeat(100_000)), "{}"), "cannot be read"),
            (feature(&line("[[48.1,115.2],[48.2,115.1]]"), "{}"), "longitude first"),
        ] {
            let error = all(&text).map(|_| text.clone()).unwrap_err().to_string();
            assert!(
                error.starts_with("town.geojson: ") && error.contains(says),
                "{says}: {error}"
            );
            assert!(error.ends_with('.'), "{error}");
        }
    }

    #[test]
    fn bytes_that_are_no_text_are_refused() {
        let wanted = Wanted {
            columns: Columns::All,
            heights: false,
            encoding: None,
        };
        let latin = b"{\"type\":\"FeatureCollection\",\n\"name\":\"Stra\xdfe\",\"features\":[]}";
        let error = read_bytes(Path::new("a.json"), latin, &wanted).unwrap_err();
        assert!(error.to_string().contains("line 2 is not UTF-8"), "{error}");
        let error = read_bytes(Path::new("a.json"), b"\xff\xfe{\0", &wanted).unwrap_err();
        assert!(error.to_string().contains("UTF-16"), "{error}");
    }

    #[test]
    fn the_reference_system_is_stated_or_assumed_aloud() {
        let with = |crs: &str, xy: &str| {
            all(&format!(
                r#"{{"type":"FeatureCollection",{crs}"features":[{{"type":"Feature","properties":null,"geometry":{{"type":"Point","coordinates":{xy}}}}}]}}"#
            ))
        };
        assert_eq!(with("", "[15,48]").unwrap().value.crs, Crs::lon_lat());
        assert!(with("", "[15,48]").unwrap().findings.is_empty());
        let plane = with("", "[500000,4800000]").unwrap();
        assert_eq!(plane.findings[0].code, Code::CrsAssumed);
        assert!(!plane.value.crs.is_lon_lat);
        assert_eq!(with("\"crs\":null,", "[15,48]").unwrap().findings.len(), 1);
        let old = r#""crs":{"type":"EPSG","properties":{"code":32633}},"#;
        assert_eq!(with(old, "[500000,4800000]").unwrap().value.crs.epsg, Some(32633));
        let link = r#""crs":{"type":"link","properties":{"href":"x"}},"#;
        assert!(with(link, "[1,2]").is_err());
        let unknown = r#""crs":{"type":"name","properties":{"name":"EPSG:1"}},"#;
        assert!(with(unknown, "[1,2]").unwrap_err().to_string().contains("EPSG:1"));
    }

    #[test]
    fn a_single_feature_is_a_layer_of_one_row() {
        let text = r#"{"type":"Feature","properties":{"a":1},"geometry":{"type":"Point","coordinates":[1,2]}}"#;
        let layer = all(text).unwrap().value;
        assert_eq!((layer.rows(), layer.shape(0)), (1, Shape::Point([1.0, 2.0])));
        assert!(
            all(r#"{"type":"FeatureCollection","features":[]}"#)
                .unwrap()
                .value
                .rows()
                == 0
        );
    }
}
