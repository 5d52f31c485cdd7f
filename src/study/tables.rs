//! Every table and key of a study file: what it takes, what holds without it, what it means. The reader goes by this list, and
//! `docs/study-file.md` is made from it.

use super::keys::{Key, Table, Takes};
use crate::units::Quantity;

const fn key(name: &'static str, takes: Takes, default: &'static str, means: &'static str) -> Key {
    Key {
        name,
        takes,
        default,
        means,
    }
}

const FROM: Key = key(
    "from",
    Takes::File,
    "",
    "The file, relative to the study: GeoJSON or shapefile.",
);
const ID: Key = key(
    "id",
    Takes::Column,
    "",
    "Column of your own ids; without it features are named by their row.",
);
const ZONE: Key = key("zone", Takes::Column, "", "Column of the pressure zone.");
const STATUS: Key = key(
    "status",
    Takes::Column,
    "",
    "Column of the status. Rows that are abandoned, removed, retired, out of service, proposed, planned or the like take no part, also \
     where more stands beside the word (`AB - Abandoned`). A status that is not known leaves nothing out and is said: for mains, a \
     warning.",
);
const LEAVE_OUT: Key = key(
    "leave_out",
    Takes::Marks,
    "",
    "Rows that take no part: your own columns and the values that mark them, as in `{ STATUS = [\"ABANDONED\"] }`.",
);
const ENCODING: Key = key(
    "encoding",
    Takes::Text,
    "",
    "Encoding of a shapefile's table that has no .cpg file, for example `windows-1252`.",
);
const ELEVATION: Key = key(
    "elevation",
    Takes::UnitColumn(Quantity::Length),
    "",
    "Column of the elevation.",
);

/// The top of the file.
pub(super) const TOP: Table = Table {
    means: "The top of the file, before any table.",
    keys: &[
        key(
            "title",
            Takes::Text,
            "the study file's name",
            "What the study is called in the report.",
        ),
        key(
            "results_in",
            Takes::Choice(&["si", "us"]),
            "\"si\"",
            "Units of everything written: `si` (m, l/s, mm) or `us` (ft, psi, gpm, in).",
        ),
        key("mains", Takes::Tables(&MAINS), "", ""),
        key("nodes", Takes::Tables(&NODES), "", ""),
        key("hydrants", Takes::Tables(&HYDRANTS), "", ""),
        key("customers", Takes::Tables(&CUSTOMERS), "", ""),
        key("valves", Takes::Tables(&VALVES), "", ""),
        key("source", Takes::Tables(&SOURCE), "", ""),
        key("joining", Takes::Table(&JOINING), "", ""),
        key("friction", Takes::Table(&FRICTION), "", ""),
        key("case", Takes::Tables(&CASE), "", ""),
        key("fire", Takes::Table(&FIRE), "", ""),
        key("limits", Takes::Table(&LIMITS), "", ""),
        key("pumps", Takes::NotYet("pumps"), "", "Booster pumps."),
        key("curve", Takes::NotYet("pump curves"), "", "Curves of pumps."),
        key(
            "tests",
            Takes::NotYet("a comparison with field flow tests"),
            "",
            "Field flow tests.",
        ),
        key(
            "proposal",
            Takes::NotYet("a proposed development"),
            "",
            "A development to be hooked up.",
        ),
    ],
};

/// `[mains]`.
pub(super) const MAINS: Table = Table {
    means: "A layer of mains. Write `[[mains]]` once for each of several layers.",
    keys: &[
        FROM,
        ID,
        key(
            "diameter",
            Takes::UnitColumn(Quantity::Diameter),
            "",
            "Column of the diameter.",
        ),
        key(
            "diameter_is",
            Takes::Choice(&["inside", "nominal", "outside"]),
            "\"inside\"",
            "What that column holds. `inside`: the bore, calculated with as it stands. `nominal`: the bore is assumed to be the \
             nominal size, save for plastic in sizes that are outside diameters alone (ISO 4065), where a wall of SDR 11 \
             (polyethylene) or SDR 21 (PVC) is taken off. `outside`: that wall is taken off; other materials have no bore then, and \
             a finding says so. What is worked out has the basis `assumed`.",
        ),
        key(
            "c_factor",
            Takes::Column,
            "",
            "Column of the Hazen-Williams C-factor. Rows without one take it from material and age, by a table in the method docs.",
        ),
        key(
            "roughness",
            Takes::UnitColumn(Quantity::Roughness),
            "",
            "Column of the roughness height, for the law `darcy-weisbach`. Rows without one take it from material and age.",
        ),
        key(
            "minor_loss",
            Takes::Column,
            "",
            "Column of the minor loss coefficient K of the whole main.",
        ),
        key(
            "material",
            Takes::Column,
            "",
            "Column of the material, in common spellings (CI, DI, PVC, AC, HDPE, steel ...).",
        ),
        key("year", Takes::Column, "", "Column of the year of laying, or of a date."),
        key(
            "length",
            Takes::UnitColumn(Quantity::Length),
            "",
            "Column of a stored length, held against the drawn one.",
        ),
        key(
            "length_from",
            Takes::Choice(&["drawn", "stored"]),
            "\"drawn\"",
            "Which length is calculated with. A stored one that is missing or not above zero gives way to the drawn one.",
        ),
        key(
            "kind",
            Takes::Column,
            "",
            "Column of what the main is for: distribution, transmission, hydrant lateral, service; raw water and private mains take \
             no part.",
        ),
        ZONE,
        STATUS,
        LEAVE_OUT,
        ENCODING,
    ],
};

/// `[nodes]`.
pub(super) const NODES: Table = Table {
    means: "Node points: fittings, tanks, wells, anything with a known head, elevation or demand.",
    keys: &[
        FROM,
        ID,
        key(
            "kind",
            Takes::Column,
            "",
            "Column of what stands there: node, source, tank, in common words.",
        ),
        ELEVATION,
        key(
            "head",
            Takes::UnitColumn(Quantity::Length),
            "",
            "Column of the known head: a node that has one is a source.",
        ),
        key(
            "demand",
            Takes::UnitColumn(Quantity::Flow),
            "",
            "Column of the average-day demand.",
        ),
        ZONE,
        STATUS,
        LEAVE_OUT,
        ENCODING,
    ],
};

/// `[hydrants]`.
pub(super) const HYDRANTS: Table = Table {
    means: "Hydrants.",
    keys: &[
        FROM,
        ID,
        ELEVATION,
        key(
            "needed_flow",
            Takes::UnitColumn(Quantity::Flow),
            "",
            "Column of the needed fire flow; rows without one take that of `[fire]`.",
        ),
        key(
            "reach",
            Takes::Number(Quantity::Length),
            "10 m",
            "How far a hydrant may stand from its main.",
        ),
        ZONE,
        STATUS,
        LEAVE_OUT,
        ENCODING,
    ],
};

/// `[customers]`.
pub(super) const CUSTOMERS: Table = Table {
    means: "Customers: points that draw.",
    keys: &[
        FROM,
        ID,
        key(
            "demand",
            Takes::UnitColumn(Quantity::Flow),
            "",
            "Column of the average-day demand.",
        ),
        key(
            "class",
            Takes::Column,
            "",
            "Column of the class, for `demand_times_by` of a case.",
        ),
        ELEVATION,
        key(
            "lift",
            Takes::NumberOrColumn(Quantity::Length),
            "",
            "Height of the highest tap above the elevation: a number for all (`lift_m = 6.0`), or a column.",
        ),
        key(
            "reach",
            Takes::Number(Quantity::Length),
            "60 m",
            "How far a customer may stand from its main.",
        ),
        ZONE,
        STATUS,
        LEAVE_OUT,
        ENCODING,
    ],
};

/// `[valves]`.
pub(super) const VALVES: Table = Table {
    means: "Valves: gate valves, zone valves, and those off the line (air valves, blow-offs). A row that is a check valve, a \
            regulating valve or a pump stops the run: this version does not calculate it.",
    keys: &[
        FROM,
        ID,
        key(
            "kind",
            Takes::Column,
            "",
            "Column of the kind; without it every valve is a gate valve.",
        ),
        key(
            "status",
            Takes::Column,
            "",
            "Column that says `open` or `closed`. Numbers, yes and no are understood where the column's name says what they mean \
             (`closed`, `is_open`). Where it cannot be told, a zone valve is taken as closed and any other as open, and it is said. \
             Abandoned and proposed valves take no part.",
        ),
        key(
            "main",
            Takes::Column,
            "",
            "Column of the id of the main that the valve stands on.",
        ),
        key(
            "reach",
            Takes::Number(Quantity::Length),
            "2 m",
            "How far a valve may stand from its main.",
        ),
        key(
            "setting",
            Takes::NotYet("regulating valves"),
            "",
            "Setting of a regulating valve.",
        ),
        key(
            "flow_bearing",
            Takes::NotYet("regulating and check valves"),
            "",
            "Direction of flow of a regulating or check valve.",
        ),
        key(
            "diameter",
            Takes::NotYet("the head loss of valves"),
            "",
            "Diameter of a valve.",
        ),
        ZONE,
        LEAVE_OUT,
        ENCODING,
    ],
};

/// `[[source]]`.
pub(super) const SOURCE: Table = Table {
    means: "A source that the map lacks: a known head at a place. Write one table for each.",
    keys: &[
        key(
            "at",
            Takes::Place,
            "",
            "A node's id, a main's id (then its free end, else its start), or a point `[x, y]` in the coordinates of the first mains \
             layer. At a node that has a known head of its own, this one counts.",
        ),
        key(
            "head",
            Takes::Number(Quantity::Length),
            "",
            "The head: elevation and pressure together.",
        ),
        key(
            "elevation",
            Takes::Number(Quantity::Length),
            "",
            "Elevation, if the head is not given.",
        ),
        key(
            "pressure",
            Takes::Number(Quantity::Pressure),
            "",
            "Pressure, if the head is not given.",
        ),
        key(
            "greatest",
            Takes::Number(Quantity::Flow),
            "",
            "The greatest flow that the source can give in a fire.",
        ),
        key(
            "static",
            Takes::NotYet("a source by a flow test"),
            "",
            "Static pressure of a flow test.",
        ),
        key(
            "residual",
            Takes::NotYet("a source by a flow test"),
            "",
            "Residual pressure of a flow test.",
        ),
        key(
            "flow",
            Takes::NotYet("a source by a flow test"),
            "",
            "Flow of a flow test.",
        ),
    ],
};

/// `[joining]`.
pub(super) const JOINING: Table = Table {
    means: "How mains are joined.",
    keys: &[
        key(
            "tolerance",
            Takes::Number(Quantity::Length),
            "0.3 m",
            "Ends no farther apart than this are joined without asking.",
        ),
        key(
            "look",
            Takes::Number(Quantity::Length),
            "3 m",
            "How far to look for near misses.",
        ),
        key(
            "touch",
            Takes::Number(Quantity::Length),
            "0.001 m",
            "An end this close to a main counts as touching it.",
        ),
        key(
            "zones",
            Takes::Choice(&["apart", "ignore"]),
            "\"apart\"",
            "What happens where mains of two known pressure zones touch with nothing drawn between them: kept `apart`, or joined as if \
             there were no zones (`ignore`).",
        ),
        key(
            "decisions",
            Takes::NotYet("an analyst's decisions on joins"),
            "",
            "An earlier joins layer with a `decision` column.",
        ),
    ],
};

/// `[friction]`.
pub(super) const FRICTION: Table = Table {
    means: "The friction law and its constants.",
    keys: &[
        key(
            "law",
            Takes::Choice(&["hazen-williams", "darcy-weisbach"]),
            "\"hazen-williams\"",
            "The law.",
        ),
        key(
            "constant",
            Takes::Plain,
            "10.66992",
            "K of Hazen-Williams as h = K L Q^n / (C^n D^m) in metres and seconds. Published ones run from 10.5 to 10.9.",
        ),
        key(
            "flow_exponent",
            Takes::Plain,
            "1/0.54",
            "n, the exponent of flow and C-factor.",
        ),
        key(
            "diameter_exponent",
            Takes::Plain,
            "2.63/0.54",
            "m, the exponent of diameter.",
        ),
        key(
            "temperature_c",
            Takes::Plain,
            "15",
            "Temperature of the water in degrees Celsius, for Darcy-Weisbach.",
        ),
        key(
            "default_c",
            Takes::Plain,
            "100",
            "C-factor of a main without one and of no known material (common practice, no source).",
        ),
        key(
            "default_roughness",
            Takes::Number(Quantity::Roughness),
            "0.4 mm",
            "Roughness height of a main without one and of no known material (DVGW W 302 for a network of mains with its fittings, from \
             memory).",
        ),
        key(
            "age_in_year",
            Takes::Plain,
            "the year of the run",
            "The year that the ages of mains are counted to. Give it, or friction that rests on age changes from one year to the next; the \
             year used is among the settings of the report.",
        ),
    ],
};

/// `[[case]]`.
pub(super) const CASE: Table = Table {
    means: "A demand condition. Write one table for each; without any there is one case, `average day`. The network at rest (nobody \
            draws) is always solved besides.",
    keys: &[
        key("name", Takes::Text, "", "Its name, for example `peak hour`."),
        key(
            "demand_times",
            Takes::Plain,
            "1",
            "What every average-day demand is multiplied by.",
        ),
        key(
            "demand_times_by",
            Takes::PlainByName,
            "",
            "Other factors for classes of customers, as in `{ industry = 1.0 }`.",
        ),
        key(
            "tank_levels",
            Takes::NumberByName(Quantity::Length),
            "",
            "Water levels of tanks, as heads, by the node's id: `tank_levels_m = { T1 = 118.2 }`.",
        ),
        key("off", Takes::NotYet("pumps"), "", "Pumps that are off."),
        key(
            "limits",
            Takes::Table(&LIMITS),
            "",
            "Limits of this case alone, with the keys of `[limits]`.",
        ),
    ],
};

/// `[fire]`.
pub(super) const FIRE: Table = Table {
    means: "Fire flow. Without this table it is not calculated, and the report says so.",
    keys: &[
        key(
            "case",
            Takes::Text,
            "",
            "The case that the fire comes on top of; needed. As a rule the maximum day.",
        ),
        key(
            "residual",
            Takes::Number(Quantity::Pressure),
            "20 psi (WAC 246-290-230(6), Washington)",
            "Pressure that must be left at the hydrant that flows.",
        ),
        key(
            "needed",
            Takes::Number(Quantity::Flow),
            "",
            "Needed flow of hydrants whose row has none.",
        ),
        key(
            "keep_elsewhere",
            Takes::Number(Quantity::Pressure),
            "",
            "Pressure that must be left wherever customers draw; the flow that keeps it is written as the safe flow.",
        ),
        key(
            "judged_at",
            Takes::Choice(&["hydrant", "main", "outlet"]),
            "\"hydrant\"",
            "Whose elevation counts: the hydrant's own where it has one, or always its main's. `outlet` is refused: this version does \
             not calculate losses inside hydrants.",
        ),
    ],
};

/// `[limits]`.
pub(super) const LIMITS: Table = Table {
    means: "What results are held against. Defaults are marked as defaults wherever they decide a verdict; they are not your code.",
    keys: &[
        key(
            "pressure_low",
            Takes::Number(Quantity::Pressure),
            "30 psi (WAC 246-290-230(5), Washington)",
            "Pressure below this is low where customers draw or hydrants stand.",
        ),
        key(
            "pressure_low_serious",
            Takes::Number(Quantity::Pressure),
            "20 psi (WAC 246-290-230(6), Washington)",
            "Pressure below this is seriously low; never above `pressure_low`.",
        ),
        key(
            "pressure_high",
            Takes::Number(Quantity::Pressure),
            "80 psi (plumbing code 608.2)",
            "Pressure above this, when nobody draws, is high.",
        ),
        key(
            "pressure_high_serious",
            Takes::Number(Quantity::Pressure),
            "125 psi (COMAR 20.70.07.02, Maryland)",
            "Pressure above this is seriously high; never below `pressure_high`.",
        ),
        key(
            "velocity_high",
            Takes::Number(Quantity::Velocity),
            "1.5 m/s (common practice)",
            "Velocity above this is high.",
        ),
        key(
            "gradient_high",
            Takes::Number(Quantity::Gradient),
            "10 m/km (common practice)",
            "Hydraulic gradient above this is high.",
        ),
        key(
            "gradient_high_large",
            Takes::Number(Quantity::Gradient),
            "3 m/km (common practice)",
            "The same for large mains.",
        ),
        key(
            "large_from",
            Takes::Number(Quantity::Diameter),
            "400 mm",
            "From this bore on a main is large.",
        ),
    ],
};
