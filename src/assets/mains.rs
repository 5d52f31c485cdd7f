//! Mains: diameter, friction, minor loss, year, length, zone and kind of every row that takes part.

use super::cells::{self, Number};
use super::columns::{self, Slot, Wanted, diameter_unit, doubtful_diameter_unit, is_size_in, is_size_mm};
use super::desk::{Desk, features};
use super::drawings::Drawn;
use super::materials::{Material, bore_from_nominal_m};
use super::selection::by_word;
use super::sentinels::Meaning;
use super::settings::{AssetSettings, DiameterIs, FrictionLaw, LengthFrom, MainsColumns, UnitColumn};
use super::{Basis, Friction, Main, MainKind, Role, Valued, words};
use crate::finding::{Code, Error, FeatureRef, Finding, Sentence, Severity};
use crate::units::{M_PER_INCH, M_PER_MM, Quantity, Unit};

/// Smallest bore that a main is made with, m: 3/4 in. Common practice, no source.
const SMALLEST_M: f64 = 0.75 * M_PER_INCH;
/// Largest bore that a main is made with, m. Common practice, no source.
const LARGEST_M: f64 = 3.0;
/// C-factors met in practice: from heavy tuberculation to new plastic (the published tables end at 60 and 150; the margins are
/// common practice, no source).
const C_FACTORS: std::ops::RangeInclusive<f64> = 20.0..=165.0;
/// Largest roughness height met in practice, m: heavy tuberculation (handbooks, from memory), doubled.
const ROUGHEST_M: f64 = 30.0 * M_PER_MM;
/// The first year of piped water under pressure in use today. Common practice, no source.
const FIRST_YEAR: f64 = 1800.0;
/// Stored lengths below this are no lengths, m.
const SHORTEST_STORED_M: f64 = M_PER_MM;
/// A stored length that differs by more than this share and more than this length disagrees. Common practice, no source.
const LENGTH_SHARE: f64 = 0.1;
const LENGTH_SLACK_M: f64 = 1.0;
/// Above this share of disagreeing lengths the column as a whole is at fault, not its rows.
const COLUMN_AT_FAULT: f64 = 0.5;

/// The columns of one mains layer, by row.
struct Columns {
    diameter_m: Vec<Option<Valued<f64>>>,
    friction: Vec<Valued<Friction>>,
    minor_loss_k: Vec<f64>,
    year: Vec<Option<i32>>,
    stored_length_m: Vec<Option<f64>>,
    zone: Vec<Option<u32>>,
    kind: Vec<MainKind>,
}

impl Desk<'_> {
    /// Reads a layer of mains: those that take part, and those left out.
    pub fn read_mains(
        &mut self,
        wanted: &MainsColumns,
        settings: &AssetSettings,
    ) -> Result<(Vec<Main>, Vec<FeatureRef>), Error> {
        let layer = wanted.common.layer;
        self.read_ids(&wanted.common, Role::Main)?;
        let mut taking_part = self.select(&wanted.common, Role::Main, true)?;
        let kind = self.main_kinds(wanted, &mut taking_part)?;
        let drawn = self.read_drawings(layer)?;
        let year = self.years(wanted, settings, &taking_part)?;
        let material = self.materials(wanted)?;
        let columns = Columns {
            diameter_m: self.diameters(wanted, &material, &taking_part)?,
            friction: self.frictions(wanted, settings, &material, &year, &taking_part)?,
            minor_loss_k: self.minor_losses(wanted, &taking_part)?,
            stored_length_m: self.stored_lengths(wanted, &drawn, &taking_part)?,
            zone: self.read_zones(&wanted.common)?,
            year,
            kind,
        };
        let left_out = taking_part.iter().enumerate().filter(|(_, takes_part)| !**takes_part);
        let left_out = left_out.map(|(row, _)| FeatureRef { layer, row: row as u32 }).collect();
        let rows = drawn.into_iter().enumerate().filter(|(row, _)| taking_part[*row]);
        let mains = rows
            .map(|(row, drawn)| columns.main(FeatureRef { layer, row: row as u32 }, drawn))
            .collect();
        self.check_ids(&features(layer, &taking_part), Role::Main);
        Ok((mains, left_out))
    }

    /// What each main is for. Raw water and private mains are taken out.
    fn main_kinds(&mut self, wanted: &MainsColumns, taking_part: &mut [bool]) -> Result<Vec<MainKind>, Error> {
        let layer = wanted.common.layer;
        let mut kinds = vec![MainKind::Unknown; taking_part.len()];
        let Some(column) = self.maybe_column(layer, "kind", wanted.kind.as_ref())? else {
            return Ok(kinds);
        };
        let (mut out, mut unknown) = (Vec::new(), Vec::new());
        for (row, cell) in column.cells.iter().enumerate().filter(|(row, _)| taking_part[*row]) {
            let Some(text) = cells::text(cell) else { continue };
            let feature = FeatureRef { layer, row: row as u32 };
            if let Some(device) = words::device_elsewhere(&text) {
                return Err(self.not_yet(feature, device, &column.name, &text));
            }
            match words::main_kind(&text) {
                Some(Ok(MainKind::RawWater) | Err(_)) => out.push((text, feature)),
                Some(Ok(kind)) => kinds[row] = kind,
                None => unknown.push((text, feature)),
            }
        }
        for (word, features) in by_word(out) {
            self.take_out(taking_part, format!("`{}` is {word}", column.name), features);
        }
        for (word, features) in by_word(unknown) {
            let said = format!(
                "the kind `{word}` ({}) is not known here and counts as any main",
                Role::Main.counted(features.len())
            );
            self.report_together(Code::ValueUnreadable, Severity::Note, &features, said.into());
        }
        Ok(kinds)
    }

    fn materials(&self, wanted: &MainsColumns) -> Result<Vec<Option<String>>, Error> {
        let column = self.maybe_column(wanted.common.layer, "material", wanted.material.as_ref())?;
        Ok(column.map_or_else(Vec::new, |column| column.cells.iter().map(cells::text).collect()))
    }

    fn years(
        &mut self,
        wanted: &MainsColumns,
        settings: &AssetSettings,
        taking_part: &[bool],
    ) -> Result<Vec<Option<i32>>, Error> {
        let layer = wanted.common.layer;
        let Some(column) = self.maybe_column(layer, "year", wanted.year.as_ref())? else {
            return Ok(vec![None; taking_part.len()]);
        };
        let mut impossible = Vec::new();
        let years = column.cells.iter().enumerate().map(|(row, cell)| {
            let feature = FeatureRef { layer, row: row as u32 };
            let said = match cells::year(cell) {
                Number::Value(year, _) if (FIRST_YEAR..=f64::from(settings.age_in_year)).contains(&year) => {
                    return Some(year as i32);
                }
                Number::Empty(text) | Number::Unreadable(text) if text.is_empty() => None,
                Number::Value(0.0 | -1.0, _) | Number::Empty(_) => None,
                Number::Value(year, _) => Some(year.to_string()),
                Number::Unreadable(text) => Some(text),
            };
            if let Some(said) = said.filter(|_| taking_part[row]) {
                let message = Sentence::new()
                    .feature(feature)
                    .text(format!(" has {said} as its year of laying"));
                impossible.push(Finding::new(Code::YearImpossible, message).on(feature));
            }
            None
        });
        let years = years.collect();
        self.report(impossible, |count| {
            format!("{count} mains have an impossible year of laying").into()
        });
        Ok(years)
    }

    /// The bore of every main, where the map has one that can be used.
    fn diameters(
        &mut self,
        wanted: &MainsColumns,
        material: &[Option<String>],
        taking_part: &[bool],
    ) -> Result<Vec<Option<Valued<f64>>>, Error> {
        let layer = wanted.common.layer;
        let Some(column) = &wanted.diameter else {
            let name = &self.layer(layer).name;
            let said =
                format!("the study names no `diameter` column for {name}: the bore of every main in it is assumed");
            let finding = Finding::new(Code::DiameterMissing, said.into()).severity(Severity::Serious);
            self.findings.push(finding);
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
        let odd = OddSizes::of(&bare, read.unit);
        let (mut missing, mut impossible) = (Vec::new(), Vec::new());
        let mut bores = vec![None; taking_part.len()];
        for (row, slot) in read.slots.iter().enumerate().filter(|(row, _)| taking_part[*row]) {
            let feature = FeatureRef { layer, row: row as u32 };
            match slot {
                Slot::Empty(_) | Slot::Unreadable(_) => missing.push(missing_diameter(feature, slot)),
                // A column in the wrong unit is one fault, not a fault of each row.
                Slot::Value(value_m) if column_doubtful => {
                    let possible = Some(*value_m).filter(|value_m| is_possible(*value_m));
                    bores[row] = possible.map(|value| Valued {
                        value,
                        basis: Basis::Map,
                    });
                }
                Slot::Value(value_m) => match impossible_diameter(feature, *value_m, read.unit, &odd) {
                    Some(finding) => impossible.push(finding),
                    None => {
                        let made_of = material.get(row).and_then(|text| Material::parse(text.as_deref()?));
                        bores[row] = bore(wanted.diameter_is, made_of, *value_m);
                        if bores[row].is_none() {
                            missing.push(no_wall(feature, *value_m));
                        }
                    }
                },
            }
        }
        self.report(missing, |count| {
            format!("{count} mains have no diameter that can be used").into()
        });
        self.report(impossible, |count| {
            format!("{count} mains have an impossible diameter").into()
        });
        Ok(bores)
    }

    fn frictions(
        &mut self,
        wanted: &MainsColumns,
        settings: &AssetSettings,
        material: &[Option<String>],
        year: &[Option<i32>],
        taking_part: &[bool],
    ) -> Result<Vec<Valued<Friction>>, Error> {
        let own = self.own_frictions(wanted, settings.law, taking_part)?;
        let mut unknown = Vec::new();
        let frictions = (0..taking_part.len()).map(|row| {
            if let Some(friction) = own.get(row).copied().flatten() {
                return Valued {
                    value: friction,
                    basis: Basis::Map,
                };
            }
            let text = material.get(row).and_then(Option::as_deref);
            let known = text.and_then(Material::parse);
            if let (Some(text), None, true) = (text, known, taking_part[row]) {
                unknown.push((
                    text.to_string(),
                    FeatureRef {
                        layer: wanted.common.layer,
                        row: row as u32,
                    },
                ));
            }
            let age_years = year[row].map(|year| f64::from(settings.age_in_year - year));
            friction_of(known, age_years, settings)
        });
        let frictions = frictions.collect();
        for (word, features) in by_word(unknown) {
            let said = format!(
                "the material `{word}` of {} is not in the table of materials",
                Role::Main.counted(features.len())
            );
            self.report_together(Code::MaterialUnknown, Severity::Note, &features, said.into());
        }
        Ok(frictions)
    }

    /// C-factor or roughness from the map's own column, where it is possible.
    fn own_frictions(
        &mut self,
        wanted: &MainsColumns,
        law: FrictionLaw,
        taking_part: &[bool],
    ) -> Result<Vec<Option<Friction>>, Error> {
        let layer = wanted.common.layer;
        let (slots, name) = match (law, &wanted.c_factor, &wanted.roughness) {
            (FrictionLaw::HazenWilliams, Some(name), _) => (
                self.read_plain(layer, "c_factor", name, Meaning::CFactor, taking_part)?,
                name,
            ),
            (FrictionLaw::DarcyWeisbach, _, Some(column)) => {
                let asked = Wanted {
                    layer,
                    key: "roughness",
                    column,
                    quantity: Quantity::Roughness,
                    meaning: Meaning::Roughness,
                    taking_part,
                };
                (self.read_numbers(&asked, |_| None)?.slots, &column.column)
            }
            _ => return Ok(Vec::new()),
        };
        let possible = |value: f64| match law {
            FrictionLaw::HazenWilliams => C_FACTORS.contains(&value).then_some(Friction::CFactor(value)),
            FrictionLaw::DarcyWeisbach => (0.0..=ROUGHEST_M)
                .contains(&value)
                .then_some(Friction::RoughnessM(value)),
        };
        let (mut impossible, mut fillers) = (Vec::new(), Vec::new());
        let own = slots.iter().enumerate().map(|(row, slot)| {
            let feature = FeatureRef { layer, row: row as u32 };
            let own = slot.value().and_then(possible);
            match slot {
                Slot::Value(value) if own.is_none() && taking_part[row] => {
                    let message = Sentence::new()
                        .feature(feature)
                        .text(format!(" has {value} in `{name}`"));
                    impossible.push(Finding::new(Code::FrictionValueImpossible, message).on(feature));
                }
                // A filler in the shape of a number looks like a value to whoever reads the map.
                Slot::Empty(text) if text.parse::<f64>().is_ok() && taking_part[row] => {
                    fillers.push((text.clone(), feature));
                }
                _ => {}
            }
            own
        });
        let own = own.collect();
        self.report(impossible, |count| {
            format!("{count} mains have an impossible value in `{name}`").into()
        });
        for (filler, features) in by_word(fillers) {
            let said = format!(
                "`{name}` of {} is {filler}, a filler",
                Role::Main.counted(features.len())
            );
            self.report_together(Code::FrictionValueImpossible, Severity::Warning, &features, said.into());
        }
        Ok(own)
    }

    fn minor_losses(&mut self, wanted: &MainsColumns, taking_part: &[bool]) -> Result<Vec<f64>, Error> {
        let layer = wanted.common.layer;
        let Some(name) = &wanted.minor_loss else {
            return Ok(vec![0.0; taking_part.len()]);
        };
        let slots = self.read_plain(layer, "minor_loss", name, Meaning::LossCoefficient, taking_part)?;
        let mut negative = Vec::new();
        let losses = slots.iter().enumerate().map(|(row, slot)| {
            let value = slot.value().unwrap_or(0.0);
            if value < 0.0 && taking_part[row] {
                let feature = FeatureRef { layer, row: row as u32 };
                let said = Sentence::new()
                    .feature(feature)
                    .text(format!(" has a minor loss coefficient of {value}, below zero"));
                negative.push(Finding::new(Code::ValueUnreadable, said).on(feature));
            }
            value.max(0.0)
        });
        let losses = losses.collect();
        self.report(negative, |count| {
            format!("{count} mains have a minor loss coefficient below zero").into()
        });
        Ok(losses)
    }

    /// Stored lengths that count. Those that disagree with the drawing are said, whether they count or not.
    fn stored_lengths(
        &mut self,
        wanted: &MainsColumns,
        drawn: &[Drawn],
        taking_part: &[bool],
    ) -> Result<Vec<Option<f64>>, Error> {
        let layer = wanted.common.layer;
        let Some(column) = &wanted.length else {
            return Ok(vec![None; taking_part.len()]);
        };
        let drawn_m: Vec<Option<f64>> = drawn.iter().map(Drawn::length_m).collect();
        let asked = Wanted {
            layer,
            key: "length",
            column,
            quantity: Quantity::Length,
            meaning: Meaning::Length,
            taking_part,
        };
        let read = self.read_numbers(&asked, |values| length_unit(values, &drawn_m))?;
        let mut stored_m: Vec<Option<f64>> = read.slots.iter().map(Slot::value).collect();
        let no_lengths = self.take_out_no_lengths(layer, &mut stored_m, taking_part);
        self.say_lengths(layer, column, &stored_m, &drawn_m, taking_part);
        self.report(no_lengths, |count| {
            format!("{count} stored lengths are no length of a main; the drawn ones count").into()
        });
        Ok(match wanted.length_from {
            LengthFrom::Drawn => vec![None; taking_part.len()],
            LengthFrom::Stored => stored_m,
        })
    }

    /// Takes out stored lengths that no main has: shared among its parts they would leave some with none at all.
    fn take_out_no_lengths(&self, layer: u16, stored_m: &mut [Option<f64>], taking_part: &[bool]) -> Vec<Finding> {
        let mut found = Vec::new();
        for (row, stored) in stored_m.iter_mut().enumerate() {
            let is_length = |length_m: &f64| length_m.is_finite() && *length_m >= SHORTEST_STORED_M;
            let Some(length_m) = *stored else { continue };
            if is_length(&length_m) {
                continue;
            }
            *stored = None;
            if taking_part[row] {
                let feature = FeatureRef { layer, row: row as u32 };
                let said = Sentence::new().feature(feature).text(" is stored as ");
                let said = said.number(length_m, Quantity::Length);
                let said = said.text(" long, which is no length of a main; the drawn one counts");
                found.push(Finding::new(Code::LengthDisagrees, said).on(feature));
            }
        }
        found
    }

    fn say_lengths(
        &mut self,
        layer: u16,
        column: &UnitColumn,
        stored_m: &[Option<f64>],
        drawn_m: &[Option<f64>],
        taking_part: &[bool],
    ) {
        let rows = stored_m
            .iter()
            .zip(drawn_m)
            .enumerate()
            .filter(|(row, _)| taking_part[*row]);
        let pairs: Vec<(usize, f64, f64)> = rows
            .filter_map(|(row, (stored, drawn))| Some((row, (*stored)?, (*drawn)?)))
            .collect();
        let found: Vec<Finding> = pairs
            .iter()
            .filter(|(_, stored, drawn)| (stored - drawn).abs() > LENGTH_SLACK_M.max(LENGTH_SHARE * drawn))
            .map(|(row, stored, drawn)| {
                let feature = FeatureRef {
                    layer,
                    row: *row as u32,
                };
                let said = Sentence::new()
                    .feature(feature)
                    .text(" is stored as ")
                    .number(*stored, Quantity::Length);
                let said = said.text(" long, and drawn ").number(*drawn, Quantity::Length);
                Finding::new(Code::LengthDisagrees, said)
                    .on(feature)
                    .measured(*stored, Quantity::Length)
                    .limit(*drawn, "drawn length")
            })
            .collect();
        if found.len() > 20 && found.len() as f64 > COLUMN_AT_FAULT * pairs.len() as f64 {
            let features: Vec<FeatureRef> = found.iter().filter_map(|finding| finding.feature).collect();
            let said = format!(
                "{} of {} stored lengths in `{}` differ from the drawn ones by more than a tenth: look at the column's unit",
                found.len(),
                pairs.len(),
                column.column
            );
            self.report_together(Code::LengthDisagrees, Severity::Warning, &features, said.into());
        } else {
            self.report(found, |count| {
                format!("{count} stored lengths disagree with the drawing").into()
            });
        }
    }
}

impl Columns {
    fn main(&self, origin: FeatureRef, drawn: Drawn) -> Main {
        let row = origin.row as usize;
        Main {
            origin,
            drawing: drawn.drawing,
            length_scale: drawn.length_scale,
            stored_length_m: self.stored_length_m[row],
            diameter_m: self.diameter_m[row],
            friction: self.friction[row],
            minor_loss_k: self.minor_loss_k[row],
            year: self.year[row],
            zone: self.zone[row],
            kind: self.kind[row],
        }
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

fn friction_of(material: Option<Material>, age_years: Option<f64>, settings: &AssetSettings) -> Valued<Friction> {
    match (settings.law, material) {
        (FrictionLaw::HazenWilliams, Some(material)) => Valued {
            value: Friction::CFactor(material.c_factor(age_years)),
            basis: Basis::Assumed,
        },
        (FrictionLaw::DarcyWeisbach, Some(material)) => Valued {
            value: Friction::RoughnessM(material.roughness_m(age_years)),
            basis: Basis::Assumed,
        },
        (FrictionLaw::HazenWilliams, None) => {
            let Valued { value, basis } = settings.default_c_factor;
            Valued {
                value: Friction::CFactor(value),
                basis,
            }
        }
        (FrictionLaw::DarcyWeisbach, None) => {
            let Valued { value, basis } = settings.default_roughness_m;
            Valued {
                value: Friction::RoughnessM(value),
                basis,
            }
        }
    }
}

/// The unit that stored lengths stand in, told by the drawn ones: the middle ratio of the two is that of a unit.
fn length_unit(values: &[Option<f64>], drawn_m: &[Option<f64>]) -> Option<Unit> {
    let mut ratios: Vec<f64> = values
        .iter()
        .zip(drawn_m)
        .filter_map(|(stored, drawn)| Some(drawn.as_ref()? / (*stored).filter(|stored| *stored > 0.0)?))
        .collect();
    if ratios.is_empty() {
        return None;
    }
    ratios.sort_by(f64::total_cmp);
    let middle = ratios[ratios.len() / 2];
    // The two feet differ by far less than drawn and stored lengths do: the international one, first in the list, is taken.
    Unit::all(Quantity::Length).find(|unit| (middle / unit.si - 1.0).abs() < 0.1)
}

/// Every name of a column that a mains layer is read by.
pub(super) fn wanted_columns(wanted: &MainsColumns) -> Vec<String> {
    let with_unit = [&wanted.diameter, &wanted.roughness, &wanted.length]
        .into_iter()
        .flatten();
    let plain = [
        &wanted.c_factor,
        &wanted.minor_loss,
        &wanted.material,
        &wanted.year,
        &wanted.kind,
    ]
    .into_iter()
    .flatten();
    with_unit
        .map(|column| column.column.clone())
        .chain(plain.cloned())
        .chain(columns::common(&wanted.common))
        .collect()
}
