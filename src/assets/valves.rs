//! Valves: what each does, whether it is shut, and the main it names. Regulating and check valves and pumps are refused until
//! the hydraulics take them: left out in silence they would make every pressure behind them wrong.

use std::collections::HashMap;

use super::desk::{Desk, features};
use super::selection::by_word;
use super::settings::ValvesColumns;
use super::words::{self, Valves};
use super::{Basis, Main, NamedMain, Role, Valued, Valve, ValveKind, cells, columns};
use crate::finding::{Code, Error, FeatureRef, Sentence, Severity};

impl Desk<'_> {
    /// Reads a layer of valves. `mains` are those that take part: a valve may name one.
    pub fn read_valves(&mut self, wanted: &ValvesColumns, mains: &[Main]) -> Result<Vec<Valve>, Error> {
        let layer = wanted.common.layer;
        self.read_ids(&wanted.common, Role::Valve)?;
        let taking_part = self.select(&wanted.common, Role::Valve, false)?;
        let points = self.read_points(layer, &taking_part, Role::Valve)?;
        let kinds = self.valve_kinds(wanted, &taking_part)?;
        let closed = self.valve_states(wanted, &kinds, &taking_part)?;
        let mut named = self.named_mains(wanted, mains)?;
        let rows = (0..taking_part.len()).filter(|row| taking_part[*row]);
        let valves = rows.map(|row| Valve {
            origin: FeatureRef { layer, row: row as u32 },
            at: points[row],
            kind: kinds[row],
            closed: closed[row],
            main: named[row].take(),
        });
        let valves = valves.collect();
        self.check_ids(&features(layer, &taking_part), Role::Valve);
        Ok(valves)
    }

    fn valve_kinds(&mut self, wanted: &ValvesColumns, taking_part: &[bool]) -> Result<Vec<ValveKind>, Error> {
        let layer = wanted.common.layer;
        let mut kinds = vec![ValveKind::Gate; taking_part.len()];
        let Some(column) = self.maybe_column(layer, "kind", wanted.kind.as_ref())? else {
            return Ok(kinds);
        };
        let mut unknown = Vec::new();
        for (row, cell) in column.cells.iter().enumerate().filter(|(row, _)| taking_part[*row]) {
            let Some(text) = cells::text(cell) else { continue };
            let feature = FeatureRef { layer, row: row as u32 };
            match words::valve_kind(&text) {
                Valves::Known(kind) => kinds[row] = kind,
                Valves::NotYet(device) => return Err(self.not_yet(feature, device, &column.name, &text)),
                Valves::Unknown => unknown.push((text, feature)),
            }
        }
        for (word, features) in by_word(unknown) {
            let said = format!(
                "the kind `{word}` ({}) is not known here and counts as a gate valve",
                Role::Valve.counted(features.len())
            );
            self.report_together(Code::ValueUnreadable, Severity::Note, &features, said.into());
        }
        Ok(kinds)
    }

    fn not_yet(&self, feature: FeatureRef, device: &str, column: &str, text: &str) -> Error {
        Error::input(
            &self.layer(feature.layer).source.path,
            format!(
                "{} is a {device} (`{column}` is {text}), which this version does not calculate",
                self.names.of(feature)
            ),
            format!(
                "Calculate the part of the map without such devices, or leave them out knowingly: `leave_out = {{ {column} = [\"{text}\"] }}`."
            ),
        )
    }

    /// Whether each valve is shut. One whose status does not say is taken as open, and said.
    fn valve_states(
        &mut self,
        wanted: &ValvesColumns,
        kinds: &[ValveKind],
        taking_part: &[bool],
    ) -> Result<Vec<Valued<bool>>, Error> {
        let layer = wanted.common.layer;
        let open = Valued {
            value: false,
            basis: Basis::Assumed,
        };
        let mut states = vec![open; taking_part.len()];
        let Some(column) = self.maybe_column(layer, "status", wanted.common.status.as_ref())? else {
            return Ok(states);
        };
        let mut unknown = Vec::new();
        for (row, cell) in column.cells.iter().enumerate().filter(|(row, _)| taking_part[*row]) {
            match words::is_shut(cell, &column.name) {
                Some(value) => {
                    states[row] = Valued {
                        value,
                        basis: Basis::Map,
                    }
                }
                // A valve that is off the line changes nothing, whatever its state.
                None if kinds[row] == ValveKind::OffLine => {}
                None => {
                    let text = cells::text(cell).unwrap_or_default();
                    unknown.push((text, FeatureRef { layer, row: row as u32 }));
                }
            }
        }
        for (word, features) in by_word(unknown) {
            let status = if word.is_empty() {
                "no status".to_string()
            } else {
                format!("the status `{word}`")
            };
            let said = match features.as_slice() {
                [one] => Sentence::new()
                    .feature(*one)
                    .text(format!(" has {status}; it is taken as open")),
                many => format!("{} valves have {status}; they are taken as open", many.len()).into(),
            };
            self.report_together(Code::ValveStatusUnknown, Severity::Note, &features, said);
        }
        Ok(states)
    }

    fn named_mains(&self, wanted: &ValvesColumns, mains: &[Main]) -> Result<Vec<Option<NamedMain>>, Error> {
        let layer = wanted.common.layer;
        let Some(column) = self.maybe_column(layer, "main", wanted.main.as_ref())? else {
            return Ok(vec![None; self.layer(layer).rows() as usize]);
        };
        let mut by_id: HashMap<&str, Vec<u32>> = HashMap::new();
        for (index, main) in mains.iter().enumerate() {
            if let Some(id) = self.names.id(main.origin) {
                by_id.entry(id).or_default().push(index as u32);
            }
        }
        let named = column.cells.iter().map(|cell| {
            let id = cells::id(cell)?;
            Some(match by_id.get(&*id) {
                Some(mains) => NamedMain::Known(mains.clone()),
                None => NamedMain::Unknown(id.into()),
            })
        });
        Ok(named.collect())
    }
}

/// Every name of a column that a valves layer is read by.
pub(super) fn wanted_columns(wanted: &ValvesColumns) -> Vec<String> {
    let names = [&wanted.kind, &wanted.main].into_iter().flatten().cloned();
    names.chain(columns::common(&wanted.common)).collect()
}
