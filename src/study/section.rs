//! One table of a study file against its definition (`tables.rs`). A key that is not there is refused with the nearest
//! spelling; one that this version does not calculate is refused by name; what is read is recorded, given or default, for the
//! report. What the keys hold is read in `values.rs`.

use std::collections::HashMap;

use toml::Value;

use super::Used;
use super::file::StudyFile;
use super::keys::{Key, Table, Takes};
use crate::finding::{Error, nearest};
use crate::units::Unit;

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

    /// The definition of a key.
    pub fn key(&self, name: &str) -> &'static Key {
        self.table
            .keys
            .iter()
            .find(|key| key.name == name)
            .expect("only keys of the definition are asked for")
    }

    /// The name a key is given under, its unit and its value.
    pub fn find(&self, name: &str) -> Option<(&'a str, Option<Unit>, &'a Value)> {
        let key = self.key(name);
        self.given
            .iter()
            .find_map(|(given, value)| key.unit_of(given).ok().map(|unit| (given.as_str(), unit, value)))
    }

    /// As [`Section::find`], and records what is used.
    pub fn take(&self, name: &str) -> Option<(&'a str, Option<Unit>, &'a Value)> {
        let found = self.find(name);
        let (key, value) = match found {
            Some((given, _, value)) => (given.to_string(), value.to_string()),
            None => (name.to_string(), self.key(name).default.to_string()),
        };
        if found.is_some() || !value.is_empty() {
            self.file.record(Used {
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
        self.file.default_is(name, value);
    }

    /// An error about a value of another type than the key takes.
    pub fn wrong_type(&self, given: &str, value: &Value, wanted: &str) -> Error {
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

    /// The table as it is called in a sentence.
    pub fn shown_title(&self) -> &str {
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

/// Words in back quotes, for a sentence.
pub(super) fn quoted(words: &[String]) -> String {
    let words: Vec<String> = words.iter().map(|word| format!("`{word}`")).collect();
    words.join(", ")
}
