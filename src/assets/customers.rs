//! Customers.

use super::columns;
use super::desk::{Desk, features};
use super::sentinels::Meaning;
use super::settings::{CustomersColumns, NumberOrColumn};
use super::{Customer, Role, cells};
use crate::finding::{Error, FeatureRef};

impl Desk<'_> {
    /// Reads a layer of customers.
    pub fn read_customers(&mut self, wanted: &CustomersColumns) -> Result<Vec<Customer>, Error> {
        let layer = wanted.common.layer;
        self.read_ids(&wanted.common, Role::Customer)?;
        let taking_part = self.select(&wanted.common, Role::Customer, true)?;
        let points = self.read_points(layer, &taking_part, Role::Customer)?;
        let elevations = self.elevations(layer, wanted.elevation.as_ref(), Role::Customer, &taking_part)?;
        let demands = self.demands(layer, wanted.demand.as_ref(), Role::Customer, &taking_part)?;
        let classes = self.customer_classes(wanted)?;
        let lifts = match &wanted.lift {
            None => vec![0.0; taking_part.len()],
            Some(NumberOrColumn::Number(lift_m)) => vec![*lift_m; taking_part.len()],
            Some(NumberOrColumn::Column(column)) => {
                let lifts = self.lengths(layer, "lift", Some(column), Meaning::Lift, &taking_part)?;
                lifts.into_iter().map(|lift_m| lift_m.unwrap_or(0.0)).collect()
            }
        };
        let zones = self.read_zones(&wanted.common)?;
        let rows = (0..taking_part.len()).filter(|row| taking_part[*row]);
        let customers = rows.map(|row| Customer {
            origin: FeatureRef { layer, row: row as u32 },
            at: points[row],
            demand_m3_per_s: demands[row],
            class: classes[row],
            elevation_m: elevations[row],
            lift_m: lifts[row],
            zone: zones[row],
        });
        let customers = customers.collect();
        self.check_ids(&features(layer, &taking_part), Role::Customer);
        Ok(customers)
    }

    fn customer_classes(&mut self, wanted: &CustomersColumns) -> Result<Vec<Option<u32>>, Error> {
        let layer = wanted.common.layer;
        let column = self.maybe_column(layer, "class", wanted.class.as_ref())?;
        let classes = &mut self.classes;
        Ok(match column {
            Some(column) => column
                .cells
                .iter()
                .map(|cell| cells::text(cell).map(|text| classes.number(&text)))
                .collect(),
            None => vec![None; self.layer(layer).rows() as usize],
        })
    }
}

/// Every name of a column that a customers layer is read by.
pub(super) fn wanted_columns(wanted: &CustomersColumns) -> Vec<String> {
    let lift = match &wanted.lift {
        Some(NumberOrColumn::Column(column)) => Some(column),
        _ => None,
    };
    let with_unit = [wanted.demand.as_ref(), wanted.elevation.as_ref(), lift]
        .into_iter()
        .flatten();
    let names = with_unit
        .map(|column| column.column.clone())
        .chain(wanted.class.clone());
    names.chain(columns::common(&wanted.common)).collect()
}
