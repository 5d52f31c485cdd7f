//! Rows of a result table: SI values in, cells in the written units out.

use crate::layers::result_columns::ResultColumn;
use crate::layers::{Cell, Field, Table};
use crate::units::{Unit, UnitSystem};

/// One value of a row, in SI.
pub enum Entry {
    /// Nothing.
    Blank,
    /// Words.
    Text(String),
    /// A count.
    Whole(i64),
    /// A number in the SI unit of its column.
    Number(f64),
}

impl From<&str> for Entry {
    fn from(words: &str) -> Self {
        Entry::Text(words.to_string())
    }
}

impl From<String> for Entry {
    fn from(words: String) -> Self {
        Entry::Text(words)
    }
}

impl From<f64> for Entry {
    fn from(value: f64) -> Self {
        if value.is_finite() {
            Entry::Number(value)
        } else {
            Entry::Blank
        }
    }
}

impl<T: Into<Entry>> From<Option<T>> for Entry {
    fn from(value: Option<T>) -> Self {
        value.map_or(Entry::Blank, Into::into)
    }
}

/// A table under construction.
pub struct Rows {
    units: Vec<Unit>,
    table: Table,
}

impl Rows {
    /// A table with these columns and room for `rows` rows.
    pub fn new(columns: &[ResultColumn], system: UnitSystem, rows: usize) -> Rows {
        let field = |column: &ResultColumn| Field {
            name: column.name(system),
            holds: column.holds,
        };
        Rows {
            units: columns
                .iter()
                .map(|column| Unit::written(column.quantity, system))
                .collect(),
            table: Table {
                fields: columns.iter().map(field).collect(),
                columns: columns.iter().map(|_| Vec::with_capacity(rows)).collect(),
            },
        }
    }

    /// Adds a row: one entry a column.
    pub fn push<const N: usize>(&mut self, entries: [Entry; N]) {
        assert_eq!(N, self.units.len(), "one entry a column");
        for ((entry, unit), column) in entries.into_iter().zip(&self.units).zip(&mut self.table.columns) {
            column.push(match entry {
                Entry::Blank => Cell::Null,
                Entry::Text(words) => Cell::Text(words.into_boxed_str()),
                Entry::Whole(count) => Cell::Whole(count),
                Entry::Number(value) => Cell::Real(unit.from_si(value)),
            });
        }
    }

    /// Adds a row with nothing in it.
    pub fn push_blank(&mut self) {
        self.table.columns.iter_mut().for_each(|column| column.push(Cell::Null));
    }

    /// The table, whole.
    pub fn into_table(self) -> Table {
        self.table
    }

    /// The table without those of these columns that are blank in every row: a law that no main follows has no column.
    pub fn into_table_without_blank(mut self, stems: &[&str], columns: &[ResultColumn]) -> Table {
        for at in (0..columns.len()).rev().filter(|at| stems.contains(&columns[*at].stem)) {
            if self.table.columns[at].iter().all(|cell| *cell == Cell::Null) {
                self.table.columns.remove(at);
                self.table.fields.remove(at);
            }
        }
        self.table
    }
}
