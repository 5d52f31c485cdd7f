//! The desk that all readers work at: the layer in hand, and what has been noticed so far.

use std::collections::HashMap;

use super::cells;
use super::reading::{Fillers, LeftOut, UnitUsed};
use super::settings::LayerColumns;
use super::{Names, Point, Role};
use crate::finding::{Code, Error, FeatureRef, Finding, Sentence, Severity};
use crate::layers::{Column, Layer, LayerSet, LocalPlane, Shape};

/// Findings of one kind in one layer are listed one by one up to this many; above, one finding names all features.
const SINGLY_AT_MOST: usize = 200;

/// Texts by number, each once.
#[derive(Default)]
pub(super) struct Interned {
    pub texts: Vec<String>,
    index: HashMap<String, u32>,
}

impl Interned {
    /// The number of a text. Case and blanks at the ends do not count; the first spelling is kept.
    pub fn number(&mut self, text: &str) -> u32 {
        let next = self.texts.len() as u32;
        *self.index.entry(text.trim().to_lowercase()).or_insert_with(|| {
            self.texts.push(text.trim().to_string());
            next
        })
    }
}

/// What the readers share.
pub(super) struct Desk<'a> {
    pub set: &'a LayerSet,
    pub plane: &'a LocalPlane,
    pub findings: Vec<Finding>,
    pub names: Names,
    pub units: Vec<UnitUsed>,
    pub fillers: Vec<Fillers>,
    pub left_out: Vec<LeftOut>,
    pub zones: Interned,
    pub classes: Interned,
}

/// The column of a layer without rows.
static NO_ROWS: Column = Column {
    name: String::new(),
    cells: Vec::new(),
};

impl<'a> Desk<'a> {
    /// A desk with nothing on it.
    pub fn new(set: &'a LayerSet, plane: &'a LocalPlane) -> Desk<'a> {
        Desk {
            set,
            plane,
            findings: Vec::new(),
            names: Names::default(),
            units: Vec::new(),
            fillers: Vec::new(),
            left_out: Vec::new(),
            zones: Interned::default(),
            classes: Interned::default(),
        }
    }

    /// The layer of an index.
    pub fn layer(&self, index: u16) -> &'a Layer {
        &self.set.layers[usize::from(index)]
    }

    /// A column that the study names.
    pub fn column(&self, layer: u16, key: &str, name: &str) -> Result<&'a Column, Error> {
        let layer = self.layer(layer);
        // GeoJSON without features has no columns to look for; a layer that is empty today is no error.
        if layer.rows() == 0 && layer.column_names.is_empty() {
            return Ok(&NO_ROWS);
        }
        layer.column(name).ok_or_else(|| {
            let nearest = crate::finding::nearest(name, layer.column_names.iter().map(String::as_str));
            let todo = match nearest {
                Some(nearest) => format!("The nearest is `{nearest}`."),
                None => format!("Its columns are: {}.", layer.column_names.join(", ")),
            };
            Error::input(
                &layer.source.path,
                format!("there is no column `{name}`, which the study names as `{key}`"),
                todo,
            )
        })
    }

    /// A column that the study may name.
    pub fn maybe_column(&self, layer: u16, key: &str, name: Option<&String>) -> Result<Option<&'a Column>, Error> {
        name.map(|name| self.column(layer, key, name)).transpose()
    }

    /// Adds findings of one kind in one layer: one by one, or as a single one that names all features when there are many.
    pub fn report(&mut self, mut found: Vec<Finding>, many: impl Fn(usize) -> Sentence) {
        if found.len() <= SINGLY_AT_MOST {
            self.findings.append(&mut found);
            return;
        }
        let message = many(found.len());
        let mut all = Finding::new(found[0].code, message).severity(found[0].severity);
        all.feature = found[0].feature;
        all.others = found
            .iter()
            .flat_map(|finding| finding.feature.into_iter().chain(finding.others.iter().copied()))
            .filter(|other| Some(*other) != all.feature)
            .collect();
        self.findings.push(all);
    }

    /// One finding about several features of a layer; none if there are no features.
    pub fn report_together(&mut self, code: Code, severity: Severity, features: &[FeatureRef], message: Sentence) {
        if let Some((first, others)) = features.split_first() {
            let mut finding = Finding::new(code, message).severity(severity).on(*first);
            finding.others = others.to_vec();
            self.findings.push(finding);
        }
    }

    /// Counts a filler.
    pub fn count_filler(&mut self, layer: u16, key: &'static str, filler: &str) {
        let filler = if filler.is_empty() { "(empty)" } else { filler };
        let mut known = self.fillers.iter_mut().rev();
        match known.find(|known| known.layer == layer && known.key == key && known.filler == filler) {
            Some(known) => known.count += 1,
            None => self.fillers.push(Fillers {
                layer,
                key,
                filler: filler.to_string(),
                count: 1,
            }),
        }
    }

    /// Reads the ids of a layer, and hands them to the names.
    pub fn read_ids(&mut self, common: &LayerColumns, role: Role) -> Result<(), Error> {
        let column = self.maybe_column(common.layer, "id", common.id.as_ref())?;
        let ids = column.map_or_else(Vec::new, |column| column.cells.iter().map(cells::id).collect());
        self.names.add(common.layer, role, ids);
        Ok(())
    }

    /// The zone of each row; `None` for every row when the study names no zone column.
    pub fn read_zones(&mut self, common: &LayerColumns) -> Result<Vec<Option<u32>>, Error> {
        let column = self.maybe_column(common.layer, "zone", common.zone.as_ref())?;
        let zones = &mut self.zones;
        Ok(match column {
            Some(column) => column
                .cells
                .iter()
                .map(|cell| cells::text(cell).map(|text| zones.number(&text)))
                .collect(),
            None => vec![None; self.layer(common.layer).rows() as usize],
        })
    }

    /// Ids that are missing or repeated among the features that take part.
    pub fn check_ids(&mut self, features: &[FeatureRef], role: Role) {
        let mut by_id: HashMap<&str, Vec<FeatureRef>> = HashMap::new();
        let mut missing = Vec::new();
        for feature in features {
            match self.names.id(*feature) {
                Some(id) => by_id.entry(id).or_default().push(*feature),
                None if self.names.has_ids(feature.layer) => missing.push(*feature),
                None => {}
            }
        }
        let mut repeated: Vec<Finding> = by_id
            .into_iter()
            .filter(|(_, features)| features.len() > 1)
            .map(|(id, features)| {
                let said = format!("{} {}s carry the id {id}", features.len(), role.word());
                let mut finding = Finding::new(Code::IdRepeated, said.into()).on(features[0]);
                finding.others = features[1..].to_vec();
                finding
            })
            .collect();
        repeated.sort_by_key(|finding| finding.feature);
        self.report(repeated, |count| {
            format!("{count} ids are carried by several {}s each", role.word()).into()
        });
        let said = match missing.as_slice() {
            [one] => Sentence::new().feature(*one).text(" has no id"),
            many => format!("{} {}s have no id", many.len(), role.word()).into(),
        };
        self.report_together(Code::IdMissing, Severity::Note, &missing, said);
    }

    /// Refuses a device that is not calculated: left out in silence it would make every pressure behind it wrong.
    pub fn not_yet(&self, feature: FeatureRef, device: &str, column: &str, text: &str) -> Error {
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

    /// The point of every row in the local plane. A row without a usable one gets a finding, unless it does not take part.
    pub fn read_points(&mut self, layer: u16, taking_part: &[bool], role: Role) -> Result<Vec<Option<Point>>, Error> {
        let read = self.layer(layer);
        let mut drawn = Vec::new();
        let mut rows = Vec::new();
        let mut found = Vec::new();
        for row in 0..read.rows() {
            let problem = match read.shape(row) {
                Shape::Point(at) if at.iter().all(|axis| axis.is_finite()) => {
                    drawn.push(at);
                    rows.push(row as usize);
                    continue;
                }
                Shape::Missing => (Code::GeometryMissing, " has no geometry".to_string()),
                Shape::NotFinite | Shape::Point(_) => (
                    Code::GeometryNotFinite,
                    " has a coordinate that is not a finite number".to_string(),
                ),
                Shape::Lines { .. } => (
                    Code::GeometryOtherType,
                    format!(" is a line, not a point, in the layer of {}s", role.word()),
                ),
                Shape::Other(kind) => (
                    Code::GeometryOtherType,
                    format!(" is a {kind}, not a point, in the layer of {}s", role.word()),
                ),
            };
            if taking_part[row as usize] {
                let feature = FeatureRef { layer, row };
                found.push(Finding::new(problem.0, Sentence::new().feature(feature).text(problem.1)).on(feature));
            }
        }
        let mut points = vec![None; read.rows() as usize];
        for (row, place) in rows.into_iter().zip(self.plane.to_plane(&read.crs, &drawn)?) {
            points[row] = Some(place).filter(|place| place.iter().all(|axis| axis.is_finite()));
        }
        self.report(found, |count| {
            format!("{count} {}s have no usable geometry", role.word()).into()
        });
        Ok(points)
    }
}

/// The features of a layer that take part, in file order.
pub(super) fn features(layer: u16, taking_part: &[bool]) -> Vec<FeatureRef> {
    let rows = taking_part.iter().enumerate().filter(|(_, takes_part)| **takes_part);
    rows.map(|(row, _)| FeatureRef { layer, row: row as u32 }).collect()
}
