//! Node points: fittings, tanks, wells, anything with a known head, elevation or demand.

use std::collections::HashSet;

use super::columns::{self, Slot, Wanted};
use super::desk::{Desk, features};
use super::selection::by_word;
use super::sentinels::Meaning;
use super::settings::{AssetSettings, NodesColumns, SourceAt, UnitColumn};
use super::{Basis, NodeKind, NodePoint, Role, Valued, cells, words};
use crate::finding::{Code, Error, FeatureRef, Finding, Sentence, Severity};
use crate::units::Quantity;

/// Plain nodes with a head are taken for results of an earlier calculation from this number on, if they are half of all.
const TOO_MANY_HEADS: usize = 20;

/// Above this share of customers without a demand the answer rests on what is missing. Common practice, no source.
const MANY_WITHOUT_DEMAND: f64 = 0.1;

impl Desk<'_> {
    /// Reads a layer of node points.
    pub fn read_nodes(&mut self, wanted: &NodesColumns, settings: &AssetSettings) -> Result<Vec<NodePoint>, Error> {
        let layer = wanted.common.layer;
        self.read_ids(&wanted.common, Role::Node)?;
        let taking_part = self.select(&wanted.common, Role::Node, true)?;
        let points = self.read_points(layer, &taking_part, Role::Node)?;
        let kinds = self.node_kinds(wanted, &taking_part)?;
        let elevations = self.elevations(layer, wanted.elevation.as_ref(), Role::Node, &taking_part)?;
        let heads = self.lengths(layer, "head", wanted.head.as_ref(), Meaning::Head, &taking_part)?;
        let demands = self.demands(layer, wanted.demand.as_ref(), Role::Node, &taking_part)?;
        let zones = self.read_zones(&wanted.common)?;
        let rows = (0..taking_part.len()).filter(|row| taking_part[*row]);
        let nodes: Vec<NodePoint> = rows
            .map(|row| NodePoint {
                origin: Some(FeatureRef { layer, row: row as u32 }),
                at: points[row],
                kind: kinds[row],
                elevation_m: elevations[row].map(|value| Valued {
                    value,
                    basis: Basis::Map,
                }),
                head_m: heads[row].map(|value| Valued {
                    value,
                    basis: Basis::Map,
                }),
                demand_m3_per_s: demands[row],
                greatest_m3_per_s: None,
                zone: zones[row],
            })
            .collect();
        self.check_ids(&features(layer, &taking_part), Role::Node);
        if let Some(head) = &wanted.head {
            self.check_heads(layer, &head.column, &nodes, wanted.kind.is_some())?;
            self.say_without_head(&nodes, settings);
        }
        Ok(nodes)
    }

    /// Stops when plain nodes have heads throughout: those are results of an earlier calculation, and as known heads would
    /// make every node a source.
    fn check_heads(&self, layer: u16, column: &str, nodes: &[NodePoint], kinds_known: bool) -> Result<(), Error> {
        let plain = nodes.iter().filter(|node| node.kind == NodeKind::Node);
        let with_head = plain.clone().filter(|node| node.head_m.is_some()).count();
        if !kinds_known || with_head < TOO_MANY_HEADS || 2 * with_head < plain.count() {
            return Ok(());
        }
        Err(Error::input(
            &self.layer(layer).source.path,
            format!("{with_head} plain nodes have a head in `{column}`: as known heads they would all be sources"),
            "Name a column that holds known heads alone as `head`, or leave the key out and write a `[[source]]`.",
        ))
    }

    /// Says which sources and tanks have no head, neither on the map nor in the study: they feed nothing.
    fn say_without_head(&mut self, nodes: &[NodePoint], settings: &AssetSettings) {
        let mut given: HashSet<&str> = settings.heads_by_case.iter().map(String::as_str).collect();
        given.extend(settings.sources.iter().filter_map(|source| match &source.at {
            SourceAt::Id(id) => Some(id.as_str()),
            SourceAt::Point(_) => None,
        }));
        let without = nodes
            .iter()
            .filter(|node| node.kind != NodeKind::Node && node.head_m.is_none());
        let origins = without.filter_map(|node| node.origin);
        let missed: Vec<Finding> = origins
            .filter(|origin| !self.names.id(*origin).is_some_and(|id| given.contains(id)))
            .map(|origin| {
                let said = Sentence::new()
                    .feature(origin)
                    .text(" is a source or a tank without a known head: it feeds nothing");
                Finding::new(Code::ValueUnreadable, said).on(origin)
            })
            .collect();
        self.report(missed, |count| {
            format!("{count} sources and tanks have no known head: they feed nothing").into()
        });
    }

    fn node_kinds(&mut self, wanted: &NodesColumns, taking_part: &[bool]) -> Result<Vec<NodeKind>, Error> {
        let layer = wanted.common.layer;
        let mut kinds = vec![NodeKind::Node; taking_part.len()];
        let Some(column) = self.maybe_column(layer, "kind", wanted.kind.as_ref())? else {
            return Ok(kinds);
        };
        let mut unknown = Vec::new();
        for (row, cell) in column.cells.iter().enumerate().filter(|(row, _)| taking_part[*row]) {
            let Some(text) = cells::text(cell) else { continue };
            if let Some(device) = words::device_elsewhere(&text) {
                let feature = FeatureRef { layer, row: row as u32 };
                return Err(self.not_yet(feature, device, &column.name, &text));
            }
            match words::node_kind(&text) {
                Some(kind) => kinds[row] = kind,
                None => unknown.push((text, FeatureRef { layer, row: row as u32 })),
            }
        }
        for (word, features) in by_word(unknown) {
            let said = format!(
                "the kind `{word}` ({}) is not known here and counts as a plain node",
                Role::Node.counted(features.len())
            );
            self.report_together(Code::ValueUnreadable, Severity::Note, &features, said.into());
        }
        Ok(kinds)
    }

    /// Elevations, m, by row. Node points without one are said, together.
    pub fn elevations(
        &mut self,
        layer: u16,
        column: Option<&UnitColumn>,
        role: Role,
        taking_part: &[bool],
    ) -> Result<Vec<Option<f64>>, Error> {
        let elevations = self.lengths(layer, "elevation", column, Meaning::Elevation, taking_part)?;
        if column.is_some() && role == Role::Node {
            let rows = (0..taking_part.len()).filter(|row| taking_part[*row] && elevations[*row].is_none());
            let without: Vec<FeatureRef> = rows.map(|row| FeatureRef { layer, row: row as u32 }).collect();
            let said = match without.as_slice() {
                [one] => Sentence::new().feature(*one).text(" has no elevation"),
                many => format!("{} nodes have no elevation", many.len()).into(),
            };
            self.report_together(Code::ElevationMissing, Severity::Note, &without, said);
        }
        Ok(elevations)
    }

    /// A column of lengths, m, by row; `None` for every row when the study names none.
    pub fn lengths(
        &mut self,
        layer: u16,
        key: &'static str,
        column: Option<&UnitColumn>,
        meaning: Meaning,
        taking_part: &[bool],
    ) -> Result<Vec<Option<f64>>, Error> {
        self.optional(layer, key, column, Quantity::Length, meaning, taking_part)
    }

    /// A column of numbers in SI, by row; `None` for every row when the study names none.
    pub fn optional(
        &mut self,
        layer: u16,
        key: &'static str,
        column: Option<&UnitColumn>,
        quantity: Quantity,
        meaning: Meaning,
        taking_part: &[bool],
    ) -> Result<Vec<Option<f64>>, Error> {
        let Some(column) = column else {
            return Ok(vec![None; taking_part.len()]);
        };
        let wanted = Wanted {
            layer,
            key,
            column,
            quantity,
            meaning,
            taking_part,
        };
        let read = self.read_numbers(&wanted, |_| None)?;
        Ok(read.slots.iter().map(Slot::value).collect())
    }

    /// Average-day demands, m3/s, not below zero; zero where there is none. Missing and negative ones are said.
    pub fn demands(
        &mut self,
        layer: u16,
        column: Option<&UnitColumn>,
        role: Role,
        taking_part: &[bool],
    ) -> Result<Vec<f64>, Error> {
        let read = self.optional(layer, "demand", column, Quantity::Flow, Meaning::Demand, taking_part)?;
        // Customers are there for their demand; nodes without one are usual where no column is named.
        if column.is_some() || role == Role::Customer {
            self.say_without_demand(layer, &read, role, taking_part);
        }
        let mut negative = Vec::new();
        let demands = read.iter().enumerate().map(|(row, demand)| {
            let value = demand.unwrap_or(0.0);
            if value < 0.0 && taking_part[row] {
                let feature = FeatureRef { layer, row: row as u32 };
                let said = Sentence::new()
                    .feature(feature)
                    .text(" has a demand of ")
                    .number(value, Quantity::Flow);
                negative.push(
                    Finding::new(Code::DemandNegative, said)
                        .on(feature)
                        .measured(value, Quantity::Flow),
                );
            }
            value.max(0.0)
        });
        let demands = demands.collect();
        self.report(negative, |count| format!("{count} demands are below zero").into());
        Ok(demands)
    }

    fn say_without_demand(&mut self, layer: u16, read: &[Option<f64>], role: Role, taking_part: &[bool]) {
        let all = features(layer, taking_part);
        let without = all
            .iter()
            .copied()
            .filter(|feature| read[feature.row as usize].is_none());
        let without: Vec<FeatureRef> = without.collect();
        let many = without.len() as f64 > MANY_WITHOUT_DEMAND * all.len() as f64;
        let severity = if many && role == Role::Customer {
            Severity::Warning
        } else {
            Severity::Note
        };
        let said = match without.as_slice() {
            [one] => Sentence::new().feature(*one).text(" has no demand: it draws nothing"),
            many => format!("{} {}s have no demand: they draw nothing", many.len(), role.word()).into(),
        };
        self.report_together(Code::DemandMissing, severity, &without, said);
    }
}

/// Every name of a column that a nodes layer is read by.
pub(super) fn wanted_columns(wanted: &NodesColumns) -> Vec<String> {
    let with_unit = [&wanted.elevation, &wanted.head, &wanted.demand].into_iter().flatten();
    let names = with_unit.map(|column| column.column.clone()).chain(wanted.kind.clone());
    names.chain(columns::common(&wanted.common)).collect()
}
