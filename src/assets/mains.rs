//! Mains: diameter, friction, minor loss, year, length, zone and kind of every row that takes part.

use super::cells::{self, Number};
use super::columns;
use super::desk::{Desk, features};
use super::drawings::Drawn;
use super::selection::by_word;
use super::sentinels::Meaning;
use super::settings::{AssetSettings, MainsColumns};
use super::{Friction, Main, MainKind, Role, Valued, words};
use crate::finding::{Code, Error, FeatureRef, Finding, Sentence, Severity};

/// The first year of piped water under pressure in use today. Common practice, no source.
const FIRST_YEAR: f64 = 1800.0;

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
