//! The text of a study file: its values, the line that each key stands in, and what has been read of it.

use std::cell::RefCell;
use std::collections::HashMap;
use std::path::Path;

use toml::de::{DeTable, DeValue};

use super::Used;
use crate::finding::Error;

/// The study file as text and values, and what has been read of it.
pub(super) struct StudyFile<'a> {
    path: &'a Path,
    lines: HashMap<String, usize>,
    used: RefCell<Vec<Used>>,
}

impl<'a> StudyFile<'a> {
    /// Parses a study file.
    pub fn parse(path: &'a Path, text: &str) -> Result<(StudyFile<'a>, toml::Table), Error> {
        let wrong = |error: toml::de::Error| {
            let place = error.span().map(|span| {
                let before = text.get(..span.start).unwrap_or(text);
                let column = before.chars().rev().take_while(|letter| *letter != '\n').count() + 1;
                format!("line {}, column {column}: ", line_at(text, span.start))
            });
            let message = error.message().replace('\n', ", ");
            let todo =
                "A study is written in TOML: `key = value` lines under `[table]` headings, text in double quotes.";
            Error::study(path, format!("{}{message}", place.unwrap_or_default()), todo)
        };
        let values: toml::Table = text.parse().map_err(wrong)?;
        let mut lines = HashMap::new();
        let spanned = DeTable::parse(text).map_err(wrong)?;
        note_lines(text, spanned.get_ref(), "", &mut lines);
        Ok((
            StudyFile {
                path,
                lines,
                used: RefCell::new(Vec::new()),
            },
            values,
        ))
    }

    /// Records a setting that was read.
    pub fn record(&self, used: Used) {
        self.used.borrow_mut().push(used);
    }

    /// Changes the value of the setting recorded last, if it is a default of this key.
    pub fn default_is(&self, key: &str, value: String) {
        let mut used = self.used.borrow_mut();
        if let Some(last) = used.last_mut().filter(|last| last.key == key && !last.given) {
            last.value = value;
        }
    }

    /// What was read, in order.
    pub fn into_used(self) -> Vec<Used> {
        self.used.into_inner()
    }

    /// An error at a place of the file, with its line where the place is in it.
    pub fn error(&self, place: &str, what: String, todo: impl Into<String>) -> Error {
        let line = self
            .lines
            .get(place)
            .map_or(String::new(), |line| format!("line {line}: "));
        Error::study(self.path, format!("{line}{what}"), todo)
    }
}

fn line_at(text: &str, byte: usize) -> usize {
    text.as_bytes()[..byte.min(text.len())]
        .iter()
        .filter(|byte| **byte == b'\n')
        .count()
        + 1
}

/// Remembers the line of every key, by its place: `mains/0/diameter`.
fn note_lines(text: &str, table: &DeTable<'_>, place: &str, lines: &mut HashMap<String, usize>) {
    for (key, value) in table {
        let place = format!("{place}{}", key.get_ref());
        lines.insert(place.clone(), line_at(text, key.span().start));
        match value.get_ref() {
            DeValue::Table(table) => note_lines(text, table, &format!("{place}/"), lines),
            DeValue::Array(items) => {
                for (index, item) in items.iter().enumerate() {
                    if let DeValue::Table(table) = item.get_ref() {
                        note_lines(text, table, &format!("{place}/{index}/"), lines);
                    }
                }
            }
            _ => {}
        }
    }
}
