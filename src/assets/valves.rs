//! Valves: what each does, whether it is shut, and the main it names. Regulating and check valves and pumps are refused until
//! the hydraulics take them: left out in silence they would make every pressure behind them wrong.

use std::collections::HashMap;

use super::desk::{Desk, features};
use super::selection::by_word;
use super::settings::ValvesColumns;
use super::words::{self, Valves};
use super::{Basis, Main, NamedMain, Role, Valued, Valve, ValveKind, cells, columns};
use crate::finding::{Code, Error, FeatureRef, Finding, Sentence, Severity};

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

    /// Whether each valve is shut. Where the status does not say, a zone valve is taken as shut and any other as open, and it is
    /// said: an open zone valve would join two zones, which a map does not mean by silence.
    fn valve_states(
        &mut self,
        wanted: &ValvesColumns,
        kinds: &[ValveKind],
        taking_part: &[bool],
    ) -> Result<Vec<Valued<bool>>, Error> {
        let layer = wanted.common.layer;
        let assumed = kinds.iter().map(|kind| Valued {
            value: *kind == ValveKind::Zone,
            basis: Basis::Assumed,
        });
        let mut states: Vec<Valued<bool>> = assumed.collect();
        let column = self.maybe_column(layer, "status", wanted.common.status.as_ref())?;
        let mut unknown = Vec::new();
        for row in (0..taking_part.len()).filter(|row| taking_part[*row]) {
            let cell = column.and_then(|column| Some((column, column.cells.get(row)?)));
            match cell.and_then(|(column, cell)| words::is_shut(cell, &column.name)) {
                Some(value) => {
                    states[row] = Valued {
                        value,
                        basis: Basis::Map,
                    }
                }
                // A valve that is off the line changes nothing, whatever its state.
                None if kinds[row] == ValveKind::OffLine => {}
                None => {
                    let text = cell.and_then(|(_, cell)| cells::text(cell)).unwrap_or_default();
                    unknown.push((text, FeatureRef { layer, row: row as u32 }));
                }
            }
        }
        let is_zone = |feature: &FeatureRef| kinds[feature.row as usize] == ValveKind::Zone;
        let (zone, other) = unknown.into_iter().partition(|(_, feature)| is_zone(feature));
        self.say_zone_valves_unknown(zone);
        self.say_valves_unknown(other, column.is_some());
        Ok(states)
    }

    /// Zone valves that do not say whether they are shut, each by itself: what a zone is fed by hangs on it.
    fn say_zone_valves_unknown(&mut self, unknown: Vec<(String, FeatureRef)>) {
        let found = unknown.into_iter().map(|(word, feature)| {
            let said = format!(" is a zone valve with {}; it is taken as closed", status_said(&word));
            let said = Sentence::new().feature(feature).text(said);
            Finding::new(Code::ValveStatusUnknown, said)
                .severity(Severity::Warning)
                .on(feature)
        });
        self.report(found.collect(), |count| {
            format!("{count} zone valves do not say whether they are closed; they are taken as closed").into()
        });
    }

    /// Other valves that do not say whether they are shut, together.
    fn say_valves_unknown(&mut self, unknown: Vec<(String, FeatureRef)>, has_column: bool) {
        for (word, features) in by_word(unknown) {
            let said = match features.as_slice() {
                many if !has_column => format!(
                    "the study names no `status` column for this layer: {} taken as open",
                    Role::Valve.counted(many.len())
                )
                .into(),
                [one] => Sentence::new()
                    .feature(*one)
                    .text(format!(" has {}; it is taken as open", status_said(&word))),
                many => format!(
                    "{} valves have {}; they are taken as open",
                    many.len(),
                    status_said(&word)
                )
                .into(),
            };
            self.report_together(Code::ValveStatusUnknown, Severity::Note, &features, said);
        }
    }

    fn named_mains(&self, wanted: &ValvesColumns, mains: &[Main]) -> Result<Vec<Option<NamedMain>>, Error> {
        let layer = wanted.common.layer;
        let Some(column) = self.maybe_column(layer, "main", wanted.main.as_ref())? else {
            return Ok(vec![None; self.layer(layer).rows() as usize]);
        };
        let mut by_id: HashMap<&str, Vec<u32>> = HashMap::new();
        let mut in_any_case: HashMap<String, Vec<u32>> = HashMap::new();
        for (index, main) in mains.iter().enumerate() {
            if let Some(id) = self.names.id(main.origin) {
                by_id.entry(id).or_default().push(index as u32);
                in_any_case.entry(id.to_lowercase()).or_default().push(index as u32);
            }
        }
        // An id that fits no main as it is spelt may fit one in another case.
        let named = column.cells.iter().map(|cell| {
            let id = cells::id(cell)?;
            let known = by_id.get(&*id).or_else(|| in_any_case.get(&id.to_lowercase()));
            Some(match known {
                Some(mains) => NamedMain::Known(mains.clone()),
                None => NamedMain::Unknown(id.into()),
            })
        });
        Ok(named.collect())
    }
}

fn status_said(word: &str) -> String {
    if word.is_empty() {
        "no status".to_string()
    } else {
        format!("the status `{word}`")
    }
}

/// Every name of a column that a valves layer is read by.
pub(super) fn wanted_columns(wanted: &ValvesColumns) -> Vec<String> {
    let names = [&wanted.kind, &wanted.main].into_iter().flatten().cloned();
    names.chain(columns::common(&wanted.common)).collect()
}
