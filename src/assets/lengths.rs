//! Stored lengths of mains against the drawn ones.

use super::columns::{Slot, Wanted};
use super::desk::Desk;
use super::drawings::Drawn;
use super::sentinels::Meaning;
use super::settings::{LengthFrom, MainsColumns, UnitColumn};
use crate::finding::{Code, Error, FeatureRef, Finding, Sentence, Severity};
use crate::units::{M_PER_MM, Quantity, Unit};

/// Stored lengths below this are no lengths, m.
const SHORTEST_STORED_M: f64 = M_PER_MM;
/// A stored length that differs by more than this share and more than this length disagrees. Common practice, no source.
const LENGTH_SHARE: f64 = 0.1;
const LENGTH_SLACK_M: f64 = 1.0;
/// Above this share of disagreeing lengths the column as a whole is at fault, not its rows.
const COLUMN_AT_FAULT: f64 = 0.5;

impl Desk<'_> {
    /// Stored lengths that count. Those that disagree with the drawing are said, whether they count or not.
    pub fn stored_lengths(
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
