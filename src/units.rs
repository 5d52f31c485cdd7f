//! Units: parsed and printed at the edges only. The only file with a conversion factor.
//!
//! Everything inside the program is SI: metres, metres of water for pressure, cubic metres a second, seconds. The exact
//! factors follow from the international yard and pound agreement (1959), the US gallon of 231 cubic inches (NIST HB 44),
//! the imperial gallon of 4.54609 litres (Weights and Measures Act 1985) and standard gravity 9.80665 m/s2 (CGPM 1901).
//! Pressure as a height of water uses the conventional metre of water, 9806.65 Pa (1000 kg/m3 at standard gravity).

use std::fmt;

/// Metres in an inch (exact).
pub const M_PER_INCH: f64 = 0.0254;
/// Metres in an international foot (exact).
pub const M_PER_FOOT: f64 = 0.3048;
/// Metres in an international mile of 5280 feet (exact).
pub const M_PER_MILE: f64 = 5280.0 * M_PER_FOOT;
/// Metres in a kilometre.
pub const M_PER_KM: f64 = 1000.0;
/// Metres in a US survey foot, 1200/3937 (exact).
pub const M_PER_US_SURVEY_FOOT: f64 = 1200.0 / 3937.0;
/// Metres in a millimetre (exact).
pub const M_PER_MM: f64 = 1e-3;
/// Cubic metres in a US gallon (exact, 231 cubic inches).
pub const M3_PER_US_GALLON: f64 = 0.003_785_411_784;
/// Cubic metres in an imperial gallon (exact).
pub const M3_PER_IMPERIAL_GALLON: f64 = 0.004_546_09;
/// Pascals in a conventional metre of water (exact).
pub const PA_PER_M_WATER: f64 = 9806.65;
/// Pascals in a pound-force per square inch (rounded from the exact rational 8896443230521/1290320000).
pub const PA_PER_PSI: f64 = 8_896_443_230_521.0 / 1_290_320_000.0;
/// Standard gravity, m/s2 (exact, CGPM 1901).
pub const GRAVITY_M_PER_S2: f64 = 9.80665;

/// What a number measures. Decides which units fit it and how it is printed.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Quantity {
    /// Length, distance, elevation or head, m.
    Length,
    /// Diameter of a main, m.
    Diameter,
    /// Pressure as a height of water, m.
    Pressure,
    /// Flow or demand, m3/s.
    Flow,
    /// Velocity, m/s.
    Velocity,
    /// Hydraulic gradient, metres of head a metre of main.
    Gradient,
    /// Roughness height, m.
    Roughness,
    /// A number without a unit: a C-factor, a count, a ratio.
    Plain,
}

/// The units results are written in.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum UnitSystem {
    /// Metres, litres a second, millimetres.
    #[default]
    Si,
    /// Feet, US gallons a minute, pounds per square inch, inches.
    Us,
}

/// One unit of one quantity.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Unit {
    /// The name it is printed with and, in lower case, recognised by.
    pub name: &'static str,
    /// The suffix a key or a column ends in, without the underscore.
    pub suffix: &'static str,
    /// What it measures.
    pub quantity: Quantity,
    /// How much of the SI unit (see [`Quantity`]) one of it is.
    pub si: f64,
}

const fn unit(name: &'static str, suffix: &'static str, quantity: Quantity, si: f64) -> Unit {
    Unit {
        name,
        suffix,
        quantity,
        si,
    }
}

/// Every unit the program reads, the SI one of each quantity first. A second spelling is a second row.
pub const UNITS: &[Unit] = &[
    unit("m", "m", Quantity::Length, 1.0),
    unit("mm", "mm", Quantity::Length, 1e-3),
    unit("km", "km", Quantity::Length, 1e3),
    unit("ft", "ft", Quantity::Length, M_PER_FOOT),
    unit("us-ft", "usft", Quantity::Length, M_PER_US_SURVEY_FOOT),
    unit("mm", "mm", Quantity::Diameter, 1e-3),
    unit("cm", "cm", Quantity::Diameter, 1e-2),
    unit("m", "m", Quantity::Diameter, 1.0),
    unit("in", "in", Quantity::Diameter, M_PER_INCH),
    unit("ft", "ft", Quantity::Diameter, M_PER_FOOT),
    unit("m", "m", Quantity::Pressure, 1.0),
    unit("psi", "psi", Quantity::Pressure, PA_PER_PSI / PA_PER_M_WATER),
    unit("kPa", "kpa", Quantity::Pressure, 1e3 / PA_PER_M_WATER),
    unit("bar", "bar", Quantity::Pressure, 1e5 / PA_PER_M_WATER),
    unit("ft", "ft", Quantity::Pressure, M_PER_FOOT),
    unit("l/s", "lps", Quantity::Flow, 1e-3),
    unit("lps", "lps", Quantity::Flow, 1e-3),
    unit("m3/s", "m3s", Quantity::Flow, 1.0),
    unit("m3/h", "m3h", Quantity::Flow, 1.0 / 3600.0),
    unit("m3/d", "m3d", Quantity::Flow, 1.0 / 86_400.0),
    unit("l/min", "lpm", Quantity::Flow, 1e-3 / 60.0),
    unit("l/d", "lpd", Quantity::Flow, 1e-3 / 86_400.0),
    unit("Ml/d", "mld", Quantity::Flow, 1e3 / 86_400.0),
    unit("gpm", "gpm", Quantity::Flow, M3_PER_US_GALLON / 60.0),
    unit("gpd", "gpd", Quantity::Flow, M3_PER_US_GALLON / 86_400.0),
    unit("mgd", "mgd", Quantity::Flow, M3_PER_US_GALLON * 1e6 / 86_400.0),
    unit("imperial gpm", "igpm", Quantity::Flow, M3_PER_IMPERIAL_GALLON / 60.0),
    unit("ft3/s", "cfs", Quantity::Flow, M_PER_FOOT * M_PER_FOOT * M_PER_FOOT),
    unit("m/s", "mps", Quantity::Velocity, 1.0),
    unit("ft/s", "fps", Quantity::Velocity, M_PER_FOOT),
    unit("m/km", "mkm", Quantity::Gradient, 1e-3),
    unit("ft/1000 ft", "ftk", Quantity::Gradient, 1e-3),
    unit("mm", "mm", Quantity::Roughness, 1e-3),
    unit("m", "m", Quantity::Roughness, 1.0),
    unit("in", "in", Quantity::Roughness, M_PER_INCH),
    unit("ft", "ft", Quantity::Roughness, M_PER_FOOT),
    unit("", "", Quantity::Plain, 1.0),
];

/// Words that people write for a unit, and its name.
const SPELLINGS: &[(&str, &str)] = &[
    ("inch", "in"),
    ("inches", "in"),
    ("\"", "in"),
    ("foot", "ft"),
    ("feet", "ft"),
    ("metre", "m"),
    ("metres", "m"),
    ("meter", "m"),
    ("meters", "m"),
    ("millimetre", "mm"),
    ("millimetres", "mm"),
    ("millimeters", "mm"),
    ("us survey feet", "us-ft"),
    ("l/sec", "l/s"),
    ("litres per second", "l/s"),
    ("gallons per minute", "gpm"),
    ("usgpm", "gpm"),
    ("m3/hr", "m3/h"),
];

impl Unit {
    /// The unit of `quantity` that `text` names, whatever its case; `None` if there is none.
    pub fn parse(text: &str, quantity: Quantity) -> Option<Unit> {
        let wanted = text.trim().to_lowercase();
        let wanted = SPELLINGS
            .iter()
            .find(|(spelt, _)| *spelt == wanted)
            .map_or(wanted.as_str(), |(_, name)| name);
        Self::all(quantity).find(|unit| unit.name.to_lowercase() == wanted || unit.suffix == wanted)
    }

    /// Every unit of a quantity, the usual SI one first.
    pub fn all(quantity: Quantity) -> impl Iterator<Item = Unit> {
        UNITS.iter().copied().filter(move |unit| unit.quantity == quantity)
    }

    /// The unit that results of a quantity are written in.
    pub fn written(quantity: Quantity, system: UnitSystem) -> Unit {
        let name = match (quantity, system) {
            (Quantity::Length | Quantity::Pressure, UnitSystem::Si) => "m",
            (Quantity::Length, UnitSystem::Us) => "ft",
            (Quantity::Pressure, UnitSystem::Us) => "psi",
            (Quantity::Diameter, UnitSystem::Si) => "mm",
            (Quantity::Diameter, UnitSystem::Us) => "in",
            (Quantity::Flow, UnitSystem::Si) => "l/s",
            (Quantity::Flow, UnitSystem::Us) => "gpm",
            (Quantity::Velocity, UnitSystem::Si) => "m/s",
            (Quantity::Velocity, UnitSystem::Us) => "ft/s",
            (Quantity::Gradient, UnitSystem::Si) => "m/km",
            (Quantity::Gradient, UnitSystem::Us) => "ft/1000 ft",
            (Quantity::Roughness, UnitSystem::Si) => "mm",
            (Quantity::Roughness, UnitSystem::Us) => "in",
            (Quantity::Plain, _) => "",
        };
        Self::all(quantity)
            .find(|unit| unit.name == name)
            .expect("every written unit stands in UNITS")
    }

    /// A value in this unit, in SI.
    pub fn to_si(self, value: f64) -> f64 {
        value * self.si
    }

    /// An SI value, in this unit.
    pub fn from_si(self, value: f64) -> f64 {
        value / self.si
    }
}

impl fmt::Display for Unit {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        out.write_str(self.name)
    }
}
