//! What the study says about the layers: which column means what, in which unit, and which rows are left out.

use super::Valued;
use crate::units::Unit;

/// A column that holds numbers of one quantity.
#[derive(Clone, Debug, PartialEq)]
pub struct UnitColumn {
    /// Its name, as the study spells it.
    pub column: String,
    /// The unit the study states; `None` to infer it from the name and the values.
    pub unit: Option<Unit>,
}

/// A number that holds for every row, or a column.
#[derive(Clone, Debug, PartialEq)]
pub enum NumberOrColumn {
    /// The same for every row, SI.
    Number(f64),
    /// Each row has its own.
    Column(UnitColumn),
}

/// Rows that are left out: the user's own column and the values that mark them.
#[derive(Clone, Debug, PartialEq)]
pub struct LeaveOut {
    /// The column.
    pub column: String,
    /// The values, as text; compared without regard to case and to blanks at the ends.
    pub values: Vec<String>,
}

/// What every layer has.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct LayerColumns {
    /// Index in the `LayerSet`.
    pub layer: u16,
    /// Column of the user's ids.
    pub id: Option<String>,
    /// Column of the pressure zone's name.
    pub zone: Option<String>,
    /// Column of the status.
    pub status: Option<String>,
    /// Rows that are left out.
    pub leave_out: Vec<LeaveOut>,
}

/// What the diameter column holds.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum DiameterIs {
    /// The bore: calculated with as it stands.
    #[default]
    Inside,
    /// The nominal size: the bore is assumed from it, see `materials.rs`.
    Nominal,
    /// The outside diameter: the wall, where the material tells it, is taken off, see `materials.rs`.
    Outside,
}

/// Which length is calculated with.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum LengthFrom {
    /// The drawn one.
    #[default]
    Drawn,
    /// The one in the length column, where it is one.
    Stored,
}

/// A layer of mains.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct MainsColumns {
    /// What every layer has.
    pub common: LayerColumns,
    /// Diameter.
    pub diameter: Option<UnitColumn>,
    /// What the diameter column holds.
    pub diameter_is: DiameterIs,
    /// C-factor.
    pub c_factor: Option<String>,
    /// Roughness height.
    pub roughness: Option<UnitColumn>,
    /// Minor loss coefficient K.
    pub minor_loss: Option<String>,
    /// Material.
    pub material: Option<String>,
    /// Year of laying.
    pub year: Option<String>,
    /// Stored length.
    pub length: Option<UnitColumn>,
    /// Which length is calculated with.
    pub length_from: LengthFrom,
    /// What the main is for.
    pub kind: Option<String>,
}

/// A layer of node points.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct NodesColumns {
    /// What every layer has.
    pub common: LayerColumns,
    /// What stands there.
    pub kind: Option<String>,
    /// Elevation.
    pub elevation: Option<UnitColumn>,
    /// Known head.
    pub head: Option<UnitColumn>,
    /// Average-day demand.
    pub demand: Option<UnitColumn>,
}

/// A layer of hydrants.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct HydrantsColumns {
    /// What every layer has.
    pub common: LayerColumns,
    /// Elevation.
    pub elevation: Option<UnitColumn>,
    /// Needed fire flow.
    pub needed_flow: Option<UnitColumn>,
}

/// A layer of customers.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct CustomersColumns {
    /// What every layer has.
    pub common: LayerColumns,
    /// Average-day demand.
    pub demand: Option<UnitColumn>,
    /// Class of customer.
    pub class: Option<String>,
    /// Ground elevation.
    pub elevation: Option<UnitColumn>,
    /// Highest tap above the elevation.
    pub lift: Option<NumberOrColumn>,
}

/// A layer of valves.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct ValvesColumns {
    /// What every layer has.
    pub common: LayerColumns,
    /// What it does.
    pub kind: Option<String>,
    /// Id of the main it stands on.
    pub main: Option<String>,
}

/// Where a source of the study stands.
#[derive(Clone, Debug, PartialEq)]
pub enum SourceAt {
    /// A node's or a main's id.
    Id(String),
    /// A point in the coordinates of the first mains layer.
    Point([f64; 2]),
}

/// A source that the study adds.
#[derive(Clone, Debug, PartialEq)]
pub struct StudySource {
    /// Where it stands.
    pub at: SourceAt,
    /// Its head, m.
    pub head_m: f64,
    /// Its elevation, m, where the study gives it.
    pub elevation_m: Option<f64>,
    /// The greatest flow it can give, m3/s.
    pub greatest_m3_per_s: Option<f64>,
}

/// The friction law in use: which of C-factor and roughness height a main needs.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum FrictionLaw {
    /// Hazen-Williams, by C-factor.
    #[default]
    HazenWilliams,
    /// Darcy-Weisbach with Colebrook-White, by roughness height.
    DarcyWeisbach,
}

/// Everything the study says about the layers.
#[derive(Clone, Debug, PartialEq)]
pub struct AssetSettings {
    /// Mains layers, in the study's order; at least one.
    pub mains: Vec<MainsColumns>,
    /// Node layers.
    pub nodes: Vec<NodesColumns>,
    /// Hydrant layers.
    pub hydrants: Vec<HydrantsColumns>,
    /// Customer layers.
    pub customers: Vec<CustomersColumns>,
    /// Valve layers.
    pub valves: Vec<ValvesColumns>,
    /// Sources of the study.
    pub sources: Vec<StudySource>,
    /// Ids of the nodes whose head the study gives by case: none is missed on the map.
    pub heads_by_case: Vec<String>,
    /// The friction law.
    pub law: FrictionLaw,
    /// C-factor of a main about which nothing is known.
    pub default_c_factor: Valued<f64>,
    /// Roughness height of a main about which nothing is known, m.
    pub default_roughness_m: Valued<f64>,
    /// The year that ages are counted to, and after which nothing can have been laid.
    pub age_in_year: i32,
    /// Whether hydrants are judged at their own elevation where they have one, or always at that of their main.
    pub hydrants_at_own_elevation: bool,
    /// How far points may lie from their mains.
    pub reach: super::Reach,
}
