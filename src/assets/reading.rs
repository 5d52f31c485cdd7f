//! What comes of reading columns: the assets, the user's names for them, and a record of what was taken for what.

use super::{Assets, Names};
use crate::finding::FeatureRef;
use crate::units::Unit;

/// How a column's unit is known.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum UnitFrom {
    /// The study states it.
    Study,
    /// The column's name ends in it.
    Name,
    /// The column's values fit no other.
    Values,
}

impl UnitFrom {
    /// In words, for the report.
    pub fn words(self) -> &'static str {
        match self {
            UnitFrom::Study => "stated in the study",
            UnitFrom::Name => "from the column's name",
            UnitFrom::Values => "from the column's values",
        }
    }
}

/// The unit that a column was read in.
#[derive(Clone, Debug, PartialEq)]
pub struct UnitUsed {
    /// Index of the layer.
    pub layer: u16,
    /// The study's key, for example `diameter`.
    pub key: &'static str,
    /// The column's name.
    pub column: String,
    /// The unit.
    pub unit: Unit,
    /// How it is known.
    pub from: UnitFrom,
}

/// Fillers in a column: values that stand for "not known", recognised by what the column means.
#[derive(Clone, Debug, PartialEq)]
pub struct Fillers {
    /// Index of the layer.
    pub layer: u16,
    /// The study's key, for example `diameter`.
    pub key: &'static str,
    /// The filler as it stands in the file; `(empty)` for null and blank.
    pub filler: String,
    /// In how many rows.
    pub count: u32,
}

/// Rows that a rule leaves out.
#[derive(Clone, Debug, PartialEq)]
pub struct LeftOut {
    /// The rule in words, for example `STATUS is ABANDONED`.
    pub rule: String,
    /// The features.
    pub features: Vec<FeatureRef>,
}

/// Everything that comes of reading columns.
#[derive(Clone, Debug)]
pub struct Reading {
    /// What the map says, in SI.
    pub assets: Assets,
    /// The user's ids.
    pub names: Names,
    /// The unit of every column that has one.
    pub units: Vec<UnitUsed>,
    /// Fillers, by column.
    pub fillers: Vec<Fillers>,
    /// Rows of any layer that a rule leaves out.
    pub left_out: Vec<LeftOut>,
}
