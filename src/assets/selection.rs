//! Which rows take part: by the study's `leave_out`, and by the words of a `status` column. What is left out is counted and
//! listed.

use super::columns::{as_compared, compared_cell};
use super::desk::Desk;
use super::reading::LeftOut;
use super::settings::{LayerColumns, LeaveOut};
use super::words::{Use, use_of};
use super::{Role, cells};
use crate::finding::{Code, Error, FeatureRef, Finding, Sentence, Severity};
use crate::layers::Column;

/// Values of a column that are listed in a finding.
const VALUES_LISTED: usize = 8;

impl Desk<'_> {
    /// Which rows of a layer take part. `status_is_use`: whether words that are unknown as a status are to be said (a valve's
    /// status says whether it is shut).
    pub fn select(&mut self, common: &LayerColumns, role: Role, status_is_use: bool) -> Result<Vec<bool>, Error> {
        let mut taking_part = vec![true; self.layer(common.layer).rows() as usize];
        self.leave_out(common, &mut taking_part)?;
        if let Some(name) = &common.status {
            let column = self.column(common.layer, "status", name)?;
            let mut unknown: Vec<(String, FeatureRef)> = Vec::new();
            let mut out: Vec<(String, FeatureRef)> = Vec::new();
            for (row, cell) in column.cells.iter().enumerate().filter(|(row, _)| taking_part[*row]) {
                let feature = FeatureRef {
                    layer: common.layer,
                    row: row as u32,
                };
                let Some(text) = cells::text(cell) else { continue };
                match use_of(&text) {
                    Use::Gone => out.push((text, feature)),
                    Use::Unknown => unknown.push((text, feature)),
                    Use::Live => {}
                }
            }
            for (word, features) in by_word(out) {
                self.take_out(&mut taking_part, format!("`{}` is {word}", column.name), features);
            }
            if status_is_use {
                for (word, features) in by_word(unknown) {
                    self.say_unknown_status(role, &word, &features);
                }
            }
        }
        Ok(taking_part)
    }

    /// A status of a main decides whether it carries water; of the rest less hangs on it.
    fn say_unknown_status(&mut self, role: Role, word: &str, features: &[FeatureRef]) {
        let severity = match role {
            Role::Main => Severity::Warning,
            _ => Severity::Note,
        };
        let count = role.counted(features.len());
        let said = format!("the status `{word}` ({count}) is not known here and leaves nothing out: taken as in use");
        self.report_together(Code::ValueUnreadable, severity, features, said.into());
    }

    fn leave_out(&mut self, common: &LayerColumns, taking_part: &mut [bool]) -> Result<(), Error> {
        for rule in &common.leave_out {
            let column = self.column(common.layer, "leave_out", &rule.column)?;
            let values = as_compared(&rule.values);
            let mut out = Vec::new();
            for (row, cell) in column.cells.iter().enumerate().filter(|(row, _)| taking_part[*row]) {
                if values.contains(&compared_cell(cell)) {
                    let text = cells::text(cell).unwrap_or_else(|| "empty".to_string());
                    out.push((
                        text,
                        FeatureRef {
                            layer: common.layer,
                            row: row as u32,
                        },
                    ));
                }
            }
            if out.is_empty() {
                self.say_idle_rule(column, rule);
            }
            for (word, features) in by_word(out) {
                self.take_out(taking_part, format!("`{}` is {word}", column.name), features);
            }
        }
        Ok(())
    }

    /// A rule that fits no row is likely misspelt.
    fn say_idle_rule(&mut self, column: &Column, rule: &LeaveOut) {
        let mut values: Vec<String> = column.cells.iter().filter_map(cells::text).collect();
        values.sort();
        values.dedup();
        if values.is_empty() {
            return;
        }
        let more = if values.len() > VALUES_LISTED { ", ..." } else { "" };
        values.truncate(VALUES_LISTED);
        let said = format!(
            "`leave_out` by `{}` leaves out nothing: no row is {}; its values are {}{more}",
            column.name,
            rule.values.join(" or "),
            values.join(", "),
        );
        self.findings.push(Finding::new(Code::LeaveOutIdle, said.into()));
    }

    /// Takes features out by a rule, and keeps the list.
    pub fn take_out(&mut self, taking_part: &mut [bool], rule: String, features: Vec<FeatureRef>) {
        for feature in &features {
            taking_part[feature.row as usize] = false;
        }
        self.left_out.push(LeftOut { rule, features });
    }

    /// Says what was left out, a finding a rule.
    pub fn say_left_out(&mut self) {
        let rules = std::mem::take(&mut self.left_out);
        for rule in &rules {
            let Some(role) = self.names.role(rule.features[0].layer) else {
                continue;
            };
            let code = match role {
                Role::Main => Code::MainsLeftOut,
                _ => Code::PointsLeftOut,
            };
            let said = Sentence::new().text(format!(
                "left out by a rule: {} whose {}",
                role.counted(rule.features.len()),
                rule.rule
            ));
            self.report_together(code, Severity::Note, &rule.features, said);
        }
        self.left_out = rules;
    }
}

/// Features by word, in the order that the words first appear; spellings that differ in case alone are one word.
pub(super) fn by_word(found: Vec<(String, FeatureRef)>) -> Vec<(String, Vec<FeatureRef>)> {
    let mut words: Vec<(String, Vec<FeatureRef>)> = Vec::new();
    let mut place: std::collections::HashMap<String, usize> = std::collections::HashMap::new();
    for (word, feature) in found {
        let at = *place.entry(word.to_lowercase()).or_insert_with(|| {
            words.push((word, Vec::new()));
            words.len() - 1
        });
        words[at].1.push(feature);
    }
    words
}
