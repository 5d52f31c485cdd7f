//! What the keys of a study file are: their names, what they take, and the units that they may end in.

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
    pub fn unit_of(&self, given: &str) -> Result<Option<Unit>, ()> {
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
