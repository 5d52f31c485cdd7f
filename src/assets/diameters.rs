//! Diameters of mains: the bore of every row, and which of them cannot be right.

use super::columns::{Slot, Slots, Wanted, diameter_unit, doubtful_diameter_unit, is_size_in, is_size_mm};
use super::desk::Desk;
use super::materials::{Material, bore_from_nominal_m};
use super::sentinels::Meaning;
use super::settings::{DiameterIs, MainsColumns};
use super::{Basis, Valued};
use crate::finding::{Code, Error, FeatureRef, Finding, Sentence, Severity};
use crate::units::{M_PER_INCH, Quantity, Unit};

/// Smallest bore that a main is made with, m: 3/4 in. Common practice, no source.
const SMALLEST_M: f64 = 0.75 * M_PER_INCH;
/// Largest bore that a main is made with, m. Common practice, no source.
const LARGEST_M: f64 = 3.0;

impl Desk<'_> {
    /// The bore of every main, where the map has one that can be used.
    pub fn diameters(
        &mut self,
        wanted: &MainsColumns,
        material: &[Option<String>],
        taking_part: &[bool],
    ) -> Result<Vec<Option<Valued<f64>>>, Error> {
        let layer = wanted.common.layer;
        let Some(column) = &wanted.diameter else {
            self.say_no_diameters(layer);
            return Ok(vec![None; taking_part.len()]);
        };
        let asked = Wanted {
            layer,
            key: "diameter",
            column,
            quantity: Quantity::Diameter,
            meaning: Meaning::Diameter,
            taking_part,
        };
        let read = self.read_numbers(&asked, diameter_unit)?;
        let bare: Vec<Option<f64>> = read
            .slots
            .iter()
            .zip(taking_part)
            .map(|(slot, takes_part)| {
                slot.value()
                    .filter(|_| *takes_part)
                    .map(|value| tidy(read.unit.from_si(value)))
            })
            .collect();
        let doubtful = doubtful_diameter_unit(layer, &bare, &column.column, read.unit, read.unit_from);
        let column_doubtful = doubtful.is_some();
        self.findings.extend(doubtful);
        // A column in the wrong unit is one fault, not a fault of each row.
        if column_doubtful {
            return Ok(self.bores_of_doubtful(layer, &read.slots, taking_part));
        }
        let odd = OddSizes::of(&bare, read.unit);
        Ok(self.bores(wanted, &read, &odd, material, taking_part))
    }

    /// Bores by row. What is missing or impossible is said.
    fn bores(
        &mut self,
        wanted: &MainsColumns,
        read: &Slots,
        odd: &Option<OddSizes>,
        material: &[Option<String>],
        taking_part: &[bool],
    ) -> Vec<Option<Valued<f64>>> {
        let layer = wanted.common.layer;
        let (mut missing, mut impossible) = (Vec::new(), Vec::new());
        let mut bores = vec![None; taking_part.len()];
        for (row, slot) in read.slots.iter().enumerate().filter(|(row, _)| taking_part[*row]) {
            let feature = FeatureRef { layer, row: row as u32 };
            let Slot::Value(value_m) = slot else {
                missing.push(missing_diameter(feature, slot));
                continue;
            };
            if let Some(finding) = impossible_diameter(feature, *value_m, read.unit, odd) {
                impossible.push(finding);
                continue;
            }
            let made_of = material.get(row).and_then(|text| Material::parse(text.as_deref()?));
            bores[row] = bore(wanted.diameter_is, made_of, *value_m);
            if bores[row].is_none() {
                missing.push(no_wall(feature, *value_m));
            }
        }
        self.say_missing(missing);
        self.report(impossible, |count| {
            format!("{count} mains have an impossible diameter").into()
        });
        bores
    }

    /// Bores by row of a column whose unit is in doubt: those that are possible.
    fn bores_of_doubtful(&mut self, layer: u16, slots: &[Slot], taking_part: &[bool]) -> Vec<Option<Valued<f64>>> {
        let mut missing = Vec::new();
        let mut bores = vec![None; taking_part.len()];
        for (row, slot) in slots.iter().enumerate().filter(|(row, _)| taking_part[*row]) {
            let Slot::Value(value_m) = slot else {
                missing.push(missing_diameter(FeatureRef { layer, row: row as u32 }, slot));
                continue;
            };
            let possible = Some(*value_m).filter(|value_m| is_possible(*value_m));
            bores[row] = possible.map(|value| Valued {
                value,
                basis: Basis::Map,
            });
        }
        self.say_missing(missing);
        bores
    }

    fn say_no_diameters(&mut self, layer: u16) {
        let name = &self.layer(layer).name;
        let said = format!("the study names no `diameter` column for {name}: the bore of every main in it is assumed");
        let finding = Finding::new(Code::DiameterMissing, said.into()).severity(Severity::Serious);
        self.findings.push(finding);
    }

    fn say_missing(&mut self, missing: Vec<Finding>) {
        self.report(missing, |count| {
            format!("{count} mains have no diameter that can be used").into()
        });
    }
}

/// A number as it stood before it went to SI and back.
fn tidy(value: f64) -> f64 {
    let rounded = (value * 1e6).round() / 1e6;
    if (rounded - value).abs() < 1e-9 * value.abs().max(1.0) {
        rounded
    } else {
        value
    }
}

/// Whether a number is a nominal size in some unit.
type IsSize = fn(f64) -> bool;

/// The layer's sizes, to know a row that fits the other unit only.
struct OddSizes {
    nearly_all_sizes: bool,
    is_own: IsSize,
    is_other: IsSize,
    other: &'static str,
}

impl OddSizes {
    fn of(bare: &[Option<f64>], unit: Unit) -> Option<OddSizes> {
        let (is_own, is_other, other): (IsSize, IsSize, _) = match unit.name {
            "mm" => (is_size_mm, is_size_in, "in"),
            "in" => (is_size_in, is_size_mm, "mm"),
            _ => return None,
        };
        let (sizes, all) = bare.iter().flatten().fold((0, 0), |(sizes, all), value| {
            (sizes + u32::from(is_own(*value)), all + 1)
        });
        Some(OddSizes {
            nearly_all_sizes: sizes * 10 >= all * 9,
            is_own,
            is_other,
            other,
        })
    }

    /// The other unit, when the value is a size in that one only and the layer is full of sizes of its own.
    fn fits_other(&self, value: f64) -> Option<&'static str> {
        (self.nearly_all_sizes && !(self.is_own)(value) && (self.is_other)(value)).then_some(self.other)
    }
}

fn missing_diameter(feature: FeatureRef, slot: &Slot) -> Finding {
    let said = match slot {
        Slot::Empty(text) if !text.is_empty() => format!(" has no diameter: the map says {text}"),
        Slot::Unreadable(text) => format!(" has no diameter that can be read: the map says `{text}`"),
        _ => " has no diameter".to_string(),
    };
    Finding::new(Code::DiameterMissing, Sentence::new().feature(feature).text(said)).on(feature)
}

fn impossible_diameter(feature: FeatureRef, value_m: f64, unit: Unit, odd: &Option<OddSizes>) -> Option<Finding> {
    let value = tidy(unit.from_si(value_m));
    let fits_other = odd.as_ref().and_then(|odd| odd.fits_other(value));
    if is_possible(value_m) && fits_other.is_none() {
        return None;
    }
    let said = match fits_other {
        Some(other) => format!(" has a diameter of {value} {unit}, which would be a size in {other}"),
        None => format!(" has a diameter of {value} {unit}, which no water main has"),
    };
    let finding = Finding::new(Code::DiameterImpossible, Sentence::new().feature(feature).text(said)).on(feature);
    Some(finding.measured(value_m, Quantity::Diameter))
}

/// Whether water mains are made with a bore. The slack is for a size that lost its last digit on the way to SI.
fn is_possible(bore_m: f64) -> bool {
    (SMALLEST_M * (1.0 - 1e-9)..=LARGEST_M).contains(&bore_m)
}

fn no_wall(feature: FeatureRef, outside_m: f64) -> Finding {
    let said = Sentence::new()
        .feature(feature)
        .text(" has an outside diameter of ")
        .number(outside_m, Quantity::Diameter)
        .text(", and its material does not tell the wall");
    Finding::new(Code::DiameterMissing, said).on(feature)
}

fn bore(diameter_is: DiameterIs, material: Option<Material>, value_m: f64) -> Option<Valued<f64>> {
    match diameter_is {
        DiameterIs::Inside => Some(Valued {
            value: value_m,
            basis: Basis::Map,
        }),
        DiameterIs::Nominal => Some(Valued {
            value: bore_from_nominal_m(material, value_m),
            basis: Basis::Assumed,
        }),
        DiameterIs::Outside => material?.bore_from_outside_m(value_m).map(|value| Valued {
            value,
            basis: Basis::Assumed,
        }),
    }
}
