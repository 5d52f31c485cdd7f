//! The one list of all columns that are written. Writers, recheck, decisions and the docs go by it.
//!
//! A name is a stem and the unit it is written in, fits ten characters (what a shapefile can hold) and is the same in
//! every format. Where stem and unit together are longer, the stem is cut: `at_need_m`, but `at_nee_psi`.

use crate::units::{Quantity, Unit, UnitSystem};

/// What a column holds.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Holds {
    /// Words.
    Text,
    /// A count.
    Whole,
    /// A number with this many decimals.
    Real(u8),
}

/// A column that is written.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ResultColumn {
    /// Its name without the unit.
    pub stem: &'static str,
    /// What it measures; decides the unit it ends in.
    pub quantity: Quantity,
    /// What it holds.
    pub holds: Holds,
    /// What it means, for the docs.
    pub means: &'static str,
}

/// Longest name that a shapefile can hold.
const LONGEST: usize = 10;

impl ResultColumn {
    /// The name it is written under.
    pub fn name(&self, system: UnitSystem) -> String {
        let suffix = Unit::written(self.quantity, system).suffix;
        if suffix.is_empty() {
            return self.stem.to_string();
        }
        let room = LONGEST - 1 - suffix.len();
        let stem = if self.stem.len() > room {
            &self.stem[..room]
        } else {
            self.stem
        };
        format!("{stem}_{suffix}")
    }
}

const fn text(stem: &'static str, means: &'static str) -> ResultColumn {
    ResultColumn {
        stem,
        quantity: Quantity::Plain,
        holds: Holds::Text,
        means,
    }
}

const fn whole(stem: &'static str, means: &'static str) -> ResultColumn {
    ResultColumn {
        stem,
        quantity: Quantity::Plain,
        holds: Holds::Whole,
        means,
    }
}

const fn real(stem: &'static str, quantity: Quantity, decimals: u8, means: &'static str) -> ResultColumn {
    ResultColumn {
        stem,
        quantity,
        holds: Holds::Real(decimals),
        means,
    }
}

/// Decimals of values that a recheck starts from: far below the residuals that are accepted.
const EXACT: u8 = 10;

/// Appended to each mains layer.
pub const MAINS: &[ResultColumn] = &[
    real(
        "flow",
        Quantity::Flow,
        4,
        "flow in the case of the highest velocity, positive along the drawn line; of the fastest part",
    ),
    real(
        "vel",
        Quantity::Velocity,
        4,
        "highest velocity in any case, of the fastest part",
    ),
    text("vel_flag", "`ok`, `high` or `untested`"),
    text("vel_case", "the case of the highest velocity"),
    real("grad", Quantity::Gradient, 4, "steepest hydraulic gradient in any case"),
    text(
        "grad_flag",
        "`ok`, `high`, `untested` or `not judged` (a part under a metre)",
    ),
    text("grad_case", "the case of the steepest gradient"),
    real("used", Quantity::Diameter, 3, "bore calculated with"),
    text("diam_basis", "where the bore came from"),
    real("used_c", Quantity::Plain, 2, "C-factor calculated with"),
    real("rough", Quantity::Roughness, 5, "roughness height calculated with"),
    text("c_basis", "where the C-factor or roughness came from"),
    whole("parts", "pieces it was calculated in"),
    text(
        "served",
        "`yes`, `unserved` (no source), `left out` (by a rule), `duplicate` or `not drawn`",
    ),
];

/// The parts layer.
pub const PARTS: &[ResultColumn] = &[
    text("part", "its name"),
    text("main", "id of the main it is a piece of"),
    text("node_a", "node at its start, in the drawn direction"),
    text("node_b", "node at its end"),
    real("length", Quantity::Length, EXACT, "length calculated with"),
    real("used", Quantity::Diameter, EXACT, "bore calculated with"),
    real("used_c", Quantity::Plain, EXACT, "C-factor calculated with"),
    real("rough", Quantity::Roughness, EXACT, "roughness height calculated with"),
    real("minor_k", Quantity::Plain, EXACT, "minor loss coefficient"),
    real("flow", Quantity::Flow, 6, "flow in the case of the highest velocity"),
    real("vel", Quantity::Velocity, 6, "highest velocity in any case"),
];

/// The nodes layer.
pub const NODES: &[ResultColumn] = &[
    text(
        "node",
        "its name: the id of the user's point that stands there, else `node` and a number",
    ),
    text("kind", "`node`, `source` or `tank`"),
    text("zone", "pressure zone, where the map names it"),
    real("elev", Quantity::Length, 4, "elevation"),
    text("elev_basis", "where the elevation came from"),
    real("head", Quantity::Length, 6, "head in the case of the lowest pressure"),
    real("pres", Quantity::Pressure, 6, "lowest pressure in any case"),
    text("low_flag", "`ok`, `low`, `untested` or `not judged`"),
    text("low_case", "the case of the lowest pressure"),
    real(
        "margin",
        Quantity::Pressure,
        4,
        "lowest pressure less its limit: positive passes",
    ),
    real("pmax", Quantity::Pressure, 4, "pressure when nobody draws"),
    text("high_flag", "`ok`, `high` or `untested`"),
    text("high_case", "the case of the highest pressure"),
];

/// Appended to each hydrants layer.
pub const HYDRANTS: &[ResultColumn] = &[
    text("node", "node it taps"),
    real(
        "static",
        Quantity::Pressure,
        4,
        "pressure in the fire case with no hydrant open",
    ),
    real("need", Quantity::Flow, 4, "needed fire flow"),
    real("avail", Quantity::Flow, 6, "flow it can give at its own residual limit"),
    real(
        "safe",
        Quantity::Flow,
        6,
        "flow at which the first limit anywhere is met",
    ),
    real("short", Quantity::Flow, 4, "how much of the needed flow is missing"),
    real(
        "at_need",
        Quantity::Pressure,
        4,
        "pressure while it gives the needed flow; below zero: it cannot",
    ),
    text("fire_flag", "`ok`, `short`, `unserved`, `untested` or `not judged`"),
    text("limit_by", "what limits it"),
    text("limit_at", "where"),
    text("judged_at", "whose elevation counts: `hydrant` or `main`"),
];

/// Appended to each customers layer.
pub const CUSTOMERS: &[ResultColumn] = &[
    text("on_main", "id of the main that serves it"),
    text("node", "node that its draw goes to"),
    real(
        "pres",
        Quantity::Pressure,
        4,
        "lowest pressure at its highest tap in any case",
    ),
    text("low_flag", "`ok`, `low` or `untested`"),
    text("low_case", "the case of the lowest pressure"),
    real(
        "margin",
        Quantity::Pressure,
        4,
        "lowest pressure less its limit: positive passes",
    ),
];

/// The joins layer.
pub const JOINS: &[ResultColumn] = &[
    text("join", "its name"),
    text("kind", "how the two were found to connect, or why they were thought to"),
    real("dist", Quantity::Length, 4, "distance between the two"),
    text("main_a", "id of the main whose end it is"),
    text("main_b", "id of the main it meets"),
    text("joined", "`yes` or `no`"),
    text("why", "what speaks for it and against it"),
    text("decision", "for the analyst to fill in: `join` or `apart`"),
];

/// The devices layer.
pub const DEVICES: &[ResultColumn] = &[
    text("device", "its id"),
    text("kind", "what it is"),
    text("node_a", "node on the side of its main's start"),
    text("node_b", "node on the side of its main's end"),
    text("state", "`closed`"),
    real("flow", Quantity::Flow, 4, "flow through it"),
    real("head_a", Quantity::Length, 4, "head on the one side, in the first case"),
    real(
        "head_b",
        Quantity::Length,
        4,
        "head on the other side, in the first case",
    ),
];

/// The findings layer.
pub const FINDINGS: &[ResultColumn] = &[
    text("code", "what kind of finding; `gradeline explain CODE` says more"),
    text("about", "`map` or `water`"),
    text("severity", "`note`, `warning` or `serious`"),
    text("layer", "layer of the feature it is about"),
    text("feature", "the user's id of that feature"),
    text("other", "ids of other features that take part"),
    real("measured", Quantity::Plain, 4, "what was measured"),
    real("limit_val", Quantity::Plain, 4, "the limit it was held against"),
    text("limit_from", "where the limit came from"),
    text("unit", "unit of both"),
    text("message", "what is"),
    text("hint", "what to do"),
];

/// The table of nodes in each case.
pub const NODE_CASES: &[ResultColumn] = &[
    text("node", "the node"),
    text("in_case", "the case"),
    real("head", Quantity::Length, EXACT, "head"),
    real("pres", Quantity::Pressure, EXACT, "pressure"),
    real(
        "out",
        Quantity::Flow,
        EXACT,
        "outflow: what is drawn there, less what a source feeds in",
    ),
];

/// The table of parts in each case.
pub const PART_CASES: &[ResultColumn] = &[
    text("part", "the part"),
    text("in_case", "the case"),
    real("flow", Quantity::Flow, EXACT, "flow, positive along the drawn line"),
    real("vel", Quantity::Velocity, EXACT, "velocity"),
    real(
        "loss",
        Quantity::Length,
        EXACT,
        "head at its start less head at its end",
    ),
    text("state", "`open`"),
];

/// Every layer and table that is written, with its columns.
pub const LAYERS: &[(&str, &[ResultColumn])] = &[
    ("mains", MAINS),
    ("parts", PARTS),
    ("nodes", NODES),
    ("hydrants", HYDRANTS),
    ("customers", CUSTOMERS),
    ("joins", JOINS),
    ("devices", DEVICES),
    ("findings", FINDINGS),
    ("node_cases", NODE_CASES),
    ("part_cases", PART_CASES),
];

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_fit_a_shapefile_and_do_not_clash() {
        for system in [UnitSystem::Si, UnitSystem::Us] {
            for (layer, columns) in LAYERS {
                let mut names: Vec<String> = columns.iter().map(|column| column.name(system)).collect();
                assert!(
                    names
                        .iter()
                        .all(|name| name.len() <= LONGEST && *name == name.to_lowercase()),
                    "{layer}: {names:?}"
                );
                names.sort();
                names.dedup();
                assert_eq!(names.len(), columns.len(), "{layer}");
            }
        }
    }
}
