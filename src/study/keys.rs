//! The key reader: every table of a study file is read through it, and through nothing else.
//!
//! A key is looked up in the table's definition (`tables.rs`). One that is not there is refused with the nearest spelling; one
//! that this version does not calculate is refused by name; what is read is recorded, given or default, for the report.

use std::cell::RefCell;
use std::collections::HashMap;
use std::path::Path;

use toml::Value;
use toml::de::{DeTable, DeValue};

use super::Used;
use crate::assets::{LeaveOut, NumberOrColumn, SourceAt, UnitColumn};
use crate::finding::{Error, nearest};
use crate::units::{Quantity, Unit};

/// What a key takes.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Takes {
    /// Any text.
    Text,
    /// The path of a file.
    File,
    /// One of a few words.
    Choice(&'static [&'static str]),
    /// The name of a column.
    Column,
    /// A column of numbers with a unit: its name, or `{ column = "...", unit = "..." }`.
    UnitColumn(Quantity),
    /// A number; the key ends in its unit.
    Number(Quantity),
    /// A number, the key ending in its unit, for every row; or a column.
    NumberOrColumn(Quantity),
    /// A number without a unit.
    Plain,
    /// A table of names and numbers without a unit.
    PlainByName,
    /// A table of names and numbers; the key ends in their unit.
    NumberByName(Quantity),
    /// A table of columns and the values that mark rows.
    Marks,
    /// An id or a point `[x, y]`.
    Place,
    /// A table with keys of its own.
    Table(&'static Table),
    /// Several tables, or a single one, with keys of their own.
    Tables(&'static Table),
    /// Not calculated by this version: refused, with what it would be.
    NotYet(&'static str),
}

/// A key, for the reader and for the docs.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Key {
    /// Its name; without the unit where it takes a [`Takes::Number`].
    pub name: &'static str,
    /// What it takes.
    pub takes: Takes,
    /// What holds when it is not given, in words; empty when nothing does.
    pub default: &'static str,
    /// What it means, in a line.
    pub means: &'static str,
}

/// A table of a study file.
#[derive(Debug, PartialEq)]
pub(super) struct Table {
    /// What it is for, in a line or two.
    pub means: &'static str,
    /// Its keys.
    pub keys: &'static [Key],
}

impl Key {
    /// The quantity that the key's suffix is a unit of, if it takes one.
    pub fn suffix_of(&self) -> Option<Quantity> {
        match self.takes {
            Takes::Number(quantity) | Takes::NumberOrColumn(quantity) | Takes::NumberByName(quantity) => Some(quantity),
            _ => None,
        }
    }

    /// Every name it can be written under.
    pub fn spellings(&self) -> Vec<String> {
        let Some(quantity) = self.suffix_of() else {
            return vec![self.name.to_string()];
        };
        let mut suffixes: Vec<&str> = Unit::all(quantity).map(|unit| unit.suffix).collect();
        suffixes.dedup();
        let mut all: Vec<String> = suffixes
            .iter()
            .map(|suffix| format!("{}_{suffix}", self.name))
            .collect();
        if matches!(self.takes, Takes::NumberOrColumn(_)) {
            all.push(self.name.to_string());
        }
        all
    }

    /// The unit that a name of this key ends in; `Err` when the name is not one of this key's.
    fn unit_of(&self, given: &str) -> Result<Option<Unit>, ()> {
        if given == self.name && !matches!(self.takes, Takes::Number(_) | Takes::NumberByName(_)) {
            return Ok(None);
        }
        let suffix = given
            .strip_prefix(self.name)
            .and_then(|rest| rest.strip_prefix('_'))
            .ok_or(())?;
        // What is refused is refused in every unit.
        if matches!(self.takes, Takes::NotYet(_)) {
            return Ok(None);
        }
        let quantity = self.suffix_of().ok_or(())?;
        Unit::all(quantity)
            .find(|unit| unit.suffix == suffix)
            .map(Some)
            .ok_or(())
    }
}

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

    /// What was read, in order.
    pub fn into_used(self) -> Vec<Used> {
        self.used.into_inner()
    }

    fn error(&self, place: &str, what: String, todo: impl Into<String>) -> Error {
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

/// One table of the file, with its definition. Making one checks every key it holds.
pub(super) struct Section<'a> {
    file: &'a StudyFile<'a>,
    table: &'static Table,
    /// As it is called in sentences and in the record: `[mains]`; empty for the top of the file.
    title: String,
    place: String,
    given: &'a toml::Table,
}

impl<'a> Section<'a> {
    /// The top of the file.
    pub fn top(file: &'a StudyFile<'a>, table: &'static Table, given: &'a toml::Table) -> Result<Section<'a>, Error> {
        Section {
            file,
            table,
            title: String::new(),
            place: String::new(),
            given,
        }
        .checked()
    }

    /// A table under a key of this one, if it is given; several of them stand in order.
    pub fn sections(&self, name: &str) -> Result<Vec<Section<'a>>, Error> {
        let key = self.key(name);
        let (table, several) = match key.takes {
            Takes::Table(table) => (table, false),
            Takes::Tables(table) => (table, true),
            _ => unreachable!("{name} holds a table"),
        };
        let header = if self.title.is_empty() {
            name.to_string()
        } else {
            format!("{}.{name}", bare(&self.title))
        };
        let open = |given: &'a toml::Table, title: String, place: String| {
            Section {
                file: self.file,
                table,
                title,
                place,
                given,
            }
            .checked()
        };
        match self.given.get(name) {
            None => Ok(Vec::new()),
            Some(Value::Table(given)) => Ok(vec![open(
                given,
                format!("[{header}]"),
                format!("{}{name}/", self.place),
            )?]),
            Some(Value::Array(items)) if several => {
                let mut sections = Vec::new();
                for (index, item) in items.iter().enumerate() {
                    let Value::Table(given) = item else {
                        return Err(self.wrong_type(name, item, "a table"));
                    };
                    let title = if items.len() == 1 {
                        format!("[[{header}]]")
                    } else {
                        format!("[[{header}]] {}", index + 1)
                    };
                    sections.push(open(given, title, format!("{}{name}/{index}/", self.place))?);
                }
                Ok(sections)
            }
            Some(Value::Array(items)) if items.len() > 1 => Err(self.error(
                name,
                format!("there are {} tables `{header}`", items.len()),
                format!("There can be only one: write `[{header}]` once."),
            )),
            Some(Value::Array(items)) => match items.first() {
                Some(Value::Table(given)) => Ok(vec![open(
                    given,
                    format!("[{header}]"),
                    format!("{}{name}/0/", self.place),
                )?]),
                _ => Err(self.wrong_type(name, &self.given[name], "a table")),
            },
            Some(other) => Err(self.wrong_type(name, other, "a table")),
        }
    }

    /// The single table under a key; an empty one, so that its defaults hold and are recorded, when it is not given.
    pub fn section(&self, name: &str, empty: &'a toml::Table) -> Result<Section<'a>, Error> {
        if let Some(section) = self.sections(name)?.pop() {
            return Ok(section);
        }
        let Takes::Table(table) = self.key(name).takes else {
            unreachable!("{name} holds a single table")
        };
        Ok(Section {
            file: self.file,
            table,
            title: format!("[{name}]"),
            place: format!("{}{name}/", self.place),
            given: empty,
        })
    }

    /// Refuses keys that are not known, not calculated yet, without their unit, or given twice.
    fn checked(self) -> Result<Section<'a>, Error> {
        let mut seen: HashMap<&str, &str> = HashMap::new();
        for name in self.given.keys() {
            let Some(key) = self.table.keys.iter().find(|key| key.unit_of(name).is_ok()) else {
                return Err(self.unknown(name));
            };
            if let Takes::NotYet(what) = key.takes {
                let what = format!(
                    "{} asks for {what}, which this version does not calculate",
                    self.called(name)
                );
                return Err(self.error(
                    name,
                    what,
                    "Leave the key out; nothing else in the study depends on it.",
                ));
            }
            if let Some(first) = seen.insert(key.name, name) {
                let what = format!(
                    "`{first}` and `{name}` in {} are one setting in two units",
                    self.shown_title()
                );
                return Err(self.error(name, what, "Keep one of the two."));
            }
        }
        Ok(self)
    }

    fn unknown(&self, name: &str) -> Error {
        let what = format!("there is no key `{name}` in {}", self.shown_title());
        if let Some(key) = self
            .table
            .keys
            .iter()
            .find(|key| key.name == name || is_with_some_suffix(key, name))
        {
            let what = format!("`{name}` in {} does not end in a unit that fits", self.shown_title());
            return self.error(name, what, format!("Write one of: {}.", quoted(&key.spellings())));
        }
        let spellings: Vec<String> = self.table.keys.iter().flat_map(Key::spellings).collect();
        let todo = match nearest(name, spellings.iter().map(String::as_str)) {
            Some(nearest) => format!("The nearest is `{nearest}`."),
            None => {
                let names: Vec<String> = self.table.keys.iter().map(|key| key.spellings()[0].clone()).collect();
                format!("Keys here: {}.", quoted(&names))
            }
        };
        self.error(name, what, todo)
    }

    /// Whether a key is given, in whatever unit.
    pub fn has(&self, name: &str) -> bool {
        self.find(name).is_some()
    }

    fn key(&self, name: &str) -> &'static Key {
        self.table
            .keys
            .iter()
            .find(|key| key.name == name)
            .expect("only keys of the definition are asked for")
    }

    /// The name a key is given under, its unit and its value.
    fn find(&self, name: &str) -> Option<(&'a str, Option<Unit>, &'a Value)> {
        let key = self.key(name);
        self.given
            .iter()
            .find_map(|(given, value)| key.unit_of(given).ok().map(|unit| (given.as_str(), unit, value)))
    }

    /// As [`Section::find`], and records what is used.
    fn take(&self, name: &str) -> Option<(&'a str, Option<Unit>, &'a Value)> {
        let found = self.find(name);
        let (key, value) = match found {
            Some((given, _, value)) => (given.to_string(), value.to_string()),
            None => (name.to_string(), self.key(name).default.to_string()),
        };
        if found.is_some() || !value.is_empty() {
            self.file.used.borrow_mut().push(Used {
                table: self.title.clone(),
                key,
                value,
                given: found.is_some(),
            });
        }
        found
    }

    /// Records what stands for a default that is not the same in every run; as the last thing read.
    pub fn default_is(&self, name: &str, value: String) {
        let mut used = self.file.used.borrow_mut();
        if let Some(last) = used.last_mut().filter(|last| last.key == name && !last.given) {
            last.value = value;
        }
    }

    /// A text.
    pub fn text(&self, name: &str) -> Result<Option<String>, Error> {
        match self.take(name) {
            None => Ok(None),
            Some((_, _, Value::String(text))) if !text.trim().is_empty() => Ok(Some(text.clone())),
            Some((given, _, Value::String(_))) => Err(self.error(
                given,
                format!("{} is empty", self.called(given)),
                "Fill it in, or leave the key out.",
            )),
            Some((given, _, other)) => Err(self.wrong_type(given, other, "a text in double quotes")),
        }
    }

    /// A text that must be given.
    pub fn needed_text(&self, name: &str, example: &str) -> Result<String, Error> {
        self.text(name)?.ok_or_else(|| self.missing(name, example))
    }

    /// Says that a key must be given.
    pub fn missing(&self, name: &str, example: &str) -> Error {
        let what = format!("{} has no `{name}`", self.shown_title());
        self.error("", what, format!("Add it, for example `{example}`."))
    }

    /// One of the words that the key takes.
    pub fn choice(&self, name: &str) -> Result<Option<&'static str>, Error> {
        let Takes::Choice(words) = self.key(name).takes else {
            unreachable!("{name} is a choice")
        };
        let Some((given, _, value)) = self.take(name) else {
            return Ok(None);
        };
        let Value::String(text) = value else {
            return Err(self.wrong_type(given, value, "a text in double quotes"));
        };
        if let Some(word) = words.iter().find(|word| *word == text) {
            return Ok(Some(word));
        }
        let words: Vec<String> = words.iter().map(|word| (*word).to_string()).collect();
        let what = format!("{} cannot be `{text}`", self.called(given));
        Err(self.error(given, what, format!("It takes one of: {}.", quoted(&words))))
    }

    /// A number without a unit, in a range.
    pub fn plain(&self, name: &str, range: std::ops::RangeInclusive<f64>) -> Result<Option<f64>, Error> {
        let Some((given, _, value)) = self.take(name) else {
            return Ok(None);
        };
        let number = self.number_of(given, value)?;
        self.in_range(given, number, "", &range, |value| value)?;
        Ok(Some(number))
    }

    /// A number in SI, from a key that ends in a unit, in a range of SI.
    pub fn number(&self, name: &str, range: std::ops::RangeInclusive<f64>) -> Result<Option<f64>, Error> {
        let Some((given, unit, value)) = self.take(name) else {
            return Ok(None);
        };
        let unit = unit.expect("checked: the key ends in a unit");
        let si = unit.to_si(self.number_of(given, value)?);
        self.in_range(given, si, unit.name, &range, |value| unit.from_si(value))?;
        Ok(Some(si))
    }

    fn in_range(
        &self,
        given: &str,
        si: f64,
        unit: &str,
        range: &std::ops::RangeInclusive<f64>,
        shown: impl Fn(f64) -> f64,
    ) -> Result<(), Error> {
        if range.contains(&si) {
            return Ok(());
        }
        let show = |value: f64| {
            format!("{} {unit}", (shown(value) * 1e4).round() / 1e4)
                .trim_end()
                .to_string()
        };
        let todo = match (range.start().is_finite(), range.end().is_finite()) {
            (true, true) => format!(
                "It must lie between {} and {}.",
                show(*range.start()),
                show(*range.end())
            ),
            (true, false) => format!("It must not be below {}.", show(*range.start())),
            _ => "It must be a finite number.".to_string(),
        };
        Err(self.error(given, format!("{} cannot be {}", self.called(given), show(si)), todo))
    }

    fn number_of(&self, given: &str, value: &Value) -> Result<f64, Error> {
        match value {
            Value::Integer(number) => Ok(*number as f64),
            Value::Float(number) if number.is_finite() => Ok(*number),
            other => Err(self.wrong_type(given, other, "a number without quotes")),
        }
    }

    /// A column of numbers.
    pub fn unit_column(&self, name: &str) -> Result<Option<UnitColumn>, Error> {
        let Takes::UnitColumn(quantity) = self.key(name).takes else {
            unreachable!("{name} is a column with a unit")
        };
        let Some((given, _, value)) = self.take(name) else {
            return Ok(None);
        };
        self.unit_column_of(given, value, quantity, None).map(Some)
    }

    /// A number for every row, in SI, or a column.
    pub fn number_or_column(&self, name: &str) -> Result<Option<NumberOrColumn>, Error> {
        let Takes::NumberOrColumn(quantity) = self.key(name).takes else {
            unreachable!("{name} is a number or a column")
        };
        let Some((given, unit, value)) = self.take(name) else {
            return Ok(None);
        };
        match (value, unit) {
            (Value::Integer(_) | Value::Float(_), Some(unit)) => {
                Ok(Some(NumberOrColumn::Number(unit.to_si(self.number_of(given, value)?))))
            }
            (Value::Integer(_) | Value::Float(_), None) => {
                let what = format!("{} does not end in a unit", self.called(given));
                Err(self.error(
                    given,
                    what,
                    format!("Write one of: {}.", quoted(&self.key(name).spellings())),
                ))
            }
            _ => self
                .unit_column_of(given, value, quantity, unit)
                .map(|column| Some(NumberOrColumn::Column(column))),
        }
    }

    fn unit_column_of(
        &self,
        given: &str,
        value: &Value,
        quantity: Quantity,
        unit: Option<Unit>,
    ) -> Result<UnitColumn, Error> {
        let table = match value {
            Value::String(column) => {
                return Ok(UnitColumn {
                    column: column.clone(),
                    unit,
                });
            }
            Value::Table(table) => table,
            other => {
                return Err(self.wrong_type(
                    given,
                    other,
                    "a column's name, or `{ column = \"...\", unit = \"...\" }`",
                ));
            }
        };
        if let Some(other) = table.keys().find(|key| !["column", "unit"].contains(&key.as_str())) {
            let what = format!("there is no key `{other}` in {}", self.called(given));
            return Err(self.error(given, what, "Keys here: `column` and `unit`."));
        }
        let Some(Value::String(column)) = table.get("column") else {
            let what = format!("{} names no column", self.called(given));
            return Err(self.error(
                given,
                what,
                format!("Write `{given} = {{ column = \"...\", unit = \"...\" }}`."),
            ));
        };
        let unit = match table.get("unit") {
            None => unit,
            Some(Value::String(text)) => Some(self.unit(given, text, quantity)?),
            Some(other) => return Err(self.wrong_type(given, other, "a unit in double quotes")),
        };
        Ok(UnitColumn {
            column: column.clone(),
            unit,
        })
    }

    fn unit(&self, given: &str, text: &str, quantity: Quantity) -> Result<Unit, Error> {
        Unit::parse(text, quantity).ok_or_else(|| {
            let names: Vec<String> = Unit::all(quantity).map(|unit| unit.name.to_string()).collect();
            let what = format!("{} cannot be in `{text}`", self.called(given));
            self.error(given, what, format!("Units that fit: {}.", quoted(&names)))
        })
    }

    /// Names and numbers without a unit, none below zero.
    pub fn plain_by_name(&self, name: &str) -> Result<Vec<(String, f64)>, Error> {
        let Some((given, _, value)) = self.take(name) else {
            return Ok(Vec::new());
        };
        self.by_name(given, value, 0.0)
    }

    /// Names and numbers in SI.
    pub fn number_by_name(&self, name: &str) -> Result<Vec<(String, f64)>, Error> {
        let Some((given, unit, value)) = self.take(name) else {
            return Ok(Vec::new());
        };
        let unit = unit.expect("checked: the key ends in a unit");
        let named = self.by_name(given, value, f64::NEG_INFINITY)?;
        Ok(named
            .into_iter()
            .map(|(name, number)| (name, unit.to_si(number)))
            .collect())
    }

    fn by_name(&self, given: &str, value: &Value, least: f64) -> Result<Vec<(String, f64)>, Error> {
        let Value::Table(table) = value else {
            return Err(self.wrong_type(given, value, "a table such as `{ name = 1.0 }`"));
        };
        let mut named = Vec::new();
        for (name, value) in table {
            let number = self.number_of(given, value)?;
            if number < least {
                let what = format!("`{name}` in {} cannot be {number}", self.called(given));
                return Err(self.error(given, what, format!("It must not be below {least}.")));
            }
            named.push((name.clone(), number));
        }
        Ok(named)
    }

    /// Columns and the values that mark rows.
    pub fn marks(&self, name: &str) -> Result<Vec<LeaveOut>, Error> {
        let Some((given, _, value)) = self.take(name) else {
            return Ok(Vec::new());
        };
        let Value::Table(table) = value else {
            return Err(self.wrong_type(given, value, "a table such as `{ STATUS = [\"ABANDONED\"] }`"));
        };
        let text_of = |value: &Value| match value {
            Value::String(text) => Some(text.clone()),
            Value::Integer(_) | Value::Float(_) | Value::Boolean(_) => Some(value.to_string()),
            _ => None,
        };
        let mut marks = Vec::new();
        for (column, values) in table {
            let values = match values {
                Value::Array(items) => items.iter().map(text_of).collect::<Option<Vec<String>>>(),
                one => text_of(one).map(|one| vec![one]),
            };
            let Some(values) = values else {
                let what = format!("`{column}` in {} does not list values", self.called(given));
                return Err(self.error(given, what, "Write it as `{ STATUS = [\"ABANDONED\", \"REMOVED\"] }`."));
            };
            marks.push(LeaveOut {
                column: column.clone(),
                values,
            });
        }
        Ok(marks)
    }

    /// An id or a point.
    pub fn place(&self, name: &str) -> Result<Option<SourceAt>, Error> {
        let Some((given, _, value)) = self.take(name) else {
            return Ok(None);
        };
        match value {
            Value::String(id) => Ok(Some(SourceAt::Id(id.trim().to_string()))),
            Value::Integer(id) => Ok(Some(SourceAt::Id(id.to_string()))),
            Value::Array(axes) if axes.len() == 2 => Ok(Some(SourceAt::Point([
                self.number_of(given, &axes[0])?,
                self.number_of(given, &axes[1])?,
            ]))),
            other => Err(self.wrong_type(given, other, "an id in double quotes, or a point `[x, y]`")),
        }
    }

    fn wrong_type(&self, given: &str, value: &Value, wanted: &str) -> Error {
        let is = match value {
            Value::String(_) => "a text",
            Value::Integer(_) => "a whole number",
            Value::Float(number) if !number.is_finite() => "a number that is not finite",
            Value::Float(_) => "a number",
            Value::Boolean(_) => "true or false",
            Value::Datetime(_) => "a date",
            Value::Array(_) => "a list",
            Value::Table(_) => "a table",
        };
        self.error(
            given,
            format!("{} is {is}", self.called(given)),
            format!("It takes {wanted}."),
        )
    }

    /// An error about a key of this table; about the table as a whole when `given` is empty.
    pub fn error(&self, given: &str, what: String, todo: impl Into<String>) -> Error {
        let place = format!("{}{given}", self.place);
        self.file.error(place.trim_end_matches('/'), what, todo)
    }

    /// A key as it is called in a sentence.
    pub fn called(&self, given: &str) -> String {
        if self.title.is_empty() {
            format!("`{given}`")
        } else {
            format!("`{given}` in {}", self.title)
        }
    }

    fn shown_title(&self) -> &str {
        if self.title.is_empty() {
            "the top of the study"
        } else {
            &self.title
        }
    }
}

fn bare(title: &str) -> &str {
    title.trim_start_matches('[').split(']').next().unwrap_or(title)
}

/// Whether a name is a key's, with something else than one of its units at the end.
fn is_with_some_suffix(key: &Key, name: &str) -> bool {
    key.suffix_of().is_some()
        && name
            .strip_prefix(key.name)
            .is_some_and(|rest| rest.starts_with('_') && rest.len() > 1)
}

fn quoted(words: &[String]) -> String {
    let words: Vec<String> = words.iter().map(|word| format!("`{word}`")).collect();
    words.join(", ")
}
