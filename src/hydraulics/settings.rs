//! Every constant and tolerance of the hydraulics.

use std::f64::consts::PI;

use super::linear::Factoring;
use super::water::viscosity_m2_per_s;
use crate::units::{GRAVITY_M_PER_S2, M_PER_FOOT};

/// The Hazen-Williams law as it is calculated: h = K L Q^n / (C^n D^m), in metres and cubic metres a second.
///
/// Published constants differ by 2 %, which is enough to turn a flag near a limit: the three numbers belong together and
/// are stated with every result.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HazenWilliams {
    /// K.
    pub constant: f64,
    /// n, the exponent of flow and of the C-factor.
    pub flow_exponent: f64,
    /// m, the exponent of diameter.
    pub diameter_exponent: f64,
}

impl HazenWilliams {
    /// The published law, V = 1.318 C R^0.63 S^0.54 in feet and seconds (Williams & Hazen, Hydraulic Tables, 1905 and
    /// later), converted exactly: K = 10.66992, n = 1/0.54, m = 2.63/0.54.
    pub fn published() -> Self {
        Self::from_velocity_form(1.318 * M_PER_FOOT.powf(1.0 - 0.63))
    }

    /// The law whose velocity form is V = k C R^0.63 S^0.54 in metres and seconds; k is 0.84918 for the published law and
    /// is often rounded to 0.849 or 0.85.
    pub fn from_velocity_form(k: f64) -> Self {
        let flow_exponent = 1.0 / 0.54;
        // A full round pipe: R = D/4 and Q = V pi D^2/4; solved for S.
        let constant = (4.0 * 4_f64.powf(0.63) / (PI * k)).powf(flow_exponent);
        Self {
            constant,
            flow_exponent,
            diameter_exponent: 2.63 / 0.54,
        }
    }
}

impl Default for HazenWilliams {
    fn default() -> Self {
        Self::published()
    }
}

/// Every constant and tolerance of the hydraulics.
#[derive(Clone, Debug, PartialEq)]
pub struct Settings {
    /// The Hazen-Williams law, for parts with a C-factor.
    pub hazen_williams: HazenWilliams,
    /// Kinematic viscosity of water, m2/s, for parts with a roughness height.
    pub viscosity_m2_per_s: f64,
    /// Acceleration of gravity in the Darcy-Weisbach law and in minor losses, m/s2.
    pub gravity_m_per_s2: f64,
    /// Largest continuity residual accepted, m3/s.
    pub continuity_m3_per_s: f64,
    /// Largest head-loss residual accepted, m.
    pub head_m: f64,
    /// Newton steps after which it is said that the solution does not settle.
    pub most_steps: u32,
    /// How the linear equations of a step are factored.
    pub factoring: Factoring,
}

/// Temperature that the default viscosity belongs to, degrees Celsius: common practice for water in buried mains.
pub const USUAL_TEMPERATURE_C: f64 = 15.0;

impl Default for Settings {
    /// The published Hazen-Williams law, water at 15 degrees Celsius, standard gravity; residuals of 1e-9 m3/s and 1e-7 m.
    fn default() -> Self {
        Self {
            hazen_williams: HazenWilliams::published(),
            viscosity_m2_per_s: viscosity_m2_per_s(USUAL_TEMPERATURE_C),
            gravity_m_per_s2: GRAVITY_M_PER_S2,
            continuity_m3_per_s: 1e-9,
            head_m: 1e-7,
            most_steps: 200,
            factoring: Factoring::Excess,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_published_law_has_its_known_constants() {
        let law = HazenWilliams::published();
        assert!((law.constant - 10.66992).abs() < 5e-6, "{}", law.constant);
        // 0.849 gives 10.67416: the rounding of k alone moves the head loss by 0.04 %.
        let rounded = HazenWilliams::from_velocity_form(0.849);
        assert!((rounded.constant - 10.67416).abs() < 5e-6, "{}", rounded.constant);
    }
}
