//! Properties of water that the friction laws need, from its temperature.

/// Kinematic viscosity of liquid water at atmospheric pressure, m2/s; `temperature_c` in degrees Celsius, 0 to 100.
///
/// Dynamic viscosity by the four-term equation of the IAPWS supplementary release on liquid water at 0.1 MPa (SR6-08,
/// equation 7; it agrees with the full formulation R12-08 within its uncertainty), density by Kell (1975), J. Chem. Eng.
/// Data 20(1):97-105. Both coefficient sets are from memory and are held against tabulated values in the tests.
pub fn viscosity_m2_per_s(temperature_c: f64) -> f64 {
    dynamic_viscosity_pa_s(temperature_c) / density_kg_per_m3(temperature_c)
}

/// Density of water at one atmosphere, kg/m3 (Kell 1975); `temperature_c` in degrees Celsius, 0 to 100.
pub fn density_kg_per_m3(temperature_c: f64) -> f64 {
    let t = temperature_c;
    let above = [
        999.839_52,
        16.945_176,
        -7.987_040_1e-3,
        -46.170_461e-6,
        105.563_02e-9,
        -280.542_53e-12,
    ];
    above.iter().rev().fold(0.0, |sum, a| sum * t + a) / (1.0 + 16.879_850e-3 * t)
}

/// Dynamic viscosity of liquid water at 0.1 MPa, Pa s; `temperature_c` in degrees Celsius.
pub fn dynamic_viscosity_pa_s(temperature_c: f64) -> f64 {
    let relative = (temperature_c + 273.15) / 300.0;
    let terms = [(280.68, -1.9), (511.45, -7.7), (61.131, -19.6), (0.459_03, -40.0)];
    terms.iter().map(|(a, b)| a * relative.powf(*b)).sum::<f64>() * 1e-6
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn water_at_twenty_degrees() {
        assert!((dynamic_viscosity_pa_s(20.0) / 1.0016e-3 - 1.0).abs() < 1e-4);
        assert!((density_kg_per_m3(20.0) - 998.204).abs() < 1e-3);
    }
}
