//! The reading itself: every layer in turn, then what needs several of them.

use std::path::Path;

use super::desk::Desk;
use super::settings::AssetSettings;
use super::{Assets, Point, Reading, customers, hydrants, mains, nodes, supply, valves};
use crate::finding::{Checked, Error};
use crate::layers::{Layer, LayerSet, LocalPlane};

/// The columns that each layer must be read with, by layer index.
pub fn wanted_columns(settings: &AssetSettings) -> Vec<(u16, Vec<String>)> {
    let mains = settings
        .mains
        .iter()
        .map(|layer| (layer.common.layer, mains::wanted_columns(layer)));
    let nodes = settings
        .nodes
        .iter()
        .map(|layer| (layer.common.layer, nodes::wanted_columns(layer)));
    let hydrants = settings
        .hydrants
        .iter()
        .map(|layer| (layer.common.layer, hydrants::wanted_columns(layer)));
    let customers = settings
        .customers
        .iter()
        .map(|layer| (layer.common.layer, customers::wanted_columns(layer)));
    let valves = settings
        .valves
        .iter()
        .map(|layer| (layer.common.layer, valves::wanted_columns(layer)));
    let mut all: Vec<(u16, Vec<String>)> = mains
        .chain(nodes)
        .chain(hydrants)
        .chain(customers)
        .chain(valves)
        .collect();
    for (_, columns) in &mut all {
        columns.sort();
        columns.dedup();
    }
    all
}

/// Reads the columns of every layer of the study; `study` is the study file, for messages.
///
/// # Errors
/// A column that a layer does not have, a unit that cannot be told, a layer that lies nowhere near the mains, a device
/// that this version does not calculate: each with the layer, the column or the feature, and what to do.
pub fn read(
    set: &LayerSet,
    settings: &AssetSettings,
    plane: &LocalPlane,
    study: &Path,
) -> Result<Checked<Reading>, Error> {
    let mut desk = Desk::new(set, plane);
    check_places(&desk, settings)?;
    let mut assets = read_layers(&mut desk, settings)?;
    desk.add_sources(settings, study, &assets.mains, &mut assets.nodes)?;
    desk.say_left_out();
    assets.zones = desk.zones.texts;
    assets.classes = desk.classes.texts;
    Ok(Checked {
        value: Reading {
            assets,
            names: desk.names,
            units: desk.units,
            fillers: desk.fillers,
            left_out: desk.left_out,
        },
        findings: desk.findings,
    })
}

/// Reads every layer in turn. The names of zones and classes are still at the desk.
fn read_layers(desk: &mut Desk<'_>, settings: &AssetSettings) -> Result<Assets, Error> {
    let mut assets = Assets {
        mains: Vec::new(),
        left_out: Vec::new(),
        nodes: Vec::new(),
        hydrants: Vec::new(),
        customers: Vec::new(),
        valves: Vec::new(),
        zones: Vec::new(),
        classes: Vec::new(),
        reach: settings.reach,
    };
    for layer in &settings.mains {
        let (read, out) = desk.read_mains(layer, settings)?;
        assets.mains.extend(read);
        assets.left_out.extend(out);
    }
    for layer in &settings.nodes {
        assets.nodes.extend(desk.read_nodes(layer, settings)?);
    }
    for layer in &settings.hydrants {
        let read = desk.read_hydrants(layer, settings.hydrants_at_own_elevation)?;
        assets.hydrants.extend(read);
    }
    for layer in &settings.customers {
        assets.customers.extend(desk.read_customers(layer)?);
    }
    for layer in &settings.valves {
        let read = desk.read_valves(layer, &assets.mains)?;
        assets.valves.extend(read);
    }
    Ok(assets)
}

/// Stops when a layer lies nowhere near the mains: joined to nothing, it would only look like a thousand faults of the map.
fn check_places(desk: &Desk<'_>, settings: &AssetSettings) -> Result<(), Error> {
    let mains_layer = desk.layer(settings.mains[0].common.layer);
    let Some(mains) = corners_in_plane(desk, mains_layer)? else {
        return Ok(());
    };
    for index in wanted_columns(settings).into_iter().map(|(index, _)| index) {
        let layer = desk.layer(index);
        let Some(own) = corners_in_plane(desk, layer)? else {
            continue;
        };
        if is_apart(mains, own) {
            return Err(far_off(mains_layer, layer, mains, own));
        }
    }
    Ok(())
}

fn far_off(mains_layer: &Layer, layer: &Layer, mains: [f64; 4], own: [f64; 4]) -> Error {
    let middle = |bounds: [f64; 4]| [(bounds[0] + bounds[2]) / 2.0, (bounds[1] + bounds[3]) / 2.0];
    let ([x, y], [own_x, own_y]) = (middle(mains), middle(own));
    let distance_km = (own_x - x).hypot(own_y - y) / 1e3;
    let distance = if distance_km.is_finite() {
        format!("{distance_km:.0} km from the mains")
    } else {
        "nowhere near the mains".into()
    };
    let swapped = layer.bounds().is_some_and(|[min_x, min_y, max_x, max_y]| {
        let middle = [(min_y + max_y) / 2.0, (min_x + max_x) / 2.0];
        layer.crs == mains_layer.crs
            && mains_layer
                .bounds()
                .is_some_and(|bounds| !supply::is_far_outside(bounds, middle))
    });
    let todo = if swapped {
        "Its two coordinates seem to be swapped: x (longitude, easting) comes first.".to_string()
    } else {
        format!(
            "It is read as {}, the mains as {}: check the reference system that each file states (.prj, or the `crs` member).",
            layer.crs.name, mains_layer.crs.name
        )
    };
    Error::input(&layer.source.path, format!("the layer lies {distance}"), todo)
}

/// Bounds of a layer in the plane, by its corners; infinite where a corner has no place there.
fn corners_in_plane(desk: &Desk<'_>, layer: &Layer) -> Result<Option<[f64; 4]>, Error> {
    let Some([min_x, min_y, max_x, max_y]) = layer.bounds() else {
        return Ok(None);
    };
    let corners: [Point; 4] = [[min_x, min_y], [max_x, min_y], [max_x, max_y], [min_x, max_y]];
    let places = desk.plane.to_plane(&layer.crs, &corners)?;
    let mut bounds = [f64::INFINITY, f64::INFINITY, f64::NEG_INFINITY, f64::NEG_INFINITY];
    for place in places {
        bounds = [
            bounds[0].min(place[0]),
            bounds[1].min(place[1]),
            bounds[2].max(place[0]),
            bounds[3].max(place[1]),
        ];
    }
    Ok(Some(bounds))
}

/// Whether two bounds lie farther from one another than the first is wide and high together.
fn is_apart(mains: [f64; 4], other: [f64; 4]) -> bool {
    let slack = (mains[2] - mains[0]) + (mains[3] - mains[1]);
    other[0] > mains[2] + slack
        || other[2] < mains[0] - slack
        || other[1] > mains[3] + slack
        || other[3] < mains[1] - slack
}
