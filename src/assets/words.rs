//! Words in columns of status and kind, and what they are taken to mean. The lists are trade usage: common practice, no source.

use super::{MainKind, NodeKind, ValveKind};
use crate::layers::Cell;

/// Rows whose status is one of these take no part, whatever the layer.
const NOT_IN_USE: &[&str] = &["abd", "abn", "dead", "design", "designed", "future"];

/// Words that say the same when more stands beside them: `AB - Abandoned`, `Retired 1998`.
const NOT_IN_USE_AMONG_OTHERS: &[&str] = &[
    "abandoned",
    "abandon",
    "aband",
    "removed",
    "retired",
    "decommissioned",
    "disused",
    "demolished",
    "out of service",
    "oos",
    "not in service",
    "out of use",
    "not in use",
    "not active",
    "not existing",
    "not built",
    "not installed",
    "proposed",
    "planned",
    "under construction",
    "inactive",
];

/// Statuses of features that take part.
const IN_USE: &[&str] = &[
    "act",
    "exist",
    "as built",
    "installed",
    "current",
    "ok",
    "open",
    "yes",
    "is",
];

/// Words that say the same when more stands beside them.
const IN_USE_AMONG_OTHERS: &[&str] = &[
    "active",
    "in service",
    "in use",
    "existing",
    "live",
    "operational",
    "operating",
];

/// Beside these a word above says something else: `to be abandoned`, `planned replacement`.
const TURNS_IT: &[&str] = &[
    "not",
    "never",
    "no",
    "non",
    "un",
    "to",
    "for",
    "will",
    "if",
    "or",
    "abandonment",
    "removal",
    "replacement",
    "retirement",
    "decommissioning",
    "demolition",
];

/// What a status of a main, node, hydrant or customer says.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Use {
    Live,
    Gone,
    Unknown,
}

/// Lower case, marks as blanks, single blanks.
pub(super) fn plain(text: &str) -> String {
    let lower = text.to_lowercase();
    let words: Vec<&str> = lower
        .split(|letter: char| !letter.is_alphanumeric())
        .filter(|word| !word.is_empty())
        .collect();
    words.join(" ")
}

/// What a status says about a feature's use. A text that says two things is not understood.
pub(super) fn use_of(text: &str) -> Use {
    let said = plain(text);
    if NOT_IN_USE.contains(&said.as_str()) {
        return Use::Gone;
    }
    if IN_USE.contains(&said.as_str()) {
        return Use::Live;
    }
    // `not in service` is taken out whole, before `in service` is looked for.
    let (gone, rest) = without(&said, NOT_IN_USE_AMONG_OTHERS);
    let (live, rest) = without(&rest, IN_USE_AMONG_OTHERS);
    let turned = without(&rest, TURNS_IT).0;
    match (gone, live, turned) {
        (true, false, false) => Use::Gone,
        (false, true, false) => Use::Live,
        _ => Use::Unknown,
    }
}

/// Whether any of some phrases stands in a plain text as whole words, and the text without them.
fn without(said: &str, phrases: &[&str]) -> (bool, String) {
    let before = format!(" {said} ");
    let after = phrases.iter().fold(before.clone(), |text, phrase| {
        text.replace(&format!(" {phrase} "), " | ")
    });
    (after != before, after.trim().to_string())
}

/// Whether any of some words stands in a plain text.
fn has(said: &str, words: &[&str]) -> bool {
    said.split(' ').any(|word| words.contains(&word))
}

/// The full name of a device that this version does not calculate, where a valve's kind says that it is one.
fn device(said: &str) -> Option<&'static str> {
    let has = |words: &[&str]| has(said, words);
    if has(&["check", "nrv", "reflux", "cv", "backflow"]) || said.contains("non return") {
        Some("check valve")
    } else if has(&["prv", "reducing"]) {
        Some("pressure reducing valve")
    } else if has(&["psv", "sustaining"]) {
        Some("pressure sustaining valve")
    } else if has(&["fcv", "rate"]) || said.contains("flow control") {
        Some("flow control valve")
    } else if has(&["altitude"]) {
        Some("altitude valve")
    } else if has(&["throttle", "throttled", "throttling"]) || said.contains("partly open") {
        Some("partly open valve")
    } else if has(&["regulating", "regulator", "control"]) {
        Some("regulating valve")
    } else if has(PUMPS) {
        Some("pump")
    } else {
        None
    }
}

const PUMPS: &[&str] = &["pump", "pumps", "booster", "boosters"];

/// The same outside a layer of valves, where some of the words mean other things: a reducing tee is a fitting, and a pumping
/// main is a main.
pub(super) fn device_elsewhere(text: &str) -> Option<&'static str> {
    let said = plain(text);
    let is_pipe = has(
        &said,
        &[
            "main",
            "mains",
            "pipe",
            "line",
            "pipeline",
            "suction",
            "discharge",
            "delivery",
        ],
    );
    if has(&said, PUMPS) || has(&said, &["pumping"]) && has(&said, &["station"]) {
        return (!is_pipe).then_some("pump");
    }
    let is_valve = has(
        &said,
        &["valve", "valves", "station", "regulator", "prv", "psv", "fcv", "nrv"],
    );
    device(&said).filter(|_| is_valve && !is_pipe)
}

/// What a main's kind says; `None` for a word that is not known. `Err` for what is never calculated: the reason.
pub(super) fn main_kind(text: &str) -> Option<Result<MainKind, &'static str>> {
    let said = plain(text);
    let has = |words: &[&str]| has(&said, words);
    if has(&["raw", "untreated", "reclaimed", "recycled", "rawwater"])
        || said.contains("non potable")
        || said == "nonpotable"
    {
        return Some(Ok(MainKind::RawWater));
    }
    if has(&["private"]) {
        return Some(Err("private"));
    }
    let kind = if has(&["lateral", "laterals", "lead", "branch"]) && !has(&["service"]) || has(&["hydrant", "hyd"]) {
        MainKind::HydrantLateral
    } else if has(&["service", "services", "serv", "svc", "connection"]) {
        MainKind::Service
    } else if has(&["transmission", "trans", "trunk", "tm", "supply", "bulk", "feeder"]) {
        MainKind::Transmission
    } else if has(&[
        "distribution",
        "dist",
        "distr",
        "dm",
        "reticulation",
        "main",
        "mains",
        "potable",
        "water",
    ]) {
        MainKind::Distribution
    } else {
        return None;
    };
    Some(Ok(kind))
}

/// What a node point's kind says; `None` for a word that is not known.
pub(super) fn node_kind(text: &str) -> Option<NodeKind> {
    let said = plain(text);
    let has = |words: &[&str]| has(&said, words);
    if has(&[
        "tank",
        "tanks",
        "storage",
        "standpipe",
        "tower",
        "reservoir",
        "cistern",
        "clearwell",
    ]) || said == "clear well"
    {
        Some(NodeKind::Tank)
    } else if has(&[
        "source", "sources", "well", "spring", "intake", "works", "plant", "wtp", "wtw", "supply", "inlet", "head",
    ]) {
        Some(NodeKind::Source)
    } else if has(&[
        "node", "nodes", "point", "fitting", "tee", "bend", "cross", "cap", "end", "elbow", "reducer", "demand",
        "coupling",
    ]) {
        Some(NodeKind::Node)
    } else {
        None
    }
}

/// What a valve's kind says.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Valves {
    /// One that this version calculates.
    Known(ValveKind),
    /// One that it does not, by its full name.
    NotYet(&'static str),
    /// A word that is not known.
    Unknown,
}

/// Words for valves that are open or shut and nothing else.
const GATES: &[&str] = &[
    "gate",
    "gv",
    "sluice",
    "sv",
    "butterfly",
    "bfv",
    "ball",
    "plug",
    "isolation",
    "isolating",
    "isolator",
    "line",
    "inline",
    "stop",
    "shutoff",
    "stopcock",
    "curb",
    "tapping",
    "hydrant",
    "service",
    "main",
    "system",
    "valve",
];

/// What a valve's kind says.
pub(super) fn valve_kind(text: &str) -> Valves {
    let said = plain(text);
    let has = |words: &[&str]| has(&said, words);
    if let Some(device) = device(&said) {
        return Valves::NotYet(device);
    }
    if has(&["zone", "division", "boundary", "divide"]) {
        Valves::Known(ValveKind::Zone)
    } else if has(&[
        "air", "arv", "av", "vacuum", "blowoff", "bo", "washout", "wo", "scour", "drain", "flush", "flushing",
    ]) || said.contains("blow off")
        || said.contains("wash out")
    {
        Valves::Known(ValveKind::OffLine)
    } else if has(GATES) {
        Valves::Known(ValveKind::Gate)
    } else {
        Valves::Unknown
    }
}

/// Whether a valve's status says that it is shut; `None` where it cannot be told. Numbers, truth values, `yes` and `no` are
/// understood only where the column's name says what they mean (`closed`, `is_open`).
pub(super) fn is_shut(cell: &Cell, column: &str) -> Option<bool> {
    let yes = match cell {
        Cell::Null => return None,
        Cell::Bool(value) => Some(*value),
        Cell::Whole(value) => yes_of_number(*value as f64),
        Cell::Real(value) => yes_of_number(*value),
        Cell::Text(text) => match plain(text).as_str() {
            "closed" | "close" | "shut" | "c" | "cl" | "clsd" | "normally closed" | "normally shut" | "nc" | "n c"
            | "locked closed" | "permanently closed" | "closed valve" => return Some(true),
            "open" | "o" | "opened" | "op" | "normally open" | "n o" | "locked open" | "fully open"
            | "permanently open" | "open valve" => {
                return Some(false);
            }
            "true" | "yes" | "y" | "t" | "1" => Some(true),
            "false" | "no" | "f" | "0" => Some(false),
            _ => None,
        },
    }?;
    let column = plain(column);
    let (open, closed) = (
        column.contains("open"),
        column.contains("closed") || column.contains("shut"),
    );
    match (open, closed) {
        (true, false) => Some(!yes),
        (false, true) => Some(yes),
        _ => None,
    }
}

fn yes_of_number(value: f64) -> Option<bool> {
    match value {
        1.0 => Some(true),
        0.0 => Some(false),
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn statuses() {
        assert_eq!(use_of("ABANDONED"), Use::Gone);
        assert_eq!(use_of("Out-of-Service"), Use::Gone);
        assert_eq!(use_of("In Service"), Use::Live);
        assert_eq!(use_of("purple"), Use::Unknown);
        let gone = [
            "Abandoned in place",
            "AB - Abandoned",
            "Retired 1998",
            "Removed (2004)",
            "taken out of service",
            "NOT IN SERVICE",
            "Not active",
            "Proposed 2030",
            "Planned",
            "not built",
            "dead",
        ];
        for text in gone {
            assert_eq!(use_of(text), Use::Gone, "{text}");
        }
        for text in ["Active main", "A - In Service", "existing", "Live since 1998"] {
            assert_eq!(use_of(text), Use::Live, "{text}");
        }
        // What says two things, or what will be, is not for the program to settle.
        let doubtful = [
            "to be abandoned",
            "active, planned replacement",
            "not abandoned",
            "dead end",
            "for removal",
            "abandonedness",
        ];
        for text in doubtful {
            assert_eq!(use_of(text), Use::Unknown, "{text}");
        }
    }

    #[test]
    fn devices_outside_a_layer_of_valves() {
        assert_eq!(device_elsewhere("Booster Pump"), Some("pump"));
        assert_eq!(device_elsewhere("pumping station"), Some("pump"));
        assert_eq!(
            device_elsewhere("Pressure Reducing Valve"),
            Some("pressure reducing valve")
        );
        assert_eq!(device_elsewhere("PRV"), Some("pressure reducing valve"));
        assert_eq!(device_elsewhere("check valve"), Some("check valve"));
        for text in [
            "reducing tee",
            "reducer",
            "pumping main",
            "pump discharge line",
            "control point",
            "gate valve",
        ] {
            assert_eq!(device_elsewhere(text), None, "{text}");
        }
    }

    #[test]
    fn kinds_of_mains() {
        assert_eq!(main_kind("Transmission Main"), Some(Ok(MainKind::Transmission)));
        assert_eq!(main_kind("DISTRIBUTION"), Some(Ok(MainKind::Distribution)));
        assert_eq!(main_kind("hydrant lateral"), Some(Ok(MainKind::HydrantLateral)));
        assert_eq!(main_kind("service lateral"), Some(Ok(MainKind::Service)));
        assert_eq!(main_kind("raw water main"), Some(Ok(MainKind::RawWater)));
        assert_eq!(main_kind("Private main"), Some(Err("private")));
        assert_eq!(main_kind("xyz"), None);
    }

    #[test]
    fn kinds_of_valves() {
        assert_eq!(valve_kind("Gate Valve"), Valves::Known(ValveKind::Gate));
        assert_eq!(valve_kind("zone valve"), Valves::Known(ValveKind::Zone));
        assert_eq!(valve_kind("AIR"), Valves::Known(ValveKind::OffLine));
        assert_eq!(valve_kind("PRV"), Valves::NotYet("pressure reducing valve"));
        assert_eq!(valve_kind("check valve"), Valves::NotYet("check valve"));
        assert_eq!(valve_kind("zzz"), Valves::Unknown);
    }

    #[test]
    fn kinds_of_nodes() {
        assert_eq!(node_kind("source"), Some(NodeKind::Source));
        assert_eq!(node_kind("Storage tank"), Some(NodeKind::Tank));
        assert_eq!(node_kind("node"), Some(NodeKind::Node));
        assert_eq!(node_kind("thing"), None);
    }

    #[test]
    fn a_number_says_shut_only_under_a_telling_name() {
        let text = |text: &str| Cell::Text(text.into());
        assert_eq!(is_shut(&text("Closed"), "status"), Some(true));
        assert_eq!(is_shut(&text("NORMALLY OPEN"), "status"), Some(false));
        assert_eq!(is_shut(&Cell::Whole(1), "status"), None);
        assert_eq!(is_shut(&Cell::Whole(1), "is_closed"), Some(true));
        assert_eq!(is_shut(&Cell::Bool(true), "open"), Some(false));
        assert_eq!(is_shut(&text("?"), "closed"), None);
    }
}
