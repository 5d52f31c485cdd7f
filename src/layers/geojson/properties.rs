//! Properties: the union of all members as columns, of which only those asked for keep their cells.

use std::collections::HashMap;
use std::fmt;

use serde::de::{DeserializeSeed, Deserializer, IgnoredAny, MapAccess, Visitor};
use serde_json::value::RawValue;

use super::coordinates::Text;
use crate::layers::layer::{Cell, Column, Columns};

/// The columns found so far.
pub(super) struct Table<'a> {
    wanted: &'a Columns,
    names: Vec<String>,
    /// Cells of a column, where they are kept. A column that ends early has nulls after.
    cells: Vec<Option<Vec<Cell>>>,
    by_name: HashMap<String, usize>,
}

impl<'a> Table<'a> {
    pub fn new(wanted: &'a Columns) -> Self {
        Table {
            wanted,
            names: Vec::new(),
            cells: Vec::new(),
            by_name: HashMap::new(),
        }
    }

    /// The column of a name; a new one if it is new. Features mostly have the same members in the same order, so the
    /// place where it is expected is looked at first.
    fn place(&mut self, name: &str, expected: usize) -> usize {
        if self.names.get(expected).is_some_and(|known| known == name) {
            return expected;
        }
        if let Some(&place) = self.by_name.get(name) {
            return place;
        }
        self.names.push(name.to_string());
        self.cells.push(self.wanted.may_want(name).then(Vec::new));
        self.by_name.insert(name.to_string(), self.names.len() - 1);
        self.names.len() - 1
    }

    /// All names, and the columns wanted with one cell a row.
    pub fn finish(self, rows: usize) -> (Vec<String>, Vec<Column>) {
        let chosen = self.wanted.chosen(&self.names);
        let columns = self
            .cells
            .into_iter()
            .zip(&self.names)
            .zip(chosen)
            .filter(|(_, chosen)| *chosen)
            .filter_map(|((cells, name), _)| {
                let mut cells = cells?;
                cells.resize(rows, Cell::Null);
                Some(Column {
                    name: name.clone(),
                    cells,
                })
            })
            .collect();
        (self.names, columns)
    }
}

/// Reads the members of one feature's properties into the table.
pub(super) struct Members<'t, 'a> {
    pub table: &'t mut Table<'a>,
    pub row: usize,
}

impl<'de> DeserializeSeed<'de> for Members<'_, '_> {
    type Value = ();

    fn deserialize<D: Deserializer<'de>>(self, input: D) -> Result<(), D::Error> {
        input.deserialize_map(self)
    }
}

impl<'de> Visitor<'de> for Members<'_, '_> {
    type Value = ();

    fn expecting(&self, out: &mut fmt::Formatter) -> fmt::Result {
        out.write_str("properties as an object")
    }

    fn visit_map<A: MapAccess<'de>>(self, mut members: A) -> Result<(), A::Error> {
        let mut expected = 0;
        while let Some(name) = members.next_key_seed(Text)? {
            let place = self.table.place(&name, expected);
            expected = place + 1;
            match &mut self.table.cells[place] {
                Some(cells) => {
                    let cell = cell(members.next_value::<&RawValue>()?.get());
                    // A member given twice counts as given last.
                    cells.truncate(self.row);
                    cells.resize(self.row, Cell::Null);
                    cells.push(cell);
                }
                None => {
                    members.next_value::<IgnoredAny>()?;
                }
            }
        }
        Ok(())
    }
}

/// A value from its JSON text. Whole numbers beyond 64 bits, and arrays and objects, stay text.
fn cell(json: &str) -> Cell {
    match json.as_bytes().first() {
        Some(b'n') => Cell::Null,
        Some(b't') => Cell::Bool(true),
        Some(b'f') => Cell::Bool(false),
        Some(b'"') if !json.contains('\\') => Cell::Text(json[1..json.len() - 1].into()),
        Some(b'"') => Cell::Text(
            serde_json::from_str::<String>(json)
                .unwrap_or_else(|_| json.to_string())
                .into(),
        ),
        Some(b'-' | b'0'..=b'9') => number(json),
        _ => Cell::Text(json.into()),
    }
}

fn number(text: &str) -> Cell {
    if !text.contains(['.', 'e', 'E']) {
        return text.parse().map_or_else(|_| Cell::Text(text.into()), Cell::Whole);
    }
    match text.parse::<f64>() {
        Ok(value) if value.is_finite() => Cell::Real(value),
        _ => Cell::Text(text.into()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn values_keep_their_kind_and_digits() {
        for (json, expected) in [
            ("null", Cell::Null),
            ("true", Cell::Bool(true)),
            ("9007199254740993", Cell::Whole(9_007_199_254_740_993)),
            ("-0", Cell::Whole(0)),
            ("9223372036854775808", Cell::Text("9223372036854775808".into())),
            ("1.10", Cell::Real(1.1)),
            ("1e400", Cell::Text("1e400".into())),
            (r#""a\"b""#, Cell::Text("a\"b".into())),
            (r#""""#, Cell::Text("".into())),
            (r#"{"a": 1}"#, Cell::Text(r#"{"a": 1}"#.into())),
        ] {
            assert_eq!(cell(json), expected);
        }
    }
}
