//! Hydrants.

use super::columns;
use super::desk::{Desk, features};
use super::sentinels::Meaning;
use super::settings::HydrantsColumns;
use super::{Basis, Hydrant, Role, Valued};
use crate::finding::{Error, FeatureRef};
use crate::units::Quantity;

impl Desk<'_> {
    /// Reads a layer of hydrants.
    pub fn read_hydrants(&mut self, wanted: &HydrantsColumns, at_own_elevation: bool) -> Result<Vec<Hydrant>, Error> {
        let layer = wanted.common.layer;
        self.read_ids(&wanted.common, Role::Hydrant)?;
        let taking_part = self.select(&wanted.common, Role::Hydrant, true)?;
        let points = self.read_points(layer, &taking_part, Role::Hydrant)?;
        let elevations = self.elevations(layer, wanted.elevation.as_ref(), Role::Hydrant, &taking_part)?;
        let (quantity, meaning) = (Quantity::Flow, Meaning::NeededFlow);
        let needed = self.optional(
            layer,
            "needed_flow",
            wanted.needed_flow.as_ref(),
            quantity,
            meaning,
            &taking_part,
        )?;
        let zones = self.read_zones(&wanted.common)?;
        let rows = (0..taking_part.len()).filter(|row| taking_part[*row]);
        let hydrants = rows.map(|row| Hydrant {
            origin: FeatureRef { layer, row: row as u32 },
            at: points[row],
            elevation_m: elevations[row].filter(|_| at_own_elevation),
            needed_m3_per_s: needed[row].filter(|flow| *flow > 0.0).map(|value| Valued {
                value,
                basis: Basis::Map,
            }),
            zone: zones[row],
        });
        let hydrants = hydrants.collect();
        self.check_ids(&features(layer, &taking_part), Role::Hydrant);
        Ok(hydrants)
    }
}

/// Every name of a column that a hydrants layer is read by.
pub(super) fn wanted_columns(wanted: &HydrantsColumns) -> Vec<String> {
    let with_unit = [&wanted.elevation, &wanted.needed_flow].into_iter().flatten();
    with_unit
        .map(|column| column.column.clone())
        .chain(columns::common(&wanted.common))
        .collect()
}
