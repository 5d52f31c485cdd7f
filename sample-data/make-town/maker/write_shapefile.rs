//! The layers as shapefiles (ESRI Shapefile Technical Description, 1998): shapes, index, attribute table, encoding and
//! reference system. Written byte by byte, because the planted faults include shapes that a careful writer refuses.

use super::place::Place;
use super::plane::Point;
use super::tables::{Cell, Shape, Table};

const NULL: i32 = 0;
const POINT: i32 = 1;
const POLYLINE: i32 = 3;

/// The endings of a layer's files, with their content.
pub fn files(table: &Table, place: &Place) -> Vec<(&'static str, Vec<u8>)> {
    let (shp, shx) = shapes(table, place);
    vec![
        ("shp", shp),
        ("shx", shx),
        ("dbf", attributes(table)),
        ("prj", place.wkt().as_bytes().to_vec()),
        ("cpg", b"UTF-8".to_vec()),
    ]
}

fn bounds(places: &[Point]) -> [f64; 4] {
    let start = [f64::INFINITY, f64::INFINITY, f64::NEG_INFINITY, f64::NEG_INFINITY];
    places.iter().fold(start, |all, place| {
        [
            all[0].min(place[0]),
            all[1].min(place[1]),
            all[2].max(place[0]),
            all[3].max(place[1]),
        ]
    })
}

fn record(shape: &Shape, place: &Place) -> (Vec<u8>, Vec<Point>) {
    let mut out = Vec::new();
    match shape {
        Shape::Null | Shape::Empty => {
            out.extend(NULL.to_le_bytes());
            (out, Vec::new())
        }
        Shape::Point(at) => {
            let at = place.feet(*at);
            out.extend(POINT.to_le_bytes());
            out.extend(at.iter().flat_map(|number| number.to_le_bytes()));
            (out, vec![at])
        }
        Shape::Lines(lines) => {
            let places: Vec<Point> = lines.iter().flatten().map(|vertex| place.feet(*vertex)).collect();
            out.extend(POLYLINE.to_le_bytes());
            out.extend(bounds(&places).iter().flat_map(|number| number.to_le_bytes()));
            out.extend((lines.len() as i32).to_le_bytes());
            out.extend((places.len() as i32).to_le_bytes());
            let mut start = 0i32;
            for line in lines {
                out.extend(start.to_le_bytes());
                start += line.len() as i32;
            }
            out.extend(places.iter().flatten().flat_map(|number| number.to_le_bytes()));
            (out, places)
        }
    }
}

fn header(kind: i32, bytes: usize, all: [f64; 4]) -> Vec<u8> {
    let mut out = Vec::new();
    out.extend(9994i32.to_be_bytes());
    out.extend([0; 20]);
    out.extend(((bytes / 2) as i32).to_be_bytes());
    out.extend(1000i32.to_le_bytes());
    out.extend(kind.to_le_bytes());
    out.extend(all.iter().flat_map(|number| number.to_le_bytes()));
    out.extend([0; 32]);
    out
}

fn shapes(table: &Table, place: &Place) -> (Vec<u8>, Vec<u8>) {
    let kind = if matches!(table.shapes[0], Shape::Point(_)) {
        POINT
    } else {
        POLYLINE
    };
    let records: Vec<(Vec<u8>, Vec<Point>)> = table.shapes.iter().map(|shape| record(shape, place)).collect();
    let all = bounds(
        &records
            .iter()
            .flat_map(|(_, places)| places.iter().copied())
            .collect::<Vec<_>>(),
    );
    let bytes: usize = records.iter().map(|(content, _)| content.len() + 8).sum();
    let mut shp = header(kind, 100 + bytes, all);
    let mut shx = header(kind, 100 + 8 * records.len(), all);
    for (index, (content, _)) in records.iter().enumerate() {
        let words = ((content.len() / 2) as i32).to_be_bytes();
        shx.extend(((shp.len() / 2) as i32).to_be_bytes());
        shx.extend(words);
        shp.extend((index as i32 + 1).to_be_bytes());
        shp.extend(words);
        shp.extend(content);
    }
    (shp, shx)
}

fn field_bytes(cell: &Cell, width: usize, decimals: usize) -> Vec<u8> {
    let (words, to_the_right) = match cell {
        Cell::Null => (String::new(), true),
        Cell::Whole(number) => (number.to_string(), true),
        Cell::Real(number) => (format!("{number:.decimals$}"), true),
        Cell::Text(words) => (words.clone(), false),
    };
    assert!(words.len() <= width, "{words} is wider than its field");
    let blanks = vec![b' '; width - words.len()];
    if to_the_right {
        [blanks, words.into_bytes()].concat()
    } else {
        [words.into_bytes(), blanks].concat()
    }
}

fn attributes(table: &Table) -> Vec<u8> {
    let rows = table.shapes.len();
    let row_bytes = 1 + table
        .columns
        .iter()
        .map(|column| usize::from(column.field.width))
        .sum::<usize>();
    let mut out = vec![3, 125, 6, 1];
    out.extend((rows as u32).to_le_bytes());
    out.extend(((33 + 32 * table.columns.len()) as u16).to_le_bytes());
    out.extend((row_bytes as u16).to_le_bytes());
    out.extend([0; 20]);
    for column in &table.columns {
        let mut name = column.us_name.as_bytes().to_vec();
        name.resize(11, 0);
        out.extend(name);
        out.push(column.field.kind);
        out.extend([0; 4]);
        out.extend([column.field.width, column.field.decimals]);
        out.extend([0; 14]);
    }
    out.push(13);
    for row in 0..rows {
        out.push(b' ');
        for column in &table.columns {
            out.extend(field_bytes(
                &column.us[row],
                column.field.width.into(),
                column.field.decimals.into(),
            ));
        }
    }
    out.push(26);
    out
}
