//! Limits: what results are held against, each with where it came from. Defaults are marked as defaults.

use crate::units::{PA_PER_M_WATER, PA_PER_PSI};

/// A limit and where it came from.
#[derive(Clone, Debug, PartialEq)]
pub struct Limit {
    /// The limit, SI.
    pub value: f64,
    /// Where it came from: `study`, or the source of a default.
    pub from: String,
    /// Whether it is a default of this program and not the user's.
    pub is_default: bool,
}

impl Limit {
    /// A limit that the study sets.
    pub fn of_study(value: f64) -> Limit {
        Limit {
            value,
            from: "study".into(),
            is_default: false,
        }
    }

    fn default_from(value: f64, source: &str) -> Limit {
        Limit {
            value,
            from: format!("default: {source}"),
            is_default: true,
        }
    }
}

/// Limits of pressure, velocity and gradient.
#[derive(Clone, Debug, PartialEq)]
pub struct Limits {
    /// Pressure below this is low where customers draw or hydrants stand, m.
    pub pressure_low_m: Limit,
    /// Pressure below this is seriously low, m.
    pub pressure_low_serious_m: Limit,
    /// Pressure above this, when nobody draws, is high, m.
    pub pressure_high_m: Limit,
    /// Pressure above this is seriously high, m.
    pub pressure_high_serious_m: Limit,
    /// Velocity above this is high, m/s.
    pub velocity_high_m_per_s: Limit,
    /// Hydraulic gradient above this is high, m/m.
    pub gradient_high: Limit,
    /// The same for large mains, m/m.
    pub gradient_high_large: Limit,
    /// From this bore on a main is large, m.
    pub large_from_m: f64,
}

/// Pounds per square inch as metres of water.
fn psi(value: f64) -> f64 {
    value * PA_PER_PSI / PA_PER_M_WATER
}

impl Default for Limits {
    fn default() -> Self {
        Limits {
            pressure_low_m: Limit::default_from(psi(30.0), "30 psi at peak hour, WAC 246-290-230(5), Washington"),
            pressure_low_serious_m: Limit::default_from(psi(20.0), "20 psi, WAC 246-290-230(6), Washington"),
            pressure_high_m: Limit::default_from(psi(80.0), "80 psi, plumbing code 608.2"),
            pressure_high_serious_m: Limit::default_from(psi(125.0), "125 psi, COMAR 20.70.07.02, Maryland"),
            velocity_high_m_per_s: Limit::default_from(1.5, "1.5 m/s at peak, common practice"),
            gradient_high: Limit::default_from(0.010, "10 m/km, common practice"),
            gradient_high_large: Limit::default_from(0.003, "3 m/km from 400 mm, common practice"),
            large_from_m: 0.4,
        }
    }
}

impl Limits {
    /// The gradient limit for a bore, m/m.
    pub fn gradient_for(&self, diameter_m: f64) -> &Limit {
        if diameter_m >= self.large_from_m {
            &self.gradient_high_large
        } else {
            &self.gradient_high
        }
    }
}

/// What is asked about fire flow.
#[derive(Clone, Debug, PartialEq)]
pub struct Fire {
    /// Index of the case that the fire comes on top of.
    pub case: usize,
    /// Pressure that must be left at the hydrant that flows, m.
    pub residual_m: Limit,
    /// Needed flow of hydrants whose row has none, m3/s.
    pub needed_m3_per_s: Option<f64>,
    /// Pressure that must be left wherever customers draw, m, if that is asked.
    pub keep_elsewhere_m: Option<Limit>,
}

impl Fire {
    /// The default residual limit.
    pub fn default_residual() -> Limit {
        Limit::default_from(psi(20.0), "20 psi with the maximum day, WAC 246-290-230(6), Washington")
    }
}
