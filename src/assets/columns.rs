//! Columns of numbers: in which unit they stand, and what each cell says.
//!
//! A unit is the one the study states; else the one that the column's name ends in; else, for diameters and lengths, the
//! only one that the values fit. Where none of the three tells, the run stops and asks: a guessed unit is worse than none.

use std::collections::HashSet;

use super::cells::{self, Number};
use super::desk::Desk;
use super::reading::{UnitFrom, UnitUsed};
use super::sentinels::{Meaning, Spread, is_filler, is_possible};
use super::settings::{LayerColumns, UnitColumn};
use crate::finding::{Code, Error, FeatureRef, Finding, Sentence, Severity};
use crate::layers::Cell;
use crate::units::{Quantity, Unit};

/// What one cell of a column of numbers says.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum Slot {
    /// Null, blank, a word for "not known", or a filler; the text or number as it stands.
    Empty(String),
    /// Something else than a number.
    Unreadable(String),
    /// A number in SI.
    Value(f64),
}

impl Slot {
    /// The value, if there is one.
    pub fn value(&self) -> Option<f64> {
        match self {
            Slot::Value(value) => Some(*value),
            _ => None,
        }
    }
}

/// A column of numbers to be read.
pub(super) struct Wanted<'a> {
    pub layer: u16,
    /// The study's key.
    pub key: &'static str,
    pub column: &'a UnitColumn,
    pub quantity: Quantity,
    pub meaning: Meaning,
    /// Which rows take part: only these are counted and judged.
    pub taking_part: &'a [bool],
}

/// A column that was read, and the unit it stands in.
pub(super) struct Slots {
    pub slots: Vec<Slot>,
    pub unit: Unit,
    pub unit_from: UnitFrom,
}

impl<'a> Desk<'a> {
    /// Reads a column of numbers. `by_values` tells the unit from the numbers as they stand in the file (without units of
    /// their own), where the column's meaning allows that.
    pub fn read_numbers(
        &mut self,
        wanted: &Wanted<'_>,
        by_values: impl Fn(&[Option<f64>]) -> Option<Unit>,
    ) -> Result<Slots, Error> {
        let column = self.column(wanted.layer, wanted.key, &wanted.column.column)?;
        let read: Vec<Number> = column
            .cells
            .iter()
            .map(|cell| cells::number(cell, wanted.quantity))
            .collect();
        let bare = bare_numbers(&read, wanted);
        let (unit, unit_from) = self.unit_of(wanted, &column.name, &bare, by_values)?;
        let spread = Spread::of(bare.iter().flatten().copied());
        let mut slots = Vec::with_capacity(read.len());
        let mut unreadable = Vec::new();
        for (row, number) in read.into_iter().enumerate() {
            let slot = match number {
                Number::Empty(text) => Slot::Empty(text),
                Number::Unreadable(text) => Slot::Unreadable(text),
                Number::Value(value, own) if is_filler(wanted.meaning, value, spread) && own.is_none() => {
                    Slot::Empty(value.to_string())
                }
                Number::Value(value, own) => match own.unwrap_or(unit).to_si(value) {
                    si if is_possible(wanted.meaning, si) => Slot::Value(si),
                    _ => Slot::Unreadable(value.to_string()),
                },
            };
            if wanted.taking_part[row] {
                match &slot {
                    Slot::Empty(text) => self.count_filler(wanted.layer, wanted.key, text),
                    Slot::Unreadable(text) => unreadable.push(unreadable_finding(wanted, row, &column.name, text)),
                    Slot::Value(_) => {}
                }
            }
            slots.push(slot);
        }
        let name = &column.name;
        self.report(unreadable, |count| {
            format!("{count} rows hold something in `{name}` that cannot be").into()
        });
        self.units.push(UnitUsed {
            layer: wanted.layer,
            key: wanted.key,
            column: column.name.clone(),
            unit,
            from: unit_from,
        });
        Ok(Slots { slots, unit, unit_from })
    }

    /// Reads a column of numbers without a unit.
    pub fn read_plain(
        &mut self,
        layer: u16,
        key: &'static str,
        name: &str,
        meaning: Meaning,
        taking_part: &[bool],
    ) -> Result<Vec<Slot>, Error> {
        let column = UnitColumn {
            column: name.to_string(),
            unit: Unit::all(Quantity::Plain).next(),
        };
        let wanted = Wanted {
            layer,
            key,
            column: &column,
            quantity: Quantity::Plain,
            meaning,
            taking_part,
        };
        let read = self.read_numbers(&wanted, |_| None)?;
        self.units.pop();
        Ok(read.slots)
    }

    fn unit_of(
        &self,
        wanted: &Wanted<'_>,
        name: &str,
        bare: &[Option<f64>],
        by_values: impl Fn(&[Option<f64>]) -> Option<Unit>,
    ) -> Result<(Unit, UnitFrom), Error> {
        if let Some(unit) = wanted.column.unit {
            return Ok((unit, UnitFrom::Study));
        }
        if let Some(unit) = unit_in_name(name, wanted.quantity) {
            return Ok((unit, UnitFrom::Name));
        }
        if let Some(unit) = by_values(bare) {
            return Ok((unit, UnitFrom::Values));
        }
        let usual = Unit::all(wanted.quantity).next().expect("every quantity has a unit");
        if bare.iter().all(Option::is_none) {
            return Ok((usual, UnitFrom::Values));
        }
        let units: Vec<&str> = Unit::all(wanted.quantity).map(|unit| unit.name).collect();
        Err(Error::input(
            &self.layer(wanted.layer).source.path,
            format!(
                "the unit of column `{name}` ({}) is not stated and cannot be told from its name",
                wanted.key
            ),
            format!(
                "Write `{} = {{ column = \"{name}\", unit = \"{}\" }}` in the study; units known here: {}.",
                wanted.key,
                usual.name,
                units.join(", ")
            ),
        ))
    }
}

/// The numbers of rows that take part and carry no unit of their own, as they stand in the file.
fn bare_numbers(read: &[Number], wanted: &Wanted<'_>) -> Vec<Option<f64>> {
    let rows = read.iter().zip(wanted.taking_part);
    rows.map(|(number, takes_part)| match number {
        Number::Value(value, None) if *takes_part => Some(*value),
        _ => None,
    })
    .collect()
}

fn unreadable_finding(wanted: &Wanted<'_>, row: usize, column: &str, text: &str) -> Finding {
    let feature = FeatureRef {
        layer: wanted.layer,
        row: row as u32,
    };
    let said = Sentence::new()
        .feature(feature)
        .text(format!(" has `{text}` in `{column}` ({}), which cannot be", wanted.key));
    Finding::new(Code::ValueUnreadable, said).on(feature)
}

/// The unit that a column's name ends in: `diam_mm`, `DIA_IN`, `Elev (ft)`, `needFlowGpm`.
pub(super) fn unit_in_name(name: &str, quantity: Quantity) -> Option<Unit> {
    let mut words: Vec<String> = vec![String::new()];
    let mut before_is_lower = false;
    for letter in name.chars() {
        if !letter.is_alphanumeric() && letter != '/' {
            words.push(String::new());
        } else {
            if before_is_lower && letter.is_uppercase() {
                words.push(String::new());
            }
            words.last_mut().expect("never empty").push(letter);
        }
        before_is_lower = letter.is_lowercase();
    }
    let mut words = words.into_iter().filter(|word| !word.is_empty());
    let first = words.next()?;
    let Some(last) = words.next_back() else {
        return unit_run_on(&first, quantity);
    };
    let last = last.to_lowercase();
    let usual = match last.as_str() {
        "inch" | "inches" => "in",
        "feet" | "foot" => "ft",
        "metres" | "meters" | "metre" | "meter" => "m",
        "ls" | "lsec" => "lps",
        "lmin" => "lpm",
        "cms" => "m3s",
        "cmh" => "m3h",
        "cmd" => "m3d",
        "usgpm" => "gpm",
        word => word,
    };
    Unit::parse(usual, quantity)
}

/// Units that a name may end in without a mark before them (`ELEVFT`, `DEMGPM`): those that no other word is likely to end in.
const RUN_ON: &[&str] = &["mm", "ft", "gpm", "gpd", "mgd", "lps", "mld", "cfs"];

/// The unit that a name of one word ends in.
fn unit_run_on(name: &str, quantity: Quantity) -> Option<Unit> {
    let lower = name.to_lowercase();
    let fits = |suffix: &&&str| lower.len() > suffix.len() && lower.ends_with(**suffix);
    RUN_ON
        .iter()
        .filter(fits)
        .find_map(|suffix| Unit::parse(suffix, quantity))
}

/// Nominal sizes of mains in mm: those of iron, steel and asbestos cement (EN 545, EN 512), and the outside diameters that
/// plastic is named by (ISO 4065).
const SIZES_MM: &[u32] = &[
    20, 25, 32, 40, 50, 60, 63, 65, 75, 80, 90, 100, 110, 125, 140, 150, 160, 175, 180, 200, 225, 250, 280, 300, 315,
    350, 355, 375, 400, 450, 500, 525, 560, 600, 630, 675, 700, 710, 750, 800, 900, 1000, 1050, 1100, 1200, 1350, 1400,
    1500, 1600, 1800, 2000, 2200, 2400,
];
/// Nominal sizes of mains in quarter inches: those of iron, steel and plastic in inches (common practice, no one source).
const SIZES_QUARTER_IN: &[u32] = &[
    3, 4, 5, 6, 8, 9, 10, 12, 16, 20, 24, 28, 32, 36, 40, 48, 56, 60, 64, 72, 80, 84, 96, 108, 120, 132, 144, 168, 192,
    216, 240, 264, 288, 336, 384,
];

/// Whether a number is a nominal size in mm.
pub(super) fn is_size_mm(value: f64) -> bool {
    SIZES_MM.iter().any(|size| f64::from(*size) == value)
}

/// Whether a number is a nominal size in inches.
pub(super) fn is_size_in(value: f64) -> bool {
    SIZES_QUARTER_IN.iter().any(|size| f64::from(*size) / 4.0 == value)
}

/// The unit that diameters as they stand in a file fit, and no other: nominal sizes in mm or in inches, or metres.
///
/// Three of four must be sizes of the unit, and their middle must be one that a network is made of: 60 mm to 1.5 m.
pub(super) fn diameter_unit(values: &[Option<f64>]) -> Option<Unit> {
    let mut usable: Vec<f64> = values
        .iter()
        .flatten()
        .copied()
        .filter(|value| !is_filler(Meaning::Diameter, *value, None) && *value > 0.0)
        .collect();
    if usable.is_empty() {
        return None;
    }
    usable.sort_by(f64::total_cmp);
    let middle = usable[usable.len() / 2];
    let fits = |name: &str, is_size: &dyn Fn(f64) -> bool| {
        let unit = Unit::parse(name, Quantity::Diameter).expect("a unit of diameters");
        let share = usable.iter().filter(|value| is_size(**value)).count() as f64 / usable.len() as f64;
        let in_range = (0.06..=1.5).contains(&unit.to_si(middle));
        (share >= 0.75 && in_range).then_some(unit)
    };
    let mm = fits("mm", &is_size_mm);
    let inches = fits("in", &is_size_in);
    let metres = fits("m", &|value| is_size_mm((value * 1e3).round()) && value < 3.0);
    let fitting: Vec<Unit> = [mm, inches, metres].into_iter().flatten().collect();
    match fitting.as_slice() {
        [one] => Some(*one),
        _ => None,
    }
}

/// Fewer diameters than this say nothing about their unit by being impossible.
const FEWEST_FOR_A_UNIT: usize = 8;

/// How a layer's diameters contradict the unit they were read in, if they do.
pub(super) fn doubtful_diameter_unit(
    layer: u16,
    bare: &[Option<f64>],
    column: &str,
    unit: Unit,
    from: UnitFrom,
) -> Option<Finding> {
    let better = diameter_unit(bare).filter(|better| *better != unit);
    let mut usable: Vec<(f64, usize)> = bare
        .iter()
        .enumerate()
        .filter_map(|(row, value)| value.map(|value| (value, row)))
        .filter(|(value, _)| *value > 0.0 && !is_filler(Meaning::Diameter, *value, None))
        .collect();
    usable.sort_by(|a, b| a.0.total_cmp(&b.0));
    let (middle, row) = *usable.get(usable.len() / 2)?;
    // In a layer of a few rows an odd one is a fault of its own, found row by row.
    let out_of_range = usable.len() >= FEWEST_FOR_A_UNIT && !(0.02..=2.0).contains(&unit.to_si(middle));
    // A column of 300 to 600 fits mm only; one of 12 to 48 may be inches or small plastic in mm: only what is both
    // better elsewhere and worse here is doubted.
    let sizes_here = match unit.name {
        "mm" => usable.iter().filter(|(value, _)| is_size_mm(*value)).count(),
        "in" => usable.iter().filter(|(value, _)| is_size_in(*value)).count(),
        _ => 0,
    };
    let mostly_sizes = sizes_here * 2 > usable.len();
    if !out_of_range && (better.is_none() || mostly_sizes) {
        return None;
    }
    let feature = FeatureRef { layer, row: row as u32 };
    let instead = better.map_or(String::new(), |better| format!("; they would fit `{better}`"));
    let said = Sentence::new().text(format!(
        "the diameters in `{column}` were read as `{unit}` ({}), and do not fit it: the middle one is {middle}{instead}",
        from.words()
    ));
    Some(
        Finding::new(Code::DiameterUnitWrong, said)
            .severity(Severity::Serious)
            .on(feature),
    )
}

/// Names of the columns that every layer may be read by.
pub(super) fn common(wanted: &LayerColumns) -> Vec<String> {
    let named = [&wanted.id, &wanted.zone, &wanted.status]
        .into_iter()
        .flatten()
        .cloned();
    named
        .chain(wanted.leave_out.iter().map(|rule| rule.column.clone()))
        .collect()
}

/// Values that mark rows to be left out, ready to compare.
pub(super) fn as_compared(values: &[String]) -> HashSet<String> {
    values.iter().map(|value| compared(value)).collect()
}

/// A cell's text as it is compared: without regard to case and to blanks at the ends; null is an empty text.
pub(super) fn compared_cell(cell: &Cell) -> String {
    match cell {
        Cell::Null => String::new(),
        Cell::Text(text) => compared(text),
        other => cells::text(other).map_or(String::new(), |text| compared(&text)),
    }
}

fn compared(text: &str) -> String {
    text.trim().to_lowercase()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn unit(values: &[f64]) -> Option<&'static str> {
        let values: Vec<Option<f64>> = values.iter().copied().map(Some).collect();
        diameter_unit(&values).map(|unit| unit.name)
    }

    #[test]
    fn the_unit_is_told_by_the_name() {
        let named = |name, quantity| unit_in_name(name, quantity).map(|unit| unit.name);
        assert_eq!(named("diam_mm", Quantity::Diameter), Some("mm"));
        assert_eq!(named("DIA_IN", Quantity::Diameter), Some("in"));
        assert_eq!(named("Elev (ft)", Quantity::Length), Some("ft"));
        assert_eq!(named("needFlowGpm", Quantity::Flow), Some("gpm"));
        assert_eq!(named("dem_lps", Quantity::Flow), Some("l/s"));
        assert_eq!(named("DEM_CMH", Quantity::Flow), Some("m3/h"));
        assert_eq!(named("ELEVFT", Quantity::Length), Some("ft"));
        assert_eq!(named("DIAMMM", Quantity::Diameter), Some("mm"));
        assert_eq!(named("MAIN", Quantity::Diameter), None);
        assert_eq!(named("diameter", Quantity::Diameter), None);
        assert_eq!(named("m", Quantity::Length), None);
    }

    #[test]
    fn the_unit_is_told_by_nominal_sizes() {
        assert_eq!(unit(&[100.0, 150.0, 150.0, 200.0, 300.0, 0.0, 999.0]), Some("mm"));
        assert_eq!(unit(&[6.0, 8.0, 8.0, 12.0, 2.25, 99.0]), Some("in"));
        assert_eq!(unit(&[0.1, 0.15, 0.2, 0.3]), Some("m"));
        assert_eq!(unit(&[152.4, 203.2, 304.8]), None);
        assert_eq!(unit(&[0.0, 999.0]), None);
    }

    #[test]
    fn a_unit_that_the_sizes_contradict_is_doubted() {
        let doubted = |values: &[f64], name| {
            let bare: Vec<Option<f64>> = values.iter().copied().map(Some).collect();
            let unit = Unit::parse(name, Quantity::Diameter).unwrap();
            doubtful_diameter_unit(0, &bare, "d", unit, UnitFrom::Study).is_some()
        };
        assert!(doubted(&[6.0, 8.0, 12.0], "mm"));
        assert!(doubted(&[100.0, 150.0, 200.0], "in"));
        assert!(doubted(&[0.1, 0.15], "mm"));
        assert!(!doubted(&[100.0, 150.0, 200.0], "mm"));
        assert!(!doubted(&[6.0, 8.0, 12.0], "in"));
        assert!(!doubted(&[152.4, 203.2, 304.8], "mm"));
    }
}
