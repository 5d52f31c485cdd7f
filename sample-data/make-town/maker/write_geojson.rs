//! The layers as GeoJSON (RFC 7946): longitude and latitude, one feature a line.

use std::fmt::Write as _;

use serde_json::{Map, Value, json};

use super::place::Place;
use super::plane::Point;
use super::tables::{Cell, Shape, Table};

fn value(cell: &Cell) -> Value {
    match cell {
        Cell::Null => Value::Null,
        Cell::Whole(number) => json!(number),
        Cell::Real(number) => json!(number),
        Cell::Text(words) => json!(words),
    }
}

fn geometry(shape: &Shape, place: &Place) -> Value {
    let line = |line: &Vec<Point>| -> Vec<[f64; 2]> { line.iter().map(|vertex| place.lon_lat(*vertex)).collect() };
    match shape {
        Shape::Null => Value::Null,
        Shape::Empty => json!({ "type": "LineString", "coordinates": [] }),
        Shape::Point(at) => json!({ "type": "Point", "coordinates": place.lon_lat(*at) }),
        Shape::Lines(lines) if lines.len() == 1 => json!({ "type": "LineString", "coordinates": line(&lines[0]) }),
        Shape::Lines(lines) => {
            json!({ "type": "MultiLineString", "coordinates": lines.iter().map(line).collect::<Vec<_>>() })
        }
    }
}

/// A layer's file.
pub fn text(table: &Table, place: &Place) -> String {
    let mut out = format!(
        "{{\"type\":\"FeatureCollection\",\"name\":\"{}\",\"features\":[\n",
        table.name
    );
    for (row, shape) in table.shapes.iter().enumerate() {
        let mut properties = Map::new();
        for column in &table.columns {
            properties.insert(column.si_name.to_string(), value(&column.si[row]));
        }
        let feature = json!({ "type": "Feature", "properties": properties, "geometry": geometry(shape, place) });
        let comma = if row + 1 < table.shapes.len() { "," } else { "" };
        writeln!(out, "{feature}{comma}").expect("text takes text");
    }
    out.push_str("]}\n");
    out
}
