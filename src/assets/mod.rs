//! Assets: what the map's columns mean, in SI, each value with its basis.
//!
//! After this room nobody but `report` and `study` sees a layer or a column name.

mod cells;
mod columns;
mod customers;
mod desk;
mod diameters;
mod drawings;
mod frictions;
mod hydrants;
mod lengths;
mod mains;
mod materials;
mod names;
mod nodes;
mod read;
mod reading;
mod selection;
mod sentinels;
mod settings;
mod supply;
mod valves;
mod words;

pub use names::{Names, Role};
pub use read::{read, wanted_columns};
pub use reading::{Fillers, LeftOut, Reading, UnitFrom, UnitUsed};
pub use settings::{
    AssetSettings, CustomersColumns, DiameterIs, FrictionLaw, HydrantsColumns, LayerColumns, LeaveOut, LengthFrom,
    MainsColumns, NodesColumns, NumberOrColumn, SourceAt, StudySource, UnitColumn, ValvesColumns,
};

use crate::finding::FeatureRef;

/// A place in the local plane, m: x to the east, y to the north.
pub type Point = [f64; 2];

/// Where a value came from. Written beside the value, so that an assumption can be told from a record.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Basis {
    /// The user's own column.
    Map,
    /// Read from the feature it was joined to.
    Joined,
    /// Interpolated between known values.
    Interpolated,
    /// A documented assumption of this program.
    Assumed,
    /// The study file.
    Study,
}

impl Basis {
    /// The word that is written.
    pub fn word(self) -> &'static str {
        match self {
            Basis::Map => "map",
            Basis::Joined => "joined",
            Basis::Interpolated => "interpolated",
            Basis::Assumed => "assumed",
            Basis::Study => "study",
        }
    }
}

/// A value and where it came from.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Valued<T> {
    /// The value, SI.
    pub value: T,
    /// Where it came from.
    pub basis: Basis,
}

/// What makes a main rough, by the law it belongs to.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Friction {
    /// Hazen-Williams C-factor.
    CFactor(f64),
    /// Roughness height for Colebrook-White, m.
    RoughnessM(f64),
}

/// How a row of a layer that should hold lines is drawn.
#[derive(Clone, Debug, PartialEq)]
pub enum Drawing {
    /// One or more parts, each with its vertices in the local plane, m. A part may have a single vertex.
    Lines(Vec<Vec<Point>>),
    /// Null or empty geometry.
    Missing,
    /// A coordinate is not finite.
    NotFinite,
    /// Another geometry, named as the file names it.
    OtherType(&'static str),
}

/// What a main is for, where the map says so.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Default)]
pub enum MainKind {
    /// The map does not say.
    #[default]
    Unknown,
    /// Feeds services and hydrants.
    Distribution,
    /// Carries water between source, storage and distribution: no services, no hydrants.
    Transmission,
    /// Carries water that is not for drinking: never calculated with the rest.
    RawWater,
    /// From a main to a hydrant.
    HydrantLateral,
    /// From a main to one property.
    Service,
}

/// A row of a mains layer that takes part in the calculation.
#[derive(Clone, Debug, PartialEq)]
pub struct Main {
    /// The user's feature.
    pub origin: FeatureRef,
    /// The drawing.
    pub drawing: Drawing,
    /// True length over length in the local plane: geodesic for lon/lat layers, 1 for projected ones.
    pub length_scale: f64,
    /// The length the map stores, m, where the study says that it counts and it is one; else the drawn length counts.
    pub stored_length_m: Option<f64>,
    /// Inside diameter, m; `None` when the map has none that can be used (a finding says so).
    pub diameter_m: Option<Valued<f64>>,
    /// C-factor or roughness height.
    pub friction: Valued<Friction>,
    /// Minor loss coefficient K of the whole main, on its own velocity head.
    pub minor_loss_k: f64,
    /// Year of laying.
    pub year: Option<i32>,
    /// Index into [`Assets::zones`].
    pub zone: Option<u32>,
    /// What it is for.
    pub kind: MainKind,
}

/// What stands at a node point.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Default)]
pub enum NodeKind {
    /// A place on the network.
    #[default]
    Node,
    /// Feeds the network at a known head.
    Source,
    /// Storage at a known level.
    Tank,
}

/// A row of a nodes layer, or a `[[source]]` of the study.
#[derive(Clone, Debug, PartialEq)]
pub struct NodePoint {
    /// The user's feature; `None` for a source the study names.
    pub origin: Option<FeatureRef>,
    /// Where; `None` when it has no usable geometry.
    pub at: Option<Point>,
    /// What stands there.
    pub kind: NodeKind,
    /// Elevation, m.
    pub elevation_m: Option<Valued<f64>>,
    /// Known head, m: the node is a source or a tank.
    pub head_m: Option<Valued<f64>>,
    /// Demand at the average day, m3/s, not below zero.
    pub demand_m3_per_s: f64,
    /// The greatest flow the source can give, m3/s, if stated.
    pub greatest_m3_per_s: Option<f64>,
    /// Index into [`Assets::zones`].
    pub zone: Option<u32>,
}

/// A row of the hydrants layer.
#[derive(Clone, Debug, PartialEq)]
pub struct Hydrant {
    /// The user's feature.
    pub origin: FeatureRef,
    /// Where; `None` when it has no usable geometry.
    pub at: Option<Point>,
    /// Its own elevation, m; where there is none it is judged at that of its main.
    pub elevation_m: Option<f64>,
    /// Needed fire flow, m3/s.
    pub needed_m3_per_s: Option<Valued<f64>>,
    /// Index into [`Assets::zones`].
    pub zone: Option<u32>,
}

/// A row of the customers layer.
#[derive(Clone, Debug, PartialEq)]
pub struct Customer {
    /// The user's feature.
    pub origin: FeatureRef,
    /// Where; `None` when it has no usable geometry.
    pub at: Option<Point>,
    /// Demand at the average day, m3/s, not below zero.
    pub demand_m3_per_s: f64,
    /// Index into [`Assets::classes`].
    pub class: Option<u32>,
    /// Ground elevation, m; where there is none it is judged at that of its main.
    pub elevation_m: Option<f64>,
    /// Highest tap above the elevation, m.
    pub lift_m: f64,
    /// Index into [`Assets::zones`].
    pub zone: Option<u32>,
}

/// What a valve does. Regulating and check valves are refused until the solver takes them.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Default)]
pub enum ValveKind {
    /// Isolates a length of main.
    #[default]
    Gate,
    /// Stands between two pressure zones, normally shut.
    Zone,
    /// Lets air in or out, or drains the main: no part in the hydraulics.
    OffLine,
}

/// A row of the valves layer.
#[derive(Clone, Debug, PartialEq)]
pub struct Valve {
    /// The user's feature.
    pub origin: FeatureRef,
    /// Where; `None` when it has no usable geometry.
    pub at: Option<Point>,
    /// What it does.
    pub kind: ValveKind,
    /// Whether it is shut, and how that is known.
    pub closed: Valued<bool>,
    /// The main it names, if it names one.
    pub main: Option<NamedMain>,
}

/// A main that another feature names by id.
#[derive(Clone, Debug, PartialEq)]
pub enum NamedMain {
    /// Indices into [`Assets::mains`] of the mains that carry the id (ids repeat).
    Known(Vec<u32>),
    /// No main carries the id.
    Unknown(String),
}

/// How far a point may lie from its main, m.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Reach {
    /// Hydrants.
    pub hydrants_m: f64,
    /// Customers.
    pub customers_m: f64,
    /// Valves.
    pub valves_m: f64,
}

/// Everything the map says, in SI.
#[derive(Clone, Debug)]
pub struct Assets {
    /// The mains that take part, in file order.
    pub mains: Vec<Main>,
    /// Mains left out by a rule of the study.
    pub left_out: Vec<FeatureRef>,
    /// Node points, tanks and sources, those of the study last.
    pub nodes: Vec<NodePoint>,
    /// Hydrants.
    pub hydrants: Vec<Hydrant>,
    /// Customers.
    pub customers: Vec<Customer>,
    /// Valves.
    pub valves: Vec<Valve>,
    /// Names of the pressure zones.
    pub zones: Vec<String>,
    /// Names of the customer classes.
    pub classes: Vec<String>,
    /// How far points may lie from their mains.
    pub reach: Reach,
}
